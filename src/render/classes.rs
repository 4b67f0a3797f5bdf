//! Classes of fix distance: five steps that follow from the required distance alone, so that a colour means the same in every
//! chart of a dive. Three classes meet the requirement, the fourth ends at twice it, the last is open.

use super::colours::CLASSES;
use super::nice;
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
    /// Upper limits, metres, ascending, the last infinite; a value belongs to the first class whose limit it does not exceed.
    pub(super) limits_m: [f64; CLASSES],
    pub(super) required_m: f64,
}

impl Scale {
    /// The scale for all segments of `report`.
    pub(super) fn of(report: &LinesReport) -> Self {
        let segments = || report.lines.iter().flat_map(|line| &line.segments);
        let guaranteed = segments().any(|segment| segment.guaranteed.is_some());
        let quantity = if guaranteed { Quantity::Guaranteed } else { Quantity::Estimated };
        let required_m = report.parameters.required_fix_m;
        Self { quantity, limits_m: limits(required_m), required_m }
    }

    /// The scale for guaranteed distances.
    pub(super) fn of_guaranteed(required_m: f64) -> Self {
        Self { quantity: Quantity::Guaranteed, limits_m: limits(required_m), required_m }
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
            _ if class + 1 == CLASSES => format!("over {} m", written(self.limits_m[class - 1])),
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

/// The limits for a required distance (positive): two round ones below it, itself, twice it, and none.
fn limits(required_m: f64) -> [f64; CLASSES] {
    let step = nice::nearest(required_m / 3.0);
    [step, 2.0 * step, required_m, 2.0 * required_m, f64::INFINITY]
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    proptest! {
        #[test]
        fn limits_ascend_and_the_requirement_is_the_third(required_m in 1.0..20_000.0_f64) {
            let limits = limits(required_m);
            prop_assert!(limits[0] > 0.0 && limits[2] == required_m);
            prop_assert!(limits.windows(2).all(|pair| pair[0] < pair[1]), "{limits:?}");
        }
    }

    #[test]
    fn limits_are_round() {
        assert_eq!(limits(450.0), [150.0, 300.0, 450.0, 900.0, f64::INFINITY]);
        assert_eq!(limits(100.0)[..2], [30.0, 60.0]);
    }

    #[test]
    fn every_class_has_its_words() {
        let scale = Scale::of_guaranteed(450.0);
        let labels: Vec<String> = (0..CLASSES).map(|class| scale.label(class)).collect();
        assert_eq!(labels, ["up to 150 m", "150 – 300 m", "300 – 450 m", "450 – 900 m", "over 900 m"]);
        assert_eq!(scale.class_of(5e6), Finding::Class(CLASSES - 1));
    }
}
