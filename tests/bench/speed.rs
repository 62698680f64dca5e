//! How long the stages of a job take, and the whole of it: `cargo bench`, or `cargo bench -- plate` for some.

use divan::{Bencher, black_box};
use pinchbar::cli::files::OutFolder;
use pinchbar::fem::{self, Complex};
use pinchbar::findings::gauge::DensityField;
use pinchbar::findings::{self, Found, hotspot};
use pinchbar::mesh::{Mesh, bisected, triangulated};
use pinchbar::physics::bar::Bar;
use pinchbar::physics::pieces::{given_currents, layout};
use pinchbar::physics::plan::Plan;
use pinchbar::problem::Problem;
use pinchbar::{physics, reading, report};
use std::path::{Path, PathBuf};
use std::process::Command;

fn main() {
    divan::main();
}

/// A sheet of this folder, solved to a bracket in per cent.
struct Job {
    sheet: &'static str,
    bracket_percent: &'static str,
}

impl std::fmt::Display for Job {
    fn fmt(&self, f: &mut std::fmt::Formatter) -> std::fmt::Result {
        write!(f, "{} {} %", self.sheet, self.bracket_percent)
    }
}

const PLATE: Job = Job { sheet: "plate.toml", bracket_percent: "0.1" };
const JOBS: [Job; 4] = [
    PLATE,
    Job { sheet: "plate.toml", bracket_percent: "0.01" },
    Job { sheet: "two-sheets.toml", bracket_percent: "0.1" },
    Job { sheet: "pack.toml", bracket_percent: "0.1" },
];

impl Job {
    fn path(&self) -> PathBuf {
        Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/bench").join(self.sheet)
    }

    fn read(&self) -> Problem {
        let mut problem = reading::read(&self.path(), &|path| std::fs::read_to_string(path)).expect("a good sheet").problem;
        problem.accuracy.bracket = self.bracket_percent.parse::<f64>().expect("a number") / 100.0;
        problem
    }

    fn found(&self) -> (Problem, Found) {
        let problem = self.read();
        let found = findings::find(&problem).expect("solved");
        (problem, found)
    }
}

fn whole(job: &Job, more: &[&str]) {
    let mut tool = Command::new(env!("CARGO_BIN_EXE_pinchbar"));
    let output = tool.arg("map").arg(job.path()).args(["--quiet", "--bracket-percent", job.bracket_percent]).args(more).output();
    assert!(output.expect("the tool starts").status.success());
}

/// The tool as it is called, with all its files.
#[divan::bench(args = JOBS, sample_count = 7, sample_size = 1)]
fn process(job: &Job) {
    let folder = tempfile::tempdir().expect("a folder");
    whole(job, &["--out", &folder.path().to_string_lossy()]);
}

/// The tool as it is called, figures only.
#[divan::bench(args = JOBS, sample_count = 7, sample_size = 1)]
fn process_figures_only(job: &Job) {
    whole(job, &["--json"]);
}

#[divan::bench(args = JOBS, sample_count = 20, sample_size = 1)]
fn stage_1_read(bencher: Bencher, job: &Job) {
    bencher.bench(|| job.read());
}

fn first_mesh(problem: &Problem) -> Mesh {
    let plan = Plan::new(problem).expect("a plan");
    let drawing = plan.drawing().expect("a drawing");
    triangulated(&drawing, problem.accuracy.max_vertices, &|cover| plan.is_metal(cover)).expect("a mesh").0
}

#[divan::bench(args = JOBS, sample_count = 7, sample_size = 1)]
fn stage_2_first_mesh(bencher: Bencher, job: &Job) {
    let problem = job.read();
    bencher.bench(|| first_mesh(black_box(&problem)));
}

/// With the first mesh, without the hotspots.
#[divan::bench(args = JOBS, sample_count = 7, sample_size = 1)]
fn stage_3_solve(bencher: Bencher, job: &Job) {
    let problem = job.read();
    bencher.bench(|| physics::run(black_box(&problem)).expect("solved"));
}

/// One survey of a solution.
#[divan::bench(args = JOBS, sample_count = 7, sample_size = 1)]
fn stage_4_hotspots(bencher: Bencher, job: &Job) {
    let (problem, found) = job.found();
    bencher.bench(|| {
        let density = DensityField::new(&problem, &found.solution);
        hotspot::survey(&problem, &found.solution, &density)
    });
}

#[divan::bench(args = JOBS, sample_count = 7, sample_size = 1)]
fn stage_5_draw(bencher: Bencher, job: &Job) {
    let (problem, found) = job.found();
    bencher.bench(|| report::figure::heat_map(&problem, &found).expect("a picture"));
}

/// The tables and texts, and all files onto the disk.
#[divan::bench(args = JOBS, sample_count = 20, sample_size = 1)]
fn stage_6_write(bencher: Bencher, job: &Job) {
    let (problem, Found { findings, .. }) = job.found();
    let folder = tempfile::tempdir().expect("a folder");
    bencher.bench(|| {
        let files = [
            ("hotspots.csv", Some(report::csv::hotspots(&findings).expect("a table"))),
            ("welds.csv", Some(report::csv::welds(&findings).expect("a table"))),
            ("result.json", Some(report::json::json(&findings).expect("JSON").into_bytes())),
            ("report.md", Some(report::markdown::report(&problem, &findings, false).into_bytes())),
        ];
        OutFolder::ready(folder.path(), &[]).and_then(|out| out.replace(&files)).expect("written");
    });
}

/// The plate, every triangle halved again and again until there are a million.
fn million(problem: &Problem) -> Mesh {
    let mut mesh = first_mesh(problem);
    while mesh.triangles.len() < 1_000_000 {
        mesh = bisected(&mesh, &vec![true; mesh.triangles.len()]).0;
    }
    mesh
}

#[divan::bench(sample_count = 3, sample_size = 1)]
fn million_1_mesh(bencher: Bencher) {
    let problem = PLATE.read();
    bencher.bench(|| million(black_box(&problem)));
}

/// Matrix, factor, one solve for the given currents.
#[divan::bench(sample_count = 3, sample_size = 1)]
fn million_2_solve(bencher: Bencher) {
    on_a_million(bencher, false);
}

/// The same with both bounds of the loss.
#[divan::bench(sample_count = 3, sample_size = 1)]
fn million_3_solve_and_enclose(bencher: Bencher) {
    on_a_million(bencher, true);
}

fn on_a_million(bencher: Bencher, enclosed: bool) {
    let problem = PLATE.read();
    let mesh = million(&problem);
    bencher.bench(|| {
        let plan = Plan::new(&problem).expect("a plan");
        let cells: Vec<_> = mesh.covers.iter().map(|cover| plan.cell(cover).expect("a cell plan")).collect();
        let complex = Complex::new(&mesh, &cells, plan.line_plans(), problem.electrodes.len()).expect("glued");
        let layout = layout(&problem, &plan, &mesh, &complex).expect("pieces");
        let bar = Bar::new(&problem, &plan, &mesh, &complex, &layout).expect("factored");
        let currents = given_currents(&problem, &layout).expect("all currents given");
        let potential = bar.driven(&currents).expect("solved");
        enclosed.then(|| fem::equilibrated(&mesh, &complex, &potential))
    });
}
