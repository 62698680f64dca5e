//! Outline text to rings: one number line per point, with the place of each, all faults at once.

use super::drawn::{Budget, DrawnRing, few_enough};
use crate::diagnostic::{Fault, Remark, SourceText, Span};
use crate::geometry::ring::SAGITTA;
use crate::geometry::{Point, Ring, Vertex};
use std::sync::Arc;

/// Reads a whole outline text. Faults and remarks are added to the lists; the rings that could be read are returned.
pub fn read_outline(source: &Arc<SourceText>, budget: &mut Budget, faults: &mut Vec<Fault>, remarks: &mut Vec<Remark>) -> Vec<DrawnRing> {
    let lines: Vec<Line> = lines(&source.text).collect();
    let mut reader = Reader { source, faults, rings: Vec::new(), open: None, repeated: 0, scale: 1.0, unit: None, numbers: false };
    let comma = reader.meaning_of_comma(&lines);
    for line in &lines {
        let words = words(line, comma);
        let numbers = words.iter().filter(|w| starts_number(w.text)).count();
        let here = reader.span(line.start, line.end);
        if let Err(fault) = budget.spend(numbers, &here).and_then(|()| few_enough(reader.faults.len(), &here)) {
            reader.faults.push(fault);
            return Vec::new();
        }
        reader.line(line, &words, comma);
    }
    reader.close_ring();
    if reader.rings.is_empty() && reader.faults.is_empty() {
        let whole = reader.span(0, source.text.len().min(1));
        reader.fault(
            "the outline holds no ring",
            whole,
            "two numbers per line: x y",
            "give at least three points or one `circle x y diameter`",
        );
    }
    if reader.repeated > 0 {
        let (path, n) = (source.path.display(), reader.repeated);
        let text = if n == 1 { "1 repeated point was".to_string() } else { format!("{n} repeated points were") };
        remarks.push(Remark::new(format!("{path}: {text} dropped, so that no edge has length zero")));
    }
    reader.rings
}

/// What a comma between two digits means in this file.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Comma {
    Separates,
    Decimal,
}

/// A line without its comment, by its place in the text.
struct Line<'a> {
    text: &'a str,
    start: usize,
    end: usize,
    comment: bool,
}

/// A word of a line and where it starts in the text.
struct Word<'a> {
    text: &'a str,
    start: usize,
}

fn lines(text: &str) -> impl Iterator<Item = Line<'_>> {
    let mut start = 0;
    text.split_inclusive('\n').map(move |raw| {
        let here = start;
        start += raw.len();
        let body = raw.split('#').next().unwrap_or_default();
        let text = body.trim_end();
        Line { text, start: here, end: here + text.len(), comment: raw.contains('#') }
    })
}

fn words<'a>(line: &Line<'a>, comma: Comma) -> Vec<Word<'a>> {
    let bytes = line.text.as_bytes();
    let digit = |i: Option<usize>| i.and_then(|i| bytes.get(i)).is_some_and(u8::is_ascii_digit);
    let decimal = |i: usize| comma == Comma::Decimal && digit(i.checked_sub(1)) && digit(Some(i + 1));
    let mut words = Vec::new();
    let mut from = None;
    for (i, c) in line.text.char_indices().chain([(line.text.len(), ' ')]) {
        let separates = c.is_whitespace() || c == ';' || (c == ',' && !decimal(i));
        match (separates, from) {
            (true, Some(first)) => {
                words.push(Word { text: &line.text[first..i], start: line.start + first });
                from = None;
            }
            (false, None) => from = Some(i),
            _ => {}
        }
    }
    words
}

fn starts_number(word: &str) -> bool {
    word.starts_with(|c: char| c.is_ascii_digit() || matches!(c, '+' | '-' | '.'))
}

fn number(word: &str, comma: Comma) -> Option<f64> {
    let plain = word.bytes().all(|b| b.is_ascii_digit() || matches!(b, b'+' | b'-' | b'.' | b'e' | b'E' | b','));
    if !plain {
        return None;
    }
    match comma {
        Comma::Separates => word.parse().ok(),
        Comma::Decimal => word.replacen(',', ".", 1).parse().ok(),
    }
}

/// True when the line has a comma between two digits with nothing between.
fn has_inner_comma(text: &str) -> bool {
    text.as_bytes().windows(3).any(|w| w[1] == b',' && w[0].is_ascii_digit() && w[2].is_ascii_digit())
}

struct OpenRing {
    name: Option<String>,
    place: Span,
    vertices: Vec<Vertex>,
    places: Vec<Span>,
}

struct Reader<'a> {
    source: &'a Arc<SourceText>,
    faults: &'a mut Vec<Fault>,
    rings: Vec<DrawnRing>,
    open: Option<OpenRing>,
    repeated: usize,
    scale: f64,
    unit: Option<Span>,
    numbers: bool,
}

impl Reader<'_> {
    fn span(&self, start: usize, end: usize) -> Span {
        Span { source: self.source.clone(), start, end }
    }

    fn fault(&mut self, message: impl Into<String>, span: Span, expected: impl Into<String>, remedy: impl Into<String>) {
        self.faults.push(Fault {
            message: message.into(),
            span: Some(span),
            expected: Some(expected.into()),
            remedy: Some(remedy.into()),
            labels: Vec::new(),
        });
    }

    /// Decides once for the whole file; where both readings fit, it asks.
    fn meaning_of_comma(&mut self, lines: &[Line]) -> Comma {
        // How many numbers the line has in this reading, where all of its words are numbers.
        let count = |line: &Line, comma| {
            let words = words(line, comma);
            let words = if words.first().is_some_and(|w| w.text == "circle") { &words[1..] } else { &words[..] };
            words.iter().all(|w| number(w.text, comma).is_some()).then_some(words.len())
        };
        let is_circle = |line: &Line| line.text.trim_start().starts_with("circle");
        let is_points = |line: &Line| starts_number(line.text.trim_start()) || is_circle(line);
        let fits = |line: &Line, comma| count(line, comma).is_some_and(|n| n == 3 || (n == 2 && !is_circle(line)));
        let separated = |line: &Line| line.text.trim_matches([' ', '\t', ';', ',']).contains(['\t', ';']);
        let points = || lines.iter().filter(|l| is_points(l));
        let Some(first) = points().find(|l| has_inner_comma(l.text)) else { return Comma::Separates };
        if points().any(separated) {
            return Comma::Decimal;
        }
        if !points().all(|l| fits(l, Comma::Decimal)) {
            return Comma::Separates;
        }
        let with_comma = || points().filter(|l| has_inner_comma(l.text));
        if with_comma().all(|l| count(l, Comma::Separates).is_some_and(|n| n > 3)) {
            return Comma::Decimal;
        }
        let (start, end) = (first.start, first.end);
        let as_list = words(first, Comma::Separates).iter().map(|w| w.text).collect::<Vec<_>>().join(" | ");
        let as_decimals = words(first, Comma::Decimal).iter().map(|w| w.text.replace(',', ".")).collect::<Vec<_>>().join(" | ");
        let span = self.span(start, end);
        let message = format!("this comma may be a decimal comma or stand between two numbers: `{as_list}` or `{as_decimals}`?");
        self.fault(message, span, "one reading that fits the file", "write decimal points, or separate the numbers by semicolons");
        Comma::Decimal
    }

    fn line(&mut self, line: &Line, words: &[Word], comma: Comma) {
        let Some(first) = words.first() else {
            if !line.comment && self.open.as_ref().is_some_and(|r| !r.vertices.is_empty()) {
                self.close_ring();
            }
            return;
        };
        let span = self.span(first.start, line.end.max(first.start + first.text.len()));
        match first.text {
            "ring" => {
                self.close_ring();
                let name = line.text.trim_start()["ring".len()..].trim();
                let name = (!name.is_empty()).then(|| name.to_string());
                self.open = Some(OpenRing { name, place: span, vertices: Vec::new(), places: Vec::new() });
            }
            "unit" => self.unit(words, span),
            "circle" => self.circle(&words[1..], span, comma),
            word if starts_number(word) => self.point(words, span, comma),
            word => {
                let known = super::hint::nearest(word, ["ring", "circle", "unit"]);
                let remedy = known.map_or("put a `#` before a comment".to_string(), |k| format!("did you mean `{k}`?"));
                let span = self.span(first.start, first.start + first.text.len());
                self.fault(format!("unknown word `{}`", shortened(word)), span, "`ring`, `circle`, `unit` or two or three numbers", remedy);
            }
        }
    }

    fn unit(&mut self, words: &[Word], span: Span) {
        let scale = match words.get(1).map(|w| w.text) {
            Some("mm") => 1.0,
            Some("inch") => 25.4,
            _ => return self.fault("unknown unit", span, "`unit mm` or `unit inch`", "convert other units to mm"),
        };
        if words.len() > 2 {
            return self.fault("too many words after `unit`", span, "`unit mm` or `unit inch`", "leave one unit");
        }
        if self.numbers || self.unit.is_some() {
            return self.fault(
                "a unit must be given once, before the first number",
                span,
                "one unit per file",
                "move it to the top of the file",
            );
        }
        self.unit = Some(span);
        self.scale = scale;
    }

    /// The numbers of a line in mm (the third as it stands); a fault where one is none.
    fn numbers(&mut self, words: &[Word], comma: Comma) -> Option<Vec<f64>> {
        self.numbers = true;
        let mut values = Vec::with_capacity(words.len());
        for word in words {
            match number(word.text, comma) {
                Some(value) if value.is_finite() => values.push(value),
                _ => {
                    let span = self.span(word.start, word.start + word.text.len());
                    let message = format!("`{}` is not a number", shortened(word.text));
                    self.fault(message, span, "a finite number such as 12.5", "correct the number, or put a `#` before a comment");
                }
            }
        }
        (values.len() == words.len()).then_some(values)
    }

    fn point(&mut self, words: &[Word], span: Span, comma: Comma) {
        let Some(values) = self.numbers(words, comma) else { return self.keep_open(span) };
        let (x, y, bulge) = match values.as_slice() {
            [x, y] => (*x, *y, 0.0),
            [x, y, bulge] => (*x, *y, *bulge),
            [_] => {
                self.fault("a point needs two numbers", span.clone(), "x y, or x y bulge", "add the missing coordinate");
                return self.keep_open(span);
            }
            _ => {
                self.fault(
                    format!("{} numbers in one line", values.len()),
                    span.clone(),
                    "x y, or x y bulge",
                    "one point per line; separate numbers by semicolons where commas are decimal",
                );
                return self.keep_open(span);
            }
        };
        let vertex = Vertex { point: Point::new(x * self.scale, y * self.scale), bulge };
        let ring = self.open.get_or_insert_with(|| OpenRing { name: None, place: span.clone(), vertices: Vec::new(), places: Vec::new() });
        match ring.vertices.last_mut() {
            Some(last) if last.point == vertex.point => {
                *last = vertex;
                self.repeated += 1;
            }
            _ => {
                ring.vertices.push(vertex);
                ring.places.push(span);
            }
        }
    }

    /// A faulty line still belongs to a ring: no second fault for a ring that seems too short.
    fn keep_open(&mut self, place: Span) {
        self.open.get_or_insert_with(|| OpenRing { name: None, place, vertices: Vec::new(), places: Vec::new() });
    }

    fn circle(&mut self, words: &[Word], span: Span, comma: Comma) {
        let name = match &self.open {
            Some(ring) if ring.vertices.is_empty() => self.open.take().and_then(|ring| ring.name),
            _ => None,
        };
        self.close_ring();
        let Some(values) = self.numbers(words, comma) else { return };
        match values.as_slice() {
            [x, y, diameter] if *diameter > 0.0 => {
                let ring = Ring::circle(Point::new(x * self.scale, y * self.scale), diameter * self.scale);
                self.rings.push(DrawnRing { ring, name, places: vec![span.clone(), span.clone()], place: span });
            }
            [_, _, _] => self.fault(
                "a circle's diameter must be larger than zero",
                span,
                "circle x y diameter",
                "give the diameter in the file's unit",
            ),
            _ => self.fault(
                format!("a circle needs three numbers, not {}", values.len()),
                span,
                "circle x y diameter",
                "give centre and diameter",
            ),
        }
    }

    fn close_ring(&mut self) {
        let Some(OpenRing { name, place, mut vertices, mut places }) = self.open.take() else { return };
        let faulty = |s: &Span| s.source == place.source && s.start >= place.start;
        if vertices.is_empty() && !self.faults.iter().any(|f| f.span.as_ref().is_some_and(faulty)) {
            return self.fault("a ring without points", place, "at least three points", "remove the word `ring`, or give its points");
        }
        // Repeating the first point at the end is a habit, not a fault.
        if vertices.len() > 1 && vertices.first().map(|v| v.point) == vertices.last().map(|v| v.point) {
            vertices.pop();
            places.pop();
        }
        straighten(&mut vertices);
        if !vertices.is_empty() {
            self.rings.push(DrawnRing { ring: Ring { vertices }, name, places, place });
        }
    }
}

/// Arcs so flat that rounding made them are straight: well within the flattening's own deviation, and of an enormous radius.
fn straighten(vertices: &mut [Vertex]) {
    for i in 0..vertices.len() {
        let chord = vertices[i].point.distance(vertices[(i + 1) % vertices.len()].point);
        let height = 0.5 * chord * vertices[i].bulge.abs();
        if height < 0.1 * SAGITTA && chord * chord > 8e6 * height {
            vertices[i].bulge = 0.0;
        }
    }
}

/// A word fit for a message.
fn shortened(word: &str) -> String {
    if word.chars().count() > 40 { word.chars().take(40).chain("...".chars()).collect() } else { word.to_string() }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(text: &str) -> (Vec<DrawnRing>, Vec<Fault>, Vec<Remark>) {
        let source = Arc::new(SourceText { path: "part.outline".into(), text: text.to_string() });
        let (mut faults, mut remarks) = (Vec::new(), Vec::new());
        let rings = read_outline(&source, &mut Budget::default(), &mut faults, &mut remarks);
        (rings, faults, remarks)
    }

    fn points(text: &str) -> Vec<Vec<(f64, f64, f64)>> {
        let (rings, faults, _) = read(text);
        assert_eq!(faults, []);
        rings.iter().map(|r| r.ring.vertices.iter().map(|v| (v.point.x, v.point.y, v.bulge)).collect()).collect()
    }

    #[test]
    fn separators_and_closing_points_make_no_difference() {
        let plain = points("0 0\n10 0\n10 5.5\n");
        for same in [
            "0 0\r\n10 0\r\n10 5.5\r\n0 0\r\n",
            "# a part\nunit mm\nring body\n\n 0,0\n10, 0\n10,5.5 # corner\n",
            "0;0\n10;0\n10;5,5\n",
            "0\t0\n10\t0\n10\t5,5",
            "0,0 0,0\n10,0 0,0\n10,0 5,5",
            "ring\n0 0;\n10 0;\n10 5.5;\n;;\n",
            "0 0 1e-12\n10 0\n10 5.5",
        ] {
            assert_eq!(points(same), plain, "{same}");
        }
    }

    #[test]
    fn bulges_circles_inches_and_rings() {
        let rings = points("unit inch\n0 0\n1 0 0.4142\n1 1\n\n0.2 0.2\n0.3 0.2\n0.3 0.3\ncircle 0.5 0.5 0.1\n");
        assert_eq!(rings.len(), 3);
        assert_eq!(rings[0][1], (25.4, 0.0, 0.4142));
        assert_eq!(rings[2].len(), 2);
        assert!((rings[2][0].0 - 0.55 * 25.4).abs() < 1e-12);
        assert_eq!(read("ring body\n0 0\n1 0\n1 1").0[0].name.as_deref(), Some("body"));
    }

    #[test]
    fn a_comma_with_two_readings_asks() {
        let (_, faults, _) = read("10,5 3\n20,5 3\n20,5 9\n");
        assert_eq!(faults.len(), 1);
        assert!(faults[0].message.contains("10 | 5 | 3") && faults[0].message.contains("10.5 | 3"), "{}", faults[0].message);
        assert_eq!(points("1,5\n2,5\n2,9\n")[0][0], (1.0, 5.0, 0.0), "one number per line is no point");
        assert_eq!(points("1,5,0.5\n2,5,0\n2,9,0\n")[0][0], (1.0, 5.0, 0.5));
    }

    #[test]
    fn repeated_points_are_dropped_and_counted() {
        let (rings, faults, remarks) = read("0 0\n0 0 0.5\n1 0\n1 1\n1 1\n0 0\n");
        assert_eq!(faults, []);
        assert_eq!(rings[0].ring.vertices.len(), 3);
        assert_eq!(rings[0].ring.vertices[0].bulge, 0.5, "the edge of length zero goes with its bulge");
        assert_eq!(remarks.len(), 1);
        assert!(remarks[0].text.contains("2 repeated points"));
    }

    #[test]
    fn every_fault_is_found_with_its_line() {
        let (_, faults, _) = read("0 0\n1\n1 x1\n1 2 3 4\nwheel\nring\nring\ncircle 1 2\ncircle 1 2 -3\nunit mm\n1e999 0\n5 5\n");
        let lines: Vec<usize> = faults.iter().map(|f| f.span.as_ref().expect("a place").line_column().0).collect();
        assert_eq!(lines, [2, 3, 4, 5, 6, 8, 9, 10, 11]);
        assert_eq!(read(&"x\n".repeat(5000)).1.len(), 1001, "a slip that is repeated for ever comes to an end");
        assert!(read("# nothing\n").1[0].message.contains("no ring"));
        assert_eq!(read("ciircle 1 2 3").1[0].remedy.as_deref(), Some("did you mean `circle`?"));
    }
}
