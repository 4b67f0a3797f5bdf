//! Every key of the dive file and every numeric column: unit, range, default and meaning, in one table.
//!
//! The reader takes ranges and error texts from here, and the tables of the README are made from the same rows.

use std::fmt;

/// A range of numbers with open or closed ends.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Range {
    /// Lower end.
    pub low: f64,
    /// Whether the lower end itself is excluded.
    pub above_low: bool,
    /// Upper end.
    pub high: f64,
    /// Whether the upper end itself is excluded.
    pub below_high: bool,
    /// Unit, as written after the number; empty for plain numbers.
    pub unit: &'static str,
}

impl Range {
    const fn closed(low: f64, high: f64, unit: &'static str) -> Self {
        Self { low, above_low: false, high, below_high: false, unit }
    }

    const fn above(low: f64, high: f64, unit: &'static str) -> Self {
        Self { low, above_low: true, high, below_high: false, unit }
    }

    const fn open(low: f64, high: f64, unit: &'static str) -> Self {
        Self { low, above_low: true, high, below_high: true, unit }
    }

    /// Whether `x` is inside. Not-a-number never is.
    pub fn contains(&self, x: f64) -> bool {
        let low_ok = if self.above_low { x > self.low } else { x >= self.low };
        let high_ok = if self.below_high { x < self.high } else { x <= self.high };
        low_ok && high_ok
    }
}

impl fmt::Display for Range {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let unit = if self.unit.is_empty() { String::new() } else { format!(" {}", self.unit) };
        let low = if self.above_low { "above " } else { "" };
        let high = if self.below_high { "below " } else { "" };
        write!(f, "{low}{} to {high}{}{unit}", self.low, self.high)
    }
}

/// What kind of value a key takes.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Kind {
    /// A number within a range.
    Number(Range),
    /// A whole number within a range.
    Whole(Range),
    /// Free text.
    Text,
    /// One of these words.
    Choice(&'static [&'static str]),
    /// A list of these words.
    Choices(&'static [&'static str]),
    /// A file, relative to the dive file.
    File,
    /// A list of files, relative to the dive file.
    Files,
    /// A coordinate system: `EPSG:` code or `local`.
    Crs,
    /// `true` or `false`.
    Flag,
    /// A calendar date.
    Date,
}

/// Whether a key must be given.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Need {
    /// It must.
    Required,
    /// It has a default, as it would be written in the file.
    Default(&'static str),
    /// What happens without it.
    Without(&'static str),
}

/// One key of the dive file.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Key {
    /// Table, empty for keys at the top.
    pub section: &'static str,
    /// Name within the table.
    pub name: &'static str,
    /// Kind of value with unit and range.
    pub kind: Kind,
    /// Whether it must be given.
    pub need: Need,
    /// What it means.
    pub meaning: &'static str,
}

/// Range of a latitude.
pub const LATITUDE: Range = Range::closed(-90.0, 90.0, "degrees");
/// Range of a longitude. Up to 360, because charts of the Pacific count on past 180.
pub const LONGITUDE: Range = Range::closed(-180.0, 360.0, "degrees");
/// Range of an easting or northing. Far more than any grid holds; a guard against garbled digits.
pub const GRID_METRES: Range = Range::closed(-1e8, 1e8, "m");
/// Range of an uncertainty.
pub const UNCERTAINTY: Range = Range::closed(0.0, 10_000.0, "m");

/// Largest input file, bytes: 256 MiB. A row of a table has about 50 bytes, so this is some five million landmarks, far more
/// than any survey of one site holds.
pub const FILE_SIZE_MAX: u64 = 256 << 20;

/// Largest dive file, bytes: 256 KiB, room for the names of ten thousand line files.
pub const DIVE_SIZE_MAX: usize = 256 << 10;

/// [`FILE_SIZE_MAX`] in words.
pub fn file_size_words() -> String {
    format!("{} MiB", FILE_SIZE_MAX >> 20)
}

/// How dates are written.
pub const DATE_FORM: &str = "a date as year-month-day, such as 2026-05-31";

const fn number(
    section: &'static str,
    name: &'static str,
    range: Range,
    need: Need,
    meaning: &'static str,
) -> Key {
    Key { section, name, kind: Kind::Number(range), need, meaning }
}

const fn key(
    section: &'static str,
    name: &'static str,
    kind: Kind,
    need: Need,
    meaning: &'static str,
) -> Key {
    Key { section, name, kind, need, meaning }
}

use Need::{Default, Required, Without};

/// All keys of the dive file, in the order of the documentation.
pub const KEYS: &[Key] = &[
    key("", "name", Kind::Text, Required, "Title of the dive, printed on every output."),
    key(
        "",
        "issued",
        Kind::Date,
        Without("no date on the outputs, and the same input gives the same bytes"),
        "Date of issue, printed on every output.",
    ),
    key("map", "landmarks", Kind::File, Required, "Landmarks: CSV, GeoJSON points or KML points."),
    key("map", "crs", Kind::Crs, Required, "Coordinate system of the landmark file."),
    key(
        "map",
        "working_crs",
        Kind::Crs,
        Without(
            "the grid of the landmark file; for latitude and longitude, the UTM zone of the first landmark (of the first waypoint when there are no landmarks)",
        ),
        "Projected grid in which everything is computed and drawn.",
    ),
    key(
        "map",
        "uncertainty",
        Kind::Choice(&["bound", "sigma", "p95"]),
        Without("allowed only when no landmark has an uncertainty"),
        "What the uncertainty figures mean: a hard bound, one standard deviation per axis, or a 95 % radius.",
    ),
    number(
        "map",
        "uncertainty_m",
        UNCERTAINTY,
        Without("every landmark must have its own"),
        "Uncertainty of landmarks that have none of their own.",
    ),
    number(
        "map",
        "sigma_factor",
        Range::closed(1.0, 100.0, ""),
        Default("4.292"),
        "Bound divided by standard deviation. The default is the 99.99 % radius of a circular Gaussian.",
    ),
    number(
        "map",
        "p95_factor",
        Range::closed(1.0, 100.0, ""),
        Default("1.754"),
        "Bound divided by 95 % radius. The default is the ratio of the 99.99 % to the 95 % radius of a circular Gaussian.",
    ),
    number(
        "map",
        "seabed_depth_m",
        Range::closed(0.0, 11_500.0, "m"),
        Default("0"),
        "Depth of the seabed, for the scale between true metres down there and grid metres.",
    ),
    key(
        "map",
        "surveyed",
        Kind::Date,
        Without("the outputs say that the age of the map is not stated"),
        "Date on which the landmarks were surveyed; of several surveys, the oldest.",
    ),
    key(
        "map",
        "oldest_survey",
        Kind::Date,
        Without("landmarks of any age are used"),
        "Landmarks with an own survey date before this one are left out, counted in a warning.",
    ),
    number(
        "map",
        "gone_chance",
        Range { low: 0.0, above_low: false, high: 1.0, below_high: true, unit: "" },
        Default("0"),
        "Chance that a mapped landmark is no longer there, drawn for each landmark and simulated dive; needs budget.misses to guarantee anything.",
    ),
    number(
        "map",
        "common_shift_m",
        Range::closed(0.0, 10_000.0, "m"),
        Default("0"),
        "Largest shift of the whole map against the Earth. It cannot be found from relative positions: it widens the start, and adds to every absolute position.",
    ),
    key(
        "map",
        "complete_inside",
        Kind::File,
        Without("no area"),
        "Polygon (GeoJSON, WGS 84 or local metres like the map) inside which every mapped landmark exists; needed for budget.nothing_seen.",
    ),
    key(
        "map",
        "decimal_comma",
        Kind::Flag,
        Default("false"),
        "Numbers of the landmark file are written with a decimal comma.",
    ),
    key(
        "map",
        "skip_bad_rows",
        Kind::Flag,
        Default("false"),
        "Leave out landmark rows with problems, counted in a warning, instead of refusing the file.",
    ),
    key(
        "lines",
        "files",
        Kind::Files,
        Required,
        "Candidate lines: CSV waypoints, GeoJSON lines, GPX routes and tracks, KML lines.",
    ),
    key(
        "lines",
        "crs",
        Kind::Crs,
        Without(
            "CSV: that of the landmarks; GeoJSON: WGS 84 latitude and longitude; GPX and KML are always WGS 84",
        ),
        "Coordinate system of the line files.",
    ),
    key(
        "lines",
        "decimal_comma",
        Kind::Flag,
        Default("false"),
        "Numbers of CSV line files are written with a decimal comma.",
    ),
    number(
        "vehicle",
        "speed_mps",
        Range::above(0.0, 20.0, "m/s"),
        Required,
        "Speed over ground along the line.",
    ),
    number(
        "vehicle",
        "turn_radius_m",
        Range::closed(0.0, 5_000.0, "m"),
        Default("0"),
        "Radius of a turn at a waypoint; 0 turns on the spot.",
    ),
    number(
        "dead_reckoning",
        "scale_error_pct",
        Range::closed(0.0, 50.0, "%"),
        Required,
        "Bound on the error of travelled distance, in per cent of it.",
    ),
    number(
        "dead_reckoning",
        "heading_bias_deg",
        Range::closed(0.0, 180.0, "degrees"),
        Required,
        "Bound on the constant heading error of a dive.",
    ),
    number(
        "dead_reckoning",
        "heading_noise_deg",
        Range::closed(0.0, 45.0, "degrees"),
        Required,
        "Bound on the changing heading error.",
    ),
    number(
        "dead_reckoning",
        "drift_mps",
        Range::closed(0.0, 10.0, "m/s"),
        Default("0"),
        "Bound on the speed of an unknown drift.",
    ),
    key(
        "dead_reckoning",
        "heading_slices",
        Kind::Whole(Range::closed(1.0, 720.0, "")),
        Without("as many as keep each slice within 1 degree, at most 72"),
        "Slices of the heading bias that are solved one by one; more are tighter and slower.",
    ),
    key(
        "sonar",
        "kind",
        Kind::Choice(&["side-looking", "forward-looking"]),
        Required,
        "Which way the sonar looks.",
    ),
    number("sonar", "range_min_m", Range::closed(0.0, 10_000.0, "m"), Default("0"), "Shortest slant range."),
    number("sonar", "range_max_m", Range::above(0.0, 20_000.0, "m"), Required, "Longest slant range."),
    number(
        "sonar",
        "nadir_gap_deg",
        Range { low: 0.0, above_low: false, high: 90.0, below_high: true, unit: "degrees" },
        Default("0"),
        "Half-angle off the vertical that is not seen (side-looking only).",
    ),
    number(
        "sonar",
        "sector_deg",
        Range::open(0.0, 360.0, "degrees"),
        Without("required for a forward-looking sonar"),
        "Full opening of the sector ahead (forward-looking only).",
    ),
    number(
        "sonar",
        "altitude_m",
        Range::closed(0.0, 10_000.0, "m"),
        Default("0"),
        "Height above the seabed; 0 when ranges are horizontal already.",
    ),
    number(
        "sonar",
        "range_error_m",
        Range::closed(0.0, 1_000.0, "m"),
        Required,
        "Constant part of the bound on the slant-range error.",
    ),
    number(
        "sonar",
        "range_error_pct",
        Range::closed(0.0, 50.0, "%"),
        Default("0"),
        "Part of the bound that grows with range, in per cent of it.",
    ),
    number(
        "sonar",
        "bearing_error_deg",
        Range::closed(0.0, 90.0, "degrees"),
        Required,
        "Bound on the error of the beam direction or measured bearing.",
    ),
    number(
        "sonar",
        "altitude_error_m",
        Range::closed(0.0, 1_000.0, "m"),
        Default("0"),
        "Bound on the error of the altitude.",
    ),
    number(
        "sonar",
        "detection_chance",
        Range::above(0.0, 1.0, ""),
        Default("1"),
        "Chance that a landmark inside the swath is detected.",
    ),
    number(
        "sonar",
        "strays_per_km",
        Range::closed(0.0, 1_000.0, "per km"),
        Default("0"),
        "Simulated detections of things that are not on the map, per kilometre of line.",
    ),
    key(
        "sonar",
        "detect_in_turns",
        Kind::Flag,
        Default("false"),
        "Landmarks are also detected while the vehicle turns.",
    ),
    key(
        "budget",
        "strays",
        Kind::Whole(Range::closed(0.0, 10.0, "")),
        Default("0"),
        "Most detections per run that may be of something that is not on the map.",
    ),
    key(
        "budget",
        "misses",
        Kind::Whole(Range::closed(0.0, 4.0, "")),
        Default("0"),
        "Most landmarks per run that may be missed although they are certainly inside the swath.",
    ),
    key(
        "budget",
        "nothing_seen",
        Kind::Flag,
        Default("false"),
        "A landmark certainly passed and not detected speaks against a position (side-looking sonar, detection_chance 1).",
    ),
    key(
        "start",
        "search_area",
        Kind::File,
        Without("the box around landmarks and lines, grown by sonar reach, scatter and turns"),
        "Polygon (GeoJSON) in which the vehicle may be at the start; its convex hull is used.",
    ),
    key(
        "start",
        "crs",
        Kind::Crs,
        Without("WGS 84 latitude and longitude"),
        "Coordinate system of the search area file.",
    ),
    number(
        "start",
        "scatter_m",
        Range::closed(0.0, 100_000.0, "m"),
        Default("0"),
        "Radius of the descent scatter about the planned start.",
    ),
    number(
        "scoring",
        "fix_size_m",
        Range::above(0.0, 100_000.0, "m"),
        Required,
        "Widest extent of the feasible set that counts as a fix.",
    ),
    number(
        "scoring",
        "required_fix_m",
        Range::above(0.0, 1_000_000.0, "m"),
        Required,
        "Longest run from an unknown start that the mission can accept.",
    ),
    number(
        "scoring",
        "segment_m",
        Range::closed(1.0, 100_000.0, "m"),
        Default("50"),
        "Interval between the starts at which a line is scored.",
    ),
    key(
        "scoring",
        "draws",
        Kind::Whole(Range::closed(1.0, 100_000.0, "")),
        Default("60"),
        "Simulated dives per line.",
    ),
    key(
        "scoring",
        "seed",
        Kind::Whole(Range::closed(0.0, 9_007_199_254_740_992.0, "")),
        Default("1"),
        "Seed of the random generator.",
    ),
    key(
        "scoring",
        "error_shapes",
        Kind::Choices(&["uniform", "corners", "steady"]),
        Default("[\"uniform\", \"corners\", \"steady\"]"),
        "How simulated errors are drawn, in turn.",
    ),
    key(
        "scoring",
        "rank_by",
        Kind::Choice(&["guaranteed", "share", "p95", "median", "no-fix"]),
        Default("\"guaranteed\""),
        "What orders the ranking of the lines.",
    ),
    key(
        "scoring",
        "cell_budget",
        Kind::Whole(Range::closed(100.0, 10_000_000.0, "")),
        Without("50000, or twice the number of landmarks times heading slices where that is more"),
        "Most cells the solver keeps at once before it answers \"undecided\".",
    ),
    number(
        "area",
        "cell_m",
        Range::closed(1.0, 10_000.0, "m"),
        Default("25"),
        "Side of a start cell of the area map; the vehicle is lost at its centre.",
    ),
    key(
        "area",
        "headings",
        Kind::Whole(Range::closed(1.0, 360.0, "")),
        Default("16"),
        "Headings run from every cell of the area map, evenly spaced from grid north.",
    ),
    number(
        "area",
        "longest_run_m",
        Range::closed(10.0, 100_000.0, "m"),
        Default("600"),
        "Longest straight run of the area map.",
    ),
    number(
        "remap",
        "cell_m",
        Range::closed(1.0, 10_000.0, "m"),
        Default("50"),
        "Side of a start cell of the remap analysis.",
    ),
    number(
        "remap",
        "pass_share",
        Range::above(0.0, 1.0, ""),
        Default("0.5"),
        "Share of the headings (`area.headings`) that must have a guaranteed fix within `scoring.required_fix_m` for a cell to pass.",
    ),
    number(
        "remap",
        "cured_share",
        Range::above(0.0, 1.0, ""),
        Default("0.75"),
        "Share of the cells of a region that must pass for the region to count as cured.",
    ),
    key(
        "remap",
        "smallest_region_cells",
        Kind::Whole(Range::closed(1.0, 10_000.0, "")),
        Default("10"),
        "Fewest cells of a region; smaller specks are counted and left out.",
    ),
    number(
        "remap",
        "resurvey_half_width_m",
        Range::closed(0.0, 10_000.0, "m"),
        Default("0.5"),
        "Half-width of a landmark's box that a re-survey can reach at best.",
    ),
    key(
        "remap",
        "gain_regions",
        Kind::Whole(Range::closed(0.0, 10_000.0, "")),
        Default("20"),
        "Number of regions, largest first, for which cure and gain are computed.",
    ),
    key(
        "suggest",
        "listed",
        Kind::Whole(Range::closed(1.0, 100.0, "")),
        Default("5"),
        "Most dive points and headings to suggest.",
    ),
    number(
        "suggest",
        "lead_m",
        Range::closed(0.0, 10_000.0, "m"),
        Default("50"),
        "How far a suggested line goes on after its guaranteed fix; it is at least `scoring.required_fix_m` long where the search area allows.",
    ),
    number(
        "sensitivity",
        "factor",
        Range { low: 0.0, above_low: false, high: 1.0, below_high: true, unit: "" },
        Default("0.5"),
        "Each error bound is multiplied by this, one at a time and all together.",
    ),
];

/// The row of a key.
///
/// # Panics
/// When the table has no such key: the reader asks for keys of the table only.
pub fn find(section: &str, name: &str) -> &'static Key {
    KEYS.iter()
        .find(|k| k.section == section && k.name == name)
        .unwrap_or_else(|| panic!("the table of keys has no {section}.{name}"))
}

impl Key {
    /// Name with its table: `sonar.range_max_m`.
    pub fn full_name(&self) -> String {
        if self.section.is_empty() { self.name.to_owned() } else { format!("{}.{}", self.section, self.name) }
    }

    /// What is accepted, in words.
    pub fn accepted(&self) -> String {
        let quoted = |words: &[&str]| words.iter().map(|w| format!("\"{w}\"")).collect::<Vec<_>>();
        match self.kind {
            Kind::Number(range) => format!("a number, {range}"),
            Kind::Whole(range) => format!("a whole number, {range}"),
            Kind::Text => "text in quotes".into(),
            Kind::Choice(words) => quoted(words).join(" or "),
            Kind::Choices(words) => format!("a list of {}", quoted(words).join(", ")),
            Kind::File => "a file name in quotes, relative to the dive file".into(),
            Kind::Files => "a list of file names in quotes, relative to the dive file".into(),
            Kind::Crs => "\"EPSG:4326\" (latitude and longitude), the \"EPSG:…\" code of a projected grid, or \"local\" (plain metres)".into(),
            Kind::Flag => "true or false".into(),
            Kind::Date => DATE_FORM.into(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_default_is_accepted_by_its_own_range() {
        for k in KEYS {
            if let (Kind::Number(r) | Kind::Whole(r), Default(text)) = (k.kind, k.need) {
                assert!(r.contains(text.parse().unwrap()), "{}", k.full_name());
            }
        }
    }

    #[test]
    fn keys_are_unique() {
        for (i, a) in KEYS.iter().enumerate() {
            assert!(
                KEYS[..i].iter().all(|b| (a.section, a.name) != (b.section, b.name)),
                "{}",
                a.full_name()
            );
        }
    }

    #[test]
    fn not_a_number_is_in_no_range() {
        assert!(KEYS.iter().all(|k| match k.kind {
            Kind::Number(r) | Kind::Whole(r) => !r.contains(f64::NAN) && !r.contains(f64::INFINITY),
            _ => true,
        }));
    }
}
