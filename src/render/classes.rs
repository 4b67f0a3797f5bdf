//! Classes of fix distance: five steps with round limits, the required distance always a limit.

use super::colours::CLASSES;
use super::nice;
use crate::interval::larger;
use crate::report::{LinesReport, SegmentReport};

/// Share of dives from which "undecided" decides how a segment is drawn.
const UNDECIDED_SHARE: f64 = 0.05;

/// What the colours show.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Quantity {
    /// 95th percentile of simulated dives.
    Estimated,
    /// True for every error within the bounds.
    Guaranteed,
}

/// How one segment is drawn.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Finding {
    /// A fix distance in this class.
    Class(usize),
    /// No fix before the line ends (guaranteed, or for too many dives).
    NoFix,
    /// The solver ran out of its budget.
    Undecided,
    /// The report has no value for this segment.
    NotScored,
}

/// The quantity shown and the limits of its classes.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Scale {
    pub(super) quantity: Quantity,
    /// Upper limits, metres, ascending; a value belongs to the first class whose limit it does not exceed.
    pub(super) limits_m: [f64; CLASSES],
    pub(super) required_m: f64,
}

impl Scale {
    /// The scale for all segments of `report`.
    pub(super) fn of(report: &LinesReport) -> Self {
        let segments = || report.lines.iter().flat_map(|line| &line.segments);
        let guaranteed = segments().any(|segment| segment.guaranteed.is_some());
        let quantity = if guaranteed { Quantity::Guaranteed } else { Quantity::Estimated };
        let values: Vec<f64> = segments().filter_map(|segment| value_m(quantity, segment)).collect();
        let required_m = report.parameters.required_fix_m;
        Self { quantity, limits_m: limits(&values, required_m), required_m }
    }

    /// The scale for guaranteed distances `values`.
    pub(super) fn of_guaranteed(values: &[f64], required_m: f64) -> Self {
        Self { quantity: Quantity::Guaranteed, limits_m: limits(values, required_m), required_m }
    }

    /// How a distance is drawn.
    pub(super) fn class_of(&self, value: f64) -> Finding {
        let class = self.limits_m.iter().position(|&limit| value <= limit);
        Finding::Class(class.unwrap_or(CLASSES - 1))
    }

    /// How `segment` is drawn.
    pub(super) fn finding(&self, segment: &SegmentReport) -> Finding {
        if let Some(value) = value_m(self.quantity, segment) {
            return self.class_of(value);
        }
        match self.quantity {
            Quantity::Guaranteed if segment.guaranteed.is_some() => Finding::NoFix,
            Quantity::Guaranteed => Finding::NotScored,
            Quantity::Estimated => Self::estimate_missing(segment),
        }
    }

    /// How a segment is drawn for which too many dives have no fix to give a percentile.
    pub(super) fn estimate_missing(segment: &SegmentReport) -> Finding {
        let Some(no_fix) = segment.estimated.no_fix_share.value else { return Finding::NotScored };
        // Undecided dives count as dives without a fix; they name the segment when they are most of them.
        let undecided = segment.estimated.undecided_share;
        if undecided >= UNDECIDED_SHARE && 2.0 * undecided >= no_fix {
            Finding::Undecided
        } else {
            Finding::NoFix
        }
    }

    /// Label of class `class`.
    pub(super) fn label(&self, class: usize) -> String {
        let written = |limit: f64| nice::short(limit, 2);
        match class {
            0 => format!("up to {} m", written(self.limits_m[0])),
            _ => format!("{} – {} m", written(self.limits_m[class - 1]), written(self.limits_m[class])),
        }
    }

    /// Number of classes within the required distance: the requirement is marked after that many.
    pub(super) fn classes_within(&self) -> usize {
        self.limits_m.iter().filter(|&&limit| limit <= self.required_m).count()
    }
}

fn value_m(quantity: Quantity, segment: &SegmentReport) -> Option<f64> {
    match quantity {
        Quantity::Guaranteed => segment.guaranteed.as_ref().and_then(|fix| fix.distance_m),
        Quantity::Estimated => segment.estimated.p95_m.value,
    }
}

/// Round limits that hold all `values`, with `required_m` (positive) either among them or above them all.
fn limits(values: &[f64], required_m: f64) -> [f64; CLASSES] {
    let Some(most) = values.iter().copied().reduce(larger).filter(|&most| most > 0.0) else {
        return within(required_m, required_m);
    };
    if most <= required_m {
        return within(most, required_m);
    }
    // Three classes meet the requirement and two do not; when no segment meets it, the others share what is left.
    let below = if values.iter().any(|&value| value <= required_m) { 3 } else { 1 };
    let step = nice::nearest(required_m / 3.0);
    let upper = above(most, required_m, CLASSES - below);
    std::array::from_fn(|class| match class + 1 {
        number if number < below => step * number as f64,
        number if number == below => required_m,
        number => upper[number - below - 1],
    })
}

/// Limits when every value meets the requirement.
fn within(most: f64, required_m: f64) -> [f64; CLASSES] {
    let count = CLASSES as f64;
    let step = nice::round_up(most / count);
    if step * count <= required_m {
        return std::array::from_fn(|class| step * (class + 1) as f64);
    }
    // Even round steps would pass the requirement; let it be the last limit and round the others to a fine grain.
    let grain = nice::step_down(required_m / 50.0);
    std::array::from_fn(|class| {
        if class + 1 == CLASSES {
            required_m
        } else {
            libm::round(required_m * (class + 1) as f64 / count / grain) * grain
        }
    })
}

/// `count` round limits above the requirement, the last at least `most`.
fn above(most: f64, required_m: f64, count: usize) -> Vec<f64> {
    let width = (most - required_m) / count as f64;
    // Classes are wider than the grain, so rounding keeps their limits apart and above the requirement.
    let grain = nice::step_down(0.7 * width);
    let inner = (1..count).map(|number| libm::round((required_m + width * number as f64) / grain) * grain);
    inner.chain([libm::ceil(most / grain) * grain]).collect()
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    proptest! {
        #[test]
        fn limits_ascend_hold_every_value_and_never_split_at_the_requirement(
            values in prop::collection::vec(0.01..50_000.0_f64, 0..30),
            required_m in 1.0..20_000.0_f64,
        ) {
            let limits = limits(&values, required_m);
            prop_assert!(limits[0] > 0.0);
            prop_assert!(limits.windows(2).all(|pair| pair[0] < pair[1]), "{limits:?}");
            let last = limits[CLASSES - 1];
            // A limit that is a sum of round steps may round off in its last digits.
            prop_assert!(values.iter().all(|&value| value <= last * (1.0 + 1e-9)), "{limits:?}");
            prop_assert!(limits.contains(&required_m) || last <= required_m, "{limits:?}");
        }
    }

    #[test]
    fn limits_are_round() {
        assert_eq!(limits(&[80.0, 420.0, 600.0], 450.0), [150.0, 300.0, 450.0, 550.0, 600.0]);
        assert_eq!(limits(&[80.0, 190.0], 450.0), [40.0, 80.0, 120.0, 160.0, 200.0]);
        assert_eq!(limits(&[500.0, 880.0], 450.0)[0], 450.0);
    }
}
