//! The larger and the smaller of two numbers by IEEE total order.
//!
//! `f64::max` and `f64::min` drop not-a-number silently; these do not, so a mistake upstream stays visible.

/// The larger of two numbers by IEEE total order.
#[inline]
pub fn larger(a: f64, b: f64) -> f64 {
    if a.total_cmp(&b).is_lt() { b } else { a }
}

/// The smaller of two numbers by IEEE total order.
#[inline]
pub fn smaller(a: f64, b: f64) -> f64 {
    if b.total_cmp(&a).is_lt() { b } else { a }
}
