//! The start of the command-line tool; everything is in the library.

fn main() -> std::process::ExitCode {
    pinchbar::cli::run(std::env::args_os())
}
