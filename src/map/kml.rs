//! Landmarks from KML points. Always WGS 84.
//!
//! *Values.* The `ExtendedData` of a placemark may hold the identifier, the uncertainty and the date of survey under the names of the columns of
//! [`super::csv`]; without an identifier there, the placemark's `name` counts, then its `id` attribute. Several points of one
//! placemark are landmarks of their own.

use std::collections::BTreeSet;

use time::Date;

use super::csv::{BOTH, EAST, ID, NORTH, SURVEYED};
use super::read::{LandmarkFile, LandmarkRow, ReadOptions};
use crate::bounds;
use crate::frame::Crs;
use crate::input::kml::{self, Datum, Placemark};
use crate::input::position::PositionCheck;
use crate::input::table::{Column, listed, normal};
use crate::input::{BadRows, InputText};
use crate::problem::{Findings, Problem, ProblemList};
use crate::units;

pub(super) fn read(
    input: &InputText,
    declared: &Crs,
    options: ReadOptions,
    findings: &mut Findings,
) -> Option<LandmarkFile> {
    let crs = Crs::wgs84();
    if *declared != crs {
        findings.problem(
            Problem::new(
                &input.name,
                format!("KML is always {}, the dive file says {}", crs.name(), declared.name()),
            )
            .advice("set crs = \"EPSG:4326\" under [map]; to work in a grid, set working_crs"),
        );
        return None;
    }
    let found = kml::read(input, findings)?;
    kml::report_unused(input, &found, true, findings);
    report_unknown_data(input, &found.list, findings);
    let has_point = found.list.iter().flat_map(|placemark| &placemark.shapes).any(|shape| shape.is_point);
    if !has_point && !found.list.is_empty() {
        findings.problem(
            Problem::new(&input.name, "holds no Point")
                .accepted("a Placemark with a Point for each landmark, or no Placemark at all"),
        );
        return None;
    }
    let mut bad = BadRows::default();
    let mut check = PositionCheck::new(&input.name, &crs).degrees_only();
    let mut rows = Vec::new();
    for placemark in &found.list {
        let points: Vec<_> = placemark.shapes.iter().filter(|shape| shape.is_point).collect();
        if points.is_empty() {
            continue;
        }
        let mut problems = ProblemList::default();
        let uncertainty_m = uncertainty(input, placemark, &mut problems);
        let surveyed = surveyed(input, placemark, &mut problems);
        let id = id(input, placemark, &mut problems);
        let mut of_placemark = Vec::new();
        for (i, point) in points.iter().enumerate() {
            problems.extend(point.problems.iter().cloned());
            // A point without problems has exactly one position.
            let Some(tuple) = point.tuples.first().filter(|_| point.problems.is_empty()) else { continue };
            let places = ["longitude", "latitude"].map(|axis| format!("{}, {axis}", placemark.place()));
            let (x, y) = (tuple.longitude_deg, tuple.latitude_deg);
            let position = check.pair(x, y, Some(tuple.line), &places[0], &places[1], &mut problems);
            let id =
                id.as_ref().map(|id| if points.len() == 1 { id.clone() } else { format!("{id}-{}", i + 1) });
            of_placemark.extend(position.map(|position| LandmarkRow {
                line: Some(tuple.line),
                place: None,
                id,
                position,
                uncertainty_m,
                surveyed,
            }));
        }
        if problems.is_empty() {
            rows.extend(of_placemark);
        } else {
            bad.add(problems);
        }
    }
    if check.plausible(findings) {
        bad.finish(&input.name, options.skip_bad_rows, findings);
    }
    Some(LandmarkFile { crs, rows })
}

/// The value under one of the names of a column; a problem when there are two.
fn value<'a>(
    input: &InputText,
    placemark: &'a Placemark,
    column: &Column,
    problems: &mut ProblemList,
) -> Option<&'a Datum> {
    let mut hits: Vec<&Datum> = Vec::new();
    for name in column.names {
        hits.extend(placemark.data.iter().filter(|datum| normal(&datum.name) == *name));
    }
    let first = *hits.first()?;
    let again = hits[1..].iter().find(|hit| column.one_only || normal(&hit.name) == normal(&first.name));
    if let Some(again) = again {
        problems.push(
            Problem::new(
                &input.name,
                format!("the data \"{}\" and \"{}\" mean the same", first.name, again.name),
            )
            .line(again.line)
            .place(placemark.place())
            .accepted("one of them"),
        );
    }
    Some(first).filter(|datum| !datum.text.is_empty())
}

fn id(input: &InputText, placemark: &Placemark, problems: &mut ProblemList) -> Option<String> {
    let in_data = value(input, placemark, &ID, problems).map(|datum| datum.text.clone());
    in_data.or_else(|| placemark.name.clone()).or_else(|| placemark.id.clone())
}

fn uncertainty(input: &InputText, placemark: &Placemark, problems: &mut ProblemList) -> Option<(f64, f64)> {
    let before = problems.len();
    let mut read = |column: &Column| -> Option<f64> {
        let datum = value(input, placemark, column, problems)?;
        let why = match units::parse_number(&datum.text, false) {
            Ok(x) if bounds::UNCERTAINTY.contains(x) => return Some(x),
            Ok(x) if x < 0.0 => "is negative",
            Ok(_) => "is out of range",
            // The comma is explained for tables, where it can be declared; here it cannot.
            Err(_) if datum.text.contains(',') => "is not a number with a decimal point",
            Err(fault) => fault.what,
        };
        problems.push(
            Problem::new(&input.name, format!("\"{}\" {why}", datum.text))
                .line(datum.line)
                .place(format!("{}, data {}", placemark.place(), datum.name))
                .accepted(format!("{}, or empty for the default", bounds::UNCERTAINTY)),
        );
        None
    };
    let (both, east, north) = (read(&BOTH), read(&EAST), read(&NORTH));
    match (both, east, north) {
        (Some(u), None, None) => Some((u, u)),
        (None, Some(east), Some(north)) => Some((east, north)),
        (None, None, None) => None,
        _ => {
            if problems.len() == before {
                problems.push(
                    Problem::new(&input.name, "the uncertainties do not fit together")
                        .line(placemark.line)
                        .place(placemark.place())
                        .accepted(
                            "uncertainty_m for both axes, or uncertainty_east_m together with uncertainty_north_m",
                        ),
                );
            }
            None
        }
    }
}

fn surveyed(input: &InputText, placemark: &Placemark, problems: &mut ProblemList) -> Option<Date> {
    let datum = value(input, placemark, &SURVEYED, problems)?;
    let date = units::parse_date(&datum.text);
    if date.is_none() {
        problems.push(
            Problem::new(&input.name, format!("\"{}\" is not a date", datum.text))
                .line(datum.line)
                .place(format!("{}, data {}", placemark.place(), datum.name))
                .accepted(format!("{}, or empty when it is not known", bounds::DATE_FORM)),
        );
    }
    date
}

/// Names the data that mean nothing here, each once.
fn report_unknown_data(input: &InputText, placemarks: &[Placemark], findings: &mut Findings) {
    let (mut names, mut seen) = (Vec::new(), BTreeSet::new());
    for datum in placemarks.iter().flat_map(|placemark| &placemark.data) {
        let name = normal(&datum.name);
        let is_known =
            [ID, BOTH, EAST, NORTH, SURVEYED].iter().any(|column| column.names.contains(&name.as_str()));
        if !is_known && seen.insert(datum.name.as_str()) {
            names.push(datum.name.as_str());
        }
    }
    if !names.is_empty() {
        findings.inform(Some(&input.name), format!("data not used: {}", listed(&names)));
    }
}
