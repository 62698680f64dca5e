//! Typed access to the keys of a block: wrong types, missing and unknown keys become faults, and reading goes on.

use super::hint;
use super::sheet::{Content, Entry, Value};
use crate::diagnostic::{Fault, Label, Remark, Span};
use crate::geometry::Point;
use std::cell::RefCell;

/// Everything there is to say about the input.
#[derive(Debug, Default)]
pub struct Notes {
    /// What is wrong.
    pub faults: RefCell<Vec<Fault>>,
    /// What was moved, dropped or assumed.
    pub remarks: RefCell<Vec<Remark>>,
}

impl Notes {
    /// Adds a fault.
    pub fn fault(&self, message: impl Into<String>, span: &Span, expected: impl Into<String>, remedy: impl Into<String>) {
        self.fault_with(message, span, expected, remedy, Vec::new());
    }

    /// Adds a fault that has further places.
    pub fn fault_with(
        &self,
        message: impl Into<String>,
        span: &Span,
        expected: impl Into<String>,
        remedy: impl Into<String>,
        labels: Vec<(Span, &str)>,
    ) {
        let labels = labels.into_iter().map(|(span, text)| Label { span, text: text.to_string() }).collect();
        let (message, expected, remedy) = (message.into(), Some(expected.into()), Some(remedy.into()));
        self.faults.borrow_mut().push(Fault { message, span: Some(span.clone()), expected, remedy, labels });
    }

    /// Keeps a good result, or adds the fault.
    pub fn keep<T>(&self, result: Result<T, Fault>) -> Option<T> {
        result.map_err(|fault| self.faults.borrow_mut().push(fault)).ok()
    }

    /// Adds a remark.
    pub fn remark(&self, text: impl Into<String>) {
        self.remarks.borrow_mut().push(Remark::new(text));
    }
}

/// A value that was read and its place.
#[derive(Debug, Clone)]
pub struct Placed<T> {
    /// The value.
    pub value: T,
    /// Where it is written.
    pub span: Span,
}

/// The keys of one block.
pub struct Fields<'a> {
    /// What the block is, such as `layer`.
    pub what: &'static str,
    /// The block's header.
    pub span: &'a Span,
    /// Where faults go.
    pub notes: &'a Notes,
    entries: &'a [Entry],
    misspelt: Vec<&'static str>,
}

/// Keys of the sheet that this version does not know yet.
const NOT_YET: [&str; 3] = ["heat", "case", "state"];

impl<'a> Fields<'a> {
    /// Opens a block and tells of every key that is not one of `keys`; `None` when the value is no block.
    pub fn open(value: &'a Value, what: &'static str, keys: &[&'static str], notes: &'a Notes) -> Option<Self> {
        let Content::Block(entries) = &value.content else {
            let message = format!("`{what}` must be a block of keys, not {}", value.content.noun());
            notes.fault(message, &value.span, format!("`[{what}]` or `{what} = {{ ... }}`"), "write the block's keys with their values");
            return None;
        };
        let mut misspelt = Vec::new();
        for entry in entries {
            if keys.contains(&entry.key.as_str()) {
                continue;
            }
            if NOT_YET.contains(&entry.key.as_str()) {
                not_yet(&format!("`{}`", entry.key), &entry.key_span, notes);
                continue;
            }
            let near = hint::nearest(&entry.key, keys.iter().copied());
            let remedy = near.map_or_else(|| "remove the key, or correct its name".to_string(), |key| format!("did you mean `{key}`?"));
            misspelt.extend(near.and_then(|near| keys.iter().copied().find(|k| *k == near)));
            let message = format!("unknown key `{}` in {what}", entry.key);
            notes.fault(message, &entry.key_span, format!("one of: {}", keys.join(", ")), remedy);
        }
        Some(Self { what, span: &value.span, notes, entries, misspelt })
    }

    /// The value of a key.
    pub fn value(&self, key: &str) -> Option<&'a Value> {
        self.entries.iter().find(|e| e.key == key).map(|e| &e.value)
    }

    /// True when the key is written, or a misspelt key was probably meant to be it.
    pub fn has(&self, key: &str) -> bool {
        self.value(key).is_some() || self.misspelt.contains(&key)
    }

    /// The place of a key's value, or the block's header.
    pub fn place(&self, key: &str) -> &'a Span {
        self.value(key).map_or(self.span, |v| &v.span)
    }

    /// Tells of a key that must be there, unless a misspelt one was told of already.
    pub fn missing(&self, key: &str, expected: &str) {
        if !self.has(key) {
            self.notes.fault(format!("{} has no `{key}`", self.what), self.span, expected, format!("add `{key} = ...`"));
        }
    }

    fn wrong(&self, key: &str, value: &Value, expected: &str) {
        let message = format!("`{key}` must be {expected}, not {}", value.content.noun());
        self.notes.fault(message, &value.span, expected, format!("write {expected} here"));
    }

    /// A finite number.
    pub fn number(&self, key: &str) -> Option<Placed<f64>> {
        let value = self.value(key)?;
        let number = finite(value, &format!("`{key}`"), self.notes)?;
        Some(Placed { value: number, span: value.span.clone() })
    }

    /// A finite number that passes a test; `expected` says which.
    pub fn number_where(&self, key: &str, expected: &str, good: impl Fn(f64) -> bool) -> Option<Placed<f64>> {
        let number = self.number(key)?;
        if !good(number.value) {
            let message = format!("`{key}` must be {expected}, not {}", number.value);
            self.notes.fault(message, &number.span, expected, "correct the number, and check its unit");
            return None;
        }
        Some(number)
    }

    /// A number above zero (and no larger than anything of this trade).
    pub fn positive(&self, key: &str) -> Option<f64> {
        self.number_where(key, "larger than zero and at most 1e12", |x| x > 0.0 && x <= 1e12).map(|n| n.value)
    }

    /// The resistance of a joint or contact: zero, or not so small beside the sheets that nothing is left of theirs in the sums. A fused bond, the
    /// best joint there is, is about ten times the least value.
    pub fn joint(&self, key: &str) -> Option<f64> {
        let expected = "0 (no drop at all), or a number from 1e-5 to 1e12";
        self.number_where(key, expected, |x| x == 0.0 || (1e-5..=1e12).contains(&x)).map(|n| n.value)
    }

    /// A text that is not empty.
    pub fn text(&self, key: &str) -> Option<Placed<String>> {
        let value = self.value(key)?;
        match &value.content {
            Content::Text(text) if !text.trim().is_empty() => Some(Placed { value: text.trim().to_string(), span: value.span.clone() }),
            Content::Text(_) => {
                self.notes.fault(format!("`{key}` is empty"), &value.span, "a text in quotes", "write at least one letter");
                None
            }
            _ => {
                self.wrong(key, value, "a text in quotes");
                None
            }
        }
    }

    /// A text that must be there.
    pub fn required_text(&self, key: &str) -> Option<Placed<String>> {
        self.missing(key, "a text in quotes");
        self.text(key)
    }

    /// A list that is not empty.
    pub fn list(&self, key: &str) -> Option<&'a [Value]> {
        let value = self.value(key)?;
        match &value.content {
            Content::List(values) if !values.is_empty() => Some(values),
            Content::List(_) => {
                self.notes.fault(format!("`{key}` is empty"), &value.span, "at least one entry", "fill the list, or remove the key");
                None
            }
            _ => {
                self.wrong(key, value, "a list in square brackets");
                None
            }
        }
    }

    /// The blocks of one name, in order; `[name]` in place of `[[name]]` is told of.
    pub fn blocks(&self, key: &str) -> &'a [Value] {
        match self.value(key) {
            Some(Value { content: Content::List(values), .. }) => values,
            Some(value) => {
                let message = format!("`{key}` is written once in single brackets");
                self.notes.fault(message, &value.span, format!("`[[{key}]]`"), format!("write `[[{key}]]`, also for a single one"));
                &[]
            }
            None => &[],
        }
    }

    /// A list of entries of `count` numbers each.
    pub fn tuples<const N: usize>(&self, key: &str, form: &str) -> Option<Vec<Placed<[f64; N]>>> {
        let rows = self.list(key)?;
        let read: Vec<_> = rows.iter().map(|row| tuple(row, key, form, self.notes)).collect();
        read.into_iter().collect()
    }

    /// A list of points.
    pub fn points(&self, key: &str) -> Option<Vec<Placed<Point>>> {
        let rows = self.tuples::<2>(key, "[x, y]")?;
        Some(rows.into_iter().map(|Placed { value: [x, y], span }| Placed { value: Point::new(x, y), span }).collect())
    }

    /// A fixed number of numbers.
    pub fn tuple<const N: usize>(&self, key: &str, form: &str) -> Option<Placed<[f64; N]>> {
        tuple(self.value(key)?, key, form, self.notes)
    }
}

/// Tells of something that this version does not know yet.
pub fn not_yet(what: &str, span: &Span, notes: &Notes) {
    notes.fault(format!("{what} is not yet supported"), span, "a sheet without it", "remove it for now");
}

/// A number that is finite.
pub fn finite(value: &Value, name: &str, notes: &Notes) -> Option<f64> {
    match value.content {
        Content::Number(number) if number.is_finite() => Some(number),
        Content::Number(number) => {
            notes.fault(format!("{name} must be a finite number, not {number}"), &value.span, "a finite number", "correct the number");
            None
        }
        _ => {
            let message = format!("{name} must be a number, not {}", value.content.noun());
            notes.fault(message, &value.span, "a number without quotes; its unit is in the key", "write the plain number");
            None
        }
    }
}

/// A list of exactly `N` numbers, each within 1e6.
pub fn tuple<const N: usize>(value: &Value, key: &str, form: &str, notes: &Notes) -> Option<Placed<[f64; N]>> {
    let Content::List(entries) = &value.content else {
        let message = format!("`{key}` holds {} where `{form}` belongs", value.content.noun());
        notes.fault(message, &value.span, form, "put square brackets around the numbers that belong together");
        return None;
    };
    if entries.len() != N {
        let message = format!("`{key}` holds {} values where `{form}` belongs", entries.len());
        notes.fault(message, &value.span, form, format!("give exactly {N} numbers"));
        return None;
    }
    let mut numbers = [0.0; N];
    let mut good = true;
    for (slot, entry) in numbers.iter_mut().zip(entries) {
        match finite(entry, &format!("a number in `{key}`"), notes) {
            Some(number) if number.abs() <= crate::geometry::validity::LARGEST_COORDINATE => *slot = number,
            Some(number) => {
                let message = format!("{number} in `{key}` is out of range");
                notes.fault(message, &entry.span, "at most 1 000 000 mm", "move the drawing towards the origin and check the unit");
                good = false;
            }
            None => good = false,
        }
    }
    good.then(|| Placed { value: numbers, span: value.span.clone() })
}
