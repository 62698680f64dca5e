//! `pinchbar check`: read, validate, print the inventory; solve nothing.

use super::{Ending, files, map, terminal};
use crate::reading;
use std::io;
use std::path::PathBuf;

/// Runs the command.
///
/// # Errors
/// When stdout cannot be written.
pub fn run(jobs: &[PathBuf], _json: bool, _quiet: bool) -> io::Result<Ending> {
    let mut ending = Ending::Done;
    for job in jobs {
        match reading::read(job, &files::load) {
            Ok(reading) => terminal::print(&format!("{}: {}\n", job.display(), reading.problem.title))?,
            Err(faults) => ending = map::refused(&faults),
        }
    }
    Ok(ending)
}
