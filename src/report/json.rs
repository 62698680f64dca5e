//! Findings as `result.json`; the only user of `serde_json`.

use serde::Serialize;

/// Pretty JSON with all digits of every number and a line break at the end; a figure that is not finite becomes null.
///
/// # Errors
/// Only when the value cannot be serialised at all.
pub fn json(value: &impl Serialize) -> Result<String, String> {
    serde_json::to_string_pretty(value).map(|text| text + "\n").map_err(|e| e.to_string())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn figures_keep_their_digits_and_what_is_not_finite_is_null() {
        let text = json(&[0.1 + 0.2, f64::NAN, f64::INFINITY]).expect("a list can be written");
        assert_eq!(text, "[\n  0.30000000000000004,\n  null,\n  null\n]\n");
    }
}
