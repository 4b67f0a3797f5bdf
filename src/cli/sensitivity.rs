//! The command `sensitivity`.

use std::path::Path;

use anyhow::{Context, Result};

use super::args::Common;
use super::run::{Exit, read, say_written, undecided_runs};
use super::terminal::{print_notices, print_result, progress_bar_over};
use crate::assess::{self, Setup};
use crate::export::{self, Exporter, SensitivityCsv, SensitivityJson};
use crate::render;

/// Files that `sensitivity` writes.
const FILES: [&str; 3] = ["sensitivity.json", "sensitivity.csv", "sensitivity.png"];

pub(super) fn sensitivity(
    path: &Path,
    out: Option<&Path>,
    factor: Option<f64>,
    common: &Common,
) -> Result<Exit> {
    let dive = read(path, common)?;
    print_notices(dive.notices.iter().filter(|notice| notice.is_warning), common.quiet);
    if let Some(out) = out {
        export::prepare(out, &FILES, common.force)?;
    }
    let factor = factor.unwrap_or(dive.improvement_factor);
    let bar = progress_bar_over(assess::sensitivity_runs(&dive), "lines", common.quiet);
    let report = assess::sensitivity(&Setup::new(&dive), factor, &|| bar.inc(1));
    bar.finish_and_clear();
    let json = SensitivityJson.bytes(&report)?;
    if let Some(out) = out {
        let files = [
            (FILES[0], json.clone()),
            (FILES[1], SensitivityCsv.bytes(&report)?),
            (FILES[2], render::sensitivity_png(&report, &common.chart_size())?),
        ];
        export::write_all(out, &files, common.force)?;
        say_written(out, &FILES, common);
    }
    let text = if common.json { json } else { export::sensitivity_table(&report).into_bytes() };
    print_result(&text).context("standard output")?;
    if report.undecided {
        return Ok(undecided_runs(common));
    }
    Ok(Exit::Done)
}
