//! Words that several reports share: cautions, and figures with their intervals.

use crate::findings::{Enclosure, HotspotKind, Verdict};
use crate::problem::Problem;
use crate::quantity::{outward, three};

/// The caution that stands in every report.
pub const CAUTION: &str = "Estimate only. Live cells: burn, arc and fire danger. Test before use; see the cautions in the manual.";

/// The long caution, for `--help` and the manual.
pub const LONG_CAUTION: &str = "\
CAUTION: LIVE BATTERY WORK. Charged cells drive a very large current into any slip and cannot be switched off; burns, arcs, fire and toxic gas can follow. \
What this tool prints is an estimate from your inputs: no proof that a pack is safe, no rating, and no substitute for the tests that your standards ask for. \
A neck is not a fuse: fit proper d.c. protection. Measure joints and temperatures on samples, with limited current, before use. \
Work on live packs only if trained and equipped: insulated tools, no metal jewellery, eye protection, covered terminals, a way out. \
Local codes and licensed practice come first.";

/// Further cautions that this job calls for.
pub fn further_cautions(problem: &Problem) -> Vec<&'static str> {
    let mut lines = Vec::new();
    if problem.sources.iter().any(|s| s.emf_v > 60.0) {
        lines.push("A source above 60 V d.c. is in the job: shock and arc rules apply to the work, not only burn and fire precautions.");
    }
    lines
}

/// "low ... high", rounded outward.
pub fn interval(enclosure: Enclosure) -> String {
    let (low, high) = outward(enclosure.low, enclosure.high);
    if low == high { low } else { format!("{low} ... {high}") }
}

/// A figure, or a dash.
pub fn optional(value: Option<f64>) -> String {
    value.map_or("-".into(), three)
}

/// A hotspot's kind in words.
pub fn kind(kind: HotspotKind) -> &'static str {
    match kind {
        HotspotKind::Neck => "neck",
        HotspotKind::InsideCorner => "inside corner",
        HotspotKind::HoleEdge => "hole edge",
        HotspotKind::WeldRim => "weld rim",
        HotspotKind::TerminalEdge => "terminal edge",
        HotspotKind::OverlayEnd => "overlay end",
        HotspotKind::Strip => "strip",
        HotspotKind::Other => "other",
    }
}

/// A verdict in words.
pub fn verdict(verdict: Verdict) -> &'static str {
    match verdict {
        Verdict::Pass => "PASS",
        Verdict::Tight => "TIGHT",
        Verdict::Fail => "FAIL",
        Verdict::NotChecked => "NOT CHECKED",
    }
}
