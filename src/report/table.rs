//! The summary on the terminal: headline, hotspots, cells, limits, remarks, within 80 columns.

use super::words::{self, CAUTION, interval, optional};
use crate::findings::{Findings, Verdict};
use crate::quantity::three;

/// Rows of a list shown before the rest is summed up.
const MOST_ROWS: usize = 12;

/// The whole summary, ending in a line break.
pub fn summary(findings: &Findings) -> String {
    let mut text = String::new();
    let mut line = |s: String| {
        text.push_str(s.trim_end());
        text.push('\n');
    };
    wrapped(&findings.title, 78).into_iter().for_each(&mut line);
    line(String::new());
    line(format!("  loss           {} W", interval(findings.loss_w)));
    if let Some(r) = findings.resistance_mohm {
        line(format!("  resistance     {} mohm", interval(r)));
    }
    if let Some(drop) = findings.largest_drop_mv {
        line(format!("  largest drop   {} mV between two electrodes", interval(drop)));
    }
    let run = &findings.run;
    line(format!(
        "  enclosed to    {} %{}, {} triangles, {} round(s)",
        three(run.bracket_percent),
        if run.reached { "" } else { " (NOT as asked)" },
        run.triangles,
        run.rounds
    ));
    if !findings.hotspots.is_empty() {
        line(String::new());
        line("  Where current crowds (gauge peaks; worst first, by part of a limit if given)".into());
        line(format!(
            "  {:>2} {:13} {:12} {:>8} {:>8} {:>8} {:>6} {:>7} {:>5}",
            "no", "kind", "layer", "x mm", "y mm", "A/mm2", "width", "A", "crowd"
        ));
        for h in findings.hotspots.iter().take(MOST_ROWS) {
            line(format!(
                "  {:>2} {:13} {:12} {:>8} {:>8} {:>8} {:>6} {:>7} {:>5}",
                h.rank,
                words::kind(h.kind),
                clipped(&h.layer, 12),
                coordinate(h.x_mm),
                coordinate(h.y_mm),
                three(h.peak_a_mm2),
                optional(h.width_mm),
                optional(h.section_a),
                optional(h.crowding)
            ));
        }
        more(findings.hotspots.len(), &mut line);
    }
    line(String::new());
    line("  Electrodes".into());
    line(format!("  {:16} {:>10} {:>24} {:>8} {:>12}", "name", "A", "mV", "share %", "worst mV"));
    for e in findings.electrodes.iter().take(MOST_ROWS) {
        let worst = e.spots.iter().map(|s| s.drop_mv.abs()).fold(0.0, f64::max);
        line(format!(
            "  {:16} {:>10} {:>24} {:>8} {:>12}",
            clipped(&e.name, 16),
            three(e.current_a),
            interval(e.voltage_mv),
            optional(e.share_percent),
            three(worst)
        ));
    }
    more(findings.electrodes.len(), &mut line);
    for (group, ratio) in words::sharing(findings) {
        line(format!("  sharing in group \"{}\": largest over mean current {}", clipped(group, 24), three(ratio)));
    }
    if !findings.probes.is_empty() || !findings.crossings.is_empty() {
        line(String::new());
        line("  Readings".into());
        for p in &findings.probes {
            line(format!("  {:16} {} mV", clipped(&p.name, 16), interval(p.drop_mv)));
        }
        for c in &findings.crossings {
            line(format!("  {:16} {} A across", clipped(&c.name, 16), three(c.total_a)));
        }
    }
    let checked: Vec<_> = findings.verdicts.iter().filter(|v| v.verdict != Verdict::NotChecked).collect();
    if !checked.is_empty() {
        line(String::new());
        line("  Limits".into());
        for v in checked {
            line(format!(
                "  {:5} {:32} {:>10} {:>8} % margin",
                words::verdict(v.verdict),
                clipped(&v.limit, 32),
                optional(v.value),
                v.margin_percent.map_or("-".into(), |m| format!("{m:.0}"))
            ));
        }
    }
    if !findings.remarks.is_empty() {
        line(String::new());
        for remark in &findings.remarks {
            for (i, part) in wrapped(&remark.text, 74).into_iter().enumerate() {
                line(format!("  {} {part}", if i == 0 { "*" } else { " " }));
            }
        }
    }
    line(String::new());
    wrapped(CAUTION, 78).into_iter().for_each(line);
    text
}

fn more(count: usize, line: &mut impl FnMut(String)) {
    if count > MOST_ROWS {
        line(format!("     and {} more in the files", count - MOST_ROWS));
    }
}

fn coordinate(value: f64) -> String {
    let text = format!("{value:.2}");
    if text == "-0.00" { "0.00".into() } else { text }
}

fn clipped(name: &str, width: usize) -> String {
    let name = words::one_line(name);
    if name.chars().count() <= width {
        return name;
    }
    name.chars().take(width.saturating_sub(1)).chain(['~']).collect()
}

/// Words in lines of at most `width` characters; a longer word is cut.
pub fn wrapped(text: &str, width: usize) -> Vec<String> {
    let mut lines = vec![String::new()];
    for word in words::one_line(text).split_whitespace() {
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

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn long_names_and_remarks_stay_within_their_columns() {
        assert_eq!(clipped("Überlangername-123", 8), "Überlan~");
        assert!(wrapped(&"word ".repeat(60), 74).iter().all(|l| l.chars().count() <= 74));
        let cut = wrapped(&format!("a name {} of one word", "x".repeat(200)), 74);
        assert!(cut.len() == 4 && cut.iter().all(|l| l.chars().count() <= 74), "{cut:?}");
    }
}
