//! Random jobs: plates of odd shapes in one to three sheets, with contacts, bonds, joins, spots and sources, by a seeded generator.

use fastrand::Rng;
use pinchbar::geometry::{Point, Region, Ring};
use pinchbar::index::{ElectrodeId, LayerId, SourceId};
use pinchbar::problem::*;
use std::f64::consts::{PI, TAU};

/// A number between two, even in its logarithm.
pub fn log_uniform(rng: &mut Rng, low: f64, high: f64) -> f64 {
    low * (high / low).powf(rng.f64())
}

fn between(rng: &mut Rng, low: f64, high: f64) -> f64 {
    low + (high - low) * rng.f64()
}

/// A sheet of 0.1 to 1 mohm a square.
pub fn sheet(name: &str, rings: Vec<Ring>, rng: &mut Rng) -> Layer {
    let resistivity = log_uniform(rng, 1.7e-5, 1e-4);
    let material =
        Material { name: "own figures".into(), resistivity: Resistivity::Linear { at_20: resistivity, alpha: 0.0 }, density_g_cm3: None };
    let region = Region::from_rings(&rings);
    Layer { name: name.into(), material, resistivity, thickness_mm: between(rng, 0.1, 0.3), rings, region }
}

/// A star-shaped outline of 5 to 12 corners that reaches at least 12 and at most 20 mm from the origin.
fn star(rng: &mut Rng) -> Ring {
    let corners = rng.usize(5..13);
    let first = rng.f64() * TAU;
    Ring::polygon((0..corners).map(|i| {
        let angle = first + TAU * i as f64 / corners as f64;
        let radius = between(rng, 12.0, 20.0);
        Point::new(radius * angle.cos(), radius * angle.sin())
    }))
}

/// A rectilinear outline: a square of 24 mm with up to four of its corners cut out as rectangles.
fn rectilinear(rng: &mut Rng) -> Ring {
    let mut points = Vec::new();
    for quarter in 0..4 {
        let (c, s) = [(1.0, 0.0), (0.0, 1.0), (-1.0, 0.0), (0.0, -1.0)][quarter];
        let turned = |x: f64, y: f64| Point::new(c * x - s * y, s * x + c * y);
        if rng.bool() {
            let (a, b) = (between(rng, 8.6, 11.0), between(rng, 8.6, 11.0));
            points.extend([turned(12.0, -a), turned(b, -a), turned(b, -12.0)].into_iter().rev());
        } else {
            points.push(turned(12.0, -12.0));
        }
    }
    Ring::polygon(points)
}

/// What a random plate is: the outer ring and its holes, which stay within 8.5 mm of the origin, beside the places for electrodes.
pub fn plate(name: &str, rng: &mut Rng) -> Layer {
    let mut rings = vec![if rng.bool() { star(rng) } else { rectilinear(rng) }];
    for quarter in 0..4 {
        let angle = TAU * (quarter as f64 + 0.5) / 4.0;
        let at = Point::new(6.0 * angle.cos(), 6.0 * angle.sin());
        match rng.u8(0..4) {
            0 => rings.push(Ring::circle(at, between(rng, 0.8, 3.0))),
            1 => {
                let (a, b) = (between(rng, 0.3, 1.4), between(rng, 0.3, 1.4));
                let corners = [(-a, -b), (a, -b), (a, b), (-a, b)];
                rings.push(Ring::polygon(corners.map(|(x, y)| at + Point::new(x, y))));
            }
            _ => {}
        }
    }
    sheet(name, rings, rng)
}

/// A round spot.
pub fn disc(x: f64, y: f64, diameter: f64) -> Footprint {
    let centre = Point::new(x, y);
    let region = Region::from_rings(&[Ring::circle(centre, diameter)]);
    Footprint::Area { region, area_mm2: PI * 0.25 * diameter * diameter, centre, diameter_mm: Some(diameter) }
}

/// A rectangle.
pub fn block(middle: Point, half_x: f64, half_y: f64) -> Footprint {
    let corners = [(-half_x, -half_y), (half_x, -half_y), (half_x, half_y), (-half_x, half_y)];
    let ring = Ring::polygon(corners.map(|(x, y)| middle + Point::new(x, y)));
    let region = Region::from_rings(&[ring]);
    Footprint::Area { region, area_mm2: 4.0 * half_x * half_y, centre: middle, diameter_mm: None }
}

/// An electrode of one spot on one sheet.
pub fn electrode(name: String, layer: LayerId, footprint: Footprint, joint_ohm: f64, drive: Drive) -> Electrode {
    Electrode { name, kind: ElectrodeKind::Terminal, group: None, through: vec![layer], spots: vec![Spot { footprint, joint_ohm }], drive }
}

/// A problem without electrodes.
pub fn bare(layers: Vec<Layer>, bracket: f64) -> Problem {
    Problem {
        title: "random".into(),
        temperature_c: 20.0,
        accuracy: Accuracy { bracket, max_vertices: 60_000, gauge_mm: None },
        layers,
        contacts: vec![],
        joins: vec![],
        electrodes: vec![],
        sources: vec![],
        measured: vec![],
        probes: vec![],
        crossings: vec![],
        limits: Limits::default(),
    }
}

/// Half of the time zero, else up to a few mohm.
fn joint(rng: &mut Rng) -> f64 {
    if rng.bool() { 0.0 } else { log_uniform(rng, 1e-6, 3e-3) }
}

/// The places where electrodes may stand: free of holes, inside every plate, apart from each other.
const PLACES: [(f64, f64); 5] = [(0.0, 0.0), (7.2, 0.0), (0.0, 7.2), (-7.2, 0.0), (0.0, -7.2)];

fn spot_at(place: usize, rng: &mut Rng) -> Footprint {
    let (x, y) = PLACES[place];
    match rng.u8(0..3) {
        0 => disc(x, y, between(rng, 0.6, 1.8)),
        1 => block(Point::new(x, y), between(rng, 0.2, 0.8), between(rng, 0.2, 0.8)),
        _ => {
            let (half, turn) = (between(rng, 0.3, 0.9), rng.f64() * TAU);
            let along = Point::new(half * turn.cos(), half * turn.sin());
            Footprint::Line { points: vec![Point::new(x, y) - along, Point::new(x, y) + along] }
        }
    }
}

/// How sheets hang together: a contact over an area or everywhere, a bond, or spots.
fn connect(problem: &mut Problem, lower: LayerId, upper: LayerId, rng: &mut Rng) {
    let between_layers = if rng.bool() { [lower, upper] } else { [upper, lower] };
    let kind = rng.u8(0..4);
    if kind < 3 {
        let area = rng.bool().then(|| {
            let middle = Point::new(between(rng, -3.0, 3.0), between(rng, -3.0, 3.0));
            let (a, b) = (between(rng, 1.0, 9.0), between(rng, 1.0, 9.0));
            let corners = [(-a, -b), (a, -b), (a, b), (-a, b)];
            Region::from_rings(&[Ring::polygon(corners.map(|(x, y)| middle + Point::new(x, y)))])
        });
        // From 1e-3 to 1e4 mohm mm2.
        let interface = if kind == 0 { Interface::Bonded } else { Interface::Conductance(1.0 / log_uniform(rng, 1e-6, 1e1)) };
        let name = format!("{} on {}", lower.0, upper.0);
        problem.contacts.push(Contact { name, between: between_layers, area, interface });
    }
    if kind == 3 || rng.u8(0..3) == 0 {
        let spots = (0..rng.usize(1..4)).map(|i| disc(2.4 * (i as f64 - 1.0), 1.6, 0.8)).collect();
        problem.joins.push(Join { between: between_layers, spots, joint_ohm: joint(rng) });
    }
}

/// A job of one to three plates with two to five electrodes whose currents are given.
pub fn job(rng: &mut Rng, bracket: f64) -> Problem {
    let count = rng.usize(1..4);
    let layers = (0..count).map(|i| plate(&format!("plate {i}"), rng)).collect();
    let mut problem = bare(layers, bracket);
    for upper in 1..count {
        connect(&mut problem, LayerId::new(rng.usize(0..upper)), LayerId::new(upper), rng);
    }
    let mut places: Vec<usize> = (0..PLACES.len()).collect();
    rng.shuffle(&mut places);
    let ends = rng.usize(2..PLACES.len() + 1);
    for (k, &place) in places.iter().take(ends).enumerate() {
        let drive = if k == 0 { Drive::Balance } else { Drive::Current(between(rng, -20.0, 20.0)) };
        let layer = LayerId::new(rng.usize(0..count));
        problem.electrodes.push(electrode(format!("E{k}"), layer, spot_at(place, rng), joint(rng), drive));
    }
    problem
}

/// A job with sources: cells against the common zero or between two electrodes, and a load.
pub fn job_with_sources(rng: &mut Rng, bracket: f64) -> Problem {
    let mut problem = job(rng, bracket);
    let ends = problem.electrodes.len();
    let mut source = |problem: &mut Problem, positive: usize, negative: Option<usize>| {
        let id = SourceId::new(problem.sources.len());
        problem.electrodes[positive].drive = Drive::Source(id);
        if let Some(negative) = negative {
            problem.electrodes[negative].drive = Drive::Return(id);
        }
        let (emf_v, resistance_ohm) = (between(rng, 3.5, 3.7), log_uniform(rng, 1e-3, 3e-2));
        let [positive, negative] = [Some(positive), negative].map(|e| e.map(ElectrodeId::new));
        if let Some(positive) = positive {
            problem.sources.push(Source { emf_v, resistance_ohm, positive, negative });
        }
    };
    source(&mut problem, 0, None);
    if ends >= 4 {
        source(&mut problem, 1, Some(2));
    } else {
        source(&mut problem, 1, None);
    }
    problem
}

/// A job with everything a sheet can say: meters, held potentials, nuggets through several sheets, spots over an edge, terminals on a part of an
/// edge, sheets cut to one outline.
pub fn job_of_all_kinds(rng: &mut Rng, bracket: f64) -> Problem {
    let mut problem = if rng.u8(0..3) == 0 { job_with_sources(rng, bracket) } else { job(rng, bracket) };
    let count = problem.layers.len();
    if rng.bool() {
        let first = problem.layers[0].clone();
        for layer in &mut problem.layers {
            (layer.rings, layer.region) = (first.rings.clone(), first.region.clone());
        }
    }
    if problem.sources.is_empty() {
        for k in 0..rng.usize(0..3) {
            problem.electrodes[k].drive = Drive::Held(between(rng, -0.01, 0.01));
        }
    }
    let any = |rng: &mut Rng| LayerId::new(rng.usize(0..count));
    let current = |rng: &mut Rng| Drive::Current(between(rng, -20.0, 20.0));
    if rng.bool() {
        let mut through: Vec<LayerId> = (0..count).map(LayerId::new).collect();
        if rng.bool() {
            through.reverse();
        }
        let joint_ohm = joint(rng);
        let line = |x: f64| Footprint::Line { points: vec![Point::new(x - 0.4, -3.4), Point::new(x + 0.4, -3.2)] };
        let as_lines = rng.u8(0..3) == 0;
        let footprint = |x: f64| if as_lines { line(x) } else { disc(x, -3.4, 0.9) };
        let spots = (0..rng.usize(1..3)).map(|i| Spot { footprint: footprint(1.1 * i as f64), joint_ohm }).collect();
        let drive = current(rng);
        problem.electrodes.push(Electrode { name: "nugget".into(), kind: ElectrodeKind::Cell, group: None, through, spots, drive });
    }
    if rng.bool() {
        let layer = any(rng);
        let corners = &problem.layers[layer.index()].rings[0].vertices;
        let (a, b) = (corners[0].point, corners[1].point);
        let part = if rng.bool() { 1.0 } else { between(rng, 0.3, 0.7) };
        let line = Footprint::Line { points: vec![a, a + (b - a) * part] };
        problem.electrodes.push(electrode("edge".into(), layer, line, joint(rng), current(rng)));
    }
    if rng.bool() {
        let layer = any(rng);
        let corners = &problem.layers[layer.index()].rings[0].vertices;
        let half = corners.len() / 2;
        let at = corners[half].point.midpoint(corners[half + 1].point);
        problem.electrodes.push(electrode("over the edge".into(), layer, disc(at.x, at.y, 0.8), joint(rng), current(rng)));
    }
    for (k, places) in [[(3.4, 0.0), (-3.4, 0.0)], [(0.0, 4.4), (3.4, 0.2)]].into_iter().enumerate().take(rng.usize(0..3)) {
        let tips = places.map(|(x, y)| (any(rng), Point::new(x, y)));
        problem.probes.push(Probe { name: format!("M{k}"), tips, tip_mm: 0.3 });
    }
    problem
}
