//! The result of `suggest`: where to dive, and on which heading to run first.

use serde::Serialize;

use super::{AreaGrid, Cause, ChartLandmark, Parameters, Provenance};
use crate::dive::{AreaOptions, SuggestOptions};
use crate::frame::{GeoPoint, LocalPoint};

/// The terms of every figure of a suggestion.
pub const SUGGEST_STATEMENT: &str = "From each of the starts computed in the scatter disc, every dive on that heading whose errors, strays and misses lie within the stated bounds and budgets has a fix within this distance. The vehicle knows only that it started inside the search area. Starts between them and other headings are not covered by proof.";

/// One start in the scatter disc of a suggestion.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct SuggestedStart {
    /// Where the vehicle starts to run.
    pub position: LocalPoint,
    /// Guaranteed fix distance from here, m.
    pub fix_m: f64,
}

/// A dive point and a first heading.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Suggestion {
    /// Number from 1: its place in the ranking.
    pub number: usize,
    /// Name of the line in the exported files: `S1`.
    pub name: String,
    /// Middle of the scatter disc.
    pub dive_point: LocalPoint,
    /// The same on the Earth; none with local metres.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub dive_point_wgs84: Option<GeoPoint>,
    /// First heading, degrees clockwise from grid north.
    pub heading_deg: f64,
    /// Guaranteed fix distance, m: the longest over the starts.
    pub fix_m: f64,
    /// Shortest guaranteed fix distance over the starts, m.
    pub shortest_fix_m: f64,
    /// Median of the guaranteed fix distances over the starts, m.
    pub median_fix_m: f64,
    /// Whether the guaranteed fix distance is within the required one.
    pub within_required: bool,
    /// Length of the exported line from the dive point, m.
    pub line_m: f64,
    /// End of the exported line.
    pub line_end: LocalPoint,
    /// The same on the Earth; none with local metres.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub line_end_wgs84: Option<GeoPoint>,
    /// The starts computed: dive point, rings about it, and the cell centres of the search inside the disc.
    pub starts: Vec<SuggestedStart>,
}

/// Candidates (dive point and heading) without a guaranteed fix, by the cause of the first start that has none.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
pub struct CauseCount {
    /// The cause.
    pub cause: Cause,
    /// Candidates.
    pub candidates: usize,
}

/// The result of `suggest`.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct SuggestReport {
    /// Where this comes from.
    #[serde(flatten)]
    pub provenance: Provenance,
    /// What was asked of the dive.
    pub parameters: Parameters,
    /// What was asked of the list.
    pub options: SuggestOptions,
    /// The search: cells whose centres are tried as dive points, headings, longest run.
    pub search: AreaOptions,
    /// What the figures mean.
    pub statement: &'static str,
    /// Radius of the scatter disc on the map, m: descent scatter and common shift.
    pub scatter_m: f64,
    /// The starts computed in a scatter disc, in words.
    pub start_pattern: String,
    /// Least distance between two dive points of the list, m: the scatter disc's width or twice the sonar's reach.
    pub apart_m: f64,
    /// Where the cells lie.
    pub grid: AreaGrid,
    /// Cells of the search area.
    pub cells: usize,
    /// Cells whose scatter disc lies inside the search area: the dive points tried.
    pub dive_points: usize,
    /// Candidates: dive points times headings.
    pub candidates: usize,
    /// Candidates with a guaranteed fix from every cell centre in the disc, inside the search area.
    pub candidates_with_fix: usize,
    /// Candidates whose run to the guaranteed fix leaves the search area.
    pub candidates_leaving: usize,
    /// Candidates solved again from all starts in the disc.
    pub candidates_refined: usize,
    /// Candidates without a guaranteed fix, by cause, most first.
    pub without_fix: Vec<CauseCount>,
    /// Whether the cell budget ran out on some run.
    pub undecided: bool,
    /// The answer in words.
    pub verdict: String,
    /// The suggestions, best first; empty when no candidate has a guaranteed fix.
    pub suggestions: Vec<Suggestion>,
    /// Search area, corners in order.
    pub search_area: Vec<LocalPoint>,
    /// For the chart. Not exported.
    #[serde(skip)]
    pub landmarks: Vec<ChartLandmark>,
}
