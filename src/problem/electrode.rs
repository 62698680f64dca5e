//! Terminals and cells' ends: where current enters or leaves, and what drives it.

use super::Footprint;
use crate::index::{ElectrodeId, LayerId, SourceId};

/// One electrode: a set of spots that share one outer potential.
#[derive(Debug, Clone)]
pub struct Electrode {
    /// Its name.
    pub name: String,
    /// Terminal or cell.
    pub kind: ElectrodeKind,
    /// Group within which shares are counted; `None` for terminals.
    pub group: Option<String>,
    /// The sheets a spot passes on its way to the outside; the last one touches the can or the lug. A terminal has one.
    pub through: Vec<LayerId>,
    /// Where it is attached.
    pub spots: Vec<Spot>,
    /// What drives it.
    pub drive: Drive,
}

/// One place where an electrode is attached.
#[derive(Debug, Clone, PartialEq)]
pub struct Spot {
    /// What it covers.
    pub footprint: Footprint,
    /// Resistance of this spot in ohm, interface only; 0 is solid: one potential over the patch.
    pub joint_ohm: f64,
}

/// Terminal or cell.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ElectrodeKind {
    /// Lug, clamped edge, soldered wire.
    Terminal,
    /// A cell's end.
    Cell,
}

/// What drives an electrode.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Drive {
    /// A known current in A, + from outside into the bar.
    Current(f64),
    /// The current that is left over; at most one electrode of a connected piece, every other one there has a known current.
    Balance,
    /// A known potential in V.
    Held(f64),
    /// The positive end of a source: its current enters here.
    Source(SourceId),
    /// The return end of a source: its current leaves here.
    Return(SourceId),
}

/// A cell as a voltage source: V(positive) - V(return) = emf - resistance * current.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Source {
    /// Open-circuit voltage, V.
    pub emf_v: f64,
    /// Internal resistance, ohm; > 0.
    pub resistance_ohm: f64,
    /// The end whose [`Drive`] is `Source`.
    pub positive: ElectrodeId,
    /// The other end; `None`: a common zero.
    pub negative: Option<ElectrodeId>,
}
