//! Watches a run for its first fix, for fixes lost again, and for the fix that lasts.
//!
//! Between two sightings the feasible set only grows, by the travel. It is widest just before the next sighting (and at
//! the end of the line), so the spread is looked at there as well as after each sighting. A *relapse* is a fix that is
//! lost at such a moment; the *lasting* fix is the first after the last relapse.

use super::cell::{Cell, DIRECTION_COUNT, add_reaches};
use super::feasible::EventSet;
use super::steps::Step;

/// What a watch has seen.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct FixHistory {
    /// Distance along the track of the first fix.
    pub first_along_m: Option<f64>,
    /// Distance along the track of the first fix that is not lost again.
    pub lasting_along_m: Option<f64>,
    /// Number of times a fix was lost again.
    pub relapses: usize,
}

/// A watch over one run along `steps`.
#[derive(Debug)]
pub struct FixWatch<'a> {
    steps: &'a [Step],
    fix_size_m: f64,
    history: FixHistory,
    /// Step of the last sighting and the hull of each slice's cells after it.
    last: Option<(usize, Vec<Option<Cell>>)>,
}

impl<'a> FixWatch<'a> {
    /// A watch over a run along `steps`, the same that the solver is given.
    pub fn new(steps: &'a [Step], fix_size_m: f64) -> Self {
        Self { steps, fix_size_m, history: FixHistory::default(), last: None }
    }

    /// Takes the set after the sighting of step number `step`, whose spread the caller has computed. Returns whether this
    /// is the first fix of the run.
    pub fn see(&mut self, step: usize, set: &EventSet<'_>, spread_m: Option<f64>) -> bool {
        self.look_before(step);
        let along_m = self.steps[step].along_m;
        let had_none = self.history.first_along_m.is_none();
        if spread_m.is_some_and(|spread| spread <= self.fix_size_m) {
            self.history.first_along_m.get_or_insert(along_m);
            self.history.lasting_along_m.get_or_insert(along_m);
        } else {
            self.lose();
        }
        self.last = Some((step, set.slice_hulls().to_vec()));
        had_none && self.history.first_along_m.is_some()
    }

    /// Looks once more at the end of the steps and returns what was seen. A run that ended early (empty or undecided)
    /// has no lasting fix: pass `is_complete` as `false`.
    pub fn finish(mut self, is_complete: bool) -> FixHistory {
        if is_complete {
            self.look_before(self.steps.len().saturating_sub(1));
        } else {
            self.lose();
        }
        self.history
    }

    /// Looks at the set of the last sighting, moved to step number `step`.
    fn look_before(&mut self, step: usize) {
        if self.history.lasting_along_m.is_none() {
            return;
        }
        let Some((last, hulls)) = &self.last else { return };
        let moved = hulls.iter().enumerate().filter_map(|(slice, hull)| {
            let mut travel = [0.0; DIRECTION_COUNT];
            for between in &self.steps[last + 1..step + 1] {
                add_reaches(&mut travel, &between.travel[slice]);
            }
            hull.map(|h| h.minkowski_sum(&travel))
        });
        let spread_m = moved.reduce(|a, b| a.hull(&b)).map_or(0.0, |hull| hull.diameter_m());
        if spread_m > self.fix_size_m {
            self.lose();
        }
    }

    fn lose(&mut self) {
        if self.history.lasting_along_m.take().is_some() {
            self.history.relapses += 1;
        }
    }
}
