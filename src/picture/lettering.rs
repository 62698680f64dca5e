//! Words as outlines: the embedded font, widths, wrapping, and glyph curves at a place and an angle.

use super::PictureFault;
use super::place::Spot;
use ab_glyph::{Font, FontRef, OutlineCurve};

/// Weight of the strokes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Weight {
    /// For reading.
    Regular,
    /// For titles and numbers in balloons.
    Strong,
}

/// One step of a glyph's outline, in pixels.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Step {
    /// Start of a contour.
    Move(Spot),
    /// Straight on.
    Line(Spot),
    /// Curve with one control point.
    Quad(Spot, Spot),
    /// Curve with two control points.
    Cubic(Spot, Spot, Spot),
    /// End of a contour.
    Close,
}

/// Height of capitals over the em.
pub const CAPITAL: f64 = 0.727;
/// How far a line of text reaches above its base line, over the em.
pub const ABOVE: f64 = 0.80;
/// How far it reaches below, over the em.
pub const BELOW: f64 = 0.22;

/// The embedded font.
#[derive(Debug)]
pub struct Lettering {
    regular: FontRef<'static>,
    strong: FontRef<'static>,
}

impl Lettering {
    /// Reads the embedded font.
    pub fn new() -> Result<Self, PictureFault> {
        let read = |bytes: &'static [u8]| FontRef::try_from_slice(bytes).map_err(|_| PictureFault::Font);
        Ok(Self { regular: read(include_bytes!("font/Regular.otf"))?, strong: read(include_bytes!("font/SemiBold.otf"))? })
    }

    fn font(&self, weight: Weight) -> &FontRef<'static> {
        match weight {
            Weight::Regular => &self.regular,
            Weight::Strong => &self.strong,
        }
    }

    /// Width of one line, px. Control characters count as nothing.
    pub fn width(&self, text: &str, size: f64, weight: Weight) -> f64 {
        let font = self.font(weight);
        let em = f64::from(font.units_per_em().unwrap_or(1000.0));
        text.chars().filter(|c| !c.is_control()).map(|c| f64::from(font.h_advance_unscaled(font.glyph_id(c)))).sum::<f64>() * size / em
    }

    /// The line shortened with an ellipsis until it is no wider than `room`; empty where not even the ellipsis fits.
    pub fn fitted(&self, text: &str, size: f64, weight: Weight, room: f64) -> String {
        let ellipsis = self.width("…", size, weight);
        let (mut width, mut kept) = (0.0, 0);
        // One pass, so that a very long word costs no more than its length.
        for (at, c) in text.char_indices() {
            let end = at + c.len_utf8();
            width += self.width(&text[at..end], size, weight);
            if width > room {
                return if ellipsis <= room { format!("{}…", text[..kept].trim_end()) } else { String::new() };
            }
            if width + ellipsis <= room {
                kept = end;
            }
        }
        text.to_string()
    }

    /// The text in lines no wider than `room`, broken at blanks; a longer word is shortened.
    pub fn wrapped(&self, text: &str, size: f64, weight: Weight, room: f64) -> Vec<String> {
        let mut lines: Vec<String> = Vec::new();
        for word in text.split_whitespace() {
            if let Some(line) = lines.last_mut() {
                let longer = format!("{line} {word}");
                if self.width(&longer, size, weight) <= room {
                    *line = longer;
                    continue;
                }
            }
            lines.push(self.fitted(word, size, weight, room));
        }
        lines
    }

    /// Outline of one line whose base line starts at `at`, turned by `angle` (radians, clockwise as seen, since y points down).
    pub fn outline(&self, text: &str, size: f64, weight: Weight, at: Spot, angle: f64) -> Vec<Step> {
        let font = self.font(weight);
        let scale = size / f64::from(font.units_per_em().unwrap_or(1000.0));
        let (sin, cos) = angle.sin_cos();
        let mut pen = 0.0;
        let mut steps = Vec::new();
        for c in text.chars().filter(|c| !c.is_control()) {
            let id = font.glyph_id(c);
            let put = |p: ab_glyph::Point| {
                let (x, y) = (pen + scale * f64::from(p.x), -scale * f64::from(p.y));
                [at[0] + cos * x - sin * y, at[1] + sin * x + cos * y]
            };
            let mut last = None;
            for curve in font.outline(id).map_or_else(Vec::new, |outline| outline.curves) {
                let (start, end) = match curve {
                    OutlineCurve::Line(a, b) | OutlineCurve::Quad(a, _, b) | OutlineCurve::Cubic(a, _, _, b) => (a, b),
                };
                if last != Some(start) {
                    if last.is_some() {
                        steps.push(Step::Close);
                    }
                    steps.push(Step::Move(put(start)));
                }
                steps.push(match curve {
                    OutlineCurve::Line(_, b) => Step::Line(put(b)),
                    OutlineCurve::Quad(_, c, b) => Step::Quad(put(c), put(b)),
                    OutlineCurve::Cubic(_, c, d, b) => Step::Cubic(put(c), put(d), put(b)),
                });
                last = Some(end);
            }
            if last.is_some() {
                steps.push(Step::Close);
            }
            pen += scale * f64::from(font.h_advance_unscaled(id));
        }
        steps
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_font_has_every_sign_of_the_trade() {
        let lettering = Lettering::new().unwrap();
        for font in [&lettering.regular, &lettering.strong] {
            for c in "AZaz09 µμΩΔ²³·×°–—−…±≤≥→≈éäöüßçñøåłčžЖ".chars() {
                assert_ne!(font.glyph_id(c).0, 0, "{c}");
            }
        }
    }

    #[test]
    fn longer_text_is_wider_and_wrapping_keeps_to_the_room() {
        let lettering = Lettering::new().unwrap();
        let width = |t: &str| lettering.width(t, 14.0, Weight::Regular);
        assert!(width("10.0 A") > width("10.0") && width("10.0") > 0.0);
        let text = "Live cells: burn, arc and fire danger; Donaudampfschifffahrtsgesellschaft";
        let lines = lettering.wrapped(text, 14.0, Weight::Regular, 120.0);
        assert!(lines.len() > 3 && lines.iter().all(|l| width(l) <= 120.0), "{lines:?}");
        assert!(lines.last().unwrap().ends_with('…'));
        assert_eq!(lettering.wrapped("  ", 14.0, Weight::Regular, 120.0), Vec::<String>::new());
        assert_eq!(lettering.fitted("abc", 14.0, Weight::Regular, 0.0), "");
    }

    #[test]
    fn a_shortened_word_keeps_as_much_as_fits() {
        let lettering = Lettering::new().unwrap();
        let width = |t: &str| lettering.width(t, 14.0, Weight::Regular);
        let word = "Übergabe".repeat(20_000);
        let fitted = lettering.fitted(&word, 14.0, Weight::Regular, 300.0);
        let kept = fitted.trim_end_matches('…');
        let longer: String = word.chars().take(kept.chars().count() + 1).collect();
        assert!(word.starts_with(kept) && width(&fitted) <= 300.0, "{fitted}");
        assert!(width(&format!("{longer}…")) > 300.0, "{fitted}");
        assert_eq!(lettering.fitted("Übergabe", 14.0, Weight::Regular, 300.0), "Übergabe");
    }

    #[test]
    fn an_outline_stays_within_its_box() {
        let lettering = Lettering::new().unwrap();
        let steps = lettering.outline("Åg 54 mV", 20.0, Weight::Regular, [100.0, 50.0], 0.0);
        let width = lettering.width("Åg 54 mV", 20.0, Weight::Regular);
        let ends = steps.iter().filter_map(|s| match *s {
            Step::Move(p) | Step::Line(p) | Step::Quad(_, p) | Step::Cubic(_, _, p) => Some(p),
            Step::Close => None,
        });
        for [x, y] in ends {
            assert!((99.0..=101.0 + width).contains(&x) && (50.0 - 20.0 * 1.0..=50.0 + 20.0 * BELOW).contains(&y), "{x} {y}");
        }
    }
}
