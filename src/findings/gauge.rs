//! Current density per sheet and its gauge mean: the mean of |J| over a disc clipped to the connected metal that holds its centre.

use super::metal::{LayerMetal, Place};
use crate::geometry::Point;
use crate::geometry::predicate::nearest_on_segment;
use crate::index::LayerId;
use crate::mesh::NONE;
use crate::physics::Solution;
use crate::physics::adapt::RESOLVED;
use crate::problem::Problem;

/// Current density of every sheet.
#[derive(Debug, Clone)]
pub struct DensityField {
    /// Per sheet, by [`LayerId`].
    pub layers: Vec<LayerMetal>,
}

impl DensityField {
    /// The density of a solution: per triangle the mean of -(1/rho) grad phi and of the equilibrated flux at its middle. A bonded leaf's current is
    /// shared by the sheets' conductances; held triangles carry none.
    pub fn new(problem: &Problem, solution: &Solution) -> Self {
        Self { layers: (0..problem.layers.len()).map(|l| LayerMetal::new(problem, solution, LayerId::new(l))).collect() }
    }

    /// The largest gauge mean of discs that touch a rim (closed loops of points) or lie across it; `None` where no part of the rim is on the metal.
    pub fn rim_peak(&self, layer: LayerId, rim: &[Vec<Point>]) -> Option<f64> {
        const SAMPLES: usize = 32;
        let metal = self.layers.get(layer.index())?;
        let reach = 0.55 * metal.gauge;
        let mut best: Option<(f64, Place)> = None;
        for points in rim {
            let length: f64 = (0..points.len()).map(|i| points[i].distance(points[(i + 1) % points.len()])).sum();
            let mut next = 0.0;
            let mut passed = 0.0;
            for i in 0..points.len() {
                let (a, b) = (points[i], points[(i + 1) % points.len()]);
                let edge = a.distance(b);
                while next < passed + edge && edge > 0.0 {
                    let on_rim = a + (b - a) * ((next - passed) / edge);
                    let outward = (b - a).perpendicular() * (0.5 * metal.gauge / edge);
                    for p in [on_rim, on_rim - outward, on_rim + outward] {
                        if let Some(place) = metal.locate(p, 0.0) {
                            let value = metal.at(place.triangle).magnitude;
                            if best.is_none_or(|b| value > b.0) {
                                best = Some((value, place));
                            }
                        }
                    }
                    next += length / SAMPLES as f64;
                }
                passed += edge;
            }
        }
        let near = |p: Point| {
            rim.iter().any(|points| {
                (0..points.len()).any(|i| nearest_on_segment(points[i], points[(i + 1) % points.len()], p).distance(p) <= reach)
            })
        };
        Some(Disc::new(metal).climb(best?.1, &near).0)
    }
}

/// What a disc covers.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Covered {
    /// Mean of |J|, A/mm².
    pub mean: f64,
    /// Mean of J.
    pub direction: Point,
    /// Roughly the middle of the metal under the disc.
    pub middle: Point,
    /// Part of the metal under it that lies in triangles with an edge longer than [`RESOLVED`] diameters.
    pub coarse: f64,
    /// Longest edge of a triangle under it, mm.
    pub longest: f64,
}

/// Evaluates discs on one sheet; holds the marks of the flood.
pub struct Disc<'a> {
    metal: &'a LayerMetal,
    stamps: Vec<u32>,
    round: u32,
    stack: Vec<u32>,
}

impl<'a> Disc<'a> {
    /// For discs on this sheet.
    pub fn new(metal: &'a LayerMetal) -> Self {
        Self { metal, stamps: vec![0; metal.triangles.len()], round: 0, stack: Vec::new() }
    }

    /// Calls `visit` for the triangles that a disc covers and that hang together within it, with the covered area.
    pub fn flood(&mut self, from: Place, diameter: f64, mut visit: impl FnMut(u32, f64)) {
        let radius = 0.5 * diameter;
        let meets = |a: Point, b: Point| {
            let nearest = nearest_on_segment(a, b, Point::default());
            nearest.dot(nearest) < radius * radius
        };
        self.round += 1;
        self.stack.push(from.triangle);
        self.stamps[from.triangle as usize] = self.round;
        while let Some(t) = self.stack.pop() {
            let triangle = self.metal.at(t);
            let corners = triangle.corners.map(|c| c - from.point);
            let inside = corners.map(|c| c.dot(c) <= radius * radius);
            visit(t, if inside == [true; 3] { triangle.area } else { circle_over_triangle(corners, radius) });
            for k in 0..3 {
                let other = triangle.neighbours[k];
                if other != NONE && self.stamps[other as usize] != self.round {
                    let (i, j) = ((k + 1) % 3, (k + 2) % 3);
                    if inside[i] || inside[j] || meets(corners[i], corners[j]) {
                        self.stamps[other as usize] = self.round;
                        self.stack.push(other);
                    }
                }
            }
        }
    }

    /// The means over a disc of some diameter.
    pub fn mean(&mut self, centre: Place, diameter: f64) -> Covered {
        let metal = self.metal;
        let mut sum = Covered::default();
        let mut area = 0.0;
        self.flood(centre, diameter, |t, part| {
            let triangle = metal.at(t);
            area += part;
            sum.mean += part * triangle.magnitude;
            sum.direction = sum.direction + triangle.density * part;
            sum.middle = sum.middle + triangle.middle() * part;
            let longest = triangle.longest();
            sum.longest = sum.longest.max(longest);
            if longest > RESOLVED * diameter {
                sum.coarse += part;
            }
        });
        if area > 0.0 {
            sum.mean /= area;
            sum.coarse /= area;
            (sum.direction, sum.middle) = (sum.direction * (1.0 / area), sum.middle * (1.0 / area));
        }
        sum
    }

    /// Goes uphill from a start by steps that get smaller: in eight directions, or, where the disc is clipped, inward, outward and along the edge
    /// of the metal and back against it, so that a curved edge can be followed. Centres stay on the metal and where `allowed`.
    pub fn climb(&mut self, start: Place, allowed: &dyn Fn(Point) -> bool) -> (f64, Place) {
        const HALF: f64 = std::f64::consts::FRAC_1_SQRT_2;
        const WAYS: [(f64, f64); 8] =
            [(1.0, 0.0), (HALF, HALF), (0.0, 1.0), (-HALF, HALF), (-1.0, 0.0), (-HALF, -HALF), (0.0, -1.0), (HALF, -HALF)];
        let metal = self.metal;
        let gauge = metal.gauge;
        let mut best = (self.mean(start, gauge), start);
        // Wider than the chords of a small hole: the corners of its polygon are no places of their own.
        let mut step = 1.6 * gauge;
        let mut moves = 0;
        let mut round_corners = true;
        while moves < 40 {
            if step <= 0.03 * gauge {
                // A step never turns a corner of the metal's edge: what lies behind one is looked at once, at the end.
                let behind = if round_corners { self.best_on_edge(best, allowed) } else { None };
                let Some(better) = behind else { break };
                (best, step, round_corners) = (better, 0.2 * gauge, false);
            }
            let (at, inward) = (best.1, best.0.middle - best.1.point);
            let tried: Vec<Place> = if inward.norm() > 0.05 * gauge {
                let inward = inward * (step / inward.norm());
                let pressed = [inward.perpendicular(), -inward.perpendicular()].map(|side| {
                    let aside = metal.moved(at, at.point + inward * 0.5 + side);
                    metal.moved(aside, aside.point - inward * 2.0)
                });
                let across = [inward, -inward].map(|way| metal.moved(at, at.point + way));
                pressed.into_iter().chain(across).collect()
            } else {
                WAYS.iter().map(|&(x, y)| metal.moved(at, at.point + Point::new(x, y) * step)).collect()
            };
            let mut better = best;
            for place in tried {
                if allowed(place.point) {
                    let covered = self.mean(place, gauge);
                    if covered.mean > better.0.mean * (1.0 + 1e-7) {
                        better = (covered, place);
                    }
                }
            }
            if better.0.mean > best.0.mean {
                best = better;
                moves += 1;
            } else {
                step *= 0.45;
            }
        }
        (best.0.mean, best.1)
    }

    /// The best centre on the edges of the connected metal within a gauge, when it is better than the one given.
    fn best_on_edge(&mut self, best: (Covered, Place), allowed: &dyn Fn(Point) -> bool) -> Option<(Covered, Place)> {
        let (metal, gauge) = (self.metal, self.metal.gauge);
        let mut centres = Vec::new();
        self.flood(best.1, 2.0 * gauge, |t, _| {
            let triangle = metal.at(t);
            for k in (0..3).filter(|&k| triangle.neighbours[k] == NONE) {
                let (a, b) = (triangle.corners[(k + 1) % 3], triangle.corners[(k + 2) % 3]);
                let pieces = (a.distance(b) / (0.1 * gauge)).ceil().clamp(1.0, 20.0) as usize;
                let point = |i: usize| a + (b - a) * ((i as f64 + 0.5) / pieces as f64);
                centres.extend((0..pieces).map(|i| Place { triangle: t, point: point(i) }).filter(|c| allowed(c.point)));
            }
        });
        let near = centres.into_iter().filter(|c| c.point.distance(best.1.point) <= gauge);
        let top = near.map(|c| (self.mean(c, gauge), c)).reduce(|a, b| if b.0.mean > a.0.mean { b } else { a })?;
        (top.0.mean > best.0.mean * (1.0 + 1e-7)).then_some(top)
    }
}

/// Area of a triangle (counter-clockwise, seen from the circle's centre) within a circle: exact.
fn circle_over_triangle(corners: [Point; 3], radius: f64) -> f64 {
    let square = radius * radius;
    // Chords give triangles with the centre, the stretches between them sectors; the sectors' angles are added by multiplying rotations.
    let mut chords = 0.0;
    let mut turn = Point::new(1.0, 0.0);
    let mut any_chord = false;
    let mut centre_inside = true;
    let mut sector = |a: Point, b: Point| {
        let (cos, sin) = (a.dot(b), a.cross(b));
        turn = Point::new(turn.x * cos - turn.y * sin, turn.x * sin + turn.y * cos);
    };
    for k in 0..3 {
        let (a, b) = (corners[k], corners[(k + 1) % 3]);
        centre_inside &= a.cross(b) > 0.0;
        let way = b - a;
        let (aa, ab, ac) = (way.dot(way), a.dot(way), a.dot(a) - square);
        let under_root = ab * ab - aa * ac;
        let root = under_root.max(0.0).sqrt();
        let (enter, leave) = ((-ab - root) / aa, (-ab + root) / aa);
        if under_root <= 0.0 || enter >= 1.0 || leave <= 0.0 {
            sector(a, b);
        } else {
            any_chord = true;
            let (p, q) = (a + way * enter.max(0.0), a + way * leave.min(1.0));
            chords += 0.5 * p.cross(q);
            if enter > 0.0 {
                sector(a, p);
            }
            if leave < 1.0 {
                sector(q, b);
            }
        }
    }
    if !any_chord {
        return if centre_inside { std::f64::consts::PI * square } else { 0.0 };
    }
    let angle = turn.y.atan2(turn.x);
    // Between no angle and a full turn; a hair below zero is rounding.
    let angle = if angle < -1e-9 { angle + std::f64::consts::TAU } else { angle };
    (chords + 0.5 * square * angle).max(0.0)
}

#[cfg(test)]
mod tests {
    use super::super::trial::*;
    use super::*;

    /// Gauge mean at a point of a sheet; `None` off the metal.
    fn gauge_mean(density: &DensityField, layer: usize, centre: Point) -> Option<f64> {
        let metal = &density.layers[layer];
        let place = metal.locate(centre, 1e-3)?;
        Some(Disc::new(metal).mean(place, metal.gauge).mean)
    }

    #[test]
    fn circle_and_triangle_share_the_area_that_counting_finds() {
        let mut random = fastrand::Rng::with_seed(7);
        for _ in 0..200 {
            let mut corners = [0; 3].map(|_| Point::new(random.f64() * 4.0 - 2.0, random.f64() * 4.0 - 2.0));
            if (corners[1] - corners[0]).cross(corners[2] - corners[0]) < 0.0 {
                corners.swap(1, 2);
            }
            let n = 400;
            let mut counted = 0.0;
            for i in 0..n {
                for j in 0..n {
                    let p = Point::new((i as f64 + 0.5) / n as f64 * 2.0 - 1.0, (j as f64 + 0.5) / n as f64 * 2.0 - 1.0);
                    let inside = (0..3).all(|k| (corners[(k + 1) % 3] - corners[k]).cross(p - corners[k]) >= 0.0);
                    counted += if inside && p.norm() <= 1.0 { 4.0 / (n * n) as f64 } else { 0.0 };
                }
            }
            let exact = circle_over_triangle(corners, 1.0);
            assert!((exact - counted).abs() < 0.01, "{corners:?} {exact} {counted}");
        }
    }

    #[test]
    fn a_disc_does_not_reach_across_a_slit() {
        // Two strips 0.1 mm apart, joined at the right end: the current runs along both of them, but only the lower one is fed strongly.
        let ring = polygon(&[(0.0, 0.0), (40.0, 0.0), (40.0, 4.1), (0.0, 4.1), (0.0, 2.1), (30.0, 2.1), (30.0, 2.0), (0.0, 2.0)]);
        let ends = terminals(line(&[(0.0, 0.0), (0.0, 2.0)]), line(&[(40.0, 0.0), (40.0, 2.0)]), 0, 2.0);
        let job = problem(vec![sheet("a", vec![ring], 1.0)], ends, 1e-3, 1.0);
        let (_, density, _) = surveyed(&job);
        let mean = |y: f64| gauge_mean(&density, 0, Point::new(10.0, y)).unwrap();
        assert!((mean(1.99) - 1.0).abs() < 1e-3 && mean(2.11) < 1e-3, "{} {}", mean(1.99), mean(2.11));
        assert_eq!(gauge_mean(&density, 0, Point::new(10.0, 2.05)), None);
    }

    #[test]
    fn the_density_around_a_nugget_falls_like_one_over_the_radius() {
        // Radial flow: J = I / (2 pi r t); the disc of 0.2 mm that touches the rim of 2 mm has its middle at 2.1 mm.
        let ring = crate::geometry::Ring::circle(Point::default(), 30.0);
        let rim = ring.flattened();
        let closed = rim.iter().copied().chain(rim.first().copied()).collect();
        let ends = terminals(disc(0.0, 0.0, 4.0), crate::problem::Footprint::Line { points: closed }, 0, 10.0);
        let job = problem(vec![sheet("a", vec![ring], 1.0)], ends, 2e-4, 0.2);
        let (_, density, survey) = surveyed(&job);
        let expected = 10.0 / (std::f64::consts::TAU * 2.1);
        let nugget = crate::geometry::Ring::circle(Point::default(), 4.0).flattened();
        let found = density.rim_peak(LayerId(0), &[nugget]).unwrap();
        assert!((found / expected - 1.0).abs() < 0.03, "{found} {expected}");
        assert!((survey.rows[0].peak_a_mm2 / found - 1.0).abs() < 0.03);
        let far = gauge_mean(&density, 0, Point::new(0.0, 8.0)).unwrap();
        assert!((far / (10.0 / (std::f64::consts::TAU * 8.0)) - 1.0).abs() < 0.03, "{far}");
    }

    #[test]
    fn bonded_sheets_share_by_their_conductances() {
        let body = || vec![polygon(&[(0.0, 0.0), (20.0, 0.0), (20.0, 5.0), (0.0, 5.0)])];
        let ends = terminals(line(&[(0.0, 0.0), (0.0, 5.0)]), line(&[(20.0, 0.0), (20.0, 5.0)]), 0, 6.0);
        let mut job = problem(vec![sheet("a", body(), 0.2), sheet("b", body(), 0.4)], ends, 1e-3, 0.5);
        job.contacts.push(crate::problem::Contact {
            name: "c".into(),
            between: [LayerId(0), LayerId(1)],
            area: None,
            interface: crate::problem::Interface::Bonded,
        });
        let (_, density, survey) = surveyed(&job);
        for layer in [0, 1] {
            let mean = gauge_mean(&density, layer, Point::new(10.0, 2.5)).unwrap();
            assert!((mean - 2.0).abs() < 1e-9, "{mean}");
        }
        let crossing = super::super::section::crossing_current(&density, Point::new(7.0, -1.0), Point::new(7.0, 6.0)).unwrap();
        assert!((crossing[0] - 2.0).abs() < 1e-9 && (crossing[1] - 4.0).abs() < 1e-9, "{crossing:?}");
        assert_eq!(survey.rows.len(), 2);
    }
}
