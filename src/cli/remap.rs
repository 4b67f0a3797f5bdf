//! The command `remap`.

use std::path::Path;

use anyhow::{Context, Result, bail};

use super::args::Common;
use super::run::{Exit, read, say_local_metres, say_written, undecided_runs};
use super::terminal::{print_notices, print_result, runs_bar};
use crate::assess::{self, AREA_STARTS_MAX, RemapProgress, Setup};
use crate::export::{self, Exporter, RemapCsv, RemapGeoJson, RemapJson};
use crate::render;
use crate::report::{LinesReport, RemapReport};

pub(super) fn remap(path: &Path, out: Option<&Path>, common: &Common) -> Result<Exit> {
    let dive = read(path, common)?;
    print_notices(dive.notices.iter().filter(|notice| notice.is_warning), common.quiet);
    let setup = Setup::new(&dive);
    refuse_huge(&setup)?;
    let mut names = vec!["remap.json", "remap.csv", "remap.png"];
    if !dive.frame.is_local() {
        names.push("remap.geojson");
    }
    if let Some(out) = out {
        export::prepare(out, &names, common.force)?;
    }
    let report = analyse(&setup, common);
    let json = RemapJson.bytes(&report)?;
    if let Some(out) = out {
        let mut files = vec![
            (names[0], json.clone()),
            (names[1], RemapCsv.bytes(&report)?),
            (names[2], render::remap_png(&report, &common.chart_size())?),
        ];
        if dive.frame.is_local() {
            say_local_metres(&["remap.geojson"], common);
        } else {
            files.push((names[3], RemapGeoJson.bytes(&report)?));
        }
        export::write_all(out, &files, common.force)?;
        say_written(out, &names, common);
    }
    let text = if common.json { json } else { export::remap_table(&report).into_bytes() };
    print_result(&text).context("standard output")?;
    if report.undecided {
        return Ok(undecided_runs(common));
    }
    Ok(Exit::Done)
}

/// Marks the segments of `lines` that run over remap regions.
pub(super) fn mark_remap_regions(setup: &Setup<'_>, lines: &mut LinesReport, common: &Common) {
    assess::mark_segments(lines, &analyse(setup, common));
}

fn analyse(setup: &Setup<'_>, common: &Common) -> RemapReport {
    let bar = runs_bar(common.quiet);
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
