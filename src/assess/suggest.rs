//! Where to dive, and on which heading to run first.
//!
//! *What is asked.* The vehicle starts anywhere in the scatter disc about the dive point and does not know where; it runs
//! straight on the first heading. The figure of a candidate (dive point and heading) is the longest guaranteed fix
//! distance over the starts in the disc. Smaller is better.
//!
//! *Search.* The area map (`area`) gives the guaranteed fix distance from cell centres on each heading. Every cell
//! centre is tried as a dive point: the longest distance over the cell centres in its disc is a lower bound of its figure. The
//! candidates are then taken in the order of this bound and solved again from more starts in the disc; what comes next
//! cannot be better than its bound, so the list is that of an exhaustive search over all candidates
//! (`tests/suite/suggest.rs`).
//!
//! *Starts.* Dive point, two rings, and the cell centres in the disc. The even ones of the outer ring are the offset tracks
//! for which `lines` computes its guarantee (`guarantee.rs`), so `lines` gives the first segment of an exported line the
//! same distance or a shorter one, in the same search area. Starts between them are not covered by proof.
//!
//! *Inside.* Disc and run, up to the fix and from every start in the disc, lie inside the convex hull of the search area:
//! beyond it the map may end, and a line that leaves it is refused by `lines`.
//!
//! *Alternatives.* The list takes the best candidate, then the best of those that are an alternative to all taken: dive
//! points whose discs do not overlap and that lie at least twice the sonar's reach apart, so that the sonar sees other ground.

use std::collections::BTreeMap;
use std::f64::consts::TAU;

use rayon::prelude::*;

use super::Setup;
use super::area::{area_grid, headings_rad, outcome, outcomes};
use super::statistics::at_rank_of_share;
use crate::dive::{AreaOptions, Dive, SearchHull};
use crate::frame::LocalPoint;
use crate::locate::StraightRuns;
use crate::order::{larger, smaller};
use crate::report::{
    AreaGrid, Cause, CauseCount, RunOutcome, SUGGEST_STATEMENT, SuggestReport, SuggestedStart, Suggestion,
};
use crate::track::plan::{Plan, direction};

/// Starts on the outer ring: twice the offset tracks of `guarantee.rs`.
const OUTER_STARTS: usize = 12;
/// Starts on the inner ring, at half the radius, between those of the outer one.
const INNER_STARTS: usize = 6;
/// What is kept free between a disc and the edge of the search area, metres: more than coordinates in a file are rounded.
const INSET_M: f64 = 1.0;
/// What is kept free beside it for each metre of common shift: the search area has grown by a square of the shift, so an
/// oblique edge of it by up to √2 times the shift, and `lines` checks the area before it grew.
const SHIFT_ROOM: f64 = 0.5;
/// Least length of an exported line after the guaranteed fix, metres, for the same reason.
const RUN_OUT_M: f64 = 1.0;
/// Candidates solved at once. A constant, so that the result does not depend on the number of threads.
const BATCH: usize = 64;

/// The search: the area map's cells, finer where the scatter disc is smaller than a cell, down to half of them.
pub fn suggest_area_options(dive: &Dive) -> AreaOptions {
    let cell_m = dive.area.cell_m;
    let scatter_m = dive.start.scatter_on_map_m();
    let cell_m = if scatter_m > 0.0 { scatter_m.clamp(0.5 * cell_m, cell_m) } else { cell_m };
    AreaOptions { cell_m, ..dive.area }
}

/// Finds the dive points and first headings with the best guaranteed fix distance. `tick` is called with the number of
/// runs of the area map finished since the last call; all calls add up to [`super::area_starts`].
pub fn suggest(setup: &Setup<'_>, search: &AreaOptions, tick: &(dyn Fn(usize) + Sync)) -> SuggestReport {
    let dive = setup.dive;
    let (grid, places) = area_grid(setup, search);
    let headings_rad = headings_rad(search);
    let outcomes = outcomes(setup, search, &grid, &places, &headings_rad, tick);
    let hull = SearchHull::new(&dive.start.search_area);
    let cells = Cells { grid, places: &places, numbers: numbers(&grid, &places), outcomes: &outcomes };
    let scatter_m = dive.start.scatter_on_map_m();
    let room = Room { hull: &hull, margin_m: scatter_m + SHIFT_ROOM * dive.start.common_shift_m + INSET_M };
    let discs = cells.discs(scatter_m, &room);
    let judged: Vec<Judged> = discs
        .par_iter()
        .flat_map_iter(|(place, disc)| {
            (0..headings_rad.len()).map(|heading| cells.judge(*place, disc, heading, headings_rad.len()))
        })
        .collect();
    let mut tally = Tally::default();
    let mut coarse: Vec<Candidate> = judged.into_iter().filter_map(|judged| tally.count(judged)).collect();
    let with_fix = coarse.len();
    coarse.retain(|candidate| {
        room.is_enough(grid_centre(&cells, candidate), headings_rad[candidate.heading], candidate.fix_m)
    });
    let mut leaving = with_fix - coarse.len();
    coarse.sort_by(|a, b| a.fix_m.total_cmp(&b.fix_m).then((a.place, a.heading).cmp(&(b.place, b.heading))));
    let mut list = List {
        taken: Vec::new(),
        apart_m: larger(2.0 * scatter_m, 2.0 * dive.sonar.reach_m()),
        most: dive.suggest.listed,
    };
    let refiner = Refiner { setup, search, headings_rad: &headings_rad, cells: &cells };
    let refined = refiner.fill(&mut list, &coarse, &room, &mut tally, &mut leaving);
    let suggestions: Vec<Suggestion> =
        list.taken.iter().enumerate().map(|(at, found)| suggestion(setup, at + 1, found, &room)).collect();
    let undecided = outcomes.iter().any(|run| run.cause() == Some(Cause::Undecided))
        || tally.without.contains_key(Cause::Undecided.word());
    let mut report = SuggestReport {
        provenance: setup.provenance("fixability.suggest"),
        parameters: setup.parameters(),
        options: dive.suggest,
        search: *search,
        statement: SUGGEST_STATEMENT,
        scatter_m,
        start_pattern: pattern_in_words(scatter_m),
        apart_m: list.apart_m,
        grid,
        cells: places.len(),
        dive_points: discs.len(),
        candidates: discs.len() * headings_rad.len(),
        candidates_with_fix: with_fix,
        candidates_leaving: leaving,
        candidates_refined: refined,
        without_fix: tally.sorted(),
        undecided,
        verdict: String::new(),
        suggestions,
        search_area: dive.start.search_area.clone(),
        landmarks: setup.chart_landmarks(),
    };
    report.verdict = verdict(&report);
    report
}

/// The cells of the area map with what is guaranteed of their runs.
struct Cells<'a> {
    grid: AreaGrid,
    places: &'a [(usize, usize)],
    /// By row and column: number among `places`.
    numbers: Vec<Option<usize>>,
    outcomes: &'a [RunOutcome],
}

fn numbers(grid: &AreaGrid, places: &[(usize, usize)]) -> Vec<Option<usize>> {
    let mut numbers = vec![None; grid.columns * grid.rows];
    for (number, (column, row)) in places.iter().enumerate() {
        numbers[row * grid.columns + column] = Some(number);
    }
    numbers
}

fn grid_centre(cells: &Cells<'_>, candidate: &Candidate) -> LocalPoint {
    let (column, row) = cells.places[candidate.place];
    cells.grid.centre(column, row)
}

impl Cells<'_> {
    /// The dive points whose disc lies inside the search area, each with the cells in its disc.
    fn discs(&self, scatter_m: f64, room: &Room<'_>) -> Vec<(usize, Vec<usize>)> {
        let reach = (scatter_m / self.grid.cell_m).floor() as isize;
        let within = |(columns, rows): &(isize, isize)| {
            libm::hypot(*columns as f64, *rows as f64) * self.grid.cell_m <= scatter_m
        };
        let steps: Vec<(isize, isize)> = (-reach..=reach)
            .flat_map(|rows| (-reach..=reach).map(move |columns| (columns, rows)))
            .filter(within)
            .collect();
        (0..self.places.len())
            .into_par_iter()
            .filter_map(|place| {
                let (column, row) = self.places[place];
                if room.hull.inside_m(self.grid.centre(column, row)) < room.margin_m {
                    return None;
                }
                let disc: Option<Vec<usize>> = steps
                    .iter()
                    .map(|&(columns, rows)| {
                        let column = column.checked_add_signed(columns)?;
                        let row = row.checked_add_signed(rows)?;
                        if column >= self.grid.columns || row >= self.grid.rows {
                            return None;
                        }
                        self.numbers[row * self.grid.columns + column]
                    })
                    .collect();
                Some((place, disc?))
            })
            .collect()
    }

    /// The longest guaranteed fix distance over the cells of a disc, or the first cause of none.
    fn judge(&self, place: usize, disc: &[usize], heading: usize, headings: usize) -> Judged {
        let mut fix_m: f64 = 0.0;
        for cell in disc {
            match self.outcomes[cell * headings + heading] {
                RunOutcome::Fix(of_cell_m) => fix_m = larger(fix_m, of_cell_m),
                RunOutcome::NoFix(cause) => return Judged::Without(cause),
            }
        }
        Judged::Candidate(Candidate { place, heading, fix_m })
    }
}

/// A dive point and a heading with a lower bound of the longest guaranteed fix distance.
#[derive(Clone, Copy, Debug)]
struct Candidate {
    place: usize,
    heading: usize,
    fix_m: f64,
}

enum Judged {
    Candidate(Candidate),
    Without(Cause),
}

/// Candidates without a fix, by the word of the cause.
#[derive(Default)]
struct Tally {
    without: BTreeMap<&'static str, CauseCount>,
}

impl Tally {
    fn count(&mut self, judged: Judged) -> Option<Candidate> {
        match judged {
            Judged::Candidate(candidate) => Some(candidate),
            Judged::Without(cause) => {
                self.add(cause);
                None
            }
        }
    }

    fn add(&mut self, cause: Cause) {
        self.without.entry(cause.word()).or_insert(CauseCount { cause, candidates: 0 }).candidates += 1;
    }

    /// Most first; equal counts by the word of the cause.
    fn sorted(self) -> Vec<CauseCount> {
        let mut counts: Vec<CauseCount> = self.without.into_values().collect();
        counts.sort_by_key(|count| std::cmp::Reverse(count.candidates));
        counts
    }
}

/// How far a run may go.
struct Room<'a> {
    hull: &'a SearchHull,
    /// What disc and inset need.
    margin_m: f64,
}

impl Room<'_> {
    fn ahead_m(&self, from: LocalPoint, heading_rad: f64) -> f64 {
        self.hull.room_m(from, direction(heading_rad), self.margin_m)
    }

    fn is_enough(&self, from: LocalPoint, heading_rad: f64, fix_m: f64) -> bool {
        self.ahead_m(from, heading_rad) >= fix_m + RUN_OUT_M
    }
}

/// A candidate solved from all starts in its disc.
#[derive(Clone, Debug)]
struct Found {
    candidate: Candidate,
    at: LocalPoint,
    heading_rad: f64,
    /// Longest and median guaranteed fix distance.
    fix_m: f64,
    median_m: f64,
    starts: Vec<SuggestedStart>,
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
struct List {
    taken: Vec<Found>,
    apart_m: f64,
    most: usize,
}

impl List {
    fn is_alternative(&self, at: LocalPoint) -> bool {
        self.taken.iter().all(|taken| taken.at.distance_m(at) >= self.apart_m)
    }
}

/// Solves candidates from all starts in their discs.
struct Refiner<'a> {
    setup: &'a Setup<'a>,
    search: &'a AreaOptions,
    headings_rad: &'a [f64],
    cells: &'a Cells<'a>,
}

impl Refiner<'_> {
    /// Takes the best alternatives into `list`; `coarse` is in the order of the lower bounds. Returns how many candidates
    /// were solved.
    fn fill(
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

fn pattern_in_words(scatter_m: f64) -> String {
    if scatter_m == 0.0 {
        return "the dive point (no descent scatter)".to_owned();
    }
    format!(
        "the dive point, {INNER_STARTS} starts at {} m and {OUTER_STARTS} at {scatter_m} m from it, evenly spaced, and the cell \
         centres of the search that lie in the disc",
        0.5 * scatter_m
    )
}

fn suggestion(setup: &Setup<'_>, number: usize, found: &Found, room: &Room<'_>) -> Suggestion {
    let dive = setup.dive;
    let required_m = dive.scoring.required_fix_m;
    let wanted_m = larger(required_m, found.fix_m + larger(dive.suggest.lead_m, RUN_OUT_M));
    let line_m = smaller(wanted_m, room.ahead_m(found.at, found.heading_rad));
    let line_end = Plan::straight(found.at, found.heading_rad, line_m).point_at(line_m);
    // A point inside the search area has a place on the Earth when the frame has one.
    let on_earth = |point: LocalPoint| dive.frame.to_geo(point).ok();
    Suggestion {
        number,
        name: format!("S{number}"),
        dive_point: found.at,
        dive_point_wgs84: on_earth(found.at),
        heading_deg: 360.0 * found.candidate.heading as f64 / setup.dive.area.headings as f64,
        fix_m: found.fix_m,
        shortest_fix_m: found.starts.iter().map(|start| start.fix_m).reduce(smaller).unwrap_or(found.fix_m),
        median_fix_m: found.median_m,
        within_required: found.fix_m <= required_m,
        line_m,
        line_end,
        line_end_wgs84: on_earth(line_end),
        starts: found.starts.clone(),
    }
}

fn verdict(report: &SuggestReport) -> String {
    let required_m = report.parameters.required_fix_m;
    if let Some(best) = report.suggestions.first() {
        let within = if best.within_required { "within" } else { "beyond" };
        return format!(
            "dive at {:.0} m east, {:.0} m north and run {:05.1}°: a fix is guaranteed after {:.1} m from every start computed, \
             {within} the required {required_m} m",
            best.dive_point.east_m, best.dive_point.north_m, best.heading_deg, best.fix_m
        );
    }
    if report.dive_points == 0 {
        return format!(
            "no dive point: a scatter disc of {} m radius about a cell centre fits nowhere inside the search area",
            report.scatter_m
        );
    }
    if report.landmarks.is_empty() {
        return "no dive point has a guaranteed fix: there are no landmarks".to_owned();
    }
    let mut causes: Vec<String> = report
        .without_fix
        .iter()
        .map(|count| format!("{} {}", count.candidates, cause_in_words(count.cause)))
        .collect();
    if report.candidates_leaving > 0 {
        causes.push(format!("{} leave the search area before the fix", report.candidates_leaving));
    }
    format!(
        "no dive point has a guaranteed fix from all of its scatter disc within a straight run of {} m; of {} candidates {}",
        report.search.longest_run_m,
        report.candidates,
        causes.join(", ")
    )
}

/// What the candidates of a cause do, after their number.
fn cause_in_words(cause: Cause) -> &'static str {
    match cause {
        Cause::TooFewLandmarks => "meet too few landmarks",
        Cause::LookAlikes => "run over look-alike ground",
        Cause::TooWide => "end in one place that is wider than the fix size",
        Cause::Undecided => "are undecided (scoring.cell_budget)",
        Cause::DetectionNotCertain => "have no certain detection (set budget.misses)",
    }
}
