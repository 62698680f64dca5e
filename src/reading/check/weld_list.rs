//! Weld lists: a table with a header row and one weld to a row, as spreadsheets export them.

use super::shape::{Drawn, Form};
use crate::csv::{Cell, rows};
use crate::diagnostic::{SourceText, Span};
use crate::geometry::Point;
use crate::geometry::validity::LARGEST_COORDINATE;
use crate::reading::drawn::{MOST_SPOTS, few_enough, within};
use crate::reading::fields::{Fields, Notes, Placed};
use crate::reading::files::Files;
use crate::reading::hint;
use std::sync::Arc;

/// A weld of the list.
pub struct Weld {
    /// Spot or seam; its place is the row.
    pub drawn: Drawn,
    /// The cell it belongs to, where the list says so.
    pub cell: Option<Placed<String>>,
    /// The current of that cell in A, where the list says so.
    pub current_a: Option<Placed<f64>>,
}

/// The columns that have a meaning; the unit may be left out of the title.
const COLUMNS: [&str; 7] = ["x_mm", "y_mm", "diameter_mm", "length_mm", "angle_deg", "cell", "current_a"];

/// Most columns of a list.
const MOST_COLUMNS: usize = 1000;

/// Most unused columns that are named.
const MOST_NAMED: usize = 20;

/// Shorter titles of other columns are near to too many words.
const SHORTEST_MISSPELT: usize = 4;

/// Reads the list that `spots_csv` names. Spots without a diameter take the block's; columns named in `idle` are not used. Faults are told; `None` then.
pub fn read_welds(fields: &Fields, idle: &[&str], files: &Files) -> Option<Vec<Weld>> {
    let name = fields.text("spots_csv")?;
    let source = files.text(&name)?;
    let faults_before = fields.notes.faults.borrow().len();
    let whole_diameter = match fields.has("diameter_mm") {
        true => Some(fields.number_where("diameter_mm", "larger than zero", |d| d > 0.0 && d <= LARGEST_COORDINATE)?.value),
        false => None,
    };
    let separator = separator(&source.text);
    let span = |from: &Cell, to: &Cell| Span { source: source.clone(), start: from.start, end: to.end };
    let mut table = rows(&source.text, separator).filter(|row| row.iter().any(|cell| !cell.text.is_empty()));
    let Some(header) = table.next() else {
        let start = Span { source: source.clone(), start: 0, end: 0 };
        fields.notes.fault("the list is empty", &start, HEADER, "export the list again, with its header row");
        return None;
    };
    if let (Some(first), Some(last)) = (header.first(), header.last()) {
        fields.notes.keep(within(header.len(), MOST_COLUMNS, "columns in one list", &span(first, last)))?;
    }
    let columns = Columns::read(&header, &source, idle, fields.notes)?;
    if columns.number("diameter_mm").is_none() && whole_diameter.is_none() {
        fields.missing("diameter_mm", "a diameter for all spots, or a column `diameter_mm` in the list");
        return None;
    }
    let mut welds = Vec::new();
    for row in table {
        let (Some(first), Some(last)) = (row.first(), row.last()) else { continue };
        let here = span(first, last);
        let budget = files.budget.borrow_mut().spend(row.len(), &here);
        let faults = fields.notes.faults.borrow().len() - faults_before;
        let size = within(welds.len() + 1, MOST_SPOTS, "spots", &here);
        fields.notes.keep(budget.and(size).and_then(|()| few_enough(faults, &here)))?;
        if let Some(extra) = row.iter().skip(header.len()).find(|cell| !cell.text.is_empty()) {
            let message = format!("the row has {} cells, the header {}", row.len(), header.len());
            let remedy = match separator {
                b',' => "separate the cells by semicolons where commas are decimal, or put quotes around a text with commas",
                _ => "put quotes around a text that holds a separator",
            };
            fields.notes.fault(message, &span(extra, extra), "as many cells as the header has", remedy);
            continue;
        }
        let row = Row { cells: &row, columns: &columns, span: &span, here, decimal_comma: separator != b',', notes: fields.notes };
        welds.extend(row.weld(whole_diameter));
    }
    if welds.is_empty() && fields.notes.faults.borrow().len() == faults_before {
        let remedy = "add the welds below the header, or remove `spots_csv`";
        fields.notes.fault("the list holds no weld", &columns.header, "one weld to a row", remedy);
    }
    columns.remark_unused(&source, fields.notes);
    (fields.notes.faults.borrow().len() == faults_before).then_some(welds)
}

const HEADER: &str = "a header row with at least `x_mm` and `y_mm`";

/// The separator of the header row: a tab, else a semicolon, else a comma.
fn separator(text: &str) -> u8 {
    let header = text.lines().find(|line| !line.trim().is_empty() && !line.starts_with('#')).unwrap_or_default();
    [b'\t', b';'].into_iter().find(|&s| header.contains(char::from(s))).unwrap_or(b',')
}

/// Which column holds what.
struct Columns {
    /// Per entry of [`COLUMNS`] its number.
    numbers: [Option<usize>; COLUMNS.len()],
    unused: Vec<String>,
    header: Span,
}

impl Columns {
    fn read(header: &[Cell], source: &Arc<SourceText>, idle: &[&str], notes: &Notes) -> Option<Self> {
        let span = |cell: &Cell| Span { source: source.clone(), start: cell.start, end: cell.end };
        let mut good = true;
        let mut fault = |message: String, place: &Span, expected: &str, remedy: String| {
            notes.fault(message, place, expected, remedy);
            good = false;
        };
        let mut numbers = [None; COLUMNS.len()];
        let mut unused = Vec::new();
        for (number, cell) in header.iter().enumerate() {
            let (column, other_unit) = match Meant::by(&cell.text) {
                Meant::Column(column) if !idle.contains(&COLUMNS[column]) => (column, false),
                Meant::OtherUnit(column) if !idle.contains(&COLUMNS[column]) => (column, true),
                _ => {
                    unused.extend((!cell.text.is_empty()).then(|| cell.text.clone()));
                    continue;
                }
            };
            let title = COLUMNS[column];
            if other_unit {
                let message = format!("the column `{}` is in another unit", cell.text);
                fault(message, &span(cell), title, format!("convert it to `{title}`"));
            } else if numbers[column].replace(number).is_some() {
                let message = format!("the column `{title}` is there twice");
                fault(message, &span(cell), "each column once", "remove or rename one of them".into());
            }
        }
        let all = header.first().zip(header.last());
        let header_span = all.map_or_else(|| Span { source: source.clone(), start: 0, end: 0 }, |(a, b)| Span { end: b.end, ..span(a) });
        for (column, title) in COLUMNS.iter().enumerate().take(2) {
            let other_unit = header.iter().any(|cell| Meant::by(&cell.text) == Meant::OtherUnit(column));
            if numbers[column].is_none() && !other_unit {
                let remedy = format!("name the columns in the first row; `{title}` must be one of them");
                fault(format!("the list has no column `{title}`"), &header_span, HEADER, remedy);
            }
        }
        good.then_some(Self { numbers, unused, header: header_span })
    }

    fn number(&self, title: &str) -> Option<usize> {
        COLUMNS.iter().position(|known| *known == title).and_then(|column| self.numbers[column])
    }

    /// A spreadsheet has columns for people, too: they are told of, not refused.
    fn remark_unused(&self, source: &SourceText, notes: &Notes) {
        if self.unused.is_empty() {
            return;
        }
        let missing = || COLUMNS.into_iter().zip(self.numbers).filter(|c| c.1.is_none()).map(|c| c.0);
        let named = self.unused.iter().take(MOST_NAMED).map(|title| {
            let near = hint::nearest(&plain(title), missing()).filter(|_| title.chars().count() >= SHORTEST_MISSPELT);
            near.map_or_else(|| format!("`{title}`"), |near| format!("`{title}` (did you mean `{near}`?)"))
        });
        let rest = (self.unused.len() > MOST_NAMED).then(|| format!("and {} more", self.unused.len() - MOST_NAMED));
        let columns = if self.unused.len() == 1 { "column" } else { "columns" };
        notes.remark(format!("{}: {columns} not used: {}", source.path.display(), named.chain(rest).collect::<Vec<_>>().join(", ")));
    }
}

/// What a title stands for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Meant {
    Column(usize),
    OtherUnit(usize),
    Nothing,
}

impl Meant {
    fn by(title: &str) -> Self {
        let title = plain(title);
        for (number, column) in COLUMNS.iter().enumerate() {
            let (stem, unit) = column.split_once('_').unwrap_or((column, ""));
            if title == stem || title == *column {
                return Self::Column(number);
            }
            let other = title.strip_prefix(stem).and_then(|rest| rest.strip_prefix('_'));
            if !unit.is_empty() && other.is_some_and(hint::is_unit) {
                return Self::OtherUnit(number);
            }
        }
        Self::Nothing
    }
}

/// A title in small letters, with one underscore for whatever stands between its words: `X [mm]` is `x_mm`.
fn plain(title: &str) -> String {
    let lower = title.to_lowercase();
    lower.split(|c: char| !c.is_alphanumeric()).filter(|word| !word.is_empty()).collect::<Vec<_>>().join("_")
}

/// One row with what is needed to read it.
struct Row<'a> {
    cells: &'a [Cell],
    columns: &'a Columns,
    span: &'a dyn Fn(&Cell, &Cell) -> Span,
    here: Span,
    decimal_comma: bool,
    notes: &'a Notes,
}

impl Row<'_> {
    fn weld(&self, whole_diameter: Option<f64>) -> Option<Weld> {
        // Every cell is read before the first fault ends it: all faults at once.
        let [x, y, diameter, length, angle, current_a] =
            ["x_mm", "y_mm", "diameter_mm", "length_mm", "angle_deg", "current_a"].map(|title| self.number(title));
        let required = |title: &str, number: &Result<Option<Placed<f64>>, ()>| {
            if matches!(number, Ok(None)) {
                self.notes.fault(
                    format!("the weld has no `{title}`"),
                    &self.here,
                    format!("a number in `{title}`"),
                    "fill the cell, or remove the row",
                );
            }
        };
        required("x_mm", &x);
        required("y_mm", &y);
        let cell = self.cell("cell").map(|c| Placed { value: c.text.clone(), span: (self.span)(c, c) });
        let (x, y, diameter, length, angle) = (x.ok()??, y.ok()??, diameter.ok()?, length.ok()?, angle.ok()?);
        let current_a = current_a.ok()?;
        let diameter = diameter.or_else(|| whole_diameter.map(|value| Placed { value, span: self.here.clone() }));
        let Some(diameter) = diameter else {
            let remedy = "fill the cell, or give `diameter_mm` in the block for all that have none";
            self.notes.fault("the weld has no `diameter_mm`", &self.here, "a diameter in mm", remedy);
            return None;
        };
        if diameter.value <= 0.0 {
            let message = format!("the diameter must be larger than zero, not {}", diameter.value);
            self.notes.fault(message, &diameter.span, "a diameter in mm", "correct the number");
            return None;
        }
        let (centre, width) = (Point::new(x.value, y.value), diameter.value);
        let form = match length {
            Some(length) if length.value != 0.0 => {
                if length.value < width {
                    let message = format!("the seam's length over all, {}, is less than its width, {width}", length.value);
                    let remedy = "give the length with both round ends, or leave it empty for a round spot";
                    self.notes.fault(message, &length.span, "a length of at least the diameter", remedy);
                    return None;
                }
                let (sin, cos) = angle.map_or(0.0, |a| a.value.to_radians()).sin_cos();
                let half = Point::new(cos, sin) * (0.5 * (length.value - width));
                Form::Seam(centre - half, centre + half, width)
            }
            _ => Form::Disc(centre, width),
        };
        Some(Weld { drawn: Drawn { form, span: self.here.clone() }, cell, current_a })
    }

    /// The cell of a column, where it holds anything.
    fn cell(&self, title: &str) -> Option<&Cell> {
        self.cells.get(self.columns.number(title)?).filter(|cell| !cell.text.is_empty())
    }

    /// The number of a column, where there is one; what is no number is told.
    fn number(&self, title: &str) -> Result<Option<Placed<f64>>, ()> {
        let Some(cell) = self.cell(title) else { return Ok(None) };
        let text = if self.decimal_comma { cell.text.replacen(',', ".", 1) } else { cell.text.clone() };
        let plain = text.bytes().all(|b| b.is_ascii_digit() || matches!(b, b'+' | b'-' | b'.' | b'e' | b'E'));
        let span = (self.span)(cell, cell);
        match text.parse::<f64>().ok().filter(|v| plain && v.is_finite()) {
            Some(value) if value.abs() <= LARGEST_COORDINATE => Ok(Some(Placed { value, span })),
            Some(value) => {
                let message = format!("{value} in `{title}` is out of range");
                self.notes.fault(message, &span, "at most 1 000 000", "correct the number, and check its unit");
                Err(())
            }
            None => {
                let shown: String = cell.text.chars().take(40).collect();
                let expected = format!("a finite number in `{title}`, such as 12.5");
                self.notes.fault(
                    format!("`{shown}` is not a number"),
                    &span,
                    expected,
                    "write the plain number, without unit and without spaces",
                );
                Err(())
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn titles_are_known_with_and_without_their_unit() {
        for title in ["x", "X_mm", "x [mm]", " X (mm)", "x.mm"] {
            assert_eq!(Meant::by(title), Meant::Column(0), "{title}");
        }
        assert_eq!([Meant::by("Cell"), Meant::by("Current [A]"), Meant::by("angle")], [5, 6, 4].map(Meant::Column));
        assert_eq!([Meant::by("x_inch"), Meant::by("current (mA)")], [0, 6].map(Meant::OtherUnit));
        assert_eq!([Meant::by("cell_id"), Meant::by("x_offset"), Meant::by("z"), Meant::by("")], [Meant::Nothing; 4]);
    }

    #[test]
    fn the_header_names_the_separator() {
        assert_eq!([separator("x,y\n1;2"), separator("# a;b\n\nx;y, z"), separator("x\ty;z"), separator("")], [b',', b';', b'\t', b',']);
    }
}
