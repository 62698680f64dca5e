//! The area that several regions have in common, exact to rounding, also where their edges coincide.

use super::{BoundingBox, Point, SegmentIndex, predicate};

/// Area in mm² of the points that are inside every one of the shapes. A shape is the list of edges of its closed loops; inside
/// by even-odd containment. Edges outside `window` may be missing where they lie above, below or to the right of it.
/// The sum stops once it is larger than `enough`.
pub fn common_area(shapes: &[&[(Point, Point)]], window: BoundingBox, enough: f64) -> f64 {
    let mut levels = vec![window.min.y, window.max.y];
    let mut edges: Vec<(Point, Point, usize)> = Vec::new();
    for (shape, list) in shapes.iter().enumerate() {
        for &(a, b) in *list {
            let (low, high) = if a.y <= b.y { (a, b) } else { (b, a) };
            if low.y < high.y && high.y > window.min.y && low.y < window.max.y && low.x.min(high.x) <= window.max.x {
                levels.extend([low.y, high.y]);
                edges.push((low, high, shape));
            }
        }
    }
    push_crossing_levels(&edges, &mut levels);
    levels.retain(|y| *y >= window.min.y && *y <= window.max.y);
    levels.sort_by(f64::total_cmp);
    levels.dedup();
    edges.sort_by(|p, q| p.0.y.total_cmp(&q.0.y));

    let mut total = 0.0;
    let mut waiting = edges.into_iter().peekable();
    let mut active: Vec<(Point, Point, usize)> = Vec::new();
    let mut row: Vec<(f64, usize)> = Vec::new();
    for (bottom, top) in levels.iter().zip(levels.iter().skip(1)) {
        let middle = 0.5 * (bottom + top);
        active.retain(|e| e.1.y > middle);
        while let Some(edge) = waiting.next_if(|e| e.0.y < middle) {
            if edge.1.y > middle {
                active.push(edge);
            }
        }
        row.clear();
        row.extend(active.iter().map(|(a, b, shape)| (a.x + (b.x - a.x) * ((middle - a.y) / (b.y - a.y)), *shape)));
        row.sort_by(|p, q| p.0.total_cmp(&q.0));
        total += (top - bottom) * common_width(&row, shapes.len(), window);
        if total > enough {
            break;
        }
    }
    total
}

/// Length of the part of one row that is inside all shapes and inside the window.
fn common_width(row: &[(f64, usize)], shapes: usize, window: BoundingBox) -> f64 {
    let mut inside = vec![false; shapes];
    let mut count = 0;
    let mut from = 0.0;
    let mut width = 0.0;
    for &(x, shape) in row {
        let x = x.clamp(window.min.x, window.max.x);
        if count == shapes {
            width += x - from;
        }
        inside[shape] = !inside[shape];
        count = if inside[shape] { count + 1 } else { count - 1 };
        from = x;
    }
    if count == shapes { width + window.max.x - from } else { width }
}

/// Adds the heights at which edges of different shapes cross: between two levels no two edges may change places.
fn push_crossing_levels(edges: &[(Point, Point, usize)], levels: &mut Vec<f64>) {
    let index = SegmentIndex::new(edges.iter().map(|e| (e.0, e.1)).collect());
    for (i, &(a, b, shape)) in edges.iter().enumerate() {
        for j in index.near(BoundingBox::around([a, b])) {
            let (c, d, other) = edges[j];
            if j > i && other != shape && predicate::segments_meet(a, b, c, d) {
                levels.push(predicate::meeting_point(a, b, c, d).y);
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::{Region, Ring};

    fn edges(ring: &Ring) -> Vec<(Point, Point)> {
        Region::from_rings([ring]).edges().collect()
    }

    fn square(x: f64, y: f64, side: f64) -> Ring {
        Ring::polygon([(0.0, 0.0), (side, 0.0), (side, side), (0.0, side)].map(|(u, v)| Point::new(x + u, y + v)))
    }

    #[test]
    fn half_a_disc_on_an_edge_and_coincident_edges() {
        let disc = Ring::circle(Point::new(0.0, 5.0), 1.0);
        let plate = square(0.0, 0.0, 10.0);
        let area = common_area(&[&edges(&disc), &edges(&plate)], disc.bounding_box(), f64::INFINITY);
        assert!((area - 0.5 * disc.signed_area()).abs() < 1e-12, "{area}");
        let same = common_area(&[&edges(&plate), &edges(&plate)], plate.bounding_box(), f64::INFINITY);
        assert!((same - 100.0).abs() < 1e-9);
        let beside = square(10.0, 0.0, 10.0);
        assert!(common_area(&[&edges(&plate), &edges(&beside)], beside.bounding_box(), f64::INFINITY).abs() < 1e-9);
    }

    #[test]
    fn three_shapes_that_overlap_only_two_by_two_have_nothing_in_common() {
        let shapes = [square(0.0, 0.0, 2.0), square(1.5, 0.0, 2.0), square(0.0, 1.5, 2.0)].map(|r| edges(&r));
        let window = BoundingBox { min: Point::new(-1.0, -1.0), max: Point::new(5.0, 5.0) };
        let all = [shapes[0].as_slice(), &shapes[1], &shapes[2]];
        assert!((common_area(&all, window, f64::INFINITY) - 0.25).abs() < 1e-12);
        let turned = [shapes[1].as_slice(), &shapes[2]];
        assert!((common_area(&turned, window, f64::INFINITY) - 0.25).abs() < 1e-12);
    }
}
