//! `pinchbar check`: read, validate, print the inventory; solve nothing.

use super::late::{self, Stop};
use super::{Ending, files, refused, terminal};
use crate::diagnostic::Fault;
use crate::physics::connections;
use crate::reading::{self, Reading};
use crate::report::inventory::{Inventory, inventory, text};
use crate::report::json::json;
use serde::Serialize;
use std::io;
use std::path::{Path, PathBuf};

/// One job as JSON.
#[derive(Serialize)]
struct Checked {
    job: String,
    valid: bool,
    inventory: Option<Inventory>,
    faults: Vec<Told>,
}

/// One fault as JSON.
#[derive(Serialize)]
struct Told {
    message: String,
    file: Option<String>,
    line: Option<usize>,
    column: Option<usize>,
    expected: Option<String>,
    remedy: Option<String>,
}

/// Runs the command: every job is checked, also after one that has faults. With `json` stdout is one list with an entry for each job.
///
/// # Errors
/// When stdout cannot be written.
pub fn run(jobs: &[PathBuf], as_json: bool, quiet: bool) -> io::Result<Ending> {
    let mut ending = Ending::Done;
    let mut list = Vec::new();
    for (number, job) in jobs.iter().enumerate() {
        let name = job.display().to_string();
        match read(job) {
            Ok(reading) => {
                let found = inventory(&reading.problem, reading.remarks);
                if as_json {
                    list.push(Checked { job: name, valid: true, inventory: Some(found), faults: Vec::new() });
                } else if !quiet {
                    let gap = if number > 0 { "\n" } else { "" };
                    terminal::print(&format!("{gap}{}", text(&found)))?;
                }
            }
            Err(Stop::Failed(ours)) => {
                terminal::say(&format!("{name}: {ours}"));
                return Ok(Ending::Failed);
            }
            Err(Stop::Refused(faults)) => {
                ending = refused(&faults);
                list.push(Checked { job: name, valid: false, inventory: None, faults: faults.iter().map(told).collect() });
            }
        }
    }
    if as_json {
        terminal::print(&json(&list).map_err(io::Error::other)?)?;
    }
    Ok(ending)
}

/// A job without fault, also of the kind that only its mesh shows.
fn read(job: &Path) -> Result<Reading, Stop> {
    let reading = reading::read(job, &files::load).map_err(Stop::Refused)?;
    connections::check(&reading.problem).map_err(|faults| late::stop(&faults, &reading.problem, &reading.origins))?;
    Ok(reading)
}

fn told(fault: &Fault) -> Told {
    let place = fault.span.as_ref().map(|span| (span.source.path.display().to_string(), span.line_column()));
    Told {
        message: fault.message.clone(),
        file: place.as_ref().map(|p| p.0.clone()),
        line: place.as_ref().map(|p| p.1.0),
        column: place.as_ref().map(|p| p.1.1),
        expected: fault.expected.clone(),
        remedy: fault.remedy.clone(),
    }
}
