//! Where current crowds in welded collector plates: from an outline and a job sheet to drop, loss and hotspots with guaranteed intervals.
//!
//! Data goes one way, floor by floor; a floor may use any floor above it in this list, never one below:
//!
//! | floor | holds |
//! |---|---|
//! | [`index`], [`diagnostic`], [`quantity`], [`progress`], [`mod@csv`], [`mod@union`] | words: ids, faults with places, units, stages; rows of cells; sets of numbers |
//! | [`geometry`] | points, rings with arcs, regions |
//! | [`problem`], [`mesh`] | the checked statement; the triangulation (they do not know each other) |
//! | [`reading`] | texts to a `Problem`, or all faults at once |
//! | [`algebra`] | sparse matrices and their factors |
//! | [`fem`] | linear elements, equilibrated fluxes, the bracket |
//! | [`physics`] | from a `Problem` to a `Solution` |
//! | [`findings`] | from a `Solution` to what a reader wants to know |
//! | [`picture`] | plain shapes and numbers to a PNG |
//! | [`report`] | findings to bytes |
//! | [`starting`] | a first sheet and outline, as texts to edit (it uses `problem` for the metals, nothing in between) |
//! | [`cli`] | files and terminal |
#![forbid(unsafe_code)]
#![warn(missing_docs)]

pub mod csv;
pub mod diagnostic;
pub mod index;
pub mod progress;
pub mod quantity;
pub mod union;

pub mod geometry;

pub mod mesh;
pub mod problem;

pub mod reading;

pub mod algebra;

pub mod fem;

pub mod physics;

pub mod findings;

pub mod picture;
pub mod report;

pub mod starting;

pub mod cli;
