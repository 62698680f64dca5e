//! From plain shapes, values and words to a PNG: the heat map with its balloons, scales and notes.
//!
//! The renderer knows no physics. A [`Sheet`] says what to show; [`heat_map`] draws it and [`layout`] tells where the words went.

mod arrange;
mod canvas;
mod colour;
mod compose;
mod contour;
mod drawing;
mod encode;
mod flow;
mod legend;
mod lettering;
mod notes;
mod place;
mod raster;
mod scale;
mod view;

use crate::geometry::Point;
use std::fmt;

pub use place::Area;

/// All that one picture shows.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Sheet {
    /// What it is, large.
    pub title: String,
    /// Under which load and at which temperature, one line below.
    pub subtitle: String,
    /// One per layer, the bottom layer first. All share one scale of length, of colour and of potential.
    pub panels: Vec<Panel>,
    /// What the colour means, with its unit.
    pub scale_label: String,
    /// What stands at the clipped end of the scale: a gauge peak, since the largest triangle's value depends on the mesh. `None`: that value.
    pub peak: Option<f64>,
    /// Lines of the title block: loss, drop, bracket.
    pub footer: Vec<String>,
    /// A caution, in its own line at the foot; empty for none.
    pub caution: String,
}

/// One layer seen from above. Lengths in mm, y up.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Panel {
    /// Name of the layer.
    pub name: String,
    /// Metal, thickness, current: `nickel-201 0.15 mm · 15.0 A`.
    pub details: String,
    /// Rim of the metal: closed loops, inside by the even-odd rule.
    pub loops: Vec<Vec<Point>>,
    /// Corners of the triangles. A slit has a corner on either side.
    pub points: Vec<Point>,
    /// Triangles as numbers into `points`.
    pub triangles: Vec<[u32; 3]>,
    /// Per triangle: what the colour shows, usually the current density in A/mm².
    pub values: Vec<f64>,
    /// Per triangle: the region it lies in; the colour jumps where regions meet and is smooth elsewhere. Empty for one region.
    pub regions: Vec<u32>,
    /// Per point: potential, mV; empty for no equipotentials.
    pub potential_mv: Vec<f64>,
    /// Per triangle: the current's direction; only the direction is used. Empty for no arrows.
    pub flow: Vec<[f64; 2]>,
    /// Spots and other joints with a rim.
    pub spots: Vec<SpotMark>,
    /// Terminals that are lines.
    pub lines: Vec<Vec<Point>>,
    /// Terminals that are areas; hatched.
    pub patches: Vec<Vec<Point>>,
    /// Areas of contact with another sheet; dashed.
    pub contacts: Vec<Vec<Point>>,
    /// Tips of meters with their words: `middle +`.
    pub tips: Vec<(Point, String)>,
    /// Lines across which current is counted, with their words: `one 16.8 A`.
    pub crossings: Vec<([Point; 2], String)>,
    /// Names of electrodes and where they belong.
    pub names: Vec<(Point, String)>,
    /// Hotspots, worst first.
    pub hotspots: Vec<HotspotMark>,
}

/// One weld spot.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct SpotMark {
    /// Its rim.
    pub outline: Vec<Point>,
    /// Its current, `10.0 A`; shown where room allows.
    pub label: Option<String>,
}

/// One row of the hotspot table.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct HotspotMark {
    /// Number of the row.
    pub number: usize,
    /// Where the leader ends.
    pub at: Point,
    /// The two rim points of a neck.
    pub neck: Option<[Point; 2]>,
    /// Width of the neck, `4.00`.
    pub text: Option<String>,
}

/// A place where words stand, px.
#[derive(Debug, Clone, PartialEq)]
pub struct LabelBox {
    /// The place.
    pub area: Area,
    /// The words.
    pub text: String,
}

/// Where the words of a sheet went.
#[derive(Debug, Clone, PartialEq)]
pub struct Placed {
    /// All words with their boxes, pairwise disjoint and within the page.
    pub boxes: Vec<LabelBox>,
    /// Width of the page, px.
    pub width: u32,
    /// Height of the page, px.
    pub height: u32,
}

/// Why there is no picture.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum PictureFault {
    /// No panel, or a panel without metal.
    Empty,
    /// Lists of a panel do not fit together, or a triangle names a corner that is not there.
    Lists {
        /// Number of the panel, from 0.
        panel: usize,
    },
    /// A coordinate, value or potential is not a finite number.
    NotFinite {
        /// Number of the panel, from 0.
        panel: usize,
    },
    /// The page has no size that can be drawn.
    Size {
        /// Asked width, px.
        width: u32,
        /// Asked height, px.
        height: u32,
    },
    /// The embedded font cannot be read.
    Font,
    /// The PNG could not be written.
    Encoding(String),
}

impl fmt::Display for PictureFault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Empty => write!(f, "there is no metal to draw"),
            Self::Lists { panel } => write!(f, "the lists of panel {panel} do not fit together"),
            Self::NotFinite { panel } => write!(f, "panel {panel} holds a number that is not finite"),
            Self::Size { width, height } => write!(f, "a page of {width} x {height} pixels cannot be drawn"),
            Self::Font => write!(f, "the embedded font cannot be read"),
            Self::Encoding(reason) => write!(f, "the picture cannot be encoded: {reason}"),
        }
    }
}

impl std::error::Error for PictureFault {}

/// The picture of a sheet as PNG bytes, 1600 px wide, the height by content. The same sheet gives the same bytes.
///
/// # Errors
/// A sheet whose lists do not fit together, that holds no metal or numbers that are not finite.
pub fn heat_map(sheet: &Sheet) -> Result<Vec<u8>, PictureFault> {
    check(sheet)?;
    let lettering = lettering::Lettering::new()?;
    let scene = compose::compose(sheet, &lettering);
    let canvas = scene.drawing.paint(&scene.views)?;
    encode::png(scene.drawing.width, scene.drawing.height, &canvas.into_rgb())
}

/// Where the words of a sheet go, without drawing.
///
/// # Errors
/// As [`heat_map`].
pub fn layout(sheet: &Sheet) -> Result<Placed, PictureFault> {
    check(sheet)?;
    let lettering = lettering::Lettering::new()?;
    let drawing = compose::compose(sheet, &lettering).drawing;
    Ok(Placed { boxes: drawing.labels, width: drawing.width, height: drawing.height })
}

/// Faults of the lists, so that all that follows may index.
fn check(sheet: &Sheet) -> Result<(), PictureFault> {
    if sheet.panels.is_empty() {
        return Err(PictureFault::Empty);
    }
    for (panel, p) in sheet.panels.iter().enumerate() {
        let fits = |length: usize, asked: usize| length == 0 || length == asked;
        let known = p.points.len();
        if p.values.len() != p.triangles.len()
            || !fits(p.potential_mv.len(), known)
            || !fits(p.flow.len(), p.triangles.len())
            || !fits(p.regions.len(), p.triangles.len())
            || p.triangles.iter().flatten().any(|&corner| corner as usize >= known)
        {
            return Err(PictureFault::Lists { panel });
        }
        let spots = p.spots.iter().flat_map(|s| &s.outline);
        let marks = p.hotspots.iter().flat_map(|h| h.neck.iter().flatten().chain([&h.at]));
        let shapes = p.loops.iter().chain(&p.lines).chain(&p.patches).chain(&p.contacts).flatten();
        let readings = p.tips.iter().map(|(at, _)| at).chain(p.crossings.iter().flat_map(|(ends, _)| ends));
        let mut places = shapes.chain(readings).chain(spots).chain(marks).chain(&p.points).chain(p.names.iter().map(|(at, _)| at));
        let numbers = p.values.iter().chain(&p.potential_mv).chain(p.flow.iter().flatten());
        // Beyond this, differences of coordinates lose the part itself.
        if places.any(|q| !(q.x.abs() < 1e9 && q.y.abs() < 1e9)) || !numbers.copied().all(|v| v.abs() < 1e30) {
            return Err(PictureFault::NotFinite { panel });
        }
        let extent = arrange::extent(p);
        if p.triangles.is_empty() || !(extent.width() > 0.0 && extent.height() > 0.0) {
            return Err(PictureFault::Empty);
        }
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn square() -> Sheet {
        let corners = [(0.0, 0.0), (10.0, 0.0), (10.0, 10.0), (0.0, 10.0)].map(|(x, y)| Point::new(x, y)).to_vec();
        let panel = Panel {
            loops: vec![corners.clone()],
            points: corners,
            triangles: vec![[0, 1, 2], [0, 2, 3]],
            values: vec![1.0, 2.0],
            ..Panel::default()
        };
        Sheet { panels: vec![panel], ..Sheet::default() }
    }

    #[test]
    fn lists_that_do_not_fit_are_told() {
        assert_eq!(heat_map(&Sheet::default()), Err(PictureFault::Empty));
        let mut sheet = square();
        sheet.panels[0].triangles[1] = [0, 2, 9];
        assert_eq!(heat_map(&sheet), Err(PictureFault::Lists { panel: 0 }));
        let mut sheet = square();
        sheet.panels[0].regions = vec![0; 3];
        assert_eq!(heat_map(&sheet), Err(PictureFault::Lists { panel: 0 }));
        let mut sheet = square();
        sheet.panels[0].values.pop();
        assert_eq!(heat_map(&sheet), Err(PictureFault::Lists { panel: 0 }));
        let mut sheet = square();
        sheet.panels[0].potential_mv = vec![f64::NAN; 4];
        assert_eq!(layout(&sheet), Err(PictureFault::NotFinite { panel: 0 }));
        let mut sheet = square();
        let panel = &mut sheet.panels[0];
        panel.points.iter_mut().chain(panel.loops.iter_mut().flatten()).for_each(|p| p.y = 3.0);
        assert_eq!(layout(&sheet), Err(PictureFault::Empty));
    }

    #[test]
    fn a_bare_square_is_a_picture() {
        let bytes = heat_map(&square()).unwrap();
        assert_eq!(&bytes[1..4], b"PNG");
        assert_eq!(bytes, heat_map(&square()).unwrap());
    }

    #[test]
    fn no_current_at_all_is_a_picture_too() {
        let mut sheet = square();
        sheet.panels[0].values = vec![0.0; 2];
        sheet.panels[0].potential_mv = vec![5.0; 4];
        sheet.panels[0].flow = vec![[0.0, 0.0]; 2];
        assert!(heat_map(&sheet).is_ok());
    }
}
