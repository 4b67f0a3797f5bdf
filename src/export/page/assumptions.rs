//! What everything rests on: bounds, budgets, map, scoring.

use maud::{Markup, html};

use super::Page;
use super::table::{number, scrolling};
use crate::report::Parameters;

pub(super) fn section(page: &Page<'_>) -> Markup {
    let parameters = &page.lines.parameters;
    let table = html! {
        table.assumptions {
            caption { "Error budget and settings in force, as the dive file would state them. Bounds are plus or minus." }
            thead { tr { th scope="col" { "What" } th.n scope="col" { "Value" } th scope="col" { "Unit" } } }
            @for (head, rows) in groups(page, parameters) {
                tbody {
                    tr { th.group scope="rowgroup" colspan="3" { (head) } }
                    @for (what, value, unit) in rows {
                        tr { th scope="row" { (what) } td.n { (value) } td { (unit) } }
                    }
                }
            }
        }
    };
    html! {
        section #assumptions aria-labelledby="assumptions-head" {
            h2 #assumptions-head { "Assumptions and error budget" }
            p { "Uncertainty of the landmarks: " (parameters.landmark_uncertainty) ". " (super::dates(page)) "." }
            (scrolling("Table of the assumptions", &table))
        }
    }
}

type Row = (&'static str, String, &'static str);

fn groups(page: &Page<'_>, p: &Parameters) -> Vec<(&'static str, Vec<Row>)> {
    let shapes: Vec<String> = p
        .error_shapes
        .iter()
        .filter_map(|shape| serde_json::to_value(shape).ok()?.as_str().map(str::to_owned))
        .collect();
    let yes = |flag: bool| if flag { "yes" } else { "no" }.to_owned();
    let optional = |value: Option<f64>| value.map(number);
    let mut sonar = vec![
        ("Kind", p.sonar_kind.to_owned(), ""),
        ("Shortest slant range", number(p.range_min_m), "m"),
        ("Longest slant range", number(p.range_max_m), "m"),
        ("Nearest horizontal range at the nominal altitude", format!("{:.1}", p.nearest_horizontal_m), "m"),
        ("Farthest horizontal range at the nominal altitude", format!("{:.1}", p.farthest_horizontal_m), "m"),
    ];
    if let Some(sector) = optional(p.sector_deg) {
        sonar.push(("Opening of the forward sector", sector, "°"));
    }
    if let Some(gap) = optional(p.nadir_gap_deg) {
        sonar.push(("Nadir gap off the vertical", gap, "°"));
    }
    sonar.extend([
        ("Altitude", number(p.altitude_m), "m"),
        ("Bound on the slant range, constant part", number(p.range_error_m), "m"),
        ("Bound on the slant range, growing part", number(p.range_error_pct), "% of range"),
        ("Bound on the bearing", number(p.bearing_error_deg), "°"),
        ("Bound on the altitude", number(p.altitude_error_m), "m"),
        ("Landmarks are detected in turns", yes(p.detect_in_turns), ""),
    ]);
    let half_width = |value: Option<f64>| value.map_or_else(|| super::table::NONE.to_owned(), number);
    vec![
        (
            "Vehicle and dead reckoning",
            vec![
                ("Speed over ground", number(p.speed_mps), "m/s"),
                ("Turn radius", number(p.turn_radius_m), "m"),
                (
                    "Bound on the distance run, with the grid's part",
                    number(p.scale_error_pct),
                    "% of distance",
                ),
                ("Bound on the constant heading bias", number(p.heading_bias_deg), "°"),
                ("Bound on the heading noise, with the grid's part", number(p.heading_noise_deg), "°"),
                ("Bound on unknown drift", number(p.drift_mps), "m/s"),
            ],
        ),
        ("Sonar", sonar),
        (
            "Map",
            vec![
                ("Landmarks", p.landmarks.to_string(), ""),
                ("Smallest half-width of a landmark's box", half_width(p.half_width_min_m), "m"),
                ("Largest half-width of a landmark's box", half_width(p.half_width_max_m), "m"),
                ("Coordinate system", page.lines.provenance.coordinate_system.clone(), ""),
            ],
        ),
        (
            "What may go wrong and is still covered, in one run",
            vec![
                ("Detections that are strays, at most", p.stray_budget.to_string(), ""),
                ("Landmarks missed, at most", p.miss_budget.to_string(), ""),
                ("“Nothing seen” is used as evidence", yes(p.nothing_seen), ""),
            ],
        ),
        (
            "Start and requirement",
            vec![
                ("Search area", format!("{:.3}", p.search_area_km2), "km²"),
                ("Descent scatter, radius", number(p.scatter_m), "m"),
                ("Fix size: largest extent of all that remains", number(p.fix_size_m), "m"),
                ("Required fix distance", number(p.required_fix_m), "m"),
                ("Segment length", number(p.segment_m), "m"),
            ],
        ),
        (
            "Simulated dives (for estimates only)",
            vec![
                ("Dives for each line", p.draws.to_string(), ""),
                ("Shapes of errors, in turn", shapes.join(", "), ""),
                ("Chance of detection", number(p.detection_chance), ""),
                ("Strays drawn", number(p.strays_per_km), "per km"),
                ("Seed", page.lines.provenance.seed.to_string(), ""),
                ("Generator", page.lines.provenance.generator.to_owned(), ""),
            ],
        ),
        (
            "Solver and area map",
            vec![
                ("Cell budget", p.cell_budget.to_string(), "cells"),
                ("Slices of the heading bias", p.heading_slices.to_string(), ""),
                ("Side of a start cell of the area map", number(page.area.grid.cell_m), "m"),
                ("Headings from each start cell", page.area.headings_deg.len().to_string(), ""),
                ("Side of a cell of the remap analysis", number(page.remap.options.cell_m), "m"),
            ],
        ),
    ]
}
