//! Straight cuts through a sheet: the current that crosses them (exact for the equilibrated flux), the cut with the highest mean density, and what
//! drops over the stretch around it.

use super::gauge::DensityField;
use super::metal::{LayerMetal, MetalTriangle, Place};
use crate::geometry::Point;
use crate::index::LayerId;
use crate::mesh::NONE;

/// Angles at which cuts through a spot are tried before the best one is refined.
const ANGLES: usize = 60;

/// A straight cut from edge to edge of the metal.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Section {
    /// Where it meets the edges.
    pub ends: [Point; 2],
    /// Its middle.
    pub middle: Place,
    /// Unit vector from the first end to the second.
    pub along: Point,
    /// Length in mm.
    pub width: f64,
    /// Current across it, A, + from the left of the cut to its right.
    pub current: f64,
}

impl Section {
    /// Unit vector to the right of the cut.
    pub fn across(&self) -> Point {
        -self.along.perpendicular()
    }
}

/// What is lost over a stretch of metal.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Stretch {
    /// Difference of the mean potentials of its two end cuts, V.
    pub drop: f64,
    /// Loss in it, W.
    pub loss: f64,
}

/// Current per mm across a straight line in a triangle, + to the right of `along`: constant, because the normal part of the flux is constant along a line.
fn crossing_density(triangle: &MetalTriangle, origin: Point, along: Point) -> f64 {
    (0..3).map(|k| triangle.flux[k] * along.cross(triangle.corners[k] - origin)).sum::<f64>() / (2.0 * triangle.area)
}

/// The cut through a place at an angle (radians); `None` where it runs into a pole (a held patch or a line joint) or is longer than `longest`.
fn cut(metal: &LayerMetal, place: Place, angle: f64, longest: f64) -> Option<Section> {
    let along = Point::new(angle.cos(), angle.sin());
    let mut defined = true;
    let mut current = 0.0;
    let mut half = |way: Point, sign: f64, longest: f64| {
        let walk = metal.walk(place, way, f64::INFINITY, |step| {
            let triangle = metal.at(step.triangle);
            current += sign * (step.to - step.from) * crossing_density(triangle, place.point, way);
            defined &= step.to <= longest && !triangle.held && step.edge.is_none_or(|k| !triangle.open[k]);
            defined
        });
        defined.then_some(walk.length)
    };
    let forward = half(along, 1.0, longest)?;
    let backward = half(-along, -1.0, longest - forward)?;
    let ends = [place.point - along * backward, place.point + along * forward];
    let width = forward + backward;
    (width > 0.0).then_some(Section { ends, middle: place, along, width, current })
}

/// The cut with the highest mean density of all that pass one of the places (given in order of preference), equal ones by lower angle.
/// `most`: no cut carries more than this, A; `flow`: roughly where the current goes. They save work and change nothing.
pub fn best_cut(metal: &LayerMetal, places: &[Place], most: f64, flow: Point) -> Option<Section> {
    let mean = |s: &Section| s.current.abs() / s.width;
    let step = std::f64::consts::PI / ANGLES as f64;
    let across = flow.perpendicular();
    let first_guess = (across.y.atan2(across.x).rem_euclid(std::f64::consts::PI) / step).round() * step;
    let guessed = places.iter().filter_map(|&place| cut(metal, place, first_guess, f64::INFINITY)).map(|s| mean(&s)).fold(0.0, f64::max);
    let mut best: Option<(Section, Place, f64)> = None;
    for &place in places {
        for i in 0..ANGLES {
            let angle = i as f64 * step;
            let to_beat = best.map_or(guessed * (1.0 - 1e-6), |(b, ..)| mean(&b).max(guessed * (1.0 - 1e-6)));
            let longest = if to_beat > 0.0 { 1.01 * most / to_beat } else { f64::INFINITY };
            if let Some(section) = cut(metal, place, angle, longest)
                && best.is_none_or(|(b, ..)| mean(&section) > mean(&b) * (1.0 + 1e-6))
            {
                best = Some((section, place, angle));
            }
        }
    }
    let (mut section, place, mut angle) = best?;
    let longest = f64::INFINITY;
    let mut turn = 0.5 * step;
    while turn > 2e-4 {
        let tried = [angle - turn, angle + turn].map(|a| (cut(metal, place, a, longest), a));
        let better = tried.into_iter().filter_map(|(s, a)| Some((s?, a))).find(|(s, _)| mean(s) > mean(&section) * (1.0 + 1e-9));
        match better {
            Some(b) => (section, angle) = b,
            None => turn *= 0.5,
        }
    }
    section.middle = metal.moved(place, section.ends[0].midpoint(section.ends[1]));
    Some(section)
}

/// The narrowest cut of a neck near a cut through it: along the current to at most one width away, while the mean density rises.
pub fn narrowest(metal: &LayerMetal, start: Section) -> Section {
    let mean = |s: &Section| s.current.abs() / s.width;
    let across = start.across();
    let at = |shift: f64, turn: f64| {
        let place = metal.moved(start.middle, start.middle.point + across * shift);
        let angle = start.along.y.atan2(start.along.x) + turn;
        let mut section = cut(metal, place, angle, 2.0 * start.width)?;
        section.middle = metal.moved(place, section.ends[0].midpoint(section.ends[1]));
        Some((section, shift, turn))
    };
    let mut best = (start, 0.0, 0.0);
    let (mut step, mut angle) = (0.25 * start.width, 0.05);
    while step > 2e-4 * start.width {
        let (_, shift, turn) = best;
        let tried =
            [(step, 0.0), (-step, 0.0), (0.0, angle), (0.0, -angle), (step, angle), (step, -angle), (-step, angle), (-step, -angle)];
        let tried = tried.into_iter().map(|(s, a)| (shift + s, turn + a)).filter(|(s, _)| s.abs() <= start.width);
        let better = tried.filter_map(|(s, a)| at(s, a)).find(|(s, ..)| mean(s) > mean(&best.0) * (1.0 + 1e-6));
        match better {
            Some(found) => best = found,
            None => (step, angle) = (0.5 * step, 0.5 * angle),
        }
    }
    best.0
}

/// Width of the metal through a place along a direction.
pub fn width_through(metal: &LayerMetal, place: Place, along: Point) -> f64 {
    [along, -along].into_iter().map(|way| metal.walk(place, way, f64::INFINITY, |_| true).length).sum()
}

/// Drop and loss over the stretch of one section width: the square around the section, as far as there is metal that hangs together with it.
pub fn stretch(metal: &LayerMetal, section: &Section) -> Option<Stretch> {
    let half = 0.5 * section.width;
    let mut reach = [0.0; 2];
    let mut level = [0.0; 2];
    for (i, sign) in [-1.0, 1.0].into_iter().enumerate() {
        let out = metal.walk(section.middle, section.across() * sign, half, |_| true);
        // An end cut on the very edge of the metal would not find its way along it.
        let inset = if out.at_edge { 1e-4 * half } else { 0.0 };
        reach[i] = (out.length - inset).max(0.0);
        let place = metal.moved(section.middle, section.middle.point + section.across() * (sign * reach[i]));
        let (mut sum, mut length) = (0.0, 0.0);
        for way in [section.along, -section.along] {
            metal.walk(place, way, half, |step| {
                let (middle, part) = (place.point + way * (0.5 * (step.from + step.to)), step.to - step.from);
                sum += part * metal.at(step.triangle).potential_at(middle);
                length += part;
                true
            });
        }
        if length <= 0.0 {
            return None;
        }
        level[i] = sum / length;
    }
    // In the section's own frame: x along it, y across.
    let origin = section.middle.point;
    let local = |p: Point| Point::new(section.along.dot(p - origin), section.across().dot(p - origin));
    let (low, high) = (Point::new(-half, -reach[0]), Point::new(half, reach[1]));
    let mut seen = std::collections::HashSet::from([section.middle.triangle]);
    let mut stack = vec![section.middle.triangle];
    let mut loss = 0.0;
    while let Some(t) = stack.pop() {
        let triangle = metal.at(t);
        let area = area_within(triangle.corners.map(local), low, high);
        if area <= 0.0 {
            continue;
        }
        loss += metal.resistivity * metal.thickness * triangle.magnitude * triangle.magnitude * area;
        for other in triangle.neighbours.into_iter().filter(|&n| n != NONE) {
            if seen.insert(other) {
                stack.push(other);
            }
        }
    }
    Some(Stretch { drop: (level[1] - level[0]).abs(), loss })
}

/// Area of a triangle within an upright box.
fn area_within(corners: [Point; 3], low: Point, high: Point) -> f64 {
    let area = |p: &[Point]| (0..p.len()).map(|i| 0.5 * (p[i] - p[0]).cross(p[(i + 1) % p.len()] - p[0])).sum::<f64>().abs();
    let inside = |p: &Point| p.x >= low.x && p.x <= high.x && p.y >= low.y && p.y <= high.y;
    if corners.iter().all(inside) {
        return area(&corners);
    }
    let sides: [&dyn Fn(Point) -> f64; 4] = [&|p| p.x - low.x, &|p| high.x - p.x, &|p| p.y - low.y, &|p| high.y - p.y];
    let mut polygon = corners.to_vec();
    for side in sides {
        let mut kept = Vec::with_capacity(polygon.len() + 1);
        for i in 0..polygon.len() {
            let (p, q) = (polygon[i], polygon[(i + 1) % polygon.len()]);
            let (sp, sq) = (side(p), side(q));
            if sp >= 0.0 {
                kept.push(p);
            }
            if (sp >= 0.0) != (sq >= 0.0) {
                kept.push(p + (q - p) * (sp / (sp - sq)));
            }
        }
        polygon = kept;
    }
    if polygon.len() < 3 { 0.0 } else { area(&polygon) }
}

/// A stretch of a crossing that lies inside a held patch, where no current is defined.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct HeldStretch {
    /// On this sheet.
    pub layer: LayerId,
    /// A point in the patch.
    pub at: Point,
}

/// Current across the line `from -> to` per sheet, A, + from its left to its right: the exact integral of the equilibrated flux.
///
/// # Errors
/// Where a stretch lies inside a held patch.
pub fn crossing_current(density: &DensityField, from: Point, to: Point) -> Result<Vec<f64>, HeldStretch> {
    let length = from.distance(to);
    if length == 0.0 {
        return Ok(vec![0.0; density.layers.len()]);
    }
    let along = (to - from) * (1.0 / length);
    density.layers.iter().map(|metal| crossing_of(metal, from, along, length)).collect()
}

fn crossing_of(metal: &LayerMetal, from: Point, along: Point, length: f64) -> Result<f64, HeldStretch> {
    // Vertices this near to the line lie on it: corners of the drawing are rounded to a grid.
    const ON_LINE: f64 = 1e-7;
    let mut current = 0.0;
    for triangle in &metal.triangles {
        let side = triangle.corners.map(|c| along.cross(c - from)).map(|s| if s.abs() < ON_LINE { 0.0 } else { s });
        if side.iter().all(|&s| s > 0.0) || side.iter().all(|&s| s < 0.0) {
            continue;
        }
        // Where an edge lies on the line, the triangle on its left counts; the one on its right only where there is none on the left.
        if side.iter().all(|&s| s <= 0.0)
            && !(0..3).any(|k| side[k] < 0.0 && side[(k + 1) % 3] == side[(k + 2) % 3] && triangle.neighbours[k] == NONE)
        {
            continue;
        }
        let (mut enter, mut leave) = (f64::INFINITY, f64::NEG_INFINITY);
        for k in 0..3 {
            let (a, b) = (k, (k + 1) % 3);
            let (pa, pb) = (along.dot(triangle.corners[a] - from), along.dot(triangle.corners[b] - from));
            let met = if side[a] == 0.0 {
                pa
            } else if (side[a] > 0.0) != (side[b] > 0.0) && side[b] != 0.0 {
                pa + (pb - pa) * side[a] / (side[a] - side[b])
            } else {
                continue;
            };
            (enter, leave) = (enter.min(met), leave.max(met));
        }
        let (enter, leave) = (enter.max(0.0), leave.min(length));
        if leave - enter > 0.0 {
            if triangle.held && leave - enter > 1e-6 {
                return Err(HeldStretch { layer: metal.layer, at: from + along * (0.5 * (enter + leave)) });
            }
            current += (leave - enter) * crossing_density(triangle, from, along);
        }
    }
    Ok(current)
}

#[cfg(test)]
mod tests {
    use super::super::gauge::DensityField;
    use super::super::trial::*;
    use super::*;
    use crate::problem::*;

    /// A strip with a nugget of 4 mm at its middle, held, that gives 3 of the 5 A that leave on the right.
    fn fed_strip() -> DensityField {
        let body = polygon(&[(0.0, 0.0), (40.0, 0.0), (40.0, 10.0), (0.0, 10.0)]);
        let electrodes = vec![
            electrode(ElectrodeKind::Terminal, 0, line(&[(0.0, 0.0), (0.0, 10.0)]), 0.0, Drive::Current(2.0)),
            electrode(ElectrodeKind::Cell, 0, disc(20.0, 5.0, 4.0), 0.0, Drive::Current(3.0)),
            electrode(ElectrodeKind::Terminal, 0, line(&[(40.0, 0.0), (40.0, 10.0)]), 0.0, Drive::Balance),
        ];
        surveyed(&problem(vec![sheet("a", vec![body], 0.2)], electrodes, 1e-2, 0.5)).1
    }

    #[test]
    fn crossings_conserve_current_and_know_their_direction() {
        let density = fed_strip();
        let across = |a: (f64, f64), b: (f64, f64)| crossing_current(&density, Point::new(a.0, a.1), Point::new(b.0, b.1)).map(|c| c[0]);
        // Upwards, the right-hand side is that of larger x.
        for (a, b, expected) in [
            ((10.0, -1.0), (10.0, 11.0), 2.0),
            ((30.0, -1.0), (30.0, 11.0), 5.0),
            ((30.0, 11.0), (30.0, -1.0), -5.0),
            ((3.0, 0.0), (17.0, 10.0), 2.0),
            ((40.0, 0.0), (40.0, 10.0), 5.0),
            ((0.0, 0.0), (0.0, 10.0), 2.0),
            ((5.0, 0.0), (35.0, 0.0), 0.0),
            ((50.0, 0.0), (50.0, 10.0), 0.0),
            ((1.0, 1.0), (1.0, 1.0), 0.0),
        ] {
            let found = across(a, b).unwrap();
            assert!((found - expected).abs() < 1e-9, "{a:?} {b:?}: {found} {expected}");
        }
        let held = across((20.0, 0.0), (20.0, 10.0)).unwrap_err();
        assert!(held.at.distance(Point::new(20.0, 5.0)) < 2.01);
        // Around the nugget, from edge to edge on either side of it.
        let around = [((15.0, 0.0), (15.0, 10.0)), ((25.0, 10.0), (25.0, 0.0))].map(|(a, b)| across(a, b).unwrap());
        assert!((around[0] + around[1] + 3.0).abs() < 1e-9);
    }

    #[test]
    fn the_best_cut_of_a_turned_strip_is_square_to_it() {
        let turned = |x: f64, y: f64| (0.8 * x - 0.6 * y, 0.6 * x + 0.8 * y);
        let body = polygon(&[turned(0.0, 0.0), turned(40.0, 0.0), turned(40.0, 8.0), turned(0.0, 8.0)]);
        let ends = terminals(line(&[turned(0.0, 0.0), turned(0.0, 8.0)]), line(&[turned(40.0, 0.0), turned(40.0, 8.0)]), 0, 8.0);
        let (_, density, _) = surveyed(&problem(vec![sheet("a", vec![body], 0.5)], ends, 1e-3, 0.5));
        let metal = &density.layers[0];
        let (x, y) = turned(13.0, 3.0);
        let place = metal.locate(Point::new(x, y), 1e-6).unwrap();
        let section = best_cut(metal, &[place], 8.0, Point::new(0.8, 0.6)).unwrap();
        assert!((section.width - 8.0).abs() < 1e-5 && (section.current.abs() - 8.0).abs() < 1e-6, "{section:?}");
        // One square of 0.5 mm copper: 34.482 microhm at 8 A.
        let stretch = stretch(metal, &section).unwrap();
        assert!((stretch.drop - 8.0 * 3.4482e-5).abs() < 1e-8 && (stretch.loss - 64.0 * 3.4482e-5).abs() < 1e-6, "{stretch:?}");
        // Guesses only save work.
        let other = best_cut(metal, &[place], 800.0, Point::new(0.0, 1.0)).unwrap();
        assert!((other.width - section.width).abs() < 1e-6);
    }

    #[test]
    fn a_box_cuts_a_triangle() {
        let corners = [Point::new(0.0, 0.0), Point::new(4.0, 0.0), Point::new(0.0, 4.0)];
        assert!((area_within(corners, Point::new(-1.0, -1.0), Point::new(9.0, 9.0)) - 8.0).abs() < 1e-12);
        assert!((area_within(corners, Point::new(1.0, 1.0), Point::new(9.0, 9.0)) - 2.0).abs() < 1e-12);
        assert!((area_within(corners, Point::new(0.0, 0.0), Point::new(2.0, 2.0)) - 4.0).abs() < 1e-12);
        assert_eq!(area_within(corners, Point::new(5.0, 5.0), Point::new(9.0, 9.0)), 0.0);
    }
}
