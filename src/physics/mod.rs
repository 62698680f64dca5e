//! From a checked problem to its solution: plan the mesh, solve, enclose, refine.

pub mod account;
pub mod adapt;
pub mod bar;
pub mod connections;
pub mod enclose;
pub mod fit;
pub mod network;
pub mod pieces;
pub mod plan;
pub mod solution;

pub use adapt::{Started, sharpened};
pub use fit::fit;
pub use solution::{Fault, Solution};

use crate::problem::Problem;

/// Solves a problem to the accuracy it asks for.
///
/// # Errors
/// As [`Started::new`].
pub fn run(problem: &Problem) -> Result<Solution, Vec<Fault>> {
    Started::new(problem, &|_| {})?.finished(&[])
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::{Point, Region, Ring};
    use crate::index::{ElectrodeId, LayerId};
    use crate::problem::*;

    /// One ohm per square.
    fn sheet(name: &str, rings: Vec<Ring>, conductance: f64) -> Layer {
        let material = Material { name: "test".into(), resistivity: Resistivity::Linear { at_20: 1.0, alpha: 0.0 }, density_g_cm3: None };
        let region = Region::from_rings(&rings);
        Layer { name: name.into(), material, resistivity: 1.0 / conductance, thickness_mm: 1.0, rings, region }
    }

    fn polygon(points: &[(f64, f64)]) -> Ring {
        Ring::polygon(points.iter().map(|&(x, y)| Point::new(x, y)))
    }

    fn line(points: &[(f64, f64)]) -> Footprint {
        Footprint::Line { points: points.iter().map(|&(x, y)| Point::new(x, y)).collect() }
    }

    fn disc(x: f64, y: f64, diameter: f64) -> Footprint {
        let centre = Point::new(x, y);
        let region = Region::from_rings(&[Ring::circle(centre, diameter)]);
        Footprint::Area { region, area_mm2: std::f64::consts::PI * 0.25 * diameter * diameter, centre, diameter_mm: Some(diameter) }
    }

    fn electrode(layer: u32, footprint: Footprint, joint_ohm: f64, drive: Drive) -> Electrode {
        Electrode {
            name: "e".into(),
            kind: ElectrodeKind::Terminal,
            group: None,
            through: vec![LayerId(layer)],
            spots: vec![Spot { footprint, joint_ohm }],
            drive,
        }
    }

    fn problem(layers: Vec<Layer>, electrodes: Vec<Electrode>, bracket: f64) -> Problem {
        Problem {
            title: "test".into(),
            temperature_c: 20.0,
            accuracy: Accuracy { bracket, max_vertices: 400_000, gauge_mm: None },
            layers,
            contacts: vec![],
            joins: vec![],
            electrodes,
            sources: vec![],
            measured: vec![],
            probes: vec![],
            crossings: vec![],
            limits: Limits::default(),
        }
    }

    fn resistance_holds(problem: &Problem, expected: f64) {
        let solution = run(problem).unwrap();
        solution.mesh.check().unwrap();
        let r = solution.resistance.unwrap();
        assert!(r.low <= expected * (1.0 + 1e-9) && expected <= r.high * (1.0 + 1e-9), "{r:?} {expected}");
        assert!(solution.run.reached && r.high / r.low - 1.0 <= problem.accuracy.bracket + 1e-9);
    }

    #[test]
    fn a_bend_of_three_squares() {
        // Bowman 1935; Papamichael and Stylianopoulos 2010: twice the module of a trapezium.
        let bend = polygon(&[(0.0, 0.0), (14.0, 0.0), (14.0, 7.0), (7.0, 7.0), (7.0, 14.0), (0.0, 14.0)]);
        for bracket in [1e-2, 1e-3, 2e-4, 2e-5] {
            let ends = [line(&[(14.0, 0.0), (14.0, 7.0)]), line(&[(7.0, 14.0), (0.0, 14.0)])];
            let [a, b] = ends.map(|e| electrode(0, e, 0.0, Drive::Current(1.0)));
            let b = Electrode { drive: Drive::Balance, ..b };
            resistance_holds(&problem(vec![sheet("a", vec![bend.clone()], 1.0)], vec![a, b], bracket), 2.558523142342);
        }
    }

    #[test]
    fn two_discs_on_a_plate_and_a_patch_bonded_on_a_strip() {
        let plate = polygon(&[(0.0, 0.0), (45.0, 0.0), (45.0, 18.0), (0.0, 18.0)]);
        let ends = vec![
            electrode(0, disc(9.0, 9.0, 5.0), 0.0, Drive::Current(1.0)),
            electrode(0, disc(36.0, 9.0, 5.0), 0.0, Drive::Current(-1.0)),
        ];
        resistance_holds(&problem(vec![sheet("a", vec![plate], 1.0)], ends, 2e-4), 1.485944116115);
        let strip = polygon(&[(0.0, 0.0), (60.0, 0.0), (60.0, 10.0), (0.0, 10.0)]);
        let patch = polygon(&[(20.0, 0.0), (34.0, 0.0), (34.0, 5.0), (20.0, 5.0)]);
        let ends = vec![
            electrode(0, line(&[(0.0, 0.0), (0.0, 10.0)]), 0.0, Drive::Current(1.0)),
            electrode(0, line(&[(60.0, 0.0), (60.0, 10.0)]), 0.0, Drive::Balance),
        ];
        let mut job = problem(vec![sheet("a", vec![strip], 1.0), sheet("b", vec![patch], 2.0)], ends, 1e-5);
        job.contacts.push(Contact { name: "c".into(), between: [LayerId(0), LayerId(1)], area: None, interface: Interface::Bonded });
        resistance_holds(&job, 5.352570697978);
    }

    #[test]
    fn laps_with_contact_and_resistive_nuggets() {
        // Lap joint over the full width (derived; the mathematics of Volkersen 1938): ohms here are milliohms of the published case.
        let a = polygon(&[(0.0, 0.0), (30.0, 0.0), (30.0, 9.0), (0.0, 9.0)]);
        let b = polygon(&[(18.0, 0.0), (60.0, 0.0), (60.0, 9.0), (18.0, 9.0)]);
        let ends = vec![
            electrode(0, line(&[(0.0, 0.0), (0.0, 9.0)]), 0.0, Drive::Current(1.0)),
            electrode(1, line(&[(60.0, 0.0), (60.0, 9.0)]), 0.0, Drive::Balance),
        ];
        let mut job = problem(vec![sheet("a", vec![a], 0.2 / 1.7241e-5), sheet("b", vec![b], 0.15 / 9.5e-5)], ends, 2e-4);
        job.contacts.push(Contact {
            name: "c".into(),
            between: [LayerId(0), LayerId(1)],
            area: None,
            interface: Interface::Conductance(200.0),
        });
        resistance_holds(&job, 2.5519674887591e-3);
        // Circular nugget on a resistive interface, sheet out to a circle (derived; the circular transmission line of Reeves 1980, from memory).
        let ring = Ring::circle(Point::default(), 30.0);
        let rim: Vec<Point> = ring.flattened();
        let points = rim.iter().copied().chain(rim.first().copied()).collect();
        let ends = vec![
            electrode(0, disc(0.0, 0.0, 4.0), 5e-3 / (std::f64::consts::PI * 4.0), Drive::Current(1.0)),
            electrode(0, Footprint::Line { points }, 0.0, Drive::Balance),
        ];
        resistance_holds(&problem(vec![sheet("a", vec![ring], 0.15 / 9.5e-5)], ends, 2e-4), 6.25669654305876e-4);
    }

    #[test]
    fn a_ladder_of_cells_shares_as_the_network_does() {
        // Ladder of sources on one strip with full-width taps (derived): hyperbolic shares.
        let pitch = 19.0;
        let strip = polygon(&[(0.0, 0.0), (8.0 * pitch, 0.0), (8.0 * pitch, 12.0), (0.0, 12.0)]);
        let mut electrodes = Vec::new();
        let mut sources = Vec::new();
        for k in 0..9 {
            let x = k as f64 * pitch;
            electrodes.push(electrode(0, line(&[(x, 0.0), (x, 12.0)]), 0.0, Drive::Source(crate::index::SourceId(k))));
            sources.push(Source { emf_v: 3.6, resistance_ohm: 12.5e-3, positive: ElectrodeId(k), negative: None });
        }
        // The load is taken at the last cell: a cell's source and the load share an electrode, so the load hangs on a stub without length.
        let mut job = problem(vec![sheet("a", vec![strip], 0.2 / 1.7241e-5)], electrodes, 1e-3);
        job.sources = sources;
        let solution = run(&job).unwrap();
        let total: f64 = solution.electrodes.iter().map(|e| e.current).sum();
        assert!(total.abs() < 1e-9, "no load: nothing flows: {total}");
    }
}
