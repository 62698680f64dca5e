//! What a hotspot is, from geometry alone.
//!
//! The first that holds, in this order; "in reach" is within three quarters of a gauge diameter of the disc's centre:
//!
//! 1. *weld rim*: the rim of a cell's or a join's spot is in reach;
//! 2. *terminal edge*: the rim of a terminal's patch, or an end of a line joint where more than a right angle of metal is left beside it;
//! 3. *overlay end*: the edge of an area where another sheet lies on this one in electrical contact;
//! 4. *neck*: followed along the current both ways, the metal gets wider by [`WIDER`] and stays so for more than a section width, before it gets
//!    narrower. Beside a hole it must also be narrow against that hole ([`HOLE_TO_NECK`]); else the hole's edge is what crowds the current;
//! 5. *inside corner*: a re-entrant corner, or a fillet (an arc with metal outside it) of a radius up to [`FILLET`] section widths;
//! 6. *hole edge*: the edge of a hole is in reach;
//! 7. what is left crowds at a polygon drawn for a bend (the outline is in reach: *inside corner*), above the end of another sheet (*overlay end*)
//!    or around a terminal (*terminal edge*). (*strip* is given where a piece of metal has no hotspot at all.)

use super::HotspotKind;
use super::gauge::Disc;
use super::hotspot::Setting;
use super::metal::{LayerMetal, Place};
use super::section::{Section, width_through};
use crate::geometry::predicate::nearest_on_segment;
use crate::geometry::ring::Arc;
use crate::geometry::{Point, Region};
use crate::index::LayerId;
use crate::mesh::NONE;
use crate::physics::plan::Area;
use crate::problem::{ElectrodeKind, Footprint, Problem};

/// How far from the disc's centre a feature may lie, in gauge diameters.
const REACH: f64 = 0.75;

/// A neck's surroundings are wider by this factor.
pub const WIDER: f64 = 1.15;

/// A leg beside a hole is a neck when the hole is this many times as large as the leg is wide.
pub const HOLE_TO_NECK: f64 = 2.5;

/// Largest radius of a fillet, in section widths.
pub const FILLET: f64 = 3.0;

/// How far along the current a neck's surroundings are looked for, in section widths.
const FARTHEST: f64 = 16.0;

/// Below this many thicknesses a width, nugget or radius is too small for a thin-sheet model.
const THIN: f64 = 3.0;

/// What a spot turned out to be.
#[derive(Debug, Clone, PartialEq)]
pub struct Character {
    /// Its kind.
    pub kind: HotspotKind,
    /// The spot whose rim it is on, for weld rims and terminal patches.
    pub spot: Option<Area>,
    /// The ring whose corner or edge it is at.
    pub ring: Option<usize>,
    /// The fillet it is on.
    pub fillet: Option<usize>,
    /// True when the exact density is infinite there.
    pub singular: bool,
    /// True when something is as small as the sheet is thick.
    pub coarse: bool,
}

/// The outline of one sheet and what ends on it.
#[derive(Debug, Clone, Default)]
pub struct Outline {
    rings: Vec<OutlineRing>,
    corners: Vec<Corner>,
    fillets: Vec<Fillet>,
    /// Ends of line joints with more than a right angle of metal on one side; true: solid.
    line_ends: Vec<(Point, bool)>,
}

#[derive(Debug, Clone)]
struct OutlineRing {
    points: Vec<Point>,
    hole: bool,
    /// The larger side of its box.
    size: f64,
}

impl OutlineRing {
    /// True where a point is this near to it.
    fn meets(&self, point: Point, within: f64) -> bool {
        let mut edges = (0..self.points.len()).map(|i| (self.points[i], self.points[(i + 1) % self.points.len()]));
        edges.any(|(a, b)| nearest_on_segment(a, b, point).distance(point) <= within)
    }
}

#[derive(Debug, Clone, Copy)]
struct Corner {
    point: Point,
    ring: usize,
}

#[derive(Debug, Clone, Copy)]
struct Fillet {
    arc: Arc,
    ring: usize,
}

impl Outline {
    /// The outline of a sheet as drawn, and the ends of the lines on it.
    pub fn new(problem: &Problem, metal: &LayerMetal) -> Self {
        let layer = &problem.layers[metal.layer.index()];
        let mut outline = Self::default();
        let loops: Vec<Vec<Point>> = layer.rings.iter().map(|r| r.flattened()).collect();
        let regions: Vec<Region> = loops.iter().map(|l| Region { loops: vec![l.clone()] }).collect();
        for (r, ring) in layer.rings.iter().enumerate() {
            let Some(&first) = loops[r].first() else { continue };
            let depth = (0..regions.len()).filter(|&o| o != r && regions[o].contains(first)).count();
            let hole = depth % 2 == 1;
            let extent = ring.bounding_box();
            let number = outline.rings.len();
            outline.rings.push(OutlineRing { points: loops[r].clone(), hole, size: extent.width().max(extent.height()) });
            // With the metal on the left, a turn to the right is re-entrant.
            let turned = if (ring.signed_area() > 0.0) != hole { 1.0 } else { -1.0 };
            let edges: Vec<(Point, f64, Point)> = ring.edges().collect();
            let full_circle = ring.as_circle().is_some();
            for (i, &(a, bulge, b)) in edges.iter().enumerate() {
                let (before_a, before_bulge, _) = edges[(i + edges.len() - 1) % edges.len()];
                let (chord_in, chord_out) = (a - before_a, b - a);
                let half = |bulge: f64| 2.0 * bulge.atan();
                let turn = chord_in.cross(chord_out).atan2(chord_in.dot(chord_out)) - half(before_bulge) - half(bulge);
                let turn = (turn + std::f64::consts::PI).rem_euclid(std::f64::consts::TAU) - std::f64::consts::PI;
                let sharp = 30f64.to_radians();
                let plain = bulge == 0.0 && before_bulge == 0.0 && chord_in.norm().min(chord_out.norm()) > 2.0 * metal.gauge;
                // A polygon drawn for a curve turns a little at every point: those are no corners.
                let least = if plain && !hole { 5f64.to_radians() } else { sharp };
                if !full_circle && -turn * turned > least {
                    outline.corners.push(Corner { point: a, ring: number });
                }
                if let Some(arc) = Arc::new(a, bulge, b)
                    && bulge * turned < 0.0
                    && !full_circle
                    && !(hole && (arc.sweep.abs() > 2.1 || arc.radius > 0.25 * extent.width().min(extent.height())))
                {
                    outline.fillets.push(Fillet { arc, ring: number });
                }
            }
        }
        for electrode in &problem.electrodes {
            if electrode.through.last() != Some(&metal.layer) {
                continue;
            }
            for spot in &electrode.spots {
                if let Footprint::Line { points } = &spot.footprint
                    && points.first() != points.last()
                {
                    let ends = [points.get(..2), points.get(points.len().saturating_sub(2)..)];
                    for (pair, turned) in ends.into_iter().zip([false, true]) {
                        if let Some(&[a, b]) = pair {
                            let (end, next) = if turned { (b, a) } else { (a, b) };
                            if widest_side(metal, end, next - end) > 95f64.to_radians() {
                                outline.line_ends.push((end, spot.joint_ohm == 0.0));
                            }
                        }
                    }
                }
            }
        }
        outline
    }

    /// Re-entrant corners and ends of line joints.
    fn sharp_places(&self) -> impl Iterator<Item = Point> + Clone {
        self.corners.iter().map(|c| c.point).chain(self.line_ends.iter().map(|e| e.0))
    }

    /// The nearest of them to a point.
    pub fn nearest_corner(&self, point: Point) -> Option<Point> {
        self.sharp_places().min_by(|a, b| a.distance(point).total_cmp(&b.distance(point)))
    }

    /// Those within reach of a point.
    pub fn corners_near(&self, point: Point, reach: f64) -> impl Iterator<Item = Point> + Clone {
        self.sharp_places().filter(move |c| c.distance(point) <= reach)
    }

    /// True where the edge of the metal is within reach of a point.
    fn rim_in_reach(&self, point: Point, reach: f64) -> bool {
        self.rings.iter().any(|r| r.meets(point, reach))
    }
}

/// The larger of the two angles of metal beside a line that starts at a point.
fn widest_side(metal: &LayerMetal, end: Point, way: Point) -> f64 {
    const SAME: f64 = 2e-4;
    let mut sides = [0.0; 2];
    let mut seen: Vec<u32> = Vec::new();
    metal.near(end, SAME, |t| {
        if seen.contains(&t) {
            return;
        }
        seen.push(t);
        let corners = metal.at(t).corners;
        for k in (0..3).filter(|&k| corners[k].distance(end) < SAME) {
            let (u, v) = (corners[(k + 1) % 3] - corners[k], corners[(k + 2) % 3] - corners[k]);
            let middle = u * (1.0 / u.norm()) + v * (1.0 / v.norm());
            sides[usize::from(way.cross(middle) > 0.0)] += u.cross(v).atan2(u.dot(v));
        }
    });
    sides[0].max(sides[1])
}

/// Which other sheets lie in contact with a sheet under a cover, one bit each.
fn partners(setting: &Setting, layer: LayerId, cover: &[u32]) -> u64 {
    let meanings = || cover.iter().map(|&a| setting.plan.areas[a as usize]);
    let mut mask = 0;
    for (c, contact) in setting.problem.contacts.iter().enumerate() {
        let other = match contact.between {
            [a, b] if a == layer => b,
            [a, b] if b == layer => a,
            _ => continue,
        };
        let here = contact.area.is_none() || meanings().any(|m| matches!(m, Area::Contact(id) if id.index() == c));
        if here && meanings().any(|m| m == Area::Layer(other)) {
            mask |= 1 << other.0;
        }
    }
    mask
}

/// True for areas that attach something to this sheet.
pub fn attaches(problem: &Problem, layer: LayerId, area: Area) -> bool {
    match area {
        Area::Spot(k, _) => problem.electrodes[k.index()].through.contains(&layer),
        Area::Join(j, _) => problem.joins[j.index()].between.contains(&layer),
        _ => false,
    }
}

/// What the reach of a place meets.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Touched {
    /// The rim of this spot of a cell or join.
    pub weld: Option<Area>,
    /// The rim of this patch of a terminal.
    pub patch: Option<Area>,
    /// The edge of an area in contact with another sheet.
    pub overlay: bool,
}

impl Touched {
    /// Looks at the triangles within reach.
    pub fn new(setting: &Setting, metal: &LayerMetal, disc: &mut Disc, place: Place) -> Self {
        let problem = setting.problem;
        let mut spots: Vec<(Area, usize)> = Vec::new();
        let mut masks: Vec<u64> = Vec::new();
        let mut count = 0;
        disc.flood(place, 2.0 * REACH * metal.gauge, |t, part| {
            if part > 0.0 {
                let cover = setting.solution.mesh.cover(metal.at(t).triangle as usize);
                count += 1;
                for area in cover.iter().map(|&a| setting.plan.areas[a as usize]).filter(|&a| attaches(problem, metal.layer, a)) {
                    match spots.iter_mut().find(|x| x.0 == area) {
                        Some(x) => x.1 += 1,
                        None => spots.push((area, 1)),
                    }
                }
                let mask = partners(setting, metal.layer, cover);
                if !masks.contains(&mask) {
                    masks.push(mask);
                }
            }
        });
        let is_terminal = |area: Area| matches!(area, Area::Spot(k, _) if problem.electrodes[k.index()].kind == ElectrodeKind::Terminal);
        let order = |area: &Area| match *area {
            Area::Spot(k, i) => (0, k.0, i),
            Area::Join(j, i) => (1, j.0, i),
            _ => (2, 0, 0),
        };
        let rims = || spots.iter().filter(|x| x.1 < count).map(|x| x.0);
        Self {
            weld: rims().filter(|&a| !is_terminal(a)).min_by_key(order),
            patch: rims().filter(|&a| is_terminal(a)).min_by_key(order),
            overlay: masks.len() > 1,
        }
    }
}

/// What the spot at a place is.
pub fn character(setting: &Setting, metal: &LayerMetal, touched: &Touched, place: Place, section: Option<&Section>) -> Character {
    let (problem, outline) = (setting.problem, &setting.outlines[metal.layer.index()]);
    let reach = REACH * metal.gauge;
    let p = place.point;
    let mut character = Character { kind: HotspotKind::TerminalEdge, spot: None, ring: None, fillet: None, singular: false, coarse: false };
    let small = |length: f64| length < THIN * metal.thickness;
    let line_end = outline.line_ends.iter().find(|e| e.0.distance(p) <= reach);
    let corner =
        outline.corners.iter().filter(|c| c.point.distance(p) <= reach).min_by(|a, b| a.point.distance(p).total_cmp(&b.point.distance(p)));
    let on_fillet = |f: &Fillet| {
        let from = p - f.arc.centre;
        let turned = (from.y.atan2(from.x) - f.arc.start) * f.arc.sweep.signum();
        let turned = turned.rem_euclid(std::f64::consts::TAU);
        (from.norm() - f.arc.radius).abs() <= reach
            && (turned <= f.arc.sweep.abs() || [0.0, 1.0].iter().any(|&s| f.arc.point(s).distance(p) <= reach))
            && section.is_none_or(|s| f.arc.radius <= FILLET * s.width)
    };
    character.fillet = outline.fillets.iter().position(on_fillet);
    let fillet = character.fillet.map(|f| &outline.fillets[f]);
    let on_ring = |point: Point, within: f64| outline.rings.iter().enumerate().find(|(_, r)| r.hole && r.meets(point, within));
    let hole = on_ring(p, reach).map(|(i, _)| i);
    character.ring = corner.map(|c| c.ring).or(fillet.map(|f| f.ring)).or(hole);
    character.singular = corner.is_some();
    character.coarse = fillet.is_some_and(|f| small(f.arc.radius));

    if let Some(area) = touched.weld.or(touched.patch) {
        character.kind = if touched.weld.is_some() { HotspotKind::WeldRim } else { HotspotKind::TerminalEdge };
        character.spot = Some(area);
        character.coarse |= nugget(problem, area).is_some_and(small);
        return character;
    }
    if let Some(&(_, solid)) = line_end {
        character.kind = HotspotKind::TerminalEdge;
        character.singular |= solid;
        return character;
    }
    character.coarse |= section.is_some_and(|s| small(s.width));
    if touched.overlay {
        character.kind = HotspotKind::OverlayEnd;
        return character;
    }
    if let Some(section) = section {
        let beside = section.ends.iter().filter_map(|&e| on_ring(e, 0.01 * metal.gauge + 0.01 * section.width)).map(|(_, r)| r.size);
        let largest = beside.fold(None, |m: Option<f64>, s| Some(m.map_or(s, |m| m.max(s))));
        if largest.is_none_or(|size| size >= HOLE_TO_NECK * section.width) && is_neck(metal, section) {
            character.kind = HotspotKind::Neck;
            return character;
        }
    }
    let covered = || problem.contacts.iter().any(|c| c.between.contains(&metal.layer));
    if corner.is_some() || fillet.is_some() {
        character.kind = HotspotKind::InsideCorner;
    } else if hole.is_some() {
        character.kind = HotspotKind::HoleEdge;
    } else if outline.rim_in_reach(p, reach) {
        character.kind = HotspotKind::InsideCorner;
    } else if covered() {
        character.kind = HotspotKind::OverlayEnd;
    }
    character
}

/// Diameter of a spot's nugget or width of its seam.
fn nugget(problem: &Problem, area: Area) -> Option<f64> {
    let footprint = match area {
        Area::Spot(k, i) => &problem.electrodes[k.index()].spots[i as usize].footprint,
        Area::Join(j, i) => &problem.joins[j.index()].spots[i as usize],
        _ => return None,
    };
    match footprint {
        Footprint::Area { diameter_mm, .. } => *diameter_mm,
        Footprint::Line { .. } => None,
    }
}

/// True when the metal gets wider both ways along the current, and stays so, before it gets narrower.
fn is_neck(metal: &LayerMetal, section: &Section) -> bool {
    [1.0, -1.0].into_iter().all(|sign| widens(metal, section, sign))
}

fn widens(metal: &LayerMetal, section: &Section, sign: f64) -> bool {
    let width = section.width;
    let mut place = section.middle;
    let mut passed = 0.0;
    let mut wide = 0.0;
    while passed < FARTHEST * width {
        let density = metal.at(place.triangle).density;
        if density.norm() == 0.0 {
            break;
        }
        let ahead = density * (sign / density.norm());
        let step = if passed < 4.0 * width { 0.5 * width } else { width };
        let walk = metal.walk(place, ahead, step, |_| true);
        if walk.length < 1e-2 * width {
            break;
        }
        place = walk.place;
        passed += walk.length;
        let here = metal.at(place.triangle).density;
        if here.norm() == 0.0 {
            break;
        }
        let across = here.perpendicular() * (1.0 / here.norm());
        let now = width_through(metal, place, across);
        if now > WIDER * width {
            wide += walk.length;
            // A bend is wider for less than a width along the current: it makes no neck of what lies beyond it.
            if wide > 1.4 * width {
                return true;
            }
        } else {
            wide = 0.0;
        }
        if now < 0.9 * width {
            return false;
        }
    }
    wide > 0.9 * width
}

/// Rims on a sheet, by the areas of the plan: length where there is metal on both sides in mm, and current that leaves through it in A.
pub fn rims(setting: &Setting, metal: &LayerMetal) -> Vec<(f64, f64)> {
    let (mesh, areas) = (&setting.solution.mesh, &setting.plan.areas);
    let mut rims = vec![(0.0, 0.0); areas.len()];
    let attaching = |cover: &Vec<u32>| -> Vec<u32> {
        cover.iter().copied().filter(|&a| attaches(setting.problem, metal.layer, areas[a as usize])).collect()
    };
    let by_cell: Vec<Vec<u32>> = mesh.covers.iter().map(attaching).collect();
    let labels = |triangle: u32| &by_cell[mesh.cells[metal.at(triangle).triangle as usize] as usize];
    for (t, triangle) in metal.triangles.iter().enumerate().filter(|(t, _)| !labels(*t as u32).is_empty()) {
        for k in (0..3).filter(|&k| triangle.neighbours[k] != NONE) {
            let outside = triangle.neighbours[k];
            for &label in labels(t as u32).iter().filter(|l| !labels(outside).contains(l)) {
                let rim = &mut rims[label as usize];
                rim.0 += triangle.corners[(k + 1) % 3].distance(triangle.corners[(k + 2) % 3]);
                if let Some(back) = (0..3).find(|&j| metal.at(outside).neighbours[j] == t as u32) {
                    rim.1 -= metal.at(outside).flux[back];
                }
            }
        }
    }
    rims
}
