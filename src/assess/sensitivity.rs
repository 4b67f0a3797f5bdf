//! Which error is worth improving first?
//!
//! *What is computed.* The guaranteed fix of every segment start of every line, as [`super::score_lines`] computes it, for
//! the bounds as stated, then with one bound multiplied by a factor at a time, then with all of them. No simulated dive.
//!
//! *Never worse.* A dive within the improved bounds is a dive within the stated ones, and a vehicle that counts on smaller
//! bounds, in slices of the heading bias no wider than before, keeps no position that the composed run of the stated
//! bounds does not hold. So the guarantee of the stated bounds stays true after an improvement, and the shorter of the two
//! distances is reported. It is nearly always that of the improved bounds. The exceptions: with a miss budget, a landmark
//! that becomes certain to be detected twice raises the number of detections that may be missing (point 8 of
//! `locate/composed.rs`); with a factor above 1/2 the windows of the heading bias need not lie inside those of before.
//!
//! *Order.* By the gain in the share of the length with a guaranteed fix within the required distance; then by the share
//! of the length that gains a guaranteed fix at all; then by how much sooner the fix is guaranteed where there was one, in
//! the mean over the length. Equal in all three is a tie. (The median is reported and does not decide: most fixes come at the
//! same sighting as before, which smaller boxes and beam errors advance by millimetres, so the median would rank
//! millimetres on most segments before tens of metres on some.)

use std::cmp::Ordering;

use super::Setup;
use super::guarantee::{guaranteed_fixes, terms};
use crate::dive::{Dive, ErrorBound};
use crate::order::smaller;
use crate::report::{
    BoundValue, Cause, GuaranteedChange, GuaranteedFigures, ImprovedBound, SENSITIVITY_STATEMENT,
    SensitivityLine, SensitivityReport, SensitivityVerdict, ZeroBound,
};
use crate::track::plan::Plan;

/// Shares that differ by less are equal: the difference comes from the rounding of sums of lengths.
const EQUAL_SHARE: f64 = 1e-9;
/// Distances that differ by less are equal, metres: no plan depends on less.
const EQUAL_M: f64 = 0.1;

/// Runs of the analysis, for a progress bar: each line once as it is, once per bound, and once with all of them.
pub fn sensitivity_runs(dive: &Dive) -> usize {
    dive.lines.len() * (2 + improvable(dive).len())
}

fn improvable(dive: &Dive) -> Vec<ErrorBound> {
    ErrorBound::ALL.into_iter().filter(|&bound| dive.stated_value(bound) > 0.0).collect()
}

/// One segment: its length and its guaranteed fix distance.
#[derive(Clone, Copy, Debug)]
struct Segment {
    length_m: f64,
    fix_m: Option<f64>,
}

/// The segments of each line, and whether the cell budget ran out on some run.
struct Scored {
    lines: Vec<Vec<Segment>>,
    undecided: bool,
}

/// Improves each error bound by `factor`, one at a time and all together. `tick` is called once per line and set of
/// bounds.
pub fn sensitivity(setup: &Setup<'_>, factor: f64, tick: &(dyn Fn() + Sync)) -> SensitivityReport {
    let dive = setup.dive;
    let required_m = dive.scoring.required_fix_m;
    let present = scored(setup, tick);
    let mut undecided = present.undecided;
    let mut improve = |bounds: &[ErrorBound]| {
        let improved = dive.improved(bounds, factor);
        let mut after = scored(&Setup::new(&improved), tick);
        undecided |= after.undecided;
        never_worse(&present, &mut after);
        (improved, after)
    };
    let mut singles: Vec<(ImprovedBound, Scored)> = improvable(dive)
        .into_iter()
        .map(|bound| {
            let (improved, after) = improve(&[bound]);
            let value = |dive: &Dive| BoundValue {
                stated: dive.stated_value(bound),
                in_force: dive.value_in_force(bound),
            };
            let row = ImprovedBound {
                bound,
                words: bound.words(),
                key: bound.key(),
                unit: bound.unit(),
                rank: None,
                present: value(dive),
                improved: value(&improved),
                change: change(&present.lines.concat(), &after.lines.concat(), required_m),
            };
            (row, after)
        })
        .collect();
    // The sort keeps the order of the dive file among equals.
    singles.sort_by(|a, b| by_gain(&a.0.change, &b.0.change));
    let mut rank = 1;
    for place in 0..singles.len() {
        if place > 0 && by_gain(&singles[place - 1].0.change, &singles[place].0.change).is_ne() {
            rank = place + 1;
        }
        singles[place].0.rank = helps(&singles[place].0.change).then_some(rank);
    }
    let all_bounds: Vec<ErrorBound> = singles.iter().map(|(row, _)| row.bound).collect();
    let (_, mut all) = improve(&all_bounds);
    // What one improvement guarantees, all of them together guarantee too.
    for (_, single) in &singles {
        never_worse(single, &mut all);
    }
    let all_together = change(&present.lines.concat(), &all.lines.concat(), required_m);
    let lines = dive
        .lines
        .iter()
        .enumerate()
        .map(|(number, line)| {
            let before = &present.lines[number];
            SensitivityLine {
                name: line.name.clone(),
                length_m: Plan::new(line, dive.vehicle.turn_radius_m).length_m,
                present: figures(before, required_m),
                changes: singles
                    .iter()
                    .map(|(_, after)| change(before, &after.lines[number], required_m))
                    .collect(),
                all_together: change(before, &all.lines[number], required_m),
            }
        })
        .collect();
    let bounds: Vec<ImprovedBound> = singles.into_iter().map(|(row, _)| row).collect();
    let present = figures(&present.lines.concat(), required_m);
    SensitivityReport {
        provenance: setup.provenance("fixability.sensitivity"),
        parameters: setup.parameters(),
        factor,
        statement: SENSITIVITY_STATEMENT,
        guarantee: terms(setup),
        verdict: verdict(setup, &present, &bounds, &all_together),
        present,
        bounds,
        all_together,
        zero: ErrorBound::ALL
            .into_iter()
            .filter(|&bound| dive.stated_value(bound) == 0.0)
            .map(|bound| ZeroBound { bound, words: bound.words(), key: bound.key() })
            .collect(),
        lines,
        undecided,
    }
}

/// The guaranteed fixes of every line.
fn scored(setup: &Setup<'_>, tick: &(dyn Fn() + Sync)) -> Scored {
    let mut undecided = false;
    let lines = setup
        .dive
        .lines
        .iter()
        .map(|line| {
            let plan = Plan::new(line, setup.dive.vehicle.turn_radius_m);
            let starts_m = setup.segment_starts(plan.length_m);
            let fixes = guaranteed_fixes(setup, &plan, &starts_m);
            tick();
            let ends_m = starts_m.iter().skip(1).copied().chain([plan.length_m]);
            starts_m
                .iter()
                .zip(ends_m)
                .zip(fixes)
                .map(|((start_m, end_m), fix)| {
                    undecided |= fix.cause == Some(Cause::Undecided);
                    Segment { length_m: end_m - start_m, fix_m: fix.distance_m }
                })
                .collect()
        })
        .collect();
    Scored { lines, undecided }
}

/// What is guaranteed before stays guaranteed after.
fn never_worse(before: &Scored, after: &mut Scored) {
    for (before, after) in before.lines.iter().flatten().zip(after.lines.iter_mut().flatten()) {
        after.fix_m = match (before.fix_m, after.fix_m) {
            (Some(before_m), Some(after_m)) => Some(smaller(before_m, after_m)),
            (before_m, after_m) => after_m.or(before_m),
        };
    }
}

fn length(segments: impl Iterator<Item = Segment>) -> f64 {
    segments.fold(0.0, |sum, segment| sum + segment.length_m)
}

fn figures(segments: &[Segment], required_m: f64) -> GuaranteedFigures {
    let total_m = length(segments.iter().copied());
    let share = |keep: &dyn Fn(Option<f64>) -> bool| {
        length(segments.iter().copied().filter(|segment| keep(segment.fix_m))) / total_m
    };
    let fixed: Vec<(f64, f64)> =
        segments.iter().filter_map(|segment| Some((segment.fix_m?, segment.length_m))).collect();
    GuaranteedFigures {
        segments: segments.len(),
        segments_with_fix: fixed.len(),
        within_required_share: share(&|fix| fix.is_some_and(|fix_m| fix_m <= required_m)),
        no_fix_share: share(&|fix| fix.is_none()),
        median_m: weighted_median(&fixed),
        longest_m: fixed.iter().map(|(fix_m, _)| *fix_m).max_by(f64::total_cmp),
    }
}

fn change(before: &[Segment], after: &[Segment], required_m: f64) -> GuaranteedChange {
    let was = figures(before, required_m);
    let is = figures(after, required_m);
    let pairs = || before.iter().zip(after);
    let gaining = || pairs().filter(|(before, after)| before.fix_m.is_none() && after.fix_m.is_some());
    let sooner: Vec<(f64, f64)> =
        pairs().filter_map(|(before, after)| Some((before.fix_m? - after.fix_m?, before.length_m))).collect();
    let compared_m = sooner.iter().fold(0.0, |sum, (_, length_m)| sum + length_m);
    GuaranteedChange {
        after: is,
        share_gained: is.within_required_share - was.within_required_share,
        segments_gaining_fix: gaining().count(),
        fix_gained_share: length(gaining().map(|(before, _)| *before)) / length(before.iter().copied()),
        segments_compared: sooner.len(),
        sooner_median_m: weighted_median(&sooner),
        sooner_mean_m: (!sooner.is_empty()).then(|| {
            sooner.iter().fold(0.0, |sum, (sooner_m, length_m)| sum + sooner_m * length_m) / compared_m
        }),
        sooner_most_m: sooner.iter().map(|(sooner_m, _)| *sooner_m).max_by(f64::total_cmp),
    }
}

/// The smallest value such that the values up to it hold at least half of the weight; none of nothing. Each value comes
/// with its weight.
fn weighted_median(values: &[(f64, f64)]) -> Option<f64> {
    let mut sorted = values.to_vec();
    sorted.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.total_cmp(&b.1)));
    let total = sorted.iter().fold(0.0, |sum, (_, weight)| sum + weight);
    let mut below = 0.0;
    sorted
        .iter()
        .find(|(_, weight)| {
            below += weight;
            2.0 * below >= total
        })
        .map(|(value, _)| *value)
}

/// What decides the order, the first figure first, in whole multiples of what counts as equal.
fn gains(change: &GuaranteedChange) -> [i64; 3] {
    [
        change.share_gained / EQUAL_SHARE,
        change.fix_gained_share / EQUAL_SHARE,
        change.sooner_mean_m.unwrap_or(0.0) / EQUAL_M,
    ]
    .map(|gain| gain.round() as i64)
}

/// Larger gains first.
fn by_gain(a: &GuaranteedChange, b: &GuaranteedChange) -> Ordering {
    gains(b).cmp(&gains(a))
}

fn helps(change: &GuaranteedChange) -> bool {
    gains(change) != [0; 3]
}

/// Which one to spend money on, in words.
fn verdict(
    setup: &Setup<'_>,
    present: &GuaranteedFigures,
    bounds: &[ImprovedBound],
    all_together: &GuaranteedChange,
) -> SensitivityVerdict {
    let required_m = setup.dive.scoring.required_fix_m;
    let first: Vec<&ImprovedBound> = bounds.iter().filter(|row| row.rank == Some(1)).collect();
    let names = first.iter().map(|row| row.words).collect::<Vec<_>>().join(", ");
    let text = match first.as_slice() {
        _ if setup.dive.sonar.detection_chance < 1.0 && setup.dive.budget.misses == 0 => {
            "nothing is guaranteed: detection is not certain and no miss is budgeted, and no smaller error changes \
             that (set budget.misses)"
                .to_owned()
        }
        [] if bounds.is_empty() => "every error bound is zero already".to_owned(),
        [] if helps(all_together) => format!(
            "no single improvement changes a guaranteed figure; all together {}",
            in_words(all_together, required_m)
        ),
        [] => "no improvement changes a guaranteed figure, not even all together".to_owned(),
        [only] => format!("improve the {} first: {}", only.words, in_words(&only.change, required_m)),
        [one, ..] => {
            format!("several are equally worth improving first ({names}): each {}", in_words(&one.change, required_m))
        }
    };
    let caution = if first.is_empty() || present.no_fix_share < 1.0 || all_together.after.no_fix_share < 1.0 {
        String::new()
    } else {
        "; still no segment has a guaranteed fix".to_owned()
    };
    SensitivityVerdict { first: first.iter().map(|row| row.bound).collect(), text: text + &caution }
}

/// What an improvement brings, by the first figure that decides.
fn in_words(change: &GuaranteedChange, required_m: f64) -> String {
    let percent = |share: f64| format!("{:.1}", 100.0 * share);
    if change.share_gained > EQUAL_SHARE {
        return format!(
            "raises the share of the lines with a guaranteed fix within {required_m} m by {} points to {} %",
            percent(change.share_gained),
            percent(change.after.within_required_share)
        );
    }
    let same = format!("leaves the share within {required_m} m as it is");
    if change.fix_gained_share > EQUAL_SHARE {
        return format!(
            "{same}, but {} % of the length gains a guaranteed fix",
            percent(change.fix_gained_share)
        );
    }
    match change.sooner_mean_m {
        Some(mean_m) => format!("{same}, but guarantees the fix sooner, by {mean_m:.1} m on average"),
        None => same,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_median_weighs_lengths() {
        assert_eq!(weighted_median(&[]), None);
        assert_eq!(weighted_median(&[(3.0, 50.0), (1.0, 50.0), (2.0, 50.0)]), Some(2.0));
        assert_eq!(weighted_median(&[(3.0, 150.0), (1.0, 50.0), (2.0, 50.0)]), Some(3.0));
    }
}
