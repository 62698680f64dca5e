//! Jobs of the tests in this floor, and what solving them finds.

use super::gauge::DensityField;
use super::hotspot::{self, Survey};
use crate::geometry::{Point, Region, Ring, Vertex};
use crate::index::LayerId;
use crate::physics::{self, Solution};
use crate::problem::*;

pub fn polygon(points: &[(f64, f64)]) -> Ring {
    Ring::polygon(points.iter().map(|&(x, y)| Point::new(x, y)))
}

/// Corners as (x, y, bulge to the next).
pub fn bulged(points: &[(f64, f64, f64)]) -> Ring {
    Ring { vertices: points.iter().map(|&(x, y, bulge)| Vertex { point: Point::new(x, y), bulge }).collect() }
}

pub fn line(points: &[(f64, f64)]) -> Footprint {
    Footprint::Line { points: points.iter().map(|&(x, y)| Point::new(x, y)).collect() }
}

pub fn disc(x: f64, y: f64, diameter: f64) -> Footprint {
    let centre = Point::new(x, y);
    let region = Region::from_rings(&[Ring::circle(centre, diameter)]);
    Footprint::Area { region, area_mm2: std::f64::consts::PI * 0.25 * diameter * diameter, centre, diameter_mm: Some(diameter) }
}

/// Copper of the International Annealed Copper Standard.
pub fn sheet(name: &str, rings: Vec<Ring>, thickness_mm: f64) -> Layer {
    let material =
        Material { name: "copper".into(), resistivity: Resistivity::Linear { at_20: 1.7241e-5, alpha: 0.0 }, density_g_cm3: None };
    let region = Region::from_rings(&rings);
    Layer { name: name.into(), material, resistivity: 1.7241e-5, thickness_mm, rings, region }
}

pub fn electrode(kind: ElectrodeKind, layer: u32, footprint: Footprint, joint_ohm: f64, drive: Drive) -> Electrode {
    let spots = vec![Spot { footprint, joint_ohm }];
    Electrode { name: "e".into(), kind, group: None, through: vec![LayerId(layer)], spots, drive }
}

/// Current in at the first footprint, out at the last.
pub fn terminals(first: Footprint, last: Footprint, last_layer: u32, current: f64) -> Vec<Electrode> {
    vec![
        electrode(ElectrodeKind::Terminal, 0, first, 0.0, Drive::Current(current)),
        electrode(ElectrodeKind::Terminal, last_layer, last, 0.0, Drive::Balance),
    ]
}

pub fn problem(layers: Vec<Layer>, electrodes: Vec<Electrode>, bracket: f64, gauge_mm: f64) -> Problem {
    Problem {
        title: "test".into(),
        temperature_c: 20.0,
        accuracy: Accuracy { bracket, max_vertices: 400_000, gauge_mm: Some(gauge_mm) },
        layers,
        contacts: vec![],
        joins: vec![],
        electrodes,
        sources: vec![],
        measured: vec![],
        probes: vec![],
        crossings: vec![],
        limits: Limits::default(),
    }
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
