//! Electrodes as a network: what the sources, held potentials and given currents make of the port matrix, and guaranteed intervals from it.
//!
//! Ports are the electrodes and the meter tips. With the discrete port matrix R (a lower bound) and D (upper less lower bound, both as
//! quadratic forms), the energy Q of the drive z (injected currents J, source levels E) is enclosed by matrices H and H + B'DB, where B z are
//! the discrete port currents. A voltage is dQ/dJ and a source's current -dQ/dE, so by Cauchy and Schwarz each lies within half of
//! sqrt(x.B'DB x) sqrt(z.B'DB z) of its middle value; x is the unit of that voltage or current.

use crate::algebra::Dense;
use crate::problem::{Drive, Problem};

/// How the ports lie in the metal.
pub struct Layout {
    /// Per port (electrodes first, then tips): its piece of metal.
    pub piece_of: Vec<usize>,
    /// Number of pieces.
    pub pieces: usize,
    /// Per piece: the electrode that is grounded while the port matrix is formed.
    pub reference_of: Vec<usize>,
    /// Electrodes whose potential is the zero of a part of the network that has no other.
    pub zeros: Vec<usize>,
}

/// The network's answer.
pub struct Response {
    /// Currents into the bar at every port, under the job's drive.
    pub currents: Vec<f64>,
    /// Discrete potentials of every port, V.
    pub voltages: Vec<f64>,
    /// Per port: the port currents that a unit of current injected there makes, with all sources at zero.
    pub of_injection: Vec<Vec<f64>>,
    /// Per electrode that is a source's positive end or held: the port currents that a unit of emf makes.
    pub of_emf: Vec<Option<Vec<f64>>>,
}

/// A guaranteed interval.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Interval {
    /// Not below this.
    pub low: f64,
    /// Not above this.
    pub high: f64,
}

impl Interval {
    /// Half its width.
    pub fn half(&self) -> f64 {
        0.5 * (self.high - self.low)
    }
}

/// Part of a figure by which an interval is widened for rounding in the sums and the solver. Measured: up to 8e-11 on a strip
/// behind joints of 1e-5 to 1e-3 mohm, against the closed form; the rest is margin for longer sums.
pub const ROUNDING: f64 = 1e-9;

/// Residual of a solve, relative to its right-hand side, above which the intervals are not vouched for.
pub const LARGEST_RESIDUAL: f64 = 1e-9;

/// The fault of a network that does not determine its currents.
pub fn singular() -> Vec<super::Fault> {
    vec![super::Fault::Numerical("the network of sources is singular".into())]
}

/// Solves the network; `None` when it is singular.
pub fn response(problem: &Problem, layout: &Layout, ports: &Dense) -> Option<Response> {
    let electrodes = problem.electrodes.len();
    let all = layout.piece_of.len();
    let order = electrodes + layout.pieces;
    // Columns: the drive, a unit injection at every port, a unit emf at every electrode.
    let columns = 1 + all + electrodes;
    let mut matrix = Dense::zeros(order, order);
    let mut right = Dense::zeros(order, columns);
    // Potential of electrode k: port currents times its row of the port matrix, and its piece's level.
    let add_potential = |matrix: &mut Dense, right: &mut Dense, row: usize, k: usize, sign: f64| {
        for j in 0..electrodes {
            matrix.add(row, j, sign * ports.at(k, j));
        }
        matrix.add(row, electrodes + layout.piece_of[k], sign);
        for tip in electrodes..all {
            right.add(row, 1 + tip, -sign * ports.at(k, tip));
        }
    };
    for (k, electrode) in problem.electrodes.iter().enumerate() {
        match electrode.drive {
            Drive::Current(current) => {
                matrix.set(k, k, 1.0);
                right.set(k, 0, current);
                right.set(k, 1 + k, 1.0);
            }
            Drive::Balance => add_potential(&mut matrix, &mut right, k, k, 1.0),
            Drive::Held(volts) => {
                add_potential(&mut matrix, &mut right, k, k, 1.0);
                right.add(k, 0, volts);
                right.add(k, 1 + all + k, 1.0);
            }
            Drive::Source(s) => {
                let source = &problem.sources[s.index()];
                add_potential(&mut matrix, &mut right, k, k, 1.0);
                if let Some(negative) = source.negative {
                    add_potential(&mut matrix, &mut right, k, negative.index(), -1.0);
                }
                matrix.add(k, k, source.resistance_ohm);
                right.add(k, 0, source.emf_v);
                right.add(k, 1 + k, source.resistance_ohm);
                right.add(k, 1 + all + k, 1.0);
            }
            Drive::Return(s) => {
                let positive = problem.sources[s.index()].positive.index();
                for end in [k, positive] {
                    matrix.add(k, end, 1.0);
                    right.add(k, 1 + end, 1.0);
                }
            }
        }
    }
    for p in 0..layout.pieces {
        let row = electrodes + p;
        let zero = layout.zeros.iter().find(|&&z| layout.piece_of[z] == p && problem.electrodes[z].drive != Drive::Balance);
        match zero {
            // All currents of this part add up to zero by themselves: one balance says nothing new, the level is free.
            Some(&z) => add_potential(&mut matrix, &mut right, row, z, 1.0),
            None => {
                for (k, &piece) in layout.piece_of.iter().enumerate() {
                    if piece == p && k < electrodes {
                        matrix.add(row, k, 1.0);
                    } else if piece == p {
                        right.add(row, 1 + k, -1.0);
                    }
                }
            }
        }
    }
    let solution = matrix.solve(&right)?;
    let port_currents = |column: usize, tip: Option<usize>| -> Vec<f64> {
        let mut currents = solution.column(column)[..electrodes].to_vec();
        currents.extend((electrodes..all).map(|t| if Some(t) == tip { 1.0 } else { 0.0 }));
        currents
    };
    let currents = port_currents(0, None);
    let level = |k: usize| solution.at(electrodes + layout.piece_of[k], 0);
    let voltages = (0..all).map(|k| (0..electrodes).map(|j| ports.at(k, j) * currents[j]).sum::<f64>() + level(k)).collect();
    let driven = |k: usize| matches!(problem.electrodes[k].drive, Drive::Source(_) | Drive::Held(_));
    Some(Response {
        voltages,
        of_injection: (0..all).map(|k| port_currents(1 + k, Some(k))).collect(),
        of_emf: (0..electrodes).map(|k| driven(k).then(|| port_currents(1 + all + k, None))).collect(),
        currents,
    })
}

/// The interval of a quantity whose discrete value is `value`: `unit` are the port currents of its unit, `sign` +1 for a voltage, -1 for a source's current.
pub fn enclosed(defect: &Dense, currents: &[f64], unit: &[f64], value: f64, sign: f64, scale: f64) -> Interval {
    if unit.iter().all(|u| *u == 0.0) {
        // The zero of the job, exact by definition.
        return Interval { low: value, high: value };
    }
    let own = defect.form(unit, unit).max(0.0);
    let drive = defect.form(currents, currents).max(0.0);
    let middle = value + sign * 0.5 * defect.form(unit, currents);
    let half = 0.5 * (own * drive).sqrt() + ROUNDING * scale.abs().max(value.abs());
    Interval { low: middle - half, high: middle + half }
}
