//! The job sheet as written: every key and value with its place, no meaning yet.

use crate::diagnostic::{Fault, SourceText, Span};
use std::ops::Range;
use std::sync::Arc;
use toml::de::{DeTable, DeValue};

/// A value of the sheet.
#[derive(Debug, Clone)]
pub struct Value {
    /// What it is.
    pub content: Content,
    /// Where it is written.
    pub span: Span,
}

/// What a value is.
#[derive(Debug, Clone)]
pub enum Content {
    /// Any number; whole numbers too.
    Number(f64),
    /// A text in quotes.
    Text(String),
    /// `[ ... ]`, or the blocks of one name.
    List(Vec<Value>),
    /// `{ ... }`, or a block; in the order written.
    Block(Vec<Entry>),
    /// true, false or a date: nothing the sheet has a use for.
    Other(&'static str),
}

impl Content {
    /// What it is, for messages.
    pub fn noun(&self) -> &'static str {
        match self {
            Self::Number(_) => "a number",
            Self::Text(_) => "a text",
            Self::List(_) => "a list",
            Self::Block(_) => "a block of keys",
            Self::Other(noun) => noun,
        }
    }
}

/// A key and its value.
#[derive(Debug, Clone)]
pub struct Entry {
    /// The key.
    pub key: String,
    /// Where the key is written.
    pub key_span: Span,
    /// The value.
    pub value: Value,
}

/// Reads the whole sheet; what is no TOML is given as faults.
pub fn read_sheet(source: &Arc<SourceText>) -> Result<Value, Vec<Fault>> {
    let (table, mut errors) = DeTable::parse_recoverable(&source.text);
    errors.sort_by_key(|error| error.span().map(|range| range.start));
    if errors.is_empty() {
        return Ok(Value { content: block(table.get_ref(), source), span: place(source, table.span()) });
    }
    // After the first slip the rest of a line is often misread as well: one fault per line tells enough.
    let mut faults: Vec<Fault> = Vec::new();
    let mut last_line = 0;
    for error in errors {
        let span = error.span().map(|range| place(source, range));
        let line = span.as_ref().map_or(0, |s| s.line_column().0);
        if line != last_line || faults.is_empty() {
            last_line = line;
            let message = error.message().lines().collect::<Vec<_>>().join(", ");
            let remedy = "check quotes, commas and brackets here; every key is written once in its block".to_string();
            faults.push(Fault {
                message: format!("the sheet cannot be read: {message}"),
                span,
                expected: Some("`key = value`, `[block]` or `[[block]]` (TOML)".into()),
                remedy: Some(remedy),
                labels: Vec::new(),
            });
        }
        if faults.len() >= 20 {
            break;
        }
    }
    Err(faults)
}

fn place(source: &Arc<SourceText>, range: Range<usize>) -> Span {
    Span { source: source.clone(), start: range.start, end: range.end }
}

fn block(table: &DeTable, source: &Arc<SourceText>) -> Content {
    let mut entries: Vec<Entry> = table
        .iter()
        .map(|(key, value)| Entry {
            key: key.get_ref().to_string(),
            key_span: place(source, key.span()),
            value: Value { content: content(value.get_ref(), source), span: place(source, value.span()) },
        })
        .collect();
    entries.sort_by_key(|e| e.key_span.start);
    Content::Block(entries)
}

fn content(value: &DeValue, source: &Arc<SourceText>) -> Content {
    match value {
        DeValue::String(text) => Content::Text(text.to_string()),
        DeValue::Integer(whole) => i128::from_str_radix(whole.as_str(), whole.radix())
            .ok()
            .map(|n| n as f64)
            .or_else(|| whole.as_str().parse().ok())
            .map_or(Content::Other("a number too large to read"), Content::Number),
        DeValue::Float(float) => float.as_str().parse().map_or(Content::Other("an unreadable number"), Content::Number),
        DeValue::Boolean(_) => Content::Other("true or false"),
        DeValue::Datetime(_) => Content::Other("a date"),
        DeValue::Array(values) => {
            Content::List(values.iter().map(|v| Value { content: content(v.get_ref(), source), span: place(source, v.span()) }).collect())
        }
        DeValue::Table(table) => block(table, source),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn blocks_know_their_headers_and_values_their_places() {
        let text = "title = \"x\"\n[[layer]]\nname = \"a\"\n\n[[layer]]\nthickness_mm = 1_0.5e0\ncount = 3\n";
        let source = Arc::new(SourceText { path: "job.toml".into(), text: text.into() });
        let sheet = read_sheet(&source).expect("good TOML");
        let Content::Block(entries) = &sheet.content else { panic!("a block") };
        assert_eq!(entries.iter().map(|e| e.key.as_str()).collect::<Vec<_>>(), ["title", "layer"]);
        let Content::List(layers) = &entries[1].value.content else { panic!("a list") };
        assert_eq!(layers[1].span.line_column(), (5, 1));
        let Content::Block(second) = &layers[1].content else { panic!("a block") };
        assert!(matches!(second[0].value.content, Content::Number(x) if x == 10.5));
        assert_eq!(second[0].value.span.line_column(), (6, 16));
        assert!(matches!(second[1].value.content, Content::Number(x) if x == 3.0));
    }

    #[test]
    fn every_broken_line_is_a_fault() {
        let source = Arc::new(SourceText { path: "job.toml".into(), text: "a = \nb = 1\nc = [1, 2\nd\n".into() });
        let faults = read_sheet(&source).expect_err("broken");
        let lines: Vec<_> = faults.iter().filter_map(|f| f.span.as_ref()).map(|s| s.line_column().0).collect();
        assert_eq!(lines, [1, 4]);
    }
}
