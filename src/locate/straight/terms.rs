//! The sets of one heading: what [`ComposedRun`](super::super::ComposedRun) puts into its steps, with sines and cosines
//! taken once per heading instead of once per sighting. Every number is the same to the last digit (tested below).

use crate::detect::Scene;
use crate::frame::LocalPoint;
use crate::interval::{Interval, larger};
use crate::locate::Bounds;
use crate::locate::cell::{DIRECTION_COUNT, Fan, Reaches, add_reaches, disc_reaches, mirrored};
use crate::locate::certain::{CertainSighting, PieceGeometry, beam_bearing};
use crate::locate::composed::{COMPOSED_RESOLUTION_M, composed_travels};
use crate::locate::steps::{Look, TravelError};
use crate::track::plan::{Piece, Plan};
use crate::vehicle::SonarKind;

/// One window of the difference of heading biases, on one heading.
#[derive(Debug)]
struct Window {
    travel: TravelError,
    /// Directions of travel.
    course: Fan,
    /// Directions of landmarks, for the bearings that every sighting of a side-looking sonar has.
    beams: Vec<(Interval, Fan)>,
}

/// All that straight runs on one heading have in common.
#[derive(Debug)]
pub(super) struct HeadingTerms {
    pub heading_rad: f64,
    pub geometry: PieceGeometry,
    speed_mps: f64,
    /// Directions of the track itself.
    track: Fan,
    windows: Vec<Window>,
}

/// The sets of one certain sighting, one entry per window of bias.
#[derive(Debug)]
pub(super) struct StepSets {
    /// Displacement since the sighting before, or since the start.
    pub travel: Vec<Reaches>,
    /// Relative positions of the landmark.
    pub looks: Vec<Look>,
}

impl HeadingTerms {
    pub fn new(scene: &Scene<'_>, bounds: &Bounds, heading_rad: f64) -> Self {
        // Where the piece starts and ends does not enter.
        let piece = Plan::straight(LocalPoint::new(0.0, 0.0), heading_rad, 1.0).pieces[0];
        let geometry = PieceGeometry::new(scene, &piece, bounds);
        let heading = Interval::point(heading_rad);
        let bearings: Vec<Interval> = match scene.sonar.kind {
            SonarKind::SideLooking { .. } => [1.0, -1.0]
                .into_iter()
                .filter_map(|side| beam_bearing(&geometry, side, heading_rad))
                .collect(),
            SonarKind::ForwardLooking { .. } => Vec::new(),
        };
        let windows = composed_travels(bounds)
            .into_iter()
            .map(|travel| Window {
                course: Fan::new(heading + travel.heading),
                beams: bearings
                    .iter()
                    .map(|&bearing| (bearing, Fan::new(bearing + travel.heading)))
                    .collect(),
                travel,
            })
            .collect();
        let speed_mps = scene.vehicle.speed_mps;
        Self { heading_rad, geometry, speed_mps, track: Fan::new(heading), windows }
    }

    /// Number of windows of bias.
    pub fn window_count(&self) -> usize {
        self.windows.len()
    }

    /// The certain sighting of a landmark from `piece`.
    pub fn sightings(
        &self,
        scene: &Scene<'_>,
        piece: &Piece,
        landmark: usize,
        found: &mut Vec<CertainSighting>,
    ) {
        self.geometry.sightings(scene, piece, landmark, found);
    }

    /// The sets of a sighting after one at `from_m` along the track (or the start, 0).
    pub fn step(&self, sighting: &CertainSighting, from_m: f64) -> StepSets {
        let to_m = sighting.window.hi();
        StepSets {
            travel: self
                .windows
                .iter()
                .map(|window| {
                    // The solver adds the travel of a step to a total of zero, rounding outward.
                    let mut total = [0.0; DIRECTION_COUNT];
                    add_reaches(&mut total, &self.travel(window, to_m - from_m));
                    total
                })
                .collect(),
            looks: self.windows.iter().map(|window| self.look(window, sighting)).collect(),
        }
    }

    /// [`TravelError::reaches`] over one piece of `length_m`, or none when that is 0.
    fn travel(&self, window: &Window, length_m: f64) -> Reaches {
        let mut total = [0.0; DIRECTION_COUNT];
        let mut slack_m = Interval::point(window.travel.slack_m);
        if length_m > 0.0 {
            add_reaches(&mut total, &window.course.reaches(Interval::point(length_m) * window.travel.scale));
            let duration = Interval::point(length_m / self.speed_mps);
            slack_m = slack_m + Interval::point(window.travel.drift_mps) * duration;
        }
        add_reaches(&mut total, &disc_reaches(slack_m.hi()));
        total
    }

    /// As [`CertainSighting::look`].
    fn look(&self, window: &Window, sighting: &CertainSighting) -> Look {
        let known = window.beams.iter().find(|(bearing, _)| *bearing == sighting.theta);
        let fan = known.map_or_else(|| Fan::new(sighting.theta + window.travel.heading), |(_, fan)| *fan);
        let mut from_landmark = mirrored(&fan.reaches(sighting.rho));
        let carried = self.travel_of_piece(window, sighting.window.width()).map(|reach| larger(reach, 0.0));
        add_reaches(&mut from_landmark, &carried);
        add_reaches(&mut from_landmark, &disc_reaches(COMPOSED_RESOLUTION_M));
        Look::new(from_landmark)
    }

    /// As [`HeadingTerms::travel`], with a piece even when its length is 0.
    fn travel_of_piece(&self, window: &Window, length_m: f64) -> Reaches {
        let mut total = [0.0; DIRECTION_COUNT];
        add_reaches(&mut total, &window.course.reaches(Interval::point(length_m) * window.travel.scale));
        let duration = Interval::point(length_m / self.speed_mps);
        let slack_m =
            Interval::point(window.travel.slack_m) + Interval::point(window.travel.drift_mps) * duration;
        add_reaches(&mut total, &disc_reaches(slack_m.hi()));
        total
    }

    /// As [`CertainSighting::drift_apart`], for one window.
    pub fn drift_apart(&self, window: usize, sighting: &CertainSighting) -> Reaches {
        let window = &self.windows[window];
        let length = Interval::point(sighting.window.width());
        let mut apart = self.track.reaches(length);
        let turned = mirrored(&window.course.reaches(length * window.travel.scale));
        add_reaches(&mut apart, &turned);
        apart.map(|reach| larger(reach, 0.0))
    }
}
