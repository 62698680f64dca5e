//! A second opinion from a general library: ladders of cells, solved by nodal analysis with a dense inverse.
//!
//! Strips with full-width line taps are exactly resistors in a row (the field is one-dimensional; closed form, derived), so the finite elements
//! must enclose what nodal analysis (Kirchhoff's laws) finds for the network.

use crate::support::{read, solved};
use nalgebra::{DMatrix, DVector};

/// One group of cells between two strips: taps at the same places, emf and resistance per cell, a load between two of the taps.
struct Ladder {
    places: Vec<f64>,
    emf: Vec<f64>,
    inner: Vec<f64>,
    load_a: f64,
    /// Sheet resistance over width of the two strips, ohm per mm.
    per_mm: [f64; 2],
}

impl Ladder {
    fn random(random: &mut fastrand::Rng) -> Self {
        let cells = random.usize(2..7);
        let mut places = vec![0.0];
        for _ in 0..cells {
            let last = places[places.len() - 1];
            places.push(last + 5.0 + f64::from(random.u32(0..150)) / 10.0);
        }
        let figure = |random: &mut fastrand::Rng, low: f64, high: f64| low + (high - low) * random.f64();
        Self {
            emf: (0..cells).map(|_| figure(random, 3.59, 3.61)).collect(),
            inner: (0..cells).map(|_| figure(random, 2e-3, 20e-3)).collect(),
            load_a: figure(random, -80.0, 80.0),
            per_mm: [9e-5 / 0.2 / 12.0, 1.7241e-5 / 0.1 / 8.0],
            places,
        }
    }

    fn sheet(&self) -> String {
        let length = self.places[self.places.len() - 1];
        let mut text = format!(
            "title = \"ladder\"\n\
             [[layer]]\nname = \"a\"\nresistivity_uohm_cm = 9.0\nthickness_mm = 0.2\npoints_mm = [[0, 0], [{length}, 0], [{length}, 12], [0, 12]]\n\
             [[layer]]\nname = \"b\"\nresistivity_uohm_cm = 1.7241\nthickness_mm = 0.1\npoints_mm = [[0, 0], [{length}, 0], [{length}, 8], [0, 8]]\n"
        );
        for (k, (emf, inner)) in self.emf.iter().zip(&self.inner).enumerate() {
            let x = self.places[k];
            text += &format!(
                "[[cell]]\nname = \"C{k}\"\nlayer = \"a\"\nline_mm = [[{x}, 0], [{x}, 12]]\njoint_mohm = 0\nemf_mv = {}\nresistance_mohm = {}\n\
                 return = {{ layer = \"b\", line_mm = [[{x}, 0], [{x}, 8]], joint_mohm = 0 }}\n",
                1e3 * emf,
                1e3 * inner
            );
        }
        for (name, layer, width, sign) in [("plus", "a", 12, -1.0), ("minus", "b", 8, 1.0)] {
            text += &format!(
                "[[terminal]]\nname = \"{name}\"\nlayer = \"{layer}\"\nline_mm = [[{length}, 0], [{length}, {width}]]\ncurrent_a = {}\n",
                sign * self.load_a
            );
        }
        text
    }

    /// Currents of the cells by nodal analysis: the last node of the second strip is zero.
    fn by_nodes(&self) -> Vec<f64> {
        let taps = self.places.len();
        let order = 2 * taps;
        let mut matrix = DMatrix::<f64>::zeros(order, order);
        let mut right = DVector::<f64>::zeros(order);
        let mut between = |i: usize, j: usize, siemens: f64| {
            for (a, b) in [(i, j), (j, i)] {
                matrix[(a, a)] += siemens;
                matrix[(a, b)] -= siemens;
            }
        };
        for strip in 0..2 {
            for k in 0..taps - 1 {
                between(strip * taps + k, strip * taps + k + 1, 1.0 / (self.per_mm[strip] * (self.places[k + 1] - self.places[k])));
            }
        }
        for (k, inner) in self.inner.iter().enumerate() {
            between(k, taps + k, 1.0 / inner);
            right[k] += self.emf[k] / inner;
            right[taps + k] -= self.emf[k] / inner;
        }
        right[taps - 1] -= self.load_a;
        right[order - 1] += self.load_a;
        let reduced = matrix.remove_row(order - 1).remove_column(order - 1);
        let volts = reduced.try_inverse().expect("a connected network") * right.remove_row(order - 1);
        let at = |node: usize| if node == order - 1 { 0.0 } else { volts[node] };
        (0..self.inner.len()).map(|k| (self.emf[k] - (at(k) - at(taps + k))) / self.inner[k]).collect()
    }
}

#[test]
fn ladders_of_cells_carry_what_nodal_analysis_finds() {
    let mut random = fastrand::Rng::with_seed(20);
    for round in 0..20 {
        let ladder = Ladder::random(&mut random);
        let found = solved(&read(&ladder.sheet(), &Default::default()), 0.1);
        for (k, expected) in ladder.by_nodes().into_iter().enumerate() {
            let cell = found.electrodes.iter().find(|e| e.name == format!("C{k}")).expect("the cell");
            let allow = 1e-9 * expected.abs().max(1.0);
            assert!(
                cell.current_range_a.low - allow <= expected && expected <= cell.current_range_a.high + allow,
                "round {round}, C{k}: {expected} A by nodes, {:?}\n{}",
                cell.current_range_a,
                ladder.sheet()
            );
            assert!((cell.current_a - expected).abs() < 1e-6, "round {round}, C{k}: one-dimensional fields are exact");
        }
    }
}

/// A line joint of a cell through two strips, 6 mm wide and 40 mm long: closed forms, derived. Along the line all is alike, so that the fields have one
/// dimension: the joint is passed once on the way to the lower strip, twice on the way to the upper one.
#[test]
fn a_line_through_two_sheets_is_passed_once_for_each_interface() {
    let strip = 9e-5 * 36.0 / (6.0 * 0.2);
    for (joint_mohm, out, expected_ohm) in [(0.2, "lower", 0.2e-3 + strip), (0.2, "upper", 0.4e-3 + strip), (0.0, "upper", strip)] {
        let sheet = format!(
            "[[layer]]\nname = \"upper\"\nresistivity_uohm_cm = 9\nthickness_mm = 0.2\npoints_mm = [[0, 0], [40, 0], [40, 6], [0, 6]]\n\
             [[layer]]\nname = \"lower\"\nresistivity_uohm_cm = 9\nthickness_mm = 0.2\npoints_mm = [[-3, 0], [40, 0], [40, 6], [-3, 6]]\n\
             [[cell]]\nname = \"C\"\nthrough = [\"upper\", \"lower\"]\nline_mm = [[4, 0], [4, 6]]\njoint_mohm = {joint_mohm}\ncurrent_a = 5\n\
             [[terminal]]\nname = \"out\"\nlayer = \"{out}\"\nline_mm = [[40, 0], [40, 6]]\n"
        );
        let found = solved(&read(&sheet, &Default::default()), 1e-4);
        let resistance = found.resistance_mohm.expect("two electrodes");
        let expected = 1e3 * expected_ohm;
        assert!(resistance.low <= expected && expected <= resistance.high, "{joint_mohm} {out}: {resistance:?}, {expected}");
        assert!((found.loss_w.value - 25.0 * expected_ohm).abs() < 1e-6 * found.loss_w.value);
    }
}
