//! Tables as rows of separated cells, read with the place of each cell and written; the only user of the `csv` crate.

/// A cell that was read.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Cell {
    /// What it holds, without quotes around it and blanks at its ends.
    pub text: String,
    /// First byte in the text.
    pub start: usize,
    /// One past the last byte.
    pub end: usize,
}

/// The rows of a text, each as long as it is written; empty lines and lines that start with `#` are passed over.
pub fn rows(text: &str, separator: u8) -> impl Iterator<Item = Vec<Cell>> + '_ {
    let mut reader = ::csv::ReaderBuilder::new();
    let reader = reader.delimiter(separator).has_headers(false).flexible(true).comment(Some(b'#')).from_reader(text.as_bytes());
    // A text in memory that is UTF-8, with rows of any length, gives no error.
    reader.into_records().map_while(Result::ok).map(move |record| {
        let mut at = record.position().map_or(0, |p| p.byte() as usize);
        let bytes = text.as_bytes();
        // What was passed over before the row counts to it.
        while let Some(passed) = passed_over(bytes, at) {
            at = passed;
        }
        let cells = record.iter().map(|cell| {
            let quoted = bytes.get(at) == Some(&b'"');
            let length = if quoted { 2 + cell.len() + cell.matches('"').count() } else { cell.len() };
            let start = at;
            at = (at + length + 1).min(bytes.len() + 1);
            Cell { text: cell.trim().to_string(), start: start.min(bytes.len()), end: (start + length).min(bytes.len()) }
        });
        cells.collect()
    })
}

/// The end of a line break or comment that starts here.
fn passed_over(bytes: &[u8], at: usize) -> Option<usize> {
    match bytes.get(at)? {
        b'\r' | b'\n' => Some(at + 1),
        b'#' => Some(bytes[at..].iter().position(|&b| b == b'\n').map_or(bytes.len(), |n| at + n)),
        _ => None,
    }
}

/// A table of comma-separated cells.
///
/// # Errors
/// Only when the rows cannot be written to memory.
pub fn written(header: &[&str], rows: impl Iterator<Item = Vec<String>>) -> Result<Vec<u8>, String> {
    let mut writer = ::csv::Writer::from_writer(Vec::new());
    writer.write_record(header).map_err(|e| e.to_string())?;
    for row in rows {
        writer.write_record(row).map_err(|e| e.to_string())?;
    }
    writer.into_inner().map_err(|e| e.to_string())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_cell_knows_its_place() {
        for (text, separator) in [
            ("note,x,y\n\n# said,here\n\"a, \"\"b\"\"\",1, 2.5 \n3,4,end", b','),
            ("x;note;y\r\n\r\n1;\"a, \"\"b\"\"\";2,5\r\n\r\n3;4;end\r\n", b';'),
            ("x\ty\tnote\r1\t2.5\ta, b\r3\t4\tend\r", b'\t'),
        ] {
            let read: Vec<Vec<Cell>> = rows(text, separator).collect();
            assert_eq!(read.iter().map(Vec::len).collect::<Vec<_>>(), [3, 3, 3], "{text:?}");
            for cell in read.iter().flatten() {
                let written = text.get(cell.start..cell.end).expect("a stretch of the text");
                assert_eq!(written.trim().trim_matches('"').replace("\"\"", "\""), cell.text.trim_matches('"'), "{text:?}");
            }
            assert_eq!(read[2][2].text, "end");
            assert_eq!(&text[read[2][0].start..read[2][2].end], format!("3{0}4{0}end", char::from(separator)));
        }
        assert_eq!(rows("a,b\n1\n1,2,3\n", b',').map(|r| r.len()).collect::<Vec<_>>(), [2, 1, 3]);
        assert_eq!(rows("", b',').count(), 0);
    }

    #[test]
    fn broken_quotes_and_ends_never_panic() {
        for text in ["\"", "\"a", "a\"b,c", "a,\"b\"c,d\n\"\n", "#", "\r", "\u{e4},\"\u{e4}", "a,\"b\nc\",d\n1"] {
            for cell in rows(text, b',').flatten() {
                assert!(cell.start <= cell.end && cell.end <= text.len(), "{text:?}: {cell:?}");
            }
        }
    }

    #[test]
    fn names_are_quoted() {
        let row = vec!["a,\"b\"".to_string(), "0.1".into(), String::new()];
        let text = written(&["name", "current_a", "drop_mv"], [row].into_iter()).expect("rows in memory");
        assert_eq!(String::from_utf8(text).expect("UTF-8"), "name,current_a,drop_mv\n\"a,\"\"b\"\"\",0.1,\n");
    }
}
