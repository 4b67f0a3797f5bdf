//! `lines.csv`: one row for each segment, units in the column names, an empty field where there is no value.

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
        let segments = || report.lines.iter().flat_map(|line| line.segments.iter().map(move |s| (line, s)));
        let with_guaranteed = segments().any(|(_, segment)| segment.guaranteed.is_some());
        let mut writer = csv::Writer::from_writer(Vec::new());
        let format = |error: csv::Error| ExportError::Format { file: "lines.csv", reason: error.to_string() };

        let mut header = COLUMNS.to_vec();
        if with_guaranteed {
            header.extend(GUARANTEED_COLUMNS);
        }
        writer.write_record(header).map_err(format)?;
        for (line, segment) in segments() {
            let mut row = fields(report, line, segment);
            if with_guaranteed {
                let fix = segment.guaranteed.as_ref();
                row.push(number(fix.and_then(|fix| fix.distance_m)));
                row.push(number(fix.and_then(|fix| fix.lasting_m)));
                row.push(fix.map(|fix| fix.certain_detections.to_string()).unwrap_or_default());
                row.push(
                    fix.and_then(|fix| fix.cause).map(|cause| cause.word().to_owned()).unwrap_or_default(),
                );
                row.push(fix.and_then(|fix| fix.reason.clone()).unwrap_or_default());
            }
            writer.write_record(row).map_err(format)?;
        }
        writer
            .into_inner()
            .map_err(|error| ExportError::Format { file: "lines.csv", reason: error.to_string() })
    }
}

/// The fields of one row, in the order of [`COLUMNS`].
fn fields(report: &LinesReport, line: &LineReport, segment: &SegmentReport) -> Vec<String> {
    let fix = &segment.estimated;
    let (first, last) = (segment.path.first(), segment.path.last());
    let mut row = vec![
        line.name.clone(),
        line.rank.to_string(),
        segment.number.to_string(),
        segment.start_m.to_string(),
        segment.end_m.to_string(),
        number(first.map(|point| point.east_m)),
        number(first.map(|point| point.north_m)),
        number(last.map(|point| point.east_m)),
        number(last.map(|point| point.north_m)),
        segment.detections_ahead.to_string(),
        fix.dives.to_string(),
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
        estimates.into_iter().flat_map(|Estimate { value, low, high }| [value, low, high].map(number)),
    );
    row.extend([
        fix.relapse_share.to_string(),
        fix.contradiction_share.to_string(),
        fix.wrong_fix_share.to_string(),
        fix.undecided_share.to_string(),
        report.parameters.required_fix_m.to_string(),
        report.parameters.fix_size_m.to_string(),
        report.provenance.seed.to_string(),
        numbers(&segment.look_alikes),
        numbers(&segment.remap_regions),
    ]);
    row
}

/// Numbers with blanks between.
fn numbers(numbers: &[usize]) -> String {
    numbers.iter().map(usize::to_string).collect::<Vec<_>>().join(" ")
}

/// The shortest text that reads back as the same number; empty for none.
fn number(value: Option<f64>) -> String {
    value.map(|value| value.to_string()).unwrap_or_default()
}
