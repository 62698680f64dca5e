//! Small jobs made of numbers that like to coincide, read and solved whole.
#![no_main]

use arbitrary::Unstructured;
use libfuzzer_sys::fuzz_target;

fuzz_target!(|data: &[u8]| {
    let mut choices = Unstructured::new(data);
    let Ok(draw) = choices.ratio(1, 8) else { return };
    let Ok(sheet) = pinchbar_fuzz::job::sheet(&mut choices) else { return };
    if std::env::var_os("SHOW_SHEET").is_some() {
        println!("{sheet}");
    }
    if let Some(reading) = pinchbar_fuzz::read(&sheet, &[]) {
        if std::env::var_os("SHOW_SHEET").is_some() {
            println!("# accepted");
        }
        pinchbar_fuzz::hold_solution(&reading, draw);
    }
});
