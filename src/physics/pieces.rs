//! What hangs together: pieces of metal, parts of the network, references and zeros, and the checks that need to know them.

use super::network::Layout;
use super::plan::{Area, Mark, Plan};
use super::solution::Fault;
use crate::fem::{Complex, Link};
use crate::index::ElectrodeId;
use crate::mesh::Mesh;
use crate::problem::{Drive, ElectrodeKind, Problem};

/// Most electrodes and meter tips of one job: their matrices are dense.
pub const MOST_PORTS: usize = 2000;

/// Every spot must have found metal.
pub fn check_attached(problem: &Problem, complex: &Complex, plan: &Plan) -> Result<(), Vec<Fault>> {
    let mut found = vec![false; plan.marks.len()];
    complex.area_exchanges.iter().for_each(|x| found[x.mark as usize] = true);
    complex.edge_exchanges.iter().for_each(|x| found[x.mark as usize] = true);
    for element in &complex.elements {
        if let Some(hold) = element.leaf.held {
            found[hold.mark as usize] = true;
        }
    }
    for link in &complex.links {
        if let Link::Open(hold) = link {
            found[hold.mark as usize] = true;
        }
    }
    let pole_found = |k: usize| plan.marks.iter().zip(&found).any(|(m, f)| *f && matches!(m, Mark::Spot(e, _) if e.index() == k));
    let off: Vec<Fault> = (0..problem.electrodes.len()).filter(|&k| !pole_found(k)).map(|k| Fault::SpotOff(ElectrodeId::new(k))).collect();
    if off.is_empty() { Ok(()) } else { Err(off) }
}

/// Pieces, references and zeros; the checks that need to know what hangs together.
pub fn layout(problem: &Problem, plan: &Plan, mesh: &Mesh, complex: &Complex) -> Result<Layout, Vec<Fault>> {
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
pub fn tip_elements(problem: &Problem, plan: &Plan, mesh: &Mesh, complex: &Complex) -> Vec<Vec<usize>> {
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
pub fn given_currents(problem: &Problem, layout: &Layout) -> Option<Vec<f64>> {
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
