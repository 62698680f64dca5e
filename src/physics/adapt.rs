//! The rounds: solve, enclose, mark, refine, until every reported figure is enclosed as tightly as asked.

use super::account::account;
use super::bar::Bar;
use super::enclose::{enclose, levelled};
use super::network;
use super::pieces::{check_attached, given_currents, layout};
use super::plan::Plan;
use super::solution::{Fault, Round, RunRecord, Solution};
use crate::fem::{self, CellPlan, Complex, ComplexFault};
use crate::geometry::Point;
use crate::index::{ElectrodeId, LayerId};
use crate::mesh::{Mesh, bisected, triangulated};
use crate::problem::Problem;
use crate::progress::{Listener, Stage};
use rayon::prelude::*;

/// Rounds after which the refinement gives up: each adds triangles, so the vertex limit comes first in practice.
const MOST_ROUNDS: usize = 200;

/// The rounds of one problem, from the first mesh on.
pub struct Rounds<'a> {
    problem: &'a Problem,
    plan: Plan<'a>,
    cells: Vec<CellPlan>,
    record: RunRecord,
    listener: &'a Listener<'a>,
    /// Whether the voltages' intervals are so much wider than the loss's that every round has to look at them.
    voltages_lead: bool,
}

/// The solution on the first mesh, and the way on from it.
pub struct Started<'a> {
    rounds: Rounds<'a>,
    /// Everything is enclosed in it, but not yet as tightly as asked.
    pub first: Solution,
    wanted: Option<Wanted>,
}

/// What a round leaves to the next: where the gap lies, and how much of it may be left.
struct Wanted {
    /// Per triangle.
    indicator: Vec<f64>,
    /// What the indicators may still add up to.
    goal: f64,
}

/// How a round ended.
struct Outcome {
    /// Where everything was enclosed: always the first and the last time.
    solution: Option<Solution>,
    /// What is left to do.
    wanted: Option<Wanted>,
    /// The mesh that does it; in the first round it is not made yet.
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
        let record = RunRecord { moves: drawing.moves, angles_reached: quality.angles_reached, ..RunRecord::default() };
        let mut rounds = Rounds { problem, plan, cells, record, listener, voltages_lead: false };
        match rounds.round(mesh)? {
            Outcome { solution: Some(first), wanted, .. } => Ok(Self { rounds, first, wanted }),
            _ => Err(without_answer()),
        }
    }

    /// Refines until the loss and every voltage are enclosed as the problem asks and the mesh is fine under some discs, or the vertex limit is met.
    ///
    /// # Errors
    /// A numerical failure.
    pub fn finished(self, discs: &[FineDisc]) -> Result<Solution, Vec<Fault>> {
        let Self { mut rounds, first, wanted } = self;
        let Some(wanted) = wanted else {
            return if discs.is_empty() { Ok(first) } else { sharpened(rounds.problem, first, discs) };
        };
        let room = rounds.problem.accuracy.max_vertices;
        // The discs first: what they take from the gap need not be taken elsewhere.
        let (resolved, indicator) = resolved_under(first.mesh.clone(), wanted.indicator, discs, room);
        let Some(mut mesh) = refined(&resolved, indicator, wanted.goal, room).or((!discs.is_empty()).then_some(resolved)) else {
            return Ok(first);
        };
        drop(first);
        loop {
            match rounds.round(mesh)? {
                Outcome { finer: Some(finer), .. } => mesh = finer,
                Outcome { solution: Some(solution), .. } => return Ok(solution),
                _ => return Err(without_answer()),
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
    /// One round on a mesh.
    fn round(&mut self, mesh: Mesh) -> Result<Outcome, Vec<Fault>> {
        let (problem, plan) = (self.problem, &self.plan);
        let gap = self.record.rounds.last().map(|r| r.gap);
        (self.listener)(Stage::Round { number: self.record.rounds.len() + 1, triangles: mesh.triangles.len(), gap });
        let complex =
            Complex::new(&mesh, &self.cells, self.plan.line_plans(), problem.electrodes.len()).map_err(|f| vec![from_complex(f)])?;
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
            Some(ports) => ports.field.combined(std::slice::from_ref(&currents)),
            None => bar.driven(&currents)?,
        };
        let flux = fem::equilibrated(&mesh, &complex, &potential);
        let low: f64 = currents.iter().take(problem.electrodes.len()).enumerate().map(|(k, b)| b * potential.values[k]).sum();
        let gap = if low > 0.0 { flux.indicator.iter().sum::<f64>() / low } else { 0.0 };
        self.record.rounds.push(Round { vertices: mesh.points.len(), triangles: mesh.triangles.len(), gap });

        let loss_enclosed = gap <= problem.accuracy.bracket;
        let room = problem.accuracy.max_vertices;
        let mut answer = None;
        let mut wanted = None;
        if loss_enclosed || is_first || self.voltages_lead {
            let ports = ports.take().map_or_else(|| bar.ports(), Ok)?;
            let enclosed = enclose(problem, &mesh, &complex, &layout, &bar, &ports)?;
            if enclosed.excess > 1.0 {
                self.voltages_lead = !enclosed.wide.is_empty() && enclosed.excess > LEAD * gap / problem.accuracy.bracket;
                let indicator = if self.voltages_lead || loss_enclosed && !enclosed.wide.is_empty() {
                    fem::weighted_indicators(&mesh, &complex, &ports.field, &bar.loads, &probed(&enclosed.wide))
                } else {
                    flux.indicator.clone()
                };
                let goal = GOAL / enclosed.excess * indicator.iter().sum::<f64>();
                wanted = Some(Wanted { indicator, goal });
            }
            answer = Some(enclosed);
        } else {
            wanted = Some(Wanted { indicator: flux.indicator.clone(), goal: GOAL * problem.accuracy.bracket * low });
        }
        // Close to the limit, a step that adds next to nothing is not worth a round.
        let worth = |f: &Mesh| f.points.len() * 2 < room || f.points.len() * 50 > mesh.points.len() * 51;
        let go_on = wanted.take_if(|_| !is_first && self.record.rounds.len() < MOST_ROUNDS);
        let finer = go_on.and_then(|w| refined(&mesh, w.indicator, w.goal, room)).filter(worth);
        if finer.is_none() && answer.is_none() {
            let ports = ports.take().map_or_else(|| bar.ports(), Ok)?;
            answer = Some(enclose(problem, &mesh, &complex, &layout, &bar, &ports)?);
        }
        let Some(answer) = answer.filter(|_| finer.is_none()) else { return Ok(Outcome { solution: None, wanted, finer }) };
        let (passed, layer_loss) = account(problem, plan, &mesh, &complex, &potential, &flux);
        self.record.unknowns = complex.order();
        self.record.reached = answer.excess <= 1.0 && answer.residual <= network::LARGEST_RESIDUAL;
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
        Ok(Outcome { solution: Some(solution), wanted, finer })
    }
}

/// The fault in terms of layers and electrodes.
pub fn from_complex(fault: ComplexFault) -> Fault {
    match fault {
        ComplexFault::PolesMeet { poles, .. } => Fault::ElectrodesMeet(poles.map(ElectrodeId)),
        ComplexFault::NoPole { layers, at } => Fault::Loose { layer: LayerId(layers.trailing_zeros()), at },
    }
}

/// The voltages lead when their widest interval exceeds what is asked this many times more than the loss's.
const LEAD: f64 = 1.1;
/// The gap that a round aims at, as a part of the one asked for.
const GOAL: f64 = 0.85;
/// Largest growth of the number of triangles in one round: predictions are not trusted further.
const GROWTH: f64 = 3.0;
/// Part of the predicted gap that is marked at a time (Doerfler 1996).
const SHARE: f64 = 0.3;

/// What the indicators of a refined mesh are predicted to be, between a smooth field (a quarter of the gap is left when all edges are halved) and a
/// right-angled inside corner (0.4).
fn inherited(indicator: &[f64], from: &Mesh, next: &Mesh, parents: &[u32]) -> Vec<f64> {
    let one = |(t, &p): (usize, &u32)| {
        let part = next.area(t) / from.area(p as usize);
        if part == 1.0 { indicator[p as usize] } else { indicator[p as usize] * part.powf(2.0) }
    };
    parents.par_iter().enumerate().with_min_len(1024).map(one).collect()
}

/// Refines where the indicators are largest, again and again by what they are predicted to become, until they add up to the goal
/// or the next step would not find room for its vertices; `None` where not even one step is needed or finds room.
fn refined(mesh: &Mesh, mut indicator: Vec<f64>, goal: f64, room: usize) -> Option<Mesh> {
    if indicator.iter().sum::<f64>() <= goal {
        return None;
    }
    let most = (GROWTH * mesh.triangles.len() as f64) as usize;
    let mut finer: Option<Mesh> = None;
    loop {
        let from = finer.as_ref().unwrap_or(mesh);
        let sum: f64 = indicator.iter().sum();
        // No more is marked than the goal needs: halving all edges takes 0.6 of a triangle's part away.
        let share = ((1.0 - goal / sum) / 0.6).clamp(0.05, SHARE);
        let (next, parents) = bisected(from, &marked(&indicator, share));
        indicator = inherited(&indicator, from, &next, &parents);
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
fn probed(combinations: &[Vec<f64>]) -> Vec<Vec<f64>> {
    if combinations.len() <= MOST_PROBES {
        return combinations.to_vec();
    }
    let width = combinations.first().map_or(0, Vec::len);
    // Signs from a linear congruence (Knuth's constants, from memory): the same on every run.
    let mut state = 1u64;
    let scale = (MOST_PROBES as f64).sqrt().recip();
    let mut sign = || {
        state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        if state >> 63 == 0 { scale } else { -scale }
    };
    let mut probe = || {
        let mut sum = vec![0.0; width];
        for weights in combinations {
            let sign = sign();
            sum.iter_mut().zip(weights).for_each(|(s, w)| *s += sign * w);
        }
        sum
    };
    (0..MOST_PROBES).map(|_| probe()).collect()
}

/// Triangles whose indicators, largest first, make up a share of the sum.
fn marked(indicator: &[f64], share: f64) -> Vec<bool> {
    let mut order: Vec<u32> = (0..indicator.len() as u32).collect();
    order.par_sort_unstable_by(|&a, &b| indicator[b as usize].total_cmp(&indicator[a as usize]).then(a.cmp(&b)));
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
pub fn sharpened(problem: &Problem, old: Solution, discs: &[FineDisc]) -> Result<Solution, Vec<Fault>> {
    let plan = &Plan::new(problem)?;
    let blank = vec![0.0; old.mesh.triangles.len()];
    let (mesh, _) = resolved_under(old.mesh, blank, discs, problem.accuracy.max_vertices);
    let complex =
        Complex::new(&mesh, &cells(plan, &mesh)?, plan.line_plans(), problem.electrodes.len()).map_err(|f| vec![from_complex(f)])?;
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

/// Longest edge of the triangles under a disc that is resolved, in diameters: what is longer is halved, so that most are near a quarter.
pub const RESOLVED: f64 = 0.36;

/// A disc on a sheet under which the mesh shall be fine.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FineDisc {
    /// The sheet.
    pub layer: LayerId,
    /// Its centre.
    pub centre: Point,
    /// Its diameter, mm.
    pub diameter: f64,
    /// The longest edge there may be, mm.
    pub longest: f64,
}

/// The mesh refined until no triangle that meets one of the discs is longer than it allows, or the vertex limit is met,
/// and its predicted indicators.
fn resolved_under(mut mesh: Mesh, mut indicator: Vec<f64>, discs: &[FineDisc], most: usize) -> (Mesh, Vec<f64>) {
    // Only triangles that are new need a look: the others were fine the time before.
    let mut fresh = vec![true; mesh.triangles.len()];
    loop {
        let is_coarse = |t: usize| {
            let corners = mesh.corners(t);
            let longest = (0..3).map(|k| corners[k].distance(corners[(k + 1) % 3])).fold(0.0, f64::max);
            discs.iter().any(|disc| {
                let (way, reach) = (corners[0] - disc.centre, 0.5 * disc.diameter + longest);
                longest > disc.longest
                    && way.dot(way) < reach * reach
                    && mesh.cover(t).contains(&disc.layer.0)
                    && distance_to_triangle(corners, disc.centre) <= 0.5 * disc.diameter
            })
        };
        let coarse: Vec<bool> = fresh.par_iter().enumerate().with_min_len(512).map(|(t, &fresh)| fresh && is_coarse(t)).collect();
        if !coarse.contains(&true) {
            return (mesh, indicator);
        }
        let (finer, parents) = bisected(&mesh, &coarse);
        if finer.points.len() > most {
            return (mesh, indicator);
        }
        indicator = inherited(&indicator, &mesh, &finer, &parents);
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
