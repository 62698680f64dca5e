//! Where current crowds: the places that exceed their surroundings, each with its gauge peak, section, kind and rank.

use super::gauge::{Covered, DensityField, Disc};
use super::kind::{self, Character, Outline, attaches};
use super::metal::{LayerMetal, Place};
use super::section::{self, Section};
use super::{Hotspot, HotspotKind};
use crate::geometry::Point;
use crate::index::LayerId;
use crate::mesh::{Mesh, NONE};
use crate::physics::Solution;
use crate::physics::plan::{Area, Plan};
use crate::problem::Problem;
use rayon::prelude::*;

/// Most rows of the table.
pub const MOST_ROWS: usize = 20;

/// A place is looked at when |J| falls by this factor on every way from it to a higher place.
const PROMINENCE: f64 = 1.03;

/// A row's gauge peak exceeds its section's mean (at a weld rim: its surroundings) by this factor, unless it is a neck.
const CROWDING: f64 = 1.05;

/// Places below this part of their sheet's highest are not looked at.
const FLOOR: f64 = 0.25;

/// Most places of a sheet that are looked at closely.
const MOST_STARTS: usize = 48;

/// Peaks nearer to each other than this are ranked by place, so that the two sides of a symmetric part do not change places with the mesh.
const EQUAL: f64 = 0.01;

/// A place of the same row is kept in mind (and resolved) from this part of its peak on.
const TWIN: f64 = 0.93;

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
    /// Gauge discs (sheet, centre, diameter) of rows and sheets' peaks with a triangle under them longer than a quarter of their diameter.
    pub unresolved: Vec<(LayerId, Point, f64)>,
}

/// What the search looks at.
pub struct Setting<'a> {
    /// The statement.
    pub problem: &'a Problem,
    /// Its solution.
    pub solution: &'a Solution,
    /// Meaning of the mesh's areas.
    pub plan: &'a Plan<'a>,
    /// Outlines of the sheets.
    pub outlines: Vec<Outline>,
}

/// A place on the way to a row.
struct Candidate {
    place: Place,
    peak: f64,
    covered: Covered,
    section: Option<Section>,
    character: Character,
    /// Of a weld rim: length and current.
    rim: Option<(f64, f64)>,
    exceeds: bool,
    /// Other places of the same row that may be as high: the corners of one neck, the two sides of a small hole.
    twins: Vec<Candidate>,
}

impl Candidate {
    fn unresolved(&self, metal: &LayerMetal) -> bool {
        self.character.kind != HotspotKind::Strip && self.covered.longest > 0.25 * metal.gauge
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
    let setting = Setting { problem, solution, plan: &plan, outlines };
    let mut found: Vec<(LayerId, Candidate)> = Vec::new();
    for metal in &density.layers {
        let candidates = candidates_of(&setting, metal);
        let highest = candidates.iter().max_by(|a, b| a.peak.total_cmp(&b.peak));
        if let Some(highest) = highest {
            survey.layer_peaks[metal.layer.index()] = highest.peak;
            if highest.unresolved(metal) {
                survey.unresolved.push((metal.layer, highest.place.point, metal.gauge));
            }
        }
        found.extend(candidates.into_iter().filter(|c| c.exceeds).map(|c| (metal.layer, c)));
    }
    let limit = |l: LayerId| problem.limits.density_a_mm2.get(l.index()).copied().flatten();
    // Rows with a limit come first: peaks and parts of a limit cannot be compared.
    let score = |(l, c): &(LayerId, Candidate)| limit(*l).map_or((1, c.peak), |limit| (0, c.peak / limit));
    found.sort_by(|a, b| score(a).0.cmp(&score(b).0).then(score(b).1.total_cmp(&score(a).1)));
    let mut from = 0;
    while from < found.len() {
        let (class, top) = score(&found[from]);
        let to = from + found[from..].iter().take_while(|c| score(c).0 == class && score(c).1 >= top * (1.0 - EQUAL)).count();
        found[from..to].sort_by_key(|(l, c)| (*l, c.by_place(&density.layers[l.index()])));
        from = to.max(from + 1);
    }
    found.truncate(MOST_ROWS);
    let rows: Vec<Hotspot> = found.par_iter().enumerate().map(|(i, (l, c))| row(&setting, &density.layers[l.index()], c, i + 1)).collect();
    survey.rows = rows;
    for (layer, c) in &found {
        let metal = &density.layers[layer.index()];
        survey.places.push(HotspotPlace {
            layer: *layer,
            centre: c.place.point,
            section_ends: if c.rim.is_some() { None } else { c.section.map(|s| s.ends) },
        });
        for each in c.twins.iter().chain([c]).filter(|each| each.unresolved(metal)) {
            if !survey.unresolved.contains(&(*layer, each.place.point, metal.gauge)) {
                survey.unresolved.push((*layer, each.place.point, metal.gauge));
            }
        }
    }
    survey
}

/// Places of one sheet that differ, highest first, whether they exceed their surroundings or not.
fn candidates_of(setting: &Setting, metal: &LayerMetal) -> Vec<Candidate> {
    let (total, area) = metal.triangles.iter().filter(|t| !t.held).fold((0.0, 0.0), |(s, a), t| (s + t.area * t.magnitude, a + t.area));
    if total <= 0.0 {
        return Vec::new();
    }
    let nodes = Nodes::new(&setting.solution.mesh, metal);
    let highest = nodes.value.iter().fold(0.0, |m: f64, &v| m.max(v));
    if highest <= PROMINENCE * total / area {
        return strip(setting, metal).into_iter().collect();
    }
    let starts = thinned(setting, metal, &nodes, nodes.summits(&setting.solution.mesh, metal, FLOOR * highest));
    let mut climbed: Vec<(f64, Place)> =
        starts.par_iter().map_init(|| Disc::new(metal), |disc, &start| disc.climb(start, &|_| true)).collect();
    climbed.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.triangle.cmp(&b.1.triangle)));
    let mut apart: Vec<(f64, Place)> = Vec::new();
    for c in climbed {
        if c.0 >= FLOOR * apart.first().map_or(0.0, |f| f.0) && apart.iter().all(|a| a.1.point.distance(c.1.point) >= metal.gauge) {
            apart.push(c);
        }
    }
    let looked_at: Vec<Candidate> = apart.par_iter().map_init(|| Disc::new(metal), |disc, &c| candidate(setting, metal, disc, c)).collect();
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
    if !kept.iter().any(|c| c.exceeds) {
        // Nothing stands out: the sheet is a strip, or crowds current in a way that has no name.
        if let Some(mut strip) = strip(setting, metal) {
            let peak = kept.first().map_or(strip.peak, |c| c.peak);
            if peak <= 1.1 * strip.peak {
                strip.peak = strip.peak.max(peak.min(strip.peak * CROWDING));
                return vec![strip];
            }
        }
        if let Some(first) = kept.first_mut() {
            first.exceeds = true;
        }
    }
    kept
}

/// The one row of a sheet without hotspots: in the middle of its metal.
fn strip(setting: &Setting, metal: &LayerMetal) -> Option<Candidate> {
    let free = || metal.triangles.iter().filter(|t| !t.held);
    let area: f64 = free().map(|t| t.area).sum();
    let middle = free().fold(Point::default(), |s, t| s + t.middle() * (t.area / area));
    let place = metal.locate(middle, 1e-6).or_else(|| {
        let nearest = free().min_by(|a, b| a.middle().distance(middle).total_cmp(&b.middle().distance(middle)))?;
        metal.locate(nearest.middle(), 1e-6)
    })?;
    let mut disc = Disc::new(metal);
    let peak = disc.mean(place, metal.gauge).mean;
    let mut candidate = candidate(setting, metal, &mut disc, (peak, place));
    candidate.character.kind = HotspotKind::Strip;
    (candidate.rim, candidate.exceeds) = (None, true);
    Some(candidate)
}

fn candidate(setting: &Setting, metal: &LayerMetal, disc: &mut Disc, (peak, place): (f64, Place)) -> Candidate {
    let covered = disc.mean(place, metal.gauge);
    let unit = |v: Point| if v.norm() > 0.0 { v * (1.0 / v.norm()) } else { v };
    // Pushed inside, and a little up and down the current: at a corner only one of these has the narrow side in its cuts.
    let push = 0.02 * metal.gauge;
    let inside = metal.moved(place, place.point + unit(covered.middle - place.point) * push);
    let places = [0.0, 1.0, -1.0].map(|s| metal.moved(inside, inside.point + unit(covered.direction) * (s * push)));
    let section = section::best_cut(metal, &places);
    let character = kind::character(setting, metal, disc, place, section.as_ref());
    let rim = match (character.kind, character.spot) {
        (HotspotKind::WeldRim, Some(area)) => kind::rim(setting, metal, area),
        _ => None,
    };
    let exceeds = match character.kind {
        HotspotKind::Neck => true,
        HotspotKind::WeldRim => peak >= CROWDING * disc.mean(place, 4.0 * metal.gauge).mean,
        _ => section.is_none_or(|s| peak * s.width * metal.thickness >= CROWDING * s.current.abs()),
    };
    Candidate { place, peak, covered, section, character, rim, exceeds, twins: Vec::new() }
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
        _ => a.character.ring.is_some() && a.character.ring == b.character.ring && distance < s.width.max(t.width).min(10.0 * metal.gauge),
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
        remarks.push("as small as the sheet is thick: the thin-sheet model is coarse here");
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
    let stretch = if c.rim.is_some() { None } else { c.section.as_ref().and_then(|s| section::stretch(metal, s)) };
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

/// |J| at the vertices of a sheet: the mean over the triangles around them, held ones left out.
struct Nodes {
    value: Vec<f64>,
    /// A triangle at the vertex: the one with the largest |J|.
    at: Vec<u32>,
}

impl Nodes {
    fn new(mesh: &Mesh, metal: &LayerMetal) -> Self {
        let mut value = vec![0.0; mesh.points.len()];
        let mut area = vec![0.0; mesh.points.len()];
        let mut at = vec![NONE; mesh.points.len()];
        for (t, triangle) in metal.triangles.iter().enumerate().filter(|(_, t)| !t.held) {
            for v in mesh.triangles[triangle.triangle as usize].map(|v| v as usize) {
                value[v] += triangle.area * triangle.magnitude;
                area[v] += triangle.area;
                if at[v] == NONE || metal.at(at[v]).magnitude < triangle.magnitude {
                    at[v] = t as u32;
                }
            }
        }
        value.iter_mut().zip(&area).filter(|(_, a)| **a > 0.0).for_each(|(v, a)| *v /= a);
        Self { value, at }
    }

    /// Vertices of at least this value from which every way to a higher one leads down by [`PROMINENCE`].
    fn summits(&self, mesh: &Mesh, metal: &LayerMetal, least: f64) -> Vec<u32> {
        let value = |v: u32| self.value[v as usize];
        let mut edges: Vec<(f64, [u32; 2])> = Vec::new();
        for (t, triangle) in metal.triangles.iter().enumerate() {
            for k in 0..3 {
                // Each edge once: with the first of its triangles.
                if triangle.neighbours[k] == NONE || triangle.neighbours[k] > t as u32 {
                    let ends = mesh.edges.ends[mesh.edges.of_triangle[triangle.triangle as usize][k] as usize];
                    let saddle = value(ends[0]).min(value(ends[1]));
                    if saddle >= least {
                        edges.push((saddle, ends));
                    }
                }
            }
        }
        edges.sort_unstable_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
        let mut parent: Vec<u32> = (0..self.value.len() as u32).collect();
        let mut root = |mut v: u32, link: Option<u32>| {
            while parent[v as usize] != v {
                parent[v as usize] = parent[parent[v as usize] as usize];
                v = parent[v as usize];
            }
            if let Some(link) = link {
                parent[v as usize] = link;
            }
            v
        };
        let mut summits = Vec::new();
        for (saddle, [a, b]) in edges {
            let (a, b) = (root(a, None), root(b, None));
            if a != b {
                let (high, low) = if value(a) > value(b) || value(a) == value(b) && a < b { (a, b) } else { (b, a) };
                root(low, Some(high));
                if value(low) >= PROMINENCE * saddle {
                    summits.push(low);
                }
            }
        }
        summits.extend((0..self.value.len() as u32).filter(|&v| value(v) >= least && root(v, None) == v));
        summits
    }
}

/// The places to look at closely: the highest gauge means, one per spot of an electrode or join, none within half a gauge of a higher one.
fn thinned(setting: &Setting, metal: &LayerMetal, nodes: &Nodes, summits: Vec<u32>) -> Vec<Place> {
    let mesh = &setting.solution.mesh;
    let start = |&v: &u32| {
        let triangle = nodes.at[v as usize];
        let point = mesh.points[v as usize];
        let inward = metal.at(triangle).middle() - point;
        Place { triangle, point: point + inward * (1e-6 / inward.norm()) }
    };
    let mut ranked: Vec<(f64, Place)> = summits
        .par_iter()
        .map_init(
            || Disc::new(metal),
            |disc, v| {
                let place = start(v);
                (disc.mean(place, metal.gauge).mean, place)
            },
        )
        .collect();
    ranked.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.triangle.cmp(&b.1.triangle)));
    let spots_at = |place: Place| {
        let around = metal.at(place.triangle).neighbours.into_iter().chain([place.triangle]).filter(|&t| t != NONE);
        let areas = around.flat_map(|t| mesh.cover(metal.at(t).triangle as usize)).map(|&a| setting.plan.areas[a as usize]);
        areas.filter(|&a| attaches(setting.problem, metal.layer, a)).collect::<Vec<Area>>()
    };
    let mut taken: Vec<Area> = Vec::new();
    let mut kept: Vec<Place> = Vec::new();
    for (_, place) in ranked {
        if kept.len() == MOST_STARTS {
            break;
        }
        let spots = spots_at(place);
        if spots.iter().all(|s| !taken.contains(s)) && kept.iter().all(|k| k.point.distance(place.point) >= 0.5 * metal.gauge) {
            taken.extend(spots);
            kept.push(place);
        }
    }
    kept
}

#[cfg(test)]
mod tests {
    use super::super::trial::*;
    use super::*;
    use crate::geometry::Ring;
    use crate::problem::*;

    /// A strip along x whose ends are terminals; mean density 1 A/mm² at full width.
    fn strip_job(rings: Vec<Ring>, length: f64, width: f64, bracket: f64, gauge: f64) -> Problem {
        let ends = terminals(line(&[(0.0, 0.0), (0.0, width)]), line(&[(length, 0.0), (length, width)]), 0, width);
        problem(vec![sheet("a", rings, 1.0)], ends, bracket, gauge)
    }

    fn near(value: f64, expected: f64, part: f64) {
        assert!((value / expected - 1.0).abs() <= part, "{value} is not {expected} within {part}");
    }

    #[test]
    fn a_uniform_strip_has_one_row_at_mid_length() {
        let body = polygon(&[(0.0, 0.0), (60.0, 0.0), (60.0, 10.0), (0.0, 10.0)]);
        let (.., survey) = surveyed(&strip_job(vec![body], 60.0, 10.0, 1e-3, 0.5));
        assert_eq!(survey.rows.len(), 1);
        let row = &survey.rows[0];
        assert_eq!(row.kind, HotspotKind::Strip);
        assert!((row.x_mm - 30.0).abs() < 0.01 && (row.peak_a_mm2 - 1.0).abs() < 1e-6);
        assert!((row.width_mm.unwrap() - 10.0).abs() < 1e-6 && (row.section_a.unwrap() - 10.0).abs() < 1e-6);
        // One square of 1 mm copper: 17.241 microhm at 10 A.
        near(row.drop_mv.unwrap(), 0.17241, 1e-5);
        near(row.loss_w.unwrap(), 1.7241e-3, 1e-5);
    }

    #[test]
    fn a_hole_in_a_strip_has_its_peaks_beside_the_hole() {
        // checks.md B15 (limit of small holes: potential flow past a cylinder, Lamb).
        for (part, ratio, kind) in
            [(0.1, 2.06940028, HotspotKind::HoleEdge), (0.2, 2.32872166, HotspotKind::HoleEdge), (0.3, 3.02206308, HotspotKind::Neck)]
        {
            let radius = 10.0 * part;
            let body = polygon(&[(0.0, 0.0), (60.0, 0.0), (60.0, 10.0), (0.0, 10.0)]);
            let hole = Ring::circle(Point::new(30.0, 5.0), 2.0 * radius);
            let (.., survey) = surveyed(&strip_job(vec![body, hole], 60.0, 10.0, 1e-3, 0.1 * radius));
            assert_eq!(survey.rows.len(), 2);
            for row in &survey.rows {
                assert_eq!(row.kind, kind);
                // The gauge mean lies about a fifth of the gauge inside the metal, where less flows.
                assert!(row.peak_a_mm2 > 0.95 * ratio && row.peak_a_mm2 < 1.01 * ratio, "{} {ratio}", row.peak_a_mm2);
                near(row.width_mm.unwrap(), 5.0 - radius, 0.002);
                near(row.section_a.unwrap(), 5.0, 0.002);
                assert!((row.x_mm - 30.0).abs() < 0.1 * radius, "{}", row.x_mm);
            }
        }
    }

    /// An L of two arms of width 7 with an inner corner of some radius.
    fn bend(radius: f64, bracket: f64, gauge: f64) -> Problem {
        let (w, arm) = (7.0, 28.0);
        let corner = if radius > 0.0 {
            // Metal on the left of a ring that runs counter-clockwise: the fillet turns to the right.
            vec![(w + radius, w, -(std::f64::consts::PI / 8.0).tan()), (w, w + radius, 0.0)]
        } else {
            vec![(w, w, 0.0)]
        };
        let ring: Vec<(f64, f64, f64)> =
            [(0.0, 0.0, 0.0), (arm, 0.0, 0.0), (arm, w, 0.0)].into_iter().chain(corner).chain([(w, arm, 0.0), (0.0, arm, 0.0)]).collect();
        let ends = terminals(line(&[(arm, 0.0), (arm, w)]), line(&[(w, arm), (0.0, arm)]), 0, w);
        problem(vec![sheet("a", vec![bulged(&ring)], 1.0)], ends, bracket, gauge)
    }

    #[test]
    fn a_fillet_peaks_as_published() {
        // checks.md B22 (for the effect: Hagedorn and Hall 1963, Clem and Berggren 2011).
        for (part, ratio) in [(0.25, 2.06451), (0.5, 1.617003)] {
            let (.., survey) = surveyed(&bend(7.0 * part, 1e-3, 0.04 * 7.0 * part));
            assert_eq!(survey.rows.len(), 1);
            assert_eq!(survey.rows[0].kind, HotspotKind::InsideCorner);
            near(survey.rows[0].peak_a_mm2, ratio, 0.02);
            assert_eq!(survey.rows[0].remark.as_deref().filter(|r| r.contains("infinite")), None);
        }
    }

    #[test]
    fn a_sharp_inside_corner_is_one_row_that_says_its_peak_is_infinite() {
        let (.., survey) = surveyed(&bend(0.0, 1e-3, 0.5));
        assert_eq!(survey.rows.len(), 1);
        let row = &survey.rows[0];
        assert_eq!(row.kind, HotspotKind::InsideCorner);
        assert!(row.x_mm.hypot(row.y_mm) - 7.0 * 2f64.sqrt() < 0.2);
        near(row.section_a.unwrap(), 7.0, 1e-6);
        near(row.width_mm.unwrap(), 7.0, 0.01);
        assert!(row.remark.as_deref().unwrap().contains("infinite"));
    }

    #[test]
    fn an_arc_bend_crowds_at_its_inner_radius() {
        // checks.md B11: J = I / (t r ln(r2 / r1)), radii 8 and 15.
        let quarter = (std::f64::consts::PI / 8.0).tan();
        let ring = bulged(&[(8.0, 0.0, 0.0), (15.0, 0.0, quarter), (0.0, 15.0, 0.0), (0.0, 8.0, -quarter)]);
        let ends = terminals(line(&[(8.0, 0.0), (15.0, 0.0)]), line(&[(0.0, 15.0), (0.0, 8.0)]), 0, 7.0);
        let (.., survey) = surveyed(&problem(vec![sheet("a", vec![ring], 1.0)], ends, 1e-3, 0.3));
        near(survey.rows[0].peak_a_mm2, 7.0 / (8.0 * (15f64 / 8.0).ln()), 0.015);
        near(survey.rows[0].section_a.unwrap(), 7.0, 1e-3);
        assert_eq!(survey.rows[0].kind, HotspotKind::InsideCorner);
    }

    #[test]
    fn slots_leave_one_neck() {
        // checks.md B17: notches from both sides leave 4 of 10 mm.
        let (.., survey) = surveyed(&slotted(1e-3));
        assert_eq!(survey.rows.len(), 1);
        let row = &survey.rows[0];
        assert_eq!(row.kind, HotspotKind::Neck);
        near(row.width_mm.unwrap(), 4.0, 0.005);
        near(row.section_a.unwrap(), 10.0, 1e-6);
        near(row.section_a_mm2.unwrap(), 2.5, 0.005);
    }

    fn slotted(bracket: f64) -> Problem {
        let ring = polygon(&[
            (0.0, 0.0),
            (18.0, 0.0),
            (18.0, 3.0),
            (22.0, 3.0),
            (22.0, 0.0),
            (40.0, 0.0),
            (40.0, 10.0),
            (22.0, 10.0),
            (22.0, 7.0),
            (18.0, 7.0),
            (18.0, 10.0),
            (0.0, 10.0),
        ]);
        strip_job(vec![ring], 40.0, 10.0, bracket, 0.5)
    }

    /// A 12 mm strip with a post hole that leaves two legs 2 mm wide and 5 mm long.
    fn post_hole(bracket: f64) -> Problem {
        let body = polygon(&[(0.0, 0.0), (40.0, 0.0), (40.0, 12.0), (0.0, 12.0)]);
        let hole = polygon(&[(17.5, 2.0), (22.5, 2.0), (22.5, 10.0), (17.5, 10.0)]);
        strip_job(vec![body, hole], 40.0, 12.0, bracket, 0.3)
    }

    #[test]
    fn a_post_hole_leaves_two_legs() {
        let (.., survey) = surveyed(&post_hole(1e-3));
        assert_eq!(survey.rows.iter().map(|r| r.kind).collect::<Vec<_>>(), [HotspotKind::Neck; 2]);
        for row in &survey.rows {
            near(row.width_mm.unwrap(), 2.0, 0.01);
            near(row.section_a.unwrap(), 6.0, 0.002);
        }
    }

    #[test]
    fn a_taper_crowds_where_it_ends() {
        let ring = polygon(&[(0.0, 0.0), (20.0, 0.0), (40.0, 6.0), (60.0, 6.0), (60.0, 10.0), (40.0, 10.0), (20.0, 16.0), (0.0, 16.0)]);
        let ends = terminals(line(&[(0.0, 0.0), (0.0, 16.0)]), line(&[(60.0, 6.0), (60.0, 10.0)]), 0, 4.0);
        let (.., survey) = surveyed(&problem(vec![sheet("a", vec![ring], 1.0)], ends, 1e-3, 0.5));
        let row = &survey.rows[0];
        assert_eq!(row.kind, HotspotKind::InsideCorner);
        near(row.width_mm.unwrap(), 4.0, 0.02);
        near(row.section_a_mm2.unwrap(), 1.0, 0.02);
    }

    /// Three cells on a strip, current taken off at its right end.
    fn nuggets(bracket: f64, joint_ohm: f64) -> Problem {
        let body = polygon(&[(0.0, 0.0), (70.0, 0.0), (70.0, 16.0), (0.0, 16.0)]);
        let cell = |x: f64, i: f64| electrode(ElectrodeKind::Cell, 0, disc(x, 8.0, 4.0), joint_ohm, Drive::Current(i));
        let lug = electrode(ElectrodeKind::Terminal, 0, line(&[(70.0, 0.0), (70.0, 16.0)]), 0.0, Drive::Balance);
        problem(vec![sheet("a", vec![body], 0.3)], vec![cell(10.0, 5.0), cell(30.0, 6.0), cell(50.0, 7.0), lug], bracket, 0.5)
    }

    #[test]
    fn every_nugget_has_one_rim() {
        for joint_ohm in [0.0, 5e-5] {
            let (.., survey) = surveyed(&nuggets(1e-3, joint_ohm));
            assert_eq!(survey.rows.iter().map(|r| r.kind).collect::<Vec<_>>(), [HotspotKind::WeldRim; 3]);
            for (row, (x, current)) in survey.rows.iter().zip([(50.0, 7.0), (30.0, 6.0), (10.0, 5.0)]) {
                assert!((row.x_mm - x).hypot(row.y_mm - 8.0) < 2.6);
                near(row.section_a.unwrap(), current, 1e-6);
                near(row.width_mm.unwrap(), std::f64::consts::PI * 4.0, 0.01);
            }
        }
    }

    /// A lap of two strips in contact.
    fn lap(bracket: f64) -> Problem {
        let a = polygon(&[(0.0, 0.0), (30.0, 0.0), (30.0, 9.0), (0.0, 9.0)]);
        let b = polygon(&[(18.0, 0.0), (60.0, 0.0), (60.0, 9.0), (18.0, 9.0)]);
        let ends = terminals(line(&[(0.0, 0.0), (0.0, 9.0)]), line(&[(60.0, 0.0), (60.0, 9.0)]), 1, 9.0);
        let mut job = problem(vec![sheet("a", vec![a], 0.2), sheet("b", vec![b], 0.15)], ends, bracket, 0.5);
        job.contacts.push(Contact {
            name: "c".into(),
            between: [LayerId(0), LayerId(1)],
            area: None,
            interface: Interface::Conductance(200.0),
        });
        job
    }

    #[test]
    fn a_lap_has_no_crowding_in_the_plane() {
        // One-dimensional: each sheet carries all of the current up to the lap (the mathematics of Volkersen 1938).
        let (.., survey) = surveyed(&lap(1e-3));
        assert_eq!(
            survey.rows.iter().map(|r| (r.kind, r.layer.as_str())).collect::<Vec<_>>(),
            [(HotspotKind::Strip, "b"), (HotspotKind::Strip, "a")]
        );
    }

    #[test]
    fn the_list_does_not_depend_on_the_mesh() {
        for job in [slotted as fn(f64) -> Problem, post_hole, |b| nuggets(b, 0.0), |b| bend(0.0, b, 0.5), |b| bend(2.0, b, 0.5)] {
            let lists: Vec<Survey> = [1e-2, 1e-3, 2e-4].map(|bracket| surveyed(&job(bracket)).2).into();
            let finest = &lists[2];
            for survey in &lists {
                assert_eq!(survey.rows.len(), finest.rows.len());
                for (row, other) in survey.rows.iter().zip(&finest.rows) {
                    assert_eq!(row.kind, other.kind);
                    near(row.peak_a_mm2, other.peak_a_mm2, 0.03);
                    near(row.section_a_mm2.unwrap(), other.section_a_mm2.unwrap(), 0.03);
                    assert!((row.x_mm - other.x_mm).hypot(row.y_mm - other.y_mm) < 1.0, "{row:?} {other:?}");
                }
            }
        }
    }
}
#[cfg(test)]
mod speed_probe {
    use super::super::trial::*;
    use super::*;
    use crate::problem::*;
    #[test]
    fn plate() {
        let rings = vec![
            polygon(&[(0., 0.), (240., 0.), (240., 80.), (0., 80.)]),
            polygon(&[(90., 28.), (150., 28.), (150., 32.), (90., 32.)]),
            polygon(&[(90., 48.), (150., 48.), (150., 52.), (90., 52.)]),
        ];
        let mut electrodes = vec![];
        for y in [15.0, 65.0] {
            for i in 0..10 {
                electrodes.push(electrode(ElectrodeKind::Cell, 0, disc(12.0 + 24.0 * i as f64, y, 4.0), 5e-5, Drive::Current(1.0)));
            }
        }
        electrodes.push(electrode(ElectrodeKind::Terminal, 0, line(&[(240., 0.), (240., 80.)]), 0.0, Drive::Balance));
        let job = problem(vec![sheet("p", rings, 0.2)], electrodes, 3e-4, 0.5);
        let (s, ..) = surveyed(&job);
        for _ in 0..5 {
            let t = std::time::Instant::now();
            let d = DensityField::new(&job, &s);
            let t1 = t.elapsed();
            let v = survey(&job, &s, &d);
            eprintln!("{} triangles: density {:?} survey {:?} rows {}", s.mesh.triangles.len(), t1, t.elapsed() - t1, v.rows.len());
        }
    }
}
