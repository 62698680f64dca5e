//! A box index over segments for crossing and nearest queries; the only user of `rstar`.

use super::{BoundingBox, Point};
use rstar::primitives::{GeomWithData, Rectangle};
use rstar::{AABB, RTree};

/// Segments by their boxes.
pub struct SegmentIndex {
    tree: RTree<GeomWithData<Rectangle<[f64; 2]>, u32>>,
}

impl SegmentIndex {
    /// An index over the segments; each is known by its place in the order given.
    pub fn new(segments: impl IntoIterator<Item = (Point, Point)>) -> Self {
        let boxes = segments
            .into_iter()
            .enumerate()
            .map(|(i, (a, b))| GeomWithData::new(Rectangle::from_corners([a.x, a.y], [b.x, b.y]), i as u32))
            .collect();
        Self { tree: RTree::bulk_load(boxes) }
    }

    /// The segments whose boxes meet a box, in no stated order.
    pub fn meeting(&self, around: BoundingBox) -> impl Iterator<Item = u32> + '_ {
        let envelope = AABB::from_corners([around.min.x, around.min.y], [around.max.x, around.max.y]);
        self.tree.locate_in_envelope_intersecting(&envelope).map(|g| g.data)
    }
}
