//! Line files: what every format has in common.

use super::{csv, geojson, gpx, kml};
use crate::frame::{Crs, Given};
use crate::input::{Format, InputText};
use crate::problem::{Findings, Problem};

/// A waypoint as its file gives it.
#[derive(Clone, Debug, PartialEq)]
pub struct WaypointRow {
    /// Line in the file, for tables.
    pub line: Option<u64>,
    /// Place in the file, where there are no lines: `feature 2, position 5`.
    pub place: Option<String>,
    /// Position in the file's coordinate system.
    pub position: Given,
}

/// A line as its file gives it.
#[derive(Clone, Debug, PartialEq)]
pub struct LineRows {
    /// Name.
    pub name: String,
    /// Where the line stands in the file: `line 2`, `feature 1`, `track 1, segment 2`.
    pub origin: String,
    /// In order.
    pub waypoints: Vec<WaypointRow>,
}

/// All lines of a file.
#[derive(Clone, Debug, PartialEq)]
pub struct LineFile {
    /// The coordinate system of the positions.
    pub crs: Crs,
    /// In file order.
    pub lines: Vec<LineRows>,
}

/// What the dive file says about line files.
#[derive(Clone, Copy, Debug)]
pub struct ReadOptions<'a> {
    /// `crs` of the table `[lines]`, if given.
    pub declared: Option<&'a Crs>,
    /// Coordinate system of the landmarks: the default for separated values.
    pub of_map: Option<&'a Crs>,
    /// Numbers are written with a decimal comma.
    pub decimal_comma: bool,
}

/// Reads the lines of a file. None, with findings, when it cannot be used.
pub fn read(input: &InputText, options: ReadOptions<'_>, findings: &mut Findings) -> Option<LineFile> {
    let before = findings.problems.len();
    let file = match input.format() {
        Some(Format::Csv) => csv::read(input, options, findings),
        Some(Format::GeoJson) => geojson::read(input, options.declared, findings),
        Some(Format::Gpx) => gpx::read(input, findings),
        Some(Format::Kml) => kml::read(input, findings),
        None => {
            findings.problem(Problem::new(&input.name, "is in no format that holds lines").accepted(
                "CSV waypoints (.csv, .tsv, .txt), GeoJSON lines (.geojson, .json), GPX routes and tracks (.gpx) or KML lines (.kml)",
            ));
            None
        }
    };
    let file = file.filter(|_| findings.problems.len() == before)?;
    if file.lines.is_empty() {
        findings.problem(
            Problem::new(&input.name, "holds no line").accepted("at least one line with two waypoints"),
        );
        return None;
    }
    Some(file)
}
