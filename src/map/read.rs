//! Landmark files: what every format has in common.

use time::Date;

use super::{csv, geojson, kml};
use crate::frame::{Crs, Given};
use crate::input::{Format, InputText};
use crate::problem::{Findings, Problem};

/// A landmark as its file gives it: not yet in the working frame, its uncertainty not yet a bound.
#[derive(Clone, Debug, PartialEq)]
pub struct LandmarkRow {
    /// Line in the file, for tables.
    pub line: Option<u64>,
    /// Place in the file, where there are no lines: `feature 3`.
    pub place: Option<String>,
    /// Identifier; none where the file has none.
    pub id: Option<String>,
    /// Position in the file's coordinate system.
    pub position: Given,
    /// Uncertainty east and north as written, metres.
    pub uncertainty_m: Option<(f64, f64)>,
    /// Date of its survey, if the file has one.
    pub surveyed: Option<Date>,
}

impl LandmarkRow {
    /// The identifier, or the row or feature it stands in.
    pub fn label(&self) -> String {
        self.id
            .clone()
            .or_else(|| self.line.map(|l| format!("row {l}")))
            .unwrap_or_else(|| self.where_words())
    }

    /// `line 17` or `feature 3`.
    pub fn where_words(&self) -> String {
        match (&self.place, self.line) {
            (Some(place), _) => place.clone(),
            (None, Some(line)) => format!("line {line}"),
            (None, None) => "the file".into(),
        }
    }
}

/// All landmarks of a file.
#[derive(Clone, Debug, PartialEq)]
pub struct LandmarkFile {
    /// The coordinate system of the positions.
    pub crs: Crs,
    /// In file order.
    pub rows: Vec<LandmarkRow>,
}

/// How to read a landmark file.
#[derive(Clone, Copy, Debug, Default)]
pub struct ReadOptions {
    /// Numbers are written with a decimal comma.
    pub decimal_comma: bool,
    /// Bad rows are left out and counted.
    pub skip_bad_rows: bool,
}

/// Reads the landmarks of a file whose coordinate system the dive file states. Rows with problems are left out, with
/// findings, so that what the other rows have in common can still be checked in the same pass; none when the file cannot
/// be read at all.
pub fn read(
    input: &InputText,
    crs: &Crs,
    options: ReadOptions,
    findings: &mut Findings,
) -> Option<LandmarkFile> {
    match input.format() {
        Some(Format::Csv) => csv::read(input, crs, options, findings),
        Some(Format::GeoJson) => geojson::read(input, crs, options, findings),
        Some(Format::Kml) => kml::read(input, crs, options, findings),
        Some(Format::Gpx) | None => {
            findings.problem(
                Problem::new(&input.name, "is in no format that holds landmarks").accepted(
                    "CSV (.csv, .tsv, .txt), GeoJSON points (.geojson, .json) or KML points (.kml)",
                ),
            );
            None
        }
    }
}
