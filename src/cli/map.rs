//! `pinchbar map`: read, solve, find, show.

use super::late::{self, Stop};
use super::{Ending, files, progress::Progress, refused, terminal};
use crate::diagnostic::{Fault, Remark};
use crate::findings::{self, Findings, Verdict};
use crate::physics;
use crate::problem::Problem;
use crate::progress::Stage;
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

/// Everything up to the writing.
struct Mapped {
    problem: Problem,
    findings: Findings,
    /// Where the results go, if anywhere.
    folder: Option<files::OutFolder>,
    /// The PNG, if it was drawn.
    picture: Option<Vec<u8>>,
}

/// Runs the command.
///
/// # Errors
/// When stdout or a result file cannot be written.
pub fn run(request: &Request) -> io::Result<Ending> {
    match mapped(request) {
        Ok(mapped) => show(request, &mapped),
        Err(Stop::Refused(faults)) => Ok(refused(&faults)),
        Err(Stop::Failed(text)) => {
            terminal::say(&text);
            Ok(Ending::Failed)
        }
    }
}

/// Says nothing: the line of progress is gone before anything else is shown.
fn mapped(request: &Request) -> Result<Mapped, Stop> {
    let progress = Progress::start(request.quiet);
    let mut clock = Clock::start();
    progress.show(Stage::Reading);
    let Reading { mut problem, origins, remarks } = read(request).map_err(Stop::Refused)?;
    clock.lap("read");
    // Before the work: it would be lost in a folder that cannot be written.
    let folder = folder(request).map_err(|fault| Stop::Refused(vec![fault]))?;
    if let Some(percent) = request.bracket_percent {
        problem.accuracy.bracket = percent / 100.0;
    }
    let listener = |stage| progress.show(stage);
    let found = physics::fit(&mut problem, &listener).and_then(|()| findings::find_with(&problem, &listener));
    let mut found = found.map_err(|faults| late::stop(&faults, &problem, &origins))?;
    clock.lap("solve");
    found.findings.remarks.splice(0..0, remarks);
    progress.show(Stage::Drawing);
    let picture = folder.as_ref().map(|_| report::figure::heat_map(&problem, &found)).transpose();
    let picture = picture.unwrap_or_else(|text| {
        found.findings.remarks.push(Remark::new(format!("No picture: {text}.")));
        None
    });
    clock.lap("draw");
    let mut findings = found.findings;
    if request.timings {
        findings.run.seconds = Some(clock.laps);
    }
    Ok(Mapped { problem, findings, folder, picture })
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
fn folder(request: &Request) -> Result<Option<files::OutFolder>, Fault> {
    let path = match (request.out, request.json) {
        (Some(out), _) => out.to_path_buf(),
        (None, true) => return Ok(None),
        (None, false) => {
            let name = request.job.and_then(Path::file_stem).map_or("demo".into(), PathBuf::from);
            Path::new("pinchbar-out").join(name)
        }
    };
    files::OutFolder::ready(&path, &RESULTS).map(Some).map_err(|e| files::unwritable(&path, &e, "name another folder with `--out DIR`"))
}

fn show(request: &Request, mapped: &Mapped) -> io::Result<Ending> {
    let Mapped { problem, findings, folder, picture } = mapped;
    let json = report::json::json(findings).map_err(io::Error::other)?;
    if let Some(folder) = folder {
        let contents = [
            picture.clone(),
            Some(report::csv::hotspots(findings).map_err(io::Error::other)?),
            Some(report::csv::welds(findings).map_err(io::Error::other)?),
            Some(json.clone().into_bytes()),
            Some(report::markdown::report(problem, findings, picture.is_some()).into_bytes()),
        ];
        folder.replace(&RESULTS.into_iter().zip(contents).collect::<Vec<_>>())?;
    }
    if request.json {
        terminal::print(&json)?;
    } else if !request.quiet {
        terminal::print(&report::table::summary(findings))?;
    }
    if let (Some(folder), false) = (folder, request.quiet) {
        terminal::say(&format!("picture, tables and report are in {}", folder.path().display()));
    }
    if !findings.run.reached {
        terminal::say("the accuracy asked for was not reached: see the remarks");
    }
    let broken = findings.verdicts.iter().any(|v| v.verdict == Verdict::Fail);
    Ok(if broken { Ending::LimitBroken } else { Ending::Done })
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
