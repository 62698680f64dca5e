//! Probes, crossings and limits.

use super::layer::Stack;
use super::names::Names;
use super::place::{onto_outline, remark_moved};
use crate::diagnostic::Span;
use crate::geometry::predicate::segments_meet;
use crate::geometry::{BoundingBox, Point};
use crate::index::LayerId;
use crate::problem::{Crossing, Limits, Probe};
use crate::reading::fields::{Fields, Notes, Placed, finite};
use crate::reading::sheet::{Content, Value};

/// Diameter of a meter's tip where none is given, mm.
const TIP: f64 = 0.3;

/// Reads the probes' blocks; those with faults are left out.
pub fn read_probes(blocks: &[Value], stack: &Stack, notes: &Notes) -> Vec<(Probe, Span)> {
    let mut names = Names::new("probe");
    blocks.iter().filter_map(|block| read_probe(block, stack, &mut names, notes)).collect()
}

fn read_probe(block: &Value, stack: &Stack, names: &mut Names, notes: &Notes) -> Option<(Probe, Span)> {
    let fields = Fields::open(block, "probe", &["name", "layer", "layer_b", "tips_mm", "tip_mm"], notes)?;
    let name = fields.required_text("name");
    names.add(name.clone(), fields.span, notes);
    fields.missing("layer", "the name of a layer");
    let find = |key| fields.text(key).and_then(|l: Placed<String>| stack.names.find(&l, notes)).map(LayerId::new);
    let first = find("layer");
    let second = if fields.has("layer_b") { find("layer_b") } else { first };
    fields.missing("tips_mm", "[[x, y], [x, y]]: the two tips");
    let tips = fields.points("tips_mm");
    let tip_mm = if fields.has("tip_mm") {
        fields.number_where("tip_mm", "larger than zero", |d| d > 0.0 && d <= 1e6).map(|d| d.value)
    } else {
        Some(TIP)
    };
    let tips = tips?;
    let [a, b] = tips.as_slice() else {
        let message = format!("a probe has two tips, not {}", tips.len());
        notes.fault(message, fields.place("tips_mm"), "[[x, y], [x, y]]", "give both tips");
        return None;
    };
    let mut good = true;
    for (tip, layer) in [(a, first), (b, second)] {
        let Some(metal) = layer.and_then(|l| stack.metal(l)) else { continue };
        if !metal.contains(tip.value) && metal.rim_distance(tip.value) > 1e-6 {
            let on = layer.map_or("", |l| stack.name(l));
            let message = format!("the tip at ({}, {}) is off the metal of `{on}`", tip.value.x, tip.value.y);
            notes.fault(message, &tip.span, "a tip on the metal", "move the tip, or name the layer it stands on");
            good = false;
        }
    }
    let Placed { value: name, span } = name?;
    let probe = Probe { name, tips: [(first?, a.value), (second?, b.value)], tip_mm: tip_mm? };
    good.then_some((probe, span))
}

/// Reads the crossings' blocks; those with faults are left out.
pub fn read_crossings(blocks: &[Value], stack: &Stack, notes: &Notes) -> Vec<(Crossing, Span)> {
    let mut names = Names::new("crossing");
    blocks.iter().filter_map(|block| read_crossing(block, stack, &mut names, notes)).collect()
}

fn read_crossing(block: &Value, stack: &Stack, names: &mut Names, notes: &Notes) -> Option<(Crossing, Span)> {
    let fields = Fields::open(block, "crossing", &["name", "from_mm", "to_mm"], notes)?;
    let name = fields.required_text("name");
    names.add(name.clone(), fields.span, notes);
    fields.missing("from_mm", "[x, y]");
    fields.missing("to_mm", "[x, y]");
    let point = |key| fields.tuple::<2>(key, "[x, y]").map(|p| Point::new(p.value[0], p.value[1]));
    let (from, to) = (point("from_mm"), point("to_mm"));
    // An end near several sheets' outlines moves onto the nearest.
    let mut moved = 0;
    let mut settled = |p: Point| {
        let near = stack.metal.iter().flatten().min_by(|a, b| a.rim_distance(p).total_cmp(&b.rim_distance(p)));
        near.and_then(|metal| onto_outline(p, metal, &mut moved)).map_or(p, |rim| rim.point)
    };
    let (from, to) = (settled(from?), settled(to?));
    if from == to {
        notes.fault("the crossing has no length", fields.place("to_mm"), "two different points", "correct `from_mm` or `to_mm`");
        return None;
    }
    let touches = |metal: &crate::geometry::IndexedRegion| {
        let near = || metal.index().near(BoundingBox::around([from, to])).map(|i| metal.edges()[i]);
        metal.contains(from) || metal.contains(to) || near().any(|(c, d)| segments_meet(from, to, c, d))
    };
    if stack.metal.iter().all(Option::is_some) && !stack.metal.iter().flatten().any(touches) {
        notes.fault("the crossing touches no metal", fields.place("from_mm"), "a line across a sheet", "check its two points");
        return None;
    }
    let Placed { value: name, span } = name?;
    remark_moved(&name, moved, notes);
    Some((Crossing { name, from, to }, span))
}

/// Reads `[limits]`.
pub fn read_limits(value: Option<&Value>, stack: &Stack, notes: &Notes) -> Limits {
    let keys = ["drop_mv", "density_a_mm2", "sharing", "joint_mv", "temperature_c"];
    let Some(fields) = value.and_then(|v| Fields::open(v, "limits", &keys, notes)) else { return Limits::default() };
    let mut density_a_mm2 = Vec::new();
    if let Some(value) = fields.value("density_a_mm2") {
        density_a_mm2 = vec![None; stack.layers.len()];
        read_densities(value, stack, &mut density_a_mm2, notes);
    }
    Limits {
        drop_v: fields.positive("drop_mv").map(|v| v * 1e-3),
        density_a_mm2,
        sharing: fields.number_where("sharing", "larger than 1", |s| s > 1.0 && s <= 1e6).map(|s| s.value),
        joint_v: fields.positive("joint_mv").map(|v| v * 1e-3),
        temperature_c: fields.number_where("temperature_c", "between -273 and 3000", celsius).map(|t| t.value),
    }
}

fn read_densities(value: &Value, stack: &Stack, limits: &mut [Option<f64>], notes: &Notes) {
    let Content::Block(entries) = &value.content else {
        let message = format!("`density_a_mm2` must give a number per layer, not {}", value.content.noun());
        notes.fault(message, &value.span, "{ layer = 8, other = 12 }", "name the layers");
        return;
    };
    for entry in entries {
        let layer = stack.names.find(&Placed { value: entry.key.clone(), span: entry.key_span.clone() }, notes);
        match finite(&entry.value, &format!("the limit of `{}`", entry.key), notes) {
            Some(limit) if limit > 0.0 => {
                if let Some(slot) = layer.and_then(|l| limits.get_mut(l)) {
                    *slot = Some(limit);
                }
            }
            Some(limit) => {
                let message = format!("the limit of `{}` must be larger than zero, not {limit}", entry.key);
                notes.fault(message, &entry.value.span, "a density in A/mm2", "correct the number");
            }
            None => {}
        }
    }
}

/// Temperatures in °C that a sheet may name.
pub fn celsius(t: f64) -> bool {
    (-273.0..=3000.0).contains(&t)
}
