//! Drawing on pixels: lines, areas and words, smooth at their edges.

use super::PictureFault;
use super::colour::Rgb;
use super::lettering::Step;
use super::place::Spot;
use tiny_skia::{Color, FillRule, LineCap, LineJoin, Paint, Path, PathBuilder, Pixmap, PremultipliedColorU8, Stroke, Transform};

/// A colour and how much of it covers what is below (0 to 1).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Ink {
    /// The colour.
    pub rgb: Rgb,
    /// Cover.
    pub cover: f32,
}

impl Ink {
    /// This colour, covering all.
    pub const fn full(rgb: Rgb) -> Self {
        Self { rgb, cover: 1.0 }
    }
    /// This colour, covering in part.
    pub const fn thin(rgb: Rgb, cover: f32) -> Self {
        Self { rgb, cover }
    }
    fn paint(self) -> Paint<'static> {
        let mut paint = Paint::default();
        let [r, g, b] = self.rgb;
        paint.set_color_rgba8(r, g, b, (255.0 * self.cover.clamp(0.0, 1.0) + 0.5) as u8);
        paint
    }
}

/// A white page.
#[derive(Debug)]
pub struct Canvas {
    pixels: Pixmap,
}

impl Canvas {
    /// A white page of this size in pixels.
    pub fn new(width: u32, height: u32) -> Result<Self, PictureFault> {
        let mut pixels = Pixmap::new(width, height).ok_or(PictureFault::Size { width, height })?;
        pixels.fill(Color::WHITE);
        Ok(Self { pixels })
    }

    /// Sets pixels of one row from `left` on; `None` leaves the pixel.
    pub fn row(&mut self, left: usize, row: usize, colours: impl Iterator<Item = Option<Rgb>>) {
        let width = self.pixels.width() as usize;
        if row >= self.pixels.height() as usize || left >= width {
            return;
        }
        let line = &mut self.pixels.pixels_mut()[row * width + left..(row + 1) * width];
        for (pixel, colour) in line.iter_mut().zip(colours) {
            if let Some(opaque) = colour.and_then(|[r, g, b]| PremultipliedColorU8::from_rgba(r, g, b, 255)) {
                *pixel = opaque;
            }
        }
    }

    /// Fills the inside of loops by the even-odd rule.
    pub fn fill(&mut self, loops: &[Vec<Spot>], ink: Ink) {
        let mut builder = PathBuilder::new();
        for points in loops {
            trace(&mut builder, points, true);
        }
        self.fill_path(builder.finish(), ink, FillRule::EvenOdd);
    }

    /// Draws a line with round ends and joins.
    pub fn line(&mut self, points: &[Spot], closed: bool, width: f64, ink: Ink) {
        let mut builder = PathBuilder::new();
        trace(&mut builder, points, closed);
        self.stroke_path(builder.finish(), width, ink);
    }

    /// Draws many separate lines at once.
    pub fn lines(&mut self, lines: &[Vec<Spot>], width: f64, ink: Ink) {
        let mut builder = PathBuilder::new();
        for points in lines {
            trace(&mut builder, points, false);
        }
        self.stroke_path(builder.finish(), width, ink);
    }

    /// Fills a disc.
    pub fn disc(&mut self, centre: Spot, radius: f64, ink: Ink) {
        self.fill_path(PathBuilder::from_circle(centre[0] as f32, centre[1] as f32, radius as f32), ink, FillRule::Winding);
    }

    /// Draws a circle.
    pub fn circle(&mut self, centre: Spot, radius: f64, width: f64, ink: Ink) {
        self.stroke_path(PathBuilder::from_circle(centre[0] as f32, centre[1] as f32, radius as f32), width, ink);
    }

    /// Fills glyph outlines, over a halo of this width where one is asked for.
    pub fn glyphs(&mut self, steps: &[Step], ink: Ink, halo: Option<(f64, Ink)>) {
        let mut builder = PathBuilder::new();
        let xy = |p: Spot| (p[0] as f32, p[1] as f32);
        for step in steps {
            match *step {
                Step::Move(p) => builder.move_to(p[0] as f32, p[1] as f32),
                Step::Line(p) => builder.line_to(p[0] as f32, p[1] as f32),
                Step::Quad(c, p) => {
                    let ((cx, cy), (x, y)) = (xy(c), xy(p));
                    builder.quad_to(cx, cy, x, y);
                }
                Step::Cubic(c, d, p) => {
                    let ((cx, cy), (dx, dy), (x, y)) = (xy(c), xy(d), xy(p));
                    builder.cubic_to(cx, cy, dx, dy, x, y);
                }
                Step::Close => builder.close(),
            }
        }
        let path = builder.finish();
        if let Some((width, around)) = halo {
            self.stroke_path(path.clone(), 2.0 * width, around);
        }
        self.fill_path(path, ink, FillRule::Winding);
    }

    fn fill_path(&mut self, path: Option<Path>, ink: Ink, rule: FillRule) {
        if let Some(path) = path {
            self.pixels.fill_path(&path, &ink.paint(), rule, Transform::identity(), None);
        }
    }

    fn stroke_path(&mut self, path: Option<Path>, width: f64, ink: Ink) {
        if let Some(path) = path {
            let stroke = Stroke { width: width as f32, line_cap: LineCap::Round, line_join: LineJoin::Round, ..Stroke::default() };
            self.pixels.stroke_path(&path, &ink.paint(), &stroke, Transform::identity(), None);
        }
    }

    /// Rows of red, green, blue.
    pub fn into_rgb(self) -> Vec<u8> {
        let mut rgb = Vec::with_capacity(self.pixels.data().len() / 4 * 3);
        // Every pixel is opaque: the page began white and paint only covers.
        for pixel in self.pixels.data().chunks_exact(4) {
            rgb.extend_from_slice(&pixel[..3]);
        }
        rgb
    }
}

fn trace(builder: &mut PathBuilder, points: &[Spot], closed: bool) {
    for (number, p) in points.iter().enumerate() {
        let (x, y) = (p[0] as f32, p[1] as f32);
        if number == 0 { builder.move_to(x, y) } else { builder.line_to(x, y) }
    }
    if closed && points.len() > 1 {
        builder.close();
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn pixel(rgb: &[u8], width: usize, x: usize, y: usize) -> [u8; 3] {
        let at = 3 * (y * width + x);
        [rgb[at], rgb[at + 1], rgb[at + 2]]
    }

    #[test]
    fn a_loop_inside_a_loop_is_a_hole() {
        let mut canvas = Canvas::new(30, 30).unwrap();
        let square = |low: f64, high: f64| vec![[low, low], [high, low], [high, high], [low, high]];
        canvas.fill(&[square(5.0, 25.0), square(10.0, 20.0)], Ink::full([10, 20, 30]));
        let rgb = canvas.into_rgb();
        assert_eq!(pixel(&rgb, 30, 7, 7), [10, 20, 30]);
        assert_eq!(pixel(&rgb, 30, 15, 15), [255; 3]);
        assert_eq!(pixel(&rgb, 30, 2, 2), [255; 3]);
    }

    #[test]
    fn rows_are_cut_at_the_page_and_nothing_is_drawn_of_nothing() {
        let mut canvas = Canvas::new(4, 2).unwrap();
        canvas.row(2, 1, [Some([1, 2, 3]), None, Some([9, 9, 9])].into_iter());
        canvas.row(0, 7, [Some([1, 2, 3])].into_iter());
        canvas.line(&[], true, 2.0, Ink::full([0; 3]));
        canvas.fill(&[], Ink::full([0; 3]));
        canvas.glyphs(&[], Ink::full([0; 3]), None);
        let rgb = canvas.into_rgb();
        assert_eq!(pixel(&rgb, 4, 2, 1), [1, 2, 3]);
        assert_eq!(rgb.iter().filter(|&&v| v != 255).count(), 3);
    }

    #[test]
    fn a_page_of_no_size_is_a_fault() {
        assert!(Canvas::new(0, 10).is_err());
    }
}
