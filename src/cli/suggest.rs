//! The command `suggest`.

use std::path::Path;

use anyhow::{Context, Result, bail};

use super::args::Common;
use super::run::{Exit, read, say_local_metres, say_written, undecided_runs};
use super::terminal::{print_notices, print_result, progress_bar_over};
use crate::assess::{self, AREA_STARTS_MAX, Setup};
use crate::export::{self, Exporter, SuggestCsv, SuggestGeoJson, SuggestGpx, SuggestJson, SuggestLinesCsv};
use crate::render;

/// Files that `suggest` writes for every map, and those of maps on the Earth.
const FILES: [&str; 4] = ["suggest.json", "suggest.csv", "suggest-lines.csv", "suggest.png"];
const EARTH_FILES: [&str; 2] = ["suggest.geojson", "suggest.gpx"];

pub(super) fn suggest(path: &Path, out: Option<&Path>, listed: Option<u16>, common: &Common) -> Result<Exit> {
    let mut dive = read(path, common)?;
    print_notices(dive.notices.iter().filter(|notice| notice.is_warning), common.quiet);
    dive.suggest.listed = listed.map_or(dive.suggest.listed, usize::from);
    let setup = Setup::new(&dive);
    let search = assess::suggest_area_options(&dive);
    let starts = assess::area_starts(&setup, &search);
    if starts > AREA_STARTS_MAX {
        bail!(
            "suggest: {starts} runs (start cells times headings), and at most {AREA_STARTS_MAX} are computed; choose larger \
             cells (area.cell_m), fewer headings (area.headings), or a smaller start.search_area"
        );
    }
    let mut names = FILES.to_vec();
    if !dive.frame.is_local() {
        names.extend(EARTH_FILES);
    }
    if let Some(out) = out {
        export::prepare(out, &names, common.force)?;
    }
    let bar = progress_bar_over(starts, "runs", common.quiet);
    let report = assess::suggest(&setup, &search, &|count| bar.inc(count as u64));
    bar.finish_and_clear();
    let json = SuggestJson.bytes(&report)?;
    if let Some(out) = out {
        let mut bytes = vec![
            json.clone(),
            SuggestCsv.bytes(&report)?,
            SuggestLinesCsv.bytes(&report)?,
            render::suggest_png(&report, &common.chart_size())?,
        ];
        if dive.frame.is_local() {
            say_local_metres(&EARTH_FILES, common);
        } else {
            bytes.extend([SuggestGeoJson.bytes(&report)?, SuggestGpx.bytes(&report)?]);
        }
        let files: Vec<(&str, Vec<u8>)> = names.iter().copied().zip(bytes).collect();
        export::write_all(out, &files, common.force)?;
        say_written(out, &names, common);
    }
    let text = if common.json { json } else { export::suggest_table(&report).into_bytes() };
    print_result(&text).context("standard output")?;
    if report.undecided {
        return Ok(undecided_runs(common));
    }
    Ok(Exit::Done)
}
