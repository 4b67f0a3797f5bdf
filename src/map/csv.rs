//! Landmarks from separated values.
//!
//! *Columns.* `id` (also `name`, `contact`, `contact_id`, `landmark`), `lat` and `lon` or `easting` and `northing` with
//! their aliases, `surveyed` (a date), and either `uncertainty_m` or `uncertainty_east_m` with `uncertainty_north_m`. Others are listed and
//! left alone.

use time::Date;

use super::read::{LandmarkFile, LandmarkRow, ReadOptions};
use crate::bounds;
use crate::frame::Crs;
use crate::input::InputText;
use crate::input::position::{COORDINATE_COLUMNS, PositionCheck, PositionColumns};
use crate::input::table::{Column, Row, Table};
use crate::problem::{Findings, Problem, ProblemList};
use crate::units;

pub(super) const ID: Column = Column {
    key: "id",
    names: &["id", "contact_id", "contact", "landmark", "landmark_id", "name", "label"],
    one_only: false,
};
pub(super) const BOTH: Column =
    Column { key: "both", names: &["uncertainty_m", "uncertainty", "unc_m"], one_only: true };
pub(super) const EAST: Column =
    Column { key: "u_east", names: &["uncertainty_east_m", "unc_east_m"], one_only: true };
pub(super) const NORTH: Column =
    Column { key: "u_north", names: &["uncertainty_north_m", "unc_north_m"], one_only: true };

pub(super) const SURVEYED: Column =
    Column { key: "surveyed", names: &["surveyed", "survey_date"], one_only: true };

pub(super) fn read(
    input: &InputText,
    crs: &Crs,
    options: ReadOptions,
    findings: &mut Findings,
) -> Option<LandmarkFile> {
    let mut columns = vec![ID, BOTH, EAST, NORTH, SURVEYED];
    columns.extend(COORDINATE_COLUMNS);
    let mut table = Table::read(input, &columns, findings)?;
    let uncertainty = Uncertainty::find(&table, findings);
    let place = PositionColumns::find(&table, crs, findings);
    let (uncertainty, place) = (uncertainty?, place?);
    let id = table.column(ID.key);
    let surveyed = table.column(SURVEYED.key);

    let mut used = vec![place.x, place.y];
    used.extend(id);
    used.extend(surveyed);
    used.extend(uncertainty.columns());
    table.report_unused(&used, findings);

    let mut bad = std::mem::take(&mut table.misfits);
    let mut check = PositionCheck::new(&input.name, crs);
    let mut rows = Vec::with_capacity(table.rows().len());
    for row in table.rows() {
        let mut problems = ProblemList::default();
        let position = check.row(&table, row, place, options.decimal_comma, &mut problems);
        let uncertainty_m = uncertainty.of(&table, row, options.decimal_comma, &mut problems);
        let surveyed = surveyed.and_then(|column| date(&table, row, column, &mut problems));
        match position {
            Some(position) if problems.is_empty() => rows.push(LandmarkRow {
                line: Some(row.line),
                place: None,
                id: id.map(|c| row.text(c)).filter(|t| !t.is_empty()).map(str::to_owned),
                position,
                uncertainty_m,
                surveyed,
            }),
            _ => bad.add(problems),
        }
    }
    if check.plausible(findings) {
        bad.finish(&input.name, options.skip_bad_rows, findings);
    }
    Some(LandmarkFile { crs: crs.clone(), rows })
}

/// The date in a field, or none when it is empty; a problem of the row goes to `problems`.
fn date(table: &Table, row: Row<'_>, column: usize, problems: &mut ProblemList) -> Option<Date> {
    let text = row.text(column);
    if text.is_empty() {
        return None;
    }
    let date = units::parse_date(text);
    if date.is_none() {
        problems.push(
            Problem::new(&table.file, format!("\"{text}\" is not a date"))
                .line(row.line)
                .place(table.place(column))
                .accepted(format!("{}, or empty when it is not known", bounds::DATE_FORM)),
        );
    }
    date
}

/// Which columns hold the uncertainty.
#[derive(Clone, Copy)]
enum Uncertainty {
    None,
    Both(usize),
    Axes(usize, usize),
}

impl Uncertainty {
    fn find(table: &Table, findings: &mut Findings) -> Option<Self> {
        let found = [BOTH.key, EAST.key, NORTH.key].map(|k| table.column(k));
        match found {
            [None, None, None] => Some(Self::None),
            [Some(both), None, None] => Some(Self::Both(both)),
            [None, Some(east), Some(north)] => Some(Self::Axes(east, north)),
            _ => {
                findings.problem(
                    Problem::new(
                        &table.file,
                        format!("the uncertainty columns do not fit together: {}", {
                            let names: Vec<&str> =
                                found.iter().flatten().map(|c| table.header[*c].as_str()).collect();
                            names.join(", ")
                        }),
                    )
                    .line(1)
                    .accepted("uncertainty_m for both axes, or uncertainty_east_m together with uncertainty_north_m"),
                );
                None
            }
        }
    }

    fn columns(self) -> Vec<usize> {
        match self {
            Self::None => vec![],
            Self::Both(c) => vec![c],
            Self::Axes(e, n) => vec![e, n],
        }
    }

    /// Both values, or none when the fields are empty; problems of the row go to `problems`.
    fn of(
        self,
        table: &Table,
        row: Row<'_>,
        decimal_comma: bool,
        problems: &mut ProblemList,
    ) -> Option<(f64, f64)> {
        let mut read = |column: usize| -> Option<f64> {
            let text = row.text(column);
            if text.is_empty() {
                return None;
            }
            let problem = |what: String| {
                Problem::new(&table.file, what)
                    .line(row.line)
                    .place(table.place(column))
                    .accepted(format!("{}, or empty for the default", bounds::UNCERTAINTY))
            };
            match units::parse_number(text, decimal_comma) {
                Ok(x) if bounds::UNCERTAINTY.contains(x) => return Some(x),
                Ok(x) if x < 0.0 => problems.push(problem(format!("\"{text}\" is negative"))),
                Ok(_) => problems.push(problem(format!("\"{text}\" is out of range"))),
                Err(fault) => {
                    problems.push(problem(format!("\"{text}\" {}", fault.what)).advice(fault.advice));
                }
            }
            None
        };
        match self {
            Self::None => None,
            Self::Both(c) => read(c).map(|u| (u, u)),
            Self::Axes(e, n) => match (read(e), read(n)) {
                (Some(east), Some(north)) => Some((east, north)),
                (None, None) => None,
                _ => {
                    if row.text(e).is_empty() != row.text(n).is_empty() {
                        problems.push(
                            Problem::new(&table.file, "one axis has an uncertainty, the other none")
                                .line(row.line)
                                .place(format!("columns {} and {}", table.header[e], table.header[n]))
                                .accepted("both, or neither for the default"),
                        );
                    }
                    None
                }
            },
        }
    }
}
