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
    /// How many times wider than asked the widest interval is.
    pub excess: f64,
    /// Port currents whose fields make the voltages and found currents too wide, in the size in which their defects count;
    /// empty where the loss alone is too wide.
    pub wide: Vec<Vec<f64>>,
    /// Largest half-width of a voltage over the largest difference.
    pub voltage_spread: f64,
    /// Level of every piece, V.
    pub levels: Vec<f64>,
    /// Residual of the port solve.
    pub residual: f64,
}

/// What makes an interval too wide.
struct Wide {
    unit: Vec<f64>,
    /// Square of its field's defect.
    own: f64,
    excess: f64,
}

/// Intervals are mended together with the widest when they are more than this part as wide.
const TOGETHER: f64 = 0.5;

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
    let mut wide: Vec<Wide> = Vec::new();
    let mut spread: f64 = 0.0;
    let mut voltage = |unit: &[f64], value: f64| {
        let interval = network::enclosed(&defect, currents, unit, value, 1.0, difference);
        if difference > 0.0 {
            spread = spread.max(interval.half() / difference);
            let own = defect.form(unit, unit);
            if interval.half() > tolerance * difference && own > 0.0 {
                wide.push(Wide { unit: unit.to_vec(), own, excess: interval.half() / (tolerance * difference) });
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
    // With sources: loss = sum of J V + sum of b (E - R b). Up to the square of the found currents' errors, that is linear in voltages and found
    // currents, so it is enclosed as each of them is, by the port currents of its own unit.
    let mut own_unit = currents.clone();
    let mut squares = 0.0;
    for (k, of_emf) in response.of_emf.iter().enumerate() {
        let Some(of_emf) = of_emf else { continue };
        let (emf, resistance) = match problem.electrodes[k].drive {
            Drive::Source(s) => (problem.sources[s.index()].emf_v, problem.sources[s.index()].resistance_ohm),
            Drive::Held(volts) => (volts, 0.0),
            _ => continue,
        };
        let terminal = emf - resistance * currents[k];
        own_unit.iter_mut().zip(of_emf).for_each(|(u, x)| *u -= 2.0 * terminal * x);
        squares += resistance * (ranges[k].high - currents[k]).max(currents[k] - ranges[k].low).powi(2);
    }
    let low = ports.matrix.form(currents, currents).max(0.0);
    let own = defect.form(&own_unit, &own_unit).max(0.0);
    let drive = defect.form(currents, currents).max(0.0);
    let middle = low + 0.5 * defect.form(&own_unit, currents);
    let half = 0.5 * (own * drive).sqrt() + ROUNDING * middle.abs();
    let loss = Interval { low: (middle - half - squares).max(0.0), high: middle + half };
    // The bound keeps the comparison below finite where the lower end is zero.
    let of_loss = if loss.high > 0.0 { ((loss.high / loss.low - 1.0) / tolerance).min(1e6) } else { 0.0 };
    if of_loss > 1.0 && own_unit != *currents && own > 0.0 {
        wide.push(Wide { unit: own_unit, own, excess: of_loss });
    }
    let excess = wide.iter().fold(of_loss, |m, w| m.max(w.excess));
    wide.retain(|w| w.excess > TOGETHER * excess);
    if !wide.is_empty() {
        wide.extend(Some(Wide { unit: currents.clone(), own: drive, excess }).filter(|w| w.own > 0.0));
    }
    let resistance = (count == 2 && layout.piece_of[0] == layout.piece_of[1]).then(|| {
        let mut unit = vec![0.0; currents.len()];
        (unit[0], unit[1]) = (1.0, -1.0);
        let low = ports.matrix.form(&unit, &unit);
        let high = low + defect.form(&unit, &unit).max(0.0);
        Interval { low: low * (1.0 - ROUNDING), high: high * (1.0 + ROUNDING) }
    });
    // Every interval's width is the product of its own field's defect and that of the currents, which so counts as often as all of them.
    let last = wide.len().saturating_sub(1);
    let scaled = |(i, w): (usize, Wide)| -> Vec<f64> {
        let scale = (if i == last { last as f64 } else { 1.0 } / w.own).sqrt();
        w.unit.iter().map(|u| u * scale).collect()
    };
    let wide = wide.into_iter().enumerate().map(scaled).collect();
    let levels = (0..layout.pieces).map(|p| response.voltages[layout.reference_of[p]]).collect();
    let electrodes =
        (0..count).map(|k| ElectrodeSolution { current: currents[k], current_range: ranges[k], voltage: voltages[k] }).collect();
    Ok(Enclosed { loss, resistance, electrodes, probes, excess, wide, voltage_spread: spread, levels, residual: ports.residual })
}

/// The potential with every piece at its level.
pub fn levelled(mut potential: Field, complex: &Complex, levels: &[f64]) -> Field {
    for (value, &piece) in potential.values.iter_mut().zip(&complex.piece_of) {
        *value += levels[piece as usize];
    }
    potential
}
