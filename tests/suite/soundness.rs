//! The true position is inside the feasible set at every event, while the bounds hold.

use fixability::detect::{DrawnErrors, Scene, simulate};
use fixability::locate::{Bounds, steps};

use crate::support::scenes::RandomScene;

/// What a batch of dives showed.
#[derive(Debug, Default)]
struct Tally {
    events: usize,
    lost: usize,
    dives: usize,
    undecided: usize,
}

/// Dives of a scene: starts lost at three places along the line.
fn run_scene(number: u64, draws: u64, tally: &mut Tally, distort: impl Fn(&mut Bounds)) {
    let random = RandomScene::new(number);
    let solver = random.solver();
    let mut bounds = random.bounds;
    distort(&mut bounds);
    let marks: Vec<f64> = [0.0, 0.3, 0.6].iter().map(|share| share * random.plan.length_m).collect();
    for draw in 0..draws {
        let errors = DrawnErrors::new(number, &random.line.name, draw, random.shape);
        let scene: Scene<'_> = random.scene();
        let dive = simulate(&scene, &random.plan, &marks, &errors);
        let steps = steps(&dive.log, &bounds);
        let starts = (0..steps.len()).filter(|&i| steps[i].sighting.is_none());
        for start in starts {
            tally.dives += 1;
            let truth = &dive.truth[start + 1..];
            let outcome = solver.run(&steps[start + 1..], |event, set| {
                tally.events += 1;
                if !set.states.iter().any(|state| state.cell.contains(truth[event.step].position)) {
                    tally.lost += 1;
                }
            });
            tally.undecided += usize::from(outcome.is_undecided);
        }
    }
}

fn run_until(events: usize, distort: impl Fn(&mut Bounds) + Copy) -> Tally {
    let mut tally = Tally::default();
    let mut number = 0;
    while tally.events < events {
        run_scene(number, 4, &mut tally, distort);
        number += 1;
    }
    tally
}

#[test]
fn truth_is_never_lost_while_the_bounds_hold() {
    let tally = run_until(100_000, |_| {});
    println!("{tally:?}");
    assert_eq!(tally.lost, 0, "{tally:?}");
    assert!(tally.undecided * 20 < tally.dives, "too many undecided dives to mean much: {tally:?}");
}

#[test]
#[ignore = "10 million events take long; run by hand with --ignored"]
fn truth_is_never_lost_in_ten_million_events() {
    let tally = run_until(10_000_000, |_| {});
    println!("{tally:?}");
    assert_eq!(tally.lost, 0, "{tally:?}");
}

/// Proof that the check above can fail: the solver is told tighter bounds than the dives keep.
#[test]
fn broken_bounds_lose_the_truth() {
    type Distort = fn(&mut Bounds);
    let broken: [(&str, Distort); 4] = [
        ("range", |b| {
            b.sonar.range_error_m *= 0.2;
            b.sonar.range_error_fraction *= 0.2;
        }),
        ("bearing", |b| b.sonar.bearing_error_rad *= 0.2),
        ("heading", |b| {
            b.dead_reckoning.heading_bias_rad *= 0.2;
            b.dead_reckoning.heading_noise_rad *= 0.2;
        }),
        ("scale", |b| b.dead_reckoning.scale_error = 0.0),
    ];
    for (what, distort) in broken {
        let tally = run_until(20_000, distort);
        println!("{what}: {tally:?}");
        assert!(tally.lost > 0, "tighter {what} bounds must lose the truth: {tally:?}");
    }
}
