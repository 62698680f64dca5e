//! What is said: results on stdout, talk on stderr, a closed pipe no fault.

use std::io::{self, IsTerminal, Write};

/// Prints to stdout; a reader that has gone away is no fault.
///
/// # Errors
/// Anything else that stdout refuses, such as a full disk.
pub fn print(text: &str) -> io::Result<()> {
    print_bytes(text.as_bytes())
}

/// As [`print()`].
///
/// # Errors
/// As [`print()`].
pub fn print_bytes(bytes: &[u8]) -> io::Result<()> {
    let mut out = io::stdout().lock();
    match out.write_all(bytes).and_then(|()| out.flush()) {
        Err(e) if e.kind() == io::ErrorKind::BrokenPipe => Ok(()),
        other => other,
    }
}

/// Says something on stderr. There is nobody left to tell if that fails.
pub fn say(text: &str) {
    let mut err = io::stderr().lock();
    let _ = writeln!(err, "pinchbar: {}", text.trim_end());
}

/// Prints faults, which carry the tool's name themselves.
pub fn complain(text: &str) {
    let mut err = io::stderr().lock();
    let _ = writeln!(err, "{}", text.trim_end());
}

/// Whether stderr shows colour: on a terminal, unless NO_COLOR is set to anything.
pub fn colour() -> bool {
    io::stderr().is_terminal() && std::env::var_os("NO_COLOR").is_none_or(|v| v.is_empty())
}
