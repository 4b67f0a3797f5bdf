//! Where else to dive, and which bound to spend money on.

use maud::{Markup, html};

use super::Page;
use super::charts::chart;
use super::table::{NONE, guaranteed, metres, number, per_cent, scrolling, sentence};
use crate::report::GuaranteedChange;

pub(super) fn suggest(page: &Page<'_>) -> Markup {
    let report = page.suggest;
    let table = html! {
        table {
            caption { "Suggested dive points and first headings, best first; distances over the starts computed in the scatter disc." }
            thead {
                tr {
                    th scope="col" { "Name" }
                    th.n scope="col" { "Dive point east m" }
                    th.n scope="col" { "Dive point north m" }
                    th.n scope="col" { "Heading °" }
                    th.n scope="col" { "Fix distance m " (guaranteed()) }
                    th.n scope="col" { "Shortest m" }
                    th.n scope="col" { "Median m" }
                    th scope="col" { "Within the requirement" }
                }
            }
            tbody {
                @for suggestion in &report.suggestions {
                    tr {
                        th scope="row" { (suggestion.name) }
                        td.n { (format!("{:.1}", suggestion.dive_point.east_m)) }
                        td.n { (format!("{:.1}", suggestion.dive_point.north_m)) }
                        td.n { (number(suggestion.heading_deg)) }
                        td.n { (metres(Some(suggestion.fix_m.ceil()))) }
                        td.n { (metres(Some(suggestion.shortest_fix_m))) }
                        td.n { (metres(Some(suggestion.median_fix_m))) }
                        td { (if suggestion.within_required { "yes" } else { "no" }) }
                    }
                }
            }
        }
    };
    html! {
        section #suggest aria-labelledby="suggest-head" {
            div.plates {
                h2 #suggest-head { "Where to dive instead, and on which heading to run first" }
                (chart(
                    page,
                    "suggest.png",
                    "Map of the search area with the suggested dive points, their scatter discs and first headings. The table below \
                     lists them.",
                    &html! { "Suggestions, names as in the table " (guaranteed()) "." },
                ))
            }
            p { (sentence(&report.verdict)) }
            @if !report.suggestions.is_empty() { (scrolling("Table of the suggestions", &table)) }
            p { (guaranteed()) " " (report.statement) " Starts: " (report.start_pattern) "." }
            @if report.undecided { p { "Some runs are undecided and count as runs without a fix." } }
        }
    }
}

pub(super) fn sensitivity(page: &Page<'_>) -> Markup {
    let report = page.sensitivity;
    let factor = number(report.factor);
    let table = html! {
        table {
            caption { "Each error bound multiplied by " (factor) ", one at a time, over all lines; best first. All figures are guaranteed." }
            thead {
                tr {
                    th scope="col" { "Rank" }
                    th scope="col" { "Error bound" }
                    th.n scope="col" { "Now" }
                    th.n scope="col" { "Improved" }
                    th scope="col" { "Unit" }
                    th.n scope="col" { "Share within the requirement, %" }
                    th.n scope="col" { "Gained, % points" }
                    th.n scope="col" { "Segments that gain a fix" }
                    th.n scope="col" { "Sooner, median m" }
                }
            }
            tbody {
                tr {
                    td { "" }
                    th scope="row" { "as stated" }
                    td { "" } td { "" } td { "" }
                    td.n { (per_cent(report.present.within_required_share)) }
                    td { "" } td { "" } td { "" }
                }
                @for bound in &report.bounds {
                    tr {
                        td { @if let Some(rank) = bound.rank { (rank) } @else { (NONE) } }
                        th scope="row" { (bound.words) }
                        td.n { (number(bound.present.stated)) }
                        td.n { (number(bound.improved.stated)) }
                        td { (bound.unit) }
                        (change(&bound.change))
                    }
                }
                tr {
                    td { "" }
                    th scope="row" { "all together" }
                    td { "" } td { "" } td { "" }
                    (change(&report.all_together))
                }
            }
        }
    };
    html! {
        section #sensitivity aria-labelledby="sensitivity-head" {
            div.plates {
                h2 #sensitivity-head { "Which error bound is worth improving first" }
                (chart(
                    page,
                    "sensitivity.png",
                    "Bars of what the improvement of each error bound gains. The table below lists the figures.",
                    &html! { "What each improvement gains " (guaranteed()) "." },
                ))
            }
            p { (sentence(&report.verdict.text)) }
            (scrolling("Table of the error bounds", &table))
            p { (guaranteed()) " " (report.statement) }
            @if report.undecided { p { "Some runs are undecided and count as runs without a fix." } }
        }
    }
}

/// The last four cells of a row.
fn change(change: &GuaranteedChange) -> Markup {
    html! {
        td.n { (per_cent(change.after.within_required_share)) }
        td.n { (per_cent(change.share_gained)) }
        td.n { (change.segments_gaining_fix) }
        td.n { (metres(change.sooner_median_m)) }
    }
}
