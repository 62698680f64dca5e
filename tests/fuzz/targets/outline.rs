//! Any text, read as an outline and as a list of welds.
#![no_main]

use libfuzzer_sys::fuzz_target;

/// The terminals may be off the metal: the outline is read and checked all the same.
const OUTLINE: &str = r#"
layer = [{ name = "drawn", metal = "nickel-201", thickness_mm = 0.2, outline = "text", corner_radius_mm = 0.5 }]
terminal = [
    { name = "in", layer = "drawn", disc_mm = [5, 5, 2], current_a = 1 },
    { name = "out", layer = "drawn", disc_mm = [15, 5, 2] },
]
"#;
const WELDS: &str = r#"
layer = [{ name = "plain", metal = "nickel-201", thickness_mm = 0.2, points_mm = [[-50, -50], [150, -50], [150, 150], [-50, 150]] }]
cell = [{ name = "C", layer = "plain", spots_csv = "text", diameter_mm = 1, joint_mohm = 0.05, current_a = 1 }]
terminal = [{ name = "lug", layer = "plain", line_mm = [[150, -50], [150, 150]] }]
"#;

fuzz_target!(|text: &str| {
    for sheet in [OUTLINE, WELDS] {
        if let Some(reading) = pinchbar_fuzz::read(sheet, &[("text", text)]) {
            let inventory = pinchbar::report::inventory::inventory(&reading.problem, reading.remarks);
            assert!(!pinchbar::report::inventory::text(&inventory).is_empty());
        }
    }
});
