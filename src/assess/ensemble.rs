//! Many simulated dives of one line, each solved from every segment start.

use rayon::prelude::*;

use super::Setup;
use crate::detect::{DrawnErrors, simulate};
use crate::locate::steps;
use crate::track::plan::Plan;

/// The run from one segment start in one simulated dive.
#[derive(Clone, Debug, Default)]
pub(super) struct Run {
    /// Metres run until the first fix.
    pub fix_m: Option<f64>,
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
            let dive = simulate(&scene, plan, starts_m, &errors);
            let steps = steps(&dive.log, &bounds);
            let marks = (0..steps.len()).filter(|&i| steps[i].sighting.is_none());
            let runs = marks
                .zip(starts_m)
                .map(|(mark, &start_m)| {
                    let outcome = solver.run(&steps[mark + 1..], |_, _| {});
                    let fix_m = outcome.first_fix_along_m(scoring.fix_size_m).map(|along| along - start_m);
                    Run {
                        fix_m,
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
