//! Landmarks from GeoJSON points.
//!
//! *Properties.* `id`, `contact` or `name` (or the `id` member of the feature) and `uncertainty_m`, or
//! `uncertainty_east_m` with `uncertainty_north_m`. A MultiPoint gives one landmark per point.

use ::geojson::{Feature, GeometryValue, JsonValue, Position};
use time::Date;

use super::read::{LandmarkFile, LandmarkRow, ReadOptions};
use crate::bounds;
use crate::frame::Crs;
use crate::input::position::PositionCheck;
use crate::input::{InputText, geojson};
use crate::problem::{Findings, Problem, ProblemList};
use crate::units;

pub(super) fn read(
    input: &InputText,
    declared: &Crs,
    options: ReadOptions,
    findings: &mut Findings,
) -> Option<LandmarkFile> {
    let features = geojson::read(input, findings)?;
    let crs = geojson::settle_crs(input, features.crs, Some(declared), Crs::wgs84(), findings)?;
    let mut bad = features.faulty;
    let mut check = PositionCheck::new(&input.name, &crs);
    let mut rows = Vec::new();
    for numbered in &features.list {
        let place = format!("feature {}", numbered.number);
        let feature = &numbered.feature;
        let problem = |what: String| Problem::new(&input.name, what).place(place.clone());
        let points: Vec<&Position> = match feature.geometry.as_ref().map(|g| &g.value) {
            Some(GeometryValue::Point { coordinates }) => vec![coordinates],
            Some(GeometryValue::MultiPoint { coordinates }) => coordinates.iter().collect(),
            Some(other) => {
                bad.add([problem(format!("is a {}, not a landmark", other.type_name()))
                    .accepted("Point or MultiPoint")]);
                continue;
            }
            None => {
                bad.add([problem("has no geometry".into()).accepted("Point or MultiPoint")]);
                continue;
            }
        };
        let mut problems = ProblemList::default();
        let uncertainty_m = uncertainty(feature, &problem, &mut problems);
        let surveyed = surveyed(feature, &problem, &mut problems);
        let id = geojson::text_property(feature, &["id", "contact_id", "contact", "name"])
            .or_else(|| geojson::feature_id(feature));
        let mut of_feature = Vec::new();
        for (i, point) in points.iter().enumerate() {
            let Some((x, y)) = geojson::xy(point) else {
                problems.push(problem("has a position with fewer than two numbers".into()));
                continue;
            };
            let (x_place, y_place) = (format!("{place}, first number"), format!("{place}, second number"));
            if let Some(position) = check.pair(x, y, None, &x_place, &y_place, &mut problems) {
                let id = match (&id, points.len()) {
                    (Some(id), 1) => Some(id.clone()),
                    (Some(id), _) => Some(format!("{id}-{}", i + 1)),
                    (None, _) => None,
                };
                let place =
                    if points.len() == 1 { place.clone() } else { format!("{place}, point {}", i + 1) };
                of_feature.push(LandmarkRow {
                    line: None,
                    place: Some(place),
                    id,
                    position,
                    uncertainty_m,
                    surveyed,
                });
            }
        }
        if problems.is_empty() {
            rows.extend(of_feature);
        } else {
            bad.add(problems);
        }
    }
    if check.plausible(findings) {
        bad.finish(&input.name, options.skip_bad_rows, findings);
    }
    Some(LandmarkFile { crs, rows })
}

fn surveyed(
    feature: &Feature,
    problem: &dyn Fn(String) -> Problem,
    problems: &mut ProblemList,
) -> Option<Date> {
    let value = feature.property("surveyed").filter(|value| !value.is_null())?;
    let date = value.as_str().and_then(units::parse_date);
    if date.is_none() {
        problems
            .push(problem(format!("property surveyed: {value} is not a date")).accepted(bounds::DATE_FORM));
    }
    date
}

fn uncertainty(
    feature: &Feature,
    problem: &dyn Fn(String) -> Problem,
    problems: &mut ProblemList,
) -> Option<(f64, f64)> {
    let mut read = |name: &str| -> Option<f64> {
        let value = feature.property(name).filter(|v| !v.is_null())?;
        match value.as_f64() {
            Some(x) if bounds::UNCERTAINTY.contains(x) => Some(x),
            _ => {
                let why = match value {
                    JsonValue::Number(n) if n.as_f64().is_some_and(|x| x < 0.0) => "is negative",
                    JsonValue::Number(_) => "is out of range",
                    _ => "is not a number",
                };
                problems.push(
                    problem(format!("property {name}: {value} {why}"))
                        .accepted(format!("a number, {}", bounds::UNCERTAINTY)),
                );
                None
            }
        }
    };
    let both = read("uncertainty_m");
    let axes = (read("uncertainty_east_m"), read("uncertainty_north_m"));
    match (both, axes) {
        (Some(u), (None, None)) => Some((u, u)),
        (None, (Some(e), Some(n))) => Some((e, n)),
        (None, (None, None)) => None,
        _ => {
            if problems.is_empty() {
                problems.push(problem("the uncertainty properties do not fit together".into()).accepted(
                    "uncertainty_m for both axes, or uncertainty_east_m together with uncertainty_north_m",
                ));
            }
            None
        }
    }
}
