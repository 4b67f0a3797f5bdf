//! GPX 1.1: routes and waypoints on WGS 84, and `recommended.gpx`, the first-ranked line as a route.
//!
//! Only waypoints and routes are written, in the order of the schema (metadata, `wpt`, `rte`), by the `gpx` crate.

use ::gpx::{Gpx, GpxVersion, Metadata, Route, Waypoint};
use geo::Point;

use super::geojson_cut::position;
use super::{ExportError, Exporter};
use crate::frame::LocalPoint;
use crate::report::{LineReport, LinesReport, Provenance};

/// A named position.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct GpxPoint {
    /// Where, in the working frame.
    pub(super) position: LocalPoint,
    /// Name.
    pub(super) name: String,
    /// More about it; none to leave it out.
    pub(super) description: Option<String>,
}

/// Positions to be run in this order.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct GpxRoute {
    /// Name.
    pub(super) name: String,
    /// What it is.
    pub(super) description: String,
    /// In the order of the run.
    pub(super) points: Vec<GpxPoint>,
}

/// A whole GPX file called `file`: `waypoints` that belong to no route, and `routes`, in their order. The head carries the
/// name of the dive and the caution.
///
/// # Errors
/// A position without a place on the Earth (local metres among them).
pub(super) fn gpx_bytes(
    file: &'static str,
    provenance: &Provenance,
    waypoints: &[GpxPoint],
    routes: &[GpxRoute],
) -> Result<Vec<u8>, ExportError> {
    let failed = |reason: String| ExportError::Format { file, reason };
    let point = |point: &GpxPoint| -> Result<Waypoint, ExportError> {
        let geo = provenance.frame.to_geo(point.position).map_err(|error| failed(error.to_string()))?;
        let [longitude_deg, latitude_deg] = position(geo);
        let mut written = Waypoint::new(Point::new(longitude_deg, latitude_deg));
        written.name = Some(xml_text(&point.name));
        written.description = point.description.as_deref().map(xml_text);
        Ok(written)
    };
    let mut gpx = Gpx {
        version: GpxVersion::Gpx11,
        creator: Some(format!("fixability {}", provenance.tool_version)),
        metadata: Some(Metadata {
            name: Some(xml_text(&provenance.dive)),
            description: Some(xml_text(&head(provenance))),
            ..Metadata::default()
        }),
        waypoints: waypoints.iter().map(point).collect::<Result<_, _>>()?,
        ..Gpx::default()
    };
    for route in routes {
        gpx.routes.push(Route {
            name: Some(xml_text(&route.name)),
            description: Some(xml_text(&route.description)),
            points: route.points.iter().map(point).collect::<Result<_, _>>()?,
            ..Route::default()
        });
    }
    let mut bytes = Vec::new();
    ::gpx::write(&gpx, &mut bytes).map_err(|error| failed(error.to_string()))?;
    bytes.push(b'\n');
    Ok(bytes)
}

/// Caution, datum, seed and inputs in one text.
fn head(provenance: &Provenance) -> String {
    let mut text = format!("{} Planned in {}", provenance.caution, provenance.coordinate_system);
    if let Some(statement) = provenance.frame.datum_statement() {
        text.push_str(&format!("; {statement}"));
    }
    text.push_str(&format!(". Seed {}. Inputs by SHA-256:", provenance.seed));
    for input in &provenance.inputs {
        text.push_str(&format!(" {} {};", input.name, input.sha256));
    }
    text
}

/// The text without characters that XML 1.0 cannot hold (its production 2, `Char`); each is replaced visibly.
fn xml_text(text: &str) -> String {
    let is_kept = |c: char| matches!(c, '\t' | '\n' | '\r' | '\u{20}'..='\u{D7FF}' | '\u{E000}'..='\u{FFFD}' | '\u{10000}'..);
    text.chars().map(|c| if is_kept(c) { c } else { '\u{FFFD}' }).collect()
}

/// Writes `recommended.gpx`: the waypoints of the first-ranked line as a route, in the direction of the line.
#[derive(Clone, Copy, Debug, Default)]
pub struct RecommendedGpx;

impl Exporter for RecommendedGpx {
    type Report = LinesReport;

    fn file_name(&self) -> &'static str {
        "recommended.gpx"
    }

    fn bytes(&self, report: &LinesReport) -> Result<Vec<u8>, ExportError> {
        let first = report.lines.iter().find(|line| line.rank == 1);
        let routes: Vec<GpxRoute> = first.map(|line| route(report, line)).into_iter().collect();
        gpx_bytes(self.file_name(), &report.provenance, &[], &routes)
    }
}

fn route(report: &LinesReport, line: &LineReport) -> GpxRoute {
    let required_m = report.parameters.required_fix_m;
    let mut description = format!("Ranked first of {} lines. ", report.lines.len());
    if let Some(guaranteed) = &line.guaranteed {
        description.push_str(&format!(
            "Guaranteed: a fix within {required_m} m from {:.1} % of the line. ",
            100.0 * guaranteed.within_required_share
        ));
    }
    if let Some(share) = line.estimated.within_required_share.value {
        description
            .push_str(&format!("Estimated: a fix within {required_m} m in {:.1} % of runs. ", 100.0 * share));
    }
    description.push_str(&format!("Run from point 1 to point {}.", line.waypoints.len()));
    let points = line.waypoints.iter().enumerate().map(|(i, &position)| GpxPoint {
        position,
        name: format!("{} {}", line.name, i + 1),
        description: None,
    });
    GpxRoute { name: line.name.clone(), description, points: points.collect() }
}

#[cfg(test)]
mod tests {
    use super::xml_text;

    #[test]
    fn characters_that_xml_cannot_hold_are_replaced() {
        assert_eq!(xml_text("a\u{1}b\u{FFFE}c\u{0}é\n<&"), "a\u{FFFD}b\u{FFFD}c\u{FFFD}é\n<&");
    }
}
