//! Candidates solved from all starts in their discs, best bound first, until the list is complete.

use std::f64::consts::TAU;

use rayon::prelude::*;

use super::search::{Candidate, Cells, Room, Tally, grid_centre};
use crate::assess::Setup;
use crate::assess::area::outcome;
use crate::assess::statistics::at_rank_of_share;
use crate::dive::AreaOptions;
use crate::frame::LocalPoint;
use crate::locate::StraightRuns;
use crate::order::{larger, smaller};
use crate::report::{Cause, RunOutcome, SuggestedStart};

/// Starts on the outer ring: twice the offset tracks of `guarantee.rs`.
const OUTER_STARTS: usize = 12;
/// Starts on the inner ring, at half the radius, between those of the outer one.
const INNER_STARTS: usize = 6;
/// Candidates solved at once. A constant, so that the result does not depend on the number of threads.
const BATCH: usize = 64;

/// A candidate solved from all starts in its disc.
#[derive(Clone, Debug)]
pub(super) struct Found {
    pub candidate: Candidate,
    pub at: LocalPoint,
    pub heading_rad: f64,
    /// Longest and median guaranteed fix distance.
    pub fix_m: f64,
    pub median_m: f64,
    pub starts: Vec<SuggestedStart>,
}

impl Found {
    /// The order of the list: longest distance, then median, then place and heading.
    fn order(&self, other: &Self) -> std::cmp::Ordering {
        let key = |found: &Self| (found.candidate.place, found.candidate.heading);
        self.fix_m
            .total_cmp(&other.fix_m)
            .then(self.median_m.total_cmp(&other.median_m))
            .then(key(self).cmp(&key(other)))
    }
}

/// The suggestions taken so far.
pub(super) struct List {
    pub taken: Vec<Found>,
    pub apart_m: f64,
    pub most: usize,
}

impl List {
    fn is_alternative(&self, at: LocalPoint) -> bool {
        self.taken.iter().all(|taken| taken.at.distance_m(at) >= self.apart_m)
    }
}

/// Solves candidates from all starts in their discs.
pub(super) struct Refiner<'a> {
    pub setup: &'a Setup<'a>,
    pub search: &'a AreaOptions,
    pub headings_rad: &'a [f64],
    pub cells: &'a Cells<'a>,
}

impl Refiner<'_> {
    /// Takes the best alternatives into `list`; `coarse` is in the order of the lower bounds. Returns how many candidates
    /// were solved.
    pub fn fill(
        &self,
        list: &mut List,
        coarse: &[Candidate],
        room: &Room<'_>,
        tally: &mut Tally,
        leaving: &mut usize,
    ) -> usize {
        let setup = self.setup;
        if coarse.is_empty() {
            return 0;
        }
        let (misses, longest_run_m) = (setup.dive.budget.misses, self.search.longest_run_m);
        let runs = StraightRuns::new(setup.scene(), setup.solver(), setup.bounds(), misses, longest_run_m);
        let mut rest = coarse.iter().peekable();
        let mut open: Vec<Found> = Vec::new();
        let mut solved = 0;
        while list.taken.len() < list.most {
            let mut batch: Vec<Candidate> = Vec::new();
            // A candidate whose bound equals a figure may still come before it in the order of the list.
            let best_m = open.iter().map(|found| found.fix_m).reduce(smaller);
            while batch.len() < BATCH {
                let Some(next) = rest.peek() else { break };
                if best_m.is_some_and(|best_m| next.fix_m > best_m) {
                    break;
                }
                if list.is_alternative(grid_centre(self.cells, next)) {
                    batch.push(**next);
                }
                rest.next();
            }
            if batch.is_empty() {
                let best = open.iter().enumerate().min_by(|a, b| a.1.order(b.1)).map(|(number, _)| number);
                let Some(best) = best else { break };
                list.taken.push(open.swap_remove(best));
                open.retain(|found| list.is_alternative(found.at));
                continue;
            }
            solved += batch.len();
            let found: Vec<Result<Found, Cause>> =
                batch.par_iter().map(|candidate| self.solve(&runs, *candidate)).collect();
            for found in found {
                match found {
                    Ok(found) if room.is_enough(found.at, found.heading_rad, found.fix_m) => open.push(found),
                    Ok(_) => *leaving += 1,
                    Err(cause) => tally.add(cause),
                }
            }
        }
        solved
    }

    /// One candidate from all starts in its disc, or the cause of the first start that has no fix.
    fn solve(&self, runs: &StraightRuns<'_>, candidate: Candidate) -> Result<Found, Cause> {
        let at = grid_centre(self.cells, &candidate);
        let heading_rad = self.headings_rad[candidate.heading];
        let mut starts = pattern(at, self.setup.dive.start.scatter_on_map_m());
        let outcomes = runs.solve(heading_rad, &starts);
        let mut fixes = Vec::with_capacity(outcomes.len());
        for found in outcomes {
            match outcome(found) {
                RunOutcome::Fix(fix_m) => fixes.push(fix_m),
                RunOutcome::NoFix(cause) => return Err(cause),
            }
        }
        let (column, row) = self.cells.places[candidate.place];
        let headings = self.headings_rad.len();
        let scatter_m = self.setup.dive.start.scatter_on_map_m();
        let reach = (scatter_m / self.cells.grid.cell_m).floor() as usize;
        for near_row in row.saturating_sub(reach)..=row + reach {
            for near_column in column.saturating_sub(reach)..=column + reach {
                let centre = self.cells.grid.centre(near_column, near_row);
                let (columns, rows) = (near_column.abs_diff(column), near_row.abs_diff(row));
                let is_within =
                    libm::hypot(columns as f64, rows as f64) * self.cells.grid.cell_m <= scatter_m;
                if !is_within || (near_column, near_row) == (column, row) {
                    continue;
                }
                let number = self.cells.numbers[near_row * self.cells.grid.columns + near_column];
                let fix = number.and_then(|n| self.cells.outcomes[n * headings + candidate.heading].fix_m());
                if let Some(fix_m) = fix {
                    starts.push(centre);
                    fixes.push(fix_m);
                }
            }
        }
        let mut sorted = fixes.clone();
        sorted.sort_by(f64::total_cmp);
        let sorted: Vec<Option<f64>> = sorted.into_iter().map(Some).collect();
        let longest_m = fixes.iter().copied().fold(0.0, larger);
        Ok(Found {
            candidate,
            at,
            heading_rad,
            fix_m: longest_m,
            median_m: at_rank_of_share(&sorted, 0.5).unwrap_or(longest_m),
            starts: starts
                .into_iter()
                .zip(fixes)
                .map(|(position, fix_m)| SuggestedStart { position, fix_m })
                .collect(),
        })
    }
}

/// Dive point and rings.
fn pattern(at: LocalPoint, scatter_m: f64) -> Vec<LocalPoint> {
    let mut starts = vec![at];
    if scatter_m > 0.0 {
        let mut ring = |radius_m: f64, count: usize, turn: f64| {
            starts.extend((0..count).map(|k| {
                let bearing = TAU * (k as f64 + turn) / count as f64;
                LocalPoint::new(
                    at.east_m + radius_m * libm::sin(bearing),
                    at.north_m + radius_m * libm::cos(bearing),
                )
            }));
        };
        ring(0.5 * scatter_m, INNER_STARTS, 0.5);
        ring(scatter_m, OUTER_STARTS, 0.0);
    }
    starts
}

pub(super) fn pattern_in_words(scatter_m: f64) -> String {
    if scatter_m == 0.0 {
        return "the dive point (no descent scatter)".to_owned();
    }
    format!(
        "the dive point, {INNER_STARTS} starts at {} m and {OUTER_STARTS} at {scatter_m} m from it, evenly spaced, and the cell \
         centres of the search that lie in the disc",
        0.5 * scatter_m
    )
}
