//! Enclosure of the exponential.
//!
//! *Guarantee.* The `libm` crate's exponential is a port of the FreeBSD msun routine, whose error is stated to be
//! below 1 ulp (unit in the last place) of the result. Two steps outward cover it everywhere: one step is 1 ulp
//! inside a binade; just above a power of two a step downward is only half an ulp, and two of them make the whole.
//! Results in the subnormal range carry one more rounding of at most half a step, for which the second step is the
//! reserve. The function grows, so the enclosure over an interval is the enclosures at its ends.

use super::{Interval, down, larger, up};

impl Interval {
    /// { eˣ }, rounded outward, never below 0.
    #[must_use]
    pub fn exp(self) -> Self {
        if self.is_empty() {
            return Self::EMPTY;
        }
        let (least, most) = (libm::exp(self.lo), libm::exp(self.hi));
        Self { lo: larger(down(down(least)), 0.0), hi: up(up(most)) }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ends_of_the_range_are_enclosed() {
        assert!(Interval::EMPTY.exp().is_empty());
        assert_eq!(Interval::ENTIRE.exp(), Interval { lo: 0.0, hi: f64::INFINITY });
        let overflow = Interval::new(0.0, 1000.0).exp();
        assert!(overflow.lo() < 1.0 && overflow.hi() == f64::INFINITY);
        // Beyond the largest number the lower end stays finite: e¹⁰⁰⁰ is above it.
        assert!(Interval::point(1000.0).exp().lo().is_finite());
        let underflow = Interval::point(-1000.0).exp();
        assert!(underflow.lo() == 0.0 && underflow.hi() > 0.0 && underflow.hi() < 1e-300);
    }
}
