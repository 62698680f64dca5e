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

/// Exact area in mm² inside rings that nest by containment (outside, hole, island, ...); arcs counted as arcs. The rings must not cross.
pub fn nested_area(rings: &[Ring]) -> f64 {
    let loops: Vec<Region> = rings.iter().map(|r| Region::from_rings([r])).collect();
    let boxes: Vec<BoundingBox> = loops.iter().map(Region::bounding_box).collect();
    rings
        .iter()
        .enumerate()
        .map(|(i, ring)| {
            let probe = ring.vertices.first().map_or(Point::default(), |v| v.point);
            let depth = (0..rings.len()).filter(|&j| j != i && boxes[j].contains(probe) && loops[j].contains(probe)).count();
            if depth % 2 == 0 { ring.signed_area().abs() } else { -ring.signed_area().abs() }
        })
        .sum()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_plate_with_a_hole_and_an_island_in_it() {
        let square = |x: f64, s: f64| Ring::polygon([(x, x), (x + s, x), (x + s, x + s), (x, x + s)].map(|(x, y)| Point::new(x, y)));
        let rings = [square(0.0, 10.0), square(2.0, 6.0), Ring::circle(Point::new(5.0, 5.0), 2.0)];
        assert!((nested_area(&rings) - (100.0 - 36.0 + std::f64::consts::PI)).abs() < 1e-12);
        let region = Region::from_rings(&rings);
        assert!(region.contains(Point::new(1.0, 1.0)) && !region.contains(Point::new(3.0, 3.0)) && region.contains(Point::new(5.0, 5.0)));
    }
}
