//! The order of the lines.

use std::cmp::Ordering;

use crate::dive::RankBy;
use crate::report::LineReport;

/// Fills in the rank of every line. Ties are broken by the 95th percentile, then by the order in the file.
pub(super) fn rank(lines: &mut [LineReport], by: RankBy) {
    let mut order: Vec<usize> = (0..lines.len()).collect();
    order.sort_by(|&i, &j| {
        let (a, b) = (&lines[i].estimated, &lines[j].estimated);
        let p95 = missing_last(a.p95_m.value, b.p95_m.value);
        match by {
            RankBy::Guaranteed => missing_last(guaranteed_share(&lines[j]), guaranteed_share(&lines[i])),
            RankBy::Share => missing_last(b.within_required_share.value, a.within_required_share.value),
            RankBy::P95 => p95,
            RankBy::Median => missing_last(a.median_m.value, b.median_m.value),
            RankBy::NoFix => missing_last(a.no_fix_share.value, b.no_fix_share.value),
        }
        .then(p95)
        .then(missing_last(b.within_required_share.value, a.within_required_share.value))
        .then(i.cmp(&j))
    });
    for (position, line) in order.into_iter().enumerate() {
        lines[line].rank = position + 1;
    }
}

/// Share of the line with a guaranteed fix within the required distance.
fn guaranteed_share(line: &LineReport) -> Option<f64> {
    line.guaranteed.map(|guaranteed| guaranteed.within_required_share)
}

/// Ascending, with missing values after all others.
fn missing_last(a: Option<f64>, b: Option<f64>) -> Ordering {
    match (a, b) {
        (Some(a), Some(b)) => a.total_cmp(&b),
        (a, b) => b.is_some().cmp(&a.is_some()),
    }
}
