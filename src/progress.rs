//! The stages of a job, told while they run, so that whoever waits can be shown where the work is.

/// Where the work is.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Stage {
    /// The sheet and its outlines are read.
    Reading,
    /// A mesh is solved and its loss enclosed.
    Round {
        /// Counted from 1.
        number: usize,
        /// Triangles of the mesh.
        triangles: usize,
        /// Width of the loss's interval in parts of the loss, as the round before left it.
        gap: Option<f64>,
    },
    /// Places where current crowds are resolved.
    Hotspots,
    /// The picture is drawn.
    Drawing,
}

/// Who is told; called between the stages, never in the inner loops.
pub type Listener<'a> = dyn Fn(Stage) + Sync + 'a;
