//! `report.md`: what a colleague reads without the tool.

use super::words::{self, CAUTION, RIM_WIDTH, counted, further_cautions, interval, one_line, optional};
use crate::findings::{Enclosure, Findings, HotspotKind};
use crate::problem::{Drive, Electrode, ElectrodeKind, Footprint, Interface, Problem};
use crate::quantity::three;

/// The report, with the picture where there is one.
pub fn report(problem: &Problem, findings: &Findings, picture: bool) -> String {
    let mut out = Page::default();
    out.line(format!("# {}", plain(&findings.title)));
    out.line(format!("> {CAUTION}"));
    for caution in further_cautions(problem, findings) {
        out.line(format!("> {caution}"));
    }
    if picture {
        out.line("![Where current crowds](heatmap.png)");
    }
    out.line(in_short(problem));
    headline(&mut out, findings);
    crowding(&mut out, findings);
    electrodes(&mut out, findings);
    joints(&mut out, problem, findings);
    limits(&mut out, findings);
    assumptions(&mut out, problem);
    if !findings.remarks.is_empty() {
        out.line("## Remarks");
        out.block(findings.remarks.iter().map(|r| format!("- {}", plain(&r.text))));
    }
    out.line("## How far to trust it");
    out.line(
        "The intervals hold for the model: outlines with their arcs flattened, and thicknesses, resistivities and joint resistances as they \
         were entered, in sheets so thin that the potential does not vary across them. They say nothing about how well these inputs are known. \
         The model is coarse where a neck, a nugget or a radius is about as small as the sheet is thick; heat is not solved, and the metal has \
         one temperature throughout. Contacts and welds are the weakest inputs: measure them on samples.",
    );
    out.line(format!("Made by pinchbar {}.", findings.version));
    // One line break at the end, as in every text file.
    out.text.truncate(out.text.trim_end().len());
    out.text.push('\n');
    out.text
}

/// What was solved, in one sentence.
fn in_short(problem: &Problem) -> String {
    let sheets: Vec<String> =
        problem.layers.iter().map(|l| format!("{} ({}, {} mm)", plain(&l.name), plain(&words::metal(l)), l.thickness_mm)).collect();
    let cells = problem.electrodes.iter().filter(|e| e.kind == ElectrodeKind::Cell).count();
    format!(
        "Solved: {}, at {} °C, with {} and {}.",
        if sheets.len() == 1 { sheets.join("") } else { format!("{} sheets, bottom first: {}", sheets.len(), sheets.join(", ")) },
        problem.temperature_c,
        counted(cells, "cell end"),
        counted(problem.electrodes.len() - cells, "terminal")
    )
}

/// A name or sentence of the input that cannot turn into markup.
fn plain(text: &str) -> String {
    one_line(text).replace('<', "&lt;")
}

#[derive(Default)]
struct Page {
    text: String,
}

impl Page {
    /// A paragraph.
    fn line(&mut self, text: impl AsRef<str>) {
        self.text.push_str(text.as_ref());
        self.text.push_str("\n\n");
    }

    /// Lines that belong together.
    fn block(&mut self, lines: impl Iterator<Item = String>) {
        for line in lines {
            self.text.push_str(&line);
            self.text.push('\n');
        }
        self.text.push('\n');
    }

    /// A table: text columns to the left, numbers to the right.
    fn table(&mut self, header: &[&str], texts: usize, rows: impl Iterator<Item = Vec<String>>) {
        let rule = header.iter().enumerate().map(|(i, _)| if i < texts { "---" } else { "---:" }).collect::<Vec<_>>();
        let joined =
            |cells: &[String]| format!("| {} |", cells.iter().map(|c| plain(c).replace('|', "\\|")).collect::<Vec<_>>().join(" | "));
        let head = [format!("| {} |", header.join(" | ")), format!("|{}|", rule.join("|"))];
        self.block(head.into_iter().chain(rows.map(|r| joined(&r))));
    }
}

fn headline(out: &mut Page, findings: &Findings) {
    out.line("## Result");
    let mut rows = vec![vec!["loss in metal and joints".to_string(), format!("{} W", interval(findings.loss_w))]];
    if let Some(r) = findings.resistance_mohm {
        rows.push(vec!["resistance between the two electrodes".into(), format!("{} mΩ", interval(r))]);
    }
    if let Some(drop) = findings.largest_drop_mv {
        rows.push(vec!["largest drop between two electrodes".into(), format!("{} mV", interval(drop))]);
    }
    rows.extend(findings.probes.iter().map(|p| vec![format!("reading {}", p.name), format!("{} mV", interval(p.drop_mv))]));
    rows.extend(findings.crossings.iter().map(|c| vec![format!("current across {}", c.name), words::crossing(findings, c)]));
    out.table(&["", "low ... high"], 1, rows.into_iter());
    let run = &findings.run;
    out.line(format!(
        "An interval encloses the exact value of the model for certain; it is no estimate of scatter. The loss is enclosed to {} %{}. \
         Mesh: {} triangles, {} unknowns, {} round(s).",
        three(run.bracket_percent),
        if run.reached { "" } else { ", which is NOT as tight as asked" },
        run.triangles,
        run.unknowns,
        run.rounds
    ));
}

fn crowding(out: &mut Page, findings: &Findings) {
    if findings.hotspots.is_empty() {
        return;
    }
    out.line("## Where current crowds");
    out.table(
        &[
            "no",
            "kind",
            "layer",
            "x mm",
            "y mm",
            "peak A/mm²",
            "width mm",
            "through A",
            "mean A/mm²",
            "crowding",
            "drop mV",
            "loss W",
            "remark",
        ],
        3,
        findings.hotspots.iter().map(|h| {
            let mut row =
                vec![h.rank.to_string(), words::kind(h.kind).into(), h.layer.clone(), format!("{:.2}", h.x_mm), format!("{:.2}", h.y_mm)];
            row.push(three(h.peak_a_mm2));
            row.extend([h.width_mm, h.section_a, h.section_a_mm2, h.crowding, h.drop_mv, h.loss_w].map(optional));
            row.push(h.remark.clone().unwrap_or_default());
            row
        }),
    );
    let gauges: Vec<String> = {
        let mut list: Vec<String> = findings.hotspots.iter().map(|h| format!("{} mm on {}", three(h.gauge_mm), h.layer)).collect();
        list.sort();
        list.dedup();
        list
    };
    let rims = findings.hotspots.iter().any(|h| h.kind == HotspotKind::WeldRim);
    out.line(format!(
        "A peak is the mean over a gauge disc ({}) clipped to the metal, so that it does not depend on the mesh; at a sharp inside corner the density in the point itself has no bound.{}",
        gauges.join(", "),
        if rims { format!(" The {RIM_WIDTH}.") } else { String::new() }
    ));
}

fn electrodes(out: &mut Page, findings: &Findings) {
    out.line("## Electrodes and welds");
    out.table(
        &["name", "kind", "group", "A", "range A", "mV", "share %", "joint loss W"],
        3,
        findings.electrodes.iter().map(|e| {
            let range = Enclosure { low: e.current_range_a.low, value: e.current_a, high: e.current_range_a.high };
            vec![
                e.name.clone(),
                e.kind.into(),
                e.group.clone().unwrap_or_default(),
                three(e.current_a),
                if range.low == range.high { "given".into() } else { interval(range) },
                interval(e.voltage_mv),
                optional(e.share_percent),
                three(e.loss_w),
            ]
        }),
    );
    for (group, ratio) in words::sharing(findings) {
        out.line(format!("Sharing in group \"{}\": largest over mean current {}.", plain(group), three(ratio)));
    }
    out.table(
        &["electrode", "spot", "x mm", "y mm", "A", "share %", "drop mV", "rim A/mm²"],
        1,
        findings.electrodes.iter().flat_map(|e| {
            e.spots.iter().enumerate().map(move |(i, s)| {
                let mut row = vec![e.name.clone(), (i + 1).to_string(), format!("{:.2}", s.x_mm), format!("{:.2}", s.y_mm)];
                row.extend([s.current_a, s.share_percent, s.drop_mv].map(three));
                row.push(optional(s.rim_a_mm2));
                row
            })
        }),
    );
}

fn joints(out: &mut Page, problem: &Problem, findings: &Findings) {
    out.line("## Layers, contacts and joins");
    out.table(
        &["layer", "metal", "area mm²", "mass g", "loss W", "gauge peak A/mm²"],
        2,
        findings.layers.iter().zip(&problem.layers).map(|(l, sheet)| {
            let mass = l.mass_g.map_or("not known".into(), three);
            vec![l.name.clone(), words::metal(sheet), three(l.area_mm2), mass, three(l.loss_w), three(l.peak_a_mm2)]
        }),
    );
    if !findings.contacts.is_empty() {
        out.table(
            &["contact", "between", "net A", "exchanged A", "loss W"],
            2,
            findings
                .contacts
                .iter()
                .map(|c| vec![c.name.clone(), c.between.join(" - "), optional(c.current_a), optional(c.exchanged_a), three(c.loss_w)]),
        );
    }
    if let Some(worst) = words::worst_joins(findings).first() {
        out.line(format!(
            "Largest drop over a join: {} mV{}, {} at ({:.2}, {:.2}).",
            three(worst.drop_mv),
            worst.current_a.map_or(String::new(), |a| format!(" at {} A", three(a))),
            plain(&worst.between.join(" - ")),
            worst.x_mm,
            worst.y_mm
        ));
    }
    if !findings.joins.is_empty() {
        out.table(
            &["join between", "x mm", "y mm", "A", "drop mV", "loss W"],
            1,
            findings.joins.iter().map(|j| {
                vec![
                    j.between.join(" - "),
                    format!("{:.2}", j.x_mm),
                    format!("{:.2}", j.y_mm),
                    optional(j.current_a),
                    three(j.drop_mv),
                    three(j.loss_w),
                ]
            }),
        );
    }
}

fn limits(out: &mut Page, findings: &Findings) {
    out.line("## Limits");
    out.table(
        &["limit", "verdict", "from", "found", "margin %"],
        3,
        findings.verdicts.iter().map(|v| {
            let margin = v.margin_percent.map_or("-".into(), |m| format!("{m:.0}"));
            vec![v.limit.clone(), words::verdict(v.verdict).into(), v.source.clone(), optional(v.value), margin]
        }),
    );
    out.line("PASS up to 80 % of a limit, TIGHT up to 100 %, FAIL above; the unfavourable end of an interval counts.");
}

fn assumptions(out: &mut Page, problem: &Problem) {
    out.line("## What was assumed");
    let layers = problem.layers.iter().map(|l| {
        format!(
            "- sheet {}: {}, {} mm, {} µΩ cm at {} °C",
            plain(&l.name),
            plain(words::metal_name(&l.material.name)),
            l.thickness_mm,
            three(l.resistivity * 1e5),
            problem.temperature_c
        )
    });
    let contacts = problem.contacts.iter().map(|c| {
        let interface = match c.interface {
            Interface::Bonded => "bonded, no drop".to_string(),
            Interface::Conductance(s) => format!("{} mΩ mm²", three(1e3 / s)),
        };
        format!("- contact {}: {interface}", plain(&c.name))
    });
    let joins = problem.joins.iter().map(|j| {
        let [a, b] = j.between.map(|l| plain(&problem.layers[l.index()].name));
        format!("- {} between {a} and {b}: {}", counted(j.spots.len(), "join"), joint(j.joint_ohm))
    });
    let electrodes = problem.electrodes.iter().map(|e| {
        let kind = if e.kind == ElectrodeKind::Cell { "cell" } else { "terminal" };
        let joints = e.spots.first().map_or(String::new(), |s| joint(s.joint_ohm));
        format!("- {kind} {}: {}; {}, {joints}", plain(&e.name), drive(problem, e), attached(e))
    });
    out.block(layers.chain(contacts).chain(joins).chain(electrodes));
}

fn drive(problem: &Problem, electrode: &Electrode) -> String {
    match electrode.drive {
        Drive::Current(i) => format!("{} A given", three(i)),
        Drive::Balance => "takes the balance".into(),
        Drive::Held(v) => format!("held at {} mV", three(1e3 * v)),
        Drive::Source(s) => {
            let source = &problem.sources[s.index()];
            format!("source of {} mV behind {} mΩ", three(1e3 * source.emf_v), three(1e3 * source.resistance_ohm))
        }
        Drive::Return(_) => "return end of its source".into(),
    }
}

/// How an electrode touches the metal.
fn attached(electrode: &Electrode) -> String {
    let lines = electrode.spots.iter().all(|s| matches!(s.footprint, Footprint::Line { .. }));
    counted(electrode.spots.len(), if lines { "line" } else { "spot" })
}

fn joint(ohm: f64) -> String {
    if ohm == 0.0 { "solid".into() } else { format!("{} mΩ each (interface only)", three(1e3 * ohm)) }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_picture_is_shown_only_where_there_is_one() {
        let sheet = "[[layer]]\nname = \"a\"\nthickness_mm = 1\nresistivity_uohm_cm = 2\npoints_mm = [[0, 0], [9, 0], [9, 5], [0, 5]]\n\
                     [[terminal]]\nname = \"in\"\nlayer = \"a\"\nline_mm = [[0, 0], [0, 5]]\ncurrent_a = 1\n\
                     [[terminal]]\nname = \"out\"\nlayer = \"a\"\nline_mm = [[9, 0], [9, 5]]\n";
        let reading = crate::reading::read(std::path::Path::new("job.toml"), &|_| Ok(sheet.into())).unwrap();
        let found = crate::findings::find(&reading.problem).unwrap();
        let [with, without] = [true, false].map(|picture| report(&reading.problem, &found.findings, picture));
        assert!(with.contains("(heatmap.png)") && !without.contains("heatmap.png"));
        assert_eq!(with.len() - without.len(), "![Where current crowds](heatmap.png)\n\n".len());
    }

    #[test]
    fn cells_of_a_table_stay_in_their_row() {
        let mut page = Page::default();
        page.table(&["name", "A"], 1, [vec!["a|b\n<b>".to_string(), "1".into()]].into_iter());
        assert_eq!(page.text, "| name | A |\n|---|---:|\n| a\\|b &lt;b> | 1 |\n\n");
    }
}
