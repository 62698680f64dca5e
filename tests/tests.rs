//! One integration binary: the themes are its modules.

mod published;
mod refusals;
mod support;
