//! The solved problem, and what can go wrong on the way.

use super::network::Interval;
use super::plan::Mark;
use crate::fem::{Complex, Equilibrated, Field};
use crate::geometry::Point;
use crate::index::{ElectrodeId, LayerId};
use crate::mesh::{Mesh, MeshFault, Moves};
use std::collections::BTreeMap;
use std::fmt;

/// A solved problem.
#[derive(Debug, Clone)]
pub struct Solution {
    /// The last mesh.
    pub mesh: Mesh,
    /// Its leaves. Poles are electrodes; layer bits are layer numbers.
    pub complex: Complex,
    /// Discrete potential of the whole drive, V, against the job's zero.
    pub potential: Field,
    /// Equilibrated sheet current, A per edge.
    pub flux: Equilibrated,
    /// Loss in metal and joints.
    pub loss: Interval,
    /// Port resistance, for two electrodes.
    pub resistance: Option<Interval>,
    /// Per electrode.
    pub electrodes: Vec<ElectrodeSolution>,
    /// Per probe: its reading in V.
    pub probes: Vec<Interval>,
    /// What passes every exchange and held patch, by mark.
    pub passed: BTreeMap<Mark, Passed>,
    /// Per layer: loss in the metal, W.
    pub layer_loss: Vec<f64>,
    /// How it went.
    pub run: RunRecord,
}

/// One electrode.
#[derive(Debug, Clone, PartialEq)]
pub struct ElectrodeSolution {
    /// Current into the bar, A, as solved.
    pub current: f64,
    /// Where the true one lies.
    pub current_range: Interval,
    /// Where its potential lies, V.
    pub voltage: Interval,
}

/// What passes through an exchange or into a held patch.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Passed {
    /// Net current, + from the first end into the second (for electrodes: into the bar).
    pub current: f64,
    /// Sum of magnitudes.
    pub exchanged: f64,
    /// Loss in the interface.
    pub loss: f64,
    /// Area (mm²) or length (mm) found on the metal.
    pub extent: f64,
    /// Integral of the potential difference over that extent.
    pub difference: f64,
}

/// How the solving went.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct RunRecord {
    /// Rounds of refinement.
    pub rounds: Vec<Round>,
    /// Unknown potentials of the last round.
    pub unknowns: usize,
    /// True when the loss and every voltage are enclosed as tightly as asked.
    pub reached: bool,
    /// Largest half-width of a reported voltage over the largest difference between electrodes.
    pub voltage_spread: f64,
    /// What was snapped.
    pub moves: Moves,
    /// False when some angles of the first mesh stayed poor for want of vertices.
    pub angles_reached: bool,
    /// Largest residual of a solve relative to its right-hand side.
    pub residual: f64,
}

/// One round.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Round {
    /// Vertices of its mesh.
    pub vertices: usize,
    /// Triangles of its mesh.
    pub triangles: usize,
    /// (upper - lower) / lower bound of the loss at the currents of that round.
    pub gap: f64,
}

/// What only the mesh or the numbers can show to be wrong.
#[derive(Debug, Clone, PartialEq)]
pub enum Fault {
    /// More layers than can be stacked.
    TooManyLayers(usize),
    /// More electrodes and tips than can be solved together.
    TooManyPorts(usize),
    /// Two electrodes hold or touch one place.
    ElectrodesMeet([ElectrodeId; 2]),
    /// Metal that no electrode reaches.
    Loose {
        /// On this layer.
        layer: LayerId,
        /// A point on it.
        at: Point,
    },
    /// Given currents that do not add up to zero on a connected piece.
    Unbalanced {
        /// The electrodes on that piece.
        electrodes: Vec<ElectrodeId>,
        /// Their sum in A.
        sum: f64,
    },
    /// Two electrodes that take the balance, or one beside electrodes whose current is not given.
    BalanceUnclear(Vec<ElectrodeId>),
    /// A meter's tip that finds no metal, or metal of two pieces.
    TipOff {
        /// Which probe.
        probe: usize,
        /// Which of its tips.
        tip: usize,
    },
    /// A crossing of which a stretch lies inside a held patch.
    CrossingHeld {
        /// Which crossing.
        crossing: usize,
        /// A point in the patch.
        at: Point,
    },
    /// Joints given as measured have not been fitted yet: [`crate::physics::fit()`] does that.
    Unfitted,
    /// A joint given as measured through which no current passes (by its place in the problem's list).
    MeasuredIdle(usize),
    /// A joint that reads more than measured though its spots have no resistance left.
    MeasuredLow {
        /// Its place in the problem's list.
        measured: usize,
        /// What is read without any, ohm.
        least_ohm: f64,
    },
    /// An electrode's spot found no metal.
    SpotOff(ElectrodeId),
    /// The mesh could not be made.
    Mesh(MeshFault),
    /// The numbers failed: the system could not be solved.
    Numerical(String),
}

impl fmt::Display for Fault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::TooManyLayers(n) => write!(f, "{n} layers; at most {} can be stacked", super::plan::MOST_LAYERS),
            Self::TooManyPorts(n) => {
                write!(f, "{n} electrodes and meter tips; at most {} can be solved together", super::pieces::MOST_PORTS)
            }
            Self::ElectrodesMeet(_) => write!(f, "two electrodes overlap or touch"),
            Self::Loose { at, .. } => write!(f, "the metal at ({}, {}) is connected to no electrode", at.x, at.y),
            Self::Unbalanced { sum, .. } => write!(f, "the currents on one connected piece add up to {sum} A, not to zero"),
            Self::BalanceUnclear(_) => write!(f, "which electrode takes the balance is not clear"),
            Self::TipOff { tip, .. } => write!(f, "tip {} of the probe does not stand on one piece of metal", tip + 1),
            Self::CrossingHeld { at, .. } => {
                write!(f, "the crossing runs inside a solid patch at ({}, {}): no current is defined there", at.x, at.y)
            }
            Self::Unfitted => write!(f, "joints given as measured have not been fitted yet"),
            Self::MeasuredIdle(_) => write!(f, "no current passes the joint that was measured"),
            Self::MeasuredLow { least_ohm, .. } => {
                write!(f, "the sheets alone give a reading of {:.6} mohm between these tips, more than was measured", 1e3 * least_ohm)
            }
            Self::SpotOff(_) => write!(f, "the electrode touches no metal"),
            Self::Mesh(fault) => write!(f, "{fault}"),
            Self::Numerical(text) => write!(f, "the system could not be solved: {text}"),
        }
    }
}
