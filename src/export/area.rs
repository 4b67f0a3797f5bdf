//! `area.json`, `area.csv` and the summary of `area` for the terminal.
//!
//! The JSON holds one array per figure, each with one entry per start cell in the order of `column` and `row`; runs are
//! arrays of one entry per heading. Entries without a value are `null`.

use serde::Serialize;

use super::table::{add, plain};
use super::{ExportError, Exporter};
use crate::dive::AreaOptions;
use crate::frame::LocalPoint;
use crate::report::{
    AREA_STATEMENT, AreaCell, AreaGrid, AreaReport, Cause, NoFixCounts, Parameters, Provenance,
};

/// Writes `area.json`.
#[derive(Clone, Copy, Debug, Default)]
pub struct AreaJson;

/// The file's content.
#[derive(Serialize)]
struct Content<'a> {
    #[serde(flatten)]
    provenance: &'a Provenance,
    statement: &'static str,
    parameters: &'a Parameters,
    options: AreaOptions,
    grid: AreaGrid,
    headings_deg: &'a [f64],
    search_area: &'a [LocalPoint],
    cells: Cells,
    runs: Runs,
}

/// One entry per start cell.
#[derive(Serialize)]
struct Cells {
    column: Vec<usize>,
    row: Vec<usize>,
    guaranteed_worst_fix_m: Vec<Option<f64>>,
    guaranteed_best_fix_m: Vec<Option<f64>>,
    guaranteed_median_fix_m: Vec<Option<f64>>,
    best_heading_deg: Vec<Option<f64>>,
    within_required_share: Vec<f64>,
    no_guaranteed_fix: Vec<NoFixCounts>,
}

/// One entry per start cell and heading.
#[derive(Serialize)]
struct Runs {
    guaranteed_fix_m: Vec<Vec<Option<f64>>>,
    no_guaranteed_fix_cause: Vec<Vec<Option<Cause>>>,
}

impl Exporter for AreaJson {
    type Report = AreaReport;

    fn file_name(&self) -> &'static str {
        "area.json"
    }

    fn bytes(&self, report: &AreaReport) -> Result<Vec<u8>, ExportError> {
        let cells = &report.cells;
        let runs = || (0..cells.len()).map(|cell| report.outcomes_of(cell));
        let content = Content {
            provenance: &report.provenance,
            statement: AREA_STATEMENT,
            parameters: &report.parameters,
            options: report.options,
            grid: report.grid,
            headings_deg: &report.headings_deg,
            search_area: &report.search_area,
            cells: Cells {
                column: cells.iter().map(|cell| cell.column).collect(),
                row: cells.iter().map(|cell| cell.row).collect(),
                guaranteed_worst_fix_m: cells.iter().map(|cell| cell.worst_m).collect(),
                guaranteed_best_fix_m: cells.iter().map(|cell| cell.best_m).collect(),
                guaranteed_median_fix_m: cells.iter().map(|cell| cell.median_m).collect(),
                best_heading_deg: cells.iter().map(|cell| best_heading_deg(report, cell)).collect(),
                within_required_share: cells.iter().map(|cell| cell.within_required_share).collect(),
                no_guaranteed_fix: cells.iter().map(|cell| cell.no_fix).collect(),
            },
            runs: Runs {
                guaranteed_fix_m: runs().map(|runs| runs.iter().map(|run| run.fix_m()).collect()).collect(),
                no_guaranteed_fix_cause: runs()
                    .map(|runs| runs.iter().map(|run| run.cause()).collect())
                    .collect(),
            },
        };
        // Not indented: a map has millions of numbers.
        let mut bytes = serde_json::to_vec(&content)
            .map_err(|error| ExportError::Format { file: self.file_name(), reason: error.to_string() })?;
        bytes.push(b'\n');
        Ok(bytes)
    }
}

fn best_heading_deg(report: &AreaReport, cell: &AreaCell) -> Option<f64> {
    cell.best_heading.map(|heading| report.headings_deg[heading])
}

/// Writes `area.csv`.
#[derive(Clone, Copy, Debug, Default)]
pub struct AreaCsv;

/// Columns of `area.csv`.
const COLUMNS: [&str; 19] = [
    "column",
    "row",
    "easting_m",
    "northing_m",
    "cell_m",
    "guaranteed_worst_fix_m",
    "guaranteed_best_fix_m",
    "best_heading_deg",
    "guaranteed_median_fix_m",
    "within_required_share",
    "headings",
    "headings_without_fix",
    "too_few_landmarks",
    "look_alikes",
    "too_wide",
    "undecided",
    "detection_not_certain",
    "required_fix_m",
    "longest_run_m",
];

impl Exporter for AreaCsv {
    type Report = AreaReport;

    fn file_name(&self) -> &'static str {
        "area.csv"
    }

    fn bytes(&self, report: &AreaReport) -> Result<Vec<u8>, ExportError> {
        let format = |error: csv::Error| ExportError::Format { file: "area.csv", reason: error.to_string() };
        let mut writer = csv::Writer::from_writer(Vec::new());
        writer.write_record(COLUMNS).map_err(format)?;
        let number = |value: Option<f64>| value.map(|value| value.to_string()).unwrap_or_default();
        for cell in &report.cells {
            let centre = report.grid.centre(cell.column, cell.row);
            let row = [
                cell.column.to_string(),
                cell.row.to_string(),
                centre.east_m.to_string(),
                centre.north_m.to_string(),
                report.grid.cell_m.to_string(),
                number(cell.worst_m),
                number(cell.best_m),
                number(best_heading_deg(report, cell)),
                number(cell.median_m),
                cell.within_required_share.to_string(),
                report.headings_deg.len().to_string(),
                cell.no_fix.total().to_string(),
                cell.no_fix.too_few_landmarks.to_string(),
                cell.no_fix.look_alikes.to_string(),
                cell.no_fix.too_wide.to_string(),
                cell.no_fix.undecided.to_string(),
                cell.no_fix.detection_not_certain.to_string(),
                report.parameters.required_fix_m.to_string(),
                report.options.longest_run_m.to_string(),
            ];
            writer.write_record(row).map_err(format)?;
        }
        writer
            .into_inner()
            .map_err(|error| ExportError::Format { file: "area.csv", reason: error.to_string() })
    }
}

/// The area map in a few lines.
pub fn area_table(report: &AreaReport) -> String {
    let required_m = report.parameters.required_fix_m;
    let cells = report.cells.len();
    let headings = report.headings_deg.len();
    let share = |count: usize, of: usize| format!("{:.1}", 100.0 * count as f64 / of as f64);
    let mut table = plain(&["share of the start cells".to_owned(), "%".to_owned()], 0);
    let passing = |least: f64| report.cells.iter().filter(|c| c.within_required_share >= least).count();
    let mut row = |what: String, count: usize, of: usize| add(&mut table, vec![what, share(count, of)], 0);
    row(format!("every heading fixes within {required_m} m"), passing(1.0), cells);
    row(format!("at least half of the headings fix within {required_m} m"), passing(0.5), cells);
    row(
        format!("no heading fixes within {required_m} m"),
        report.cells.iter().filter(|c| c.within_required_share == 0.0).count(),
        cells,
    );
    let mut causes = plain(&["share of the runs".to_owned(), "%".to_owned()], 0);
    let mut row = |what: String, count: usize| {
        add(&mut causes, vec![what, share(count, report.outcomes.len())], 0);
    };
    let within = report.outcomes.iter().filter(|run| run.fix_m().is_some_and(|m| m <= required_m)).count();
    let fixed = report.outcomes.iter().filter(|run| run.fix_m().is_some()).count();
    row(format!("fix guaranteed within {required_m} m"), within);
    row(format!("fix guaranteed later, within {} m", report.options.longest_run_m), fixed - within);
    for (cause, words) in [
        (Cause::TooFewLandmarks, "no fix: too few landmarks are certain to be detected"),
        (Cause::LookAlikes, "no fix: look-alike ground, several places still fit"),
        (Cause::TooWide, "no fix: one place fits, wider than the fix size"),
        (Cause::DetectionNotCertain, "no fix: detection is not certain and no miss is budgeted"),
        (Cause::Undecided, "undecided: the cell budget ran out"),
    ] {
        let count = report.outcomes.iter().filter(|run| run.cause() == Some(cause)).count();
        if count > 0 {
            row(words.to_owned(), count);
        }
    }
    format!(
        "{cells} start cells of {} m, {headings} headings, straight runs up to {} m.\n{}\n{}\nGuaranteed: true for every error within the \
         bounds, {} strays and {} misses, from the centres of the cells on the headings computed.\n",
        report.options.cell_m,
        report.options.longest_run_m,
        table.trim_fmt(),
        causes.trim_fmt(),
        report.parameters.stray_budget,
        report.parameters.miss_budget,
    )
}
