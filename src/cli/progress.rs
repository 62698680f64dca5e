//! One line of progress on a terminal, gone when the work is done; the only user of `indicatif`.

use crate::progress::Stage;
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use std::io::IsTerminal;
use std::sync::mpsc::{RecvTimeoutError, Sender, channel};
use std::thread::{JoinHandle, spawn};
use std::time::Duration;

/// Runs that are done by then show nothing: the line would only flicker.
const PATIENCE: Duration = Duration::from_millis(300);

/// From one drawing of the line to the next.
const BEAT: Duration = Duration::from_millis(100);

/// The line; it is erased when this is dropped.
pub struct Progress(Option<Line>);

struct Line {
    bar: ProgressBar,
    /// Dropping it ends the beat.
    over: Option<Sender<()>>,
    beat: Option<JoinHandle<()>>,
}

impl Progress {
    /// Shows nothing unless stderr is a terminal and talk is wanted.
    pub fn start(quiet: bool) -> Self {
        // Erasing a line takes more than a dumb terminal can do.
        let dumb = std::env::var_os("TERM").is_some_and(|t| t == "dumb");
        if quiet || dumb || !std::io::stderr().is_terminal() {
            return Self(None);
        }
        let bar = ProgressBar::with_draw_target(None, ProgressDrawTarget::hidden());
        // Without colour, whatever the terminal can show.
        if let Ok(style) = ProgressStyle::with_template("pinchbar: {wide_msg}") {
            bar.set_style(style);
        }
        let (over, wait) = channel::<()>();
        let line = bar.clone();
        let beat = spawn(move || {
            if wait.recv_timeout(PATIENCE) != Err(RecvTimeoutError::Timeout) {
                return;
            }
            line.set_draw_target(ProgressDrawTarget::stderr());
            line.tick();
            while wait.recv_timeout(BEAT) == Err(RecvTimeoutError::Timeout) {
                line.tick();
            }
            line.finish_and_clear();
        });
        Self(Some(Line { bar, over: Some(over), beat: Some(beat) }))
    }

    /// Says where the work is.
    pub fn show(&self, stage: Stage) {
        if let Some(line) = &self.0 {
            line.bar.set_message(words(stage));
        }
    }
}

impl Drop for Line {
    fn drop(&mut self) {
        self.over = None;
        // A beat that panicked has nothing left to erase.
        self.beat.take().map(JoinHandle::join);
    }
}

fn words(stage: Stage) -> String {
    match stage {
        Stage::Reading => "reading".into(),
        Stage::Round { number, triangles, gap: None } => format!("round {number}: {} triangles", grouped(triangles)),
        Stage::Round { number, triangles, gap: Some(gap) } => {
            format!("round {number}: {} triangles, enclosed to {:.2} %", grouped(triangles), 100.0 * gap)
        }
        Stage::Hotspots => "resolving hotspots".into(),
        Stage::Drawing => "drawing".into(),
    }
}

/// A count with a comma at every third digit.
fn grouped(count: usize) -> String {
    let digits = count.to_string();
    let mut text = String::new();
    for (i, c) in digits.chars().enumerate() {
        if i > 0 && (digits.len() - i).is_multiple_of(3) {
            text.push(',');
        }
        text.push(c);
    }
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn stages_are_told_in_words() {
        assert_eq!(words(Stage::Round { number: 2, triangles: 12345, gap: Some(0.0043) }), "round 2: 12,345 triangles, enclosed to 0.43 %");
        assert_eq!(words(Stage::Round { number: 1, triangles: 999, gap: None }), "round 1: 999 triangles");
        assert_eq!(grouped(1_000_000), "1,000,000");
    }
}
