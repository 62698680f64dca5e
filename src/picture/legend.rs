//! Colour bar, scale bar, key and title block.

use super::Sheet;
use super::canvas::Ink;
use super::colour::{Ramp, Rgb};
use super::drawing::{Drawing, Mark, Style};
use super::lettering::{Lettering, Weight};
use super::place::Spot;
use super::scale::{Scale, round_step, three_digits, with_step};

/// Lines and words.
pub const INK: Rgb = [28, 30, 38];
/// Words of less weight.
pub const GREY: Rgb = [92, 94, 100];
/// Rules between parts of the page.
const RULE: Rgb = [196, 194, 190];
/// The caution.
const CAUTION: Rgb = [142, 28, 34];
/// Height of the colour bar, px.
const BAR: f64 = 20.0;

/// Plain words of this size.
pub fn plain(size: f64, rgb: Rgb) -> Style {
    Style { size, weight: Weight::Regular, ink: Ink::full(rgb), halo: None }
}

/// Words of this size in the stronger weight.
pub fn strong(size: f64, rgb: Rgb) -> Style {
    Style { weight: Weight::Strong, ..plain(size, rgb) }
}

/// Title and subtitle from the page's upper left; returns where they end.
pub fn title(drawing: &mut Drawing, lettering: &Lettering, sheet: &Sheet, margin: f64) -> f64 {
    let room = f64::from(drawing.width) - 2.0 * margin;
    let mut base = margin - 14.0;
    let lines = lettering.wrapped(&sheet.title, 31.0, Weight::Strong, room);
    for (number, line) in lines.iter().take(2).enumerate() {
        base += if number == 0 { 36.0 } else { 40.0 };
        // A third line is one too many: the second says so.
        let words = if number == 1 && lines.len() > 2 {
            lettering.fitted(&format!("{line} …"), 31.0, Weight::Strong, room)
        } else {
            line.clone()
        };
        drawing.left_aligned(lettering, &words, [margin, base], strong(31.0, INK));
    }
    for line in lettering.wrapped(&sheet.subtitle, 18.0, Weight::Regular, room).iter().take(2) {
        base += 32.0;
        drawing.left_aligned(lettering, line, [margin, base], plain(18.0, GREY));
    }
    base + 12.0
}

/// What the legend needs to know.
pub struct Legend<'a> {
    /// The words.
    pub sheet: &'a Sheet,
    /// The scales.
    pub scale: &'a Scale,
    /// Pixels per mm.
    pub per_mm: f64,
    /// The font.
    pub lettering: &'a Lettering,
}

impl Legend<'_> {
    /// Writes the legend from its upper left corner; returns where it ends. `beside` stacks its parts, else they stand in a row.
    pub fn write(&self, drawing: &mut Drawing, at: Spot, width: f64, beside: bool) -> f64 {
        let [left, top] = at;
        let rule =
            |drawing: &mut Drawing, y: f64| drawing.marks.push(Mark::Lines(vec![vec![[left, y], [left + width, y]]], 1.0, Ink::full(RULE)));
        rule(drawing, top);
        let mut end;
        if beside {
            end = self.colour_bar(drawing, [left, top + 34.0], width - 66.0);
            rule(drawing, end + 22.0);
            end = self.key(drawing, [left, end + 46.0], width);
            if !self.sheet.footer.is_empty() {
                rule(drawing, end + 22.0);
                end = self.footer(drawing, [left, end + 52.0], width);
            }
        } else {
            let third = width / 3.0;
            let bar = self.colour_bar(drawing, [left, top + 34.0], third - 40.0);
            let key = self.key(drawing, [left + third + 76.0, top + 26.0], third - 70.0);
            let footer = self.footer(drawing, [left + 2.0 * third + 50.0, top + 34.0], third - 50.0);
            end = bar.max(key).max(footer);
        }
        if !self.sheet.caution.trim().is_empty() {
            rule(drawing, end + 18.0);
            end += 18.0;
            for line in self.lettering.wrapped(&self.sheet.caution, 16.0, Weight::Regular, width).iter().take(8) {
                end += 25.0;
                drawing.left_aligned(self.lettering, line, [left, end], plain(16.0, CAUTION));
            }
        }
        end
    }

    fn colour_bar(&self, drawing: &mut Drawing, at: Spot, width: f64) -> f64 {
        let ([left, base], scale) = (at, self.scale);
        let label = self.lettering.fitted(&self.sheet.scale_label, 16.0, Weight::Strong, width + 60.0);
        drawing.left_aligned(self.lettering, &label, at, strong(16.0, INK));
        let (top, bottom, right) = (base + 12.0, base + 12.0 + BAR, left + width);
        let ramp = Ramp::new();
        let slices = width.floor();
        for slice in 0..slices as usize {
            let (from, to) = (left + width * slice as f64 / slices, left + width * (slice + 1) as f64 / slices);
            // Half a pixel over the next slice, so that no seam shows.
            let area = vec![[from, top], [(to + 0.5).min(right), top], [(to + 0.5).min(right), bottom], [from, bottom]];
            drawing.marks.push(Mark::Fill(vec![area], Ink::full(ramp.at((slice as f64 / (slices - 1.0)) as f32))));
        }
        let mut rim = vec![[left, top], [right, top]];
        if scale.is_clipped() {
            let tip = [right + 16.0, 0.5 * (top + bottom)];
            drawing.marks.push(Mark::Fill(vec![vec![[right - 0.5, top], tip, [right - 0.5, bottom]]], Ink::full(ramp.at(1.0))));
            rim.push(tip);
            let words = format!("peak {}", three_digits(self.sheet.peak.unwrap_or(scale.peak)));
            drawing.left_aligned(self.lettering, &words, [right + 21.0, tip[1] + 5.0], plain(14.0, INK));
        }
        rim.extend([[right, bottom], [left, bottom]]);
        drawing.marks.push(Mark::Loop(rim, 1.2, Ink::full(INK)));
        let mut ticks = Vec::new();
        let count = (scale.top / scale.tick + 1e-6).floor().min(40.0) as usize;
        let words: Vec<String> = (0..=count).map(|number| with_step(number as f64 * scale.tick, scale.tick)).collect();
        let widest = words.iter().fold(0.0f64, |most, text| most.max(self.lettering.width(text, 15.0, Weight::Regular)));
        let every = if widest + 14.0 > width * scale.tick / scale.top { 2 } else { 1 };
        for (number, text) in words.iter().enumerate() {
            let x = left + width * number as f64 * scale.tick / scale.top;
            ticks.push(vec![[x, bottom], [x, bottom + if number % every == 0 { 6.0 } else { 4.0 }]]);
            if number % every != 0 {
                continue;
            }
            drawing.centred(self.lettering, text, [x, bottom + 18.0], 0.0, plain(15.0, INK));
        }
        drawing.marks.push(Mark::Lines(ticks, 1.2, Ink::full(INK)));
        bottom + 26.0
    }

    /// Scale bar and what the lines mean.
    fn key(&self, drawing: &mut Drawing, at: Spot, width: f64) -> f64 {
        let [left, top] = at;
        let length = round_step(170.0 / self.per_mm);
        let right = left + length * self.per_mm;
        let middle = 0.5 * (left + right);
        let y = top + 10.0;
        drawing.marks.push(Mark::Lines(vec![vec![[left, y], [right, y]]], 2.4, Ink::full(INK)));
        let ends = [(left, 6.0), (middle, 4.0), (right, 6.0)].map(|(x, h)| vec![[x, y - h], [x, y + h]]);
        drawing.marks.push(Mark::Lines(ends.to_vec(), 1.6, Ink::full(INK)));
        drawing.left_aligned(self.lettering, &format!("{} mm", with_step(length, length)), [right + 12.0, y + 5.5], plain(16.0, INK));
        let mut lines = vec!["seen from above, drawing y up".to_string()];
        lines.extend(self.equipotentials());
        if self.sheet.panels.iter().any(|p| !p.flow.is_empty()) {
            lines.push("arrows: direction of the current".to_string());
        }
        if self.sheet.panels.iter().flat_map(|p| &p.hotspots).any(|h| h.neck.is_some()) {
            lines.push("widths of necks in mm".to_string());
        }
        if self.sheet.panels.iter().any(|p| !p.contacts.is_empty()) {
            lines.push("dashed: area of contact".to_string());
        }
        if self.sheet.panels.iter().any(|p| !p.tips.is_empty()) {
            lines.push("crosses: tips of meters, + and − with their names".to_string());
        }
        let mut base = y + 12.0;
        for line in lines.iter().flat_map(|l| self.lettering.wrapped(l, 15.0, Weight::Regular, width)) {
            base += 22.0;
            drawing.left_aligned(self.lettering, &line, [left, base], plain(15.0, GREY));
        }
        base + 4.0
    }

    /// The step of the equipotentials, of each panel where they differ.
    fn equipotentials(&self) -> Option<String> {
        let steps: Vec<(&str, String)> = self
            .sheet
            .panels
            .iter()
            .zip(&self.scale.potentials)
            .filter_map(|(p, own)| own.map(|own| (p.name.as_str(), with_step(own.step, own.step))))
            .collect();
        let (_, first) = steps.first()?;
        if steps.iter().all(|(_, step)| step == first) {
            return Some(format!("thin lines: equal potential, every {first} mV"));
        }
        let each: Vec<String> = steps.iter().take(4).map(|(name, step)| format!("{step} mV on {name}")).collect();
        Some(format!("thin lines: equal potential, every {}", each.join(", ")))
    }

    fn footer(&self, drawing: &mut Drawing, at: Spot, width: f64) -> f64 {
        let [left, mut base] = at;
        base -= 24.0;
        for line in self.sheet.footer.iter().flat_map(|l| self.lettering.wrapped(l, 16.0, Weight::Regular, width)).take(12) {
            base += 24.0;
            drawing.left_aligned(self.lettering, &line, [left, base], plain(16.0, INK));
        }
        base + 4.0
    }
}
