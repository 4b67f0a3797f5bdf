//! The command `remap`.

use std::path::Path;

use anyhow::{Context, Result, bail};
use indicatif::ProgressBar;

use super::args::Common;
use super::output::{FileNames, OutputFile};
use super::run::{Exit, read, undecided_runs};
use super::terminal::{print_notices, print_result, runs_bar};
use crate::assess::{self, AREA_STARTS_MAX, RemapProgress, Setup};
use crate::export::{self, Exporter, RemapCsv, RemapGeoJson, RemapJson};
use crate::render::{self, ChartSize};
use crate::report::{LinesReport, RemapReport};

/// Files that `remap` writes.
pub(super) const FILES: FileNames =
    FileNames { always: &["remap.json", "remap.csv", "remap.png"], on_earth: &["remap.geojson"] };

/// The files of the remap analysis.
pub(super) fn files(report: &RemapReport, size: &ChartSize) -> Result<Vec<OutputFile>> {
    let mut bytes = vec![RemapJson.bytes(report)?, RemapCsv.bytes(report)?, render::remap_png(report, size)?];
    if !report.provenance.frame.is_local() {
        bytes.push(RemapGeoJson.bytes(report)?);
    }
    Ok(FILES.with(bytes))
}

pub(super) fn remap(path: &Path, out: Option<&Path>, common: &Common) -> Result<Exit> {
    let dive = read(path, common)?;
    print_notices(dive.notices.iter().filter(|notice| notice.is_warning), common.quiet);
    let setup = Setup::new(&dive);
    refuse_huge(&setup)?;
    FILES.prepare(out, &dive.frame, common)?;
    let report = analyse(&setup, &runs_bar(common.quiet));
    if let Some(out) = out {
        FILES.write(out, &files(&report, &common.chart_size())?, common)?;
    }
    let text =
        if common.json { RemapJson.bytes(&report)? } else { export::remap_table(&report).into_bytes() };
    print_result(&text).context("standard output")?;
    if report.undecided {
        return Ok(undecided_runs(common));
    }
    Ok(Exit::Done)
}

/// Marks the segments of `lines` that run over remap regions.
pub(super) fn mark_remap_regions(setup: &Setup<'_>, lines: &mut LinesReport, common: &Common) {
    assess::mark_segments(lines, &analyse(setup, &runs_bar(common.quiet)));
}

pub(super) fn analyse(setup: &Setup<'_>, bar: &ProgressBar) -> RemapReport {
    let report = assess::remap(setup, &|progress| match progress {
        RemapProgress::Planned(runs) => bar.inc_length(runs as u64),
        RemapProgress::Done(runs) => bar.inc(runs as u64),
    });
    bar.finish_and_clear();
    report
}

/// Refuses a map with more runs than are computed.
pub(super) fn refuse_huge(setup: &Setup<'_>) -> Result<()> {
    let starts = assess::area_starts(setup, &assess::remap_area_options(setup.dive));
    if starts > AREA_STARTS_MAX {
        bail!(
            "remap: {starts} runs (start cells times headings), and at most {AREA_STARTS_MAX} are computed; choose larger \
             cells (remap.cell_m), fewer headings (area.headings), or a smaller start.search_area"
        );
    }
    Ok(())
}
