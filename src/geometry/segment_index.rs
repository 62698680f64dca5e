//! A box index over segments for crossing, nearest and ray queries; it does not know what the segments mean.

use super::{BoundingBox, Point, predicate};
use rstar::primitives::{GeomWithData, Line};
use rstar::{AABB, RTree};

/// Segments that can be asked for by place. Answers are numbers into the list it was made from.
#[derive(Debug)]
pub struct SegmentIndex {
    segments: Vec<(Point, Point)>,
    tree: RTree<GeomWithData<Line<[f64; 2]>, u32>>,
}

impl SegmentIndex {
    /// An index over these segments.
    pub fn new(segments: Vec<(Point, Point)>) -> Self {
        let entries = segments.iter().enumerate();
        let entries = entries.map(|(i, (a, b))| GeomWithData::new(Line::new([a.x, a.y], [b.x, b.y]), i as u32)).collect();
        Self { tree: RTree::bulk_load(entries), segments }
    }

    /// The segments it was made from.
    pub fn segments(&self) -> &[(Point, Point)] {
        &self.segments
    }

    /// The segments whose boxes meet the box, in no particular but always the same order.
    pub fn near(&self, area: BoundingBox) -> impl Iterator<Item = usize> + '_ {
        let corner = |p: Point| [p.x, p.y];
        self.tree.locate_in_envelope_intersecting(&AABB::from_corners(corner(area.min), corner(area.max))).map(|entry| entry.data as usize)
    }

    /// The segment nearest to `p` and the point of it that is nearest; `None` when there is no segment.
    pub fn nearest(&self, p: Point) -> Option<(usize, Point)> {
        let index = self.tree.nearest_neighbor(&[p.x, p.y])?.data as usize;
        let (a, b) = self.segments[index];
        Some((index, predicate::nearest_on_segment(a, b, p)))
    }

    /// The segments that a ray from `p` to the left meets, each counted once at shared ends: an odd number of edges of a
    /// closed loop means that `p` is inside it.
    pub fn left_of(&self, p: Point) -> impl Iterator<Item = usize> + '_ {
        self.near(BoundingBox { min: Point::new(f64::MIN, p.y), max: p }).filter(move |&i| {
            let (a, b) = self.segments[i];
            (a.y > p.y) != (b.y > p.y) && (predicate::side(a, b, p) < 0.0) == (b.y > a.y)
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rays_count_a_corner_once_and_nearest_finds_the_foot() {
        let p = Point::new;
        let corners = [p(0.0, 0.0), p(4.0, 2.0), p(0.0, 4.0), p(-4.0, 2.0)];
        let index = SegmentIndex::new((0..4).map(|i| (corners[i], corners[(i + 1) % 4])).collect());
        assert_eq!(index.left_of(p(0.0, 2.0)).count(), 1, "the ray leaves exactly through a corner");
        assert_eq!(index.left_of(p(5.0, 2.0)).count() % 2, 0);
        assert_eq!(index.left_of(p(5.0, 4.0)).count() % 2, 0);
        let (edge, foot) = index.nearest(p(2.5, -0.0)).expect("not empty");
        assert_eq!(edge, 0);
        assert!(foot.distance(p(2.0, 1.0)) < 1e-12);
        assert_eq!(index.near(BoundingBox { min: p(3.0, 1.9), max: p(5.0, 2.1) }).count(), 2);
    }
}
