//! Sheets that must be refused: each file says beside the faulty line what is told and which remedy is given.

use pinchbar::reading::read;
use std::cell::RefCell;
use std::path::{Path, PathBuf};

/// What a comment `# refused: part of the message | part of the remedy` asks for.
struct Wanted {
    path: PathBuf,
    line: usize,
    message: String,
    remedy: String,
}

fn wanted(path: &Path, text: &str) -> Vec<Wanted> {
    let mut list = Vec::new();
    for (line, content) in text.lines().enumerate() {
        for part in content.split("# refused: ").skip(1) {
            let (message, remedy) = part.split_once(" | ").unwrap_or_else(|| panic!("{}: no ` | ` in {part}", path.display()));
            let trimmed = |s: &str| s.trim().trim_end_matches('#').trim().to_string();
            list.push(Wanted { path: path.into(), line: line + 1, message: trimmed(message), remedy: trimmed(remedy) });
        }
    }
    list
}

/// Everything that is wrong with how one sheet is refused.
fn complaints(job: &Path) -> Vec<String> {
    let seen = RefCell::new(Vec::new());
    let load = |path: &Path| {
        let text = std::fs::read_to_string(path)?;
        seen.borrow_mut().extend(wanted(path, &text));
        Ok(text)
    };
    let Err(faults) = read(job, &load) else { return vec![format!("{}: was accepted", job.display())] };
    let wanted = seen.into_inner();
    let mut complaints = Vec::new();
    let mut open: Vec<_> = faults.iter().collect();
    for want in &wanted {
        let fits = |fault: &&pinchbar::diagnostic::Fault| {
            let span = fault.span.as_ref();
            span.is_some_and(|s| s.source.path == want.path && s.line_column().0 == want.line)
                && fault.message.contains(&want.message)
                && fault.remedy.as_ref().is_some_and(|r| r.contains(&want.remedy))
                && fault.expected.as_ref().is_some_and(|e| !e.is_empty())
        };
        match open.iter().position(fits) {
            Some(found) => drop(open.remove(found)),
            None => complaints.push(format!("{}:{}: not told: {} | {}", want.path.display(), want.line, want.message, want.remedy)),
        }
    }
    for fault in open {
        let place = fault.span.as_ref().map(|s| (s.source.path.display().to_string(), s.line_column()));
        complaints.push(format!("{}: told beyond that: {place:?} {} | {:?}", job.display(), fault.message, fault.remedy));
    }
    complaints
}

#[test]
fn every_sheet_is_refused_with_its_faults_and_no_others() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/refusals");
    let entries = std::fs::read_dir(&folder).expect("the folder of refusals");
    let mut jobs: Vec<PathBuf> =
        entries.map(|e| e.expect("an entry").path()).filter(|p| p.extension().is_some_and(|e| e == "toml")).collect();
    jobs.sort();
    assert!(jobs.len() >= 40, "only {} refusals", jobs.len());
    let all: Vec<String> = jobs.iter().flat_map(|job| complaints(job)).collect();
    assert!(all.is_empty(), "{}", all.join("\n"));
}
