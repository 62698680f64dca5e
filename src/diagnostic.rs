//! Faults and remarks as plain data: what is wrong, where, what was expected, one remedy.

use serde::Serialize;
use std::path::PathBuf;
use std::sync::Arc;

/// A text that was read, with the name the user knows it by.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SourceText {
    /// Path as the user wrote it (or a name such as `built-in demo`).
    pub path: PathBuf,
    /// The whole text.
    pub text: String,
}

/// A stretch of bytes in a source text.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Span {
    /// The text.
    pub source: Arc<SourceText>,
    /// First byte.
    pub start: usize,
    /// One past the last byte.
    pub end: usize,
}

impl Span {
    /// Line and column of the first byte, both counted from 1, the column in characters.
    pub fn line_column(&self) -> (usize, usize) {
        let before = &self.source.text.as_bytes()[..self.start.min(self.source.text.len())];
        let line = before.iter().filter(|&&b| b == b'\n').count() + 1;
        let line_start = before.iter().rposition(|&b| b == b'\n').map_or(0, |p| p + 1);
        let column = String::from_utf8_lossy(&before[line_start..]).chars().count() + 1;
        (line, column)
    }
}

/// A further place that belongs to a fault: the other outline, the earlier definition.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Label {
    /// Where.
    pub span: Span,
    /// What is there.
    pub text: String,
}

/// One fault of the input.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Fault {
    /// One short phrase that would suffice alone.
    pub message: String,
    /// Where it is; `None` only where no text is at fault (a file that cannot be read).
    pub span: Option<Span>,
    /// What was expected at that place.
    pub expected: Option<String>,
    /// One remedy.
    pub remedy: Option<String>,
    /// Further places.
    pub labels: Vec<Label>,
}

/// A note that goes along with a result: something was moved, dropped, clipped or assumed.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Remark {
    /// One sentence.
    pub text: String,
}

impl Remark {
    /// A remark with this sentence.
    pub fn new(text: impl Into<String>) -> Self {
        Self { text: text.into() }
    }
}
