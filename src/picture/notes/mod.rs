//! Words and signs over the panels: balloons, necks, amperes, names, readings; potentials in a file of their own. What finds no room is left out.

mod potentials;

use super::canvas::Ink;
use super::colour::{Ramp, Rgb};
use super::drawing::{Drawing, Mark, Style};
use super::legend::INK;
use super::lettering::{ABOVE, BELOW, CAPITAL, Lettering, Weight};
use super::place::{Area, Spot};
use super::view::View;
use crate::geometry::Point;

/// Words over dark metal.
const PAPER: Rgb = [255, 248, 238];
/// Electrodes and joints.
pub const SEA: Rgb = [0, 74, 104];
/// Words of electrodes and joints: darker, for they are thin.
const DEEP: Rgb = [0, 44, 64];
const WHITE: Ink = Ink::thin([255, 255, 255], 0.85);
/// Radius of a balloon, px.
const BALLOON: f64 = 14.5;
/// Size of the words over a panel, px.
const SIZE: f64 = 14.5;
/// More amperes than this in one panel are not written: they are in the table.
const MOST_AMPERES: usize = 90;

/// What notes are written with.
pub struct Notes<'a> {
    /// All panels.
    pub views: &'a [View<'a>],
    /// The font.
    pub lettering: &'a Lettering,
    /// The colour map, for halos.
    pub ramp: &'a Ramp,
}

impl Notes<'_> {
    fn share(&self, at: Spot) -> Option<f32> {
        self.views.iter().find_map(|view| view.share(at))
    }

    /// Words in this colour, or light ones over dark metal, with a halo of what is below.
    fn style(&self, at: Spot, size: f64, weight: Weight, rgb: Rgb) -> Style {
        let share = self.share(at);
        let dark = share.is_some_and(|share| self.ramp.is_dark(share));
        let below = share.map_or([255; 3], |share| self.ramp.at(share));
        Style { size, weight, ink: Ink::full(if dark { PAPER } else { rgb }), halo: Some((2.6, Ink::thin(below, 0.88))) }
    }

    /// Keeps words off spots and hotspots.
    pub fn guard(&self, drawing: &mut Drawing) {
        for view in self.views {
            for spot in &view.panel.spots {
                if let Some(area) = around(&view.frame.all(&spot.outline)) {
                    drawing.occupied.take(area.widened(1.5));
                }
            }
            for line in &view.panel.lines {
                for pair in view.frame.all(line).windows(2) {
                    bar(drawing, [pair[0], pair[1]], 8.0);
                }
            }
            for mark in &view.panel.hotspots {
                drawing.occupied.take(Area::around(view.frame.at(mark.at), 11.0, 11.0));
            }
            for (at, _) in &view.panel.tips {
                drawing.occupied.take(tip(view.frame.at(*at)));
            }
            for line in view.panel.crossings.iter().filter_map(|(ends, _)| over_metal(view, *ends)) {
                bar(drawing, line, 4.0);
            }
        }
    }

    /// Arrows of all necks.
    pub fn necks(&self, drawing: &mut Drawing) {
        for (neck, _) in self.all_necks() {
            for [tip, tail] in arrows(neck) {
                let barbs = super::flow::head(&[tail, tip], 11.0);
                let heads = vec![barbs.clone()];
                drawing.marks.push(Mark::Lines(vec![vec![tail, tip], barbs], 4.6, WHITE));
                drawing.marks.push(Mark::Lines(vec![vec![tail, tip]], 1.7, Ink::full(INK)));
                drawing.marks.push(Mark::Fill(heads, Ink::full(INK)));
                drawing.occupied.take(Area::spanning(tail, tip).widened(6.0));
            }
        }
    }

    fn all_necks(&self) -> impl Iterator<Item = ([Spot; 2], Option<&str>)> {
        self.views.iter().flat_map(|view| {
            let necks = view.panel.hotspots.iter().filter_map(|mark| Some((mark.neck?, mark.text.as_deref())));
            necks.map(|(neck, text)| (neck.map(|p| view.frame.at(p)), text))
        })
    }

    /// Widths of necks, beside one of the two arrows.
    pub fn widths(&self, drawing: &mut Drawing) {
        for (neck, text) in self.all_necks() {
            let Some(text) = text else { continue };
            let half = 0.5 * self.lettering.width(text, SIZE + 0.5, Weight::Strong) + 4.0;
            let mut places = Vec::new();
            for [tip, tail] in arrows(neck) {
                let along = unit(tip, tail);
                // Beyond the tail, then to either side of the arrow.
                let beyond = half * along[0].abs() + 10.0 * along[1].abs() + 4.0;
                places.push([tail[0] + beyond * along[0], tail[1] + beyond * along[1]]);
                let middle = [0.4 * tip[0] + 0.6 * tail[0], 0.4 * tip[1] + 0.6 * tail[1]];
                for side in [1.0, -1.0] {
                    let normal = [-along[1] * side, along[0] * side];
                    let away = half * normal[0].abs() + 10.0 * normal[1].abs() + 6.0;
                    places.push([middle[0] + away * normal[0], middle[1] + away * normal[1]]);
                }
            }
            // Off the metal first; the order is stable otherwise.
            places.sort_by_key(|&p| self.metal_below(&Area::around(p, 2.0 * half, SIZE)));
            let _ = places.iter().any(|&p| drawing.centred(self.lettering, text, p, 0.0, self.style(p, SIZE + 0.5, Weight::Strong, INK)));
        }
    }

    fn metal_below(&self, area: &Area) -> usize {
        let [x, y] = area.centre();
        [[x, y], [area.left, area.top], [area.right, area.top], [area.left, area.bottom], [area.right, area.bottom]]
            .into_iter()
            .filter(|&p| self.share(p).is_some())
            .count()
    }

    /// True where the colour below a box changes little.
    fn is_even(&self, area: &Area) -> bool {
        let [x, y] = area.centre();
        let below = [[x, y], [area.left, y], [area.right, y], [x, area.top], [x, area.bottom]].map(|p| self.share(p).unwrap_or(0.0));
        let (low, high) = below.iter().fold((f32::INFINITY, f32::NEG_INFINITY), |(l, h), &v| (l.min(v), h.max(v)));
        high - low < 0.3
    }

    /// Numbered balloons with leaders, outside the metal where there is room.
    pub fn balloons(&self, drawing: &mut Drawing) {
        let mut leaders: Vec<[Spot; 2]> = Vec::new();
        let names = self.name_places();
        let mut numbers: Vec<String> = Vec::new();
        for view in self.views {
            let spots: Vec<Spot> = view.panel.spots.iter().filter_map(|s| Some(around(&view.frame.all(&s.outline))?.centre())).collect();
            for mark in &view.panel.hotspots {
                let at = view.frame.at(mark.at);
                if let Some(place) = self.balloon_place(drawing, &spots, at, &leaders, &names) {
                    let number = mark.number.to_string();
                    drawing.claim(balloon(place), &number);
                    leaders.push([place, at]);
                    numbers.push(number);
                }
            }
        }
        // No leader over a balloon: all leaders first.
        for &[place, at] in &leaders {
            let line = vec![place, at];
            drawing.marks.push(Mark::Lines(vec![line.clone()], 4.0, WHITE));
            drawing.marks.push(Mark::Lines(vec![line], 1.4, Ink::full(INK)));
            drawing.marks.push(Mark::Disc(at, 5.0, Ink::thin([255; 3], 0.95)));
            drawing.marks.push(Mark::Disc(at, 3.2, Ink::full(INK)));
        }
        for (&[place, _], number) in leaders.iter().zip(&numbers) {
            drawing.marks.push(Mark::Disc(place, BALLOON + 2.0, WHITE));
            drawing.marks.push(Mark::Disc(place, BALLOON, Ink::full([255; 3])));
            drawing.marks.push(Mark::Circle(place, BALLOON, 1.7, Ink::full(INK)));
            let size = if number.len() > 2 { 12.0 } else { 17.0 };
            let width = self.lettering.width(number, size, Weight::Strong);
            let base = [place[0] - 0.5 * width, place[1] + 0.5 * CAPITAL * size];
            let steps = self.lettering.outline(number, size, Weight::Strong, base, 0.0);
            drawing.marks.push(Mark::Glyphs(steps, Ink::full(INK), None));
        }
        for leader in leaders {
            bar(drawing, leader, 5.0);
        }
    }

    /// The place with the least cost: near, off the metal, its leader short over metal and across nothing.
    fn balloon_place(&self, drawing: &Drawing, spots: &[Spot], at: Spot, leaders: &[[Spot; 2]], names: &[Area]) -> Option<Spot> {
        let mut best: Option<(f64, Spot)> = None;
        for distance in [40.0, 52.0, 66.0, 84.0, 106.0, 134.0, 170.0, 215.0, 270.0, 340.0] {
            // Nothing farther can be cheaper.
            if best.is_some_and(|(cost, _)| cost < distance) {
                break;
            }
            for turn in 0..32 {
                let angle = std::f64::consts::TAU * (f64::from(turn) + 0.5) / 32.0;
                let place = [at[0] + distance * angle.cos(), at[1] + distance * angle.sin()];
                let area = balloon(place);
                if !drawing.occupied.is_free(&area.widened(3.0)) {
                    continue;
                }
                // What is quick to know first: most places are out of the question by then.
                let dearer = |cost: f64| best.is_some_and(|(known, _)| cost >= known);
                let named = names.iter().filter(|name| name.overlaps(&area)).count() as f64;
                let mut cost = distance + 60.0 * named + 60.0 * surrounded(place, spots) + 26.0 * self.metal_below(&area) as f64;
                if dearer(cost) {
                    continue;
                }
                let steps = (distance / 8.0).ceil();
                let along = |k: f64| [at[0] + (place[0] - at[0]) * k / steps, at[1] + (place[1] - at[1]) * k / steps];
                cost += 3.2 * (0..steps as usize).filter(|&k| self.share(along(k as f64)).is_some()).count() as f64;
                let entangled = |&[other, spot]: &[Spot; 2]| {
                    cross([other, spot], [at, place]) || balloon(other).crossed_by(at, place) || area.widened(2.0).crossed_by(other, spot)
                };
                cost += 400.0 * leaders.iter().filter(|&leader| entangled(leader)).count() as f64;
                if dearer(cost) {
                    continue;
                }
                cost += 30.0 * drawing.occupied.crossed_by(at, place) as f64;
                if best.is_none_or(|(known, _)| cost < known) {
                    best = Some((cost, place));
                }
            }
        }
        best.map(|(_, place)| place)
    }

    /// Amperes at spots: all of a panel or, where too few find room, none.
    pub fn amperes(&self, drawing: &mut Drawing) {
        for view in self.views {
            let labelled: Vec<(&str, Area)> =
                view.panel.spots.iter().filter_map(|s| Some((s.label.as_deref()?, around(&view.frame.all(&s.outline))?))).collect();
            if labelled.is_empty() || labelled.len() > MOST_AMPERES {
                continue;
            }
            let (marks, labels, places) = (drawing.marks.len(), drawing.labels.len(), drawing.occupied.count());
            let rims: Vec<Area> = labelled.iter().map(|l| l.1).collect();
            let written = labelled.iter().filter(|(text, area)| self.beside(drawing, text, SIZE, area, &rims)).count();
            if 2 * written < labelled.len() {
                drawing.marks.truncate(marks);
                drawing.labels.truncate(labels);
                drawing.occupied.forget(places);
            }
        }
    }

    /// Words right, left, above or below a box, where none of the others is as near.
    fn beside(&self, drawing: &mut Drawing, text: &str, size: f64, area: &Area, others: &[Area]) -> bool {
        let half = 0.5 * self.lettering.width(text, size, Weight::Regular) + 2.0;
        let ([x, y], gap) = (area.centre(), 4.0);
        let high = 0.5 * (ABOVE + BELOW) * size + 2.0;
        let right = area.right + gap + half;
        let left = area.left - gap - half;
        let places = [
            [right, y],
            [left, y],
            [x, area.top - high],
            [x, area.bottom + high],
            [right, y - high],
            [right, y + high],
            [left, y - high],
            [left, y + high],
        ];
        let belongs = |p: Spot| {
            let words = Area::around(p, 2.0 * half, 2.0 * high - 4.0);
            others.iter().all(|other| other == area || words.gap(other) > 2.0 * words.gap(area) + 8.0)
        };
        let mut places: Vec<Spot> = places.into_iter().filter(|&p| belongs(p)).collect();
        // Words over a steep change of colour read badly; the order is stable otherwise.
        places.sort_by_key(|&p| !self.is_even(&Area::around(p, 2.0 * half, size)));
        let style = |p: Spot| {
            let style = self.style(p, size, Weight::Regular, DEEP);
            let even = self.is_even(&Area::around(p, 2.0 * half, size));
            if even { style } else { Style { ink: Ink::full(DEEP), halo: Some((2.6, WHITE)), ..style } }
        };
        places.into_iter().any(|p| drawing.centred(self.lettering, text, p, 0.0, style(p)))
    }

    /// Where names would like to stand.
    fn name_places(&self) -> Vec<Area> {
        let of = |view: &View<'_>, (at, name): &(Point, String)| {
            Area::around(view.frame.at(*at), self.lettering.width(name, SIZE + 1.0, Weight::Strong) + 8.0, SIZE + 6.0)
        };
        self.views.iter().flat_map(|view| view.panel.names.iter().map(|name| of(view, name))).collect()
    }

    /// Tips of meters and lines across which current is counted, with their words.
    pub fn readings(&self, drawing: &mut Drawing) {
        let size = 13.0;
        for view in self.views {
            patches_of(view).into_iter().for_each(|patch| drawing.occupied.take(patch));
            let tips: Vec<Area> = view.panel.tips.iter().map(|(at, _)| tip(view.frame.at(*at))).collect();
            for ((_, text), area) in view.panel.tips.iter().zip(&tips) {
                let _ = self.beside(drawing, text, size, area, &[]);
                let ([x, y], arm) = (area.centre(), 4.5);
                let cross = vec![vec![[x - arm, y], [x + arm, y]], vec![[x, y - arm], [x, y + arm]]];
                drawing.marks.push(Mark::Lines(cross.clone(), 4.6, WHITE));
                drawing.marks.push(Mark::Lines(cross, 1.6, Ink::full(INK)));
            }
            for (ends, text) in &view.panel.crossings {
                let Some([a, b]) = over_metal(view, *ends) else { continue };
                drawing.marks.push(Mark::Lines(vec![vec![a, b]], 3.6, Ink::thin([255; 3], 0.7)));
                drawing.marks.push(Mark::Lines(vec![vec![a, b]], 1.4, Ink::full(SEA)));
                let half = 0.5 * self.lettering.width(text, size, Weight::Regular) + 3.0;
                let along = unit(a, b);
                let mut places = Vec::new();
                for (end, way) in [(a, [-along[0], -along[1]]), (b, along)] {
                    let away = half * way[0].abs() + 10.0 * way[1].abs() + 3.0;
                    places.push([end[0] + away * way[0], end[1] + away * way[1]]);
                }
                for share in [0.5, 0.25, 0.75] {
                    for side in [1.0, -1.0] {
                        let normal = [-along[1] * side, along[0] * side];
                        let away = half * normal[0].abs() + 10.0 * normal[1].abs() + 4.0;
                        places.push([a[0] + share * (b[0] - a[0]) + away * normal[0], a[1] + share * (b[1] - a[1]) + away * normal[1]]);
                    }
                }
                let _ = places.iter().any(|&p| drawing.centred(self.lettering, text, p, 0.0, self.style(p, size, Weight::Regular, DEEP)));
            }
        }
    }

    /// Names of electrodes, at or near where they belong.
    pub fn names(&self, drawing: &mut Drawing) {
        for view in self.views {
            let patches = patches_of(view);
            for (at, name) in &view.panel.names {
                let (at, size) = (view.frame.at(*at), SIZE + 1.0);
                let half = 0.5 * self.lettering.width(name, size, Weight::Strong) + 4.0;
                let mut places = vec![at];
                for distance in [1.0, 1.7, 2.6, 4.0] {
                    let (x, y) = (half + 12.0 * distance, 18.0 * distance);
                    places.extend([[at[0], at[1] - y], [at[0], at[1] + y], [at[0] + x, at[1]], [at[0] - x, at[1]]]);
                    places.extend([[at[0] + x, at[1] - y], [at[0] - x, at[1] - y], [at[0] + x, at[1] + y], [at[0] - x, at[1] + y]]);
                }
                // Half on the metal and half off reads badly.
                let whole = |p: Spot| [0, 5].contains(&self.metal_below(&Area::around(p, 2.0 * half, size)));
                let style = |p: Spot| {
                    let on_patch = patches.iter().any(|patch| patch.overlaps(&Area::around(p, 2.0, 2.0)));
                    let uneven = !self.is_even(&Area::around(p, 2.0 * half, size));
                    let style = self.style(p, size, Weight::Strong, DEEP);
                    if on_patch || uneven {
                        Style { ink: Ink::full(DEEP), halo: Some((3.5, Ink::thin([255; 3], 0.9))), ..style }
                    } else {
                        style
                    }
                };
                let _ = places.iter().any(|&p| whole(p) && drawing.centred(self.lettering, name, p, 0.0, style(p)));
            }
        }
    }
}

/// The two arrows of a neck from outside, each as tip and tail.
fn arrows([a, b]: [Spot; 2]) -> [[Spot; 2]; 2] {
    let out = unit(b, a);
    let far = |p: Spot, sense: f64| {
        [[p[0] + 2.0 * sense * out[0], p[1] + 2.0 * sense * out[1]], [p[0] + 34.0 * sense * out[0], p[1] + 34.0 * sense * out[1]]]
    };
    [far(a, 1.0), far(b, -1.0)]
}

/// Keeps words off a straight line of this width, piece by piece so that a slanting one does not block its whole box.
fn bar(drawing: &mut Drawing, [a, b]: [Spot; 2], width: f64) {
    let pieces = ((b[0] - a[0]).hypot(b[1] - a[1]) / 8.0).ceil().clamp(1.0, 500.0);
    for piece in 0..=pieces as usize {
        let t = piece as f64 / pieces;
        drawing.occupied.take(Area::around([a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])], width, width));
    }
}

/// The box of a balloon.
fn balloon(centre: Spot) -> Area {
    Area::around(centre, 2.0 * BALLOON + 4.0, 2.0 * BALLOON + 4.0)
}

/// The box of a meter's tip.
fn tip(at: Spot) -> Area {
    Area::around(at, 12.0, 12.0)
}

/// A line across the metal, cut off a little beyond the panel's first and last metal on it; `None` where it meets none.
fn over_metal(view: &View<'_>, ends: [Point; 2]) -> Option<[Spot; 2]> {
    const BEYOND: f64 = 9.0;
    let [a, b] = ends.map(|p| view.frame.at(p));
    let length = (b[0] - a[0]).hypot(b[1] - a[1]).clamp(1.0, 1e4);
    let way = unit(a, b);
    let at = |s: f64| [a[0] + s * way[0], a[1] + s * way[1]];
    let mut met = (0..=length as usize).map(|s| s as f64).filter(|&s| view.share(at(s)).is_some());
    let first = met.next()?;
    let last = met.next_back().unwrap_or(first);
    Some([at((first - BEYOND).max(0.0)), at((last + BEYOND).min(length))])
}

/// How much a place lies in the middle of spots near it: 0 beside all of them, 1 where they pull evenly to all sides.
fn surrounded(place: Spot, spots: &[Spot]) -> f64 {
    let near: Vec<Spot> = spots.iter().filter(|s| (s[0] - place[0]).hypot(s[1] - place[1]) < 75.0).map(|&s| unit(place, s)).collect();
    if near.len() < 2 {
        return 0.0;
    }
    let (x, y) = near.iter().fold((0.0, 0.0), |(x, y), way| (x + way[0], y + way[1]));
    1.0 - x.hypot(y) / near.len() as f64
}

/// Unit vector from one place to another; to the right where they are the same.
fn unit(a: Spot, b: Spot) -> Spot {
    let (x, y) = (b[0] - a[0], b[1] - a[1]);
    let length = x.hypot(y);
    if length > 0.0 { [x / length, y / length] } else { [1.0, 0.0] }
}

/// Boxes of the terminals that are areas.
fn patches_of(view: &View<'_>) -> Vec<Area> {
    view.panel.patches.iter().filter_map(|patch| around(&view.frame.all(patch))).collect()
}

/// The upright box around some places.
fn around(places: &[Spot]) -> Option<Area> {
    let first = *places.first()?;
    Some(places.iter().fold(Area::spanning(first, first), |area, &[x, y]| Area {
        left: area.left.min(x),
        top: area.top.min(y),
        right: area.right.max(x),
        bottom: area.bottom.max(y),
    }))
}

fn cross([a, b]: [Spot; 2], [c, d]: [Spot; 2]) -> bool {
    let side = |p: Spot, q: Spot, r: Spot| (q[0] - p[0]) * (r[1] - p[1]) - (q[1] - p[1]) * (r[0] - p[0]);
    side(a, b, c) * side(a, b, d) < 0.0 && side(c, d, a) * side(c, d, b) < 0.0
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn arrows_of_a_neck_stand_outside_and_point_at_each_other() {
        let [one, two] = arrows([[0.0, 10.0], [0.0, 30.0]]);
        assert_eq!(one, [[0.0, 8.0], [0.0, -24.0]]);
        assert_eq!(two, [[0.0, 32.0], [0.0, 64.0]]);
    }

    #[test]
    fn the_middle_of_four_spots_is_surrounded_and_a_place_beside_them_is_not() {
        let spots = [[0.0, 0.0], [40.0, 0.0], [40.0, 40.0], [0.0, 40.0]];
        assert!(surrounded([20.0, 20.0], &spots) > 0.99);
        assert!(surrounded([70.0, 20.0], &spots) < 0.15);
        assert_eq!(surrounded([200.0, 20.0], &spots), 0.0);
    }

    #[test]
    fn lines_cross_or_miss_each_other() {
        assert!(cross([[0.0, 0.0], [2.0, 2.0]], [[0.0, 2.0], [2.0, 0.0]]));
        assert!(!cross([[0.0, 0.0], [2.0, 2.0]], [[3.0, 2.0], [5.0, 0.0]]));
    }
}
