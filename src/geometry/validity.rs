//! What can be wrong with a set of rings: too few points, wild coordinates, rings that cross or touch.

use super::ring::Arc;
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

/// All rings that are at fault, in the order of the rings: of every ring its first meeting with itself and with each other ring,
/// decided exactly on the flattened rings. Empty means that even-odd containment defines a region.
pub fn ring_faults(rings: &[Ring]) -> Vec<RingFault> {
    let mut faults = Vec::new();
    let mut edges = Vec::new();
    let mut owners: Vec<(u32, u32)> = Vec::new();
    let mut starts = Vec::new();
    for (number, ring) in rings.iter().enumerate() {
        let start = edges.len();
        starts.push((start, start));
        match shape_fault(ring, edges.len()) {
            Some((kind, vertex, at)) => faults.push(RingFault { kind, place: (number, vertex), other: None, at }),
            None => {
                let points = ring.flattened();
                for (vertex, (a, bulge, b)) in ring.edges().enumerate() {
                    let pieces = Arc::new(a, bulge, b).map_or(1, |arc| arc.chords());
                    owners.extend(std::iter::repeat_n((number as u32, vertex as u32), pieces));
                }
                edges.extend((0..points.len()).map(|i| (points[i], points[(i + 1) % points.len()])));
                starts[number].1 = edges.len();
            }
        }
    }
    faults.extend(meetings(SegmentIndex::new(edges), &owners, &starts));
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
fn meetings(index: SegmentIndex, owners: &[(u32, u32)], starts: &[(usize, usize)]) -> Vec<RingFault> {
    let mut faults: Vec<RingFault> = Vec::new();
    let edges = index.segments();
    for (ring, &(first, last)) in starts.iter().enumerate() {
        let count = last - first;
        // One meeting per ring is enough: a ring gone wild meets itself everywhere.
        'ring: for i in first..last {
            let (a, b) = edges[i];
            let mut found: Option<usize> = None;
            for j in index.near(BoundingBox::around([a, b])) {
                let (c, d) = edges[j];
                let meet = if j == i {
                    a == b
                } else if owners[j].0 as usize != ring {
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
                if meet {
                    found = Some(found.map_or(j, |other| other.min(j)));
                }
            }
            let Some(j) = found else { continue };
            let (other_ring, other_vertex) = owners[j];
            let other = (other_ring as usize, other_vertex as usize);
            let place = (ring, owners[i].1 as usize);
            let told = faults.iter().any(|f| f.place.0 == other.0 && f.other.map(|o| o.0) == Some(ring));
            if other.0 == ring || !told {
                let kind = if other.0 == ring { RingFaultKind::MeetsItself } else { RingFaultKind::MeetsOther };
                let at = predicate::meeting_point(a, b, edges[j].0, edges[j].1);
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
