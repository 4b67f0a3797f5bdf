//! The guaranteed fix distance of every segment start of a line.
//!
//! One composed run ([`crate::locate::ComposedRun`]) per start and per offset track; the worst is reported. Nothing here
//! is drawn at random, and nothing is mixed with what the simulated dives estimate.

use std::f64::consts::TAU;

use rayon::prelude::*;

use super::Setup;
use crate::interval::larger;
use crate::locate::{ComposedOutcome, ComposedRun};
use crate::report::{
    Cause, GUARANTEE_STATEMENT, GuaranteeTerms, GuaranteedFix, GuaranteedLine, SegmentReport,
};
use crate::track::plan::Plan;

/// Tracks at the rim of the descent scatter, beside the planned one.
const RIM_TRACKS: usize = 6;

/// With fewer certain detections than this, look-alikes are put down to too few landmarks: two ranges and bearings are one
/// constellation that is likely to occur twice.
pub(super) const FEW_DETECTIONS: usize = 3;

/// The tracks that stand for the descent scatter.
fn offset_tracks(setup: &Setup<'_>, plan: &Plan) -> Vec<Plan> {
    let scatter_m = setup.dive.start.scatter_on_map_m();
    let mut tracks = vec![plan.clone()];
    if scatter_m > 0.0 {
        tracks.extend((0..RIM_TRACKS).map(|k| {
            let bearing = TAU * k as f64 / RIM_TRACKS as f64;
            plan.moved(scatter_m * libm::sin(bearing), scatter_m * libm::cos(bearing))
        }));
    }
    tracks
}

/// What the guaranteed figures of a report are true for.
pub(super) fn terms(setup: &Setup<'_>) -> GuaranteeTerms {
    let scatter_m = setup.dive.start.scatter_on_map_m();
    let (offset_tracks, offset_pattern) = if scatter_m > 0.0 {
        let pattern = format!(
            "the planned track and {RIM_TRACKS} copies moved by {scatter_m} m, every {:.0} degrees from north",
            360.0 / RIM_TRACKS as f64
        );
        (1 + RIM_TRACKS, pattern)
    } else {
        (1, "the planned track (no descent scatter)".to_owned())
    };
    GuaranteeTerms { offset_tracks, offset_pattern, statement: GUARANTEE_STATEMENT }
}

/// The guaranteed fix of each start along `plan`.
pub(super) fn guaranteed_fixes(setup: &Setup<'_>, plan: &Plan, starts_m: &[f64]) -> Vec<GuaranteedFix> {
    let budget = setup.dive.budget;
    if !setup.dive.is_detection_certain() && budget.misses == 0 {
        let reason = format!(
            "detection chance {}, chance {} that a landmark is gone, and a miss budget of 0: no landmark is certain to be \
             detected (set budget.misses)",
            setup.dive.sonar.detection_chance, setup.dive.gone_chance
        );
        return vec![without(Cause::DetectionNotCertain, reason, 0); starts_m.len()];
    }
    let (scene, bounds) = (setup.scene(), setup.bounds());
    let solver = setup.solver();
    let runs: Vec<ComposedRun> = offset_tracks(setup, plan)
        .par_iter()
        .map(|track| ComposedRun::new(&scene, track, starts_m, &bounds))
        .collect();
    starts_m
        .par_iter()
        .map(|&start_m| {
            let mut outcomes: Vec<ComposedOutcome> = Vec::with_capacity(runs.len());
            for run in &runs {
                outcomes.push(run.solve(&solver, budget.misses, start_m, |_, _| {}));
                // The first track without a fix is the answer; the others cannot change it.
                if outcomes.last().is_some_and(|outcome| outcome.fix_m.is_none()) {
                    break;
                }
            }
            worst(&outcomes, setup.dive.scoring.fix_size_m)
        })
        .collect()
}

/// The worst outcome over the offset tracks.
fn worst(outcomes: &[ComposedOutcome], fix_size_m: f64) -> GuaranteedFix {
    if let Some(failing) = outcomes.iter().find(|outcome| outcome.fix_m.is_none()) {
        let (cause, reason) = why_not(failing, fix_size_m);
        return without(cause, reason, failing.certain_sightings);
    }
    let furthest = |of: fn(&ComposedOutcome) -> Option<f64>| {
        outcomes.iter().map(of).try_fold(0.0, |furthest, x| x.map(|x| larger(furthest, x)))
    };
    GuaranteedFix {
        distance_m: furthest(|outcome| outcome.fix_m),
        lasting_m: furthest(|outcome| outcome.lasting_m),
        certain_detections: outcomes.iter().map(|outcome| outcome.certain_sightings).min().unwrap_or(0),
        cause: None,
        reason: None,
    }
}

fn without(cause: Cause, reason: String, certain_detections: usize) -> GuaranteedFix {
    GuaranteedFix {
        distance_m: None,
        lasting_m: None,
        certain_detections,
        cause: Some(cause),
        reason: Some(reason),
    }
}

fn why_not(outcome: &ComposedOutcome, fix_size_m: f64) -> (Cause, String) {
    let certain = outcome.certain_sightings;
    if outcome.is_undecided {
        return (Cause::Undecided, "the cell budget ran out (scoring.cell_budget)".to_owned());
    }
    match (outcome.places, outcome.spread_m) {
        (Some(places), _) if places > 1 && certain < FEW_DETECTIONS => (
            Cause::TooFewLandmarks,
            format!("only {certain} certain detections before the line ends; {places} places still fit"),
        ),
        (Some(places), _) if places > 1 => {
            (Cause::LookAlikes, format!("{places} places still fit after {certain} certain detections"))
        }
        (Some(_), Some(spread_m)) => (
            Cause::TooWide,
            format!(
                "one place fits, but it is {spread_m:.1} m wide, more than the fix size of {fix_size_m} m"
            ),
        ),
        _ => {
            (Cause::TooFewLandmarks, "no landmark is certain to be detected before the line ends".to_owned())
        }
    }
}

/// Sums the segments of a line up.
pub(super) fn over_line(segments: &[SegmentReport], required_m: f64) -> Option<GuaranteedLine> {
    let scored: Vec<(f64, Option<f64>)> = segments
        .iter()
        .filter_map(|segment| {
            let fix = segment.guaranteed.as_ref()?;
            Some((segment.end_m - segment.start_m, fix.distance_m))
        })
        .collect();
    if scored.is_empty() {
        return None;
    }
    let length = |keep: &dyn Fn(Option<f64>) -> bool| {
        scored.iter().filter(|(_, fix)| keep(*fix)).fold(0.0, |sum, (length, _)| sum + length)
    };
    let total = length(&|_| true);
    Some(GuaranteedLine {
        within_required_share: length(&|fix| fix.is_some_and(|m| m <= required_m)) / total,
        no_fix_share: length(&|fix| fix.is_none()) / total,
        longest_m: scored.iter().filter_map(|(_, fix)| *fix).max_by(f64::total_cmp),
    })
}
