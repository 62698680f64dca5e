//! Hand-built problems for the tests of this floor and those below.

use super::*;
use crate::geometry::{Region, Ring, Vertex};

/// Corners as (x, y).
pub fn polygon(points: &[(f64, f64)]) -> Ring {
    Ring::polygon(points.iter().map(|&(x, y)| Point::new(x, y)))
}

/// Corners as (x, y, bulge to the next).
pub fn bulged(points: &[(f64, f64, f64)]) -> Ring {
    Ring { vertices: points.iter().map(|&(x, y, bulge)| Vertex { point: Point::new(x, y), bulge }).collect() }
}

/// A line through these points.
pub fn line(points: &[(f64, f64)]) -> Footprint {
    Footprint::Line { points: points.iter().map(|&(x, y)| Point::new(x, y)).collect() }
}

/// A round spot.
pub fn disc(x: f64, y: f64, diameter: f64) -> Footprint {
    let centre = Point::new(x, y);
    let region = Region::from_rings(&[Ring::circle(centre, diameter)]);
    Footprint::Area { region, area_mm2: std::f64::consts::PI * 0.25 * diameter * diameter, centre, diameter_mm: Some(diameter) }
}

/// An electrode with one place, on one sheet.
pub fn electrode(kind: ElectrodeKind, layer: u32, footprint: Footprint, joint_ohm: f64, drive: Drive) -> Electrode {
    let spots = vec![Spot { footprint, joint_ohm }];
    Electrode { name: "e".into(), kind, group: None, through: vec![LayerId(layer)], spots, drive }
}

/// Nothing but sheets and electrodes; contacts and the rest are added by who needs them.
pub fn problem(layers: Vec<Layer>, electrodes: Vec<Electrode>, bracket: f64, gauge_mm: Option<f64>) -> Problem {
    Problem {
        title: "test".into(),
        temperature_c: 20.0,
        accuracy: Accuracy { bracket, max_vertices: 400_000, gauge_mm },
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
