//! One integration binary: the themes are its modules.

mod convergence;
mod demos;
mod laws;
mod published;
mod pictures;
mod refusals;
mod support;
