//! The command `lookalikes`, and what `lines` takes from it.

use std::path::Path;

use anyhow::{Context, Result};

use super::args::Common;
use super::output::{FileNames, OutputFile};
use super::run::{Exit, read, warning};
use super::terminal::{print_notices, print_result};
use crate::alias::{self, LookAlikeRequest};
use crate::assess::Setup;
use crate::export::{self, Exporter, LookAlikesCsv, LookAlikesGeoJson, LookAlikesJson};
use crate::render::{self, ChartSize};
use crate::report::{LinesReport, LookAlikesReport};

/// Most dangerous look-alikes that `lines` marks: one digit each, so that the chart can be read.
const MARKED: usize = 9;

/// Files that `lookalikes` writes.
pub(super) const FILES: FileNames = FileNames {
    always: &["lookalikes.json", "lookalikes.csv", "lookalikes.png", "lookalikes-panels.png"],
    on_earth: &["lookalikes.geojson"],
};

pub(super) fn lookalikes(
    path: &Path,
    request: &LookAlikeRequest,
    out: Option<&Path>,
    common: &Common,
) -> Result<Exit> {
    let dive = read(path, common)?;
    print_notices(dive.notices.iter().filter(|notice| notice.is_warning), common.quiet);
    FILES.prepare(out, &dive.frame, common)?;
    let report = found(&Setup::new(&dive), request);
    if let Some(out) = out {
        FILES.write(out, &files(&report, &common.chart_size())?, common)?;
    }
    let text = if common.json {
        LookAlikesJson.bytes(&report)?
    } else {
        export::lookalikes_table(&report).into_bytes()
    };
    print_result(&text).context("standard output")?;
    Ok(exit(&report, common))
}

/// The files of a list of look-alikes.
pub(super) fn files(report: &LookAlikesReport, size: &ChartSize) -> Result<Vec<OutputFile>> {
    let mut bytes = vec![
        LookAlikesJson.bytes(report)?,
        LookAlikesCsv.bytes(report)?,
        render::lookalikes_png(report, size)?,
        render::lookalike_panels_png(report, size)?,
    ];
    if !report.provenance.frame.is_local() {
        bytes.push(LookAlikesGeoJson.bytes(report)?);
    }
    Ok(FILES.with(bytes))
}

/// The exit code of `lookalikes`, with the reason on standard error.
pub(super) fn exit(report: &LookAlikesReport, common: &Common) -> Exit {
    if report.complete {
        return Exit::Done;
    }
    let text = format!(
        "more than {} agreeing triangles: the list is not complete; use a shorter --separation-m, or tighter bounds",
        alias::TRIANGLES_MAX
    );
    print_notices([&warning(text)], common.quiet);
    Exit::Undecided
}

pub(super) fn found(setup: &Setup<'_>, request: &LookAlikeRequest) -> LookAlikesReport {
    let head = (setup.provenance("fixability.lookalikes"), setup.parameters(), setup.chart_landmarks());
    alias::look_alikes(setup.dive, request, head)
}

/// Marks the segments that run over the most dangerous look-alikes.
pub(super) fn mark_look_alikes(setup: &Setup<'_>, report: &mut LinesReport, common: &Common) {
    let request = LookAlikeRequest { listed: MARKED, only_whole: true, ..LookAlikeRequest::default() };
    mark(report, &found(setup, &request), common);
}

/// Marks the segments that run over the most dangerous look-alikes of a list.
pub(super) fn mark(report: &mut LinesReport, found: &LookAlikesReport, common: &Common) {
    // Marks from half a search would look like clear ground elsewhere.
    if found.complete {
        let mut marked = found.clone();
        marked.look_alikes.truncate(MARKED);
        alias::mark_lines(report, &marked);
    } else {
        let text =
            "no segments are marked as look-alike ground: the map has more look-alikes than can be held; \
                    lookalikes with a shorter --separation-m lists some"
                .to_owned();
        print_notices([&warning(text)], common.quiet);
    }
}
