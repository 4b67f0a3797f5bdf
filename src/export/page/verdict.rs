//! The first thing to read: which line, how much of it, when to come up; then what else must be known within a minute.

use maud::{Markup, html};

use super::Page;
use super::table::{count, estimated, guaranteed, sentence};
use crate::report::{LookAlikeKind, RemapReport};

pub(super) fn section(page: &Page<'_>) -> Markup {
    let verdict = page.verdict;
    html! {
        section #verdict tabindex="-1" aria-labelledby="verdict-head" {
            h2 #verdict-head.headline { (verdict.headline) }
            p.figure { strong.big { (verdict.figure) } " " span { (verdict.figure_means) " " (guaranteed()) } }
            div.abort { p.lead { (verdict.abort_headline) } p { (verdict.abort_rule) } }
            @for sentence in &verdict.guaranteed { p { (guaranteed()) " " (sentence) } }
            @for sentence in &verdict.estimated { p { (estimated()) " " (sentence) } }
            h3 { "At a glance" }
            dl.glance {
                dt { a href="#ranking" { "Lines, best first" } }
                dd { (order(page)) }
                dt { a href="#look-alikes" { "Where not to trust a fix" } }
                dd { (look_alikes(page)) }
                dt { a href="#remap" { "What to map again" } }
                dd { (remap(page.remap)) }
                dt { a href="#suggest" { "Where to dive instead" } }
                dd { (sentence(&page.suggest.verdict)) }
                dt { a href="#sensitivity" { "Which error bound to improve first" } }
                dd { (sentence(&page.sensitivity.verdict.text)) }
                dt { a href="#assumptions" { "Under which assumptions" } }
                dd { (assumptions(page)) }
            }
        }
    }
}

fn order(page: &Page<'_>) -> String {
    let mut lines: Vec<_> = page.lines.lines.iter().collect();
    lines.sort_by_key(|line| line.rank);
    let names: Vec<&str> = lines.iter().map(|line| line.name.as_str()).collect();
    format!("{}.", names.join(", "))
}

fn look_alikes(page: &Page<'_>) -> String {
    let found = page.look_alikes;
    let mut text = if found.look_alikes.is_empty() {
        "No ground with three or more landmarks looks like other ground within the bounds.".to_owned()
    } else {
        let kinds = |kind| found.look_alikes.iter().filter(|entry| entry.kind == kind).count();
        let (rows, grids) = (kinds(LookAlikeKind::Row), kinds(LookAlikeKind::Grid));
        let mut layouts = Vec::new();
        if grids > 0 {
            layouts.push(count(grids, "regular grid", "regular grids"));
        }
        if rows > 0 {
            layouts.push(count(rows, "evenly spaced row", "evenly spaced rows"));
        }
        let layouts = if layouts.is_empty() {
            String::new()
        } else {
            format!(", {} among them", layouts.join(" and "))
        };
        let marked: Vec<String> = page
            .lines
            .lines
            .iter()
            .filter_map(|line| {
                let over: f64 = line
                    .segments
                    .iter()
                    .filter(|segment| !segment.look_alikes.is_empty())
                    .map(|segment| segment.end_m - segment.start_m)
                    .sum();
                (over > 0.0).then(|| format!("{} ({over:.0} m)", line.name))
            })
            .collect();
        let over = if marked.is_empty() {
            "No line runs over the nine most dangerous ones.".to_owned()
        } else {
            format!("Metres of line over the nine most dangerous ones: {}.", marked.join(", "))
        };
        format!("{}{layouts}. {over}", count(found.found, "look-alike", "look-alikes"))
    };
    if !found.complete {
        text.push_str(" The search was cut short: there are more.");
    }
    text
}

fn remap(report: &RemapReport) -> String {
    let failing = format!(
        "{} of {} cells fail the requirement ({:.2} km²)",
        report.failing_cells, report.cells, report.failing_km2
    );
    let cured = report.regions.iter().find(|region| region.resurvey.is_some_and(|survey| survey.cures));
    match cured.or(report.regions.first()) {
        None => format!("{failing}; no region to map again."),
        Some(region) => format!(
            "{failing}, in {}. {}: region {}, {}: {}.",
            count(report.regions.len(), "region", "regions"),
            if cured.is_some() { "First of those that a re-survey cures" } else { "First" },
            region.number,
            region.cause.in_words(),
            region.verdict
        ),
    }
}

fn assumptions(page: &Page<'_>) -> String {
    let parameters = &page.lines.parameters;
    format!(
        "{} landmarks, {}; strays covered: {}, misses covered: {}; fix size {} m; required fix distance {} m. Whatever lies \
         outside these bounds is not covered.",
        parameters.landmarks,
        parameters.landmark_uncertainty,
        parameters.stray_budget,
        parameters.miss_budget,
        parameters.fix_size_m,
        parameters.required_fix_m,
    )
}
