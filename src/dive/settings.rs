//! The dive file as settings in SI units: each value in range, and the values consistent with each other.

use std::path::PathBuf;

use time::Date;

use super::section::Document;
use super::{AreaOptions, Budget, ErrorShape, RankBy, RemapOptions, Scoring, SuggestOptions};
use crate::frame::{Crs, Frame};
use crate::map::uncertainty::Declared;
use crate::problem::Findings;
use crate::vehicle::{DeadReckoning, Sonar, SonarKind, Vehicle};

/// What the dive file says; none where it says nothing or nothing usable (then a finding says why).
#[derive(Debug)]
pub(super) struct Settings {
    pub name: Option<String>,
    pub issued: Option<Date>,
    pub surveyed: Option<Date>,
    pub landmarks: Option<PathBuf>,
    pub map_crs: Option<Crs>,
    pub working: Option<Frame>,
    pub declared: Option<Declared>,
    pub uncertainty_m: Option<f64>,
    pub seabed_depth_m: f64,
    pub oldest_survey: Option<Date>,
    pub gone_chance: f64,
    pub common_shift_m: f64,
    pub map_decimal_comma: bool,
    pub skip_bad_rows: bool,
    pub line_files: Vec<PathBuf>,
    pub lines_crs: Option<Crs>,
    pub lines_decimal_comma: bool,
    pub vehicle: Option<Vehicle>,
    pub turn_radius_given: bool,
    pub dead_reckoning: Option<DeadReckoning>,
    pub sonar: Option<Sonar>,
    pub search_area: Option<PathBuf>,
    pub area_crs: Option<Crs>,
    pub complete_inside: Option<PathBuf>,
    pub nothing_seen: bool,
    pub scatter_m: Option<f64>,
    pub scoring: Option<Scoring>,
    pub cell_budget: Option<usize>,
    pub area: Option<AreaOptions>,
    pub remap: Option<RemapOptions>,
    pub suggest: Option<SuggestOptions>,
    pub improvement_factor: Option<f64>,
    pub heading_slices: Option<usize>,
    pub budget: Option<Budget>,
}

impl Settings {
    pub(super) fn read(doc: &Document<'_>, f: &mut Findings) -> Self {
        let name = doc.text("", "name", f);
        let (issued, surveyed) = dates(doc, f);
        let landmarks = doc.file("map", "landmarks", f);
        let map_crs = doc.crs("map", "crs", f);
        let working = working(doc, map_crs.as_ref(), f);
        let declared = declared(doc, f);
        let uncertainty_m = doc.number("map", "uncertainty_m", f);
        let seabed_depth_m = doc.number("map", "seabed_depth_m", f).unwrap_or(0.0);
        if doc.has("map", "seabed_depth_m") && map_crs == Some(Crs::Local) {
            f.problem(
                doc.problem("map", "seabed_depth_m", "has no effect with local metres").advice("remove it"),
            );
        }
        let oldest_survey = doc.date("map", "oldest_survey", f);
        let gone_chance = doc.number("map", "gone_chance", f).unwrap_or(0.0);
        let common_shift_m = doc.number("map", "common_shift_m", f).unwrap_or(0.0);
        let map_decimal_comma = doc.flag("map", "decimal_comma", f);
        let skip_bad_rows = doc.flag("map", "skip_bad_rows", f);
        let line_files =
            doc.list("lines", "files", f).unwrap_or_default().into_iter().map(PathBuf::from).collect();
        let lines_crs = doc.crs("lines", "crs", f);
        let lines_decimal_comma = doc.flag("lines", "decimal_comma", f);
        let vehicle = vehicle(doc, f);
        let dead_reckoning = dead_reckoning(doc, f);
        let sonar = sonar(doc, f);
        let search_area = doc.file("start", "search_area", f);
        let area_crs = doc.crs("start", "crs", f);
        if doc.has("start", "crs") && !doc.has("start", "search_area") {
            f.problem(
                doc.problem("start", "crs", "has no effect without start.search_area").advice("remove it"),
            );
        }
        let scatter_m = doc.number("start", "scatter_m", f);
        let complete_inside = doc.file("map", "complete_inside", f);
        let nothing_seen = nothing_seen(doc, sonar.as_ref(), gone_chance, f);
        let scoring = scoring(doc, f);
        let cell_budget = doc.number("scoring", "cell_budget", f).map(|cells| cells as usize);
        let area = area(doc, f);
        let remap = remap(doc, f);
        let suggest = suggest(doc, f);
        let improvement_factor = doc.number("sensitivity", "factor", f);
        let heading_slices = match doc.number("dead_reckoning", "heading_slices", f) {
            Some(given) => Some(given as usize),
            None => dead_reckoning.map(default_slices),
        };
        let budget = budget(doc, f);
        Self {
            name,
            issued,
            surveyed,
            landmarks,
            map_crs,
            working,
            declared,
            uncertainty_m,
            seabed_depth_m,
            oldest_survey,
            gone_chance,
            common_shift_m,
            map_decimal_comma,
            skip_bad_rows,
            line_files,
            lines_crs,
            lines_decimal_comma,
            vehicle,
            turn_radius_given: doc.has("vehicle", "turn_radius_m"),
            dead_reckoning,
            sonar,
            search_area,
            area_crs,
            complete_inside,
            nothing_seen,
            scatter_m,
            scoring,
            cell_budget,
            area,
            remap,
            suggest,
            improvement_factor,
            heading_slices,
            budget,
        }
    }
}

/// Dates of issue and of the survey.
fn dates(doc: &Document<'_>, f: &mut Findings) -> (Option<Date>, Option<Date>) {
    let issued = doc.date("", "issued", f);
    let surveyed = doc.date("map", "surveyed", f);
    if let (Some(issued), Some(surveyed)) = (issued, surveyed)
        && surveyed > issued
    {
        f.problem(
            doc.problem("map", "surveyed", format!("{surveyed} is after the date of issue, {issued}"))
                .accepted("a date not after `issued`"),
        );
    }
    (issued, surveyed)
}

fn working(doc: &Document<'_>, map_crs: Option<&Crs>, f: &mut Findings) -> Option<Frame> {
    let crs = doc.crs("map", "working_crs", f)?;
    let (what, advice) = match (&crs, map_crs) {
        (Crs::Grid(frame), Some(Crs::Geographic { .. } | Crs::Grid(_)) | None) => return Some(frame.clone()),
        (Crs::Local, Some(Crs::Local)) => return Some(Frame::local()),
        (Crs::Geographic { .. }, _) => ("is latitude and longitude, not a grid in metres", ""),
        (Crs::Local, _) => (
            "is local metres, but the landmarks have a place on the Earth",
            "remove it, or name a projected grid",
        ),
        (Crs::Grid(_), _) => ("is a grid, but the landmarks are in local metres", "remove it"),
    };
    f.problem(
        doc.problem("map", "working_crs", format!("{} {what}", crs.name()))
            .accepted("the \"EPSG:…\" code of a projected grid in metres")
            .advice(advice),
    );
    None
}

fn declared(doc: &Document<'_>, f: &mut Findings) -> Option<Declared> {
    let word = doc.text("map", "uncertainty", f);
    let sigma = doc.number("map", "sigma_factor", f);
    let p95 = doc.number("map", "p95_factor", f);
    for (key, for_word) in [("sigma_factor", "sigma"), ("p95_factor", "p95")] {
        if doc.has("map", key) && word.as_deref() != Some(for_word) {
            f.problem(
                doc.problem("map", key, format!("has no effect without uncertainty = \"{for_word}\""))
                    .advice("remove it, or declare the uncertainty so"),
            );
        }
    }
    match word?.as_str() {
        "sigma" => Some(Declared::Sigma { factor: sigma? }),
        "p95" => Some(Declared::P95 { factor: p95? }),
        _ => Some(Declared::Bound),
    }
}

fn vehicle(doc: &Document<'_>, f: &mut Findings) -> Option<Vehicle> {
    let speed_mps = doc.number("vehicle", "speed_mps", f);
    let turn_radius_m = doc.number("vehicle", "turn_radius_m", f);
    Some(Vehicle { speed_mps: speed_mps?, turn_radius_m: turn_radius_m? })
}

fn dead_reckoning(doc: &Document<'_>, f: &mut Findings) -> Option<DeadReckoning> {
    let scale = doc.number("dead_reckoning", "scale_error_pct", f);
    let bias = doc.number("dead_reckoning", "heading_bias_deg", f);
    let noise = doc.number("dead_reckoning", "heading_noise_deg", f);
    let drift = doc.number("dead_reckoning", "drift_mps", f);
    Some(DeadReckoning {
        scale_error: scale? / 100.0,
        heading_bias_rad: bias?.to_radians(),
        heading_noise_rad: noise?.to_radians(),
        drift_mps: drift?,
    })
}

fn sonar(doc: &Document<'_>, f: &mut Findings) -> Option<Sonar> {
    let number = |name: &str, f: &mut Findings| doc.number("sonar", name, f);
    let word = doc.text("sonar", "kind", f);
    let range_min = number("range_min_m", f);
    let range_max = number("range_max_m", f);
    let gap = number("nadir_gap_deg", f);
    let sector = number("sector_deg", f);
    let altitude = number("altitude_m", f);
    let range_error = number("range_error_m", f);
    let range_error_pct = number("range_error_pct", f);
    let bearing_error = number("bearing_error_deg", f);
    let altitude_error = number("altitude_error_m", f);
    let chance = number("detection_chance", f);
    let strays = number("strays_per_km", f);
    let detect_in_turns = doc.flag("sonar", "detect_in_turns", f);
    let word = word?;
    let side = word == "side-looking";
    let stray_key = if side { "sector_deg" } else { "nadir_gap_deg" };
    if doc.has("sonar", stray_key) {
        f.problem(
            doc.problem("sonar", stray_key, format!("has no effect with kind = \"{word}\""))
                .advice("remove it"),
        );
    }
    if !side && !doc.has("sonar", "sector_deg") {
        f.problem(
            doc.problem("sonar", "sector_deg", "is missing")
                .accepted(crate::bounds::find("sonar", "sector_deg").accepted())
                .advice("a forward-looking sonar needs the opening of its sector"),
        );
    }
    let kind = if side {
        SonarKind::SideLooking { nadir_gap_rad: gap?.to_radians() }
    } else {
        SonarKind::ForwardLooking { half_sector_rad: 0.5 * sector?.to_radians() }
    };
    let sonar = Sonar {
        kind,
        range_min_m: range_min?,
        range_max_m: range_max?,
        altitude_m: altitude?,
        range_error_m: range_error?,
        range_error_fraction: range_error_pct? / 100.0,
        bearing_error_rad: bearing_error?.to_radians(),
        altitude_error_m: altitude_error?,
        detection_chance: chance?,
        strays_per_km: strays?,
        detect_in_turns,
    };
    consistent_sonar(doc, &sonar, f).then_some(sonar)
}

fn consistent_sonar(doc: &Document<'_>, sonar: &Sonar, f: &mut Findings) -> bool {
    let before = f.problems.len();
    let (h, dh, far) = (sonar.altitude_m, sonar.altitude_error_m, sonar.range_max_m);
    if sonar.range_min_m >= far {
        f.problem(
            doc.problem(
                "sonar",
                "range_min_m",
                format!("{} m is not below sonar.range_max_m, {far} m", sonar.range_min_m),
            )
            .accepted(format!("0 to below {far} m")),
        );
    }
    if h >= far {
        f.problem(
            doc.problem(
                "sonar",
                "altitude_m",
                format!("altitude {h} m is not below the longest slant range sonar.range_max_m, {far} m: the sonar cannot reach the seabed"),
            )
            .accepted(format!("0 to below {far} m"))
            .advice("fly lower, or give the longest range as a slant range"),
        );
    } else if dh > 0.0 && h + dh >= far {
        f.problem(
            doc.problem(
                "sonar",
                "altitude_error_m",
                format!(
                    "altitude {h} m and its error {dh} m together are not below sonar.range_max_m, {far} m"
                ),
            )
            .accepted("an altitude that stays below the longest slant range"),
        );
    }
    if dh > h {
        f.problem(
            doc.problem("sonar", "altitude_error_m", format!("{dh} m is more than the altitude, {h} m"))
                .accepted(format!("0 to {h} m"))
                .advice("with horizontal ranges (altitude 0) put the error into range_error_m"),
        );
    }
    if f.problems.len() == before && sonar.nearest_m() >= sonar.reach_m() {
        f.problem(
            doc.problem(
                "sonar",
                "nadir_gap_deg",
                format!(
                    "the nadir gap reaches {:.1} m at this altitude, the sonar only {:.1} m: nothing is left of the swath",
                    sonar.nearest_m(),
                    sonar.reach_m()
                ),
            )
            .advice("lower the altitude or the gap"),
        );
    }
    f.problems.len() == before
}

/// Whether "nothing seen" counts as evidence: only with side-looking sonar, certain detection and a complete map.
fn nothing_seen(doc: &Document<'_>, sonar: Option<&Sonar>, gone_chance: f64, f: &mut Findings) -> bool {
    let wanted = doc.flag("budget", "nothing_seen", f);
    let has_map = doc.has("map", "complete_inside");
    if has_map && !wanted {
        f.problem(
            doc.problem("map", "complete_inside", "has no effect without budget.nothing_seen = true")
                .advice("remove it, or set budget.nothing_seen"),
        );
    }
    if !wanted {
        return false;
    }
    let mut refuse = |what: &str, advice: &str| {
        f.problem(doc.problem("budget", "nothing_seen", what.to_owned()).advice(advice));
    };
    if !has_map {
        refuse(
            "needs map.complete_inside",
            "name the polygon inside which every mapped landmark is certain to exist",
        );
    }
    if gone_chance > 0.0 {
        refuse(
            "needs a map on which every landmark is still there, but map.gone_chance is above 0",
            "leave nothing_seen out",
        );
    }
    if let Some(sonar) = sonar {
        if sonar.detection_chance < 1.0 {
            refuse(
                "needs a detection that is certain, but sonar.detection_chance is below 1",
                "leave nothing_seen out",
            );
        }
        if matches!(sonar.kind, SonarKind::ForwardLooking { .. }) {
            refuse("is available for side-looking sonar only", "leave nothing_seen out");
        }
    }
    true
}

/// Widest slice of the heading bias unless told otherwise, degrees. Measured (`tests/suite/slices.rs` and
/// `tests/suite/tightness.rs`): wider slices fix later and report larger areas, narrower ones gain little for their time.
const SLICE_DEG: f64 = 1.0;

/// Most slices unless told otherwise: with an unknown heading, slices of 5° find a fix hardly later than slices of 1° and
/// in a twentieth of the time (measured, `tests/suite/slices.rs`).
const SLICES_MAX: f64 = 72.0;

/// As many slices as keep each within [`SLICE_DEG`], up to [`SLICES_MAX`].
fn default_slices(dead_reckoning: DeadReckoning) -> usize {
    // The allowance keeps a bias that is a whole number of slices from asking for one more by rounding.
    let slices = 2.0 * dead_reckoning.heading_bias_rad.to_degrees() / SLICE_DEG - 1e-9;
    slices.ceil().clamp(1.0, SLICES_MAX) as usize
}

fn budget(doc: &Document<'_>, f: &mut Findings) -> Option<Budget> {
    let strays = doc.number("budget", "strays", f);
    let misses = doc.number("budget", "misses", f);
    Some(Budget { strays: strays? as u8, misses: misses? as u8 })
}

fn area(doc: &Document<'_>, f: &mut Findings) -> Option<AreaOptions> {
    let cell = doc.number("area", "cell_m", f);
    let headings = doc.number("area", "headings", f);
    let longest = doc.number("area", "longest_run_m", f);
    Some(AreaOptions { cell_m: cell?, headings: headings? as usize, longest_run_m: longest? })
}

fn remap(doc: &Document<'_>, f: &mut Findings) -> Option<RemapOptions> {
    let number = |name: &str, f: &mut Findings| doc.number("remap", name, f);
    let cell = number("cell_m", f);
    let pass = number("pass_share", f);
    let cured = number("cured_share", f);
    let smallest = number("smallest_region_cells", f);
    let half_width = number("resurvey_half_width_m", f);
    let regions = number("gain_regions", f);
    Some(RemapOptions {
        cell_m: cell?,
        pass_share: pass?,
        cured_share: cured?,
        smallest_region_cells: smallest? as usize,
        resurvey_half_width_m: half_width?,
        gain_regions: regions? as usize,
    })
}

fn suggest(doc: &Document<'_>, f: &mut Findings) -> Option<SuggestOptions> {
    let listed = doc.number("suggest", "listed", f);
    let lead = doc.number("suggest", "lead_m", f);
    Some(SuggestOptions { listed: listed? as usize, lead_m: lead? })
}

fn scoring(doc: &Document<'_>, f: &mut Findings) -> Option<Scoring> {
    let number = |name: &str, f: &mut Findings| doc.number("scoring", name, f);
    let fix_size = number("fix_size_m", f);
    let required = number("required_fix_m", f);
    let segment = number("segment_m", f);
    let draws = number("draws", f);
    let seed = number("seed", f);
    let rank_by = doc.text("scoring", "rank_by", f);
    let shapes = if doc.has("scoring", "error_shapes") {
        doc.list("scoring", "error_shapes", f)
    } else {
        Some(["uniform", "corners", "steady"].map(str::to_owned).to_vec())
    };
    let error_shapes = shapes?
        .iter()
        .map(|s| match s.as_str() {
            "corners" => ErrorShape::Corners,
            "steady" => ErrorShape::Steady,
            _ => ErrorShape::Uniform,
        })
        .collect();
    let rank_by = match rank_by?.as_str() {
        "share" => RankBy::Share,
        "p95" => RankBy::P95,
        "median" => RankBy::Median,
        "no-fix" => RankBy::NoFix,
        _ => RankBy::Guaranteed,
    };
    // Whole numbers in range are exact in f64: the ranges end at 2^53.
    Some(Scoring {
        fix_size_m: fix_size?,
        required_fix_m: required?,
        segment_m: segment?,
        draws: draws? as usize,
        seed: seed? as u64,
        error_shapes,
        rank_by,
        // Set when the number of landmarks is known.
        cell_budget: 0,
    })
}
