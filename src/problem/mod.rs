//! The checked statement of a job in the units used inside (mm, A, V, ohm): no text, no defaults, no mesh.

pub mod electrode;
pub mod joint;
pub mod material;
pub mod stack;
#[cfg(test)]
pub mod trial;

pub use electrode::{Drive, Electrode, ElectrodeKind, Source, Spot};
pub use joint::{Contact, Footprint, Interface, Join, Measured, MeasuredJoint};
pub use material::{Material, Resistivity};
pub use stack::Layer;

use crate::geometry::Point;
use crate::index::LayerId;

/// One part under one load.
#[derive(Debug, Clone)]
pub struct Problem {
    /// What the job is called.
    pub title: String,
    /// Temperature of the metal in °C.
    pub temperature_c: f64,
    /// How accurately to answer.
    pub accuracy: Accuracy,
    /// The sheets, bottom first. Indexed by [`LayerId`].
    pub layers: Vec<Layer>,
    /// Areas where two sheets lie on each other. Indexed by [`crate::index::ContactId`].
    pub contacts: Vec<Contact>,
    /// Spots, seams and areas that join two sheets. Indexed by [`crate::index::JoinId`].
    pub joins: Vec<Join>,
    /// Terminals and cells' ends in the order of the sheet. Indexed by [`crate::index::ElectrodeId`].
    pub electrodes: Vec<Electrode>,
    /// Cells as voltage sources. Indexed by [`crate::index::SourceId`].
    pub sources: Vec<Source>,
    /// Joints whose resistance is to be fitted to a reading.
    pub measured: Vec<Measured>,
    /// Pairs of meter tips.
    pub probes: Vec<Probe>,
    /// Lines across which current is counted.
    pub crossings: Vec<Crossing>,
    /// What must not be exceeded.
    pub limits: Limits,
}

/// How accurately to answer.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Accuracy {
    /// Stop when (high - low) / low of the loss is at most this (0.001 is 0.1 %).
    pub bracket: f64,
    /// Stop before the mesh has more vertices than this.
    pub max_vertices: usize,
    /// Diameter of the averaging disc in mm; `None`: the larger of 0.5 and the layer's thickness.
    pub gauge_mm: Option<f64>,
}

/// What a four-wire millivolt meter would read: first tip minus second.
#[derive(Debug, Clone)]
pub struct Probe {
    /// Its name.
    pub name: String,
    /// Sheet and centre of the two tips.
    pub tips: [(LayerId, Point); 2],
    /// Diameter of a tip in mm; the reading is the mean potential over the disc clipped to the metal.
    pub tip_mm: f64,
}

/// A line across which current is counted, + from the left of `from -> to` to its right.
#[derive(Debug, Clone)]
pub struct Crossing {
    /// Its name.
    pub name: String,
    /// Start.
    pub from: Point,
    /// End.
    pub to: Point,
}

/// What must not be exceeded; `None` is not checked.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Limits {
    /// Largest difference between any two electrodes, V.
    pub drop_v: Option<f64>,
    /// Gauge peak per layer, A/mm²; as long as `Problem::layers`, or empty.
    pub density_a_mm2: Vec<Option<f64>>,
    /// Largest over mean cell current in a group.
    pub sharing: Option<f64>,
    /// Drop across one spot, V.
    pub joint_v: Option<f64>,
    /// Temperature in °C (judged once heat is solved).
    pub temperature_c: Option<f64>,
}
