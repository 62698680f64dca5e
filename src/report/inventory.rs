//! What a job holds, before anything is solved: sheets, electrodes, connected metal. This is what `pinchbar check` shows.

use super::pieces::Pieces;
use super::words::{counted, metal_name, one_line, wrapped};
use crate::diagnostic::Remark;
use crate::geometry::clearance::{self, clearances};
use crate::geometry::ring::Arc;
use crate::geometry::{BoundingBox, Point, Ring};
use crate::index::LayerId;
use crate::problem::{Drive, Electrode, ElectrodeKind, Problem};
use crate::quantity::{coordinate, three};
use serde::Serialize;

/// The inventory of one job.
#[derive(Debug, Clone, Serialize)]
pub struct Inventory {
    /// The job's title.
    pub title: String,
    /// The sheets, bottom first.
    pub layers: Vec<Sheet>,
    /// Terminals and cells' ends.
    pub electrodes: Vec<Attached>,
    /// Sets of pieces of metal that are connected.
    pub connected: Vec<ConnectedMetal>,
    /// What was moved, dropped or assumed in reading.
    pub remarks: Vec<Remark>,
}

/// One sheet.
#[derive(Debug, Clone, Serialize)]
pub struct Sheet {
    /// Its name.
    pub name: String,
    /// Its metal.
    pub metal: String,
    /// Its thickness.
    pub thickness_mm: f64,
    /// Its area, arcs counted as drawn.
    pub area_mm2: f64,
    /// Its mass; `None` where the density is not known.
    pub mass_g: Option<f64>,
    /// Least and largest x.
    pub x_mm: [f64; 2],
    /// Least and largest y.
    pub y_mm: [f64; 2],
    /// Number of pieces.
    pub pieces: usize,
    /// Number of holes.
    pub holes: usize,
    /// The narrowest metal.
    pub least_web: Option<Distance>,
    /// The narrowest gap.
    pub least_slot: Option<Distance>,
}

/// A straight distance between two points of an outline.
#[derive(Debug, Clone, Serialize)]
pub struct Distance {
    /// Its length.
    pub width_mm: f64,
    /// One end.
    pub from_mm: [f64; 2],
    /// The other end.
    pub to_mm: [f64; 2],
}

/// One electrode.
#[derive(Debug, Clone, Serialize)]
pub struct Attached {
    /// Its name.
    pub name: String,
    /// "terminal" or "cell".
    pub kind: &'static str,
    /// Group of its shares.
    pub group: Option<String>,
    /// What drives it, in words.
    pub drive: String,
    /// Its spots.
    pub spots: Vec<Place>,
}

/// One spot, line or area of an electrode.
#[derive(Debug, Clone, Serialize)]
pub struct Place {
    /// Its middle.
    pub x_mm: f64,
    /// Its middle.
    pub y_mm: f64,
    /// The metal it stands on, from the first sheet passed to the last.
    pub on: Vec<String>,
}

/// Pieces of metal that hang together.
#[derive(Debug, Clone, Serialize)]
pub struct ConnectedMetal {
    /// Names of the pieces.
    pub pieces: Vec<String>,
    /// Contacts, joins and electrodes that connect them.
    pub by: Vec<String>,
    /// Electrodes that stand on it.
    pub electrodes: Vec<String>,
}

/// Takes the inventory of a checked job.
pub fn inventory(problem: &Problem, remarks: Vec<Remark>) -> Inventory {
    let pieces = Pieces::of(problem);
    let layers = problem.layers.iter().enumerate().map(|(l, layer)| {
        let bounds = layer.rings.iter().fold(BoundingBox::EMPTY, with_ring);
        let least = clearances(&layer.rings);
        let (count, holes) = pieces.counts(LayerId::new(l));
        Sheet {
            name: layer.name.clone(),
            metal: layer.material.name.clone(),
            thickness_mm: layer.thickness_mm,
            area_mm2: layer.area_mm2(),
            mass_g: layer.mass_g(),
            x_mm: [bounds.min.x, bounds.max.x],
            y_mm: [bounds.min.y, bounds.max.y],
            pieces: count,
            holes,
            least_web: least.web.map(distance),
            least_slot: least.slot.map(distance),
        }
    });
    let electrodes = problem.electrodes.iter().map(|e| Attached {
        name: e.name.clone(),
        kind: if e.kind == ElectrodeKind::Cell { "cell" } else { "terminal" },
        group: e.group.clone(),
        drive: drive(problem, e),
        spots: e
            .spots
            .iter()
            .map(|spot| {
                let at = spot.footprint.middle();
                let on = e.through.iter().map(|&l| pieces.under(l, &spot.footprint).map_or_else(|| "no metal".into(), |p| pieces.name(p)));
                Place { x_mm: at.x, y_mm: at.y, on: on.collect() }
            })
            .collect(),
    });
    let connected = pieces.connected().into_iter().map(|set| ConnectedMetal {
        pieces: set.pieces.iter().map(|&p| pieces.name(p)).collect(),
        by: set.ties,
        electrodes: set.electrodes.iter().filter_map(|&e| problem.electrodes.get(e)).map(|e| e.name.clone()).collect(),
    });
    let (layers, electrodes) = (layers.collect(), electrodes.collect());
    Inventory { title: problem.title.clone(), layers, electrodes, connected: connected.collect(), remarks }
}

/// The inventory as text of 80 columns.
pub fn text(inventory: &Inventory) -> String {
    let mut lines: Vec<String> = wrapped(&inventory.title, 80);
    lines.push(String::new());
    lines.push("  Layers, bottom first".into());
    for sheet in &inventory.layers {
        let mass = sheet.mass_g.map_or(String::new(), |m| format!(", {} g", three(m)));
        push(
            &mut lines,
            &format!(
                "{}: {}, {} mm, {} mm2{mass}",
                sheet.name,
                metal_name(&sheet.metal),
                coordinate(sheet.thickness_mm),
                three(sheet.area_mm2)
            ),
        );
        let ([x0, x1], [y0, y1]) = (sheet.x_mm.map(coordinate), sheet.y_mm.map(coordinate));
        let holes = if sheet.holes > 0 { format!(", {}", counted(sheet.holes, "hole")) } else { String::new() };
        lines.push(format!("      x {x0} to {x1} mm, y {y0} to {y1} mm; {}{holes}", counted(sheet.pieces, "piece")));
        for (name, least) in [("least web", &sheet.least_web), ("least slot", &sheet.least_slot)] {
            if let Some(d) = least {
                let point = |p: [f64; 2]| format!("({}, {})", coordinate(p[0]), coordinate(p[1]));
                lines.push(format!("      {name:<10} {} mm from {} to {}", coordinate(d.width_mm), point(d.from_mm), point(d.to_mm)));
            }
        }
    }
    lines.push(String::new());
    lines.push("  Electrodes".into());
    for e in &inventory.electrodes {
        let mut on: Vec<String> = Vec::new();
        for place in e.spots.iter().map(|s| s.on.join(" through ")) {
            if !on.contains(&place) {
                on.push(place);
            }
        }
        let group = e.group.as_ref().map_or(String::new(), |g| format!(", group {g}"));
        let places = match e.spots.as_slice() {
            [one] => format!("at ({}, {})", coordinate(one.x_mm), coordinate(one.y_mm)),
            many => counted(many.len(), "spot"),
        };
        push(&mut lines, &format!("{} {}{group}: {}, {places} on {}", e.kind, e.name, e.drive, on.join(" and ")));
    }
    lines.push(String::new());
    lines.push("  Connected metal".into());
    for set in &inventory.connected {
        let by = if set.by.is_empty() { String::new() } else { format!(", by {}", set.by.join(", ")) };
        let reached = match set.electrodes.as_slice() {
            [] => "no electrode".to_string(),
            names => format!("{} ({})", counted(names.len(), "electrode"), names.join(", ")),
        };
        push(&mut lines, &format!("{}{by}: {reached}", set.pieces.join(" + ")));
    }
    if !inventory.remarks.is_empty() {
        lines.push(String::new());
        lines.push("  Remarks".into());
        inventory.remarks.iter().for_each(|r| push(&mut lines, &r.text));
    }
    lines.iter().map(|line| format!("{}\n", one_line(line).trim_end())).collect()
}

/// One entry of a list, wrapped and indented.
fn push(lines: &mut Vec<String>, entry: &str) {
    lines.extend(wrapped(entry, 74).into_iter().enumerate().map(|(i, part)| format!("{}{part}", if i == 0 { "    " } else { "      " })));
}

fn drive(problem: &Problem, electrode: &Electrode) -> String {
    let source = |s: crate::index::SourceId| match problem.sources.get(s.index()) {
        Some(source) => format!("source of {} mV behind {} mohm", three(1e3 * source.emf_v), three(1e3 * source.resistance_ohm)),
        None => "source".into(),
    };
    match electrode.drive {
        Drive::Current(a) => format!("{} A", three(a)),
        Drive::Balance => "takes the balance".into(),
        Drive::Held(v) => format!("held at {} mV", three(1e3 * v)),
        Drive::Source(s) => source(s),
        Drive::Return(s) => format!("return end of a {}", source(s)),
    }
}

fn distance(c: clearance::Clearance) -> Distance {
    Distance { width_mm: c.width_mm, from_mm: [c.from.x, c.from.y], to_mm: [c.to.x, c.to.y] }
}

/// The box widened to hold a ring, its arcs as drawn.
fn with_ring(bounds: BoundingBox, ring: &Ring) -> BoundingBox {
    ring.edges().fold(bounds, |bounds, (a, bulge, b)| {
        let bounds = bounds.with(a);
        let Some(arc) = Arc::new(a, bulge, b) else { return bounds };
        let quarter = std::f64::consts::FRAC_PI_2;
        // Outermost points of a circle are a whole number of quarter turns from the right.
        let (first, last) = (arc.start.min(arc.start + arc.sweep), arc.start.max(arc.start + arc.sweep));
        let turns = (first / quarter).ceil() as i32..=(last / quarter).floor() as i32;
        turns.fold(bounds, |bounds, k| {
            let way = [(1.0, 0.0), (0.0, 1.0), (-1.0, 0.0), (0.0, -1.0)][k.rem_euclid(4) as usize];
            bounds.with(arc.centre + Point::new(way.0, way.1) * arc.radius)
        })
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::reading::read;
    use std::path::Path;

    const TWO_SHEETS: &str = r#"
title = "Two strips under one cover"
[[layer]]
name = "strip"
resistivity_uohm_cm = 9.0
thickness_mm = 0.2
points_mm = [[0, 0], [20, 0], [20, 10], [0, 10]]
holes_mm = [[[8, 4], [12, 4], [12, 6], [8, 6]]]
[[layer]]
name = "cover"
metal = "copper-etp"
thickness_mm = 0.5
outline = "cover.outline"
[[contact]]
name = "under the cover"
between = ["strip", "cover"]
contact_mohm_mm2 = 30
[[terminal]]
name = "in"
layer = "strip"
line_mm = [[0, 0], [0, 10]]
current_a = 10
[[terminal]]
name = "out"
layer = "cover"
line_mm = [[40, 0], [40, 10]]
"#;

    #[test]
    fn sheets_electrodes_and_what_connects_them() {
        let load = |path: &Path| {
            Ok(if path.ends_with("cover.outline") {
                "ring\n15 0\n40 0\n40 10\n15 10\ncircle 5 20 8\n".into()
            } else {
                TWO_SHEETS.to_string()
            })
        };
        let reading = read(Path::new("job.toml"), &load);
        // The disc is reached by nothing; whether reading refuses it or leaves that to the mesh, the rest stays as it is.
        let reading = reading.unwrap();
        let found = inventory(&reading.problem, reading.remarks);
        let cover = &found.layers[1];
        assert_eq!((cover.pieces, cover.holes, found.layers[0].pieces, found.layers[0].holes), (2, 0, 1, 1));
        assert_eq!((cover.x_mm, cover.y_mm), ([1.0, 40.0], [0.0, 24.0]));
        assert!((found.layers[0].area_mm2 - 192.0).abs() < 1e-9 && found.layers[0].mass_g.is_none());
        assert!((cover.mass_g.unwrap() / (cover.area_mm2 * 0.5 * 8.9e-3) - 1.0).abs() < 0.01);
        assert_eq!(found.layers[0].least_web.as_ref().unwrap().width_mm, 4.0);
        let pieces: Vec<&[String]> = found.connected.iter().map(|c| c.pieces.as_slice()).collect();
        assert_eq!(pieces, [&["strip".to_string(), "cover piece 1".into()][..], &["cover piece 2".into()][..]]);
        assert_eq!(found.connected[0].by, ["under the cover"]);
        assert_eq!(found.connected[0].electrodes, ["in", "out"]);
        assert_eq!(found.electrodes[1].spots[0].on, ["cover piece 1"]);
        assert_eq!((found.electrodes[0].spots[0].x_mm, found.electrodes[0].spots[0].y_mm), (0.0, 5.0));
        let shown = text(&found);
        for part in [
            "least web",
            "4 mm from",
            "x 1 to 40 mm",
            "2 pieces",
            "takes the balance",
            "no electrode",
            "strip + cover piece 1, by under the cover",
        ] {
            assert!(shown.contains(part), "{part} is missing from\n{shown}");
        }
        assert!(shown.lines().all(|l| l.chars().count() <= 80), "{shown}");
    }

    #[test]
    fn an_island_in_a_hole_is_a_piece_of_its_own() {
        let sheet = r#"
title = "Frame and island"
[[layer]]
name = "frame"
resistivity_uohm_cm = 2.0
thickness_mm = 1
outline = "frame.outline"
[[terminal]]
name = "a"
layer = "frame"
line_mm = [[0, 0], [0, 40]]
current_a = 1
[[terminal]]
name = "b"
layer = "frame"
disc_mm = [55, 20, 4]
voltage_mv = 0
[[terminal]]
name = "c"
layer = "frame"
disc_mm = [30, 20, 4]
voltage_mv = 0
"#;
        let outline = "ring\n0 0\n60 0\n60 40\n0 40\nring\n10 10\n50 10\n50 30\n10 30\nring\n15 12\n45 12\n45 28\n15 28\ncircle 20 20 2\n";
        let reading =
            read(Path::new("job.toml"), &|path| Ok(if path.ends_with("frame.outline") { outline } else { sheet }.to_string())).unwrap();
        let found = inventory(&reading.problem, reading.remarks);
        assert_eq!((found.layers[0].pieces, found.layers[0].holes), (2, 2));
        assert_eq!(found.layers[0].area_mm2, 2400.0 - 800.0 + 480.0 - std::f64::consts::PI);
        let electrodes: Vec<&[String]> = found.connected.iter().map(|c| c.electrodes.as_slice()).collect();
        assert_eq!(electrodes, [&["a".to_string(), "b".into()][..], &["c".into()][..]]);
        assert_eq!(found.layers[0].least_slot.as_ref().map(|d| d.width_mm), Some(2.0));
        assert_eq!(found.layers[0].least_web.as_ref().map(|d| d.width_mm), Some(4.0));
    }
}
