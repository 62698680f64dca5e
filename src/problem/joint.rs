//! Where sheets meet: areas of contact, and spots, seams or areas that join them.

use crate::geometry::{Point, Region};
use crate::index::{ElectrodeId, JoinId, LayerId};

/// What an interface does to the current that passes it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Interface {
    /// No drop across it: equal potentials, conductances add. Never stood for by a small number.
    Bonded,
    /// Conductance per area, S/mm².
    Conductance(f64),
}

/// An area where two sheets lie on each other.
#[derive(Debug, Clone)]
pub struct Contact {
    /// Its name, or "A on B".
    pub name: String,
    /// The two sheets; current counts + from the first into the second.
    pub between: [LayerId; 2],
    /// The area; `None`: wherever both are. It is clipped to where both are in any case.
    pub area: Option<Region>,
    /// Contact per area.
    pub interface: Interface,
}

/// Spots, seams or areas that join two sheets; in parallel with a contact where both are.
#[derive(Debug, Clone)]
pub struct Join {
    /// The two sheets; current counts + from the first into the second.
    pub between: [LayerId; 2],
    /// The places.
    pub spots: Vec<Footprint>,
    /// Resistance of one spot in ohm, interface only; 0 is a bond. Its conductance is spread over the spot's nominal area.
    pub joint_ohm: f64,
}

/// A joint known by what a four-wire meter reads across it: the resistance of its spots is fitted to that
/// (`physics::fit`), so that the spreading in the sheets is not counted twice.
#[derive(Debug, Clone, PartialEq)]
pub struct Measured {
    /// Whose spots.
    pub joint: MeasuredJoint,
    /// The reading over the current through the joint, ohm.
    pub ohm: f64,
    /// Where the tips stand: on the two sheets of a join; on the first sheet of an electrode, whose can or lug has the other tip.
    pub tips: Vec<(LayerId, Point)>,
    /// True once the spots have their resistance.
    pub fitted: bool,
}

/// Whose spots were measured.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum MeasuredJoint {
    /// A join's.
    Join(JoinId),
    /// Those of electrodes made alike, of which the first one was measured.
    Electrodes(Vec<ElectrodeId>),
}

/// What a spot, seam, area, line or edge covers in the plane.
#[derive(Debug, Clone, PartialEq)]
pub enum Footprint {
    /// An area.
    Area {
        /// The flattened area.
        region: Region,
        /// Its full area in mm², also where a part is off the metal.
        area_mm2: f64,
        /// Its middle: a spot's centre, a seam's half-way point, an area's centroid.
        centre: Point,
        /// Diameter of a round spot, width of a seam; `None` for other areas.
        diameter_mm: Option<f64>,
    },
    /// A polyline of straight pieces: a line across the metal, or a stretch of an outline.
    Line {
        /// Its points in order; a closed line repeats its first point.
        points: Vec<Point>,
    },
}

impl Footprint {
    /// Its middle: the centre of an area, half of the way along a line.
    pub fn middle(&self) -> Point {
        let points = match self {
            Self::Area { centre, .. } => return *centre,
            Self::Line { points } => points,
        };
        let length: f64 = points.windows(2).map(|p| p[0].distance(p[1])).sum();
        let mut left = 0.5 * length;
        for pair in points.windows(2) {
            let step = pair[0].distance(pair[1]);
            if left <= step && step > 0.0 {
                return pair[0] + (pair[1] - pair[0]) * (left / step);
            }
            left -= step;
        }
        points.first().copied().unwrap_or_default()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_middle_of_a_line_is_half_of_the_way_along_it() {
        let line = |points: &[(f64, f64)]| Footprint::Line { points: points.iter().map(|&(x, y)| Point::new(x, y)).collect() };
        assert_eq!(line(&[(0.0, 0.0), (2.0, 0.0), (2.0, 6.0)]).middle(), Point::new(2.0, 2.0));
        assert_eq!(line(&[(1.0, 1.0), (1.0, 1.0)]).middle(), Point::new(1.0, 1.0));
    }
}
