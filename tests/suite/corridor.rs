//! The corridor holds the true track at every instant, not only at detections.

use fixability::detect::{DrawnErrors, simulate};
use fixability::dive::ErrorShape;
use fixability::locate::{Bounds, CorridorGrain, CorridorInterval, Solver, steps};

use crate::support::scenes::{RandomScene, strays_from};

/// Distance between samples of the true track, metres.
const SAMPLE_M: f64 = 0.1;

/// What a batch of dives showed.
#[derive(Debug, Default)]
struct Tally {
    dives: usize,
    intervals: usize,
    cells: usize,
    samples: usize,
    outside: usize,
    /// Sampled instants that no interval covers.
    uncovered: usize,
    /// Intervals whose cells lie within one fix size of each other.
    narrow: usize,
    area_m2: f64,
}

/// One scene's dives. `distort` changes the bounds that the solver and the corridor are told, `thin` the corridor.
fn run_scene(
    number: u64,
    draws: u64,
    tally: &mut Tally,
    distort: impl Fn(&mut Bounds),
    thin: impl Fn(&mut Vec<CorridorInterval>),
) {
    let mut random = RandomScene::new(number);
    // Some dives see strays, at random or as decoys, within the budget.
    let stray_budget = u8::from(number % 5 == 4);
    random.bounds.sonar.strays_per_km = f64::from(stray_budget);
    let mut bounds = random.bounds;
    distort(&mut bounds);
    let solver = Solver { stray_budget, ..random.solver() };
    let length_m = random.plan.length_m;
    for draw in 0..draws {
        let shape =
            [ErrorShape::Uniform, ErrorShape::Corners, ErrorShape::Steady][((number + draw) % 3) as usize];
        let errors = DrawnErrors::new(number, "corridor", draw, shape);
        let from_m = [0.0, 0.45][(draw % 2) as usize] * length_m;
        let dive = simulate(&random.scene(), &random.plan, &[from_m, length_m], &errors);
        let start = dive.log.events.iter().position(|event| event.sighting.is_none()).expect("a mark");
        if strays_from(&dive, start) > usize::from(stray_budget) {
            continue;
        }
        let steps = steps(&dive.log, &bounds);
        let (outcome, mut history) = solver.run_recorded(&steps[start + 1..], |_, _| {});
        if outcome.contradiction().is_some() {
            continue;
        }
        history.sweep(solver.map, |_| {});
        let spacing_m = [2.0, 5.0, 20.0, 1000.0][(number % 4) as usize];
        let grain = CorridorGrain { spacing_m, cells_max: [500, 3][(number % 2) as usize] };
        let mut corridor = history.corridor(&dive.log.events[start + 1..], &bounds, solver.map, grain);
        thin(&mut corridor);
        tally.dives += 1;
        for interval in &corridor {
            assert!(
                interval.to_m - interval.from_m <= spacing_m * (1.0 + 1e-12)
                    && interval.from_m <= interval.to_m
            );
            tally.intervals += 1;
            tally.cells += interval.cells.len();
            tally.area_m2 += interval.cells.iter().map(|cell| cell.area_m2()).sum::<f64>();
            let hull = interval.cells.iter().copied().reduce(|a, b| a.hull(&b));
            tally.narrow += usize::from(hull.is_some_and(|hull| hull.diameter_m() <= random.fix_size_m));
        }
        for pair in corridor.windows(2) {
            assert!((pair[0].to_m - pair[1].from_m).abs() < 1e-9, "intervals follow each other");
        }
        // The same dive with marks along it: errors are asked by number, so they are the same.
        let mut marks = vec![from_m];
        let count = ((length_m - from_m) / SAMPLE_M) as usize;
        marks.extend((1..=count).map(|k| from_m + k as f64 * SAMPLE_M));
        let sampled = simulate(&random.scene(), &random.plan, &marks, &errors);
        let first = sampled.log.events.iter().position(|event| event.sighting.is_none()).expect("a mark");
        assert_eq!(sampled.truth[first].position, dive.truth[start].position);
        let mut run_m = 0.0;
        for (event, truth) in sampled.log.events.iter().zip(&sampled.truth).skip(first + 1) {
            run_m += event.travel.iter().map(|piece| piece.length_m).sum::<f64>();
            let at = corridor.partition_point(|interval| interval.to_m < run_m - 1e-7);
            tally.samples += 1;
            match corridor.get(at).filter(|interval| interval.from_m <= run_m + 1e-7) {
                None => tally.uncovered += 1,
                Some(interval) => {
                    let inside = interval.cells.iter().any(|cell| cell.contains(truth.position));
                    tally.outside += usize::from(!inside);
                }
            }
        }
    }
}

fn run(
    scenes: u64,
    distort: impl Fn(&mut Bounds) + Copy,
    thin: impl Fn(&mut Vec<CorridorInterval>) + Copy,
) -> Tally {
    let mut tally = Tally::default();
    for number in 0..scenes {
        run_scene(number, 4, &mut tally, distort, thin);
    }
    println!("{tally:?}");
    tally
}

#[test]
fn the_true_track_lies_in_the_corridor_at_every_instant() {
    let tally = run(300, |_| {}, |_| {});
    assert_eq!((tally.outside, tally.uncovered), (0, 0), "{tally:?}");
    assert!(
        tally.samples > 5_000_000 && tally.narrow * 10 > tally.intervals,
        "too little to mean much: {tally:?}"
    );
}

/// Proof that the check above can fail: bounds tighter than the dives keep, and a corridor that is one
/// interval late.
#[test]
fn a_broken_corridor_shows() {
    let tally = run(40, |b| b.dead_reckoning.scale_error *= 0.5, |_| {});
    assert!(tally.outside > 0, "{tally:?}");
    let shifted = |corridor: &mut Vec<CorridorInterval>| {
        for i in (1..corridor.len()).rev() {
            corridor[i].cells = corridor[i - 1].cells.clone();
        }
    };
    let tally = run(40, |_| {}, shifted);
    assert!(tally.outside > 0, "{tally:?}");
}
