//! Exact and high-precision reference arithmetic for the tests, on big integers. Shares no code with the crate.

use fixability::interval::Interval;
use num_bigint::BigInt;
use num_rational::BigRational;
use num_traits::{One, Signed, Zero};

/// The exact value of a finite binary64 number.
pub fn rational(x: f64) -> BigRational {
    BigRational::from_float(x).expect("a finite number")
}

/// Whether the exact number lies inside the interval. An infinite end holds everything on its side.
pub fn holds(interval: Interval, exact: &BigRational) -> bool {
    !interval.is_empty()
        && (interval.lo() == f64::NEG_INFINITY || rational(interval.lo()) <= *exact)
        && (interval.hi() == f64::INFINITY || *exact <= rational(interval.hi()))
}

/// How many representable numbers `outer` is above `inner` (both zeros count as one number).
pub fn steps(inner: f64, outer: f64) -> i64 {
    let key = |x: f64| {
        let bits = x.to_bits() as i64;
        if bits < 0 { i64::MIN - bits } else { bits }
    };
    key(outer) - key(inner)
}

/// Binary places of the fixed-point numbers below.
const PLACES: usize = 400;

/// Error of every function below, in units of the last place: each of the fewer than 10⁴ truncated operations loses
/// less than one unit, times the at most 2¹⁴ turns of the argument reduction and the factor e²⁰ of the exponential.
const SLACK_PLACES: usize = 64;

/// A number known to within 2^(64 − 400).
pub struct Reference(BigInt);

impl Reference {
    /// Whether the number may lie inside the interval, for all that is known of it.
    pub fn within(&self, interval: Interval) -> bool {
        let slack = BigInt::one() << SLACK_PLACES;
        let scale = BigRational::from(BigInt::one() << PLACES);
        !interval.is_empty()
            && rational(interval.lo()) * &scale <= BigRational::from(&self.0 + &slack)
            && rational(interval.hi()) * &scale >= BigRational::from(&self.0 - &slack)
    }
}

fn fixed(x: f64) -> BigInt {
    (rational(x) * BigRational::from(BigInt::one() << PLACES)).floor().to_integer()
}

/// arctan(1/n) by its power series.
fn arctan_of_inverse(n: u32) -> BigInt {
    let mut power = (BigInt::one() << PLACES) / n;
    let (mut sum, mut k) = (BigInt::zero(), 0u32);
    while !power.is_zero() {
        let term = &power / (2 * k + 1);
        sum += if k.is_multiple_of(2) { term } else { -term };
        power /= n * n;
        k += 1;
    }
    sum
}

/// π by Machin's formula of 1706: π/4 = 4 arctan(1/5) − arctan(1/239).
fn pi() -> BigInt {
    (arctan_of_inverse(5) * 4 - arctan_of_inverse(239)) * 4
}

/// Sum of x^(first + 2k) / (first + 2k)! with alternating signs, |x| ≤ π.
fn alternating_series(x: &BigInt, first: u32) -> BigInt {
    let mut term = if first == 0 { BigInt::one() << PLACES } else { x.clone() };
    let (mut sum, mut k) = (BigInt::zero(), first);
    while !term.is_zero() {
        sum += &term;
        term = -((term * x) >> PLACES) * x;
        term >>= PLACES;
        term /= (k + 1) * (k + 2);
        k += 2;
    }
    sum
}

fn reduced(x: f64) -> BigInt {
    let turn = pi() * 2;
    let x = fixed(x);
    let turns = (&x + (&turn >> 1)) / &turn;
    x - turns * turn
}

/// sin x for |x| ≤ 10⁴.
pub fn sin(x: f64) -> Reference {
    Reference(alternating_series(&reduced(x), 1))
}

/// cos x for |x| ≤ 10⁴.
pub fn cos(x: f64) -> Reference {
    Reference(alternating_series(&reduced(x), 0))
}

/// eˣ for |x| ≤ 20.
pub fn exp(x: f64) -> Reference {
    let (size, mut sum, mut k) = (fixed(x).abs(), BigInt::zero(), 0u32);
    let mut term = BigInt::one() << PLACES;
    while !term.is_zero() {
        sum += &term;
        k += 1;
        term = ((term * &size) >> PLACES) / k;
    }
    Reference(if x < 0.0 { (BigInt::one() << (2 * PLACES)) / sum } else { sum })
}
