//! Random jobs.
