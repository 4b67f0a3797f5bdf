//! The composed run holds every feasible set of every admissible dive: X ⊆ W, cell by cell.

use fixability::detect::{DrawnErrors, simulate};
use fixability::dive::ErrorShape;
use fixability::locate::cell::{Cell, add_reaches};
use fixability::locate::{Bounds, ComposedRun, Feasible, Step, steps};

use crate::support::scenes::RandomScene;

/// What a batch of dives showed.
#[derive(Debug, Default)]
struct Tally {
    dives: usize,
    cells: usize,
    outside: usize,
    fixes: usize,
    late: usize,
    guaranteed: usize,
    scenes: usize,
}

/// Bounds with every error multiplied by `share`.
fn scaled(mut bounds: Bounds, share: f64) -> Bounds {
    let (d, s) = (&mut bounds.dead_reckoning, &mut bounds.sonar);
    for error in [
        &mut d.scale_error,
        &mut d.heading_bias_rad,
        &mut d.heading_noise_rad,
        &mut d.drift_mps,
        &mut s.range_error_m,
        &mut s.range_error_fraction,
        &mut s.bearing_error_rad,
        &mut s.altitude_error_m,
    ] {
        *error *= share;
    }
    bounds
}

/// The feasible set at step `at`, moved from the last sighting before it.
fn set_at(sets: &[(usize, Feasible)], steps: &[Step], start: usize, at: usize, area: Cell) -> Vec<Cell> {
    let last = sets.iter().rev().find(|(step, _)| *step <= at);
    let (from, states) = match last {
        Some((step, set)) => (step + 1, set.states.iter().map(|s| (s.cell, usize::from(s.slice))).collect()),
        None => (start, (0..steps[at].travel.len()).map(|slice| (area, slice)).collect::<Vec<_>>()),
    };
    states
        .into_iter()
        .map(|(cell, slice)| {
            let mut travel = [0.0; 16];
            for step in &steps[from..=at] {
                add_reaches(&mut travel, &step.travel[slice]);
            }
            cell.minkowski_sum(&travel)
        })
        .collect()
}

/// `composed_share` scales the bounds of the composed run only; 1 is the real thing.
fn run_scene(number: u64, draws: u64, composed_share: f64, tally: &mut Tally) {
    let mut random = RandomScene::new(number);
    random.scatter_m = 0.0;
    random.bounds.sonar.detection_chance = 1.0;
    let solver = random.solver();
    let start_m = 0.25 * random.plan.length_m;
    let composed_bounds = scaled(random.bounds, composed_share);
    let composed = ComposedRun::new(&random.scene(), &random.plan, &[start_m], &composed_bounds);
    let mut sets: Vec<(f64, Vec<Cell>)> = Vec::new();
    let outcome = composed.solve(&solver, start_m, |along_m, set| {
        sets.push((along_m, set.states.iter().map(|state| state.cell).collect()));
    });
    tally.scenes += 1;
    if outcome.certain_sightings == 0 {
        return;
    }
    tally.guaranteed += usize::from(outcome.fix_m.is_some());
    let mut marks = vec![start_m];
    marks.extend(sets.iter().map(|(along_m, _)| *along_m));
    for draw in 0..draws {
        let shape = [ErrorShape::Uniform, ErrorShape::Corners, ErrorShape::Steady][(draw % 3) as usize];
        let errors = DrawnErrors::new(number, "guarantee", draw, shape);
        let dive = simulate(&random.scene(), &random.plan, &marks, &errors);
        let steps = steps(&dive.log, &random.bounds);
        let marked: Vec<usize> = (0..steps.len()).filter(|&i| steps[i].sighting.is_none()).collect();
        let start = marked[0] + 1;
        let mut seen: Vec<(usize, Feasible)> = Vec::new();
        let run = solver.run(&steps[start..], |summary, set| seen.push((start + summary.step, set.clone())));
        if run.is_undecided {
            continue;
        }
        tally.dives += 1;
        for ((_, w), &mark) in sets.iter().zip(&marked[1..]) {
            for cell in set_at(&seen, &steps, start, mark, solver.search_area) {
                tally.cells += 1;
                tally.outside += usize::from(!w.iter().any(|other| other.contains_cell(&cell)));
            }
        }
        if let Some(guaranteed_m) = outcome.fix_m {
            tally.fixes += 1;
            let fix_m = run.first_fix_along_m(random.fix_size_m).map(|along_m| along_m - start_m);
            tally.late += usize::from(fix_m.is_none_or(|fix_m| fix_m > guaranteed_m));
        }
    }
}

fn run_until(dives: usize, composed_share: f64) -> Tally {
    let mut tally = Tally::default();
    let mut number = 0;
    while tally.dives < dives {
        run_scene(number, 12, composed_share, &mut tally);
        number += 1;
    }
    tally
}

#[test]
fn every_feasible_set_lies_in_the_composed_set() {
    let tally = run_until(20_000, 1.0);
    println!("{tally:?}");
    assert_eq!((tally.outside, tally.late), (0, 0), "{tally:?}");
    assert!(tally.fixes > 1000 && tally.cells > 100_000, "too little to mean much: {tally:?}");
}

#[test]
#[ignore = "a million dives take long; run by hand with --ignored"]
fn every_feasible_set_lies_in_the_composed_set_in_a_million_dives() {
    let tally = run_until(1_000_000, 1.0);
    println!("{tally:?}");
    assert_eq!((tally.outside, tally.late), (0, 0), "{tally:?}");
}

/// Proof that the checks above can fail: half of the bounds, that is errors that are not composed, must not do.
#[test]
fn bounds_that_are_not_composed_do_not_hold_the_sets() {
    let tally = run_until(1500, 0.5);
    println!("{tally:?}");
    assert!(tally.outside > 0 && tally.late > 0, "{tally:?}");
}
