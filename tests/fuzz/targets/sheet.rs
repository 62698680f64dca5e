//! Any text, read as a job sheet beside a few outlines and a list of welds.
#![no_main]

use libfuzzer_sys::fuzz_target;

const FILES: [(&str, &str); 3] = [
    ("plate.outline", "0 0\n60 0\n60 20\n0 20\ncircle 30 10 5\n"),
    ("link.outline", "unit mm\nring\n0 0\n20 0\n20 8 0.4142\n0 8\n\nring\n30 0\n50 0\n50 8\n30 8\n"),
    ("welds.csv", "x_mm,y_mm,cell,diameter_mm,length_mm,angle_deg\n5,5,A,1,,\n15,5,A,1,,\n5,15,B,0.5,4,45\n"),
];

fuzz_target!(|text: &str| {
    if let Some(reading) = pinchbar_fuzz::read(text, &FILES) {
        let inventory = pinchbar::report::inventory::inventory(&reading.problem, reading.remarks);
        assert!(!pinchbar::report::inventory::text(&inventory).is_empty());
    }
});
