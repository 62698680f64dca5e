//! The tool as it is called: help, exit status, what goes to stdout and what to stderr, files whole and only our own.

use crate::support::{self, RESULTS};
use std::path::{Path, PathBuf};
use std::process::{Output, Stdio};

fn tool(folder: &Path, arguments: &[&str]) -> Output {
    support::tool(arguments).current_dir(folder).output().expect("the tool starts")
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).expect("UTF-8")
}

fn status(output: &Output) -> i32 {
    output.status.code().expect("an exit status")
}

fn folder() -> tempfile::TempDir {
    tempfile::tempdir().expect("a folder")
}

/// A strip of ten squares: quick to solve, 1 A, 1 mm thick, 2 microohm cm.
fn strip(folder: &Path, more: &str) -> PathBuf {
    let sheet = format!(
        "title = \"Strip\"\n[[layer]]\nname = \"strip\"\nresistivity_uohm_cm = 2.0\nthickness_mm = 1\n\
         points_mm = [[0, 0], [50, 0], [50, 5], [0, 5]]\n\
         [[terminal]]\nname = \"in\"\nlayer = \"strip\"\nline_mm = [[0, 0], [0, 5]]\ncurrent_a = 1\n\
         [[terminal]]\nname = \"out\"\nlayer = \"strip\"\nline_mm = [[50, 0], [50, 5]]\n{more}"
    );
    let path = folder.join("strip.toml");
    std::fs::write(&path, sheet).expect("the sheet is written");
    path
}

fn names(folder: &Path) -> Vec<String> {
    let mut names: Vec<String> =
        std::fs::read_dir(folder).expect("the folder").map(|e| e.expect("an entry").file_name().to_string_lossy().into_owned()).collect();
    names.sort();
    names
}

#[test]
fn help_fits_one_screen_and_the_long_one_carries_the_caution() {
    let here = folder();
    for arguments in [&["-h"][..], &["map", "-h"], &["check", "-h"], &["metals", "-h"], &["start", "-h"]] {
        let output = tool(here.path(), arguments);
        let shown = text(&output.stdout);
        assert_eq!((status(&output), output.stderr.len()), (0, 0), "{arguments:?}");
        assert!(shown.lines().count() <= 24 && shown.contains("Usage: pinchbar"), "{shown}");
        assert!(shown.lines().all(|l| l.chars().count() <= 80), "{shown}");
    }
    let long = text(&tool(here.path(), &["--help"]).stdout);
    for word in ["map", "check", "metals", "start", "CAUTION", "no substitute", "fuse", "Local codes"] {
        assert!(long.contains(word), "{word} is missing from\n{long}");
    }
    let version = text(&tool(here.path(), &["--version"]).stdout);
    assert_eq!(version.trim(), format!("pinchbar {}", env!("CARGO_PKG_VERSION")));
}

#[test]
fn wrong_calls_and_wrong_input_end_with_two_and_leave_stdout_empty() {
    let here = folder();
    let broken = strip(here.path(), "[limits]\ndorp_mv = 3\n");
    std::fs::write(here.path().join("bytes.toml"), [0xff, 0xfe, 0x00]).expect("written");
    let broken = broken.to_string_lossy();
    let calls: [(&[&str], &str); 14] = [
        (&[], "Usage"),
        (&["chekc"], "check"),
        (&["map", "--bracket-percent", "-1"], "bracket-percent"),
        (&["check"], "JOBS"),
        (&["check", "--bracket-percent", "0", "absent.toml"], "bracket-percent"),
        (&["start"], "DIR"),
        (&["start", "new", "--cells", "potato"], "potato"),
        (&["start", "new", "--pitch", "20"], "pitch of 20 mm"),
        (&["start", "new", "--rows", "0"], "--rows"),
        (&["start", "new", "--rows", "3", "--columns", "200"], "divide the pack"),
        (&["map", "absent.toml"], "absent.toml"),
        (&["map", "bytes.toml"], "bytes.toml"),
        (&["map", &broken], "drop_mv"),
        (&["check", &broken], "drop_mv"),
    ];
    for (arguments, part) in calls {
        let output = tool(here.path(), arguments);
        let said = text(&output.stderr);
        assert_eq!((status(&output), text(&output.stdout).as_str()), (2, ""), "{arguments:?}: {said}");
        assert!(said.starts_with("pinchbar: ") && said.contains(part), "{arguments:?}: {said}");
        assert!(!said.contains('\u{1b}'), "colour without a terminal: {said}");
    }
    assert!(!here.path().join("pinchbar-out").exists(), "a refused job leaves nothing behind");
    assert!(!here.path().join("new").exists(), "a refused start leaves nothing behind");
}

#[test]
fn results_go_to_stdout_and_talk_to_stderr() {
    let here = folder();
    strip(here.path(), "");
    let output = tool(here.path(), &["map", "strip.toml"]);
    let (shown, said) = (text(&output.stdout), text(&output.stderr));
    assert_eq!(status(&output), 0, "{said}");
    // Ten squares of 0.02 mohm.
    assert!(shown.contains("mohm") && shown.contains("0.2") && shown.contains("Estimate only"), "{shown}");
    assert!(shown.lines().all(|l| l.chars().count() <= 80) && !shown.contains('\u{1b}'), "{shown}");
    assert!(said.lines().all(|l| l.starts_with("pinchbar: ")) && said.contains("pinchbar-out"), "{said}");
    assert_eq!(names(&here.path().join("pinchbar-out/strip")), RESULTS);

    let quiet = tool(here.path(), &["map", "strip.toml", "--quiet", "--out", "there"]);
    assert_eq!((status(&quiet), text(&quiet.stderr).as_str()), (0, ""));
    assert_eq!(names(&here.path().join("there")), RESULTS);
}

#[test]
fn json_stands_alone_on_stdout_and_is_the_same_as_the_file() {
    let here = folder();
    strip(here.path(), "");
    let output = tool(here.path(), &["map", "strip.toml", "--json"]);
    let value: serde_json::Value = serde_json::from_slice(&output.stdout).expect("JSON and nothing else");
    assert_eq!(names(here.path()), ["strip.toml"], "no files unless asked for");
    let r = &value["resistance_mohm"];
    let (low, high) = (r["low"].as_f64().expect("low"), r["high"].as_f64().expect("high"));
    assert!(low <= 0.2 * (1.0 + 1e-9) && 0.2 <= high * (1.0 + 1e-9), "{low} {high}");
    assert_eq!((value["schema"].as_u64(), value["run"]["reached"].as_bool()), (Some(1), Some(true)));
    assert!(value["run"].get("seconds").is_none(), "times only when asked for: the same bytes on every run");

    let again = tool(here.path(), &["map", "strip.toml", "--json", "--out", "kept", "--threads", "1"]);
    assert_eq!(text(&again.stdout), text(&output.stdout));
    assert_eq!(std::fs::read_to_string(here.path().join("kept/result.json")).expect("the file"), text(&output.stdout));
    let timed: serde_json::Value =
        serde_json::from_slice(&tool(here.path(), &["map", "strip.toml", "--json", "--timings"]).stdout).expect("JSON");
    assert!(timed["run"]["seconds"].is_object());
}

#[test]
fn a_broken_limit_ends_with_one_and_the_results_are_there() {
    let here = folder();
    strip(here.path(), "[limits]\ndrop_mv = 0.15\n");
    let output = tool(here.path(), &["map", "strip.toml", "--out", "there"]);
    assert_eq!(status(&output), 1, "{}", text(&output.stderr));
    assert!(text(&output.stdout).contains("FAIL"));
    assert_eq!(names(&here.path().join("there")), RESULTS);
}

#[test]
fn an_accuracy_out_of_reach_is_said_and_is_no_failure() {
    let here = folder();
    let more = "[[terminal]]\nname = \"side\"\nlayer = \"strip\"\ndisc_mm = [25, 2.5, 1]\ncurrent_a = 1\n[accuracy]\nmax_vertices = 1000\n";
    strip(here.path(), more);
    let output = tool(here.path(), &["map", "strip.toml", "--json", "--bracket-percent", "0.00001"]);
    let value: serde_json::Value = serde_json::from_slice(&output.stdout).expect("JSON");
    assert_eq!((status(&output), value["run"]["reached"].as_bool()), (0, Some(false)));
    assert!(text(&output.stderr).contains("not reached"), "{}", text(&output.stderr));
}

#[test]
fn a_rerun_replaces_our_files_and_leaves_others_alone() {
    let here = folder();
    strip(here.path(), "");
    let there = here.path().join("there");
    std::fs::create_dir(&there).expect("made");
    std::fs::write(there.join("notes.txt"), "mine").expect("written");
    std::fs::write(there.join("result.json"), "stale").expect("written");
    for _ in 0..2 {
        assert_eq!(status(&tool(here.path(), &["map", "strip.toml", "--out", "there"])), 0);
    }
    let mut expected: Vec<String> = RESULTS.map(String::from).to_vec();
    expected.push("notes.txt".into());
    expected.sort();
    assert_eq!(names(&there), expected, "and no temporary files");
    assert_eq!(std::fs::read_to_string(there.join("notes.txt")).expect("kept"), "mine");
    assert!(std::fs::read_to_string(there.join("result.json")).expect("new").starts_with('{'));
}

#[test]
fn a_folder_that_cannot_be_written_is_told_before_the_work() {
    let here = folder();
    strip(here.path(), "");
    // A file in the place of the folder stops even the superuser.
    std::fs::write(here.path().join("taken"), "").expect("written");
    // A folder in the place of a file would stop the renaming half-way.
    std::fs::create_dir_all(here.path().join("half/report.md")).expect("made");
    for out in ["taken", "taken/inner", "half"] {
        let output = tool(here.path(), &["map", "strip.toml", "--out", out]);
        assert_eq!((status(&output), text(&output.stdout).as_str()), (2, ""), "{out}");
        let said = text(&output.stderr);
        assert!(said.starts_with(&format!("pinchbar: cannot write into {out}: ")) && said.contains("remedy: "), "{said}");
        assert!(out == "half" || said.contains("is a file, not a folder"), "{said}");
    }
    assert_eq!(names(&here.path().join("half")), ["report.md"]);
}

#[test]
fn a_closed_pipe_is_no_error() {
    let here = folder();
    strip(here.path(), "");
    for arguments in [&["metals"][..], &["--help"], &["check", "strip.toml"], &["map", "strip.toml", "--quiet", "--json"]] {
        let mut child = support::tool(arguments)
            .current_dir(here.path())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("the tool starts");
        drop(child.stdout.take());
        let output = child.wait_with_output().expect("it ends");
        assert_eq!((status(&output), text(&output.stderr).as_str()), (0, ""), "{arguments:?}");
    }
}

#[test]
fn the_built_in_demo_needs_no_job() {
    let here = folder();
    let output = tool(here.path(), &["map"]);
    let demo = here.path().join("pinchbar-out/demo");
    assert_eq!(names(&demo), RESULTS, "{}", text(&output.stderr));
    let failed = std::fs::read_to_string(demo.join("result.json")).expect("the result").contains("\"FAIL\"");
    assert_eq!(status(&output), i32::from(failed));
    let report = std::fs::read_to_string(demo.join("report.md")).expect("the report");
    assert!(report.starts_with("# ") && report.contains("Estimate only") && report.contains("(heatmap.png)"));
}

#[test]
fn the_files_are_the_same_bytes_on_one_thread_and_on_two() {
    let here = folder();
    let runs = ["1", "2"].map(|n| tool(here.path(), &["map", "--threads", n, "--out", n]));
    assert_eq!(runs[0].stdout, runs[1].stdout);
    assert!(text(&runs[0].stdout).lines().all(|l| l.chars().count() <= 80), "{}", text(&runs[0].stdout));
    for name in RESULTS {
        let [one, two] = ["1", "2"].map(|n| std::fs::read(here.path().join(n).join(name)).expect("a result"));
        assert!(one == two, "{name} differs");
    }
    let welds = std::fs::read_to_string(here.path().join("1/welds.csv")).expect("the weld table");
    assert_eq!(welds.lines().count(), 1 + 3 * 4 + 1, "a header, three cells of four spots, one lug\n{welds}");
}

#[test]
fn a_fault_that_only_the_solving_shows_has_its_place_too() {
    let here = folder();
    // A second piece without an electrode: the outline is valid, the metal hangs on nothing.
    let sheet = strip(here.path(), "");
    let written = std::fs::read_to_string(&sheet).expect("the sheet");
    std::fs::write(here.path().join("two.outline"), "ring\n0 0\n50 0\n50 5\n0 5\nring\n60 0\n70 0\n70 5\n60 5\n").expect("written");
    let points = "points_mm = [[0, 0], [50, 0], [50, 5], [0, 5]]";
    assert!(written.contains(points));
    std::fs::write(&sheet, written.replace(points, "outline = \"two.outline\"")).expect("written");
    let output = tool(here.path(), &["map", "strip.toml"]);
    let said = text(&output.stderr);
    assert_eq!((status(&output), text(&output.stdout).as_str()), (2, ""), "{said}");
    assert!(
        said.starts_with("pinchbar: strip.toml:3:") && said.contains("connected to no electrode") && said.contains("remedy: "),
        "{said}"
    );
    assert!(!here.path().join("pinchbar-out/strip/result.json").exists());
}

#[test]
fn check_shows_what_a_job_holds_and_solves_nothing() {
    let here = folder();
    strip(here.path(), "");
    let output = tool(here.path(), &["check", "strip.toml"]);
    let shown = text(&output.stdout);
    assert_eq!((status(&output), text(&output.stderr).as_str()), (0, ""));
    for part in ["250 mm2", "least web", "5 mm from", "terminal in", "takes the balance"] {
        assert!(shown.contains(part), "{part} is missing from\n{shown}");
    }
    assert_eq!(names(here.path()), ["strip.toml"]);

    std::fs::write(here.path().join("bad.toml"), "title = 3\n").expect("written");
    let both = tool(here.path(), &["check", "bad.toml", "strip.toml", "--json"]);
    let value: serde_json::Value = serde_json::from_slice(&both.stdout).expect("JSON and nothing else");
    assert_eq!(status(&both), 2);
    assert_eq!((value[0]["valid"].as_bool(), value[1]["valid"].as_bool()), (Some(false), Some(true)));
    assert_eq!(value[0]["faults"][0]["line"].as_u64(), Some(1));
    assert_eq!(value[1]["inventory"]["layers"][0]["least_web"]["width_mm"].as_f64(), Some(5.0));
}

#[test]
fn metals_have_a_source_for_every_figure() {
    let here = folder();
    let shown = text(&tool(here.path(), &["metals"]).stdout);
    assert!(shown.contains("nickel-201") && shown.contains("copper-etp"), "{shown}");
    assert!(shown.lines().all(|l| l.chars().count() <= 80), "{shown}");
    let (table, sources) = shown.split_once("\nSources\n").expect("the sources below the table");
    let last = sources.rsplit_once("  [").and_then(|(_, rest)| rest.split_once(']')).expect("a numbered source").0;
    assert!(last.parse::<usize>().is_ok_and(|n| n > 10) && table.contains(&format!("[{last}]")), "{shown}");
    let value: serde_json::Value = serde_json::from_slice(&tool(here.path(), &["metals", "--json"]).stdout).expect("JSON");
    let rows = value.as_array().expect("a list");
    assert!(rows.len() > 20 && rows.iter().all(|r| r["source"].as_str().is_some_and(|s| !s.is_empty())));
}

#[test]
fn a_started_plate_solves_at_once_with_all_its_cells() {
    let calls: [(&[&str], usize); 5] = [
        (&[], 10),
        (&["--rows", "1", "--columns", "1", "--cells", "4680"], 1),
        (&["--rows", "1", "--columns", "6", "--cells", "18650", "--arrange", "staggered"], 6),
        (&["--rows", "6", "--columns", "1", "--cells", "26650", "--pitch", "27"], 6),
        (&["--rows", "2", "--columns", "6", "--arrange", "staggered"], 12),
    ];
    for (more, cells) in calls {
        let here = folder();
        let arguments: Vec<&str> = ["start", "my pack/new"].iter().chain(more).copied().collect();
        let output = tool(here.path(), &arguments);
        let shown = text(&output.stdout);
        assert_eq!((status(&output), text(&output.stderr).as_str()), (0, ""), "{more:?}");
        assert!(shown.contains("written  my pack/new/plate.toml\n") && shown.lines().all(|l| l.chars().count() <= 80), "{shown}");
        assert!(shown.ends_with("next     pinchbar map 'my pack/new/plate.toml'\n"), "{shown}");
        assert_eq!(names(&here.path().join("my pack/new")), ["plate.outline", "plate.toml"]);

        let output = tool(here.path(), &["map", "my pack/new/plate.toml", "--json"]);
        let value: serde_json::Value = serde_json::from_slice(&output.stdout).expect("JSON");
        assert_eq!((status(&output), text(&output.stderr).as_str()), (0, ""), "{more:?}: {}", text(&output.stdout));
        assert_eq!(value["remarks"].as_array().map(Vec::len), Some(0), "{}", value["remarks"]);
        let electrodes = value["electrodes"].as_array().expect("a list");
        let current = |kind: &str| -> Vec<f64> {
            electrodes.iter().filter(|e| e["kind"] == kind).map(|e| e["current_a"].as_f64().expect("a current")).collect()
        };
        let (into, out) = (current("cell"), current("terminal"));
        assert_eq!((into.len(), out.len()), (cells, 1), "{more:?}");
        assert!((into.iter().sum::<f64>() + out[0]).abs() < 1e-9 && into.iter().all(|c| *c > 0.0), "{into:?} {out:?}");
    }
}

#[test]
fn start_never_writes_over_a_file() {
    let here = folder();
    std::fs::create_dir(here.path().join("new")).expect("made");
    std::fs::write(here.path().join("new/plate.outline"), "mine").expect("written");
    std::fs::write(here.path().join("file"), "mine").expect("written");
    for (folder, part) in [("new", "plate.outline is there already"), ("file", "it is a file, not a folder")] {
        let output = tool(here.path(), &["start", folder]);
        let said = text(&output.stderr);
        assert_eq!((status(&output), text(&output.stdout).as_str()), (2, ""), "{said}");
        assert!(said.starts_with("pinchbar: ") && said.contains(part) && said.contains("remedy: "), "{said}");
    }
    assert_eq!(names(&here.path().join("new")), ["plate.outline"]);
    assert_eq!(std::fs::read_to_string(here.path().join("new/plate.outline")).expect("kept"), "mine");

    let output = tool(here.path(), &["start", "json", "--json"]);
    let value: serde_json::Value = serde_json::from_slice(&output.stdout).expect("JSON and nothing else");
    assert_eq!(value["written"].as_array().map(Vec::len), Some(2));
    assert_eq!(text(&tool(here.path(), &["start", "quiet", "--quiet"]).stdout), "");
}

#[test]
fn completions_and_the_manual_are_had_without_installation() {
    let here = folder();
    for (shell, mark) in [("bash", "complete -F"), ("zsh", "#compdef pinchbar"), ("fish", "complete -c pinchbar")] {
        let output = tool(here.path(), &["completions", shell]);
        let shown = text(&output.stdout);
        assert_eq!((status(&output), text(&output.stderr).as_str()), (0, ""), "{shell}");
        assert!(shown.contains(mark) && shown.contains("bracket-percent") && shown.contains("staggered"), "{shown}");
    }
    let page = text(&tool(here.path(), &["manual"]).stdout);
    assert!(page.contains(".TH pinchbar 1") && page.contains("EXIT STATUS"), "{page}");
    for word in ["MAP", "CHECK", "METALS", "START", "CAUTION: LIVE BATTERY WORK", "no substitute", "Local codes"] {
        assert!(page.contains(word), "{word} is missing from\n{page}");
    }
}
