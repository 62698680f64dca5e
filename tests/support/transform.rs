//! A problem turned, mirrored, shifted and scaled in its plane: what the physics must not notice.

use pinchbar::geometry::{Point, Region, Ring};
use pinchbar::problem::{Footprint, Interface, Problem};

/// A similarity of the plane: turn, then mirror at the y axis, then scale, then shift.
#[derive(Debug, Clone, Copy)]
pub struct Similarity {
    /// Counter-clockwise, in degrees.
    pub turn_degrees: f64,
    /// Left becomes right.
    pub mirror: bool,
    /// Lengths in the plane times this; thicknesses stay.
    pub scale: f64,
    /// In mm, after all else.
    pub shift: Point,
}

impl Similarity {
    /// Nothing changes.
    pub const NONE: Self = Self { turn_degrees: 0.0, mirror: false, scale: 1.0, shift: Point::new(0.0, 0.0) };

    fn point(&self, p: Point) -> Point {
        let (s, c) = self.turn_degrees.to_radians().sin_cos();
        let turned = Point::new(c * p.x - s * p.y, s * p.x + c * p.y);
        let mirrored = if self.mirror { Point::new(-turned.x, turned.y) } else { turned };
        mirrored * self.scale + self.shift
    }

    fn points(&self, points: &mut [Point]) {
        points.iter_mut().for_each(|p| *p = self.point(*p));
    }

    fn region(&self, region: &mut Region) {
        region.loops.iter_mut().for_each(|l| self.points(l));
    }

    fn ring(&self, ring: &mut Ring) {
        for vertex in &mut ring.vertices {
            vertex.point = self.point(vertex.point);
            vertex.bulge = if self.mirror { -vertex.bulge } else { vertex.bulge };
        }
    }

    fn footprint(&self, footprint: &mut Footprint) {
        match footprint {
            Footprint::Line { points } => self.points(points),
            Footprint::Area { region, area_mm2, centre, diameter_mm } => {
                self.region(region);
                *centre = self.point(*centre);
                *area_mm2 *= self.scale * self.scale;
                *diameter_mm = diameter_mm.map(|d| d * self.scale);
            }
        }
    }

    /// The problem seen through the similarity. Contacts per area are scaled so that all resistances stay.
    pub fn of(&self, problem: &Problem) -> Problem {
        let mut problem = problem.clone();
        problem.accuracy.gauge_mm = problem.accuracy.gauge_mm.or(Some(0.5)).map(|g| g * self.scale);
        for layer in &mut problem.layers {
            layer.rings.iter_mut().for_each(|ring| self.ring(ring));
            self.region(&mut layer.region);
        }
        for contact in &mut problem.contacts {
            if let Some(area) = &mut contact.area {
                self.region(area);
            }
            if let Interface::Conductance(per_area) = &mut contact.interface {
                *per_area /= self.scale * self.scale;
            }
        }
        problem.joins.iter_mut().flat_map(|j| &mut j.spots).for_each(|spot| self.footprint(spot));
        problem.electrodes.iter_mut().flat_map(|e| &mut e.spots).for_each(|spot| self.footprint(&mut spot.footprint));
        for probe in &mut problem.probes {
            probe.tip_mm *= self.scale;
            probe.tips.iter_mut().for_each(|tip| tip.1 = self.point(tip.1));
        }
        for crossing in &mut problem.crossings {
            (crossing.from, crossing.to) = (self.point(crossing.from), self.point(crossing.to));
            if self.mirror {
                std::mem::swap(&mut crossing.from, &mut crossing.to);
            }
        }
        problem
    }
}
