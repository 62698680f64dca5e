//! From a solution to the findings: electrodes, joints, layers, balances.

use super::gauge::DensityField;
use super::hotspot::{self, HotspotPlace, survey};
use super::section;
use super::verdict::{largest_drop_mv, verdicts};
use super::*;
use crate::index::{ContactId, ElectrodeId, JoinId, LayerId};
use crate::physics::network::{Interval, LARGEST_RESIDUAL};
use crate::physics::plan::Mark;
use crate::physics::solution::Passed;
use crate::physics::{self, Fault, Solution};
use crate::problem::{Crossing, Electrode, ElectrodeKind, Footprint, Interface, Measured, MeasuredJoint, Problem};
use crate::progress::{Listener, Stage};
use rayon::prelude::*;

/// Times that the mesh is refined under the hotspots: the first places may move a little when they are resolved.
const SHARPENINGS: usize = 1;

/// All that was found of a solved problem.
pub struct Found {
    /// What is reported.
    pub findings: Findings,
    /// Where the hotspots lie, in the order of the table.
    pub places: Vec<HotspotPlace>,
    /// Current density of every sheet.
    pub density: DensityField,
    /// The solution it was read from: the given one, refined under the hotspots.
    pub solution: Solution,
}

/// Solves a problem and finds everything that is reported. The first mesh shows where current crowds; the rounds after it resolve those places on
/// the way to the accuracy asked for, so that gauge discs are resolved before they are reported, whatever the bracket says.
///
/// # Errors
/// As [`crate::physics::run`]; a crossing that runs inside a held patch.
pub fn find(problem: &Problem) -> Result<Found, Vec<Fault>> {
    find_with(problem, &|_| {})
}

/// As [`find()`], telling a listener where the work is.
///
/// # Errors
/// As [`find()`].
pub fn find_with(problem: &Problem, listener: &Listener) -> Result<Found, Vec<Fault>> {
    if problem.measured.iter().any(|m| !m.fitted) {
        return Err(vec![Fault::Unfitted]);
    }
    let started = physics::Started::new(problem, listener)?;
    let expected = survey(problem, &started.first, &DensityField::new(problem, &started.first)).unresolved;
    let mut solution = started.finished(&expected)?;
    listener(Stage::Hotspots);
    let mut density = DensityField::new(problem, &solution);
    let mut survey = survey(problem, &solution, &density);
    for _ in 0..SHARPENINGS {
        if !survey.doubtful {
            break;
        }
        solution = physics::sharpened(problem, solution, &survey.unresolved)?;
        density = DensityField::new(problem, &solution);
        survey = hotspot::survey(problem, &solution, &density);
    }
    let mut findings = found(problem, &solution);
    for (layer, peak) in findings.layers.iter_mut().zip(&survey.layer_peaks) {
        layer.peak_a_mm2 = *peak;
    }
    findings.electrodes.par_iter_mut().zip(&problem.electrodes).for_each(|(finding, electrode)| {
        let Some(&layer) = electrode.through.last() else { return };
        for (spot, out) in electrode.spots.iter().zip(&mut finding.spots) {
            if let Footprint::Area { region, .. } = &spot.footprint {
                out.rim_a_mm2 = density.rim_peak(layer, &region.loops);
            }
        }
    });
    findings.crossings = crossings(problem, &density)?;
    findings.hotspots = survey.rows;
    findings.verdicts = verdicts(problem, &solution, &findings);
    Ok(Found { findings, places: survey.places, density, solution })
}

fn crossings(problem: &Problem, density: &DensityField) -> Result<Vec<CrossingFinding>, Vec<Fault>> {
    let one = |(c, crossing): (usize, &Crossing)| {
        let currents = section::crossing_current(density, crossing.from, crossing.to)
            .map_err(|held| Fault::CrossingHeld { crossing: c, at: held.at })?;
        Ok(CrossingFinding {
            name: crossing.name.clone(),
            total_a: currents.iter().sum(),
            current_a: problem.layers.iter().map(|l| l.name.clone()).zip(currents).collect(),
        })
    };
    problem.crossings.iter().enumerate().map(one).collect::<Result<_, Fault>>().map_err(|f| vec![f])
}

fn found(problem: &Problem, solution: &Solution) -> Findings {
    let loss = Enclosure::from(solution.loss);
    // The parts are means of both bounds at the discrete currents; scaled, they add up to the middle of the loss exactly.
    let parts = solution.layer_loss.iter().sum::<f64>() + solution.passed.values().map(|p| p.loss).sum::<f64>();
    let scale = if parts > 0.0 { loss.value / parts } else { 0.0 };
    let electrodes: Vec<ElectrodeFinding> = (0..problem.electrodes.len()).map(|k| electrode(problem, solution, k, scale)).collect();
    let layers = problem.layers.iter().zip(&solution.layer_loss).map(|(layer, layer_loss)| LayerFinding {
        name: layer.name.clone(),
        metal: layer.material.name.clone(),
        area_mm2: layer.area_mm2(),
        mass_g: layer.mass_g(),
        loss_w: layer_loss * scale,
        peak_a_mm2: 0.0,
    });
    let names = |between: [LayerId; 2]| between.map(|l| problem.layers[l.index()].name.clone());
    let contacts = problem.contacts.iter().enumerate().map(|(c, contact)| {
        let through = passed(solution, Mark::Contact(ContactId::new(c)));
        let resistive = contact.interface != Interface::Bonded;
        ContactFinding {
            name: contact.name.clone(),
            between: names(contact.between),
            // What is left of a sum of both signs is rounding.
            current_a: resistive.then_some(if through.current.abs() > 1e-9 * through.exchanged { through.current } else { 0.0 }),
            exchanged_a: resistive.then_some(through.exchanged),
            loss_w: through.loss * scale,
        }
    });
    let joins = problem.joins.iter().enumerate().flat_map(|(j, join)| {
        let between = names(join.between);
        join.spots.iter().enumerate().map(move |(i, spot)| {
            let through = passed(solution, Mark::Join(JoinId::new(j), i as u32));
            let at = spot.middle();
            JoinFinding {
                between: between.clone(),
                x_mm: at.x,
                y_mm: at.y,
                current_a: (join.joint_ohm > 0.0).then_some(through.current),
                drop_mv: mean_drop_mv(&through),
                loss_w: through.loss * scale,
            }
        })
    });
    Findings {
        schema: 1,
        title: problem.title.clone(),
        version: env!("CARGO_PKG_VERSION").into(),
        loss_w: loss,
        resistance_mohm: solution.resistance.map(|r| Enclosure::from(r).scaled(1e3)),
        largest_drop_mv: largest_drop_mv(solution),
        run: Run {
            vertices: solution.mesh.points.len(),
            triangles: solution.mesh.triangles.len(),
            unknowns: solution.run.unknowns,
            rounds: solution.run.rounds.len(),
            bracket_percent: if loss.low > 0.0 { 100.0 * (loss.high - loss.low) / loss.low } else { 0.0 },
            reached: solution.run.reached,
            seconds: None,
        },
        electrodes,
        layers: layers.collect(),
        contacts: contacts.collect(),
        joins: joins.collect(),
        hotspots: Vec::new(),
        probes: problem
            .probes
            .iter()
            .zip(&solution.probes)
            .map(|(probe, reading)| ProbeFinding { name: probe.name.clone(), drop_mv: Enclosure::from(*reading).scaled(1e3) })
            .collect(),
        crossings: Vec::new(),
        verdicts: Vec::new(),
        remarks: remarks(problem, solution),
    }
}

/// What limits the worth of the figures, as the solving went.
fn remarks(problem: &Problem, solution: &Solution) -> Vec<Remark> {
    let mut remarks = Vec::new();
    if !solution.run.reached && solution.run.residual <= LARGEST_RESIDUAL {
        let gap = solution.run.rounds.last().map_or(0.0, |r| 100.0 * r.gap);
        remarks.push(Remark::new(format!(
            "Accuracy not reached: within the vertex limit of {} the loss is enclosed to {gap:.3} % and the voltages to {:.3} % of the largest difference; {} % was asked for. The intervals hold.",
            problem.accuracy.max_vertices,
            100.0 * solution.run.voltage_spread,
            100.0 * problem.accuracy.bracket
        )));
    }
    for measured in &problem.measured {
        remarks.push(Remark::new(fitted(problem, measured)));
    }
    let moves = solution.run.moves;
    if moves.count > 0 {
        let places = if moves.count == 1 { "1 place".into() } else { format!("{} places", moves.count) };
        remarks.push(Remark::new(format!(
            "Points or edges lie closer together than the drawing's size lets be told: in {places} they were made one, by {:.2e} mm at most. A slit or web no wider than that is gone.",
            moves.largest_mm
        )));
    }
    if !solution.run.angles_reached {
        remarks.push(Remark::new(
            "The first mesh kept some thin triangles for want of vertices: more rounds were needed, the intervals hold.",
        ));
    }
    if solution.run.residual > LARGEST_RESIDUAL {
        remarks.push(Remark::new(format!(
            "The linear solve left a residual of {:.1e}: the intervals are NOT guaranteed. Look for resistances or thicknesses many powers of ten apart.",
            solution.run.residual
        )));
    }
    remarks
}

/// What became of a joint that was given as measured.
fn fitted(problem: &Problem, measured: &Measured) -> String {
    let name = match &measured.joint {
        MeasuredJoint::Join(j) => {
            let [a, b] = problem.joins[j.index()].between.map(|l| problem.layers[l.index()].name.as_str());
            format!("join {a} - {b}")
        }
        MeasuredJoint::Electrodes(ids) => {
            let names: Vec<&str> = ids.iter().map(|k| problem.electrodes[k.index()].name.as_str()).collect();
            if let [first, .., last] = names[..] { format!("{first} to {last}") } else { names.concat() }
        }
    };
    let joint = 1e3 * physics::fit::joint_of(problem, measured).0;
    let measured = 1e3 * measured.ohm;
    format!(
        "{name}: {joint:.4} mohm a spot, fitted to the {measured} mohm measured between the tips; the rest of the reading is spreading in the sheets."
    )
}

impl From<Interval> for Enclosure {
    fn from(interval: Interval) -> Self {
        Self { low: interval.low, value: 0.5 * (interval.low + interval.high), high: interval.high }
    }
}

fn electrode(problem: &Problem, solution: &Solution, k: usize, scale: f64) -> ElectrodeFinding {
    let electrode = &problem.electrodes[k];
    let solved = &solution.electrodes[k];
    let id = ElectrodeId::new(k);
    let group_sum: f64 = members(problem, electrode).map(|j| solution.electrodes[j].current).sum();
    let spots = electrode.spots.iter().enumerate().map(|(i, spot)| {
        let through = passed(solution, Mark::Spot(id, i as u32));
        let at = spot.footprint.middle();
        SpotFinding {
            x_mm: at.x,
            y_mm: at.y,
            current_a: through.current,
            drop_mv: if spot.joint_ohm > 0.0 { mean_drop_mv(&through) } else { 0.0 },
            share_percent: if solved.current == 0.0 { 0.0 } else { 100.0 * through.current / solved.current },
            rim_a_mm2: None,
        }
    });
    let loss: f64 = (0..electrode.spots.len() as u32)
        .map(|i| passed(solution, Mark::Spot(id, i)).loss + passed(solution, Mark::Within(id, i)).loss)
        .sum();
    ElectrodeFinding {
        name: electrode.name.clone(),
        kind: match electrode.kind {
            ElectrodeKind::Terminal => "terminal",
            ElectrodeKind::Cell => "cell",
        },
        group: electrode.group.clone(),
        current_a: solved.current,
        current_range_a: Range { low: solved.current_range.low, high: solved.current_range.high },
        voltage_mv: Enclosure::from(solved.voltage).scaled(1e3),
        share_percent: (electrode.kind == ElectrodeKind::Cell && group_sum != 0.0).then(|| 100.0 * solved.current / group_sum),
        loss_w: loss * scale,
        spots: spots.collect(),
    }
}

/// The cells of an electrode's group.
fn members<'a>(problem: &'a Problem, electrode: &'a Electrode) -> impl Iterator<Item = usize> + 'a {
    let same = |other: &Electrode| other.kind == ElectrodeKind::Cell && other.group == electrode.group;
    (0..problem.electrodes.len()).filter(move |&j| electrode.kind == ElectrodeKind::Cell && same(&problem.electrodes[j]))
}

/// What passes the spots and areas of a mark; nothing where it was never meshed.
fn passed(solution: &Solution, mark: Mark) -> Passed {
    solution.passed.get(&mark).copied().unwrap_or_default()
}

fn mean_drop_mv(through: &Passed) -> f64 {
    if through.extent > 0.0 { 1e3 * through.difference / through.extent } else { 0.0 }
}

#[cfg(test)]
mod tests {
    use super::super::trial::{bulged, line, problem, sheet, terminals};
    use super::*;
    use std::sync::Mutex;

    #[test]
    fn a_listener_hears_every_round_in_order_and_then_the_hotspots() {
        let bend = bulged(&[(0.0, 0.0, 0.0), (14.0, 0.0, 0.0), (14.0, 7.0, 0.0), (7.0, 7.0, 0.0), (7.0, 14.0, 0.0), (0.0, 14.0, 0.0)]);
        let ends = terminals(line(&[(14.0, 0.0), (14.0, 7.0)]), line(&[(7.0, 14.0), (0.0, 14.0)]), 0, 1.0);
        let heard = Mutex::new(Vec::new());
        let found = find_with(&problem(vec![sheet("a", vec![bend], 1.0)], ends, 1e-4, 1.0), &|stage| heard.lock().unwrap().push(stage));
        let rounds = found.unwrap().findings.run.rounds;
        let heard = heard.into_inner().unwrap();
        assert_eq!(heard.last(), Some(&Stage::Hotspots));
        assert!(rounds > 1 && heard.len() > 2, "{heard:?}");
        let mut before = None;
        for (k, stage) in heard[..heard.len() - 1].iter().enumerate() {
            let Stage::Round { number, triangles, gap } = stage else { panic!("{heard:?}") };
            assert!(*number == k + 1 && gap.is_some() == (k > 0) && before < Some(*triangles), "{heard:?}");
            before = Some(*triangles);
        }
    }
}
