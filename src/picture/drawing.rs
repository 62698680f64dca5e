//! A drawing as a list of marks, in the order they are painted, with the boxes of its words.

use super::canvas::{Canvas, Ink};
use super::colour::Ramp;
use super::lettering::{ABOVE, BELOW, Lettering, Step, Weight};
use super::place::{Area, Occupied, Spot};
use super::view::View;
use super::{LabelBox, PictureFault};

/// One thing to paint.
#[derive(Debug)]
pub enum Mark {
    /// The coloured metal of a panel.
    Field(usize),
    /// Inside of loops.
    Fill(Vec<Vec<Spot>>, Ink),
    /// Separate lines of one width.
    Lines(Vec<Vec<Spot>>, f64, Ink),
    /// A closed line.
    Loop(Vec<Spot>, f64, Ink),
    /// A disc.
    Disc(Spot, f64, Ink),
    /// A circle with the width of its line.
    Circle(Spot, f64, f64, Ink),
    /// Words, with a halo where they stand on something.
    Glyphs(Vec<Step>, Ink, Option<(f64, Ink)>),
}

/// How words look.
#[derive(Debug, Clone, Copy)]
pub struct Style {
    /// Size of the em, px.
    pub size: f64,
    /// Weight.
    pub weight: Weight,
    /// Colour.
    pub ink: Ink,
    /// Width and colour of a halo.
    pub halo: Option<(f64, Ink)>,
}

/// A page that is being composed.
#[derive(Debug)]
pub struct Drawing {
    /// Width, px.
    pub width: u32,
    /// Height, px.
    pub height: u32,
    /// What to paint, in order.
    pub marks: Vec<Mark>,
    /// All words placed.
    pub labels: Vec<LabelBox>,
    /// Where words may not go any more: words, and marks worth seeing.
    pub occupied: Occupied,
}

impl Drawing {
    /// An empty page.
    pub fn new(width: u32, height: u32) -> Self {
        let page = Area { left: 0.0, top: 0.0, right: f64::from(width), bottom: f64::from(height) }.widened(-6.0);
        Self { width, height, marks: Vec::new(), labels: Vec::new(), occupied: Occupied::new(page) }
    }

    /// Takes a place for words drawn elsewhere (a number in its balloon), if it is free.
    pub fn claim(&mut self, area: Area, text: &str) -> bool {
        let free = self.occupied.is_free(&area);
        if free {
            self.occupied.take(area);
            self.labels.push(LabelBox { area, text: text.to_string() });
        }
        free
    }

    /// Writes a line of words around a centre, if the place is free. `angle` in radians, clockwise as seen.
    pub fn centred(&mut self, lettering: &Lettering, text: &str, centre: Spot, angle: f64, style: Style) -> bool {
        let width = lettering.width(text, style.size, style.weight);
        let area = turned(centre, width + 4.0, (ABOVE + BELOW) * style.size, angle);
        if text.is_empty() || !self.claim(area, text) {
            return false;
        }
        let (sin, cos) = angle.sin_cos();
        let (x, y) = (-0.5 * width, 0.5 * (ABOVE - BELOW) * style.size);
        let start = [centre[0] + cos * x - sin * y, centre[1] + sin * x + cos * y];
        self.marks.push(Mark::Glyphs(lettering.outline(text, style.size, style.weight, start, angle), style.ink, style.halo));
        true
    }

    /// Writes a line of words from a left end, its base line at `at`, if the place is free.
    pub fn from_left(&mut self, lettering: &Lettering, text: &str, at: Spot, style: Style) -> bool {
        let width = lettering.width(text, style.size, style.weight);
        self.centred(lettering, text, [at[0] + 0.5 * width, at[1] - 0.5 * (ABOVE - BELOW) * style.size], 0.0, style)
    }

    /// Paints all marks.
    pub fn paint(&self, views: &[View<'_>]) -> Result<Canvas, PictureFault> {
        let mut canvas = Canvas::new(self.width, self.height)?;
        let ramp = Ramp::new();
        for mark in &self.marks {
            match mark {
                Mark::Field(panel) => views[*panel].paint(&mut canvas, &ramp),
                Mark::Fill(loops, ink) => canvas.fill(loops, *ink),
                Mark::Lines(lines, width, ink) => canvas.lines(lines, *width, *ink),
                Mark::Loop(points, width, ink) => canvas.line(points, true, *width, *ink),
                Mark::Disc(centre, radius, ink) => canvas.disc(*centre, *radius, *ink),
                Mark::Circle(centre, radius, width, ink) => canvas.circle(*centre, *radius, *width, *ink),
                Mark::Glyphs(steps, ink, halo) => canvas.glyphs(steps, *ink, *halo),
            }
        }
        Ok(canvas)
    }
}

/// The upright box around a turned one.
pub fn turned(centre: Spot, width: f64, height: f64, angle: f64) -> Area {
    let (sin, cos) = (angle.sin().abs(), angle.cos().abs());
    Area::around(centre, width * cos + height * sin, width * sin + height * cos)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn words_take_their_place_once() {
        let lettering = Lettering::new().unwrap();
        let mut drawing = Drawing::new(300, 100);
        let style = Style { size: 14.0, weight: Weight::Regular, ink: Ink::full([0; 3]), halo: None };
        assert!(drawing.centred(&lettering, "54 mV", [100.0, 50.0], 0.3, style));
        assert!(!drawing.centred(&lettering, "60 mV", [110.0, 50.0], 0.0, style));
        assert!(!drawing.centred(&lettering, "60 mV", [299.0, 50.0], 0.0, style), "off the page");
        assert!(!drawing.centred(&lettering, "", [200.0, 50.0], 0.0, style));
        assert_eq!((drawing.labels.len(), drawing.marks.len()), (1, 1));
    }

    #[test]
    fn a_quarter_turn_swaps_width_and_height() {
        let area = turned([10.0, 10.0], 8.0, 2.0, std::f64::consts::FRAC_PI_2);
        assert!((area.width() - 2.0).abs() < 1e-12 && (area.height() - 8.0).abs() < 1e-12);
    }
}
