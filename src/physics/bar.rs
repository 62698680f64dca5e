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

#[cfg(test)]
mod tests {
    use super::super::pieces::layout;
    use super::*;
    use crate::fem::CellPlan;
    use crate::mesh::triangulated;
    use crate::reading::read;
    use std::path::Path;

    /// Two sheets in contact, a tee of ports and a meter: the port matrix from the sparse factor is that of a dense inverse, symmetric, with
    /// rows of the full (ungrounded) conductance matrix that add up to zero.
    #[test]
    fn ports_agree_with_a_dense_inverse() {
        let sheet = "[[layer]]\nname = \"a\"\nresistivity_uohm_cm = 9\nthickness_mm = 0.2\npoints_mm = [[0, 0], [30, 0], [30, 6], [0, 6]]\n\
             [[layer]]\nname = \"b\"\nresistivity_uohm_cm = 2\nthickness_mm = 0.1\npoints_mm = [[8, 1], [22, 1], [22, 5], [8, 5]]\n\
             [[contact]]\nbetween = [\"a\", \"b\"]\ncontact_mohm_mm2 = 20\n\
             [[cell]]\nname = \"c\"\nlayer = \"a\"\nspots_mm = [[4, 3]]\ndiameter_mm = 1.5\njoint_mohm = 0.1\ncurrent_a = 3\n\
             [[terminal]]\nname = \"edge\"\nlayer = \"a\"\nline_mm = [[30, 0], [30, 6]]\ncurrent_a = -4\n\
             [[terminal]]\nname = \"pad\"\nlayer = \"b\"\ndisc_mm = [18, 3, 2]\njoint_mohm = 0.02\ncurrent_a = 1\n\
             [[probe]]\nname = \"m\"\nlayer = \"a\"\nlayer_b = \"b\"\ntips_mm = [[2, 1], [20, 4]]\ntip_mm = 0.5\n";
        let problem = read(Path::new("job.toml"), &|_| Ok(sheet.into())).expect("a good sheet").problem;
        let plan = Plan::new(&problem).unwrap();
        let (mesh, _) = triangulated(&plan.drawing().unwrap(), 10_000, &|cover| plan.is_metal(cover)).unwrap();
        let cells: Vec<CellPlan> = mesh.covers.iter().map(|cover| plan.cell(cover).unwrap()).collect();
        let complex = Complex::new(&mesh, &cells, plan.line_plans(), problem.electrodes.len()).unwrap();
        let layout = layout(&problem, &plan, &mesh, &complex).unwrap();
        let bar = Bar::new(&problem, &plan, &mesh, &complex, &layout).unwrap();
        let ports = bar.ports().unwrap();

        let everything: Vec<Option<u32>> = (0..complex.order() as u32).map(Some).collect();
        let full = fem::assembled(&mesh, &complex, &everything);
        let rows = full.times(&vec![1.0; complex.order()]);
        let largest = full.lower().2.iter().fold(0.0, |m: f64, v| m.max(v.abs()));
        assert!(rows.iter().all(|r| r.abs() < 1e-10 * largest), "rows add up to zero");

        let order = bar.matrix.order();
        let mut dense = Dense::zeros(order, order);
        let (starts, numbers, values) = bar.matrix.lower();
        for j in 0..order {
            for k in starts[j]..starts[j + 1] {
                dense.set(numbers[k], j, values[k]);
                dense.set(j, numbers[k], values[k]);
            }
        }
        let width = bar.port_loads.len();
        let mut right = Dense::zeros(order, width);
        for (c, load) in bar.port_loads.iter().enumerate() {
            load.iter().filter_map(|&(u, w)| bar.free[u].map(|row| (row as usize, w))).for_each(|(row, w)| right.add(row, c, w));
        }
        let solution = dense.solve(&right).expect("not singular");
        let scale = (0..width).map(|i| ports.matrix.at(i, i)).fold(0.0, f64::max);
        for i in 0..width {
            for j in 0..width {
                let value: f64 = bar.port_loads[i].iter().filter_map(|&(u, w)| bar.free[u].map(|r| w * solution.at(r as usize, j))).sum();
                assert!((value - ports.matrix.at(i, j)).abs() < 1e-10 * scale, "({i}, {j})");
                assert!((ports.matrix.at(i, j) - ports.matrix.at(j, i)).abs() < 1e-12 * scale);
            }
        }
    }
}
