//! One sheet of the stack: its outline, thickness and metal.

use super::Material;
use crate::geometry::{Region, Ring, nested_area};

/// A sheet. One layer may consist of several pieces.
#[derive(Debug, Clone)]
pub struct Layer {
    /// Its name in the sheet.
    pub name: String,
    /// What it is made of.
    pub material: Material,
    /// Resistivity at the metal's temperature, ohm mm.
    pub resistivity: f64,
    /// Thickness in mm.
    pub thickness_mm: f64,
    /// The outline as drawn (corners rounded where asked), arcs kept; rings nest by containment.
    pub rings: Vec<Ring>,
    /// The flattened outline that is solved.
    pub region: Region,
}

impl Layer {
    /// Sheet conductance in siemens: thickness / resistivity; its inverse is "ohms per square".
    pub fn sheet_conductance(&self) -> f64 {
        self.thickness_mm / self.resistivity
    }
    /// Area in mm², arcs counted as drawn.
    pub fn area_mm2(&self) -> f64 {
        nested_area(&self.rings)
    }
    /// Mass in g; `None` where the metal's density is not known.
    pub fn mass_g(&self) -> Option<f64> {
        self.material.density_g_cm3.map(|d| self.area_mm2() * self.thickness_mm * d * 1e-3)
    }
}
