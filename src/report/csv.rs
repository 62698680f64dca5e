//! The hotspot and weld tables as CSV.

use super::words;
use crate::csv::written;
use crate::findings::Findings;

/// `hotspots.csv`: one row per hotspot, worst first.
///
/// # Errors
/// Only when the rows cannot be written to memory.
pub fn hotspots(findings: &Findings) -> Result<Vec<u8>, String> {
    let header = [
        "rank",
        "kind",
        "layer",
        "x_mm",
        "y_mm",
        "peak_a_mm2",
        "gauge_mm",
        "width_mm",
        "section_a",
        "section_a_mm2",
        "crowding",
        "drop_mv",
        "loss_w",
        "remark",
    ];
    let rows = findings.hotspots.iter().map(|h| {
        let mut row = vec![h.rank.to_string(), words::kind(h.kind).into(), h.layer.clone()];
        row.extend([h.x_mm, h.y_mm, h.peak_a_mm2, h.gauge_mm].map(|v| cell(Some(v))));
        row.extend([h.width_mm, h.section_a, h.section_a_mm2, h.crowding, h.drop_mv, h.loss_w].map(cell));
        row.push(h.remark.clone().unwrap_or_default());
        row
    });
    written(&header, rows)
}

/// `welds.csv`: one row per spot of every electrode, then one per spot of every join.
///
/// # Errors
/// Only when the rows cannot be written to memory.
pub fn welds(findings: &Findings) -> Result<Vec<u8>, String> {
    let header = ["electrode", "kind", "group", "spot", "x_mm", "y_mm", "current_a", "drop_mv", "share_percent", "rim_a_mm2"];
    let electrodes = findings.electrodes.iter().flat_map(|e| {
        e.spots.iter().enumerate().map(move |(i, s)| {
            let mut row = vec![e.name.clone(), e.kind.into(), e.group.clone().unwrap_or_default(), (i + 1).to_string()];
            row.extend([s.x_mm, s.y_mm, s.current_a, s.drop_mv, s.share_percent].map(|v| cell(Some(v))));
            row.push(cell(s.rim_a_mm2));
            row
        })
    });
    let joins = findings.joins.iter().enumerate().map(|(i, j)| {
        let mut row =
            vec![j.between.join(" - "), "join".into(), String::new(), (i + 1).to_string(), j.x_mm.to_string(), j.y_mm.to_string()];
        row.extend([cell(j.current_a), j.drop_mv.to_string(), String::new(), String::new()]);
        row
    });
    written(&header, electrodes.chain(joins))
}

/// A figure with all its digits; nothing where there is none.
fn cell(value: Option<f64>) -> String {
    value.filter(|v| v.is_finite()).map_or(String::new(), |v| v.to_string())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_is_not_known_is_left_empty() {
        assert_eq!([Some(0.1), None, Some(f64::NAN)].map(cell), ["0.1", "", ""]);
    }
}
