//! What hindsight costs on top of a solve: recording, sweeps, and the corridor, over a whole line at 10⁴ landmarks.
#![allow(missing_docs, reason = "the macro of the benchmark library writes an undocumented function")]

#[path = "../suite/support/scenes.rs"]
#[allow(dead_code, reason = "the tests use more of it")]
mod scenes;

use criterion::{BatchSize, Criterion, criterion_group, criterion_main};
use fixability::detect::{DrawnErrors, simulate};
use fixability::dive::ErrorShape;
use fixability::locate::{CorridorGrain, Solver, steps};

fn hindsight(c: &mut Criterion) {
    let scene = scenes::open_field(10_000);
    let errors = DrawnErrors::new(1, &scene.line.name, 0, ErrorShape::Uniform);
    let log = simulate(&scene.scene(), &scene.plan, &[], &errors).log;
    let steps = steps(&log, &scene.bounds);
    for stray_budget in [0, 1] {
        let solver = Solver { stray_budget, cell_budget: 200_000, ..scene.solver() };
        let mut group = c.benchmark_group(format!("hindsight, stray budget {stray_budget}"));
        group.sample_size(20);
        group.bench_function("solve", |b| b.iter(|| solver.run(&steps, |_, _| {})));
        group.bench_function("solve, recorded", |b| b.iter(|| solver.run_recorded(&steps, |_, _| {})));
        let (outcome, recorded) = solver.run_recorded(&steps, |_, _| {});
        assert!(!outcome.is_undecided, "the cell budget is enough for this scene");
        group.bench_function("sweeps", |b| {
            b.iter_batched(
                || recorded.clone(),
                |mut history| history.sweep(solver.map, |_| {}),
                BatchSize::LargeInput,
            );
        });
        let mut swept = recorded;
        swept.sweep(solver.map, |_| {});
        let grain = CorridorGrain { spacing_m: 5.0, cells_max: 64 };
        group.bench_function("corridor", |b| {
            b.iter(|| swept.corridor(&log.events, &scene.bounds, solver.map, grain));
        });
        group.finish();
    }
}

criterion_group!(benches, hindsight);
criterion_main!(benches);
