//! The result of `sensitivity`: each error bound improved by a factor, and what that does to the guaranteed figures.

use serde::Serialize;

use super::{GuaranteeTerms, Parameters, Provenance};
use crate::dive::ErrorBound;

/// The terms of every figure of the sensitivity analysis.
pub const SENSITIVITY_STATEMENT: &str = "Every figure is guaranteed in the sense of `lines`, for the bounds as stated and again with one of them multiplied by the factor; no simulated dive is involved. The part of a bound that comes from the distortion of the map grid stays. Budgets of strays and misses, descent scatter and detection chance are no error bounds and stay as they are. Charted positions stay where they are: better landmark boxes come from a new survey, which also moves them.";

/// Guaranteed figures over the segments of one line or of all lines.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct GuaranteedFigures {
    /// Segments.
    pub segments: usize,
    /// Segments with a guaranteed fix before the line ends.
    pub segments_with_fix: usize,
    /// Share of the length whose segments have a guaranteed fix within the required distance (0 to 1).
    pub within_required_share: f64,
    /// Share of the length whose segments have no guaranteed fix (0 to 1).
    pub no_fix_share: f64,
    /// Median guaranteed fix distance of the segments that have one, weighted by their length, m; none without any.
    pub median_m: Option<f64>,
    /// Longest guaranteed fix distance of the segments that have one, m; none without any.
    pub longest_m: Option<f64>,
}

/// Guaranteed figures after an improvement, and what it changed.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct GuaranteedChange {
    /// After the improvement.
    pub after: GuaranteedFigures,
    /// Gain in the share of the length with a guaranteed fix within the required distance (0 to 1; never negative).
    pub share_gained: f64,
    /// Segments that gain a guaranteed fix.
    pub segments_gaining_fix: usize,
    /// Share of the length whose segments gain a guaranteed fix (0 to 1).
    pub fix_gained_share: f64,
    /// Segments with a guaranteed fix before and after: those of the three figures below.
    pub segments_compared: usize,
    /// Median of how much sooner the fix is guaranteed, weighted by length, m; none without segments to compare.
    pub sooner_median_m: Option<f64>,
    /// Mean of how much sooner the fix is guaranteed, weighted by length, m; none without segments to compare.
    pub sooner_mean_m: Option<f64>,
    /// Most by which the fix of a segment is guaranteed sooner, m; none without segments to compare.
    pub sooner_most_m: Option<f64>,
}

/// The value of a bound before and after.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct BoundValue {
    /// As stated in the dive file (landmark boxes: the widest half-width on the grid), in `unit`.
    pub stated: f64,
    /// With the grid's part, as computed with, in `unit`.
    pub in_force: f64,
}

/// One error bound and what its improvement brings.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ImprovedBound {
    /// The bound.
    pub bound: ErrorBound,
    /// In words, for tables and charts: `heading bias`.
    pub words: &'static str,
    /// The key of the dive file: `dead_reckoning.heading_bias_deg`.
    pub key: &'static str,
    /// Unit of the values: `m`, `%`, `degrees`, `m/s`.
    pub unit: &'static str,
    /// Place in the ranking, from 1; equal gains share a place; none when it changes no figure that decides.
    pub rank: Option<usize>,
    /// Present value.
    pub present: BoundValue,
    /// Improved value.
    pub improved: BoundValue,
    /// What the improvement changes over all lines.
    pub change: GuaranteedChange,
}

/// A bound that is zero as stated and cannot be improved.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
pub struct ZeroBound {
    /// The bound.
    pub bound: ErrorBound,
    /// In words.
    pub words: &'static str,
    /// The key of the dive file.
    pub key: &'static str,
}

/// What the analysis says about where to spend money.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct SensitivityVerdict {
    /// The bounds in the first place: one; several when they tie; none when no single improvement helps.
    pub first: Vec<ErrorBound>,
    /// In words.
    pub text: String,
}

/// One line: its present figures and the changes, in the order of the report's `bounds`.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct SensitivityLine {
    /// Name.
    pub name: String,
    /// Length of the planned track, m.
    pub length_m: f64,
    /// With the bounds as stated.
    pub present: GuaranteedFigures,
    /// One bound improved at a time, in the order of the report's `bounds`.
    pub changes: Vec<GuaranteedChange>,
    /// All bounds improved.
    pub all_together: GuaranteedChange,
}

/// The result of `sensitivity`.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct SensitivityReport {
    /// Where this comes from.
    #[serde(flatten)]
    pub provenance: Provenance,
    /// What was asked, with the bounds as stated.
    pub parameters: Parameters,
    /// Every improved bound is its stated value times this.
    pub factor: f64,
    /// What the figures mean.
    pub statement: &'static str,
    /// What the guaranteed figures are true for.
    pub guarantee: GuaranteeTerms,
    /// Over all lines, with the bounds as stated.
    pub present: GuaranteedFigures,
    /// One bound improved at a time, best first.
    pub bounds: Vec<ImprovedBound>,
    /// All of these improved together; the same as now when there is none.
    pub all_together: GuaranteedChange,
    /// Bounds that are zero already.
    pub zero: Vec<ZeroBound>,
    /// Where to spend money.
    pub verdict: SensitivityVerdict,
    /// By line, in the order of the dive file.
    pub lines: Vec<SensitivityLine>,
    /// Whether the cell budget ran out on some run.
    pub undecided: bool,
}
