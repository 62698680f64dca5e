//! One integration binary: the themes are its modules.

mod bound;
mod commands;
mod convergence;
mod demos;
mod inventory;
mod laws;
mod network;
mod outputs;
mod pictures;
mod published;
mod refusals;
mod support;
