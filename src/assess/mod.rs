//! Scores: what is guaranteed of a line, what simulated dives say about it, and one dive in detail.
//!
//! What comes from `guarantee.rs` is true for every error within the bounds. Everything else is *estimated* from
//! simulated dives and carries a confidence interval. The two stand in fields of their own.

mod area;
mod check;
mod ensemble;
mod guarantee;
mod line;
mod rank;
mod remap;
mod sensitivity;
pub mod statistics;
mod suggest;
mod trace;

pub use area::{AREA_STARTS_MAX, area, area_grid, area_starts};
pub use check::{check, line_notices};
pub use line::score_lines;
pub use remap::{
    RegionIndex, RemapProgress, SurveyGround, mark_segments, remap, remap_area_options, survey_ground,
};
pub use sensitivity::{sensitivity, sensitivity_runs};
pub use suggest::{suggest, suggest_area_options};
pub use trace::{TraceError, TraceRequest, trace};

use geo::{Contains, Coord, LineString, Polygon, Rect};

use crate::detect::Scene;
use crate::dive::{Dive, ErrorShape};
use crate::frame::LocalPoint;
use crate::locate::cell::Cell;
use crate::locate::{Bounds, Silence, Solver, SolverMap};
use crate::map::Landmark;
use crate::report::{ChartLandmark, LandmarksReport, MapLandmark, Parameters, Provenance};
use crate::track::plan::Plan;
use crate::vehicle::SonarKind;

/// A dive made ready for simulation and solving.
#[derive(Debug)]
pub struct Setup<'a> {
    /// What was read.
    pub dive: &'a Dive,
    map: SolverMap,
    silence: Option<Silence>,
}

impl<'a> Setup<'a> {
    /// Indexes the map of `dive`.
    pub fn new(dive: &'a Dive) -> Self {
        let silence = dive.nothing_seen_inside.as_ref().and_then(|corners| {
            let is_certain = dive.landmarks.iter().map(|landmark| is_inside(landmark, corners)).collect();
            Silence::new(is_certain, dive.sonar)
        });
        Self { dive, map: SolverMap::new(&dive.landmarks), silence }
    }

    /// What a simulated dive needs.
    pub fn scene(&self) -> Scene<'_> {
        Scene {
            landmarks: &self.dive.landmarks,
            index: self.map.index(),
            vehicle: self.dive.vehicle,
            dead_reckoning: self.dive.dead_reckoning,
            sonar: self.dive.sonar,
            scatter_m: self.dive.start.scatter_on_map_m(),
            gone_chance: self.dive.gone_chance,
        }
    }

    /// The solver for this map and search area.
    pub fn solver(&self) -> Solver<'_> {
        Solver {
            map: &self.map,
            search_area: Cell::around_points(&self.dive.start.search_area),
            cell_budget: self.dive.scoring.cell_budget,
            stray_budget: self.dive.budget.strays,
            silence: self.silence.as_ref(),
            miss_budget: self.dive.budget.misses,
            fix_size_m: self.dive.scoring.fix_size_m,
        }
    }

    /// The error bounds for the solver.
    pub fn bounds(&self) -> Bounds {
        Bounds {
            dead_reckoning: self.dive.dead_reckoning,
            sonar: self.dive.sonar,
            heading_slices: self.dive.heading_slices,
        }
    }

    /// The error shape of a draw: the shapes of the dive file in turn.
    fn shape_of(&self, draw: usize) -> ErrorShape {
        let shapes = &self.dive.scoring.error_shapes;
        shapes[draw % shapes.len()]
    }

    /// Length of the track on which nothing is detected because the vehicle turns, metres.
    fn blind_turn_m(&self, plan: &Plan) -> f64 {
        if self.dive.sonar.detect_in_turns { 0.0 } else { plan.turn_length_m() }
    }

    /// Distances along a track of `length_m` at which segments start.
    fn segment_starts(&self, length_m: f64) -> Vec<f64> {
        // A rest of less than half a segment joins the segment before it.
        let count = (length_m / self.dive.scoring.segment_m).round().clamp(1.0, f64::INFINITY);
        (0..count as usize).map(|k| k as f64 * self.dive.scoring.segment_m).collect()
    }

    /// Where a report of this dive comes from.
    pub fn provenance(&self, schema: &'static str) -> Provenance {
        let dive = self.dive;
        Provenance {
            schema,
            schema_version: 1,
            tool_version: env!("CARGO_PKG_VERSION"),
            dive: dive.name.clone(),
            inputs: dive.inputs.clone(),
            seed: dive.scoring.seed,
            generator: crate::detect::GENERATOR,
            issued: dive.issued.map(|date| date.to_string()),
            surveyed: dive.surveyed.map(|date| date.to_string()),
            map_age_days: dive
                .issued
                .zip(dive.surveyed)
                .map(|(issued, surveyed)| (issued - surveyed).whole_days()),
            coordinate_system: dive.frame.name(),
            epsg: dive.frame.epsg(),
            frame: dive.frame.clone(),
            caution: crate::report::CAUTION,
        }
    }

    /// The landmarks as charts draw them.
    pub fn chart_landmarks(&self) -> Vec<ChartLandmark> {
        self.dive
            .landmarks
            .iter()
            .map(|landmark| ChartLandmark {
                position: landmark.position,
                half_width_east_m: landmark.half_width_east_m,
                half_width_north_m: landmark.half_width_north_m,
            })
            .collect()
    }

    /// The landmarks as understood.
    pub fn landmarks_report(&self) -> LandmarksReport {
        let landmark = |landmark: &Landmark| MapLandmark {
            id: landmark.id.clone(),
            position: landmark.position,
            half_width_east_m: landmark.half_width_east_m,
            half_width_north_m: landmark.half_width_north_m,
        };
        LandmarksReport {
            provenance: self.provenance("fixability.landmarks"),
            landmark_uncertainty: self.dive.uncertainty_statement.clone(),
            landmarks: self.dive.landmarks.iter().map(landmark).collect(),
        }
    }

    /// Every parameter in force.
    pub fn parameters(&self) -> Parameters {
        let dive = self.dive;
        let (sonar, bounds, scoring) = (&dive.sonar, &dive.dead_reckoning, &dive.scoring);
        let (sonar_kind, sector_deg, nadir_gap_deg) = match sonar.kind {
            SonarKind::SideLooking { nadir_gap_rad } => ("side-looking", None, Some(degrees(nadir_gap_rad))),
            SonarKind::ForwardLooking { half_sector_rad } => {
                ("forward-looking", Some(degrees(2.0 * half_sector_rad)), None)
            }
        };
        let half_widths = || dive.landmarks.iter().flat_map(|l| [l.half_width_east_m, l.half_width_north_m]);
        Parameters {
            speed_mps: dive.vehicle.speed_mps,
            turn_radius_m: dive.vehicle.turn_radius_m,
            scale_error_pct: per_cent(bounds.scale_error),
            heading_bias_deg: degrees(bounds.heading_bias_rad),
            heading_noise_deg: degrees(bounds.heading_noise_rad),
            drift_mps: bounds.drift_mps,
            heading_slices: dive.heading_slices,
            sonar_kind,
            range_min_m: sonar.range_min_m,
            range_max_m: sonar.range_max_m,
            nearest_horizontal_m: sonar.nearest_m(),
            farthest_horizontal_m: sonar.reach_m(),
            sector_deg,
            nadir_gap_deg,
            altitude_m: sonar.altitude_m,
            range_error_m: sonar.range_error_m,
            range_error_pct: per_cent(sonar.range_error_fraction),
            bearing_error_deg: degrees(sonar.bearing_error_rad),
            altitude_error_m: sonar.altitude_error_m,
            detection_chance: sonar.detection_chance,
            strays_per_km: sonar.strays_per_km,
            detect_in_turns: sonar.detect_in_turns,
            landmarks: dive.landmarks.len(),
            landmark_uncertainty: dive.uncertainty_statement.clone(),
            half_width_min_m: half_widths().min_by(f64::total_cmp),
            half_width_max_m: half_widths().max_by(f64::total_cmp),
            stray_budget: dive.budget.strays,
            miss_budget: dive.budget.misses,
            nothing_seen: self.silence.is_some(),
            search_area_km2: Cell::around_points(&dive.start.search_area).area_m2() / 1e6,
            scatter_m: dive.start.scatter_m,
            common_shift_m: dive.start.common_shift_m,
            gone_chance: dive.gone_chance,
            fix_size_m: scoring.fix_size_m,
            required_fix_m: scoring.required_fix_m,
            segment_m: scoring.segment_m,
            draws: scoring.draws,
            error_shapes: scoring.error_shapes.clone(),
            cell_budget: scoring.cell_budget,
        }
    }
}

/// Whether a landmark's whole box lies inside a polygon.
fn is_inside(landmark: &Landmark, corners: &[LocalPoint]) -> bool {
    let ring = corners.iter().map(|p| Coord { x: p.east_m, y: p.north_m }).collect();
    let polygon = Polygon::new(LineString::new(ring), vec![]);
    let b = landmark.bounds();
    let low = Coord { x: b.east.lo(), y: b.north.lo() };
    let high = Coord { x: b.east.hi(), y: b.north.hi() };
    polygon.contains(&Rect::new(low, high).to_polygon())
}

/// Radians as the degrees that a user would type: rounded to 10⁻⁹°, so that 30° does not come back as 29.999999999999996.
/// For display only; the bounds themselves are never rounded.
fn degrees(radians: f64) -> f64 {
    (radians.to_degrees() * 1e9).round() / 1e9
}

/// A fraction as per cent, likewise.
fn per_cent(fraction: f64) -> f64 {
    (fraction * 100.0 * 1e9).round() / 1e9
}
