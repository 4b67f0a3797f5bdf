//! Coordinates of one file: which columns hold them, and whether their values can be what the file says they are.

use std::path::{Path, PathBuf};

use super::table::{Column, Row, Table};
use crate::bounds::{self, Range};
use crate::frame::{Crs, GeoPoint, Given, LocalPoint};
use crate::interval::{larger, smaller};
use crate::problem::{Findings, Problem, ProblemList};
use crate::units::{self, Axis};

/// Columns that hold coordinates.
pub const COORDINATE_COLUMNS: [Column; 4] = [
    Column { key: "lat", names: &["lat", "latitude", "lat_deg", "latitude_deg"], one_only: true },
    Column {
        key: "lon",
        names: &["lon", "lng", "long", "longitude", "lon_deg", "longitude_deg"],
        one_only: true,
    },
    Column { key: "east", names: &["easting", "easting_m", "east", "east_m", "x", "x_m"], one_only: true },
    Column {
        key: "north",
        names: &["northing", "northing_m", "north", "north_m", "y", "y_m"],
        one_only: true,
    },
];

/// The two columns to read, chosen by the coordinate system: x is longitude or easting.
#[derive(Clone, Copy, Debug)]
pub struct PositionColumns {
    /// Longitude or easting.
    pub x: usize,
    /// Latitude or northing.
    pub y: usize,
}

impl PositionColumns {
    /// Finds them, or says which are missing.
    pub fn find(table: &Table, crs: &Crs, findings: &mut Findings) -> Option<Self> {
        let geographic = crs.is_geographic();
        let wanted = if geographic { ["lon", "lat"] } else { ["east", "north"] };
        let other = if geographic { ["east", "north"] } else { ["lon", "lat"] };
        if let (Some(x), Some(y)) = (table.column(wanted[0]), table.column(wanted[1])) {
            return Some(Self { x, y });
        }
        let named = |key: &str| COORDINATE_COLUMNS.iter().find(|c| c.key == key).map_or("", |c| c.names[0]);
        let missing: Vec<String> = wanted
            .iter()
            .filter(|k| table.column(k).is_none())
            .map(|k| {
                let names = COORDINATE_COLUMNS.iter().find(|c| c.key == *k).map_or(&[][..], |c| c.names);
                format!("{} (or {})", names[0], names[1..].join(", "))
            })
            .collect();
        let mut problem = Problem::new(
            &table.file,
            format!("no column {} for positions in {}", missing.join(" and no column "), crs.name()),
        )
        .line(1)
        .accepted(if geographic {
            "lat and lon in degrees"
        } else {
            "easting and northing in metres"
        });
        if other.iter().all(|k| table.column(k).is_some()) {
            problem = problem.advice(format!(
                "the file has {} and {}: state the coordinate system they are in, such as crs = \"{}\"",
                named(other[0]),
                named(other[1]),
                if geographic { "EPSG:32631" } else { "EPSG:4326" },
            ));
        } else {
            problem = problem.advice(format!("the header has: {}", table.header_words()));
        }
        findings.problem(problem);
        None
    }
}

/// Advice where a format holds nothing but longitude and latitude.
const DEGREES_ONLY: &str = "this format holds longitude, then latitude, in degrees; for metres, use another format and state the grid";

/// Checks the coordinates of one file as they come and remembers their extent.
#[derive(Debug)]
pub struct PositionCheck<'a> {
    file: PathBuf,
    crs: &'a Crs,
    /// Whether the format holds nothing but degrees.
    degrees_only: bool,
    seen: usize,
    outside: usize,
    x: Option<(f64, f64)>,
    y: Option<(f64, f64)>,
}

impl<'a> PositionCheck<'a> {
    /// For one file in `crs`.
    pub fn new(file: &Path, crs: &'a Crs) -> Self {
        Self { file: file.to_path_buf(), crs, degrees_only: false, seen: 0, outside: 0, x: None, y: None }
    }

    /// For a format that holds nothing but longitude and latitude, so that advice does not speak of stating a grid.
    #[must_use]
    pub fn degrees_only(self) -> Self {
        Self { degrees_only: true, ..self }
    }

    fn ranges(&self) -> (Range, Range) {
        if self.crs.is_geographic() {
            (bounds::LONGITUDE, bounds::LATITUDE)
        } else {
            (bounds::GRID_METRES, bounds::GRID_METRES)
        }
    }

    /// The position of a table row; problems of the row go to `problems`.
    pub fn row(
        &mut self,
        table: &Table,
        row: Row<'_>,
        columns: PositionColumns,
        decimal_comma: bool,
        problems: &mut ProblemList,
    ) -> Option<Given> {
        let geographic = self.crs.is_geographic();
        let mut read = |column: usize, axis: Axis| {
            let text = row.text(column);
            let value = if geographic {
                units::parse_angle_deg(text, axis, decimal_comma)
            } else {
                units::parse_number(text, decimal_comma)
            };
            value
                .map_err(|fault| {
                    problems.push(
                        Problem::new(&table.file, format!("\"{text}\" {}", fault.what))
                            .line(row.line)
                            .place(table.place(column))
                            .accepted(if geographic {
                                "degrees, such as 52.657570"
                            } else {
                                "metres, such as 512300.5"
                            })
                            .advice(fault.advice),
                    );
                })
                .ok()
        };
        let x = read(columns.x, Axis::Longitude);
        let y = read(columns.y, Axis::Latitude);
        let places = (table.place(columns.x), table.place(columns.y));
        self.pair(x?, y?, Some(row.line), &places.0, &places.1, problems)
    }

    /// A position from its two numbers; `x_place` and `y_place` say where they stand.
    pub fn pair(
        &mut self,
        x: f64,
        y: f64,
        line: Option<u64>,
        x_place: &str,
        y_place: &str,
        problems: &mut ProblemList,
    ) -> Option<Given> {
        let grow = |old: Option<(f64, f64)>, v: f64| {
            Some(old.map_or((v, v), |(lo, hi)| (smaller(lo, v), larger(hi, v))))
        };
        self.seen += 1;
        self.x = grow(self.x, x);
        self.y = grow(self.y, y);
        let (x_range, y_range) = self.ranges();
        let mut inside = true;
        for (value, range, place) in [(x, x_range, x_place), (y, y_range, y_place)] {
            if !range.contains(value) {
                inside = false;
                problems.push(
                    Problem::new(&self.file, format!("{value} is out of range"))
                        .line(line)
                        .place(place)
                        .accepted(format!("{range}"))
                        .advice(if self.degrees_only {
                            DEGREES_ONLY
                        } else if self.crs.is_geographic() {
                            "degrees are expected; for metres, state the projected coordinate system"
                        } else {
                            ""
                        }),
                );
            }
        }
        if !inside {
            self.outside += 1;
            return None;
        }
        Some(if self.crs.is_geographic() {
            Given::Geographic(GeoPoint { lat_deg: y, lon_deg: x })
        } else {
            Given::Metres(LocalPoint::new(x, y))
        })
    }

    /// Looks at the file as a whole: degrees given as metres, or the reverse. When most positions are outside, one
    /// finding replaces those of the rows, and the result is false.
    pub fn plausible(&self, findings: &mut Findings) -> bool {
        let (Some(x), Some(y)) = (self.x, self.y) else { return true };
        let name = self.crs.name();
        if self.crs.is_geographic() && self.outside * 2 > self.seen {
            let swapped = bounds::LATITUDE.contains(x.0)
                && bounds::LATITUDE.contains(x.1)
                && bounds::LONGITUDE.contains(y.0)
                && bounds::LONGITUDE.contains(y.1);
            findings.problem(
                Problem::new(
                    &self.file,
                    format!(
                        "{} of {} positions cannot be degrees: longitudes (x) run from {} to {}, latitudes (y) from \
                         {} to {}, but the coordinate system is {name}",
                        self.outside, self.seen, x.0, x.1, y.0, y.1
                    ),
                )
                .accepted("latitude −90 to 90 and longitude −180 to 360 degrees")
                .advice(if swapped {
                    "latitude and longitude look swapped: rename the columns or reorder the values"
                } else if self.degrees_only {
                    DEGREES_ONLY
                } else {
                    "these look like metres: state the projected coordinate system, such as crs = \"EPSG:32631\", and \
                     name the columns easting and northing"
                }),
            );
            return false;
        }
        if let Crs::Grid(_) = self.crs
            && bounds::LONGITUDE.contains(x.0)
            && bounds::LONGITUDE.contains(x.1)
            && bounds::LATITUDE.contains(y.0)
            && bounds::LATITUDE.contains(y.1)
        {
            findings.problem(
                Problem::new(
                    &self.file,
                    format!(
                        "eastings run from {} to {} and northings from {} to {}: these look like degrees, but the \
                         coordinate system is {name}, in metres",
                        x.0, x.1, y.0, y.1
                    ),
                )
                .accepted("metres")
                .advice("for latitude and longitude, set crs = \"EPSG:4326\" and name the columns lat and lon"),
            );
            return false;
        }
        true
    }
}
