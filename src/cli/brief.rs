//! The command `brief`: everything at once, and a pack of it.

use std::path::Path;

use anyhow::{Context, Result};

use super::args::Common;
use super::output::OutputFile;
use super::run::{Exit, lines_exit, lines_files, read, undecided_runs, warning};
use super::terminal::{Steps, print_notices, print_result};
use super::{area, lookalikes, remap, sensitivity, suggest};
use crate::alias::LookAlikeRequest;
use crate::assess::{self, Setup, TraceRequest};
use crate::export::{self, BriefJson, Exporter, LandmarksGeoJson, PACK_SCHEMA, PackInProgress, Page};
use crate::problem::Notice;
use crate::render::{self, ChartSize};
use crate::report::{
    AreaReport, BriefReport, LinesReport, LookAlikesReport, RemapReport, SensitivityReport, SuggestReport,
    TraceReport, Verdict,
};

/// What `brief` was asked beyond the dive file.
pub(super) struct BriefRequest<'a> {
    pub out: &'a Path,
    pub require: Option<f64>,
}

/// Longest interval of the corridor of the traced dives, metres: the page does not show it.
const CORRIDOR_M: f64 = 100.0;

/// The temporary folder of the pack, for the signal handler.
static IN_PROGRESS: PackInProgress = PackInProgress::new();

/// Everything that was found.
struct Findings {
    verdict: Verdict,
    lines: LinesReport,
    area: AreaReport,
    look_alikes: LookAlikesReport,
    remap: RemapReport,
    suggest: SuggestReport,
    sensitivity: SensitivityReport,
    traces: Vec<TraceReport>,
}

pub(super) fn brief(path: &Path, asked: &BriefRequest<'_>, common: &Common) -> Result<Exit> {
    let dive = read(path, common)?;
    let setup = Setup::new(&dive);
    print_notices(dive.notices.iter().filter(|notice| notice.is_warning), common.quiet);
    print_notices(&assess::line_notices(&setup), common.quiet);
    area::starts(&setup, &dive.area)?;
    remap::refuse_huge(&setup)?;
    suggest::starts(&setup, &assess::suggest_area_options(&dive))?;
    export::prepare_pack(asked.out, common.force)?;
    tidy_when_interrupted();

    let mut steps = Steps::new(8, common.quiet);
    let found = find(&setup, &mut steps, common)?;
    steps.next("charts and page", None);
    let files = files(&setup, &found, &common.chart_size())?;
    let report = BriefReport {
        provenance: setup.provenance(PACK_SCHEMA),
        verdict: found.verdict.clone(),
        files: export::pack_files(&files),
    };
    let json = BriefJson.bytes(&report)?;
    let mut pack = files;
    pack.push((BriefJson.file_name().to_owned(), json.clone()));
    export::write_pack(asked.out, &pack, common.force, &IN_PROGRESS)?;
    steps.finish();
    let text = format!(
        "wrote {} files into {}; read {} first",
        pack.len(),
        asked.out.display(),
        asked.out.join("index.html").display()
    );
    print_notices([&Notice { file: None, text, is_warning: false }], common.quiet);

    let text = if common.json { json } else { export::brief_text(&report, &found.lines).into_bytes() };
    print_result(&text).context("standard output")?;
    Ok(exit(&found, asked.require, common))
}

/// Runs everything, in the order of the page.
fn find(setup: &Setup<'_>, steps: &mut Steps, common: &Common) -> Result<Findings> {
    let dive = setup.dive;
    let bar = steps.next("scoring the lines", Some((dive.lines.len() * dive.scoring.draws, "dives")));
    let mut lines = assess::score_lines(setup, &|| bar.inc(1));
    let starts = area::starts(setup, &dive.area)?;
    let bar = steps.next("mapping the area", Some((starts, "runs")));
    let area = assess::area(setup, &dive.area, &|count| bar.inc(count as u64));
    steps.next("finding look-alikes", None);
    let look_alikes = lookalikes::found(setup, &LookAlikeRequest::default());
    lookalikes::mark(&mut lines, &look_alikes, common);
    let bar = steps.next_growing("finding what to map again", "runs");
    let remap = remap::analyse(setup, bar);
    assess::mark_segments(&mut lines, &remap);
    let search = assess::suggest_area_options(dive);
    let bar = steps.next("looking for dive points", Some((suggest::starts(setup, &search)?, "runs")));
    let suggest = assess::suggest(setup, &search, &|count| bar.inc(count as u64));
    let bar = steps.next("improving error bounds", Some((assess::sensitivity_runs(dive), "lines")));
    let sensitivity = assess::sensitivity(setup, dive.improvement_factor, &|| bar.inc(1));
    let bar = steps.next("following one dive of each line", Some((dive.lines.len(), "lines")));
    let mut traces = Vec::new();
    for line in &dive.lines {
        let request = TraceRequest {
            line: Some(line.name.clone()),
            from_m: 0.0,
            draw: 0,
            corridor_spacing_m: CORRIDOR_M,
        };
        traces.push(assess::trace(setup, &request)?);
        bar.inc(1);
    }
    Ok(Findings {
        verdict: assess::verdict(&lines),
        lines,
        area,
        look_alikes,
        remap,
        suggest,
        sensitivity,
        traces,
    })
}

/// The files of the pack but `pack.json`, the page first.
fn files(setup: &Setup<'_>, found: &Findings, size: &ChartSize) -> Result<Vec<(String, Vec<u8>)>> {
    let of_commands = |size: &ChartSize| -> Result<Vec<OutputFile>> {
        let mut files = lines_files(&found.lines, size)?;
        files.extend(area::files(&found.area, size)?);
        files.extend(lookalikes::files(&found.look_alikes, size)?);
        files.extend(remap::files(&found.remap, size)?);
        files.extend(suggest::files(&found.suggest, size)?);
        files.extend(sensitivity::files(&found.sensitivity, size)?);
        Ok(files)
    };
    let landmarks = setup.landmarks_report();
    let mut files: Vec<(String, Vec<u8>)> =
        of_commands(size)?.into_iter().map(|(name, bytes)| (name.to_owned(), bytes)).collect();
    if !landmarks.provenance.frame.is_local() {
        files.push((LandmarksGeoJson.file_name().to_owned(), LandmarksGeoJson.bytes(&landmarks)?));
    }
    for (number, trace) in found.traces.iter().enumerate() {
        // Lines are told apart by number: a name may hold anything.
        files.push((format!("trace-{}.png", number + 1), render::trace_png(trace, size)?));
    }
    let names: Vec<String> =
        files.iter().map(|(name, _)| name.clone()).chain(["pack.json".to_owned()]).collect();
    // The page has its charts at one size, whatever that of the files: it is to be sent, and is read on a screen.
    let of_page: Vec<(String, Vec<u8>)>;
    let charts = if *size == ChartSize::default() {
        &files
    } else {
        let all = of_commands(&ChartSize::default())?.into_iter();
        of_page = all.map(|(name, bytes)| (name.to_owned(), bytes)).collect();
        &of_page
    };
    let page = Page {
        verdict: &found.verdict,
        lines: &found.lines,
        area: &found.area,
        look_alikes: &found.look_alikes,
        remap: &found.remap,
        suggest: &found.suggest,
        sensitivity: &found.sensitivity,
        traces: &found.traces,
        charts,
        files: &names,
    };
    let page = export::page_html(&page);
    files.insert(0, ("index.html".to_owned(), page));
    Ok(files)
}

/// The most telling code of all parts, each with its reason on standard error.
fn exit(found: &Findings, require: Option<f64>, common: &Common) -> Exit {
    let mut exits = vec![lines_exit(&found.lines, require, common)];
    if found.area.is_undecided()
        || found.remap.undecided
        || found.suggest.undecided
        || found.sensitivity.undecided
    {
        exits.push(undecided_runs(common));
    }
    exits.push(lookalikes::exit(&found.look_alikes, common));
    for trace in found.traces.iter().filter(|trace| trace.contradiction.is_some()) {
        let text = format!(
            "no position explains the detections of the traced dive of line \"{}\": more strays were drawn than the stray \
             budget covers",
            trace.line
        );
        print_notices([&warning(text)], common.quiet);
    }
    if found.traces.iter().any(|trace| trace.undecided) {
        exits.push(Exit::Undecided);
    }
    let is = |exit| exits.contains(&exit);
    if is(Exit::RequirementNotMet) {
        Exit::RequirementNotMet
    } else if is(Exit::Undecided) {
        Exit::Undecided
    } else {
        Exit::Done
    }
}

/// From now on an interrupt (130) or a polite request to end (143) removes the temporary folder of the pack before the
/// program ends. Every other file is in place whole, or not begun.
#[cfg(unix)]
fn tidy_when_interrupted() {
    use signal_hook::consts::{SIGHUP, SIGINT, SIGTERM};
    use signal_hook::iterator::Signals;
    /// What a shell reports for a program that a signal ended, less the signal's number.
    const ENDED_BY_SIGNAL: i32 = 128;
    // Without a handler the signal ends the program all the same, and the next run tidies up.
    let Ok(mut signals) = Signals::new([SIGINT, SIGTERM, SIGHUP]) else { return };
    std::thread::spawn(move || {
        if let Some(signal) = signals.forever().next() {
            let _nothing_more_is_written = IN_PROGRESS.abandon();
            std::process::exit(ENDED_BY_SIGNAL + signal);
        }
    });
}

/// The system ends the program; the next run tidies up.
#[cfg(not(unix))]
fn tidy_when_interrupted() {}
