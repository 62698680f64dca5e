//! What the fuzz targets share: reading from memory, and what must hold of every refusal and every result.

pub mod job;

use pinchbar::cli::explain;
use pinchbar::cli::late::{self, Stop};
use pinchbar::diagnostic::{Fault, Span};
use pinchbar::findings::{self, Enclosure, Findings};
use pinchbar::physics;
use pinchbar::problem::Problem;
use pinchbar::reading::{self, Reading};
use pinchbar::report;
use std::io::{Error, ErrorKind};
use std::path::Path;

/// The name under which the sheet is read.
const SHEET: &str = "sheet.toml";

/// Reads a sheet with the files beside it, and holds every refusal to its form.
pub fn read(sheet: &str, files: &[(&str, &str)]) -> Option<Reading> {
    let load = |path: &Path| {
        let known = [(SHEET, sheet)].into_iter().chain(files.iter().copied()).find(|(name, _)| Path::new(name) == path);
        known.map(|(_, text)| text.to_string()).ok_or_else(|| Error::from(ErrorKind::NotFound))
    };
    match reading::read(Path::new(SHEET), &load) {
        Ok(reading) => Some(reading),
        Err(faults) => {
            hold_faults(&faults);
            None
        }
    }
}

/// A refusal says something at a place that exists, with a remedy, and can be shown.
fn hold_faults(faults: &[Fault]) {
    assert!(!faults.is_empty(), "refused without a fault");
    for fault in faults {
        assert!(!fault.message.is_empty() && fault.remedy.as_ref().is_some_and(|r| !r.is_empty()), "{}", fault.message);
        fault.span.iter().chain(fault.labels.iter().map(|l| &l.span)).for_each(hold_span);
    }
    explain::explain(faults, true);
}

fn hold_span(span: &Span) {
    let text = &span.source.text;
    assert!(span.start <= span.end && span.end <= text.len(), "a place outside the text");
    assert!(text.is_char_boundary(span.start) && text.is_char_boundary(span.end), "a place inside a character");
    span.line_column();
}

/// Solves a job and holds the result to what is promised of every one.
pub fn hold_solution(reading: &Reading, draw: bool) {
    let problem = &mut reading.problem.clone();
    let found = match physics::fit(problem, &|_| {}).and_then(|()| findings::find(problem)) {
        Ok(found) => found,
        Err(faults) => {
            return match late::stop(&faults, problem, &reading.origins) {
                Stop::Refused(faults) => hold_faults(&faults),
                Stop::Failed(text) => panic!("the tool failed: {text}"),
            };
        }
    };
    hold_findings(problem, &found.findings);
    report::json::json(&found.findings).expect("JSON");
    report::csv::hotspots(&found.findings).expect("a table");
    report::csv::welds(&found.findings).expect("a table");
    report::table::summary(&found.findings);
    report::markdown::report(problem, &found.findings, draw);
    if draw {
        report::figure::heat_map(problem, &found).expect("a picture");
    }
}

fn hold_findings(problem: &Problem, findings: &Findings) {
    let enclosed = |what: &str, e: Enclosure| {
        assert!(e.low.is_finite() && e.high.is_finite() && e.low <= e.value && e.value <= e.high, "{what}: {e:?}");
    };
    let finite = |what: &str, numbers: &[f64]| assert!(numbers.iter().all(|n| n.is_finite()), "{what}: {numbers:?}");

    enclosed("loss", findings.loss_w);
    assert!(findings.loss_w.high >= 0.0, "{:?}", findings.loss_w);
    findings.resistance_mohm.into_iter().for_each(|r| enclosed("resistance", r));
    findings.probes.iter().for_each(|p| enclosed(&p.name, p.drop_mv));
    for e in &findings.electrodes {
        enclosed(&e.name, e.voltage_mv);
        let range = e.current_range_a;
        finite(&e.name, &[e.current_a, range.low, range.high, e.loss_w]);
        let slack = 1e-9 * e.current_a.abs();
        assert!(range.low <= e.current_a + slack && e.current_a <= range.high + slack, "{} {range:?} {}", e.name, e.current_a);
        e.spots.iter().for_each(|s| finite(&e.name, &[s.current_a, s.drop_mv, s.share_percent, s.rim_a_mm2.unwrap_or(0.0)]));
    }
    for h in &findings.hotspots {
        finite("hotspot", &[h.x_mm, h.y_mm, h.peak_a_mm2, h.gauge_mm, h.crowding.unwrap_or(0.0), h.drop_mv.unwrap_or(0.0)]);
    }

    // A cell whose other end is the common zero lets its current out of the bar for good.
    if problem.sources.iter().all(|s| s.negative.is_some()) {
        let currents = || findings.electrodes.iter().map(|e| e.current_a);
        let (sum, size) = (currents().sum::<f64>(), currents().map(f64::abs).sum::<f64>());
        assert!(sum.abs() <= 1e-6 * size, "currents add up to {sum} of {size}");
    }
    let parts = [
        findings.layers.iter().map(|l| l.loss_w).sum::<f64>(),
        findings.electrodes.iter().map(|e| e.loss_w).sum(),
        findings.contacts.iter().map(|c| c.loss_w).sum(),
        findings.joins.iter().map(|j| j.loss_w).sum(),
    ];
    finite("losses", &parts);
    let (sum, whole) = (parts.iter().sum::<f64>(), findings.loss_w.value);
    assert!((sum - whole).abs() <= 1e-6 * whole.abs(), "losses {parts:?} do not add up to {whole}");
}
