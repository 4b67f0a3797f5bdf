//! From the dive file to a [`Dive`]: every file read once, every problem collected before anything is refused.

use std::path::{Component, Path, PathBuf};

use super::improve::Stated;
use super::section::Document;
use super::settings::Settings;
use super::site::{Site, Sources};
use super::{Dive, InputFile, Scoring, Start, area, checks, swath, widen};
use crate::bounds::DIVE_SIZE_MAX;
use crate::frame::Crs;
use crate::input::{self, Format, InputText, Source};
use crate::map::Landmark;
use crate::problem::{Findings, Problem, Problems};
use crate::{map, track};

impl Dive {
    /// Reads a dive file and everything it names.
    ///
    /// # Errors
    /// All problems found in all files, in the order the files were read. Nothing is written.
    pub fn read(path: &Path) -> Result<Self, Problems> {
        Self::read_from(path, &input::disk)
    }

    /// Reads a dive file and everything it names through `source`.
    ///
    /// # Errors
    /// As [`Dive::read`].
    pub fn read_from(path: &Path, source: Source<'_>) -> Result<Self, Problems> {
        let mut findings = Findings::default();
        match read(path, source, &mut findings) {
            Some(dive) if findings.problems.is_empty() => Ok(dive),
            _ => {
                if findings.problems.is_empty() {
                    // Every way to no dive has stated its problem; say so rather than fail in silence.
                    findings.problem(Problem::new(path, "could not be understood"));
                }
                Err(findings.problems.into())
            }
        }
    }
}

/// All inputs as text, with the settings that came from the dive file.
struct Read {
    settings: Settings,
    inputs: Vec<InputFile>,
    sources: Sources,
    area: Option<(PathBuf, InputText)>,
    complete: Option<InputText>,
}

fn read(path: &Path, source: Source<'_>, findings: &mut Findings) -> Option<Dive> {
    let read = read_files(path, source, findings)?;
    if !findings.problems.is_empty() {
        return None;
    }
    let Read { settings, inputs, sources, area, complete } = read;
    let (vehicle, sonar) = (settings.vehicle?, settings.sonar?);
    let scatter_m = settings.scatter_m?;
    let site = Site::place(&sources, settings.working.clone(), sonar.reach_m(), findings)?;
    let lines = checks::lines(&site, findings);
    if !findings.problems.is_empty() {
        return None;
    }
    checks::meet(&site, &lines, &sonar, findings);
    let start = Start { search_area: Vec::new(), scatter_m, common_shift_m: settings.common_shift_m };
    let margin_m = sonar.reach_m() + start.scatter_on_map_m() + 2.0 * vehicle.turn_radius_m;
    let search_area = match &area {
        Some((_, input)) => {
            let stated =
                area::read(input, settings.area_crs.as_ref(), &site.frame, &lines, scatter_m, findings)?;
            area::grown(stated, settings.common_shift_m)
        }
        None => area::around(&site, &lines, margin_m, findings)?,
    };
    if !findings.problems.is_empty() {
        return None;
    }

    checks::common_shift(settings.common_shift_m, findings);
    let local = Crs::Local;
    let declared = (settings.map_crs == Some(Crs::Local)).then_some(&local);
    let nothing_seen_inside = match &complete {
        Some(input) if settings.nothing_seen => {
            Some(area::polygon(input, "completely mapped area", declared, &site.frame, findings)?)
        }
        _ => None,
    };
    let grid = widen::Grid::over(&site, &search_area, settings.seabed_depth_m, findings)?;
    let half_widths = checks::half_widths(&sources, &settings, findings)?;
    let landmarks: Vec<Landmark> = sources
        .landmarks
        .rows
        .iter()
        .zip(&site.landmarks)
        .zip(half_widths)
        .map(|((row, position), (east, north))| Landmark {
            id: row.label(),
            position: *position,
            half_width_east_m: grid.half_width_m(east),
            half_width_north_m: grid.half_width_m(north),
        })
        .collect();
    let stated = Stated { grid, dead_reckoning: settings.dead_reckoning?, sonar };
    let dead_reckoning = grid.dead_reckoning(stated.dead_reckoning);
    let widened_sonar = grid.sonar(sonar);

    let uncertainty_statement = match settings.declared {
        Some(declared) => declared.statement(landmarks.len()),
        None => "no uncertainty is given, because there are no landmarks".into(),
    };
    findings.inform(Some(&sources.landmark_file), uncertainty_statement.clone());
    grid.report(findings);
    site.report(&sources, &lines, findings);
    checks::landmarks(&sources, &landmarks, findings);
    swath::check(&landmarks, &lines, &widened_sonar, findings);
    if !settings.turn_radius_given && lines.iter().any(|l| l.waypoints.len() > 2) {
        findings.warn(
            None,
            "vehicle.turn_radius_m is not given: the vehicle is taken to turn on the spot, so no landmark is lost in a turn",
        );
    }
    let heading_slices = settings.heading_slices?;
    let cell_budget =
        settings.cell_budget.unwrap_or_else(|| cell_budget_default(landmarks.len(), heading_slices));
    Some(Dive {
        name: settings.name?,
        issued: settings.issued,
        surveyed: settings.surveyed,
        path: path.to_path_buf(),
        frame: site.frame,
        landmarks,
        uncertainty_statement,
        gone_chance: settings.gone_chance,
        lines,
        vehicle,
        dead_reckoning,
        sonar: widened_sonar,
        start: Start { search_area, ..start },
        scoring: Scoring { cell_budget, ..settings.scoring? },
        area: settings.area?,
        remap: settings.remap?,
        suggest: settings.suggest?,
        improvement_factor: settings.improvement_factor?,
        heading_slices,
        budget: settings.budget?,
        nothing_seen_inside,
        inputs,
        notices: std::mem::take(&mut findings.notices),
        stated,
    })
}

/// Most cells unless told otherwise. The first detection leaves one cell for each landmark and slice, so a budget below that
/// would leave every run on a large map undecided.
fn cell_budget_default(landmarks: usize, heading_slices: usize) -> usize {
    const LEAST: usize = 50_000;
    (2 * landmarks * heading_slices).max(LEAST)
}

/// Reads the dive file and all files it names, as far as they can be read.
fn read_files(path: &Path, source: Source<'_>, findings: &mut Findings) -> Option<Read> {
    let input = InputText::read(path, path, source, findings)?;
    if input.text.len() > DIVE_SIZE_MAX {
        findings.problem(
            Problem::new(path, "is too large for a dive file")
                .accepted(format!("at most {} KiB of TOML", DIVE_SIZE_MAX >> 10))
                .advice("landmarks and lines go into files of their own, which the dive file names"),
        );
        return None;
    }
    let document = Document::parse(path, &input.text, findings)?;
    let settings = Settings::read(&document, findings);
    let folder = path.parent().unwrap_or_else(|| Path::new(""));
    let name = path.file_name().map_or_else(String::new, |n| n.to_string_lossy().into_owned());
    let mut inputs = vec![InputFile { name, sha256: input.sha256.clone() }];
    let mut open = |name: &Path, findings: &mut Findings| {
        let path = folder.join(name);
        let input = InputText::read(&path, name, source, findings)?;
        if leaves(folder, name, &path) {
            findings.inform(
                Some(name),
                "lies outside the folder of the dive file: a copy of that folder alone does not hold every input",
            );
        }
        inputs.push(InputFile { name: name.display().to_string(), sha256: input.sha256.clone() });
        Some(input)
    };
    let landmark_input = settings.landmarks.as_deref().and_then(|n| open(n, findings));
    let mut line_inputs = Vec::new();
    for file in &settings.line_files {
        line_inputs.extend(open(file, findings));
    }
    let area = settings.search_area.as_ref().and_then(|n| open(n, findings).map(|input| (n.clone(), input)));
    let complete = settings.complete_inside.as_ref().and_then(|n| open(n, findings));

    let map_options = map::read::ReadOptions {
        decimal_comma: settings.map_decimal_comma,
        skip_bad_rows: settings.skip_bad_rows,
    };
    let mut landmarks = match (&landmark_input, &settings.map_crs) {
        (Some(input), Some(crs)) => map::read::read(input, crs, map_options, findings),
        _ => None,
    };
    if let (Some(file), Some(oldest)) = (&mut landmarks, settings.oldest_survey) {
        checks::leave_out_old(&document, file, oldest, landmark_input.as_ref(), findings);
    }
    let line_options = track::read::ReadOptions {
        declared: settings.lines_crs.as_ref(),
        of_map: settings.map_crs.as_ref(),
        decimal_comma: settings.lines_decimal_comma,
    };
    let mut lines = Vec::new();
    for input in &line_inputs {
        if let Some(file) = track::read::read(input, line_options, findings) {
            lines.push((input.name.clone(), file));
        }
    }
    refuse_without_effect(&document, landmark_input.as_ref(), &line_inputs, findings);
    let mut sources = Sources {
        dive_file: path.to_path_buf(),
        landmark_file: settings.landmarks.clone()?,
        landmarks: landmarks?,
        lines,
    };
    checks::plain_names(&mut sources, findings);
    checks::identifiers(&sources, findings);
    if let Some(rows) = checks::missing_uncertainty(&sources, &settings) {
        for problem in rows {
            findings.problem(problem);
        }
    }
    Some(Read { settings, inputs, sources, area, complete })
}

/// Whether a file lies outside the folder of the dive file: by its name, or because a symbolic link leads out.
fn leaves(folder: &Path, name: &Path, path: &Path) -> bool {
    let mut depth = 0_i64;
    let by_name = name.components().any(|part| {
        match part {
            Component::ParentDir => depth -= 1,
            Component::Normal(_) => depth += 1,
            Component::CurDir => {}
            Component::RootDir | Component::Prefix(_) => return true,
        }
        depth < 0
    });
    let folder = if folder.as_os_str().is_empty() { Path::new(".") } else { folder };
    match (folder.canonicalize(), path.canonicalize()) {
        (Ok(folder), Ok(path)) => !path.starts_with(folder),
        // Not on the disk, so the name is all there is.
        _ => by_name,
    }
}

/// Refuses keys that say something about a format that none of the files has.
fn refuse_without_effect(
    document: &Document<'_>,
    landmarks: Option<&InputText>,
    lines: &[InputText],
    findings: &mut Findings,
) {
    let mut refuse = |section: &str, name: &str, what: &str| {
        if document.has(section, name) {
            findings.problem(
                document.problem(section, name, format!("has no effect: {what}")).advice("remove it"),
            );
        }
    };
    if landmarks.is_some_and(|i| i.format() != Some(Format::Csv)) {
        refuse("map", "decimal_comma", "the landmark file is not CSV");
    }
    if !lines.is_empty() && lines.iter().all(|i| i.format() != Some(Format::Csv)) {
        refuse("lines", "decimal_comma", "no line file is CSV");
    }
    let is_fixed = |i: &InputText| matches!(i.format(), Some(Format::Gpx | Format::Kml));
    if !lines.is_empty() && lines.iter().all(is_fixed) {
        refuse("lines", "crs", "GPX and KML are always WGS 84 latitude and longitude");
    }
}

/// The coordinate system every file was read in, for the statements about datums.
pub(super) fn systems(sources: &Sources) -> Vec<(&Path, &Crs)> {
    let mut all = vec![(sources.landmark_file.as_path(), &sources.landmarks.crs)];
    all.extend(sources.lines.iter().map(|(name, file)| (name.as_path(), &file.crs)));
    all
}
