//! The tool as it is used: help, exit status, what goes to stdout and what to stderr, files.

use std::fs;
use std::path::Path;
use std::process::{Command, Output, Stdio};

/// Runs the tool in a folder with options divided by blanks.
fn tool(folder: &Path, options: &str) -> Output {
    Command::new(env!("CARGO_BIN_EXE_pinchbar")).args(options.split_whitespace()).current_dir(folder).output().expect("the tool starts")
}

fn texts(output: &Output) -> (String, String) {
    let text = |bytes: &[u8]| String::from_utf8(bytes.to_vec()).expect("UTF-8");
    (text(&output.stdout), text(&output.stderr))
}

fn folder() -> tempfile::TempDir {
    tempfile::tempdir().expect("a folder")
}

/// A strip of 40 x 10 mm between two lines, 10 A through it; quick, and exact to the last digit.
const STRIP: &str = r#"
title = "strip"
[accuracy]
bracket_percent = 1
[[layer]]
name = "strip"
thickness_mm = 0.2
points_mm = [[0, 0], [40, 0], [40, 10], [0, 10]]
metal = "nickel-201"
[[terminal]]
name = "left"
layer = "strip"
line_mm = [[0, 0], [0, 10]]
current_a = 10
[[terminal]]
name = "right"
layer = "strip"
line_mm = [[40, 0], [40, 10]]
"#;

fn with_strip(more: &str) -> tempfile::TempDir {
    let folder = folder();
    fs::write(folder.path().join("strip.toml"), format!("{STRIP}{more}")).expect("the sheet is written");
    folder
}

fn names(folder: &Path) -> Vec<String> {
    let entries = fs::read_dir(folder).expect("the folder is there");
    let mut names: Vec<String> = entries.map(|e| e.expect("an entry").file_name().into_string().expect("UTF-8")).collect();
    names.sort();
    names
}

#[test]
fn help_and_version_go_to_stdout() {
    let folder = folder();
    for (options, part) in
        [("-h", "metals"), ("--help", "LIVE BATTERY WORK"), ("map --help", "--bracket-percent"), ("--version", "pinchbar ")]
    {
        let output = tool(folder.path(), options);
        let (out, err) = texts(&output);
        assert_eq!((output.status.code(), err.as_str()), (Some(0), ""), "{options}");
        assert!(out.contains(part), "{options}: {out}");
    }
    let (out, _) = texts(&tool(folder.path(), "-h"));
    assert!(out.lines().count() <= 24 && out.lines().all(|l| l.chars().count() <= 100), "{out}");
}

#[test]
fn faults_of_the_command_line_exit_with_two() {
    let folder = folder();
    for options in
        ["", "melt", "map --melt", "map --bracket-percent -1", "map --threads none", "check", "map nowhere.toml", "check nowhere.toml"]
    {
        let output = tool(folder.path(), options);
        let (out, err) = texts(&output);
        assert_eq!((output.status.code(), out.as_str()), (Some(2), ""), "{options}");
        assert!(err.starts_with("pinchbar") || err.contains("Usage: pinchbar"), "{options}: {err}");
    }
    assert!(names(folder.path()).is_empty(), "nothing is written for a fault");
}

#[test]
fn a_fault_of_the_sheet_is_told_with_its_place() {
    let unknown = with_strip("[limits]\ndrop_mw = 3\n");
    let unbalanced =
        with_strip("[[cell]]\nname = \"C\"\nlayer = \"strip\"\nspots_mm = [[20, 5]]\ndiameter_mm = 1\njoint_mohm = 0.1\ncurrent_a = 5\n");
    let sheet = unbalanced.path().join("strip.toml");
    let text = fs::read_to_string(&sheet).expect("the sheet").replace("[40, 10]]\n[[cell", "[40, 10]]\ncurrent_a = 1\n[[cell");
    fs::write(&sheet, text).expect("the sheet is written");
    for (folder, parts) in [(unknown, ["drop_mw", "drop_mv"]), (unbalanced, ["16 A", "current_a"])] {
        let output = tool(folder.path(), "map strip.toml");
        let (out, err) = texts(&output);
        assert_eq!((output.status.code(), out.as_str()), (Some(2), ""), "{err}");
        assert!(err.starts_with("pinchbar: strip.toml:") && err.contains("remedy: "), "{err}");
        assert!(parts.iter().all(|p| err.contains(p)), "{err}");
        assert!(!err.contains('\u{1b}'), "no colour beside a terminal");
    }
}

#[test]
fn the_summary_goes_to_stdout_and_talk_to_stderr() {
    let folder = with_strip("");
    let output = tool(folder.path(), "map strip.toml");
    let (out, err) = texts(&output);
    assert_eq!(output.status.code(), Some(0), "{err}");
    assert!(["strip", "loss", "resistance", "largest drop", "Estimate only"].iter().all(|p| out.contains(p)), "{out}");
    assert!(out.lines().all(|l| l.chars().count() <= 80), "{out}");
    assert!(err.lines().all(|l| l.starts_with("pinchbar: ")) && err.contains("strip"), "{err}");
    let files = names(&folder.path().join("pinchbar-out/strip"));
    for name in ["hotspots.csv", "report.md", "result.json", "welds.csv"] {
        assert!(files.iter().any(|f| f == name), "{name} is not in {files:?}");
    }
    let quiet = texts(&tool(folder.path(), "map strip.toml --quiet"));
    assert_eq!(quiet, (String::new(), String::new()));
}

#[test]
fn json_is_alone_on_stdout_and_in_no_file_unless_asked_for() {
    let folder = with_strip("");
    let output = tool(folder.path(), "map strip.toml --json");
    let json: serde_json::Value = serde_json::from_slice(&output.stdout).expect("JSON and nothing else");
    assert_eq!(names(folder.path()), ["strip.toml"]);
    // 40 mm of nickel 201, 2 mm2, in closed form.
    let rho = json["resistance_mohm"]["value"].as_f64().expect("a figure") / 20.0 * 1e2;
    assert!((8.0..10.5).contains(&rho), "{rho} uohm cm is no nickel");
    let loss = json["loss_w"]["value"].as_f64().expect("a figure");
    assert!((loss - 0.1 * json["resistance_mohm"]["value"].as_f64().expect("a figure")).abs() < 1e-9 * loss, "10 A through it");
    assert_eq!((json["schema"].as_u64(), json["run"]["seconds"].as_object()), (Some(1), None));
    let both = tool(folder.path(), "map strip.toml --json --out results --timings");
    let json: serde_json::Value = serde_json::from_slice(&both.stdout).expect("JSON and nothing else");
    assert!(json["run"]["seconds"]["solve"].as_f64().is_some_and(|s| s >= 0.0));
    assert_eq!(fs::read(folder.path().join("results/result.json")).expect("the file"), both.stdout);
}

#[test]
fn a_broken_limit_exits_with_one_and_writes_the_results() {
    let folder = with_strip("[limits]\ndrop_mv = 1\n");
    let output = tool(folder.path(), "map strip.toml --out results");
    let (out, err) = texts(&output);
    assert_eq!(output.status.code(), Some(1), "{err}");
    assert!(out.contains("FAIL  drop_mv"), "{out}");
    assert!(folder.path().join("results/report.md").is_file());
}

#[test]
fn an_accuracy_out_of_reach_is_said_and_exits_with_zero() {
    let folder = with_strip("[limits]\ndrop_mv = 1000\n");
    let sheet = folder.path().join("strip.toml");
    let text =
        fs::read_to_string(&sheet).expect("the sheet").replace("[[0, 0], [0, 10]]\ncurrent_a", "[[0, 3], [4, 3], [4, 6]]\ncurrent_a");
    fs::write(&sheet, text.replace("bracket_percent = 1\n", "bracket_percent = 1e-7\nmax_vertices = 2000\n"))
        .expect("the sheet is written");
    let output = tool(folder.path(), "map strip.toml --json --quiet");
    let (out, err) = texts(&output);
    assert_eq!(output.status.code(), Some(0), "{err}");
    assert!(err.contains("accuracy asked for was not reached") && out.contains("\"reached\": false"), "{err}");
}

#[test]
fn a_folder_that_cannot_be_written_is_told_before_the_work() {
    let folder = with_strip("");
    fs::write(folder.path().join("taken"), "").expect("a file in the way");
    fs::create_dir_all(folder.path().join("half/report.md")).expect("a folder in the way");
    for out in ["taken", "taken/below", "half"] {
        let output = tool(folder.path(), &format!("map strip.toml --out {out}"));
        let (out_text, err) = texts(&output);
        assert_eq!((output.status.code(), out_text.as_str()), (Some(2), ""), "{err}");
        assert!(err.starts_with(&format!("pinchbar: cannot write into {out}")), "{err}");
    }
    assert_eq!(names(&folder.path().join("half")), ["report.md"]);
}

#[test]
fn a_rerun_replaces_its_own_files_and_leaves_others() {
    let folder = with_strip("");
    let results = folder.path().join("results");
    assert_eq!(tool(folder.path(), "map strip.toml --out results").status.code(), Some(0));
    let first = names(&results);
    fs::write(results.join("notes.txt"), "mine").expect("a file of somebody else");
    fs::write(results.join("welds.csv"), "spoilt").expect("an older result");
    assert_eq!(tool(folder.path(), "map strip.toml --out results").status.code(), Some(0));
    assert_eq!(fs::read_to_string(results.join("notes.txt")).expect("still there"), "mine");
    assert!(fs::read_to_string(results.join("welds.csv")).expect("renewed").starts_with("electrode,kind,group,spot,x_mm,y_mm,current_a"));
    let mut both = first;
    both.push("notes.txt".into());
    both.sort();
    assert_eq!(names(&results), both, "no temporary file stays");
}

#[test]
fn the_demo_has_the_same_bytes_on_any_number_of_threads() {
    let folder = folder();
    let runs = ["1", "2"].map(|n| tool(folder.path(), &format!("map --threads {n} --out threads-{n}")));
    let (summary, err) = texts(&runs[0]);
    assert!(matches!(runs[0].status.code(), Some(0 | 1)), "{err}");
    assert!(summary.lines().all(|l| l.chars().count() <= 80), "{summary}");
    assert_eq!(runs[0].stdout, runs[1].stdout);
    let [one, two] = ["threads-1", "threads-2"].map(|name| folder.path().join(name));
    assert_eq!(names(&one), names(&two));
    for name in names(&one) {
        assert_eq!(fs::read(one.join(&name)).expect("a file"), fs::read(two.join(&name)).expect("a file"), "{name}");
    }
    let welds = fs::read_to_string(one.join("welds.csv")).expect("the weld table");
    assert_eq!(welds.lines().count(), 1 + 3 * 4 + 1, "three cells of four spots, one lug");
    let report = fs::read_to_string(one.join("report.md")).expect("the report");
    assert!(["Estimate only", "heatmap.png", "nickel-201", "0.2 mm"].iter().all(|p| report.contains(p)), "{report}");
}

#[test]
fn a_reader_that_goes_away_is_no_fault() {
    let folder = with_strip("");
    for options in [&["metals"][..], &["map", "strip.toml", "--json"], &["--help"]] {
        let mut child = Command::new(env!("CARGO_BIN_EXE_pinchbar"))
            .args(options)
            .current_dir(folder.path())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("the tool starts");
        drop(child.stdout.take());
        let output = child.wait_with_output().expect("the tool ends");
        assert_eq!((output.status.code(), texts(&output).1.as_str()), (Some(0), ""), "{options:?}");
    }
}

#[test]
fn the_metals_have_sources() {
    let folder = folder();
    let (out, _) = texts(&tool(folder.path(), "metals"));
    assert!(out.contains("nickel-201") && out.contains("copper-etp") && out.contains("resistivity_uohm_cm"), "{out}");
    let rows: Vec<serde_json::Value> = serde_json::from_slice(&tool(folder.path(), "metals --json").stdout).expect("JSON");
    assert!(rows.len() > 20 && rows.iter().all(|r| r["source"].as_str().is_some_and(|s| !s.is_empty()) && r["value"].is_number()));
}
