//! The rounds: solve, enclose, mark, refine, until every reported figure is enclosed as tightly as asked.

use super::network::{self, Interval, Layout, ROUNDING};
use super::plan::{Area, Mark, Plan};
use super::solution::{ElectrodeSolution, Fault, Passed, Round, RunRecord, Solution};
use crate::algebra::{Cholesky, Dense};
use crate::fem::{self, CellPlan, Complex, ComplexFault, End, Equilibrated, Field, Load};
use crate::index::{ElectrodeId, LayerId};
use crate::mesh::{Arrangement, Mesh, bisected, triangulated};
use crate::problem::{Drive, ElectrodeKind, Problem};
use std::collections::BTreeMap;

/// Most electrodes and meter tips of one job: their matrices are dense.
pub const MOST_PORTS: usize = 2000;

/// Rounds after which the refinement gives up: each adds triangles, so the vertex limit comes first in practice.
const MOST_ROUNDS: usize = 200;

/// Refines until the loss and every voltage are enclosed as the problem asks, or the vertex limit is met.
pub fn refined_until_enclosed(problem: &Problem, plan: &Plan, drawing: &Arrangement) -> Result<Solution, Vec<Fault>> {
    let most = problem.accuracy.max_vertices;
    let (mut mesh, quality) = triangulated(drawing, most, &|cover| plan.is_metal(cover)).map_err(|f| vec![Fault::Mesh(f)])?;
    let cells: Vec<CellPlan> = mesh.covers.iter().map(|cover| plan.cell(cover)).collect::<Result<_, _>>().map_err(|f| vec![f])?;
    let lines = plan.line_plans();
    let mut rounds = Vec::new();
    loop {
        let complex = Complex::new(&mesh, &cells, &lines, problem.electrodes.len()).map_err(|f| vec![from_complex(f)])?;
        if rounds.is_empty() {
            check_attached(problem, &complex, plan)?;
        }
        let layout = layout(problem, plan, &mesh, &complex)?;
        let bar = Bar::new(problem, plan, &mesh, &complex, &layout)?;
        // With all currents given, one solve tells whether the loss is enclosed; the ports are solved when it is.
        let (mut ports, currents) = match given_currents(problem, &layout) {
            Some(currents) => (None, currents),
            None => {
                let ports = bar.ports()?;
                let response = network::response(problem, &layout, &ports.matrix).ok_or_else(singular)?;
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
        rounds.push(Round { vertices: mesh.points.len(), triangles: mesh.triangles.len(), gap });

        let loss_enclosed = gap <= problem.accuracy.bracket;
        let mut answer = None;
        let mut finer = None;
        if loss_enclosed {
            let ports = ports.take().map_or_else(|| bar.ports(), Ok)?;
            let enclosed = enclose(problem, &mesh, &complex, &layout, &bar, &ports)?;
            if !enclosed.failing.is_empty() {
                let indicator = fem::weighted_indicators(&mesh, &complex, &ports.field, &bar.loads, &enclosed.failing);
                finer = Some(bisected(&mesh, &marked(&indicator, 0.5)));
            }
            answer = Some(enclosed);
        } else {
            finer = Some(bisected(&mesh, &marked(&flux.indicator, share_to_mark(gap / problem.accuracy.bracket))));
        }
        match finer {
            Some(finer) if finer.points.len() <= most && rounds.len() < MOST_ROUNDS => mesh = finer,
            _ => {
                let answer = match answer {
                    Some(answer) => answer,
                    None => {
                        let ports = ports.take().map_or_else(|| bar.ports(), Ok)?;
                        enclose(problem, &mesh, &complex, &layout, &bar, &ports)?
                    }
                };
                let (passed, layer_loss) = account(problem, plan, &mesh, &complex, &potential, &flux);
                let run = RunRecord {
                    rounds,
                    unknowns: complex.order(),
                    reached: loss_enclosed && answer.failing.is_empty(),
                    voltage_spread: answer.voltage_spread,
                    moves: drawing.moves,
                    angles_reached: quality.angles_reached,
                    residual: answer.residual,
                };
                return Ok(Solution {
                    potential: levelled(potential, &complex, &answer.levels),
                    flux,
                    loss: answer.loss,
                    resistance: answer.resistance,
                    electrodes: answer.electrodes,
                    probes: answer.probes,
                    passed,
                    layer_loss,
                    run,
                    complex,
                    mesh,
                });
            }
        }
    }
}

fn singular() -> Vec<Fault> {
    vec![Fault::Numerical("the network of sources is singular".into())]
}

fn from_complex(fault: ComplexFault) -> Fault {
    match fault {
        ComplexFault::PolesMeet { poles, .. } => Fault::ElectrodesMeet(poles.map(ElectrodeId)),
        ComplexFault::NoPole { layers, at } => Fault::Loose { layer: LayerId(layers.trailing_zeros()), at },
    }
}

/// Triangles whose indicators, largest first, make up a share of the sum (Doerfler 1996).
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

/// Halving all edges of a triangle takes about two thirds of its part of the gap away; no more is marked than the goal needs, and never more than keeps the mesh graded.
fn share_to_mark(excess: f64) -> f64 {
    ((1.0 - 1.0 / excess) / 0.65).clamp(0.1, 0.6)
}

/// Every spot must have found metal.
fn check_attached(problem: &Problem, complex: &Complex, plan: &Plan) -> Result<(), Vec<Fault>> {
    let mut found = vec![false; plan.marks.len()];
    complex.area_exchanges.iter().for_each(|x| found[x.mark as usize] = true);
    complex.edge_exchanges.iter().for_each(|x| found[x.mark as usize] = true);
    for element in &complex.elements {
        if let Some(hold) = element.leaf.held {
            found[hold.mark as usize] = true;
        }
    }
    for link in &complex.links {
        if let fem::Link::Open(hold) = link {
            found[hold.mark as usize] = true;
        }
    }
    let pole_found = |k: usize| plan.marks.iter().zip(&found).any(|(m, f)| *f && matches!(m, Mark::Spot(e, _) if e.index() == k));
    let off: Vec<Fault> = (0..problem.electrodes.len()).filter(|&k| !pole_found(k)).map(|k| Fault::SpotOff(ElectrodeId::new(k))).collect();
    if off.is_empty() { Ok(()) } else { Err(off) }
}

/// Pieces, references and zeros; the checks that need to know what hangs together.
fn layout(problem: &Problem, plan: &Plan, mesh: &Mesh, complex: &Complex) -> Result<Layout, Vec<Fault>> {
    let electrodes = problem.electrodes.len();
    let ports = electrodes + 2 * problem.probes.len();
    if ports > MOST_PORTS {
        return Err(vec![Fault::TooManyPorts(ports)]);
    }
    let mut piece_of: Vec<usize> = (0..electrodes).map(|k| complex.piece_of[k] as usize).collect();
    for (i, tips) in tip_elements(problem, plan, mesh, complex).iter().enumerate() {
        let mut pieces: Vec<u32> = tips.iter().map(|&e| complex.piece_of[complex.unknowns[e][0] as usize]).collect();
        pieces.sort_unstable();
        pieces.dedup();
        match pieces.as_slice() {
            [piece] => piece_of.push(*piece as usize),
            _ => return Err(vec![Fault::TipOff { probe: i / 2, tip: i % 2 }]),
        }
    }
    // Parts of the network: pieces joined by sources with both ends in the job.
    let mut part: Vec<usize> = (0..complex.pieces).collect();
    for source in &problem.sources {
        if let Some(negative) = source.negative {
            let (a, b) = (part[piece_of[source.positive.index()]], part[piece_of[negative.index()]]);
            part.iter_mut().filter(|p| **p == a.max(b)).for_each(|p| *p = a.min(b));
        }
    }
    let preferred = |members: &[usize]| {
        let of = |wanted: &dyn Fn(usize) -> bool| members.iter().copied().rfind(|&k| wanted(k));
        of(&|k| problem.electrodes[k].drive == Drive::Balance)
            .or_else(|| of(&|k| problem.electrodes[k].kind == ElectrodeKind::Terminal))
            .or_else(|| members.last().copied())
    };
    let mut faults = Vec::new();
    let mut zeros = Vec::new();
    let mut names: Vec<usize> = part.clone();
    names.sort_unstable();
    names.dedup();
    for name in names {
        let members: Vec<usize> = (0..electrodes).filter(|&k| part[piece_of[k]] == name).collect();
        let drive = |k: usize| problem.electrodes[k].drive;
        let ids = |list: &[usize]| list.iter().map(|&k| ElectrodeId::new(k)).collect::<Vec<_>>();
        let levelled = members.iter().any(|&k| match drive(k) {
            Drive::Held(_) => true,
            Drive::Source(s) => problem.sources[s.index()].negative.is_none(),
            _ => false,
        });
        let balancing: Vec<usize> = members.iter().copied().filter(|&k| drive(k) == Drive::Balance).collect();
        let given: Vec<f64> = members.iter().filter_map(|&k| if let Drive::Current(i) = drive(k) { Some(i) } else { None }).collect();
        if !balancing.is_empty() && balancing.len() + given.len() != members.len() || balancing.len() > 1 {
            faults.push(Fault::BalanceUnclear(ids(&balancing)));
        }
        if balancing.is_empty() && !levelled {
            let sum: f64 = given.iter().sum();
            if sum.abs() > 1e-9 * given.iter().fold(0.0, |m: f64, i| m.max(i.abs())) {
                faults.push(Fault::Unbalanced { electrodes: ids(&members), sum });
            }
        }
        if !levelled {
            zeros.extend(preferred(&members));
        }
    }
    let reference_of = (0..complex.pieces)
        .map(|p| {
            let members: Vec<usize> = (0..electrodes).filter(|&k| piece_of[k] == p).collect();
            zeros.iter().copied().find(|z| members.contains(z)).or_else(|| preferred(&members)).unwrap_or(0)
        })
        .collect();
    if faults.is_empty() { Ok(Layout { piece_of, pieces: complex.pieces, reference_of, zeros }) } else { Err(faults) }
}

/// Per meter tip (two per probe): the elements under it, held ones too.
fn tip_elements(problem: &Problem, plan: &Plan, mesh: &Mesh, complex: &Complex) -> Vec<Vec<usize>> {
    let mut tips = vec![Vec::new(); 2 * problem.probes.len()];
    if tips.is_empty() {
        return tips;
    }
    let of_cell: Vec<Vec<(usize, u64)>> = mesh
        .covers
        .iter()
        .map(|cover| {
            let tip = |&a: &u32| match plan.areas[a as usize] {
                Area::Tip(p, side) => Some((2 * p as usize + side as usize, 1u64 << problem.probes[p as usize].tips[side as usize].0.0)),
                _ => None,
            };
            cover.iter().filter_map(tip).collect()
        })
        .collect();
    for (t, &cell) in mesh.cells.iter().enumerate() {
        for &(tip, layer) in &of_cell[cell as usize] {
            tips[tip].extend(complex.element_of(t, layer));
        }
    }
    tips
}

/// Port currents, when all are given.
fn given_currents(problem: &Problem, layout: &Layout) -> Option<Vec<f64>> {
    let mut currents = vec![0.0; layout.piece_of.len()];
    for (k, electrode) in problem.electrodes.iter().enumerate() {
        match electrode.drive {
            Drive::Current(i) => currents[k] = i,
            Drive::Balance => {}
            _ => return None,
        }
    }
    for (k, electrode) in problem.electrodes.iter().enumerate() {
        if electrode.drive == Drive::Balance {
            currents[k] =
                -(0..problem.electrodes.len()).filter(|&j| layout.piece_of[j] == layout.piece_of[k]).map(|j| currents[j]).sum::<f64>();
        }
    }
    Some(currents)
}

/// The metal and joints without what drives them, factored, with one electrode of every piece at zero.
struct Bar {
    free: Vec<Option<u32>>,
    matrix: crate::algebra::SymmetricMatrix,
    factor: Cholesky,
    /// What a unit of current at each port puts on the unknowns.
    port_loads: Vec<Vec<(usize, f64)>>,
    /// The part of it that is spread over elements (tips).
    loads: Vec<Load>,
}

/// All port fields.
struct Ports {
    field: Field,
    matrix: Dense,
    residual: f64,
}

impl Bar {
    fn new(problem: &Problem, plan: &Plan, mesh: &Mesh, complex: &Complex, layout: &Layout) -> Result<Self, Vec<Fault>> {
        let mut free = Vec::with_capacity(complex.order());
        let mut positions = Vec::with_capacity(complex.order());
        for u in 0..complex.order() {
            if layout.reference_of.contains(&u) {
                free.push(None);
            } else {
                free.push(Some(positions.len() as u32));
                positions.push(complex.positions[u]);
            }
        }
        let matrix = fem::assembled(mesh, complex, &free);
        let factor = Cholesky::new(&matrix, &positions).map_err(|e| vec![Fault::Numerical(e.to_string())])?;
        let mut port_loads: Vec<Vec<(usize, f64)>> = (0..problem.electrodes.len()).map(|k| vec![(k, 1.0)]).collect();
        let mut loads = Vec::new();
        for elements in tip_elements(problem, plan, mesh, complex) {
            let area_of = |e: usize| mesh.area(complex.elements[e].triangle as usize);
            let area: f64 = elements.iter().map(|&e| area_of(e)).sum();
            let mut load = Vec::new();
            for &e in &elements {
                load.extend((0..3).map(|k| (complex.unknowns[e][k] as usize, area_of(e) / (3.0 * area))));
                if complex.elements[e].leaf.held.is_none() {
                    loads.push(Load { element: e as u32, column: port_loads.len() as u32, per_area: 1.0 / area });
                }
            }
            port_loads.push(load);
        }
        loads.sort_unstable_by_key(|l| (l.element, l.column));
        Ok(Self { free, matrix, factor, port_loads, loads })
    }

    /// Solves, and says how large the residual of the sum of all columns is against its right-hand side.
    fn solved(&self, columns: &[Vec<(usize, f64)>]) -> Result<(Vec<f64>, f64), Vec<Fault>> {
        let order = self.matrix.order();
        let mut right = vec![0.0; order * columns.len()];
        for (c, column) in columns.iter().enumerate() {
            for &(u, w) in column {
                if let Some(row) = self.free[u] {
                    right[c * order + row as usize] += w;
                }
            }
        }
        let sum = |columns: &[f64]| (0..order).map(|i| columns.iter().skip(i).step_by(order).sum::<f64>()).collect::<Vec<f64>>();
        let wanted = sum(&right);
        self.factor.solve(&mut right).map_err(|e| vec![Fault::Numerical(e.to_string())])?;
        let got = self.matrix.times(&sum(&right));
        let size = wanted.iter().fold(0.0, |m: f64, w| m.max(w.abs()));
        let off = wanted.iter().zip(&got).fold(0.0, |m: f64, (w, g)| m.max((w - g).abs()));
        Ok((right, if size > 0.0 { off / size } else { 0.0 }))
    }

    /// The field of the given port currents.
    fn driven(&self, currents: &[f64]) -> Result<Field, Vec<Fault>> {
        let load = self.port_loads.iter().zip(currents).flat_map(|(load, b)| load.iter().map(move |&(u, w)| (u, w * b))).collect();
        let (solution, _) = self.solved(&[load])?;
        Ok(Field::gathered(&solution, 1, &self.free))
    }

    /// The fields of a unit of current at every port, and the port matrix.
    fn ports(&self) -> Result<Ports, Vec<Fault>> {
        let width = self.port_loads.len();
        let (solutions, residual) = self.solved(&self.port_loads)?;
        let field = Field::gathered(&solutions, width, &self.free);
        let mut matrix = Dense::zeros(width, width);
        for (i, load) in self.port_loads.iter().enumerate() {
            for &(u, w) in load {
                for (j, v) in field.at(u).iter().enumerate() {
                    // Symmetric but for rounding: both halves.
                    matrix.add(i, j, 0.5 * w * v);
                    matrix.add(j, i, 0.5 * w * v);
                }
            }
        }
        Ok(Ports { field, matrix, residual })
    }
}

/// All guaranteed intervals of one round.
struct Enclosed {
    loss: Interval,
    resistance: Option<Interval>,
    electrodes: Vec<ElectrodeSolution>,
    probes: Vec<Interval>,
    /// Port currents whose field must be enclosed more tightly, and the weight of their indicators.
    failing: Vec<(Vec<f64>, f64)>,
    voltage_spread: f64,
    /// Level of every piece, V.
    levels: Vec<f64>,
    residual: f64,
}

fn enclose(problem: &Problem, mesh: &Mesh, complex: &Complex, layout: &Layout, bar: &Bar, ports: &Ports) -> Result<Enclosed, Vec<Fault>> {
    let response = network::response(problem, layout, &ports.matrix).ok_or_else(singular)?;
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
    let levels = (0..layout.pieces).map(|p| response.voltages[layout.reference_of[p]]).collect();
    let electrodes =
        (0..count).map(|k| ElectrodeSolution { current: currents[k], current_range: ranges[k], voltage: voltages[k] }).collect();
    Ok(Enclosed { loss, resistance, electrodes, probes, failing, voltage_spread: spread, levels, residual: ports.residual })
}

/// The potential with every piece at its level.
fn levelled(mut potential: Field, complex: &Complex, levels: &[f64]) -> Field {
    for (value, &piece) in potential.values.iter_mut().zip(&complex.piece_of) {
        *value += levels[piece as usize];
    }
    potential
}

/// What passes every joint, and the loss of every layer: the mean of the two bounds, so that the parts add up to the middle of the loss.
fn account(
    problem: &Problem,
    plan: &Plan,
    mesh: &Mesh,
    complex: &Complex,
    potential: &Field,
    flux: &Equilibrated,
) -> (BTreeMap<Mark, Passed>, Vec<f64>) {
    let mut passed: BTreeMap<Mark, Passed> = BTreeMap::new();
    let value = |end: End, k: usize| potential.values[complex.unknown_at(end, k)];
    for x in &complex.area_exchanges {
        let area = mesh.area(x.triangle as usize);
        let d = [0, 1, 2].map(|k| value(x.ends[0], k) - value(x.ends[1], k));
        let mean = (d[0] + d[1] + d[2]) / 3.0;
        let spread = d.iter().map(|d| (d - mean).powi(2)).sum::<f64>() / 12.0;
        let current = x.per_area * area * mean;
        let mark = plan.marks[x.mark as usize];
        let entry = passed.entry(mark).or_default();
        entry.current += current;
        entry.exchanged += current.abs();
        entry.loss += x.per_area * area * (mean * mean + 0.5 * spread);
        entry.extent += area;
        entry.difference += area * mean;
        if !matches!(mark, Mark::Spot(..)) {
            // A contact with a held patch carries part of that spot's current.
            for (end, sign) in x.ends.into_iter().zip([1.0, -1.0]) {
                if let End::Pole(pole) = end {
                    let holds = complex.of_triangle(x.triangle as usize).filter_map(|e| complex.elements[e].leaf.held);
                    if let Some(hold) = holds.into_iter().find(|h| h.pole == pole) {
                        passed.entry(plan.marks[hold.mark as usize]).or_default().current += sign * current;
                    }
                }
            }
        }
    }
    for x in &complex.edge_exchanges {
        let corners = mesh.corners(complex.elements[x.element as usize].triangle as usize);
        let (i, j) = ((x.edge as usize + 1) % 3, (x.edge as usize + 2) % 3);
        let length = corners[i].distance(corners[j]);
        let d = [i, j].map(|k| potential.values[x.pole as usize] - value(End::Leaf(x.element), k));
        let mean = 0.5 * (d[0] + d[1]);
        let entry = passed.entry(plan.marks[x.mark as usize]).or_default();
        entry.current += x.per_length * length * mean;
        entry.exchanged += (x.per_length * length * mean).abs();
        entry.loss += x.per_length * length * (mean * mean + 0.5 * (d[0] - d[1]).powi(2) / 12.0);
        entry.extent += length;
        entry.difference += length * mean;
    }
    let mut layer_loss = vec![0.0; problem.layers.len()];
    for (e, element) in complex.elements.iter().enumerate().filter(|(_, e)| e.leaf.held.is_none()) {
        let corners = mesh.corners(element.triangle as usize);
        let pairs = fem::conduction(corners, element.leaf.conductance);
        let mass = fem::flux_mass(corners, element.leaf.conductance);
        let primal: f64 =
            (0..3).map(|k| -pairs[k] * (value(End::Leaf(e as u32), (k + 1) % 3) - value(End::Leaf(e as u32), (k + 2) % 3)).powi(2)).sum();
        let f = flux.flux[e];
        let dual: f64 = (0..3).map(|i| (0..3).map(|j| f[i] * mass[i][j] * f[j]).sum::<f64>()).sum();
        for (l, layer) in problem.layers.iter().enumerate().filter(|(l, _)| element.leaf.layers >> l & 1 == 1) {
            layer_loss[l] += 0.5 * (primal + dual) * layer.sheet_conductance() / element.leaf.conductance;
        }
        for k in 0..3 {
            if let fem::Link::Open(hold) = complex.links[complex.link_of[e][k] as usize] {
                let entry = passed.entry(plan.marks[hold.mark as usize]).or_default();
                entry.current -= f[k];
                entry.exchanged += f[k].abs();
            }
        }
    }
    (passed, layer_loss)
}
