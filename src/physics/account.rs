//! What passes every joint, and where the loss is: sums over the solved fields.

use super::plan::{Mark, Plan};
use super::solution::Passed;
use crate::fem::{self, Complex, End, Equilibrated, Field};
use crate::mesh::Mesh;
use crate::problem::Problem;
use std::collections::BTreeMap;

/// What passes every joint, and the loss of every layer: the mean of the two bounds, so that the parts add up to the middle of the loss.
pub fn account(
    problem: &Problem,
    plan: &Plan,
    mesh: &Mesh,
    complex: &Complex,
    potential: &Field,
    flux: &Equilibrated,
) -> (BTreeMap<Mark, Passed>, Vec<f64>) {
    let mut passed: BTreeMap<Mark, Passed> = BTreeMap::new();
    let value = |end: End, k: usize| potential.values[complex.unknown_at(end, k)];
    for x in &complex.area_exchanges {
        let area = mesh.area(x.triangle as usize);
        let d = [0, 1, 2].map(|k| value(x.ends[0], k) - value(x.ends[1], k));
        let mean = (d[0] + d[1] + d[2]) / 3.0;
        let spread = d.iter().map(|d| (d - mean).powi(2)).sum::<f64>() / 12.0;
        let current = x.per_area * area * mean;
        let mark = plan.marks[x.mark as usize];
        let entry = passed.entry(mark).or_default();
        entry.current += current;
        entry.exchanged += current.abs();
        entry.loss += x.per_area * area * (mean * mean + 0.5 * spread);
        entry.extent += area;
        entry.difference += area * mean;
        if !matches!(mark, Mark::Spot(..)) {
            // A contact with a held patch carries part of that spot's current.
            for (end, sign) in x.ends.into_iter().zip([1.0, -1.0]) {
                if let End::Pole(pole) = end {
                    let holds = complex.of_triangle(x.triangle as usize).filter_map(|e| complex.elements[e].leaf.held);
                    if let Some(hold) = holds.into_iter().find(|h| h.pole == pole) {
                        passed.entry(plan.marks[hold.mark as usize]).or_default().current += sign * current;
                    }
                }
            }
        }
    }
    for x in &complex.edge_exchanges {
        let length = complex.edge_length(mesh, x);
        // + from the outside into the sheet.
        let d = complex.across_edge(mesh, x).map(|[near, far]| potential.values[far] - potential.values[near]);
        let mean = 0.5 * (d[0] + d[1]);
        let entry = passed.entry(plan.marks[x.mark as usize]).or_default();
        entry.current += x.per_length * length * mean;
        entry.exchanged += (x.per_length * length * mean).abs();
        entry.loss += x.per_length * length * (mean * mean + 0.5 * (d[0] - d[1]).powi(2) / 12.0);
        entry.extent += length;
        entry.difference += length * mean;
    }
    let mut layer_loss = vec![0.0; problem.layers.len()];
    for (e, element) in complex.elements.iter().enumerate().filter(|(_, e)| e.leaf.held.is_none()) {
        let corners = mesh.corners(element.triangle as usize);
        let pairs = fem::conduction(corners, element.leaf.conductance);
        let mass = fem::flux_mass(corners, element.leaf.conductance);
        let primal: f64 =
            (0..3).map(|k| -pairs[k] * (value(End::Leaf(e as u32), (k + 1) % 3) - value(End::Leaf(e as u32), (k + 2) % 3)).powi(2)).sum();
        let f = flux.flux[e];
        let dual: f64 = (0..3).map(|i| (0..3).map(|j| f[i] * mass[i][j] * f[j]).sum::<f64>()).sum();
        for (l, layer) in problem.layers.iter().enumerate().filter(|(l, _)| element.leaf.layers >> l & 1 == 1) {
            layer_loss[l] += 0.5 * (primal + dual) * layer.sheet_conductance() / element.leaf.conductance;
        }
        for k in 0..3 {
            if let fem::Link::Open(hold) = complex.links[complex.link_of[e][k] as usize] {
                let entry = passed.entry(plan.marks[hold.mark as usize]).or_default();
                entry.current -= f[k];
                entry.exchanged += f[k].abs();
            }
        }
    }
    (passed, layer_loss)
}
