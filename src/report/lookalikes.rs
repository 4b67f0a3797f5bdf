//! What `lookalikes` found.

use serde::Serialize;

use super::{ChartLandmark, Parameters, Provenance};
use crate::frame::LocalPoint;

/// What kind of look-alike an entry is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum LookAlikeKind {
    /// Two grounds that look alike.
    Pair,
    /// An evenly spaced row: it looks like itself, shifted.
    Row,
    /// A regular grid: it looks like itself, shifted in two directions.
    Grid,
}

impl LookAlikeKind {
    /// The word used in files.
    pub fn word(self) -> &'static str {
        match self {
            Self::Pair => "pair",
            Self::Row => "row",
            Self::Grid => "grid",
        }
    }
}

/// One of the directions in which a regular layout repeats.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct Period {
    /// Distance after which it repeats, m.
    pub period_m: f64,
    /// Bearing of the repeat, degrees clockwise from grid north, 0 to below 180 (it repeats both ways).
    pub bearing_deg: f64,
}

/// A regular layout in place of all its look-alikes.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct RegularLayout {
    /// Landmarks of the layout.
    pub landmarks: usize,
    /// One period for a row, two for a grid.
    pub periods: Vec<Period>,
    /// Look-alikes of the layout with itself: shifts by whole periods, each counted once for both directions.
    pub shifts: usize,
}

/// A landmark that is present on one of the two grounds only.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct TellTale {
    /// Its identifier.
    pub landmark: String,
    /// The ground on which it is present, 1 or 2.
    pub ground: u8,
    /// Distance to it from the nearest landmark of that ground, m: the run that is left at the edge of the ground.
    pub from_edge_m: f64,
    /// Distance to it from the middle of that ground, m.
    pub from_middle_m: f64,
    /// For the chart: its number among the landmarks.
    #[serde(skip)]
    pub number: usize,
}

/// A stretch of a line along which landmarks of one of the grounds come abeam.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct LookAlikeStretch {
    /// The line.
    pub line: String,
    /// The ground, 1 or 2.
    pub ground: u8,
    /// Where the first of its landmarks comes abeam, m along the line.
    pub from_m: f64,
    /// Where the last one does, m along the line.
    pub to_m: f64,
}

/// Two grounds that the vehicle cannot tell apart, or a regular layout.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct LookAlike {
    /// Number in the order of danger, from 1.
    pub number: usize,
    /// Kind. For a row or a grid the two grounds are those of its most dangerous shift.
    pub kind: LookAlikeKind,
    /// Landmarks that agree: every two of them have separations on both grounds that agree within the bounds.
    pub landmarks: usize,
    /// Identifiers on ground 1.
    pub ground_1: Vec<String>,
    /// Identifiers on ground 2, each opposite the one of ground 1 that it may be taken for.
    pub ground_2: Vec<String>,
    /// Distance from the middle of ground 1 to that of ground 2, m.
    pub apart_m: f64,
    /// Bearing of the same, degrees clockwise from grid north.
    pub bearing_deg: f64,
    /// The same, metres east.
    pub offset_east_m: f64,
    /// The same, metres north.
    pub offset_north_m: f64,
    /// Turn from ground 1 to ground 2 that fits best, degrees clockwise.
    pub turn_deg: f64,
    /// Root mean square distance between the landmarks of ground 1, moved and turned onto ground 2, and those there, m.
    pub disagreement_rms_m: f64,
    /// Largest of these distances, m.
    pub disagreement_worst_m: f64,
    /// Factor to which all errors, boxes included, have to shrink before no three of the landmarks agree.
    pub break_scale: f64,
    /// Nearest landmark present on ground 1 only.
    pub tell_tale_1: Option<TellTale>,
    /// Nearest landmark present on ground 2 only.
    pub tell_tale_2: Option<TellTale>,
    /// Metres of the candidate lines that run over one of the grounds.
    pub line_m: f64,
    /// Where they do.
    pub stretches: Vec<LookAlikeStretch>,
    /// The layout, for a row or a grid.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub layout: Option<RegularLayout>,
    /// For the chart: numbers of the landmarks of ground 1.
    #[serde(skip)]
    pub numbers_1: Vec<usize>,
    /// For the chart: numbers of the landmarks of ground 2.
    #[serde(skip)]
    pub numbers_2: Vec<usize>,
    /// For the chart: numbers of all landmarks of the layout; empty for a pair.
    #[serde(skip)]
    pub numbers_layout: Vec<usize>,
}

impl LookAlike {
    /// The nearer of the two tell-tales: what a vehicle meets first.
    pub fn nearest_tell_tale(&self) -> Option<&TellTale> {
        [&self.tell_tale_1, &self.tell_tale_2]
            .into_iter()
            .flatten()
            .min_by(|a, b| a.from_edge_m.total_cmp(&b.from_edge_m))
    }
}

/// The terms of every look-alike.
pub const LOOK_ALIKE_STATEMENT: &str = "Two grounds are look-alikes when, for at least three landmarks of each, the separations agree within twice the bounds of range, bearing and altitude, the boxes of both, and dead reckoning on a straight run from one landmark to the next. Landmarks are compared when they lie within the longest separation of each other. The agreement speaks of what is detected there, not of what is missing.";

/// A candidate line as the chart draws it.
#[derive(Clone, Debug, PartialEq)]
pub struct ChartLine {
    /// Name.
    pub name: String,
    /// The planned track.
    pub path: Vec<LocalPoint>,
}

/// The result of `lookalikes`.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct LookAlikesReport {
    /// Where this comes from.
    #[serde(flatten)]
    pub provenance: Provenance,
    /// What was asked.
    pub parameters: Parameters,
    /// Longest separation at which landmarks are compared, m.
    pub separation_max_m: f64,
    /// What a look-alike is.
    pub statement: &'static str,
    /// Look-alikes found, each pair of grounds counted once; the shifts of regular layouts among them.
    pub found: usize,
    /// Of these, how many lie no farther apart than the fix size: a wrong place there is no danger, and none is listed.
    pub within_fix_size: usize,
    /// Of these, how many are shifts of regular layouts and are listed as one entry for each layout.
    pub in_layouts: usize,
    /// Whether all were found; false when the map has more than the limit of agreeing triangles.
    pub complete: bool,
    /// The listed look-alikes, most dangerous first.
    pub look_alikes: Vec<LookAlike>,
    /// For the chart.
    #[serde(skip)]
    pub landmarks: Vec<ChartLandmark>,
    /// For the chart.
    #[serde(skip)]
    pub lines: Vec<ChartLine>,
}

impl LookAlikesReport {
    /// Look-alikes that are neither listed nor part of a listed layout nor within the fix size.
    pub fn unlisted(&self) -> usize {
        let pairs = self.look_alikes.iter().filter(|entry| entry.kind == LookAlikeKind::Pair).count();
        self.found - self.within_fix_size - self.in_layouts - pairs
    }
}
