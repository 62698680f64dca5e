//! Where panels and legend go on the page: one scale of length for all, as large as the page allows.

use super::Panel;
use super::place::{Area, Spot};
use crate::geometry::{BoundingBox, Point};

/// Width of the page, px.
pub const PAGE_WIDTH: f64 = 1600.0;
/// Blank rim of the page, px.
pub const MARGIN: f64 = 48.0;
/// The page grows no higher than this, px.
const MOST_HEIGHT: f64 = 1500.0;
/// Width of a legend that stands beside the panels, px.
const LEGEND_WIDTH: f64 = 330.0;
/// Room between legend and panels, px.
const LEGEND_GAP: f64 = 40.0;
/// Least distance of columns of panels, px.
const COLUMN_GAP: f64 = 28.0;

/// A panel's place and scale.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Frame {
    /// The panel's extent on the page.
    pub area: Area,
    /// Pixels per millimetre.
    pub scale: f64,
    upper_left: Point,
}

impl Frame {
    /// The place of a point on the page.
    pub fn at(&self, p: Point) -> Spot {
        [self.area.left + (p.x - self.upper_left.x) * self.scale, self.area.top + (self.upper_left.y - p.y) * self.scale]
    }

    /// The places of many points.
    pub fn all(&self, points: &[Point]) -> Vec<Spot> {
        points.iter().map(|&p| self.at(p)).collect()
    }
}

/// The page divided.
#[derive(Debug, Clone, PartialEq)]
pub struct Page {
    /// Height, px.
    pub height: f64,
    /// One per panel.
    pub frames: Vec<Frame>,
    /// Where the legend begins, and how wide it is.
    pub legend: (Spot, f64),
    /// True when the legend stands beside the panels, not below.
    pub beside: bool,
}

/// What the panel covers, mm.
pub fn extent(panel: &Panel) -> BoundingBox {
    BoundingBox::around(panel.loops.iter().flatten().chain(&panel.points).copied())
}

/// One way to set the panels.
struct Setting<'a> {
    panels: &'a [Panel],
    headings: &'a [f64],
    columns: usize,
    beside: bool,
}

impl Setting<'_> {
    fn room(&self) -> f64 {
        PAGE_WIDTH - 2.0 * MARGIN - if self.beside { LEGEND_WIDTH + LEGEND_GAP } else { 0.0 }
    }

    /// Frames from (0, 0) on at this scale, and the width and height they need.
    fn frames(&self, scale: f64) -> (Vec<Frame>, f64, f64) {
        let extents: Vec<BoundingBox> = self.panels.iter().map(extent).collect();
        let union = extents.iter().fold(BoundingBox::EMPTY, |all, &one| all.union(one));
        let widest = extents.iter().fold(0.0f64, |most, e| most.max(e.width()));
        let aligned = self.columns == 1 && union.width() <= 1.3 * widest;
        let count = self.panels.len();
        // A stack is drawn as it lies: the top sheet above.
        let order: Vec<usize> = if self.columns == 1 { (0..count).rev().collect() } else { (0..count).collect() };
        let side = |panel: usize| if self.panels[panel].hotspots.is_empty() { 4.0 } else { 26.0 };
        let shift = |panel: usize| if aligned { (extents[panel].min.x - union.min.x) * scale } else { 0.0 };
        let columns: Vec<f64> = (0..self.columns)
            .map(|column| {
                let needs = |panel: usize| shift(panel) + (extents[panel].width() * scale).max(self.headings[panel]) + 2.0 * side(panel);
                order.iter().skip(column).step_by(self.columns).map(|&panel| needs(panel)).fold(0.0, f64::max)
            })
            .collect();
        let mut frames: Vec<Option<Frame>> = vec![None; count];
        let mut bottom = 0.0f64;
        for row in order.chunks(self.columns) {
            let noted = row.iter().any(|&panel| !self.panels[panel].hotspots.is_empty());
            let (above, below) = if noted { (68.0, 50.0) } else { (44.0, 12.0) };
            let top = bottom + above;
            let mut left = 0.0;
            for (column, &panel) in row.iter().enumerate() {
                let (x, width, height) =
                    (left + side(panel) + shift(panel), extents[panel].width() * scale, extents[panel].height() * scale);
                let area = Area { left: x, top, right: x + width, bottom: top + height };
                frames[panel] = Some(Frame { area, scale, upper_left: Point::new(extents[panel].min.x, extents[panel].max.y) });
                left += columns[column] + COLUMN_GAP;
                bottom = bottom.max(area.bottom + below);
            }
        }
        let width = columns.iter().sum::<f64>() + COLUMN_GAP * (self.columns as f64 - 1.0);
        (frames.into_iter().flatten().collect(), width, bottom)
    }

    /// The largest scale at which all fits, by halving.
    fn best_scale(&self, height: f64) -> f64 {
        let widest = self.panels.iter().map(|p| extent(p).width()).fold(0.0, f64::max);
        let (mut low, mut high) = (0.0, PAGE_WIDTH / widest);
        for _ in 0..40 {
            let middle = 0.5 * (low + high);
            let (_, needed_width, needed_height) = self.frames(middle);
            if needed_width <= self.room() && needed_height <= height { low = middle } else { high = middle }
        }
        low
    }
}

/// Divides the page. `headings` are the widths of the panels' headings, `top` is where the title block ends, and the legend is as high as
/// `legend_height(width, beside)` says. There must be a panel, and every panel must have an extent.
pub fn arrange(panels: &[Panel], headings: &[f64], top: f64, legend_height: impl Fn(f64, bool) -> f64) -> Page {
    let full = PAGE_WIDTH - 2.0 * MARGIN;
    let below = legend_height(full, false);
    let mut best: Option<(f64, Setting<'_>)> = None;
    for beside in [false, true] {
        let height = (MOST_HEIGHT - top - MARGIN - if beside { 0.0 } else { below }).max(200.0);
        for columns in 1..=panels.len() {
            let setting = Setting { panels, headings, columns, beside };
            let scale = setting.best_scale(height);
            // Only a clear gain is worth leaving the plain order: stacked, the legend below.
            if best.as_ref().is_none_or(|(known, _)| scale > 1.06 * known) {
                best = Some((scale, setting));
            }
        }
    }
    let (scale, setting) = best.unwrap_or((1.0, Setting { panels, headings, columns: 1, beside: false }));
    let (mut frames, width, height) = setting.frames(scale);
    let left = MARGIN + 0.5 * (setting.room() - width).max(0.0);
    for frame in &mut frames {
        let area = frame.area;
        frame.area = Area { left: area.left + left, top: area.top + top, right: area.right + left, bottom: area.bottom + top };
    }
    let (legend, end) = if setting.beside {
        let at = [PAGE_WIDTH - MARGIN - LEGEND_WIDTH, top + 44.0];
        ((at, LEGEND_WIDTH), (top + height).max(at[1] + legend_height(LEGEND_WIDTH, true)))
    } else {
        (([MARGIN, top + height + 14.0], full), top + height + 14.0 + below)
    };
    Page { height: (end + 0.6 * MARGIN).ceil(), frames, legend, beside: setting.beside }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn plate(x: f64, y: f64, width: f64, height: f64) -> Panel {
        let corner = |dx: f64, dy: f64| Point::new(x + dx, y + dy);
        Panel { loops: vec![vec![corner(0.0, 0.0), corner(width, 0.0), corner(width, height), corner(0.0, height)]], ..Panel::default() }
    }

    fn arranged(panels: &[Panel]) -> Page {
        arrange(panels, &vec![200.0; panels.len()], 100.0, |_, beside| if beside { 300.0 } else { 160.0 })
    }

    #[test]
    fn a_long_part_fills_the_width_and_a_square_one_puts_the_legend_beside() {
        let long = arranged(&[plate(0.0, 0.0, 300.0, 8.0)]);
        assert!(!long.beside && long.frames[0].area.width() > 1450.0 && long.height < 500.0, "{long:?}");
        let square = arranged(&[plate(0.0, 0.0, 40.0, 40.0)]);
        assert!(square.beside && square.frames[0].area.height() > 1000.0 && square.height <= MOST_HEIGHT + MARGIN, "{square:?}");
    }

    #[test]
    fn stacked_layers_share_scale_and_x() {
        let page = arranged(&[plate(0.0, 0.0, 126.0, 25.0), plate(5.0, 2.0, 50.0, 19.0)]);
        let [carrier, overlay] = [page.frames[0], page.frames[1]];
        assert_eq!(carrier.scale, overlay.scale);
        assert!((carrier.at(Point::new(5.0, 0.0))[0] - overlay.area.left).abs() < 1e-9);
        assert!(overlay.area.bottom < carrier.area.top, "the top sheet is above");
    }

    #[test]
    fn tall_layers_stand_side_by_side_and_y_points_up() {
        let page = arranged(&[plate(0.0, 0.0, 20.0, 90.0), plate(0.0, 0.0, 20.0, 90.0)]);
        assert!(page.frames[0].area.right < page.frames[1].area.left);
        let frame = page.frames[0];
        assert!(frame.at(Point::new(0.0, 90.0))[1] < frame.at(Point::new(0.0, 0.0))[1]);
    }

    #[test]
    fn any_size_of_part_fits() {
        for size in [1e-3, 0.5, 2000.0, 1e8] {
            let page = arranged(&[plate(-size, 3.0 * size, size, 0.4 * size)]);
            assert!(page.frames[0].area.width() > 1000.0 && page.frames[0].area.right < PAGE_WIDTH, "{page:?}");
        }
    }
}
