//! Faults that only the mesh or the numbers show, led back to their place in the sheet.

use crate::diagnostic::{Fault, Label, Span};
use crate::index::{CrossingId, ElectrodeId, ProbeId};
use crate::mesh::MeshFault;
use crate::physics::Fault as Late;
use crate::problem::{Drive, MeasuredJoint, Problem};
use crate::reading::Origins;

/// Why a job comes to nothing.
#[derive(Debug)]
pub enum Stop {
    /// The input is at fault.
    Refused(Vec<Fault>),
    /// The tool failed.
    Failed(String),
}

/// What late faults mean: one of the tool's own outweighs those of the input.
pub fn stop(faults: &[Late], problem: &Problem, origins: &Origins) -> Stop {
    match faults.iter().find(|fault| is_ours(fault)) {
        Some(ours) => Stop::Failed(ours.to_string()),
        None => Stop::Refused(faults.iter().map(|fault| placed(fault, problem, origins)).collect()),
    }
}

/// True when the tool failed, not the input.
fn is_ours(fault: &Late) -> bool {
    matches!(fault, Late::Unfitted | Late::Numerical(_) | Late::Mesh(MeshFault::Triangulation(_)))
}

/// The fault with its place, what was expected and a remedy.
fn placed(fault: &Late, problem: &Problem, origins: &Origins) -> Fault {
    let name = |k: ElectrodeId| problem.electrodes.get(k.index()).map_or("?", |e| e.name.as_str());
    let label = |k: ElectrodeId| Label { span: origins.electrode(k).clone(), text: format!("`{}` is here", name(k)) };
    let first = |list: &[ElectrodeId]| list.first().map_or(origins.title(), |&k| origins.electrode(k)).clone();
    let list = |ids: &[ElectrodeId]| ids.iter().map(|&k| format!("`{}`", name(k))).collect::<Vec<_>>().join(", ");
    let at = |span: Span, message: String, expected: &str, remedy: &str| Fault {
        message,
        span: Some(span),
        expected: Some(expected.into()),
        remedy: Some(remedy.into()),
        labels: Vec::new(),
    };
    let measured = |m: usize| match problem.measured.get(m).map(|m| &m.joint) {
        Some(MeasuredJoint::Join(j)) => origins.join(*j).clone(),
        Some(MeasuredJoint::Electrodes(ids)) => first(ids),
        None => origins.title().clone(),
    };
    match fault {
        Late::ElectrodesMeet([a, b]) => Fault {
            labels: vec![label(*a)],
            ..at(
                origins.electrode(*b).clone(),
                format!("electrodes `{}` and `{}` overlap or touch", name(*a), name(*b)),
                "electrodes with metal between them",
                "move one of them apart, or make them one electrode",
            )
        },
        Late::Loose { layer, at: p } => at(
            origins.layer(*layer).clone(),
            format!("the piece of `{}` at ({:.3}, {:.3}) mm is connected to no electrode", problem.layers[layer.index()].name, p.x, p.y),
            "every piece of metal reached by an electrode, directly or through contacts and joins",
            "add a contact or join that reaches it, or take the piece out of the outline",
        ),
        Late::Unbalanced { electrodes, sum } => at(
            first(electrodes),
            format!("the currents of {} add up to {sum} A", list(electrodes)),
            "a sum of zero on every connected piece",
            if electrodes.iter().all(|k| matches!(problem.electrodes[k.index()].drive, Drive::Current(_))) {
                "join this piece to the others, correct a current, or leave `current_a` out of one terminal of the piece: it then takes the balance"
            } else {
                "join this piece to the others by a contact or join, or correct one of the currents given"
            },
        ),
        Late::BalanceUnclear(electrodes) => at(
            first(electrodes),
            format!("{} cannot take the balance", list(electrodes)),
            "one terminal without a drive, and every other electrode connected to it with `current_a`",
            "give `current_a` or `voltage_mv` to this terminal",
        ),
        Late::TipOff { probe, tip } => at(
            origins.probe(ProbeId::new(*probe)).clone(),
            format!("tip {} of `{}` does not stand on one piece of metal", tip + 1, problem.probes[*probe].name),
            "a tip's disc on one piece of the layer",
            "move the tip, or make `tip_mm` smaller",
        ),
        Late::CrossingHeld { crossing, .. } => at(
            origins.crossing(CrossingId::new(*crossing)).clone(),
            format!("`{}`: {fault}", problem.crossings[*crossing].name),
            "a line over metal outside solid patches",
            "move the crossing, or give the joint a resistance",
        ),
        Late::MeasuredIdle(m) => at(
            measured(*m),
            fault.to_string(),
            "a joint that carries current in this job",
            "give the job currents that pass it, or `joint_mohm` in place of the reading",
        ),
        Late::MeasuredLow { measured: m, .. } => at(
            measured(*m),
            fault.to_string(),
            "a reading that the interface has a part in",
            "check where the tips stood, the reading, and the sheets' resistivity and thickness",
        ),
        Late::SpotOff(k) => at(
            origins.electrode(*k).clone(),
            format!("`{}`: {fault}", name(*k)),
            "a place on the metal of its layer",
            "use spots, seams or areas on the metal",
        ),
        Late::TooManyLayers(_) | Late::TooManyPorts(_) | Late::Mesh(_) | Late::Numerical(_) | Late::Unfitted => at(
            origins.title().clone(),
            fault.to_string(),
            "a job within the tool's limits",
            "divide the job, simplify the outlines, or raise `max_vertices`",
        ),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::reading::{Reading, read};
    use std::path::Path;

    const SHEET: &str = "[[layer]]\nname = \"a\"\nthickness_mm = 1\nresistivity_uohm_cm = 2\npoints_mm = [[0, 0], [9, 0], [9, 5], [0, 5]]\n\
                         [[terminal]]\nname = \"in\"\nlayer = \"a\"\nline_mm = [[0, 0], [0, 5]]\ncurrent_a = 1\n\
                         [[terminal]]\nname = \"out\"\nlayer = \"a\"\nline_mm = [[9, 0], [9, 5]]\n";

    #[test]
    fn late_faults_lead_back_to_their_lines_with_a_remedy() {
        let Reading { problem, origins, .. } = read(Path::new("job.toml"), &|_| Ok(SHEET.into())).expect("a valid sheet");
        let [a, b] = [0, 1].map(ElectrodeId::new);
        let cases = [
            (Late::ElectrodesMeet([a, b]), 12, "`in` and `out`"),
            (Late::Unbalanced { electrodes: vec![a, b], sum: 0.5 }, 7, "add up to 0.5 A"),
            (Late::BalanceUnclear(vec![b]), 12, "`out` cannot take the balance"),
            (Late::SpotOff(a), 7, "`in`"),
        ];
        for (late, line, part) in cases {
            let Stop::Refused(faults) = stop(&[late], &problem, &origins) else { panic!("{part}: no fault of the input") };
            let [fault] = <[Fault; 1]>::try_from(faults).expect("one fault");
            assert!(fault.message.contains(part), "{fault:?}");
            assert_eq!(fault.span.map(|s| s.line_column().0), Some(line), "{}", fault.message);
            assert!(fault.remedy.is_some_and(|r| !r.is_empty()) && fault.expected.is_some(), "{}", fault.message);
        }
    }

    #[test]
    fn a_failure_of_the_tool_is_not_laid_on_the_input() {
        let Reading { problem, origins, .. } = read(Path::new("job.toml"), &|_| Ok(SHEET.into())).expect("a valid sheet");
        let faults = [Late::SpotOff(ElectrodeId::new(0)), Late::Numerical("a pivot is not positive".into())];
        assert!(matches!(stop(&faults, &problem, &origins), Stop::Failed(text) if text.contains("pivot")));
    }
}
