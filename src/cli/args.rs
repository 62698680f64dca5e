//! Commands and options with their help, shell completions and the manual page; the only user of `clap` and its kin.

use crate::report::words::LONG_CAUTION;
use clap::{Args, CommandFactory, Parser, Subcommand, ValueEnum};
use clap_complete::Shell;
use clap_mangen::Man;
use std::io;
use std::path::PathBuf;

/// What the exit status tells.
const EXIT_STATUS: &str = "0: done. 1: a limit is broken, results are written. 2: the input is at fault. 3: the tool failed.";

/// The whole command line.
#[derive(Debug, Parser)]
#[command(
    name = "pinchbar",
    bin_name = "pinchbar",
    version,
    max_term_width = 80,
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
    /// Where current crowds: picture, tables, JSON; JOB or the demo
    #[command(after_long_help = LONG_CAUTION)]
    Map {
        /// The job sheet (*.toml) [default: the built-in demo]
        job: Option<PathBuf>,
        /// Options shared by the commands.
        #[command(flatten)]
        common: Common,
        /// Enclose the loss to P per cent, whatever the sheet says
        #[arg(long, value_name = "P", value_parser = percent, allow_negative_numbers = true)]
        bracket_percent: Option<f64>,
        /// Folder for results [default: ./pinchbar-out/JOB]
        #[arg(long, value_name = "DIR")]
        out: Option<PathBuf>,
        /// Put the time of every stage into the JSON
        #[arg(long)]
        timings: bool,
    },
    /// Read and validate; print the inventory; solve nothing
    Check {
        /// The job sheets (*.toml)
        #[arg(required = true)]
        jobs: Vec<PathBuf>,
        /// Checked as `map` would; nothing is solved here
        #[arg(long, value_name = "P", value_parser = percent, allow_negative_numbers = true)]
        bracket_percent: Option<f64>,
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
    /// A commented sheet and outline to begin from: a collector plate
    Start {
        /// Folder for the two files; made where it is missing
        #[arg(value_name = "DIR")]
        folder: PathBuf,
        /// Such as 18650 or 4680, or the diameter in mm
        #[arg(long, value_name = "CELLS", default_value = "21700")]
        cells: String,
        /// Cells across the plate
        #[arg(long, value_name = "R", default_value_t = 2, value_parser = clap::value_parser!(u32).range(1..=200))]
        rows: u32,
        /// Cells along the plate, towards the tab
        #[arg(long, value_name = "C", default_value_t = 5, value_parser = clap::value_parser!(u32).range(1..=200))]
        columns: u32,
        /// Can to can, mm [default: diameter + 0.5]
        #[arg(long, value_name = "P", allow_negative_numbers = true)]
        pitch: Option<f64>,
        /// How the rows lie
        #[arg(long, value_enum, default_value_t = Arrangement::Square)]
        arrange: Arrangement,
        /// Options shared by the commands.
        #[command(flatten)]
        common: Common,
    },
    /// Completions for a shell, on stdout
    Completions {
        /// The shell
        shell: Shell,
    },
    /// The manual page on stdout: pinchbar manual | man -l -
    Manual,
}

/// How rows of cells lie.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum Arrangement {
    /// Cell above cell
    Square,
    /// Every second row moved by half a pitch
    Staggered,
}

/// Options shared by the commands.
#[derive(Debug, Args)]
pub struct Common {
    /// Print JSON on stdout and nothing else there
    #[arg(long)]
    pub json: bool,
    /// Say nothing but faults and warnings
    #[arg(long, short)]
    pub quiet: bool,
    /// Threads, for the same results [default: all cores]
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

/// The completions for a shell.
pub fn completions(shell: Shell) -> Vec<u8> {
    let mut text = Vec::new();
    clap_complete::generate(shell, &mut CommandLine::command(), "pinchbar", &mut text);
    text
}

/// The manual page: the tool, then each command with its options, then the caution.
///
/// # Errors
/// None in practice: it is written into memory.
pub fn manual() -> io::Result<Vec<u8>> {
    let mut root = CommandLine::command();
    root.build();
    let mut page = Vec::new();
    let man = Man::new(root.clone());
    man.render_title(&mut page)?;
    man.render_name_section(&mut page)?;
    man.render_synopsis_section(&mut page)?;
    man.render_description_section(&mut page)?;
    for command in root.get_subcommands() {
        // Its parts stand below one heading of its own, not beside the tool's.
        let mut part = Vec::new();
        let man = Man::new(command.clone());
        man.render_synopsis_section(&mut part)?;
        man.render_description_section(&mut part)?;
        man.render_options_section(&mut part)?;
        let heading = format!(".SH \"{}\"\n", command.get_name().to_uppercase());
        page.extend(heading.into_bytes());
        page.extend(String::from_utf8_lossy(&part).replace(".SH ", ".SS ").into_bytes());
    }
    page.extend(b".SH \"EXIT STATUS\"\n");
    page.extend(EXIT_STATUS.as_bytes());
    page.extend(b"\n.SH CAUTIONS\n");
    page.extend(LONG_CAUTION.as_bytes());
    page.push(b'\n');
    Ok(page)
}

#[cfg(test)]
mod tests {
    use super::*;

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
