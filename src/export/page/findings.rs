//! Look-alikes and regions to map again.

use maud::{Markup, html};

use super::Page;
use super::charts::chart;
use super::table::{NONE, count, guaranteed, metres, number, per_cent, scrolling};
use crate::report::{LOOK_ALIKE_STATEMENT, REMAP_STATEMENT, RemapRegion};

/// Most look-alikes in the table of the page; `lookalikes.csv` has all that are listed.
const LOOK_ALIKES_SHOWN: usize = 20;

pub(super) fn look_alikes(page: &Page<'_>) -> Markup {
    let report = page.look_alikes;
    let shown = &report.look_alikes[..report.look_alikes.len().min(LOOK_ALIKES_SHOWN)];
    let table = html! {
        table {
            caption {
                "Look-alikes, most dangerous first. Break scale: the factor to which all errors would have to shrink before \
                 the two grounds can be told apart; 0 means never. Tell-tale: nearest landmark on one of the grounds only."
            }
            thead {
                tr {
                    th scope="col" { "No." }
                    th scope="col" { "Kind" }
                    th.n scope="col" { "Landmarks that agree" }
                    th.n scope="col" { "Apart m" }
                    th.n scope="col" { "Bearing °" }
                    th.n scope="col" { "Break scale" }
                    th.n scope="col" { "Line over it m" }
                    th scope="col" { "Lines" }
                    th scope="col" { "Tell-tale" }
                    th.n scope="col" { "At m from the edge" }
                }
            }
            tbody {
                @for entry in shown {
                    tr {
                        th scope="row" { (entry.number) }
                        td { (entry.kind.word()) }
                        td.n { (entry.landmarks) }
                        td.n { (metres(Some(entry.apart_m))) }
                        td.n { (format!("{:.0}", entry.bearing_deg)) }
                        td.n { (format!("{:.2}", entry.break_scale)) }
                        td.n { (metres(Some(entry.line_m))) }
                        td { (lines_over(entry)) }
                        @match entry.nearest_tell_tale() {
                            Some(tell_tale) => {
                                td { (tell_tale.landmark) }
                                td.n { (metres(Some(tell_tale.from_edge_m))) }
                            }
                            None => { td { (NONE) } td.n { (NONE) } }
                        }
                    }
                }
            }
        }
    };
    html! {
        section #look-alikes aria-labelledby="look-alikes-head" {
            div.plates {
                h2 #look-alikes-head { "Where not to trust a fix: ground that looks like other ground" }
                @if shown.is_empty() {
                    p { "No ground with three or more landmarks looks like other ground within the bounds." }
                } @else {
                (chart(
                    page,
                    "lookalikes.png",
                    "Map with the most dangerous look-alike grounds outlined, joined and numbered. The table below lists them.",
                    &html! { "The most dangerous look-alikes; numbers as in the table." },
                ))
                (chart(
                    page,
                    "lookalikes-panels.png",
                    "Panels, one for each of the worst look-alikes: ground 2 laid over ground 1, agreeing landmarks joined, \
                     tell-tale landmarks ringed.",
                    &html! { "Ground 2 laid over ground 1." },
                ))
                }
            }
            @if !shown.is_empty() { (scrolling("Table of the look-alikes", &table)) }
            p {
                (count(report.found, "look-alike", "look-alikes")) " found, "
                (report.within_fix_size) " of them no farther apart than the fix size, "
                (report.in_layouts) " shifts of regular layouts; " (shown.len()) " shown here, "
                (report.look_alikes.len()) " in " a href="lookalikes.csv" { "lookalikes.csv" } "."
                @if !report.complete { " The search was cut short: there are more." }
            }
            p { (LOOK_ALIKE_STATEMENT) }
        }
    }
}

/// Names of the lines that run over a look-alike, each once.
fn lines_over(entry: &crate::report::LookAlike) -> String {
    let mut names: Vec<&str> = Vec::new();
    for stretch in &entry.stretches {
        if !names.contains(&stretch.line.as_str()) {
            names.push(&stretch.line);
        }
    }
    names.join(", ")
}

pub(super) fn remap(page: &Page<'_>) -> Markup {
    let report = page.remap;
    let table = html! {
        table {
            caption { "Regions to map again, most gained ground for each square kilometre surveyed first." }
            thead {
                tr {
                    th scope="col" { "Region" }
                    th scope="col" { "Main cause" }
                    th.n scope="col" { "Of its cells %" }
                    th.n scope="col" { "Area km²" }
                    th.n scope="col" { "Survey km²" }
                    th.n scope="col" { "Landmarks" }
                    th.n scope="col" { "Half-width now m" }
                    th.n scope="col" { "Re-survey to m" }
                    th scope="col" { "Cures" }
                    th.n scope="col" { "Gain km²" }
                    th scope="col" { "What to do" }
                }
            }
            tbody { @for region in &report.regions { (region_row(region)) } }
        }
    };
    html! {
        section #remap aria-labelledby="remap-head" {
            div.plates {
                h2 #remap-head { "What to map again" }
                (chart(
                    page,
                    "remap.png",
                    "Map of the regions to map again, patterned by cause and numbered by gain. The table below lists them.",
                    &html! { "Regions by cause, numbered as in the table." },
                ))
            }
            @if report.regions.is_empty() {
                p { "No region fails the requirement." }
            } @else {
                (scrolling("Table of the regions to map again", &table))
            }
            p {
                (report.failing_cells) " of " (report.cells) " cells of " (number(report.options.cell_m)) " m fail ("
                (format!("{:.3}", report.failing_km2)) " km²); " (count(report.specks, "speck", "specks"))
                " of too few cells left out."
                @if report.undecided { " Some runs are undecided and count as runs without a fix." }
            }
            p { (guaranteed()) " " (REMAP_STATEMENT) }
        }
    }
}

fn region_row(region: &RemapRegion) -> Markup {
    html! {
        tr {
            th scope="row" { (region.number) }
            td { (region.cause.in_words()) }
            td.n { (region.causes.first().map_or_else(|| NONE.to_owned(), |cause| per_cent(cause.share))) }
            td.n { (format!("{:.3}", region.area_km2)) }
            td.n { (format!("{:.3}", region.survey_km2)) }
            td.n { (region.landmarks_surveyed) }
            @match &region.resurvey {
                Some(resurvey) => {
                    td.n { (format!("{:.2}", resurvey.half_width_before_m)) }
                    td.n { (format!("{:.2}", resurvey.half_width_after_m)) }
                    td { (if resurvey.cures { "yes" } else { "no" }) }
                    td.n { (format!("{:.3}", resurvey.gained_km2)) }
                }
                None => { td.n { (NONE) } td.n { (NONE) } td { (NONE) } td.n { (NONE) } }
            }
            td.words { (region.verdict) }
        }
    }
}
