//! The solver beside others that answer the same question: `cargo bench --bench peers`; with
//! `FIXABILITY_WRITE_REPORTS=1` the result goes to `reports/peers.md`, otherwise to the screen only.
//! `FIXABILITY_PEERS=small` makes a quick run.
//!
//! Same maps (10³ to 10⁵ landmarks at 100 per km², `open_field`), same dives (straight lines of 1 km anywhere on the
//! map, in any direction, errors at random, at their bounds and steady in turn), same error bounds. The vehicle may
//! start anywhere on the map; each run goes up to the solver's fix. Everything runs on one thread. Runs are measured
//! in pairs, one of the program's right beside one of the other's, and what is reported is the ratio within a pair:
//! other work on the machine slows both.
//!
//! Needs Python 3 with `venv` and the package index once, to install the pinned packages of `requirements.txt` under
//! `target`; without them the NumPy part is left out and the report says so.

#[path = "../../suite/support/scenes.rs"]
#[allow(dead_code, reason = "the tests use more of it")]
mod scenes;

#[path = "../../suite/support/plain.rs"]
#[allow(dead_code, reason = "the tests use more of it")]
mod plain;

mod numpy;
mod particles;
mod report;

use std::time::Instant;

use fixability::detect::{DrawnErrors, SimulatedDive, simulate};
use fixability::dive::ErrorShape;
use fixability::frame::LocalPoint;
use fixability::interval::smaller;
use fixability::locate::{EventSummary, Solver, Step, steps};
use fixability::track::plan::Plan;
use particles::{Filter, Grid};
use plain::{Finding, PlainMap};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use report::{FilterRow, Report, SolverRow, Spread, VariantRow};
use scenes::RandomScene;

/// How much is run.
struct Settings {
    landmarks: Vec<usize>,
    dives: usize,
    /// Pairs per dive for the variants in Rust.
    rounds: usize,
    /// Dives for NumPy, and pairs for each.
    numpy: [usize; 2],
    particles: Vec<usize>,
    /// Particles and landmarks of a larger cloud, up to the fix only.
    large_cloud: Option<[usize; 2]>,
}

impl Settings {
    fn full() -> Self {
        Self {
            landmarks: vec![1_000, 10_000, 100_000],
            dives: 21,
            rounds: 3,
            numpy: [8, 2],
            particles: vec![10_000, 100_000, 1_000_000],
            large_cloud: Some([10_000_000, 10_000]),
        }
    }

    fn small() -> Self {
        Self {
            landmarks: vec![1_000, 10_000],
            dives: 3,
            rounds: 1,
            numpy: [1, 1],
            particles: vec![10_000, 100_000],
            large_cloud: None,
        }
    }

    /// Enough to see that everything runs.
    fn least() -> Self {
        Self {
            landmarks: vec![200],
            dives: 2,
            rounds: 1,
            numpy: [0, 0],
            particles: vec![1_000],
            large_cloud: None,
        }
    }
}

/// Most landmarks for the variants that look at all pairs: beyond, one solve takes minutes.
const ALL_PAIRS_MAX: usize = 10_000;
/// Widths of the soft edge of the particle filter's likelihood, bounds.
const EDGES: [usize; 2] = [1, 2];
/// Length of a line, metres.
const LINE_M: f64 = 1000.0;
/// A run of the program is repeated within a pair until it has taken this long, seconds.
const LEAST_S: f64 = 0.01;

/// One dive, ready to be solved by anyone.
struct Dive {
    dive: SimulatedDive,
    steps: Vec<Step>,
    /// Steps up to the solver's fix; all of them when it finds none.
    until: usize,
    has_fix: bool,
}

fn dives(scene: &RandomScene, side_m: f64, count: usize) -> Vec<Dive> {
    let mut rng = ChaCha8Rng::seed_from_u64(0xD1 ^ scene.landmarks.len() as u64);
    let margin_m = smaller(LINE_M, 0.25 * side_m);
    (0..count)
        .map(|number| {
            let mut at = || rng.random_range(margin_m..side_m - margin_m);
            let start = LocalPoint::new(at(), at());
            let plan = Plan::straight(start, rng.random_range(0.0..std::f64::consts::TAU), LINE_M);
            let shape = [ErrorShape::Uniform, ErrorShape::Corners, ErrorShape::Steady][number % 3];
            let errors = DrawnErrors::new(1, "peers", number as u64, shape);
            let dive = simulate(&scene.scene(), &plan, &[], &errors);
            let steps = steps(&dive.log, &scene.bounds);
            let fix = solver_of(scene)
                .run(&steps, |_, _| {})
                .events
                .iter()
                .find(|event| event.spread_m.is_some_and(|spread| spread <= scene.fix_size_m))
                .map(|event| event.step + 1);
            Dive { until: fix.unwrap_or(steps.len()), has_fix: fix.is_some(), dive, steps }
        })
        .collect()
}

fn solver_of(scene: &RandomScene) -> Solver<'_> {
    Solver { cell_budget: 1_000_000, ..scene.solver() }
}

/// Seconds per call, over at least `least_s`.
fn seconds(least_s: f64, mut call: impl FnMut()) -> f64 {
    let begin = Instant::now();
    let mut calls = 0u32;
    loop {
        call();
        calls += 1;
        let total = begin.elapsed().as_secs_f64();
        if total >= least_s {
            return total / f64::from(calls);
        }
    }
}

fn summaries(solver: &Solver<'_>, steps: &[Step]) -> Vec<EventSummary> {
    solver.run(steps, |_, _| {}).events
}

/// Seconds of the program's solver to the fix.
fn shipped(solver: &Solver<'_>, dive: &Dive) -> f64 {
    seconds(LEAST_S, || {
        std::hint::black_box(solver.run(&dive.steps[..dive.until], |_, _| {}));
    })
}

/// Another solver against the program's, over all dives with a fix.
fn variant(name: &str, scene: &RandomScene, map: &PlainMap<'_>, dives: &[Dive], rounds: usize) -> VariantRow {
    let solver = solver_of(scene);
    let mut row = VariantRow::new(name, scene.landmarks.len());
    for dive in dives.iter().filter(|dive| dive.has_fix) {
        let steps = &dive.steps[..dive.until];
        let plain: Vec<EventSummary> =
            map.run(&solver, steps, |_| true, false).events.into_iter().map(|(summary, _)| summary).collect();
        assert_eq!(summaries(&solver, steps), plain, "{name} must give the same answer");
        for _ in 0..rounds {
            let own = shipped(&solver, dive);
            let other = seconds(0.0, || {
                std::hint::black_box(map.run(&solver, steps, |_| true, false));
            });
            row.add(own, other);
        }
    }
    row
}

/// What the solver says about the dives.
fn solver_row(scene: &RandomScene, dives: &[Dive]) -> SolverRow {
    let solver = solver_of(scene);
    let mut row = SolverRow { landmarks: scene.landmarks.len(), dives: dives.len(), ..SolverRow::default() };
    let mut times = Vec::new();
    let mut run_m = Vec::new();
    for dive in dives {
        let mut is_lost = false;
        let outcome = solver.run(&dive.steps, |event, set| {
            is_lost |= !set.contains(dive.dive.truth[event.step].position);
        });
        row.wrong += usize::from(is_lost);
        row.undecided += usize::from(outcome.is_undecided);
        row.fixes += usize::from(dive.has_fix);
        if dive.has_fix {
            times.push(shipped(&solver, dive));
            run_m.push(dive.steps[dive.until - 1].along_m);
        }
    }
    row.seconds = Spread::of(times);
    row.run_m = Spread::of(run_m);
    row
}

/// The particle filter on the same dives.
fn filter_row(
    scene: &RandomScene,
    side_m: f64,
    dives: &[Dive],
    [count, edge]: [usize; 2],
    to_the_end: bool,
) -> FilterRow {
    let solver = solver_of(scene);
    let grid = Grid::new(&scene.landmarks, side_m);
    let mut row = FilterRow::new(scene.landmarks.len(), [count, edge], to_the_end);
    for (number, dive) in (0..).zip(dives).filter(|(_, dive)| dive.has_fix) {
        let own = shipped(&solver, dive);
        let begin = Instant::now();
        let mut filter = Filter::new(scene, &grid, side_m, count, edge as f64, number);
        let events = &dive.dive.log.events;
        let mut lives = events[..dive.until].iter().all(|event| filter.follow(event));
        row.add_pair(own, begin.elapsed().as_secs_f64());
        let judge = |filter: &Filter<'_>, lives: bool, step: usize| {
            let truth = dive.dive.truth[step].position;
            if !lives {
                return report::Verdict::Died;
            }
            let (at, share) = filter.estimate(scene.fix_size_m);
            let is_right = at.distance_m(truth) <= scene.fix_size_m;
            let has_truth = filter.share_near(truth, scene.fix_size_m) > 0.0;
            report::Verdict::of(is_right, has_truth, share >= 0.95)
        };
        row.at_fix.add(judge(&filter, lives, dive.until - 1));
        if to_the_end {
            lives = lives && events[dive.until..].iter().all(|event| filter.follow(event));
            row.at_end.add(judge(&filter, lives, events.len() - 1));
        }
    }
    row
}

fn main() {
    // `cargo test` calls benchmarks with this argument, or without `--bench`, to see that they run.
    let is_test = std::env::args().any(|a| a == "--test") || !std::env::args().any(|a| a == "--bench");
    let is_small = std::env::var("FIXABILITY_PEERS").is_ok_and(|text| text == "small");
    let settings = match (is_test, is_small) {
        (true, _) => Settings::least(),
        (false, true) => Settings::small(),
        (false, false) => Settings::full(),
    };
    let begin = Instant::now();
    let mut report = Report::new(settings.dives, settings.rounds);
    let python = if settings.numpy[0] > 0 { numpy::python() } else { Err("not asked for".into()) };
    for &landmarks in &settings.landmarks {
        eprintln!("{landmarks} landmarks ({:.0} s so far)", begin.elapsed().as_secs_f64());
        let scene = scenes::open_field(landmarks);
        let side_m = 100.0 * (landmarks as f64).sqrt();
        let dives = dives(&scene, side_m, settings.dives);
        report.solver.push(solver_row(&scene, &dives));
        let tree = PlainMap::new(&scene.landmarks, Finding::Tree(scene.map.index()));
        let row = variant("Rust, one R-tree query per cell", &scene, &tree, &dives, settings.rounds);
        report.variants.push(row);
        if landmarks <= ALL_PAIRS_MAX {
            let scan = PlainMap::new(&scene.landmarks, Finding::Scan);
            let row = variant("Rust, linear scan per cell", &scene, &scan, &dives, settings.rounds);
            report.variants.push(row);
            match &python {
                Ok(python) => {
                    let (row, versions) = numpy::row(python, &scene, &dives, settings.numpy);
                    report.variants.push(row);
                    report.numpy = versions;
                }
                Err(reason) => report.numpy = format!("left out: {reason}"),
            }
        }
        for &count in &settings.particles {
            for edge in EDGES {
                eprintln!("  {count} particles, edge {edge} ({:.0} s so far)", begin.elapsed().as_secs_f64());
                report.filters.push(filter_row(&scene, side_m, &dives, [count, edge], true));
            }
        }
        if let Some([count, _]) = settings.large_cloud.filter(|[_, on]| *on == landmarks) {
            eprintln!("  {count} particles ({:.0} s so far)", begin.elapsed().as_secs_f64());
            report.filters.push(filter_row(&scene, side_m, &dives, [count, EDGES[0]], false));
        }
    }
    let text = report.to_markdown(begin.elapsed().as_secs_f64());
    if is_test || std::env::var_os("FIXABILITY_WRITE_REPORTS").is_none() {
        println!("{text}");
    } else {
        let path = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("reports/peers.md");
        std::fs::write(&path, text).expect("reports/ can be written");
        println!("written: {}", path.display());
    }
}
