//! Limits and how they are kept: PASS to 80 % of the limit, TIGHT to 100 %, FAIL above; the unfavourable end of an interval counts.

use super::{Enclosure, Findings, Verdict, VerdictFinding};
use crate::physics::Solution;
use crate::problem::{ElectrodeKind, Problem};
use std::collections::BTreeMap;

/// Up to this part of the limit a verdict is PASS.
pub const TIGHT_FROM: f64 = 0.8;

/// One verdict per limit that a job can have; those without a limit or a figure are NOT CHECKED.
pub fn verdicts(problem: &Problem, solution: &Solution, findings: &Findings) -> Vec<VerdictFinding> {
    let limits = &problem.limits;
    let mut list = vec![verdict("drop_mv", findings.largest_drop_mv.map(|d| d.high), limits.drop_v.map(|v| 1e3 * v))];
    for (l, layer) in findings.layers.iter().enumerate() {
        let limit = limits.density_a_mm2.get(l).copied().flatten();
        list.push(verdict(format!("density_a_mm2.{}", layer.name), Some(layer.peak_a_mm2), limit));
    }
    for (group, ratio) in sharing(problem, solution) {
        let mut row = verdict(format!("sharing.{group}"), ratio, limits.sharing);
        match (ratio, limits.sharing) {
            // One is perfect: what counts is how much of the allowed excess is used.
            (Some(ratio), Some(limit)) => judge(&mut row, (ratio - 1.0) / (limit - 1.0)),
            (None, Some(_)) => row.source = "job sheet; no net current or a single cell in the group".into(),
            _ => {}
        }
        list.push(row);
    }
    let spots = findings.electrodes.iter().flat_map(|e| &e.spots).map(|s| s.drop_mv.abs());
    let worst = spots.chain(findings.joins.iter().map(|j| j.drop_mv.abs())).fold(0.0, f64::max);
    list.push(verdict("joint_mv", Some(worst), limits.joint_v.map(|v| 1e3 * v)));
    list.push(verdict("temperature_c", None, limits.temperature_c));
    list
}

fn verdict(limit: impl Into<String>, value: Option<f64>, bound: Option<f64>) -> VerdictFinding {
    let mut row = VerdictFinding {
        limit: limit.into(),
        value,
        margin_percent: None,
        verdict: Verdict::NotChecked,
        source: if bound.is_some() { "job sheet".into() } else { "no limit given".into() },
    };
    if let (Some(value), Some(bound)) = (value, bound) {
        judge(&mut row, value / bound);
    }
    row
}

fn judge(row: &mut VerdictFinding, used: f64) {
    row.margin_percent = Some(100.0 * (1.0 - used));
    row.verdict = if used <= TIGHT_FROM {
        Verdict::Pass
    } else if used <= 1.0 {
        Verdict::Tight
    } else {
        Verdict::Fail
    };
}

/// Largest difference between two electrodes on one connected piece, in mV: not below any pair's low end, not above all pairs' high ends.
pub fn largest_drop_mv(solution: &Solution) -> Option<Enclosure> {
    let mut worst: Option<(f64, f64)> = None;
    for (i, a) in solution.electrodes.iter().enumerate() {
        for (j, b) in solution.electrodes.iter().enumerate().filter(|(j, _)| *j != i) {
            if solution.complex.piece_of[i] == solution.complex.piece_of[j] {
                let (low, high) = (1e3 * (a.voltage.low - b.voltage.high), 1e3 * (a.voltage.high - b.voltage.low));
                // The reverse of every pair is a pair too, so nothing is below zero.
                worst = Some(worst.map_or((low.max(0.0), high), |w| (w.0.max(low), w.1.max(high))));
            }
        }
    }
    worst.map(|(low, high)| Enclosure { low, value: 0.5 * (low + high), high })
}

/// Per group of cells: largest over mean current, unfavourable end; `None` for a single cell or no net current.
fn sharing(problem: &Problem, solution: &Solution) -> BTreeMap<String, Option<f64>> {
    let mut groups: BTreeMap<String, Vec<usize>> = BTreeMap::new();
    for (k, electrode) in problem.electrodes.iter().enumerate().filter(|(_, e)| e.kind == ElectrodeKind::Cell) {
        groups.entry(electrode.group.clone().unwrap_or_default()).or_default().push(k);
    }
    let ratio = |members: &[usize]| {
        let mean = members.iter().map(|&k| solution.electrodes[k].current).sum::<f64>().abs() / members.len() as f64;
        let range = |k: usize| solution.electrodes[k].current_range;
        let largest = members.iter().map(|&k| range(k).high.abs().max(range(k).low.abs())).fold(0.0, f64::max);
        // Currents that cancel to rounding have no mean to speak of.
        (members.len() > 1 && mean > 1e-9 * largest).then(|| largest / mean)
    };
    groups.into_iter().map(|(group, members)| (group, ratio(&members))).collect()
}
