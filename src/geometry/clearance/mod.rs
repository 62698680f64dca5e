//! The narrowest metal and the narrowest gap of an outline, exact between straight edges, arcs and corner tips.

pub(super) mod feature;
mod grid;

use super::{BoundingBox, IndexedRegion, Point, Region, Ring};
use feature::{Feature, Side, features_of};
use grid::Grid;

/// A distance between two boundary points, measured straight through metal or straight through void.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Clearance {
    /// Its length in mm.
    pub width_mm: f64,
    /// One end.
    pub from: Point,
    /// The other end.
    pub to: Point,
}

/// The least distances of one outline.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Clearances {
    /// The narrowest metal; `None` where no two stretches of the boundary face each other through metal (a plain disc).
    pub web: Option<Clearance>,
    /// The narrowest gap: within a cut-out, between two arms, or between two pieces; `None` where there is none (a round hole is none).
    pub slot: Option<Clearance>,
}

/// Ends closer together than this part of the whole extent are one point.
const NOTHING: f64 = 1e-9;

/// The least web and the least slot of rings that nest by containment.
///
/// Both are the least of all local minima: pairs of boundary points whose straight connection runs through the one medium only and
/// becomes no shorter when either end moves a little along the boundary. It therefore leaves a smooth boundary at a right angle, or
/// starts at the tip of a corner that points into the medium. A taper has no such pair at its thin end.
pub fn clearances(rings: &[Ring]) -> Clearances {
    let region = IndexedRegion::new(&Region::from_rings(rings));
    let mut features = Vec::new();
    for (number, ring) in rings.iter().enumerate() {
        features_of(ring, region.inside_on_left(number), &mut features);
    }
    let extent = features.iter().fold(BoundingBox::EMPTY, |bounds, f| f.hull().iter().fold(bounds, |b, &p| b.with(p)));
    if features.is_empty() || !(extent.width() + extent.height()).is_finite() {
        return Clearances::default();
    }
    let grid = Grid::new(extent, features.len(), features.iter().map(Feature::hull));
    let search = Search { features: &features, grid: &grid, diagonal: extent.width().hypot(extent.height()) };
    Clearances { web: search.least(Side::Metal), slot: search.least(Side::Void) }
}

struct Search<'a> {
    features: &'a [Feature],
    grid: &'a Grid,
    diagonal: f64,
}

impl Search<'_> {
    /// Looks from every feature into the medium, first a little way, then twice as far, until something stands opposite.
    fn least(&self, side: Side) -> Option<Clearance> {
        let mut seen = vec![usize::MAX; self.features.len()];
        let (mut near, mut far) = (NOTHING * self.diagonal, 2.0 * self.grid.cell());
        while near < self.diagonal {
            let mut best: Option<Clearance> = None;
            let mut at_stretch = false;
            seen.fill(usize::MAX);
            for (i, feature) in self.features.iter().enumerate() {
                let reach = best.map_or(far, |b| b.width_mm);
                let Some(beam) = feature.beam(side, near, reach) else { continue };
                self.grid.visit(&beam, &mut |j| {
                    // The other one finds the pair when it is its turn.
                    if j <= i || std::mem::replace(&mut seen[j], i) == i {
                        return true;
                    }
                    for (from, to) in feature.facing(&self.features[j], side) {
                        let width_mm = from.distance(to);
                        let stretch = feature.is_straight() && self.features[j].is_straight();
                        // Of equals, the middle of a stretch is a better place than its end.
                        let slack = if stretch && !at_stretch { NOTHING } else { -NOTHING };
                        let limit = best.map_or(far, |b| b.width_mm * (1.0 + slack));
                        if width_mm > near && width_mm <= limit && self.clear(from, to) {
                            best = Some(Clearance { width_mm, from, to });
                            at_stretch = stretch;
                        }
                    }
                    true
                });
            }
            if best.is_some() {
                return best;
            }
            (near, far) = (far, 2.0 * far);
        }
        None
    }

    /// True when nothing crosses the open segment.
    fn clear(&self, from: Point, to: Point) -> bool {
        self.grid.visit(&[from, to], &mut |j| !self.features[j].crosses(from, to))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::Vertex;

    fn polygon(points: &[(f64, f64)]) -> Ring {
        Ring::polygon(points.iter().map(|&(x, y)| Point::new(x, y)))
    }

    fn rectangle(x0: f64, y0: f64, x1: f64, y1: f64) -> Ring {
        polygon(&[(x0, y0), (x1, y0), (x1, y1), (x0, y1)])
    }

    /// Turned, shifted and scaled, the same clearances come out.
    fn widths(rings: &[Ring]) -> [Option<f64>; 2] {
        let plain = clearances(rings);
        let (sine, cosine) = 0.4f64.sin_cos();
        for (scale, shift) in [(1.0, 0.0), (0.01, 1.0), (7.0, -1000.0)] {
            for mirror in [1.0, -1.0] {
                let turned: Vec<Ring> = rings
                    .iter()
                    .map(|ring| Ring {
                        vertices: ring
                            .vertices
                            .iter()
                            .map(|v| Vertex {
                                point: Point::new(
                                    scale * (v.point.x * cosine - v.point.y * sine) + shift,
                                    scale * mirror * (v.point.x * sine + v.point.y * cosine),
                                ),
                                bulge: mirror * v.bulge,
                            })
                            .collect(),
                    })
                    .collect();
                let moved = clearances(&turned);
                for (a, b) in [(plain.web, moved.web), (plain.slot, moved.slot)] {
                    let (a, b) = (a.map(|c| c.width_mm * scale), b.map(|c| c.width_mm));
                    let same = a.zip(b).map_or(a == b, |(a, b)| (a / b - 1.0).abs() < 1e-6);
                    assert!(same, "{a:?} turned {b:?} at scale {scale}, mirror {mirror}");
                }
            }
        }
        [plain.web.map(|c| c.width_mm), plain.slot.map(|c| c.width_mm)]
    }

    fn close(found: Option<f64>, expected: f64) {
        let found = found.expect("a clearance");
        assert!((found / expected - 1.0).abs() < 1e-9, "{found}, not {expected}");
    }

    #[test]
    fn plain_rectangle_and_disc() {
        let [web, slot] = widths(&[rectangle(0.0, 0.0, 40.0, 12.0)]);
        close(web, 12.0);
        assert_eq!(slot, None);
        assert_eq!(widths(&[Ring::circle(Point::new(3.0, 4.0), 10.0)]), [None, None]);
        // A stadium's straight sides face each other.
        close(widths(&[Ring::seam(Point::new(0.0, 0.0), Point::new(9.0, 2.0), 3.0)])[0], 3.0);
    }

    #[test]
    fn strip_with_a_square_hole_and_with_a_round_hole() {
        let strip = rectangle(0.0, 0.0, 60.0, 12.0);
        let found = clearances(&[strip.clone(), rectangle(25.0, 3.0, 35.0, 9.0)]);
        let web = found.web.unwrap();
        assert_eq!((web.width_mm, web.from.x, web.to.x), (3.0, 30.0, 30.0));
        close(found.slot.map(|s| s.width_mm), 6.0);
        let [web, slot] = widths(&[rectangle(0.0, 0.0, 60.0, 15.0), Ring::circle(Point::new(30.0, 7.5), 8.4)]);
        close(web, 0.5 * (15.0 - 8.4));
        assert_eq!(slot, None, "a round hole is no slot");
    }

    #[test]
    fn between_two_round_holes_and_between_two_pieces() {
        let plate = rectangle(0.0, 0.0, 100.0, 100.0);
        let holes = [Ring::circle(Point::new(50.0, 50.0), 8.0), Ring::circle(Point::new(57.0, 54.0), 6.0)];
        close(widths(&[plate, holes[0].clone(), holes[1].clone()])[0], 65f64.sqrt() - 7.0);
        let [web, slot] = widths(&[rectangle(0.0, 0.0, 10.0, 20.0), rectangle(11.5, 0.0, 21.5, 30.0)]);
        close(web, 10.0);
        close(slot, 1.5);
    }

    #[test]
    fn of_equal_places_the_middle_of_a_stretch_is_shown() {
        let corners = [(33.8, 2.0), (38.2, 2.0), (39.0, 2.8), (39.0, 9.2), (38.2, 10.0), (33.8, 10.0), (33.0, 9.2), (33.0, 2.8)];
        let rounded = corners
            .iter()
            .enumerate()
            .map(|(i, &(x, y))| Vertex { point: Point::new(x, y), bulge: if i % 2 == 1 { 0.4142135624 } else { 0.0 } });
        let web = clearances(&[rectangle(0.0, 0.0, 66.0, 12.0), Ring { vertices: rounded.collect() }]).web.unwrap();
        close(Some(web.width_mm), 2.0);
        assert!((web.from.x - 36.0).abs() < 1e-9 && (web.to.x - 36.0).abs() < 1e-9, "{web:?}");
    }

    #[test]
    fn a_slot_open_at_one_side() {
        let comb = polygon(&[(0.0, 0.0), (40.0, 0.0), (40.0, 20.0), (20.5, 20.0), (20.5, 6.0), (19.5, 6.0), (19.5, 20.0), (0.0, 20.0)]);
        let [web, slot] = widths(&[comb]);
        close(web, 6.0);
        close(slot, 1.0);
    }

    #[test]
    fn arcs_that_are_not_concentric_and_arcs_that_are() {
        let outer = Ring::circle(Point::default(), 30.0);
        let inner = |x: f64, y: f64| Ring::circle(Point::new(x, y), 20.0);
        close(widths(&[outer.clone(), inner(1.2, 1.6)])[0], 3.0);
        close(widths(&[outer, inner(0.0, 0.0)])[0], 5.0);
    }

    #[test]
    fn corner_tips_count_where_they_point_into_the_medium() {
        // A rhombic hole: its lower tip is 1 mm above the edge of the strip.
        let rhombus = polygon(&[(20.0, 1.0), (24.0, 6.0), (20.0, 11.0), (16.0, 6.0)]);
        let [web, slot] = widths(&[rectangle(0.0, 0.0, 40.0, 14.0), rhombus]);
        close(web, 1.0);
        // Parallel sides of the rhombus face each other.
        close(slot, 40.0 / 41f64.sqrt());
        // Two notches, tip against tip.
        let waist = polygon(&[
            (0.0, 0.0),
            (19.0, 0.0),
            (20.0, 4.0),
            (21.0, 0.0),
            (40.0, 0.0),
            (40.0, 12.0),
            (23.0, 12.0),
            (22.0, 7.0),
            (21.0, 12.0),
            (0.0, 12.0),
        ]);
        close(widths(&[waist])[0], 13f64.sqrt());
    }

    #[test]
    fn what_stands_between_hides_the_far_side() {
        // Without the island the void would be 20 wide; the island leaves 4 on one side.
        let rings = [rectangle(0.0, 0.0, 60.0, 40.0), rectangle(20.0, 10.0, 40.0, 30.0), rectangle(24.0, 15.0, 35.0, 25.0)];
        let [web, slot] = widths(&rings);
        close(web, 10.0);
        close(slot, 4.0);
    }

    #[test]
    fn many_holes_and_many_points_take_no_time() {
        let mut rings = vec![rectangle(-2.0, -2.0, 302.0, 302.0)];
        for i in 0..10_000 {
            let (x, y) = ((i % 100) as f64, (i / 100) as f64);
            rings.push(Ring::circle(Point::new(3.0 * x + 1.0, 3.0 * y + 1.0), if i == 4321 { 1.5 } else { 1.0 }));
        }
        close(clearances(&rings).web.map(|w| w.width_mm), 1.75);
        // A wavy blob of many short edges: no neck at all until far away.
        let points = (0..100_000).map(|i| {
            let angle = std::f64::consts::TAU * i as f64 / 100_000.0;
            let radius = 50.0 + 3.0 * (5.0 * angle).cos();
            Point::new(radius * angle.cos(), radius * angle.sin())
        });
        clearances(&[Ring::polygon(points)]);
        // Generous: it must not grow with the square of the number of edges.
    }
}
