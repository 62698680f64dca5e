//! Whole sheets through the one door.

use super::*;
use crate::geometry::Point;
use crate::index::{ElectrodeId, LayerId, SourceId};
use crate::problem::{Drive, Footprint, Interface};
use std::io::{Error, ErrorKind};

const STRIP: &str = r#"
[[layer]]
name = "carrier"
metal = "copper-iacs"
thickness_mm = 0.15
outline = "carrier.outline"
corner_radius_mm = 0.2
"#;

const OUTLINE: &str = "# strip with a slot\n0 0\n120 0\n120 30\n0 30\n\n40 10\n60 10\n60 20\n40 20\ncircle 80 15 8.4\n";

const WELDS: &str =
    "id,x_mm,y_mm,cell,diameter_mm,length,angle,net,curent\n1,9,7,C1,1.0,,,B+,15\n2,24,7,C2,,3,90,B+,15\n3,11,7,C1,,,,B+,15\n";

fn read_job(text: &str) -> Result<Reading, Vec<Fault>> {
    read(Path::new("pack/job.toml"), &|path: &Path| match path.to_str() {
        Some("pack/job.toml") => Ok(text.to_string()),
        Some("pack/carrier.outline") => Ok(OUTLINE.to_string()),
        Some("pack/welds.csv") => Ok(WELDS.to_string()),
        Some("pack/pipe.outline") => Err(Error::from(ErrorKind::Unsupported)),
        Some("pack/binary.outline") => Err(Error::from(ErrorKind::InvalidData)),
        _ => Err(Error::from(ErrorKind::NotFound)),
    })
}

fn good(text: &str) -> Reading {
    read_job(text).unwrap_or_else(|faults| panic!("{}", explained(&faults)))
}

fn explained(faults: &[Fault]) -> String {
    faults.iter().map(|f| format!("{:?} {}\n", f.span.as_ref().map(|s| s.line_column()), f.message)).collect()
}

#[test]
fn a_whole_sheet_comes_out_in_the_inside_units() {
    let text = format!(
        r#"{STRIP}
[[layer]]
name = "overlay"
resistivity_uohm_cm = 9.0
alpha_per_k = 0.005
thickness_mm = 0.2
points_mm = [[0, 0], [30, 0], [30, 30], [0, 30]]
[[contact]]
between = ["carrier", "overlay"]
contact_mohm_mm2 = 30
[[join]]
between = ["carrier", "overlay"]
seams_mm = [[10, 25, 14, 25, 0.8]]
joint_mohm = 0
[[terminal]]
name = "lug"
layer = "carrier"
line_mm = [[119.99, -0.01], [120, 30.01]]
[[cell]]
name = "C1"
through = ["overlay", "carrier"]
spots_mm = [[9, 7], [11, 7]]
diameter_mm = 1.0
joint_mohm = 0.05
current_a = 15
pattern = {{ step_mm = [10, 0], count = 2, row_step_mm = [0, 10], rows = 2 }}
[[probe]]
name = "M1"
layer = "carrier"
tips_mm = [[20, 15], [100, 15]]
[[crossing]]
name = "waist"
from_mm = [50, 0]
to_mm = [50, 30]
[limits]
drop_mv = 20
density_a_mm2 = {{ overlay = 12 }}
"#
    );
    let Reading { problem, origins, remarks } = good(&text);
    assert_eq!(problem.title, "job");
    assert!((problem.layers[0].resistivity - 1.7241e-5).abs() < 1e-20);
    assert!((problem.layers[1].resistivity - 9.0e-5).abs() < 1e-20);
    assert_eq!(problem.layers[0].rings[1].vertices.len(), 8, "the slot's corners are round");
    let Interface::Conductance(g) = problem.contacts[0].interface else { panic!("a conductance") };
    assert!((g - 1.0 / 0.03).abs() < 1e-12);
    assert_eq!(problem.contacts[0].name, "carrier on overlay");
    assert_eq!(problem.joins[0].joint_ohm, 0.0);
    let names: Vec<&str> = problem.electrodes.iter().map(|e| e.name.as_str()).collect();
    assert_eq!(names, ["lug", "C1", "C2", "C3", "C4"]);
    let Footprint::Area { centre, area_mm2, .. } = &problem.electrodes[4].spots[1].footprint else { panic!("a spot") };
    assert_eq!(*centre, Point::new(21.0, 17.0));
    assert!((area_mm2 - std::f64::consts::FRAC_PI_4).abs() < 1e-12);
    assert_eq!(problem.electrodes[1].through, [LayerId(1), LayerId(0)]);
    assert_eq!(problem.electrodes[1].group.as_deref(), Some("cells in"));
    assert_eq!(problem.electrodes[0].drive, Drive::Balance);
    let Footprint::Line { points } = &problem.electrodes[0].spots[0].footprint else { panic!("a line") };
    assert_eq!(points, &[Point::new(120.0, 0.0), Point::new(120.0, 30.0)]);
    assert!(remarks.iter().any(|r| r.text.contains("lug: 2 points were moved")), "{remarks:?}");
    assert_eq!(problem.limits.density_a_mm2, [None, Some(12.0)]);
    assert_eq!(problem.limits.drop_v, Some(0.02));
    assert_eq!(problem.probes[0].tip_mm, 0.3);
    assert_eq!(origins.electrode(ElectrodeId(2)), origins.electrode(ElectrodeId(1)));
    assert_eq!(origins.electrode(ElectrodeId(0)).line_column().0, 23);
}

#[test]
fn sources_have_two_ends_and_edges_follow_arcs() {
    let text = format!(
        r#"{STRIP}
[[layer]]
name = "bar"
metal = "nickel-201"
thickness_mm = 0.2
points_mm = [[0, 0], [30, 0], [30, 30], [0, 30]]
[[terminal]]
name = "eye"
layer = "carrier"
edge_mm = [[84.2, 15]]
current_a = -4
[[terminal]]
name = "end"
layer = "bar"
edge_mm = [[30, 0], [30, 30]]
joint_mohm = 0.1
current_a = 4
[[cell]]
name = "A"
layer = "carrier"
spots_mm = [[9, 7]]
diameter_mm = 1.0
joint_mohm = 0
emf_mv = 3650
resistance_mohm = 16
return = {{ layer = "bar", spots_mm = [[20, 7]], diameter_mm = 2, joint_mohm = 0.5 }}
"#
    );
    let problem = good(&text).problem;
    let [eye, end, positive, negative] = problem.electrodes.as_slice() else { panic!("four electrodes") };
    assert_eq!((positive.name.as_str(), negative.name.as_str()), ("A", "A return"));
    assert_eq!((positive.drive, negative.drive), (Drive::Source(SourceId(0)), Drive::Return(SourceId(0))));
    assert_eq!(problem.sources[0].positive, ElectrodeId(2));
    assert_eq!(problem.sources[0].negative, Some(ElectrodeId(3)));
    assert!((problem.sources[0].resistance_ohm - 0.016).abs() < 1e-15 && (problem.sources[0].emf_v - 3.65).abs() < 1e-12);
    let Footprint::Line { points } = &eye.spots[0].footprint else { panic!("a line") };
    assert!(points.len() > 37 && points.first() == points.last());
    let turn: f64 = points.windows(2).map(|w| w[0].cross(w[1])).sum();
    assert!(turn < 0.0, "round a hole the metal is on the left when it is walked clockwise");
    assert!((end.spots[0].joint_ohm - 1e-4).abs() < 1e-18);
}

#[test]
fn a_terminal_keeps_the_corner_it_runs_through_and_half_a_spot_is_remarked() {
    let text = format!(
        r#"{STRIP}
[[terminal]]
name = "wire"
layer = "carrier"
line_mm = [[0, 10], [40, 10]]
current_a = 5
[[cell]]
name = "C1"
layer = "carrier"
spots_mm = [[100, 0]]
diameter_mm = 2
joint_mohm = 0
current_a = -5
"#
    );
    let reading = good(&text);
    let texts: Vec<&str> = reading.remarks.iter().map(|r| r.text.as_str()).collect();
    assert!(
        texts.iter().any(|t| t.contains("carrier: 1 inside corner stays sharp because a terminal runs through: (40.000, 10.000)")),
        "{texts:?}"
    );
    assert!(texts.iter().any(|t| t.contains("C1: 1 spot lies partly off the metal (50.0 %")), "{texts:?}");
    assert_eq!(reading.problem.layers[0].rings[1].vertices.len(), 7);
}

/// The spots of a cell as (centre, area, width).
fn spots(problem: &Problem, electrode: usize) -> Vec<(f64, f64, f64, f64)> {
    let spot = |f: &Footprint| match f {
        Footprint::Area { centre, area_mm2, diameter_mm, .. } => (centre.x, centre.y, *area_mm2, diameter_mm.unwrap_or(0.0)),
        Footprint::Line { .. } => panic!("an area"),
    };
    problem.electrodes[electrode].spots.iter().map(|s| spot(&s.footprint)).collect()
}

const LUG: &str = "[[terminal]]\nname = \"lug\"\nlayer = \"carrier\"\nline_mm = [[120, 0], [120, 30]]\n";

#[test]
fn one_block_makes_the_cells_of_its_list() {
    let block = "[[cell]]\nlayer = \"carrier\"\nspots_csv = \"welds.csv\"\ndiameter_mm = 0.8\njoint_mohm = 0.05\ncurrent_a = 5\n";
    let Reading { problem, origins, remarks } = good(&format!("{STRIP}{LUG}{block}"));
    assert_eq!(problem.electrodes.iter().map(|e| e.name.as_str()).collect::<Vec<_>>(), ["lug", "C1", "C2"]);
    let round = |d: f64| std::f64::consts::FRAC_PI_4 * d * d;
    let [first, third] = spots(&problem, 1)[..] else { panic!("two spots") };
    assert_eq!(((first.0, first.1, first.3), (third.0, third.1, third.3)), ((9.0, 7.0, 1.0), (11.0, 7.0, 0.8)));
    let seam = spots(&problem, 2)[0];
    assert!((seam.2 - (round(0.8) + 0.8 * 2.2)).abs() < 1e-12, "3 mm over all: {seam:?}");
    let Footprint::Area { region, .. } = &problem.electrodes[2].spots[0].footprint else { panic!("an area") };
    assert!((region.bounding_box().height() - 3.0).abs() < 0.01 && (region.bounding_box().width() - 0.8).abs() < 0.01, "upright");
    assert!(problem.electrodes[1..].iter().all(|e| e.drive == Drive::Current(5.0) && e.spots[0].joint_ohm == 0.05e-3));
    let place = origins.electrode(ElectrodeId(2));
    assert_eq!((place.source.path.to_str(), place.line_column()), (Some("pack/welds.csv"), (3, 8)));
    let texts: Vec<&str> = remarks.iter().map(|r| r.text.as_str()).collect();
    let told = "pack/welds.csv: columns not used: `id`, `net`, `curent` (did you mean `current_a`?)";
    assert!(texts.contains(&told), "{texts:?}");

    // The same welds join two sheets: whose cell they are does not matter there.
    let cover = "[[layer]]\nname = \"cover\"\nmetal = \"tin\"\nthickness_mm = 0.2\npoints_mm = [[0, 0], [120, 0], [120, 30], [0, 30]]\n";
    let join = "[[join]]\nbetween = [\"carrier\", \"cover\"]\nspots_csv = \"welds.csv\"\ndiameter_mm = 0.8\njoint_mohm = 0.02\n";
    let wire = "[[terminal]]\nname = \"wire\"\nlayer = \"cover\"\nline_mm = [[0, 0], [0, 30]]\ncurrent_a = 5\n";
    assert_eq!(good(&format!("{STRIP}{cover}{LUG}{wire}{join}")).problem.joins[0].spots.len(), 3);
}

#[test]
fn lists_are_read_as_spreadsheets_write_them() {
    let read_list = |list: &str, block: &str| {
        let job = format!("{STRIP}{LUG}[[cell]]\nlayer = \"carrier\"\nspots_csv = \"list.csv\"\njoint_mohm = 0\n{block}");
        let reading = read(Path::new("job.toml"), &|path: &Path| {
            Ok(match path.to_str() {
                Some("job.toml") => job.clone(),
                Some("list.csv") => list.to_string(),
                _ => OUTLINE.to_string(),
            })
        });
        let Reading { problem, .. } = reading.unwrap_or_else(|faults| panic!("{list:?}: {}", explained(&faults)));
        let named = problem.electrodes.iter().enumerate().skip(1).map(|(i, e)| (e.name.clone(), e.drive, spots(&problem, i)));
        named.collect::<Vec<_>>()
    };
    let plain = read_list("x,y,cell,diameter,current_a\n9.5,7,A,1,2.5\n20,7,B,1,-2\n11.5,7,A,1,\n", "");
    assert_eq!((plain.len(), plain[0].2.len()), (2, 2));
    assert_eq!((&plain[0].0, plain[0].1, &plain[1].0, plain[1].1), (&"A".into(), Drive::Current(2.5), &"B".into(), Drive::Current(-2.0)));
    for same in [
        "\u{feff}X [mm];Y [mm];Cell;Diameter (mm);Current [A]\r\n9,5;7;A;1;2,5\r\n;;;;\r\n20;7;B;1;-2\r\n11,5;7;A;1;2,5\r\n",
        "# from the drawing\nx_mm\ty_mm\tcell\tdiameter_mm\tcurrent\n9,5\t7\tA\t1\t2.5\n20\t7\tB\t1\t-2\n\n11.5\t7\tA\t1",
        "cell,current_a,\"diameter_mm\",y,x\n\"A\",2.5,1,7,9.5\nB,\"-2\",1,7,20,,\nA,,1,7.0,11.5",
    ] {
        assert_eq!(read_list(same, ""), plain, "{same:?}");
    }
    let one = read_list("x,y\n9,7\n11,7\n", "name = \"C1\"\ndiameter_mm = 1\ncurrent_a = 2\npattern = { step_mm = [10, 0], count = 2 }\n");
    assert_eq!(one.iter().map(|c| (c.0.as_str(), c.2.len())).collect::<Vec<_>>(), [("C1", 2), ("C2", 2)]);
    let mixed = read_list("x,y,cell\n9,7,A\n20,7,\n11,7,A\n", "name = \"C1\"\ndiameter_mm = 1\ncurrent_a = 2\n");
    assert_eq!(mixed.iter().map(|c| (c.0.as_str(), c.2.len())).collect::<Vec<_>>(), [("A", 2), ("C1", 1)]);
    // The currents of our own table of welds do not stand in the way of the block's.
    let again = read_list("electrode,x_mm,y_mm,current_a\nC1,9,7,1.1\nC1,11,7,0.9\n", "name = \"C1\"\ndiameter_mm = 1\ncurrent_a = 2\n");
    assert_eq!((again.len(), again[0].1), (1, Drive::Current(2.0)));
}

#[test]
fn endless_lists_and_endless_slips_come_to_an_end() {
    let block = "[[cell]]\nname = \"C\"\nlayer = \"carrier\"\nspots_csv = \"list.csv\"\ndiameter_mm = 1\njoint_mohm = 0\ncurrent_a = 1\n";
    for (row, count, told) in
        [("1,1\n", 1, "more than 100000 spots"), ("a,b\n", 1002, "reading stops here"), (",x", 1, "more than 1000 columns")]
    {
        let list = format!("x,y{}{}", if row.starts_with(',') { "" } else { "\n" }, row.repeat(200_000));
        let faults = read(Path::new("job.toml"), &|path: &Path| {
            Ok(match path.to_str() {
                Some("job.toml") => format!("{STRIP}{LUG}{block}"),
                Some("list.csv") => list.clone(),
                _ => OUTLINE.to_string(),
            })
        });
        let faults = faults.expect_err("too much");
        assert!(faults.len() <= count && faults.last().is_some_and(|f| f.message.contains(told)), "{}: {:?}", faults.len(), faults.last());
    }
}

#[test]
fn crossings_that_end_beside_the_outline_end_on_it() {
    let crossing = "[[crossing]]\nname = \"waist\"\nfrom_mm = [100, 0.015]\nto_mm = [100, 30.01]\n";
    let cell = "[[cell]]\nname = \"C\"\nlayer = \"carrier\"\nspots_mm = [[9, 7]]\ndiameter_mm = 1\njoint_mohm = 0\ncurrent_a = 1\n";
    let Reading { problem, remarks, .. } = good(&format!("{STRIP}{LUG}{cell}{crossing}"));
    assert_eq!((problem.crossings[0].from, problem.crossings[0].to), (Point::new(100.0, 0.0), Point::new(100.0, 30.0)));
    let texts: Vec<&str> = remarks.iter().map(|r| r.text.as_str()).collect();
    assert!(texts.contains(&"waist: 2 points were moved onto the outline (by at most 0.02 mm)"), "{texts:?}");
    let far = good(&format!("{STRIP}{LUG}{cell}{}", crossing.replace("0.015", "0.03").replace("30.01", "31")));
    assert_eq!((far.problem.crossings[0].from, far.problem.crossings[0].to), (Point::new(100.0, 0.03), Point::new(100.0, 31.0)));
}

#[test]
fn slips_of_units_are_remarked_where_they_are_written() {
    let text = r#"
[[layer]]
name = "plate"
resistivity_uohm_cm = 0.0172
thickness_mm = 25
points_mm = [[0, 0], [0.24, 0], [0.24, 0.08], [0, 0.08]]
[[terminal]]
name = "lug"
layer = "plate"
line_mm = [[0.24, 0], [0.24, 0.08]]
joint_mohm = 150
voltage_mv = 0
[[cell]]
name = "C1"
layer = "plate"
spots_mm = [[0.04, 0.04]]
diameter_mm = 0.01
joint_mohm = 170
emf_mv = 3.65
resistance_mohm = 16
"#;
    let texts: Vec<String> = good(text).remarks.into_iter().map(|r| r.text).collect();
    for part in [
        "plate: its extents are 0.24 x 0.08 mm: plausible?",
        "plate: `thickness_mm` is 25: plausible?",
        "plate: `resistivity_uohm_cm` is 0.0172: plausible?",
        "lug: `joint_mohm` is 150: plausible?",
        "C1: `joint_mohm` is 170: plausible?",
        "C1: `emf_mv` is 3.65: plausible?",
    ] {
        assert_eq!(texts.iter().filter(|t| t.starts_with(part)).count(), 1, "{part}: {texts:?}");
    }
    assert_eq!(texts.len(), 6, "{texts:?}");
}

#[test]
fn unreadable_files_are_told_at_their_key() {
    for (file, reason) in [("binary.outline", "it is not text in UTF-8"), ("pipe.outline", "it is a pipe or a device")] {
        let faults = read_job(&STRIP.replace("carrier.outline", file)).expect_err("no outline");
        let fault = faults.iter().find(|f| f.message.contains(reason)).expect("told");
        assert_eq!(fault.span.as_ref().map(|s| s.line_column()), Some((6, 11)));
    }
    assert_eq!(read(Path::new("gone.toml"), &|_| Err(Error::from(ErrorKind::NotFound))).expect_err("gone").len(), 1);
}

#[test]
fn a_byte_order_mark_takes_no_place_in_any_file() {
    let list = "[[cell]]\nname = \"C\"\nlayer = \"carrier\"\nspots_csv = \"list.csv\"\ndiameter_mm = 1\njoint_mohm = 0\ncurrent_a = 1\n";
    let job = format!("titel = 1\n{STRIP}{LUG}{list}");
    let faults = read(Path::new("job.toml"), &|path: &Path| {
        let text = match path.to_str() {
            Some("job.toml") => job.as_str(),
            Some("list.csv") => "x_inch,y\n9,7\n",
            _ => "rong\n0 0\n120 0\n120 30\n0 30\n",
        };
        Ok(format!("\u{feff}{text}"))
    });
    let faults = faults.expect_err("a slip in every first line");
    let first: Vec<_> = faults.iter().filter_map(|f| f.span.as_ref()).map(Span::line_column).filter(|place| place.0 == 1).collect();
    assert_eq!(first, [(1, 1); 3], "{}", explained(&faults));
    let end = "[[terminal]]\nname = \"in\"\nlayer = \"carrier\"\nline_mm = [[0, 0], [0, 30]]\ncurrent_a = 1\n";
    assert_eq!(good(&format!("\u{feff}{STRIP}{LUG}{end}")).problem.electrodes.len(), 2);
}

#[test]
fn broken_sheets_and_outlines_never_panic() {
    let mut random = fastrand::Rng::with_seed(7);
    let whole = format!(
        "{STRIP}[[terminal]]\nname = \"a\"\nlayer = \"carrier\"\nedge_mm = [[0, 0], [0, 30]]\n[[cell]]\nname = \"C1\"\nlayer = \"carrier\"\nseams_mm = [[70, 5, 90, 5, 3]]\njoint_mohm = 0\ncurrent_a = 1\n"
    );
    assert!(read_job(&whole).is_ok());
    let spoil = |text: &str, random: &mut fastrand::Rng| {
        let mut bytes = text.as_bytes().to_vec();
        for _ in 0..random.usize(1..4) {
            let at = random.usize(0..bytes.len());
            match random.u8(0..3) {
                0 => drop(bytes.remove(at)),
                1 => bytes.insert(at, *random.choice(b"[]{}=,.-#\"0e \n").unwrap_or(&b' ')),
                _ => bytes[at] = random.u8(32..127),
            }
        }
        String::from_utf8_lossy(&bytes).into_owned()
    };
    let listed = "[[cell]]\nlayer = \"carrier\"\nspots_csv = \"welds.csv\"\ndiameter_mm = 0.8\njoint_mohm = 0.05\ncurrent_a = 5\n";
    let whole = format!("{whole}{listed}").replace("C1", "D1");
    let mut refused = 0;
    for _ in 0..3000 {
        let (job, outline, welds) = (spoil(&whole, &mut random), spoil(OUTLINE, &mut random), spoil(WELDS, &mut random));
        let spoilt = random.u8(0..3);
        let result = read(Path::new("job.toml"), &|path: &Path| {
            let text = match path.extension().and_then(|e| e.to_str()) {
                Some("csv") => (if spoilt == 0 { &welds } else { WELDS }).to_string(),
                _ if path.ends_with("job.toml") => (if spoilt == 1 { &job } else { &whole }).clone(),
                _ => (if spoilt == 2 { &outline } else { OUTLINE }).to_string(),
            };
            Ok(text)
        });
        if let Err(faults) = result {
            refused += 1;
            assert!(!faults.is_empty());
            assert!(faults.iter().filter_map(|f| f.span.as_ref()).all(|s| s.line_column().0 > 0 && s.end <= s.source.text.len().max(1)));
        }
    }
    assert!(refused > 1000, "{refused}");
}

#[test]
fn two_hundred_thousand_points_and_twenty_thousand_cells_are_read_in_seconds() {
    let mut outline = String::from("-5 -5\n1005 -5\n1005 1005\n-5 1005\n");
    for i in 0..10_000 {
        let (x, y) = ((i % 100) as f64 * 10.0, (i / 100) as f64 * 10.0);
        outline.push_str(&format!("circle {} {} 2\n", x + 5.0, y + 5.0));
    }
    outline.push('\n');
    for i in 0..200_000 {
        let (s, c) = (i as f64 * std::f64::consts::TAU / 200_000.0).sin_cos();
        outline.push_str(&format!("{} {}\n", 2000.0 + 100.0 * c, 100.0 * s));
    }
    let job = r#"
[[layer]]
name = "carrier"
metal = "copper-iacs"
thickness_mm = 0.15
outline = "big.outline"
corner_radius_mm = 0.1
[[terminal]]
name = "a"
layer = "carrier"
edge_mm = [[-5, -5], [-5, 1005]]
[[cell]]
name = "C1"
layer = "carrier"
spots_mm = [[-0.2, 0]]
diameter_mm = 1
joint_mohm = 0.1
current_a = 1
pattern = { step_mm = [10, 0], count = 100, row_step_mm = [0, 10], rows = 100 }
"#;
    let reading = read(Path::new("job.toml"), &|path: &Path| Ok(if path.ends_with("job.toml") { job.into() } else { outline.clone() }));
    assert_eq!(reading.map(|r| r.problem.electrodes.len()).map_err(|f| explained(&f)), Ok(10_001));
}

#[test]
fn turned_shifted_and_scaled_drawings_are_read_alike() {
    for (degrees, shift, scale) in [(0.0, 0.0, 1.0), (23.0, 0.0, 1.0), (23.0, 1e5, 1.0), (71.0, 1000.0, 0.01), (-23.0, 3.0, 0.01)] {
        let (sin, cos) = f64::to_radians(degrees).sin_cos();
        let at = |x: f64, y: f64| format!("[{}, {}]", (x * cos - y * sin) * scale + shift, (x * sin + y * cos) * scale - shift);
        let job = format!(
            r#"
[[layer]]
name = "ell"
metal = "silver"
thickness_mm = 0.2
points_mm = [{}, {}, {}, {}, {}, {}, {}]
[[terminal]]
name = "a"
layer = "ell"
line_mm = [{}, {}]
[[terminal]]
name = "b"
layer = "ell"
edge_mm = [{}, {}]
current_a = 3
[[terminal]]
name = "c"
layer = "ell"
line_mm = [{}, {}]
current_a = 3
[[cell]]
name = "d"
layer = "ell"
spots_mm = [{}]
diameter_mm = {}
joint_mohm = 1
current_a = -5
"#,
            at(0.0, 0.0),
            at(100.0, 0.0),
            at(100.0, 20.0),
            at(60.0, 20.0),
            at(20.0, 20.0),
            at(20.0, 90.0),
            at(0.0, 90.0),
            at(0.0, 90.0),
            at(20.0, 90.0),
            at(100.0, 0.0),
            at(100.0, 20.0),
            at(90.0, 20.0),
            at(30.0, 20.0),
            at(40.0, 0.0),
            3.0 * scale,
        );
        let reading = read(Path::new("job.toml"), &|_| Ok(job.clone()));
        let Reading { problem, remarks, .. } = reading.unwrap_or_else(|f| panic!("{degrees} {shift} {scale}: {}", explained(&f)));
        let counts: Vec<usize> = problem.electrodes[..3]
            .iter()
            .map(|e| if let Footprint::Line { points } = &e.spots[0].footprint { points.len() } else { 0 })
            .collect();
        assert_eq!(counts, [2, 2, 3], "a line along the outline takes up its corners");
        let rest = remarks.iter().filter(|r| !r.text.contains("its extents are")).count();
        assert_eq!(rest, 1, "half a spot, and nothing moved: {remarks:?}");
    }
}
