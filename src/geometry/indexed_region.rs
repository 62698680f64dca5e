//! A region with an index over its edges: containment, distance to the rim, overlap and walks along the rim, fast at any size.

use super::overlap::common_area;
use super::{BoundingBox, Point, Region, SegmentIndex};

/// A region that is asked many questions.
#[derive(Debug)]
pub struct IndexedRegion {
    index: SegmentIndex,
    /// Per loop: number of its first edge, and one past its last.
    loops: Vec<(usize, usize)>,
    bounds: BoundingBox,
}

/// A point of the rim.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RimPoint {
    /// Number of the edge among all edges.
    pub edge: usize,
    /// Where.
    pub point: Point,
}

impl IndexedRegion {
    /// Indexes the region's edges.
    pub fn new(region: &Region) -> Self {
        let mut loops = Vec::with_capacity(region.loops.len());
        let mut first = 0;
        for points in &region.loops {
            loops.push((first, first + points.len()));
            first += points.len();
        }
        Self { index: SegmentIndex::new(region.edges().collect()), loops, bounds: region.bounding_box() }
    }

    /// The box around it.
    pub fn bounding_box(&self) -> BoundingBox {
        self.bounds
    }

    /// All edges, loop after loop.
    pub fn edges(&self) -> &[(Point, Point)] {
        self.index.segments()
    }

    /// The index over its edges.
    pub fn index(&self) -> &SegmentIndex {
        &self.index
    }

    /// True when the point is inside, decided exactly (on the rim: either answer).
    pub fn contains(&self, p: Point) -> bool {
        self.bounds.contains(p) && self.index.left_of(p).count() % 2 == 1
    }

    /// The point of the rim nearest to `p`; `None` for an empty region.
    pub fn nearest_rim(&self, p: Point) -> Option<RimPoint> {
        self.index.nearest(p).map(|(edge, point)| RimPoint { edge, point })
    }

    /// Distance from `p` to the rim.
    pub fn rim_distance(&self, p: Point) -> f64 {
        self.nearest_rim(p).map_or(f64::INFINITY, |r| r.point.distance(p))
    }

    /// Which part of the area of `shape` is inside, 0 to 1.
    pub fn part_inside(&self, shape: &Region) -> f64 {
        let window = shape.bounding_box();
        if self.index.near(window).next().is_none() {
            return if self.contains(window.min) { 1.0 } else { 0.0 };
        }
        let edges: Vec<(Point, Point)> = shape.edges().collect();
        // Everything to the left decides what is inside; the far left has no bound.
        let reach = BoundingBox { min: Point::new(f64::MIN, window.min.y), max: window.max };
        let nearby: Vec<(Point, Point)> = self.index.near(reach).map(|i| self.edges()[i]).collect();
        common_area(&[&edges, &nearby], window, f64::INFINITY) / common_area(&[&edges], window, f64::INFINITY)
    }

    /// The loop to which an edge belongs.
    pub fn loop_of(&self, edge: usize) -> usize {
        self.loops.partition_point(|l| l.1 <= edge).min(self.loops.len().saturating_sub(1))
    }

    /// True when the loop bounds a piece from outside, false when it is a hole.
    pub fn is_outer(&self, loop_number: usize) -> bool {
        let (first, last) = self.loops[loop_number];
        let Some(&(start, _)) = self.edges()[first..last].first() else { return true };
        self.index.left_of(start).filter(|&i| i < first || i >= last).count() % 2 == 0
    }

    /// True when the loop, as it is stored, has the region's inside on its left.
    pub fn inside_on_left(&self, loop_number: usize) -> bool {
        let (first, last) = self.loops[loop_number];
        let edges = &self.edges()[first..last];
        let Some(&(start, _)) = edges.first() else { return true };
        let area: f64 = edges.iter().map(|(a, b)| (*a - start).cross(*b - start)).sum();
        (area > 0.0) == self.is_outer(loop_number)
    }

    /// The stretch of a rim with the inside on the left from one rim point to another of the same loop; `None` when they are
    /// on different loops. Equal points give no stretch but the two points.
    pub fn stretch(&self, from: RimPoint, to: RimPoint) -> Option<Vec<Point>> {
        let number = self.loop_of(from.edge);
        if number != self.loop_of(to.edge) {
            return None;
        }
        let (first, last) = self.loops[number];
        let count = last - first;
        let forward = self.inside_on_left(number);
        let edges = self.edges();
        let mut points = vec![from.point];
        let mut edge = from.edge;
        let along = |r: RimPoint| (r.point - edges[r.edge].0).norm();
        let ahead = if forward { along(to) >= along(from) } else { along(to) <= along(from) };
        if from.edge != to.edge || !ahead {
            for _ in 0..count {
                points.push(if forward { edges[edge].1 } else { edges[edge].0 });
                edge = first + (edge - first + if forward { 1 } else { count - 1 }) % count;
                if edge == to.edge {
                    break;
                }
            }
        }
        points.push(to.point);
        points.dedup();
        Some(points)
    }

    /// A whole loop with the inside on the left, its first point repeated at the end.
    pub fn whole_loop(&self, loop_number: usize) -> Vec<Point> {
        let (first, last) = self.loops[loop_number];
        let mut points: Vec<Point> = self.edges()[first..last].iter().map(|e| e.0).collect();
        points.extend(points.first().copied());
        if !self.inside_on_left(loop_number) {
            points.reverse();
        }
        points
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::Ring;

    fn plate_with_hole() -> IndexedRegion {
        let p = Point::new;
        let outer = Ring::polygon([p(0.0, 0.0), p(0.0, 10.0), p(20.0, 10.0), p(20.0, 0.0)]);
        let hole = Ring::polygon([p(8.0, 4.0), p(12.0, 4.0), p(12.0, 6.0), p(8.0, 6.0)]);
        IndexedRegion::new(&Region::from_rings([&outer, &hole]))
    }

    #[test]
    fn walks_keep_the_metal_on_the_left_whatever_the_winding() {
        let plate = plate_with_hole();
        let at = |x, y| plate.nearest_rim(Point::new(x, y)).expect("edges");
        let lower = plate.stretch(at(5.0, 0.0), at(15.0, 0.0)).expect("one loop");
        assert_eq!(lower, vec![Point::new(5.0, 0.0), Point::new(15.0, 0.0)]);
        let round = plate.stretch(at(15.0, 0.0), at(5.0, 0.0)).expect("one loop");
        assert_eq!(round.len(), 6, "the long way passes all four corners: {round:?}");
        let hole = plate.stretch(at(8.0, 5.0), at(12.0, 5.0)).expect("one loop");
        assert_eq!(hole[1], Point::new(8.0, 6.0), "a hole is walked clockwise");
        assert!(plate.stretch(at(8.0, 5.0), at(0.0, 5.0)).is_none());
        assert_eq!(plate.whole_loop(1).len(), 5);
    }

    #[test]
    fn overlap_counts_the_hole() {
        let plate = plate_with_hole();
        let disc = Region::from_rings([&Ring::circle(Point::new(8.0, 5.0), 1.0)]);
        assert!((plate.part_inside(&disc) - 0.5).abs() < 1e-9);
        let inside = Region::from_rings([&Ring::circle(Point::new(15.0, 5.0), 1.0)]);
        assert!((plate.part_inside(&inside) - 1.0).abs() < 1e-9);
        let gone = Region::from_rings([&Ring::circle(Point::new(10.0, 5.0), 1.0)]);
        assert!(plate.part_inside(&gone) < 1e-12);
        assert!(!plate.contains(Point::new(10.0, 5.0)) && plate.contains(Point::new(4.0, 5.0)));
    }
}
