//! Where to look for hotspots: vertices from which |J| falls on every way to a higher one.

use super::gauge::Disc;
use super::hotspot::Setting;
use super::kind::attaches;
use super::metal::{LayerMetal, Place};
use crate::mesh::{Mesh, NONE};
use crate::physics::plan::Area;
use crate::union::Sets;
use rayon::prelude::*;

/// A place is looked at when |J| falls by this factor on every way from it to a higher place.
const PROMINENCE: f64 = 1.03;

/// Most places of a sheet that are looked at closely beside spots, and as many of them elsewhere: neither may crowd out the other.
const MOST_STARTS: usize = 48;

/// |J| at the vertices of a sheet: the mean over the triangles around them, held ones left out.
struct Vertices {
    value: Vec<f64>,
    /// A triangle at the vertex: the one with the largest |J|.
    at: Vec<u32>,
}

impl Vertices {
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

    /// A vertex as a place: a hair inside the triangle, because a walk from the very tip of a re-entrant corner may leave the metal at once.
    fn place(&self, mesh: &Mesh, metal: &LayerMetal, vertex: usize) -> Option<Place> {
        let triangle = self.at[vertex];
        if triangle == NONE {
            return None;
        }
        let tip = mesh.points[vertex];
        Some(Place { triangle, point: tip + (metal.at(triangle).middle() - tip) * 1e-3 })
    }

    /// Vertices of at least this value from which every way to a higher one leads down by [`PROMINENCE`].
    fn summits(&self, mesh: &Mesh, metal: &LayerMetal, least: f64) -> Vec<usize> {
        let value = |v: usize| self.value[v];
        let mut edges: Vec<(f64, [usize; 2])> = Vec::new();
        for (t, triangle) in metal.triangles.iter().enumerate() {
            for k in 0..3 {
                // Each edge once: with the first of its triangles.
                if triangle.neighbours[k] == NONE || triangle.neighbours[k] > t as u32 {
                    let ends = mesh.edges.ends[mesh.edges.of_triangle[triangle.triangle as usize][k] as usize].map(|v| v as usize);
                    let saddle = value(ends[0]).min(value(ends[1]));
                    if saddle >= least {
                        edges.push((saddle, ends));
                    }
                }
            }
        }
        edges.sort_unstable_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
        let mut sets = Sets::new(self.value.len());
        let mut summits = Vec::new();
        for (saddle, [a, b]) in edges {
            let (a, b) = (sets.root(a), sets.root(b));
            if a != b {
                let (high, low) = if value(a) > value(b) || value(a) == value(b) && a < b { (a, b) } else { (b, a) };
                sets.join_under(high, low);
                if value(low) >= PROMINENCE * saddle {
                    summits.push(low);
                }
            }
        }
        summits.extend((0..self.value.len()).filter(|&v| value(v) >= least && sets.root(v) == v));
        summits
    }
}

/// The places of a sheet to look at closely; `None` where |J| is nowhere above its mean (given) by more than the prominence asked of a place: a strip.
/// Places below `least` of the highest are left out.
pub fn starts(setting: &Setting, metal: &LayerMetal, mean: f64, least: &dyn Fn(f64) -> f64) -> Option<Vec<Place>> {
    let mesh = &setting.solution.mesh;
    let vertices = Vertices::new(mesh, metal);
    let highest = vertices.value.iter().fold(0.0, |m: f64, &v| m.max(v));
    if highest <= PROMINENCE * mean {
        return None;
    }
    // Measured by its gauge mean: the value at a vertex grows without end where triangles get smaller at a corner.
    let top = (0..vertices.value.len()).rfind(|&v| vertices.value[v] == highest).and_then(|v| vertices.place(mesh, metal, v));
    let least = least(top.map_or(0.0, |place| Disc::new(metal).mean(place, metal.gauge).mean).min(highest));
    Some(thinned(setting, metal, &vertices, vertices.summits(mesh, metal, least)))
}

/// The places to look at closely: the highest gauge means, one per spot of an electrode or join, none within half a gauge of a higher one.
fn thinned(setting: &Setting, metal: &LayerMetal, vertices: &Vertices, summits: Vec<usize>) -> Vec<Place> {
    let mesh = &setting.solution.mesh;
    let places: Vec<Place> = summits.into_iter().filter_map(|v| vertices.place(mesh, metal, v)).collect();
    let mut ranked: Vec<(f64, Place)> =
        places.par_iter().map_init(|| Disc::new(metal), |disc, &place| (disc.mean(place, metal.gauge).mean, place)).collect();
    ranked.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.triangle.cmp(&b.1.triangle)));
    let spots_at = |place: Place| {
        let around = metal.at(place.triangle).neighbours.into_iter().chain([place.triangle]).filter(|&t| t != NONE);
        let areas = around.flat_map(|t| mesh.cover(metal.at(t).triangle as usize)).map(|&a| setting.plan.areas[a as usize]);
        areas.filter(|&a| attaches(setting.problem, metal.layer, a)).collect::<Vec<Area>>()
    };
    let mut taken: Vec<Area> = Vec::new();
    let mut kept: Vec<Place> = Vec::new();
    let mut left = [MOST_STARTS; 2];
    for (_, place) in ranked {
        let spots = spots_at(place);
        let left = &mut left[usize::from(spots.is_empty())];
        if *left > 0 && spots.iter().all(|s| !taken.contains(s)) && kept.iter().all(|k| k.point.distance(place.point) >= 0.5 * metal.gauge)
        {
            taken.extend(spots);
            kept.push(place);
            *left -= 1;
        }
    }
    kept
}
