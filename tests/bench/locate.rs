//! One unknown-start solve at 10³ to 10⁵ landmarks at the same density (100 per km²). Compiled in every test run, timed
//! by `cargo bench`.

#[path = "../suite/support/scenes.rs"]
#[allow(dead_code, reason = "the tests use more of it")]
mod scenes;

use criterion::{BenchmarkId, Criterion, criterion_group, criterion_main};
use fixability::detect::{DrawnErrors, simulate};
use fixability::dive::ErrorShape;
use fixability::locate::steps;

fn unknown_start(c: &mut Criterion) {
    let mut group = c.benchmark_group("unknown start to fix");
    for landmarks in [1_000usize, 10_000, 100_000] {
        let scene = scenes::open_field(landmarks);
        let errors = DrawnErrors::new(1, &scene.line.name, 0, ErrorShape::Uniform);
        let log = simulate(&scene.scene(), &scene.plan, &[], &errors).log;
        let steps = steps(&log, &scene.bounds);
        let solver = scene.solver();
        let outcome = solver.run(&steps, |_, _| {});
        let fix = outcome.first_fix_along_m(scene.fix_size_m).expect("the scene has a fix");
        let until = steps.iter().position(|step| step.along_m >= fix).expect("a step at the fix") + 1;
        group.bench_with_input(BenchmarkId::from_parameter(landmarks), &until, |b, &until| {
            b.iter(|| solver.run(&steps[..until], |_, _| {}));
        });
    }
    group.finish();
}

criterion_group!(benches, unknown_start);
criterion_main!(benches);
