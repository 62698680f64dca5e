//! The parts of a boundary from which a clearance can start: straight edges, arcs of a quarter turn at most, corner tips.

use crate::geometry::ring::Arc;
use crate::geometry::{Point, Ring};

/// Relative size below which a parameter lies on an end, and an overlap is none.
const END: f64 = 1e-9;

/// Sine of the angle below which edges are parallel and a corner is smooth: outlines are written with few digits.
const PARALLEL: f64 = 1e-6;

/// The medium through which is measured.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Side {
    /// Left of every edge.
    Metal,
    /// Right of every edge.
    Void,
}

/// A part of a boundary, run through with the metal on its left.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Feature {
    /// A straight edge.
    Straight {
        /// Start and end.
        ends: [Point; 2],
        /// Whether the boundary goes on there without a corner.
        smooth: [bool; 2],
    },
    /// An arc of a quarter turn at most.
    Bent {
        /// Start and end.
        ends: [Point; 2],
        /// Whether the boundary goes on there without a corner.
        smooth: [bool; 2],
        /// Of the circle.
        centre: Point,
        /// Of the circle, mm.
        radius: f64,
        /// True when it turns left: the metal is towards the centre.
        left: bool,
    },
    /// The tip of a corner.
    Tip {
        /// Where.
        at: Point,
        /// Direction in which the boundary arrives and in which it leaves.
        along: [Point; 2],
        /// The medium into which it points.
        side: Side,
    },
}

/// Appends the features of one ring; `metal_left` says on which side of the ring as stored the metal lies.
pub fn features_of(ring: &Ring, metal_left: bool, features: &mut Vec<Feature>) {
    let mut edges: Vec<(Point, f64, Point)> = ring.edges().filter(|(a, _, b)| a != b).collect();
    if !metal_left {
        edges = edges.into_iter().rev().map(|(a, bulge, b)| (b, -bulge, a)).collect();
    }
    let tangents: Vec<[Point; 2]> = edges.iter().map(|&(a, bulge, b)| tangents(a, bulge, b)).collect();
    let count = edges.len();
    let turn = |i: usize| Turn::between(tangents[(i + count - 1) % count][1], tangents[i][0]);
    for (i, &(a, bulge, b)) in edges.iter().enumerate() {
        let (start, end) = (turn(i), turn((i + 1) % count));
        let smooth = [start == Turn::None, end == Turn::None];
        features.extend(parts(a, bulge, b, smooth));
        let along = [tangents[(i + count - 1) % count][1], tangents[i][0]];
        match start {
            Turn::None => {}
            Turn::Left => features.push(Feature::Tip { at: a, along, side: Side::Void }),
            Turn::Right => features.push(Feature::Tip { at: a, along, side: Side::Metal }),
        }
    }
}

/// The parts of one edge; `smooth` says whether the boundary goes on at its ends without a corner: without, the very ends are no part of it.
pub fn parts(a: Point, bulge: f64, b: Point, smooth: [bool; 2]) -> Vec<Feature> {
    let Some(arc) = Arc::new(a, bulge, b) else { return vec![Feature::Straight { ends: [a, b], smooth }] };
    let parts = (arc.sweep.abs() / std::f64::consts::FRAC_PI_2 - END).ceil().clamp(1.0, 4.0) as usize;
    let point = |k: usize| match k {
        0 => a,
        k if k == parts => b,
        k => arc.point(k as f64 / parts as f64),
    };
    let part = |k: usize| Feature::Bent {
        ends: [point(k), point(k + 1)],
        smooth: [k > 0 || smooth[0], k + 1 < parts || smooth[1]],
        centre: arc.centre,
        radius: arc.radius,
        left: arc.sweep > 0.0,
    };
    (0..parts).map(part).collect()
}

/// How a boundary turns at a vertex.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Turn {
    None,
    Left,
    Right,
}

impl Turn {
    fn between(arriving: Point, leaving: Point) -> Self {
        let sine = arriving.cross(leaving);
        if sine.abs() <= PARALLEL && arriving.dot(leaving) > 0.0 {
            Self::None
        } else if sine > 0.0 {
            Self::Left
        } else {
            Self::Right
        }
    }
}

/// Directions of an edge at its start and its end.
fn tangents(a: Point, bulge: f64, b: Point) -> [Point; 2] {
    match Arc::new(a, bulge, b) {
        None => [unit(b - a); 2],
        Some(arc) => [a, b].map(|p| unit((p - arc.centre).perpendicular() * arc.sweep.signum())),
    }
}

fn unit(v: Point) -> Point {
    let length = v.norm();
    if length > 0.0 { v * (1.0 / length) } else { v }
}

impl Feature {
    /// True for the tip of a corner.
    fn is_tip(&self) -> bool {
        matches!(self, Self::Tip { .. })
    }

    /// True for a straight edge.
    pub fn is_straight(&self) -> bool {
        matches!(self, Self::Straight { .. })
    }

    /// A convex polygon around it.
    pub fn hull(&self) -> Vec<Point> {
        match *self {
            Self::Straight { ends, .. } => ends.to_vec(),
            Self::Tip { at, .. } => vec![at],
            Self::Bent { ends, centre, radius, .. } => vec![ends[0], outside(ends, centre, radius), ends[1]],
        }
    }

    /// A convex polygon around everything in this medium that it could face from `near` to `far` away; `None` where there is nothing such.
    pub fn beam(&self, side: Side, near: f64, far: f64) -> Option<Vec<Point>> {
        let away = |p: Point, reach: f64| p + self.normal(p, side) * reach;
        match *self {
            Self::Straight { ends: [a, b], .. } => Some(vec![away(a, near), away(b, near), away(b, far), away(a, far)]),
            Self::Bent { ends, centre, radius, .. } if self.bend(side) > 0.0 => {
                let (low, high) = (ends.map(|p| away(p, near)), ends.map(|p| away(p, far)));
                Some(vec![low[0], high[0], outside(high, centre, radius + far), high[1], low[1]])
            }
            Self::Bent { ends, centre, radius, .. } => {
                // Beyond the centre nothing is faced: moving along the arc would shorten the way.
                let (low, high) = (ends.map(|p| away(p, near)), ends.map(|p| away(p, far.min(radius))));
                (near < radius).then(|| vec![high[0], low[0], outside(low, centre, radius - near), low[1], high[1]])
            }
            Self::Tip { at, along, side: into } => {
                if into != side {
                    return None;
                }
                const PARTS: usize = 4;
                let [first, last] = along.map(|t| if side == Side::Metal { t.perpendicular() } else { -t.perpendicular() });
                let angle = first.cross(last).atan2(first.dot(last));
                let grown = far / (0.5 * angle / PARTS as f64).cos();
                let turned = |part: f64, length: f64| {
                    let (sine, cosine) = (part * angle).sin_cos();
                    at + Point::new(first.x * cosine - first.y * sine, first.x * sine + first.y * cosine) * length
                };
                let middle = (0..PARTS).map(|k| turned((k as f64 + 0.5) / PARTS as f64, grown));
                Some([turned(0.0, near), turned(0.0, far)].into_iter().chain(middle).chain([turned(1.0, far), turned(1.0, near)]).collect())
            }
        }
    }

    /// The pairs of points, the first on `self`, at which both face each other through this medium with no shorter way nearby.
    pub fn facing(&self, other: &Self, side: Side) -> Vec<(Point, Point)> {
        let mut pairs = Vec::new();
        for (p, q) in self.candidates(other) {
            let gap = q - p;
            let distance = gap.norm();
            let way = unit(gap);
            if distance > 0.0 && self.holds(p) && other.holds(q) && self.leaves(p, way, side) && other.leaves(q, -way, side) {
                let (a, b) = (self.bend(side), other.bend(side));
                // Moving both ends must not shorten the way: the second derivatives must have no negative direction.
                let tip = self.is_tip() || other.is_tip();
                let slack = END / distance;
                if tip || (a + 1.0 / distance >= -slack && b + 1.0 / distance >= -slack && a * b * distance + a + b >= -slack) {
                    pairs.push((p, q));
                }
            }
        }
        pairs
    }

    /// The points, the first on `self`, at which two edges with their ends are nearest to each other. Edges that cross have no pair at the crossing:
    /// theirs is one at an end, or one where a bend reaches deepest across the other.
    pub fn nearest(&self, other: &Self) -> Option<(Point, Point)> {
        let others = other.with_ends();
        let pairs = self.with_ends().into_iter().flat_map(|one| {
            let near = others
                .iter()
                .flat_map(move |other| one.candidates(other).into_iter().filter(move |&(p, q)| one.holds(p) && other.holds(q)));
            near.collect::<Vec<_>>()
        });
        pairs.min_by(|a, b| a.0.distance(a.1).total_cmp(&b.0.distance(b.1)))
    }

    /// Itself and its ends as tips, whose directions do not matter here.
    fn with_ends(self) -> Vec<Self> {
        match self {
            Self::Straight { ends, .. } | Self::Bent { ends, .. } => {
                [self].into_iter().chain(ends.map(|at| Self::Tip { at, along: [Point::default(); 2], side: Side::Metal })).collect()
            }
            Self::Tip { .. } => vec![self],
        }
    }

    /// Pairs at which the distance is stationary; whether they lie on the features is not yet asked.
    fn candidates(&self, other: &Self) -> Vec<(Point, Point)> {
        match (*self, *other) {
            (Self::Tip { at: p, .. }, Self::Tip { at: q, .. }) => vec![(p, q)],
            (Self::Tip { at, .. }, Self::Straight { ends, .. }) => vec![(at, foot(ends, at))],
            (Self::Tip { at, .. }, Self::Bent { ends, centre, radius, .. }) => {
                let ray = if at == centre { ends[0].midpoint(ends[1]) - centre } else { at - centre };
                vec![(at, centre + unit(ray) * radius)]
            }
            (Self::Straight { ends: [a, b], .. }, Self::Straight { ends: [c, d], .. }) => {
                let along = unit(b - a);
                if along.cross(unit(d - c)).abs() > PARALLEL {
                    return vec![];
                }
                let part = |p: Point| (p - a).dot(along);
                let (low, high) = (part(c).min(part(d)).max(0.0), part(c).max(part(d)).min(part(b)));
                if high - low <= END * part(b) {
                    return vec![];
                }
                let p = a + along * (0.5 * (low + high));
                vec![(p, foot([c, d], p))]
            }
            (Self::Straight { ends, .. }, Self::Bent { centre, radius, .. }) => {
                let p = foot(ends, centre);
                let ray = unit((ends[1] - ends[0]).perpendicular()) * radius;
                vec![(p, centre + ray), (p, centre - ray)]
            }
            (Self::Bent { centre: c, radius: r, ends, .. }, Self::Bent { centre: d, radius: s, ends: others, .. }) => {
                if c.distance(d) > END * (r + s) {
                    let ray = unit(d - c);
                    return [(r, s), (r, -s), (-r, s), (-r, -s)].map(|(r, s)| (c + ray * r, d + ray * s)).to_vec();
                }
                // Concentric: as long as the common sector; both its ends and its middle are tried.
                let shared: Vec<Point> =
                    ends.iter().filter(|&&p| other.sees(p)).chain(others.iter().filter(|&&p| self.sees(p))).copied().collect();
                let rays: Vec<Point> = shared.iter().map(|&p| unit(p - c)).collect();
                let middle = rays.iter().fold(Point::default(), |sum, &ray| sum + ray);
                if middle.norm() <= END { vec![] } else { vec![(c + unit(middle) * r, d + unit(middle) * s)] }
            }
            _ => other.candidates(self).into_iter().map(|(q, p)| (p, q)).collect(),
        }
    }

    /// Whether a point of its line or circle lies on it, an end only where the boundary goes on smoothly.
    fn holds(&self, p: Point) -> bool {
        let (parts, smooth) = match *self {
            Self::Tip { .. } => return true,
            Self::Straight { ends: [a, b], smooth } => {
                let along = b - a;
                let part = (p - a).dot(along) / along.dot(along);
                ([part, 1.0 - part], smooth)
            }
            Self::Bent { ends, smooth, centre, radius, left } => {
                let ray = p - centre;
                if ray.dot(ends[0] + ends[1] - centre * 2.0) <= 0.0 {
                    return false;
                }
                let sign = if left { 1.0 } else { -1.0 } / (radius * radius);
                ([sign * (ends[0] - centre).cross(ray), sign * ray.cross(ends[1] - centre)], smooth)
            }
        };
        parts.iter().zip(smooth).all(|(&part, smooth)| if smooth { part >= -END } else { part > END })
    }

    /// Whether the ray from the centre through `p` meets the arc.
    fn sees(&self, p: Point) -> bool {
        let Self::Bent { ends, centre, radius, left, .. } = *self else { return false };
        Self::Bent { ends, smooth: [true; 2], centre, radius, left }.holds(centre + unit(p - centre) * radius)
    }

    /// Whether a way that starts here in this direction enters the medium with no shorter way beside it.
    fn leaves(&self, p: Point, way: Point, side: Side) -> bool {
        match *self {
            Self::Tip { along: [arriving, leaving], side: into, .. } => {
                into == side && arriving.dot(way) >= -PARALLEL && leaving.dot(way) <= PARALLEL
            }
            _ => {
                let normal = self.normal(p, side);
                normal.dot(way) > 0.0 && normal.cross(way).abs() <= PARALLEL
            }
        }
    }

    /// Unit vector into the medium.
    fn normal(&self, p: Point, side: Side) -> Point {
        let into_metal = match *self {
            Self::Straight { ends: [a, b], .. } => unit((b - a).perpendicular()),
            Self::Bent { centre, left, .. } => unit(centre - p) * if left { 1.0 } else { -1.0 },
            Self::Tip { .. } => Point::default(),
        };
        if side == Side::Metal { into_metal } else { -into_metal }
    }

    /// Curvature, positive where it bulges into the medium.
    fn bend(&self, side: Side) -> f64 {
        match *self {
            Self::Bent { radius, left, .. } if left == (side == Side::Metal) => -1.0 / radius,
            Self::Bent { radius, .. } => 1.0 / radius,
            _ => 0.0,
        }
    }

    /// Whether it crosses or touches the inner part of the segment.
    pub fn crosses(&self, from: Point, to: Point) -> bool {
        const NEAR_END: f64 = 1e-7;
        let way = to - from;
        let inner = |part: f64| part > NEAR_END && part < 1.0 - NEAR_END;
        match *self {
            Self::Tip { .. } => false,
            Self::Straight { ends: [a, b], .. } => {
                let along = b - a;
                let area = way.cross(along);
                if area.abs() <= END * way.norm() * along.norm() {
                    return false;
                }
                let here = (a - from).cross(along) / area;
                let there = (a - from).cross(way) / area;
                inner(here) && (-END..=1.0 + END).contains(&there)
            }
            Self::Bent { ends, centre, radius, left, .. } => {
                let (a, b) = (way.dot(way), way.dot(from - centre));
                let c = (from - centre).dot(from - centre) - radius * radius;
                let root = b * b - a * c;
                if root <= 0.0 {
                    return false;
                }
                let closed = Self::Bent { ends, smooth: [true; 2], centre, radius, left };
                [-root.sqrt(), root.sqrt()]
                    .into_iter()
                    .map(|root| (root - b) / a)
                    .any(|part| inner(part) && closed.holds(from + way * part))
            }
        }
    }
}

/// The foot of a perpendicular on the line through two points.
fn foot([a, b]: [Point; 2], p: Point) -> Point {
    let along = b - a;
    a + along * ((p - a).dot(along) / along.dot(along))
}

/// Where the tangents at the ends of a short arc of this circle meet.
fn outside(ends: [Point; 2], centre: Point, radius: f64) -> Point {
    let middle = ends[0].midpoint(ends[1]) - centre;
    let cosine = middle.norm() / radius;
    if cosine > 0.0 { centre + unit(middle) * (radius / cosine) } else { ends[0] }
}
