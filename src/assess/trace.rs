//! One simulated dive of one line in detail.

use super::Setup;
use crate::detect::{DrawnErrors, LogEvent, simulate};
use crate::frame::LocalPoint;
use crate::locate::cell::disc_reaches;
use crate::locate::{CorridorGrain, Feasible, FixWatch, History, Outcome, Solver, Step, steps};
use crate::report::{
    Contradiction, CorridorReport, Hindsight, HindsightEvent, TRACE_CANDIDATES_MAX, TRACE_CELLS_MAX,
    TraceEvent, TraceReport,
};
use crate::track::plan::{Plan, wrap};

/// Which dive to trace.
#[derive(Clone, Debug, PartialEq)]
pub struct TraceRequest {
    /// Name of the line; none for the first.
    pub line: Option<String>,
    /// Distance along the line at which the vehicle is lost, metres.
    pub from_m: f64,
    /// Number of the draw, from 0.
    pub draw: usize,
    /// Longest interval of the corridor, metres of reported travel; positive.
    pub corridor_spacing_m: f64,
}

/// Most polygons of the corridor per interval. Where more places are left, near ones are joined; see
/// [`CorridorGrain::cells_max`].
const CORRIDOR_POLYGONS_MAX: usize = 64;

/// Why a trace cannot be made.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum TraceError {
    /// No such line.
    #[error("there is no line \"{name}\"; the lines of this dive are: {known}")]
    UnknownLine {
        /// What was asked for.
        name: String,
        /// What there is.
        known: String,
    },
    /// The start lies off the line.
    #[error("a start at {from_m} m is off line \"{line}\"; accepted: 0 to below {length_m:.1} m")]
    OffLine {
        /// What was asked for.
        from_m: f64,
        /// The line.
        line: String,
        /// Its length.
        length_m: f64,
    },
}

/// The corridor's polygons are made of cells widened by this, metres. Corners that lie within 0.1 mm of each other are
/// written as one, and a convex polygon loses no point deeper inside than that; so the polygons written hold the cells.
const CORNER_ALLOWANCE_M: f64 = 2e-4;

/// Simulates one dive and solves it, event by event.
///
/// # Errors
/// When the line does not exist or the start lies off it.
pub fn trace(setup: &Setup<'_>, request: &TraceRequest) -> Result<TraceReport, TraceError> {
    let dive = setup.dive;
    let line = match &request.line {
        None => &dive.lines[0],
        Some(name) => {
            dive.lines.iter().find(|line| line.name == *name).ok_or_else(|| TraceError::UnknownLine {
                name: name.clone(),
                known: dive.lines.iter().map(|line| line.name.as_str()).collect::<Vec<_>>().join(", "),
            })?
        }
    };
    let plan = Plan::new(line, dive.vehicle.turn_radius_m);
    if !(0.0..plan.length_m).contains(&request.from_m) {
        return Err(TraceError::OffLine {
            from_m: request.from_m,
            line: line.name.clone(),
            length_m: plan.length_m,
        });
    }
    let shape = setup.shape_of(request.draw);
    let errors = DrawnErrors::new(dive.scoring.seed, &line.name, request.draw as u64, shape);
    // Marks: where the vehicle is lost, and the end of the line, so that the log reports the travel until there.
    let simulated = simulate(&setup.scene(), &plan, &[request.from_m, plan.length_m], &errors);
    let steps = steps(&simulated.log, &setup.bounds());
    let mark = steps.iter().position(|step| step.sighting.is_none()).expect("the mark was asked for");
    let start_s = simulated.log.events[mark].time_s;
    let fix_size_m = dive.scoring.fix_size_m;
    let mut events = Vec::new();
    let solver = setup.solver();
    let ahead = &steps[mark + 1..];
    let mut watch = FixWatch::new(ahead, fix_size_m);
    let (outcome, history) = solver.run_recorded(ahead, |summary, set| {
        watch.see(summary.step, set, summary.spread_m);
        let at = mark + 1 + summary.step;
        let (event, truth) = (&simulated.log.events[at], simulated.truth[at]);
        let sighting = event.sighting.expect("the solver reports sightings only");
        events.push(TraceEvent {
            number: events.len() + 1,
            run_m: summary.along_m - request.from_m,
            along_m: summary.along_m,
            time_s: event.time_s - start_s,
            slant_range_m: sighting.slant_range_m,
            relative_bearing_deg: sighting.relative_bearing_rad.to_degrees(),
            heading_deg: wrap(sighting.heading_rad).to_degrees().rem_euclid(360.0),
            cells: summary.cells,
            places: summary.places,
            spread_m: summary.spread_m,
            is_fix: summary.spread_m.is_some_and(|spread| spread <= fix_size_m),
            true_landmark: truth
                .landmark
                .map_or_else(|| "stray".to_owned(), |landmark| dive.landmarks[landmark].id.clone()),
            true_position: truth.position,
            truth_inside: set.contains(truth.position),
            cell_corners: corners(set),
            hindsight: None,
        });
    });
    let hindsight =
        look_back(setup, &solver, history, &simulated.log.events[mark + 1..], request, &mut events);
    let contradiction = outcome
        .contradiction()
        .map(|at| contradiction(&solver, ahead, &outcome, at.along_m - request.from_m));
    let fixes = watch.finish(!outcome.is_undecided && contradiction.is_none());
    // An empty set is never a fix, and neither is what came before it: the bounds did not hold.
    let first_along_m = fixes.first_along_m.filter(|_| contradiction.is_none());
    Ok(TraceReport {
        provenance: setup.provenance("fixability.trace"),
        parameters: setup.parameters(),
        line: line.name.clone(),
        from_m: request.from_m,
        draw: request.draw,
        error_shape: shape,
        fix_distance_m: first_along_m.map(|along_m| along_m - request.from_m),
        lasting_fix_distance_m: fixes.lasting_along_m.map(|along_m| along_m - request.from_m),
        relapses: fixes.relapses,
        contradiction,
        undecided: outcome.is_undecided,
        path: plan.path(request.from_m, plan.length_m),
        search_area: dive.start.search_area.clone(),
        events,
        hindsight,
        landmarks: setup.chart_landmarks(),
    })
}

/// Largest stray budget beyond the stated one that is tried on a contradiction.
const EXTRA_STRAYS_MAX: u8 = 6;

/// Finds the smallest stray budget that explains the whole dive.
fn contradiction(solver: &Solver<'_>, steps: &[Step], outcome: &Outcome, run_m: f64) -> Contradiction {
    let tried_up_to = solver.stray_budget.saturating_add(EXTRA_STRAYS_MAX);
    let explains = |&stray_budget: &u8| {
        let outcome = Solver { stray_budget, ..*solver }.run(steps, |_, _| {});
        !outcome.is_undecided && outcome.contradiction().is_none()
    };
    Contradiction {
        event: outcome.events.len(),
        run_m,
        smallest_stray_budget: (solver.stray_budget + 1..=tried_up_to).find(explains),
        tried_up_to,
    }
}

/// Sweeps over the dive's history and notes what is then known, for each of `events` and in all. None, and nothing
/// noted, when nothing explains the dive.
fn look_back(
    setup: &Setup<'_>,
    solver: &Solver<'_>,
    mut history: History,
    log: &[LogEvent],
    request: &TraceRequest,
    events: &mut [TraceEvent],
) -> Option<Hindsight> {
    let swept = history.sweep(solver.map, |_| {});
    if history.is_contradicted() {
        return None;
    }
    let start = history.set(0);
    for (detection, event) in (1..).zip(events) {
        let set = history.set(detection);
        let candidates = history.candidates(detection);
        let name = |&landmark: &usize| setup.dive.landmarks[landmark].id.clone();
        event.hindsight = Some(HindsightEvent {
            cells: set.states.len(),
            places: set.places(solver.fix_size_m),
            spread_m: set.spread_m()?,
            identified: candidates.identified().as_ref().map(name),
            candidate_count: candidates.landmarks.len(),
            candidates: candidates.landmarks.iter().take(TRACE_CANDIDATES_MAX).map(name).collect(),
            may_be_stray: candidates.may_be_stray,
            truth_inside: set.contains(event.true_position),
            cell_corners: corners(&set),
        });
    }
    let grain = CorridorGrain { spacing_m: request.corridor_spacing_m, cells_max: CORRIDOR_POLYGONS_MAX };
    let allowance = disc_reaches(CORNER_ALLOWANCE_M);
    let corridor = history.corridor(log, &setup.bounds(), solver.map, grain);
    Some(Hindsight {
        sweeps: swept.count,
        at_rest: swept.is_at_rest,
        start_places: start.places(solver.fix_size_m),
        start_spread_m: start.spread_m()?,
        corridor_spacing_m: request.corridor_spacing_m,
        corridor: corridor
            .iter()
            .map(|interval| CorridorReport {
                reported_from_m: interval.from_m,
                reported_to_m: interval.to_m,
                from_s: interval.from_s,
                to_s: interval.to_s,
                polygons: interval
                    .cells
                    .iter()
                    .map(|cell| cell.minkowski_sum(&allowance).corners())
                    .collect(),
            })
            .collect(),
    })
}

/// Corners of each cell, at most [`TRACE_CELLS_MAX`] of them.
fn corners(set: &Feasible) -> Vec<Vec<LocalPoint>> {
    set.states.iter().take(TRACE_CELLS_MAX).map(|state| state.cell.corners()).collect()
}
