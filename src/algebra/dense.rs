//! Small dense systems and Gram matrices; the only user of `nalgebra`.

use nalgebra::{DMatrix, DVector};

/// Columns of a Gram matrix that are formed together.
const GRAM_BLOCK: usize = 64;

/// A dense matrix, column by column.
#[derive(Debug, Clone, PartialEq)]
pub struct Dense(DMatrix<f64>);

impl Dense {
    /// All zero.
    pub fn zeros(rows: usize, columns: usize) -> Self {
        Self(DMatrix::zeros(rows, columns))
    }

    /// The entry in a row and column.
    pub fn at(&self, row: usize, column: usize) -> f64 {
        self.0[(row, column)]
    }

    /// Sets the entry in a row and column.
    pub fn set(&mut self, row: usize, column: usize, value: f64) {
        self.0[(row, column)] = value;
    }

    /// Adds to the entry in a row and column.
    pub fn add(&mut self, row: usize, column: usize, value: f64) {
        self.0[(row, column)] += value;
    }

    /// Number of rows.
    pub fn rows(&self) -> usize {
        self.0.nrows()
    }

    /// Adds another matrix of the same shape.
    pub fn accumulate(&mut self, other: &Self) {
        self.0 += &other.0;
    }

    /// Adds the Gram matrix of vectors that are given one component at a time: every `rows()` numbers are one component of all the vectors.
    /// Right of the diagonal's blocks nothing is added: [`Dense::mirror`] does that at the end of all sums.
    pub fn add_gram(&mut self, components: &[f64]) {
        let width = self.0.nrows();
        if width == 0 || components.is_empty() {
            return;
        }
        let block = DMatrix::from_column_slice(width, components.len() / width, components);
        let transposed = block.transpose();
        for from in (0..width).step_by(GRAM_BLOCK) {
            let columns = GRAM_BLOCK.min(width - from);
            let mut part = self.0.view_mut((from, from), (width - from, columns));
            part.gemm(1.0, &block.rows(from, width - from), &transposed.columns(from, columns), 1.0);
        }
    }

    /// Copies what is left of the diagonal to its right.
    pub fn mirror(&mut self) {
        self.0.fill_upper_triangle_with_lower_triangle();
    }

    /// x . M y
    pub fn form(&self, x: &[f64], y: &[f64]) -> f64 {
        DVector::from_column_slice(x).dot(&(&self.0 * DVector::from_column_slice(y)))
    }

    /// Solves for several right-hand sides, the columns of `right`; `None` when the matrix is singular.
    pub fn solve(&self, right: &Self) -> Option<Self> {
        self.0.clone().lu().solve(&right.0).filter(|x| x.iter().all(|v| v.is_finite())).map(Self)
    }

    /// A column as a slice.
    pub fn column(&self, column: usize) -> &[f64] {
        let n = self.0.nrows();
        &self.0.as_slice()[n * column..n * (column + 1)]
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn wide_gram_matrices_are_whole() {
        let width = 2 * GRAM_BLOCK + 5;
        let components: Vec<f64> = (0..3 * width).map(|i| (i as f64 * 0.37).sin()).collect();
        let mut d = Dense::zeros(width, width);
        d.add_gram(&components);
        d.mirror();
        for i in 0..width {
            for j in 0..width {
                let expected: f64 = components.chunks(width).map(|row| row[i] * row[j]).sum();
                assert!((d.at(i, j) - expected).abs() < 1e-14, "({i}, {j})");
            }
        }
    }

    #[test]
    fn gram_and_form_agree() {
        let mut d = Dense::zeros(2, 2);
        d.add_gram(&[1.0, 2.0, -1.0, 0.5]);
        d.mirror();
        assert_eq!((d.at(0, 0), d.at(0, 1), d.at(1, 1)), (2.0, 1.5, 4.25));
        assert_eq!(d.form(&[1.0, 1.0], &[1.0, -1.0]), 2.0 - 4.25);
    }
}
