//! Guaranteed intervals of everything that is reported, from the port fields and their defects.

use super::bar::{Bar, Ports};
use super::network::{self, Interval, Layout, ROUNDING};
use super::solution::{ElectrodeSolution, Fault};
use crate::fem::{self, Complex, Field};
use crate::mesh::Mesh;
use crate::problem::{Drive, Problem};

/// All guaranteed intervals of one round.
pub struct Enclosed {
    /// Loss in metal and joints.
    pub loss: Interval,
    /// Port resistance, for two electrodes.
    pub resistance: Option<Interval>,
    /// Per electrode.
    pub electrodes: Vec<ElectrodeSolution>,
    /// Per probe, V.
    pub probes: Vec<Interval>,
    /// Port currents whose field must be enclosed more tightly, and the weight of their indicators.
    pub failing: Vec<(Vec<f64>, f64)>,
    /// How many times too wide the worst of them is.
    pub excess: f64,
    /// Largest half-width of a voltage over the largest difference.
    pub voltage_spread: f64,
    /// Level of every piece, V.
    pub levels: Vec<f64>,
    /// Residual of the port solve.
    pub residual: f64,
}

/// Encloses everything.
pub fn enclose(
    problem: &Problem,
    mesh: &Mesh,
    complex: &Complex,
    layout: &Layout,
    bar: &Bar,
    ports: &Ports,
) -> Result<Enclosed, Vec<Fault>> {
    let response = network::response(problem, layout, &ports.matrix).ok_or_else(network::singular)?;
    let defect = fem::gram(mesh, complex, &ports.field, &bar.loads);
    let (currents, count) = (&response.currents, problem.electrodes.len());
    let volts = &response.voltages[..count];
    let (lowest, highest) = volts.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), &v| (l.min(v), h.max(v)));
    let difference = (highest - lowest).max(0.0);
    let tolerance = problem.accuracy.bracket;
    let mut failing = Vec::new();
    let mut spread: f64 = 0.0;
    let mut voltage = |unit: &[f64], value: f64| {
        let interval = network::enclosed(&defect, currents, unit, value, 1.0, difference);
        if difference > 0.0 {
            spread = spread.max(interval.half() / difference);
            let own = defect.form(unit, unit);
            if interval.half() > tolerance * difference && own > 0.0 {
                failing.push((unit.to_vec(), 1.0 / own));
            }
        }
        interval
    };
    let voltages: Vec<Interval> = (0..count).map(|k| voltage(&response.of_injection[k], volts[k])).collect();
    let probes = (0..problem.probes.len())
        .map(|p| {
            let (a, b) = (count + 2 * p, count + 2 * p + 1);
            let unit: Vec<f64> = response.of_injection[a].iter().zip(&response.of_injection[b]).map(|(x, y)| x - y).collect();
            voltage(&unit, response.voltages[a] - response.voltages[b])
        })
        .collect();
    let largest = currents.iter().fold(0.0, |m: f64, i| m.max(i.abs()));
    let range = |k: usize| -> Interval {
        let of_emf =
            |k: usize| response.of_emf[k].as_ref().map(|unit| network::enclosed(&defect, currents, unit, currents[k], -1.0, largest));
        match problem.electrodes[k].drive {
            Drive::Return(s) => of_emf(problem.sources[s.index()].positive.index()).map(|i| Interval { low: -i.high, high: -i.low }),
            _ => of_emf(k),
        }
        .unwrap_or(Interval { low: currents[k], high: currents[k] })
    };
    let ranges: Vec<Interval> = (0..count).map(range).collect();
    let low = ports.matrix.form(currents, currents).max(0.0);
    let high = low + defect.form(currents, currents).max(0.0);
    // Currents that were found may differ from the true ones: the loss then moves by no more than the norm of that difference.
    let slack: f64 = ranges
        .iter()
        .enumerate()
        .map(|(k, r)| (r.high - currents[k]).max(currents[k] - r.low) * (ports.matrix.at(k, k) + defect.at(k, k)).max(0.0).sqrt())
        .sum();
    let loss =
        Interval { low: (low.sqrt() - slack).max(0.0).powi(2) * (1.0 - ROUNDING), high: (high.sqrt() + slack).powi(2) * (1.0 + ROUNDING) };
    if slack > 0.0 && loss.low < loss.high / (1.0 + tolerance) {
        let units = (0..count).filter_map(|k| response.of_emf[k].clone());
        failing
            .extend(units.map(|unit| (defect.form(&unit, &unit), unit)).filter(|(own, _)| *own > 0.0).map(|(own, unit)| (unit, 1.0 / own)));
    }
    if !failing.is_empty() {
        let own = defect.form(currents, currents);
        if own > 0.0 {
            failing.push((currents.clone(), 1.0 / own));
        }
    }
    let resistance = (count == 2 && layout.piece_of[0] == layout.piece_of[1]).then(|| {
        let mut unit = vec![0.0; currents.len()];
        (unit[0], unit[1]) = (1.0, -1.0);
        let low = ports.matrix.form(&unit, &unit);
        let high = low + defect.form(&unit, &unit).max(0.0);
        Interval { low: low * (1.0 - ROUNDING), high: high * (1.0 + ROUNDING) }
    });
    let excess = (spread / tolerance).max((loss.high / loss.low - 1.0) / tolerance);
    let levels = (0..layout.pieces).map(|p| response.voltages[layout.reference_of[p]]).collect();
    let electrodes =
        (0..count).map(|k| ElectrodeSolution { current: currents[k], current_range: ranges[k], voltage: voltages[k] }).collect();
    Ok(Enclosed { loss, resistance, electrodes, probes, failing, excess, voltage_spread: spread, levels, residual: ports.residual })
}

/// The potential with every piece at its level.
pub fn levelled(mut potential: Field, complex: &Complex, levels: &[f64]) -> Field {
    for (value, &piece) in potential.values.iter_mut().zip(&complex.piece_of) {
        *value += levels[piece as usize];
    }
    potential
}
