//! Shapes in the sheet: rings given as points or files, and what spots, seams, areas, lines and edges are given by.

use crate::diagnostic::Span;
use crate::geometry::{Point, Ring};
use crate::reading::drawn::{DrawnRing, faults_of_rings};
use crate::reading::fields::{Fields, Placed, tuple};
use crate::reading::files::Files;
use crate::reading::sheet::{Content, Value};

/// One place of attachment as it was drawn.
#[derive(Debug, Clone)]
pub struct Drawn {
    /// What it is.
    pub form: Form,
    /// Where it is written.
    pub span: Span,
}

/// What a place of attachment is drawn as.
#[derive(Debug, Clone)]
pub enum Form {
    /// A round spot: centre and diameter.
    Disc(Point, f64),
    /// A seam with round ends: its two middle ends and its width.
    Seam(Point, Point, f64),
    /// An area.
    Area(Ring),
    /// A polyline.
    Line(Vec<Point>),
    /// Along the outline from the first point to the second; one point: the whole ring.
    Edge(Vec<Point>),
}

impl Drawn {
    /// The same moved by a step.
    pub fn moved(&self, by: Point) -> Self {
        let all = |points: &[Point]| points.iter().map(|p| *p + by).collect();
        let form = match &self.form {
            Form::Disc(centre, diameter) => Form::Disc(*centre + by, *diameter),
            Form::Seam(a, b, width) => Form::Seam(*a + by, *b + by, *width),
            Form::Area(ring) => {
                let mut ring = ring.clone();
                ring.vertices.iter_mut().for_each(|v| v.point = v.point + by);
                Form::Area(ring)
            }
            Form::Line(points) => Form::Line(all(points)),
            Form::Edge(points) => Form::Edge(all(points)),
        };
        Self { form, span: self.span.clone() }
    }
}

/// The rings of a layer or an area: `outline`, or `points_mm` with `holes_mm`. Faults are told; `None` then.
pub fn rings_of(fields: &Fields, files: &Files) -> Option<Vec<DrawnRing>> {
    match (fields.has("outline"), fields.has("points_mm")) {
        (true, true) => {
            let remedy = "keep one of the two";
            fields.notes.fault("the outline is given twice", fields.place("outline"), "`outline` or `points_mm`", remedy);
            None
        }
        (false, false) => {
            fields.missing("outline", "`outline = \"file\"` or `points_mm = [[x, y], ...]`");
            None
        }
        (true, false) => {
            if fields.has("holes_mm") {
                let remedy = "draw the holes in the outline file";
                fields.notes.fault("`holes_mm` belongs to `points_mm`", fields.place("holes_mm"), "no `holes_mm` beside `outline`", remedy);
            }
            files.outline(&fields.text("outline")?)
        }
        (false, true) => {
            let outer = fields.value("points_mm").and_then(|value| ring(value, "points_mm", fields));
            let holes: Option<Vec<DrawnRing>> = match fields.has("holes_mm") {
                true => {
                    let list = fields.list("holes_mm")?;
                    let read: Vec<_> = list.iter().map(|value| ring(value, "holes_mm", fields)).collect();
                    read.into_iter().collect()
                }
                false => Some(Vec::new()),
            };
            let mut rings = vec![outer?];
            rings.extend(holes?);
            let faults = faults_of_rings(&rings);
            let good = faults.is_empty();
            fields.notes.faults.borrow_mut().extend(faults);
            good.then_some(rings)
        }
    }
}

/// A ring given as a list of points; repeated points are dropped.
fn ring(value: &Value, key: &str, fields: &Fields) -> Option<DrawnRing> {
    let Content::List(rows) = &value.content else {
        let message = format!("`{key}` holds {} where a list of points belongs", value.content.noun());
        fields.notes.fault(message, &value.span, "[[x, y], [x, y], ...]", "put each ring into brackets of its own");
        return None;
    };
    let read: Vec<_> = rows.iter().map(|row| tuple::<2>(row, key, "[x, y]", fields.notes)).collect();
    let mut points: Vec<Placed<[f64; 2]>> = read.into_iter().collect::<Option<_>>()?;
    let before = points.len();
    points.dedup_by(|a, b| a.value == b.value);
    if points.len() < before {
        let n = before - points.len();
        fields.notes.remark(format!(
            "{key}: {n} repeated {} dropped, so that no edge has length zero",
            if n == 1 { "point was" } else { "points were" }
        ));
    }
    if points.len() > 1 && points.first().map(|p| p.value) == points.last().map(|p| p.value) {
        points.pop();
    }
    let ring = Ring::polygon(points.iter().map(|p| Point::new(p.value[0], p.value[1])));
    let places = points.into_iter().map(|p| p.span).collect();
    Some(DrawnRing { ring, name: None, places, place: value.span.clone() })
}

/// The places of attachment of a block, given by exactly one of `keys`.
pub fn drawn_places(fields: &Fields, keys: &[&'static str]) -> Option<Vec<Drawn>> {
    places_by(fields, place_key(fields, keys)?)
}

/// The one of `keys` by which the block says where it is attached.
pub fn place_key(fields: &Fields, keys: &[&'static str]) -> Option<&'static str> {
    let given: Vec<&'static str> = keys.iter().copied().filter(|key| fields.has(key)).collect();
    let listed = keys.iter().map(|k| format!("`{k}`")).collect::<Vec<_>>().join(", ");
    let key = match given.as_slice() {
        [key] => *key,
        [] => {
            let message = format!("{} says nowhere where it is attached", fields.what);
            fields.notes.fault(message, fields.span, format!("one of {listed}"), format!("add `{} = ...`", keys.first().unwrap_or(&"")));
            return None;
        }
        [first, second, ..] => {
            let message = format!("{} is attached twice: by `{first}` and `{second}`", fields.what);
            fields.notes.fault(message, fields.place(second), format!("only one of {listed}"), "keep one of them");
            return None;
        }
    };
    if !["spots_mm", "spots_csv"].contains(&key) && fields.has("diameter_mm") {
        let message = format!("`diameter_mm` has no meaning beside `{key}`");
        fields.notes.fault(message, fields.place("diameter_mm"), "`diameter_mm` only beside spots", "remove `diameter_mm`");
    }
    Some(key)
}

/// The places of attachment that stand in the block itself.
pub fn places_by(fields: &Fields, key: &str) -> Option<Vec<Drawn>> {
    let at = |x, y| Point::new(x, y);
    match key {
        "spots_mm" => {
            fields.missing("diameter_mm", "the spots' diameter in mm");
            let diameter = fields.number_where("diameter_mm", "larger than zero", |d| d > 0.0 && d <= 1e6);
            let points = fields.points("spots_mm");
            let diameter = diameter?.value;
            Some(points?.into_iter().map(|p| Drawn { form: Form::Disc(p.value, diameter), span: p.span }).collect())
        }
        "disc_mm" => {
            let Placed { value: [x, y, diameter], span } = fields.tuple::<3>(key, "[x, y, diameter]")?;
            size(diameter, "diameter", &span, fields)?;
            Some(vec![Drawn { form: Form::Disc(at(x, y), diameter), span }])
        }
        "seams_mm" => {
            let rows = fields.tuples::<5>(key, "[x1, y1, x2, y2, width]")?;
            let read: Vec<_> = rows
                .into_iter()
                .map(|Placed { value: [x1, y1, x2, y2, width], span }| {
                    size(width, "width", &span, fields)?;
                    Some(Drawn { form: Form::Seam(at(x1, y1), at(x2, y2), width), span })
                })
                .collect();
            read.into_iter().collect()
        }
        "areas_mm" => {
            let read: Vec<_> = fields.list(key)?.iter().map(|value| area(value, key, fields)).collect();
            read.into_iter().collect()
        }
        "points_mm" => Some(vec![area(fields.value(key)?, key, fields)?]),
        "line_mm" => {
            let points: Vec<Point> = fields.points(key)?.into_iter().map(|p| p.value).collect();
            if points.len() < 2 {
                fields.notes.fault("a line needs two points", fields.place(key), "[[x, y], [x, y], ...]", "add the line's other end");
                return None;
            }
            Some(vec![Drawn { form: Form::Line(points), span: fields.place(key).clone() }])
        }
        _ => {
            let points: Vec<Point> = fields.points(key)?.into_iter().map(|p| p.value).collect();
            if points.len() > 2 || (points.len() == 2 && points[0] == points[1]) {
                let expected = "[[x, y], [x, y]] along the outline, or [[x, y]] for the whole ring";
                let message =
                    if points.len() > 2 { "`edge_mm` holds more than two points" } else { "the two points of `edge_mm` are the same" };
                fields.notes.fault(message, fields.place(key), expected, "give the first and the last point of the stretch, or one point");
                return None;
            }
            Some(vec![Drawn { form: Form::Edge(points), span: fields.place(key).clone() }])
        }
    }
}

fn size(value: f64, what: &str, span: &Span, fields: &Fields) -> Option<()> {
    if value > 0.0 {
        return Some(());
    }
    fields.notes.fault(format!("the {what} must be larger than zero, not {value}"), span, format!("a {what} in mm"), "correct the number");
    None
}

/// One area with its ring checked.
fn area(value: &Value, key: &str, fields: &Fields) -> Option<Drawn> {
    let drawn = ring(value, key, fields)?;
    let faults = faults_of_rings(std::slice::from_ref(&drawn));
    let good = faults.is_empty();
    fields.notes.faults.borrow_mut().extend(faults);
    good.then_some(Drawn { form: Form::Area(drawn.ring), span: drawn.place })
}
