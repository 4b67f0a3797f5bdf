//! The result of `brief`: the verdict of the first page, and what the pack holds.

use serde::Serialize;

use super::{Estimate, Provenance};

/// What kind of answer the lines give.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Finding {
    /// The first-ranked line has a guaranteed fix within the required distance on some of its length.
    Guaranteed,
    /// It has none anywhere, and the solver decided every segment of it.
    NothingGuaranteed,
    /// It has none, and on some segment of it the solver ran out of its cell budget.
    Undecided,
    /// The map holds no landmark.
    NoLandmarks,
}

/// When to stop waiting for a fix: *guaranteed*.
///
/// *Guarantee.* A vehicle lost at the start of any of the segments that the distance is for has a fix within
/// `distance_m`, on each of the offset tracks, for every error within the bounds. A vehicle without a fix after
/// `distance_m` therefore was lost elsewhere, or is off these tracks, or a bound or the map does not hold.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct AbortDistance {
    /// The distance run since the vehicle was lost, m.
    pub distance_m: f64,
    /// Whether the segments that it is for are those with a guaranteed fix within the required distance. Otherwise none
    /// is within it, and they are those with any guaranteed fix.
    pub within_required: bool,
    /// Share of the line's length in these segments (0 to 1).
    pub share_of_line: f64,
    /// Longest guaranteed fix distance of any segment of the line, m: after that no segment has a guarantee left.
    pub longest_guaranteed_m: f64,
}

/// What to do, in words and figures.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Verdict {
    /// The kind of answer.
    pub finding: Finding,
    /// The first-ranked line; none without lines.
    pub line: Option<String>,
    /// Required fix distance, m.
    pub required_fix_m: f64,
    /// *Guaranteed*: share of the line's length from which a fix is guaranteed within the required distance (0 to 1).
    pub guaranteed_within_required_share: f64,
    /// *Guaranteed*: share of the line's length from which a fix that lasts to the end of the line is guaranteed within
    /// the required distance (0 to 1).
    pub guaranteed_lasting_within_required_share: f64,
    /// *Guaranteed*: share of the line's length on which the solver ran out of its cell budget (0 to 1); it counts as
    /// ground without a guarantee.
    pub undecided_share: f64,
    /// *Guaranteed*: when to stop waiting for a fix; none when no segment of the line has a guaranteed fix.
    pub abort: Option<AbortDistance>,
    /// *Estimated*: share of simulated runs with a fix within the required distance (0 to 1); none without lines.
    pub estimated_within_required_share: Option<Estimate>,
    /// Another line with a larger guaranteed share, when the ranking goes by another key.
    pub larger_guaranteed_line: Option<String>,
    /// The answer in one sentence.
    pub headline: String,
    /// The figure that goes with it, such as `53.6 %`.
    pub figure: String,
    /// What the figure counts.
    pub figure_means: String,
    /// What else is *guaranteed*, sentence by sentence.
    pub guaranteed: Vec<String>,
    /// What is *estimated*, sentence by sentence.
    pub estimated: Vec<String>,
    /// The abort distance, or that there is none.
    pub abort_headline: String,
    /// When to come up.
    pub abort_rule: String,
}

/// One file of the pack.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct PackFile {
    /// Name in the folder.
    pub name: String,
    /// Size, bytes.
    pub bytes: usize,
    /// Fingerprint.
    pub sha256: String,
}

/// The result of `brief`, as `pack.json` holds it.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct BriefReport {
    /// Where this comes from.
    #[serde(flatten)]
    pub provenance: Provenance,
    /// What to do.
    pub verdict: Verdict,
    /// Every other file of the pack, sorted by name.
    pub files: Vec<PackFile>,
}
