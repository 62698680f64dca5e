//! Every sample of `shapes/` is solved and its headline compared with the hand value that stands in its comment.

use crate::support::{Figure, attempt, figure, read_file};
use std::path::{Path, PathBuf};

/// What a comment `# headline: figure = value within percent %` promises.
struct Headline {
    of: String,
    value: f64,
    within: f64,
}

/// All that a sheet promises; none where a line cannot be read.
fn headlines(text: &str) -> Option<Vec<Headline>> {
    let lines = text.lines().filter_map(|l| l.strip_prefix("# headline: "));
    let read = |line: &str| {
        let (of, rest) = line.split_once(" = ")?;
        let (value, percent) = rest.split_once(" within ")?;
        let within = percent.trim().strip_suffix('%')?.trim().parse::<f64>().ok()? / 100.0;
        Some(Headline { of: of.into(), value: value.parse().ok()?, within })
    };
    lines.map(read).collect::<Option<Vec<_>>>().filter(|all| !all.is_empty())
}

fn jobs() -> Vec<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("shapes");
    let entries = std::fs::read_dir(&folder).expect("the folder of samples");
    let mut jobs: Vec<PathBuf> =
        entries.map(|e| e.expect("an entry").path()).filter(|p| p.extension().is_some_and(|e| e == "toml")).collect();
    jobs.sort();
    jobs
}

#[test]
fn every_sample_agrees_with_its_hand_value() {
    let jobs = jobs();
    assert!(jobs.len() >= 20, "only {} samples", jobs.len());
    let mut wrong = Vec::new();
    for job in &jobs {
        let name = job.file_stem().map(|n| n.to_string_lossy().into_owned()).unwrap_or_default();
        let text = std::fs::read_to_string(job).expect("a sample");
        let Some(promised) = headlines(&text) else {
            wrong.push(format!("{name}: no headline, or one that cannot be read"));
            continue;
        };
        let found = match attempt(&read_file(job)) {
            Ok(found) => found.findings,
            Err(faults) => {
                wrong.push(format!("{name}: {faults}"));
                continue;
            }
        };
        if !found.run.reached || found.hotspots.is_empty() {
            wrong.push(format!("{name}: reached {}, {} hotspots", found.run.reached, found.hotspots.len()));
        }
        for Headline { of, value, within } in promised {
            let figure = match figure(&found, &of) {
                Some(Figure::Enclosed(e)) => e.value,
                Some(Figure::Plain(v)) => v,
                None => f64::NAN,
            };
            let agrees = (figure - value).abs() <= within * value.abs();
            if !agrees {
                wrong.push(format!("{name}: {of} {figure}, by hand {value}"));
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

/// Cells between the same rows: the leads at opposite ends share better and lose more.
#[test]
fn sharing_and_loss_pull_apart() {
    let solved = |name: &str| {
        let job = Path::new(env!("CARGO_MANIFEST_DIR")).join("shapes").join(name);
        let found = attempt(&read_file(&job)).expect("a sample").findings;
        let largest = found.electrodes.iter().filter(|e| e.kind == "cell").map(|e| e.current_a).fold(0.0, f64::max);
        (largest, found.loss_w)
    };
    let (same, opposite) = (solved("corner-lead-same-end.toml"), solved("corner-lead-opposite.toml"));
    assert!(same.0 > 1.5 * opposite.0, "{} A and {} A", same.0, opposite.0);
    assert!(same.1.high < opposite.1.low, "{:?} and {:?}", same.1, opposite.1);
}

/// One spot of four: the currents and the group's voltage hardly move, the reading on the joint does.
#[test]
fn a_weak_joint_shows_only_on_the_joint() {
    let solved = |name: &str| {
        let job = Path::new(env!("CARGO_MANIFEST_DIR")).join("shapes").join(name);
        attempt(&read_file(&job)).expect("a sample").findings
    };
    let (sound, weak) = (solved("five-sound-cans.toml"), solved("one-weak-can.toml"));
    let of = |findings, name: &str| match figure(findings, name) {
        Some(Figure::Enclosed(e)) => e.value,
        _ => f64::NAN,
    };
    let part = |name: &str| of(&weak, name) / of(&sound, name);
    assert!((part("electrodes.next group.voltage_mv") - 1.0).abs() < 0.0005);
    for cell in ["C1", "C2", "C3", "C4", "C5"] {
        let name = format!("electrodes.{cell}.current_a");
        assert!((part(&name) - 1.0).abs() < 0.02, "{name}: {}", part(&name));
    }
    assert!(part("probes.joint 3.drop_mv") > 5.0 && (part("probes.joint 2.drop_mv") - 1.0).abs() < 0.05);
}

/// `outputs-demo/` shows what the tool prints for the samples. `PINCHBAR_RENEW=1 cargo test --release demos` makes it anew.
#[test]
fn the_outputs_shown_are_those_of_today() {
    let shown = Path::new(env!("CARGO_MANIFEST_DIR")).join("outputs-demo");
    let renew = std::env::var_os("PINCHBAR_RENEW").is_some();
    let fresh = std::env::temp_dir().join(format!("pinchbar-demos-{}", std::process::id()));
    let mut stale = Vec::new();
    for job in jobs() {
        let name = job.file_stem().map(|n| n.to_string_lossy().into_owned()).unwrap_or_default();
        let out = if renew { shown.join(&name) } else { fresh.join(&name) };
        let run =
            std::process::Command::new(env!("CARGO_BIN_EXE_pinchbar")).arg("map").arg(&job).arg("--quiet").arg("--out").arg(&out).output();
        assert!(run.expect("the tool runs").status.code().is_some_and(|c| c < 2), "{name}");
        if !renew {
            let read = |folder: &Path, file: &str| std::fs::read(folder.join(&name).join(file)).unwrap_or_default();
            if ["heatmap.png", "report.md", "welds.csv", "hotspots.csv"].iter().any(|f| read(&shown, f).is_empty())
                || !alike(&read(&shown, "result.json"), &read(&fresh, "result.json"))
            {
                stale.push(name);
            }
        }
    }
    let _ = std::fs::remove_dir_all(&fresh);
    assert!(stale.is_empty(), "renew with PINCHBAR_RENEW=1 and look at the pictures: {stale:?}");
}

/// Not byte by byte: another processor may round a last digit and refine one triangle more.
fn alike(shown: &[u8], fresh: &[u8]) -> bool {
    let parsed = |bytes: &[u8]| serde_json::from_slice::<serde_json::Value>(bytes).unwrap_or_default();
    let (a, b) = (parsed(shown), parsed(fresh));
    let near = |x: &serde_json::Value, y: &serde_json::Value, part: f64| match (x.as_f64(), y.as_f64()) {
        (Some(x), Some(y)) => (x - y).abs() <= part * x.abs().max(y.abs()),
        _ => false,
    };
    let rows = |v: &serde_json::Value| v["hotspots"].as_array().cloned().unwrap_or_default();
    a["title"] == b["title"]
        && near(&a["loss_w"]["value"], &b["loss_w"]["value"], 1e-3)
        && a["electrodes"].as_array().map(Vec::len) == b["electrodes"].as_array().map(Vec::len)
        && rows(&a).len() == rows(&b).len()
        && rows(&a).iter().zip(&rows(&b)).all(|(x, y)| x["kind"] == y["kind"] && near(&x["peak_a_mm2"], &y["peak_a_mm2"], 0.03))
}
