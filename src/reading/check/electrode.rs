//! Terminals and cells: what drives them, where they are attached, patterns and return ends.

use super::layer::Stack;
use super::measured::{GivenJoint, read_joint};
use super::names::Names;
use super::place::place;
use super::plausible;
use super::shape::{Drawn, drawn_places, place_key, places_by};
use super::weld_list::{Weld, read_welds};
use crate::diagnostic::Span;
use crate::geometry::Point;
use crate::index::{ElectrodeId, LayerId, SourceId};
use crate::problem::{Drive, Electrode, ElectrodeKind, Source, Spot};
use crate::reading::drawn::{MOST_COPIES, within};
use crate::reading::fields::{Fields, Notes, Placed};
use crate::reading::files::Files;
use crate::reading::sheet::Value;
use std::collections::HashMap;

const TERMINAL_KEYS: [&str; 11] =
    ["name", "layer", "line_mm", "edge_mm", "disc_mm", "points_mm", "current_a", "voltage_mv", "joint_mohm", "measured_mohm", "tips_mm"];
const CELL_KEYS: [&str; 19] = [
    "name",
    "layer",
    "through",
    "spots_mm",
    "diameter_mm",
    "seams_mm",
    "areas_mm",
    "line_mm",
    "edge_mm",
    "spots_csv",
    "joint_mohm",
    "measured_mohm",
    "tips_mm",
    "current_a",
    "emf_mv",
    "resistance_mohm",
    "return",
    "group",
    "pattern",
];
const RETURN_KEYS: [&str; 11] =
    ["layer", "through", "spots_mm", "diameter_mm", "seams_mm", "areas_mm", "line_mm", "edge_mm", "joint_mohm", "measured_mohm", "tips_mm"];
const CELL_PLACES: [&str; 6] = ["spots_mm", "seams_mm", "areas_mm", "line_mm", "edge_mm", "spots_csv"];
const RETURN_PLACES: [&str; 5] = ["spots_mm", "seams_mm", "areas_mm", "line_mm", "edge_mm"];

/// An electrode before it is put onto the metal.
pub struct DrawnElectrode {
    /// What will be solved, without its spots.
    pub electrode: Electrode,
    /// Its spots as drawn.
    pub places: Vec<Drawn>,
    joint_ohm: f64,
    /// Its name, or its return block.
    pub span: Span,
    /// The current's place, else the name's.
    pub drive_span: Span,
}

/// All electrodes as drawn, and the sources among them.
pub struct DrawnElectrodes {
    /// In the order of the sheet.
    pub list: Vec<DrawnElectrode>,
    /// Cells as voltage sources.
    pub sources: Vec<Source>,
    /// Electrodes made alike whose joint is to be fitted to a reading at the first of them, and the sheets they pass.
    pub measured: Vec<(Vec<ElectrodeId>, GivenJoint, Vec<LayerId>)>,
    /// False when some block could not be read.
    pub complete: bool,
}

/// Reads the blocks of terminals and cells and expands the patterns.
pub fn read_electrodes(terminals: &[Value], cells: &[Value], layers: &Names, files: &Files, notes: &Notes) -> DrawnElectrodes {
    let mut drawn = DrawnElectrodes { list: Vec::new(), sources: Vec::new(), measured: Vec::new(), complete: true };
    let mut names = Names::new("electrode");
    // In the order in which they are written.
    let mut blocks: Vec<(&Value, bool)> = terminals.iter().map(|t| (t, true)).chain(cells.iter().map(|c| (c, false))).collect();
    blocks.sort_by_key(|b| b.0.span.start);
    for (block, terminal) in blocks {
        let read = if terminal {
            read_terminal(block, layers, &mut names, notes).map(|(electrode, given)| {
                let (id, through) = (ElectrodeId::new(drawn.list.len()), electrode.electrode.through.clone());
                drawn.measured.extend(given.tips.is_some().then_some((vec![id], given, through)));
                drawn.list.push(electrode);
            })
        } else {
            read_cell(block, layers, &mut names, files, notes, &mut drawn)
        };
        drawn.complete &= read.is_some();
    }
    drawn
}

fn layer_id(name: &Placed<String>, layers: &Names, notes: &Notes) -> Option<LayerId> {
    layers.find(name, notes).map(LayerId::new)
}

fn read_terminal(block: &Value, layers: &Names, names: &mut Names, notes: &Notes) -> Option<(DrawnElectrode, GivenJoint)> {
    let fields = Fields::open(block, "terminal", &TERMINAL_KEYS, notes)?;
    let name = fields.required_text("name");
    names.add(name.clone(), fields.span, notes);
    fields.missing("layer", "the name of a layer");
    let layer = fields.text("layer").and_then(|l| layer_id(&l, layers, notes));
    let places = drawn_places(&fields, &["line_mm", "edge_mm", "disc_mm", "points_mm"]);
    let joint = read_joint(&fields, name.as_ref().map_or("terminal", |n| &n.value), None, 1..=1, notes);
    let current = current(&fields);
    let voltage = fields.number_where("voltage_mv", "within a million volts", |v| v.abs() <= 1e9);
    let drive = match (fields.has("current_a"), fields.has("voltage_mv")) {
        (true, true) => {
            let remedy = "keep `current_a`, or keep `voltage_mv`";
            notes.fault("the terminal is driven twice", fields.place("voltage_mv"), "`current_a` or `voltage_mv`", remedy);
            None
        }
        (true, false) => current.map(Drive::Current),
        (false, true) => voltage.map(|v| Drive::Held(v.value * 1e-3)),
        (false, false) => Some(Drive::Balance),
    };
    let Placed { value: name, span } = name?;
    let drive_span = if fields.value("current_a").is_some() { fields.place("current_a").clone() } else { span.clone() };
    let electrode = Electrode { name, kind: ElectrodeKind::Terminal, group: None, through: vec![layer?], spots: Vec::new(), drive: drive? };
    let given = joint?;
    Some((DrawnElectrode { electrode, places: places?, joint_ohm: given.ohm, span, drive_span }, given))
}

fn current(fields: &Fields) -> Option<f64> {
    fields.number_where("current_a", "within a million amperes", |i| i.abs() <= 1e6).map(|i| i.value)
}

/// What a cell's end or its return end is attached to, and by what resistance.
struct Footing {
    through: Vec<LayerId>,
    joint: GivenJoint,
}

fn read_footing(fields: &Fields, who: &str, layers: &Names, notes: &Notes) -> Option<Footing> {
    let through = match (fields.has("layer"), fields.has("through")) {
        (true, true) => {
            let remedy = "keep `layer` for one sheet, `through` for several";
            notes.fault("the sheet is given twice", fields.place("through"), "`layer` or `through`", remedy);
            None
        }
        (_, true) => read_through(fields, layers, notes),
        _ => {
            fields.missing("layer", "`layer = \"name\"`, or `through = [...]` from the top sheet down to the can");
            fields.text("layer").and_then(|l| layer_id(&l, layers, notes)).map(|l| vec![l])
        }
    };
    let joint = read_joint(fields, who, Some("solid"), 1..=1, notes);
    Some(Footing { through: through?, joint: joint? })
}

fn read_through(fields: &Fields, layers: &Names, notes: &Notes) -> Option<Vec<LayerId>> {
    let mut through: Vec<LayerId> = Vec::new();
    let mut good = true;
    for value in fields.list("through")? {
        let crate::reading::sheet::Content::Text(name) = &value.content else {
            let message = format!("`through` must hold layers' names, not {}", value.content.noun());
            notes.fault(message, &value.span, "[\"top sheet\", \"sheet on the can\"]", "write the names in quotes");
            good = false;
            continue;
        };
        match layer_id(&Placed { value: name.clone(), span: value.span.clone() }, layers, notes) {
            Some(id) if through.contains(&id) => {
                notes.fault(format!("`through` names `{name}` twice"), &value.span, "each sheet once", "remove one of the two");
                good = false;
            }
            Some(id) => through.push(id),
            None => good = false,
        }
    }
    good.then_some(through)
}

/// One cell of a block: the block's own, or one of its list of welds.
struct CellEnd {
    name: Placed<String>,
    places: Vec<Drawn>,
    /// Its own current in A, where the list gives it.
    current_a: Option<Placed<f64>>,
}

fn read_cell(block: &Value, layers: &Names, names: &mut Names, files: &Files, notes: &Notes, drawn: &mut DrawnElectrodes) -> Option<()> {
    let fields = Fields::open(block, "cell", &CELL_KEYS, notes)?;
    let name = fields.text("name");
    let who = name.as_ref().map_or("cell", |n| n.value.as_str());
    let group = fields.text("group");
    let footing = read_footing(&fields, who, layers, notes);
    let key = place_key(&fields, &CELL_PLACES);
    let driven = fields.has("current_a") || fields.has("emf_mv");
    let welds = (key == Some("spots_csv")).then(|| read_welds(&fields, if driven { &["current_a"] } else { &[] }, files));
    let listed = |has: fn(&Weld) -> bool| welds.iter().flatten().flatten().any(has);
    let (names_listed, currents_listed) = (listed(|w| w.cell.is_some()), listed(|w| w.current_a.is_some()));
    // A list with faults may hold what seems to be missing.
    let list_failed = matches!(welds, Some(None));
    if !names_listed && !list_failed {
        fields.missing("name", "a text in quotes");
    }
    let drive = if list_failed && !driven { None } else { read_drive(&fields, currents_listed, who, notes) };
    let back = fields.value("return").map(|value| {
        let inner = Fields::open(value, "return", &RETURN_KEYS, notes)?;
        let (footing, places) = (read_footing(&inner, "return", layers, notes), drawn_places(&inner, &RETURN_PLACES));
        Some((footing?, places?, value.span.clone()))
    });
    let steps = read_pattern(&fields, notes);
    if names_listed {
        for key in ["pattern", "return"].into_iter().filter(|key| fields.has(key)) {
            let message = format!("`{key}` has no meaning beside a list of several cells");
            let remedy = "write a block for each cell, or leave the column `cell` out";
            notes.fault(message, fields.place(key), "`spots_csv` alone, or with the welds of one cell", remedy);
        }
    }
    let cells = match welds {
        Some(welds) => welds.and_then(|welds| cells_of_list(welds, name.clone(), currents_listed, notes)),
        None => key
            .and_then(|key| places_by(&fields, key))
            .zip(name.clone())
            .map(|(places, name)| vec![CellEnd { name, places, current_a: None }]),
    };
    let steps = steps?;
    let back_spots = back.iter().flatten().map(|b| b.1.len()).sum::<usize>();
    let spots = cells.iter().flatten().map(|c| c.places.len()).sum::<usize>() + back_spots;
    let limit = files.budget.borrow_mut().spend_spots(spots.saturating_mul(steps.len()), fields.place("name"));
    notes.keep(limit)?;
    // Where the cell cannot be read its name is still taken.
    let named: Vec<&Placed<String>> = cells.as_ref().map_or_else(|| name.iter().collect(), |cells| cells.iter().map(|c| &c.name).collect());
    if named.is_empty() {
        names.add(None, fields.span, notes);
    }
    for Placed { value: first, span } in named {
        for copy in numbered(first, steps.len()) {
            let end = back.is_some().then(|| format!("{copy} return"));
            for name in [copy].into_iter().chain(end) {
                names.add(Some(Placed { value: name, span: span.clone() }), fields.span, notes);
            }
        }
    }
    let (footing, cells, drive) = (footing?, cells?, drive?);
    let back = match back {
        Some(back) => Some(back?),
        None => None,
    };
    let (mut alike, mut alike_back) = (Vec::new(), Vec::new());
    for (cell, name, step) in cells.iter().flat_map(|cell| {
        let copies = numbered(&cell.name.value, steps.len());
        copies.into_iter().zip(&steps).map(move |(name, step)| (cell, name, *step))
    }) {
        let id = ElectrodeId::new(drawn.list.len());
        let source = SourceId::new(drawn.sources.len());
        let given = |i: f64| (Drive::Current(i), Drive::Current(-i), if i < 0.0 { "cells out" } else { "cells in" });
        let (forward, backward, default_group) = match (drive, &cell.current_a) {
            (CellDrive::Current(i), _) => given(i),
            (CellDrive::Listed, current) => given(current.as_ref()?.value),
            (CellDrive::Source { emf_v, resistance_ohm }, _) => {
                let negative = back.is_some().then(|| ElectrodeId::new(id.index() + 1));
                drawn.sources.push(Source { emf_v, resistance_ohm, positive: id, negative });
                (Drive::Source(source), Drive::Return(source), "cells")
            }
        };
        let group_name = group.as_ref().map_or(default_group, |g| g.value.as_str());
        let drive_span = match &cell.current_a {
            Some(current) => &current.span,
            None if fields.value("current_a").is_some() => fields.place("current_a"),
            None => &cell.name.span,
        };
        let mut push = |name: String, group: String, footing: &Footing, places: &[Drawn], drive, span: &Span| {
            let places = places.iter().map(|p| p.moved(step)).collect();
            let through = footing.through.clone();
            let electrode = Electrode { name, kind: ElectrodeKind::Cell, group: Some(group), through, spots: Vec::new(), drive };
            let (span, drive_span) = (span.clone(), drive_span.clone());
            drawn.list.push(DrawnElectrode { electrode, places, joint_ohm: footing.joint.ohm, span, drive_span });
        };
        push(name.clone(), group_name.to_string(), &footing, &cell.places, forward, &cell.name.span);
        alike.push(id);
        if let Some((footing, places, place)) = &back {
            push(format!("{name} return"), format!("{group_name} return"), footing, places, backward, place);
            alike_back.push(ElectrodeId::new(id.index() + 1));
        }
    }
    for (ids, footing) in [(alike, Some(footing)), (alike_back, back.map(|b| b.0))] {
        let measured = footing.filter(|f| f.joint.tips.is_some());
        drawn.measured.extend(measured.map(|f| (ids, f.joint, f.through)));
    }
    Some(())
}

/// The cells of a list in the order of their first welds; welds that name no cell belong to the block's.
fn cells_of_list(welds: Vec<Weld>, own: Option<Placed<String>>, with_currents: bool, notes: &Notes) -> Option<Vec<CellEnd>> {
    let mut cells: Vec<CellEnd> = Vec::new();
    let mut found: HashMap<String, usize> = HashMap::new();
    let mut good = true;
    for Weld { drawn, cell, current_a } in welds {
        let Some(name) = cell.or_else(|| own.clone()) else {
            let remedy = "fill the column `cell`, or give the block a `name` for the rest";
            notes.fault("the weld belongs to no cell", &drawn.span, "a cell's name in every row", remedy);
            good = false;
            continue;
        };
        let number = *found.entry(name.value.clone()).or_insert(cells.len());
        if number == cells.len() {
            cells.push(CellEnd { name, places: Vec::new(), current_a: None });
        }
        let cell = &mut cells[number];
        match (&cell.current_a, current_a) {
            (Some(first), Some(other)) if first.value != other.value => {
                let message = format!("`{}` has two currents, {} A and {} A", cell.name.value, first.value, other.value);
                let remedy = "give each row the current of the whole cell, or fill one row only";
                notes.fault_with(message, &other.span, "one current for each cell", remedy, vec![(first.span.clone(), "the first one")]);
                good = false;
            }
            (None, other) => cell.current_a = other,
            _ => {}
        }
        cell.places.push(drawn);
    }
    for cell in cells.iter().filter(|cell| with_currents && cell.current_a.is_none()) {
        let message = format!("`{}` has no current", cell.name.value);
        notes.fault(message, &cell.name.span, "a current for each cell of the list", "fill `current_a` in one of its rows");
        good = false;
    }
    good.then_some(cells)
}

#[derive(Clone, Copy)]
enum CellDrive {
    Current(f64),
    /// Each cell's own, from the list of welds.
    Listed,
    Source {
        emf_v: f64,
        resistance_ohm: f64,
    },
}

fn read_drive(fields: &Fields, listed: bool, who: &str, notes: &Notes) -> Option<CellDrive> {
    let current = current(fields);
    let emf = fields.number_where("emf_mv", "within a million volts", |v| v.abs() <= 1e9);
    plausible::remark_number(who, "emf_mv", emf.as_ref().map(|e| e.value), notes);
    let resistance = fields.positive("resistance_mohm");
    plausible::remark_number(who, "resistance_mohm", resistance, notes);
    match (fields.has("current_a") || listed, fields.has("emf_mv")) {
        (true, true) => {
            let remedy = "remove `current_a`: it is found from the voltage; or remove `emf_mv`";
            notes.fault("the cell is driven twice", fields.place("emf_mv"), "`current_a`, or `emf_mv` with `resistance_mohm`", remedy);
            None
        }
        (true, false) if fields.has("resistance_mohm") => {
            let remedy = "remove it; the current is given";
            notes.fault(
                "`resistance_mohm` belongs to `emf_mv`",
                fields.place("resistance_mohm"),
                "no `resistance_mohm` beside `current_a`",
                remedy,
            );
            None
        }
        (true, false) if listed => Some(CellDrive::Listed),
        (true, false) => current.map(CellDrive::Current),
        (false, true) => {
            fields.missing("resistance_mohm", "the cell's internal resistance in milliohm, above zero");
            Some(CellDrive::Source { emf_v: emf?.value * 1e-3, resistance_ohm: resistance? * 1e-3 })
        }
        (false, false) => {
            fields.missing("current_a", "`current_a`, or `emf_mv` with `resistance_mohm`");
            None
        }
    }
}

/// The steps of a pattern, row by row; a single zero step without one.
fn read_pattern(fields: &Fields, notes: &Notes) -> Option<Vec<Point>> {
    let Some(value) = fields.value("pattern") else { return Some(vec![Point::default()]) };
    let pattern = Fields::open(value, "pattern", &["step_mm", "count", "row_step_mm", "rows"], notes)?;
    pattern.missing("step_mm", "the step from one copy to the next, [x, y]");
    pattern.missing("count", "how many stand in a row");
    if pattern.has("rows") != pattern.has("row_step_mm") {
        let key = if pattern.has("rows") { "row_step_mm" } else { "rows" };
        pattern.missing(key, "`rows` and `row_step_mm` together");
        return None;
    }
    let whole = |key| {
        pattern.value(key)?;
        pattern.number_where(key, "a whole number of 1 or more", |n| n >= 1.0 && n.fract() == 0.0 && n <= 1e9).map(|n| n.value as usize)
    };
    let (count, step) = (whole("count"), pattern.tuple::<2>("step_mm", "[x, y]"));
    let (rows, row_step) = match pattern.has("rows") {
        true => (whole("rows"), pattern.tuple::<2>("row_step_mm", "[x, y]").map(|s| s.value)),
        false => (Some(1), Some([0.0, 0.0])),
    };
    let (count, rows, step, row_step) = (count?, rows?, step?, row_step?);
    notes.keep(within(count.saturating_mul(rows), MOST_COPIES, "copies in one pattern", &value.span))?;
    if (count > 1 && step.value == [0.0, 0.0]) || (rows > 1 && row_step == [0.0, 0.0]) {
        notes.fault("the pattern's copies lie on each other", &step.span, "a step that is not zero", "give the pitch in mm");
        return None;
    }
    let at = |s: [f64; 2], n: usize| Point::new(s[0] * n as f64, s[1] * n as f64);
    Some((0..rows).flat_map(|row| (0..count).map(move |column| at(row_step, row) + at(step.value, column))).collect())
}

/// `C1`, `C2`, ... from the first name; a name that ends without a number gets one.
fn numbered(first: &str, count: usize) -> Vec<String> {
    if count == 1 {
        return vec![first.to_string()];
    }
    let stem = first.trim_end_matches(|c: char| c.is_ascii_digit());
    let digits = &first[stem.len()..];
    let start: u64 = digits.parse().unwrap_or(1);
    let width = if digits.starts_with('0') { digits.len() } else { 0 };
    (0..count as u64).map(|i| format!("{stem}{:0width$}", start.saturating_add(i))).collect()
}

/// Puts the electrodes onto the metal; those with faults are left without spots.
pub fn attach(drawn: Vec<DrawnElectrode>, stack: &Stack, notes: &Notes) -> Vec<Electrode> {
    drawn
        .into_iter()
        .map(|d| {
            let mut electrode = d.electrode;
            let footprints = place(&d.places, &electrode.through, stack, &electrode.name, notes);
            electrode.spots = footprints.into_iter().map(|footprint| Spot { footprint, joint_ohm: d.joint_ohm }).collect();
            electrode
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::numbered;

    #[test]
    fn copies_count_on_from_the_first_name() {
        assert_eq!(numbered("C1", 3), ["C1", "C2", "C3"]);
        assert_eq!(numbered("C08", 3), ["C08", "C09", "C10"]);
        assert_eq!(numbered("cell ", 2), ["cell 1", "cell 2"]);
        assert_eq!(numbered("lone", 1), ["lone"]);
        assert_eq!(numbered("x99999999999999999999999", 2)[0], "x1");
    }
}
