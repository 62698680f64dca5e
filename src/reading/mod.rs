//! From texts to a checked [`Problem`], or all faults at once: [`read`] is the one door.

mod check;
mod drawn;
mod fields;
mod files;
pub mod hint;
mod origins;
mod outline;
mod sheet;

pub use origins::Origins;

use crate::diagnostic::{Fault, Remark, SourceText, Span};
use crate::problem::Problem;
use drawn::{LARGEST_TEXT, within};
use fields::Notes;
use files::{Files, load_fault, loaded};
use sheet::{Content, Value};
use std::path::Path;
use std::sync::Arc;

/// A job that was read without fault.
#[derive(Debug, Clone)]
pub struct Reading {
    /// The checked statement.
    pub problem: Problem,
    /// Where its parts are written.
    pub origins: Origins,
    /// What was moved, dropped or assumed.
    pub remarks: Vec<Remark>,
}

/// Reads a job sheet and the outlines it names. `load` gives the text of a path; paths in the sheet are relative to the sheet's folder.
///
/// # Errors
/// All faults that could be found, in the order of their places in the sheet, then of each outline.
pub fn read(job: &Path, load: &dyn Fn(&Path) -> std::io::Result<String>) -> Result<Reading, Vec<Fault>> {
    let text = loaded(load, job).map_err(|error| vec![load_fault(job, &error, None)])?;
    let source = Arc::new(SourceText { path: job.to_path_buf(), text });
    let start = Span { source: source.clone(), start: 0, end: 0 };
    within(source.text.len(), LARGEST_TEXT, "bytes in one file", &start).map_err(|fault| vec![fault])?;
    let sheet = sheet::read_sheet(&source)?;

    let notes = Notes::default();
    let files = Files::beside(job, load, &notes);
    files.budget.borrow_mut().spend(count_numbers(&sheet), &start).map_err(|fault| vec![fault])?;
    let checked = check::check(&sheet, job, &files, &notes);
    drop(files);
    let Notes { faults, remarks } = notes;
    let mut faults = faults.into_inner();
    if let (Some((problem, origins)), true) = (checked, faults.is_empty()) {
        return Ok(Reading { problem, origins, remarks: remarks.into_inner() });
    }
    let place = |fault: &Fault| {
        let span = fault.span.as_ref();
        (span.map(|s| s.source.path != job), span.map(|s| s.source.path.clone()), span.map(|s| s.start))
    };
    faults.sort_by_cached_key(place);
    faults.dedup();
    Err(faults)
}

fn count_numbers(value: &Value) -> usize {
    match &value.content {
        Content::Number(_) => 1,
        Content::List(values) => values.iter().map(count_numbers).sum(),
        Content::Block(entries) => entries.iter().map(|e| count_numbers(&e.value)).sum(),
        Content::Text(_) | Content::Other(_) => 0,
    }
}

#[cfg(test)]
mod tests;
