//! Small job sheets from bytes: shapes on a coarse lattice, so that points, edges, spots and sheets often meet.

use arbitrary::{Result, Unstructured};
use std::fmt::{Debug, Write};

/// Vertices allowed to a job: enough for a few rounds.
const MOST_VERTICES: usize = 3000;

type Point = (f64, f64);

/// The text of a job sheet.
pub fn sheet(u: &mut Unstructured) -> Result<String> {
    let wild = u.ratio(1, 4)?;
    let mut maker = Maker { u, text: String::new(), wild };
    maker.job()?;
    // Points were written as tuples.
    Ok(maker.text.replace('(', "[").replace(')', "]"))
}

/// Writes a sheet by the choices that the bytes make.
struct Maker<'a, 'b> {
    u: &'a mut Unstructured<'b>,
    text: String,
    /// Anything may stand anywhere, and most is refused; else parts have places of their own, and most is solved.
    wild: bool,
}

impl Maker<'_, '_> {
    fn job(&mut self) -> Result<()> {
        self.line(format_args!("title = \"fuzz\"\n[accuracy]\nbracket_percent = 1\nmax_vertices = {MOST_VERTICES}"));
        if self.u.ratio(1, 6)? {
            let gauge = self.pick(&[1e-3, 0.3, 2.0, 30.0])?;
            self.key("gauge_mm", gauge);
        }
        let count = self.u.int_in_range(1..=3)?;
        let outers = (0..count).map(|layer| self.layer(layer)).collect::<Result<Vec<_>>>()?;
        for upper in 1..count {
            self.connection(upper)?;
        }
        if count > 1 && self.u.ratio(1, 4)? {
            self.connection(1)?;
        }
        for number in 0..self.u.int_in_range(2..=5)? {
            self.electrode(number, &outers)?;
        }
        for number in 0..self.u.int_in_range(0..=2)? {
            let layer = self.u.int_in_range(0..=count - 1)?;
            let tips = if self.wild { [self.point()?, self.point()?] } else { [(self.coordinate()?, 0.5), (self.coordinate()?, 3.5)] };
            let tip = self.pick(&[0.1, 0.3, 1.0])?;
            self.line(format_args!("[[probe]]\nname = \"M{number}\"\nlayer = \"L{layer}\"\ntips_mm = {tips:?}\ntip_mm = {tip}"));
        }
        for number in 0..self.u.int_in_range(0..=2)? {
            let x = self.coordinate()?;
            let (from, to) = if self.wild { (self.point()?, self.point()?) } else { ((x, -1.0), (x, 25.0)) };
            self.line(format_args!("[[crossing]]\nname = \"X{number}\"\nfrom_mm = {from:?}\nto_mm = {to:?}"));
        }
        if self.u.ratio(1, 4)? {
            self.line(format_args!("[limits]\ndrop_mv = 1\nsharing = 1.1\njoint_mv = 1\ndensity_a_mm2 = {{ L0 = 5 }}"));
        }
        Ok(())
    }

    fn line(&mut self, line: std::fmt::Arguments) {
        writeln!(self.text, "{line}").expect("a string takes everything");
    }

    fn key(&mut self, key: &str, value: impl Debug) {
        self.line(format_args!("{key} = {value:?}"));
    }

    fn pick(&mut self, values: &[f64]) -> Result<f64> {
        self.u.choose(values).copied()
    }

    /// Nothing, mostly.
    fn nudge(&mut self) -> Result<f64> {
        self.pick(&[0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.25, 0.013, 1e-3, -1e-5, 3e-7])
    }

    /// Mostly on a lattice of half a millimetre, sometimes just beside it.
    fn coordinate(&mut self) -> Result<f64> {
        Ok(f64::from(self.u.int_in_range(0u8..=48)?) * 0.5 + self.nudge()?)
    }

    fn point(&mut self) -> Result<Point> {
        Ok((self.coordinate()?, self.coordinate()?))
    }

    /// A place for a part with this number: on the strip along the bottom that every tame sheet covers, or anywhere.
    fn home(&mut self, number: usize) -> Result<Point> {
        if self.wild {
            return self.point();
        }
        let step = self.pick(&[0.0, 0.5, -0.5, 1.0])?;
        Ok((3.0 + 4.5 * number as f64 + step + self.nudge()?, 2.0 + self.nudge()?))
    }

    /// A block with corners on the lattice.
    fn block(&mut self) -> Result<Vec<Point>> {
        Ok(block(self.point()?, self.point()?))
    }

    /// Points in the order in which they are seen from their middle: a ring that seldom crosses itself.
    fn star(&mut self) -> Result<Vec<Point>> {
        let count = self.u.int_in_range(3..=9)?;
        let mut points = (0..count).map(|_| self.point()).collect::<Result<Vec<_>>>()?;
        let size = points.len() as f64;
        let middle = (points.iter().map(|p| p.0).sum::<f64>() / size, points.iter().map(|p| p.1).sum::<f64>() / size);
        let angle = |p: &Point| (p.1 - middle.1).atan2(p.0 - middle.0);
        points.sort_by(|a, b| angle(a).total_cmp(&angle(b)));
        Ok(points)
    }

    /// A comb: a back with teeth, all necks and inside corners.
    fn comb(&mut self) -> Result<Vec<Point>> {
        let (teeth, width) = (self.u.int_in_range(1u8..=4)?, self.pick(&[0.02, 0.2, 1.0, 3.0])?);
        let mut points = vec![(0.0, 0.0), (24.0, 0.0), (24.0, 4.0)];
        for tooth in (0..teeth).rev() {
            let left = 1.0 + 5.5 * f64::from(tooth);
            points.extend([(left + width, 4.0), (left + width, 16.0), (left, 16.0), (left, 4.0)]);
        }
        points.push((0.0, 4.0));
        Ok(points)
    }

    /// Writes a layer and gives its outer ring.
    fn layer(&mut self, number: usize) -> Result<Vec<Point>> {
        let kind = self.u.int_in_range(0..=if self.wild { 5 } else { 3 })?;
        let outer = match kind {
            0 => block((0.0, 0.0), (24.0, 16.0)),
            1 => block((0.0, 0.0), (24.0 + self.nudge()?, 4.0 + self.u.int_in_range(0u8..=12)? as f64)),
            2 => self.comb()?,
            3 => vec![(0.0, 0.0), (24.0, 0.0), (24.0, 8.0), (8.0, 8.0), (8.0, 20.0), (0.0, 20.0)],
            4 => self.block()?,
            _ => self.star()?,
        };
        let (thickness, resistivity) = (self.pick(&[0.2, 0.02, 2.0])?, self.pick(&[1.7, 9.0, 1e-3, 1e3])?);
        self.line(format_args!("[[layer]]\nname = \"L{number}\"\nthickness_mm = {thickness}\nresistivity_uohm_cm = {resistivity}"));
        self.key("points_mm", &outer);
        let mut holes = Vec::new();
        for hole in 0..self.u.int_in_range(0..=3)? {
            match (self.wild, kind) {
                (true, _) => holes.push(if self.u.ratio(1, 3)? { self.star()? } else { self.block()? }),
                (false, 0) => {
                    let (left, low) = (1.0 + 6.0 * f64::from(hole) + self.nudge()?, 5.0 + self.nudge()?);
                    let (wide, high) = (self.pick(&[4.0, 0.05, 6.0])?, self.pick(&[4.0, 0.05, 10.5])?);
                    holes.push(block((left, low), (left + wide, low + high)));
                }
                _ => {}
            }
        }
        if !holes.is_empty() {
            self.key("holes_mm", holes);
        }
        if self.u.ratio(1, 5)? {
            let radius = self.pick(&[0.05, 0.5, 3.0])?;
            self.key("corner_radius_mm", radius);
        }
        Ok(outer)
    }

    fn connection(&mut self, upper: usize) -> Result<()> {
        let lower = self.u.int_in_range(0..=upper - 1)?;
        let (first, second) = if self.u.arbitrary()? { (lower, upper) } else { (upper, lower) };
        if self.u.ratio(2, 3)? {
            self.line(format_args!("[[contact]]\nbetween = [\"L{first}\", \"L{second}\"]"));
            let contact = self.pick(&[0.0, 1e-3, 30.0, 300.0, 1e5])?;
            self.key("contact_mohm_mm2", contact);
            match self.u.int_in_range(0..=3)? {
                0 => {
                    let area = self.block()?;
                    self.key("points_mm", area);
                }
                1 => {
                    let disc = (self.coordinate()?, self.coordinate()?, self.pick(&[0.5, 4.0, 30.0])?);
                    self.key("disc_mm", disc);
                }
                _ => {}
            }
        } else {
            let joint = self.joint()?;
            self.line(format_args!("[[join]]\nbetween = [\"L{first}\", \"L{second}\"]\njoint_mohm = {joint:?}"));
            let number = self.u.int_in_range(0..=4)?;
            self.places(number)?;
        }
        Ok(())
    }

    fn joint(&mut self) -> Result<f64> {
        self.pick(&[0.0, 0.0, 1e-5, 0.05, 3.0, 1e4])
    }

    /// Spots, seams or areas.
    fn places(&mut self, number: usize) -> Result<()> {
        let count = self.u.int_in_range(1..=3)?;
        match self.u.int_in_range(0..=3)? {
            0 => {
                let (a, length, width) = (self.home(number)?, self.pick(&[0.0, 1.0, 2.5])?, self.pick(&[0.1, 0.5, 2.0])?);
                self.key("seams_mm", [(a.0, a.1, a.0 + length, a.1, width)]);
            }
            1 => {
                let (a, size) = (self.home(number)?, self.pick(&[0.02, 0.5, 2.0])?);
                let area = if self.wild { self.block()? } else { block(a, (a.0 + size, a.1 + size)) };
                self.key("areas_mm", [area]);
            }
            _ => {
                let spots = (0..count).map(|_| self.home(number)).collect::<Result<Vec<_>>>()?;
                let diameter = self.pick(&[1.0, 0.05, 0.5, 4.0])?;
                self.key("spots_mm", spots);
                self.key("diameter_mm", diameter);
            }
        }
        Ok(())
    }

    /// A stretch of an outline, a line across, or the ring itself.
    fn edge(&mut self, outer: &[Point]) -> Result<()> {
        let first = self.u.choose_index(outer.len())?;
        let (a, b) = (outer[first], outer[(first + 1) % outer.len()]);
        match self.u.int_in_range(0..=if self.wild { 3 } else { 2 })? {
            0 => self.key("edge_mm", [a, b]),
            1 => self.key("line_mm", [a, (0.5 * (a.0 + b.0), 0.5 * (a.1 + b.1))]),
            2 => self.key("line_mm", [a, b]),
            _ => self.key("edge_mm", [a]),
        }
        Ok(())
    }

    fn electrode(&mut self, number: usize, outers: &[Vec<Point>]) -> Result<()> {
        let layer = self.u.choose_index(outers.len())?;
        let outer = &outers[layer];
        // Two edges soon touch each other: tame jobs have one.
        let on_edge = (self.wild || number == 0) && self.u.arbitrary()?;
        let is_cell = number > 0 && self.u.arbitrary()?;
        if is_cell {
            let joint = self.joint()?;
            self.line(format_args!("[[cell]]\nname = \"E{number}\"\njoint_mohm = {joint:?}"));
            if !on_edge && outers.len() > 1 && self.u.ratio(1, 4)? {
                let all: Vec<String> = (0..outers.len()).map(|l| format!("L{l}")).collect();
                self.key("through", all);
            } else {
                self.line(format_args!("layer = \"L{layer}\""));
            }
            if on_edge { self.edge(outer)? } else { self.places(number)? }
        } else {
            self.line(format_args!("[[terminal]]\nname = \"E{number}\"\nlayer = \"L{layer}\""));
            if self.u.arbitrary()? {
                let joint = self.joint()?;
                self.key("joint_mohm", joint);
            }
            let (a, size) = (self.home(number)?, self.pick(&[1.0, 0.2, 3.0])?);
            match self.u.arbitrary()? {
                _ if on_edge => self.edge(outer)?,
                false => self.key("disc_mm", (a.0, a.1, size)),
                true => self.key("points_mm", block(a, (a.0 + size, a.1 + 0.5))),
            }
        }
        // The first terminal takes the balance, mostly.
        match (number, self.u.int_in_range(0..=9)?) {
            (0, 0..=7) => {}
            (0, _) => self.key("voltage_mv", 0),
            (_, 9) if is_cell => {
                let resistance = self.pick(&[16.0, 1e-3, 1e6])?;
                self.line(format_args!("emf_mv = 3650\nresistance_mohm = {resistance:?}"));
            }
            (_, 9) => {
                let voltage = self.pick(&[0.0, 1.0, -1e3])?;
                self.key("voltage_mv", voltage);
            }
            _ => {
                let current = self.pick(&[1.0, 0.0, -1.0, 15.0, 1e-6, 1e4])?;
                self.key("current_a", current);
            }
        }
        Ok(())
    }
}

fn block(a: Point, b: Point) -> Vec<Point> {
    let (low, high) = ((a.0.min(b.0), a.1.min(b.1)), (a.0.max(b.0), a.1.max(b.1)));
    vec![low, (high.0, low.1), high, (low.0, high.1)]
}
