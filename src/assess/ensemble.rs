//! Many simulated dives of one line, each solved from every segment start.

use rayon::prelude::*;

use super::Setup;
use crate::detect::{DrawnErrors, simulate};
use crate::locate::{FixWatch, steps};
use crate::track::plan::Plan;

/// The run from one segment start in one simulated dive.
#[derive(Clone, Debug, Default)]
pub(super) struct Run {
    /// Metres run until the first fix.
    pub fix_m: Option<f64>,
    /// Metres run until the fix that lasts to the end of the line.
    pub lasting_m: Option<f64>,
    /// Whether a fix was lost again.
    pub has_relapse: bool,
    /// Whether no position explained the log at some event (only beyond the stray budget). Such a run has no fix.
    pub is_contradictory: bool,
    /// Whether the first fix does not hold the true position (only beyond the stray budget).
    pub is_wrong: bool,
    /// Whether the solver ran out of its cell budget before a fix.
    pub is_undecided: bool,
    /// After each detection: metres run, number of places, spread.
    pub curve: Vec<(f64, usize, f64)>,
}

/// Runs of one line: `[draw][segment]`.
///
/// Parallel over draws, collected in order; each draw derives its own errors, so the result does not depend on the
/// number of threads. `tick` is called once per finished draw.
pub(super) fn run_line(
    setup: &Setup<'_>,
    name: &str,
    plan: &Plan,
    starts_m: &[f64],
    tick: &(dyn Fn() + Sync),
) -> Vec<Vec<Run>> {
    let (scene, solver, bounds) = (setup.scene(), setup.solver(), setup.bounds());
    let scoring = &setup.dive.scoring;
    (0..scoring.draws)
        .into_par_iter()
        .map(|draw| {
            let errors = DrawnErrors::new(scoring.seed, name, draw as u64, setup.shape_of(draw));
            // The end of the line is a mark too, so that a fix is known to last until there.
            let marked: Vec<f64> = starts_m.iter().copied().chain([plan.length_m]).collect();
            let dive = simulate(&scene, plan, &marked, &errors);
            let steps = steps(&dive.log, &bounds);
            let marks = (0..steps.len()).filter(|&i| steps[i].sighting.is_none());
            let runs = marks
                .zip(starts_m)
                .map(|(mark, &start_m)| {
                    let ahead = &steps[mark + 1..];
                    let mut watch = FixWatch::new(ahead, scoring.fix_size_m);
                    let mut is_wrong = false;
                    let outcome = solver.run(ahead, |event, set| {
                        let is_first_fix = watch.see(event.step, set, event.spread_m);
                        let truth = dive.truth[mark + 1 + event.step].position;
                        is_wrong |= is_first_fix && !set.contains(truth);
                    });
                    let is_contradictory = outcome.contradiction().is_some();
                    let history = watch.finish(!outcome.is_undecided && !is_contradictory);
                    // An empty set is never a fix, and neither is what came before it: the bounds did not hold.
                    let fix_m =
                        history.first_along_m.filter(|_| !is_contradictory).map(|along| along - start_m);
                    Run {
                        fix_m,
                        lasting_m: history.lasting_along_m.map(|along| along - start_m),
                        has_relapse: history.relapses > 0,
                        is_contradictory,
                        is_wrong: is_wrong && !is_contradictory,
                        is_undecided: outcome.is_undecided && fix_m.is_none(),
                        curve: outcome
                            .events
                            .iter()
                            .filter_map(|e| e.spread_m.map(|spread| (e.along_m - start_m, e.places, spread)))
                            .collect(),
                    }
                })
                .collect();
            tick();
            runs
        })
        .collect()
}
