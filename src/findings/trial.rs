//! Jobs of the tests in this floor, and what solving them finds.

use super::gauge::DensityField;
use super::hotspot::{self, Survey};
use crate::geometry::{Region, Ring};
use crate::physics::{self, Solution};
pub use crate::problem::trial::{bulged, disc, electrode, line, polygon};
use crate::problem::*;

/// Copper of the International Annealed Copper Standard.
pub fn sheet(name: &str, rings: Vec<Ring>, thickness_mm: f64) -> Layer {
    let material =
        Material { name: "copper".into(), resistivity: Resistivity::Linear { at_20: 1.7241e-5, alpha: 0.0 }, density_g_cm3: None };
    let region = Region::from_rings(&rings);
    Layer { name: name.into(), material, resistivity: 1.7241e-5, thickness_mm, rings, region }
}

/// Current in at the first footprint, out at the last.
pub fn terminals(first: Footprint, last: Footprint, last_layer: u32, current: f64) -> Vec<Electrode> {
    vec![
        electrode(ElectrodeKind::Terminal, 0, first, 0.0, Drive::Current(current)),
        electrode(ElectrodeKind::Terminal, last_layer, last, 0.0, Drive::Balance),
    ]
}

/// As [`trial::problem`], with a gauge of this diameter.
pub fn problem(layers: Vec<Layer>, electrodes: Vec<Electrode>, bracket: f64, gauge_mm: f64) -> Problem {
    trial::problem(layers, electrodes, bracket, Some(gauge_mm))
}

/// Solved, and sharpened until all discs are resolved.
pub fn surveyed(problem: &Problem) -> (Solution, DensityField, Survey) {
    let mut solution = physics::run(problem).unwrap();
    for _ in 0..8 {
        let density = DensityField::new(problem, &solution);
        let survey = hotspot::survey(problem, &solution, &density);
        if survey.unresolved.is_empty() {
            return (solution, density, survey);
        }
        solution = physics::sharpened(problem, solution, &survey.unresolved).unwrap();
    }
    panic!("discs stay unresolved");
}
