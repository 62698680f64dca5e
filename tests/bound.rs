//! The upper bound worked out again from the fluxes alone: they conserve current on every triangle, and what they dissipate is the bound.

use crate::support::random::{job, job_of_all_kinds};
use crate::support::run;
use fastrand::Rng;
use pinchbar::fem::{End, FarEnd, Link};
use pinchbar::geometry::Point;
use pinchbar::physics::Solution;
use pinchbar::problem::Drive;

/// Dissipation of the flux, the largest current it loses on a triangle, and the largest it loses between triangles.
fn dissipation(solution: &Solution) -> (f64, f64, f64) {
    let (mesh, complex) = (&solution.mesh, &solution.complex);
    let values = |end: End| [0, 1, 2].map(|k| solution.potential.values[complex.unknown_at(end, k)]);
    let mut left: Vec<f64> = solution.flux.flux.iter().map(|f| f.iter().sum()).collect();
    let mut loss = 0.0;
    for x in &complex.area_exchanges {
        let [a, b] = x.ends.map(values);
        let mean = (0..3).map(|k| a[k] - b[k]).sum::<f64>() / 3.0;
        let conductance = x.per_area * mesh.area(x.triangle as usize);
        loss += conductance * mean * mean;
        for (end, sign) in x.ends.into_iter().zip([1.0, -1.0]) {
            if let End::Leaf(element) = end {
                left[element as usize] += sign * conductance * mean;
            }
        }
    }
    let mut across = vec![0.0; complex.links.len()];
    for (e, element) in complex.elements.iter().enumerate().filter(|(_, e)| e.leaf.held.is_none()) {
        let (corners, flux) = (mesh.corners(element.triangle as usize), solution.flux.flux[e]);
        let area = mesh.area(element.triangle as usize);
        let density = |at: Point| {
            let q = (0..3).fold(Point::default(), |q, k| q + (at - corners[k]) * flux[k]);
            q.dot(q) / (4.0 * area * area)
        };
        // Exact for squares of linear fields: the mean of the three middles of the edges.
        let middles = [0, 1, 2].map(|k| corners[k].midpoint(corners[(k + 1) % 3]));
        loss += area / 3.0 * middles.map(density).iter().sum::<f64>() / element.leaf.conductance;
        (0..3).for_each(|k| across[complex.link_of[e][k] as usize] += flux[k]);
    }
    for x in &complex.edge_exchanges {
        let drops = complex.across_edge(mesh, x).map(|[near, far]| solution.potential.values[near] - solution.potential.values[far]);
        let mean = 0.5 * (drops[0] + drops[1]);
        let conductance = x.per_length * complex.edge_length(mesh, x);
        loss += conductance * mean * mean;
        across[complex.link_of[x.element as usize][x.edge as usize] as usize] -= conductance * mean;
        if let FarEnd::Leaf(element, edge) = x.far {
            across[complex.link_of[element as usize][edge as usize] as usize] += conductance * mean;
        }
    }
    let worst = |list: &mut dyn Iterator<Item = f64>| list.fold(0.0, |m: f64, x| m.max(x.abs()));
    let inside = worst(&mut complex.elements.iter().zip(&left).filter(|(e, _)| e.leaf.held.is_none()).map(|(_, &x)| x));
    let between = worst(&mut complex.links.iter().zip(&across).filter(|(l, _)| matches!(l, Link::Closed)).map(|(_, &x)| x));
    (loss, inside, between)
}

#[test]
fn the_upper_bound_is_what_a_conserving_flux_dissipates() {
    let mut wrong = Vec::new();
    for seed in 8000..8060 {
        let mut rng = Rng::with_seed(seed);
        let problem = if seed % 2 == 0 { job(&mut rng, 0.05) } else { job_of_all_kinds(&mut rng, 0.05) };
        let solution = run(&problem, 5.0);
        let (loss, inside, between) = dissipation(&solution);
        let largest = solution.electrodes.iter().map(|e| e.current.abs()).fold(0.0, f64::max);
        // Where currents are found, the interval of the loss also holds what they may be off.
        let given = problem.electrodes.iter().all(|e| matches!(e.drive, Drive::Current(_) | Drive::Balance));
        if given && (loss / solution.loss.high - 1.0).abs() > 1e-8 || inside > 1e-8 * largest || between > 1e-8 * largest {
            wrong.push(format!("job {seed}: {loss} and {:?}; lost {inside:e} and {between:e} of {largest} A", solution.loss));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}
