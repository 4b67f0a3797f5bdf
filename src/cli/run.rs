//! Runs a command.

use std::path::Path;

use anyhow::{Context, Result};
use clap::{CommandFactory, Parser};

use super::area::{AreaRequest, area};
use super::args::{Arguments, Command, Common};
use super::brief::{BriefRequest, brief};
use super::lookalikes::{lookalikes, mark_look_alikes};
use super::output::{FileNames, OutputFile};
use super::remap::{mark_remap_regions, refuse_huge, remap};
use super::sensitivity::sensitivity;
use super::suggest::suggest;
use super::terminal::{print_notices, print_result, progress_bar};
use crate::alias::LookAlikeRequest;
use crate::assess::{self, Setup, TraceRequest};
use crate::dive::{Dive, RankBy};
use crate::export::{self, Exporter, LinesCsv, LinesGeoJson, LinesJson, RecommendedGpx, TraceJson};
use crate::problem::Notice;
use crate::render::{self, ChartSize};
use crate::report::{Cause, LinesReport, SegmentReport};

/// How the program ends.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Exit {
    /// Done.
    Done = 0,
    /// The stated requirement is not met.
    RequirementNotMet = 1,
    /// Bad input or file trouble.
    BadInput = 3,
    /// The bounds contradict the data.
    Contradiction = 4,
    /// Incomplete or undecided.
    Undecided = 5,
}

/// Parses `arguments` (the first is the program's name), runs the command, prints, and says how to exit. A wrong
/// command line ends the process with code 2, as does `--help` with code 0.
pub fn main_with(arguments: impl IntoIterator<Item = std::ffi::OsString>) -> Exit {
    let arguments = Arguments::parse_from(arguments);
    match run(&arguments) {
        Ok(exit) => exit,
        Err(error) => {
            // One chain, cause after cause; standard error that cannot be written leaves nobody to tell.
            use std::io::Write as _;
            let _ = writeln!(std::io::stderr(), "error: {error:#}");
            Exit::BadInput
        }
    }
}

fn run(arguments: &Arguments) -> Result<Exit> {
    let common = &arguments.common;
    if let Some(threads) = common.threads {
        // A second call in one process (as in tests) keeps the first pool; results do not depend on it.
        let _ = rayon::ThreadPoolBuilder::new().num_threads(usize::from(threads)).build_global();
    }
    match &arguments.command {
        Command::Check { dive } => check(dive, common),
        Command::Brief { dive, out, require } => {
            brief(dive, &BriefRequest { out, require: *require }, common)
        }
        Command::Lines { dive, out, mark_remap, rank_by, draws, require } => {
            let asked = LinesOptions {
                out: out.as_deref(),
                mark_remap: *mark_remap,
                rank_by: *rank_by,
                draws: *draws,
                require: *require,
            };
            lines(dive, &asked, common)
        }
        Command::Trace { dive, line, from_m, draw, corridor_m, out } => {
            let request = TraceRequest {
                line: line.clone(),
                from_m: *from_m,
                draw: *draw,
                corridor_spacing_m: *corridor_m,
            };
            trace(dive, &request, out.as_deref(), common)
        }
        Command::Lookalikes { dive, out, separation_m, listed } => {
            let request = LookAlikeRequest {
                separation_max_m: *separation_m,
                listed: *listed as usize,
                only_whole: false,
            };
            lookalikes(dive, &request, out.as_deref(), common)
        }
        Command::Area { dive, out, cell_m, headings, longest_run_m } => {
            let asked = AreaRequest {
                out: out.as_deref(),
                cell_m: *cell_m,
                headings: *headings,
                longest_run_m: *longest_run_m,
            };
            area(dive, &asked, common)
        }
        Command::Remap { dive, out } => remap(dive, out.as_deref(), common),
        Command::Suggest { dive, out, listed } => suggest(dive, out.as_deref(), *listed, common),
        Command::Sensitivity { dive, out, factor } => sensitivity(dive, out.as_deref(), *factor, common),
        Command::Completions { shell } => {
            let mut script = Vec::new();
            clap_complete::generate(*shell, &mut Arguments::command(), "fixability", &mut script);
            print_result(&script).context("standard output")?;
            Ok(Exit::Done)
        }
    }
}

/// Reads a dive and applies the options that replace its settings.
pub(super) fn read(path: &Path, common: &Common) -> Result<Dive> {
    let mut dive = Dive::read(path)?;
    if let Some(seed) = common.seed {
        dive.scoring.seed = seed;
    }
    Ok(dive)
}

fn check(path: &Path, common: &Common) -> Result<Exit> {
    let dive = read(path, common)?;
    let report = assess::check(&Setup::new(&dive));
    if common.json {
        print_result(&export::check_json(&report)?).context("standard output")?;
    } else {
        print_result(export::check_text(&report).as_bytes()).context("standard output")?;
    }
    Ok(Exit::Done)
}

/// Files that `lines` writes.
pub(super) const LINES_FILES: FileNames = FileNames {
    always: &["lines.json", "lines.csv", "lines.png", "profiles.png"],
    on_earth: &["lines.geojson", "recommended.gpx"],
};

/// What `lines` was asked beyond the dive file.
struct LinesOptions<'a> {
    out: Option<&'a Path>,
    mark_remap: bool,
    rank_by: Option<RankBy>,
    draws: Option<u32>,
    require: Option<f64>,
}

fn lines(path: &Path, asked: &LinesOptions<'_>, common: &Common) -> Result<Exit> {
    let mut dive = read(path, common)?;
    if let Some(rank_by) = asked.rank_by {
        dive.scoring.rank_by = rank_by;
    }
    if let Some(draws) = asked.draws {
        dive.scoring.draws = draws as usize;
    }
    let setup = Setup::new(&dive);
    print_notices(dive.notices.iter().filter(|notice| notice.is_warning), common.quiet);
    print_notices(&assess::line_notices(&setup), common.quiet);
    if asked.mark_remap {
        refuse_huge(&setup)?;
    }
    LINES_FILES.prepare(asked.out, &dive.frame, common)?;
    let bar = progress_bar(dive.lines.len() * dive.scoring.draws, common.quiet);
    let mut report = assess::score_lines(&setup, &|| bar.inc(1));
    bar.finish_and_clear();
    mark_look_alikes(&setup, &mut report, common);
    if asked.mark_remap {
        mark_remap_regions(&setup, &mut report, common);
    }
    if let Some(out) = asked.out {
        LINES_FILES.write(out, &lines_files(&report, &common.chart_size())?, common)?;
    }
    let text =
        if common.json { LinesJson.bytes(&report)? } else { export::lines_table(&report).into_bytes() };
    print_result(&text).context("standard output")?;
    Ok(lines_exit(&report, asked.require, common))
}

/// The files of scored lines.
pub(super) fn lines_files(report: &LinesReport, size: &ChartSize) -> Result<Vec<OutputFile>> {
    let mut bytes = vec![
        LinesJson.bytes(report)?,
        LinesCsv.bytes(report)?,
        render::lines_png(report, size)?,
        render::profiles_png(report, size)?,
    ];
    if !report.provenance.frame.is_local() {
        bytes.push(LinesGeoJson.bytes(report)?);
        bytes.push(RecommendedGpx.bytes(report)?);
    }
    Ok(LINES_FILES.with(bytes))
}

/// The exit code of `lines`, with the reason on standard error.
pub(super) fn lines_exit(report: &LinesReport, require: Option<f64>, common: &Common) -> Exit {
    if let Some(required) = require {
        let best = report.lines.iter().find(|line| line.rank == 1);
        let reached = best.and_then(|line| line.guaranteed).map_or(0.0, |sum| sum.within_required_share);
        if reached < required {
            let text = format!(
                "{:.1} % of the first-ranked line has a guaranteed fix within the required distance, below the {:.1} % asked for",
                100.0 * reached,
                100.0 * required
            );
            print_notices([&warning(text)], common.quiet);
            return Exit::RequirementNotMet;
        }
    }
    if report.lines.iter().any(|line| line.estimated.contradiction_share > 0.0) {
        let text = "in some runs no position explained the detections: more strays were drawn than the stray budget \
                    covers; they count as runs without a fix"
            .to_owned();
        print_notices([&warning(text)], common.quiet);
    }
    if report.lines.iter().any(|line| line.estimated.wrong_fix_share > 0.0) {
        let text = "in some runs the fix did not hold the true position: more strays were drawn than the stray budget \
                    covers, and they spoke for a wrong place (estimated_wrong_fix_share)"
            .to_owned();
        print_notices([&warning(text)], common.quiet);
    }
    let mut exit = Exit::Done;
    let mut undecided = |what: &str, count_as: &str| {
        let text = format!(
            "{what} undecided: the solver ran out of its cell budget; they count as {count_as}; raise \
             scoring.cell_budget to decide them"
        );
        print_notices([&warning(text)], common.quiet);
        exit = Exit::Undecided;
    };
    if report.lines.iter().any(|line| line.estimated.undecided_share > 0.0) {
        undecided("some dives are", "dives without a fix");
    }
    let cause = |segment: &SegmentReport| segment.guaranteed.as_ref().and_then(|fix| fix.cause);
    if report
        .lines
        .iter()
        .flat_map(|line| &line.segments)
        .any(|segment| cause(segment) == Some(Cause::Undecided))
    {
        undecided("the guarantees of some segments are", "segments without a guaranteed fix");
    }
    exit
}

/// Files that `trace` writes.
const TRACE_FILES: FileNames = FileNames { always: &["trace.json", "trace.png"], on_earth: &[] };

fn trace(path: &Path, request: &TraceRequest, out: Option<&Path>, common: &Common) -> Result<Exit> {
    let dive = read(path, common)?;
    print_notices(dive.notices.iter().filter(|notice| notice.is_warning), common.quiet);
    TRACE_FILES.prepare(out, &dive.frame, common)?;
    let report = assess::trace(&Setup::new(&dive), request)?;
    if let Some(out) = out {
        let bytes = vec![TraceJson.bytes(&report)?, render::trace_png(&report, &common.chart_size())?];
        TRACE_FILES.write(out, &TRACE_FILES.with(bytes), common)?;
    }
    let text =
        if common.json { TraceJson.bytes(&report)? } else { export::trace_table(&report).into_bytes() };
    print_result(&text).context("standard output")?;
    if report.contradiction.is_some() {
        let text = "no position explains the detections: an error bound, the map or the stray budget does not hold. With \
                    more strays than the budget a set that is wrong but not empty is possible too"
            .to_owned();
        print_notices([&warning(text)], common.quiet);
        return Ok(Exit::Contradiction);
    }
    Ok(if report.undecided { Exit::Undecided } else { Exit::Done })
}

/// Says that some runs of a map are undecided, and how to exit.
pub(super) fn undecided_runs(common: &Common) -> Exit {
    let text = "some runs are undecided: the solver ran out of its cell budget; they count as runs without a fix; raise \
                scoring.cell_budget to decide them"
        .to_owned();
    print_notices([&warning(text)], common.quiet);
    Exit::Undecided
}

pub(super) fn warning(text: String) -> Notice {
    Notice { file: None, text, is_warning: true }
}
