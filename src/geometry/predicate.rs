//! Orientation and crossing of segments with an exact sign.

use super::Point;
use robust::{Coord, orient2d};

/// On which side of the line from `a` to `b` the point `c` lies: > 0 left, < 0 right, 0 exactly on it.
pub fn side(a: Point, b: Point, c: Point) -> f64 {
    let coord = |p: Point| Coord { x: p.x, y: p.y };
    orient2d(coord(a), coord(b), coord(c))
}

/// True when the closed segments have at least one point in common (decided exactly).
pub fn segments_meet(a: Point, b: Point, c: Point, d: Point) -> bool {
    let (s1, s2) = (side(a, b, c), side(a, b, d));
    let (s3, s4) = (side(c, d, a), side(c, d, b));
    let apart = |s: f64, t: f64| (s > 0.0 && t > 0.0) || (s < 0.0 && t < 0.0);
    if apart(s1, s2) || apart(s3, s4) {
        return false;
    }
    // Collinear segments meet when their boxes do; in every other case the boxes meet as well.
    let ranges_meet = |p: f64, q: f64, r: f64, s: f64| p.min(q) <= r.max(s) && r.min(s) <= p.max(q);
    ranges_meet(a.x, b.x, c.x, d.x) && ranges_meet(a.y, b.y, c.y, d.y)
}

/// True when `p` lies exactly on the closed segment.
pub fn on_segment(a: Point, b: Point, p: Point) -> bool {
    side(a, b, p) == 0.0 && p.x >= a.x.min(b.x) && p.x <= a.x.max(b.x) && p.y >= a.y.min(b.y) && p.y <= a.y.max(b.y)
}

/// Where two segments that meet do so, to rounding; an end that lies on the other one is given exactly.
pub fn meeting_point(a: Point, b: Point, c: Point, d: Point) -> Point {
    for (p, from, to) in [(c, a, b), (d, a, b), (a, c, d), (b, c, d)] {
        if on_segment(from, to, p) {
            return p;
        }
    }
    let (along, other) = (b - a, d - c);
    let turn = along.cross(other);
    if turn == 0.0 { a.midpoint(b) } else { a + along * ((c - a).cross(other) / turn).clamp(0.0, 1.0) }
}

/// The point of the segment nearest to `p`.
pub fn nearest_on_segment(a: Point, b: Point, p: Point) -> Point {
    let along = b - a;
    let length = along.dot(along);
    let part = if length > 0.0 { (p - a).dot(along) / length } else { 0.0 };
    if part <= 0.0 {
        a
    } else if part >= 1.0 {
        b
    } else {
        a + along * part
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn meeting_is_exact_where_rounding_would_mislead() {
        let p = Point::new;
        assert!(segments_meet(p(0.0, 0.0), p(1.0, 1.0), p(0.0, 1.0), p(1.0, 0.0)));
        assert!(segments_meet(p(0.0, 0.0), p(2.0, 0.0), p(1.0, 0.0), p(1.0, 5.0)), "a touch counts");
        assert!(segments_meet(p(0.0, 0.0), p(2.0, 0.0), p(1.0, 0.0), p(3.0, 0.0)), "lying on each other counts");
        assert!(!segments_meet(p(0.0, 0.0), p(1.0, 0.0), p(1.0 + f64::EPSILON, 0.0), p(3.0, 0.0)));
        let above = 0.5 + f64::EPSILON;
        assert!(!segments_meet(p(0.0, 0.0), p(1.0, 1.0), p(0.5, above), p(0.0, 1.0)));
    }

    #[test]
    fn the_nearest_point_is_an_end_or_a_foot() {
        let (a, b) = (Point::new(0.0, 0.0), Point::new(4.0, 0.0));
        assert_eq!(nearest_on_segment(a, b, Point::new(1.0, 3.0)), Point::new(1.0, 0.0));
        assert_eq!(nearest_on_segment(a, b, Point::new(9.0, 3.0)), b);
        assert_eq!(meeting_point(a, b, Point::new(1.0, -1.0), Point::new(1.0, 1.0)), Point::new(1.0, 0.0));
    }
}
