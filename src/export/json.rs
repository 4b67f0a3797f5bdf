//! `lines.json`, `trace.json` and the JSON of `check`: the whole report, keys in the order of the report's fields.

use serde::Serialize;

use super::{ExportError, Exporter};
use crate::report::{CheckReport, LinesReport, TraceReport};

/// Writes `lines.json`.
#[derive(Clone, Copy, Debug, Default)]
pub struct LinesJson;

impl Exporter for LinesJson {
    type Report = LinesReport;

    fn file_name(&self) -> &'static str {
        "lines.json"
    }

    fn bytes(&self, report: &LinesReport) -> Result<Vec<u8>, ExportError> {
        pretty(self.file_name(), report)
    }
}

/// Writes `trace.json`.
#[derive(Clone, Copy, Debug, Default)]
pub struct TraceJson;

impl Exporter for TraceJson {
    type Report = TraceReport;

    fn file_name(&self) -> &'static str {
        "trace.json"
    }

    fn bytes(&self, report: &TraceReport) -> Result<Vec<u8>, ExportError> {
        pretty(self.file_name(), report)
    }
}

/// The JSON of `check`, which is printed and not written to a file.
///
/// # Errors
/// When the report cannot be put into JSON.
pub fn check_json(report: &CheckReport) -> Result<Vec<u8>, ExportError> {
    pretty("check.json", report)
}

/// Indented JSON with a newline at its end. Numbers are the shortest that read back as the same value.
pub(super) fn pretty(file: &'static str, report: &impl Serialize) -> Result<Vec<u8>, ExportError> {
    let mut bytes = serde_json::to_vec_pretty(report)
        .map_err(|error| ExportError::Format { file, reason: error.to_string() })?;
    bytes.push(b'\n');
    Ok(bytes)
}
