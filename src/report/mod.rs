//! Plain values that say what was asked and what was found. Exporters and charts use nothing else.
//!
//! *Units.* In every key name. *Missing* is `None`, never zero.

mod area;
mod brief;
mod landmarks;
mod lookalikes;
mod remap;
mod sensitivity;
mod suggest;

pub use area::{AREA_STATEMENT, AreaCell, AreaGrid, AreaReport, NoFixCounts, RunOutcome};
pub use brief::{AbortDistance, BriefReport, Finding, PackFile, Verdict};
pub use landmarks::{LandmarksReport, MapLandmark};
pub use lookalikes::{
    ChartLine, LOOK_ALIKE_STATEMENT, LookAlike, LookAlikeKind, LookAlikeStretch, LookAlikesReport, Period,
    RegularLayout, TellTale,
};
pub use remap::{
    CauseShare, LineOverRegions, REMAP_STATEMENT, RegionOutline, RegionStretch, RemapCause, RemapRegion,
    RemapReport, Resurvey, TOO_FEW_LANDMARKS_NOTE,
};
pub use sensitivity::{
    BoundValue, GuaranteedChange, GuaranteedFigures, ImprovedBound, SENSITIVITY_STATEMENT, SensitivityLine,
    SensitivityReport, SensitivityVerdict, ZeroBound,
};
pub use suggest::{CauseCount, SUGGEST_STATEMENT, SuggestReport, SuggestedStart, Suggestion};

use serde::Serialize;

use crate::dive::{InputFile, RankBy};
use crate::frame::{Frame, LocalPoint};

/// The caution every output carries.
pub const CAUTION: &str = "Planning aid, not for navigation. A fix is unambiguous only while the stated error bounds hold and the map is as described. No statement that ground is clear of objects. The vehicle's safety case, local regulations and qualified personnel decide.";

/// What files with landmark positions say of them.
pub const CONTACT_POSITIONS: &str = "This file contains positions of contacts, which may be sensitive. Pass it on only to those who may have them.";

/// What produced an output and from what.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Provenance {
    /// Name of the schema, such as `fixability.lines`.
    pub schema: &'static str,
    /// Version of the schema.
    pub schema_version: u32,
    /// Version of the program.
    pub tool_version: &'static str,
    /// Title of the dive.
    pub dive: String,
    /// Input files with fingerprints.
    pub inputs: Vec<InputFile>,
    /// Seed of the generator.
    pub seed: u64,
    /// Name of the generator.
    pub generator: &'static str,
    /// Date of issue as year-month-day; none unless the dive file states it.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub issued: Option<String>,
    /// Date of the survey behind the map as year-month-day; none unless the dive file states it.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub surveyed: Option<String>,
    /// Days from the survey to the issue; none unless both dates are stated.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub map_age_days: Option<i64>,
    /// Working frame in words: `WGS 84 / UTM zone 31N (EPSG:32631)` or `local metres`.
    pub coordinate_system: String,
    /// EPSG code of the working frame; none for local metres.
    pub epsg: Option<u16>,
    /// The working frame itself, for charts and files that show latitude and longitude.
    #[serde(skip)]
    pub frame: Frame,
    /// The caution text.
    pub caution: &'static str,
}

/// Every parameter in force, in users' units, as the dive file would state it.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Parameters {
    /// Speed over ground, m/s.
    pub speed_mps: f64,
    /// Turn radius, m.
    pub turn_radius_m: f64,
    /// Dead-reckoning scale error, % of distance, with the grid's distortion added.
    pub scale_error_pct: f64,
    /// Heading bias, ± degrees.
    pub heading_bias_deg: f64,
    /// Heading noise, ± degrees, with the grid's change of convergence over the site added.
    pub heading_noise_deg: f64,
    /// Unknown drift, m/s.
    pub drift_mps: f64,
    /// Slices of the heading bias.
    pub heading_slices: usize,
    /// `side-looking` or `forward-looking`.
    pub sonar_kind: &'static str,
    /// Shortest slant range, m.
    pub range_min_m: f64,
    /// Longest slant range, m.
    pub range_max_m: f64,
    /// Shortest horizontal range at the nominal altitude, m.
    pub nearest_horizontal_m: f64,
    /// Longest horizontal range at the nominal altitude, m.
    pub farthest_horizontal_m: f64,
    /// Full opening of the forward sector, degrees; none for side-looking sonar.
    pub sector_deg: Option<f64>,
    /// Nadir gap off the vertical, degrees; none for forward-looking sonar.
    pub nadir_gap_deg: Option<f64>,
    /// Altitude, m.
    pub altitude_m: f64,
    /// Constant slant-range error, ± m.
    pub range_error_m: f64,
    /// Growing slant-range error, ± % of range, with the grid's distortion added.
    pub range_error_pct: f64,
    /// Bearing error, ± degrees.
    pub bearing_error_deg: f64,
    /// Altitude error, ± m.
    pub altitude_error_m: f64,
    /// Detection chance, 0 to 1.
    pub detection_chance: f64,
    /// Simulated strays, per km of line.
    pub strays_per_km: f64,
    /// Whether landmarks are detected in turns.
    pub detect_in_turns: bool,
    /// Landmarks on the map.
    pub landmarks: usize,
    /// How the landmarks' uncertainty was declared and turned into bounds.
    pub landmark_uncertainty: String,
    /// Smallest half-width of a landmark's box, m; none without landmarks.
    pub half_width_min_m: Option<f64>,
    /// Largest half-width of a landmark's box, m; none without landmarks.
    pub half_width_max_m: Option<f64>,
    /// Most detections per run that may be strays.
    pub stray_budget: u8,
    /// Most landmarks per run that may be missed.
    pub miss_budget: u8,
    /// Whether "nothing seen" is used as evidence.
    pub nothing_seen: bool,
    /// Area of the search area, km².
    pub search_area_km2: f64,
    /// Descent scatter radius, m.
    pub scatter_m: f64,
    /// Largest common shift of the whole map, m; it adds to every absolute position.
    pub common_shift_m: f64,
    /// Chance that a landmark of the map is gone, in simulated dives, 0 to 1.
    pub gone_chance: f64,
    /// Fix size, m.
    pub fix_size_m: f64,
    /// Required fix distance, m.
    pub required_fix_m: f64,
    /// Segment length, m.
    pub segment_m: f64,
    /// Simulated dives per line.
    pub draws: usize,
    /// Error shapes in turn.
    pub error_shapes: Vec<crate::dive::ErrorShape>,
    /// Cell budget of the solver.
    pub cell_budget: usize,
}

/// A value with a 95 % confidence interval. An end that lies beyond what the draws can tell is `None`.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct Estimate {
    /// Best value; none where the draws have none (for example a percentile that falls among dives without a fix).
    pub value: Option<f64>,
    /// Lower end of the 95 % confidence interval.
    pub low: Option<f64>,
    /// Upper end of the 95 % confidence interval.
    pub high: Option<f64>,
}

/// Statistics of simulated dives: *estimated*, never guaranteed.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct EstimatedFix {
    /// Simulated dives counted.
    pub dives: usize,
    /// Median fix distance, m.
    pub median_m: Estimate,
    /// 95th percentile fix distance, m.
    pub p95_m: Estimate,
    /// Share of dives with a fix within the required distance (0 to 1).
    pub within_required_share: Estimate,
    /// Share of dives with no fix before the line ends (0 to 1), undecided dives included.
    pub no_fix_share: Estimate,
    /// Median distance to a fix that lasts to the end of the line, m.
    pub lasting_median_m: Estimate,
    /// 95th percentile of the distance to a fix that lasts to the end of the line, m.
    pub lasting_p95_m: Estimate,
    /// Share of dives in which a fix was lost again before the line ended (0 to 1).
    pub relapse_share: f64,
    /// Share of runs in which no position explained the detections (0 to 1): the bounds were violated. Such runs count as
    /// runs without a fix.
    pub contradiction_share: f64,
    /// Share of dives whose first fix does not hold the true position (0 to 1). Above 0 only where more strays were
    /// drawn than the stray budget covers.
    pub wrong_fix_share: f64,
    /// Share of dives in which the solver ran out of its cell budget (0 to 1).
    pub undecided_share: f64,
}

/// Why there is no guaranteed fix.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Cause {
    /// Too few landmarks are certain to be detected before the line ends.
    TooFewLandmarks,
    /// Several places still fit: the ground looks like other ground within the bounds.
    LookAlikes,
    /// One place is left, but it is wider than the fix size.
    TooWide,
    /// The solver ran out of its cell budget.
    Undecided,
    /// Detection is not certain and no miss is budgeted.
    DetectionNotCertain,
}

impl Cause {
    /// The word used in files.
    pub fn word(self) -> &'static str {
        match self {
            Self::TooFewLandmarks => "too-few-landmarks",
            Self::LookAlikes => "look-alikes",
            Self::TooWide => "too-wide",
            Self::Undecided => "undecided",
            Self::DetectionNotCertain => "detection-not-certain",
        }
    }
}

/// True for every error within the bounds: *guaranteed*.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct GuaranteedFix {
    /// Guaranteed fix distance, m: the worst over the offset tracks; none when some track has none before the line ends.
    pub distance_m: Option<f64>,
    /// Guaranteed distance to a fix that lasts to the end of the line, m.
    pub lasting_m: Option<f64>,
    /// Landmarks that are certain to be detected from here to the end of the line, on the worst track.
    pub certain_detections: usize,
    /// Why there is no guaranteed fix; none when there is one.
    pub cause: Option<Cause>,
    /// The same in words.
    pub reason: Option<String>,
}

/// What the guaranteed figures of a line say together.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct GuaranteedLine {
    /// Share of the line's length whose segments have a guaranteed fix within the required distance (0 to 1).
    pub within_required_share: f64,
    /// Share of the line's length whose segments have no guaranteed fix (0 to 1).
    pub no_fix_share: f64,
    /// Longest guaranteed fix distance of those segments that have one, m.
    pub longest_m: Option<f64>,
}

/// What the guaranteed figures are true for.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct GuaranteeTerms {
    /// Tracks for which each figure was computed; the worst is reported.
    pub offset_tracks: usize,
    /// How they lie.
    pub offset_pattern: String,
    /// In words.
    pub statement: &'static str,
}

/// The terms of every guaranteed figure.
pub const GUARANTEE_STATEMENT: &str = "On each of the offset tracks, every dive whose errors, strays and misses lie within the stated bounds and budgets has a fix within this distance. Tracks between the offset tracks are not covered by proof.";

/// One scored segment of a line: the vehicle is lost at its start.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct SegmentReport {
    /// Number along the line, from 1.
    pub number: usize,
    /// Distance of the segment's start along the line, m.
    pub start_m: f64,
    /// Distance of the segment's end along the line, m.
    pub end_m: f64,
    /// Points of the planned track from start to end, turns included.
    pub path: Vec<LocalPoint>,
    /// Landmarks expected in the swath from here to the end of the line (planned track, charted positions).
    pub detections_ahead: usize,
    /// Statistics of simulated dives that start lost here.
    pub estimated: EstimatedFix,
    /// Guaranteed fix distance from here.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub guaranteed: Option<GuaranteedFix>,
    /// Numbers of the listed look-alikes (as `lookalikes` lists them) over whose ground the segment runs, ascending.
    pub look_alikes: Vec<usize>,
    /// Numbers of the remap regions that the segment runs over; empty when none or not asked.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub remap_regions: Vec<usize>,
}

/// Ambiguity against distance run, over all segment starts and dives of a line (*estimated*).
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ProfilePoint {
    /// Distance run since the vehicle was lost, m.
    pub run_m: f64,
    /// Dives that still have line to run at this distance.
    pub dives: usize,
    /// Median number of places; none before the first detection in half of the dives.
    pub places_median: Option<f64>,
    /// 95th percentile of the number of places.
    pub places_p95: Option<f64>,
    /// Median spread, m.
    pub spread_median_m: Option<f64>,
    /// 95th percentile of the spread, m.
    pub spread_p95_m: Option<f64>,
    /// Share of dives that have had a fix by this distance.
    pub fixed_share: f64,
}

/// One scored line.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct LineReport {
    /// Name.
    pub name: String,
    /// Place in the ranking, from 1.
    pub rank: usize,
    /// Length of the planned track, m.
    pub length_m: f64,
    /// Landmarks expected in the swath over the whole line.
    pub detections_expected: usize,
    /// Distance of the line spent in turns without detections, m.
    pub blind_turn_m: f64,
    /// Waypoints as planned.
    pub waypoints: Vec<LocalPoint>,
    /// Over all segment starts.
    pub estimated: EstimatedFix,
    /// Share of segment starts whose estimated 95th percentile is within the required distance (0 to 1).
    pub segments_p95_within_share: f64,
    /// Guaranteed figures over the whole line.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub guaranteed: Option<GuaranteedLine>,
    /// By segment.
    pub segments: Vec<SegmentReport>,
    /// Against distance run.
    pub profile: Vec<ProfilePoint>,
}

/// A landmark as charts draw it. Not exported: contact positions may be sensitive.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ChartLandmark {
    /// Charted position.
    pub position: LocalPoint,
    /// Half-width east, m.
    pub half_width_east_m: f64,
    /// Half-width north, m.
    pub half_width_north_m: f64,
}

/// The result of `lines`.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct LinesReport {
    /// Where this comes from.
    #[serde(flatten)]
    pub provenance: Provenance,
    /// What was asked.
    pub parameters: Parameters,
    /// Key that orders the ranking.
    pub rank_by: RankBy,
    /// What the guaranteed figures are true for.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub guarantee: Option<GuaranteeTerms>,
    /// Lines in the order of the file; `rank` gives the ranking.
    pub lines: Vec<LineReport>,
    /// For the chart.
    #[serde(skip)]
    pub landmarks: Vec<ChartLandmark>,
}

/// A line as understood, before it is scored.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct CheckedLine {
    /// Name.
    pub name: String,
    /// Waypoints as planned.
    pub waypoints: Vec<LocalPoint>,
    /// Length of the planned track, m.
    pub length_m: f64,
    /// Landmarks expected in the swath over the whole line.
    pub detections_expected: usize,
    /// Distance of the line spent in turns without detections, m.
    pub blind_turn_m: f64,
}

/// The result of `check`.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct CheckReport {
    /// Where this comes from.
    #[serde(flatten)]
    pub provenance: Provenance,
    /// What was asked.
    pub parameters: Parameters,
    /// The lines.
    pub lines: Vec<CheckedLine>,
    /// What was understood and what to watch.
    pub notices: Vec<crate::problem::Notice>,
}

/// What is known about one detection of a traced dive once all of its detections have been seen.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct HindsightEvent {
    /// Cells in the feasible set.
    pub cells: usize,
    /// Number of places.
    pub places: usize,
    /// Spread, m.
    pub spread_m: f64,
    /// The landmark that was certainly seen, when there is only one and the detection cannot be a stray.
    pub identified: Option<String>,
    /// Number of landmarks that may have been seen.
    pub candidate_count: usize,
    /// Identifiers of these landmarks, at most [`TRACE_CANDIDATES_MAX`] of them.
    pub candidates: Vec<String>,
    /// Whether the detection may be a stray. (With a stray budget that the dive does not use up, any may be.)
    pub may_be_stray: bool,
    /// Whether the true position lies in the feasible set.
    pub truth_inside: bool,
    /// Corners of each feasible cell, at most [`TRACE_CELLS_MAX`] of them.
    pub cell_corners: Vec<Vec<LocalPoint>>,
}

/// Most candidates that a trace names per detection.
pub const TRACE_CANDIDATES_MAX: usize = 20;

/// What is known about a traced dive once all of its detections have been seen.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Hindsight {
    /// Sweeps made over the dive, backward and forward counted one by one.
    pub sweeps: usize,
    /// Whether the last sweep changed nothing worth another.
    pub at_rest: bool,
    /// Number of places where the vehicle may have been when it was lost.
    pub start_places: usize,
    /// Spread of the positions where the vehicle may have been when it was lost, m.
    pub start_spread_m: f64,
    /// Longest interval of the corridor, metres of reported travel.
    pub corridor_spacing_m: f64,
    /// Where the vehicle may have been at every instant, interval by interval, in order.
    pub corridor: Vec<CorridorReport>,
}

/// Where the vehicle may have been during an interval: at every instant of it, inside one of the polygons.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct CorridorReport {
    /// Reported distance run since the vehicle was lost at the start of the interval, m.
    pub reported_from_m: f64,
    /// Reported distance run since the vehicle was lost at the end of the interval, m.
    pub reported_to_m: f64,
    /// Time since the vehicle was lost at the start of the interval, s.
    pub from_s: f64,
    /// Time since the vehicle was lost at the end of the interval, s.
    pub to_s: f64,
    /// Corners of each polygon, in order. All of them together hold the vehicle.
    pub polygons: Vec<Vec<LocalPoint>>,
}

/// One event of a traced dive. Figures outside of `hindsight` use what was seen so far; those inside use all that was
/// seen on the dive.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct TraceEvent {
    /// Number from 1.
    pub number: usize,
    /// Distance run since the vehicle was lost, m.
    pub run_m: f64,
    /// Distance along the line, m.
    pub along_m: f64,
    /// Time since the vehicle was lost, s.
    pub time_s: f64,
    /// Measured slant range, m.
    pub slant_range_m: f64,
    /// Measured bearing relative to the bow, degrees, starboard positive.
    pub relative_bearing_deg: f64,
    /// Reported heading, degrees.
    pub heading_deg: f64,
    /// Cells in the feasible set.
    pub cells: usize,
    /// Number of places.
    pub places: usize,
    /// Spread, m; none when the set is empty.
    pub spread_m: Option<f64>,
    /// Whether the spread is at most the fix size.
    pub is_fix: bool,
    /// Identifier of the landmark that was really seen, or `stray` (known to the simulator only).
    pub true_landmark: String,
    /// True position (known to the simulator only).
    pub true_position: LocalPoint,
    /// Whether the true position lies in the feasible set.
    pub truth_inside: bool,
    /// Corners of each feasible cell, at most [`TRACE_CELLS_MAX`] of them.
    pub cell_corners: Vec<Vec<LocalPoint>>,
    /// What is known about this detection once the whole dive has been seen; none when nothing explains the dive.
    pub hindsight: Option<HindsightEvent>,
}

/// Most cells whose corners a trace writes per event.
pub const TRACE_CELLS_MAX: usize = 2000;

/// The bounds contradict the data: no position explains the detections up to an event.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct Contradiction {
    /// Number of the first event at which nothing is left.
    pub event: usize,
    /// Distance run until then, m.
    pub run_m: f64,
    /// Smallest stray budget with which some position explains the whole dive; none when none of those tried does.
    pub smallest_stray_budget: Option<u8>,
    /// Largest stray budget tried.
    pub tried_up_to: u8,
}

/// The result of `trace`.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct TraceReport {
    /// Where this comes from.
    #[serde(flatten)]
    pub provenance: Provenance,
    /// What was asked.
    pub parameters: Parameters,
    /// Line traced.
    pub line: String,
    /// Distance along the line at which the vehicle is lost, m.
    pub from_m: f64,
    /// Number of the draw.
    pub draw: usize,
    /// Error shape of the draw.
    pub error_shape: crate::dive::ErrorShape,
    /// Fix distance, m; none without a fix.
    pub fix_distance_m: Option<f64>,
    /// Distance to a fix that lasts to the end of the line, m; none without one.
    pub lasting_fix_distance_m: Option<f64>,
    /// Number of times a fix was lost again.
    pub relapses: usize,
    /// Where the bounds contradict the data; none where some position explains every detection.
    pub contradiction: Option<Contradiction>,
    /// Whether the solver ran out of its cell budget.
    pub undecided: bool,
    /// Planned track from start to end, turns included.
    pub path: Vec<LocalPoint>,
    /// Search area, corners in order.
    pub search_area: Vec<LocalPoint>,
    /// The events.
    pub events: Vec<TraceEvent>,
    /// What is known once the whole dive has been seen; none when nothing explains the dive. When the solver ran out of
    /// its cell budget, the whole dive means the detections up to there.
    pub hindsight: Option<Hindsight>,
    /// For the chart.
    #[serde(skip)]
    pub landmarks: Vec<ChartLandmark>,
}
