//! Lines from separated values: one row per waypoint.
//!
//! *Columns.* `line` (also `line_name`, `line_id`, `name`), `order` (optional; also `sequence`, `seq`, `waypoint`; rows
//! keep file order without it), and `lat` and `lon` or `easting` and `northing` with their aliases.

use super::read::{LineFile, LineRows, ReadOptions, WaypointRow};
use crate::frame::Crs;
use crate::input::InputText;
use crate::input::position::{COORDINATE_COLUMNS, PositionCheck, PositionColumns};
use crate::input::table::{Column, Table};
use crate::problem::{Findings, Problem, ProblemList};
use crate::units;

pub(super) const LINE: Column =
    Column { key: "line", names: &["line", "line_name", "line_id", "name"], one_only: false };
const ORDER: Column = Column {
    key: "order",
    names: &["order", "sequence", "seq", "waypoint", "waypoint_number"],
    one_only: false,
};

/// A waypoint with its order value, while lines are put together.
type Ordered = (f64, WaypointRow);

pub(super) fn read(input: &InputText, options: ReadOptions<'_>, findings: &mut Findings) -> Option<LineFile> {
    let crs: Crs = options.declared.or(options.of_map).cloned()?;
    let mut columns = vec![LINE, ORDER];
    columns.extend(COORDINATE_COLUMNS);
    let mut table = Table::read(input, &columns, findings)?;
    let place = PositionColumns::find(&table, &crs, findings);
    let Some(name_column) = table.column(LINE.key) else {
        findings.problem(
            Problem::new(&input.name, "no column line with the name of the line each waypoint belongs to")
                .line(1)
                .accepted(format!("line (or {})", LINE.names[1..].join(", ")))
                .advice(format!("the header has: {}", table.header_words())),
        );
        return None;
    };
    let place = place?;
    let order_column = table.column(ORDER.key);
    let mut used = vec![place.x, place.y, name_column];
    used.extend(order_column);
    table.report_unused(&used, findings);

    let mut bad = std::mem::take(&mut table.misfits);
    let mut check = PositionCheck::new(&input.name, &crs);
    let mut lines: Vec<(String, u64, Vec<Ordered>)> = Vec::new();
    let mut number_of_name = std::collections::HashMap::new();
    for row in table.rows() {
        let mut problems = ProblemList::default();
        let name = row.text(name_column);
        if name.is_empty() {
            problems.push(
                Problem::new(&input.name, "is empty")
                    .line(row.line)
                    .place(table.place(name_column))
                    .accepted("the name of the line"),
            );
        }
        let order = order_column.map_or(Some(0.0), |c| {
            units::parse_number(row.text(c), options.decimal_comma)
                .map_err(|fault| {
                    problems.push(
                        Problem::new(&input.name, format!("\"{}\" {}", row.text(c), fault.what))
                            .line(row.line)
                            .place(table.place(c))
                            .accepted("a number that grows along the line"),
                    );
                })
                .ok()
        });
        let position = check.row(&table, row, place, options.decimal_comma, &mut problems);
        match (order, position) {
            (Some(order), Some(position)) if problems.is_empty() => {
                let i = *number_of_name.entry(name.to_owned()).or_insert_with(|| {
                    lines.push((name.to_owned(), row.line, Vec::new()));
                    lines.len() - 1
                });
                lines[i].2.push((order, WaypointRow { line: Some(row.line), place: None, position }));
            }
            _ => bad.add(problems),
        }
    }
    if check.plausible(findings) {
        bad.finish(&input.name, false, findings);
    }
    let mut out = Vec::new();
    for (name, first_line, mut waypoints) in lines {
        if let Some(column) = order_column {
            waypoints.sort_by(|a, b| a.0.total_cmp(&b.0));
            for pair in waypoints.windows(2) {
                if pair[0].0.total_cmp(&pair[1].0).is_eq() {
                    findings.problem(
                        Problem::new(
                            &input.name,
                            format!(
                                "line \"{name}\" has the order {} twice (also in line {})",
                                pair[1].0,
                                pair[0].1.line.unwrap_or_default()
                            ),
                        )
                        .line(pair[1].1.line)
                        .place(table.place(column))
                        .accepted("each number once per line"),
                    );
                }
            }
        }
        out.push(LineRows {
            name,
            origin: format!("line {first_line}"),
            waypoints: waypoints.into_iter().map(|(_, w)| w).collect(),
        });
    }
    Some(LineFile { crs, lines: out })
}
