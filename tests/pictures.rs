//! Pictures of made-up parts with analytic fields: words never collide or leave the page, and the bytes stay what they were.
//!
//! `PINCHBAR_RENEW=1` writes the golden digests anew; `PINCHBAR_PICTURES=DIR` stores the PNGs to be looked at.

use pinchbar::geometry::Point;
use pinchbar::picture::{HotspotMark, Panel, Sheet, SpotMark, heat_map, layout};
use std::f64::consts::{PI, TAU};

/// Potential (mV) and current density (A/mm²) at a point.
type Field<'a> = &'a dyn Fn(Point) -> (f64, [f64; 2]);

/// A structured triangulation of the image of the unit square.
fn mapped(nu: usize, nv: usize, map: &dyn Fn(f64, f64) -> Point, field: Field<'_>) -> Panel {
    let mut panel = Panel::default();
    for j in 0..=nv {
        for i in 0..=nu {
            let p = map(i as f64 / nu as f64, j as f64 / nv as f64);
            panel.points.push(p);
            panel.potential_mv.push(field(p).0);
        }
    }
    let at = |i: usize, j: usize| (j * (nu + 1) + i) as u32;
    for j in 0..nv {
        for i in 0..nu {
            for corners in [[at(i, j), at(i + 1, j), at(i + 1, j + 1)], [at(i, j), at(i + 1, j + 1), at(i, j + 1)]] {
                let [a, b, c] = corners.map(|n| panel.points[n as usize]);
                let flow = field((a + b + c) * (1.0 / 3.0)).1;
                panel.triangles.push(corners);
                panel.values.push(flow[0].hypot(flow[1]));
                panel.flow.push(flow);
            }
        }
    }
    panel
}

fn circle(centre: Point, radius: f64) -> Vec<Point> {
    (0..48).map(|k| TAU * f64::from(k) / 48.0).map(|a| Point::new(centre.x + radius * a.cos(), centre.y + radius * a.sin())).collect()
}

fn rectangle(x: f64, y: f64, width: f64, height: f64) -> Vec<Point> {
    [(0.0, 0.0), (width, 0.0), (width, height), (0.0, height)].map(|(dx, dy)| Point::new(x + dx, y + dy)).to_vec()
}

fn spot(x: f64, y: f64, radius: f64, label: &str) -> SpotMark {
    SpotMark { outline: circle(Point::new(x, y), radius), label: Some(label.to_string()) }
}

fn hotspot(number: usize, x: f64, y: f64) -> HotspotMark {
    HotspotMark { number, at: Point::new(x, y), neck: None, text: None }
}

fn sheet(title: &str, panels: Vec<Panel>) -> Sheet {
    Sheet {
        title: title.to_string(),
        subtitle: "60 A in through six cells, out at the lug · metal at 20 °C".to_string(),
        panels,
        peak: None,
        scale_label: "current density, A/mm²".to_string(),
        footer: vec![
            "loss 1.283 … 1.285 W".to_string(),
            "drop cells to lug 21.38 … 21.42 mV".to_string(),
            "enclosed to 0.1 % · 11 982 triangles".to_string(),
        ],
        caution: "Estimate only. Live cells: burn, arc and fire danger. Test before use; see the cautions.".to_string(),
    }
}

/// Width of the necked strip at x, mm.
fn necked_width(x: f64) -> f64 {
    25.0 - 14.0 * (-((x - 62.0) / 5.0).powi(4)).exp()
}

/// A strip with a neck, carried by slices: the current keeps its share of the width.
fn necked(cells: usize) -> Panel {
    let drop_at = |x: f64| {
        let n = 400;
        let step = x / f64::from(n);
        (0..n).map(|k| step * ramp((f64::from(k) + 0.5) * step) / necked_width((f64::from(k) + 0.5) * step)).sum::<f64>()
    };
    let table: Vec<f64> = (0..=1260).map(|k| drop_at(0.1 * f64::from(k))).collect();
    let field = move |p: Point| {
        let at = (p.x / 0.1).clamp(0.0, 1259.0);
        let (k, t) = (at.floor() as usize, at.fract());
        let phi = table[k] + t * (table[k + 1] - table[k]);
        let width = necked_width(p.x);
        let slope = (necked_width(p.x + 0.01) - necked_width(p.x - 0.01)) / 0.02;
        let eta = (p.y - 12.5) / width;
        let density = 250.0 * ramp(p.x) / width * (1.0 + 6.0 * eta.powi(4) * (slope.abs() / 3.0).min(1.0));
        (60.0 - 18.0 * phi, [density, density * eta * slope])
    };
    let map = |u: f64, v: f64| Point::new(126.0 * u, 12.5 + (v - 0.5) * necked_width(126.0 * u));
    let mut panel = mapped(cells * 5, cells, &map, &field);
    let rim = |v: f64| (0..=300).map(move |k| map(f64::from(k) / 300.0, v));
    panel.loops = vec![rim(0.0).chain(rim(1.0).collect::<Vec<_>>().into_iter().rev()).collect()];
    panel.name = "carrier".to_string();
    panel.details = "nickel-201 0.20 mm · 60.0 A".to_string();
    for (x, label) in [(12.0, "9.8 A"), (30.0, "10.0 A"), (46.0, "10.2 A")] {
        panel.spots.extend([spot(x, 7.5, 1.4, label), spot(x, 17.5, 1.4, label)]);
    }
    panel.patches = vec![rectangle(121.0, 0.0, 5.0, 25.0)];
    panel.names = vec![(Point::new(123.5, 12.5), "lug".to_string()), (Point::new(12.0, 12.5), "cell 1".to_string())];
    let neck = [Point::new(62.0, 7.0), Point::new(62.0, 18.0)];
    panel.hotspots = vec![
        HotspotMark { number: 1, at: Point::new(62.0, 12.5), neck: Some(neck), text: Some("11.00".to_string()) },
        hotspot(2, 57.5, 9.5),
        hotspot(3, 46.0, 7.5),
    ];
    panel
}

/// The current collected up to x, as a share.
fn ramp(x: f64) -> f64 {
    [12.0, 30.0, 46.0].iter().map(|s| 1.0 / (1.0 + (-(x - s) / 2.0).exp())).sum::<f64>() / 3.0
}

/// A square with a round hole in uniform flow: the textbook field of a hole in a wide plate.
fn holed(side: f64, radius: f64, cells: usize) -> Panel {
    let map = move |u: f64, v: f64| {
        let angle = TAU * u;
        let (sin, cos) = angle.sin_cos();
        let outer = 0.5 * side / sin.abs().max(cos.abs());
        let r = radius + (outer - radius) * v * v.sqrt();
        Point::new(r * cos, r * sin)
    };
    let field = move |p: Point| {
        let r2 = p.dot(p);
        let a2 = radius * radius / r2;
        let (c, s) = ((p.x * p.x - p.y * p.y) / r2, 2.0 * p.x * p.y / r2);
        (-30.0 * p.x / side * (1.0 + a2), [8.0 * (1.0 - a2 * c), -8.0 * a2 * s])
    };
    let mut panel = mapped(4 * cells, cells, &map, &field);
    panel.loops = vec![rectangle(-0.5 * side, -0.5 * side, side, side), circle(Point::default(), radius)];
    panel.name = "plate".to_string();
    panel.details = "copper 0.30 mm · 96.0 A".to_string();
    panel.hotspots = vec![hotspot(1, 0.0, radius), hotspot(2, 0.0, -radius)];
    panel.lines = vec![[-0.5, 0.5].map(|y| Point::new(-0.5 * side, y * side)).to_vec()];
    panel.names = vec![(Point::new(-0.44 * side, 0.3 * side), "busbar".to_string())];
    panel
}

/// A plate fed by spots: sources in a plane, with their total drawn off at the right.
fn spotted(width: f64, height: f64, rows: usize, columns: usize, cells: usize) -> Panel {
    let pitch = (width / (columns as f64 + 0.5), height / rows as f64);
    let places: Vec<Point> =
        (0..rows * columns).map(|k| Point::new(pitch.0 * ((k % columns) as f64 + 0.5), pitch.1 * ((k / columns) as f64 + 0.5))).collect();
    let radius = 0.11 * pitch.0.min(pitch.1);
    let sources = places.clone();
    let field = move |p: Point| {
        let (mut phi, mut flow) = (0.0, [0.0, 0.0]);
        for q in &sources {
            let d = p - *q;
            let r2 = d.dot(d).max(radius * radius);
            phi -= 0.5 * r2.ln();
            flow = [flow[0] + d.x / r2 * 3.0, flow[1] + d.y / r2 * 3.0];
        }
        let pull = 1.1 * sources.len() as f64 * p.x / width * TAU / height;
        (phi * 0.4 - 0.2 * pull * p.x, [flow[0] + 1.4 * pull, flow[1]])
    };
    let map = |u: f64, v: f64| Point::new(width * u, height * v);
    let mut panel = mapped((cells as f64 * width / height) as usize, cells, &map, &field);
    panel.loops = vec![rectangle(0.0, 0.0, width, height)];
    panel.name = "collector".to_string();
    panel.details = format!("nickel 0.15 mm · {} spots", places.len());
    panel.spots = places.iter().map(|p| spot(p.x, p.y, radius, "1.50 A")).collect();
    panel.patches = vec![rectangle(width * 0.985, 0.0, width * 0.015, height)];
    panel.hotspots = (0..6).map(|k| hotspot(k + 1, width * 0.97, height * (0.08 + 0.168 * k as f64))).collect();
    panel
}

fn bar(length: f64, width: f64, cells: usize) -> Panel {
    let bump = move |x: f64| 1.0 + 1.4 * (-((x / length - 0.35) / 0.02).powi(2)).exp();
    let field = move |p: Point| (2.0 * length - 0.3 * p.x * 300.0 / length, [5.0 * bump(p.x), 0.0]);
    let mut panel = mapped(cells * 20, cells, &|u, v| Point::new(length * u, width * v), &field);
    panel.loops = vec![rectangle(0.0, 0.0, length, width)];
    panel.name = "strip".to_string();
    panel.details = "nickel-plated steel 0.15 mm · 6.0 A".to_string();
    panel.hotspots = vec![HotspotMark {
        number: 1,
        at: Point::new(0.35 * length, 0.5 * width),
        neck: Some([Point::new(0.35 * length, 0.0), Point::new(0.35 * length, width)]),
        text: Some("8.00".to_string()),
    }];
    panel.lines = [0.0, length].map(|x| vec![Point::new(x, 0.0), Point::new(x, width)]).to_vec();
    panel.names = vec![(Point::new(0.0, 0.5 * width), "feed".to_string()), (Point::new(length, 0.5 * width), "return".to_string())];
    panel
}

fn overlay() -> Panel {
    let field = |p: Point| {
        let rise = (p.x - 5.0) / 49.0;
        (59.0 - 9.0 * rise * rise, [12.0 * (PI * rise).sin().max(0.0), 0.2 * (p.y - 12.5)])
    };
    let mut panel = mapped(100, 40, &|u, v| Point::new(5.0 + 49.0 * u, 3.0 + 19.0 * v), &field);
    panel.loops = vec![rectangle(5.0, 3.0, 49.0, 19.0)];
    panel.name = "overlay".to_string();
    panel.details = "copper 0.20 mm · 41.3 A".to_string();
    for (x, label) in [(12.0, "5.1 A"), (30.0, "6.6 A"), (46.0, "9.0 A")] {
        panel.spots.extend([spot(x, 7.5, 1.4, label), spot(x, 17.5, 1.4, label)]);
    }
    panel
}

fn tall() -> Panel {
    let mut panel = bar(30.0, 200.0, 20);
    panel.hotspots.clear();
    panel
}

/// All the sheets, named.
fn sheets() -> Vec<(&'static str, Sheet)> {
    let four = (0..4).map(|k| Panel { name: format!("layer {}", k + 1), ..spotted(90.0, 60.0, 2, 3, 60) }).collect();
    let mut crowded = necked(30);
    crowded.hotspots = (0..12).map(|k| hotspot(k + 1, 57.0 + 1.1 * (k % 4) as f64, 9.0 + 2.0 * (k / 4) as f64)).collect();
    crowded.names = (0..12).map(|k| (Point::new(60.0, 12.0), format!("electrode {k}"))).collect();
    let mut bench = bar(120.0, 16.0, 20);
    bench.tips = [(20.0, "middle +"), (70.0, "middle −"), (90.0, "half +"), (118.0, "half −")]
        .map(|(x, words)| (Point::new(x, 8.0), words.to_string()))
        .to_vec();
    bench.crossings = vec![([Point::new(80.0, -40.0), Point::new(80.0, 60.0)], "line 6.00 A".to_string())];
    bench.contacts = vec![rectangle(94.0, 2.0, 12.0, 12.0)];
    bench.regions = bench.triangles.iter().map(|t| u32::from(bench.points[t[0] as usize].x >= 60.0)).collect();
    vec![
        ("bench", sheet("Bench, tips and a line", vec![bench])),
        ("neck", sheet("Orchard sprayer 10s6p, link 4–5", vec![necked(35)])),
        ("two-layers", sheet("Orchard sprayer 10s6p, link 4–5, with a copper overlay", vec![necked(35), overlay()])),
        ("square", sheet("Square plate with a round hole", vec![holed(40.0, 7.0, 50)])),
        ("200-spots", sheet("Collector plate, 200 spots", vec![spotted(400.0, 160.0, 10, 20, 100)])),
        ("24-spots", sheet("Collector plate, 24 spots", vec![spotted(160.0, 80.0, 4, 6, 70)])),
        ("long-thin", sheet("Strip 300 x 8 mm", vec![bar(300.0, 8.0, 10)])),
        ("four-layers", sheet("Four layers", four)),
        ("tiny", sheet("Half a millimetre", vec![holed(0.5, 0.1, 40)])),
        ("large", sheet("Two metres", vec![spotted(2000.0, 500.0, 3, 12, 50)])),
        ("tall", sheet("Tall and narrow, twice", vec![tall(), tall()])),
        ("crowded", sheet(&"Far too long a title for one line of this page ".repeat(4), vec![crowded])),
    ]
}

#[test]
fn words_never_overlap_or_leave_the_page() {
    for (name, sheet) in sheets() {
        let placed = layout(&sheet).unwrap();
        assert_eq!(placed.width, 1600, "{name}");
        assert!((300..=2000).contains(&placed.height), "{name}: {}", placed.height);
        for (number, one) in placed.boxes.iter().enumerate() {
            let a = one.area;
            assert!(
                a.left >= 0.0 && a.top >= 0.0 && a.right <= f64::from(placed.width) && a.bottom <= f64::from(placed.height),
                "{name}: {one:?}"
            );
            for other in &placed.boxes[number + 1..] {
                assert!(!a.overlaps(&other.area), "{name}: {one:?} over {other:?}");
            }
        }
    }
}

#[test]
fn what_matters_is_written() {
    for (name, sheet) in sheets() {
        let placed = layout(&sheet).unwrap();
        let has = |text: &str| placed.boxes.iter().any(|b| b.text == text);
        assert!(has("current density, A/mm²") && has("seen from above, drawing y up"), "{name}");
        assert!(placed.boxes.iter().any(|b| b.text.ends_with(" mV")), "{name}: no potential is labelled");
        for panel in &sheet.panels {
            assert!(has(&panel.name), "{name}: {}", panel.name);
            for mark in &panel.hotspots {
                assert!(has(&mark.number.to_string()), "{name}: balloon {}", mark.number);
                assert!(mark.text.as_ref().is_none_or(|text| has(text)), "{name}: width {:?}", mark.text);
            }
        }
    }
    let named = |wanted: &str| sheets().into_iter().find(|(name, _)| *name == wanted).map(|(_, sheet)| sheet).unwrap();
    let bench = layout(&named("bench")).unwrap();
    for text in ["middle +", "middle −", "half +", "half −", "line 6.00 A", "dashed: area of contact"] {
        assert!(bench.boxes.iter().any(|b| b.text == text), "{text}");
    }
    let line = bench.boxes.iter().find(|b| b.text == "line 6.00 A").unwrap().area;
    assert!(line.top > 0.0 && line.bottom < 420.0, "a line drawn far beyond the metal has its words near the metal: {line:?}");
    let neck = named("neck");
    let placed = layout(&neck).unwrap();
    for text in ["9.8 A", "10.0 A", "10.2 A", "lug", "cell 1"] {
        assert!(placed.boxes.iter().any(|b| b.text == text), "{text}");
    }
}

#[test]
fn amperes_of_very_many_spots_are_left_to_the_table() {
    let (_, many) = sheets().into_iter().find(|(name, _)| *name == "200-spots").unwrap();
    let placed = layout(&many).unwrap();
    assert!(!placed.boxes.iter().any(|b| b.text == "1.50 A"));
}

/// A digest of bytes (Fowler, Noll, Vo: 64 bits, variant 1a).
fn digest(bytes: &[u8]) -> u64 {
    bytes.iter().fold(0xcbf2_9ce4_8422_2325, |hash, &b| (hash ^ u64::from(b)).wrapping_mul(0x0100_0000_01b3))
}

#[test]
fn bytes_are_the_same_each_time_and_the_same_as_before() {
    let mut found = String::new();
    for (name, sheet) in sheets() {
        let bytes = heat_map(&sheet).unwrap();
        assert_eq!(bytes, heat_map(&sheet).unwrap(), "{name}");
        if let Ok(folder) = std::env::var("PINCHBAR_PICTURES") {
            std::fs::write(std::path::Path::new(&folder).join(format!("{name}.png")), &bytes).unwrap();
        }
        found += &format!("{name} {:016x}\n", digest(&bytes));
    }
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/tests/golden/pictures.txt");
    if std::env::var_os("PINCHBAR_RENEW").is_some() {
        std::fs::write(path, &found).unwrap();
    }
    let known = std::fs::read_to_string(path).unwrap_or_default();
    assert_eq!(known, found, "look at the pictures (PINCHBAR_PICTURES=DIR), then renew with PINCHBAR_RENEW=1");
}

#[test]
fn a_million_triangles_are_no_burden() {
    for (cells, most_ms) in [(35, 400), (317, 2000)] {
        let sheet = sheet("Fine", vec![necked(cells)]);
        let times = (0..9).map(|_| {
            let start = std::time::Instant::now();
            heat_map(&sheet).unwrap();
            start.elapsed().as_millis()
        });
        // The quickest of some runs: others may share the machine.
        let taken = times.min().unwrap();
        println!("{} triangles: {taken} ms", sheet.panels[0].triangles.len());
        // Ten times what an idle machine needs: a test of the order of growth, not of the machine.
        assert!(taken < most_ms, "{taken} ms");
    }
}
