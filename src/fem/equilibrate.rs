//! Equilibrated flux: from a discrete potential to a flux that obeys conservation exactly, fan by fan, and how far the two differ.
//!
//! The flux lies in the lowest-order Raviart-Thomas space: one number per element and edge, + outward. Around every vertex the hat function
//! splits the current balance; each fan's part is the admissible one nearest to the interpolation of -psi g grad phi, measured with 1/g.
//! With one number t per element of the fan (what leaves through the edge on the far side of its corner) that nearest one solves a
//! Laplacian over the fan's closed links, whatever the fan looks like: closed, open, cut by lines, or branching where a bond ends.
//! (Prager and Synge 1947; Destuynder and Metivet 1999; Braess and Schoeberl 2008; Ern and Vohralik 2015.)
//!
//! The defect (flux + g grad phi, and an exchange's difference less its mean) gives the bound: energy of the flux = discrete energy + its square.

use super::assemble::conduction;
use super::complex::{Complex, Element, End, FarEnd, Link};
use super::field::Field;
use crate::algebra::Dense;
use crate::geometry::Point;
use crate::mesh::{Mesh, NONE};
use rayon::prelude::*;
use std::ops::Range;

/// A given source density on one element, in one column of the fields.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Load {
    /// The element.
    pub element: u32,
    /// The column.
    pub column: u32,
    /// A/mm².
    pub per_area: f64,
}

/// The flux of one field.
#[derive(Debug, Clone)]
pub struct Equilibrated {
    /// Per element: what leaves through each edge.
    pub flux: Vec<[f64; 3]>,
    /// Per triangle: its part of (upper - lower) bound.
    pub indicator: Vec<f64>,
}

/// Elements handled together; fans on the border of two chunks are built twice.
const CHUNK: usize = 1536;

/// The flux of a single field without loads, and the defect per triangle.
pub fn equilibrated(mesh: &Mesh, complex: &Complex, field: &Field) -> Equilibrated {
    let (flux, indicator) = fluxes(mesh, complex, field, &[]);
    Equilibrated { flux: flux.chunks_exact(3).map(|f| [f[0], f[1], f[2]]).collect(), indicator }
}

/// The fluxes of all columns (three rows of them per element), and per triangle the sum of their defects.
fn fluxes(mesh: &Mesh, complex: &Complex, field: &Field, loads: &[Load]) -> (Vec<f64>, Vec<f64>) {
    type Part = (Vec<f64>, Vec<(u32, f64)>);
    let parts: Vec<Part> = chunks(complex)
        .into_par_iter()
        .map(|range| {
            let chunk = Chunk::new(mesh, complex, field, loads, range);
            let mut indicator = Vec::with_capacity(chunk.range.len());
            chunk.defects(|triangle, rows| indicator.push((triangle, rows.iter().map(|r| r * r).sum())));
            (chunk.flux, indicator)
        })
        .collect();
    let mut flux = Vec::with_capacity(3 * complex.elements.len() * field.width);
    let mut indicator = vec![0.0; mesh.triangles.len()];
    for (part, defects) in parts {
        flux.extend(part);
        for (t, eta) in defects {
            indicator[t as usize] += eta;
        }
    }
    (flux, indicator)
}

/// The Gram matrix of the defects of all columns: upper minus lower bound as a quadratic form of the columns' weights. `loads` are sorted by element.
pub fn gram(mesh: &Mesh, complex: &Complex, field: &Field, loads: &[Load]) -> Dense {
    let mut total = Dense::zeros(field.width, field.width);
    // A few chunks at a time bound the memory; they are added in order, so the sum does not depend on threads.
    for batch in chunks(complex).chunks(16) {
        let parts: Vec<Dense> = batch
            .par_iter()
            .map(|range| {
                let mut part = Dense::zeros(field.width, field.width);
                let mut pending = Vec::new();
                Chunk::new(mesh, complex, field, loads, range.clone()).defects(|_, rows| {
                    pending.extend_from_slice(rows);
                    if pending.len() > 1 << 15 {
                        part.add_gram(&pending);
                        pending.clear();
                    }
                });
                part.add_gram(&pending);
                part
            })
            .collect();
        for part in &parts {
            total.accumulate(part);
        }
    }
    total.mirror();
    total
}

/// Per triangle: the sum over some combinations of the columns (their weights) of the square of the combined defect. `loads` are sorted by element.
pub fn weighted_indicators(mesh: &Mesh, complex: &Complex, field: &Field, loads: &[Load], combinations: &[Vec<f64>]) -> Vec<f64> {
    let combined = |load: &Load| -> Vec<Load> {
        let weights = combinations.iter().map(|w| w[load.column as usize]).enumerate();
        weights.map(|(c, w)| Load { element: load.element, column: c as u32, per_area: w * load.per_area }).collect()
    };
    let loads: Vec<Load> = loads.iter().flat_map(combined).collect();
    fluxes(mesh, complex, &field.combined(combinations), &loads).1
}

/// The local mass matrix of the edge fluxes, times 1 / conductance: entry (i, j) is ∫ w_i . w_j with w_i = (p - p_i) / (2 |T|).
pub fn flux_mass(corners: [Point; 3], conductance: f64) -> [[f64; 3]; 3] {
    let area = 0.5 * (corners[1] - corners[0]).cross(corners[2] - corners[0]);
    let middle = (corners[0] + corners[1] + corners[2]) * (1.0 / 3.0);
    let from = corners.map(|p| middle - p);
    let spread = from.iter().map(|v| v.dot(*v)).sum::<f64>() / 12.0;
    let scale = 1.0 / (4.0 * area * conductance);
    [0, 1, 2].map(|i| [0, 1, 2].map(|j| (from[i].dot(from[j]) + spread) * scale))
}

fn chunks(complex: &Complex) -> Vec<Range<usize>> {
    let n = complex.elements.len();
    (0..n).step_by(CHUNK).map(|from| from..(from + CHUNK).min(n)).collect()
}

/// The fluxes of a stretch of elements, for all columns.
struct Chunk<'a> {
    mesh: &'a Mesh,
    complex: &'a Complex,
    field: &'a Field,
    range: Range<usize>,
    /// Three rows of all columns per element.
    flux: Vec<f64>,
}

impl<'a> Chunk<'a> {
    fn new(mesh: &'a Mesh, complex: &'a Complex, field: &'a Field, loads: &[Load], range: Range<usize>) -> Self {
        let width = field.width;
        let mut chunk = Self { mesh, complex, field, flux: vec![0.0; 3 * range.len() * width], range: range.clone() };
        let mut fans: Vec<u32> = complex.fan_of[3 * range.start..3 * range.end].iter().copied().filter(|&f| f != NONE).collect();
        fans.sort_unstable();
        fans.dedup();
        let lines = LinesByLink::new(complex);
        let mut work = Work::default();
        for fan in fans {
            let corners = &complex.fans[complex.fan_starts[fan as usize] as usize..complex.fan_starts[fan as usize + 1] as usize];
            chunk.add_fan(corners, loads, &lines, &mut work);
        }
        chunk
    }

    fn add_fan(&mut self, corners: &[u32], loads: &[Load], lines: &LinesByLink, work: &mut Work) {
        let (complex, field, width) = (self.complex, self.field, self.field.width);
        work.reset(corners.len(), width);
        for (i, &corner) in corners.iter().enumerate() {
            let (element, a) = (corner as usize / 3, corner as usize % 3);
            let (b, c) = ((a + 1) % 3, (a + 2) % 3);
            let leaf = complex.elements[element].leaf;
            let points = self.mesh.corners(complex.elements[element].triangle as usize);
            let pairs = conduction(points, leaf.conductance);
            let u = complex.unknowns[element].map(|u| &field.at(u as usize)[..width]);
            let (ua, ub, uc) = (u[a], u[b], u[c]);
            let mass = flux_mass(points, leaf.conductance);
            let spread = mass[b][b] + mass[c][c] - 2.0 * mass[b][c];
            work.inverse[i] = 1.0 / spread;
            work.spokes[i] = [b, c].map(|k| work.spoke(complex.link_of[element][k], &complex.links));
            let demand = &mut work.demand[i * width..(i + 1) * width];
            let through = &mut work.through[i * width..(i + 1) * width];
            let (wb, wc) = ((mass[b][b] - mass[b][c]) / spread, (mass[c][c] - mass[b][c]) / spread);
            for col in 0..width {
                // Half the flux of -g grad phi through the edges opposite b and c: the interpolation of psi times it.
                let kb = pairs[a] * (uc[col] - ub[col]) + pairs[c] * (ua[col] - ub[col]);
                let kc = pairs[a] * (ub[col] - uc[col]) + pairs[b] * (ua[col] - uc[col]);
                demand[col] = kb + kc;
                through[col] = wb * kb - wc * kc;
            }
            self.exchange_demand(element, a, points, demand);
            let area = 0.5 * (points[1] - points[0]).cross(points[2] - points[0]);
            let from = loads.partition_point(|l| (l.element as usize) < element);
            for load in loads[from..].iter().take_while(|l| l.element as usize == element) {
                demand[load.column as usize] += load.per_area * area / 3.0;
            }
            for col in 0..width {
                through[col] += wc * demand[col];
            }
        }
        work.given.resize(work.links.len() * width, 0.0);
        self.line_demand(corners, lines, work);
        work.balance(width);
        for (i, &corner) in corners.iter().enumerate() {
            let (element, a) = (corner as usize / 3, corner as usize % 3);
            if self.range.contains(&element) {
                let (b, c) = ((a + 1) % 3, (a + 2) % 3);
                let base = 3 * (element - self.range.start) * width;
                let (through, demand) = (&work.through[i * width..(i + 1) * width], &work.demand[i * width..(i + 1) * width]);
                let far = &mut self.flux[base + b * width..base + (b + 1) * width];
                far.iter_mut().zip(through).for_each(|(f, t)| *f += t);
                let near = &mut self.flux[base + c * width..base + (c + 1) * width];
                near.iter_mut().zip(demand.iter().zip(through)).for_each(|(f, (d, t))| *f += d - t);
            }
        }
    }

    /// Takes the linear exchange that leaves an element, weighted with the hat of corner `a`, from what the fluxes have to carry away.
    fn exchange_demand(&self, element: usize, a: usize, points: [Point; 3], demand: &mut [f64]) {
        let area = 0.5 * (points[1] - points[0]).cross(points[2] - points[0]);
        for &i in self.complex.exchanges(element) {
            let x = &self.complex.area_exchanges[i as usize];
            let sign = if x.ends[0] == End::Leaf(element as u32) { 1.0 } else { -1.0 };
            let weight = sign * x.per_area * area / 12.0;
            for k in 0..3 {
                let (from, to) =
                    (self.field.at(self.complex.unknown_at(x.ends[0], k)), self.field.at(self.complex.unknown_at(x.ends[1], k)));
                let w = if k == a { 2.0 * weight } else { weight };
                for (d, (f, t)) in demand.iter_mut().zip(from.iter().zip(to)) {
                    *d -= w * (f - t);
                }
            }
        }
    }

    /// What the lines on a closed link take must leave its members together.
    fn line_demand(&self, corners: &[u32], lines: &LinesByLink, work: &mut Work) {
        if lines.sorted.is_empty() {
            return;
        }
        let width = self.field.width;
        let vertex_unknown = |corner: u32| self.complex.unknowns[corner as usize / 3][corner as usize % 3];
        let here = corners.first().map_or(NONE, |&c| vertex_unknown(c));
        for spoke in 0..work.links.len() {
            for &(_, x, side) in lines.on(work.links[spoke]) {
                let x = &self.complex.edge_exchanges[x as usize];
                let [first, second] = self.complex.across_edge(self.mesh, x);
                // Unknowns on this side and on the other one, at this vertex and at the edge's other end.
                let (at, to) = if first[side] == here as usize { (first, second) } else { (second, first) };
                let weight = x.per_length * self.complex.edge_length(self.mesh, x) / 6.0;
                let [at, at_far, to, to_far] = [at[side], at[1 - side], to[side], to[1 - side]].map(|u| self.field.at(u));
                for col in 0..width {
                    work.given[spoke * width + col] += weight * (2.0 * (at[col] - at_far[col]) + to[col] - to_far[col]);
                }
            }
        }
    }

    /// Hands out, element by element and exchange by exchange, rows of all columns whose squares add up to the defect.
    fn defects(&self, mut take: impl FnMut(u32, &[f64])) {
        let width = self.field.width;
        let mut rows = vec![0.0; 3 * width];
        for element in self.range.clone() {
            let Element { triangle, leaf } = self.complex.elements[element];
            if leaf.held.is_none() {
                let points = self.mesh.corners(triangle as usize);
                let pairs = conduction(points, leaf.conductance);
                let u = self.complex.unknowns[element].map(|u| self.field.at(u as usize));
                let root = square_root(flux_mass(points, leaf.conductance));
                let base = 3 * (element - self.range.start) * width;
                let [u0, u1, u2] = u.map(|u| &u[..width]);
                let flux = &self.flux[base..base + 3 * width];
                let (f0, rest) = flux.split_at(width);
                let (f1, f2) = rest.split_at(width);
                let (r0, rest) = rows.split_at_mut(width);
                let (r1, r2) = rest.split_at_mut(width);
                for col in 0..width {
                    let (d01, d12, d20) = (u1[col] - u0[col], u2[col] - u1[col], u0[col] - u2[col]);
                    // The flux of -g grad phi through the edges, as twice what its interpolation has.
                    let e0 = f0[col] - 2.0 * (pairs[2] * d01 - pairs[1] * d20);
                    let e1 = f1[col] - 2.0 * (pairs[0] * d12 - pairs[2] * d01);
                    let e2 = f2[col] - 2.0 * (pairs[1] * d20 - pairs[0] * d12);
                    r0[col] = root[0][0] * e0 + root[1][0] * e1 + root[2][0] * e2;
                    r1[col] = root[1][1] * e1 + root[2][1] * e2;
                    r2[col] = root[2][2] * e2;
                }
                take(triangle, &rows);
            }
            for &i in self.complex.exchanges(element) {
                let x = &self.complex.area_exchanges[i as usize];
                // Counted once: with the first of its leaves.
                let counts = x.ends[0] == End::Leaf(element as u32) || matches!(x.ends[0], End::Pole(_));
                if counts {
                    let weight = (x.per_area * self.mesh.area(triangle as usize) / 12.0).sqrt();
                    let d = |k: usize, col: usize| {
                        self.field.at(self.complex.unknown_at(x.ends[0], k))[col]
                            - self.field.at(self.complex.unknown_at(x.ends[1], k))[col]
                    };
                    for col in 0..width {
                        let d = [d(0, col), d(1, col), d(2, col)];
                        let mean = (d[0] + d[1] + d[2]) / 3.0;
                        for k in 0..3 {
                            rows[k * width + col] = weight * (d[k] - mean);
                        }
                    }
                    take(triangle, &rows);
                }
            }
        }
        // Few lines: each is looked at once per chunk.
        for x in self.complex.edge_exchanges.iter().filter(|x| self.range.contains(&(x.element as usize))) {
            let weight = (x.per_length * self.complex.edge_length(self.mesh, x) / 12.0).sqrt();
            let [near, far] = self.complex.across_edge(self.mesh, x).map(|[near, far]| (self.field.at(near), self.field.at(far)));
            let row: Vec<f64> = (0..width).map(|c| weight * ((near.0[c] - near.1[c]) - (far.0[c] - far.1[c]))).collect();
            take(self.complex.elements[x.element as usize].triangle, &row);
        }
    }
}

/// Lower triangle L with m = L Lᵗ.
fn square_root(m: [[f64; 3]; 3]) -> [[f64; 3]; 3] {
    let mut l = [[0.0; 3]; 3];
    for j in 0..3 {
        let pivot: f64 = m[j][j] - (0..j).map(|k| l[j][k] * l[j][k]).sum::<f64>();
        l[j][j] = pivot.max(0.0).sqrt();
        for i in j + 1..3 {
            let rest: f64 = m[i][j] - (0..j).map(|k| l[i][k] * l[j][k]).sum::<f64>();
            l[i][j] = if l[j][j] > 0.0 { rest / l[j][j] } else { 0.0 };
        }
    }
    l
}

/// Edge exchanges by the links they lie on.
struct LinesByLink {
    /// Link, exchange, and which of its two ends lies there.
    sorted: Vec<(u32, u32, usize)>,
}

impl LinesByLink {
    fn new(complex: &Complex) -> Self {
        let mut sorted: Vec<(u32, u32, usize)> = complex
            .edge_exchanges
            .iter()
            .enumerate()
            .flat_map(|(i, x)| {
                let far = if let FarEnd::Leaf(element, edge) = x.far { Some((element, edge, 1)) } else { None };
                let ends = [Some((x.element, x.edge, 0)), far].into_iter().flatten();
                ends.map(move |(element, edge, side)| (complex.link_of[element as usize][edge as usize], i as u32, side))
            })
            .filter(|(link, ..)| complex.links[*link as usize] == Link::Closed)
            .collect();
        sorted.sort_unstable();
        Self { sorted }
    }

    fn on(&self, link: u32) -> &[(u32, u32, usize)] {
        let from = self.sorted.partition_point(|x| x.0 < link);
        let to = from + self.sorted[from..].partition_point(|x| x.0 == link);
        &self.sorted[from..to]
    }
}

/// Scratch space for one fan.
#[derive(Default)]
struct Work {
    /// The closed links of the fan ("spokes").
    links: Vec<u32>,
    /// Per corner: its two spokes (far side, near side), `NONE` where the link is open.
    spokes: Vec<[u32; 2]>,
    /// Per corner: 1 / (squared norm of a unit of current that passes the corner from spoke to spoke).
    inverse: Vec<f64>,
    /// Per corner: what must leave through its two spokes together.
    demand: Vec<f64>,
    /// Per corner: what leaves through the far spoke.
    through: Vec<f64>,
    /// Per spoke: what its members must give together.
    given: Vec<f64>,
    /// Weights between spokes, and from spokes to where current may leave.
    weights: Vec<f64>,
    ground: Vec<f64>,
    right: Vec<f64>,
}

impl Work {
    fn reset(&mut self, corners: usize, width: usize) {
        self.links.clear();
        self.given.clear();
        self.spokes.resize(corners, [NONE; 2]);
        self.inverse.resize(corners, 0.0);
        for rows in [&mut self.demand, &mut self.through] {
            rows.clear();
            rows.resize(corners * width, 0.0);
        }
    }

    fn spoke(&mut self, link: u32, links: &[Link]) -> u32 {
        if links[link as usize] != Link::Closed {
            return NONE;
        }
        let known = self.links.iter().position(|&l| l == link);
        known.unwrap_or_else(|| {
            self.links.push(link);
            self.links.len() - 1
        }) as u32
    }

    /// Changes what passes each corner, at least cost, so that the members of every spoke agree.
    fn balance(&mut self, width: usize) {
        let n = self.links.len();
        self.weights.clear();
        self.weights.resize(n * n, 0.0);
        self.ground.clear();
        self.ground.resize(n, 0.0);
        self.right.clear();
        self.right.resize(n * width, 0.0);
        self.right.iter_mut().zip(&self.given).for_each(|(r, g)| *r = -g);
        let mut grounded = false;
        for (i, &[far, near]) in self.spokes.iter().enumerate() {
            let (weight, row) = (self.inverse[i], i * width..(i + 1) * width);
            grounded |= far == NONE || near == NONE;
            if far != NONE {
                let p = far as usize;
                self.right[p * width..(p + 1) * width].iter_mut().zip(&self.through[row.clone()]).for_each(|(r, t)| *r += t);
            }
            if near != NONE {
                let q = near as usize;
                let passed = self.demand[row.clone()].iter().zip(&self.through[row]);
                self.right[q * width..(q + 1) * width].iter_mut().zip(passed).for_each(|(r, (d, t))| *r += d - t);
            }
            match (far, near) {
                (NONE, NONE) => {}
                (p, NONE) | (NONE, p) => self.ground[p as usize] += weight,
                (p, q) => {
                    self.weights[p as usize * n + q as usize] += weight;
                    self.weights[q as usize * n + p as usize] += weight;
                }
            }
        }
        // With no way out, the balance of the last spoke follows from the others'; its multiplier is zero.
        self.solve(n, if grounded { n } else { n.saturating_sub(1) }, width);
        for (i, &[far, near]) in self.spokes.iter().enumerate() {
            for (spoke, sign) in [(far, -self.inverse[i]), (near, self.inverse[i])] {
                if spoke != NONE {
                    let from = spoke as usize * width;
                    let rows = self.through[i * width..(i + 1) * width].iter_mut().zip(&self.right[from..from + width]);
                    rows.for_each(|(t, r)| *t += sign * r);
                }
            }
        }
    }

    /// Eliminates the first `m` of `n` spokes of the Laplacian; the right-hand sides become the solution, zero for the others.
    ///
    /// Only weights between spokes and to ground are kept, never diagonals: all are positive and nothing is subtracted, so that needles beside fat
    /// triangles (weights twelve powers of ten apart) lose no digits (Grassmann, Taksar and Heyman 1985).
    fn solve(&mut self, n: usize, m: usize, width: usize) {
        let w = &mut self.weights;
        for j in 0..m {
            let sum = self.ground[j] + w[j * n + j + 1..(j + 1) * n].iter().sum::<f64>();
            let inverse = if sum > 0.0 { 1.0 / sum } else { 0.0 };
            for i in j + 1..n {
                let share = w[j * n + i] * inverse;
                if share > 0.0 {
                    for k in (j + 1..n).filter(|&k| k != i) {
                        w[i * n + k] += share * w[j * n + k];
                    }
                    self.ground[i] += share * self.ground[j];
                    let (done, rest) = self.right.split_at_mut(i * width);
                    rest[..width].iter_mut().zip(&done[j * width..(j + 1) * width]).for_each(|(r, d)| *r += share * d);
                }
            }
            self.ground[j] = inverse;
        }
        self.right[m * width..].fill(0.0);
        for j in (0..m).rev() {
            let (head, done) = self.right.split_at_mut((j + 1) * width);
            let row = &mut head[j * width..];
            for i in j + 1..n {
                let weight = w[j * n + i];
                if weight > 0.0 {
                    let from = (i - j - 1) * width;
                    row.iter_mut().zip(&done[from..from + width]).for_each(|(r, d)| *r += weight * d);
                }
            }
            let inverse = self.ground[j];
            row.iter_mut().for_each(|r| *r *= inverse);
        }
    }
}
