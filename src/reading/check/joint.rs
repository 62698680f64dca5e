//! Contacts and joins between sheets.

use super::layer::Stack;
use super::measured::{GivenJoint, place_tips, read_joint};
use super::names::Names;
use super::place::{disc, place};
use super::shape::{Drawn, Form, drawn_places, place_key, places_by, rings_of};
use super::weld_list::read_welds;
use crate::diagnostic::Span;
use crate::geometry::Region;
use crate::geometry::overlap::common_area;
use crate::index::{JoinId, LayerId};
use crate::problem::{Contact, Interface, Join, Measured, MeasuredJoint};
use crate::reading::fields::{Fields, Notes, Placed, not_yet};
use crate::reading::files::Files;
use crate::reading::sheet::{Content, Value};

/// Least common area in mm² that counts as one.
const LEAST_OVERLAP: f64 = 1e-9;

/// Reads the contacts' blocks; those with faults are left out.
pub fn read_contacts(blocks: &[Value], stack: &Stack, files: &Files, notes: &Notes) -> Vec<Contact> {
    let mut names = Names::new("contact");
    blocks.iter().filter_map(|block| read_contact(block, stack, &mut names, files, notes)).collect()
}

fn read_contact(block: &Value, stack: &Stack, names: &mut Names, files: &Files, notes: &Notes) -> Option<Contact> {
    let keys = ["name", "between", "over", "points_mm", "outline", "disc_mm", "contact_mohm_mm2"];
    let fields = Fields::open(block, "contact", &keys, notes)?;
    let name = fields.text("name");
    if let Some(name) = &name {
        names.add(Some(name.clone()), fields.span, notes);
    }
    let between = read_between(&fields, stack, notes);
    let area = read_area(&fields, stack, files, notes);
    let interface = match fields.value("contact_mohm_mm2") {
        Some(Value { content: Content::Block(_), span }) => {
            not_yet("a band of contact values", span, notes);
            None
        }
        _ => {
            if !has_state(block) {
                fields.missing("contact_mohm_mm2", "the contact's resistance times area in milliohm mm2; 0 is bonded");
            }
            fields.joint("contact_mohm_mm2").map(|value| match value {
                0.0 => Interface::Bonded,
                // 1 mohm mm2 is 1e-3 ohm mm2.
                value => Interface::Conductance(1.0 / (value * 1e-3)),
            })
        }
    };
    let (between, area) = (between?, area?);
    let [a, b] = between;
    let default_name = format!("{} on {}", stack.name(a), stack.name(b));
    overlaps(between, area.as_ref(), stack, fields.place("between"), notes)?;
    let interface = interface?;
    Some(Contact { name: name.map_or(default_name, |n| n.value), between, area, interface })
}

fn has_state(block: &Value) -> bool {
    matches!(&block.content, Content::Block(entries) if entries.iter().any(|e| e.key == "state"))
}

/// `Some(None)`: wherever both are.
fn read_area(fields: &Fields, stack: &Stack, files: &Files, notes: &Notes) -> Option<Option<Region>> {
    let given: Vec<&str> = ["over", "points_mm", "outline", "disc_mm"].into_iter().filter(|k| fields.has(k)).collect();
    if let [_, second, ..] = given.as_slice() {
        let expected = "one of `over`, `points_mm`, `outline`, `disc_mm`";
        notes.fault("the contact's area is given twice", fields.place(second), expected, "keep one of them");
        return None;
    }
    match given.first() {
        None => Some(None),
        Some(&"over") => {
            let over = fields.text("over")?;
            if over.value != "overlap" {
                let message = format!("unknown area `{}`", over.value);
                notes.fault(message, &over.span, "\"overlap\"", "write \"overlap\", or give `points_mm`, `outline` or `disc_mm`");
                return None;
            }
            Some(None)
        }
        Some(&"disc_mm") => match drawn_places(fields, &["disc_mm"])?.into_iter().next()?.form {
            Form::Disc(centre, diameter) => Some(Some(disc(centre, diameter, stack))),
            _ => None,
        },
        Some(_) => {
            let rings = rings_of(fields, files)?;
            Some(Some(Region::from_rings(rings.iter().map(|r| &r.ring))))
        }
    }
}

fn read_between(fields: &Fields, stack: &Stack, notes: &Notes) -> Option<[LayerId; 2]> {
    fields.missing("between", "the names of two layers");
    let list = fields.list("between")?;
    let [first, second] = list else {
        let message = format!("`between` names {} layers", list.len());
        notes.fault(message, fields.place("between"), "[\"one layer\", \"another\"]", "name exactly two layers");
        return None;
    };
    let find = |value: &Value| match &value.content {
        Content::Text(name) => stack.names.find(&Placed { value: name.clone(), span: value.span.clone() }, notes).map(LayerId::new),
        other => {
            let message = format!("`between` must hold layers' names, not {}", other.noun());
            notes.fault(message, &value.span, "[\"one layer\", \"another\"]", "write the names in quotes");
            None
        }
    };
    let (a, b) = (find(first), find(second));
    let (a, b) = (a?, b?);
    if a == b {
        notes.fault("`between` names one layer twice", &second.span, "two different layers", "name the other layer");
        return None;
    }
    Some([a, b])
}

/// A fault when the sheets and the area have nothing in common.
fn overlaps(between: [LayerId; 2], area: Option<&Region>, stack: &Stack, span: &Span, notes: &Notes) -> Option<()> {
    let (a, b) = (stack.metal(between[0])?, stack.metal(between[1])?);
    let mut window = a.bounding_box().common(b.bounding_box());
    let drawn: Vec<_> = area.map(|r| r.edges().collect()).unwrap_or_default();
    let mut shapes = vec![a.edges(), b.edges()];
    if let Some(area) = area {
        window = window.common(area.bounding_box());
        shapes.push(&drawn);
    }
    if !window.has_area() || common_area(&shapes, window, LEAST_OVERLAP) <= LEAST_OVERLAP {
        let message = format!("`{}` and `{}` have no area in common there", stack.name(between[0]), stack.name(between[1]));
        notes.fault(message, span, "sheets that overlap within the contact's area", "check the outlines' positions and the area");
        return None;
    }
    Some(())
}

/// Reads the joins' blocks, and which of them are to be fitted to a reading; those with faults are left out.
pub fn read_joins(blocks: &[Value], stack: &Stack, files: &Files, notes: &Notes) -> (Vec<(Join, Span)>, Vec<Measured>) {
    let (mut joins, mut measured) = (Vec::new(), Vec::new());
    for block in blocks {
        let Some((join, given, span)) = read_join(block, stack, files, notes) else { continue };
        if given.tips.is_some() {
            measured.extend(place_tips(MeasuredJoint::Join(JoinId::new(joins.len())), &given, &join.between, stack, notes));
        }
        joins.push((join, span));
    }
    (joins, measured)
}

fn read_join(block: &Value, stack: &Stack, files: &Files, notes: &Notes) -> Option<(Join, GivenJoint, Span)> {
    let keys = ["between", "spots_mm", "diameter_mm", "seams_mm", "areas_mm", "spots_csv", "joint_mohm", "measured_mohm", "tips_mm"];
    let fields = Fields::open(block, "join", &keys, notes)?;
    let between = read_between(&fields, stack, notes);
    let places = match place_key(&fields, &["spots_mm", "seams_mm", "areas_mm", "spots_csv"]) {
        Some("spots_csv") => read_welds(&fields, &["cell", "current_a"], files).map(|welds| welds.into_iter().map(|w| w.drawn).collect()),
        Some(key) => places_by(&fields, key),
        None => None,
    };
    let who = between.map_or_else(|| "join".to_string(), |b| format!("join {} - {}", stack.name(b[0]), stack.name(b[1])));
    let joint = read_joint(&fields, &who, Some("a bond"), 2..=2, notes);
    let (between, places): (_, Vec<Drawn>) = (between?, places?);
    let limit = files.budget.borrow_mut().spend_spots(places.len(), fields.span);
    notes.keep(limit)?;
    let spots = place(&places, &between, stack, &who, notes);
    let given = joint?;
    Some((Join { between, spots, joint_ohm: given.ohm }, given, fields.span.clone()))
}
