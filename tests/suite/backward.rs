//! Sweeps over a recorded history never lose the truth, only ever shrink, and name the right landmarks.

use fixability::detect::{DrawnErrors, SimulatedDive, simulate};
use fixability::locate::{Bounds, History, SWEEPS_MAX, Solver, State, Step, steps};

use crate::support::scenes::{RandomScene, strays_from};

/// What a batch of dives showed.
#[derive(Debug, Default)]
struct Tally {
    dives: usize,
    undecided: usize,
    contradicted: usize,
    /// Positions checked: every detection and the start, after every sweep.
    positions: usize,
    lost: usize,
    /// Cells that stick out of the same state's cell before the sweep, or that stem from nothing.
    grown: usize,
    detections: usize,
    /// Detections whose true landmark (or stray) is not among the candidates.
    misnamed: usize,
    identified: usize,
    /// Detections explained by one landmark or as a stray.
    sole: usize,
    possibly_stray: usize,
    certainly_stray: usize,
    /// Sweeps until rest, by number.
    sweeps: [usize; SWEEPS_MAX + 1],
    at_limit: usize,
    /// Sum of the spreads before and after the sweeps, metres.
    spread_before_m: f64,
    spread_after_m: f64,
    /// Places at detections before and after the sweeps.
    places_before: usize,
    places_after: usize,
}

/// One dive to be solved and what is known of it.
struct Case<'a> {
    solver: Solver<'a>,
    steps: &'a [Step],
    dive: &'a SimulatedDive,
    start: usize,
}

impl Case<'_> {
    fn check(&self, tally: &mut Tally) {
        let (solver, dive) = (&self.solver, self.dive);
        let (outcome, mut history) = solver.run_recorded(&self.steps[self.start + 1..], |_, _| {});
        let plain = solver.run(&self.steps[self.start + 1..], |_, _| {});
        assert_eq!(outcome, plain, "recording must not change the answer");
        tally.dives += 1;
        tally.undecided += usize::from(outcome.is_undecided);
        if outcome.contradiction().is_some() {
            tally.contradicted += 1;
            return;
        }
        // Position in the log of each level of the history.
        let mut at = vec![self.start];
        at.extend(outcome.events.iter().map(|event| self.start + 1 + event.step));
        assert_eq!(history.detections() + 1, at.len());
        let measure = |history: &History, tally: &mut Tally, is_after: bool| {
            for detection in 1..at.len() {
                let set = history.set(detection);
                let (spread_m, places) = (set.spread_m().unwrap_or(0.0), set.places(solver.fix_size_m));
                if is_after {
                    tally.spread_after_m += spread_m;
                    tally.places_after += places;
                } else {
                    tally.spread_before_m += spread_m;
                    tally.places_before += places;
                }
            }
        };
        measure(&history, tally, false);
        let states = |history: &History| -> Vec<Vec<Option<State>>> {
            (0..at.len()).map(|detection| history.states(detection).to_vec()).collect()
        };
        let mut before = states(&history);
        let swept = history.sweep(solver.map, |history| {
            let now = states(history);
            for ((old, new), &event) in before.iter().zip(&now).zip(&at) {
                tally.positions += 1;
                let truth = dive.truth[event].position;
                tally.lost += usize::from(!new.iter().flatten().any(|state| state.cell.contains(truth)));
                for (number, new) in new.iter().enumerate() {
                    let Some(new) = new else { continue };
                    let holds = |old: &State| {
                        (old.slice, old.strays) == (new.slice, new.strays)
                            && old.cell.contains_cell(&new.cell)
                    };
                    let is_held = match old.get(number) {
                        Some(old) => old.as_ref().is_some_and(holds),
                        // Part of a state that was split.
                        None => old.iter().flatten().any(holds),
                    };
                    tally.grown += usize::from(!is_held);
                }
            }
            before = now;
        });
        tally.sweeps[swept.count] += 1;
        tally.at_limit += usize::from(!swept.is_at_rest);
        measure(&history, tally, true);
        for (detection, &event) in at.iter().enumerate().skip(1) {
            let candidates = history.candidates(detection);
            let is_named = match dive.truth[event].landmark {
                Some(landmark) => candidates.landmarks.contains(&landmark),
                None => candidates.may_be_stray,
            };
            tally.detections += 1;
            tally.misnamed += usize::from(!is_named);
            tally.identified += usize::from(candidates.identified().is_some());
            tally.sole += usize::from(candidates.sole_landmark().is_some());
            tally.possibly_stray += usize::from(candidates.may_be_stray);
            tally.certainly_stray += usize::from(candidates.is_stray());
        }
    }
}

fn run_until(dives: usize, stray_budget: u8, strays_per_km: f64, distort: impl Fn(&mut Bounds)) -> Tally {
    let mut tally = Tally::default();
    let mut number = 0;
    while tally.dives < dives {
        let mut random = RandomScene::new(number);
        random.bounds.sonar.strays_per_km = strays_per_km;
        let mut bounds = random.bounds;
        distort(&mut bounds);
        let solver = Solver { stray_budget, ..random.solver() };
        for draw in 0..4 {
            let errors = DrawnErrors::new(number, "backward", draw, random.shape);
            let from_m = [0.0, 0.3, 0.6, 0.1][draw as usize] * random.plan.length_m;
            let dive = simulate(&random.scene(), &random.plan, &[from_m], &errors);
            let start = dive.log.events.iter().position(|event| event.sighting.is_none()).expect("a mark");
            // More strays than one are outside every budget here.
            if strays_from(&dive, start) > 1 {
                continue;
            }
            let steps = steps(&dive.log, &bounds);
            if start + 1 == steps.len() {
                continue;
            }
            Case { solver, steps: &steps, dive: &dive, start }.check(&mut tally);
        }
        number += 1;
    }
    tally
}

#[test]
fn sweeps_keep_the_truth_shrink_and_name_the_landmark() {
    let tally = run_until(3000, 0, 0.0, |_| {});
    println!("{tally:?}");
    assert_eq!((tally.lost, tally.grown, tally.misnamed, tally.contradicted), (0, 0, 0, 0), "{tally:?}");
    assert_eq!(tally.possibly_stray, 0, "without a stray budget nothing is left unexplained: {tally:?}");
    assert_eq!(tally.at_limit, 0, "the sweeps come to rest: {tally:?}");
    // The sweeps must be worth having, and the checks must have seen much.
    assert!(tally.places_after * 2 < tally.places_before, "{tally:?}");
    assert!(tally.identified * 2 > tally.detections && tally.positions > 50_000, "{tally:?}");
}

#[test]
fn sweeps_keep_the_truth_with_a_stray_to_spare() {
    let tally = run_until(1000, 1, 0.0, |_| {});
    println!("{tally:?}");
    assert_eq!((tally.lost, tally.grown, tally.misnamed, tally.contradicted), (0, 0, 0, 0), "{tally:?}");
    // A stray that was not used up may be any of the detections.
    assert!(tally.possibly_stray == tally.detections && tally.sole * 4 > tally.detections, "{tally:?}");
}

#[test]
fn sweeps_keep_the_truth_with_a_stray() {
    let tally = run_until(1000, 1, 1.0, |_| {});
    println!("{tally:?}");
    assert_eq!((tally.lost, tally.grown, tally.misnamed, tally.contradicted), (0, 0, 0, 0), "{tally:?}");
    assert!(tally.certainly_stray > 0, "some strays are known as such: {tally:?}");
}

/// Proof that the checks above can fail: tighter bounds than the dives keep lose the truth, and a stray without a
/// budget is named wrongly or contradicts the map.
#[test]
fn broken_bounds_show() {
    type Distort = fn(&mut Bounds);
    let broken: [(&str, Distort); 3] = [
        ("range", |b| {
            b.sonar.range_error_m *= 0.5;
            b.sonar.range_error_fraction *= 0.5;
        }),
        ("heading", |b| {
            b.dead_reckoning.heading_bias_rad *= 0.5;
            b.dead_reckoning.heading_noise_rad *= 0.5;
        }),
        ("scale", |b| b.dead_reckoning.scale_error = 0.0),
    ];
    let mut misnamed = 0;
    for (what, distort) in broken {
        let tally = run_until(600, 0, 0.0, distort);
        println!("{what}: {tally:?}");
        assert!(tally.lost > 0, "tighter {what} bounds must show: {tally:?}");
        misnamed += tally.misnamed;
    }
    assert!(misnamed > 0, "tighter bounds must rule out the true landmark somewhere");
    let tally = run_until(600, 0, 1.0, |_| {});
    assert!(tally.misnamed > 0 && tally.contradicted > 0, "a stray without a budget must show: {tally:?}");
}
