//! The metal of one sheet as it was meshed: triangles with their currents and neighbours, finding a point, and walking along straight lines.

use crate::fem::{FarEnd, Link};
use crate::geometry::predicate::nearest_on_segment;
use crate::geometry::{BoundingBox, Point};
use crate::index::LayerId;
use crate::mesh::NONE;
use crate::physics::Solution;
use crate::problem::Problem;
use rayon::prelude::*;

/// How far from the edge a point that ran into it is put, mm: enough for the signs of cross products, nothing for the result.
const INSET: f64 = 1e-6;

/// A point and the triangle (of a [`LayerMetal`]) that holds it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Place {
    /// The triangle.
    pub triangle: u32,
    /// The point.
    pub point: Point,
}

/// One triangle of one sheet.
#[derive(Debug, Clone)]
pub struct MetalTriangle {
    /// Its number in the mesh.
    pub triangle: u32,
    /// Its leaf.
    pub element: u32,
    /// Corners, counter-clockwise.
    pub corners: [Point; 3],
    /// Triangles of the same sheet across the edges opposite the corners, or `NONE`.
    pub neighbours: [u32; 3],
    /// Part of a pole: no current of its own.
    pub held: bool,
    /// Edges along which current passes to a pole: rims of held patches and line joints.
    pub open: [bool; 3],
    /// This sheet's equilibrated current out through each edge, A.
    pub flux: [f64; 3],
    /// Discrete potential at the corners, V.
    pub potential: [f64; 3],
    /// Current density in A/mm²: mean of the discrete and the equilibrated one at the middle.
    pub density: Point,
    /// Its magnitude.
    pub magnitude: f64,
    /// Area in mm².
    pub area: f64,
}

impl MetalTriangle {
    /// The middle.
    pub fn middle(&self) -> Point {
        (self.corners[0] + self.corners[1] + self.corners[2]) * (1.0 / 3.0)
    }
    /// Length of the longest edge.
    pub fn longest(&self) -> f64 {
        let [a, b, c] = self.corners;
        [b - a, c - b, a - c].into_iter().fold(0.0, |m: f64, e| m.max(e.dot(e))).sqrt()
    }
    /// Potential at a point.
    pub fn potential_at(&self, p: Point) -> f64 {
        let [a, b, c] = self.corners;
        let whole = 2.0 * self.area;
        let (wa, wb) = ((b - p).cross(c - p) / whole, (c - p).cross(a - p) / whole);
        wa * self.potential[0] + wb * self.potential[1] + (1.0 - wa - wb) * self.potential[2]
    }
}

/// The metal of one sheet.
#[derive(Debug, Clone)]
pub struct LayerMetal {
    /// Which sheet.
    pub layer: LayerId,
    /// Thickness in mm.
    pub thickness: f64,
    /// Diameter of the gauge disc in mm.
    pub gauge: f64,
    /// Resistivity in ohm mm.
    pub resistivity: f64,
    /// Its triangles, in the order of the mesh.
    pub triangles: Vec<MetalTriangle>,
    grid: Grid,
}

/// A stretch of a walk that lies in one triangle.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Step {
    /// The triangle.
    pub triangle: u32,
    /// Where the stretch begins, mm from the start.
    pub from: f64,
    /// Where it ends.
    pub to: f64,
    /// The edge by which the triangle is left; `None` where the walk ends in it.
    pub edge: Option<usize>,
}

/// What a walk came to.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Walk {
    /// How far it came, mm.
    pub length: f64,
    /// Where it ended.
    pub place: Place,
    /// True when the edge of the metal stopped it.
    pub at_edge: bool,
}

impl LayerMetal {
    /// The metal of a sheet with the currents of a solution.
    pub fn new(problem: &Problem, solution: &Solution, layer: LayerId) -> Self {
        let sheet = &problem.layers[layer.index()];
        let (mesh, complex) = (&solution.mesh, &solution.complex);
        let bit = 1u64 << layer.0;
        let mut local = vec![NONE; mesh.triangles.len()];
        let mut own: Vec<(u32, u32)> = Vec::new();
        for (t, place) in local.iter_mut().enumerate() {
            if let Some(e) = complex.element_of(t, bit) {
                *place = own.len() as u32;
                own.push((t as u32, e as u32));
            }
        }
        let build = |&(triangle, element): &(u32, u32)| {
            let (t, e) = (triangle as usize, element as usize);
            let leaf = complex.elements[e].leaf;
            let (corners, area, held) = (mesh.corners(t), mesh.area(t), leaf.held.is_some());
            let share = sheet.sheet_conductance() / leaf.conductance;
            let potential = complex.unknowns[e].map(|u| solution.potential.values[u as usize]);
            let flux = if held { [0.0; 3] } else { solution.flux.flux[e].map(|f| f * share) };
            let middle = (corners[0] + corners[1] + corners[2]) * (1.0 / 3.0);
            let mut density = Point::default();
            if !held {
                for k in 0..3 {
                    let opposite = corners[(k + 2) % 3] - corners[(k + 1) % 3];
                    let conducted = opposite.perpendicular() * (-potential[k] / sheet.resistivity);
                    let balanced = (middle - corners[k]) * (flux[k] / sheet.thickness_mm);
                    density = density + (conducted + balanced) * (0.25 / area);
                }
            }
            let neighbour = |k: usize| match mesh.edges.across(t, k) {
                NONE => NONE,
                across => local[across as usize / 3],
            };
            MetalTriangle {
                triangle,
                element,
                corners,
                neighbours: [0, 1, 2].map(neighbour),
                held,
                open: [0, 1, 2].map(|k| matches!(complex.links[complex.link_of[e][k] as usize], Link::Open(_))),
                flux,
                potential,
                density,
                magnitude: density.norm(),
                area,
            }
        };
        let mut triangles: Vec<MetalTriangle> = own.par_iter().map(build).collect();
        for x in &complex.edge_exchanges {
            let far = if let FarEnd::Leaf(element, edge) = x.far { Some((element, edge)) } else { None };
            for (element, edge) in [Some((x.element, x.edge)), far].into_iter().flatten() {
                let first = complex.elements[element as usize].triangle as usize;
                let second = mesh.edges.across(first, edge as usize);
                for (t, k) in [(first, edge as usize), (second as usize / 3, second as usize % 3)] {
                    if let Some(&place) = local.get(t)
                        && place != NONE
                        && complex.elements[element as usize].leaf.layers & bit != 0
                    {
                        triangles[place as usize].open[k] = true;
                    }
                }
            }
        }
        let grid = Grid::new(&triangles);
        let gauge = problem.accuracy.gauge_mm.unwrap_or(sheet.thickness_mm.max(0.5));
        Self { layer, thickness: sheet.thickness_mm, gauge, resistivity: sheet.resistivity, triangles, grid }
    }

    /// One triangle.
    pub fn at(&self, triangle: u32) -> &MetalTriangle {
        &self.triangles[triangle as usize]
    }

    /// The triangle that holds a point, or the nearest one within `reach` mm with the nearest point on it.
    pub fn locate(&self, p: Point, reach: f64) -> Option<Place> {
        let mut best: Option<(f64, Place)> = None;
        self.grid.near(p, reach, |t| {
            let (distance, point) = nearest_in_triangle(self.at(t).corners, p);
            if distance <= reach && best.is_none_or(|(d, b)| (distance, t) < (d, b.triangle)) {
                best = Some((distance, Place { triangle: t, point }));
            }
        });
        best.map(|b| b.1)
    }

    /// Walks from a place along a unit vector for at most `length`, telling every triangle with the stretch that lies in it, until the edge of the
    /// metal, the end, or a `visit` that says no. A line through a vertex is taken to pass it on one side, the same for all triangles there.
    pub fn walk(&self, from: Place, along: Point, length: f64, mut visit: impl FnMut(Step) -> bool) -> Walk {
        let exit_of = |triangle: &MetalTriangle, origin: Point| {
            let side = triangle.corners.map(|c| along.cross(c - origin));
            (0..3)
                .find(|&k| side[(k + 1) % 3] <= 0.0 && side[(k + 2) % 3] > 0.0)
                .map(|k| (k, side[(k + 1) % 3] / (side[(k + 1) % 3] - side[(k + 2) % 3])))
        };
        let mut at = from.triangle;
        let mut done = 0.0;
        // From a point on the triangle's rim the line may miss it; from a hair inside it does not.
        let origin = match exit_of(self.at(at), from.point) {
            Some(_) => from.point,
            None => from.point + (self.at(at).middle() - from.point) * 1e-6,
        };
        for _ in 0..=self.triangles.len() {
            let triangle = self.at(at);
            let Some((k, part)) = exit_of(triangle, origin) else { break };
            let (right, left) = (triangle.corners[(k + 1) % 3], triangle.corners[(k + 2) % 3]);
            let out = along.dot(right + (left - right) * part - origin).max(done);
            let to = out.min(length);
            let go_on = visit(Step { triangle: at, from: done, to, edge: (out < length).then_some(k) });
            done = to;
            if !go_on || out >= length {
                return Walk { length: done, place: Place { triangle: at, point: origin + along * done }, at_edge: false };
            }
            if triangle.neighbours[k] == NONE {
                break;
            }
            at = triangle.neighbours[k];
        }
        let stop = (done - INSET).max(0.0);
        Walk { length: done, place: Place { triangle: at, point: origin + along * stop }, at_edge: true }
    }

    /// Moves straight towards a target; the edge of the metal stops it.
    pub fn moved(&self, from: Place, target: Point) -> Place {
        let way = target - from.point;
        let length = way.norm();
        if length > 0.0 { self.walk(from, way * (1.0 / length), length, |_| true).place } else { from }
    }

    /// Calls `visit` for the triangles whose boxes come within `reach` of a point; some are told that do not.
    pub fn near(&self, p: Point, reach: f64, visit: impl FnMut(u32)) {
        self.grid.near(p, reach, visit);
    }
}

/// Distance from a point to a triangle and the nearest point on it.
fn nearest_in_triangle(corners: [Point; 3], p: Point) -> (f64, Point) {
    let mut inside = true;
    let mut best = (f64::INFINITY, p);
    for k in 0..3 {
        let (a, b) = (corners[k], corners[(k + 1) % 3]);
        inside &= (b - a).cross(p - a) >= 0.0;
        let q = nearest_on_segment(a, b, p);
        if p.distance(q) < best.0 {
            best = (p.distance(q), q);
        }
    }
    if inside { (0.0, p) } else { best }
}

/// Triangles by the squares of a uniform grid that their boxes meet.
#[derive(Debug, Clone)]
struct Grid {
    origin: Point,
    size: f64,
    columns: usize,
    rows: usize,
    starts: Vec<u32>,
    entries: Vec<u32>,
}

impl Grid {
    fn new(triangles: &[MetalTriangle]) -> Self {
        let extent = BoundingBox::around(triangles.iter().flat_map(|t| t.corners));
        let (width, height) = (extent.width(), extent.height());
        let size = (width * height / triangles.len().max(1) as f64).sqrt().max(width.max(height) / 2000.0).max(f64::MIN_POSITIVE);
        let count = |length: f64| (length / size) as usize + 1;
        let origin = if extent.is_empty() { Point::default() } else { extent.min };
        let mut grid = Self { origin, size, columns: count(width), rows: count(height), starts: Vec::new(), entries: Vec::new() };
        let mut starts = vec![0u32; grid.columns * grid.rows + 1];
        let boxes: Vec<[usize; 4]> = triangles.iter().map(|t| grid.range(BoundingBox::around(t.corners))).collect();
        for b in &boxes {
            grid.squares(*b, |s| starts[s + 1] += 1);
        }
        for s in 1..starts.len() {
            starts[s] += starts[s - 1];
        }
        let mut next = starts.clone();
        let mut entries = vec![0u32; starts.last().map_or(0, |&n| n as usize)];
        for (t, b) in boxes.iter().enumerate() {
            grid.squares(*b, |s| {
                entries[next[s] as usize] = t as u32;
                next[s] += 1;
            });
        }
        (grid.starts, grid.entries) = (starts, entries);
        grid
    }

    fn range(&self, area: BoundingBox) -> [usize; 4] {
        let column = |x: f64| (((x - self.origin.x) / self.size).max(0.0) as usize).min(self.columns - 1);
        let row = |y: f64| (((y - self.origin.y) / self.size).max(0.0) as usize).min(self.rows - 1);
        [column(area.min.x), column(area.max.x), row(area.min.y), row(area.max.y)]
    }

    fn squares(&self, [left, right, low, high]: [usize; 4], mut visit: impl FnMut(usize)) {
        for row in low..=high {
            for column in left..=right {
                visit(row * self.columns + column);
            }
        }
    }

    fn near(&self, p: Point, reach: f64, mut visit: impl FnMut(u32)) {
        let r = Point::new(reach, reach);
        self.squares(self.range(BoundingBox { min: p - r, max: p + r }), |s| {
            for &t in &self.entries[self.starts[s] as usize..self.starts[s + 1] as usize] {
                visit(t);
            }
        });
    }
}
