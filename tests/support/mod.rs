//! What the tests share: the one place that touches the doors of library and tool, and how a figure is picked from the findings.

pub mod random;
pub mod transform;

use pinchbar::findings::{self, Enclosure, Findings, Found};
use pinchbar::physics::{self, Solution};
use pinchbar::problem::Problem;
use pinchbar::reading;
use std::collections::BTreeMap;
use std::io::{Error, ErrorKind};
use std::path::Path;
use std::process::Command;

/// The files of a result, by name.
pub const RESULTS: [&str; 5] = ["heatmap.png", "hotspots.csv", "report.md", "result.json", "welds.csv"];

/// The tool, called with these arguments.
pub fn tool(arguments: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_pinchbar"));
    command.args(arguments);
    command
}

/// Reads a sheet held in memory, with the outlines it names.
pub fn read(sheet: &str, outlines: &BTreeMap<String, String>) -> Problem {
    let load = |path: &Path| match path.to_str() {
        Some("sheet.toml") => Ok(sheet.to_string()),
        name => name.and_then(|n| outlines.get(n)).cloned().ok_or_else(|| Error::new(ErrorKind::NotFound, "not in memory")),
    };
    match reading::read(Path::new("sheet.toml"), &load) {
        Ok(reading) => reading.problem,
        Err(faults) => {
            let told: Vec<_> = faults.iter().map(|f| (f.span.as_ref().map(|s| s.line_column()), &f.message)).collect();
            panic!("the sheet was refused: {told:#?}\n{sheet}")
        }
    }
}

/// Reads a sheet from the project's folder.
pub fn read_file(job: &Path) -> Problem {
    match reading::read(job, &|path| std::fs::read_to_string(path)) {
        Ok(reading) => reading.problem,
        Err(faults) => panic!("{} was refused: {faults:#?}", job.display()),
    }
}

/// Solves a problem to a bracket in per cent, without looking for hotspots.
pub fn run(problem: &Problem, bracket_percent: f64) -> Solution {
    let mut problem = problem.clone();
    problem.accuracy.bracket = bracket_percent / 100.0;
    physics::run(&problem).unwrap_or_else(|faults| panic!("{} not solved: {faults:?}", problem.title))
}

/// Solves a problem, its measured joints fitted first, and looks for hotspots; faults are told to the caller.
pub fn attempt(problem: &Problem) -> Result<Found, String> {
    let mut problem = problem.clone();
    let found = physics::fit(&mut problem, &|_| {}).and_then(|()| findings::find(&problem));
    found.map_err(|faults| format!("{faults:?}"))
}

/// Solves a problem to a bracket in per cent.
pub fn solved(problem: &Problem, bracket_percent: f64) -> Findings {
    let mut problem = problem.clone();
    problem.accuracy.bracket = bracket_percent / 100.0;
    attempt(&problem).unwrap_or_else(|faults| panic!("{} not solved: {faults}", problem.title)).findings
}

/// A figure of the findings: enclosed, or a plain number.
#[derive(Debug, Clone, Copy)]
pub enum Figure {
    /// With its interval.
    Enclosed(Enclosure),
    /// Without one.
    Plain(f64),
}

/// The figure with a name such as `resistance_mohm`, `electrodes.C1.voltage_mv` or `crossings.waist.total`; `a - b` is a difference of two.
pub fn figure(findings: &Findings, name: &str) -> Option<Figure> {
    if let Some((a, b)) = name.split_once(" - ") {
        let (Figure::Enclosed(a), Figure::Enclosed(b)) = (figure(findings, a)?, figure(findings, b)?) else { return None };
        return Some(Figure::Enclosed(Enclosure { low: a.low - b.high, value: a.value - b.value, high: a.high - b.low }));
    }
    let parts: Vec<&str> = name.split('.').collect();
    match parts.as_slice() {
        ["resistance_mohm"] => findings.resistance_mohm.map(Figure::Enclosed),
        ["loss_w"] => Some(Figure::Enclosed(findings.loss_w)),
        ["electrodes", who, what] => {
            let electrode = findings.electrodes.iter().find(|e| e.name == *who)?;
            match *what {
                "voltage_mv" => Some(Figure::Enclosed(electrode.voltage_mv)),
                "current_a" => {
                    let range = electrode.current_range_a;
                    Some(Figure::Enclosed(Enclosure { low: range.low, value: electrode.current_a, high: range.high }))
                }
                "share_percent" => electrode.share_percent.map(Figure::Plain),
                _ => None,
            }
        }
        ["probes", who, "drop_mv"] => findings.probes.iter().find(|p| p.name == *who).map(|p| Figure::Enclosed(p.drop_mv)),
        ["contacts", who, "current_a"] => findings.contacts.iter().find(|c| c.name == *who)?.current_a.map(Figure::Plain),
        ["crossings", who, "total"] => findings.crossings.iter().find(|c| c.name == *who).map(|c| Figure::Plain(c.total_a)),
        ["crossings", who, layer] => findings.crossings.iter().find(|c| c.name == *who)?.current_a.get(*layer).copied().map(Figure::Plain),
        _ => None,
    }
}
