//! Regions of the plane: flattened loops, inside by even-odd containment.

use super::{BoundingBox, Point, Ring};

/// An area bounded by straight loops; a point is inside when an odd number of loops contain it.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Region {
    /// The loops; winding means nothing.
    pub loops: Vec<Vec<Point>>,
}

impl Region {
    /// The flattened region of some rings.
    pub fn from_rings<'a>(rings: impl IntoIterator<Item = &'a Ring>) -> Self {
        Self { loops: rings.into_iter().map(Ring::flattened).collect() }
    }

    /// All edges as (start, end).
    pub fn edges(&self) -> impl Iterator<Item = (Point, Point)> + '_ {
        self.loops.iter().flat_map(|l| (0..l.len()).map(move |i| (l[i], l[(i + 1) % l.len()])))
    }

    /// True when the point is inside (on the rim: either answer).
    pub fn contains(&self, p: Point) -> bool {
        let mut inside = false;
        for (a, b) in self.edges() {
            if (a.y > p.y) != (b.y > p.y) && p.x < a.x + (p.y - a.y) / (b.y - a.y) * (b.x - a.x) {
                inside = !inside;
            }
        }
        inside
    }

    /// The box around it.
    pub fn bounding_box(&self) -> BoundingBox {
        BoundingBox::around(self.loops.iter().flatten().copied())
    }
}
