//! The command `lookalikes`, and what `lines` takes from it.

use std::path::Path;

use anyhow::{Context, Result};

use super::args::Common;
use super::run::{Exit, read, say_local_metres, say_written, warning};
use super::terminal::{print_notices, print_result};
use crate::alias::{self, LookAlikeRequest};
use crate::assess::Setup;
use crate::export::{self, Exporter, LookAlikesCsv, LookAlikesGeoJson, LookAlikesJson};
use crate::render;
use crate::report::{LinesReport, LookAlikesReport};

/// Most dangerous look-alikes that `lines` marks: one digit each, so that the chart can be read.
const MARKED: usize = 9;

pub(super) fn lookalikes(
    path: &Path,
    request: &LookAlikeRequest,
    out: Option<&Path>,
    common: &Common,
) -> Result<Exit> {
    let dive = read(path, common)?;
    print_notices(dive.notices.iter().filter(|notice| notice.is_warning), common.quiet);
    let mut names = vec!["lookalikes.json", "lookalikes.csv", "lookalikes.png", "lookalikes-panels.png"];
    if !dive.frame.is_local() {
        names.push("lookalikes.geojson");
    }
    if let Some(out) = out {
        export::prepare(out, &names, common.force)?;
    }
    let report = found(&Setup::new(&dive), request);
    let json = LookAlikesJson.bytes(&report)?;
    if let Some(out) = out {
        let size = common.chart_size();
        let mut files = vec![
            (names[0], json.clone()),
            (names[1], LookAlikesCsv.bytes(&report)?),
            (names[2], render::lookalikes_png(&report, &size)?),
            (names[3], render::lookalike_panels_png(&report, &size)?),
        ];
        if dive.frame.is_local() {
            say_local_metres(&["lookalikes.geojson"], common);
        } else {
            files.push((names[4], LookAlikesGeoJson.bytes(&report)?));
        }
        export::write_all(out, &files, common.force)?;
        say_written(out, &names, common);
    }
    let text = if common.json { json } else { export::lookalikes_table(&report).into_bytes() };
    print_result(&text).context("standard output")?;
    if !report.complete {
        let text = format!(
            "more than {} agreeing triangles: the list is not complete; use a shorter --separation-m, or tighter bounds",
            alias::TRIANGLES_MAX
        );
        print_notices([&warning(text)], common.quiet);
        return Ok(Exit::Undecided);
    }
    Ok(Exit::Done)
}

fn found(setup: &Setup<'_>, request: &LookAlikeRequest) -> LookAlikesReport {
    let head = (setup.provenance("fixability.lookalikes"), setup.parameters(), setup.chart_landmarks());
    alias::look_alikes(setup.dive, request, head)
}

/// Marks the segments that run over the most dangerous look-alikes.
pub(super) fn mark_look_alikes(setup: &Setup<'_>, report: &mut LinesReport, common: &Common) {
    let request = LookAlikeRequest { listed: MARKED, only_whole: true, ..LookAlikeRequest::default() };
    let found = found(setup, &request);
    // Marks from half a search would look like clear ground elsewhere.
    if found.complete {
        alias::mark_lines(report, &found);
    } else {
        let text =
            "no segments are marked as look-alike ground: the map has more look-alikes than can be held; \
                    lookalikes with a shorter --separation-m lists some"
                .to_owned();
        print_notices([&warning(text)], common.quiet);
    }
}
