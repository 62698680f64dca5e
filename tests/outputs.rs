//! The files of a result: the same bytes every time, whole or absent when the tool is killed, refused before the work where they cannot be.

use crate::support::{self, RESULTS};
use std::collections::BTreeMap;
use std::path::Path;
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

/// How the names of files begin that are being written.
const UNFINISHED: &str = ".pinchbar-";

fn tool(arguments: &[&str]) -> Command {
    let mut command = support::tool(arguments);
    command.stdin(Stdio::null()).stdout(Stdio::piped()).stderr(Stdio::piped());
    command
}

fn sample(name: &str) -> String {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("shapes").join(name).to_string_lossy().into_owned()
}

fn names(folder: &Path) -> Vec<String> {
    let entries = std::fs::read_dir(folder).into_iter().flatten();
    entries.filter_map(|e| Some(e.ok()?.file_name().to_string_lossy().into_owned())).collect()
}

/// Every file with its bytes.
fn contents(folder: &Path) -> BTreeMap<String, Vec<u8>> {
    names(folder).into_iter().map(|name| (name.clone(), std::fs::read(folder.join(name)).expect("a file"))).collect()
}

#[test]
fn the_same_bytes_on_any_number_of_threads_and_every_time() {
    // Sheets in contact, bolted sheets with meters, cells as sources.
    for job in ["copper-on-nickel.toml", "loose-lug.toml", "one-weak-can.toml"] {
        let folder = tempfile::tempdir().expect("a folder");
        let mut runs = Vec::new();
        for (run, threads) in ["1", "2", "2"].into_iter().enumerate() {
            let out = folder.path().join(run.to_string());
            let output = tool(&["map", &sample(job), "--threads", threads, "--out", &out.to_string_lossy()]).output().expect("it runs");
            let shown = String::from_utf8(output.stdout).expect("UTF-8");
            runs.push((output.status.code(), shown, contents(&out)));
        }
        assert_eq!(runs[0].2.keys().collect::<Vec<_>>(), RESULTS, "{job}");
        for run in &runs[1..] {
            assert_eq!((run.0, &run.1), (runs[0].0, &runs[0].1), "{job}");
            let differing: Vec<&str> = RESULTS.into_iter().filter(|&name| run.2[name] != runs[0].2[name]).collect();
            assert!(differing.is_empty(), "{job}: {differing:?}");
        }
    }
}

/// When a run is killed.
#[derive(Debug, Clone, Copy)]
enum Moment {
    /// So long after its start.
    After(Duration),
    /// As soon as so many files are being written.
    Writing(usize),
    /// As soon as so many results are in their place.
    Placed(usize),
}

/// Starts a run into the folder, in which older results may stand, and kills it; true when it was still alive.
fn killed(job: &str, out: &Path, moment: Moment, old: &BTreeMap<String, Vec<u8>>) -> bool {
    let mut child = tool(&["map", job, "--quiet", "--out", &out.to_string_lossy()]).spawn().expect("the tool starts");
    let start = Instant::now();
    let due = || match moment {
        Moment::After(time) => start.elapsed() >= time,
        Moment::Writing(count) => names(out).iter().filter(|n| n.starts_with(UNFINISHED)).count() >= count,
        Moment::Placed(count) => {
            let length = |name: &str| std::fs::metadata(out.join(name)).ok().map(|m| m.len());
            let is_new = |name: &str| length(name).is_some_and(|l| old.get(name).is_none_or(|o| o.len() as u64 != l));
            RESULTS.into_iter().filter(|name| is_new(name)).count() >= count
        }
    };
    while !due() && child.try_wait().expect("its state").is_none() {
        std::hint::spin_loop();
    }
    let alive = child.try_wait().expect("its state").is_none();
    child.kill().expect("killed, or gone already");
    child.wait().expect("gone");
    alive
}

#[test]
fn a_killed_run_leaves_whole_files_or_none() {
    let base = tempfile::tempdir().expect("a folder");
    let job = base.path().join("plate.toml").to_string_lossy().into_owned();
    let sheet = |current: f64, title: &str| {
        let text = format!(
            "title = \"{title}\"\n[accuracy]\nbracket_percent = 1\n[[layer]]\nname = \"plate\"\nmetal = \"nickel-201\"\nthickness_mm = 0.2\n\
             points_mm = [[0, 0], [30, 0], [30, 20], [0, 20]]\n\
             [[cell]]\nname = \"C\"\nlayer = \"plate\"\nspots_mm = [[5, 5]]\ndiameter_mm = 1\njoint_mohm = 0.05\ncurrent_a = {current}\n\
             pattern = {{ step_mm = [6, 0], count = 2, row_step_mm = [0, 10], rows = 2 }}\n\
             [[terminal]]\nname = \"lug\"\nlayer = \"plate\"\nline_mm = [[30, 0], [30, 20]]\n"
        );
        std::fs::write(&job, text).expect("the sheet is written");
    };
    let undisturbed = |name: &str| {
        let out = base.path().join(name);
        let start = Instant::now();
        let output = tool(&["map", &job, "--quiet", "--out", &out.to_string_lossy()]).output().expect("it runs");
        assert_eq!(output.status.code(), Some(0), "{}", String::from_utf8_lossy(&output.stderr));
        (contents(&out), start.elapsed())
    };
    sheet(5.0, "The older of two runs");
    let (old, _) = undisturbed("old");
    sheet(7.25, "The newer");
    let (new, whole_time) = undisturbed("new");
    assert!(RESULTS.iter().all(|&name| old[name].len() != new[name].len()), "the two are told apart by their lengths");

    let mut rng = fastrand::Rng::with_seed(5);
    let random = (0..12).map(|_| Moment::After(whole_time.mul_f64(rng.f64())));
    let moments: Vec<Moment> = random.chain((1..=5).map(Moment::Writing)).chain((1..=4).map(Moment::Placed)).collect();
    let mut alive = 0;
    for (run, &moment) in moments.iter().enumerate() {
        let out = base.path().join(format!("run{run}"));
        // Half of the runs find results in their folder.
        let before = if run % 2 == 0 { BTreeMap::new() } else { old.clone() };
        if !before.is_empty() {
            std::fs::create_dir(&out).expect("made");
            before.iter().for_each(|(name, bytes)| std::fs::write(out.join(name), bytes).expect("written"));
        }
        alive += usize::from(killed(&job, &out, moment, &before));
        for (name, bytes) in contents(&out) {
            let known = name.starts_with(UNFINISHED) || before.get(&name) == Some(&bytes) || new.get(&name) == Some(&bytes);
            assert!(known, "{moment:?}: {name} is half-written or foreign");
        }
        assert!(before.keys().all(|name| out.join(name).exists()), "{moment:?}: an older result is gone");

        // What is left of it does not stand in the way of the next run.
        let output = tool(&["map", &job, "--quiet", "--out", &out.to_string_lossy()]).output().expect("it runs");
        assert_eq!(output.status.code(), Some(0), "{moment:?}: {}", String::from_utf8_lossy(&output.stderr));
        let mut after = contents(&out);
        after.retain(|name, _| !name.starts_with(UNFINISHED));
        assert!(after == new, "{moment:?}: the next run gives other files");
    }
    assert!(alive >= 6, "only {alive} of {} runs were killed at work", moments.len());
}

#[test]
fn where_results_cannot_be_written_is_told_before_what_only_the_work_shows() {
    let base = tempfile::tempdir().expect("a folder");
    let job = base.path().join("loose.toml").to_string_lossy().into_owned();
    // The second piece hangs on nothing, which the mesh shows.
    std::fs::write(base.path().join("two.outline"), "0 0\n50 0\n50 5\n0 5\n\n60 0\n70 0\n70 5\n60 5\n").expect("written");
    let text = "[[layer]]\nname = \"strip\"\nmetal = \"nickel-201\"\nthickness_mm = 0.2\noutline = \"two.outline\"\n\
                [[terminal]]\nname = \"in\"\nlayer = \"strip\"\nline_mm = [[0, 0], [0, 5]]\ncurrent_a = 1\n\
                [[terminal]]\nname = \"out\"\nlayer = \"strip\"\nline_mm = [[50, 0], [50, 5]]\n";
    std::fs::write(&job, text).expect("written");
    std::fs::write(base.path().join("file"), "").expect("written");
    for (out, part) in
        [("free", "connected to no electrode"), ("file", "is a file, not a folder"), ("file/below", "is a file, not a folder")]
    {
        let output = tool(&["map", &job, "--out", &base.path().join(out).to_string_lossy()]).output().expect("it runs");
        let said = String::from_utf8(output.stderr).expect("UTF-8");
        assert_eq!((output.status.code(), output.stdout.len()), (Some(2), 0), "{out}: {said}");
        assert!(said.contains(part) && said.matches("pinchbar: ").count() == 1, "{out}: {said}");
    }
}
