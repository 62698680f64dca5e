//! What hangs together, found on the first mesh without solving: the faults of a statement that its texts alone do not show.

use super::adapt::from_complex;
use super::pieces::{check_attached, layout};
use super::plan::Plan;
use super::solution::Fault;
use crate::fem::{CellPlan, Complex};
use crate::mesh::triangulated;
use crate::problem::Problem;

/// Checks what [`super::run`] checks before it solves: every piece of metal is reached by an electrode, electrodes do not meet, currents
/// balance on every connected piece, spots and meter tips stand on metal.
///
/// # Errors
/// What is at fault; whatever depends on sound pieces is looked at only once those are sound.
pub fn check(problem: &Problem) -> Result<(), Vec<Fault>> {
    let plan = Plan::new(problem)?;
    let drawing = plan.drawing()?;
    let (mesh, _) =
        triangulated(&drawing, problem.accuracy.max_vertices, &|cover| plan.is_metal(cover)).map_err(|f| vec![Fault::Mesh(f)])?;
    let cells: Vec<CellPlan> = mesh.covers.iter().map(|cover| plan.cell(cover)).collect::<Result<_, _>>().map_err(|f| vec![f])?;
    let complex = Complex::new(&mesh, &cells, plan.line_plans(), problem.electrodes.len()).map_err(|f| vec![from_complex(f)])?;
    check_attached(problem, &complex, &plan)?;
    layout(problem, &plan, &mesh, &complex).map(|_| ())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::index::{ElectrodeId, LayerId};
    use crate::reading::read;
    use std::path::Path;

    /// Two strips side by side; what else the sheet says is given.
    fn checked(more: &str) -> Result<(), Vec<Fault>> {
        let sheet = format!(
            "[[layer]]\nname = \"a\"\nthickness_mm = 1\nresistivity_uohm_cm = 2\npoints_mm = [[0, 0], [20, 0], [20, 5], [0, 5]]\n\
             [[layer]]\nname = \"b\"\nthickness_mm = 1\nresistivity_uohm_cm = 2\npoints_mm = [[15, 0], [40, 0], [40, 5], [15, 5]]\n{more}"
        );
        let reading = read(Path::new("job.toml"), &|_| Ok(sheet.clone())).expect("nothing is wrong with the text");
        check(&reading.problem)
    }

    fn terminal(name: &str, layer: &str, x: f64, drive: &str) -> String {
        format!("[[terminal]]\nname = \"{name}\"\nlayer = \"{layer}\"\nline_mm = [[{x}, 0], [{x}, 5]]\n{drive}\n")
    }

    #[test]
    fn metal_without_an_electrode_is_told_and_a_contact_mends_it() {
        let ends = terminal("in", "a", 0.0, "current_a = 3") + &terminal("out", "a", 20.0, "current_a = -3");
        assert!(matches!(checked(&ends), Err(faults) if matches!(faults[..], [Fault::Loose { layer: LayerId(1), .. }])));
        let contact = "[[contact]]\nbetween = [\"a\", \"b\"]\ncontact_mohm_mm2 = 30\n";
        assert_eq!(checked(&(ends + contact)), Ok(()));
    }

    #[test]
    fn currents_balance_on_each_connected_piece_not_in_the_whole_job_only() {
        let ends = terminal("in", "a", 0.0, "current_a = 3") + &terminal("out", "b", 40.0, "current_a = -3");
        let faults = checked(&ends).expect_err("each strip has one current");
        let sums: Vec<(Vec<ElectrodeId>, f64)> = faults
            .into_iter()
            .map(|f| match f {
                Fault::Unbalanced { electrodes, sum } => (electrodes, sum),
                other => panic!("{other:?}"),
            })
            .collect();
        assert_eq!(sums, [(vec![ElectrodeId(0)], 3.0), (vec![ElectrodeId(1)], -3.0)]);
        let join = "[[join]]\nbetween = [\"a\", \"b\"]\nspots_mm = [[17.5, 2.5]]\ndiameter_mm = 1\njoint_mohm = 0\n";
        assert_eq!(checked(&(ends + join)), Ok(()));
    }
}
