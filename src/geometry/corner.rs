//! Rounding of inside corners: where the metal's angle is more than half a turn, a tangent arc takes the corner's place.

use super::predicate::nearest_on_segment;
use super::{IndexedRegion, Point, Ring, Vertex};

/// Bends flatter than this (radians) are part of a drawn curve, not corners.
const FLAT: f64 = 0.087;

/// How near a terminal's line must pass to run through a corner, mm.
const THROUGH: f64 = 0.02;

/// Why a corner was left sharp.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Sharp {
    /// The straight pieces beside it are too short for the arc.
    NoRoom,
    /// A terminal runs through it.
    Terminal,
}

/// What rounding came to.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Rounding {
    /// How many corners are now round.
    pub rounded: usize,
    /// The corners left sharp, and why.
    pub skipped: Vec<(Point, Sharp)>,
}

/// Rounds the inside corners between straight edges of all rings with arcs of this radius (mm, > 0). `lines` are polylines of terminals:
/// a corner on one of them stays. The rings must be valid, and `region` is theirs.
pub fn round_inside_corners(rings: &mut [Ring], region: &IndexedRegion, radius: f64, lines: &[Vec<Point>]) -> Rounding {
    let mut rounding = Rounding::default();
    for (number, ring) in rings.iter_mut().enumerate() {
        let turn = if region.inside_on_left(number) { 1.0 } else { -1.0 };
        *ring = rounded(ring, turn, radius, lines, &mut rounding);
    }
    rounding
}

/// One ring with its inside corners rounded; `turn` is +1 where the metal is on the left.
fn rounded(ring: &Ring, turn: f64, radius: f64, lines: &[Vec<Point>], rounding: &mut Rounding) -> Ring {
    let corners = &ring.vertices;
    let n = corners.len();
    let previous = |i: usize| (i + n - 1) % n;
    let next = |i: usize| (i + 1) % n;
    let length = |i: usize| corners[i].point.distance(corners[next(i)].point);
    // What each corner's arc takes from the two edges beside it; 0 where there is none.
    let mut taken = vec![0.0; n];
    let mut bend = vec![0.0; n];
    for i in 0..n {
        if corners[i].bulge != 0.0 || corners[previous(i)].bulge != 0.0 {
            continue;
        }
        let (before, here, after) = (corners[previous(i)].point, corners[i].point, corners[next(i)].point);
        let (a, b) = (here - before, after - here);
        let angle = -turn * a.cross(b).atan2(a.dot(b));
        if angle < FLAT {
            continue;
        }
        if lines.iter().any(|line| line.windows(2).any(|w| nearest_on_segment(w[0], w[1], here).distance(here) <= THROUGH)) {
            rounding.skipped.push((here, Sharp::Terminal));
            continue;
        }
        let reach = radius * (0.5 * angle).tan();
        let fits = |edge: usize, neighbour: usize| reach + taken[neighbour] <= length(edge) + 1e-9;
        if fits(previous(i), previous(i)) && fits(i, next(i)) {
            taken[i] = reach;
            bend[i] = angle;
            rounding.rounded += 1;
        } else {
            rounding.skipped.push((here, Sharp::NoRoom));
        }
    }
    let mut vertices: Vec<Vertex> = Vec::with_capacity(n);
    for i in 0..n {
        if taken[i] == 0.0 {
            vertices.push(corners[i]);
            continue;
        }
        let here = corners[i].point;
        let towards = |other: usize, edge: usize| here + (corners[other].point - here) * (taken[i] / length(edge)).min(1.0);
        let bulge = -turn * (0.25 * bend[i]).tan();
        vertices.push(Vertex { point: towards(previous(i), previous(i)), bulge });
        vertices.push(Vertex { point: towards(next(i), i), bulge: 0.0 });
    }
    // Two arcs that use up the whole edge between them meet: the empty edge goes.
    let count = vertices.len();
    let empty = |i: usize| vertices[i].bulge == 0.0 && vertices[i].point.distance(vertices[(i + 1) % count].point) < 2e-9;
    Ring { vertices: (0..count).filter(|&i| !empty(i)).map(|i| vertices[i]).collect() }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::Region;

    fn round(rings: &mut [Ring], radius: f64, lines: &[Vec<Point>]) -> Rounding {
        let region = IndexedRegion::new(&Region::from_rings(&*rings));
        round_inside_corners(rings, &region, radius, lines)
    }

    fn polygon(points: &[(f64, f64)]) -> Ring {
        Ring::polygon(points.iter().map(|&(x, y)| Point::new(x, y)))
    }

    #[test]
    fn an_angle_bar_gets_one_arc_whatever_its_winding() {
        let mut points = vec![(0.0, 0.0), (10.0, 0.0), (10.0, 4.0), (4.0, 4.0), (4.0, 10.0), (0.0, 10.0)];
        for _ in 0..2 {
            let mut rings = [polygon(&points)];
            let rounding = round(&mut rings, 1.0, &[]);
            assert_eq!((rounding.rounded, rounding.skipped.len(), rings[0].vertices.len()), (1, 0, 7));
            // Metal is added: the square of the corner less a quarter disc.
            let added = rings[0].signed_area().abs() - polygon(&points).signed_area().abs();
            assert!((added - (1.0 - std::f64::consts::FRAC_PI_4)).abs() < 1e-12, "{added}");
            points.reverse();
        }
    }

    #[test]
    fn all_corners_of_a_slot_are_rounded_up_to_a_full_round_end() {
        let plate = polygon(&[(0.0, 0.0), (20.0, 0.0), (20.0, 10.0), (0.0, 10.0)]);
        let slot = polygon(&[(5.0, 4.0), (15.0, 4.0), (15.0, 6.0), (5.0, 6.0)]);
        let mut rings = [plate, slot];
        assert_eq!(round(&mut rings, 1.0, &[]).rounded, 4);
        assert!((rings[1].signed_area() - (8.0 * 2.0 + std::f64::consts::PI)).abs() < 1e-12);
        assert_eq!(rings[0].vertices.len(), 4, "outside corners stay");
        assert_eq!(crate::geometry::validity::ring_faults(&rings), []);
    }

    #[test]
    fn a_corner_stays_sharp_where_the_arc_has_no_room_or_a_terminal_runs() {
        let step = polygon(&[(0.0, 0.0), (10.0, 0.0), (10.0, 4.0), (4.0, 4.0), (4.0, 4.5), (0.0, 4.5)]);
        let rounding = round(&mut [step.clone()], 1.0, &[]);
        assert_eq!(rounding.skipped, vec![(Point::new(4.0, 4.0), Sharp::NoRoom)]);
        let line = vec![Point::new(4.0, 0.0), Point::new(4.0, 4.0)];
        let rounding = round(&mut [step], 0.2, &[line]);
        assert_eq!(rounding.skipped, vec![(Point::new(4.0, 4.0), Sharp::Terminal)]);
    }
}
