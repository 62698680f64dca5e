//! Joints given as measured: the resistance of their spots is fitted until the model reads between the tips what the meter read.

use super::adapt::{FineDisc, Started};
use super::plan::Mark;
use super::solution::{Fault, Solution};
use crate::geometry::Point;
use crate::index::LayerId;
use crate::problem::{Measured, MeasuredJoint, Problem};
use crate::progress::Listener;

/// Solves after which the fit gives up; three or four are usual.
const MOST_FITS: usize = 25;

/// Resistance of a spot, ohm, below which it cannot be told from none.
const LEAST: f64 = 1e-8;

/// Diameter of the disc under a tip in which the mesh is fine, mm.
const TIP: f64 = 0.3;

/// What was tried for one joint last: resistance and reading.
type Tried = Option<(f64, f64)>;

/// Fits the joints of a problem that are given as measured, to the accuracy asked of the problem, while its own currents flow.
///
/// # Errors
/// As [`Started::new`]; a joint through which no current passes, or one that reads more than measured though it has no resistance of its own.
pub fn fit(problem: &mut Problem, listener: &Listener) -> Result<(), Vec<Fault>> {
    let mut tried: Vec<Tried> = vec![None; problem.measured.len()];
    for _ in 0..MOST_FITS {
        if problem.measured.iter().all(|m| m.fitted) {
            return Ok(());
        }
        let solution = {
            let tips = problem.measured.iter().flat_map(|m| &m.tips);
            let discs: Vec<FineDisc> = tips.map(|&(layer, centre)| FineDisc { layer, centre, diameter: TIP, longest: 0.5 * TIP }).collect();
            Started::new(problem, listener)?.finished(&discs)?
        };
        let largest = solution.electrodes.iter().map(|e| e.current.abs()).fold(0.0, f64::max);
        let mut faults = Vec::new();
        let mut next = Vec::new();
        for (m, measured) in problem.measured.iter().enumerate() {
            let (drop, current) = across(&solution, measured, problem);
            if current.abs() <= 1e-9 * largest {
                faults.push(Fault::MeasuredIdle(m));
                continue;
            }
            let (joint, spots) = joint_of(problem, measured);
            let reading = drop / current;
            let off = measured.ohm - reading;
            let good = off.abs() <= problem.accuracy.bracket * measured.ohm;
            if !good && off < 0.0 && joint <= LEAST {
                faults.push(Fault::MeasuredLow { measured: m, least_ohm: reading });
            }
            let slope = tried[m].map(|(before, read)| (reading - read) / (joint - before)).filter(|s| s.is_finite() && *s > 0.0);
            tried[m] = Some((joint, reading));
            // Spots in parallel: the first step supposes that they share alike.
            let better = joint + off / slope.unwrap_or(1.0 / spots as f64);
            next.push((good, if good { joint } else { better.clamp(LEAST, 1e9) }));
        }
        if !faults.is_empty() {
            return Err(faults);
        }
        // A joint moves the reading of others a little: all are good in one solve, or all are fitted on.
        let done = next.iter().all(|n| n.0);
        for (m, (_, joint)) in next.into_iter().enumerate() {
            problem.measured[m].fitted = done;
            set_joint(problem, m, joint);
        }
    }
    Err(vec![Fault::Numerical("a joint could not be fitted to its reading".into())])
}

/// Resistance of one spot of a measured joint, and how many spots stand side by side.
pub fn joint_of(problem: &Problem, measured: &Measured) -> (f64, usize) {
    match &measured.joint {
        MeasuredJoint::Join(j) => {
            let join = &problem.joins[j.index()];
            (join.joint_ohm, join.spots.len().max(1))
        }
        MeasuredJoint::Electrodes(ids) => {
            let spots = ids.first().map_or(&[][..], |k| &problem.electrodes[k.index()].spots);
            (spots.first().map_or(0.0, |s| s.joint_ohm), spots.len().max(1))
        }
    }
}

fn set_joint(problem: &mut Problem, m: usize, ohm: f64) {
    match &problem.measured[m].joint {
        MeasuredJoint::Join(j) => problem.joins[j.index()].joint_ohm = ohm,
        MeasuredJoint::Electrodes(ids) => {
            for k in ids {
                problem.electrodes[k.index()].spots.iter_mut().for_each(|s| s.joint_ohm = ohm);
            }
        }
    }
}

/// Drop between the tips and the current through the joint, both + from the first sheet of a join, or the outside of an electrode, on.
fn across(solution: &Solution, measured: &Measured, problem: &Problem) -> (f64, f64) {
    let at = |&(layer, point): &(LayerId, Point)| potential_at(solution, layer, point);
    match &measured.joint {
        MeasuredJoint::Join(j) => {
            let through = |i: u32| solution.passed.get(&Mark::Join(*j, i)).map_or(0.0, |p| p.current);
            let current = (0..problem.joins[j.index()].spots.len() as u32).map(through).sum();
            let [first, second] = [0, 1].map(|i| measured.tips.get(i).map_or(0.0, at));
            (first - second, current)
        }
        MeasuredJoint::Electrodes(ids) => ids.first().map_or((0.0, 0.0), |k| {
            let outside = solution.potential.values[k.index()];
            (outside - measured.tips.first().map_or(outside, at), solution.electrodes[k.index()].current)
        }),
    }
}

/// The discrete potential of a sheet at a point of its metal.
fn potential_at(solution: &Solution, layer: LayerId, p: Point) -> f64 {
    let (mesh, complex) = (&solution.mesh, &solution.complex);
    let mut best = (f64::NEG_INFINITY, 0.0);
    for t in 0..mesh.triangles.len() {
        let [a, b, c] = mesh.corners(t);
        let whole = (b - a).cross(c - a);
        let parts = [(b - p).cross(c - p) / whole, (c - p).cross(a - p) / whole, (a - p).cross(b - p) / whole];
        // The triangle that holds the point, or, for a point on a flattened rim, the one it is least outside of.
        let least = parts.iter().fold(f64::INFINITY, |m: f64, x| m.min(*x));
        if least > best.0
            && let Some(element) = complex.element_of(t, 1 << layer.0)
        {
            let value = |k: usize| solution.potential.values[complex.unknowns[element][k] as usize];
            best = (least, (0..3).map(|k| parts[k] * value(k)).sum());
        }
    }
    best.1
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::reading::read;
    use std::path::Path;

    fn problem(joint: &str) -> Problem {
        let sheet = format!(
            "[[layer]]\nname = \"tab\"\nresistivity_uohm_cm = 9\nthickness_mm = 0.2\npoints_mm = [[0, 0], [40, 0], [40, 10], [0, 10]]\n\
             [[cell]]\nname = \"C\"\nlayer = \"tab\"\nspots_mm = [[8, 3], [8, 7]]\ndiameter_mm = 1\n{joint}\ncurrent_a = 6\n\
             [[terminal]]\nname = \"out\"\nlayer = \"tab\"\nline_mm = [[40, 0], [40, 10]]\n"
        );
        read(Path::new("job.toml"), &|_| Ok(sheet.clone())).unwrap_or_else(|f| panic!("{f:?}\n{sheet}")).problem
    }

    /// What would be read with a joint that is known is what leads back to it.
    #[test]
    fn a_reading_leads_back_to_the_joint() {
        for known in [0.02, 0.3, 5.0] {
            let mut first = problem(&format!("joint_mohm = {known}"));
            first.accuracy.bracket = 1e-4;
            let solution = super::super::run(&first).unwrap();
            let reading = 1e3 * (solution.potential.values[0] - potential_at(&solution, LayerId(0), Point::new(12.0, 5.0))) / 6.0;
            assert!(reading > 1.05 * known / 2.0, "the reading holds some spreading: {reading}");
            let mut second = problem(&format!("measured_mohm = {reading}\ntips_mm = [[12, 5]]"));
            second.accuracy.bracket = 1e-4;
            fit(&mut second, &|_| {}).unwrap();
            assert!(second.measured[0].fitted);
            let fitted = 1e3 * second.electrodes[0].spots[1].joint_ohm;
            assert!((fitted - known).abs() < 3e-4 * 2.0 * reading, "{fitted} for {known}");
        }
    }

    #[test]
    fn a_reading_below_that_of_the_sheet_alone_is_a_fault() {
        let mut low = problem("measured_mohm = 0.01\ntips_mm = [[20, 5]]");
        let Err(faults) = fit(&mut low, &|_| {}) else { panic!("fitted") };
        assert!(matches!(faults[..], [Fault::MeasuredLow { measured: 0, least_ohm }] if least_ohm > 1e-5), "{faults:?}");
    }
}
