//! Round numbers: steps of grids and scale bars, limits of classes, and how numbers are written.

/// Leading digits a round number may have.
const DIGITS: [f64; 9] = [1.0, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0];
/// Leading digits of a step that people count in.
const STEP_DIGITS: [f64; 3] = [1.0, 2.0, 5.0];

/// Smallest round number that is at least `x` (positive and finite).
pub(super) fn round_up(x: f64) -> f64 {
    candidates(x, &DIGITS).find(|&c| c >= x * (1.0 - 1e-12)).unwrap_or(x)
}

/// Round number nearest to `x` (positive and finite).
pub(super) fn nearest(x: f64) -> f64 {
    candidates(x, &DIGITS).min_by(|a, b| (a - x).abs().total_cmp(&(b - x).abs())).unwrap_or(x)
}

/// Smallest of 1, 2, 5 times a power of ten that is at least `x` (positive and finite).
pub(super) fn step_up(x: f64) -> f64 {
    candidates(x, &STEP_DIGITS).find(|&c| c >= x * (1.0 - 1e-12)).unwrap_or(x)
}

/// Largest of 1, 2, 5 times a power of ten that is at most `x` (positive and finite).
pub(super) fn step_down(x: f64) -> f64 {
    candidates(x, &STEP_DIGITS).take_while(|&c| c <= x * (1.0 + 1e-12)).last().unwrap_or(x)
}

/// Round numbers around `x`, ascending.
fn candidates(x: f64, digits: &[f64]) -> impl Iterator<Item = f64> {
    let exponent = libm::floor(libm::log10(x));
    (-1..=1).flat_map(move |shift| digits.iter().map(move |d| scaled(*d, exponent + f64::from(shift))))
}

/// `digit` × 10^`exponent`, dividing for negative exponents so that 0.2 is the nearest number to 0.2.
fn scaled(digit: f64, exponent: f64) -> f64 {
    if exponent < 0.0 { digit / libm::pow(10.0, -exponent) } else { digit * libm::pow(10.0, exponent) }
}

/// Multiples of `step` in [from, to].
pub(super) fn multiples(step: f64, from: f64, to: f64) -> Vec<f64> {
    let (first, last) = (libm::ceil(from / step), libm::floor(to / step));
    let count = last - first;
    // A frame holds a handful of grid lines; anything else is a picture of no width.
    if !(0.0..1000.0).contains(&count) {
        return Vec::new();
    }
    (0..=count as u32).map(|n| (first + f64::from(n)) * step).collect()
}

/// `value` with as many decimals as a multiple of `step` can have, at most six.
pub(super) fn written(value: f64, step: f64) -> String {
    let mut decimals = 0;
    let mut scaled = step;
    while decimals < 6 && (scaled - libm::round(scaled)).abs() > 1e-9 * scaled.abs() {
        scaled *= 10.0;
        decimals += 1;
    }
    let text = format!("{value:.decimals$}");
    // A rounded minus zero is zero.
    if text.strip_prefix('-').is_some_and(|rest| rest.chars().all(|c| c == '0' || c == '.')) {
        text[1..].to_owned()
    } else {
        text
    }
}

/// `value` as short as it can be written with at most `decimals` decimals.
pub(super) fn short(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    let text = if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.') } else { &text };
    if text == "-0" { "0".to_owned() } else { text.to_owned() }
}

/// Metres for reading: whole above 10, one decimal below.
pub(super) fn metres(value: f64) -> String {
    if value.abs() >= 10.0 { format!("{value:.0}") } else { short(value, 1) }
}
