//! The command line: dispatch, exit status, and nothing that computes.

pub mod args;
pub mod check;
pub mod explain;
pub mod files;
pub mod late;
pub mod map;
pub mod metals;
pub mod progress;
pub mod start;
pub mod terminal;

use crate::diagnostic::Fault;
use crate::starting::Order;
use args::{Arrangement, Command, Common};
use std::ffi::OsString;
use std::panic::AssertUnwindSafe;
use std::process::ExitCode;

/// How a command ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Ending {
    /// Done, no limit broken.
    Done = 0,
    /// Done, a limit is broken.
    LimitBroken = 1,
    /// The input is at fault.
    BadInput = 2,
    /// The tool failed.
    Failed = 3,
}

impl From<Ending> for ExitCode {
    fn from(ending: Ending) -> Self {
        ExitCode::from(ending as u8)
    }
}

/// Runs the command line and tells its exit status.
pub fn run(arguments: impl Iterator<Item = OsString>) -> ExitCode {
    // A defect of ours must not look like bad input or a broken limit; the panic itself has been printed already.
    std::panic::catch_unwind(AssertUnwindSafe(|| dispatched(arguments))).unwrap_or_else(|_| {
        terminal::say("this is a defect of the tool, not of the job; the results are not written");
        Ending::Failed.into()
    })
}

fn dispatched(arguments: impl Iterator<Item = OsString>) -> ExitCode {
    let line = match args::parse(arguments) {
        Ok(line) => line,
        Err((text, true)) => {
            terminal::say(&text);
            return Ending::BadInput.into();
        }
        Err((text, false)) => return finish(terminal::print(&text).map(|()| Ending::Done)),
    };
    let common = match &line.command {
        Command::Map { common, .. } | Command::Check { common, .. } | Command::Metals { common } | Command::Start { common, .. } => {
            Some(common)
        }
        Command::Completions { .. } | Command::Manual => None,
    };
    if let Some(Err(text)) = common.map(set_threads) {
        terminal::say(&text);
        return Ending::Failed.into();
    }
    finish(match &line.command {
        Command::Map { job, common, bracket_percent, out, timings } => map::run(&map::Request {
            job: job.as_deref(),
            out: out.as_deref(),
            json: common.json,
            quiet: common.quiet,
            bracket_percent: *bracket_percent,
            timings: *timings,
        }),
        Command::Check { jobs, common, .. } => check::run(jobs, common.json, common.quiet),
        Command::Metals { common } => metals::run(common.json),
        Command::Start { folder, cells, rows, columns, pitch, arrange, common } => {
            let staggered = *arrange == Arrangement::Staggered;
            let order = Order { cells: cells.clone(), rows: *rows, columns: *columns, pitch_mm: *pitch, staggered };
            start::run(folder, &order, common.json, common.quiet)
        }
        Command::Completions { shell } => terminal::print_bytes(&args::completions(*shell)).map(|()| Ending::Done),
        Command::Manual => args::manual().and_then(|page| terminal::print_bytes(&page)).map(|()| Ending::Done),
    })
}

/// Shows the faults of the input.
fn refused(faults: &[Fault]) -> Ending {
    terminal::complain(&explain::explain(faults, terminal::colour()));
    Ending::BadInput
}

fn finish(outcome: std::io::Result<Ending>) -> ExitCode {
    match outcome {
        Ok(ending) => ending.into(),
        Err(e) => {
            terminal::say(&format!("cannot write: {e}"));
            Ending::Failed.into()
        }
    }
}

fn set_threads(common: &Common) -> Result<(), String> {
    match common.threads {
        Some(n) => {
            rayon::ThreadPoolBuilder::new().num_threads(n as usize).build_global().map_err(|e| format!("cannot start {n} threads: {e}"))
        }
        None => Ok(()),
    }
}
