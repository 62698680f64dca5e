//! Names of one kind: unique, and found again with a hint.

use crate::diagnostic::Span;
use crate::reading::fields::{Notes, Placed};
use crate::reading::hint;
use std::collections::HashMap;

/// The names of one kind in the order they were given.
pub struct Names {
    kind: &'static str,
    list: Vec<(String, Span)>,
    found: HashMap<String, usize>,
}

impl Names {
    /// No names yet.
    pub fn new(kind: &'static str) -> Self {
        Self { kind, list: Vec::new(), found: HashMap::new() }
    }

    /// Adds a name; one that was given before is a fault. A block without a name still takes its number.
    pub fn add(&mut self, name: Option<Placed<String>>, block: &Span, notes: &Notes) {
        let Some(Placed { value: name, span }) = name else {
            self.list.push((String::new(), block.clone()));
            return;
        };
        if let Some(&earlier) = self.found.get(&name) {
            let message = format!("the {} `{name}` is there twice", self.kind);
            let labels = vec![(self.list[earlier].1.clone(), "first here")];
            notes.fault_with(message, &span, "a name of its own for each", "rename one of them", labels);
        } else {
            self.found.insert(name.clone(), self.list.len());
        }
        self.list.push((name, span));
    }

    /// The number of a name; an unknown one is a fault.
    pub fn find(&self, name: &Placed<String>, notes: &Notes) -> Option<usize> {
        if let Some(&number) = self.found.get(&name.value) {
            return Some(number);
        }
        let known: Vec<&str> = self.list.iter().map(|n| n.0.as_str()).filter(|n| !n.is_empty()).collect();
        let shown = if known.is_empty() { "none is defined".into() } else { known.iter().take(20).copied().collect::<Vec<_>>().join(", ") };
        let near = hint::nearest(&name.value, known);
        let remedy = near.map_or_else(|| format!("define it, or use one of: {shown}"), |n| format!("did you mean `{n}`?"));
        notes.fault(
            format!("unknown {} `{}`", self.kind, name.value),
            &name.span,
            format!("a {} of this sheet: {shown}", self.kind),
            remedy,
        );
        None
    }

    /// The name with this number.
    pub fn name(&self, number: usize) -> &str {
        self.list.get(number).map_or("", |n| n.0.as_str())
    }

    /// Where all of them are written.
    pub fn places(&self) -> Vec<Span> {
        self.list.iter().map(|n| n.1.clone()).collect()
    }
}
