//! The summary on the terminal: headline, hotspots, cells, limits, remarks, within 80 columns.

use super::words::{self, CAUTION, RIM_WIDTH, interval, optional, wrapped};
use crate::findings::{Findings, HotspotKind, Verdict};
use crate::quantity::three;

/// Rows of a list shown before the rest is summed up.
const MOST_ROWS: usize = 12;

/// Joins shown before the rest is summed up.
const MOST_JOINS: usize = 6;

/// Columns of the terminal.
const COLUMNS: usize = 80;

/// The whole summary, ending in a line break.
pub fn summary(findings: &Findings) -> String {
    let mut page = Page::default();
    page.lines(wrapped(&findings.title, 78));
    headline(&mut page, findings);
    hotspots(&mut page, findings);
    electrodes(&mut page, findings);
    joins(&mut page, findings);
    readings(&mut page, findings);
    limits(&mut page, findings);
    if !findings.remarks.is_empty() {
        page.line("");
        for remark in &findings.remarks {
            page.lines(
                wrapped(&remark.text, 74).iter().enumerate().map(|(i, part)| format!("  {} {part}", if i == 0 { "*" } else { " " })),
            );
        }
    }
    page.line("");
    page.lines(wrapped(CAUTION, 78));
    page.text
}

#[derive(Default)]
struct Page {
    text: String,
}

impl Page {
    fn line(&mut self, text: impl AsRef<str>) {
        self.text.push_str(text.as_ref().trim_end());
        self.text.push('\n');
    }

    fn lines(&mut self, lines: impl IntoIterator<Item = String>) {
        lines.into_iter().for_each(|line| self.line(line));
    }

    /// The title of a part, with an empty line above.
    fn heading(&mut self, text: &str) {
        self.line("");
        self.line(text);
    }

    /// What a list holds beyond the rows shown.
    fn more(&mut self, indent: &str, count: usize, shown: usize) {
        if count > shown {
            self.line(format!("{indent}and {} more in the files", count - shown));
        }
    }
}

fn headline(page: &mut Page, findings: &Findings) {
    page.heading(&format!("  loss           {} W", interval(findings.loss_w)));
    if let Some(r) = findings.resistance_mohm {
        page.line(format!("  resistance     {} mohm", interval(r)));
    }
    if let Some(drop) = findings.largest_drop_mv {
        page.line(format!("  largest drop   {} mV between two electrodes", interval(drop)));
    }
    let run = &findings.run;
    page.line(format!(
        "  enclosed to    {} %{}, {} triangles, {} round(s)",
        three(run.bracket_percent),
        if run.reached { "" } else { " (NOT as asked)" },
        run.triangles,
        run.rounds
    ));
}

fn hotspots(page: &mut Page, findings: &Findings) {
    if findings.hotspots.is_empty() {
        return;
    }
    page.heading("  Where current crowds (gauge peaks; worst first, by part of a limit if given)");
    let header = ["no", "kind", "layer", "x mm", "y mm", "A/mm2", "width", "A", "crowd"];
    let rows = findings.hotspots.iter().take(MOST_ROWS).map(|h| {
        let mut row = vec![h.rank.to_string(), words::kind(h.kind).into(), h.layer.clone()];
        row.extend([coordinate(h.x_mm), coordinate(h.y_mm), three(h.peak_a_mm2)]);
        row.extend([h.width_mm, h.section_a, h.crowding].map(optional));
        row
    });
    page.lines(columns(&header, rows.collect(), 1..3));
    page.more("     ", findings.hotspots.len(), MOST_ROWS);
    if findings.hotspots.iter().any(|h| h.kind == HotspotKind::WeldRim) {
        page.line(format!("     {RIM_WIDTH}"));
    }
}

fn electrodes(page: &mut Page, findings: &Findings) {
    page.heading("  Electrodes");
    let rows = findings.electrodes.iter().take(MOST_ROWS).map(|e| {
        let worst = e.spots.iter().map(|s| s.drop_mv.abs()).fold(0.0, f64::max);
        let worst = (worst > 0.0).then_some(worst);
        vec![e.name.clone(), three(e.current_a), interval(e.voltage_mv), optional(e.share_percent), optional(worst)]
    });
    page.lines(columns(&["name", "A", "mV", "share %", "worst joint mV"], rows.collect(), 0..1));
    page.more("     ", findings.electrodes.len(), MOST_ROWS);
    for (group, ratio) in words::sharing(findings) {
        page.line(format!("  sharing in group \"{}\": largest over mean current {}", clipped(group, 24), three(ratio)));
    }
}

fn joins(page: &mut Page, findings: &Findings) {
    let joins = words::worst_joins(findings);
    if joins.is_empty() {
        return;
    }
    page.heading("  Joins between sheets (largest drop first)");
    let rows = joins.iter().take(MOST_JOINS).map(|j| {
        vec![j.between.join(" - "), coordinate(j.x_mm), coordinate(j.y_mm), optional(j.current_a), three(j.drop_mv), three(j.loss_w)]
    });
    page.lines(columns(&["between", "x mm", "y mm", "A", "mV", "W"], rows.collect(), 0..1));
    page.more("  ", joins.len(), MOST_JOINS);
}

fn readings(page: &mut Page, findings: &Findings) {
    if findings.probes.is_empty() && findings.crossings.is_empty() {
        return;
    }
    page.heading("  Readings");
    let names = findings.probes.iter().map(|p| &p.name).chain(findings.crossings.iter().map(|c| &c.name));
    let width = names.map(|name| name.chars().count()).max().unwrap_or(0).min(40);
    for p in &findings.probes {
        page.line(format!("  {:width$}  {} mV", clipped(&p.name, width), interval(p.drop_mv)));
    }
    for c in &findings.crossings {
        for (i, part) in wrapped(&words::crossing(findings, c), 76 - width).into_iter().enumerate() {
            page.line(format!("  {:width$}  {part}", if i == 0 { clipped(&c.name, width) } else { String::new() }));
        }
    }
}

fn limits(page: &mut Page, findings: &Findings) {
    let checked: Vec<_> = findings.verdicts.iter().filter(|v| v.verdict != Verdict::NotChecked).collect();
    if checked.is_empty() {
        return;
    }
    page.heading("  Limits");
    for v in checked {
        page.line(format!(
            "  {:5} {:32} {:>10} {:>8} % margin",
            words::verdict(v.verdict),
            clipped(&v.limit, 32),
            optional(v.value),
            v.margin_percent.map_or("-".into(), |m| format!("{m:.0}"))
        ));
    }
}

/// A table as wide as its words need: `left` columns to the left, the others to the right. Where it is too wide for the terminal, the last of the
/// left columns is cut.
fn columns(header: &[&str], rows: Vec<Vec<String>>, left: std::ops::Range<usize>) -> Vec<String> {
    let mut rows: Vec<Vec<String>> = std::iter::once(header.iter().map(|h| h.to_string()).collect()).chain(rows).collect();
    let needed =
        |rows: &[Vec<String>], c: usize| rows.iter().filter_map(|row| row.get(c)).map(|cell| cell.chars().count()).max().unwrap_or(0);
    let mut widths: Vec<usize> = (0..header.len()).map(|c| needed(&rows, c)).collect();
    let words: usize = widths.iter().sum();
    let gap = if 2 * header.len() + words <= COLUMNS { 2 } else { 1 };
    let over = (1 + header.len() * gap + words).saturating_sub(COLUMNS);
    if let Some(last) = left.clone().last().filter(|_| over > 0) {
        widths[last] = widths[last].saturating_sub(over).max(8);
        rows.iter_mut().for_each(|row| row[last] = clipped(&row[last], widths[last]));
    }
    let gap = " ".repeat(gap);
    let cell = |c: usize, text: &str| if left.contains(&c) { format!("{text:<0$}", widths[c]) } else { format!("{text:>0$}", widths[c]) };
    let joined = |row: &Vec<String>| row.iter().enumerate().map(|(c, text)| cell(c, &words::one_line(text))).collect::<Vec<_>>().join(&gap);
    rows.iter().map(|row| format!("  {}", joined(row))).collect()
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

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_table_is_as_wide_as_its_words_need_and_no_wider_than_the_terminal() {
        let row = |name: &str| vec!["1".to_string(), name.to_string(), "12.5".into()];
        let of = |name: &str| columns(&["no", "layer", "mV"], vec![row("a"), row(name)], 1..2);
        assert_eq!(
            of("second copper sheet"),
            ["  no  layer                  mV", "   1  a                    12.5", "   1  second copper sheet  12.5"]
        );
        let wide = of(&"x".repeat(200));
        assert!(wide.iter().all(|l| l.chars().count() == COLUMNS) && wide[2].contains("x~ 12.5"), "{wide:?}");
    }

    #[test]
    fn long_names_and_remarks_stay_within_their_columns() {
        assert_eq!(clipped("Überlangername-123", 8), "Überlan~");
        assert!(wrapped(&"word ".repeat(60), 74).iter().all(|l| l.chars().count() <= 74));
        let cut = wrapped(&format!("a name {} of one word", "x".repeat(200)), 74);
        assert!(cut.len() == 4 && cut.iter().all(|l| l.chars().count() <= 74), "{cut:?}");
    }
}
