//! Potentials in words: along their lines, which are cut open for them, or beyond their ends.

use super::super::contour::Contour;
use super::super::drawing::{Drawing, Style, turned};
use super::super::legend::{GREY, INK};
use super::super::lettering::{ABOVE, BELOW, Weight};
use super::super::place::{Area, Spot};
use super::super::scale::with_step;
use super::super::view::View;
use super::{Notes, patches_of, unit};

/// Room between the words of a potential and its line, px.
const OPEN: f64 = 8.0;

impl Notes<'_> {
    /// Potentials along their lines; beyond their ends where the metal is too narrow. A line is cut open for its words: run up to a number,
    /// it would read as a minus sign.
    pub fn potentials(&self, drawing: &mut Drawing, view: &View<'_>, contours: &mut Vec<Contour>, step: f64) {
        let size = 13.0;
        let mut order: Vec<usize> = (0..contours.len()).collect();
        // Round numbers first, long lines before short ones.
        let rank = |level: i64| if level % 5 == 0 { 0 } else { 1 + level.rem_euclid(2) };
        order.sort_by_key(|&n| (rank(contours[n].level), std::cmp::Reverse(contours[n].line.len())));
        let patches = patches_of(view);
        let mut written: Vec<(i64, Spot)> = Vec::new();
        let mut rests: Vec<Contour> = Vec::new();
        for &number in &order {
            let contour = &contours[number];
            let text = format!("{} mV", with_step(contour.level as f64 * step, step));
            let width = self.lettering.width(&text, size, Weight::Regular);
            let lengths = running_length(&contour.line);
            let whole = lengths.last().copied().unwrap_or(0.0);
            for share in [0.5, 0.38, 0.62, 0.26, 0.74, 0.16, 0.84] {
                let (from, to) = (share * whole - 0.5 * width - OPEN, share * whole + 0.5 * width + OPEN);
                if from < 0.0 || to > whole {
                    continue;
                }
                let (a, b, m) = (
                    at_length(&contour.line, &lengths, from),
                    at_length(&contour.line, &lengths, to),
                    at_length(&contour.line, &lengths, share * whole),
                );
                let centre = [0.5 * (a[0] + b[0]), 0.5 * (a[1] + b[1])];
                let chord = (b[0] - a[0]).hypot(b[1] - a[1]);
                let bent = (m[0] - centre[0]).hypot(m[1] - centre[1]) > 2.5 || chord < 0.97 * (to - from);
                let hatched = patches.iter().any(|patch| patch.overlaps(&Area::around(centre, 8.0, 8.0)));
                let crowded = hatched || view.line_distance(centre, step).is_none_or(|d| d < 13.0);
                let near = written
                    .iter()
                    .any(|&(level, p)| (p[0] - centre[0]).hypot(p[1] - centre[1]) < if level == contour.level { 260.0 } else { 46.0 });
                if bent || crowded || near {
                    continue;
                }
                let angle = upright((b[1] - a[1]).atan2(b[0] - a[0]));
                let area = turned(centre, width + 4.0, (ABOVE + BELOW) * size, angle);
                if self.metal_below(&area.widened(2.0)) == 5
                    && drawing.centred(self.lettering, &text, centre, angle, self.style(centre, size, Weight::Regular, INK))
                {
                    written.push((contour.level, centre));
                    rests.extend(
                        [(0.0, from), (to, whole)]
                            .map(|(a, b)| Contour { level: contour.level, line: piece(&contour.line, &lengths, a, b) }),
                    );
                    contours[number].line.clear();
                    break;
                }
            }
        }
        if written.len() < 4 {
            self.beyond(drawing, order.iter().map(|&number| &contours[number]), step, &mut written);
        }
        contours.retain(|contour| !contour.line.is_empty());
        contours.extend(rests);
    }

    /// Potentials off the metal, beyond the ends of lines that have no words yet.
    fn beyond<'a>(&self, drawing: &mut Drawing, contours: impl Iterator<Item = &'a Contour>, step: f64, written: &mut Vec<(i64, Spot)>) {
        let size = 13.0;
        for contour in contours {
            if written.iter().any(|&(level, _)| level == contour.level) {
                continue;
            }
            let [first, second, ..] = contour.line[..] else { continue };
            let [.., before, last] = contour.line[..] else { continue };
            let text = format!("{} mV", with_step(contour.level as f64 * step, step));
            let half = 0.5 * self.lettering.width(&text, size, Weight::Regular) + 4.0;
            let mut ends = [(first, unit(second, first)), (last, unit(before, last))];
            ends.sort_by(|a, b| b.0[1].total_cmp(&a.0[1]));
            for (end, way) in ends {
                let away = half * way[0].abs() + 9.0 * way[1].abs() + 5.0;
                let place = [end[0] + away * way[0], end[1] + away * way[1]];
                let near = written.iter().any(|&(_, p)| (p[0] - place[0]).hypot(p[1] - place[1]) < 2.0 * half + 16.0);
                let style = Style { halo: None, ..self.style(place, size, Weight::Regular, GREY) };
                if !near
                    && self.metal_below(&Area::around(place, 2.0 * half, 13.0)) == 0
                    && drawing.centred(self.lettering, &text, place, 0.0, style)
                {
                    written.push((contour.level, place));
                    break;
                }
            }
        }
    }
}

/// The angle turned by half a turn where words would stand on their head. Steep words all read upwards, so that neighbours agree.
fn upright(angle: f64) -> f64 {
    use std::f64::consts::{FRAC_PI_2, PI};
    if angle > FRAC_PI_2 - 0.4 {
        angle - PI
    } else if angle <= -FRAC_PI_2 - 0.4 {
        angle + PI
    } else {
        angle
    }
}

fn running_length(line: &[Spot]) -> Vec<f64> {
    let mut sum = 0.0;
    let steps = line.windows(2).map(|w| (w[1][0] - w[0][0]).hypot(w[1][1] - w[0][1]));
    std::iter::once(0.0)
        .chain(steps.map(|step| {
            sum += step;
            sum
        }))
        .collect()
}

fn at_length(line: &[Spot], lengths: &[f64], wanted: f64) -> Spot {
    let after = lengths.partition_point(|&l| l < wanted).clamp(1, line.len() - 1);
    let (before, step) = (lengths[after - 1], lengths[after] - lengths[after - 1]);
    let t = if step > 0.0 { (wanted - before) / step } else { 0.0 };
    let (p, q) = (line[after - 1], line[after]);
    [p[0] + t * (q[0] - p[0]), p[1] + t * (q[1] - p[1])]
}

/// The line between two running lengths.
fn piece(line: &[Spot], lengths: &[f64], from: f64, to: f64) -> Vec<Spot> {
    let between = line.iter().zip(lengths).filter(|&(_, &l)| l > from && l < to).map(|(&p, _)| p);
    std::iter::once(at_length(line, lengths, from)).chain(between).chain([at_length(line, lengths, to)]).collect()
}

#[cfg(test)]
mod tests {
    use super::super::super::Panel;
    use super::super::super::arrange::arrange;
    use super::super::super::colour::Ramp;
    use super::super::super::contour::contours;
    use super::super::super::lettering::Lettering;
    use super::super::super::scale::Scale;
    use super::*;
    use crate::geometry::Point;

    #[test]
    fn a_line_ends_well_before_its_number() {
        let corners = [(0.0, 0.0), (40.0, 0.0), (40.0, 20.0), (0.0, 20.0)].map(|(x, y)| Point::new(x, y)).to_vec();
        let panels = [Panel {
            points: corners.clone(),
            loops: vec![corners],
            triangles: vec![[0, 1, 2], [0, 2, 3]],
            values: vec![1.0; 2],
            potential_mv: vec![-8.0, 8.0, 8.0, -8.0],
            ..Panel::default()
        }];
        let frame = arrange(&panels, &[0.0], 0.0, |_, _| 100.0).frames[0];
        let views = [View::new(&panels[0], frame, &Scale::new(&panels, None))];
        let (lettering, ramp) = (Lettering::new().unwrap(), Ramp::new());
        let mut drawing = Drawing::new(1600, 1200);
        let mut lines = contours(&views[0].corners, &panels[0].triangles, &panels[0].potential_mv, 2.0, (-9, 9));
        let before = lines.len();
        Notes { views: &views, lettering: &lettering, ramp: &ramp }.potentials(&mut drawing, &views[0], &mut lines, 2.0);
        assert!(drawing.labels.len() >= 5 && lines.len() == before + drawing.labels.len());
        for label in &drawing.labels {
            // The box reaches 2 px beyond the words.
            let kept_free = label.area.widened(OPEN - 2.5);
            assert!(!lines.iter().any(|c| c.line.windows(2).any(|w| kept_free.crossed_by(w[0], w[1]))), "{label:?}");
        }
    }

    #[test]
    fn words_never_stand_on_their_head() {
        for degrees in -180..=180 {
            let angle = upright(f64::from(degrees).to_radians());
            assert!((-1.98..=1.18).contains(&angle), "{degrees}: {angle}");
        }
    }

    #[test]
    fn half_the_length_of_a_bent_line_is_where_it_should_be() {
        let line = [[0.0, 0.0], [3.0, 0.0], [3.0, 5.0]];
        let lengths = running_length(&line);
        assert_eq!(lengths, vec![0.0, 3.0, 8.0]);
        assert_eq!(at_length(&line, &lengths, 4.0), [3.0, 1.0]);
        assert_eq!(at_length(&line, &lengths, 99.0)[0], 3.0);
        assert_eq!(piece(&line, &lengths, 1.0, 5.0), vec![[1.0, 0.0], [3.0, 0.0], [3.0, 2.0]]);
    }
}
