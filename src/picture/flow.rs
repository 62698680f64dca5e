//! Direction of the current: short strokes along it, evenly strewn, each with a head.

use super::place::{Area, Occupied, Spot};
use super::view::View;
use std::collections::HashMap;

/// Distance of the places where a stroke may begin, px.
const SPACING: f64 = 54.0;
/// Strokes keep this distance, px.
const CLEAR: f64 = 28.0;
/// A gap is filled where it is this wide to all sides, px.
const GAP: f64 = 44.0;
/// Strokes keep this distance from the rim of the metal, px.
const RIM: f64 = 8.0;
/// Steps along the current, px.
const STEP: f64 = 3.0;
/// Steps to each side of the beginning, at most.
const STEPS: usize = 8;
/// Below this share of the scale there is no stroke.
const FAINT: f32 = 0.01;

/// Strokes along the current, each from tail to tip, none through what is taken on the page.
pub fn strokes(view: &View<'_>, occupied: &Occupied) -> Vec<Vec<Spot>> {
    if view.panel.flow.is_empty() {
        return Vec::new();
    }
    let area = view.frame.area;
    let mut taken: HashMap<(i64, i64), Vec<Spot>> = HashMap::new();
    let mut strokes = Vec::new();
    // What the even pattern left bare is filled from a finer one.
    for (spacing, clear) in [(SPACING, CLEAR), (0.5 * SPACING, GAP)] {
        let rows = (area.height() / (0.87 * spacing)).floor().max(1.0);
        let columns = (area.width() / spacing).floor().max(1.0);
        for row in 0..rows as usize {
            for column in 0..columns as usize {
                let shift = if row % 2 == 0 { 0.25 } else { 0.75 };
                let x = area.left + area.width() * (column as f64 + shift) / columns;
                let y = area.top + area.height() * (row as f64 + 0.5) / rows;
                let free = |p: Spot| occupied.is_free(&Area::around(p, 6.0, 6.0)) && is_clear(&taken, p, CLEAR);
                if !free([x, y]) || !is_clear(&taken, [x, y], clear) {
                    continue;
                }
                let Some(first) = view.direction([x, y]).filter(|&way| is_off_rim(view, [x, y], way)) else { continue };
                let mut stroke = traced(view, [x, y], first, -1.0, &free);
                stroke.reverse();
                stroke.push([x, y]);
                stroke.extend(traced(view, [x, y], first, 1.0, &free));
                if stroke.len() < 7 {
                    continue;
                }
                for &p in &stroke {
                    taken.entry(cell(p)).or_default().push(p);
                }
                strokes.push(straightened(stroke));
            }
        }
    }
    strokes
}

/// The stroke without the kinks it has from triangle to triangle; both ends stay.
fn straightened(mut stroke: Vec<Spot>) -> Vec<Spot> {
    for _ in 0..3 {
        let before = stroke.clone();
        for (p, w) in stroke[1..].iter_mut().zip(before.windows(3)) {
            *p = [0.25 * (w[0][0] + w[2][0]) + 0.5 * p[0], 0.25 * (w[0][1] + w[2][1]) + 0.5 * p[1]];
        }
    }
    stroke
}

/// True where the metal reaches to both sides of a stroke.
fn is_off_rim(view: &View<'_>, at: Spot, [x, y]: Spot) -> bool {
    [RIM, -RIM].into_iter().all(|side| view.share([at[0] - side * y, at[1] + side * x]).is_some())
}

/// The two sides of a stroke's head, from one barb over the tip to the other.
pub fn head(stroke: &[Spot], size: f64) -> Vec<Spot> {
    let [.., before, tip] = stroke else { return Vec::new() };
    let (x, y) = (tip[0] - before[0], tip[1] - before[1]);
    let length = x.hypot(y).max(1e-12);
    let (x, y) = (size * x / length, size * y / length);
    vec![[tip[0] - x - 0.5 * y, tip[1] - y + 0.5 * x], *tip, [tip[0] - x + 0.5 * y, tip[1] - y - 0.5 * x]]
}

fn traced(view: &View<'_>, from: Spot, first: Spot, sense: f64, free: &dyn Fn(Spot) -> bool) -> Vec<Spot> {
    let mut path = Vec::new();
    let mut here = from;
    for _ in 0..STEPS {
        let Some([x, y]) = view.direction(here) else { break };
        // A stroke shows one direction; where the current turns sharply it ends.
        if view.share(here).is_none_or(|share| share < FAINT) || first[0] * x + first[1] * y < 0.5 {
            break;
        }
        here = [here[0] + sense * STEP * x, here[1] + sense * STEP * y];
        // The line keeps off the rim by one step more than it is drawn.
        let ahead = [here[0] + sense * STEP * x, here[1] + sense * STEP * y];
        if view.share(ahead).is_none() || !is_off_rim(view, here, [x, y]) || !free(here) {
            break;
        }
        path.push(here);
    }
    path
}

fn cell(p: Spot) -> (i64, i64) {
    ((p[0] / CLEAR).floor() as i64, (p[1] / CLEAR).floor() as i64)
}

fn is_clear(taken: &HashMap<(i64, i64), Vec<Spot>>, p: Spot, clear: f64) -> bool {
    let (column, row) = cell(p);
    let near = |other: &Spot| (other[0] - p[0]).hypot(other[1] - p[1]) < clear;
    let reach = (clear / CLEAR).ceil() as i64;
    (-reach..=reach).all(|i| (-reach..=reach).all(|j| taken.get(&(column + i, row + j)).is_none_or(|there| !there.iter().any(near))))
}

#[cfg(test)]
mod tests {
    use super::super::arrange::arrange;
    use super::super::scale::Scale;
    use super::super::{Panel, Point};
    use super::*;

    #[test]
    fn a_kink_is_straightened_and_a_straight_stroke_stays() {
        let kinked: Vec<Spot> = (0..9).map(|i| [3.0 * f64::from(i), if i % 2 == 0 { 0.0 } else { 2.0 }]).collect();
        let smooth = straightened(kinked.clone());
        assert_eq!((smooth[0], smooth[8]), (kinked[0], kinked[8]));
        assert!(smooth[2..7].iter().all(|p| (p[1] - 1.0).abs() < 0.2), "{smooth:?}");
        let straight: Vec<Spot> = (0..9).map(|i| [3.0 * f64::from(i), f64::from(i)]).collect();
        assert_eq!(straightened(straight.clone()), straight);
    }

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
        let view = View::new(&panels[0], frame, &Scale::new(&panels, None));
        let page = Area { left: 0.0, top: 0.0, right: 1600.0, bottom: 1000.0 };
        let mut occupied = Occupied::new(page);
        let sign = Area::around(frame.area.centre(), 90.0, 30.0);
        occupied.take(sign);
        let strokes = strokes(&view, &occupied);
        assert!(strokes.len() > 100, "{}", strokes.len());
        for stroke in &strokes {
            let (tail, tip) = (stroke[0], stroke[stroke.len() - 1]);
            assert!(tip[1] < tail[1] - 15.0 && (tip[0] - tail[0]).abs() < 1e-9, "up on the page");
            assert!(stroke.iter().all(|&p| view.share(p).is_some() && !sign.overlaps(&Area::around(p, 1.0, 1.0))));
        }
        let rim = frame.area.widened(-RIM);
        assert!(strokes.iter().flatten().all(|p| p[0] >= rim.left && p[0] <= rim.right), "off the rim");
        assert_eq!(head(&strokes[0], 6.0)[1], strokes[0][strokes[0].len() - 1]);
        assert!(head(&[], 6.0).is_empty());
    }
}
