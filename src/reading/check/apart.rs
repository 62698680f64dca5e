//! Electrodes must not overlap or touch on one layer.

use super::layer::Stack;
use crate::diagnostic::Span;
use crate::geometry::predicate::segments_meet;
use crate::geometry::{BoundingBox, Point, SegmentIndex};
use crate::index::LayerId;
use crate::problem::{Electrode, Footprint};
use crate::reading::fields::Notes;
use std::collections::BTreeSet;

/// Tells of every electrode that meets another one; of each one meeting.
pub fn check_apart(electrodes: &[Electrode], places: &[Span], stack: &Stack, notes: &Notes) {
    let mut told = BTreeSet::new();
    for layer in (0..stack.layers.len()).map(LayerId::new) {
        let mut edges = Vec::new();
        let mut owners = Vec::new();
        let mut areas: Vec<(usize, &Footprint)> = Vec::new();
        for (number, electrode) in electrodes.iter().enumerate().filter(|e| e.1.through.contains(&layer)) {
            for spot in &electrode.spots {
                let before = edges.len();
                match &spot.footprint {
                    Footprint::Area { region, .. } => {
                        edges.extend(region.edges());
                        areas.push((number, &spot.footprint));
                    }
                    Footprint::Line { points } => edges.extend(points.windows(2).map(|w| (w[0], w[1]))),
                }
                owners.extend(std::iter::repeat_n(number, edges.len() - before));
            }
        }
        let mut meet = |a: usize, b: usize, at: Point| {
            if told.insert((a.min(b), a.max(b))) {
                let (name, other) = (&electrodes[a.max(b)].name, &electrodes[a.min(b)].name);
                let message = format!("`{name}` and `{other}` overlap or touch on `{}` at ({:.4}, {:.4})", stack.name(layer), at.x, at.y);
                let labels = vec![(places[a.min(b)].clone(), "the other one")];
                let remedy = "move them apart, or make one electrode of both";
                notes.fault_with(message, &places[a.max(b)], "electrodes with a gap between them", remedy, labels);
            }
        };
        let index = SegmentIndex::new(edges);
        let mut last_hit = None;
        for (i, &(a, b)) in index.segments().iter().enumerate() {
            // One meeting per electrode is enough to tell, and keeps a pile of thousands from taking for ever.
            if last_hit == Some(owners[i]) {
                continue;
            }
            let hit = index.near(BoundingBox::around([a, b])).find(|&j| {
                let (c, d) = index.segments()[j];
                owners[j] != owners[i] && segments_meet(a, b, c, d)
            });
            if let Some(j) = hit {
                last_hit = Some(owners[i]);
                meet(owners[i], owners[j], a.midpoint(b));
            }
        }
        // One wholly inside another: its edges meet nothing.
        let boxes = areas.iter().map(|(_, footprint)| match footprint {
            Footprint::Area { region, .. } => (region.bounding_box().min, region.bounding_box().max),
            Footprint::Line { .. } => (Point::default(), Point::default()),
        });
        let boxes = SegmentIndex::new(boxes.collect());
        let mut last = None;
        for (i, &(a, _)) in index.segments().iter().enumerate() {
            if last == Some(owners[i]) {
                continue;
            }
            let holder = boxes.near(BoundingBox { min: a, max: a }).map(|j| areas[j]).find(|(owner, footprint)| {
                *owner != owners[i] && matches!(footprint, Footprint::Area { region, .. } if region.contains(a))
            });
            if let Some((owner, _)) = holder {
                last = Some(owners[i]);
                meet(owners[i], owner, a);
            }
        }
    }
}
