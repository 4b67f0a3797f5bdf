//! One simulated dive of one line in detail.

use super::Setup;
use crate::detect::{DrawnErrors, simulate};
use crate::locate::steps;
use crate::report::{TRACE_CELLS_MAX, TraceEvent, TraceReport};
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
}

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
    let simulated = simulate(&setup.scene(), &plan, &[request.from_m], &errors);
    let steps = steps(&simulated.log, &setup.bounds());
    let mark = steps.iter().position(|step| step.sighting.is_none()).expect("the mark was asked for");
    let start_s = simulated.log.events[mark].time_s;
    let fix_size_m = dive.scoring.fix_size_m;
    let mut events = Vec::new();
    let outcome = setup.solver().run(&steps[mark + 1..], |summary, set| {
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
            truth_inside: set.states.iter().any(|state| state.cell.contains(truth.position)),
            cell_corners: set.states.iter().take(TRACE_CELLS_MAX).map(|state| state.cell.corners()).collect(),
        });
    });
    Ok(TraceReport {
        provenance: setup.provenance("fixability.trace"),
        parameters: setup.parameters(),
        line: line.name.clone(),
        from_m: request.from_m,
        draw: request.draw,
        error_shape: shape,
        fix_distance_m: outcome.first_fix_along_m(fix_size_m).map(|along_m| along_m - request.from_m),
        undecided: outcome.is_undecided,
        path: plan.path(request.from_m, plan.length_m),
        search_area: dive.start.search_area.clone(),
        events,
        landmarks: setup.chart_landmarks(),
    })
}
