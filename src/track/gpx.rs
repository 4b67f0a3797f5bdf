//! Lines from GPX: every route, and every segment of every track. Always WGS 84.
//!
//! The `gpx` crate stops at the first fault and does not say where. So when it fails, the opening tags of the points are
//! gone through here, counted, and every one with a bad latitude or longitude is named with its line.

use super::read::{LineFile, LineRows, WaypointRow};
use crate::bounds;
use crate::frame::{Crs, GeoPoint, Given};
use crate::input::InputText;
use crate::problem::{Findings, Problem};
use crate::units;

pub(super) fn read(input: &InputText, findings: &mut Findings) -> Option<LineFile> {
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
fn bad_points(input: &InputText) -> Vec<Problem> {
    let mut problems = Vec::new();
    let text = input.text.as_str();
    for tag in ["wpt", "rtept", "trkpt"] {
        let open = format!("<{tag}");
        for (i, (at, _)) in text.match_indices(open.as_str()).enumerate() {
            let rest = &text[at + open.len()..];
            let element = &rest[..rest.find('>').unwrap_or(rest.len())];
            for (attribute, range) in [("lat", bounds::LATITUDE), ("lon", bounds::LONGITUDE)] {
                let what = match attribute_text(element, attribute) {
                    None => "is missing".to_owned(),
                    Some(value) => match units::parse_number(value, false) {
                        Ok(x) if range.contains(x) && x <= 180.0 => continue,
                        Ok(_) => format!("\"{value}\" is out of range"),
                        Err(fault) => format!("\"{value}\" {}", fault.what),
                    },
                };
                problems.push(
                    Problem::new(&input.name, what)
                        .line(input.line_at(at))
                        .place(format!("{tag} {}, attribute {attribute}", i + 1))
                        .accepted(if attribute == "lat" {
                            "−90 to 90 degrees"
                        } else {
                            "−180 to 180 degrees"
                        }),
                );
            }
        }
    }
    problems.sort_by_key(|p| p.line);
    problems
}

fn attribute_text<'a>(element: &'a str, name: &str) -> Option<&'a str> {
    let mut from = 0;
    loop {
        let at = from + element[from..].find(name)?;
        let before_ok = element[..at].ends_with(char::is_whitespace);
        let after = element[at + name.len()..].trim_start();
        if let (true, Some(value)) = (before_ok, after.strip_prefix('=')) {
            let value = value.trim_start();
            let quote = value.chars().next().filter(|c| matches!(c, '"' | '\''))?;
            return value[1..].find(quote).map(|end| &value[1..=end]);
        }
        from = at + name.len();
    }
}
