//! Commands and options with their help; the only user of `clap`.

use crate::report::words::LONG_CAUTION;
use clap::{Args, Parser, Subcommand};
use std::path::PathBuf;

/// The whole command line.
#[derive(Debug, Parser)]
#[command(
    name = "pinchbar",
    bin_name = "pinchbar",
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
        #[arg(long, value_name = "P", value_parser = percent, allow_negative_numbers = true)]
        bracket_percent: Option<f64>,
        /// Folder for the results [default: ./pinchbar-out/JOB]
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
    /// Print no summary and say nothing but faults and warnings
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

/// Reads the command line; `Err` holds the text to print and whether it tells a fault (help and version are none).
pub fn parse(arguments: impl Iterator<Item = std::ffi::OsString>) -> Result<CommandLine, (String, bool)> {
    CommandLine::try_parse_from(arguments).map_err(|e| {
        let text = e.render().to_string();
        (text.strip_prefix("error: ").map(str::to_string).unwrap_or(text), e.use_stderr())
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use clap::CommandFactory;

    fn parsed(line: &str) -> Result<CommandLine, (String, bool)> {
        parse(line.split(' ').map(Into::into))
    }

    #[test]
    fn the_definition_is_sound_and_its_short_help_fits_a_screen() {
        CommandLine::command().debug_assert();
        for command in [&mut CommandLine::command(), CommandLine::command().find_subcommand_mut("map").expect("map")] {
            assert!(command.render_help().to_string().lines().count() <= 24);
        }
    }

    #[test]
    fn percentages_outside_the_possible_are_faults() {
        assert!(parsed("pinchbar map --bracket-percent 0.1").is_ok());
        for wrong in ["0", "-1", "nan", "inf", "101", "tight"] {
            let Err((text, fault)) = parsed(&format!("pinchbar map --bracket-percent {wrong}")) else { panic!("{wrong} was taken") };
            assert!(fault && text.contains("above 0 and up to 100"), "{text}");
        }
        assert!(parsed("pinchbar map --threads 0").is_err());
    }

    #[test]
    fn help_is_no_fault() {
        let Err((text, fault)) = parsed("pinchbar --help") else { panic!("help is printed instead of a run") };
        assert!(!fault && text.contains(LONG_CAUTION.split(':').next().expect("a first word")));
    }
}
