//! Relaxed intersection: what all but a few of the sets agree on.
//!
//! With at most q stray measurements among n, the truth lies in at least n − q of the n sets that they give.
//!
//! *References.* [`crate::bibliography::JAULIN_2001`] for sets from bounded errors; the sweep over sorted ends is
//! common practice.

use super::{Interval, IntervalUnion};

/// Numbers that lie in all of `sets` but at most `most_left_out` (exact).
///
/// With as many left out as there are sets nothing is asked, and the answer is all reals. An empty set among `sets`
/// counts: it is one that every number misses.
///
/// *Derivation.* Going up the line, the number of sets that hold x rises by one at every lower end and falls by one
/// just after every upper end (the sets are closed), so at equal numbers lower ends are counted first. The answer is
/// where the count is at least n − q: it begins at the lower end that brings the count up to n − q and ends at the
/// upper end that takes it below. Ends are compared and copied, never computed, so nothing is rounded.
#[must_use]
pub fn relaxed_intersection(sets: &[Interval], most_left_out: usize) -> IntervalUnion {
    if most_left_out >= sets.len() {
        return IntervalUnion::of([Interval::ENTIRE]);
    }
    let needed = sets.len() - most_left_out;
    let present = || sets.iter().filter(|set| !set.is_empty());
    // Adding 0 makes one number of the two zeros, which the total order tells apart.
    let mut ends: Vec<(f64, bool)> =
        present().map(|set| (set.lo + 0.0, false)).chain(present().map(|set| (set.hi + 0.0, true))).collect();
    ends.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
    let (mut held, mut begun, mut parts) = (0, f64::NEG_INFINITY, Vec::new());
    for (at, is_upper) in ends {
        if is_upper {
            if held == needed {
                parts.push(Interval::new(begun, at));
            }
            held -= 1;
        } else {
            held += 1;
            if held == needed {
                begun = at;
            }
        }
    }
    IntervalUnion::of(parts)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn closed_ends_and_single_points_count() {
        let sets = [Interval::new(0.0, 1.0), Interval::new(1.0, 2.0), Interval::point(1.0)];
        assert_eq!(relaxed_intersection(&sets, 0).parts(), [Interval::point(1.0)]);
        assert_eq!(relaxed_intersection(&sets, 1).parts(), [Interval::point(1.0)]);
        assert_eq!(relaxed_intersection(&sets, 2).parts(), [Interval::new(0.0, 2.0)]);
        assert_eq!(relaxed_intersection(&sets, 3).parts(), [Interval::ENTIRE]);
        let zeros = [Interval::new(-1.0, -0.0), Interval::new(0.0, 1.0)];
        assert_eq!(relaxed_intersection(&zeros, 0).parts(), [Interval::ZERO]);
    }

    #[test]
    fn an_empty_set_counts_as_one_that_is_always_missed() {
        let sets = [Interval::EMPTY, Interval::new(0.0, 1.0)];
        assert!(relaxed_intersection(&sets, 0).is_empty());
        assert_eq!(relaxed_intersection(&sets, 1).parts(), [Interval::new(0.0, 1.0)]);
    }
}
