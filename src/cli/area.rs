//! The command `area`.

use std::path::Path;

use anyhow::{Context, Result, bail};

use super::args::Common;
use super::run::{Exit, read, say_written, undecided_runs};
use super::terminal::{print_notices, print_result, progress_bar_over};
use crate::assess::{self, AREA_STARTS_MAX, Setup};
use crate::export::{self, AreaCsv, AreaJson, AreaTiff, Exporter};
use crate::render::{self, AreaChart};

/// Files that `area` writes.
const FILES: [&str; 6] =
    ["area.json", "area.csv", "area.tif", "area-worst.png", "area-best.png", "area-share.png"];

/// What `area` was asked beyond the dive file.
pub(super) struct AreaRequest<'a> {
    pub out: Option<&'a Path>,
    pub cell_m: Option<f64>,
    pub headings: Option<u16>,
    pub longest_run_m: Option<f64>,
}

pub(super) fn area(path: &Path, asked: &AreaRequest<'_>, common: &Common) -> Result<Exit> {
    let dive = read(path, common)?;
    print_notices(dive.notices.iter().filter(|notice| notice.is_warning), common.quiet);
    let mut options = dive.area;
    options.cell_m = asked.cell_m.unwrap_or(options.cell_m);
    options.headings = asked.headings.map_or(options.headings, usize::from);
    options.longest_run_m = asked.longest_run_m.unwrap_or(options.longest_run_m);
    let setup = Setup::new(&dive);
    let starts = assess::area_starts(&setup, &options);
    if starts == 0 {
        bail!(
            "area: no cell of {} m has its centre in the search area; choose a smaller area.cell_m (or --cell-m)",
            options.cell_m
        );
    }
    if starts > AREA_STARTS_MAX {
        bail!(
            "area: {starts} runs (start cells times headings), and at most {AREA_STARTS_MAX} are computed; choose larger \
             cells (area.cell_m or --cell-m), fewer headings, or a smaller start.search_area"
        );
    }
    if let Some(out) = asked.out {
        export::prepare(out, &FILES, common.force)?;
    }
    let bar = progress_bar_over(starts, "runs", common.quiet);
    let report = assess::area(&setup, &options, &|count| bar.inc(count as u64));
    bar.finish_and_clear();
    let json = || AreaJson.bytes(&report);
    if let Some(out) = asked.out {
        let chart = |chart| render::area_png(&report, chart, &common.chart_size());
        let bytes = [
            json()?,
            AreaCsv.bytes(&report)?,
            AreaTiff.bytes(&report)?,
            chart(AreaChart::Worst)?,
            chart(AreaChart::Best)?,
            chart(AreaChart::Share)?,
        ];
        let files: Vec<(&str, Vec<u8>)> = FILES.into_iter().zip(bytes).collect();
        export::write_all(out, &files, common.force)?;
        say_written(out, &FILES, common);
    }
    let text = if common.json { json()? } else { export::area_table(&report).into_bytes() };
    print_result(&text).context("standard output")?;
    if report.is_undecided() {
        return Ok(undecided_runs(common));
    }
    Ok(Exit::Done)
}
