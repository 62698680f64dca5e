//! The rounds: solve, enclose, mark, refine, until every reported figure is enclosed as tightly as asked.

use super::account::account;
use super::bar::Bar;
use super::enclose::{enclose, levelled};
use super::network;
use super::pieces::{check_attached, given_currents, layout};
use super::plan::Plan;
use super::solution::{Fault, Round, RunRecord, Solution};
use crate::fem::{self, CellPlan, Complex, ComplexFault, LinePlan};
use crate::geometry::Point;
use crate::index::{ElectrodeId, LayerId};
use crate::mesh::{Mesh, bisected, triangulated};
use crate::problem::Problem;
use crate::progress::{Listener, Stage};

/// Rounds after which the refinement gives up: each adds triangles, so the vertex limit comes first in practice.
const MOST_ROUNDS: usize = 200;

/// The rounds of one problem, from the first mesh on.
pub struct Rounds<'a> {
    problem: &'a Problem,
    plan: Plan<'a>,
    cells: Vec<CellPlan>,
    lines: Vec<LinePlan>,
    record: RunRecord,
    listener: &'a Listener<'a>,
    /// How much wider, in parts of what is asked, the voltages' intervals are than the loss's: learnt on the first mesh.
    strictness: f64,
}

/// The solution on the first mesh, and the way on from it.
pub struct Started<'a> {
    rounds: Rounds<'a>,
    /// Everything is enclosed in it, but not yet as tightly as asked.
    pub first: Solution,
    finer: Option<Mesh>,
}

impl<'a> Started<'a> {
    /// Draws, meshes and solves the first round.
    ///
    /// # Errors
    /// Faults of the statement that only the mesh can show (metal that hangs on nothing, currents that do not balance on a piece, electrodes that
    /// meet), or a numerical failure.
    pub fn new(problem: &'a Problem, listener: &'a Listener<'a>) -> Result<Self, Vec<Fault>> {
        let plan = Plan::new(problem)?;
        let drawing = plan.drawing()?;
        let (mesh, quality) =
            triangulated(&drawing, problem.accuracy.max_vertices, &|cover| plan.is_metal(cover)).map_err(|f| vec![Fault::Mesh(f)])?;
        let cells = cells(&plan, &mesh)?;
        let lines = plan.line_plans();
        let record = RunRecord { moves: drawing.moves, angles_reached: quality.angles_reached, ..RunRecord::default() };
        let mut rounds = Rounds { problem, plan, cells, lines, record, listener, strictness: 1.0 };
        match rounds.round(mesh)? {
            (Some(first), finer) => Ok(Self { rounds, first, finer }),
            (None, _) => Err(without_answer()),
        }
    }

    /// Refines until the loss and every voltage are enclosed as the problem asks and the triangles under some discs (layer, middle, diameter in mm)
    /// are no longer than a quarter of the diameter, or the vertex limit is met.
    ///
    /// # Errors
    /// A numerical failure.
    pub fn finished(self, discs: &[(LayerId, Point, f64)]) -> Result<Solution, Vec<Fault>> {
        let Self { mut rounds, first, finer } = self;
        let Some(finer) = finer else {
            return if discs.is_empty() { Ok(first) } else { sharpened(rounds.problem, first, discs) };
        };
        let mut mesh = resolved_under(finer, discs, rounds.problem.accuracy.max_vertices);
        loop {
            match rounds.round(mesh)? {
                (_, Some(finer)) => mesh = finer,
                (Some(solution), None) => return Ok(solution),
                (None, None) => return Err(without_answer()),
            }
        }
    }
}

fn without_answer() -> Vec<Fault> {
    vec![Fault::Numerical("a round ended without an answer: this is a bug in pinchbar".into())]
}

fn cells(plan: &Plan, mesh: &Mesh) -> Result<Vec<CellPlan>, Vec<Fault>> {
    mesh.covers.iter().map(|cover| plan.cell(cover)).collect::<Result<_, _>>().map_err(|f| vec![f])
}

impl Rounds<'_> {
    /// One round on a mesh: the solution where everything was enclosed (always the first and the last time), and the next mesh, if there is one.
    fn round(&mut self, mesh: Mesh) -> Result<(Option<Solution>, Option<Mesh>), Vec<Fault>> {
        let (problem, plan) = (self.problem, &self.plan);
        let gap = self.record.rounds.last().map(|r| r.gap);
        (self.listener)(Stage::Round { number: self.record.rounds.len() + 1, triangles: mesh.triangles.len(), gap });
        let complex = Complex::new(&mesh, &self.cells, &self.lines, problem.electrodes.len()).map_err(|f| vec![from_complex(f)])?;
        let is_first = self.record.rounds.is_empty();
        if is_first {
            check_attached(problem, &complex, plan)?;
        }
        let layout = layout(problem, plan, &mesh, &complex)?;
        let bar = Bar::new(problem, plan, &mesh, &complex, &layout)?;
        // With all currents given, one solve tells whether the loss is enclosed; the ports are solved when it is.
        let (mut ports, currents) = match given_currents(problem, &layout) {
            Some(currents) => (None, currents),
            None => {
                let ports = bar.ports()?;
                let response = network::response(problem, &layout, &ports.matrix).ok_or_else(network::singular)?;
                (Some(ports), response.currents)
            }
        };
        let potential = match &ports {
            Some(ports) => ports.field.combined(&currents),
            None => bar.driven(&currents)?,
        };
        let flux = fem::equilibrated(&mesh, &complex, &potential);
        let low: f64 = currents.iter().take(problem.electrodes.len()).enumerate().map(|(k, b)| b * potential.values[k]).sum();
        let gap = if low > 0.0 { flux.indicator.iter().sum::<f64>() / low } else { 0.0 };
        self.record.rounds.push(Round { vertices: mesh.points.len(), triangles: mesh.triangles.len(), gap });

        let loss_enclosed = gap <= problem.accuracy.bracket;
        let room = problem.accuracy.max_vertices;
        let mut answer = None;
        let mut finer = None;
        if loss_enclosed || is_first {
            let ports = ports.take().map_or_else(|| bar.ports(), Ok)?;
            let enclosed = enclose(problem, &mesh, &complex, &layout, &bar, &ports)?;
            if gap > 0.0 {
                self.strictness = self.strictness.max(enclosed.excess * problem.accuracy.bracket / gap);
            }
            if loss_enclosed && !enclosed.failing.is_empty() {
                let indicator = fem::weighted_indicators(&mesh, &complex, &ports.field, &bar.loads, &probed(&enclosed.failing));
                finer = refined(&mesh, indicator, GOAL / enclosed.excess, room);
            }
            answer = Some(enclosed);
        }
        if !loss_enclosed {
            finer = refined(&mesh, flux.indicator.clone(), GOAL * problem.accuracy.bracket / (gap * self.strictness), room);
        }
        // Close to the limit, a step that adds next to nothing is not worth a round.
        let worth = |f: &Mesh| f.points.len() * 2 < room || f.points.len() * 50 > mesh.points.len() * 51;
        let finer = finer.filter(|f| worth(f) && self.record.rounds.len() < MOST_ROUNDS);
        if finer.is_none() && answer.is_none() {
            let ports = ports.take().map_or_else(|| bar.ports(), Ok)?;
            answer = Some(enclose(problem, &mesh, &complex, &layout, &bar, &ports)?);
        }
        let Some(answer) = answer else { return Ok((None, finer)) };
        let (passed, layer_loss) = account(problem, plan, &mesh, &complex, &potential, &flux);
        self.record.unknowns = complex.order();
        self.record.reached = loss_enclosed && answer.failing.is_empty() && answer.residual <= network::LARGEST_RESIDUAL;
        self.record.voltage_spread = answer.voltage_spread;
        self.record.residual = answer.residual;
        let solution = Solution {
            potential: levelled(potential, &complex, &answer.levels),
            flux,
            loss: answer.loss,
            resistance: answer.resistance,
            electrodes: answer.electrodes,
            probes: answer.probes,
            passed,
            layer_loss,
            run: self.record.clone(),
            complex,
            mesh,
        };
        Ok((Some(solution), finer))
    }
}

/// The fault in terms of layers and electrodes.
pub fn from_complex(fault: ComplexFault) -> Fault {
    match fault {
        ComplexFault::PolesMeet { poles, .. } => Fault::ElectrodesMeet(poles.map(ElectrodeId)),
        ComplexFault::NoPole { layers, at } => Fault::Loose { layer: LayerId(layers.trailing_zeros()), at },
    }
}

/// The gap that a round aims at, as a part of the one asked for.
const GOAL: f64 = 0.8;
/// Largest growth of the number of triangles in one round: predictions are not trusted further.
const GROWTH: f64 = 3.0;
/// Part of the predicted gap that is marked at a time (Doerfler 1996).
const SHARE: f64 = 0.3;

/// Refines where the indicators are largest, again and again by what they are predicted to become, until they have fallen to a part `goal` of their sum
/// or the next step would not find room for its vertices; `None` where not even one step does.
fn refined(mesh: &Mesh, mut indicator: Vec<f64>, goal: f64, room: usize) -> Option<Mesh> {
    let goal = goal * indicator.iter().sum::<f64>();
    let most = (GROWTH * mesh.triangles.len() as f64) as usize;
    let mut finer: Option<Mesh> = None;
    loop {
        let from = finer.as_ref().unwrap_or(mesh);
        let sum: f64 = indicator.iter().sum();
        // No more is marked than the goal needs: halving all edges takes 0.6 of a triangle's part away.
        let share = ((1.0 - goal / sum) / 0.6).clamp(0.05, SHARE);
        let (next, parents) = bisected(from, &marked(&indicator, share));
        // Between a smooth field (a quarter of the gap is left when all edges are halved) and a right-angled inside corner (0.4).
        indicator =
            parents.iter().enumerate().map(|(t, &p)| indicator[p as usize] * (next.area(t) / from.area(p as usize)).powf(1.8)).collect();
        if next.points.len() > room {
            return finer;
        }
        let enough = indicator.iter().sum::<f64>() <= goal || next.triangles.len() >= most;
        finer = Some(next);
        if enough {
            return finer;
        }
    }
}

/// Most combinations of port fields whose indicators are formed one by one.
const MOST_PROBES: usize = 16;

/// Few combinations with, in the mean over signs, the same sum of squares as many (Hutchinson 1990): enough to tell where to refine.
fn probed(combinations: &[(Vec<f64>, f64)]) -> Vec<(Vec<f64>, f64)> {
    if combinations.len() <= MOST_PROBES {
        return combinations.to_vec();
    }
    let width = combinations.first().map_or(0, |c| c.0.len());
    // Signs from a linear congruence (Knuth's constants, from memory): the same on every run.
    let mut state = 1u64;
    let mut sign = || {
        state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        if state >> 63 == 0 { 1.0 } else { -1.0 }
    };
    let mut probe = || {
        let mut sum = vec![0.0; width];
        for (weights, factor) in combinations {
            let scale = sign() * factor.sqrt();
            sum.iter_mut().zip(weights).for_each(|(s, w)| *s += scale * w);
        }
        (sum, 1.0 / MOST_PROBES as f64)
    };
    (0..MOST_PROBES).map(|_| probe()).collect()
}

/// Triangles whose indicators, largest first, make up a share of the sum.
fn marked(indicator: &[f64], share: f64) -> Vec<bool> {
    let mut order: Vec<u32> = (0..indicator.len() as u32).collect();
    order.sort_unstable_by(|&a, &b| indicator[b as usize].total_cmp(&indicator[a as usize]).then(a.cmp(&b)));
    let goal = share * indicator.iter().sum::<f64>();
    let mut sum = 0.0;
    let mut chosen = vec![false; indicator.len()];
    for t in order {
        if sum >= goal && sum > 0.0 {
            break;
        }
        sum += indicator[t as usize];
        chosen[t as usize] = true;
    }
    chosen
}

/// The solution on a mesh refined under some discs. Its intervals stay as they are: they hold for the problem, not for a mesh.
pub fn sharpened(problem: &Problem, old: Solution, discs: &[(LayerId, Point, f64)]) -> Result<Solution, Vec<Fault>> {
    let plan = &Plan::new(problem)?;
    let mesh = resolved_under(old.mesh, discs, problem.accuracy.max_vertices);
    let complex =
        Complex::new(&mesh, &cells(plan, &mesh)?, &plan.line_plans(), problem.electrodes.len()).map_err(|f| vec![from_complex(f)])?;
    let layout = layout(problem, plan, &mesh, &complex)?;
    let bar = Bar::new(problem, plan, &mesh, &complex, &layout)?;
    let mut currents: Vec<f64> = old.electrodes.iter().map(|e| e.current).collect();
    currents.resize(layout.piece_of.len(), 0.0);
    let potential = bar.driven(&currents)?;
    let flux = fem::equilibrated(&mesh, &complex, &potential);
    let (passed, layer_loss) = account(problem, plan, &mesh, &complex, &potential, &flux);
    let levels: Vec<f64> = layout.reference_of.iter().map(|&k| old.potential.values[k]).collect();
    let run = RunRecord { unknowns: complex.order(), ..old.run };
    Ok(Solution { potential: levelled(potential, &complex, &levels), flux, passed, layer_loss, run, complex, mesh, ..old })
}

/// The mesh refined until no triangle that meets one of the discs is longer than a quarter of its diameter, or the vertex limit is met.
fn resolved_under(mut mesh: Mesh, discs: &[(LayerId, Point, f64)], most: usize) -> Mesh {
    // Only triangles that are new need a look: the others were fine the time before.
    let mut fresh = vec![true; mesh.triangles.len()];
    loop {
        let is_coarse = |t: usize| {
            let corners = mesh.corners(t);
            let longest = (0..3).map(|k| corners[k].distance(corners[(k + 1) % 3])).fold(0.0, f64::max);
            discs.iter().any(|&(layer, middle, diameter)| {
                let (way, reach) = (corners[0] - middle, 0.5 * diameter + longest);
                longest > 0.25 * diameter
                    && way.dot(way) < reach * reach
                    && mesh.cover(t).contains(&layer.0)
                    && distance_to_triangle(corners, middle) <= 0.5 * diameter
            })
        };
        let coarse: Vec<bool> = fresh.iter().enumerate().map(|(t, &fresh)| fresh && is_coarse(t)).collect();
        if !coarse.contains(&true) {
            return mesh;
        }
        let (finer, parents) = bisected(&mesh, &coarse);
        if finer.points.len() > most {
            return mesh;
        }
        let mut children = vec![0u8; mesh.triangles.len()];
        parents.iter().for_each(|&p| children[p as usize] += 1);
        fresh = parents.iter().map(|&p| children[p as usize] > 1).collect();
        mesh = finer;
    }
}

fn distance_to_triangle(corners: [Point; 3], p: Point) -> f64 {
    let mut inside = true;
    let mut nearest = f64::INFINITY;
    for k in 0..3 {
        let (a, b) = (corners[k], corners[(k + 1) % 3]);
        inside &= (b - a).cross(p - a) >= 0.0;
        let along = ((p - a).dot(b - a) / (b - a).dot(b - a)).clamp(0.0, 1.0);
        nearest = nearest.min(p.distance(a + (b - a) * along));
    }
    if inside { 0.0 } else { nearest }
}
