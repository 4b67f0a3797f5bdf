//! Finite unions of closed intervals: sets of reals that may have gaps.

use super::Interval;

/// A finite union of closed intervals.
///
/// *Invariants.* The parts are not empty, lie in increasing order, and do not meet: between two parts there is a gap.
/// So equal sets have equal parts. All ends are ends of intervals that were put in; nothing is rounded.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct IntervalUnion {
    parts: Vec<Interval>,
}

impl IntervalUnion {
    /// The empty set.
    pub const EMPTY: Self = Self { parts: Vec::new() };

    /// The union of any intervals (exact).
    ///
    /// *Derivation.* In the order of their lower ends, an interval meets the last part exactly when it begins at or
    /// before the end of that part; every earlier part ended before the last one began.
    pub fn of(intervals: impl IntoIterator<Item = Interval>) -> Self {
        let mut sorted: Vec<Interval> = intervals.into_iter().filter(|i| !i.is_empty()).collect();
        sorted.sort_by(|a, b| a.lo.total_cmp(&b.lo));
        let mut parts: Vec<Interval> = Vec::with_capacity(sorted.len());
        for next in sorted {
            match parts.last_mut() {
                Some(last) if next.lo <= last.hi => *last = last.hull(next),
                _ => parts.push(next),
            }
        }
        Self { parts }
    }

    /// The parts, in increasing order, with gaps between them.
    pub fn parts(&self) -> &[Interval] {
        &self.parts
    }

    /// Whether no number is inside.
    pub fn is_empty(&self) -> bool {
        self.parts.is_empty()
    }

    /// Whether `x` is inside.
    pub fn contains(&self, x: f64) -> bool {
        let not_before = self.parts.partition_point(|part| part.hi < x);
        self.parts.get(not_before).is_some_and(|part| part.contains(x))
    }

    /// Numbers in either (exact).
    #[must_use]
    pub fn union(&self, other: &Self) -> Self {
        Self::of(self.parts.iter().chain(&other.parts).copied())
    }

    /// Numbers in both (exact).
    ///
    /// *Derivation.* Walking both lists at once: of the two parts in hand, the one that ends first cannot meet any
    /// later part of the other list, so it is done once it has met the part in hand.
    #[must_use]
    pub fn intersection(&self, other: &Self) -> Self {
        let (mut i, mut j) = (0, 0);
        let mut both = Vec::new();
        while let (Some(a), Some(b)) = (self.parts.get(i), other.parts.get(j)) {
            both.push(a.intersection(*b));
            if a.hi <= b.hi {
                i += 1;
            } else {
                j += 1;
            }
        }
        Self::of(both)
    }

    /// Smallest interval that holds the set (exact); empty when the set is.
    pub fn hull(&self) -> Interval {
        self.parts.iter().fold(Interval::EMPTY, |hull, part| hull.hull(*part))
    }

    /// Enclosure of the total length of the parts; [0, 0] when empty.
    pub fn length(&self) -> Interval {
        self.parts
            .iter()
            .fold(Interval::ZERO, |sum, part| sum + (Interval::point(part.hi) - Interval::point(part.lo)))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn of(ends: &[(f64, f64)]) -> IntervalUnion {
        IntervalUnion::of(ends.iter().map(|(lo, hi)| Interval::new(*lo, *hi)))
    }

    #[test]
    fn parts_are_sorted_and_joined_where_they_meet() {
        let set = of(&[(5.0, 6.0), (1.0, 2.0), (2.0, 3.0), (1.5, 1.7), (6.5, 6.5)]);
        assert_eq!(set.parts(), [Interval::new(1.0, 3.0), Interval::new(5.0, 6.0), Interval::point(6.5)]);
        assert!(set.contains(3.0) && set.contains(6.5) && !set.contains(4.0) && !set.contains(7.0));
        assert_eq!(set.hull(), Interval::new(1.0, 6.5));
        assert!(set.length().contains(3.0) && set.length().width() < 1e-14);
    }

    #[test]
    fn union_and_intersection_agree_with_membership() {
        let one = of(&[(0.0, 2.0), (4.0, 6.0), (8.0, 8.0)]);
        let other = of(&[(1.0, 4.0), (5.0, 9.0)]);
        for half in -2..20 {
            let x = 0.5 * f64::from(half);
            assert_eq!(one.intersection(&other).contains(x), one.contains(x) && other.contains(x), "{x}");
            assert_eq!(one.union(&other).contains(x), one.contains(x) || other.contains(x), "{x}");
        }
        assert_eq!(one.intersection(&other), other.intersection(&one));
        assert_eq!(one.intersection(&other).parts().len(), 4);
        assert!(one.intersection(&IntervalUnion::EMPTY).is_empty());
    }

    #[test]
    fn the_empty_set_has_no_parts() {
        assert!(IntervalUnion::of([Interval::EMPTY]).is_empty());
        assert!(IntervalUnion::EMPTY.hull().is_empty());
        assert_eq!(IntervalUnion::EMPTY.length(), Interval::ZERO);
    }
}
