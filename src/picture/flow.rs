//! Direction of the current: short strokes along it, evenly strewn, each with a head.

use super::place::Spot;
use super::view::View;
use std::collections::HashMap;

/// Distance of the places where a stroke may begin, px.
const SPACING: f64 = 42.0;
/// Strokes keep this distance, px.
const CLEAR: f64 = 24.0;
/// Steps along the current, px.
const STEP: f64 = 3.0;
/// Steps to each side of the beginning, at most.
const STEPS: usize = 8;
/// Below this share of the scale there is no stroke.
const FAINT: f32 = 0.01;

/// Strokes along the current, each from tail to tip.
pub fn strokes(view: &View<'_>) -> Vec<Vec<Spot>> {
    if view.panel.flow.is_empty() {
        return Vec::new();
    }
    let area = view.frame.area;
    let mut taken: HashMap<(i64, i64), Vec<Spot>> = HashMap::new();
    let mut strokes = Vec::new();
    let rows = (area.height() / (0.87 * SPACING)).floor().max(1.0);
    let columns = (area.width() / SPACING).floor().max(1.0);
    for row in 0..rows as usize {
        for column in 0..columns as usize {
            let shift = if row % 2 == 0 { 0.25 } else { 0.75 };
            let x = area.left + area.width() * (column as f64 + shift) / columns;
            let y = area.top + area.height() * (row as f64 + 0.5) / rows;
            let mut stroke = traced(view, [x, y], -1.0, &taken);
            stroke.reverse();
            stroke.push([x, y]);
            stroke.extend(traced(view, [x, y], 1.0, &taken));
            if stroke.len() < 7 || !is_clear(&taken, [x, y]) {
                continue;
            }
            for &p in &stroke {
                taken.entry(cell(p)).or_default().push(p);
            }
            strokes.push(stroke);
        }
    }
    strokes
}

/// The two sides of a stroke's head, from one barb over the tip to the other.
pub fn head(stroke: &[Spot], size: f64) -> Vec<Spot> {
    let [.., before, tip] = stroke else { return Vec::new() };
    let (x, y) = (tip[0] - before[0], tip[1] - before[1]);
    let length = x.hypot(y).max(1e-12);
    let (x, y) = (size * x / length, size * y / length);
    vec![[tip[0] - x - 0.5 * y, tip[1] - y + 0.5 * x], *tip, [tip[0] - x + 0.5 * y, tip[1] - y - 0.5 * x]]
}

fn traced(view: &View<'_>, from: Spot, sense: f64, taken: &HashMap<(i64, i64), Vec<Spot>>) -> Vec<Spot> {
    let mut path = Vec::new();
    let mut here = from;
    let mut last: Option<Spot> = None;
    for _ in 0..STEPS {
        let Some([x, y]) = view.direction(here) else { break };
        // A stroke shows one direction; where the current turns sharply it ends.
        if view.share(here).is_none_or(|share| share < FAINT) || last.is_some_and(|l| l[0] * x + l[1] * y < 0.5) {
            break;
        }
        last = Some([x, y]);
        here = [here[0] + sense * STEP * x, here[1] + sense * STEP * y];
        // The line keeps off the rim by one step more than it is drawn.
        let ahead = [here[0] + sense * STEP * x, here[1] + sense * STEP * y];
        if view.share(ahead).is_none() || !is_clear(taken, here) {
            break;
        }
        path.push(here);
    }
    path
}

fn cell(p: Spot) -> (i64, i64) {
    ((p[0] / CLEAR).floor() as i64, (p[1] / CLEAR).floor() as i64)
}

fn is_clear(taken: &HashMap<(i64, i64), Vec<Spot>>, p: Spot) -> bool {
    let (column, row) = cell(p);
    let near = |other: &Spot| (other[0] - p[0]).hypot(other[1] - p[1]) < CLEAR;
    (-1..=1).all(|i| (-1..=1).all(|j| taken.get(&(column + i, row + j)).is_none_or(|there| !there.iter().any(near))))
}

#[cfg(test)]
mod tests {
    use super::super::arrange::arrange;
    use super::super::scale::Scale;
    use super::super::{Panel, Point};
    use super::*;

    #[test]
    fn strokes_point_along_the_current_and_stay_on_the_metal() {
        let corners = [(0.0, 0.0), (40.0, 0.0), (40.0, 20.0), (0.0, 20.0)].map(|(x, y)| Point::new(x, y)).to_vec();
        let panel = Panel {
            points: corners.clone(),
            loops: vec![corners],
            triangles: vec![[0, 1, 2], [0, 2, 3]],
            values: vec![1.0; 2],
            flow: vec![[0.0, 2.0]; 2],
            ..Panel::default()
        };
        let panels = [panel];
        let frame = arrange(&panels, &[0.0], 0.0, |_, _| 100.0).frames[0];
        let view = View::new(&panels[0], frame, &Scale::new(&panels));
        let strokes = strokes(&view);
        assert!(strokes.len() > 100, "{}", strokes.len());
        for stroke in &strokes {
            let (tail, tip) = (stroke[0], stroke[stroke.len() - 1]);
            assert!(tip[1] < tail[1] - 15.0 && (tip[0] - tail[0]).abs() < 1e-9, "up on the page");
            assert!(stroke.iter().all(|&p| view.share(p).is_some()));
        }
        assert_eq!(head(&strokes[0], 6.0)[1], strokes[0][strokes[0].len() - 1]);
        assert!(head(&[], 6.0).is_empty());
    }
}
