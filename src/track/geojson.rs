//! Lines from GeoJSON: LineString and MultiLineString, named by the property `name`.

use ::geojson::{GeometryValue, Position};

use super::read::{LineFile, LineRows, WaypointRow};
use crate::frame::Crs;
use crate::input::position::PositionCheck;
use crate::input::{InputText, geojson};
use crate::problem::{Findings, Problem, ProblemList};

pub(super) fn read(input: &InputText, declared: Option<&Crs>, findings: &mut Findings) -> Option<LineFile> {
    let features = geojson::read(input, findings)?;
    let crs = geojson::settle_crs(input, features.crs, declared, Crs::wgs84(), findings)?;
    let stem = input.name.file_stem().and_then(|s| s.to_str()).unwrap_or("line").to_owned();
    let mut bad = features.faulty;
    let mut check = PositionCheck::new(&input.name, &crs);
    let mut lines = Vec::new();
    for numbered in &features.list {
        let place = format!("feature {}", numbered.number);
        let problem = |what: String| Problem::new(&input.name, what).place(place.clone());
        let parts: Vec<&Vec<Position>> = match numbered.feature.geometry.as_ref().map(|g| &g.value) {
            Some(GeometryValue::LineString { coordinates }) => vec![coordinates],
            Some(GeometryValue::MultiLineString { coordinates }) => coordinates.iter().collect(),
            Some(other) => {
                bad.add([problem(format!("is a {}, not a line", other.type_name()))
                    .accepted("LineString or MultiLineString")]);
                continue;
            }
            None => {
                bad.add([problem("has no geometry".into()).accepted("LineString or MultiLineString")]);
                continue;
            }
        };
        let name = geojson::text_property(&numbered.feature, &["name", "line", "id"])
            .or_else(|| geojson::feature_id(&numbered.feature))
            .unwrap_or_else(|| format!("{stem} {}", numbered.number));
        for (i, part) in parts.iter().enumerate() {
            let (name, origin) = if parts.len() == 1 {
                (name.clone(), place.clone())
            } else {
                (format!("{name} part {}", i + 1), format!("{place}, part {}", i + 1))
            };
            let mut problems = ProblemList::default();
            let mut waypoints = Vec::new();
            for (k, position) in part.iter().enumerate() {
                let at = format!("{origin}, position {}", k + 1);
                let Some((x, y)) = geojson::xy(position) else {
                    problems.push(
                        Problem::new(&input.name, "has fewer than two numbers").place(at).accepted("x and y"),
                    );
                    continue;
                };
                let (x_place, y_place) = (format!("{at}, first number"), format!("{at}, second number"));
                if let Some(position) = check.pair(x, y, None, &x_place, &y_place, &mut problems) {
                    waypoints.push(WaypointRow { line: None, place: Some(at), position });
                }
            }
            if problems.is_empty() {
                lines.push(LineRows { name, origin, waypoints });
            } else {
                bad.add(problems);
            }
        }
    }
    if check.plausible(findings) {
        bad.finish(&input.name, false, findings);
    }
    Some(LineFile { crs, lines })
}
