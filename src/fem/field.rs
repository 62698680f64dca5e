//! Values of one or several potential fields at all unknowns.

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

    /// The weighted sum of the columns.
    pub fn combined(&self, weights: &[f64]) -> Self {
        let values = if self.width == 0 {
            Vec::new()
        } else {
            self.values.chunks(self.width).map(|row| row.iter().zip(weights).map(|(v, w)| v * w).sum()).collect()
        };
        Self::single(values)
    }
}
