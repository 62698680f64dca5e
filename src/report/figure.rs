//! From a solution and its findings to the sheet that the picture draws.

use super::words::{self, CAUTION, interval};
use crate::findings::metal::{LayerMetal, MetalTriangle};
use crate::findings::{Found, HotspotKind};
use crate::geometry::Point;
use crate::mesh::NONE;
use crate::picture::{self, HotspotMark, Panel, Sheet, SpotMark};
use crate::problem::{Drive, Electrode, ElectrodeKind, Footprint, Problem};
use crate::quantity::three;
use std::collections::HashMap;

/// Spots whose amperes are worth writing: beyond this many they would only be noise.
const MOST_LABELS: usize = 80;

/// The heat map as PNG.
///
/// # Errors
/// When it cannot be drawn.
pub fn heat_map(problem: &Problem, found: &Found) -> Result<Vec<u8>, String> {
    picture::heat_map(&sheet(problem, found)).map_err(|fault| fault.to_string())
}

/// What the picture shows.
pub fn sheet(problem: &Problem, found: &Found) -> Sheet {
    let findings = &found.findings;
    let mut footer = vec![format!("loss {} W", interval(findings.loss_w))];
    if let Some(r) = findings.resistance_mohm {
        footer.push(format!("resistance {} mΩ", interval(r)));
    }
    let run = &findings.run;
    footer.push(format!("enclosed to {} %{}", three(run.bracket_percent), if run.reached { "" } else { ", not as tight as asked" }));
    let mut panels: Vec<Panel> = (0..problem.layers.len()).map(|l| panel(problem, found, l)).collect();
    refer_to_lowest(&mut panels);
    Sheet {
        title: problem.title.clone(),
        subtitle: subtitle(problem, found),
        panels,
        scale_label: "current density, A/mm²".into(),
        peak: findings.layers.iter().map(|l| l.peak_a_mm2).reduce(f64::max),
        footer,
        caution: CAUTION.into(),
    }
}

/// Rows at levels volts apart would share no useful spacing of equipotentials: each panel then counts from its own lowest point.
fn refer_to_lowest(panels: &mut [Panel]) {
    let span = |values: &mut dyn Iterator<Item = f64>| {
        let (low, high) = values.fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), v| (l.min(v), h.max(v)));
        (low, high - low)
    };
    let own: Vec<(f64, f64)> = panels.iter().map(|p| span(&mut p.potential_mv.iter().copied())).collect();
    let (_, all) = span(&mut panels.iter().flat_map(|p| p.potential_mv.iter().copied()));
    if all > 3.0 * own.iter().fold(0.0, |m: f64, o| m.max(o.1)) {
        for (panel, (low, _)) in panels.iter_mut().zip(own) {
            panel.potential_mv.iter_mut().for_each(|v| *v -= low);
            panel.details += " · mV above its lowest point";
        }
    }
}

fn subtitle(problem: &Problem, found: &Found) -> String {
    let inward = through(problem, found);
    let count = |kind: ElectrodeKind| problem.electrodes.iter().filter(|e| e.kind == kind && !matches!(e.drive, Drive::Return(_))).count();
    let mut parts = Vec::new();
    for (n, one) in [(count(ElectrodeKind::Cell), "cell"), (count(ElectrodeKind::Terminal), "terminal")] {
        if n > 0 {
            parts.push(words::counted(n, one));
        }
    }
    format!("{} A through {} · metal at {} °C", three(inward), parts.join(" and "), problem.temperature_c)
}

/// What flows through the whole job, A: what enters from outside, pieces in series through their cells counted once.
fn through(problem: &Problem, found: &Found) -> f64 {
    let complex = &found.solution.complex;
    let mut inward = vec![0.0; complex.pieces];
    for (e, &piece) in found.findings.electrodes.iter().zip(&complex.piece_of) {
        inward[piece as usize] += e.current_a.max(0.0);
    }
    let mut set: Vec<usize> = (0..complex.pieces).collect();
    let ends = || problem.electrodes.iter().zip(&complex.piece_of);
    for (positive, &from) in ends() {
        for (negative, &to) in ends() {
            if let (Drive::Source(s), Drive::Return(r)) = (positive.drive, negative.drive)
                && s == r
            {
                let (keep, drop) = (set[from as usize].min(set[to as usize]), set[from as usize].max(set[to as usize]));
                set.iter_mut().filter(|s| **s == drop).for_each(|s| *s = keep);
            }
        }
    }
    let of = |number: usize| set.iter().zip(&inward).filter(|(s, _)| **s == number).map(|(_, a)| *a).fold(0.0, f64::max);
    (0..complex.pieces).map(of).sum()
}

fn panel(problem: &Problem, found: &Found, l: usize) -> Panel {
    let layer = &problem.layers[l];
    let metal = &found.density.layers[l];
    let (points, triangles, potential_mv) = corners(found, metal);
    let mut panel = Panel {
        name: layer.name.clone(),
        details: format!("{}, {} mm", words::metal(layer), layer.thickness_mm),
        loops: layer.region.loops.clone(),
        points,
        triangles,
        potential_mv,
        values: metal.triangles.iter().map(|t| t.magnitude).collect(),
        flow: metal.triangles.iter().map(|t| [t.density.x, t.density.y]).collect(),
        regions: regions(found, metal),
        ..Panel::default()
    };
    let spots: usize = problem.electrodes.iter().map(|e| e.spots.len()).chain(problem.joins.iter().map(|j| j.spots.len())).sum();
    for (electrode, finding) in
        problem.electrodes.iter().zip(&found.findings.electrodes).filter(|(e, _)| e.through.iter().any(|t| t.index() == l))
    {
        for (spot, out) in electrode.spots.iter().zip(&finding.spots) {
            match &spot.footprint {
                Footprint::Line { points } => panel.lines.push(points.clone()),
                Footprint::Area { region, .. } if electrode.kind == ElectrodeKind::Terminal => {
                    panel.patches.extend(region.loops.iter().cloned())
                }
                Footprint::Area { region, .. } => {
                    let label = (spots <= MOST_LABELS).then(|| amperes(out.current_a));
                    panel.spots.extend(region.loops.iter().map(|outline| SpotMark { outline: outline.clone(), label: label.clone() }));
                }
            }
        }
        panel.names.push((name_place(electrode), electrode.name.clone()));
    }
    let mut findings = found.findings.joins.iter();
    for join in &problem.joins {
        for (spot, finding) in join.spots.iter().zip(findings.by_ref()) {
            if let Footprint::Area { region, .. } = spot
                && join.between.iter().any(|b| b.index() == l)
            {
                let label = finding.current_a.filter(|_| spots <= MOST_LABELS).map(|a| amperes(a.abs()));
                panel.spots.extend(region.loops.iter().map(|outline| SpotMark { outline: outline.clone(), label: label.clone() }));
            }
        }
    }
    for contact in problem.contacts.iter().filter(|c| c.between.iter().any(|b| b.index() == l)) {
        panel.contacts.extend(contact.area.iter().flat_map(|area| area.loops.iter().cloned()));
    }
    for probe in &problem.probes {
        for (&(layer, at), sign) in probe.tips.iter().zip(["+", "−"]) {
            if layer.index() == l {
                panel.tips.push((at, format!("{} {sign}", words::one_line(&probe.name))));
            }
        }
    }
    for (crossing, finding) in problem.crossings.iter().zip(&found.findings.crossings) {
        let own = finding.current_a.get(&layer.name).copied().unwrap_or(0.0);
        let most = finding.current_a.values().fold(0.0, |m: f64, a| m.max(a.abs()));
        if own.abs() > 1e-9 * most {
            panel.crossings.push(([crossing.from, crossing.to], format!("{} {}", words::one_line(&crossing.name), amperes(own))));
        }
    }
    for (row, place) in found.findings.hotspots.iter().zip(&found.places).filter(|(_, p)| p.layer.index() == l) {
        let neck = (row.kind == HotspotKind::Neck).then_some(place.section_ends).flatten();
        let text = neck.and(row.width_mm).map(|w| format!("{w:.2}"));
        panel.hotspots.push(HotspotMark { number: row.rank, at: place.centre, neck, text });
    }
    panel
}

/// The layer's triangles over points of their own: one per unknown, so that the two sides of a slit stay apart.
fn corners(found: &Found, metal: &LayerMetal) -> (Vec<Point>, Vec<[u32; 3]>, Vec<f64>) {
    let solution = &found.solution;
    let (mut points, mut potential) = (Vec::new(), Vec::new());
    let mut place = vec![NONE; solution.complex.order()];
    // A held patch has one unknown but many corners: those are numbered by vertex.
    let mut held_place = vec![NONE; solution.mesh.points.len()];
    let mut triangles = Vec::with_capacity(metal.triangles.len());
    for triangle in &metal.triangles {
        triangles.push([0, 1, 2].map(|k| {
            let unknown = solution.complex.unknowns[triangle.element as usize][k] as usize;
            let vertex = solution.mesh.triangles[triangle.triangle as usize][k] as usize;
            let slot = if unknown < solution.complex.poles { &mut held_place[vertex] } else { &mut place[unknown] };
            if *slot == NONE {
                *slot = points.len() as u32;
                points.push(solution.mesh.points[vertex]);
                potential.push(1e3 * solution.potential.values[unknown]);
            }
            *slot
        }));
    }
    (points, triangles, potential)
}

/// A current with the minus sign of print.
fn amperes(value: f64) -> String {
    format!("{} A", three(value).replacen('-', "−", 1))
}

/// Where the current density jumps: from bare to bonded metal and at held patches.
fn regions(found: &Found, metal: &LayerMetal) -> Vec<u32> {
    let mut kinds = HashMap::new();
    let leaf = |t: &MetalTriangle| found.solution.complex.elements[t.element as usize].leaf;
    metal
        .triangles
        .iter()
        .map(|t| {
            let (leaf, next) = (leaf(t), kinds.len() as u32);
            *kinds.entry((leaf.layers, leaf.held.map(|h| h.pole))).or_insert(next)
        })
        .collect()
}

/// Where an electrode's name belongs: the middle of its spots.
fn name_place(electrode: &Electrode) -> Point {
    let middles = electrode.spots.iter().map(|spot| match &spot.footprint {
        Footprint::Area { centre, .. } => *centre,
        Footprint::Line { points } => points.iter().fold(Point::default(), |s, &p| s + p) * (1.0 / points.len().max(1) as f64),
    });
    middles.fold(Point::default(), |s, p| s + p) * (1.0 / electrode.spots.len().max(1) as f64)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn sheet_of(job: &str) -> Sheet {
        let reading = crate::reading::read(std::path::Path::new("job.toml"), &|_| Ok(job.into())).unwrap();
        let found = crate::findings::find(&reading.problem).unwrap();
        sheet(&reading.problem, &found)
    }

    /// A strip of 10 x 5 mm as a layer of its own, from some y on.
    fn layer(name: &str, y: f64) -> String {
        let points = format!("[[0, {y}], [10, {y}], [10, {0}], [0, {0}]]", y + 5.0);
        format!("[[layer]]\nname = \"{name}\"\nthickness_mm = 0.2\nresistivity_uohm_cm = 2\npoints_mm = {points}\n")
    }

    fn end(name: &str, layer: &str, x: f64, y: f64, drive: &str) -> String {
        format!("[[terminal]]\nname = \"{name}\"\nlayer = \"{layer}\"\nline_mm = [[{x}, {y}], [{x}, {}]]\n{drive}\n", y + 5.0)
    }

    #[test]
    fn what_enters_separate_pieces_adds_up() {
        let job = layer("a", 0.0)
            + &layer("b", 10.0)
            + &end("a in", "a", 0.0, 0.0, "current_a = 2")
            + &end("a out", "a", 10.0, 0.0, "")
            + &end("b in", "b", 0.0, 10.0, "current_a = 3")
            + &end("b out", "b", 10.0, 10.0, "");
        assert!(sheet_of(&job).subtitle.starts_with("5.00 A through 4 terminals"));
    }

    #[test]
    fn rows_in_series_through_their_cells_count_once() {
        let job = layer("plus", 0.0)
            + &layer("minus", 10.0)
            + "[[cell]]\nname = \"c\"\nlayer = \"plus\"\nspots_mm = [[3, 2.5]]\ndiameter_mm = 1\njoint_mohm = 0.1\nemf_mv = 1000\n\
               resistance_mohm = 10\nreturn = { layer = \"minus\", spots_mm = [[3, 12.5]], diameter_mm = 1, joint_mohm = 0.1 }\n"
            + &end("lead", "plus", 10.0, 0.0, "current_a = -4")
            + &end("other lead", "minus", 10.0, 10.0, "current_a = 4");
        assert!(sheet_of(&job).subtitle.starts_with("4.00 A through"), "{}", sheet_of(&job).subtitle);
    }

    #[test]
    fn joins_tips_and_lines_are_in_the_panels_they_belong_to() {
        let job = layer("a", 0.0)
            + &layer("b", 0.0)
            + "[[join]]\nbetween = [\"a\", \"b\"]\nspots_mm = [[5, 2.5]]\ndiameter_mm = 1\njoint_mohm = 0.1\n\
               [[probe]]\nname = \"over\"\nlayer = \"a\"\nlayer_b = \"b\"\ntips_mm = [[4, 1], [6, 1]]\n\
               [[crossing]]\nname = \"cut\"\nfrom_mm = [2, 0]\nto_mm = [2, 5]\n"
            + &end("in", "a", 0.0, 0.0, "current_a = 2")
            + &end("out", "b", 10.0, 0.0, "");
        let [a, b] = <[Panel; 2]>::try_from(sheet_of(&job).panels).unwrap();
        assert_eq!((a.spots[0].label.as_deref(), b.spots[0].label.as_deref()), (Some("2.00 A"), Some("2.00 A")));
        assert_eq!((a.tips[0].1.as_str(), b.tips[0].1.as_str(), a.tips.len()), ("over +", "over −", 1));
        assert_eq!((a.crossings[0].1.as_str(), b.crossings.len()), ("cut 2.00 A", 0));
    }
}
