//! Current density per sheet and its gauge mean: the mean of |J| over a disc clipped to the connected metal that holds its centre.

use super::metal::{LayerMetal, Place, nearest_on_segment};
use crate::geometry::Point;
use crate::index::LayerId;
use crate::mesh::NONE;
use crate::physics::Solution;
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

    /// Gauge mean at a point of a sheet, A/mm²; `None` off the metal.
    pub fn gauge_mean(&self, layer: LayerId, centre: Point) -> Option<f64> {
        let metal = self.layers.get(layer.index())?;
        let place = metal.locate(centre, 1e-3)?;
        Some(Disc::new(metal).mean(place, metal.gauge).mean)
    }

    /// The largest gauge mean near a start, by a search that goes uphill, and its centre; `None` off the metal.
    pub fn gauge_peak_near(&self, layer: LayerId, start: Point) -> Option<(f64, Point)> {
        let metal = self.layers.get(layer.index())?;
        let (mean, place) = Disc::new(metal).climb(metal.locate(start, 1e-3)?, &|_| true);
        Some((mean, place.point))
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
    /// Longest edge of a triangle under it.
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
                    if inside[i] || inside[j] || nearest_on_segment(corners[i], corners[j], Point::default()).norm() < radius {
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
            if part > 0.0 {
                sum.longest = sum.longest.max(triangle.longest());
            }
        });
        if area > 0.0 {
            sum.mean /= area;
            (sum.direction, sum.middle) = (sum.direction * (1.0 / area), sum.middle * (1.0 / area));
        }
        sum
    }

    /// Goes uphill from a start by steps that are halved: eight directions, and two along the edge of the metal and back against it, so that a
    /// curved edge can be followed. Centres stay on the metal and where `allowed`.
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
        while step > 0.02 * gauge && moves < 40 {
            let (at, inward) = (best.1, best.0.middle - best.1.point);
            let free = WAYS.map(|(x, y)| metal.moved(at, at.point + Point::new(x, y) * step));
            let edge = (inward.norm() > 0.05 * gauge).then(|| {
                let inward = inward * (step / inward.norm());
                [inward.perpendicular(), -inward.perpendicular()].map(|side| {
                    let aside = metal.moved(at, at.point + inward * 0.5 + side);
                    metal.moved(aside, aside.point - inward)
                })
            });
            let mut better = best;
            for place in free.into_iter().chain(edge.into_iter().flatten()) {
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
                step *= 0.5;
            }
        }
        (best.0.mean, best.1)
    }
}

/// Area of a triangle (counter-clockwise, seen from the circle's centre) within a circle: exact.
fn circle_over_triangle(corners: [Point; 3], radius: f64) -> f64 {
    let square = radius * radius;
    let sector = |a: Point, b: Point| 0.5 * square * a.cross(b).atan2(a.dot(b));
    let mut sum = 0.0;
    for k in 0..3 {
        let (a, b) = (corners[k], corners[(k + 1) % 3]);
        let way = b - a;
        let (aa, ab, ac) = (way.dot(way), a.dot(way), a.dot(a) - square);
        let root = ab * ab - aa * ac;
        let (enter, leave) = if root > 0.0 { ((-ab - root.sqrt()) / aa, (-ab + root.sqrt()) / aa) } else { (2.0, 2.0) };
        if enter >= 1.0 || leave <= 0.0 {
            sum += sector(a, b);
        } else {
            let (p, q) = (a + way * enter.max(0.0), a + way * leave.min(1.0));
            sum += 0.5 * p.cross(q);
            if enter > 0.0 {
                sum += sector(a, p);
            }
            if leave < 1.0 {
                sum += sector(q, b);
            }
        }
    }
    sum.max(0.0)
}
