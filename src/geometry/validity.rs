//! What can be wrong with a set of rings: too few points, wild coordinates, rings that cross or touch.

use super::ring::Arc;
use super::touch::DrawnEdges;
use super::{BoundingBox, Point, Ring, SegmentIndex, predicate};

/// Largest coordinate that is accepted, mm.
pub const LARGEST_COORDINATE: f64 = 1e6;

/// Largest radius of an arc, mm: beyond it the arc's points lose their last decimals.
pub const LARGEST_RADIUS: f64 = 1e9;

/// Most edges into which the rings of one outline may be flattened.
pub const MOST_EDGES: usize = 2_000_000;

/// What is wrong with a ring.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum RingFaultKind {
    /// Fewer than three points (two with at least one arc would do).
    TooFewPoints,
    /// A coordinate or bulge that is no finite number, or beyond [`LARGEST_COORDINATE`].
    WildNumber,
    /// The arcs are so large or so many that they flatten to more than [`MOST_EDGES`] edges.
    TooManyEdges,
    /// Crosses or touches itself.
    MeetsItself,
    /// Crosses or touches another ring.
    MeetsOther,
}

/// One fault of a set of rings.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RingFault {
    /// What is wrong.
    pub kind: RingFaultKind,
    /// Number of the ring and of the vertex whose edge is at fault.
    pub place: (usize, usize),
    /// Ring and vertex of the other edge, for rings that meet.
    pub other: Option<(usize, usize)>,
    /// Where, mm.
    pub at: Point,
}

/// All rings that are at fault, in the order of the rings: of every ring its first meeting with itself or with another ring. Straight edges are
/// compared exactly; an arc meets what its chords meet and what is no farther from the arc itself than its chords may leave it (0.003 mm at the
/// most). Empty means that even-odd containment defines a region, for the drawn rings as for the flattened ones.
pub fn ring_faults(rings: &[Ring]) -> Vec<RingFault> {
    let mut faults = Vec::new();
    let mut edges = Vec::new();
    let mut drawn = DrawnEdges::new(rings);
    let mut starts = Vec::new();
    for (number, ring) in rings.iter().enumerate() {
        let start = edges.len();
        starts.push((start, start));
        match shape_fault(ring, edges.len()) {
            Some((kind, vertex, at)) => faults.push(RingFault { kind, place: (number, vertex), other: None, at }),
            None => {
                let points = ring.flattened();
                drawn.add(number, &points);
                edges.extend((0..points.len()).map(|i| (points[i], points[(i + 1) % points.len()])));
                starts[number].1 = edges.len();
            }
        }
    }
    faults.extend(meetings(SegmentIndex::new(edges), &drawn, &starts));
    faults.sort_by_key(|f| f.place);
    faults
}

/// What is wrong with one ring taken alone, before its edges are compared.
fn shape_fault(ring: &Ring, edges_so_far: usize) -> Option<(RingFaultKind, usize, Point)> {
    let wild = |x: f64| x.is_nan() || x.abs() > LARGEST_COORDINATE;
    if let Some(i) = ring.vertices.iter().position(|v| wild(v.point.x) || wild(v.point.y) || wild(v.bulge)) {
        return Some((RingFaultKind::WildNumber, i, ring.vertices[i].point));
    }
    let first = ring.vertices.first().map_or(Point::default(), |v| v.point);
    if ring.vertices.len() < 2 || (ring.vertices.len() == 2 && ring.vertices.iter().all(|v| v.bulge == 0.0)) {
        return Some((RingFaultKind::TooFewPoints, 0, first));
    }
    let mut edges = edges_so_far;
    for (i, (a, bulge, b)) in ring.edges().enumerate() {
        if let Some(arc) = Arc::new(a, bulge, b) {
            if arc.radius > LARGEST_RADIUS {
                return Some((RingFaultKind::WildNumber, i, a));
            }
            edges += arc.chords();
        } else {
            edges += 1;
        }
        if edges > MOST_EDGES {
            return Some((RingFaultKind::TooManyEdges, i, a));
        }
    }
    None
}

/// Where edges meet that should not. `starts` holds the first and one past the last edge of every ring.
fn meetings(index: SegmentIndex, drawn: &DrawnEdges, starts: &[(usize, usize)]) -> Vec<RingFault> {
    let mut faults: Vec<RingFault> = Vec::new();
    let edges = index.segments();
    for (ring, &(first, last)) in starts.iter().enumerate() {
        let count = last - first;
        // One meeting per ring is enough: a ring gone wild meets itself everywhere.
        'ring: for i in first..last {
            let (a, b) = edges[i];
            let reach = Point::new(drawn.reach(i), drawn.reach(i));
            let chord = BoundingBox::around([a, b]);
            let mut found: Option<(usize, Point)> = None;
            for j in index.near(BoundingBox { min: chord.min - reach, max: chord.max + reach }) {
                let (c, d) = edges[j];
                let meet = if j == i {
                    a == b
                } else if drawn.owner(j).0 != ring {
                    predicate::segments_meet(a, b, c, d)
                } else {
                    let (p, q) = (i - first, j - first);
                    match ((p + 1) % count == q, (q + 1) % count == p) {
                        // Neighbours share a corner; they must not lie on each other.
                        (true, _) => predicate::on_segment(a, b, d) || predicate::on_segment(c, d, a),
                        (_, true) => predicate::on_segment(a, b, c) || predicate::on_segment(c, d, b),
                        _ => predicate::segments_meet(a, b, c, d),
                    }
                };
                let at = if meet { Some(predicate::meeting_point(a, b, c, d)) } else { drawn.touch(i, j, [(a, b), (c, d)]) };
                found = at.map(|at| (j, at)).into_iter().chain(found).min_by_key(|f| f.0);
            }
            let Some((j, at)) = found else { continue };
            let (place, other) = (drawn.owner(i), drawn.owner(j));
            let told = faults.iter().any(|f| f.place.0 == other.0 && f.other.map(|o| o.0) == Some(ring));
            if other.0 == ring || !told {
                let kind = if other.0 == ring { RingFaultKind::MeetsItself } else { RingFaultKind::MeetsOther };
                faults.push(RingFault { kind, place, other: Some(other), at });
            }
            break 'ring;
        }
    }
    faults
}

#[cfg(test)]
mod tests {
    use super::*;

    fn polygon(points: &[(f64, f64)]) -> Ring {
        Ring::polygon(points.iter().map(|&(x, y)| Point::new(x, y)))
    }

    fn kinds(rings: &[Ring]) -> Vec<RingFaultKind> {
        ring_faults(rings).iter().map(|f| f.kind).collect()
    }

    #[test]
    fn good_rings_have_no_fault_and_bad_ones_are_named() {
        let plate = polygon(&[(0.0, 0.0), (10.0, 0.0), (10.0, 10.0), (0.0, 10.0)]);
        let hole = Ring::circle(Point::new(5.0, 5.0), 3.0);
        assert_eq!(kinds(&[plate.clone(), hole.clone()]), []);
        let bow = polygon(&[(0.0, 0.0), (10.0, 10.0), (10.0, 0.0), (0.0, 10.0)]);
        let faults = ring_faults(std::slice::from_ref(&bow));
        assert_eq!(faults.len(), 1);
        assert_eq!((faults[0].kind, faults[0].at), (RingFaultKind::MeetsItself, Point::new(5.0, 5.0)));
        assert_eq!(kinds(&[polygon(&[(0.0, 0.0), (1.0, 0.0)])]), [RingFaultKind::TooFewPoints]);
        assert_eq!(kinds(&[polygon(&[(0.0, 0.0), (1.0, 0.0), (2.0, 0.0)])]), [RingFaultKind::MeetsItself]);
        assert_eq!(kinds(&[polygon(&[(0.0, 0.0), (f64::NAN, 0.0), (2.0, 5.0)])]), [RingFaultKind::WildNumber]);
        assert_eq!(kinds(&[plate.clone(), Ring::circle(Point::new(9.0, 5.0), 3.0)]), [RingFaultKind::MeetsOther]);
        let spike = polygon(&[(0.0, 0.0), (10.0, 0.0), (10.0, 10.0), (5.0, 10.0), (5.0, 12.0), (5.0, 10.0), (0.0, 10.0)]);
        assert_eq!(kinds(&[spike]), [RingFaultKind::MeetsItself]);
    }

    #[test]
    fn two_points_make_a_ring_when_an_edge_is_an_arc() {
        let corner = |x, bulge| super::super::Vertex { point: Point::new(x, 0.0), bulge };
        assert_eq!(kinds(&[Ring { vertices: vec![corner(0.0, 0.5), corner(1.0, 0.0)] }]), []);
        assert_eq!(kinds(&[Ring { vertices: vec![corner(0.0, 0.5), corner(1.0, -0.5)] }]), [RingFaultKind::MeetsItself]);
    }

    #[test]
    fn rings_that_miss_by_the_last_bit_are_fine() {
        let plate = polygon(&[(0.0, 0.0), (10.0, 0.0), (10.0, 10.0), (0.0, 10.0)]);
        let beside = |x: f64| polygon(&[(x, 2.0), (20.0, 2.0), (20.0, 8.0), (x, 8.0)]);
        assert_eq!(kinds(&[plate.clone(), beside(10.0)]), [RingFaultKind::MeetsOther]);
        assert_eq!(kinds(&[plate, beside(10.0 + 2e-15)]), []);
    }

    #[test]
    fn a_circle_that_touches_is_refused_wherever_its_chords_fall() {
        for degrees in [0, 7, 30, 45, 61] {
            let (sin, cos) = f64::to_radians(f64::from(degrees)).sin_cos();
            let turned = |x: f64, y: f64| Point::new(x * cos - y * sin, x * sin + y * cos);
            let plate = Ring::polygon([(0.0, 0.0), (100.0, 0.0), (100.0, 30.0), (0.0, 30.0)].map(|(x, y)| turned(x, y)));
            // The drawing alone is turned: a circle's chords begin at its right in any case.
            let circle = |y: f64| Ring::circle(turned(50.0, y), 2.0);
            for (gap, met) in [(0.0, true), (-1e-4, true), (1e-4, true), (0.002, true), (0.0028, false), (0.01, false)] {
                let faults = ring_faults(&[plate.clone(), circle(1.0 + gap)]);
                assert_eq!(!faults.is_empty(), met, "{degrees} {gap}: {faults:?}");
                if gap == 0.0 {
                    assert_eq!(faults[0].kind, RingFaultKind::MeetsOther);
                    assert!(faults[0].at.distance(turned(50.0, 0.0)) < 0.1, "{faults:?}");
                }
            }
            let small = |d: f64| [circle(1.0 + d), Ring::circle(turned(52.0, 1.0 + d), 2.0)];
            assert_eq!(kinds(&small(5.0)), [RingFaultKind::MeetsOther], "two circles side by side");
            assert_eq!(kinds(&[Ring::circle(turned(5.0, 0.0), 8.0), Ring::circle(turned(4.0, 0.0), 6.0)]), [RingFaultKind::MeetsOther]);
            assert_eq!(kinds(&[Ring::circle(turned(5.0, 0.0), 8.0), Ring::circle(turned(4.0, 0.0), 5.98)]), [], "one inside the other");
        }
        let faults =
            ring_faults(&[polygon(&[(0.0, 0.0), (100.0, 0.0), (100.0, 30.0), (0.0, 30.0)]), Ring::circle(Point::new(50.0, 1.0), 2.0)]);
        assert!(faults[0].at.distance(Point::new(50.0, 0.0)) < 1e-9, "{faults:?}");
    }

    #[test]
    fn an_arc_that_touches_its_own_ring_is_refused_and_neighbours_are_not() {
        let ring = |corners: &[(f64, f64, f64)]| Ring {
            vertices: corners.iter().map(|&(x, y, bulge)| super::super::Vertex { point: Point::new(x, y), bulge }).collect(),
        };
        // The upper edge sags to the lower one; the middle of a chord lies there.
        let sagging = |bulge: f64| ring(&[(0.0, 0.0, 0.0), (9.6, 0.0, 0.0), (9.6, 4.8, bulge), (0.0, 4.8, 0.0)]);
        assert_eq!(kinds(&[sagging(-1.0)]), [RingFaultKind::MeetsItself]);
        assert_eq!(kinds(&[sagging(-0.999)]), []);
        // Tiny and cusped, but sound: a fillet's straight piece of a micrometre, a corner of two degrees, a slot with full round ends.
        let quarter = (std::f64::consts::PI / 8.0).tan();
        assert_eq!(
            kinds(&[ring(&[
                (0.0, 0.0, 0.0),
                (9.0, 0.0, quarter),
                (10.0, 1.0, 0.0),
                (10.0, 1.001, quarter),
                (9.0, 2.001, 0.0),
                (0.0, 2.001, 0.0)
            ])]),
            []
        );
        assert_eq!(kinds(&[ring(&[(0.0, 0.0, 0.01), (10.0, 0.0, -0.03)])]), []);
        assert_eq!(kinds(&[ring(&[(0.0, 0.0, 0.0), (3.0, 0.0, 1.0), (3.0, 0.004, 0.0), (0.0, 0.004, 1.0)])]), []);
    }

    #[test]
    fn stars_stay_sound_whatever_rounds_their_inside_corners() {
        for spikes in [3, 5, 12, 40] {
            for scale in [0.01, 1.0, 30.0] {
                for part in [1e-4, 1e-3, 0.01, 0.1, 0.3, 0.6, 0.9] {
                    let star = Ring::polygon((0..2 * spikes).map(|i| {
                        let (sin, cos) = (std::f64::consts::PI * f64::from(i) / f64::from(spikes)).sin_cos();
                        Point::new(cos, sin) * (scale * if i % 2 == 0 { 2.0 } else { 1.0 })
                    }));
                    let mut rings = [star];
                    let region = crate::geometry::IndexedRegion::new(&crate::geometry::Region::from_rings(&rings));
                    crate::geometry::corner::round_inside_corners(&mut rings, &region, scale * part, &[]);
                    assert_eq!(ring_faults(&rings), [], "{spikes} {scale} {part}");
                }
            }
        }
    }

    #[test]
    fn ten_thousand_circles_a_hair_apart_end_quickly() {
        let mut rings: Vec<Ring> = (0..10_000).map(|i| Ring::circle(Point::new((i % 100) as f64, (i / 100) as f64), 0.99)).collect();
        rings.extend((0..500).map(|i| Ring::circle(Point::new(500.0, 0.0), 10.0 + 0.02 * f64::from(i))));
        assert_eq!(kinds(&rings), []);
    }

    #[test]
    fn wild_scribbles_of_two_hundred_thousand_points_end_quickly() {
        let mut state = 1u64;
        let mut random = || {
            state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            (state >> 33) as f64 / 1e7
        };
        let scribble = Ring::polygon((0..200_000).map(|_| Point::new(random(), random())));
        let round = Ring::polygon((0..200_000).map(|i| {
            let (s, c) = (i as f64 * std::f64::consts::TAU / 200_000.0).sin_cos();
            Point::new(2000.0 + 100.0 * c, 100.0 * s)
        }));
        assert_eq!(kinds(&[scribble, round]), [RingFaultKind::MeetsItself]);
    }
}
