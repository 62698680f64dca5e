//! Small dense systems and Gram matrices; the only user of `nalgebra`.

use nalgebra::{DMatrix, DVector};

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
    pub fn add_gram(&mut self, components: &[f64]) {
        let width = self.0.nrows();
        if width == 0 || components.is_empty() {
            return;
        }
        let block = DMatrix::from_column_slice(width, components.len() / width, components);
        self.0.gemm(1.0, &block, &block.transpose(), 1.0);
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
    fn gram_and_form_agree() {
        let mut d = Dense::zeros(2, 2);
        d.add_gram(&[1.0, 2.0, -1.0, 0.5]);
        assert_eq!((d.at(0, 0), d.at(0, 1), d.at(1, 1)), (2.0, 1.5, 4.25));
        assert_eq!(d.form(&[1.0, 1.0], &[1.0, -1.0]), 2.0 - 4.25);
    }
}
