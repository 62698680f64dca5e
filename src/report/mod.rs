//! Findings to bytes: terminal text, JSON, CSV and a report a colleague can read. Writers return; somebody else writes files.

pub mod csv;
pub mod figure;
pub mod inventory;
pub mod json;
pub mod markdown;
pub mod pieces;
pub mod table;
pub mod words;
