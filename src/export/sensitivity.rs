//! `sensitivity.json`, `sensitivity.csv` and the table of the error bounds.

use super::json::pretty;
use super::table::{add, metres, per_cent, plain, printable};
use super::{ExportError, Exporter};
use crate::report::{GuaranteedChange, GuaranteedFigures, ImprovedBound, SensitivityReport};

/// Columns of `sensitivity.csv`.
const COLUMNS: [&str; 27] = [
    "line",
    "improved",
    "key",
    "rank",
    "factor",
    "unit",
    "stated",
    "stated_improved",
    "in_force",
    "in_force_improved",
    "within_required_share_before",
    "within_required_share_after",
    "share_gained",
    "no_fix_share_before",
    "no_fix_share_after",
    "fix_gained_share",
    "segments",
    "segments_gaining_fix",
    "segments_compared",
    "median_fix_before_m",
    "median_fix_after_m",
    "longest_fix_before_m",
    "longest_fix_after_m",
    "sooner_median_m",
    "sooner_mean_m",
    "sooner_most_m",
    "required_fix_m",
];

/// What stands in the column `improved` for all bounds together.
const ALL: &str = "all";

/// Writes `sensitivity.json`.
#[derive(Clone, Copy, Debug, Default)]
pub struct SensitivityJson;

impl Exporter for SensitivityJson {
    type Report = SensitivityReport;

    fn file_name(&self) -> &'static str {
        "sensitivity.json"
    }

    fn bytes(&self, report: &SensitivityReport) -> Result<Vec<u8>, ExportError> {
        pretty(self.file_name(), report)
    }
}

/// Writes `sensitivity.csv`: one row for each bound and for all together, over all lines (column `line` empty) and then for
/// each line.
#[derive(Clone, Copy, Debug, Default)]
pub struct SensitivityCsv;

impl Exporter for SensitivityCsv {
    type Report = SensitivityReport;

    fn file_name(&self) -> &'static str {
        "sensitivity.csv"
    }

    fn bytes(&self, report: &SensitivityReport) -> Result<Vec<u8>, ExportError> {
        let file = self.file_name();
        let format = |error: csv::Error| ExportError::Format { file, reason: error.to_string() };
        let mut writer = csv::Writer::from_writer(Vec::new());
        writer.write_record(COLUMNS).map_err(format)?;
        for row in rows(report) {
            writer.write_record(&row).map_err(format)?;
        }
        writer.into_inner().map_err(|error| ExportError::Format { file, reason: error.to_string() })
    }
}

fn rows(report: &SensitivityReport) -> Vec<Vec<String>> {
    let mut rows = Vec::new();
    let mut scope = |line: &str, present: &GuaranteedFigures, changes: &[&GuaranteedChange], all| {
        for (bound, change) in report.bounds.iter().zip(changes) {
            rows.push(row(report, line, Some(bound), present, change));
        }
        rows.push(row(report, line, None, present, all));
    };
    let changes: Vec<&GuaranteedChange> = report.bounds.iter().map(|bound| &bound.change).collect();
    scope("", &report.present, &changes, &report.all_together);
    for line in &report.lines {
        let changes: Vec<&GuaranteedChange> = line.changes.iter().collect();
        scope(&line.name, &line.present, &changes, &line.all_together);
    }
    rows
}

fn row(
    report: &SensitivityReport,
    line: &str,
    bound: Option<&ImprovedBound>,
    before: &GuaranteedFigures,
    change: &GuaranteedChange,
) -> Vec<String> {
    let of_bound = |of: &dyn Fn(&ImprovedBound) -> String| bound.map(of).unwrap_or_default();
    let number = |value: Option<f64>| value.map(|value| value.to_string()).unwrap_or_default();
    let after = &change.after;
    vec![
        line.to_owned(),
        bound.map_or(ALL, |bound| bound.words).to_owned(),
        of_bound(&|bound| bound.key.to_owned()),
        of_bound(&|bound| rank(bound)),
        report.factor.to_string(),
        of_bound(&|bound| bound.unit.to_owned()),
        of_bound(&|bound| bound.present.stated.to_string()),
        of_bound(&|bound| bound.improved.stated.to_string()),
        of_bound(&|bound| bound.present.in_force.to_string()),
        of_bound(&|bound| bound.improved.in_force.to_string()),
        before.within_required_share.to_string(),
        after.within_required_share.to_string(),
        change.share_gained.to_string(),
        before.no_fix_share.to_string(),
        after.no_fix_share.to_string(),
        change.fix_gained_share.to_string(),
        before.segments.to_string(),
        change.segments_gaining_fix.to_string(),
        change.segments_compared.to_string(),
        number(before.median_m),
        number(after.median_m),
        number(before.longest_m),
        number(after.longest_m),
        number(change.sooner_median_m),
        number(change.sooner_mean_m),
        number(change.sooner_most_m),
        report.parameters.required_fix_m.to_string(),
    ]
}

/// The bounds, best first, and the answer in words.
pub fn sensitivity_table(report: &SensitivityReport) -> String {
    let required = super::table::short(report.parameters.required_fix_m);
    let header = [
        "rank".to_owned(),
        "improved".to_owned(),
        "now".to_owned(),
        "then".to_owned(),
        format!("within {required} m, % of length"),
        "gain, points".to_owned(),
        "segments gaining a fix".to_owned(),
        "sooner, median m".to_owned(),
        "sooner, mean m".to_owned(),
        "longest m".to_owned(),
    ];
    let mut table = plain(&header, 1);
    let mut row = |rank: String, words: &str, now: String, then: String, change: &GuaranteedChange| {
        let fields = vec![
            rank,
            words.to_owned(),
            now,
            then,
            per_cent(change.after.within_required_share),
            format!("{:.1}", 100.0 * change.share_gained),
            change.segments_gaining_fix.to_string(),
            metres(change.sooner_median_m),
            metres(change.sooner_mean_m),
            metres(change.after.longest_m),
        ];
        add(&mut table, fields, 1);
    };
    for bound in &report.bounds {
        let value = |value: f64| format!("{} {}", rounded(value), bound.unit);
        row(
            rank(bound),
            bound.words,
            value(bound.present.stated),
            value(bound.improved.stated),
            &bound.change,
        );
    }
    row(String::new(), "all together", String::new(), String::new(), &report.all_together);
    let mut text = format!(
        "{}\nNow {} % of the length of all lines has a guaranteed fix within {required} m; every bound times {}.\n",
        table.trim_fmt(),
        per_cent(report.present.within_required_share),
        report.factor,
    );
    for line in &report.lines {
        text.push_str(&format!(
            "Line {}: {} % now, {} % with all together.\n",
            printable(&line.name),
            per_cent(line.present.within_required_share),
            per_cent(line.all_together.after.within_required_share),
        ));
    }
    if !report.zero.is_empty() {
        let names: Vec<&str> = report.zero.iter().map(|bound| bound.words).collect();
        text.push_str(&format!("Zero already: {}.\n", names.join(", ")));
    }
    text.push_str(&format!("Answer: {}.\n", report.verdict.text));
    text.push_str(
        "Guaranteed figures only. Budgets of strays and misses, descent scatter and detection chance stay as they are.\n",
    );
    text
}

/// Its place; nothing for a bound that changes nothing.
fn rank(bound: &ImprovedBound) -> String {
    bound.rank.map(|rank| rank.to_string()).unwrap_or_default()
}

/// A stated value for reading: at most four decimals.
fn rounded(value: f64) -> String {
    let text = format!("{value:.4}");
    text.trim_end_matches('0').trim_end_matches('.').to_owned()
}
