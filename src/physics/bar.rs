//! The metal and joints without what drives them: factored once per mesh, solved for every electrode and meter tip.

use super::network::Layout;
use super::pieces::tip_elements;
use super::plan::Plan;
use super::solution::Fault;
use crate::algebra::{Cholesky, Dense, SymmetricMatrix};
use crate::fem::{self, Complex, Field, Load};
use crate::mesh::Mesh;
use crate::problem::Problem;

/// The metal and joints without what drives them, factored, with one electrode of every piece at zero.
pub struct Bar {
    free: Vec<Option<u32>>,
    matrix: SymmetricMatrix,
    factor: Cholesky,
    /// What a unit of current at each port puts on the unknowns.
    port_loads: Vec<Vec<(usize, f64)>>,
    /// The part of it that is spread over elements (tips).
    pub loads: Vec<Load>,
}

/// All port fields.
pub struct Ports {
    /// Their potentials.
    pub field: Field,
    /// The port matrix: potentials of the ports.
    pub matrix: Dense,
    /// Residual of the solve relative to its right-hand side.
    pub residual: f64,
}

impl Bar {
    /// Assembles and factors.
    pub fn new(problem: &Problem, plan: &Plan, mesh: &Mesh, complex: &Complex, layout: &Layout) -> Result<Self, Vec<Fault>> {
        let mut free = Vec::with_capacity(complex.order());
        let mut positions = Vec::with_capacity(complex.order());
        for u in 0..complex.order() {
            if layout.reference_of.contains(&u) {
                free.push(None);
            } else {
                free.push(Some(positions.len() as u32));
                positions.push(complex.positions[u]);
            }
        }
        let matrix = fem::assembled(mesh, complex, &free);
        let factor = Cholesky::new(&matrix, &positions).map_err(|e| vec![Fault::Numerical(e.to_string())])?;
        let mut port_loads: Vec<Vec<(usize, f64)>> = (0..problem.electrodes.len()).map(|k| vec![(k, 1.0)]).collect();
        let mut loads = Vec::new();
        for elements in tip_elements(problem, plan, mesh, complex) {
            let area_of = |e: usize| mesh.area(complex.elements[e].triangle as usize);
            let area: f64 = elements.iter().map(|&e| area_of(e)).sum();
            let mut load = Vec::new();
            for &e in &elements {
                load.extend((0..3).map(|k| (complex.unknowns[e][k] as usize, area_of(e) / (3.0 * area))));
                if complex.elements[e].leaf.held.is_none() {
                    loads.push(Load { element: e as u32, column: port_loads.len() as u32, per_area: 1.0 / area });
                }
            }
            port_loads.push(load);
        }
        loads.sort_unstable_by_key(|l| (l.element, l.column));
        Ok(Self { free, matrix, factor, port_loads, loads })
    }

    /// Solves, and says how large the residual of the sum of all columns is against its right-hand side.
    fn solved(&self, columns: &[Vec<(usize, f64)>]) -> Result<(Vec<f64>, f64), Vec<Fault>> {
        let order = self.matrix.order();
        let mut right = vec![0.0; order * columns.len()];
        for (c, column) in columns.iter().enumerate() {
            for &(u, w) in column {
                if let Some(row) = self.free[u] {
                    right[c * order + row as usize] += w;
                }
            }
        }
        let sum = |columns: &[f64]| {
            let mut total = vec![0.0; order];
            for column in columns.chunks_exact(order.max(1)) {
                total.iter_mut().zip(column).for_each(|(t, v)| *t += v);
            }
            total
        };
        let wanted = sum(&right);
        self.factor.solve(&mut right).map_err(|e| vec![Fault::Numerical(e.to_string())])?;
        let got = self.matrix.times(&sum(&right));
        let size = wanted.iter().fold(0.0, |m: f64, w| m.max(w.abs()));
        let off = wanted.iter().zip(&got).fold(0.0, |m: f64, (w, g)| m.max((w - g).abs()));
        Ok((right, if size > 0.0 { off / size } else { 0.0 }))
    }

    /// The field of the given port currents.
    pub fn driven(&self, currents: &[f64]) -> Result<Field, Vec<Fault>> {
        let load = self.port_loads.iter().zip(currents).flat_map(|(load, b)| load.iter().map(move |&(u, w)| (u, w * b))).collect();
        let (solution, _) = self.solved(&[load])?;
        Ok(Field::gathered(&solution, 1, &self.free))
    }

    /// The fields of a unit of current at every port, and the port matrix.
    pub fn ports(&self) -> Result<Ports, Vec<Fault>> {
        let width = self.port_loads.len();
        let (solutions, residual) = self.solved(&self.port_loads)?;
        let field = Field::gathered(&solutions, width, &self.free);
        let mut matrix = Dense::zeros(width, width);
        for (i, load) in self.port_loads.iter().enumerate() {
            for &(u, w) in load {
                for (j, v) in field.at(u).iter().enumerate() {
                    // Symmetric but for rounding: both halves.
                    matrix.add(i, j, 0.5 * w * v);
                    matrix.add(j, i, 0.5 * w * v);
                }
            }
        }
        Ok(Ports { field, matrix, residual })
    }
}
