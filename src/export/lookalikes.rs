//! `lookalikes.json`, `lookalikes.csv`, `lookalikes.geojson`, and the table for the terminal.

use geo::{Area, ConvexHull, Coord, MultiPoint as Points};
use geojson::{GeometryValue, JsonObject, JsonValue};

use super::geojson::{GeoJsonFile, feature};
use super::json::pretty;
use super::table::{add, metres, plain, printable};
use super::{ExportError, Exporter};
use crate::frame::LocalPoint;
use crate::report::{CONTACT_POSITIONS, LookAlike, LookAlikeKind, LookAlikesReport};

/// Writes `lookalikes.json`.
#[derive(Clone, Copy, Debug, Default)]
pub struct LookAlikesJson;

impl Exporter for LookAlikesJson {
    type Report = LookAlikesReport;

    fn file_name(&self) -> &'static str {
        "lookalikes.json"
    }

    fn bytes(&self, report: &LookAlikesReport) -> Result<Vec<u8>, ExportError> {
        pretty(self.file_name(), report)
    }
}

/// Columns of `lookalikes.csv`.
const COLUMNS: [&str; 33] = [
    "number",
    "kind",
    "landmarks",
    "apart_m",
    "bearing_deg",
    "offset_east_m",
    "offset_north_m",
    "turn_deg",
    "disagreement_rms_m",
    "disagreement_worst_m",
    "break_scale",
    "line_m",
    "lines",
    "tell_tale_1",
    "tell_tale_1_from_edge_m",
    "tell_tale_1_from_middle_m",
    "tell_tale_2",
    "tell_tale_2_from_edge_m",
    "tell_tale_2_from_middle_m",
    "layout_landmarks",
    "layout_shifts",
    "period_1_m",
    "period_1_bearing_deg",
    "period_2_m",
    "period_2_bearing_deg",
    "ground_1_easting_m",
    "ground_1_northing_m",
    "ground_2_easting_m",
    "ground_2_northing_m",
    "ground_1",
    "ground_2",
    "fix_size_m",
    "separation_max_m",
];

/// Writes `lookalikes.csv`: one row for each entry.
#[derive(Clone, Copy, Debug, Default)]
pub struct LookAlikesCsv;

impl Exporter for LookAlikesCsv {
    type Report = LookAlikesReport;

    fn file_name(&self) -> &'static str {
        "lookalikes.csv"
    }

    fn bytes(&self, report: &LookAlikesReport) -> Result<Vec<u8>, ExportError> {
        let failed = |reason: String| ExportError::Format { file: "lookalikes.csv", reason };
        let mut writer = csv::Writer::from_writer(Vec::new());
        writer.write_record(COLUMNS).map_err(|error| failed(error.to_string()))?;
        for entry in &report.look_alikes {
            writer.write_record(row(report, entry)).map_err(|error| failed(error.to_string()))?;
        }
        writer.into_inner().map_err(|error| failed(error.to_string()))
    }
}

fn row(report: &LookAlikesReport, entry: &LookAlike) -> Vec<String> {
    let number = |value: Option<f64>| value.map(|value| value.to_string()).unwrap_or_default();
    let mut row = vec![entry.number.to_string(), entry.kind.word().to_owned(), entry.landmarks.to_string()];
    row.extend(
        [
            entry.apart_m,
            entry.bearing_deg,
            entry.offset_east_m,
            entry.offset_north_m,
            entry.turn_deg,
            entry.disagreement_rms_m,
            entry.disagreement_worst_m,
            entry.break_scale,
            entry.line_m,
        ]
        .map(|value| value.to_string()),
    );
    row.push(lines_crossed(entry).join("; "));
    for tell in [&entry.tell_tale_1, &entry.tell_tale_2] {
        row.push(tell.as_ref().map(|tell| tell.landmark.clone()).unwrap_or_default());
        row.push(number(tell.as_ref().map(|tell| tell.from_edge_m)));
        row.push(number(tell.as_ref().map(|tell| tell.from_middle_m)));
    }
    let layout = entry.layout.as_ref();
    row.push(layout.map(|layout| layout.landmarks.to_string()).unwrap_or_default());
    row.push(layout.map(|layout| layout.shifts.to_string()).unwrap_or_default());
    for place in 0..2 {
        let period = layout.and_then(|layout| layout.periods.get(place));
        row.push(number(period.map(|period| period.period_m)));
        row.push(number(period.map(|period| period.bearing_deg)));
    }
    for ground in grounds(report, entry) {
        let middle = mean(&ground);
        row.extend([number(middle.map(|p| p.east_m)), number(middle.map(|p| p.north_m))]);
    }
    row.extend([entry.ground_1.join(" "), entry.ground_2.join(" ")]);
    row.extend([report.parameters.fix_size_m.to_string(), report.separation_max_m.to_string()]);
    row
}

/// Names of the lines that run over one of the grounds, each once, in order.
fn lines_crossed(entry: &LookAlike) -> Vec<String> {
    let mut lines: Vec<String> = Vec::new();
    for stretch in &entry.stretches {
        if !lines.contains(&stretch.line) {
            lines.push(stretch.line.clone());
        }
    }
    lines
}

/// Charted positions of both grounds.
fn grounds(report: &LookAlikesReport, entry: &LookAlike) -> [Vec<LocalPoint>; 2] {
    [&entry.numbers_1, &entry.numbers_2]
        .map(|numbers| numbers.iter().map(|&i| report.landmarks[i].position).collect())
}

fn mean(points: &[LocalPoint]) -> Option<LocalPoint> {
    let first = points.first()?;
    let count = points.len() as f64;
    let (e, n) = points
        .iter()
        .fold((0.0, 0.0), |(e, n), p| (e + (p.east_m - first.east_m), n + (p.north_m - first.north_m)));
    Some(LocalPoint::new(first.east_m + e / count, first.north_m + n / count))
}

/// Writes `lookalikes.geojson` (RFC 7946, WGS 84): for each entry the landmarks of both grounds, the hulls of both, and a
/// line from the middle of one to that of the other. Only for dives in a projected grid: GeoJSON has no local metres.
#[derive(Clone, Copy, Debug, Default)]
pub struct LookAlikesGeoJson;

impl Exporter for LookAlikesGeoJson {
    type Report = LookAlikesReport;

    fn file_name(&self) -> &'static str {
        "lookalikes.geojson"
    }

    fn bytes(&self, report: &LookAlikesReport) -> Result<Vec<u8>, ExportError> {
        let file = GeoJsonFile::new(self.file_name(), &report.provenance);
        let mut features = Vec::new();
        for entry in &report.look_alikes {
            let grounds = grounds(report, entry);
            let middles: Vec<LocalPoint> = grounds.iter().filter_map(|ground| mean(ground)).collect();
            for (place, ground) in grounds.iter().enumerate() {
                let part = |what: &str| properties(entry, &format!("{what} of ground {}", place + 1));
                features.push(feature(None, file.points(ground)?, part("landmarks")));
                features.push(feature(None, hull(&file, ground)?, part("hull")));
            }
            features.push(feature(None, file.line(&middles)?, properties(entry, "offset")));
        }
        let mut members = JsonObject::new();
        members.insert("contact_positions".into(), CONTACT_POSITIONS.into());
        file.bytes(features, members)
    }
}

fn properties(entry: &LookAlike, part: &str) -> JsonObject {
    let mut properties = JsonObject::new();
    let mut put = |name: &str, value: JsonValue| properties.insert(name.to_owned(), value);
    put("number", entry.number.into());
    put("part", part.into());
    put("kind", entry.kind.word().into());
    put("landmarks", entry.landmarks.into());
    put("apart_m", entry.apart_m.into());
    put("bearing_deg", entry.bearing_deg.into());
    put("break_scale", entry.break_scale.into());
    put("line_m", entry.line_m.into());
    if let Some(tell) = entry.nearest_tell_tale() {
        put("tell_tale", tell.landmark.clone().into());
        put("tell_tale_from_edge_m", tell.from_edge_m.into());
    }
    properties
}

/// Hulls of a smaller area are written as lines: rounded to the last digit, such a ring could turn the wrong way.
const HULL_LEAST_M2: f64 = 1.0;

/// The convex hull; a line from end to end where the landmarks lie on one.
fn hull(file: &GeoJsonFile<'_>, ground: &[LocalPoint]) -> Result<GeometryValue, ExportError> {
    // From the first landmark on, so that the area keeps its digits.
    let origin = ground.first().copied().unwrap_or(LocalPoint::new(0.0, 0.0));
    let points: Points<f64> = Points::from(
        ground
            .iter()
            .map(|p| Coord { x: p.east_m - origin.east_m, y: p.north_m - origin.north_m })
            .collect::<Vec<_>>(),
    );
    let hull = points.convex_hull();
    let corners: Vec<LocalPoint> = hull
        .exterior()
        .0
        .iter()
        .map(|c| LocalPoint::new(origin.east_m + c.x, origin.north_m + c.y))
        .collect();
    if hull.unsigned_area() >= HULL_LEAST_M2 {
        return file.polygon(&corners, &[]);
    }
    let farthest = |from: LocalPoint| {
        let far = corners.iter().max_by(|a, b| from.distance_m(**a).total_cmp(&from.distance_m(**b)));
        far.copied().unwrap_or(from)
    };
    let end = farthest(origin);
    file.line(&[farthest(end), end])
}

/// The look-alikes, most dangerous first, and how many there are in all.
pub fn lookalikes_table(report: &LookAlikesReport) -> String {
    let header = [
        "no",
        "kind",
        "landmarks",
        "apart m",
        "bearing deg",
        "worst disagreement m",
        "break scale",
        "line over it m",
        "lines",
        "tell-tale",
        "m from its ground",
    ];
    let mut table = plain(&header.map(str::to_owned), 1);
    for entry in &report.look_alikes {
        let tell = entry.nearest_tell_tale();
        let row = vec![
            entry.number.to_string(),
            entry.kind.word().to_owned(),
            entry.landmarks.to_string(),
            format!("{:.0}", entry.apart_m),
            format!("{:.0}", entry.bearing_deg),
            format!("{:.1}", entry.disagreement_worst_m),
            format!("{:.2}", entry.break_scale),
            format!("{:.0}", entry.line_m),
            lines_crossed(entry).iter().map(|name| printable(name)).collect::<Vec<_>>().join(", "),
            tell.map_or_else(|| "none".to_owned(), |tell| printable(&tell.landmark)),
            metres(tell.map(|tell| tell.from_edge_m)),
        ];
        add(&mut table, row, 1);
    }
    let mut text = if report.look_alikes.is_empty() {
        "No look-alikes farther apart than the fix size.\n".to_owned()
    } else {
        format!("{}\n", table.trim_fmt())
    };
    for entry in &report.look_alikes {
        text.push_str(&layout_in_words(entry));
    }
    text.push_str(&format!(
        "{} look-alikes{} of 3 or more landmarks within {:.0} m of each other: {} shifts of regular layouts, {} no farther apart than the fix size, {} more not listed.\n",
        report.found,
        if report.complete { "" } else { " (not all were found)" },
        report.separation_max_m,
        report.in_layouts,
        report.within_fix_size,
        report.unlisted(),
    ));
    text
}

/// One line for a row or a grid; empty for a pair.
fn layout_in_words(entry: &LookAlike) -> String {
    let Some(layout) = &entry.layout else { return String::new() };
    let periods: Vec<String> = layout
        .periods
        .iter()
        .map(|period| format!("every {:.1} m along {:.0} deg", period.period_m, period.bearing_deg))
        .collect();
    let kind = if entry.kind == LookAlikeKind::Grid { "grid" } else { "row" };
    format!(
        "Number {}: a {kind} of {} landmarks, repeating {}; {} shifts look like the layout itself.\n",
        entry.number,
        layout.landmarks,
        periods.join(" and "),
        layout.shifts,
    )
}
