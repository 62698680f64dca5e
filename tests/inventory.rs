//! `pinchbar check` as it is called: faults that only the mesh shows are told with their place, and every job is looked at.

use crate::support::tool;
use std::path::Path;
use std::process::Output;

fn check(folder: &Path, arguments: &[&str]) -> Output {
    tool(&[&["check"], arguments].concat()).current_dir(folder).output().expect("the tool starts")
}

/// Two strips that lap over 5 mm; the terminals stand at the far ends.
fn lap(path: &Path, more: &str) {
    let layer = |name: &str, x: f64| {
        format!(
            "[[layer]]\nname = \"{name}\"\nmetal = \"nickel-201\"\nthickness_mm = 0.2\npoints_mm = [[{x}, 0], [{}, 0], [{}, 8], [{x}, 8]]\n",
            x + 25.0,
            x + 25.0
        )
    };
    let end = |name: &str, layer: &str, x: f64, current: f64| {
        format!("[[terminal]]\nname = \"{name}\"\nlayer = \"{layer}\"\nline_mm = [[{x}, 0], [{x}, 8]]\ncurrent_a = {current}\n")
    };
    let sheet = format!(
        "title = \"Lap\"\n{}{}{}{}{more}",
        layer("lower", 0.0),
        layer("upper", 20.0),
        end("in", "lower", 0.0, 4.0),
        end("out", "upper", 45.0, -4.0)
    );
    std::fs::write(path, sheet).expect("the sheet is written");
}

const JOIN: &str = "[[join]]\nbetween = [\"lower\", \"upper\"]\nspots_mm = [[22.5, 2], [22.5, 6]]\ndiameter_mm = 1\njoint_mohm = 0.05\n";

#[test]
fn strips_that_are_not_joined_are_refused_with_the_place_and_the_next_job_is_still_shown() {
    let here = tempfile::tempdir().expect("a folder");
    lap(&here.path().join("loose.toml"), "");
    lap(&here.path().join("joined.toml"), JOIN);
    let output = check(here.path(), &["loose.toml", "joined.toml"]);
    let (shown, told) = (String::from_utf8_lossy(&output.stdout), String::from_utf8_lossy(&output.stderr));
    assert_eq!(output.status.code(), Some(2));
    assert!(told.contains("add up to 4 A") && told.contains("add up to -4 A") && told.contains("loose.toml:13:8"), "{told}");
    assert!(shown.contains("join of lower and upper") && !shown.contains("NaN"), "{shown}");
    assert!(shown.lines().all(|l| l.chars().count() <= 80), "{shown}");
}

#[test]
fn json_holds_the_same_faults() {
    let here = tempfile::tempdir().expect("a folder");
    lap(&here.path().join("loose.toml"), "");
    lap(&here.path().join("joined.toml"), JOIN);
    let output = check(here.path(), &["loose.toml", "joined.toml", "--json"]);
    let value: serde_json::Value = serde_json::from_slice(&output.stdout).expect("JSON and nothing else");
    assert_eq!(value[0]["faults"].as_array().map(Vec::len), Some(2), "{value}");
    assert_eq!((value[0]["valid"].as_bool(), value[1]["valid"].as_bool()), (Some(false), Some(true)));
    assert_eq!(value[1]["inventory"]["layers"][0]["least_web"]["width_mm"].as_f64(), Some(8.0));
}
