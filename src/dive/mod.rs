//! A dive: everything one TOML file names, read, checked, and in SI units.

mod area;
mod checks;
mod improve;
mod read;
mod section;
mod settings;
mod site;
mod swath;
mod widen;

pub use area::SearchHull;
pub use improve::ErrorBound;

use std::path::PathBuf;

use time::Date;

use crate::frame::{Frame, LocalPoint};
use crate::interval::up;
use crate::map::Landmark;
use crate::problem::Notice;
use crate::track::Line;
use crate::vehicle::{DeadReckoning, Sonar, Vehicle};

/// How simulated errors are drawn. All shapes stay within the bounds.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, serde::Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum ErrorShape {
    /// Every error uniform within its bounds, drawn anew each time.
    Uniform,
    /// Every error at one end of its bounds, drawn anew each time.
    Corners,
    /// Every error at one end of its bounds, drawn once for the dive.
    Steady,
}

/// What orders the ranking of the lines.
#[derive(Clone, Copy, Debug, PartialEq, Eq, serde::Serialize, clap::ValueEnum)]
#[serde(rename_all = "kebab-case")]
pub enum RankBy {
    /// Share of the line with a guaranteed fix within the required distance; ties by 95th percentile.
    Guaranteed,
    /// Share of dives (over all segment starts) with a fix within the required distance; ties by 95th percentile.
    Share,
    /// 95th percentile fix distance over all segment starts, shortest first.
    P95,
    /// Median fix distance over all segment starts, shortest first.
    Median,
    /// Share of dives without a fix before the line ends, smallest first.
    NoFix,
}

/// Where the vehicle may be when it starts to look for itself.
#[derive(Clone, Debug, PartialEq)]
pub struct Start {
    /// Corners of the search area, in order, not repeated at the end. The solver uses its convex hull.
    pub search_area: Vec<LocalPoint>,
    /// Radius of the descent scatter about the planned start of a line, metres, at least 0.
    pub scatter_m: f64,
    /// Largest common shift of the whole map against the Earth, metres, at least 0.
    pub common_shift_m: f64,
}

impl Start {
    /// How far the vehicle may lie from its planned place *on the map*: descent scatter and common shift together, metres.
    ///
    /// *Guarantee.* Rounded up. Seen from a map that is shifted as a whole, every place on the Earth is shifted the other
    /// way; relative positions do not change, so a shift acts as more scatter and as nothing else. `search_area` has
    /// grown by the shift already.
    pub fn scatter_on_map_m(&self) -> f64 {
        if self.common_shift_m > 0.0 { up(self.scatter_m + self.common_shift_m) } else { self.scatter_m }
    }
}

/// What may go wrong with detections in one run and still be covered.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, serde::Serialize)]
pub struct Budget {
    /// Most detections of something that is not on the map.
    pub strays: u8,
    /// Most landmarks missed although they are certainly inside the swath.
    pub misses: u8,
}

/// How lines are scored.
#[derive(Clone, Debug, PartialEq)]
pub struct Scoring {
    /// Widest extent of the feasible set that counts as a fix, metres.
    pub fix_size_m: f64,
    /// Longest run from an unknown start that the mission can accept, metres.
    pub required_fix_m: f64,
    /// Interval between the starts at which a line is scored, metres.
    pub segment_m: f64,
    /// Simulated dives per line.
    pub draws: usize,
    /// Seed of the generator.
    pub seed: u64,
    /// Error shapes, used in turn by the draws; at least one.
    pub error_shapes: Vec<ErrorShape>,
    /// What orders the ranking.
    pub rank_by: RankBy,
    /// Most cells the solver may keep at once before it answers "undecided".
    pub cell_budget: usize,
}

/// How the area map is cut up.
#[derive(Clone, Copy, Debug, PartialEq, serde::Serialize)]
pub struct AreaOptions {
    /// Side of a start cell, metres, above 0.
    pub cell_m: f64,
    /// Number of headings, evenly spaced from grid north, at least 1.
    pub headings: usize,
    /// Longest straight run from a start, metres, above 0.
    pub longest_run_m: f64,
}

/// How the remap analysis judges cells and what a re-survey can reach.
#[derive(Clone, Copy, Debug, PartialEq, serde::Serialize)]
pub struct RemapOptions {
    /// Side of a start cell, metres, above 0.
    pub cell_m: f64,
    /// Share of the headings that must have a guaranteed fix within the required distance for a cell to pass, above 0 to 1.
    pub pass_share: f64,
    /// Share of the cells of a region that must pass for the region to count as cured, above 0 to 1.
    pub cured_share: f64,
    /// Fewest cells of a region, at least 1.
    pub smallest_region_cells: usize,
    /// Half-width of a landmark's box that a re-survey can reach at best, metres, at least 0.
    pub resurvey_half_width_m: f64,
    /// Number of regions, largest first, for which cure and gain are computed.
    pub gain_regions: usize,
}

/// What `suggest` lists.
#[derive(Clone, Copy, Debug, PartialEq, serde::Serialize)]
pub struct SuggestOptions {
    /// Most suggestions to list, at least 1.
    pub listed: usize,
    /// How far an exported line goes on after the guaranteed fix, metres, at least 0.
    pub lead_m: f64,
}

/// One input file and the fingerprint of its bytes.
#[derive(Clone, Debug, PartialEq, serde::Serialize)]
pub struct InputFile {
    /// Path as the dive file names it (the dive file itself: its file name).
    pub name: String,
    /// SHA-256 of the bytes, lower-case hexadecimal.
    pub sha256: String,
}

/// Everything read and checked.
#[derive(Clone, Debug)]
pub struct Dive {
    /// Title from the dive file.
    pub name: String,
    /// Date of issue, if the dive file states one.
    pub issued: Option<Date>,
    /// Date of the survey behind the map, if the dive file states one.
    pub surveyed: Option<Date>,
    /// The dive file.
    pub path: PathBuf,
    /// The working frame.
    pub frame: Frame,
    /// The landmarks.
    pub landmarks: Vec<Landmark>,
    /// How landmark uncertainty was declared and turned into bounds, in words with the factor used.
    pub uncertainty_statement: String,
    /// Chance that a landmark of the map is gone, for simulated dives, from 0 to below 1.
    pub gone_chance: f64,
    /// The candidate lines.
    pub lines: Vec<Line>,
    /// How the vehicle moves.
    pub vehicle: Vehicle,
    /// Dead-reckoning bounds, already widened by the distortion of the grid over the site.
    pub dead_reckoning: DeadReckoning,
    /// The sonar, its range error already widened by the distortion of the grid over the site.
    pub sonar: Sonar,
    /// Where the vehicle may start.
    pub start: Start,
    /// How lines are scored.
    pub scoring: Scoring,
    /// How the area map is cut up.
    pub area: AreaOptions,
    /// How the remap analysis judges cells.
    pub remap: RemapOptions,
    /// What `suggest` lists.
    pub suggest: SuggestOptions,
    /// Factor by which `sensitivity` multiplies each error bound, at least 0 and below 1.
    pub improvement_factor: f64,
    /// Slices of the heading-bias interval that the solver takes one by one, at least 1.
    pub heading_slices: usize,
    /// Detections that may be strays and landmarks that may be missed.
    pub budget: Budget,
    /// Corners of the polygon inside which "nothing seen" is evidence; none when it is not used.
    pub nothing_seen_inside: Option<Vec<LocalPoint>>,
    /// What was read, with fingerprints: dive file first, then in the order named.
    pub inputs: Vec<InputFile>,
    /// What was understood and what to watch, for `check` and for standard error.
    pub notices: Vec<Notice>,
    /// The bounds before they were widened for the grid.
    stated: improve::Stated,
}

impl Dive {
    /// Whether a landmark that is certainly inside the swath is certain to be detected.
    pub fn is_detection_certain(&self) -> bool {
        self.sonar.detection_chance >= 1.0 && self.gone_chance <= 0.0
    }
}
