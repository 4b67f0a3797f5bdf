//! The score of a line from its simulated dives.

use super::ensemble::{Run, run_line};
use super::guarantee::{guaranteed_fixes, over_line, terms};
use super::statistics::{at_rank_of_share, percentile, share, sort_missing_last};
use super::{Setup, rank};
use crate::detect::expected_detections;
use crate::report::{EstimatedFix, LineReport, LinesReport, ProfilePoint, SegmentReport};
use crate::track::Line;
use crate::track::plan::Plan;

/// Scores and ranks every line of the dive. `tick` is called once per simulated dive.
pub fn score_lines(setup: &Setup<'_>, tick: &(dyn Fn() + Sync)) -> LinesReport {
    let rank_by = setup.dive.scoring.rank_by;
    let mut lines: Vec<LineReport> =
        setup.dive.lines.iter().map(|line| score_line(setup, line, tick)).collect();
    rank::rank(&mut lines, rank_by);
    LinesReport {
        provenance: setup.provenance("fixability.lines"),
        parameters: setup.parameters(),
        rank_by,
        guarantee: Some(terms(setup)),
        lines,
        landmarks: setup.chart_landmarks(),
    }
}

fn score_line(setup: &Setup<'_>, line: &Line, tick: &(dyn Fn() + Sync)) -> LineReport {
    let plan = Plan::new(line, setup.dive.vehicle.turn_radius_m);
    let starts_m = setup.segment_starts(plan.length_m);
    let detections = expected_detections(&setup.scene(), &plan);
    let draws = run_line(setup, &line.name, &plan, &starts_m, tick);
    let mut guaranteed = guaranteed_fixes(setup, &plan, &starts_m).into_iter();
    let estimate = |runs: &[&Run]| estimated(runs, setup);
    let segments: Vec<SegmentReport> = starts_m
        .iter()
        .enumerate()
        .map(|(k, &start_m)| {
            let end_m = starts_m.get(k + 1).copied().unwrap_or(plan.length_m);
            let runs: Vec<&Run> = draws.iter().map(|runs| &runs[k]).collect();
            SegmentReport {
                number: k + 1,
                start_m,
                end_m,
                path: plan.path(start_m, end_m),
                detections_ahead: detections.iter().filter(|&&along_m| along_m >= start_m).count(),
                estimated: estimate(&runs),
                guaranteed: guaranteed.next(),
                look_alikes: Vec::new(),
                remap_regions: Vec::new(),
            }
        })
        .collect();
    let all: Vec<&Run> = draws.iter().flatten().collect();
    let required_m = setup.dive.scoring.required_fix_m;
    let passing =
        segments.iter().filter(|s| s.estimated.p95_m.value.is_some_and(|p95| p95 <= required_m)).count();
    LineReport {
        name: line.name.clone(),
        rank: 0,
        length_m: plan.length_m,
        detections_expected: detections.len(),
        blind_turn_m: setup.blind_turn_m(&plan),
        waypoints: line.waypoints.clone(),
        estimated: estimate(&all),
        guaranteed: over_line(&segments, required_m),
        segments_p95_within_share: passing as f64 / segments.len() as f64,
        profile: profile(&draws, &starts_m, plan.length_m, setup.dive.scoring.segment_m),
        segments,
    }
}

/// Statistics of runs that all come from the dive's number of draws.
fn estimated(runs: &[&Run], setup: &Setup<'_>) -> EstimatedFix {
    let scoring = &setup.dive.scoring;
    let dives = scoring.draws;
    let mut fixes: Vec<Option<f64>> = runs.iter().map(|run| run.fix_m).collect();
    sort_missing_last(&mut fixes);
    let within = fixes.iter().flatten().filter(|&&fix_m| fix_m <= scoring.required_fix_m).count();
    let without = fixes.iter().filter(|fix_m| fix_m.is_none()).count();
    let mut lasting: Vec<Option<f64>> = runs.iter().map(|run| run.lasting_m).collect();
    sort_missing_last(&mut lasting);
    let share_of = |is: fn(&Run) -> bool| {
        let count = runs.iter().filter(|run| is(run)).count();
        count as f64 / (runs.len() as f64).clamp(1.0, f64::INFINITY)
    };
    EstimatedFix {
        dives,
        median_m: percentile(&fixes, 0.5, dives),
        p95_m: percentile(&fixes, 0.95, dives),
        within_required_share: share(within, runs.len(), dives),
        no_fix_share: share(without, runs.len(), dives),
        lasting_median_m: percentile(&lasting, 0.5, dives),
        lasting_p95_m: percentile(&lasting, 0.95, dives),
        relapse_share: share_of(|run| run.has_relapse),
        contradiction_share: share_of(|run| run.is_contradictory),
        wrong_fix_share: share_of(|run| run.is_wrong),
        undecided_share: share_of(|run| run.is_undecided),
    }
}

/// Ambiguity at multiples of `step_m` metres run, over all runs that still have line ahead of them.
fn profile(draws: &[Vec<Run>], starts_m: &[f64], length_m: f64, step_m: f64) -> Vec<ProfilePoint> {
    let count = (length_m / step_m).floor() as usize;
    (1..=count)
        .map(|k| {
            let run_m = k as f64 * step_m;
            let (mut places, mut spreads, mut fixed, mut runs) = (Vec::new(), Vec::new(), 0usize, 0usize);
            for draw in draws {
                for (run, start_m) in draw.iter().zip(starts_m) {
                    if start_m + run_m > length_m {
                        continue;
                    }
                    runs += 1;
                    fixed += usize::from(run.fix_m.is_some_and(|fix_m| fix_m <= run_m));
                    let seen = run.curve.partition_point(|(at_m, ..)| *at_m <= run_m);
                    // Before the first detection the vehicle may be anywhere: later than every number.
                    let last = seen.checked_sub(1).map(|i| run.curve[i]);
                    places.push(last.map(|(_, places, _)| places as f64));
                    spreads.push(last.map(|(.., spread)| spread));
                }
            }
            sort_missing_last(&mut places);
            sort_missing_last(&mut spreads);
            ProfilePoint {
                run_m,
                dives: runs,
                places_median: at_rank_of_share(&places, 0.5),
                places_p95: at_rank_of_share(&places, 0.95),
                spread_median_m: at_rank_of_share(&spreads, 0.5),
                spread_p95_m: at_rank_of_share(&spreads, 0.95),
                fixed_share: fixed as f64 / runs as f64,
            }
        })
        .collect()
}
