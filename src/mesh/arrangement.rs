//! The overlay of labelled areas and lines: one planar straight-line graph on a fixed grid, with every move counted.
//!
//! Points are rounded to a grid of 2^-20 mm, so that all decisions are exact integer arithmetic; a drawn point then keeps its own coordinates. A point closer than
//! a small part of the drawing ([`MERGE_PART`]) to another becomes that other; a segment that passes a point closer than that is led through it. This is repeated
//! until no two segments cross and no point lies on a segment (iterated snap rounding; Hobby 1999, with a wider pixel).

use super::MeshFault;
use crate::geometry::{BoundingBox, Point, SegmentIndex};
use std::collections::HashMap;

/// Points closer than this part of the drawing's larger extent, between [`MERGE_LEAST_MM`] and [`MERGE_MOST_MM`], become one; segments that pass
/// closer are led through the point. A shop cannot cut such a step, but a mesh would have to resolve it.
pub const MERGE_PART: f64 = 1e-5;
/// Least merging distance, mm.
pub const MERGE_LEAST_MM: f64 = 1e-5;
/// Largest merging distance, mm.
pub const MERGE_MOST_MM: f64 = 1e-3;
/// Half the largest extent of a drawing.
pub const FARTHEST_MM: f64 = 1e6;

const GRID_PER_MM: f64 = (1u64 << 20) as f64;
const PASSES: usize = 40;

/// What was moved while the shapes were brought together.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Moves {
    /// Points and segments moved by more than the rounding to the grid.
    pub count: usize,
    /// Largest move in mm.
    pub largest_mm: f64,
}

/// A planar straight-line graph: segments meet only in their ends.
#[derive(Debug, Clone)]
pub struct Arrangement {
    /// The points.
    pub points: Vec<Point>,
    /// The segments as pairs of points.
    pub segments: Vec<[u32; 2]>,
    /// Per segment: the areas whose boundary runs along it (an odd number of times), rising.
    pub areas: Vec<Vec<u32>>,
    /// Per segment: the lines that run along it, rising.
    pub lines: Vec<Vec<u32>>,
    /// What was moved.
    pub moves: Moves,
}

/// Overlays areas (even-odd loops) and lines (polylines).
///
/// # Errors
/// [`MeshFault::TooFar`] for coordinates that are not finite or too far out, [`MeshFault::Unsettled`] when snapping does not come to rest.
pub fn arrange(areas: &[&[Vec<Point>]], lines: &[&[Point]]) -> Result<Arrangement, MeshFault> {
    let all = areas.iter().flat_map(|loops| loops.iter().flatten()).chain(lines.iter().copied().flatten());
    if all.clone().any(|p| !(p.x.is_finite() && p.y.is_finite())) {
        return Err(MeshFault::TooFar);
    }
    let extent = BoundingBox::around(all.copied());
    let middle = if extent.is_empty() { Point::default() } else { extent.min.midpoint(extent.max) };
    // A round origin keeps grid positions the same for drawings that differ by whole millimetres.
    let origin = Point::new(middle.x.round(), middle.y.round());
    if extent.width().max(extent.height()) > 2.0 * FARTHEST_MM || origin.norm() > 1e9 {
        return Err(MeshFault::TooFar);
    }
    let merge = (MERGE_PART * extent.width().max(extent.height())).clamp(MERGE_LEAST_MM, MERGE_MOST_MM);
    let mut work = Work { origin, merge: (merge * GRID_PER_MM) as i64, ..Work::default() };
    let mut owners = Vec::new();
    for (label, loops) in areas.iter().enumerate() {
        for points in loops.iter() {
            let nodes: Vec<u32> = points.iter().map(|&p| work.drawn(p)).collect();
            for i in 0..nodes.len() {
                owners.push((work.segment(nodes[i], nodes[(i + 1) % nodes.len()]), label as u32, true));
            }
        }
    }
    for (label, points) in lines.iter().enumerate() {
        let nodes: Vec<u32> = points.iter().map(|&p| work.drawn(p)).collect();
        for pair in nodes.windows(2) {
            owners.push((work.segment(pair[0], pair[1]), label as u32, false));
        }
    }
    work.settle()?;
    Ok(work.finish(owners))
}

type Node = (i64, i64);

/// A segment, and the chain that replaces it once it has been split.
struct Segment {
    ends: [u32; 2],
    chain: Vec<u32>,
}

#[derive(Default)]
struct Work {
    origin: Point,
    /// Merging distance, grid steps.
    merge: i64,
    nodes: Vec<Node>,
    /// Where each node lies without the rounding to the grid.
    exact: Vec<Point>,
    /// Nodes by squares of the merging distance.
    near: HashMap<Node, Vec<u32>>,
    segments: Vec<Segment>,
    by_ends: HashMap<[u32; 2], u32>,
    moves: Moves,
}

/// Twice the signed area of a, b, c: exact.
fn turn(a: Node, b: Node, c: Node) -> i128 {
    i128::from(b.0 - a.0) * i128::from(c.1 - a.1) - i128::from(b.1 - a.1) * i128::from(c.0 - a.0)
}

fn distance(a: Node, b: Node) -> f64 {
    ((a.0 - b.0) as f64).hypot((a.1 - b.1) as f64)
}

impl Work {
    fn on_grid(&self, p: Point) -> Node {
        let local = (p - self.origin) * GRID_PER_MM;
        (local.x.round() as i64, local.y.round() as i64)
    }

    fn position(&self, node: Node) -> Point {
        Point::new(node.0 as f64, node.1 as f64) * (1.0 / GRID_PER_MM)
    }

    fn count_move(&mut self, by: f64) {
        // One grid step is rounding, not a move.
        if by > 2.0 {
            self.moves.count += 1;
            self.moves.largest_mm = self.moves.largest_mm.max(by / GRID_PER_MM);
        }
    }

    /// The node of a drawn point. A new one keeps the point's own coordinates: all others are further away than the rounding by far.
    fn drawn(&mut self, p: Point) -> u32 {
        let known = self.nodes.len();
        let n = self.node(self.on_grid(p));
        if n as usize == known {
            self.exact[known] = p;
        }
        n
    }

    /// The nearest node within the merging distance, or a new one.
    fn node(&mut self, p: Node) -> u32 {
        let square = |p: Node| (p.0.div_euclid(self.merge), p.1.div_euclid(self.merge));
        let (sx, sy) = square(p);
        let mut best: Option<(f64, u32)> = None;
        for dx in -1..=1 {
            for dy in -1..=1 {
                for &n in self.near.get(&(sx + dx, sy + dy)).into_iter().flatten() {
                    let d = distance(p, self.nodes[n as usize]);
                    if d <= self.merge as f64 && best.is_none_or(|(b, m)| (d, n) < (b, m)) {
                        best = Some((d, n));
                    }
                }
            }
        }
        if let Some((d, n)) = best {
            self.count_move(d);
            return n;
        }
        let n = self.nodes.len() as u32;
        self.nodes.push(p);
        self.exact.push(self.position(p) + self.origin);
        self.near.entry((sx, sy)).or_default().push(n);
        n
    }

    /// The segment between two nodes; `None` when they are one.
    fn segment(&mut self, a: u32, b: u32) -> Option<u32> {
        if a == b {
            return None;
        }
        let ends = [a.min(b), a.max(b)];
        let segments = &mut self.segments;
        Some(*self.by_ends.entry(ends).or_insert_with(|| {
            segments.push(Segment { ends, chain: Vec::new() });
            segments.len() as u32 - 1
        }))
    }

    fn ends(&self, segment: u32) -> [Node; 2] {
        self.segments[segment as usize].ends.map(|n| self.nodes[n as usize])
    }

    fn segment_at(&self, segment: u32) -> (Point, Point) {
        let [a, b] = self.ends(segment).map(|n| self.position(n));
        (a, b)
    }

    /// How far along a segment a node lies (0 to 1) and how far from it, when it is within the merging distance and not an end.
    fn beside(&self, segment: u32, node: u32) -> Option<(f64, f64)> {
        if self.segments[segment as usize].ends.contains(&node) {
            return None;
        }
        let [a, b] = self.ends(segment);
        let p = self.nodes[node as usize];
        let length = distance(a, b);
        let along =
            (i128::from(b.0 - a.0) * i128::from(p.0 - a.0) + i128::from(b.1 - a.1) * i128::from(p.1 - a.1)) as f64 / (length * length);
        if !(0.0..=1.0).contains(&along) {
            return None;
        }
        let off = turn(a, b, p).unsigned_abs() as f64 / length;
        (off <= self.merge as f64).then_some((along, off))
    }

    /// Where two segments cross in their insides, rounded to the grid.
    fn crossing(&self, s: u32, t: u32) -> Option<Node> {
        let ([a, b], [c, d]) = (self.ends(s), self.ends(t));
        let (ta, tb) = (turn(c, d, a), turn(c, d, b));
        let (tc, td) = (turn(a, b, c), turn(a, b, d));
        if ta.signum() * tb.signum() >= 0 || tc.signum() * td.signum() >= 0 {
            return None;
        }
        let part = ta as f64 / (ta as f64 - tb as f64);
        let x = a.0 as f64 + part * (b.0 - a.0) as f64;
        let y = a.1 as f64 + part * (b.1 - a.1) as f64;
        Some((x.round() as i64, y.round() as i64))
    }

    fn settle(&mut self) -> Result<(), MeshFault> {
        let margin = 2.0 * self.merge as f64 / GRID_PER_MM;
        let margin = Point::new(margin, margin);
        let mut fresh_nodes = 0;
        let mut fresh_segments = 0;
        for _ in 0..PASSES {
            let leaves: Vec<u32> = (0..self.segments.len() as u32).filter(|&s| self.segments[s as usize].chain.is_empty()).collect();
            let index = SegmentIndex::new(leaves.iter().map(|&s| self.segment_at(s)).collect());
            let node_index =
                (fresh_nodes > 0).then(|| SegmentIndex::new(self.nodes.iter().map(|&n| (self.position(n), self.position(n))).collect()));
            let mut splits: Vec<(u32, f64, u32, f64)> = Vec::new();
            for n in fresh_nodes..self.nodes.len() {
                let p = self.position(self.nodes[n]);
                for i in index.near(BoundingBox { min: p - margin, max: p + margin }) {
                    let s = leaves[i];
                    if let Some((along, off)) = self.beside(s, n as u32) {
                        splits.push((s, along, n as u32, off));
                    }
                }
            }
            let mut crossings: Vec<(u32, u32, Node)> = Vec::new();
            for &s in leaves.iter().filter(|&&s| s as usize >= fresh_segments) {
                let (from, to) = self.segment_at(s);
                let b = BoundingBox::around([from, to]);
                for i in index.near(b) {
                    let t = leaves[i];
                    // A pair of two fresh segments is met twice; it is taken once.
                    if t != s
                        && (t < s || (t as usize) < fresh_segments)
                        && let Some(p) = self.crossing(s, t)
                    {
                        crossings.push((t.min(s), t.max(s), p));
                    }
                }
                for n in node_index.iter().flat_map(|x| x.near(BoundingBox { min: b.min - margin, max: b.max + margin })) {
                    if let Some((along, off)) = self.beside(s, n as u32) {
                        splits.push((s, along, n as u32, off));
                    }
                }
            }
            // The index answers in no stated order; sorted, the outcome depends on the input alone.
            crossings.sort_unstable();
            crossings.dedup();
            fresh_nodes = self.nodes.len();
            fresh_segments = self.segments.len();
            for (s, t, p) in crossings {
                let n = self.node(p);
                for segment in [s, t] {
                    if !self.segments[segment as usize].ends.contains(&n) {
                        let [a, b] = self.ends(segment);
                        let q = self.nodes[n as usize];
                        let (dx, dy) = ((b.0 - a.0) as f64, (b.1 - a.1) as f64);
                        let along = ((q.0 - a.0) as f64 * dx + (q.1 - a.1) as f64 * dy) / (dx * dx + dy * dy);
                        splits.push((segment, along, n, 0.0));
                    }
                }
            }
            if splits.is_empty() {
                return Ok(());
            }
            splits.sort_by(|x, y| (x.0, x.1, x.2).partial_cmp(&(y.0, y.1, y.2)).unwrap_or(std::cmp::Ordering::Equal));
            splits.dedup_by(|x, y| x.0 == y.0 && x.2 == y.2);
            for group in splits.chunk_by(|x, y| x.0 == y.0) {
                let s = group[0].0 as usize;
                let [from, to] = self.segments[s].ends;
                let mut chain = vec![from];
                for &(_, _, n, off) in group {
                    self.count_move(off);
                    chain.push(n);
                }
                chain.push(to);
                for pair in chain.windows(2) {
                    self.segment(pair[0], pair[1]);
                }
                self.segments[s].chain = chain;
            }
        }
        Err(MeshFault::Unsettled)
    }

    /// The unsplit segments that a segment has become.
    fn leaves_of(&self, segment: u32, into: &mut Vec<u32>) {
        let mut stack = vec![segment];
        while let Some(s) = stack.pop() {
            let chain = &self.segments[s as usize].chain;
            if chain.is_empty() {
                into.push(s);
            }
            for pair in chain.windows(2) {
                let ends = [pair[0].min(pair[1]), pair[0].max(pair[1])];
                stack.extend(self.by_ends.get(&ends));
            }
        }
    }

    fn finish(self, owners: Vec<(Option<u32>, u32, bool)>) -> Arrangement {
        let mut place = vec![u32::MAX; self.segments.len()];
        let mut segments = Vec::new();
        for (s, segment) in self.segments.iter().enumerate() {
            if segment.chain.is_empty() {
                place[s] = segments.len() as u32;
                segments.push(segment.ends);
            }
        }
        let mut areas = vec![Vec::new(); segments.len()];
        let mut lines = vec![Vec::new(); segments.len()];
        let mut leaves = Vec::new();
        for (segment, label, is_area) in owners {
            leaves.clear();
            if let Some(segment) = segment {
                self.leaves_of(segment, &mut leaves);
            }
            for &leaf in &leaves {
                let set: &mut Vec<u32> =
                    if is_area { &mut areas[place[leaf as usize] as usize] } else { &mut lines[place[leaf as usize] as usize] };
                // Owners come in rising order, so the label can only be the last one.
                match set.last() {
                    Some(&last) if last == label => {
                        if is_area {
                            set.pop();
                        }
                    }
                    _ => set.push(label),
                }
            }
        }
        // A segment that bounds nothing any more (the two sides of a closed slit) is dropped.
        let kept: Vec<usize> = (0..segments.len()).filter(|&s| !areas[s].is_empty() || !lines[s].is_empty()).collect();
        Arrangement {
            points: self.exact,
            segments: kept.iter().map(|&s| segments[s]).collect(),
            areas: kept.iter().map(|&s| std::mem::take(&mut areas[s])).collect(),
            lines: kept.iter().map(|&s| std::mem::take(&mut lines[s])).collect(),
            moves: self.moves,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn square(x: f64, y: f64, side: f64) -> Vec<Vec<Point>> {
        vec![[(0.0, 0.0), (1.0, 0.0), (1.0, 1.0), (0.0, 1.0)].map(|(u, v)| Point::new(x + u * side, y + v * side)).to_vec()]
    }

    #[test]
    fn crossing_squares_meet_in_two_new_points() {
        let (a, b) = (square(0.0, 0.0, 2.0), square(1.0, 1.0, 2.0));
        let result = arrange(&[&a, &b], &[]).unwrap();
        assert_eq!((result.points.len(), result.segments.len()), (10, 12));
        assert_eq!(result.moves, Moves::default());
    }

    #[test]
    fn a_shared_edge_is_one_segment_and_a_near_one_is_snapped_and_counted() {
        let (a, b, c) = (square(0.0, 0.0, 2.0), square(2.0, 0.0, 2.0), square(4.00005, 0.0, 2.0));
        let result = arrange(&[&a, &b, &c], &[]).unwrap();
        assert_eq!((result.points.len(), result.segments.len()), (8, 10));
        assert_eq!(result.moves.count, 2);
        assert!((result.moves.largest_mm - 5e-5).abs() < 2e-6);
        assert!(result.areas.contains(&vec![0, 1]));
    }

    #[test]
    fn a_turned_line_across_a_turned_plate_stays_on_its_edge() {
        let turned = |x: f64, y: f64| Point::new(0.8 * x - 0.6 * y, 0.6 * x + 0.8 * y) + Point::new(1e5, -3e4);
        let plate = vec![vec![turned(0.0, 0.0), turned(30.0, 0.0), turned(30.0, 10.0), turned(0.0, 10.0)]];
        let line = [turned(7.1, 10.0), turned(13.3, 10.0)];
        let result = arrange(&[&plate], &[&line]).unwrap();
        assert_eq!((result.points.len(), result.segments.len()), (6, 6));
        assert_eq!(result.lines.iter().filter(|l| !l.is_empty()).count(), 1);
        assert_eq!(result.moves, Moves::default());
    }

    #[test]
    fn a_slit_without_width_vanishes() {
        let p = Point::new;
        let loops = vec![vec![p(0.0, 0.0), p(4.0, 0.0), p(4.0, 4.0), p(2.0, 4.0), p(2.0, 2.0), p(2.00001, 4.0), p(0.0, 4.0)]];
        let result = arrange(&[&loops], &[]).unwrap();
        assert_eq!(result.segments.len(), 5);
    }

    #[test]
    fn a_far_or_endless_coordinate_is_refused() {
        let far = square(0.0, 0.0, 3e6);
        assert_eq!(arrange(&[&far], &[]).unwrap_err(), MeshFault::TooFar);
        let endless = square(f64::NAN, 0.0, 1.0);
        assert_eq!(arrange(&[&endless], &[]).unwrap_err(), MeshFault::TooFar);
    }
}
