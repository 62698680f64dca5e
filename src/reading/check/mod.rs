//! From the sheet as written to the checked statement: every fault is collected, none stops the rest.

mod apart;
mod drive;
mod electrode;
mod joint;
mod layer;
mod measured;
mod meter;
mod names;
mod place;
mod plausible;
mod shape;
mod weld_list;

use super::fields::{Fields, Notes};
use super::files::Files;
use super::origins::Origins;
use super::sheet::Value;
use crate::geometry::Point;
use crate::problem::{Accuracy, MeasuredJoint, Problem};
use std::path::Path;

const KEYS: [&str; 11] =
    ["title", "temperature_c", "accuracy", "layer", "contact", "join", "terminal", "cell", "probe", "crossing", "limits"];

/// Temperature of the metal where none is given, °C.
const ROOM: f64 = 20.0;

/// Checks the whole sheet; `None` when there are faults, which are in `notes`.
pub fn check(sheet: &Value, job: &Path, files: &Files, notes: &Notes) -> Option<(Problem, Origins)> {
    let fields = Fields::open(sheet, "the sheet", &KEYS, notes)?;
    let title = fields.text("title");
    let title_span = title.as_ref().map_or_else(|| sheet.span.clone(), |t| t.span.clone());
    let celsius = fields.number_where("temperature_c", "between -273 and 3000", meter::celsius);
    let temperature_c = celsius.map_or(ROOM, |t| t.value);
    plausible::remark_number("the job", "temperature_c", Some(temperature_c), notes);
    let accuracy = read_accuracy(fields.value("accuracy"), notes);

    if !fields.has("layer") {
        notes.fault("the job has no layer", &title_span, "at least one `[[layer]]`", "add a `[[layer]]` block with its outline");
    }
    let (names, layers) = layer::read_layers(fields.blocks("layer"), temperature_c, files, notes);
    let drawn = electrode::read_electrodes(fields.blocks("terminal"), fields.blocks("cell"), &names, files, notes);
    let lines = terminal_lines(&layers, &drawn);
    let stack = layer::make_stack(names, layers, &lines, notes);

    let contacts = joint::read_contacts(fields.blocks("contact"), &stack, files, notes);
    let (joins, measured_joins) = joint::read_joins(fields.blocks("join"), &stack, files, notes);
    drive::check_drives(&drawn, &contacts, &joins, &stack, &title_span, notes);
    let electrode::DrawnElectrodes { list, sources, measured: alike, .. } = drawn;
    let electrode_places: Vec<_> = list.iter().map(|e| e.span.clone()).collect();
    let mut measured: Vec<_> = alike
        .into_iter()
        .filter_map(|(ids, given, through)| measured::place_tips(MeasuredJoint::Electrodes(ids), &given, &through, &stack, notes))
        .collect();
    let electrodes = electrode::attach(list, &stack, notes);
    measured.extend(measured_joins);
    apart::check_apart(&electrodes, &electrode_places, &stack, notes);
    let probes = meter::read_probes(fields.blocks("probe"), &stack, notes);
    let crossings = meter::read_crossings(fields.blocks("crossing"), &stack, notes);
    let limits = meter::read_limits(fields.value("limits"), &stack, notes);

    if !notes.faults.borrow().is_empty() {
        return None;
    }
    let (joins, join_places) = joins.into_iter().unzip();
    let (probes, probe_places) = probes.into_iter().unzip();
    let (crossings, crossing_places) = crossings.into_iter().unzip();
    let origins = Origins {
        title: title_span,
        layers: stack.names.places(),
        joins: join_places,
        electrodes: electrode_places,
        probes: probe_places,
        crossings: crossing_places,
    };
    let problem = Problem {
        title: title.map_or_else(|| layer::stem(job), |t| t.value),
        temperature_c,
        accuracy,
        layers: stack.layers.into_iter().collect::<Option<_>>()?,
        contacts,
        joins,
        electrodes,
        sources,
        measured,
        probes,
        crossings,
        limits,
    };
    Some((problem, origins))
}

fn read_accuracy(value: Option<&Value>, notes: &Notes) -> Accuracy {
    let mut accuracy = Accuracy { bracket: 0.001, max_vertices: 400_000, gauge_mm: None };
    let keys = ["bracket_percent", "max_vertices", "gauge_mm"];
    let Some(fields) = value.and_then(|v| Fields::open(v, "accuracy", &keys, notes)) else { return accuracy };
    if let Some(percent) = fields.number_where("bracket_percent", "larger than zero and at most 100", |p| p > 0.0 && p <= 100.0) {
        accuracy.bracket = percent.value / 100.0;
    }
    let whole = |n: f64| n >= 100.0 && n.fract() == 0.0 && n <= 1e8;
    if let Some(most) = fields.number_where("max_vertices", "a whole number from 100 to 100 000 000", whole) {
        accuracy.max_vertices = most.value as usize;
    }
    accuracy.gauge_mm = fields.number_where("gauge_mm", "larger than zero", |g| g > 0.0 && g <= 1e6).map(|g| g.value);
    accuracy
}

/// For each layer the polylines of its terminals, where corners will be rounded.
fn terminal_lines(layers: &[layer::DrawnLayer], drawn: &electrode::DrawnElectrodes) -> Vec<Vec<Vec<Point>>> {
    let of_layer = |(number, layer): (usize, &layer::DrawnLayer)| {
        let Some(metal) = &layer.sharp else { return Vec::new() };
        let here = drawn.list.iter().filter(|e| e.electrode.through.iter().any(|l| l.index() == number));
        here.flat_map(|e| place::lines_before_rounding(&e.places, metal)).collect()
    };
    layers.iter().enumerate().map(of_layer).collect()
}
