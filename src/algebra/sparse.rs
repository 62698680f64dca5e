//! Symmetric sparse matrices, built from triplets of their lower triangle; the only user of `nalgebra-sparse`.

use nalgebra_sparse::{CooMatrix, CscMatrix};

/// Entries to be added up.
pub struct Triplets {
    entries: CooMatrix<f64>,
}

impl Triplets {
    /// No entries yet of a matrix of this order.
    pub fn new(order: usize) -> Self {
        Self { entries: CooMatrix::new(order, order) }
    }

    /// Adds a value to the entries (i, j) and (j, i).
    pub fn add(&mut self, i: usize, j: usize, value: f64) {
        self.entries.push(i.max(j), i.min(j), value);
    }
}

/// A symmetric matrix, its lower triangle stored by columns with rising rows.
#[derive(Debug, Clone)]
pub struct SymmetricMatrix {
    lower: CscMatrix<f64>,
}

impl From<Triplets> for SymmetricMatrix {
    fn from(triplets: Triplets) -> Self {
        Self { lower: CscMatrix::from(&triplets.entries) }
    }
}

impl SymmetricMatrix {
    /// Number of rows.
    pub fn order(&self) -> usize {
        self.lower.nrows()
    }

    /// The lower triangle as (column starts, row numbers, values).
    pub fn lower(&self) -> (&[usize], &[usize], &[f64]) {
        self.lower.csc_data()
    }

    /// The product with a vector.
    pub fn times(&self, x: &[f64]) -> Vec<f64> {
        let (starts, rows, values) = self.lower();
        let mut y = vec![0.0; x.len()];
        for j in 0..self.order() {
            let mut own = 0.0;
            for k in starts[j]..starts[j + 1] {
                let i = rows[k];
                own += values[k] * x[i];
                if i != j {
                    y[i] += values[k] * x[j];
                }
            }
            y[j] += own;
        }
        y
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn entries_add_up_and_multiply_on_both_sides() {
        let mut t = Triplets::new(3);
        for (i, j, v) in [(0, 0, 2.0), (0, 1, -1.0), (1, 0, -0.5), (1, 1, 3.0), (2, 2, 1.0), (2, 1, -1.0)] {
            t.add(i, j, v);
        }
        let m = SymmetricMatrix::from(t);
        assert_eq!(m.times(&[1.0, 2.0, 3.0]), vec![-1.0, 1.5, 1.0]);
    }
}
