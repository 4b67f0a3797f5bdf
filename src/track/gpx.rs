//! Lines from GPX: every route, and every segment of every track. Always WGS 84.
//!
//! The `gpx` crate stops at the first fault and does not say where. So when it fails, the points are gone through here,
//! counted, and every one with a bad latitude or longitude is named with its line.

use quick_xml::events::Event;
use quick_xml::reader::Reader;

use super::read::{LineFile, LineRows, WaypointRow};
use crate::bounds;
use crate::frame::{Crs, GeoPoint, Given};
use crate::input::{InputText, xml};
use crate::problem::{Findings, Problem, ProblemList};
use crate::units;

pub(super) fn read(input: &InputText, findings: &mut Findings) -> Option<LineFile> {
    if let Err(problem) = xml::guard(input) {
        findings.problem(*problem);
        return None;
    }
    let document = match ::gpx::read(input.text.as_bytes()) {
        Ok(document) => document,
        Err(e) => {
            let points = bad_points(input);
            if points.is_empty() {
                let cause = std::error::Error::source(&e).map(|s| format!(": {s}")).unwrap_or_default();
                findings.problem(
                    Problem::new(&input.name, format!("is not valid GPX: {e}{cause}"))
                        .accepted("GPX 1.0 or 1.1 with routes (rte) or tracks (trk)"),
                );
            }
            findings.problems.extend(points);
            return None;
        }
    };
    let stem = input.name.file_stem().and_then(|s| s.to_str()).unwrap_or("line").to_owned();
    let mut lines = Vec::new();
    for (i, route) in document.routes.iter().enumerate() {
        let origin = format!("route {}", i + 1);
        let name = named(route.name.as_deref(), &stem, &origin);
        lines.push(line(name, origin, &route.points));
    }
    for (i, track) in document.tracks.iter().enumerate() {
        let origin = format!("track {}", i + 1);
        let name = named(track.name.as_deref(), &stem, &origin);
        for (k, segment) in track.segments.iter().enumerate() {
            if track.segments.len() == 1 {
                lines.push(line(name.clone(), origin.clone(), &segment.points));
            } else {
                let part = format!("segment {}", k + 1);
                lines.push(line(format!("{name} {part}"), format!("{origin}, {part}"), &segment.points));
            }
        }
    }
    if !document.waypoints.is_empty() {
        let n = units::count_words(document.waypoints.len(), "single waypoint");
        findings.inform(Some(&input.name), format!("{n} (wpt) not used: only routes and tracks are lines"));
    }
    Some(LineFile { crs: Crs::wgs84(), lines })
}

fn named(name: Option<&str>, stem: &str, origin: &str) -> String {
    match name.map(str::trim) {
        Some(name) if !name.is_empty() => name.to_owned(),
        _ => format!("{stem} {origin}"),
    }
}

fn line(name: String, origin: String, points: &[::gpx::Waypoint]) -> LineRows {
    let waypoints = points
        .iter()
        .enumerate()
        .map(|(i, p)| WaypointRow {
            line: None,
            place: Some(format!("{origin}, point {}", i + 1)),
            position: Given::Geographic(GeoPoint { lat_deg: p.point().y(), lon_deg: p.point().x() }),
        })
        .collect();
    LineRows { name, origin, waypoints }
}

/// Every point whose latitude or longitude is missing, no number, or out of range.
fn bad_points(input: &InputText) -> ProblemList {
    const TAGS: [&str; 3] = ["wpt", "rtept", "trkpt"];
    let mut problems = ProblemList::default();
    let mut seen = [0_usize; TAGS.len()];
    let mut reader = Reader::from_str(&input.text);
    let mut lines = xml::Lines::new(&input.text);
    loop {
        let line = lines.at(reader.buffer_position() as usize);
        let element = match reader.read_event() {
            Ok(Event::Start(element) | Event::Empty(element)) => element,
            // The text is well-formed (the guard has been through it), so this is the end.
            Ok(Event::Eof) | Err(_) => return problems,
            Ok(_) => continue,
        };
        let Some(kind) = TAGS.iter().position(|tag| *tag == element.local_name().as_ref()) else { continue };
        seen[kind] += 1;
        for (name, range) in [("lat", bounds::LATITUDE), ("lon", bounds::LONGITUDE)] {
            let value = element
                .attributes()
                .with_checks(false)
                .flatten()
                .find(|attribute| attribute.key.as_ref() == name)
                .map(|attribute| attribute.value);
            let what = match value {
                None => "is missing".to_owned(),
                Some(value) => match units::parse_number(&value, false) {
                    Ok(x) if range.contains(x) && x <= 180.0 => continue,
                    Ok(_) => format!("\"{value}\" is out of range"),
                    Err(fault) => format!("\"{value}\" {}", fault.what),
                },
            };
            problems.push(
                Problem::new(&input.name, what)
                    .line(line)
                    .place(format!("{} {}, attribute {name}", TAGS[kind], seen[kind]))
                    .accepted(if name == "lat" { "−90 to 90 degrees" } else { "−180 to 180 degrees" }),
            );
        }
    }
}
