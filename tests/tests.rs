//! One integration binary: the themes are its modules.

mod convergence;
mod demos;
mod laws;
mod pictures;
mod published;
mod refusals;
mod support;
