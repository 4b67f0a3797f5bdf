//! Why a cell fails: the map is run again over the failing cells with one thing changed at a time.

use rayon::prelude::*;

use super::Run;
use crate::assess::Setup;
use crate::assess::guarantee::FEW_DETECTIONS;
use crate::dive::Dive;
use crate::interval::{larger, smaller};
use crate::locate::certain_landmarks;
use crate::report::{Cause, RemapCause, RunOutcome};
use crate::track::plan::Plan;
use crate::vehicle::DeadReckoning;

/// The headings of one cell, counted.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(super) struct Tally {
    /// Headings run.
    pub headings: usize,
    /// With a guaranteed fix within the required distance.
    pub within: usize,
    /// On which the cell budget ran out.
    pub undecided: usize,
    /// Without a fix, several places left.
    pub several_places: usize,
    /// Without certain detection.
    pub not_certain: usize,
}

impl Tally {
    pub(super) fn of(runs: &[RunOutcome], required_m: f64) -> Self {
        let count = |cause: Cause| runs.iter().filter(|run| run.cause() == Some(cause)).count();
        Self {
            headings: runs.len(),
            within: runs.iter().filter(|run| run.fix_m().is_some_and(|m| m <= required_m)).count(),
            undecided: count(Cause::Undecided),
            several_places: count(Cause::LookAlikes) + count(Cause::TooFewLandmarks),
            not_certain: count(Cause::DetectionNotCertain),
        }
    }

    /// Whether `headings` of the headings are enough.
    fn enough(&self, headings: usize, pass_share: f64) -> bool {
        headings as f64 >= pass_share * self.headings as f64
    }

    pub(super) fn passes(&self, pass_share: f64) -> bool {
        self.enough(self.within, pass_share)
    }
}

/// The dive with narrower boxes on the landmarks that `concerned` names: each half-width times `factor`, but no
/// narrower than `floor_m`, and never wider than it is.
pub(super) fn narrowed(dive: &Dive, factor: f64, floor_m: f64, concerned: impl Fn(usize) -> bool) -> Dive {
    let mut dive = dive.clone();
    let narrow = |half_width_m: f64| smaller(half_width_m, larger(floor_m, factor * half_width_m));
    for (number, landmark) in dive.landmarks.iter_mut().enumerate() {
        if concerned(number) {
            landmark.half_width_east_m = narrow(landmark.half_width_east_m);
            landmark.half_width_north_m = narrow(landmark.half_width_north_m);
        }
    }
    dive
}

/// The dive with perfect dead reckoning.
fn with_perfect_dead_reckoning(dive: &Dive) -> Dive {
    let mut dive = dive.clone();
    dive.dead_reckoning =
        DeadReckoning { scale_error: 0.0, heading_bias_rad: 0.0, heading_noise_rad: 0.0, drift_mps: 0.0 };
    dive
}

/// The dive with a sonar without errors; what it reaches stays as it is.
fn with_perfect_sonar(dive: &Dive) -> Dive {
    let mut dive = dive.clone();
    dive.sonar.range_error_m = 0.0;
    dive.sonar.range_error_fraction = 0.0;
    dive.sonar.bearing_error_rad = 0.0;
    dive.sonar.altitude_error_m = 0.0;
    dive
}

/// The cause of each of the failing cells `places`, whose headings are counted in `tallies`, and whether the cell budget
/// ran out on some run.
pub(super) fn causes(run: &Run<'_>, places: &[(usize, usize)], tallies: &[Tally]) -> (Vec<RemapCause>, bool) {
    if tallies.iter().all(|tally| tally.not_certain > 0) {
        return (vec![RemapCause::DetectionNotCertain; places.len()], false);
    }
    let dive = run.setup.dive;
    let options = &dive.remap;
    let tight = narrowed(dive, 0.0, options.resurvey_half_width_m, |_| true);
    let boxes = run.tallies(&tight, places);
    let few = few_landmarks(run, &tight, places);
    let dead_reckoning = run.tallies(&with_perfect_dead_reckoning(dive), places);
    let sonar = run.tallies(&with_perfect_sonar(dive), places);
    let undecided = [tallies, &boxes, &dead_reckoning, &sonar]
        .into_iter()
        .any(|tallies| tallies.iter().any(|tally| tally.undecided > 0));
    let causes = (0..places.len())
        .map(|i| {
            let evidence = Evidence {
                now: tallies[i],
                boxes: boxes[i],
                is_few: few[i],
                dead_reckoning: dead_reckoning[i],
                sonar: sonar[i],
            };
            evidence.cause(options.pass_share)
        })
        .collect();
    (causes, undecided)
}

/// Whether a cell meets too few landmarks: fewer headings than must pass meet enough landmarks that are certain to be
/// detected within the required distance, even with tight boxes.
fn few_landmarks(run: &Run<'_>, tight: &Dive, places: &[(usize, usize)]) -> Vec<bool> {
    let setup = Setup::new(tight);
    let (scene, bounds) = (setup.scene(), setup.bounds());
    // Beyond those that the budgets of strays and misses may take away.
    let enough = FEW_DETECTIONS + usize::from(tight.budget.strays) + usize::from(tight.budget.misses);
    places
        .par_iter()
        .map(|&(column, row)| {
            let centre = run.grid.centre(column, row);
            let rich = run
                .headings_rad
                .iter()
                .filter(|&&heading_rad| {
                    let plan = Plan::straight(centre, heading_rad, run.area.longest_run_m);
                    certain_landmarks(&scene, &plan, &bounds, run.required_m()) >= enough
                })
                .count();
            (rich as f64) < tight.remap.pass_share * run.headings_rad.len() as f64
        })
        .collect()
}

/// What the runs say about one failing cell.
struct Evidence {
    now: Tally,
    boxes: Tally,
    is_few: bool,
    dead_reckoning: Tally,
    sonar: Tally,
}

impl Evidence {
    /// The rule of the module's documentation.
    fn cause(&self, pass_share: f64) -> RemapCause {
        let passes = |tally: &Tally| tally.passes(pass_share);
        if self.now.enough(self.now.within + self.now.undecided, pass_share) {
            return RemapCause::Undecided;
        }
        if passes(&self.boxes) {
            return RemapCause::BoxesTooWide;
        }
        if self.is_few {
            return RemapCause::TooFewLandmarks;
        }
        match (passes(&self.dead_reckoning), passes(&self.sonar)) {
            (true, true) if self.sonar.within > self.dead_reckoning.within => return RemapCause::Sonar,
            (true, _) => return RemapCause::DeadReckoning,
            (_, true) => return RemapCause::Sonar,
            _ => {}
        }
        let failing = self.now.headings - self.now.within;
        if 2 * self.now.several_places >= failing {
            RemapCause::LookAlikeGround
        } else {
            RemapCause::SeveralErrors
        }
    }
}
