//! How the work grows with the accuracy: the gap falls like one over the number of vertices, inside corners and nuggets included.

use crate::support::{read, run};
use std::collections::BTreeMap;

const BEND: &str = r#"
[[layer]]
name = "bend"
resistivity_uohm_cm = 10
thickness_mm = 0.1
points_mm = [[0, 0], [14, 0], [14, 7], [7, 7], [7, 14], [0, 14]]

[[terminal]]
name = "in"
layer = "bend"
line_mm = [[14, 0], [14, 7]]
current_a = 1

[[terminal]]
name = "out"
layer = "bend"
line_mm = [[7, 14], [0, 14]]
"#;

const NUGGETS: &str = r#"
[[layer]]
name = "plate"
resistivity_uohm_cm = 10
thickness_mm = 0.1
points_mm = [[0, 0], [45, 0], [45, 18], [0, 18]]

[[cell]]
name = "C"
layer = "plate"
spots_mm = [[8, 8], [10, 8], [8, 10], [10, 10]]
diameter_mm = 0.8
joint_mohm = JOINT
current_a = 1

[[terminal]]
name = "lug"
layer = "plate"
disc_mm = [36, 9, 5]
"#;

/// Halving the bracket takes no more than this many times the vertices on average.
const PER_HALVING: f64 = 2.6;

fn check(name: &str, sheet: &str) {
    let brackets = [0.32, 0.16, 0.08, 0.04, 0.02];
    let problem = read(sheet, &BTreeMap::new());
    let runs: Vec<_> = brackets.iter().map(|&b| run(&problem, b)).collect();
    let vertices: Vec<usize> = runs.iter().map(|r| r.mesh.points.len()).collect();
    assert!(runs.iter().all(|r| r.run.reached), "{name}: {vertices:?}");
    let growth = (vertices[brackets.len() - 1] as f64 / vertices[0] as f64).powf(1.0 / (brackets.len() - 1) as f64);
    assert!(growth <= PER_HALVING, "{name}: {growth:.2} times the vertices for half the bracket, {vertices:?}");
    for solution in &runs {
        let gaps: Vec<f64> = solution.run.rounds.iter().map(|round| round.gap).collect();
        assert!(gaps.windows(2).all(|w| w[1] < w[0]), "{name}: a round did not narrow the bracket, {gaps:?}");
    }
}

#[test]
fn the_gap_falls_with_the_vertices_at_an_inside_corner() {
    check("bend", BEND);
}

#[test]
fn the_gap_falls_with_the_vertices_at_nuggets() {
    check("solid spots", &NUGGETS.replace("JOINT", "0"));
    check("resistive spots", &NUGGETS.replace("JOINT", "0.05"));
}
