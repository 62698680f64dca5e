//! A first job to edit: a collector plate over round cells, as a commented sheet and outline.

pub mod plate;
pub mod text;

pub use plate::{Order, Plate};
