//! Commands and options with their help; the only user of `clap`.

use crate::report::words::LONG_CAUTION;
use clap::{Args, Parser, Subcommand};
use std::path::PathBuf;

/// The whole command line.
#[derive(Debug, Parser)]
#[command(
    name = "pinchbar",
    version,
    about = "Where current crowds in the welded collector plates of a battery pack",
    long_about = "From an outline and a one-page job sheet: loss, drop, sharing and hotspots of welded strips, tabs, plates and overlays, \
                  by two-dimensional finite elements, with a guaranteed interval on the numbers, a heat map and a hotspot table.",
    after_help = "Estimate only: local codes and licensed practice come first. `pinchbar --help` has the cautions.",
    after_long_help = LONG_CAUTION,
    disable_help_subcommand = true
)]
pub struct CommandLine {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
}

/// What to do.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Where current crowds: picture, tables, JSON (without JOB: the built-in demo)
    #[command(after_long_help = LONG_CAUTION)]
    Map {
        /// The job sheet (*.toml)
        job: Option<PathBuf>,
        /// Options shared by the commands.
        #[command(flatten)]
        common: Common,
        /// Stop when the loss is enclosed this tightly, in per cent (in place of the sheet's figure)
        #[arg(long, value_name = "P", value_parser = percent)]
        bracket_percent: Option<f64>,
        /// Folder for the results [default: ./pinchbar-out/<job name>]
        #[arg(long, value_name = "DIR")]
        out: Option<PathBuf>,
        /// Put the wall time of every stage into the JSON
        #[arg(long)]
        timings: bool,
    },
    /// Read and validate; print the inventory; solve nothing
    Check {
        /// The job sheets (*.toml)
        #[arg(required = true)]
        jobs: Vec<PathBuf>,
        /// Options shared by the commands.
        #[command(flatten)]
        common: Common,
    },
    /// The metals table with sources
    Metals {
        /// Options shared by the commands.
        #[command(flatten)]
        common: Common,
    },
}

/// Options shared by the commands.
#[derive(Debug, Args)]
pub struct Common {
    /// Print JSON on stdout and nothing else there
    #[arg(long)]
    pub json: bool,
    /// Say nothing but faults
    #[arg(long, short)]
    pub quiet: bool,
    /// Use this many threads [default: as many as there are cores]; the results are the same
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    pub threads: Option<u16>,
}

fn percent(text: &str) -> Result<f64, String> {
    match text.parse::<f64>() {
        Ok(p) if p > 0.0 && p <= 100.0 => Ok(p),
        _ => Err("a number above 0 and up to 100 is expected, such as 0.1".into()),
    }
}

/// Reads the command line; `Err` holds the text to print and the exit status (help and version are no faults).
pub fn parse(arguments: impl Iterator<Item = std::ffi::OsString>) -> Result<CommandLine, (String, bool)> {
    CommandLine::try_parse_from(arguments).map_err(|e| (e.render().to_string(), e.use_stderr()))
}
