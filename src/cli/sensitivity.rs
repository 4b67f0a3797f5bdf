//! The command `sensitivity`.

use std::path::Path;

use anyhow::{Context, Result};

use super::args::Common;
use super::output::{FileNames, OutputFile};
use super::run::{Exit, read, undecided_runs};
use super::terminal::{print_notices, print_result, progress_bar_over};
use crate::assess::{self, Setup};
use crate::export::{self, Exporter, SensitivityCsv, SensitivityJson};
use crate::render::{self, ChartSize};
use crate::report::SensitivityReport;

/// Files that `sensitivity` writes.
const FILES: FileNames =
    FileNames { always: &["sensitivity.json", "sensitivity.csv", "sensitivity.png"], on_earth: &[] };

/// The files of the analysis.
pub(super) fn files(report: &SensitivityReport, size: &ChartSize) -> Result<Vec<OutputFile>> {
    Ok(FILES.with(vec![
        SensitivityJson.bytes(report)?,
        SensitivityCsv.bytes(report)?,
        render::sensitivity_png(report, size)?,
    ]))
}

pub(super) fn sensitivity(
    path: &Path,
    out: Option<&Path>,
    factor: Option<f64>,
    common: &Common,
) -> Result<Exit> {
    let dive = read(path, common)?;
    print_notices(dive.notices.iter().filter(|notice| notice.is_warning), common.quiet);
    FILES.prepare(out, &dive.frame, common)?;
    let factor = factor.unwrap_or(dive.improvement_factor);
    let bar = progress_bar_over(assess::sensitivity_runs(&dive), "lines", common.quiet);
    let report = assess::sensitivity(&Setup::new(&dive), factor, &|| bar.inc(1));
    bar.finish_and_clear();
    if let Some(out) = out {
        FILES.write(out, &files(&report, &common.chart_size())?, common)?;
    }
    let text = if common.json {
        SensitivityJson.bytes(&report)?
    } else {
        export::sensitivity_table(&report).into_bytes()
    };
    print_result(&text).context("standard output")?;
    if report.undecided {
        return Ok(undecided_runs(common));
    }
    Ok(Exit::Done)
}
