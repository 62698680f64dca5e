//! One integration binary: the themes are its modules.

mod commands;
mod convergence;
mod laws;
mod pictures;
mod published;
mod refusals;
mod support;
