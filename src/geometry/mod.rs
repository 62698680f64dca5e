//! Plane geometry: points, rings whose edges may be arcs, regions by even-odd containment.
//!
//! Lengths are in millimetres, y points up, counter-clockwise is positive.

pub mod clearance;
pub mod corner;
pub mod indexed_region;
pub mod overlap;
pub mod point;
pub mod predicate;
pub mod region;
pub mod ring;
pub mod segment_index;
mod touch;
pub mod validity;

pub use indexed_region::{IndexedRegion, RimPoint};
pub use point::{BoundingBox, Point};
pub use region::{Region, nested_area};
pub use ring::{Ring, Vertex};
pub use segment_index::SegmentIndex;
