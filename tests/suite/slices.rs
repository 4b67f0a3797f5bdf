//! How many slices of the heading bias are worth their time, and headings that are not known at all.
//!
//! Random fields at 100 landmarks per km² with a straight line through them (see `open_field`), errors at random, at
//! their bounds and steady.

use std::f64::consts::PI;
use std::time::{Duration, Instant};

use fixability::detect::{DrawnErrors, simulate};
use fixability::dive::ErrorShape;
use fixability::locate::{ComposedRun, Solver, steps};

use crate::support::scenes::{RandomScene, open_field};

/// Starts of a run, as shares of the line.
const STARTS: [f64; 3] = [0.0, 0.2, 0.4];

/// What a number of slices gives.
#[derive(Debug, Default)]
struct Tally {
    dives: usize,
    events: usize,
    lost: usize,
    undecided: usize,
    fixes: usize,
    /// Metres run to the fix, or to the end of the line without one.
    run_m: f64,
    cells: usize,
    time: Duration,
    /// Starts with a guaranteed fix, and metres as above.
    guaranteed: usize,
    guaranteed_run_m: f64,
    guaranteed_time: Duration,
}

fn field(number: usize, bias_rad: f64, slices: usize) -> RandomScene {
    let mut scene = open_field(400 + 7 * number);
    scene.bounds.dead_reckoning.heading_bias_rad = bias_rad;
    scene.bounds.heading_slices = slices;
    scene
}

fn run(fields: usize, draws: u64, bias_rad: f64, slices: usize, with_guarantee: bool) -> Tally {
    let mut tally = Tally::default();
    for number in 0..fields {
        let scene = field(number, bias_rad, slices);
        let solver = Solver { cell_budget: 1_000_000, ..scene.solver() };
        let starts: Vec<f64> = STARTS.iter().map(|share| share * scene.plan.length_m).collect();
        for draw in 0..draws {
            let shape = [ErrorShape::Uniform, ErrorShape::Corners, ErrorShape::Steady][(draw % 3) as usize];
            let errors = DrawnErrors::new(number as u64, "slices", draw, shape);
            let dive = simulate(&scene.scene(), &scene.plan, &starts, &errors);
            let steps = steps(&dive.log, &scene.bounds);
            let marked = (0..steps.len()).filter(|&i| steps[i].sighting.is_none());
            for (mark, &start_m) in marked.zip(&starts) {
                let first = mark + 1;
                let clock = Instant::now();
                let outcome = solver.run(&steps[first..], |event, set| {
                    tally.events += 1;
                    tally.cells += event.cells;
                    tally.lost += usize::from(!set.contains(dive.truth[first + event.step].position));
                });
                tally.time += clock.elapsed();
                tally.dives += 1;
                tally.undecided += usize::from(outcome.is_undecided);
                let fix_m = outcome.first_fix_along_m(scene.fix_size_m);
                tally.fixes += usize::from(fix_m.is_some());
                tally.run_m += fix_m.unwrap_or(scene.plan.length_m) - start_m;
            }
        }
        if with_guarantee {
            let clock = Instant::now();
            let composed = ComposedRun::new(&scene.scene(), &scene.plan, &starts, &scene.bounds);
            for &start_m in &starts {
                let outcome = composed.solve(&solver, 0, start_m, |_, _| {});
                tally.guaranteed += usize::from(outcome.fix_m.is_some());
                tally.guaranteed_run_m += outcome.fix_m.unwrap_or(scene.plan.length_m - start_m);
            }
            tally.guaranteed_time += clock.elapsed();
        }
    }
    tally
}

/// Number of equal slices of ±`bias_rad` that are at most `width_deg` wide.
fn slices_of_width(bias_rad: f64, width_deg: f64) -> usize {
    (2.0 * bias_rad.to_degrees() / width_deg - 1e-9).ceil().max(1.0) as usize
}

#[test]
fn slices_shorten_the_way_to_a_fix() {
    for (bias_deg, worth_m) in [(0.7f64, 0.0), (3.0, 3.0)] {
        let bias_rad = bias_deg.to_radians();
        let whole = run(8, 6, bias_rad, 1, true);
        let cut = run(8, 6, bias_rad, slices_of_width(bias_rad, 1.0), true);
        assert_eq!((whole.lost, cut.lost, whole.undecided, cut.undecided), (0, 0, 0, 0));
        let gain_m = (whole.run_m - cut.run_m) / whole.dives as f64;
        let guaranteed_gain_m = (whole.guaranteed_run_m - cut.guaranteed_run_m) / 24.0;
        println!(
            "bias {bias_deg} deg: slices of 1 deg gain {gain_m:.1} m, {guaranteed_gain_m:.1} m guaranteed"
        );
        assert!(gain_m >= worth_m && guaranteed_gain_m >= worth_m, "{whole:?} {cut:?}");
    }
}

#[test]
fn an_unknown_heading_is_slices_around_the_whole_circle() {
    let mut before_m = f64::INFINITY;
    for slices in [72, 180] {
        let tally = run(2, 3, PI, slices, false);
        println!("heading unknown, {slices} slices: {tally:?}");
        assert_eq!((tally.lost, tally.undecided), (0, 0));
        assert!(tally.events > 150 && tally.fixes * 4 > tally.dives * 3, "{tally:?}");
        assert!(tally.run_m < before_m, "narrower slices fix sooner");
        before_m = tally.run_m;
    }
}

/// Proof that the check above can fail: a half circle of biases loses the truth of dives that err by more.
#[test]
fn half_a_circle_of_headings_loses_the_truth() {
    let scene = field(0, PI, 72);
    let mut bounds = scene.bounds;
    bounds.dead_reckoning.heading_bias_rad = 0.5 * PI;
    let mut lost = 0;
    for draw in 0..12 {
        let errors = DrawnErrors::new(0, "slices", draw, ErrorShape::Uniform);
        let dive = simulate(&scene.scene(), &scene.plan, &[], &errors);
        scene.solver().run(&steps(&dive.log, &bounds), |event, set| {
            lost += usize::from(!set.contains(dive.truth[event.step].position));
        });
    }
    assert!(lost > 0);
}

#[test]
#[ignore = "a table of measurements; run by hand with --ignored --nocapture"]
fn table_of_slices() {
    for bias_deg in [0.7f64, 3.0, 180.0] {
        let bias_rad = if bias_deg == 180.0 { PI } else { bias_deg.to_radians() };
        let is_unknown = bias_deg == 180.0;
        let counts: &[usize] =
            if is_unknown { &[36, 72, 120, 180, 360, 720] } else { &[1, 2, 3, 4, 6, 8, 12, 24] };
        for &slices in counts {
            let (fields, draws) = if is_unknown { (4, 3) } else { (40, 6) };
            let t = run(fields, draws, bias_rad, slices, !is_unknown);
            let share = |x: f64| x / t.dives as f64;
            let starts = (fields * STARTS.len()) as f64;
            println!(
                "bias {bias_deg} deg, {slices} slices of {:.2} deg: mean run to fix {:.1} m, {} of {} fix, {:.0} cells per \
                 event, {:.2} ms per solve, {} undecided, {} lost; guaranteed: {} of {starts}, mean run {:.1} m, {:.2} ms per start",
                2.0 * bias_deg / slices as f64,
                share(t.run_m),
                t.fixes,
                t.dives,
                t.cells as f64 / t.events as f64,
                share(t.time.as_secs_f64() * 1e3),
                t.undecided,
                t.lost,
                t.guaranteed,
                t.guaranteed_run_m / starts,
                t.guaranteed_time.as_secs_f64() * 1e3 / starts,
            );
        }
    }
}
