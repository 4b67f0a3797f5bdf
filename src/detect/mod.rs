//! The simulator: a planned track run with bounded errors, and what the vehicle reports of it.
//!
//! Truth runs the planned shape from a start offset, landmarks lie anywhere in their boxes, and every error lies
//! within its bound. The vehicle's [`Log`] holds only what it could know; [`Truth`] stays apart and is read by tests,
//! by `trace` and by nobody else.
//!
//! *Frame and units.* Working frame, SI, headings clockwise from grid north.

mod errors;
mod motion;
mod sonar;
mod strays;

use nalgebra::Vector2;

pub use errors::{DrawnErrors, Errors, GENERATOR, LegErrors, SightingErrors, StrayDraw};
pub use motion::ERROR_HOLD_M;

use crate::frame::LocalPoint;
use crate::map::Landmark;
use crate::map::index::LandmarkIndex;
use crate::track::plan::Plan;
use crate::vehicle::{DeadReckoning, Sonar, Vehicle};

/// A straight piece of reported travel.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ReportedPiece {
    /// Reported length, metres.
    pub length_m: f64,
    /// Reported heading, radians.
    pub heading_rad: f64,
    /// Duration, seconds.
    pub duration_s: f64,
    /// Whether the sonar detects nothing here, because the vehicle turns.
    pub is_blind: bool,
}

/// One anonymous detection.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sighting {
    /// Measured slant range, metres.
    pub slant_range_m: f64,
    /// Measured bearing relative to the bow, radians, starboard positive. Side-looking sonar reports ±π/2.
    pub relative_bearing_rad: f64,
    /// Reported heading at the sighting, radians.
    pub heading_rad: f64,
}

/// Something the log marks: a detection, or a distance along the line that somebody asked for.
#[derive(Clone, Debug, PartialEq)]
pub struct LogEvent {
    /// Distance along the planned track, metres.
    pub along_m: f64,
    /// Time since the start of the line, seconds.
    pub time_s: f64,
    /// Travel since the event before (or since the start of the line).
    pub travel: Vec<ReportedPiece>,
    /// The detection; none at a mark.
    pub sighting: Option<Sighting>,
}

/// All that the vehicle knows about a dive, in order of time.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Log {
    /// Detections and marks.
    pub events: Vec<LogEvent>,
}

/// What was really the case at an event of the log.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Truth {
    /// True position of the vehicle.
    pub position: LocalPoint,
    /// Number of the landmark detected; none at a mark and for a stray.
    pub landmark: Option<usize>,
}

/// A simulated dive: the vehicle's log, and the truth beside it (same length, same order).
#[derive(Clone, Debug, Default, PartialEq)]
pub struct SimulatedDive {
    /// What the vehicle knows.
    pub log: Log,
    /// What was the case.
    pub truth: Vec<Truth>,
}

/// What a simulated dive needs besides its errors.
#[derive(Clone, Copy, Debug)]
pub struct Scene<'a> {
    /// The map.
    pub landmarks: &'a [Landmark],
    /// Its index.
    pub index: &'a LandmarkIndex,
    /// How the vehicle moves.
    pub vehicle: Vehicle,
    /// Bounds on dead reckoning.
    pub dead_reckoning: DeadReckoning,
    /// The sonar.
    pub sonar: Sonar,
    /// How far the start may lie from its planned place on the map, metres.
    pub scatter_m: f64,
    /// Chance that a landmark is gone in a dive, from 0 to below 1.
    pub gone_chance: f64,
}

/// Runs `plan` with `errors`; `marks_m` are distances along the track to mark in the log.
///
/// Two detections at the same instant are ordered by landmark number.
pub fn simulate(scene: &Scene<'_>, plan: &Plan, marks_m: &[f64], errors: &impl Errors) -> SimulatedDive {
    let legs = motion::true_legs(scene, plan, errors);
    let mut stops = sonar::sightings(scene, &legs, errors);
    stops.extend(strays::strays(scene, plan, &legs, errors));
    stops.extend(marks_m.iter().map(|&along_m| motion::stop_at_mark(&legs, along_m)));
    // By leg first: the end of a leg and the start of the next are the same place, in this order of time. Marks come
    // before detections at the same place, so that a start there does not lose the detection.
    stops.sort_by(|a, b| {
        a.leg
            .cmp(&b.leg)
            .then(a.run_m.total_cmp(&b.run_m))
            .then(a.sighting.is_some().cmp(&b.sighting.is_some()))
            .then(a.landmark.cmp(&b.landmark))
            .then(a.tie.cmp(&b.tie))
    });
    let mut dive = SimulatedDive::default();
    let mut travelled = motion::Travel::new(&legs, scene.vehicle.speed_mps);
    for stop in stops {
        dive.log.events.push(LogEvent {
            along_m: stop.along_m,
            time_s: stop.along_m / scene.vehicle.speed_mps,
            travel: travelled.until(stop.leg, stop.run_m),
            sighting: stop.sighting,
        });
        let position = legs[stop.leg].point_at(stop.run_m);
        dive.truth.push(Truth { position: LocalPoint::new(position.x, position.y), landmark: stop.landmark });
    }
    dive
}

/// Landmarks that come into the swath of the planned track when everything is as charted and without error: distances
/// along the track at which they are detected, in order.
pub fn expected_detections(scene: &Scene<'_>, plan: &Plan) -> Vec<f64> {
    let mut along: Vec<f64> =
        simulate(scene, plan, &[], &errors::NoErrors).log.events.iter().map(|event| event.along_m).collect();
    along.sort_by(f64::total_cmp);
    along
}

/// East and north of a point as a vector.
fn vector(p: LocalPoint) -> Vector2<f64> {
    Vector2::new(p.east_m, p.north_m)
}
