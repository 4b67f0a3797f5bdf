//! The command `suggest`.

use std::path::Path;

use anyhow::{Context, Result, bail};

use super::args::Common;
use super::output::{FileNames, OutputFile};
use super::run::{Exit, read, undecided_runs};
use super::terminal::{print_notices, print_result, progress_bar_over};
use crate::assess::{self, AREA_STARTS_MAX, Setup};
use crate::dive::AreaOptions;
use crate::export::{self, Exporter, SuggestCsv, SuggestGeoJson, SuggestGpx, SuggestJson, SuggestLinesCsv};
use crate::render::{self, ChartSize};
use crate::report::SuggestReport;

/// Files that `suggest` writes.
const FILES: FileNames = FileNames {
    always: &["suggest.json", "suggest.csv", "suggest-lines.csv", "suggest.png"],
    on_earth: &["suggest.geojson", "suggest.gpx"],
};

/// The files of a list of suggestions.
pub(super) fn files(report: &SuggestReport, size: &ChartSize) -> Result<Vec<OutputFile>> {
    let mut bytes = vec![
        SuggestJson.bytes(report)?,
        SuggestCsv.bytes(report)?,
        SuggestLinesCsv.bytes(report)?,
        render::suggest_png(report, size)?,
    ];
    if !report.provenance.frame.is_local() {
        bytes.extend([SuggestGeoJson.bytes(report)?, SuggestGpx.bytes(report)?]);
    }
    Ok(FILES.with(bytes))
}

/// Runs of the search; refuses more than are computed.
pub(super) fn starts(setup: &Setup<'_>, search: &AreaOptions) -> Result<usize> {
    let starts = assess::area_starts(setup, search);
    if starts > AREA_STARTS_MAX {
        bail!(
            "suggest: {starts} runs (start cells times headings), and at most {AREA_STARTS_MAX} are computed; choose larger \
             cells (area.cell_m), fewer headings (area.headings), or a smaller start.search_area"
        );
    }
    Ok(starts)
}

pub(super) fn suggest(path: &Path, out: Option<&Path>, listed: Option<u16>, common: &Common) -> Result<Exit> {
    let mut dive = read(path, common)?;
    print_notices(dive.notices.iter().filter(|notice| notice.is_warning), common.quiet);
    dive.suggest.listed = listed.map_or(dive.suggest.listed, usize::from);
    let setup = Setup::new(&dive);
    let search = assess::suggest_area_options(&dive);
    let starts = starts(&setup, &search)?;
    FILES.prepare(out, &dive.frame, common)?;
    let bar = progress_bar_over(starts, "runs", common.quiet);
    let report = assess::suggest(&setup, &search, &|count| bar.inc(count as u64));
    bar.finish_and_clear();
    if let Some(out) = out {
        FILES.write(out, &files(&report, &common.chart_size())?, common)?;
    }
    let text =
        if common.json { SuggestJson.bytes(&report)? } else { export::suggest_table(&report).into_bytes() };
    print_result(&text).context("standard output")?;
    if report.undecided {
        return Ok(undecided_runs(common));
    }
    Ok(Exit::Done)
}
