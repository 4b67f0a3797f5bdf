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

mod refine;
mod search;

use rayon::prelude::*;

use super::Setup;
use super::area::{area_grid, headings_rad, outcomes};
use crate::dive::{AreaOptions, Dive, SearchHull};
use crate::frame::LocalPoint;
use crate::order::{larger, smaller};
use crate::report::{Cause, SUGGEST_STATEMENT, SuggestReport, Suggestion};
use crate::track::plan::Plan;
use refine::{Found, List, Refiner, pattern_in_words};
use search::{Candidate, Cells, Judged, Room, Tally, grid_centre, numbers};

/// What is kept free between a disc and the edge of the search area, metres: more than coordinates in a file are rounded.
const INSET_M: f64 = 1.0;
/// What is kept free beside it for each metre of common shift: the search area has grown by a square of the shift, so an
/// oblique edge of it by up to √2 times the shift, and `lines` checks the area before it grew.
const SHIFT_ROOM: f64 = 0.5;
/// Least length of an exported line after the guaranteed fix, metres, for the same reason.
const RUN_OUT_M: f64 = 1.0;

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
