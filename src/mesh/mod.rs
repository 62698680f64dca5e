//! The triangulation: an arrangement of labelled areas and lines, its conforming triangles, and their bisection.
//!
//! Labels are opaque numbers: an area's or a line's place in the lists handed to [`arrange`].

pub mod arrangement;
pub mod bisect;
pub mod topology;
pub mod triangulate;

pub use arrangement::{Arrangement, Moves, arrange};
pub use bisect::bisected;
pub use topology::{Edges, NONE};
pub use triangulate::{Quality, triangulated};

use crate::geometry::Point;
use std::fmt;
use std::sync::Arc;

/// A conforming triangulation of the kept part of an arrangement. It is never changed; refining gives a new one.
///
/// Promises (see [`Mesh::check`]): every triangle is counter-clockwise with positive area; two triangles share a whole edge,
/// one vertex or nothing; the edge opposite a triangle's first vertex is the one to be bisected next.
#[derive(Debug, Clone)]
pub struct Mesh {
    /// Vertices.
    pub points: Vec<Point>,
    /// Triangles as counter-clockwise vertices.
    pub triangles: Vec<[u32; 3]>,
    /// Per triangle: which cell of the arrangement it lies in.
    pub cells: Vec<u32>,
    /// Edges and their neighbours.
    pub edges: Edges,
    /// Per cell: the areas that cover it, rising.
    pub covers: Arc<Vec<Vec<u32>>>,
    /// Per line label of an edge (see [`Edges::label`]): the lines that run along it, rising.
    pub line_sets: Arc<Vec<Vec<u32>>>,
}

/// Why no mesh could be made.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum MeshFault {
    /// A coordinate is not finite or further than the limit from the middle of the drawing.
    TooFar,
    /// The shapes could not be brought to a consistent arrangement by snapping.
    Unsettled,
    /// More vertices than the limit are needed for the first mesh alone.
    TooLarge(usize),
    /// The triangulation library failed: this is a bug in pinchbar.
    Triangulation(String),
}

impl fmt::Display for MeshFault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::TooFar => write!(f, "a coordinate is further than {} mm from the middle of the drawing", arrangement::FARTHEST_MM),
            Self::Unsettled => {
                write!(f, "the outlines lie so close together in so many places that they could not be snapped to a clean drawing")
            }
            Self::TooLarge(n) => write!(f, "the first mesh alone needs more than {n} vertices"),
            Self::Triangulation(text) => write!(f, "the triangulation failed ({text}): this is a bug in pinchbar"),
        }
    }
}

impl Mesh {
    /// The corners of a triangle.
    pub fn corners(&self, triangle: usize) -> [Point; 3] {
        self.triangles[triangle].map(|v| self.points[v as usize])
    }

    /// Area of a triangle in mm².
    pub fn area(&self, triangle: usize) -> f64 {
        let [a, b, c] = self.corners(triangle);
        0.5 * (b - a).cross(c - a)
    }

    /// The areas that cover a triangle, rising.
    pub fn cover(&self, triangle: usize) -> &[u32] {
        &self.covers[self.cells[triangle] as usize]
    }

    /// The self-check that tests call after every operation: the promises above, or what is broken.
    pub fn check(&self) -> Result<(), String> {
        if self.triangles.len() != self.cells.len() {
            return Err("one cell per triangle".into());
        }
        for t in 0..self.triangles.len() {
            if self.area(t).partial_cmp(&0.0) != Some(std::cmp::Ordering::Greater) {
                return Err(format!("triangle {t} has area {}", self.area(t)));
            }
        }
        self.edges.check(&self.triangles)?;
        // A hanging vertex would lie inside an edge that only one triangle knows: such an edge's length then equals two others' sum.
        let mut ends: Vec<(u32, u32)> = Vec::new();
        for (e, sides) in self.edges.sides.iter().enumerate() {
            if sides[1] == NONE {
                let [a, b] = self.edges.ends[e];
                ends.push((a, b));
                ends.push((b, a));
            }
        }
        ends.sort_unstable();
        for &(a, b) in ends.iter().filter(|(a, b)| a < b) {
            let (pa, pb) = (self.points[a as usize], self.points[b as usize]);
            let from = ends.partition_point(|&(x, _)| x < a);
            for &(_, m) in ends[from..].iter().take_while(|&&(x, _)| x == a) {
                let pm = self.points[m as usize];
                let on_line = (pb - pa).cross(pm - pa) == 0.0 && m != b && (pm - pa).dot(pm - pb) < 0.0;
                if on_line && ends.binary_search(&(m, b)).is_ok() {
                    return Err(format!("vertex {m} hangs in edge {a}-{b}"));
                }
            }
        }
        Ok(())
    }
}
