//! Linear algebra without meshes: symmetric sparse matrices, their Cholesky factors, small dense systems.

pub mod cholesky;
pub mod dense;
pub mod dissection;
pub mod sparse;

pub use cholesky::{Cholesky, NotPositive};
pub use dense::Dense;
pub use sparse::{SymmetricMatrix, Triplets};
