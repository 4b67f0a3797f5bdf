//! The whole area map against one plain solve per start, in one process: `cargo bench --bench area`.
//!
//! Fields of 10³, 10⁴ and 10⁵ landmarks at 100 per km² (the scene of `locate.rs`). At 10⁴ landmarks, 10 km × 10 km, the
//! map has 25 m cells and 16 headings: 2.56 million starts. The other sizes get a square of cells in the middle of their
//! field. The plain solver is timed on a random sample of the same starts, twice: as it is used for a line (to the end
//! of the run), and on a track cut off at its fix. Both use the same threads one after the other. Not a `criterion`
//! benchmark, because one map takes many seconds and its memory is part of the result.
//!
//! Run by `cargo test`, it uses small maps only.

#[path = "../suite/support/scenes.rs"]
#[allow(dead_code, reason = "the tests use more of it")]
mod scenes;

use std::path::Path;
use std::time::Instant;

use fixability::assess::{Setup, area};
use fixability::dive::{AreaOptions, Dive};
use fixability::frame::{Frame, LocalPoint};
use fixability::locate::{StraightOutcome, StraightRuns};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rayon::prelude::*;

const OPTIONS: AreaOptions = AreaOptions { cell_m: 25.0, headings: 16, longest_run_m: 600.0 };

/// The scene as a dive file would give it.
fn dive_of(landmarks: usize) -> Dive {
    let scene = scenes::open_field(landmarks);
    let demo = Path::new(env!("CARGO_MANIFEST_DIR")).join("demo-data/dive.toml");
    let mut dive = Dive::read(&demo).expect("the demo is good");
    dive.frame = Frame::local();
    dive.landmarks = scene.landmarks;
    dive.lines = vec![scene.line];
    dive.vehicle = scene.vehicle;
    dive.dead_reckoning = scene.bounds.dead_reckoning;
    dive.sonar = scene.bounds.sonar;
    dive.heading_slices = scene.bounds.heading_slices;
    dive.start.search_area = scene.search_area;
    dive.scoring.fix_size_m = scene.fix_size_m;
    // Every landmark explains the first detection: the plain solver needs a cell for each.
    dive.scoring.cell_budget = 1_000_000;
    dive
}

/// Highest memory of the process so far, MB, where the system tells.
fn peak_mb() -> f64 {
    let status = std::fs::read_to_string("/proc/self/status").unwrap_or_default();
    let line = status.lines().find_map(|line| line.strip_prefix("VmHWM:"));
    let kilobytes = line.and_then(|line| line.split_whitespace().next()).and_then(|text| text.parse().ok());
    kilobytes.map_or(f64::NAN, |kb: f64| kb / 1024.0)
}

/// Seconds per start of the plain solver on a sample, to the end of the run and to its fix, on one thread.
fn plain_seconds(dive: &Dive, side_m: f64, sample: usize) -> [f64; 2] {
    let setup = Setup::new(dive);
    let mut rng = ChaCha8Rng::seed_from_u64(7);
    let starts: Vec<(LocalPoint, f64)> = (0..sample)
        .map(|_| {
            let start = LocalPoint::new(rng.random_range(0.0..side_m), rng.random_range(0.0..side_m));
            let heading = rng.random_range(0..OPTIONS.headings) as f64 / OPTIONS.headings as f64;
            (start, std::f64::consts::TAU * heading)
        })
        .collect();
    let runs =
        |longest_run_m| StraightRuns::new(setup.scene(), setup.solver(), setup.bounds(), 0, longest_run_m);
    let whole = runs(OPTIONS.longest_run_m);
    let begin = Instant::now();
    let lengths: Vec<f64> = starts
        .iter()
        .map(|&(start, heading)| match whole.solve_plainly(heading, start) {
            StraightOutcome::Fix(fix_m) => fix_m * (1.0 + 1e-12),
            _ => OPTIONS.longest_run_m,
        })
        .collect();
    let to_end = begin.elapsed().as_secs_f64() / sample as f64;
    drop(whole);
    let mut total = 0.0;
    for (&(start, heading), length_m) in starts.iter().zip(lengths) {
        let plan = fixability::track::plan::Plan::straight(start, heading, length_m);
        let begin = Instant::now();
        let run = fixability::locate::ComposedRun::new(&setup.scene(), &plan, &[0.0], &setup.bounds());
        let outcome = run.solve(&setup.solver(), 0, 0.0, |_, _| {});
        total += begin.elapsed().as_secs_f64();
        assert!(!outcome.is_undecided);
    }
    [to_end, total / sample as f64]
}

fn measure(landmarks: usize, cells_side_m: f64, sample: usize) {
    let side_m = 100.0 * (landmarks as f64).sqrt();
    let dive = dive_of(landmarks);
    // The vehicle may be anywhere in the field; the map is computed for a square in its middle.
    let setup = Setup::new(&dive);
    let begin = Instant::now();
    let runs = StraightRuns::new(setup.scene(), setup.solver(), setup.bounds(), 0, OPTIONS.longest_run_m);
    let index_s = begin.elapsed().as_secs_f64();
    let (starts, fixes, map_s) = if cells_side_m >= side_m {
        drop(runs);
        let begin = Instant::now();
        let report = area(&setup, &OPTIONS, &|_| {});
        let fixes = report.outcomes.iter().filter(|run| run.fix_m().is_some()).count();
        (report.outcomes.len(), fixes, begin.elapsed().as_secs_f64())
    } else {
        let count = (cells_side_m / OPTIONS.cell_m / 32.0).ceil() as usize;
        let first = 0.5 * (side_m - count as f64 * 32.0 * OPTIONS.cell_m);
        let blocks: Vec<(usize, usize, usize)> = (0..count * count)
            .flat_map(|block| {
                (0..OPTIONS.headings).map(move |heading| (block / count, block % count, heading))
            })
            .collect();
        let begin = Instant::now();
        let fixes: usize = blocks
            .par_iter()
            .map(|&(row, column, heading)| {
                let starts: Vec<LocalPoint> = (0..32 * 32)
                    .map(|k| {
                        let at = |block: usize, cell: usize| {
                            first + ((block * 32 + cell) as f64 + 0.5) * OPTIONS.cell_m
                        };
                        LocalPoint::new(at(column, k % 32), at(row, k / 32))
                    })
                    .collect();
                let heading_rad = std::f64::consts::TAU * heading as f64 / OPTIONS.headings as f64;
                let outcomes = runs.solve(heading_rad, &starts);
                outcomes.iter().filter(|o| matches!(o, StraightOutcome::Fix(_))).count()
            })
            .sum();
        (blocks.len() * 1024, fixes, index_s + begin.elapsed().as_secs_f64())
    };
    let threads = rayon::current_num_threads() as f64;
    let memory = peak_mb();
    let each_us = map_s * threads / starts as f64 * 1e6;
    let [to_end, to_fix] = plain_seconds(&dive, side_m, sample).map(|s| s * 1e6);
    println!(
        "{landmarks} landmarks: {starts} starts in {map_s:.2} s on {threads} threads (indexes {index_s:.2} s), {:.1} % fix, \
         {each_us:.2} us per start and thread, peak {memory:.0} MB; plain {to_end:.0} us to the end, {to_fix:.0} us to \
         the fix: {:.0} and {:.0} times faster",
        100.0 * fixes as f64 / starts as f64,
        to_end / each_us,
        to_fix / each_us,
    );
}

fn main() {
    // `cargo test` calls benchmarks with this argument to see that they run.
    if std::env::args().any(|argument| argument == "--test") || !std::env::args().any(|a| a == "--bench") {
        measure(100, 1000.0, 5);
        return;
    }
    let only: Option<usize> = std::env::var("FIXABILITY_LANDMARKS").ok().and_then(|text| text.parse().ok());
    for (landmarks, cells_side_m, sample) in [(1_000, 1e9, 300), (10_000, 1e9, 300), (100_000, 3200.0, 60)] {
        if only.is_none_or(|only| only == landmarks) {
            measure(landmarks, cells_side_m, sample);
        }
    }
}
