//! Conforming newest-vertex bisection: marked triangles to a finer mesh.
//!
//! Every marked triangle is cut across its bisection edge (opposite its first vertex) and both halves once more, so that all its three edges
//! are halved. Closure: a triangle with any halved edge has its bisection edge halved too. That ends, because there are finitely many edges,
//! and leaves no hanging vertex (Bänsch 1991; Mitchell 1991; the edge-marking form of Chen 2009).

use super::{Edges, Mesh, NONE};

/// The mesh in which every marked triangle has all three edges halved, and its neighbours as many as conformity needs; with every triangle's parent.
pub fn bisected(mesh: &Mesh, marked: &[bool]) -> (Mesh, Vec<u32>) {
    let edges = &mesh.edges;
    let mut halved = vec![false; edges.ends.len()];
    let mut stack = Vec::new();
    let halve = |edge: u32, halved: &mut Vec<bool>, stack: &mut Vec<u32>| {
        if !halved[edge as usize] {
            halved[edge as usize] = true;
            stack.push(edge);
        }
    };
    for t in (0..mesh.triangles.len()).filter(|&t| marked[t]) {
        for edge in edges.of_triangle[t] {
            halve(edge, &mut halved, &mut stack);
        }
        while let Some(edge) = stack.pop() {
            for side in edges.sides[edge as usize].into_iter().filter(|&s| s != NONE) {
                halve(edges.of_triangle[side as usize / 3][0], &mut halved, &mut stack);
            }
        }
    }
    let mut points = mesh.points.clone();
    let mut middle = vec![NONE; edges.ends.len()];
    for (e, &[a, b]) in edges.ends.iter().enumerate() {
        if halved[e] {
            middle[e] = points.len() as u32;
            points.push(mesh.points[a as usize].midpoint(mesh.points[b as usize]));
        }
    }
    let mut triangles = Vec::with_capacity(mesh.triangles.len() * 3 / 2);
    let mut parents = Vec::with_capacity(mesh.triangles.len() * 3 / 2);
    for (t, &[a, b, c]) in mesh.triangles.iter().enumerate() {
        let [m, mb, mc] = edges.of_triangle[t].map(|e| middle[e as usize]);
        if m == NONE {
            triangles.push([a, b, c]);
        } else if mb != NONE && mc != NONE {
            // Four similar triangles, each with its bisection edge along the parent's.
            triangles.extend([[a, mc, mb], [mc, b, m], [mb, m, c], [m, mb, mc]]);
        } else {
            // The halves [m, a, b] and [m, c, a] carry the parent's other edges opposite their first vertex.
            if mc == NONE {
                triangles.push([m, a, b]);
            } else {
                triangles.extend([[mc, m, a], [mc, b, m]]);
            }
            if mb == NONE {
                triangles.push([m, c, a]);
            } else {
                triangles.extend([[mb, m, c], [mb, a, m]]);
            }
        }
        parents.resize(triangles.len(), t as u32);
    }
    let mut finer = Edges::new(points.len(), &triangles);
    if !mesh.line_sets.is_empty() {
        carry_labels(mesh, &middle, &mut finer);
    }
    let cells = parents.iter().map(|&t| mesh.cells[t as usize]).collect();
    (Mesh { points, triangles, cells, edges: finer, covers: mesh.covers.clone(), line_sets: mesh.line_sets.clone() }, parents)
}

/// Both halves of a labelled edge carry its label.
fn carry_labels(mesh: &Mesh, middle: &[u32], finer: &mut Edges) {
    let mut wanted: Vec<([u32; 2], u32)> = Vec::new();
    for (e, &label) in mesh.edges.label.iter().enumerate().filter(|(_, l)| **l != NONE) {
        let [a, b] = mesh.edges.ends[e];
        if middle[e] == NONE {
            wanted.push(([a, b], label));
        } else {
            // New vertices have the largest numbers, so the old end comes first.
            wanted.push(([a, middle[e]], label));
            wanted.push(([b, middle[e]], label));
        }
    }
    wanted.sort_unstable();
    for (e, ends) in finer.ends.iter().enumerate() {
        if let Ok(i) = wanted.binary_search_by(|w| w.0.cmp(ends)) {
            finer.label[e] = wanted[i].1;
        }
    }
}
