//! Closed rings whose edges are straight or circular arcs, and their flattening to polygons of equal area.

use super::{BoundingBox, Point};

/// Largest distance between an arc and its chords, in mm. Part of the statement: intervals hold for the flattened outline.
pub const SAGITTA: f64 = 0.002;

/// Fewest edges by which a full circle is replaced, however small it is.
pub const CIRCLE_EDGES: usize = 36;

/// Largest distance between a weld spot's rim and its chords, in mm, where the spot lies clear of all outlines. Of two spots of one area,
/// the round one and its 36-sided stand-in spread current alike to 6e-5 in the logarithm of the diameter.
const SPOT_SAGITTA: f64 = 0.01;

/// Edges of a meter tip: for any field without sources the mean over a regular polygon of so many edges is that over the disc
/// but for terms of the twelfth order.
const TIP_EDGES: usize = 12;

/// A corner of a ring and the edge that leaves it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Vertex {
    /// Where.
    pub point: Point,
    /// tan(angle / 4) of the arc to the next vertex: 0 straight, + counter-clockwise, ±1 half a circle.
    pub bulge: f64,
}

/// A closed ring: the last vertex's edge leads back to the first.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Ring {
    /// The corners in order; the first is not repeated.
    pub vertices: Vec<Vertex>,
}

impl Ring {
    /// A ring of straight edges.
    pub fn polygon(points: impl IntoIterator<Item = Point>) -> Self {
        Self { vertices: points.into_iter().map(|point| Vertex { point, bulge: 0.0 }).collect() }
    }

    /// A circle, counter-clockwise, as two half arcs that start at the right.
    pub fn circle(centre: Point, diameter: f64) -> Self {
        let r = Point::new(0.5 * diameter, 0.0);
        Self { vertices: vec![Vertex { point: centre + r, bulge: 1.0 }, Vertex { point: centre - r, bulge: 1.0 }] }
    }

    /// A straight bar of the given width with round ends from `a` to `b` (a weld seam).
    pub fn seam(a: Point, b: Point, width: f64) -> Self {
        let along = b - a;
        let length = along.norm();
        if length == 0.0 {
            return Self::circle(a, width);
        }
        let side = along.perpendicular() * (0.5 * width / length);
        let corner = |point, bulge| Vertex { point, bulge };
        Self { vertices: vec![corner(a - side, 0.0), corner(b - side, 1.0), corner(b + side, 0.0), corner(a + side, 1.0)] }
    }

    /// The edges as (start, bulge, end).
    pub fn edges(&self) -> impl Iterator<Item = (Point, f64, Point)> + '_ {
        let n = self.vertices.len();
        (0..n).map(move |i| (self.vertices[i].point, self.vertices[i].bulge, self.vertices[(i + 1) % n].point))
    }

    /// Exact area in mm², positive when counter-clockwise; arcs counted as arcs.
    pub fn signed_area(&self) -> f64 {
        let Some(first) = self.vertices.first() else { return 0.0 };
        let origin = first.point;
        self.edges()
            .map(|(a, bulge, b)| 0.5 * (a - origin).cross(b - origin) + Arc::new(a, bulge, b).map_or(0.0, |arc| arc.segment_area()))
            .sum()
    }

    /// The box around the flattened ring.
    pub fn bounding_box(&self) -> BoundingBox {
        BoundingBox::around(self.flattened())
    }

    /// The polygon that stands for the ring: straight edges kept; every arc cut into equal chords that stay within
    /// [`SAGITTA`] (and [`CIRCLE_EDGES`] to a full turn), whose inner points are moved outward so that the arc's area is kept exactly.
    pub fn flattened(&self) -> Vec<Point> {
        let mut points = Vec::with_capacity(self.vertices.len());
        for (a, bulge, b) in self.edges() {
            points.push(a);
            if let Some(arc) = Arc::new(a, bulge, b) {
                arc.push_inner_points(&mut points);
            }
        }
        // A circle's two end points lie on the circle itself; only a full circle can be blown up evenly.
        match self.as_circle() {
            Some((centre, _)) => round(centre, self.vertices[0].point - centre, self.vertices[0].bulge < 0.0, points.len()),
            None => points,
        }
    }

    /// Centre and radius, when the ring is one full circle of two half arcs.
    pub fn as_circle(&self) -> Option<(Point, f64)> {
        match self.vertices.as_slice() {
            [a, b] if a.bulge.abs() == 1.0 && a.bulge == b.bulge => Some((a.point.midpoint(b.point), 0.5 * a.point.distance(b.point))),
            _ => None,
        }
    }
}

/// The regular polygon of a circle's area: from the corner in the direction of `start` (a point of the circle as seen from its centre) on.
fn round(centre: Point, start: Point, clockwise: bool, edges: usize) -> Vec<Point> {
    let step = std::f64::consts::TAU / edges as f64;
    let start = start * (step / step.sin()).sqrt();
    let corner = |i: usize| {
        let (s, c) = (step * i as f64).sin_cos();
        let s = if clockwise { -s } else { s };
        centre + Point::new(start.x * c - start.y * s, start.x * s + start.y * c)
    };
    (0..edges).map(corner).collect()
}

/// The polygon that stands for a weld spot clear of all outlines: coarser than a drawn circle, of the same area.
pub fn spot(centre: Point, diameter: f64) -> Vec<Point> {
    let radius = 0.5 * diameter;
    let edges = (std::f64::consts::TAU / largest_step(radius, SPOT_SAGITTA)).ceil().min(100_000.0) as usize;
    round(centre, Point::new(radius, 0.0), false, edges)
}

/// The polygon that stands for a meter tip, of the same area.
pub fn tip(centre: Point, diameter: f64) -> Vec<Point> {
    round(centre, Point::new(0.5 * diameter, 0.0), false, TIP_EDGES)
}

/// The angle over which a chord may stretch.
fn largest_step(radius: f64, sagitta: f64) -> f64 {
    let by_sagitta = 2.0 * (1.0 - sagitta / radius).clamp(-1.0, 1.0).acos();
    by_sagitta.min(std::f64::consts::TAU / CIRCLE_EDGES as f64)
}

/// A circular arc between two points.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Arc {
    /// Centre of the circle.
    pub centre: Point,
    /// Radius in mm.
    pub radius: f64,
    /// Direction of the start as seen from the centre, radians.
    pub start: f64,
    /// Signed angle swept, + counter-clockwise, radians.
    pub sweep: f64,
}

impl Arc {
    /// The arc from `a` to `b` with this bulge; `None` for a straight or empty edge.
    pub fn new(a: Point, bulge: f64, b: Point) -> Option<Self> {
        let chord = b - a;
        let length = chord.norm();
        if bulge == 0.0 || length == 0.0 {
            return None;
        }
        let sweep = 4.0 * bulge.atan();
        let offset = chord.perpendicular() * (0.25 * (1.0 / bulge - bulge));
        let centre = a.midpoint(b) + offset;
        let radius = 0.25 * length * (bulge.abs() + 1.0 / bulge.abs());
        let from = a - centre;
        Some(Self { centre, radius, start: from.y.atan2(from.x), sweep })
    }

    /// The point after a part of the sweep (0 start, 1 end).
    pub fn point(&self, part: f64) -> Point {
        let angle = self.start + part * self.sweep;
        self.centre + Point::new(angle.cos(), angle.sin()) * self.radius
    }

    /// Signed area between chord and arc.
    fn segment_area(&self) -> f64 {
        0.5 * self.radius * self.radius * (self.sweep - self.sweep.sin())
    }

    /// Into how many chords it is cut.
    pub fn chords(&self) -> usize {
        let largest = largest_step(self.radius, SAGITTA);
        // 1e-9: a half circle of exactly n chords must not become n + 1 by rounding.
        ((self.sweep.abs() / largest - 1e-9).ceil() as usize).clamp(2, 100_000)
    }

    /// No chord leaves the arc by more than this, mm: inward by less than the sagitta, outward by at most four thirds of it, where there are two chords.
    pub fn deviation(&self) -> f64 {
        let quarter = 0.25 * self.sweep.abs() / self.chords() as f64;
        // A hundredth more covers the higher powers of the largest step.
        1.01 * 4.0 / 3.0 * 2.0 * self.radius * quarter.sin().powi(2)
    }

    /// The points between start and end of the polygon of equal area: they lie a little outside the arc.
    fn push_inner_points(&self, points: &mut Vec<Point>) {
        let n = self.chords();
        let step = self.sweep.abs() / n as f64;
        // Sector area kept: two triangles of sides (r, R) at the ends and n - 2 of (R, R) between; solve for R.
        let target = step * n as f64 / step.sin();
        let grown = if n == 2 {
            0.5 * target
        } else {
            let inner = (n - 2) as f64;
            (-2.0 + (4.0 + 4.0 * inner * target).sqrt()) / (2.0 * inner)
        };
        for i in 1..n {
            let on_arc = self.point(i as f64 / n as f64);
            points.push(self.centre + (on_arc - self.centre) * grown);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn area(points: &[Point]) -> f64 {
        (0..points.len()).map(|i| 0.5 * points[i].cross(points[(i + 1) % points.len()])).sum()
    }

    #[test]
    fn flattening_keeps_the_area_of_circles_seams_and_arcs() {
        let bent = Ring {
            vertices: [(0.0, 0.0, 0.0), (8.0, 0.0, 0.4142), (8.0, 5.0, 0.0), (0.0, 5.0, -0.3)]
                .map(|(x, y, bulge)| Vertex { point: Point::new(x, y), bulge })
                .to_vec(),
        };
        let disc = Ring::circle(Point::new(3.0, -2.0), 8.4);
        let seam = Ring::seam(Point::new(1.0, 1.0), Point::new(5.0, 4.0), 0.8);
        assert!((disc.signed_area() - std::f64::consts::PI * 4.2 * 4.2).abs() < 1e-12);
        assert!((seam.signed_area() - (4.0 + std::f64::consts::PI * 0.16)).abs() < 1e-12);
        for ring in [bent, disc, seam] {
            assert!((area(&ring.flattened()) / ring.signed_area() - 1.0).abs() < 1e-12, "{ring:?}");
        }
    }

    #[test]
    fn chords_leave_an_arc_by_no_more_than_its_deviation() {
        for sweep in [0.1f64, 0.35, 1.0, 3.0, 6.0] {
            for radius in [0.01, 0.5, 3.0, 400.0] {
                let (a, b) = (Point::new(radius, 0.0), Point::new(radius * sweep.cos(), radius * sweep.sin()));
                let bulge = (0.25 * sweep).tan();
                let arc = Arc::new(a, bulge, b).expect("an arc");
                let points = Ring { vertices: vec![Vertex { point: a, bulge }, Vertex { point: b, bulge: 0.0 }] }.flattened();
                let chords = points.windows(2).take(arc.chords());
                let most = chords.flat_map(|w| [w[0], w[0].midpoint(w[1])]).map(|p| (p.norm() - radius).abs()).fold(0.0, f64::max);
                let allowed = arc.deviation();
                assert!(most <= allowed && most > 0.4 * allowed, "{sweep} {radius}: {most} {allowed}");
                assert!(allowed <= 1.01 * 4.0 / 3.0 * SAGITTA);
            }
        }
    }

    #[test]
    fn chords_stay_within_the_stated_sagitta() {
        let disc = Ring::circle(Point::default(), 30.0);
        let n = disc.flattened().len();
        assert!(15.0 * (1.0 - (std::f64::consts::PI / n as f64).cos()) <= SAGITTA * 1.0001);
        assert_eq!(Ring::circle(Point::default(), 0.02).flattened().len(), CIRCLE_EDGES);
    }
}
