//! Closed intervals of reals with outward rounding: the only arithmetic in which sets are computed.
//!
//! *Guarantee.* For every operation ∘ and all x ∈ X, y ∈ Y: x ∘ y ∈ X ∘ Y, whatever the rounding of the machine.
//! The empty interval is a value; every operation on it is empty.
//!
//! *Rounding.* All of it goes through two primitives, [`down`] and [`up`], which step one representable number
//! outward. IEEE 754 addition, subtraction, multiplication, division and square root return one of the two
//! representable neighbours of the exact result, so one step outward encloses it.
//!
//! *References.* Set-based intervals as in [`crate::bibliography::IEEE_1788`]; the method in
//! [`crate::bibliography::JAULIN_2001`].

mod box2;
mod exp;
pub mod paving;
mod relaxed;
mod trig;
mod union;

pub use crate::order::{larger, smaller};
pub use box2::Box2;
pub use relaxed::relaxed_intersection;
pub use union::IntervalUnion;

use serde::Serialize;

/// Largest representable number below `x` (rounding primitive 1).
#[inline]
pub fn down(x: f64) -> f64 {
    x.next_down()
}

/// Smallest representable number above `x` (rounding primitive 2).
#[inline]
pub fn up(x: f64) -> f64 {
    x.next_up()
}

/// A closed interval [lo, hi] of reals; empty when lo > hi.
///
/// *Invariant.* No end is ever "not a number". An interval made by hand has lo < +∞ and hi > −∞ and holds a real
/// number. Rounding outward keeps that: a lower end that overflows upward steps back to the largest number, an upper
/// end likewise downward. So a sum never meets ∞ − ∞, and products and quotients give their limits to 0 · ∞ and ∞ / ∞.
#[derive(Clone, Copy, Debug, PartialEq, Serialize)]
pub struct Interval {
    lo: f64,
    hi: f64,
}

impl Interval {
    /// The empty set.
    pub const EMPTY: Self = Self { lo: f64::INFINITY, hi: f64::NEG_INFINITY };
    /// All reals.
    pub const ENTIRE: Self = Self { lo: f64::NEG_INFINITY, hi: f64::INFINITY };
    /// The interval that holds 0 only.
    pub const ZERO: Self = Self { lo: 0.0, hi: 0.0 };

    /// The interval [lo, hi]; −∞ and +∞ leave it open at that end.
    ///
    /// # Panics
    /// When `lo > hi`, when either is not a number, or when no real number lies between: an interval made by hand
    /// must not be empty by accident.
    pub fn new(lo: f64, hi: f64) -> Self {
        assert!(
            lo <= hi && lo < f64::INFINITY && f64::NEG_INFINITY < hi,
            "an interval needs lo <= hi and a number between, got [{lo}, {hi}]"
        );
        Self { lo, hi }
    }

    /// The interval that holds exactly `x`.
    ///
    /// # Panics
    /// When `x` is infinite or not a number: the truth would be lost without a sound.
    pub const fn point(x: f64) -> Self {
        assert!(x.is_finite(), "an interval holds finite numbers");
        Self { lo: x, hi: x }
    }

    /// `centre` ± `half_width`, rounded outward.
    ///
    /// # Panics
    /// When `half_width` is negative or not a number.
    pub fn around(centre: f64, half_width: f64) -> Self {
        assert!(half_width >= 0.0, "a half-width is at least 0, got {half_width}");
        Self::point(centre) + Self::new(-half_width, half_width)
    }

    /// Lower end (+∞ when empty).
    #[inline]
    pub const fn lo(self) -> f64 {
        self.lo
    }

    /// Upper end (−∞ when empty).
    #[inline]
    pub const fn hi(self) -> f64 {
        self.hi
    }

    /// Whether no number is inside.
    #[inline]
    pub fn is_empty(self) -> bool {
        self.lo > self.hi
    }

    /// Width, rounded up; 0 when empty.
    pub fn width(self) -> f64 {
        if self.is_empty() || self.lo == self.hi { 0.0 } else { up(self.hi - self.lo) }
    }

    /// A number near the middle, inside the interval.
    ///
    /// # Panics
    /// When the interval is empty or unbounded.
    pub fn middle(self) -> f64 {
        assert!(self.lo.is_finite() && self.hi.is_finite(), "the middle of {self:?} does not exist");
        (0.5 * self.lo + 0.5 * self.hi).clamp(self.lo, self.hi)
    }

    /// Whether `x` is inside.
    #[inline]
    pub fn contains(self, x: f64) -> bool {
        self.lo <= x && x <= self.hi
    }

    /// Whether every number of `other` is inside (the empty set is inside everything).
    #[inline]
    pub fn contains_interval(self, other: Self) -> bool {
        other.is_empty() || (self.lo <= other.lo && other.hi <= self.hi)
    }

    /// Numbers in both (exact).
    #[inline]
    #[must_use]
    pub fn intersection(self, other: Self) -> Self {
        let both = Self { lo: larger(self.lo, other.lo), hi: smaller(self.hi, other.hi) };
        if both.is_empty() { Self::EMPTY } else { both }
    }

    /// Smallest interval that holds both (exact).
    #[inline]
    #[must_use]
    pub fn hull(self, other: Self) -> Self {
        if self.is_empty() {
            other
        } else if other.is_empty() {
            self
        } else {
            Self { lo: smaller(self.lo, other.lo), hi: larger(self.hi, other.hi) }
        }
    }

    /// { x² }, rounded outward, never below 0.
    #[must_use]
    pub fn sqr(self) -> Self {
        if self.is_empty() {
            return Self::EMPTY;
        }
        let (a, b) = (self.lo.abs(), self.hi.abs());
        let least = if self.contains(0.0) { 0.0 } else { smaller(a, b) };
        let most = larger(a, b);
        Self { lo: larger(down(least * least), 0.0), hi: up(most * most) }
    }

    /// { √x : x ≥ 0 }, rounded outward; empty when no x is at least 0.
    #[must_use]
    pub fn sqrt(self) -> Self {
        if self.is_empty() || self.hi < 0.0 {
            return Self::EMPTY;
        }
        let lo = if self.lo <= 0.0 { 0.0 } else { larger(down(self.lo.sqrt()), 0.0) };
        Self { lo, hi: up(self.hi.sqrt()) }
    }
}

/// [a, b] + [c, d] = [a + c, b + d].
impl std::ops::Add for Interval {
    type Output = Self;
    #[inline]
    fn add(self, other: Self) -> Self {
        if self.is_empty() || other.is_empty() {
            return Self::EMPTY;
        }
        Self { lo: down(self.lo + other.lo), hi: up(self.hi + other.hi) }
    }
}

/// [a, b] − [c, d] = [a − d, b − c].
impl std::ops::Sub for Interval {
    type Output = Self;
    #[inline]
    fn sub(self, other: Self) -> Self {
        self + (-other)
    }
}

/// −[a, b] = [−b, −a] (exact).
impl std::ops::Neg for Interval {
    type Output = Self;
    #[inline]
    fn neg(self) -> Self {
        Self { lo: -self.hi, hi: -self.lo }
    }
}

/// [a, b] · [c, d] = hull { ac, ad, bc, bd }; 0 · ∞ counts as 0.
impl std::ops::Mul for Interval {
    type Output = Self;
    #[inline]
    fn mul(self, other: Self) -> Self {
        if self.is_empty() || other.is_empty() {
            return Self::EMPTY;
        }
        let product = |x: f64, y: f64| if x == 0.0 || y == 0.0 { 0.0 } else { x * y };
        let corners = [
            product(self.lo, other.lo),
            product(self.lo, other.hi),
            product(self.hi, other.lo),
            product(self.hi, other.hi),
        ];
        let least = corners.into_iter().fold(f64::INFINITY, smaller);
        let most = corners.into_iter().fold(f64::NEG_INFINITY, larger);
        Self { lo: down(least), hi: up(most) }
    }
}

/// [a, b] / [c, d] = hull of the quotients; all reals when the divisor holds 0 among others, empty when it is
/// exactly 0.
///
/// A corner with an infinite divisor counts as 0, its limit for every finite dividend. Where the dividend is infinite
/// too, the quotients run from that 0 to the corner with the finite end of the divisor, which is also in the hull.
impl std::ops::Div for Interval {
    type Output = Self;
    #[inline]
    fn div(self, other: Self) -> Self {
        if self.is_empty() || other.is_empty() || (other.lo == 0.0 && other.hi == 0.0) {
            return Self::EMPTY;
        }
        if other.contains(0.0) {
            return Self::ENTIRE;
        }
        let quotient = |x: f64, y: f64| if y.is_infinite() { 0.0 } else { x / y };
        let corners = [
            quotient(self.lo, other.lo),
            quotient(self.lo, other.hi),
            quotient(self.hi, other.lo),
            quotient(self.hi, other.hi),
        ];
        let least = corners.into_iter().fold(f64::INFINITY, smaller);
        let most = corners.into_iter().fold(f64::NEG_INFINITY, larger);
        Self { lo: down(least), hi: up(most) }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn empty_is_a_value_that_stays_empty() {
        let one = Interval::point(1.0);
        for result in [
            Interval::EMPTY + one,
            one - Interval::EMPTY,
            one * Interval::EMPTY,
            Interval::EMPTY / one,
            Interval::EMPTY.sqr(),
            Interval::new(-2.0, -1.0).sqrt(),
            one.intersection(Interval::point(2.0)),
            -Interval::EMPTY,
        ] {
            assert!(result.is_empty(), "{result:?}");
        }
        assert_eq!(Interval::EMPTY.hull(one), one);
        assert!(one.contains_interval(Interval::EMPTY));
    }

    #[test]
    fn every_result_lies_strictly_around_the_inexact_value() {
        let tenth = Interval::point(0.1);
        let sum = tenth + Interval::point(0.2);
        // 0.1 + 0.2 in binary64 is above the exact sum of the two binary64 numbers.
        assert!(sum.lo() < 0.1 + 0.2 && 0.1 + 0.2 < sum.hi());
        assert!(sum.width() < 1e-15);
    }

    #[test]
    fn division_by_an_interval_around_zero_gives_all_reals() {
        assert_eq!(Interval::point(1.0) / Interval::new(-1.0, 1.0), Interval::ENTIRE);
        assert!((Interval::point(1.0) / Interval::ZERO).is_empty());
    }
}
