//! From the ids of a problem back to the places in the sheet, so that late faults have a place.

use crate::diagnostic::Span;
use crate::index::{CrossingId, ElectrodeId, JoinId, LayerId, ProbeId};

/// Where what a late fault may name was written.
#[derive(Debug, Clone)]
pub struct Origins {
    pub(super) title: Span,
    pub(super) layers: Vec<Span>,
    pub(super) joins: Vec<Span>,
    pub(super) electrodes: Vec<Span>,
    pub(super) probes: Vec<Span>,
    pub(super) crossings: Vec<Span>,
}

impl Origins {
    /// The title, or the start of the sheet.
    pub fn title(&self) -> &Span {
        &self.title
    }
    /// A layer's name.
    pub fn layer(&self, id: LayerId) -> &Span {
        self.layers.get(id.index()).unwrap_or(&self.title)
    }
    /// A join's block.
    pub fn join(&self, id: JoinId) -> &Span {
        self.joins.get(id.index()).unwrap_or(&self.title)
    }
    /// A terminal's or cell's name; copies of a pattern share it, a cell of a weld list has its first row there, a return end has its block.
    pub fn electrode(&self, id: ElectrodeId) -> &Span {
        self.electrodes.get(id.index()).unwrap_or(&self.title)
    }
    /// A probe's name.
    pub fn probe(&self, id: ProbeId) -> &Span {
        self.probes.get(id.index()).unwrap_or(&self.title)
    }
    /// A crossing's name.
    pub fn crossing(&self, id: CrossingId) -> &Span {
        self.crossings.get(id.index()).unwrap_or(&self.title)
    }
}
