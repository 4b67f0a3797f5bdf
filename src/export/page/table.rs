//! Tables and the words of numbers.

use maud::{Markup, html};

use crate::report::Estimate;

/// A table in a container that scrolls sideways when the page is narrow, so that the page itself never does. The
/// container can be reached and moved with the keyboard.
pub(super) fn scrolling(label: &str, table: &Markup) -> Markup {
    html! { div.scroll tabindex="0" role="region" aria-label=(label) { (table) } }
}

/// Marks a figure as true for every error within the bounds.
pub(super) fn guaranteed() -> Markup {
    html! { span.tag.sure { "guaranteed" } }
}

/// Marks a figure as a statistic of simulated dives.
pub(super) fn estimated() -> Markup {
    html! { span.tag.estimate { "estimated" } }
}

/// What stands for a missing value.
pub(super) const NONE: &str = "none";

/// Metres without decimals.
pub(super) fn metres(value: Option<f64>) -> String {
    value.map_or_else(|| NONE.to_owned(), |metres| format!("{metres:.0}"))
}

/// A share as per cent with one decimal, without the sign.
pub(super) fn per_cent(share: f64) -> String {
    format!("{:.1}", 100.0 * share)
}

/// A share with its 95 % confidence interval, per cent.
pub(super) fn share(estimate: Estimate) -> String {
    let end = |end: Option<f64>| end.map_or_else(|| "?".to_owned(), per_cent);
    match estimate.value {
        Some(value) => format!("{} ({} to {})", per_cent(value), end(estimate.low), end(estimate.high)),
        None => NONE.to_owned(),
    }
}

/// A distance with its 95 % confidence interval, metres. An end that lies among runs without a fix is open.
pub(super) fn distance(estimate: Estimate) -> String {
    match estimate.value {
        Some(value) => {
            let low = estimate.low.map_or_else(|| "?".to_owned(), |low| format!("{low:.0}"));
            let high = estimate.high.map_or_else(|| "no fix".to_owned(), |high| format!("{high:.0}"));
            format!("{value:.0} ({low} to {high})")
        }
        None => NONE.to_owned(),
    }
}

/// A number with at most four decimals.
pub(super) fn number(value: f64) -> String {
    format!("{}", (value * 1e4).round() / 1e4)
}

/// A verdict as a sentence: it begins with a capital and ends with a stop.
pub(super) fn sentence(text: &str) -> String {
    let mut letters = text.chars();
    let first: String = letters.next().map(|letter| letter.to_uppercase().collect()).unwrap_or_default();
    format!("{first}{}{}", letters.as_str(), if text.ends_with('.') { "" } else { "." })
}

/// A count with its word.
pub(super) fn count(number: usize, one: &str, many: &str) -> String {
    if number == 1 { format!("1 {one}") } else { format!("{number} {many}") }
}
