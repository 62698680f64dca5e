//! `pinchbar map`: read, solve, find, show.

use super::{Ending, explain, files, late, terminal};
use crate::diagnostic::{Fault, Remark};
use crate::findings::{self, Findings, Verdict};
use crate::problem::Problem;
use crate::reading::{self, Reading};
use crate::report;
use std::collections::BTreeMap;
use std::io;
use std::path::{Path, PathBuf};
use std::time::Instant;

/// The built-in demo: its sheet and the outline it names.
const DEMO: [(&str, &str); 2] = [
    ("post-hole.toml", include_str!("../../shapes/post-hole.toml")),
    ("post-hole.outline", include_str!("../../shapes/post-hole.outline")),
];

/// The files of a result.
const RESULTS: [&str; 5] = ["heatmap.png", "hotspots.csv", "welds.csv", "result.json", "report.md"];

/// What was asked.
pub struct Request<'a> {
    /// The job sheet; `None`: the built-in demo.
    pub job: Option<&'a Path>,
    /// The folder for the results.
    pub out: Option<&'a Path>,
    /// JSON on stdout.
    pub json: bool,
    /// No talk.
    pub quiet: bool,
    /// In place of the sheet's figure.
    pub bracket_percent: Option<f64>,
    /// Wall times into the JSON.
    pub timings: bool,
}

/// Runs the command.
///
/// # Errors
/// When stdout or a result file cannot be written.
pub fn run(request: &Request) -> io::Result<Ending> {
    let mut clock = Clock::start();
    let reading = match read(request) {
        Ok(reading) => reading,
        Err(faults) => return Ok(refused(&faults)),
    };
    clock.lap("read");
    // Before the work: it would be lost in a folder that cannot be written.
    let folder = match folder(request) {
        Ok(folder) => folder,
        Err(text) => {
            terminal::say(&text);
            return Ok(Ending::BadInput);
        }
    };
    let Reading { mut problem, origins, remarks } = reading;
    if let Some(percent) = request.bracket_percent {
        problem.accuracy.bracket = percent / 100.0;
    }
    let found = findings::find(&problem);
    let mut found = match found {
        Ok(found) => found,
        Err(faults) if faults.iter().any(late::is_ours) => {
            faults.iter().for_each(|f| terminal::say(&f.to_string()));
            return Ok(Ending::Failed);
        }
        Err(faults) => return Ok(refused(&faults.iter().map(|f| late::placed(f, &problem, &origins)).collect::<Vec<_>>())),
    };
    clock.lap("solve");
    found.findings.remarks.splice(0..0, remarks);
    let picture = if folder.is_some() { report::figure::heat_map(&problem, &found) } else { Ok(Vec::new()) };
    let picture = picture.map_err(|text| found.findings.remarks.push(Remark::new(format!("No picture: {text}.")))).ok();
    clock.lap("draw");
    let mut findings = found.findings;
    if request.timings {
        findings.run.seconds = Some(clock.laps);
    }
    show(request, &problem, &findings, folder, picture)
}

fn read(request: &Request) -> Result<Reading, Vec<Fault>> {
    match request.job {
        Some(job) => reading::read(job, &files::load),
        None => reading::read(Path::new(DEMO[0].0), &|path| {
            let known = DEMO.iter().find(|(name, _)| Path::new(name) == path);
            known.map(|(_, text)| text.to_string()).ok_or_else(|| io::ErrorKind::NotFound.into())
        }),
    }
}

/// The folder for the results, ready; `None` where only JSON on stdout was asked for.
fn folder(request: &Request) -> Result<Option<files::OutFolder>, String> {
    let path = match (request.out, request.json) {
        (Some(out), _) => out.to_path_buf(),
        (None, true) => return Ok(None),
        (None, false) => {
            let name = request.job.and_then(Path::file_stem).map_or("demo".into(), PathBuf::from);
            Path::new("pinchbar-out").join(name)
        }
    };
    files::OutFolder::ready(&path, &RESULTS).map(Some).map_err(|e| format!("cannot write into {}: {e}", path.display()))
}

fn show(
    request: &Request,
    problem: &Problem,
    findings: &Findings,
    folder: Option<files::OutFolder>,
    picture: Option<Vec<u8>>,
) -> io::Result<Ending> {
    let json = report::json::json(findings).map_err(io::Error::other)?;
    if let Some(folder) = &folder {
        let contents = [
            picture,
            Some(report::csv::hotspots(findings).map_err(io::Error::other)?),
            Some(report::csv::welds(findings).map_err(io::Error::other)?),
            Some(json.clone().into_bytes()),
            Some(report::markdown::report(problem, findings).into_bytes()),
        ];
        folder.replace(&RESULTS.into_iter().zip(contents).collect::<Vec<_>>())?;
    }
    if request.json {
        terminal::print(&json)?;
    } else if !request.quiet {
        terminal::print(&report::table::summary(findings))?;
    }
    if let (Some(folder), false) = (&folder, request.quiet) {
        terminal::say(&format!("picture, tables and report are in {}", folder.path().display()));
    }
    if !findings.run.reached {
        terminal::say("the accuracy asked for was not reached within the vertex limit; the intervals hold, but are wider");
    }
    let broken = findings.verdicts.iter().any(|v| v.verdict == Verdict::Fail);
    Ok(if broken { Ending::LimitBroken } else { Ending::Done })
}

/// Shows the faults of the input.
pub fn refused(faults: &[Fault]) -> Ending {
    terminal::complain(&explain::explain(faults, terminal::colour()));
    Ending::BadInput
}

/// Wall time of the stages.
struct Clock {
    last: Instant,
    laps: BTreeMap<String, f64>,
}

impl Clock {
    fn start() -> Self {
        Self { last: Instant::now(), laps: BTreeMap::new() }
    }

    fn lap(&mut self, stage: &str) {
        self.laps.insert(stage.into(), self.last.elapsed().as_secs_f64());
        self.last = Instant::now();
    }
}
