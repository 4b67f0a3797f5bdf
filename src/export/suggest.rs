//! `suggest.json`, `suggest.csv`, and the suggested lines as files that `lines` reads: `suggest-lines.csv`,
//! `suggest.geojson`, `suggest.gpx`.

use ::geojson::{JsonObject, JsonValue};

use super::geojson::{GeoJsonFile, feature};
use super::gpx::{GpxPoint, GpxRoute, gpx_bytes};
use super::json::pretty;
use super::table::{add, plain, short};
use super::{ExportError, Exporter};
use crate::frame::GeoPoint;
use crate::report::{SuggestReport, Suggestion};

/// Columns of `suggest.csv`.
const COLUMNS: [&str; 20] = [
    "suggestion",
    "name",
    "dive_easting_m",
    "dive_northing_m",
    "dive_lat_deg",
    "dive_lon_deg",
    "heading_deg",
    "guaranteed_fix_m",
    "shortest_start_fix_m",
    "median_start_fix_m",
    "within_required",
    "starts",
    "line_m",
    "end_easting_m",
    "end_northing_m",
    "end_lat_deg",
    "end_lon_deg",
    "scatter_m",
    "required_fix_m",
    "fix_size_m",
];

/// Writes `suggest.json`.
#[derive(Clone, Copy, Debug, Default)]
pub struct SuggestJson;

impl Exporter for SuggestJson {
    type Report = SuggestReport;

    fn file_name(&self) -> &'static str {
        "suggest.json"
    }

    fn bytes(&self, report: &SuggestReport) -> Result<Vec<u8>, ExportError> {
        pretty(self.file_name(), report)
    }
}

/// Writes `suggest.csv`: one row for each suggestion, best first.
#[derive(Clone, Copy, Debug, Default)]
pub struct SuggestCsv;

impl Exporter for SuggestCsv {
    type Report = SuggestReport;

    fn file_name(&self) -> &'static str {
        "suggest.csv"
    }

    fn bytes(&self, report: &SuggestReport) -> Result<Vec<u8>, ExportError> {
        let rows = report.suggestions.iter().map(|suggestion| {
            let [dive_lat, dive_lon] = degrees(suggestion.dive_point_wgs84);
            let [end_lat, end_lon] = degrees(suggestion.line_end_wgs84);
            vec![
                suggestion.number.to_string(),
                suggestion.name.clone(),
                suggestion.dive_point.east_m.to_string(),
                suggestion.dive_point.north_m.to_string(),
                dive_lat,
                dive_lon,
                suggestion.heading_deg.to_string(),
                suggestion.fix_m.to_string(),
                suggestion.shortest_fix_m.to_string(),
                suggestion.median_fix_m.to_string(),
                suggestion.within_required.to_string(),
                suggestion.starts.len().to_string(),
                suggestion.line_m.to_string(),
                suggestion.line_end.east_m.to_string(),
                suggestion.line_end.north_m.to_string(),
                end_lat,
                end_lon,
                report.scatter_m.to_string(),
                report.parameters.required_fix_m.to_string(),
                report.parameters.fix_size_m.to_string(),
            ]
        });
        table(self.file_name(), &COLUMNS, rows)
    }
}

/// Writes `suggest-lines.csv`: the suggested lines as waypoints, the form in which `lines` reads CSV. Easting and northing
/// are those of the working frame; on the Earth latitude and longitude stand beside them, so that the file is read both
/// with the grid's code and with `EPSG:4326`.
#[derive(Clone, Copy, Debug, Default)]
pub struct SuggestLinesCsv;

impl Exporter for SuggestLinesCsv {
    type Report = SuggestReport;

    fn file_name(&self) -> &'static str {
        "suggest-lines.csv"
    }

    fn bytes(&self, report: &SuggestReport) -> Result<Vec<u8>, ExportError> {
        let on_earth = !report.provenance.frame.is_local();
        let mut columns = vec!["line", "order", "easting_m", "northing_m"];
        if on_earth {
            columns.extend(["lat_deg", "lon_deg"]);
        }
        let rows = report.suggestions.iter().flat_map(|suggestion| {
            let ends = [
                (suggestion.dive_point, suggestion.dive_point_wgs84),
                (suggestion.line_end, suggestion.line_end_wgs84),
            ];
            ends.into_iter().zip(["1", "2"]).map(move |((point, geo), order)| {
                let mut row = vec![
                    suggestion.name.clone(),
                    order.to_owned(),
                    point.east_m.to_string(),
                    point.north_m.to_string(),
                ];
                if on_earth {
                    row.extend(degrees(geo));
                }
                row
            })
        });
        table(self.file_name(), &columns, rows)
    }
}

/// Latitude and longitude; empty where there is none.
fn degrees(geo: Option<GeoPoint>) -> [String; 2] {
    geo.map_or_else(Default::default, |geo| [geo.lat_deg.to_string(), geo.lon_deg.to_string()])
}

fn table(
    file: &'static str,
    columns: &[&str],
    rows: impl Iterator<Item = Vec<String>>,
) -> Result<Vec<u8>, ExportError> {
    let format = |error: csv::Error| ExportError::Format { file, reason: error.to_string() };
    let mut writer = csv::Writer::from_writer(Vec::new());
    writer.write_record(columns).map_err(format)?;
    for row in rows {
        writer.write_record(&row).map_err(format)?;
    }
    writer.into_inner().map_err(|error| ExportError::Format { file, reason: error.to_string() })
}

/// Writes `suggest.geojson` (RFC 7946, WGS 84): one line for each suggestion, from the dive point along the heading. Only
/// for dives in a projected grid: the format has no local metres.
#[derive(Clone, Copy, Debug, Default)]
pub struct SuggestGeoJson;

impl Exporter for SuggestGeoJson {
    type Report = SuggestReport;

    fn file_name(&self) -> &'static str {
        "suggest.geojson"
    }

    fn bytes(&self, report: &SuggestReport) -> Result<Vec<u8>, ExportError> {
        let file = GeoJsonFile::new(self.file_name(), &report.provenance);
        let features = report.suggestions.iter().map(|suggestion| {
            let mut properties = JsonObject::new();
            let mut put = |name: &str, value: JsonValue| {
                properties.insert(name.to_owned(), value);
            };
            put("name", suggestion.name.clone().into());
            put("suggestion", suggestion.number.into());
            put("heading_deg", suggestion.heading_deg.into());
            put("guaranteed_fix_m", suggestion.fix_m.into());
            put("shortest_start_fix_m", suggestion.shortest_fix_m.into());
            put("median_start_fix_m", suggestion.median_fix_m.into());
            put("within_required", suggestion.within_required.into());
            put("starts", suggestion.starts.len().into());
            put("scatter_m", report.scatter_m.into());
            put("line_m", suggestion.line_m.into());
            put("dive_easting_m", suggestion.dive_point.east_m.into());
            put("dive_northing_m", suggestion.dive_point.north_m.into());
            let line = file.waypoints(&[suggestion.dive_point, suggestion.line_end])?;
            Ok(feature(Some(suggestion.number), line, properties))
        });
        let features = features.collect::<Result<_, ExportError>>()?;
        let mut members = JsonObject::new();
        members.insert("statement".into(), report.statement.into());
        members.insert("start_pattern".into(), report.start_pattern.clone().into());
        file.bytes(features, members)
    }
}

/// Writes `suggest.gpx`: each suggestion as a route of two points. Only for dives in a projected grid.
#[derive(Clone, Copy, Debug, Default)]
pub struct SuggestGpx;

impl Exporter for SuggestGpx {
    type Report = SuggestReport;

    fn file_name(&self) -> &'static str {
        "suggest.gpx"
    }

    fn bytes(&self, report: &SuggestReport) -> Result<Vec<u8>, ExportError> {
        let routes: Vec<GpxRoute> =
            report.suggestions.iter().map(|suggestion| route(report, suggestion)).collect();
        gpx_bytes(self.file_name(), &report.provenance, &[], &routes)
    }
}

fn route(report: &SuggestReport, suggestion: &Suggestion) -> GpxRoute {
    let point = |position, what: &str| GpxPoint {
        position,
        name: format!("{} {what}", suggestion.name),
        description: None,
    };
    GpxRoute {
        name: suggestion.name.clone(),
        description: format!(
            "Dive at the first point, run heading {}° (grid). Guaranteed: a fix after {:.1} m from every start computed within \
             {} m of the dive point.",
            suggestion.heading_deg, suggestion.fix_m, report.scatter_m
        ),
        points: vec![point(suggestion.dive_point, "dive point"), point(suggestion.line_end, "end")],
    }
}

/// The suggestions, best first, and the answer in words.
pub fn suggest_table(report: &SuggestReport) -> String {
    let on_earth = !report.provenance.frame.is_local();
    let mut header = vec!["name", "east m", "north m"];
    if on_earth {
        header.extend(["lat deg", "lon deg"]);
    }
    header.extend(["heading deg", "guaranteed fix m", "shortest m", "median m", "line m"]);
    let header: Vec<String> = header.into_iter().map(str::to_owned).collect();
    let mut table = plain(&header, 0);
    for suggestion in &report.suggestions {
        let mut row = vec![
            suggestion.name.clone(),
            format!("{:.1}", suggestion.dive_point.east_m),
            format!("{:.1}", suggestion.dive_point.north_m),
        ];
        if on_earth {
            let degrees = |of: fn(GeoPoint) -> f64| {
                suggestion.dive_point_wgs84.map_or_else(super::table::none, |geo| format!("{:.7}", of(geo)))
            };
            row.extend([degrees(|geo| geo.lat_deg), degrees(|geo| geo.lon_deg)]);
        }
        row.extend([
            format!("{:.1}", suggestion.heading_deg),
            format!("{:.1}", suggestion.fix_m),
            format!("{:.1}", suggestion.shortest_fix_m),
            format!("{:.1}", suggestion.median_fix_m),
            format!("{:.0}", suggestion.line_m),
        ]);
        add(&mut table, row, 0);
    }
    let list = if report.suggestions.is_empty() { String::new() } else { format!("{}\n", table.trim_fmt()) };
    format!(
        "{list}Answer: {}.\n{} dive points (centres of {} m cells whose scatter disc lies inside the search area), {} headings, straight \
         runs up to {} m; {} of {} candidates have a guaranteed fix.\nGuaranteed: true for every error within the bounds, {} strays \
         and {} misses, for these starts: {}. Starts between them are not covered by proof.\n",
        report.verdict.replace('°', " deg"),
        report.dive_points,
        short(report.search.cell_m),
        report.search.headings,
        short(report.search.longest_run_m),
        report.candidates_with_fix,
        report.candidates,
        report.parameters.stray_budget,
        report.parameters.miss_budget,
        report.start_pattern,
    )
}
