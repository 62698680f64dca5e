//! From a solution to the sheet that the picture draws.

use crate::findings::Findings;
use crate::physics::Solution;
use crate::problem::Problem;

/// The heat map as PNG.
///
/// # Errors
/// When it cannot be drawn.
pub fn heat_map(_problem: &Problem, _solution: &Solution, _findings: &Findings) -> Result<Vec<u8>, String> {
    Err("the renderer is not there yet".into())
}
