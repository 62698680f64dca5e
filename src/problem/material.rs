//! Metals: resistivity over temperature, density, and the built-in table with its sources.

/// A metal as the solver needs it.
#[derive(Debug, Clone, PartialEq)]
pub struct Material {
    /// Name of the table's row, or "own figures".
    pub name: String,
    /// Resistivity and its law.
    pub resistivity: Resistivity,
    /// Density in g/cm³, for the mass; `None` where it is not known.
    pub density_g_cm3: Option<f64>,
}

/// Resistivity over temperature.
#[derive(Debug, Clone, PartialEq)]
pub enum Resistivity {
    /// rho20 (1 + alpha (T - 20 °C)).
    Linear {
        /// At 20 °C, ohm mm.
        at_20: f64,
        /// Per kelvin, referred to 20 °C.
        alpha: f64,
    },
    /// Straight lines between (°C, ohm mm), rising in temperature; the end pieces go on beyond the ends.
    Table(Vec<(f64, f64)>),
}

impl Resistivity {
    /// Resistivity in ohm mm at a temperature in °C.
    pub fn at(&self, celsius: f64) -> f64 {
        match self {
            Self::Linear { at_20, alpha } => at_20 * (1.0 + alpha * (celsius - 20.0)),
            Self::Table(rows) => {
                let upper = rows.iter().position(|r| r.0 >= celsius).unwrap_or(rows.len() - 1).clamp(1, rows.len() - 1);
                let ((t0, r0), (t1, r1)) = (rows[upper - 1], rows[upper]);
                r0 + (r1 - r0) * (celsius - t0) / (t1 - t0)
            }
        }
    }
}
