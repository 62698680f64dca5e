//! To come.

pub mod explain;

/// To come.
pub fn run(_arguments: impl Iterator<Item = std::ffi::OsString>) -> std::process::ExitCode {
    std::process::ExitCode::SUCCESS
}
