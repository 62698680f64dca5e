//! Published and exact cases: each file of `tests/published/` holds its source, its sheet and the figures that must lie inside the intervals.

use crate::support::transform::Similarity;
use crate::support::{Figure, figure, read, solved};
use pinchbar::findings::Findings;
use pinchbar::geometry::Point;
use serde::Deserialize;
use std::collections::BTreeMap;
use std::path::Path;

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Case {
    /// What is computed.
    title: String,
    /// Author and year, or that it is exact by its own mathematics.
    source: String,
    /// Where the number comes from.
    derivation: String,
    /// The job sheet.
    sheet: String,
    /// The figures.
    expected: Vec<Expected>,
    /// Outline texts by file name.
    #[serde(default)]
    outlines: BTreeMap<String, String>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Expected {
    /// Name of the figure, as [`figure`] knows it.
    of: String,
    /// In the unit of the figure's name.
    value: f64,
    /// Relative allowance beyond the interval, where the file says why; printed digits otherwise.
    #[serde(default = "digits")]
    allow: f64,
}

fn digits() -> f64 {
    1e-9
}

/// Plain figures have no interval: they must agree to this part, which is a few times the bracket of the middle run.
const PLAIN: f64 = 3e-3;

fn cases() -> Vec<(String, Case)> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/published");
    let mut paths: Vec<_> = std::fs::read_dir(&folder).expect("the folder of cases").map(|e| e.expect("an entry").path()).collect();
    paths.sort();
    let read = |path: &Path| {
        let text = std::fs::read_to_string(path).expect("a case");
        let case: Case = toml::from_str(&text).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
        let named = [&case.title, &case.source, &case.derivation].iter().all(|s| !s.trim().is_empty()) && !case.expected.is_empty();
        assert!(named, "{}: a case names its title, source, derivation and figures", path.display());
        (path.file_stem().map(|n| n.to_string_lossy().into_owned()).unwrap_or_default(), case)
    };
    paths.iter().map(|p| read(p)).collect()
}

/// What is wrong with one run. `rounding` is what the change of coordinates itself may do.
fn complaints(name: &str, case: &Case, findings: &Findings, percent: f64, rounding: f64) -> Vec<String> {
    let mut wrong = Vec::new();
    if !findings.run.reached {
        wrong.push(format!("{name} at {percent} %: not reached, {} vertices", findings.run.vertices));
    }
    if let Some(r) = findings.resistance_mohm
        && r.high / r.low - 1.0 > percent / 100.0 + 1e-9
    {
        wrong.push(format!("{name} at {percent} %: resistance only to {:.5} %", 100.0 * (r.high / r.low - 1.0)));
    }
    let potentials = || findings.electrodes.iter().map(|e| e.voltage_mv.value);
    let largest = potentials().fold(f64::NEG_INFINITY, f64::max) - potentials().fold(f64::INFINITY, f64::min);
    for expected in &case.expected {
        let value = expected.value;
        let allow = (expected.allow + rounding) * value.abs();
        let fits = match figure(findings, &expected.of) {
            None => false,
            Some(Figure::Plain(found)) => (found - value).abs() <= PLAIN * value.abs(),
            Some(Figure::Enclosed(e)) => {
                let voltage = expected.of.ends_with("_mv");
                // Half of a voltage's width is asked for; a difference of two has the width of both.
                let narrow = !voltage || e.high - e.low <= 4.01 * percent / 100.0 * largest;
                e.low - allow <= value && value <= e.high + allow && e.low <= e.value && e.value <= e.high && narrow
            }
        };
        if !fits {
            let found = figure(findings, &expected.of);
            wrong.push(format!("{name} at {percent} %: {} expected {value} (allowed {allow:.1e}), found {found:?}", expected.of));
        }
    }
    wrong
}

#[test]
fn every_published_figure_lies_inside_its_interval_at_three_accuracies() {
    let cases = cases();
    assert!(cases.len() >= 40, "only {} cases", cases.len());
    let mut wrong = Vec::new();
    for (name, case) in &cases {
        let problem = read(&case.sheet, &case.outlines);
        for percent in [1.0, 0.1, 0.02] {
            wrong.extend(complaints(name, case, &solved(&problem, percent), percent, 0.0));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn every_published_figure_survives_turning_mirroring_shifting_and_scaling() {
    let changes = [
        ("turned by 23 degrees", Similarity { turn_degrees: 23.0, ..Similarity::NONE }),
        ("mirrored", Similarity { mirror: true, ..Similarity::NONE }),
        ("shifted by 1 m", Similarity { shift: Point::new(1000.0, -1000.0), ..Similarity::NONE }),
        ("scaled by 0.01", Similarity { scale: 0.01, ..Similarity::NONE }),
    ];
    let mut wrong = Vec::new();
    for (name, case) in &cases() {
        let problem = read(&case.sheet, &case.outlines);
        for (change, similarity) in &changes {
            let findings = solved(&similarity.of(&problem), 0.1);
            wrong.extend(complaints(&format!("{name} {change}"), case, &findings, 0.1, 1e-9));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}
