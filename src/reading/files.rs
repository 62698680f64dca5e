//! The files of a job, found beside the sheet; each outline is loaded and read once.

use super::drawn::{Budget, DrawnRing, LARGEST_TEXT, faults_of_rings, within};
use super::fields::{Notes, Placed};
use super::outline::read_outline;
use crate::diagnostic::{Fault, SourceText, Span};
use std::cell::RefCell;
use std::collections::BTreeMap;
use std::io::{Error, ErrorKind};
use std::path::{Path, PathBuf};
use std::sync::Arc;

/// Loads a text by its path.
pub type Load<'a> = &'a dyn Fn(&Path) -> std::io::Result<String>;

/// The files around a sheet.
pub struct Files<'a> {
    folder: PathBuf,
    load: Load<'a>,
    notes: &'a Notes,
    seen: RefCell<BTreeMap<PathBuf, Option<Vec<DrawnRing>>>>,
    /// How much has been read so far.
    pub budget: RefCell<Budget>,
}

impl<'a> Files<'a> {
    /// Files relative to the folder of `job`.
    pub fn beside(job: &Path, load: Load<'a>, notes: &'a Notes) -> Self {
        let folder = job.parent().map(Path::to_path_buf).unwrap_or_default();
        Self { folder, load, notes, seen: RefCell::default(), budget: RefCell::default() }
    }

    /// The valid rings of an outline file; `None` when it has faults, which are told once.
    pub fn outline(&self, name: &Placed<String>) -> Option<Vec<DrawnRing>> {
        let path = self.folder.join(&name.value);
        if let Some(rings) = self.seen.borrow().get(&path) {
            return rings.clone();
        }
        let rings = self.read(&path, &name.span);
        self.seen.borrow_mut().insert(path, rings.clone());
        rings
    }

    fn read(&self, path: &Path, asked_at: &Span) -> Option<Vec<DrawnRing>> {
        let source = self.load(path, asked_at)?;
        let mut faults = Vec::new();
        let remarks = &mut *self.notes.remarks.borrow_mut();
        let rings = read_outline(&source, &mut self.budget.borrow_mut(), &mut faults, remarks);
        if faults.is_empty() {
            faults = faults_of_rings(&rings);
        }
        let good = faults.is_empty();
        self.notes.faults.borrow_mut().extend(faults);
        good.then_some(rings)
    }

    /// The text of another file; `None` when it cannot be read, which is told.
    pub fn text(&self, name: &Placed<String>) -> Option<Arc<SourceText>> {
        self.load(&self.folder.join(&name.value), &name.span)
    }

    fn load(&self, path: &Path, asked_at: &Span) -> Option<Arc<SourceText>> {
        let text = self.notes.keep(loaded(self.load, path).map_err(|error| load_fault(path, &error, Some(asked_at.clone()))))?;
        self.notes.keep(within(text.len(), LARGEST_TEXT, "bytes in one file", asked_at))?;
        Some(Arc::new(SourceText { path: path.to_path_buf(), text }))
    }
}

/// The text of a file. A byte-order mark is no part of it, and places count without it.
pub fn loaded(load: Load, path: &Path) -> std::io::Result<String> {
    let text = load(path)?;
    let plain = text.trim_start_matches('\u{feff}');
    Ok(if plain.len() == text.len() { text } else { plain.to_string() })
}

/// A file that could not be loaded, told at the key that asks for it.
pub fn load_fault(path: &Path, error: &Error, span: Option<Span>) -> Fault {
    let (reason, remedy) = match error.kind() {
        ErrorKind::NotFound if span.is_none() => ("there is no such file", "correct the path of the job sheet"),
        ErrorKind::NotFound => ("there is no such file", "correct the path; it is relative to the sheet"),
        ErrorKind::IsADirectory => ("it is a folder", "name a file in it"),
        ErrorKind::Unsupported => ("it is a pipe or a device", "save the text as a file and name that"),
        ErrorKind::InvalidData => ("it is not text in UTF-8", "export it again as plain text (UTF-8)"),
        ErrorKind::PermissionDenied => ("it may not be read", "give yourself the right to read it"),
        _ => ("it cannot be read", "check the path and the disk"),
    };
    let detail = if reason == "it cannot be read" { format!(" ({error})") } else { String::new() };
    Fault {
        message: format!("cannot open {}: {reason}{detail}", path.display()),
        span,
        expected: Some("a readable text file".into()),
        remedy: Some(remedy.into()),
        labels: Vec::new(),
    }
}
