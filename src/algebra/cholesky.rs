//! Cholesky factors of sparse symmetric positive definite matrices; the only user of `faer`.

use super::SymmetricMatrix;
use super::dissection::elimination_order;
use faer::dyn_stack::{MemBuffer, MemStack, StackReq};
use faer::linalg::cholesky::llt::factor::{LltError, LltRegularization};
use faer::sparse::linalg::SupernodalThreshold;
use faer::sparse::linalg::cholesky::{CholeskySymbolicParams, LltRef, SymbolicCholesky, SymmetricOrdering, factorize_symbolic_cholesky};
use faer::sparse::{SparseColMatRef, SymbolicSparseColMatRef};
use faer::{Conj, MatMut, Par, Side, perm::PermRef};
use std::fmt;

/// A factored matrix, ready to solve.
///
/// Everything runs on the calling thread: parallel factoring was measured to bring nothing at these sizes.
pub struct Cholesky {
    symbolic: SymbolicCholesky<u32>,
    values: Vec<f64>,
}

/// Why a matrix could not be factored.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum NotPositive {
    /// The pivot of this row (in elimination order) was not positive: some part of the system has nothing to refer to.
    Row(usize),
    /// It needs more memory than there is, or more than 2^31 entries.
    TooLarge,
}

impl fmt::Display for NotPositive {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Row(row) => write!(f, "the system is not positive definite (pivot {row})"),
            Self::TooLarge => write!(f, "the system is too large for the memory"),
        }
    }
}

impl Cholesky {
    /// Factors a matrix whose unknowns lie at `positions` (used for the order of elimination only).
    pub fn new(matrix: &SymmetricMatrix, positions: &[[f64; 2]]) -> Result<Self, NotPositive> {
        let n = matrix.order();
        let (starts, rows, values) = matrix.lower();
        let (full_starts, neighbours) = adjacency(starts, rows);
        let order = elimination_order(&full_starts, &neighbours, positions);
        let mut place = vec![0u32; n];
        for (step, &v) in order.iter().enumerate() {
            place[v as usize] = step as u32;
        }
        let starts: Vec<u32> = starts.iter().map(|&s| s as u32).collect();
        let rows: Vec<u32> = rows.iter().map(|&r| r as u32).collect();
        let pattern = SymbolicSparseColMatRef::new_checked(n, n, &starts, None, &rows);
        let symbolic = factorize_symbolic_cholesky(
            pattern,
            Side::Lower,
            SymmetricOrdering::Custom(PermRef::new_checked(&order, &place, n)),
            // Measured: supernodes pay from the smallest meshes on (8.8 ms against 14.8 ms at 13 000 unknowns).
            CholeskySymbolicParams { supernodal_flop_ratio_threshold: SupernodalThreshold::FORCE_SUPERNODAL, ..Default::default() },
        )
        .map_err(|_| NotPositive::TooLarge)?;
        let mut factor = Vec::new();
        factor.try_reserve_exact(symbolic.len_val()).map_err(|_| NotPositive::TooLarge)?;
        factor.resize(symbolic.len_val(), 0.0);
        let mut memory = memory(symbolic.factorize_numeric_llt_scratch::<f64>(Par::Seq, Default::default()))?;
        symbolic
            .factorize_numeric_llt(
                &mut factor,
                SparseColMatRef::new(pattern, values),
                Side::Lower,
                LltRegularization::default(),
                Par::Seq,
                MemStack::new(&mut memory),
                Default::default(),
            )
            .map_err(|e| match e {
                LltError::NonPositivePivot { index } => NotPositive::Row(index),
            })?;
        Ok(Self { symbolic, values: factor })
    }

    /// Replaces right-hand sides, one after another in `columns`, by the solutions.
    pub fn solve(&self, columns: &mut [f64]) -> Result<(), NotPositive> {
        let n = self.symbolic.nrows();
        if n == 0 {
            return Ok(());
        }
        let count = columns.len() / n;
        let mut memory = memory(self.symbolic.solve_in_place_scratch::<f64>(count, Par::Seq))?;
        LltRef::<'_, u32, f64>::new(&self.symbolic, &self.values).solve_in_place_with_conj(
            Conj::No,
            MatMut::from_column_major_slice_mut(columns, n, count),
            Par::Seq,
            MemStack::new(&mut memory),
        );
        Ok(())
    }
}

fn memory(need: StackReq) -> Result<MemBuffer, NotPositive> {
    MemBuffer::try_new(need).map_err(|_| NotPositive::TooLarge)
}

/// The full adjacency without the diagonal, from the lower triangle.
fn adjacency(starts: &[usize], rows: &[usize]) -> (Vec<usize>, Vec<u32>) {
    let n = starts.len() - 1;
    let mut full = vec![0usize; n + 1];
    for j in 0..n {
        for &i in rows[starts[j]..starts[j + 1]].iter().filter(|&&i| i != j) {
            full[i + 1] += 1;
            full[j + 1] += 1;
        }
    }
    for v in 0..n {
        full[v + 1] += full[v];
    }
    let mut next = full.clone();
    let mut neighbours = vec![0u32; full[n]];
    for j in 0..n {
        for &i in rows[starts[j]..starts[j + 1]].iter().filter(|&&i| i != j) {
            neighbours[next[i]] = j as u32;
            next[i] += 1;
            neighbours[next[j]] = i as u32;
            next[j] += 1;
        }
    }
    (full, neighbours)
}

#[cfg(test)]
mod tests {
    use super::super::Triplets;
    use super::*;

    /// The five-point matrix of a grid with one more unknown tied to all of the first column.
    fn grid(side: usize) -> (SymmetricMatrix, Vec<[f64; 2]>) {
        let n = side * side + 1;
        let mut t = Triplets::new(n);
        let mut at = Vec::new();
        for y in 0..side {
            for x in 0..side {
                let i = y * side + x;
                at.push([x as f64, y as f64]);
                t.add(i, i, 0.01);
                for (j, inside) in [(i + 1, x + 1 < side), (i + side, y + 1 < side), (n - 1, x == 0)] {
                    if inside {
                        t.add(i, i, 1.0);
                        t.add(j, j, 1.0);
                        t.add(i, j, -1.0);
                    }
                }
            }
        }
        at.push([0.0, 0.5 * side as f64]);
        (t.into(), at)
    }

    #[test]
    fn it_solves_small_and_large_systems_to_rounding() {
        for side in [1, 3, 70] {
            let (matrix, at) = grid(side);
            let n = matrix.order();
            let x: Vec<f64> = (0..n).map(|i| (i as f64 * 0.7).sin()).collect();
            let mut b = matrix.times(&x);
            b.extend(matrix.times(&vec![1.0; n]));
            Cholesky::new(&matrix, &at).unwrap().solve(&mut b).unwrap();
            let worst = (0..n).map(|i| (b[i] - x[i]).abs().max((b[n + i] - 1.0).abs())).fold(0.0, f64::max);
            assert!(worst < 1e-10, "{side}: {worst}");
        }
    }

    #[test]
    fn a_system_without_reference_is_told() {
        let mut t = Triplets::new(2);
        for (i, j, v) in [(0, 0, 1.0), (1, 1, 1.0), (0, 1, -1.0)] {
            t.add(i, j, v);
        }
        assert!(matches!(Cholesky::new(&t.into(), &[[0.0; 2]; 2]), Err(NotPositive::Row(_))));
    }
}
