//! True motion along the planned shape, and the travel the vehicle reports of it.
//!
//! *Model.* The vehicle keeps the planned track over ground at its planned speed v. With a drift c it steers the
//! through-water velocity w = v·u − c, so its bow points along w (it crabs), its log reports |w| / (1 + σ) and its
//! compass reports the direction of w minus bias β and noise ν. Hence the true travel is
//! reported length · (1 + σ) in direction reported heading + β + ν, plus c·Δt, which is what the solver's bounds say.

use nalgebra::Vector2;

use super::{Errors, ReportedPiece, Scene, Sighting, vector};
use crate::interval::smaller;
use crate::track::plan::Plan;

/// Errors of a leg are held for at most this distance, metres, then drawn anew. (Any value is admissible: the bounds
/// leave the errors free at every instant. 25 m is shorter than the usual distance between detections, so errors
/// change within it.)
pub const ERROR_HOLD_M: f64 = 25.0;

/// A straight piece of true motion with constant errors.
#[derive(Clone, Copy, Debug)]
pub(super) struct TrueLeg {
    /// True start.
    pub start: Vector2<f64>,
    /// Unit vector of the true motion over ground.
    pub course: Vector2<f64>,
    /// Length over ground, metres.
    pub length_m: f64,
    /// Distance of the start along the track.
    pub along_m: f64,
    /// True heading of the bow.
    pub bow_rad: f64,
    /// Reported heading.
    pub reported_heading_rad: f64,
    /// Reported metres per metre over ground.
    pub reported_per_metre: f64,
    /// Whether landmarks can be detected here.
    pub sees: bool,
}

impl TrueLeg {
    /// The true position `run_m` metres after the start.
    pub fn point_at(&self, run_m: f64) -> Vector2<f64> {
        self.start + self.course * run_m
    }
}

/// A place where the log gets an event.
#[derive(Clone, Copy, Debug)]
pub(super) struct Stop {
    pub along_m: f64,
    pub leg: usize,
    pub run_m: f64,
    pub sighting: Option<Sighting>,
    pub landmark: Option<usize>,
    /// Orders two sightings of the same landmark at the same place.
    pub tie: usize,
}

/// The true motion along `plan`.
pub(super) fn true_legs(scene: &Scene<'_>, plan: &Plan, errors: &impl Errors) -> Vec<TrueLeg> {
    let offset = errors.start_offset() * scene.scatter_m;
    let bounds = scene.dead_reckoning;
    let bias = errors.heading_bias() * bounds.heading_bias_rad;
    let mut legs = Vec::new();
    for piece in &plan.pieces {
        let parts = (piece.length_m / ERROR_HOLD_M).ceil();
        let part_m = piece.length_m / parts;
        for k in 0..parts as usize {
            let run_m = k as f64 * part_m;
            let e = errors.leg(legs.len());
            let course = piece.direction();
            let water = course - e.drift * (bounds.drift_mps / scene.vehicle.speed_mps);
            let bow_rad =
                if bounds.drift_mps == 0.0 { piece.heading_rad } else { libm::atan2(water.x, water.y) };
            legs.push(TrueLeg {
                start: vector(piece.start) + course * run_m + offset,
                course,
                length_m: smaller(part_m, piece.length_m - run_m),
                along_m: piece.along_m + run_m,
                bow_rad,
                reported_heading_rad: bow_rad - bias - e.heading_noise * bounds.heading_noise_rad,
                reported_per_metre: water.norm() / (1.0 + e.scale * bounds.scale_error),
                sees: scene.sonar.detect_in_turns || !piece.in_turn,
            });
        }
    }
    legs
}

/// The stop for a mark at a distance along the track.
pub(super) fn stop_at_mark(legs: &[TrueLeg], along_m: f64) -> Stop {
    let leg = legs.partition_point(|leg| leg.along_m <= along_m).saturating_sub(1);
    let run_m = (along_m - legs[leg].along_m).clamp(0.0, legs[leg].length_m);
    Stop { along_m, leg, run_m, sighting: None, landmark: None, tie: 0 }
}

/// Walks along the legs and cuts the reported travel at stops.
pub(super) struct Travel<'a> {
    legs: &'a [TrueLeg],
    speed_mps: f64,
    leg: usize,
    run_m: f64,
}

impl<'a> Travel<'a> {
    pub fn new(legs: &'a [TrueLeg], speed_mps: f64) -> Self {
        Self { legs, speed_mps, leg: 0, run_m: 0.0 }
    }

    /// Reported travel from the last stop to `run_m` metres into leg number `leg`.
    pub fn until(&mut self, leg: usize, run_m: f64) -> Vec<ReportedPiece> {
        let mut pieces = Vec::new();
        while self.leg < leg {
            self.report(self.legs[self.leg].length_m, &mut pieces);
            self.leg += 1;
            self.run_m = 0.0;
        }
        self.report(run_m, &mut pieces);
        self.run_m = run_m;
        pieces
    }

    fn report(&self, to_m: f64, pieces: &mut Vec<ReportedPiece>) {
        let leg = &self.legs[self.leg];
        let ground_m = to_m - self.run_m;
        // Stops at a joint may differ from the leg's end by a rounding; no travel is lost, the position error is
        // covered by the solver's resolution allowance.
        if ground_m > 0.0 {
            pieces.push(ReportedPiece {
                length_m: ground_m * leg.reported_per_metre,
                heading_rad: leg.reported_heading_rad,
                duration_s: ground_m / self.speed_mps,
                is_blind: !leg.sees,
            });
        }
    }
}
