//! One unknown-start solve. Compiled in every test run, timed by `cargo bench`.
//!
//! - 10³ to 10⁵ landmarks at the same density (100 per km²), until the fix;
//! - 10⁴ landmarks with a stray budget of 1 beside none, over the same detections in the same run;
//! - 10⁴ landmarks with 1, 2, 4 and 8 slices of the heading bias.

#![allow(missing_docs, reason = "the macro of the benchmark library writes an undocumented function")]

#[path = "../suite/support/scenes.rs"]
#[allow(dead_code, reason = "the tests use more of it")]
mod scenes;

use criterion::{BenchmarkId, Criterion, criterion_group, criterion_main};
use fixability::detect::{DrawnErrors, Log, simulate};
use fixability::dive::ErrorShape;
use fixability::locate::{Bounds, Solver, Step, steps};
use scenes::RandomScene;

/// A dive on the scene's line.
fn log_of(scene: &RandomScene) -> Log {
    let errors = DrawnErrors::new(1, &scene.line.name, 0, ErrorShape::Uniform);
    simulate(&scene.scene(), &scene.plan, &[], &errors).log
}

/// The steps up to the first fix.
fn until_fix(solver: &Solver<'_>, all: &[Step], fix_size_m: f64) -> usize {
    let fix = solver.run(all, |_, _| {}).first_fix_along_m(fix_size_m).expect("the scene has a fix");
    all.iter().position(|step| step.along_m >= fix).expect("a step at the fix") + 1
}

fn unknown_start(c: &mut Criterion) {
    let mut group = c.benchmark_group("unknown start to fix");
    for landmarks in [1_000usize, 10_000, 100_000] {
        let scene = scenes::open_field(landmarks);
        let all = steps(&log_of(&scene), &scene.bounds);
        let solver = scene.solver();
        let until = until_fix(&solver, &all, scene.fix_size_m);
        group.bench_with_input(BenchmarkId::from_parameter(landmarks), &until, |b, &until| {
            b.iter(|| solver.run(&all[..until], |_, _| {}));
        });
    }
    group.finish();
}

fn with_strays(c: &mut Criterion) {
    let mut group = c.benchmark_group("10000 landmarks, stray budget");
    let scene = scenes::open_field(10_000);
    let all = steps(&log_of(&scene), &scene.bounds);
    for stray_budget in [0u8, 1, 2] {
        let solver = Solver { stray_budget, cell_budget: 1_000_000, ..scene.solver() };
        let until = until_fix(&solver, &all, scene.fix_size_m);
        group.bench_with_input(BenchmarkId::new("until its own fix", stray_budget), &until, |b, &until| {
            b.iter(|| solver.run(&all[..until], |_, _| {}));
        });
    }
    group.finish();
}

fn with_slices(c: &mut Criterion) {
    let mut group = c.benchmark_group("10000 landmarks, heading slices");
    let scene = scenes::open_field(10_000);
    let log = log_of(&scene);
    let solver = scene.solver();
    for heading_slices in [1usize, 2, 4, 8] {
        let all = steps(&log, &Bounds { heading_slices, ..scene.bounds });
        let until = until_fix(&solver, &all, scene.fix_size_m);
        group.bench_with_input(BenchmarkId::from_parameter(heading_slices), &until, |b, &until| {
            b.iter(|| solver.run(&all[..until], |_, _| {}));
        });
    }
    group.finish();
}

criterion_group!(benches, unknown_start, with_strays, with_slices);
criterion_main!(benches);
