//! Equipotentials: lines of equal value through triangles, chained from triangle to triangle.

use super::place::Spot;
use std::collections::HashMap;

/// One line of equal value.
#[derive(Debug, Clone, PartialEq)]
pub struct Contour {
    /// The value is this many steps.
    pub level: i64,
    /// Its points in order; the last equals the first where it closes.
    pub line: Vec<Spot>,
}

/// The lines at whole multiples of `step` with numbers in `levels`, in the order they are met. Corner numbers must be valid, `step` > 0.
/// A corner exactly at a level counts as above it, so that every triangle is crossed by two of its edges or by none.
pub fn contours(corners: &[Spot], triangles: &[[u32; 3]], values: &[f64], step: f64, levels: (i64, i64)) -> Vec<Contour> {
    let mut crossings: Vec<Spot> = Vec::new();
    let mut known: HashMap<(i64, u32, u32), usize> = HashMap::new();
    // The two neighbours of a crossing along its line.
    let mut beside: Vec<[usize; 2]> = Vec::new();
    let mut level_of: Vec<i64> = Vec::new();
    const OPEN: usize = usize::MAX;
    for triangle in triangles {
        let value = triangle.map(|c| values[c as usize]);
        let low = value[0].min(value[1]).min(value[2]);
        let high = value[0].max(value[1]).max(value[2]);
        let first = ((low / step).floor() as i64).max(levels.0);
        let last = ((high / step).ceil() as i64).min(levels.1);
        for level in first..=last {
            let height = level as f64 * step;
            if low >= height || high < height {
                continue;
            }
            let mut ends = [OPEN; 2];
            for edge in 0..3 {
                let (a, b) = (edge, (edge + 1) % 3);
                if (value[a] >= height) == (value[b] >= height) {
                    continue;
                }
                let (small, large) = if triangle[a] < triangle[b] { (a, b) } else { (b, a) };
                let number = *known.entry((level, triangle[small], triangle[large])).or_insert_with(|| {
                    let share = (height - value[small]) / (value[large] - value[small]);
                    let (p, q) = (corners[triangle[small] as usize], corners[triangle[large] as usize]);
                    crossings.push([p[0] + share * (q[0] - p[0]), p[1] + share * (q[1] - p[1])]);
                    beside.push([OPEN; 2]);
                    level_of.push(level);
                    crossings.len() - 1
                });
                if ends[0] == OPEN {
                    ends[0] = number;
                } else {
                    ends[1] = number;
                }
            }
            if ends[0] != OPEN && ends[1] != OPEN {
                for (here, other) in [(ends[0], ends[1]), (ends[1], ends[0])] {
                    if let Some(slot) = beside[here].iter_mut().find(|slot| **slot == OPEN) {
                        *slot = other;
                    }
                }
            }
        }
    }
    chained(&crossings, &beside, &level_of)
}

/// Walks open lines from their ends first, then what is left: closed ones.
fn chained(crossings: &[Spot], beside: &[[usize; 2]], level_of: &[i64]) -> Vec<Contour> {
    let mut used = vec![false; crossings.len()];
    let mut lines = Vec::new();
    for open in [true, false] {
        for start in 0..crossings.len() {
            if used[start] || (open && beside[start][1] != usize::MAX) {
                continue;
            }
            used[start] = true;
            let mut line = vec![crossings[start]];
            let mut here = start;
            while let Some(&next) = beside[here].iter().find(|&&n| n != usize::MAX && !used[n]) {
                used[next] = true;
                line.push(crossings[next]);
                here = next;
            }
            if !open {
                line.push(crossings[start]);
            }
            if line.len() > 1 {
                lines.push(Contour { level: level_of[start], line });
            }
        }
    }
    lines
}

/// The line with points nearer than `gap` to the one before left out; both ends stay.
pub fn thinned(line: &[Spot], gap: f64) -> Vec<Spot> {
    let mut kept: Vec<Spot> = Vec::with_capacity(line.len());
    for (number, &p) in line.iter().enumerate() {
        let far = kept.last().is_none_or(|&l| (p[0] - l[0]).hypot(p[1] - l[1]) >= gap);
        if far || number + 1 == line.len() {
            kept.push(p);
        }
    }
    kept
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A square of n x n cells of side 1, two triangles each.
    fn grid(n: usize) -> (Vec<Spot>, Vec<[u32; 3]>) {
        let at = |i: usize, j: usize| (j * (n + 1) + i) as u32;
        let points = (0..=n).flat_map(|j| (0..=n).map(move |i| [i as f64, j as f64])).collect();
        let cells = (0..n).flat_map(|j| (0..n).map(move |i| (i, j)));
        (
            points,
            cells.flat_map(|(i, j)| [[at(i, j), at(i + 1, j), at(i + 1, j + 1)], [at(i, j), at(i + 1, j + 1), at(i, j + 1)]]).collect(),
        )
    }

    #[test]
    fn a_uniform_slope_gives_straight_lines_from_edge_to_edge() {
        let (points, triangles) = grid(8);
        let values: Vec<f64> = points.iter().map(|p| p[0]).collect();
        let lines = contours(&points, &triangles, &values, 2.5, (-10, 10));
        assert_eq!(lines.iter().map(|l| l.level).collect::<Vec<_>>(), vec![1, 2, 3]);
        for contour in lines {
            assert!(contour.line.iter().all(|p| (p[0] - 2.5 * contour.level as f64).abs() < 1e-12));
            let (first, last) = (contour.line[0], contour.line[contour.line.len() - 1]);
            assert_eq!((first[1] - last[1]).abs(), 8.0);
        }
    }

    #[test]
    fn a_hill_gives_closed_lines_and_levels_at_corners_do_no_harm() {
        let (points, triangles) = grid(8);
        let values: Vec<f64> = points.iter().map(|p| 8.0 - (p[0] - 4.0).abs().max((p[1] - 4.0).abs())).collect();
        let lines = contours(&points, &triangles, &values, 1.0, (6, 7));
        assert_eq!(lines.len(), 2);
        assert!(lines.iter().all(|l| l.line.first() == l.line.last() && l.line.len() > 4));
        let only = contours(&points, &triangles, &values, 1.0, (7, 7));
        assert_eq!(only.len(), 1);
    }

    #[test]
    fn thinning_keeps_both_ends() {
        let line: Vec<Spot> = (0..=10).map(|i| [f64::from(i) * 0.4, 0.0]).collect();
        let kept = thinned(&line, 1.0);
        assert_eq!((kept[0], kept[kept.len() - 1]), (line[0], line[10]));
        assert!(kept.len() <= 5);
    }
}
