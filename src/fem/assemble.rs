//! The matrix of the energy form: conduction in the leaves, exchange over areas and along edges.

use super::Complex;
use crate::algebra::{SymmetricMatrix, Triplets};
use crate::geometry::Point;
use crate::mesh::Mesh;

/// Entries of conductance * ∫ ∇λi . ∇λj over a triangle: those of the pairs opposite each corner, (1,2), (2,0), (0,1). The diagonal follows, rows sum to zero.
pub fn conduction(corners: [Point; 3], conductance: f64) -> [f64; 3] {
    let [a, b, c] = corners;
    let (ea, eb, ec) = (c - b, a - c, b - a);
    let scale = conductance / (2.0 * ec.cross(-eb));
    [eb.dot(ec) * scale, ec.dot(ea) * scale, ea.dot(eb) * scale]
}

/// The matrix over the unknowns that are `free`: `free[u]` is the row of unknown u, or `None` where it is zero by definition.
pub fn assembled(mesh: &Mesh, complex: &Complex, free: &[Option<u32>]) -> SymmetricMatrix {
    let mut triplets = Triplets::new(free.iter().flatten().count());
    // All members of a link have the same two unknowns at its ends: added up first, the triplets are a third as many.
    let mut between = vec![(0, 0, 0.0); complex.links.len()];
    for (x, element) in complex.elements.iter().enumerate() {
        if element.leaf.held.is_none() {
            let u = complex.unknowns[x];
            let pairs = conduction(mesh.corners(element.triangle as usize), element.leaf.conductance);
            for k in 0..3 {
                let link = &mut between[complex.link_of[x][k] as usize];
                *link = (u[(k + 1) % 3] as usize, u[(k + 2) % 3] as usize, link.2 + pairs[k]);
            }
        }
    }
    let mut own = vec![0.0; free.len()];
    for (i, j, weight) in between {
        // Two ends on one pole have no difference.
        if i != j {
            own[i] -= weight;
            own[j] -= weight;
            if let (Some(r), Some(s)) = (free[i], free[j]) {
                triplets.add(r as usize, s as usize, weight);
            }
        }
    }
    for (row, value) in free.iter().zip(own) {
        if let Some(r) = row {
            triplets.add(*r as usize, *r as usize, value);
        }
    }
    // Adds weight * (linear form)^2; the form names each unknown once.
    let mut add_square = |rows: &[(usize, f64)], weight: f64| {
        for (m, &(i, a)) in rows.iter().enumerate() {
            for &(j, b) in &rows[..=m] {
                if let (Some(r), Some(s)) = (free[i], free[j]) {
                    triplets.add(r as usize, s as usize, weight * a * b);
                }
            }
        }
    };
    for x in &complex.area_exchanges {
        // ∫ d² = area / 12 (sum of d_k² + (sum of d_k)²)
        let weight = x.per_area * mesh.area(x.triangle as usize) / 12.0;
        let d = [0, 1, 2].map(|k| [(complex.unknown_at(x.ends[0], k), 1.0), (complex.unknown_at(x.ends[1], k), -1.0)]);
        for pair in &d {
            add_square(&merged(pair), weight);
        }
        add_square(&merged(d.as_flattened()), weight);
    }
    for x in &complex.edge_exchanges {
        // ∫ d² = length / 6 (d_1² + d_2² + (d_1 + d_2)²)
        let weight = x.per_length * complex.edge_length(mesh, x) / 6.0;
        let d = complex.across_edge(mesh, x).map(|[near, far]| [(near, 1.0), (far, -1.0)]);
        for pair in &d {
            add_square(&merged(pair), weight);
        }
        add_square(&merged(d.as_flattened()), weight);
    }
    triplets.into()
}

/// A linear form with each unknown named once.
fn merged(terms: &[(usize, f64)]) -> Vec<(usize, f64)> {
    let mut sum: Vec<(usize, f64)> = Vec::with_capacity(terms.len());
    for &(u, w) in terms {
        match sum.iter_mut().find(|t| t.0 == u) {
            Some(t) => t.1 += w,
            None => sum.push((u, w)),
        }
    }
    sum
}
