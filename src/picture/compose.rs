//! A sheet to a drawing: scales, places, panels, then words from the most to the least wanted.

use super::arrange::{MARGIN, PAGE_WIDTH, arrange};
use super::canvas::Ink;
use super::colour::Ramp;
use super::contour::{Contour, contours, thinned};
use super::drawing::{Drawing, Mark};
use super::flow;
use super::legend::{self, GREY, INK, Legend};
use super::lettering::{Lettering, Weight};
use super::notes::{Notes, SEA};
use super::place::Spot;
use super::scale::{Potentials, Scale};
use super::view::View;
use super::{Panel, Sheet};
use rayon::prelude::*;

/// Lines over light and over dark metal.
const OVER_LIGHT: Ink = Ink::thin([44, 42, 58], 0.62);
const OVER_DARK: Ink = Ink::thin([255, 226, 196], 0.62);

/// A drawing and the panels it paints.
pub struct Scene<'a> {
    /// The panels at their places.
    pub views: Vec<View<'a>>,
    /// The marks.
    pub drawing: Drawing,
}

/// Composes a sheet whose lists were checked.
pub fn compose<'a>(sheet: &'a Sheet, lettering: &Lettering) -> Scene<'a> {
    let scale = Scale::new(&sheet.panels, sheet.peak);
    let ramp = Ramp::new();
    let headings: Vec<f64> = sheet.panels.iter().map(|p| heading_width(p, lettering)).collect();
    // A page to try on: how high title and legend become does not depend on the rest.
    let mut trial = Drawing::new(PAGE_WIDTH as u32, 4000);
    let top = legend::title(&mut trial, lettering, sheet, MARGIN);
    let legend_height = |width: f64, beside: bool| {
        let legend = Legend { sheet, scale: &scale, per_mm: 1.0, lettering };
        legend.write(&mut Drawing::new(PAGE_WIDTH as u32, 4000), [MARGIN, 100.0], width, beside) - 100.0
    };
    let page = arrange(&sheet.panels, &headings, top, legend_height);
    let views: Vec<View<'a>> = sheet.panels.par_iter().zip(&page.frames).map(|(panel, &frame)| View::new(panel, frame, &scale)).collect();

    let mut drawing = Drawing::new(PAGE_WIDTH as u32, page.height as u32);
    legend::title(&mut drawing, lettering, sheet, MARGIN);
    let per_mm = page.frames.first().map_or(1.0, |frame| frame.scale);
    Legend { sheet, scale: &scale, per_mm, lettering }.write(&mut drawing, page.legend.0, page.legend.1, page.beside);
    let mut lines: Vec<Vec<Contour>> =
        views.par_iter().zip(&scale.potentials).map(|(view, own)| own.map_or(Vec::new(), |own| equipotentials(view, own))).collect();
    for view in &views {
        heading(&mut drawing, lettering, view);
    }
    let notes = Notes { views: &views, lettering, ramp: &ramp };
    notes.guard(&mut drawing);
    notes.necks(&mut drawing);
    notes.balloons(&mut drawing);
    notes.widths(&mut drawing);
    notes.amperes(&mut drawing);
    notes.names(&mut drawing);
    notes.readings(&mut drawing);
    for ((view, lines), own) in views.iter().zip(&mut lines).zip(&scale.potentials) {
        if let Some(own) = own {
            notes.potentials(&mut drawing, view, lines, own.step);
        }
    }
    // What lies below the words is drawn first but chosen last: strokes keep off words.
    let words = std::mem::take(&mut drawing.marks);
    for ((number, view), lines) in views.iter().enumerate().zip(&lines) {
        drawing.marks.push(Mark::Field(number));
        over_metal(&mut drawing, view, &ramp, lines.iter().map(|c| c.line.clone()), 1.0, [OVER_LIGHT, OVER_DARK]);
        strokes(&mut drawing, view, &ramp);
        shapes(&mut drawing, view);
    }
    drawing.marks.extend(words);
    Scene { views, drawing }
}

fn heading_width(panel: &Panel, lettering: &Lettering) -> f64 {
    (lettering.width(&panel.name, 17.0, Weight::Strong) + 14.0 + lettering.width(&panel.details, 16.0, Weight::Regular) + 1.0).min(560.0)
}

/// Name and details above the panel's left end.
fn heading(drawing: &mut Drawing, lettering: &Lettering, view: &View<'_>) {
    let at = [view.frame.area.left, view.frame.area.top - 13.0];
    let room = heading_width(view.panel, lettering);
    let name = lettering.fitted(&view.panel.name, 17.0, Weight::Strong, room);
    drawing.left_aligned(lettering, &name, at, legend::strong(17.0, INK));
    let used = if name.is_empty() { 0.0 } else { lettering.width(&name, 17.0, Weight::Strong) + 14.0 };
    let details = lettering.fitted(&view.panel.details, 16.0, Weight::Regular, room - used);
    drawing.left_aligned(lettering, &details, [at[0] + used, at[1]], legend::plain(16.0, GREY));
}

/// Draws lines so that they show on what is below.
fn over_metal(drawing: &mut Drawing, view: &View<'_>, ramp: &Ramp, lines: impl Iterator<Item = Vec<Spot>>, width: f64, inks: [Ink; 2]) {
    let mut runs: [Vec<Vec<Spot>>; 2] = [Vec::new(), Vec::new()];
    for line in lines {
        let mut current: Option<usize> = None;
        for pair in line.windows(2) {
            let middle = [0.5 * (pair[0][0] + pair[1][0]), 0.5 * (pair[0][1] + pair[1][1])];
            let kind = match view.share(middle) {
                Some(share) => usize::from(ramp.is_dark(share)),
                None => current.unwrap_or(0),
            };
            if current == Some(kind)
                && let Some(run) = runs[kind].last_mut()
            {
                run.push(pair[1]);
            } else {
                runs[kind].push(pair.to_vec());
                current = Some(kind);
            }
        }
    }
    for (lines, ink) in runs.into_iter().zip(inks) {
        drawing.marks.push(Mark::Lines(lines, width, ink));
    }
}

fn equipotentials(view: &View<'_>, own: Potentials) -> Vec<Contour> {
    let mut lines = contours(&view.corners, &view.panel.triangles, &view.panel.potential_mv, own.step, own.levels);
    for contour in &mut lines {
        contour.line = thinned(&contour.line, 1.5);
    }
    lines
}

fn strokes(drawing: &mut Drawing, view: &View<'_>, ramp: &Ramp) {
    let strokes = flow::strokes(view, &drawing.occupied);
    let heads: Vec<Vec<Spot>> = strokes.iter().map(|s| flow::head(s, 6.5)).collect();
    let inks = [Ink::thin([60, 48, 44], 0.36), Ink::thin([255, 232, 206], 0.42)];
    over_metal(drawing, view, ramp, strokes.into_iter().chain(heads), 1.5, inks);
}

/// Terminals, the rim of the metal, spots.
fn shapes(drawing: &mut Drawing, view: &View<'_>) {
    for patch in &view.panel.patches {
        let rim = view.frame.all(patch);
        drawing.marks.push(Mark::Fill(vec![rim.clone()], Ink::thin([255, 255, 255], 0.45)));
        drawing.marks.push(Mark::Lines(hatch(&rim, 9.0), 1.2, Ink::thin(SEA, 0.8)));
        drawing.marks.push(Mark::Loop(rim, 1.4, Ink::full(SEA)));
    }
    for contact in &view.panel.contacts {
        let dashes = dashed(&view.frame.all(contact), 7.0);
        drawing.marks.push(Mark::Lines(dashes.clone(), 3.0, Ink::thin([255; 3], 0.6)));
        drawing.marks.push(Mark::Lines(dashes, 1.2, Ink::full(INK)));
    }
    for rim in &view.panel.loops {
        drawing.marks.push(Mark::Loop(view.frame.all(rim), 2.2, Ink::full(INK)));
    }
    let lines: Vec<Vec<Spot>> = view.panel.lines.iter().map(|line| view.frame.all(line)).collect();
    drawing.marks.push(Mark::Lines(lines.clone(), 8.0, Ink::full([255; 3])));
    drawing.marks.push(Mark::Lines(lines, 5.0, Ink::full(SEA)));
    for spot in &view.panel.spots {
        let rim = view.frame.all(&spot.outline);
        let size = rim.iter().fold(0.0f64, |most, p| most.max((p[0] - rim[0][0]).hypot(p[1] - rim[0][1])));
        let width = (0.16 * size).clamp(0.7, 2.2);
        drawing.marks.push(Mark::Loop(rim.clone(), 2.2 * width, Ink::thin([255; 3], 0.75)));
        drawing.marks.push(Mark::Loop(rim, width, Ink::full(SEA)));
    }
}

/// A closed loop in dashes of about this length in px, as long as the gaps between them.
fn dashed(rim: &[Spot], length: f64) -> Vec<Vec<Spot>> {
    let closed: Vec<Spot> = rim.iter().chain(rim.first()).copied().collect();
    let total: f64 = closed.windows(2).map(|w| (w[1][0] - w[0][0]).hypot(w[1][1] - w[0][1])).sum();
    let dash = 0.5 * total / (0.5 * total / length).round().clamp(1.0, 5e3);
    let mut dashes: Vec<Vec<Spot>> = Vec::new();
    let mut passed = 0.0;
    for pair in closed.windows(2) {
        let step = (pair[1][0] - pair[0][0]).hypot(pair[1][1] - pair[0][1]);
        let at = |s: f64| [0, 1].map(|i| pair[0][i] + (pair[1][i] - pair[0][i]) * ((s - passed) / step).clamp(0.0, 1.0));
        let mut number = (passed / dash) as usize;
        while step > 0.0 && number as f64 * dash < passed + step {
            let (from, to) = (passed.max(number as f64 * dash), (passed + step).min((number + 1) as f64 * dash));
            if number.is_multiple_of(2) && to > from {
                match dashes.last_mut() {
                    // A dash goes on around a corner.
                    Some(last) if from == passed && passed > number as f64 * dash => last.push(at(to)),
                    _ => dashes.push(vec![at(from), at(to)]),
                }
            }
            number += 1;
        }
        passed += step;
    }
    dashes
}

/// Slanting lines inside a loop, at this distance in px.
fn hatch(rim: &[Spot], distance: f64) -> Vec<Vec<Spot>> {
    let slant = distance * std::f64::consts::SQRT_2;
    let (low, high) = rim.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), p| (l.min(p[0] + p[1]), h.max(p[0] + p[1])));
    if !(high > low && (high - low) / slant < 1e4) {
        return Vec::new();
    }
    let mut lines = Vec::new();
    for number in (low / slant).ceil() as i64..=(high / slant).floor() as i64 {
        let sum = number as f64 * slant;
        let mut met: Vec<f64> = Vec::new();
        for (k, p) in rim.iter().enumerate() {
            let q = rim[(k + 1) % rim.len()];
            let (u, v) = (p[0] + p[1] - sum, q[0] + q[1] - sum);
            if (u >= 0.0) != (v >= 0.0) {
                met.push(p[0] + (q[0] - p[0]) * u / (u - v));
            }
        }
        met.sort_by(f64::total_cmp);
        lines.extend(met.chunks_exact(2).map(|pair| vec![[pair[0], sum - pair[0]], [pair[1], sum - pair[1]]]));
    }
    lines
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn dashes_cover_half_of_a_loop_and_go_around_its_corners() {
        let rim = [[0.0, 0.0], [90.0, 0.0], [90.0, 60.0], [0.0, 60.0]];
        let dashes = dashed(&rim, 7.0);
        let length = |line: &Vec<Spot>| line.windows(2).map(|w| (w[1][0] - w[0][0]).hypot(w[1][1] - w[0][1])).sum::<f64>();
        assert!((dashes.iter().map(length).sum::<f64>() - 150.0).abs() < 1e-9);
        assert!(dashes.iter().all(|d| (length(d) - length(&dashes[0])).abs() < 1e-9), "{dashes:?}");
        assert!(dashed(&[], 7.0).is_empty());
    }

    #[test]
    fn hatching_stays_inside_and_covers_a_notched_loop() {
        let rim = [[0.0, 0.0], [90.0, 0.0], [90.0, 60.0], [60.0, 60.0], [60.0, 20.0], [30.0, 20.0], [30.0, 60.0], [0.0, 60.0]];
        let lines = hatch(&rim, 6.0);
        assert!(lines.len() > 12);
        for line in lines {
            let [x, y] = [0.5 * (line[0][0] + line[1][0]), 0.5 * (line[0][1] + line[1][1])];
            assert!((0.0..=90.0).contains(&x) && (0.0..=60.0).contains(&y), "{x} {y}");
            assert!(!(x > 30.0 && x < 60.0 && y > 20.0), "in the notch: {x} {y}");
        }
        assert!(hatch(&[], 6.0).is_empty());
    }
}
