//! Percentiles and shares with confidence intervals that stay honest for few draws and for "never".
//!
//! *Censored values.* A dive without a fix has no fix distance; it counts as longer than every distance. A percentile
//! that falls among such dives has no value.
//!
//! *Effective number.* Runs that start at different segments of one simulated dive share its errors, so they are not
//! independent. Intervals use the number of **dives**, not of runs. A share averaged within dives has at most the
//! variance of a yes-or-no answer per dive, so the binomial interval on dives is on the safe side.
//!
//! *References.* Shares: [`crate::bibliography::CLOPPER_PEARSON_1934`] (0 of n gives an upper end of about 3.7/n at
//! two-sided 95 %). Percentiles: order statistics between binomial ranks, the standard distribution-free interval.

use statrs::distribution::{Beta, Binomial, ContinuousCDF, DiscreteCDF};

use crate::interval::larger;
use crate::report::Estimate;

/// Probability left out on each side of a confidence interval (95 % two-sided).
const TAIL: f64 = 0.025;

/// Percentile `p` (0 to 1) of `sorted`, in which dives without a value stand last as `None`; interval for `dives`
/// independent dives.
///
/// The percentile is the smallest value that at least the share `p` of the runs does not exceed.
pub fn percentile(sorted: &[Option<f64>], p: f64, dives: usize) -> Estimate {
    if sorted.is_empty() || dives == 0 {
        return Estimate { value: None, low: None, high: None };
    }
    let n = dives as f64;
    let ranks = Binomial::new(p, dives as u64).expect("p is a probability");
    // Number of dives (out of n) that lie below the true percentile with probability outside [TAIL, 1 − TAIL].
    let below = ranks.inverse_cdf(TAIL) as f64;
    let above = ranks.inverse_cdf(1.0 - TAIL) as f64 + 1.0;
    let at_rank = |rank: f64| {
        let run = (rank / n * sorted.len() as f64).ceil() as usize;
        if rank < 1.0 || run > sorted.len() { None } else { sorted[run.max(1) - 1] }
    };
    Estimate { value: at_rank_of_share(sorted, p), low: at_rank(below), high: at_rank(above) }
}

/// The plain percentile without an interval.
pub fn at_rank_of_share(sorted: &[Option<f64>], p: f64) -> Option<f64> {
    let rank = (p * sorted.len() as f64 - 1e-9).ceil() as usize;
    sorted.get(rank.clamp(1, sorted.len().max(1)) - 1).copied().flatten()
}

/// Share `hits / runs` with the Clopper–Pearson interval for `dives` independent dives.
pub fn share(hits: usize, runs: usize, dives: usize) -> Estimate {
    if runs == 0 || dives == 0 {
        return Estimate { value: None, low: None, high: None };
    }
    let value = hits as f64 / runs as f64;
    let (n, k) = (dives as f64, value * dives as f64);
    let quantile = |a: f64, b: f64, x: f64| Beta::new(a, b).expect("both shapes are above 0").inverse_cdf(x);
    let low = if hits == 0 { 0.0 } else { quantile(k, n - k + 1.0, TAIL) };
    let high =
        if hits == runs { 1.0 } else { quantile(k + 1.0, larger(n - k, f64::MIN_POSITIVE), 1.0 - TAIL) };
    Estimate { value: Some(value), low: Some(low), high: Some(high) }
}

/// Sorts with missing values last.
pub fn sort_missing_last(values: &mut [Option<f64>]) {
    values.sort_by(|a, b| match (a, b) {
        (Some(a), Some(b)) => a.total_cmp(b),
        (None, None) => std::cmp::Ordering::Equal,
        (None, Some(_)) => std::cmp::Ordering::Greater,
        (Some(_), None) => std::cmp::Ordering::Less,
    });
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nothing_in_n_is_not_zero() {
        // Clopper and Pearson's closed form for 0 of n: 1 − (α/2)^(1/n); about 3.7/n at 95 % two-sided.
        let e = share(0, 60, 60);
        assert_eq!(e.value, Some(0.0));
        assert_eq!(e.low, Some(0.0));
        let expected = 1.0 - TAIL.powf(1.0 / 60.0);
        assert!((e.high.expect("an upper end") - expected).abs() < 1e-6, "{e:?}");
    }

    #[test]
    fn shares_agree_with_the_published_interval() {
        // 95 % Clopper–Pearson interval for 4 of 20 from the F-distribution formula: 0.0573 to 0.4366 (value from
        // memory of common tables, recomputed by bisection on the binomial tail below).
        let e = share(4, 20, 20);
        let tail = |p: f64, at_least: u64| {
            let b = Binomial::new(p, 20).expect("valid");
            1.0 - b.cdf(at_least - 1)
        };
        assert!((tail(e.low.expect("low"), 4) - TAIL).abs() < 1e-6);
        assert!((1.0 - tail(e.high.expect("high"), 5) - TAIL).abs() < 1e-6);
        assert!((e.low.expect("low") - 0.0573).abs() < 1e-4 && (e.high.expect("high") - 0.4366).abs() < 1e-4);
    }

    #[test]
    fn percentiles_treat_missing_as_longest() {
        let mut values: Vec<Option<f64>> = (1..=19).map(|i| Some(f64::from(i))).collect();
        values.push(None);
        sort_missing_last(&mut values);
        assert_eq!(percentile(&values, 0.5, 20).value, Some(10.0));
        assert_eq!(percentile(&values, 0.95, 20).value, Some(19.0));
        assert_eq!(percentile(&values, 0.95, 20).high, None);
        assert_eq!(percentile(&values[19..], 0.5, 1).value, None);
        assert_eq!(percentile(&[], 0.5, 0).value, None);
    }

    #[test]
    fn the_percentile_interval_covers_as_often_as_it_says() {
        // For the median of n = 60 the interval runs from rank 22 to rank 39: coverage P(22 ≤ B(60, ½) ≤ 38) = 0.973.
        let values: Vec<Option<f64>> = (1..=60).map(|i| Some(f64::from(i))).collect();
        let e = percentile(&values, 0.5, 60);
        let b = Binomial::new(0.5, 60).expect("valid");
        let (low, high) = (e.low.expect("low") as u64, e.high.expect("high") as u64);
        assert!(b.cdf(high - 1) - b.cdf(low - 1) >= 0.95, "{low} {high}");
    }
}
