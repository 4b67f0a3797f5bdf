//! Runs a command.

use std::path::{Path, PathBuf};

use anyhow::{Context, Result};
use clap::{CommandFactory, Parser};

use super::area::{AreaRequest, area};
use super::args::{Arguments, Command, Common};
use super::lookalikes::{lookalikes, mark_look_alikes};
use super::remap::{mark_remap_regions, refuse_huge, remap};
use super::sensitivity::sensitivity;
use super::suggest::suggest;
use super::terminal::{print_notices, print_result, progress_bar};
use crate::alias::LookAlikeRequest;
use crate::assess::{self, Setup, TraceRequest};
use crate::dive::{Dive, RankBy};
use crate::export::{self, Exporter, LinesCsv, LinesGeoJson, LinesJson, RecommendedGpx, TraceJson};
use crate::problem::Notice;
use crate::render;
use crate::report::LinesReport;

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
    let mut names = vec!["lines.json", "lines.csv", "lines.png", "profiles.png"];
    if !dive.frame.is_local() {
        names.extend(["lines.geojson", "recommended.gpx"]);
    }
    if let Some(out) = asked.out {
        export::prepare(out, &names, common.force)?;
    }
    let bar = progress_bar(dive.lines.len() * dive.scoring.draws, common.quiet);
    let mut report = assess::score_lines(&setup, &|| bar.inc(1));
    bar.finish_and_clear();
    mark_look_alikes(&setup, &mut report, common);
    if asked.mark_remap {
        mark_remap_regions(&setup, &mut report, common);
    }
    let json = LinesJson.bytes(&report)?;
    if let Some(out) = asked.out {
        let size = common.chart_size();
        let mut files = vec![
            (names[0], json.clone()),
            (names[1], LinesCsv.bytes(&report)?),
            (names[2], render::lines_png(&report, &size)?),
            (names[3], render::profiles_png(&report, &size)?),
        ];
        if dive.frame.is_local() {
            say_local_metres(&["lines.geojson", "recommended.gpx"], common);
        } else {
            files.push((names[4], LinesGeoJson.bytes(&report)?));
            files.push((names[5], RecommendedGpx.bytes(&report)?));
        }
        export::write_all(out, &files, common.force)?;
        say_written(out, &names, common);
    }
    let text = if common.json { json } else { export::lines_table(&report).into_bytes() };
    print_result(&text).context("standard output")?;
    Ok(lines_exit(&report, asked.require, common))
}

/// The exit code of `lines`, with the reason on standard error.
fn lines_exit(report: &LinesReport, require: Option<f64>, common: &Common) -> Exit {
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
    if report.lines.iter().any(|line| line.estimated.undecided_share > 0.0) {
        print_notices([&warning(
            "some dives are undecided: the solver ran out of its cell budget; they count as dives without a fix; \
             raise scoring.cell_budget to decide them"
                .to_owned(),
        )], common.quiet);
        return Exit::Undecided;
    }
    Exit::Done
}

fn trace(path: &Path, request: &TraceRequest, out: Option<&Path>, common: &Common) -> Result<Exit> {
    let dive = read(path, common)?;
    print_notices(dive.notices.iter().filter(|notice| notice.is_warning), common.quiet);
    if let Some(out) = out {
        export::prepare(out, &["trace.json", "trace.png"], common.force)?;
    }
    let report = assess::trace(&Setup::new(&dive), request)?;
    let json = TraceJson.bytes(&report)?;
    if let Some(out) = out {
        let files =
            [("trace.json", json.clone()), ("trace.png", render::trace_png(&report, &common.chart_size())?)];
        export::write_all(out, &files, common.force)?;
        say_written(out, &files.map(|(name, _)| name), common);
    }
    let text = if common.json { json } else { export::trace_table(&report).into_bytes() };
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

/// Says which files are not written because the map is in local metres.
pub(super) fn say_local_metres(names: &[&str], common: &Common) {
    let verb = if names.len() == 1 { "is" } else { "are" };
    let text = format!(
        "{} {verb} not written: such files hold latitude and longitude, and this map is in local metres",
        names.join(", ")
    );
    print_notices([&Notice { file: None, text, is_warning: false }], common.quiet);
}

/// Names the files written.
pub(super) fn say_written(out: &Path, names: &[&str], common: &Common) {
    let paths: Vec<PathBuf> = names.iter().map(|name| out.join(name)).collect();
    let text = paths.iter().map(|path| path.display().to_string()).collect::<Vec<_>>().join(", ");
    print_notices([&Notice { file: None, text: format!("wrote {text}"), is_warning: false }], common.quiet);
}
