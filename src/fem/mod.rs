//! Linear elements on stacked leaves of a triangulation, the equilibrated flux, and the two-sided bound.
//!
//! Named by mathematics: a *leaf* is a copy of a triangle with a conductance of its own, a *pole* is an unknown potential outside the leaves
//! (an electrode), an *exchange* couples two leaves, or a leaf and a pole, over an area or along an edge. Marks are opaque numbers by which
//! the caller sums things up. What any of this stands for is not known here.

pub mod assemble;
pub mod complex;
pub mod equilibrate;
pub mod field;

pub use assemble::{assembled, conduction};
pub use complex::{CellPlan, Complex, ComplexFault, End, ExchangePlan, FarEnd, Hold, LeafPlan, LinePlan, Link, Touch};
pub use equilibrate::{Equilibrated, Load, equilibrated, flux_mass, gram, weighted_indicators};
pub use field::Field;
