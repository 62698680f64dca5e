//! Findings as `result.json`; the only user of `serde_json`.

use serde::Serialize;

/// Pretty JSON with all digits of every number and a line break at the end; a figure that is not finite becomes null.
///
/// # Errors
/// Only when the value cannot be serialised at all.
pub fn json(value: &impl Serialize) -> Result<String, String> {
    serde_json::to_string_pretty(value).map(|text| text + "\n").map_err(|e| e.to_string())
}
