//! Enclosures of sine and cosine.
//!
//! *Guarantee.* The pure-Rust `libm` crate is a port of the FreeBSD msun routines, whose sine and cosine are stated
//! to be within 1 ulp (the kernels are, and the argument reduction keeps more than 53 bits). The values are the same
//! on every machine. Two steps outward leave one spare. Between extreme points both functions are monotone, so the
//! enclosure over an interval is the hull of the enclosures at its ends, plus +1 or −1 wherever an extreme point
//! *may* lie inside; the test for that errs on the side of "may".

use super::{Interval, down, larger, smaller, up};

/// Angle by which the search for extreme points is widened, radians. The quotient a / 2π is computed with a relative
/// error below 4·2⁻⁵³; for |a| ≤ 10⁴ rad that is below 10⁻¹¹ rad.
const EXTREME_GUARD_RAD: f64 = 1e-9;

/// Largest angle for which the guard above is argued, radians. Beyond it the answer is [−1, 1].
const ANGLE_MAX_RAD: f64 = 1e4;

impl Interval {
    /// { cos x }, rounded outward, within [−1, 1].
    #[must_use]
    pub fn cos(self) -> Self {
        self.periodic(libm::cos, 0.0)
    }

    /// { sin x }, rounded outward, within [−1, 1].
    #[must_use]
    pub fn sin(self) -> Self {
        self.periodic(libm::sin, std::f64::consts::FRAC_PI_2)
    }

    /// Enclosure of a function with value 1 at `peak` + 2kπ, −1 at `peak` + (2k + 1)π, monotone in between.
    fn periodic(self, function: fn(f64) -> f64, peak: f64) -> Self {
        if self.is_empty() {
            return Self::EMPTY;
        }
        let whole = Self::new(-1.0, 1.0);
        if !(self.lo.abs() <= ANGLE_MAX_RAD && self.hi.abs() <= ANGLE_MAX_RAD) {
            return whole;
        }
        let (at_lo, at_hi) = (function(self.lo), function(self.hi));
        let least = down(down(smaller(at_lo, at_hi)));
        let most = up(up(larger(at_lo, at_hi)));
        let top = self.may_meet(peak);
        let bottom = self.may_meet(peak + std::f64::consts::PI);
        Self { lo: if bottom { -1.0 } else { least }, hi: if top { 1.0 } else { most } }.intersection(whole)
    }

    /// Whether some `extreme` + 2kπ may lie inside.
    fn may_meet(self, extreme: f64) -> bool {
        let turn = std::f64::consts::TAU;
        let first = ((self.lo - EXTREME_GUARD_RAD - extreme) / turn).ceil();
        let last = ((self.hi + EXTREME_GUARD_RAD - extreme) / turn).floor();
        first <= last
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::PI;

    #[test]
    fn extremes_inside_are_found_and_outside_are_not() {
        assert_eq!(Interval::new(-0.1, 0.1).cos().hi(), 1.0);
        assert_eq!(Interval::new(3.0, 3.3).cos().lo(), -1.0);
        assert_eq!(Interval::new(0.0, 7.0).sin(), Interval::new(-1.0, 1.0));
        let steep = Interval::new(0.2, 0.3).sin();
        assert!(steep.lo() < 0.2f64.sin() && 0.3f64.sin() < steep.hi() && steep.width() < 0.1);
    }

    #[test]
    fn many_turns_away_still_encloses() {
        for k in -300..300 {
            let x = 0.37 + f64::from(k) * 2.0 * PI;
            let c = Interval::new(x, x + 0.01).cos();
            for i in 0..=10 {
                assert!(c.contains(libm::cos(x + 0.001 * f64::from(i))));
            }
        }
    }

    #[test]
    fn beyond_the_argued_range_nothing_is_claimed() {
        assert_eq!(Interval::point(1e300).cos(), Interval::new(-1.0, 1.0));
    }
}
