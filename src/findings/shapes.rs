//! Shapes whose hotspots are known from the literature or by hand.

use super::hotspot::Survey;
use super::trial::*;
use super::{Hotspot, HotspotKind};
use crate::geometry::Point;
use crate::geometry::Ring;
use crate::index::LayerId;
use crate::problem::*;

/// A strip along x whose ends are terminals; mean density 1 A/mm² at full width.
fn strip_job(rings: Vec<Ring>, length: f64, width: f64, bracket: f64, gauge: f64) -> Problem {
    let ends = terminals(line(&[(0.0, 0.0), (0.0, width)]), line(&[(length, 0.0), (length, width)]), 0, width);
    problem(vec![sheet("a", rings, 1.0)], ends, bracket, gauge)
}

fn near(value: f64, expected: f64, part: f64) {
    assert!((value / expected - 1.0).abs() <= part, "{value} is not {expected} within {part}");
}

#[test]
fn a_uniform_strip_has_one_row_at_mid_length() {
    let body = polygon(&[(0.0, 0.0), (60.0, 0.0), (60.0, 10.0), (0.0, 10.0)]);
    let (.., survey) = surveyed(&strip_job(vec![body], 60.0, 10.0, 1e-3, 0.5));
    assert_eq!(survey.rows.len(), 1);
    let row = &survey.rows[0];
    assert_eq!(row.kind, HotspotKind::Strip);
    assert!((row.x_mm - 30.0).abs() < 0.01 && (row.peak_a_mm2 - 1.0).abs() < 1e-6);
    assert!((row.width_mm.unwrap() - 10.0).abs() < 1e-6 && (row.section_a.unwrap() - 10.0).abs() < 1e-6);
    // One square of 1 mm copper: 17.241 microhm at 10 A.
    near(row.drop_mv.unwrap(), 0.17241, 1e-5);
    near(row.loss_w.unwrap(), 1.7241e-3, 1e-5);
}

#[test]
fn a_hole_in_a_strip_has_its_peaks_beside_the_hole() {
    // The limit of small holes is potential flow past a cylinder (Lamb).
    for (part, ratio, kind) in
        [(0.1, 2.06940028, HotspotKind::HoleEdge), (0.2, 2.32872166, HotspotKind::HoleEdge), (0.3, 3.02206308, HotspotKind::Neck)]
    {
        let radius = 10.0 * part;
        let body = polygon(&[(0.0, 0.0), (60.0, 0.0), (60.0, 10.0), (0.0, 10.0)]);
        let hole = Ring::circle(Point::new(30.0, 5.0), 2.0 * radius);
        let (.., survey) = surveyed(&strip_job(vec![body, hole], 60.0, 10.0, 1e-3, 0.1 * radius));
        assert_eq!(survey.rows.len(), 2);
        for row in &survey.rows {
            assert_eq!(row.kind, kind);
            // The gauge mean lies about a fifth of the gauge inside the metal, where less flows.
            assert!(row.peak_a_mm2 > 0.95 * ratio && row.peak_a_mm2 < 1.01 * ratio, "{} {ratio}", row.peak_a_mm2);
            near(row.width_mm.unwrap(), 5.0 - radius, 0.002);
            near(row.section_a.unwrap(), 5.0, 0.002);
            assert!((row.x_mm - 30.0).abs() < 0.1 * radius, "{}", row.x_mm);
        }
    }
}

/// An L of two arms of width 7 with an inner corner of some radius.
fn bend(radius: f64, bracket: f64, gauge: f64) -> Problem {
    let (w, arm) = (7.0, 28.0);
    let corner = if radius > 0.0 {
        // Metal on the left of a ring that runs counter-clockwise: the fillet turns to the right.
        vec![(w + radius, w, -(std::f64::consts::PI / 8.0).tan()), (w, w + radius, 0.0)]
    } else {
        vec![(w, w, 0.0)]
    };
    let ring: Vec<(f64, f64, f64)> =
        [(0.0, 0.0, 0.0), (arm, 0.0, 0.0), (arm, w, 0.0)].into_iter().chain(corner).chain([(w, arm, 0.0), (0.0, arm, 0.0)]).collect();
    let ends = terminals(line(&[(arm, 0.0), (arm, w)]), line(&[(w, arm), (0.0, arm)]), 0, w);
    problem(vec![sheet("a", vec![bulged(&ring)], 1.0)], ends, bracket, gauge)
}

#[test]
fn a_fillet_peaks_as_published() {
    // For the effect: Hagedorn and Hall 1963, Clem and Berggren 2011.
    for (part, ratio) in [(0.25, 2.06451), (0.5, 1.617003)] {
        let (.., survey) = surveyed(&bend(7.0 * part, 1e-3, 0.04 * 7.0 * part));
        assert_eq!(survey.rows.len(), 1);
        assert_eq!(survey.rows[0].kind, HotspotKind::InsideCorner);
        near(survey.rows[0].peak_a_mm2, ratio, 0.02);
        assert_eq!(survey.rows[0].remark.as_deref().filter(|r| r.contains("infinite")), None);
    }
}

#[test]
fn a_sharp_inside_corner_is_one_row_that_says_its_peak_is_infinite() {
    let (.., survey) = surveyed(&bend(0.0, 1e-3, 0.5));
    assert_eq!(survey.rows.len(), 1);
    let row = &survey.rows[0];
    assert_eq!(row.kind, HotspotKind::InsideCorner);
    assert!(row.x_mm.hypot(row.y_mm) - 7.0 * 2f64.sqrt() < 0.2);
    near(row.section_a.unwrap(), 7.0, 1e-6);
    near(row.width_mm.unwrap(), 7.0, 0.01);
    assert!(row.remark.as_deref().unwrap().contains("infinite"));
}

#[test]
fn an_arc_bend_crowds_at_its_inner_radius() {
    // Current along circles: J = I / (t r ln(r2 / r1)), radii 8 and 15.
    let quarter = (std::f64::consts::PI / 8.0).tan();
    let ring = bulged(&[(8.0, 0.0, 0.0), (15.0, 0.0, quarter), (0.0, 15.0, 0.0), (0.0, 8.0, -quarter)]);
    let ends = terminals(line(&[(8.0, 0.0), (15.0, 0.0)]), line(&[(0.0, 15.0), (0.0, 8.0)]), 0, 7.0);
    let (.., survey) = surveyed(&problem(vec![sheet("a", vec![ring], 1.0)], ends, 1e-3, 0.3));
    near(survey.rows[0].peak_a_mm2, 7.0 / (8.0 * (15f64 / 8.0).ln()), 0.015);
    near(survey.rows[0].section_a.unwrap(), 7.0, 1e-3);
    assert_eq!(survey.rows[0].kind, HotspotKind::InsideCorner);
}

#[test]
fn slots_leave_one_neck() {
    // Notches from both sides leave 4 of 10 mm.
    let (.., survey) = surveyed(&slotted(1e-3));
    assert_eq!(survey.rows.len(), 1);
    let row = &survey.rows[0];
    assert_eq!(row.kind, HotspotKind::Neck);
    near(row.width_mm.unwrap(), 4.0, 0.005);
    near(row.section_a.unwrap(), 10.0, 1e-6);
    near(row.section_a_mm2.unwrap(), 2.5, 0.005);
}

fn slotted(bracket: f64) -> Problem {
    let ring = polygon(&[
        (0.0, 0.0),
        (18.0, 0.0),
        (18.0, 3.0),
        (22.0, 3.0),
        (22.0, 0.0),
        (40.0, 0.0),
        (40.0, 10.0),
        (22.0, 10.0),
        (22.0, 7.0),
        (18.0, 7.0),
        (18.0, 10.0),
        (0.0, 10.0),
    ]);
    strip_job(vec![ring], 40.0, 10.0, bracket, 0.5)
}

/// A 12 mm strip with a post hole that leaves two legs 2 mm wide and 5 mm long.
fn post_hole(bracket: f64) -> Problem {
    let body = polygon(&[(0.0, 0.0), (40.0, 0.0), (40.0, 12.0), (0.0, 12.0)]);
    let hole = polygon(&[(17.5, 2.0), (22.5, 2.0), (22.5, 10.0), (17.5, 10.0)]);
    strip_job(vec![body, hole], 40.0, 12.0, bracket, 0.3)
}

#[test]
fn a_post_hole_leaves_two_legs() {
    let (.., survey) = surveyed(&post_hole(1e-3));
    assert_eq!(survey.rows.iter().map(|r| r.kind).collect::<Vec<_>>(), [HotspotKind::Neck; 2]);
    for row in &survey.rows {
        near(row.width_mm.unwrap(), 2.0, 0.01);
        near(row.section_a.unwrap(), 6.0, 0.002);
    }
}

#[test]
fn a_taper_crowds_where_it_ends() {
    let ring = polygon(&[(0.0, 0.0), (20.0, 0.0), (40.0, 6.0), (60.0, 6.0), (60.0, 10.0), (40.0, 10.0), (20.0, 16.0), (0.0, 16.0)]);
    let ends = terminals(line(&[(0.0, 0.0), (0.0, 16.0)]), line(&[(60.0, 6.0), (60.0, 10.0)]), 0, 4.0);
    let (.., survey) = surveyed(&problem(vec![sheet("a", vec![ring], 1.0)], ends, 1e-3, 0.5));
    let row = &survey.rows[0];
    assert_eq!(row.kind, HotspotKind::InsideCorner);
    near(row.width_mm.unwrap(), 4.0, 0.02);
    near(row.section_a_mm2.unwrap(), 1.0, 0.02);
}

/// Three cells on a strip, current taken off at its right end.
fn nuggets(bracket: f64, joint_ohm: f64) -> Problem {
    let body = polygon(&[(0.0, 0.0), (70.0, 0.0), (70.0, 16.0), (0.0, 16.0)]);
    let cell = |x: f64, i: f64| electrode(ElectrodeKind::Cell, 0, disc(x, 8.0, 4.0), joint_ohm, Drive::Current(i));
    let lug = electrode(ElectrodeKind::Terminal, 0, line(&[(70.0, 0.0), (70.0, 16.0)]), 0.0, Drive::Balance);
    problem(vec![sheet("a", vec![body], 0.3)], vec![cell(10.0, 5.0), cell(30.0, 6.0), cell(50.0, 7.0), lug], bracket, 0.5)
}

#[test]
fn every_nugget_has_one_rim() {
    for joint_ohm in [0.0, 5e-5] {
        let (.., survey) = surveyed(&nuggets(1e-3, joint_ohm));
        assert_eq!(survey.rows.iter().map(|r| r.kind).collect::<Vec<_>>(), [HotspotKind::WeldRim; 3]);
        for (row, (x, current)) in survey.rows.iter().zip([(50.0, 7.0), (30.0, 6.0), (10.0, 5.0)]) {
            assert!((row.x_mm - x).hypot(row.y_mm - 8.0) < 2.6);
            near(row.section_a.unwrap(), current, 1e-6);
            near(row.width_mm.unwrap(), std::f64::consts::PI * 4.0, 0.01);
        }
    }
}

/// A lap of two strips in contact.
fn lap(bracket: f64) -> Problem {
    let a = polygon(&[(0.0, 0.0), (30.0, 0.0), (30.0, 9.0), (0.0, 9.0)]);
    let b = polygon(&[(18.0, 0.0), (60.0, 0.0), (60.0, 9.0), (18.0, 9.0)]);
    let ends = terminals(line(&[(0.0, 0.0), (0.0, 9.0)]), line(&[(60.0, 0.0), (60.0, 9.0)]), 1, 9.0);
    let mut job = problem(vec![sheet("a", vec![a], 0.2), sheet("b", vec![b], 0.15)], ends, bracket, 0.5);
    job.contacts.push(Contact {
        name: "c".into(),
        between: [LayerId(0), LayerId(1)],
        area: None,
        interface: Interface::Conductance(200.0),
    });
    job
}

#[test]
fn a_lap_has_no_crowding_in_the_plane() {
    // One-dimensional: each sheet carries all of the current up to the lap (the mathematics of Volkersen 1938).
    let (.., survey) = surveyed(&lap(1e-3));
    assert_eq!(
        survey.rows.iter().map(|r| (r.kind, r.layer.as_str())).collect::<Vec<_>>(),
        [(HotspotKind::Strip, "b"), (HotspotKind::Strip, "a")]
    );
}

#[test]
fn the_end_of_a_bonded_patch_is_an_overlay_end() {
    // A doubler makes the conductance three times as large: current crowds into it where it begins.
    let strip = polygon(&[(0.0, 0.0), (60.0, 0.0), (60.0, 10.0), (0.0, 10.0)]);
    let patch = polygon(&[(20.0, 0.0), (34.0, 0.0), (34.0, 5.0), (20.0, 5.0)]);
    let ends = terminals(line(&[(0.0, 0.0), (0.0, 10.0)]), line(&[(60.0, 0.0), (60.0, 10.0)]), 0, 10.0);
    let mut job = problem(vec![sheet("a", vec![strip], 0.2), sheet("b", vec![patch], 0.4)], ends, 1e-3, 0.5);
    job.contacts.push(Contact { name: "c".into(), between: [LayerId(0), LayerId(1)], area: None, interface: Interface::Bonded });
    let (.., survey) = surveyed(&job);
    let of_strip: Vec<&Hotspot> = survey.rows.iter().filter(|r| r.layer == "a").collect();
    assert!(!of_strip.is_empty() && of_strip.iter().all(|r| r.kind == HotspotKind::OverlayEnd), "{of_strip:?}");
    for row in of_strip {
        assert!([20.0, 34.0].iter().any(|x| (row.x_mm - x).abs() < 1.0), "{row:?}");
    }
}

#[test]
fn terminals_that_end_on_a_straight_edge_or_lie_on_the_sheet_have_edges() {
    let body = || vec![polygon(&[(0.0, 0.0), (40.0, 0.0), (40.0, 16.0), (0.0, 16.0)])];
    // On part of one side, and on a disc.
    let ends = terminals(line(&[(0.0, 5.0), (0.0, 11.0)]), disc(30.0, 8.0, 6.0), 0, 10.0);
    let (.., survey) = surveyed(&problem(vec![sheet("a", body(), 0.5)], ends, 1e-3, 0.5));
    assert!(survey.rows.iter().all(|r| r.kind == HotspotKind::TerminalEdge), "{:?}", survey.rows);
    let on_line: Vec<&Hotspot> = survey.rows.iter().filter(|r| r.x_mm < 1.0).collect();
    assert_eq!(on_line.len(), 2);
    assert!(on_line.iter().all(|r| r.remark.as_deref().is_some_and(|text| text.contains("infinite"))));
    assert_eq!(survey.rows.len(), 3);
}

#[test]
fn limits_rank_and_a_thin_neck_is_remarked() {
    // Two strips side by side, each with a neck; the lower peak is nearer to its limit.
    let notched = |y: f64, depth: f64| {
        polygon(&[(0.0, y), (9.0, y), (9.0, y + depth), (11.0, y + depth), (11.0, y), (20.0, y), (20.0, y + 6.0), (0.0, y + 6.0)])
    };
    let mut electrodes = Vec::new();
    for (layer, y) in [(0, 0.0), (1, 10.0)] {
        let end = |x: f64| line(&[(x, y), (x, y + 6.0)]);
        electrodes.push(electrode(ElectrodeKind::Terminal, layer, end(0.0), 0.0, Drive::Current(6.0)));
        electrodes.push(electrode(ElectrodeKind::Terminal, layer, end(20.0), 0.0, Drive::Balance));
    }
    let layers = vec![sheet("a", vec![notched(0.0, 3.0)], 0.5), sheet("b", vec![notched(10.0, 4.0)], 0.8)];
    let mut job = problem(layers, electrodes, 1e-3, 0.5);
    let order = |job: &Problem| surveyed(job).2.rows.iter().map(|r| (r.layer.clone(), r.kind)).collect::<Vec<_>>();
    let (a, b) = (("a".to_string(), HotspotKind::Neck), ("b".to_string(), HotspotKind::Neck));
    assert_eq!(order(&job), [a.clone(), b.clone()]);
    job.limits.density_a_mm2 = vec![Some(20.0), Some(5.0)];
    let survey = surveyed(&job).2;
    assert_eq!(order(&job), [b, a]);
    assert!(survey.rows[0].remark.as_deref().unwrap().contains("thin-sheet"), "2 mm wide, 0.8 mm thick");
    assert!(!survey.rows[1].remark.as_deref().unwrap_or_default().contains("thin-sheet"), "3 mm wide, 0.5 mm thick");
    assert_eq!(survey.places.len(), 2);
    assert!(survey.layer_peaks[0] > survey.layer_peaks[1]);
}

#[test]
fn a_slot_with_round_ends_has_hole_edges() {
    // An upright slot in a wide strip: its two ends turn the current.
    let body = polygon(&[(0.0, 0.0), (80.0, 0.0), (80.0, 40.0), (0.0, 40.0)]);
    let slot = Ring::seam(Point::new(40.0, 16.0), Point::new(40.0, 24.0), 2.0);
    let (.., survey) = surveyed(&strip_job(vec![body, slot], 80.0, 40.0, 1e-3, 0.3));
    assert_eq!(survey.rows.iter().map(|r| r.kind).collect::<Vec<_>>(), [HotspotKind::HoleEdge; 2]);
    assert!(survey.rows[0].remark.is_none());
}

/// A plate with two slots, two rows of ten cells and a lead along its right side.
fn plate(bracket: f64) -> Problem {
    let rings = vec![
        polygon(&[(0., 0.), (240., 0.), (240., 80.), (0., 80.)]),
        polygon(&[(90., 28.), (150., 28.), (150., 32.), (90., 32.)]),
        polygon(&[(90., 48.), (150., 48.), (150., 52.), (90., 52.)]),
    ];
    let mut electrodes = vec![];
    for y in [15.0, 65.0] {
        for i in 0..10 {
            electrodes.push(electrode(ElectrodeKind::Cell, 0, disc(12.0 + 24.0 * i as f64, y, 4.0), 5e-5, Drive::Current(1.0)));
        }
    }
    electrodes.push(electrode(ElectrodeKind::Terminal, 0, line(&[(240., 0.), (240., 80.)]), 0.0, Drive::Balance));
    problem(vec![sheet("p", rings, 0.2)], electrodes, bracket, 0.5)
}

#[test]
fn the_list_does_not_depend_on_the_mesh() {
    // With the height of the axis of symmetry: which of two mirror images stands for a row may change where they differ by the mesh's error.
    type Job = (fn(f64) -> Problem, f64);
    let jobs: [Job; 6] = [
        (slotted, 5.0),
        (post_hole, 6.0),
        (plate, 40.0),
        (|b| nuggets(b, 0.0), 8.0),
        (|b| bend(0.0, b, 0.5), -1.0),
        (|b| bend(2.0, b, 0.5), -1.0),
    ];
    for (job, axis) in jobs {
        let lists: Vec<Survey> = [1e-2, 1e-3, 2e-4].map(|bracket| surveyed(&job(bracket)).2).into();
        let finest = &lists[2];
        for survey in &lists {
            assert_eq!(survey.rows.len(), finest.rows.len());
            // Where the table is full, rows as high as its last one may or may not have found room.
            let cut =
                if finest.rows.len() == super::hotspot::MOST_ROWS { 1.03 * finest.rows[finest.rows.len() - 1].peak_a_mm2 } else { 0.0 };
            for (row, other) in survey.rows.iter().zip(&finest.rows).filter(|(_, other)| other.peak_a_mm2 > cut) {
                assert_eq!((row.rank, row.kind), (other.rank, other.kind));
                near(row.peak_a_mm2, other.peak_a_mm2, 0.03);
                near(row.section_a_mm2.unwrap(), other.section_a_mm2.unwrap(), 0.03);
                let aside = (row.y_mm - axis).abs() - (other.y_mm - axis).abs();
                assert!((row.x_mm - other.x_mm).hypot(aside) < 1.0, "{row:?} {other:?}");
            }
        }
    }
}

#[test]
fn the_same_job_gives_the_same_bytes_on_one_and_two_threads() {
    let job = plate(1e-2);
    let on = |threads: usize| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
        pool.install(|| serde_json::to_string(&surveyed(&job).2.rows).unwrap())
    };
    assert_eq!(on(1), on(2));
}

#[test]
fn the_width_of_a_neck_is_its_least_and_not_that_at_the_fillet() {
    // A notch with round inner corners leaves 4 of 10 mm over a length of 3 mm; the peak lies in a fillet, where the metal is wider.
    let quarter = -(std::f64::consts::PI / 8.0).tan();
    let ring = bulged(&[
        (0.0, 0.0, 0.0),
        (40.0, 0.0, 0.0),
        (40.0, 10.0, 0.0),
        (22.5, 10.0, 0.0),
        (22.5, 5.0, quarter),
        (21.5, 4.0, 0.0),
        (18.5, 4.0, quarter),
        (17.5, 5.0, 0.0),
        (17.5, 10.0, 0.0),
        (0.0, 10.0, 0.0),
    ]);
    let (.., survey) = surveyed(&strip_job(vec![ring], 40.0, 10.0, 1e-3, 0.5));
    let row = &survey.rows[0];
    assert_eq!((survey.rows.len(), row.kind), (1, HotspotKind::Neck));
    assert!(row.y_mm > 3.9 && (row.x_mm < 18.6 || row.x_mm > 21.4), "the peak is in a fillet: {row:?}");
    near(row.width_mm.unwrap(), 4.0, 2e-4);
    near(row.section_a.unwrap(), 10.0, 1e-6);
}

/// Two strips of one sheet that are not connected, each with a notch that leaves 1 and 8 mm of 10.
fn two_necks() -> Problem {
    let strip = |y: f64, left: f64| {
        let low = y + 10.0 - left;
        polygon(&[(0.0, y), (14.0, y), (14.0, low), (16.0, low), (16.0, y), (30.0, y), (30.0, y + 10.0), (0.0, y + 10.0)])
    };
    let ends = |y: f64| terminals(line(&[(0.0, y), (0.0, y + 10.0)]), line(&[(30.0, y), (30.0, y + 10.0)]), 0, 10.0);
    let electrodes = ends(0.0).into_iter().chain(ends(20.0)).collect();
    problem(vec![sheet("a", vec![strip(0.0, 1.0), strip(20.0, 8.0)], 1.0)], electrodes, 1e-3, 0.5)
}

#[test]
fn a_place_that_breaks_the_limit_has_a_row_however_high_another_is() {
    let mut job = two_necks();
    let widths = |job: &Problem| -> Vec<f64> { surveyed(job).2.rows.iter().map(|r| r.width_mm.unwrap().round()).collect() };
    assert_eq!(widths(&job), [1.0], "below a quarter of the highest");
    // The second neck's peak is about 2 A/mm².
    for (limit, expected) in [(2.0, vec![1.0, 8.0]), (8.0, vec![1.0])] {
        job.limits.density_a_mm2 = vec![Some(limit)];
        assert_eq!(widths(&job), expected, "limit {limit}");
    }
}

#[test]
fn every_uniform_piece_of_a_sheet_has_a_strip_row_in_its_middle() {
    // Two strips of one sheet; the second carries three quarters of what the first does.
    let strip = |y: f64| polygon(&[(0.0, y), (60.0, y), (60.0, y + 10.0), (0.0, y + 10.0)]);
    let ends = |y: f64, i: f64| terminals(line(&[(0.0, y), (0.0, y + 10.0)]), line(&[(60.0, y), (60.0, y + 10.0)]), 0, i);
    let electrodes = ends(0.0, 10.0).into_iter().chain(ends(20.0, 7.5)).collect();
    let (.., survey) = surveyed(&problem(vec![sheet("a", vec![strip(0.0), strip(20.0)], 1.0)], electrodes, 1e-3, 0.5));
    let found: Vec<_> = survey.rows.iter().map(|r| (r.kind, r.y_mm.round(), (100.0 * r.peak_a_mm2).round())).collect();
    assert_eq!(found, [(HotspotKind::Strip, 5.0, 100.0), (HotspotKind::Strip, 25.0, 75.0)]);
    assert!(survey.rows.iter().all(|r| (r.x_mm - 30.0).abs() < 0.01 && (r.crowding.unwrap() - 1.0).abs() < 1e-6));
}
