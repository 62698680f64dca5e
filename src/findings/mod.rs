//! What a reader wants to know of a solved job: plain, serialisable, units in the field names. This is `result.json`.

pub mod find;
pub mod gauge;
pub mod hotspot;
pub mod kind;
pub mod metal;
pub mod section;
#[cfg(test)]
mod shapes;
pub mod summit;
#[cfg(test)]
mod trial;
pub mod verdict;

pub use find::{Found, find, find_with};

use crate::diagnostic::Remark;
use serde::Serialize;
use std::collections::BTreeMap;

/// A guaranteed enclosure; `value` is its middle.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Enclosure {
    /// Not below this.
    pub low: f64,
    /// The middle.
    pub value: f64,
    /// Not above this.
    pub high: f64,
}

impl Enclosure {
    /// The enclosure `value` ± `half`.
    pub fn around(value: f64, half: f64) -> Self {
        Self { low: value - half, value, high: value + half }
    }
    /// The same in another unit.
    pub fn scaled(self, factor: f64) -> Self {
        let (a, b) = (self.low * factor, self.high * factor);
        Self { low: a.min(b), value: self.value * factor, high: a.max(b) }
    }
}

/// A range without a middle.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Range {
    /// Not below this.
    pub low: f64,
    /// Not above this.
    pub high: f64,
}

/// Everything found out about one job.
#[derive(Debug, Clone, Serialize)]
pub struct Findings {
    /// Version of this form.
    pub schema: u32,
    /// The job's title.
    pub title: String,
    /// Version of the tool.
    pub version: String,
    /// Loss in metal and joints, without the cells' own.
    pub loss_w: Enclosure,
    /// Port resistance of the bar, for exactly two electrodes.
    pub resistance_mohm: Option<Enclosure>,
    /// Largest difference between two electrodes on one connected piece; `None` where no piece has two. Not part of the JSON, where the
    /// electrodes' own voltages stand.
    #[serde(skip)]
    pub largest_drop_mv: Option<Enclosure>,
    /// How the solving went.
    pub run: Run,
    /// Terminals and cells' ends.
    pub electrodes: Vec<ElectrodeFinding>,
    /// Sheets.
    pub layers: Vec<LayerFinding>,
    /// Areas of contact.
    pub contacts: Vec<ContactFinding>,
    /// Joins, one row per spot.
    pub joins: Vec<JoinFinding>,
    /// Where current crowds, worst first.
    pub hotspots: Vec<Hotspot>,
    /// Meter readings.
    pub probes: Vec<ProbeFinding>,
    /// Currents across lines.
    pub crossings: Vec<CrossingFinding>,
    /// Limits and how they are kept.
    pub verdicts: Vec<VerdictFinding>,
    /// What was moved, dropped, assumed or not reached.
    pub remarks: Vec<Remark>,
}

/// How the solving went.
#[derive(Debug, Clone, Serialize)]
pub struct Run {
    /// Vertices of the last mesh.
    pub vertices: usize,
    /// Triangles of the last mesh.
    pub triangles: usize,
    /// Unknown potentials.
    pub unknowns: usize,
    /// Rounds of refinement.
    pub rounds: usize,
    /// (high - low) / low of the loss, in per cent.
    pub bracket_percent: f64,
    /// True when the accuracy asked for was reached.
    pub reached: bool,
    /// Wall time of the stages; only when timings are asked for.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub seconds: Option<BTreeMap<String, f64>>,
}

/// One terminal or cell's end.
#[derive(Debug, Clone, Serialize)]
pub struct ElectrodeFinding {
    /// Its name.
    pub name: String,
    /// "terminal" or "cell".
    pub kind: &'static str,
    /// Group of its shares.
    pub group: Option<String>,
    /// Current into the bar.
    pub current_a: f64,
    /// Guaranteed range of that current (no width where it was given).
    pub current_range_a: Range,
    /// Potential against the job's zero.
    pub voltage_mv: Enclosure,
    /// Its current in per cent of its group's sum; `None` for terminals.
    pub share_percent: Option<f64>,
    /// Loss in its joints.
    pub loss_w: f64,
    /// Its spots.
    pub spots: Vec<SpotFinding>,
}

/// One spot of an electrode.
#[derive(Debug, Clone, Serialize)]
pub struct SpotFinding {
    /// Middle of the spot.
    pub x_mm: f64,
    /// Middle of the spot.
    pub y_mm: f64,
    /// Current into the bar.
    pub current_a: f64,
    /// Can minus sheet, mean over the spot.
    pub drop_mv: f64,
    /// Its current in per cent of its electrode's.
    pub share_percent: f64,
    /// Gauge peak on its rim; `None` for lines.
    pub rim_a_mm2: Option<f64>,
}

/// One sheet.
#[derive(Debug, Clone, Serialize)]
pub struct LayerFinding {
    /// Its name.
    pub name: String,
    /// Its metal.
    pub metal: String,
    /// Its area, arcs counted as drawn.
    pub area_mm2: f64,
    /// Its mass; `None` where the density is not known.
    pub mass_g: Option<f64>,
    /// Loss in the metal.
    pub loss_w: f64,
    /// Largest gauge peak.
    pub peak_a_mm2: f64,
}

/// One area of contact.
#[derive(Debug, Clone, Serialize)]
pub struct ContactFinding {
    /// Its name.
    pub name: String,
    /// The two sheets.
    pub between: [String; 2],
    /// Net current from the first sheet into the second; `None` for a bond, where it is not told apart.
    pub current_a: Option<f64>,
    /// Sum of magnitudes of the current that passes; `None` for a bond.
    pub exchanged_a: Option<f64>,
    /// Loss in the contact.
    pub loss_w: f64,
}

/// One spot of a join.
#[derive(Debug, Clone, Serialize)]
pub struct JoinFinding {
    /// The two sheets.
    pub between: [String; 2],
    /// Middle of the spot.
    pub x_mm: f64,
    /// Middle of the spot.
    pub y_mm: f64,
    /// Current from the first sheet into the second; `None` for a bond.
    pub current_a: Option<f64>,
    /// First sheet minus second, mean over the spot.
    pub drop_mv: f64,
    /// Loss in the spot.
    pub loss_w: f64,
}

/// A place where current crowds.
#[derive(Debug, Clone, Serialize)]
pub struct Hotspot {
    /// Place in the table, from 1.
    pub rank: usize,
    /// What it is.
    pub kind: HotspotKind,
    /// Name of the sheet.
    pub layer: String,
    /// Centre of the gauge disc.
    pub x_mm: f64,
    /// Centre of the gauge disc.
    pub y_mm: f64,
    /// Gauge peak: mean of |J| over the gauge disc clipped to the metal.
    pub peak_a_mm2: f64,
    /// Diameter of the gauge disc.
    pub gauge_mm: f64,
    /// Width of the section, or length of a weld's rim; `None` where every straight cut runs into a held patch.
    pub width_mm: Option<f64>,
    /// Current through the section or rim.
    pub section_a: Option<f64>,
    /// Mean density in the section or rim.
    pub section_a_mm2: Option<f64>,
    /// Gauge peak over section mean.
    pub crowding: Option<f64>,
    /// Drop over the stretch of one section width.
    pub drop_mv: Option<f64>,
    /// Loss over that stretch.
    pub loss_w: Option<f64>,
    /// What limits the row's worth, if anything.
    pub remark: Option<String>,
}

/// What a hotspot is, by geometry.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub enum HotspotKind {
    /// Least width in the flow path.
    #[serde(rename = "neck")]
    Neck,
    /// A re-entrant corner of the outline.
    #[serde(rename = "inside corner")]
    InsideCorner,
    /// The edge of a hole.
    #[serde(rename = "hole edge")]
    HoleEdge,
    /// The rim of a weld spot.
    #[serde(rename = "weld rim")]
    WeldRim,
    /// Where a terminal ends on the metal.
    #[serde(rename = "terminal edge")]
    TerminalEdge,
    /// The end of a sheet that lies on another.
    #[serde(rename = "overlay end")]
    OverlayEnd,
    /// No crowding at all: one row per connected piece.
    #[serde(rename = "strip")]
    Strip,
}

/// One meter reading.
#[derive(Debug, Clone, Serialize)]
pub struct ProbeFinding {
    /// Its name.
    pub name: String,
    /// First tip minus second.
    pub drop_mv: Enclosure,
}

/// Current across one line.
#[derive(Debug, Clone, Serialize)]
pub struct CrossingFinding {
    /// Its name.
    pub name: String,
    /// Per sheet, in the order of the stack.
    pub current_a: BTreeMap<String, f64>,
    /// Sum over the sheets.
    pub total_a: f64,
}

/// One limit and how it is kept.
#[derive(Debug, Clone, Serialize)]
pub struct VerdictFinding {
    /// Which limit: its key in the sheet, with the layer, group or spot it is for.
    pub limit: String,
    /// What was found, unfavourable end, in the limit's unit; `None` when not checked.
    pub value: Option<f64>,
    /// 1 - value / limit, in per cent.
    pub margin_percent: Option<f64>,
    /// The verdict.
    pub verdict: Verdict,
    /// Where the limit came from.
    pub source: String,
}

/// PASS to 80 % of the limit, TIGHT to 100 %, FAIL above.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub enum Verdict {
    /// Up to 80 %.
    #[serde(rename = "PASS")]
    Pass,
    /// 80 to 100 %.
    #[serde(rename = "TIGHT")]
    Tight,
    /// Above 100 %.
    #[serde(rename = "FAIL")]
    Fail,
    /// No limit or no figure.
    #[serde(rename = "NOT CHECKED")]
    NotChecked,
}
