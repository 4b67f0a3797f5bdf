//! Lines from KML: every `LineString` of every placemark, named by the placemark. Always WGS 84.

use super::csv::LINE;
use super::read::{LineFile, LineRows, WaypointRow};
use crate::frame::Crs;
use crate::input::kml::{self, Placemark};
use crate::input::position::PositionCheck;
use crate::input::table::normal;
use crate::input::{BadRows, InputText};
use crate::problem::Findings;

pub(super) fn read(input: &InputText, findings: &mut Findings) -> Option<LineFile> {
    let found = kml::read(input, findings)?;
    kml::report_unused(input, &found, false, findings);
    let stem = input.name.file_stem().and_then(|s| s.to_str()).unwrap_or("line").to_owned();
    let crs = Crs::wgs84();
    let mut bad = BadRows::default();
    let mut check = PositionCheck::new(&input.name, &crs).degrees_only();
    let mut lines = Vec::new();
    for placemark in &found.list {
        let shapes: Vec<_> = placemark.shapes.iter().filter(|shape| !shape.is_point).collect();
        let place = placemark.place();
        let name = named(placemark).unwrap_or_else(|| format!("{stem} {place}"));
        for (i, shape) in shapes.iter().enumerate() {
            let (name, origin) = if shapes.len() == 1 {
                (name.clone(), place.clone())
            } else {
                (format!("{name} part {}", i + 1), format!("{place}, part {}", i + 1))
            };
            let mut problems = shape.problems.clone();
            let mut waypoints = Vec::new();
            for (k, tuple) in shape.tuples.iter().enumerate() {
                let places =
                    ["longitude", "latitude"].map(|axis| format!("{origin}, position {}, {axis}", k + 1));
                let (x, y) = (tuple.longitude_deg, tuple.latitude_deg);
                let position = check.pair(x, y, Some(tuple.line), &places[0], &places[1], &mut problems);
                waypoints.extend(position.map(|position| WaypointRow {
                    line: Some(tuple.line),
                    place: Some(format!("{origin}, position {}", k + 1)),
                    position,
                }));
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

/// The name under one of the column's names in the data, the placemark's name, or its `id` attribute.
fn named(placemark: &Placemark) -> Option<String> {
    let in_data = LINE.names.iter().find_map(|name| {
        placemark.data.iter().find(|datum| normal(&datum.name) == *name && !datum.text.is_empty())
    });
    in_data
        .map(|datum| datum.text.clone())
        .or_else(|| placemark.name.clone())
        .or_else(|| placemark.id.clone())
}
