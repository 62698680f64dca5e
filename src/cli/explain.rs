//! Faults as text for a terminal: what is wrong, where, an excerpt, what was expected, one remedy.

use crate::diagnostic::{Fault, Span};
use crate::report::words::{one_line, wrapped};
use annotate_snippets::{Annotation, AnnotationKind, Group, Level, Renderer, Snippet};
use std::fmt::Write;

/// Most faults that are printed.
const MOST: usize = 50;

/// Most characters of a line of the input that are shown: with its number and both cuts it fits 80 columns, so that the mark stands below its place.
const WIDTH: usize = 66;

/// All faults, at most fifty, each beginning with `pinchbar: `. It reads the same without colour.
pub fn explain(faults: &[Fault], colour: bool) -> String {
    let mut text = String::new();
    for fault in faults.iter().take(MOST) {
        explain_one(&mut text, fault, colour);
    }
    if faults.len() > MOST {
        text.push_str(&format!("pinchbar: and {} more\n", faults.len() - MOST));
    }
    text
}

fn explain_one(text: &mut String, fault: &Fault, colour: bool) {
    // Writing to a String cannot fail.
    let _ = match &fault.span {
        Some(span) => writeln!(text, "pinchbar: {}: {}", place(span), one_line(&fault.message)),
        None => writeln!(text, "pinchbar: {}", one_line(&fault.message)),
    };
    if let Some(span) = &fault.span {
        text.push_str(&excerpt(span, AnnotationKind::Primary, colour));
    }
    for label in &fault.labels {
        let _ = writeln!(text, "  {}: {}", place(&label.span), one_line(&label.text));
        text.push_str(&excerpt(&label.span, AnnotationKind::Context, colour));
    }
    for (word, part) in [("expected", &fault.expected), ("remedy", &fault.remedy)] {
        if let Some(part) = part {
            for (i, line) in wrapped(part, 80 - 4 - word.len()).iter().enumerate() {
                let _ = if i == 0 { writeln!(text, "  {word}: {line}") } else { writeln!(text, "    {line}") };
            }
        }
    }
}

fn place(span: &Span) -> String {
    let (line, column) = span.line_column();
    format!("{}:{line}:{column}", span.source.path.display())
}

/// The line of a span with the span marked; a long line is cut around it.
fn excerpt(span: &Span, kind: AnnotationKind, colour: bool) -> String {
    let source = &span.source.text;
    let clamp = |mut at: usize| {
        at = at.min(source.len());
        while !source.is_char_boundary(at) {
            at -= 1;
        }
        at
    };
    let (start, end) = (clamp(span.start), clamp(span.end.max(span.start)));
    let line_start = source[..start].rfind('\n').map_or(0, |p| p + 1);
    let line_end = source[start..].find('\n').map_or(source.len(), |p| start + p);
    // What is before and after, each cut to what has room.
    let lead: Vec<char> = source[line_start..start].chars().rev().take(WIDTH / 2 + 1).collect();
    let cut_before = lead.len() > WIDTH / 2;
    let mut shown = String::from(if cut_before { "... " } else { "" });
    shown.extend(lead.iter().take(WIDTH / 2).rev().map(|&c| if c.is_control() { ' ' } else { c }));
    let mark_start = shown.len();
    let mut mark_end = mark_start;
    let rest = &source[start..line_end];
    let room = WIDTH - lead.len().min(WIDTH / 2);
    for (count, (at, c)) in rest.char_indices().enumerate() {
        if count > room {
            shown.push_str(" ...");
            break;
        }
        if c != '\r' {
            shown.push(if c.is_control() { ' ' } else { c });
        }
        if start + at < end {
            mark_end = shown.len();
        }
    }
    let annotation: Annotation = kind.span(mark_start..mark_end);
    let snippet = Snippet::source(shown.as_str()).line_start(span.line_column().0).annotation(annotation);
    let renderer = if colour { Renderer::styled() } else { Renderer::plain() };
    let mut text = renderer.render(&[Group::with_level(Level::ERROR).element(snippet)]);
    text.push('\n');
    text
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::diagnostic::{Label, SourceText};
    use std::sync::Arc;

    fn fault(text: &str, start: usize, end: usize) -> Fault {
        let source = Arc::new(SourceText { path: "job.toml".into(), text: text.into() });
        Fault {
            message: "unknown key `thickness`".into(),
            span: Some(Span { source: source.clone(), start, end }),
            expected: Some("a key".into()),
            remedy: Some("did you mean `thickness_mm`?".into()),
            labels: vec![Label { span: Span { source, start: 0, end: 1 }, text: "first here".into() }],
        }
    }

    #[test]
    fn a_fault_names_its_place_shows_its_line_and_gives_a_remedy() {
        let text = explain(&[fault("[[layer]]\nthickness = 0.2\n", 10, 19)], false);
        assert!(text.starts_with("pinchbar: job.toml:2:1: unknown key `thickness`\n"), "{text}");
        assert!(text.contains("thickness = 0.2") && text.contains("^^^^^^^^^"), "{text}");
        assert!(text.contains("expected: a key") && text.contains("remedy: did you mean"), "{text}");
        assert!(!text.contains('\u{1b}'), "no colour was asked for");
        assert!(text.contains("job.toml:1:1: first here"), "{text}");
    }

    #[test]
    fn what_was_expected_is_wrapped() {
        let long = Fault { expected: Some("one of: ".to_string() + &"diameter_mm, ".repeat(20)), ..fault("x = 1\n", 0, 1) };
        let text = explain(&[long], false);
        assert!(text.lines().all(|l| l.chars().count() <= 80) && text.matches("diameter_mm").count() == 20, "{text}");
    }

    #[test]
    fn long_lines_are_cut_and_any_span_is_survived() {
        let long = "x".repeat(200_000);
        let text = explain(&[fault(&long, 100_000, 199_000)], false);
        assert!(text.lines().all(|l| l.chars().count() <= 80), "{}", text.len());
        for (start, end) in [(0, 0), (5, 2), (3, 900_000), (900_000, 900_001)] {
            assert!(explain(&[fault("é\u{7}ab\r\n", start, end)], false).starts_with("pinchbar: "));
            assert!(explain(&[fault("", start, end)], true).starts_with("pinchbar: "));
        }
        let many = vec![fault("a\nb", 0, 1); 70];
        assert!(explain(&many, false).ends_with("pinchbar: and 20 more\n"));
    }
}
