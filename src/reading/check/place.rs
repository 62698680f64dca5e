//! Drawn places onto the metal: spots that hang over, lines that follow the outline, edges walked along a ring.

use super::layer::Stack;
use super::shape::{Drawn, Form};
use crate::geometry::predicate::{meeting_point, nearest_on_segment, segments_meet};
use crate::geometry::ring;
use crate::geometry::{BoundingBox, IndexedRegion, Point, Region, RimPoint, Ring};
use crate::index::LayerId;
use crate::problem::Footprint;
use crate::reading::fields::Notes;

/// A point this near to the outline, in mm, moves onto it.
const ONTO_OUTLINE: f64 = 0.02;

/// A corner of the outline this near to a line, in mm, becomes a point of the line.
const ALONG_OUTLINE: f64 = 0.005;

/// Below this distance, in mm, a point is on the outline already.
const ON: f64 = 1e-6;

/// Places the drawn spots of one block; those with faults are left out. `who` names the block in messages.
pub fn place(drawn: &[Drawn], layers: &[LayerId], stack: &Stack, who: &str, notes: &Notes) -> Vec<Footprint> {
    let mut moved = 0;
    let mut partly: Vec<f64> = Vec::new();
    let mut footprints = Vec::with_capacity(drawn.len());
    for spot in drawn {
        let footprint = match &spot.form {
            Form::Disc(centre, diameter) => {
                let area_mm2 = 0.25 * std::f64::consts::PI * diameter * diameter;
                let region = disc(*centre, *diameter, stack);
                let spread = Footprint::Area { region, area_mm2, centre: *centre, diameter_mm: Some(*diameter) };
                area(spot, spread, layers, stack, &mut partly, notes)
            }
            Form::Seam(a, b, width) => {
                let ring = Ring::seam(*a, *b, *width);
                let (region, area_mm2) = (Region::from_rings([&ring]), ring.signed_area());
                let spread = Footprint::Area { region, area_mm2, centre: a.midpoint(*b), diameter_mm: Some(*width) };
                area(spot, spread, layers, stack, &mut partly, notes)
            }
            Form::Area(ring) => {
                let (region, area_mm2) = (Region::from_rings([ring]), ring.signed_area().abs());
                let spread = Footprint::Area { centre: centroid(&region), region, area_mm2, diameter_mm: None };
                area(spot, spread, layers, stack, &mut partly, notes)
            }
            Form::Line(points) => on_all(layers, stack, |metal, name| line(spot, points, metal, name, &mut moved, notes)),
            Form::Edge(points) => on_all(layers, stack, |metal, name| edge(spot, points, metal, name, &mut moved, notes)),
        };
        footprints.extend(footprint);
    }
    remark_moved(who, moved, notes);
    remark_doubled(who, drawn, notes);
    if let Some(least) = partly.iter().copied().reduce(f64::min) {
        let spots = if partly.len() == 1 { "1 spot lies" } else { &format!("{} spots lie", partly.len()) };
        let text = format!(
            "{who}: {spots} partly off the metal ({:.1} % on it at the least); conductance per area is that of the full spot",
            100.0 * least
        );
        notes.remark(text);
    }
    footprints
}

/// Tells of spots that stand on each other's centre: a list copied twice looks like that.
fn remark_doubled(who: &str, drawn: &[Drawn], notes: &Notes) {
    let mut centres: Vec<Point> =
        drawn.iter().filter_map(|d| if let Form::Disc(centre, _) = d.form { Some(centre) } else { None }).collect();
    centres.sort_unstable_by(|a, b| a.x.total_cmp(&b.x).then(a.y.total_cmp(&b.y)));
    if let Some(pair) = centres.windows(2).find(|pair| pair[0] == pair[1]) {
        notes.remark(format!("{who}: two spots stand at ({}, {}): they count as two side by side", pair[0].x, pair[0].y));
    }
}

/// Tells how many points were moved onto the outline, if any.
pub fn remark_moved(who: &str, moved: usize, notes: &Notes) {
    if moved > 0 {
        let points = if moved == 1 { "point was" } else { "points were" };
        notes.remark(format!("{who}: {moved} {points} moved onto the outline (by at most {ONTO_OUTLINE} mm)"));
    }
}

/// A line or edge must lie on the metal of every sheet that it passes; its points are those on the last one, whose outline they follow.
fn on_all(layers: &[LayerId], stack: &Stack, mut put: impl FnMut(&IndexedRegion, &str) -> Option<Vec<Point>>) -> Option<Footprint> {
    let mut points = None;
    for &layer in layers {
        points = Some(put(stack.metal(layer)?, stack.name(layer))?);
    }
    points.map(|points| Footprint::Line { points })
}

/// The polygon of a disc: a plain one where it lies clear of every outline, else the one that a drawn circle gets, which an outline's arc may share.
pub fn disc(centre: Point, diameter: f64, stack: &Stack) -> Region {
    let clear = |metal: &IndexedRegion| metal.rim_distance(centre) > 0.5 * diameter + ONTO_OUTLINE;
    if stack.metal.iter().flatten().all(clear) {
        Region { loops: vec![ring::spot(centre, diameter)] }
    } else {
        Region::from_rings([&Ring::circle(centre, diameter)])
    }
}

fn area(spot: &Drawn, spread: Footprint, layers: &[LayerId], stack: &Stack, partly: &mut Vec<f64>, notes: &Notes) -> Option<Footprint> {
    let Footprint::Area { region, centre, diameter_mm, .. } = &spread else { return Some(spread) };
    let mut least: f64 = 1.0;
    for &layer in layers {
        let (metal, name) = (stack.metal(layer)?, stack.name(layer));
        if diameter_mm.is_some() && !metal.contains(*centre) && metal.rim_distance(*centre) > ON {
            let message = format!("the spot's centre ({}, {}) is off the metal of `{name}`", centre.x, centre.y);
            notes.fault(message, &spot.span, "a centre on the metal", "move the spot, or name the layer it stands on");
            return None;
        }
        let part = metal.part_inside(region);
        if part < 0.5 - 1e-6 {
            let message = format!("only {:.1} % of the spot at ({}, {}) is on the metal of `{name}`", 100.0 * part, centre.x, centre.y);
            notes.fault(message, &spot.span, "at least half of it on the metal", "move the spot, or make it smaller");
            return None;
        }
        least = least.min(part);
    }
    if least < 1.0 - 1e-6 {
        partly.push(least);
    }
    Some(spread)
}

fn centroid(region: &Region) -> Point {
    let Some(origin) = region.loops.first().and_then(|l| l.first()).copied() else { return Point::default() };
    let (mut moment, mut doubled) = (Point::default(), 0.0);
    for (a, b) in region.edges() {
        let (a, b) = (a - origin, b - origin);
        let part = a.cross(b);
        moment = moment + (a + b) * part;
        doubled += part;
    }
    origin + moment * (1.0 / (3.0 * doubled))
}

/// A point moved onto the outline where it is near: onto a corner, or else onto the edge.
pub fn onto_outline(p: Point, metal: &IndexedRegion, moved: &mut usize) -> Option<RimPoint> {
    let rim = metal.nearest_rim(p).filter(|r| r.point.distance(p) <= ONTO_OUTLINE)?;
    let reach = Point::new(ONTO_OUTLINE, ONTO_OUTLINE);
    let corners =
        metal.index().near(BoundingBox { min: p - reach, max: p + reach }).map(|i| RimPoint { edge: i, point: metal.edges()[i].0 });
    let corner = corners.min_by(|a, b| a.point.distance(p).total_cmp(&b.point.distance(p)).then(a.edge.cmp(&b.edge)));
    // A point that is on an edge already stays there, unless it stands on a corner but for rounding.
    let on_edge = rim.point.distance(p) <= 1e-9;
    let near = if on_edge { 1e-9 } else { ONTO_OUTLINE };
    let foot = if on_edge { RimPoint { edge: rim.edge, point: p } } else { rim };
    let target = corner.filter(|c| c.point.distance(p) <= near).unwrap_or(foot);
    if target.point.distance(p) > 1e-9 {
        *moved += 1;
    }
    Some(target)
}

fn line(spot: &Drawn, drawn: &[Point], metal: &IndexedRegion, name: &str, moved: &mut usize, notes: &Notes) -> Option<Vec<Point>> {
    let mut points: Vec<Point> = drawn.iter().map(|&p| onto_outline(p, metal, moved).map_or(p, |rim| rim.point)).collect();
    points.dedup();
    if points.len() < 2 {
        notes.fault("the line has no length", &spot.span, "two different points", "correct the line's points");
        return None;
    }
    let mut full = vec![points[0]];
    for pair in points.windows(2) {
        let (a, b) = (pair[0], pair[1]);
        full.extend(corners_along(a, b, metal));
        full.push(b);
    }
    full.dedup();
    for pair in full.windows(2) {
        if let Some(off) = off_the_metal(pair[0], pair[1], metal) {
            let message = format!("the line is partly off the metal of `{name}`, at ({:.4}, {:.4})", off.x, off.y);
            notes.fault(message, &spot.span, "a line wholly on the metal", "shorten the line, split it, or use `edge_mm` along arcs");
            return None;
        }
    }
    Some(full)
}

/// Corners of the outline that lie on the inner part of a segment, in its direction.
fn corners_along(a: Point, b: Point, metal: &IndexedRegion) -> Vec<Point> {
    let along = b - a;
    let length = along.norm();
    let reach = Point::new(ALONG_OUTLINE, ALONG_OUTLINE);
    let around = BoundingBox::around([a, b]);
    let window = BoundingBox { min: around.min - reach, max: around.max + reach };
    let mut found: Vec<(f64, Point)> = metal
        .index()
        .near(window)
        .map(|i| metal.edges()[i].0)
        .filter(|&p| nearest_on_segment(a, b, p).distance(p) <= ALONG_OUTLINE)
        .map(|p| ((p - a).dot(along) / length, p))
        .filter(|(s, _)| *s > ALONG_OUTLINE && *s < length - ALONG_OUTLINE)
        .collect();
    found.sort_by(|p, q| p.0.total_cmp(&q.0));
    found.into_iter().map(|f| f.1).collect()
}

/// A point of the segment that is off the metal, if there is one.
fn off_the_metal(a: Point, b: Point, metal: &IndexedRegion) -> Option<Point> {
    let along = b - a;
    let length = along.norm();
    let part = |p: Point| ((p - a).dot(along) / (length * length)).clamp(0.0, 1.0);
    let mut cuts = vec![0.0, 1.0];
    for i in metal.index().near(BoundingBox::around([a, b])) {
        let (c, d) = metal.edges()[i];
        if segments_meet(a, b, c, d) {
            cuts.push(part(meeting_point(a, b, c, d)));
        }
        cuts.extend([c, d].into_iter().filter(|&p| nearest_on_segment(a, b, p).distance(p) <= ON).map(part));
    }
    cuts.sort_by(f64::total_cmp);
    cuts.windows(2)
        .filter(|w| (w[1] - w[0]) * length > ON)
        .map(|w| a + along * (0.5 * (w[0] + w[1])))
        .find(|&middle| !metal.contains(middle) && metal.rim_distance(middle) > ON)
}

fn edge(spot: &Drawn, drawn: &[Point], metal: &IndexedRegion, name: &str, moved: &mut usize, notes: &Notes) -> Option<Vec<Point>> {
    let mut ends = Vec::with_capacity(2);
    for &p in drawn {
        let Some(rim) = onto_outline(p, metal, moved) else {
            let message = format!("({}, {}) is {:.3} mm away from the outline of `{name}`", p.x, p.y, metal.rim_distance(p));
            let expected = format!("points within {ONTO_OUTLINE} mm of the outline");
            notes.fault(message, &spot.span, expected, "give points of the outline; for a line across the metal use `line_mm`");
            return None;
        };
        ends.push(rim);
    }
    match ends.as_slice() {
        [one] => Some(metal.whole_loop(metal.loop_of(one.edge))),
        [from, to] => {
            let stretch = metal.stretch(*from, *to);
            if stretch.is_none() {
                let remedy = "give both points on one ring";
                notes.fault("the two points of `edge_mm` are on different rings", &spot.span, "two points of one ring", remedy);
            }
            stretch.filter(|points| points.len() > 1)
        }
        _ => None,
    }
}

/// The polylines of lines and edges on a layer before its corners are rounded; faults are told later.
pub fn lines_before_rounding(drawn: &[Drawn], metal: &IndexedRegion) -> Vec<Vec<Point>> {
    let quiet = Notes::default();
    let mut moved = 0;
    drawn
        .iter()
        .filter_map(|spot| match &spot.form {
            Form::Line(points) => Some(points.clone()),
            Form::Edge(points) => edge(spot, points, metal, "", &mut moved, &quiet),
            _ => None,
        })
        .collect()
}
