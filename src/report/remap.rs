//! The result of `remap`: seabed that deserves more mapping before the dive, why, and what that buys.

use serde::Serialize;

use super::{AreaGrid, ChartLandmark, Parameters, Provenance};
use crate::dive::RemapOptions;
use crate::frame::LocalPoint;

/// The terms of every figure of the remap analysis.
pub const REMAP_STATEMENT: &str = "A cell passes when, from its centre, at least the stated share of the headings has a guaranteed fix within the required distance on a straight run. Gains are from running the same map again with the boxes of the landmarks in and near the region narrowed about their charted positions. Where the landmarks really lie is not known: a re-survey also moves the charted positions, so a gain says what to expect of that quality and is no guarantee.";

/// What is said of regions whose cells meet too few landmarks.
pub const TOO_FEW_LANDMARKS_NOTE: &str =
    "more mapping may find landmarks here; what they would bring cannot be computed from this map";

/// Why the cells of a region fail.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum RemapCause {
    /// Narrower landmark boxes alone let the cell pass.
    BoxesTooWide,
    /// Too few landmarks are certain to be detected within the required distance.
    TooFewLandmarks,
    /// Perfect dead reckoning alone lets the cell pass.
    DeadReckoning,
    /// A sonar without errors alone lets the cell pass.
    Sonar,
    /// Several places still fit although there are landmarks enough, and no single improvement lets the cell pass.
    LookAlikeGround,
    /// One place is left, wider than the fix size or found too late, and no single improvement lets the cell pass.
    SeveralErrors,
    /// The solver ran out of its cell budget on runs that decide.
    Undecided,
    /// Detection is not certain and no miss is budgeted.
    DetectionNotCertain,
}

impl RemapCause {
    /// All causes.
    pub const ALL: [Self; 8] = [
        Self::BoxesTooWide,
        Self::TooFewLandmarks,
        Self::DeadReckoning,
        Self::Sonar,
        Self::LookAlikeGround,
        Self::SeveralErrors,
        Self::Undecided,
        Self::DetectionNotCertain,
    ];

    /// The word used in files.
    pub fn word(self) -> &'static str {
        match self {
            Self::BoxesTooWide => "boxes-too-wide",
            Self::TooFewLandmarks => "too-few-landmarks",
            Self::DeadReckoning => "dead-reckoning",
            Self::Sonar => "sonar",
            Self::LookAlikeGround => "look-alike-ground",
            Self::SeveralErrors => "several-errors",
            Self::Undecided => "undecided",
            Self::DetectionNotCertain => "detection-not-certain",
        }
    }

    /// In words, for tables and charts.
    pub fn in_words(self) -> &'static str {
        match self {
            Self::BoxesTooWide => "boxes too wide",
            Self::TooFewLandmarks => "too few landmarks",
            Self::DeadReckoning => "dead reckoning",
            Self::Sonar => "sonar",
            Self::LookAlikeGround => "look-alike ground",
            Self::SeveralErrors => "several errors",
            Self::Undecided => "undecided",
            Self::DetectionNotCertain => "detection not certain",
        }
    }
}

/// Cells of a region that fail for one cause.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct CauseShare {
    /// The cause.
    pub cause: RemapCause,
    /// Cells.
    pub cells: usize,
    /// Share of the region's cells (0 to 1).
    pub share: f64,
}

/// A polygon of the working frame: the outer ring counter-clockwise, holes clockwise, first corner not repeated.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct RegionOutline {
    /// Outer ring.
    pub outer: Vec<LocalPoint>,
    /// Holes.
    pub holes: Vec<Vec<LocalPoint>>,
}

/// A re-survey of one region and what it buys.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct Resurvey {
    /// Every half-width becomes this share of its present value ...
    pub factor: f64,
    /// ... but no less than this, m (boxes that are narrower already stay).
    pub floor_m: f64,
    /// Largest half-width of the landmarks concerned at present, m.
    pub half_width_before_m: f64,
    /// Largest half-width of these landmarks after the re-survey, m.
    pub half_width_after_m: f64,
    /// Whether the region passes after it; otherwise this is the best re-survey tried.
    pub cures: bool,
    /// Cells of the region that pass after it (none pass before).
    pub region_cells_passing: usize,
    /// Cells of the whole map that pass before it.
    pub map_cells_passing_before: usize,
    /// Cells of the whole map that pass after it.
    pub map_cells_passing_after: usize,
    /// Area of the cells that pass only after it, km².
    pub gained_km2: f64,
    /// Change of the share of cells that pass (0 to 1).
    pub gained_share: f64,
    /// Area gained over the area to be surveyed.
    pub gained_per_surveyed: f64,
}

/// One region.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct RemapRegion {
    /// Number, from 1: its place in the ranking.
    pub number: usize,
    /// Cause of most of its cells.
    pub cause: RemapCause,
    /// Its cells by cause, the main cause first.
    pub causes: Vec<CauseShare>,
    /// Cells.
    pub cells: usize,
    /// Area, km².
    pub area_km2: f64,
    /// How far the survey has to go beyond the region, m.
    pub survey_margin_m: f64,
    /// Area to be surveyed, km²: the region and all ground within that margin.
    pub survey_km2: f64,
    /// Landmarks charted inside the region.
    pub landmarks_inside: usize,
    /// Landmarks charted on the ground to be surveyed.
    pub landmarks_surveyed: usize,
    /// A place inside, for labels.
    pub label_at: LocalPoint,
    /// What a re-survey buys; none where it was not computed (see `verdict`).
    pub resurvey: Option<Resurvey>,
    /// What to do, in words.
    pub verdict: String,
    /// The polygon, in the working frame.
    pub outline: RegionOutline,
    /// Cells by column and row of the grid, ascending by row. For the chart.
    #[serde(skip)]
    pub grid_cells: Vec<(usize, usize)>,
}

/// A stretch of a candidate line that lies on a region.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct RegionStretch {
    /// Number of the region.
    pub region: usize,
    /// Distance along the line at which it begins, m.
    pub from_m: f64,
    /// Distance along the line at which it ends, m.
    pub to_m: f64,
}

/// The regions that a candidate line runs over.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct LineOverRegions {
    /// Name of the line.
    pub name: String,
    /// Length of the planned track, m.
    pub length_m: f64,
    /// Length on regions, m.
    pub over_regions_m: f64,
    /// Stretches, in the order of the line.
    pub stretches: Vec<RegionStretch>,
    /// Planned track. For the chart.
    #[serde(skip)]
    pub track: Vec<LocalPoint>,
}

/// The result of `remap`.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct RemapReport {
    /// Where this comes from.
    #[serde(flatten)]
    pub provenance: Provenance,
    /// What was asked of the dive.
    pub parameters: Parameters,
    /// What was asked of the analysis.
    pub options: RemapOptions,
    /// Headings run from each cell.
    pub headings: usize,
    /// Length of the straight runs, m: what comes after the required distance does not count.
    pub run_m: f64,
    /// What the figures mean.
    pub statement: &'static str,
    /// Where the cells lie.
    pub grid: AreaGrid,
    /// Start cells of the map.
    pub cells: usize,
    /// Cells that fail.
    pub failing_cells: usize,
    /// Area of the cells that fail, km².
    pub failing_km2: f64,
    /// Specks: groups of fewer than `smallest_region_cells` failing cells, left out of the regions.
    pub specks: usize,
    /// Cells in specks.
    pub speck_cells: usize,
    /// Whether the solver ran out of its cell budget on some run.
    pub undecided: bool,
    /// The regions, ranked.
    pub regions: Vec<RemapRegion>,
    /// The candidate lines.
    pub lines: Vec<LineOverRegions>,
    /// Search area, corners in order.
    pub search_area: Vec<LocalPoint>,
    /// For the chart. Not exported.
    #[serde(skip)]
    pub landmarks: Vec<ChartLandmark>,
    /// Cells in specks, by column and row. For the chart.
    #[serde(skip)]
    pub speck_grid_cells: Vec<(usize, usize)>,
}
