//! The agreement graph and its components, at 10³ to 10⁵ landmarks of the same density (100 per km²). The number of
//! look-alikes of random ground grows with the square of the landmarks, and so does the time: every one of them is found.
//! At 10⁵ landmarks the whole swath would hold some 2·10⁸ of them; a shorter separation is compared there.

#![allow(missing_docs, reason = "the macro of the benchmark library writes an undocumented function")]

#[path = "../suite/support/scenes.rs"]
#[allow(dead_code, reason = "the tests use more of it")]
mod scenes;

use criterion::{BenchmarkId, Criterion, criterion_group, criterion_main};
use fixability::alias::{AgreementBounds, components};

fn look_alikes(c: &mut Criterion) {
    let mut group = c.benchmark_group("components of the agreement graph");
    group.sample_size(10);
    for (landmarks, reaches) in [(1_000, 1.0), (1_000, 2.0), (10_000, 1.0), (10_000, 2.0), (100_000, 0.67)] {
        let scene = scenes::open_field(landmarks);
        let bounds = AgreementBounds {
            dead_reckoning: scene.bounds.dead_reckoning,
            sonar: scene.bounds.sonar,
            speed_mps: scene.vehicle.speed_mps,
        };
        let separation_max_m = reaches * scene.bounds.sonar.reach_m();
        let (found, complete) = components(&scene.landmarks, &bounds, separation_max_m);
        println!(
            "{landmarks} landmarks compared within {separation_max_m:.0} m: {} look-alikes, complete: {complete}",
            found.len()
        );
        let id = BenchmarkId::new(format!("compared within {reaches} reach"), landmarks);
        group.bench_with_input(id, &separation_max_m, |b, &separation_max_m| {
            b.iter(|| components(&scene.landmarks, &bounds, separation_max_m));
        });
    }
    group.finish();
}

criterion_group!(benches, look_alikes);
criterion_main!(benches);
