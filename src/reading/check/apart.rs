//! Electrodes must not overlap or touch on one layer.

use super::layer::Stack;
use crate::diagnostic::Span;
use crate::geometry::predicate::{meeting_point, segments_meet};
use crate::geometry::{BoundingBox, Point, SegmentIndex};
use crate::index::LayerId;
use crate::problem::{Electrode, Footprint};
use crate::reading::fields::Notes;
use std::collections::BTreeSet;

/// From this number of edges on a footprint gets an index of its own.
const MANY: usize = 128;

/// A footprint with what the comparison needs.
struct Patch {
    owner: usize,
    bounds: BoundingBox,
    edges: Vec<(Point, Point)>,
    index: Option<SegmentIndex>,
    is_area: bool,
}

/// Tells of every electrode that meets an earlier one on a layer; of each one meeting, so that a pile of thousands ends soon.
pub fn check_apart(electrodes: &[Electrode], places: &[Span], stack: &Stack, notes: &Notes) {
    let mut told = BTreeSet::new();
    for layer in (0..stack.layers.len()).map(LayerId::new) {
        let on_layer = electrodes.iter().enumerate().filter(|e| e.1.through.contains(&layer));
        let patches: Vec<Patch> = on_layer.flat_map(|(owner, e)| e.spots.iter().map(move |s| Patch::new(owner, &s.footprint))).collect();
        let boxes = SegmentIndex::new(patches.iter().map(|p| (p.bounds.min, p.bounds.max)).collect());
        let mut hit_owner = None;
        for patch in &patches {
            if hit_owner == Some(patch.owner) {
                continue;
            }
            let earlier = boxes.near(patch.bounds).map(|j| &patches[j]).filter(|other| other.owner < patch.owner);
            let Some((other, at)) = earlier.filter_map(|other| Some((other.owner, patch.meets(other)?))).next() else { continue };
            hit_owner = Some(patch.owner);
            if told.insert((other, patch.owner)) {
                let (name, other_name) = (&electrodes[patch.owner].name, &electrodes[other].name);
                let message =
                    format!("`{name}` and `{other_name}` overlap or touch on `{}` at ({:.4}, {:.4})", stack.name(layer), at.x, at.y);
                let labels = vec![(places[other].clone(), "the other one")];
                let remedy = "move them apart, or make one electrode of both";
                notes.fault_with(message, &places[patch.owner], "electrodes with a gap between them", remedy, labels);
            }
        }
    }
}

impl Patch {
    fn new(owner: usize, footprint: &Footprint) -> Self {
        let edges: Vec<(Point, Point)> = match footprint {
            Footprint::Area { region, .. } => region.edges().collect(),
            Footprint::Line { points } => points.windows(2).map(|w| (w[0], w[1])).collect(),
        };
        let bounds = BoundingBox::around(edges.iter().flat_map(|e| [e.0, e.1]));
        let index = (edges.len() > MANY).then(|| SegmentIndex::new(edges.clone()));
        Self { owner, bounds, edges, index, is_area: matches!(footprint, Footprint::Area { .. }) }
    }

    /// A point that both have.
    fn meets(&self, other: &Self) -> Option<Point> {
        let (small, large) = if self.edges.len() <= other.edges.len() { (self, other) } else { (other, self) };
        let crossing = |&(a, b): &(Point, Point), &(c, d): &(Point, Point)| segments_meet(a, b, c, d).then(|| meeting_point(a, b, c, d));
        let met = match &large.index {
            Some(index) => index.near(small.bounds).next().and_then(|_| {
                let near = |e: &(Point, Point)| index.near(BoundingBox::around([e.0, e.1]));
                small.edges.iter().find_map(|e| near(e).find_map(|i| crossing(e, &index.segments()[i])))
            }),
            None => large.edges.iter().find_map(|e| small.edges.iter().find_map(|f| crossing(e, f))),
        };
        // One wholly inside the other: their edges meet nowhere.
        met.or_else(|| large.holds_start_of(small)).or_else(|| small.holds_start_of(large))
    }

    fn holds_start_of(&self, other: &Self) -> Option<Point> {
        let start = other.edges.first()?.0;
        if !self.is_area || !self.bounds.contains(start) {
            return None;
        }
        let right = |e: &&(Point, Point)| {
            let (a, b) = **e;
            (a.y > start.y) != (b.y > start.y) && start.x < a.x + (start.y - a.y) / (b.y - a.y) * (b.x - a.x)
        };
        let count = self.index.as_ref().map_or_else(|| self.edges.iter().filter(right).count(), |index| index.left_of(start).count());
        (count % 2 == 1).then_some(start)
    }
}
