//! The layers' blocks: outline, thickness and metal; and the stack they make once corners are rounded.

use super::names::Names;
use super::plausible;
use super::shape::rings_of;
use crate::geometry::corner::{Sharp, round_inside_corners};
use crate::geometry::{IndexedRegion, Point, Region, Ring};
use crate::index::LayerId;
use crate::problem::material::OWN_FIGURES;
use crate::problem::material::metal;
use crate::problem::{Layer, Material, Resistivity};
use crate::reading::drawn::{DrawnRing, faults_of_rings};
use crate::reading::fields::{Fields, Notes, Placed};
use crate::reading::files::Files;
use crate::reading::sheet::Value;
use std::path::Path;

const KEYS: [&str; 13] = [
    "name",
    "metal",
    "resistivity_uohm_cm",
    "alpha_per_k",
    "conductivity_w_mk",
    "density_g_cm3",
    "heat_capacity_j_kgk",
    "thickness_mm",
    "outline",
    "points_mm",
    "holes_mm",
    "corner_radius_mm",
    "melting_c",
];

/// A layer's block before its corners are rounded.
pub struct DrawnLayer {
    rings: Option<Vec<DrawnRing>>,
    material: Option<(Material, f64)>,
    thickness_mm: Option<f64>,
    corner_radius: Option<Placed<f64>>,
    /// The metal before rounding, where corners will be rounded.
    pub sharp: Option<IndexedRegion>,
}

/// The layers as far as they could be read, with an index over each.
pub struct Stack {
    /// Names and their places.
    pub names: Names,
    /// Layers without fault.
    pub layers: Vec<Option<Layer>>,
    /// Their metal.
    pub metal: Vec<Option<IndexedRegion>>,
}

impl Stack {
    /// The metal of a layer, where it could be read.
    pub fn metal(&self, layer: LayerId) -> Option<&IndexedRegion> {
        self.metal.get(layer.index())?.as_ref()
    }
    /// A layer's name.
    pub fn name(&self, layer: LayerId) -> &str {
        self.names.name(layer.index())
    }
}

/// Reads all layers' blocks. Their names come first, so that others can refer to a layer that has faults.
pub fn read_layers(blocks: &[Value], celsius: f64, files: &Files, notes: &Notes) -> (Names, Vec<DrawnLayer>) {
    let mut names = Names::new("layer");
    let mut layers = Vec::new();
    for block in blocks {
        let Some(fields) = Fields::open(block, "layer", &KEYS, notes) else { continue };
        let name = fields.required_text("name");
        let who = name.as_ref().map_or("layer", |n| n.value.as_str()).to_string();
        names.add(name, fields.span, notes);
        fields.missing("thickness_mm", "the sheet's thickness in mm");
        let rings = rings_of(&fields, files);
        let corner_radius = fields.number_where("corner_radius_mm", "larger than zero", |r| r > 0.0 && r <= 1e6);
        let region = |rings: &Vec<DrawnRing>| Region::from_rings(rings.iter().map(|r| &r.ring));
        let thickness_mm = fields.number_where("thickness_mm", "from 1e-6 to 100", |t| (1e-6..=100.0).contains(&t)).map(|t| t.value);
        plausible::remark_number(&who, "thickness_mm", thickness_mm, notes);
        if let Some(rings) = &rings {
            plausible::remark_extents(&who, region(rings).bounding_box(), notes);
        }
        layers.push(DrawnLayer {
            sharp: rings.as_ref().filter(|_| corner_radius.is_some()).map(|rings| IndexedRegion::new(&region(rings))),
            rings,
            material: material(&fields, &who, celsius),
            thickness_mm,
            corner_radius,
        });
    }
    (names, layers)
}

/// Metal and its resistivity in ohm mm at the job's temperature.
fn material(fields: &Fields, who: &str, celsius: f64) -> Option<(Material, f64)> {
    let alpha = fields.number_where("alpha_per_k", "between -0.1 and 0.1", |a| a.abs() <= 0.1);
    for key in ["conductivity_w_mk", "heat_capacity_j_kgk"] {
        fields.positive(key);
    }
    fields.number("melting_c");
    let density = fields.positive("density_g_cm3");
    let own = fields.number_where("resistivity_uohm_cm", "from 1e-9 to 1e12", |r| (1e-9..=1e12).contains(&r)).map(|r| r.value);
    plausible::remark_number(who, "resistivity_uohm_cm", own, fields.notes);
    let named = fields.text("metal");
    let material = match (named, fields.has("resistivity_uohm_cm")) {
        (Some(name), true) => {
            let remedy = "keep `metal`, or give figures of your own without it";
            fields.notes.fault("the metal is given twice", &name.span, "`metal` or `resistivity_uohm_cm`", remedy);
            return None;
        }
        (Some(name), false) => {
            let Some(row) = metal(&name.value) else {
                let known = crate::problem::material::METALS.iter().map(|m| m.name);
                let near = crate::reading::hint::family(&name.value, known);
                let remedy = match near.split_last() {
                    None => "`pinchbar metals` lists the names".to_string(),
                    Some((one, [])) => format!("did you mean `{one}`?"),
                    Some((last, others)) => format!("did you mean `{}` or `{last}`?", others.join("`, `")),
                };
                let expected = "a row of the metals table, or `resistivity_uohm_cm`";
                fields.notes.fault(format!("unknown metal `{}`", name.value), &name.span, expected, remedy);
                return None;
            };
            if let Some(alpha) = alpha {
                let remedy = "remove it, or give `resistivity_uohm_cm` with it in place of `metal`";
                fields.notes.fault(
                    "`alpha_per_k` belongs to a resistivity of your own",
                    &alpha.span,
                    "no `alpha_per_k` beside `metal`",
                    remedy,
                );
                return None;
            }
            let mut material = row.material();
            material.density_g_cm3 = density.or(material.density_g_cm3);
            material
        }
        (None, true) => {
            // 1 uohm cm is 1e-5 ohm mm.
            let resistivity = Resistivity::Linear { at_20: own? * 1e-5, alpha: alpha.map_or(0.0, |a| a.value) };
            Material { name: OWN_FIGURES.into(), resistivity, density_g_cm3: density }
        }
        (None, false) => {
            fields.missing("metal", "a row of the metals table, or `resistivity_uohm_cm`");
            return None;
        }
    };
    let resistivity = material.resistivity.at(celsius);
    if !(resistivity > 0.0 && resistivity.is_finite()) {
        let place = if fields.value("alpha_per_k").is_some() { fields.place("alpha_per_k") } else { fields.span };
        let message = format!("the resistivity at {celsius} C is not above zero");
        fields.notes.fault(message, place, "a resistivity above zero", "check `temperature_c` and `alpha_per_k`");
        return None;
    }
    Some((material, resistivity))
}

/// Rounds corners where asked and makes the stack. `lines` holds for each layer the polylines of its terminals.
pub fn make_stack(names: Names, drawn: Vec<DrawnLayer>, lines: &[Vec<Vec<Point>>], notes: &Notes) -> Stack {
    let mut layers = Vec::with_capacity(drawn.len());
    let mut metal = Vec::with_capacity(drawn.len());
    for (number, layer) in drawn.into_iter().enumerate() {
        let DrawnLayer { rings, material, thickness_mm, corner_radius, sharp } = layer;
        let rings = rings.and_then(|rings| match (corner_radius, sharp) {
            (Some(radius), Some(sharp)) => {
                rounded(rings, &sharp, &radius, lines.get(number).map_or(&[], Vec::as_slice), names.name(number), notes)
            }
            _ => Some(rings.into_iter().map(|r| r.ring).collect()),
        });
        let region = rings.as_ref().map(|rings: &Vec<Ring>| Region::from_rings(rings));
        metal.push(region.as_ref().map(IndexedRegion::new));
        layers.push((|| {
            let (material, resistivity) = material?;
            Some(Layer {
                name: names.name(number).to_string(),
                material,
                resistivity,
                thickness_mm: thickness_mm?,
                rings: rings?,
                region: region?,
            })
        })());
    }
    Stack { names, layers, metal }
}

fn rounded(
    drawn: Vec<DrawnRing>,
    sharp: &IndexedRegion,
    radius: &Placed<f64>,
    lines: &[Vec<Point>],
    name: &str,
    notes: &Notes,
) -> Option<Vec<Ring>> {
    let mut rings: Vec<Ring> = drawn.into_iter().map(|r| r.ring).collect();
    let rounding = round_inside_corners(&mut rings, sharp, radius.value, lines);
    for (why, reason) in [(Sharp::NoRoom, "the radius does not fit"), (Sharp::Terminal, "a terminal runs through")] {
        let places: Vec<Point> = rounding.skipped.iter().filter(|s| s.1 == why).map(|s| s.0).collect();
        if !places.is_empty() {
            let mut list: Vec<String> = places.iter().take(5).map(|p| format!("({:.3}, {:.3})", p.x, p.y)).collect();
            if places.len() > 5 {
                list.push(format!("and {} more", places.len() - 5));
            }
            let corners = if places.len() == 1 { "1 inside corner stays" } else { &format!("{} inside corners stay", places.len()) };
            notes.remark(format!("{name}: {corners} sharp because {reason}: {}", list.join(", ")));
        }
    }
    if rounding.rounded == 0 {
        return Some(rings);
    }
    let again: Vec<DrawnRing> =
        rings.iter().map(|ring| DrawnRing { ring: ring.clone(), name: None, places: Vec::new(), place: radius.span.clone() }).collect();
    let faults = faults_of_rings(&again);
    if let Some(fault) = faults.first() {
        let message = format!("rounded corners spoil the outline: {}", fault.message);
        notes.fault(message, &radius.span, "a radius that leaves the rings apart", "choose a smaller radius");
        return None;
    }
    Some(rings)
}

/// The folder-free name of a job file, for its default title.
pub fn stem(path: &Path) -> String {
    path.file_stem().map_or_else(|| "job".into(), |s| s.to_string_lossy().into_owned())
}
