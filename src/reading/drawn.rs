//! Shapes as they were drawn, each point with its place, and how much of them is accepted.

use crate::diagnostic::{Fault, Label, Span};
use crate::geometry::Ring;
use crate::geometry::validity::{RingFault, RingFaultKind, ring_faults};

/// Largest text that is read, bytes.
pub const LARGEST_TEXT: usize = 64 << 20;
/// Most numbers in the sheet and its outlines together.
pub const MOST_NUMBERS: usize = 2_000_000;
/// Most copies that one pattern makes.
pub const MOST_COPIES: usize = 20_000;
/// Most faults that are told of one text.
pub const MOST_FAULTS: usize = 1000;
/// Most spots of a whole job, patterns expanded.
pub const MOST_SPOTS: usize = 100_000;

/// A ring with the places of its points.
#[derive(Debug, Clone)]
pub struct DrawnRing {
    /// The ring in mm.
    pub ring: Ring,
    /// Its name in the outline, if any.
    pub name: Option<String>,
    /// Where each vertex is written.
    pub places: Vec<Span>,
    /// Where the ring begins.
    pub place: Span,
}

/// How much has been read so far.
#[derive(Debug, Default)]
pub struct Budget {
    numbers: usize,
    spots: usize,
}

impl Budget {
    /// Counts numbers; a fault once there are more than [`MOST_NUMBERS`].
    pub fn spend(&mut self, numbers: usize, place: &Span) -> Result<(), Fault> {
        self.numbers += numbers;
        within(self.numbers, MOST_NUMBERS, "numbers", place)
    }

    /// Counts spots; a fault once there are more than [`MOST_SPOTS`].
    pub fn spend_spots(&mut self, spots: usize, place: &Span) -> Result<(), Fault> {
        self.spots = self.spots.saturating_add(spots);
        within(self.spots, MOST_SPOTS, "spots", place)
    }
}

/// A fault when there are more than `most` of something.
pub fn within(count: usize, most: usize, what: &str, place: &Span) -> Result<(), Fault> {
    if count <= most {
        return Ok(());
    }
    Err(Fault {
        message: format!("the job is too large: more than {most} {what}"),
        span: Some(place.clone()),
        expected: Some(format!("at most {most} {what}")),
        remedy: Some("solve a part of it, or simplify the drawing".into()),
        labels: Vec::new(),
    })
}

/// A fault that ends the reading of a text once it has [`MOST_FAULTS`]: so many are one slip, repeated.
pub fn few_enough(faults: usize, place: &Span) -> Result<(), Fault> {
    if faults < MOST_FAULTS {
        return Ok(());
    }
    Err(Fault {
        message: format!("reading stops here: there are {MOST_FAULTS} faults before"),
        span: Some(place.clone()),
        expected: Some("a file without faults".into()),
        remedy: Some("correct the first ones: so many are often one slip, repeated".into()),
        labels: Vec::new(),
    })
}

/// What is wrong with the rings of one outline, told by role, number and coordinates.
pub fn faults_of_rings(rings: &[DrawnRing]) -> Vec<Fault> {
    let plain: Vec<Ring> = rings.iter().map(|r| r.ring.clone()).collect();
    ring_faults(&plain).iter().map(|fault| explained(fault, rings)).collect()
}

fn explained(fault: &RingFault, rings: &[DrawnRing]) -> Fault {
    let title = |number: usize| match rings.get(number).and_then(|r| r.name.as_ref()) {
        Some(name) => format!("ring {} ({name})", number + 1),
        None => format!("ring {}", number + 1),
    };
    let place = |(ring, vertex): (usize, usize)| rings.get(ring).map(|r| r.places.get(vertex).unwrap_or(&r.place).clone());
    let (ring, at) = (fault.place.0, format!("({:.6}, {:.6}) mm", fault.at.x, fault.at.y));
    let (message, expected, remedy) = match fault.kind {
        RingFaultKind::TooFewPoints => (
            format!("{} at {at} has fewer than three points", title(ring)),
            "three points, or two with an arc between them",
            "add the missing points, or remove the ring",
        ),
        RingFaultKind::WildNumber => (
            format!("{}: a coordinate or arc at {at} is out of range", title(ring)),
            "finite numbers of at most 1 000 000 mm, and radii of at most 1000 km",
            "move the drawing towards the origin and check the unit",
        ),
        RingFaultKind::TooManyEdges => (
            format!("{}: arcs at {at} need too many straight pieces", title(ring)),
            "arcs that flatten to a few thousand pieces",
            "draw very large arcs as straight edges",
        ),
        RingFaultKind::MeetsItself => (
            format!("{} crosses or touches itself at {at}", title(ring)),
            "a ring whose edges meet only at its corners",
            "correct the order of the points, or leave a gap",
        ),
        RingFaultKind::MeetsOther => (
            format!("{} crosses or touches {} at {at}", title(ring), title(fault.other.map_or(0, |o| o.0))),
            "rings with a gap between them; beside an arc at least 0.003 mm (it is cut into chords), between two arcs 0.006 mm",
            "merge the two rings into one, or move them apart",
        ),
    };
    let other = fault.other.and_then(place);
    let labels = other.map(|span| Label { span, text: "the other edge starts here".into() }).into_iter().collect();
    Fault { message, span: place(fault.place), expected: Some(expected.into()), remedy: Some(remedy.into()), labels }
}
