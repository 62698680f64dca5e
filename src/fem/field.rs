//! Values of one or several potential fields at all unknowns.

use rayon::prelude::*;

/// Fields side by side: the value of column `c` at unknown `u` is `values[u * width + c]`.
#[derive(Debug, Clone, PartialEq)]
pub struct Field {
    /// Number of columns.
    pub width: usize,
    /// The values.
    pub values: Vec<f64>,
}

impl Field {
    /// One field.
    pub fn single(values: Vec<f64>) -> Self {
        Self { width: 1, values }
    }

    /// From solutions one after another, in which unknown `u` has the place `place[u]` or is zero (`None`).
    pub fn gathered(solutions: &[f64], width: usize, place: &[Option<u32>]) -> Self {
        let order = solutions.len().checked_div(width).unwrap_or(0);
        let mut values = vec![0.0; place.len() * width];
        for (u, &p) in place.iter().enumerate() {
            if let Some(p) = p {
                for c in 0..width {
                    values[u * width + c] = solutions[c * order + p as usize];
                }
            }
        }
        Self { width, values }
    }

    /// All columns at one unknown.
    pub fn at(&self, unknown: usize) -> &[f64] {
        &self.values[unknown * self.width..(unknown + 1) * self.width]
    }

    /// Weighted sums of the columns, one column each.
    pub fn combined(&self, combinations: &[Vec<f64>]) -> Self {
        let (unknowns, width) = (self.values.len().checked_div(self.width).unwrap_or(0), combinations.len());
        let mut values = vec![0.0; unknowns * width];
        if width > 0 && self.width > 0 {
            let weights: Vec<f64> = (0..self.width).flat_map(|c| combinations.iter().map(move |w| w[c])).collect();
            values.par_chunks_mut(width).zip(self.values.par_chunks(self.width)).with_min_len(1024).for_each(|(sums, row)| {
                for (value, weights) in row.iter().zip(weights.chunks_exact(width)) {
                    sums.iter_mut().zip(weights).for_each(|(s, w)| *s += value * w);
                }
            });
        }
        Self { width, values }
    }
}
