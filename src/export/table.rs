//! Tables for the terminal. Everything but the names of lines is plain ASCII.

use comfy_table::presets::ASCII_FULL_CONDENSED;
use comfy_table::{Cell, CellAlignment, ContentArrangement, Table};

use crate::report::{
    BriefReport, CheckReport, Contradiction, Estimate, HindsightEvent, LineReport, LinesReport, TraceReport,
};

/// The ranking of the lines, best first. Figures are estimates from simulated dives.
pub fn lines_table(report: &LinesReport) -> String {
    let required = short(report.parameters.required_fix_m);
    let with_guaranteed =
        report.lines.iter().flat_map(|line| &line.segments).any(|segment| segment.guaranteed.is_some());
    let mut header = vec![
        "rank".to_owned(),
        "line".to_owned(),
        "length m".to_owned(),
        format!("within {required} m, % of runs (95 % interval)"),
        "median fix m".to_owned(),
        "p95 fix m".to_owned(),
        "no fix %".to_owned(),
        "undecided %".to_owned(),
    ];
    if with_guaranteed {
        header.push(format!("guaranteed within {required} m, % of line"));
    }
    let mut table = plain(&header, 1);
    let mut ranked: Vec<&LineReport> = report.lines.iter().collect();
    ranked.sort_by_key(|line| line.rank);
    for line in ranked {
        let fix = &line.estimated;
        let mut row = vec![
            line.rank.to_string(),
            printable(&line.name),
            format!("{:.0}", line.length_m),
            share(fix.within_required_share),
            metres(fix.median_m.value),
            metres(fix.p95_m.value),
            fix.no_fix_share.value.map_or_else(none, per_cent),
            per_cent(fix.undecided_share),
        ];
        if with_guaranteed {
            row.push(line.guaranteed.map_or_else(none, |sum| per_cent(sum.within_required_share)));
        }
        add(&mut table, row, 1);
    }
    let dives: usize = report.lines.iter().map(|line| line.estimated.dives).sum();
    let terms = report.guarantee.as_ref().map_or_else(String::new, |terms| {
        format!(
            "Guaranteed: true for every error within the bounds, {} strays and {} misses, on {} tracks ({}).\n",
            report.parameters.stray_budget, report.parameters.miss_budget, terms.offset_tracks, terms.offset_pattern,
        )
    });
    format!(
        "{}\n{terms}Estimated from {dives} simulated dives, each run from every segment start; p95 = 95th percentile; seed {}.\n",
        table.trim_fmt(),
        report.provenance.seed,
    )
}

/// The verdict of a briefing in words, and the ranking under it.
pub fn brief_text(report: &BriefReport, lines: &LinesReport) -> String {
    let verdict = &report.verdict;
    let mut text = format!("{}\n{} {}.\n", verdict.headline, verdict.figure, verdict.figure_means);
    text.push_str(&format!("{} {}\n", verdict.abort_headline, verdict.abort_rule));
    for (kind, sentences) in [("Guaranteed", &verdict.guaranteed), ("Estimated", &verdict.estimated)] {
        for sentence in sentences {
            text.push_str(&format!("{kind}: {sentence}\n"));
        }
    }
    // Names come from files; what steers a terminal does not get through.
    let text: String = text.lines().map(|line| printable(line) + "\n").collect();
    format!("{text}\n{}", lines_table(lines))
}

/// The events of one simulated dive.
pub fn trace_table(report: &TraceReport) -> String {
    let header = [
        "event",
        "run m",
        "slant range m",
        "bearing deg",
        "cells",
        "places",
        "spread m",
        "fix",
        "truth inside",
        "hindsight places",
        "hindsight spread m",
        "landmark in hindsight",
    ];
    let mut table = plain(&header.map(str::to_owned), header.len() - 1);
    for event in &report.events {
        let yes = |flag: bool| if flag { "yes" } else { "no" }.to_owned();
        let row = vec![
            event.number.to_string(),
            format!("{:.1}", event.run_m),
            format!("{:.2}", event.slant_range_m),
            format!("{:.1}", event.relative_bearing_deg),
            event.cells.to_string(),
            event.places.to_string(),
            event.spread_m.map_or_else(|| "empty".to_owned(), |spread| format!("{spread:.1}")),
            yes(event.is_fix),
            yes(event.truth_inside),
            event.hindsight.as_ref().map_or_else(none, |then| then.places.to_string()),
            event.hindsight.as_ref().map_or_else(none, |then| format!("{:.1}", then.spread_m)),
            event.hindsight.as_ref().map_or_else(none, seen),
        ];
        add(&mut table, row, header.len() - 1);
    }
    let verdict = match (&report.contradiction, report.undecided, report.fix_distance_m) {
        (Some(contradiction), ..) => contradicted(contradiction),
        (None, true, _) => "undecided: the solver ran out of its cell budget".to_owned(),
        (None, false, Some(run)) => {
            let lasting = match report.lasting_fix_distance_m {
                Some(lasting) if lasting == run => "lasting to the end of the line".to_owned(),
                Some(lasting) => format!("lost again, then lasting from {lasting:.1} m"),
                None => "lost again before the end of the line".to_owned(),
            };
            format!("fix after {run:.1} m, {lasting}")
        }
        (None, false, None) => "no fix before the line ends".to_owned(),
    };
    let line = printable(&report.line);
    let mut text = format!(
        "{}\nLine {line} from {:.1} m, draw {}: {verdict}.\n",
        table.trim_fmt(),
        report.from_m,
        report.draw
    );
    match &report.hindsight {
        Some(hindsight) => text.push_str(&format!(
            "In hindsight, that is once the whole dive has been seen ({} sweeps): lost at {} place{}, {:.1} m across.\n",
            hindsight.sweeps,
            hindsight.start_places,
            if hindsight.start_places == 1 { "" } else { "s" },
            hindsight.start_spread_m,
        )),
        None => text.push_str("No hindsight: nothing explains all of the detections.\n"),
    }
    text
}

/// Candidates named in the table; with more, only their number is given.
const CANDIDATES_IN_TABLE: usize = 3;

/// Which landmark a detection was in hindsight: its name, a few names, or how many it may be.
fn seen(hindsight: &HindsightEvent) -> String {
    let landmarks = match hindsight.candidate_count {
        0 => "stray".to_owned(),
        few if few <= CANDIDATES_IN_TABLE => {
            hindsight.candidates.iter().map(|name| printable(name)).collect::<Vec<_>>().join(" or ")
        }
        many => format!("one of {many}"),
    };
    if hindsight.may_be_stray && hindsight.candidate_count > 0 {
        format!("{landmarks}, or a stray")
    } else {
        landmarks
    }
}

/// What was understood of a dive: notices, bounds in force, lines. The caution comes last.
pub fn check_text(report: &CheckReport) -> String {
    let p = &report.parameters;
    let mut text = format!(
        "{}
{}

",
        printable(&report.provenance.dive),
        report.provenance.coordinate_system
    );
    for notice in &report.notices {
        let kind = if notice.is_warning { "WARNING: " } else { "" };
        text.push_str(&format!(
            "- {kind}{}
",
            printable(&notice.text)
        ));
    }
    let swath = match (p.nadir_gap_deg, p.sector_deg) {
        (Some(gap), _) => format!("nadir gap {} deg", short(gap)),
        (_, Some(sector)) => format!("sector {} deg", short(sector)),
        _ => String::new(),
    };
    text.push_str(&format!(
        "\nVehicle         {} m/s, turn radius {} m\n\
         Dead reckoning  scale {:.3} % of distance, heading bias {:.3} deg, noise {:.3} deg, drift {} m/s (all plus or minus); {} heading slices\n\
         Sonar           {}, slant range {} to {} m, {swath}, altitude {} m: horizontal {:.1} to {:.1} m\n\
         Sonar errors    range {} m + {:.3} %, bearing {:.3} deg, altitude {} m (all plus or minus); detection chance {}, {} strays per km\n\
         Budget          {} strays, {} misses per run\n\
         Landmarks       {}; {}\n\
         Map             common shift up to {} m, chance {} that a landmark is gone\n\
         Start           search area {:.3} km2, descent scatter {} m\n\
         Scoring         fix size {} m, required fix distance {} m, a start every {} m, {} dives per line, seed {}\n\n",
        short(p.speed_mps),
        short(p.turn_radius_m),
        p.scale_error_pct,
        p.heading_bias_deg,
        p.heading_noise_deg,
        short(p.drift_mps),
        p.heading_slices,
        p.sonar_kind,
        short(p.range_min_m),
        short(p.range_max_m),
        short(p.altitude_m),
        p.nearest_horizontal_m,
        p.farthest_horizontal_m,
        short(p.range_error_m),
        p.range_error_pct,
        p.bearing_error_deg,
        short(p.altitude_error_m),
        short(p.detection_chance),
        short(p.strays_per_km),
        p.stray_budget,
        p.miss_budget,
        p.landmarks,
        p.landmark_uncertainty,
        short(p.common_shift_m),
        short(p.gone_chance),
        p.search_area_km2,
        short(p.scatter_m),
        short(p.fix_size_m),
        short(p.required_fix_m),
        short(p.segment_m),
        p.draws,
        report.provenance.seed,
    ));
    let header = ["line", "waypoints", "length m", "detections expected", "in blind turns m"];
    let mut table = plain(&header.map(str::to_owned), 0);
    for line in &report.lines {
        let row = vec![
            printable(&line.name),
            line.waypoints.len().to_string(),
            format!("{:.0}", line.length_m),
            line.detections_expected.to_string(),
            format!("{:.0}", line.blind_turn_m),
        ];
        add(&mut table, row, 0);
    }
    text.push_str(&format!("{}\n\n{}\n", table.trim_fmt(), report.provenance.caution));
    text
}

/// A contradiction in words.
fn contradicted(contradiction: &Contradiction) -> String {
    let budget = match contradiction.smallest_stray_budget {
        Some(budget) => format!("a stray budget of {budget} would explain the dive"),
        None => format!("no stray budget up to {} explains the dive", contradiction.tried_up_to),
    };
    format!(
        "no position explains the detections from event {} ({:.1} m) on: the bounds do not hold; {budget}",
        contradiction.event, contradiction.run_m
    )
}

/// An empty table; all columns but number `left` are set to the right.
pub(super) fn plain(header: &[String], left: usize) -> Table {
    let mut table = Table::new();
    table.load_style(ASCII_FULL_CONDENSED).set_content_arrangement(ContentArrangement::Disabled);
    table.set_header(cells(header.to_vec(), left));
    table
}

pub(super) fn add(table: &mut Table, row: Vec<String>, left: usize) {
    table.add_row(cells(row, left));
}

fn cells(row: Vec<String>, left: usize) -> Vec<Cell> {
    let aligned = |(index, text): (usize, String)| {
        let alignment = if index == left { CellAlignment::Left } else { CellAlignment::Right };
        Cell::new(text).set_alignment(alignment)
    };
    row.into_iter().enumerate().map(aligned).collect()
}

fn share(estimate: Estimate) -> String {
    let Some(value) = estimate.value else { return none() };
    match (estimate.low, estimate.high) {
        (Some(low), Some(high)) => format!("{} ({} to {})", per_cent(value), per_cent(low), per_cent(high)),
        _ => per_cent(value),
    }
}

pub(super) fn per_cent(share: f64) -> String {
    format!("{:.1}", share * 100.0)
}

pub(super) fn metres(value: Option<f64>) -> String {
    value.map_or_else(none, |value| format!("{value:.0}"))
}

pub(super) fn none() -> String {
    "none".to_owned()
}

pub(super) fn short(value: f64) -> String {
    // The shortest text that reads back as the same number.
    value.to_string()
}

/// A name without control characters, which a terminal would obey.
pub(super) fn printable(name: &str) -> String {
    name.chars().map(|c| if c.is_control() { ' ' } else { c }).collect()
}
