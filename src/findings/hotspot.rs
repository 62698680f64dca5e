//! Where current crowds: the places that exceed their surroundings, each with its gauge peak, section, kind and rank.

use super::gauge::{Covered, DensityField, Disc};
use super::kind::{self, Character, Outline};
use super::metal::{LayerMetal, Place};
use super::section::{self, Section};
use super::summit;
use super::verdict::TIGHT_FROM;
use super::{Hotspot, HotspotKind};
use crate::geometry::Point;
use crate::index::LayerId;
use crate::mesh::NONE;
use crate::physics::Solution;
use crate::physics::adapt::{FineDisc, RESOLVED};
use crate::physics::plan::Plan;
use crate::problem::Problem;
use rayon::prelude::*;

/// Most rows of the table.
pub const MOST_ROWS: usize = 20;

/// A row's gauge peak exceeds its section's mean (at a weld rim: its surroundings) by this factor, unless it is a neck.
const CROWDING: f64 = 1.05;

/// From here on a place may turn out to be a row when the mesh under it is finer.
const NEARLY: f64 = 1.03;

/// Width of a spot's surroundings in gauge diameters.
const AROUND: f64 = 4.0;

/// Places below this part of their sheet's highest are not looked at, unless they come near the sheet's limit.
const FLOOR: f64 = 0.25;

/// A strip's row stands where |J| is above this part of its piece's highest.
const LEVEL: f64 = 0.95;

/// Peaks nearer to each other than this are ranked by place, so that the two sides of a symmetric part do not change places with the mesh.
const EQUAL: f64 = 0.01;

/// A place of the same row is kept in mind (and resolved) from this part of its peak on.
const TWIN: f64 = 0.93;

/// Part of a disc's metal under long triangles that does not spoil its mean.
const SPOILT: f64 = 0.05;

/// Part of a disc's metal under long triangles from which its mean may be wrong by some per cent.
const DOUBTFUL: f64 = 0.15;

/// Corners and edges of one ring nearer to each other than this, in gauges (and than the metal is wide), are one place.
const NEAR: f64 = 10.0;

/// Where a row lies, for the picture.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct HotspotPlace {
    /// The sheet.
    pub layer: LayerId,
    /// Centre of the gauge disc.
    pub centre: Point,
    /// Ends of the section; `None` at weld rims and where there is none.
    pub section_ends: Option<[Point; 2]>,
}

/// All that was found.
#[derive(Debug, Clone, Default)]
pub struct Survey {
    /// The rows, worst first.
    pub rows: Vec<Hotspot>,
    /// Where they lie, in the same order.
    pub places: Vec<HotspotPlace>,
    /// Per sheet: the largest gauge mean, A/mm².
    pub layer_peaks: Vec<f64>,
    /// Discs at rows and sheets' peaks under which the mesh is too coarse: gauge discs and wider ones around them.
    pub unresolved: Vec<FineDisc>,
    /// True when so much of one of them is coarse that what was found should be found again on a finer mesh.
    pub doubtful: bool,
}

/// What the search looks at.
pub struct Setting<'a> {
    /// The statement.
    pub problem: &'a Problem,
    /// Its solution.
    pub solution: &'a Solution,
    /// Meaning of the mesh's areas.
    pub plan: &'a Plan<'a>,
    /// No cut carries more than this, A.
    pub most: f64,
    /// Outlines of the sheets.
    pub outlines: Vec<Outline>,
}

/// A place on the way to a row.
struct Candidate {
    place: Place,
    peak: f64,
    covered: Covered,
    /// Under a disc [`AROUND`] times as wide.
    around: Covered,
    section: Option<Section>,
    character: Character,
    /// Of a weld rim: length and current.
    rim: Option<(f64, f64)>,
    /// Its peak over its section's mean (at a weld rim: over its surroundings); infinite for what is always a row.
    excess: f64,
    /// Other places of the same row that may be as high: the corners of one neck, the two sides of a small hole.
    twins: Vec<Candidate>,
}

impl Candidate {
    /// Discs under which the mesh is too coarse: the gauge disc, and a wider one, from which a coarse mesh would spoil the field within.
    fn unresolved(&self, metal: &LayerMetal, outline: &Outline) -> Vec<FineDisc> {
        if self.character.kind == HotspotKind::Strip {
            return Vec::new();
        }
        let mut fine = Vec::new();
        for (covered, diameter) in [(&self.covered, metal.gauge), (&self.around, AROUND * metal.gauge)] {
            let longest = RESOLVED * diameter;
            if covered.coarse > SPOILT {
                // On a finer mesh the peak may be found in a corner nearby, or in the other corner of a narrow slot's end.
                let nearest = outline.nearest_corner(self.place.point).filter(|c| c.distance(self.place.point) <= covered.longest);
                let corners = nearest.into_iter().flat_map(|c| outline.corners_near(c, NEAR * metal.gauge));
                let centres = std::iter::once(self.place.point).chain(corners.clone());
                fine.extend(centres.map(|centre| FineDisc { layer: metal.layer, centre, diameter, longest }));
                // The field is steepest in the middle of a disc that stands in a sharp corner.
                fine.extend(corners.map(|centre| FineDisc {
                    layer: metal.layer,
                    centre,
                    diameter: 0.5 * diameter,
                    longest: 0.5 * longest,
                }));
            }
        }
        fine
    }

    /// True when so much of a disc is coarse that what was found should be found again on a finer mesh.
    fn is_doubtful(&self) -> bool {
        match self.character.kind {
            HotspotKind::Strip => false,
            // Beside a nugget the field is smooth, and the edges of its rim are not long: measured, 0.6 % are lost at most under such a disc.
            HotspotKind::WeldRim => self.covered.coarse > 0.9,
            _ => self.covered.coarse > DOUBTFUL || self.around.coarse > 3.0 * DOUBTFUL,
        }
    }

    /// Order of equals: from left to right, then upwards, in steps of the gauge.
    fn by_place(&self, metal: &LayerMetal) -> (i64, i64) {
        let step = |x: f64| (x / metal.gauge).round() as i64;
        (step(self.place.point.x), step(self.place.point.y))
    }
}

/// Finds the hotspots of a solved problem.
pub fn survey(problem: &Problem, solution: &Solution, density: &DensityField) -> Survey {
    let mut survey = Survey { layer_peaks: vec![0.0; problem.layers.len()], ..Survey::default() };
    // The problem was solved, so its plan can be made; without one there is nothing to say.
    let Ok(plan) = Plan::new(problem) else { return survey };
    let outlines = density.layers.iter().map(|metal| Outline::new(problem, metal)).collect();
    let most = 0.5 * solution.electrodes.iter().map(|e| e.current.abs()).sum::<f64>();
    let setting = Setting { problem, solution, plan: &plan, most, outlines };
    let mut found: Vec<(LayerId, Candidate)> = Vec::new();
    for metal in &density.layers {
        let candidates = candidates_of(&setting, metal);
        let outline = &setting.outlines[metal.layer.index()];
        let highest = candidates.iter().max_by(|a, b| a.peak.total_cmp(&b.peak));
        if let Some(highest) = highest {
            survey.layer_peaks[metal.layer.index()] = highest.peak;
            survey.unresolved.extend(highest.unresolved(metal, outline));
            survey.doubtful |= highest.is_doubtful();
        }
        // On a coarse mesh a row to be may still look flat.
        found.extend(candidates.into_iter().filter(|c| c.excess >= NEARLY).map(|c| (metal.layer, c)));
    }
    let limit = |l: LayerId| limit_of(problem, l);
    // Rows with a limit come first: peaks and parts of a limit cannot be compared.
    let score = |(l, c): &(LayerId, Candidate)| limit(*l).map_or((1, c.peak), |limit| (0, c.peak / limit));
    found.sort_by(|a, b| score(a).0.cmp(&score(b).0).then(score(b).1.total_cmp(&score(a).1)));
    let mut rows: Vec<&(LayerId, Candidate)> = Vec::new();
    for each in &found {
        if rows.len() == MOST_ROWS {
            break;
        }
        let (layer, c) = each;
        let metal = &density.layers[layer.index()];
        survey.doubtful |= c.is_doubtful() || c.twins.iter().any(Candidate::is_doubtful);
        if c.excess >= CROWDING {
            rows.push(each);
            survey.places.push(HotspotPlace { layer: *layer, centre: c.place.point, section_ends: c.section.map(|s| s.ends) });
        }
        for coarse in c.twins.iter().chain([c]).flat_map(|each| each.unresolved(metal, &setting.outlines[layer.index()])) {
            if !survey.unresolved.contains(&coarse) {
                survey.unresolved.push(coarse);
            }
        }
    }
    survey.rows = rows.par_iter().enumerate().map(|(i, (l, c))| row(&setting, &density.layers[l.index()], c, i + 1)).collect();
    survey
}

fn limit_of(problem: &Problem, layer: LayerId) -> Option<f64> {
    problem.limits.density_a_mm2.get(layer.index()).copied().flatten()
}

/// Places of one sheet that differ, highest first, whether they exceed their surroundings or not; at least one per connected piece that carries
/// current worth a row.
fn candidates_of(setting: &Setting, metal: &LayerMetal) -> Vec<Candidate> {
    let (total, area) = metal.triangles.iter().filter(|t| !t.held).fold((0.0, 0.0), |(s, a), t| (s + t.area * t.magnitude, a + t.area));
    if total <= 0.0 {
        return Vec::new();
    }
    // What breaks a limit or comes near it has a row, however much higher the sheet's highest place is.
    let near_limit = limit_of(setting.problem, metal.layer).map_or(f64::INFINITY, |limit| TIGHT_FROM * limit);
    let least = |highest: f64| (FLOOR * highest).min(near_limit);
    let starts = summit::starts(setting, metal, total / area, &least).unwrap_or_default();
    let mut climbed: Vec<(f64, Place)> =
        starts.par_iter().map_init(|| Disc::new(metal), |disc, &start| disc.climb(start, &|_| true)).collect();
    climbed.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.triangle.cmp(&b.1.triangle)));
    let mut apart: Vec<(f64, Place)> = Vec::new();
    for c in climbed {
        if c.0 >= least(apart.first().map_or(0.0, |f| f.0)) && apart.iter().all(|a| a.1.point.distance(c.1.point) >= metal.gauge) {
            apart.push(c);
        }
    }
    let rims = kind::rims(setting, metal);
    let looked_at: Vec<Candidate> =
        apart.par_iter().map_init(|| Disc::new(metal), |disc, &c| candidate(setting, metal, &rims, disc, c)).collect();
    let mut kept: Vec<Candidate> = Vec::new();
    for c in looked_at {
        match kept.iter_mut().find(|k| same(metal, k, &c)) {
            Some(k) if c.peak >= TWIN * k.peak => k.twins.push(c),
            Some(_) => {}
            None => kept.push(c),
        }
    }
    for row in &mut kept {
        let least = row.peak * (1.0 - EQUAL);
        let first = (0..row.twins.len()).filter(|&i| row.twins[i].peak >= least).min_by_key(|&i| row.twins[i].by_place(metal));
        if let Some(i) = first.filter(|&i| row.twins[i].by_place(metal) < row.by_place(metal)) {
            let mut twins = std::mem::take(&mut row.twins);
            std::mem::swap(row, &mut twins[i]);
            row.twins = twins;
        }
    }
    let everywhere: Vec<u32> = (0..metal.triangles.len() as u32).collect();
    let pieces = connected(metal, &everywhere);
    let mut piece_of = vec![0; metal.triangles.len()];
    for (number, piece) in pieces.iter().enumerate() {
        piece.iter().for_each(|&t| piece_of[t as usize] = number);
    }
    let mut strips: Vec<(usize, Candidate)> = Vec::new();
    for (number, piece) in pieces.iter().enumerate() {
        let here = |c: &Candidate| piece_of[c.place.triangle as usize] == number;
        if kept.iter().any(|c| here(c) && c.excess >= CROWDING) {
            continue;
        }
        // Nothing stands out: the piece is a strip, or crowds current in a way that is not told from its surroundings.
        let first = kept.iter_mut().find(|c| here(c));
        match (strip(setting, metal, piece), first) {
            (Some(mut strip), first) if first.as_ref().is_none_or(|f| f.peak <= 1.1 * strip.peak) => {
                strip.peak = strip.peak.max(first.map_or(0.0, |f| f.peak.min(strip.peak * CROWDING)));
                strips.push((number, strip));
            }
            (_, Some(first)) => first.excess = f64::INFINITY,
            _ => {}
        }
    }
    kept.retain(|c| strips.iter().all(|(number, _)| piece_of[c.place.triangle as usize] != *number));
    kept.extend(strips.into_iter().map(|s| s.1));
    let highest = kept.iter().map(|c| c.peak).fold(0.0, f64::max);
    kept.retain(|c| c.peak >= least(highest));
    kept
}

/// The parts of some triangles of a sheet that hang together, in the order of their first triangles.
fn connected(metal: &LayerMetal, triangles: &[u32]) -> Vec<Vec<u32>> {
    let mut waiting = vec![false; metal.triangles.len()];
    triangles.iter().for_each(|&t| waiting[t as usize] = true);
    let mut parts = Vec::new();
    for &first in triangles {
        if !std::mem::take(&mut waiting[first as usize]) {
            continue;
        }
        let mut part = vec![first];
        let mut next = 0;
        while next < part.len() {
            let neighbours = metal.at(part[next]).neighbours;
            part.extend(neighbours.into_iter().filter(|&n| n != NONE && std::mem::take(&mut waiting[n as usize])));
            next += 1;
        }
        parts.push(part);
    }
    parts
}

/// The one row of a piece without hotspots: in the middle of the stretch that carries most; `None` where no current flows.
fn strip(setting: &Setting, metal: &LayerMetal, piece: &[u32]) -> Option<Candidate> {
    let magnitude = |t: u32| if metal.at(t).held { 0.0 } else { metal.at(t).magnitude };
    let area = |part: &[u32]| part.iter().map(|&t| metal.at(t).area).sum::<f64>();
    let highest = piece.iter().map(|&t| magnitude(t)).fold(0.0, f64::max);
    if highest <= 0.0 {
        return None;
    }
    let level: Vec<u32> = piece.iter().copied().filter(|&t| magnitude(t) >= LEVEL * highest).collect();
    let stretches: Vec<(Vec<u32>, f64)> = connected(metal, &level)
        .into_iter()
        .map(|part| {
            let a = area(&part);
            (part, a)
        })
        .collect();
    let middle =
        |(part, area): &(Vec<u32>, f64)| part.iter().fold(Point::default(), |s, &t| s + metal.at(t).middle() * (metal.at(t).area / area));
    let largest = stretches.iter().map(|s| s.1).fold(0.0, f64::max);
    // Of equal stretches the one to the left.
    let equals = stretches.iter().filter(|s| s.1 >= 0.99 * largest);
    let stretch = equals.min_by(|a, b| middle(a).x.total_cmp(&middle(b).x))?;
    let middle = middle(stretch);
    let nearest =
        *stretch.0.iter().min_by(|&&a, &&b| metal.at(a).middle().distance(middle).total_cmp(&metal.at(b).middle().distance(middle)))?;
    let start = Place { triangle: nearest, point: metal.at(nearest).middle() };
    let place = metal.moved(start, middle);
    let rims = vec![(0.0, 0.0); setting.plan.areas.len()];
    let mut disc = Disc::new(metal);
    let peak = disc.mean(place, metal.gauge).mean;
    let mut candidate = candidate(setting, metal, &rims, &mut disc, (peak, place));
    candidate.character.kind = HotspotKind::Strip;
    candidate.excess = f64::INFINITY;
    Some(candidate)
}

fn candidate(setting: &Setting, metal: &LayerMetal, rims: &[(f64, f64)], disc: &mut Disc, (peak, place): (f64, Place)) -> Candidate {
    let covered = disc.mean(place, metal.gauge);
    let around = disc.mean(place, AROUND * metal.gauge);
    let touched = kind::Touched::new(setting, metal, disc, place);
    let (mut rim, mut section) = (None, None);
    if let Some(area) = touched.weld {
        let label = setting.plan.areas.iter().position(|&a| a == area);
        rim = label.map(|l| rims[l]).filter(|r| r.0 > 0.0);
    } else {
        let unit = |v: Point| if v.norm() > 0.0 { v * (1.0 / v.norm()) } else { v };
        // Pushed inside, and a little up and down the current: at a corner only one of these has the narrow side in its cuts.
        let push = 0.02 * metal.gauge;
        let inside = metal.moved(place, place.point + unit(covered.middle - place.point) * push);
        let places = [0.0, 1.0, -1.0].map(|s| metal.moved(inside, inside.point + unit(covered.direction) * (s * push)));
        section = section::best_cut(metal, &places, setting.most, covered.direction);
    }
    // The peak of a neck lies in its fillet, where it is a little wider than at its narrowest.
    let narrowest = section.map(|s| section::narrowest(metal, s));
    let mut character = kind::character(setting, metal, &touched, place, narrowest.as_ref());
    if character.kind == HotspotKind::Neck {
        section = narrowest;
    } else {
        character = kind::character(setting, metal, &touched, place, section.as_ref());
    }
    let excess = match character.kind {
        // Always rows: whether one stands out enough from around it would hang on the mesh.
        HotspotKind::Neck | HotspotKind::WeldRim => f64::INFINITY,
        _ => section.map_or(f64::INFINITY, |s| peak * s.width * metal.thickness / s.current.abs()),
    };
    Candidate { place, peak, covered, around, section, character, rim, excess, twins: Vec::new() }
}

/// True when two places are one: the same spot's rim, the same neck, or corners or edges of one ring within a section width.
fn same(metal: &LayerMetal, a: &Candidate, b: &Candidate) -> bool {
    let distance = a.place.point.distance(b.place.point);
    if a.character.spot.is_some() || b.character.spot.is_some() {
        return a.character.spot == b.character.spot && a.character.kind == b.character.kind;
    }
    if distance < 2.0 * metal.gauge {
        return true;
    }
    let (Some(s), Some(t)) = (&a.section, &b.section) else { return false };
    if a.character.kind != b.character.kind {
        return false;
    }
    match a.character.kind {
        HotspotKind::Neck => one_neck(metal, s, t),
        _ if a.character.fillet.is_some() && a.character.fillet == b.character.fillet => true,
        _ => a.character.ring.is_some() && a.character.ring == b.character.ring && distance < s.width.max(t.width).min(NEAR * metal.gauge),
    }
}

/// True when the metal from one section to the other is nowhere wider than they are.
fn one_neck(metal: &LayerMetal, s: &Section, t: &Section) -> bool {
    let width = s.width.max(t.width);
    if s.width.min(t.width) * kind::WIDER < width {
        return false;
    }
    let way = t.middle.point - s.middle.point;
    if way.norm() < 1e-3 * width {
        return true;
    }
    let along = way * (1.0 / way.norm());
    let end = metal.walk(s.middle, along, way.norm(), |_| true);
    !end.at_edge
        && (way.norm() <= 0.5 * width
            || (1..8).all(|i| {
                let place = metal.moved(s.middle, s.middle.point + way * (i as f64 / 8.0));
                section::width_through(metal, place, s.along) < kind::WIDER * width
            }))
}

fn row(setting: &Setting, metal: &LayerMetal, c: &Candidate, rank: usize) -> Hotspot {
    let mut remarks: Vec<&str> = Vec::new();
    if c.character.coarse {
        remarks.push("less than three thicknesses wide or round: the thin-sheet model is coarse here");
    }
    if c.character.singular {
        remarks.push("the exact peak is infinite: the gauge mean is what is compared");
    }
    let (width, current) = match (c.rim, &c.section) {
        (Some((length, current)), _) => (Some(length), Some(current.abs())),
        (None, Some(s)) => (Some(s.width), Some(s.current.abs())),
        (None, None) => {
            remarks.push("no straight cut through here avoids a held patch");
            (None, None)
        }
    };
    let mean = width.zip(current).map(|(w, i)| i / (w * metal.thickness));
    let crowding = mean.filter(|&m| m > 0.01 * c.peak).map(|m| c.peak / m);
    let stretch = c.section.as_ref().and_then(|s| section::stretch(metal, s));
    Hotspot {
        rank,
        kind: c.character.kind,
        layer: setting.problem.layers[metal.layer.index()].name.clone(),
        x_mm: c.place.point.x,
        y_mm: c.place.point.y,
        peak_a_mm2: c.peak,
        gauge_mm: metal.gauge,
        width_mm: width,
        section_a: current,
        section_a_mm2: mean,
        crowding,
        drop_mv: stretch.map(|s| 1e3 * s.drop),
        loss_w: stretch.map(|s| s.loss),
        remark: (!remarks.is_empty()).then(|| remarks.join("; ")),
    }
}
