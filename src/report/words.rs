//! Words that several reports share: cautions, and figures with their intervals.

use crate::findings::{CrossingFinding, Enclosure, Findings, HotspotKind, JoinFinding, Verdict};
use crate::problem::material::OWN_FIGURES;
use crate::problem::{Layer, Problem};
use crate::quantity::{outward, three};

/// The caution that stands in every report.
pub const CAUTION: &str = "Estimate only. Live cells: burn, arc and fire danger. Test before use; `pinchbar --help` has the cautions.";

/// The long caution, for `--help` and the manual.
pub const LONG_CAUTION: &str = "\
CAUTION: LIVE BATTERY WORK. Charged cells drive a very large current into any slip and cannot be switched off; burns, arcs, fire and toxic gas can follow. \
What this tool prints is an estimate from your inputs: no proof that a pack is safe, no rating, and no substitute for the tests that your standards ask for. \
A neck is not a fuse: fit proper d.c. protection. Measure joints and temperatures on samples, with limited current, before use. \
Work on live packs only if trained and equipped: insulated tools, no metal jewellery, eye protection, covered terminals, a way out. \
Local codes and licensed practice come first.";

/// What the width of a weld rim is.
pub const RIM_WIDTH: &str = "width at a weld rim: the length of the rim all around";

/// Direct voltage in volts above which shock is a danger too; common practice, no source.
const SHOCK_V: f64 = 60.0;

/// Temperature in °C of the metal above which cells are harmed; common practice, no source.
const HOT_C: f64 = 60.0;

/// Further cautions that this job calls for.
pub fn further_cautions(problem: &Problem, findings: &Findings) -> Vec<&'static str> {
    let mut lines = Vec::new();
    let drop = findings.largest_drop_mv.map_or(0.0, |d| 1e-3 * d.high);
    if drop > SHOCK_V || problem.sources.iter().any(|s| s.emf_v.abs() > SHOCK_V) {
        lines.push(
            "More than 60 V d.c. is in the job: danger of shock and of a standing arc; the rules for that voltage apply to the work.",
        );
    }
    if problem.temperature_c > HOT_C {
        lines.push("The metal is above 60 C: stop and check what the cells and their insulation stand before this is built.");
    }
    lines
}

/// Largest over mean cell current per group, with the group's name.
pub fn sharing(findings: &Findings) -> impl Iterator<Item = (&str, f64)> {
    findings.verdicts.iter().filter_map(|v| Some((v.limit.strip_prefix("sharing.")?, v.value?)))
}

/// Joins with a drop, the largest first.
pub fn worst_joins(findings: &Findings) -> Vec<&JoinFinding> {
    let mut joins: Vec<&JoinFinding> = findings.joins.iter().filter(|j| j.drop_mv != 0.0).collect();
    joins.sort_by(|a, b| b.drop_mv.abs().total_cmp(&a.drop_mv.abs()));
    joins
}

/// The current across a line, with the part of each sheet where there are several: `20.0 A: nickel 3.20, copper 16.8`.
pub fn crossing(findings: &Findings, crossing: &CrossingFinding) -> String {
    let parts: Vec<(&str, f64)> =
        findings.layers.iter().filter_map(|l| Some((l.name.as_str(), *crossing.current_a.get(&l.name)?))).collect();
    // A sheet that the line does not meet carries a rounding at most.
    let least = 1e-9 * parts.iter().map(|p| p.1.abs()).fold(0.0, f64::max);
    let carried: Vec<String> = parts.iter().filter(|p| p.1.abs() > least).map(|(name, a)| format!("{name} {}", three(*a))).collect();
    let total = format!("{} A", three(crossing.total_a));
    if parts.len() < 2 || carried.is_empty() { total } else { format!("{total}: {}", carried.join(", ")) }
}

/// The metal of a sheet: its name in the table or its own resistivity in figures.
pub fn metal(layer: &Layer) -> String {
    if layer.material.name == OWN_FIGURES { format!("{} µΩ cm", three(layer.resistivity * 1e5)) } else { layer.material.name.clone() }
}

/// A metal's name in the table, or that its resistivity is the sheet's own.
pub fn metal_name(name: &str) -> &str {
    if name == OWN_FIGURES { "own resistivity" } else { name }
}

/// A name or sentence of the input in one line: control characters must reach neither a terminal nor a table.
pub fn one_line(text: &str) -> String {
    text.chars().map(|c| if c.is_control() { ' ' } else { c }).collect()
}

/// Words in lines of at most `width` characters; a longer word is cut.
pub fn wrapped(text: &str, width: usize) -> Vec<String> {
    let mut lines = vec![String::new()];
    for word in one_line(text).split_whitespace() {
        let letters: Vec<char> = word.chars().collect();
        for part in letters.chunks(width.max(1)) {
            let last = lines.len() - 1;
            let used = lines[last].chars().count();
            if used > 0 && used + 1 + part.len() > width {
                lines.push(part.iter().collect());
            } else {
                if used > 0 {
                    lines[last].push(' ');
                }
                lines[last].extend(part);
            }
        }
    }
    lines
}

/// `1 hole`, `2 holes`.
pub fn counted(count: usize, what: &str) -> String {
    format!("{count} {what}{}", if count == 1 { "" } else { "s" })
}

/// "low ... high", rounded outward.
pub fn interval(enclosure: Enclosure) -> String {
    // The rounding that every interval is widened by is no figure of its own around zero.
    if enclosure.low <= 0.0 && enclosure.high >= 0.0 && enclosure.high - enclosure.low < 1e-5 {
        return "0".into();
    }
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

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn intervals_and_names_are_written_in_one_line() {
        assert_eq!(interval(Enclosure { low: 2.557472, value: 2.5585, high: 2.559597 }), "2.5574 ... 2.5596");
        assert_eq!(interval(Enclosure::around(0.0, 0.0)), "0");
        assert_eq!(one_line("a\u{1b}[31m\nb"), "a [31m b");
        assert_eq!(optional(None), "-");
    }
}
