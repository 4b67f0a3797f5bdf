//! The result of `area`: for every start cell and heading, the guaranteed fix distance of a straight run.

use serde::Serialize;

use super::{Cause, ChartLandmark, Parameters, Provenance};
use crate::dive::AreaOptions;
use crate::frame::LocalPoint;

/// The terms of every figure of the area map.
pub const AREA_STATEMENT: &str = "On a straight run from the centre of the cell, every dive whose errors, strays and misses lie within the stated bounds and budgets has a fix within this distance. The vehicle knows only that it started inside the search area. Starts between the centres and headings between the headings are not covered by proof.";

/// What is guaranteed of one straight run.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum RunOutcome {
    /// A fix at this distance at the latest, metres.
    Fix(f64),
    /// No guaranteed fix within the longest run, and why.
    NoFix(Cause),
}

impl RunOutcome {
    /// The guaranteed fix distance, metres; none without one.
    pub fn fix_m(self) -> Option<f64> {
        match self {
            Self::Fix(fix_m) => Some(fix_m),
            Self::NoFix(_) => None,
        }
    }

    /// Why there is no guaranteed fix; none when there is one.
    pub fn cause(self) -> Option<Cause> {
        match self {
            Self::Fix(_) => None,
            Self::NoFix(cause) => Some(cause),
        }
    }
}

/// Where the start cells lie. Cell edges are whole multiples of the cell size in the working frame, so that maps of the
/// same ground have the same cells.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct AreaGrid {
    /// Side of a cell, m.
    pub cell_m: f64,
    /// West edge of the first column, m.
    pub west_m: f64,
    /// South edge of the first row, m.
    pub south_m: f64,
    /// Columns, counted east.
    pub columns: usize,
    /// Rows, counted north.
    pub rows: usize,
}

impl AreaGrid {
    /// Centre of a cell.
    pub fn centre(&self, column: usize, row: usize) -> LocalPoint {
        LocalPoint::new(
            self.west_m + (column as f64 + 0.5) * self.cell_m,
            self.south_m + (row as f64 + 0.5) * self.cell_m,
        )
    }
}

/// Headings without a guaranteed fix, by cause.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
pub struct NoFixCounts {
    /// Too few landmarks are certain to be detected.
    pub too_few_landmarks: u16,
    /// Several places still fit.
    pub look_alikes: u16,
    /// One place is left, wider than the fix size.
    pub too_wide: u16,
    /// The cell budget ran out.
    pub undecided: u16,
    /// Detection is not certain and no miss is budgeted.
    pub detection_not_certain: u16,
}

impl NoFixCounts {
    /// Counts one more heading.
    pub fn add(&mut self, cause: Cause) {
        *match cause {
            Cause::TooFewLandmarks => &mut self.too_few_landmarks,
            Cause::LookAlikes => &mut self.look_alikes,
            Cause::TooWide => &mut self.too_wide,
            Cause::Undecided => &mut self.undecided,
            Cause::DetectionNotCertain => &mut self.detection_not_certain,
        } += 1;
    }

    /// Headings without a guaranteed fix.
    pub fn total(&self) -> u16 {
        self.too_few_landmarks
            + self.look_alikes
            + self.too_wide
            + self.undecided
            + self.detection_not_certain
    }
}

/// One start cell over all headings. A heading without a guaranteed fix counts as later than every distance.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct AreaCell {
    /// Column of the grid, from 0.
    pub column: usize,
    /// Row of the grid, from 0.
    pub row: usize,
    /// Longest guaranteed fix distance, m; none when some heading has none.
    pub worst_m: Option<f64>,
    /// Shortest guaranteed fix distance, m; none when no heading has one.
    pub best_m: Option<f64>,
    /// Smallest distance within which at least half of the headings have a guaranteed fix, m; none when fewer have one.
    pub median_m: Option<f64>,
    /// Number of the heading with the shortest guaranteed fix distance (the first of equal ones).
    pub best_heading: Option<usize>,
    /// Share of the headings with a guaranteed fix within the required distance (0 to 1).
    pub within_required_share: f64,
    /// Headings without a guaranteed fix.
    pub no_fix: NoFixCounts,
}

/// The result of `area`.
#[derive(Clone, Debug, PartialEq)]
pub struct AreaReport {
    /// Where this comes from.
    pub provenance: Provenance,
    /// What was asked of the dive.
    pub parameters: Parameters,
    /// What was asked of the map.
    pub options: AreaOptions,
    /// Where the cells lie.
    pub grid: AreaGrid,
    /// Headings, degrees clockwise from grid north.
    pub headings_deg: Vec<f64>,
    /// Start cells whose centre lies in the search area, row by row from the south, west to east.
    pub cells: Vec<AreaCell>,
    /// Outcome of every run: those of cell i start at i times the number of headings, in the order of the headings.
    pub outcomes: Vec<RunOutcome>,
    /// Search area, corners in order.
    pub search_area: Vec<LocalPoint>,
    /// For the chart. Not exported.
    pub landmarks: Vec<ChartLandmark>,
}

impl AreaReport {
    /// The outcomes of cell number `cell`, in the order of the headings.
    pub fn outcomes_of(&self, cell: usize) -> &[RunOutcome] {
        let headings = self.headings_deg.len();
        &self.outcomes[cell * headings..(cell + 1) * headings]
    }

    /// Whether the cell budget ran out on some run.
    pub fn is_undecided(&self) -> bool {
        self.cells.iter().any(|cell| cell.no_fix.undecided > 0)
    }
}
