//! `pinchbar start`: a commented job sheet and its outline, to begin from.

use super::{Ending, files, refused, terminal};
use crate::quantity::coordinate;
use crate::report::json::json;
use crate::starting::{Order, Plate, text};
use serde::Serialize;
use std::io;
use std::path::Path;

/// What was written, as JSON.
#[derive(Serialize)]
struct Started {
    written: [String; 2],
    next: String,
}

/// Runs the command: both files are written, or none; files that are there already are left alone.
///
/// # Errors
/// When stdout cannot be written.
pub fn run(folder: &Path, order: &Order, as_json: bool, quiet: bool) -> io::Result<Ending> {
    let plate = match Plate::new(order) {
        Ok(plate) => plate,
        Err(fault) => return Ok(refused(&[fault])),
    };
    let contents = [(text::SHEET, text::sheet(order, &plate)), (text::OUTLINE, text::outline(order, &plate))];
    if let Err(fault) = files::write_new(folder, &contents, "give `start` another folder") {
        return Ok(refused(&[fault]));
    }
    let written = contents.map(|(name, _)| folder.join(name).display().to_string());
    let next = format!("pinchbar map {}", quoted(&written[0]));
    if as_json {
        terminal::print(&json(&Started { written, next }).map_err(io::Error::other)?)?;
    } else if !quiet {
        let [x, y] = plate.size_mm;
        let what = text::described(order);
        let metal = format!("{} {} mm", plate.metal, plate.thickness_mm);
        let current = coordinate(f64::from(plate.cells()) * plate.current_a);
        let size = format!("{} x {} mm and a tab, {metal}, {current} A to the lead", coordinate(x), coordinate(y));
        terminal::print(&format!("{what}\n{size}\n\nwritten  {}\n         {}\nnext     {next}\n", written[0], written[1]))?;
    }
    Ok(Ending::Done)
}

/// A path as a shell takes it.
fn quoted(path: &str) -> String {
    let plain = |c: char| c.is_alphanumeric() || "/\\._-+:~".contains(c);
    if path.chars().all(plain) && !path.starts_with('~') { path.into() } else { format!("'{}'", path.replace('\'', "'\\''")) }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_next_command_can_be_typed_as_shown() {
        assert_eq!(quoted("new/plate.toml"), "new/plate.toml");
        assert_eq!(quoted("my pack/plate.toml"), "'my pack/plate.toml'");
        assert_eq!(quoted("it's/p"), "'it'\\''s/p'");
        assert_eq!(quoted("~x/p"), "'~x/p'");
    }
}
