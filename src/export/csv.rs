//! `lines.csv` and `lines.geojson`: one row or feature for each segment, units in the names of columns and properties, an
//! empty field or null where there is no value.

use ::geojson::{Feature, JsonObject, JsonValue};

use super::geojson::{GeoJsonFile, feature};
use super::{ExportError, Exporter};
use crate::report::{Estimate, LineReport, LinesReport, SegmentReport};

/// Columns every row has.
const COLUMNS: [&str; 38] = [
    "line",
    "line_rank",
    "segment",
    "start_m",
    "end_m",
    "start_easting_m",
    "start_northing_m",
    "end_easting_m",
    "end_northing_m",
    "detections_ahead",
    "dives",
    "estimated_median_fix_m",
    "estimated_median_fix_low_m",
    "estimated_median_fix_high_m",
    "estimated_p95_fix_m",
    "estimated_p95_fix_low_m",
    "estimated_p95_fix_high_m",
    "estimated_within_required_share",
    "estimated_within_required_share_low",
    "estimated_within_required_share_high",
    "estimated_no_fix_share",
    "estimated_no_fix_share_low",
    "estimated_no_fix_share_high",
    "estimated_lasting_median_fix_m",
    "estimated_lasting_median_fix_low_m",
    "estimated_lasting_median_fix_high_m",
    "estimated_lasting_p95_fix_m",
    "estimated_lasting_p95_fix_low_m",
    "estimated_lasting_p95_fix_high_m",
    "estimated_relapse_share",
    "estimated_contradiction_share",
    "estimated_wrong_fix_share",
    "undecided_share",
    "required_fix_m",
    "fix_size_m",
    "seed",
    "look_alikes",
    "remap_regions",
];

/// Columns that exist only when guaranteed distances were computed.
const GUARANTEED_COLUMNS: [&str; 5] = [
    "guaranteed_fix_m",
    "guaranteed_lasting_fix_m",
    "certain_detections",
    "no_guaranteed_fix_cause",
    "no_guaranteed_fix_reason",
];

/// Writes `lines.csv`.
#[derive(Clone, Copy, Debug, Default)]
pub struct LinesCsv;

impl Exporter for LinesCsv {
    type Report = LinesReport;

    fn file_name(&self) -> &'static str {
        "lines.csv"
    }

    fn bytes(&self, report: &LinesReport) -> Result<Vec<u8>, ExportError> {
        let mut writer = csv::Writer::from_writer(Vec::new());
        let format = |error: csv::Error| ExportError::Format { file: "lines.csv", reason: error.to_string() };
        writer.write_record(columns(report)).map_err(format)?;
        for (line, segment) in segments(report) {
            writer.write_record(fields(report, line, segment).iter().map(Field::text)).map_err(format)?;
        }
        writer
            .into_inner()
            .map_err(|error| ExportError::Format { file: "lines.csv", reason: error.to_string() })
    }
}

/// Writes `lines.geojson` (RFC 7946, WGS 84): one feature for each segment, its path along the planned track, with the
/// columns of `lines.csv` as properties. Only for dives in a projected grid: the format has no local metres.
#[derive(Clone, Copy, Debug, Default)]
pub struct LinesGeoJson;

impl Exporter for LinesGeoJson {
    type Report = LinesReport;

    fn file_name(&self) -> &'static str {
        "lines.geojson"
    }

    fn bytes(&self, report: &LinesReport) -> Result<Vec<u8>, ExportError> {
        let file = GeoJsonFile::new(self.file_name(), &report.provenance);
        let columns = columns(report);
        let features = segments(report).map(|(line, segment)| -> Result<Feature, ExportError> {
            let fields = fields(report, line, segment).into_iter().map(Field::json);
            let properties = columns.iter().map(|&name| name.to_owned()).zip(fields).collect();
            Ok(feature(None, file.line(&segment.path)?, properties))
        });
        let features = features.collect::<Result<_, _>>()?;
        let mut members = JsonObject::new();
        if let Some(guarantee) = &report.guarantee {
            members.insert("guarantee".into(), file.object(guarantee)?.into());
        }
        file.bytes(features, members)
    }
}

fn segments(report: &LinesReport) -> impl Iterator<Item = (&LineReport, &SegmentReport)> {
    report.lines.iter().flat_map(|line| line.segments.iter().map(move |segment| (line, segment)))
}

fn with_guaranteed(report: &LinesReport) -> bool {
    segments(report).any(|(_, segment)| segment.guaranteed.is_some())
}

fn columns(report: &LinesReport) -> Vec<&'static str> {
    let mut columns = COLUMNS.to_vec();
    if with_guaranteed(report) {
        columns.extend(GUARANTEED_COLUMNS);
    }
    columns
}

/// What stands in one column.
enum Field {
    Text(String),
    Count(u64),
    Number(Option<f64>),
}

impl Field {
    /// As a table shows it. Numbers are the shortest text that reads back as the same number.
    fn text(&self) -> String {
        match self {
            Self::Text(text) => text.clone(),
            Self::Count(count) => count.to_string(),
            Self::Number(value) => value.map(|value| value.to_string()).unwrap_or_default(),
        }
    }

    /// As a property; an empty text is no value.
    fn json(self) -> JsonValue {
        match self {
            Self::Text(text) if text.is_empty() => JsonValue::Null,
            Self::Text(text) => text.into(),
            Self::Count(count) => count.into(),
            Self::Number(value) => value.into(),
        }
    }
}

/// What stands in the columns of a segment, in the order of [`columns`].
fn fields(report: &LinesReport, line: &LineReport, segment: &SegmentReport) -> Vec<Field> {
    let fix = &segment.estimated;
    let (first, last) = (segment.path.first(), segment.path.last());
    let count = |count: usize| Field::Count(count as u64);
    let known = |value: f64| Field::Number(Some(value));
    let mut row = vec![
        Field::Text(line.name.clone()),
        count(line.rank),
        count(segment.number),
        known(segment.start_m),
        known(segment.end_m),
        Field::Number(first.map(|point| point.east_m)),
        Field::Number(first.map(|point| point.north_m)),
        Field::Number(last.map(|point| point.east_m)),
        Field::Number(last.map(|point| point.north_m)),
        count(segment.detections_ahead),
        count(fix.dives),
    ];
    let estimates = [
        fix.median_m,
        fix.p95_m,
        fix.within_required_share,
        fix.no_fix_share,
        fix.lasting_median_m,
        fix.lasting_p95_m,
    ];
    row.extend(
        estimates.into_iter().flat_map(|Estimate { value, low, high }| [value, low, high].map(Field::Number)),
    );
    row.extend([
        known(fix.relapse_share),
        known(fix.contradiction_share),
        known(fix.wrong_fix_share),
        known(fix.undecided_share),
        known(report.parameters.required_fix_m),
        known(report.parameters.fix_size_m),
        Field::Count(report.provenance.seed),
        numbers(&segment.look_alikes),
        numbers(&segment.remap_regions),
    ]);
    if with_guaranteed(report) {
        let fix = segment.guaranteed.as_ref();
        let words = |text: Option<String>| Field::Text(text.unwrap_or_default());
        row.extend([
            Field::Number(fix.and_then(|fix| fix.distance_m)),
            Field::Number(fix.and_then(|fix| fix.lasting_m)),
            fix.map_or(Field::Number(None), |fix| count(fix.certain_detections)),
            words(fix.and_then(|fix| fix.cause).map(|cause| cause.word().to_owned())),
            words(fix.and_then(|fix| fix.reason.clone())),
        ]);
    }
    row
}

/// Numbers with blanks between.
fn numbers(numbers: &[usize]) -> Field {
    Field::Text(numbers.iter().map(usize::to_string).collect::<Vec<_>>().join(" "))
}
