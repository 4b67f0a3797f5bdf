//! Improved error bounds: the same as separate runs of `lines`, never worse, and the one that matters comes first.

use fixability::assess::{Setup, score_lines, sensitivity};
use fixability::dive::{Dive, ErrorBound};
use fixability::render::{self, ChartSize};
use fixability::report::{GuaranteedChange, SensitivityReport};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use crate::support::layout::assert_clear;
use crate::support::program::{Workplace, project};

/// A dive with two lines over random ground, in local metres or in a grid whose distortion widens the bounds.
struct Ground {
    seed: u64,
    landmarks: usize,
    crs: &'static str,
    /// Keys whose line is replaced.
    replaced: Vec<(&'static str, String)>,
}

const DIVE: &str = "\
name = \"which error\"
[map]
landmarks = \"l.csv\"
crs = \"CRS\"
uncertainty = \"bound\"
[lines]
files = [\"t.csv\"]
[vehicle]
speed_mps = 1.5
turn_radius_m = 10
[dead_reckoning]
scale_error_pct = 0.5
heading_bias_deg = 0.8
heading_noise_deg = 0.4
drift_mps = 0.01
heading_slices = 2
[sonar]
kind = \"side-looking\"
range_max_m = 70
nadir_gap_deg = 20
altitude_m = 9
range_error_m = 0.4
range_error_pct = 0.5
bearing_error_deg = 1
altitude_error_m = 0.4
[start]
scatter_m = 10
[scoring]
fix_size_m = 18
required_fix_m = 300
draws = 1
";

impl Ground {
    fn new(seed: u64) -> Self {
        Self { seed, landmarks: 110, crs: "EPSG:32631", replaced: Vec::new() }
    }

    fn set(mut self, key: &'static str, value: impl ToString) -> Self {
        self.replaced.push((key, value.to_string()));
        self
    }

    /// Half-widths are multiplied by `boxes`.
    fn place(&self, boxes: f64) -> Workplace {
        let mut dive = DIVE.replace("CRS", self.crs);
        for (key, value) in &self.replaced {
            let old =
                dive.lines().find(|line| line.starts_with(&format!("{key} ="))).expect("the key").to_owned();
            dive = dive.replace(&old, &format!("{key} = {value}"));
        }
        let mut random = ChaCha8Rng::seed_from_u64(self.seed);
        let (east, north) = if self.crs == "local" { (0.0, 0.0) } else { (512_000.0, 6_171_000.0) };
        let mut rows = String::from("id,easting,northing,uncertainty_m\n");
        for i in 0..self.landmarks {
            let mut draw = |from: f64, to: f64| random.random_range(from..to);
            // Two landmarks are a pair that neither line can tell apart: each passes one of them, to port at 50 m.
            let (e, n) = match self.landmarks {
                2 => (600.0, 300.0 + 150.0 * i as f64),
                _ => (draw(0.0, 1200.0), draw(0.0, 700.0)),
            };
            let (e, n) = (east + e, north + n);
            let half_width_m: f64 = draw(0.5, 3.0) * boxes;
            rows += &format!("L{i},{e},{n},{half_width_m}\n");
        }
        let mut lines = String::from("line,easting,northing\n");
        for (name, e, n) in
            [("A", 20.0, 200.0), ("A", 1180.0, 300.0), ("B", 1150.0, 520.0), ("B", 40.0, 480.0)]
        {
            lines += &format!("{name},{},{}\n", east + e, north + n);
        }
        Workplace::new().write("dive.toml", &dive).write("l.csv", &rows).write("t.csv", &lines)
    }

    fn dive(&self, boxes: f64) -> Dive {
        Dive::read(&self.place(boxes).path("dive.toml")).unwrap_or_else(|e| panic!("{e}"))
    }
}

fn report_of(dive: &Dive, factor: f64) -> SensitivityReport {
    sensitivity(&Setup::new(dive), factor, &|| {})
}

fn change_of(report: &SensitivityReport, bound: ErrorBound) -> &GuaranteedChange {
    &report.bounds.iter().find(|row| row.bound == bound).expect("the bound is improved").change
}

/// Guaranteed fix distances of all segments as `lines` has them, line by line.
fn fixes(dive: &Dive) -> Vec<Option<f64>> {
    let report = score_lines(&Setup::new(dive), &|| {});
    let mut lines: Vec<_> = report.lines.into_iter().collect();
    lines.sort_by(|a, b| a.name.cmp(&b.name));
    let segments = lines.into_iter().flat_map(|line| line.segments);
    segments.map(|segment| segment.guaranteed.expect("always computed").distance_m).collect()
}

/// Each figure of `sensitivity` is that of `lines` with the dive file changed, whatever the grid adds to the bounds.
#[test]
fn the_figures_are_those_of_separate_runs_of_lines() {
    let half = [
        (ErrorBound::DistanceScale, "scale_error_pct", "0.25"),
        (ErrorBound::HeadingBias, "heading_bias_deg", "0.4"),
        (ErrorBound::HeadingNoise, "heading_noise_deg", "0.2"),
        (ErrorBound::Drift, "drift_mps", "0.005"),
        (ErrorBound::RangeConstant, "range_error_m", "0.2"),
        (ErrorBound::RangeGrowing, "range_error_pct", "0.25"),
        (ErrorBound::Bearing, "bearing_error_deg", "0.5"),
        (ErrorBound::Altitude, "altitude_error_m", "0.2"),
    ];
    for crs in ["EPSG:32631", "local"] {
        let ground = || Ground { crs, ..Ground::new(3) };
        let present = ground().dive(1.0);
        let report = report_of(&present, 0.5);
        let before = fixes(&present);
        let share = |fixes: &[Option<f64>]| {
            let report = fixes.iter().filter(|fix| fix.is_some_and(|fix_m| fix_m <= 300.0)).count();
            report as f64
        };
        let mut all = ground();
        let mut moved = 0;
        let mut compare = |dive: &Dive, change: &GuaranteedChange, what: &str| {
            let after = fixes(dive);
            let gaining = before.iter().zip(&after).filter(|(b, a)| b.is_none() && a.is_some()).count();
            assert_eq!(change.segments_gaining_fix, gaining, "{crs} {what}");
            assert_eq!(change.after.segments_with_fix, after.iter().flatten().count(), "{crs} {what}");
            let longest = after.iter().flatten().copied().reduce(f64::max);
            assert_eq!(change.after.longest_m, longest, "{crs} {what}");
            let sooner: Vec<f64> =
                before.iter().zip(&after).filter_map(|(b, a)| Some((*b)? - (*a)?)).collect();
            assert_eq!(change.segments_compared, sooner.len());
            assert_eq!(change.sooner_most_m, sooner.iter().copied().reduce(f64::max), "{crs} {what}");
            // Segments are 50 m long but for the last of a line, which may be up to half as much longer or shorter.
            let rough = (share(&after) - share(&before)) / before.len() as f64;
            assert!(
                (change.share_gained - rough).abs() < 0.05,
                "{crs} {what}: {} {rough}",
                change.share_gained
            );
            moved += usize::from(after != before);
        };
        for (bound, key, value) in half {
            compare(&ground().set(key, value).dive(1.0), change_of(&report, bound), key);
            all = all.set(key, value);
        }
        compare(&ground().dive(0.5), change_of(&report, ErrorBound::LandmarkBoxes), "boxes");
        compare(&all.dive(0.5), &report.all_together, "all");
        assert!(moved >= 5, "{crs}: only {moved} improvements change anything");
    }
}

/// What the grid adds to a bound stays when the bound is improved away.
#[test]
fn the_part_of_the_grid_stays() {
    let dive = Ground::new(1).dive(1.0);
    let report = report_of(&dive, 0.0);
    for (bound, adds) in [
        (ErrorBound::DistanceScale, true),
        (ErrorBound::HeadingNoise, true),
        (ErrorBound::RangeGrowing, true),
        (ErrorBound::HeadingBias, false),
        (ErrorBound::RangeConstant, false),
        (ErrorBound::Altitude, false),
    ] {
        let row = report.bounds.iter().find(|row| row.bound == bound).unwrap();
        assert_eq!(row.improved.stated, 0.0, "{bound:?}");
        assert_eq!(row.improved.in_force > 0.0, adds, "{bound:?}");
        let grid = row.present.in_force - row.present.stated;
        assert!(
            (row.improved.in_force - grid).abs() < 0.01 * row.present.stated + 1e-12,
            "{bound:?}: {row:?}"
        );
    }
}

/// Smaller bounds never lengthen a guaranteed distance: the runs themselves, before the shorter one is taken.
#[test]
fn improved_bounds_never_lengthen_a_guaranteed_distance() {
    let (mut shorter, mut compared) = (0, 0);
    for seed in 0..12u64 {
        let mut ground = Ground::new(100 + seed).set("heading_slices", 1 + seed % 4);
        if seed % 3 == 2 {
            ground = ground.set("drift_mps", "0.03").set("bearing_error_deg", "2");
        }
        let place = ground.place(1.0);
        if seed % 3 == 1 {
            let text = std::fs::read_to_string(place.path("dive.toml")).unwrap();
            let text = text.replace("\"side-looking\"", "\"forward-looking\"");
            std::fs::write(place.path("dive.toml"), text.replace("nadir_gap_deg = 20", "sector_deg = 90"))
                .unwrap();
        }
        let dive = Dive::read(&place.path("dive.toml")).unwrap_or_else(|e| panic!("{e}"));
        let before = fixes(&dive);
        let bounds = ErrorBound::ALL;
        for (improved, factor) in
            bounds.iter().map(|&b| (vec![b], 0.5)).chain([(bounds.to_vec(), 0.5), (bounds.to_vec(), 0.1)])
        {
            let after = fixes(&dive.improved(&improved, factor));
            for (before, after) in before.iter().zip(&after) {
                let Some(before_m) = before else { continue };
                assert!(
                    after.is_some_and(|m| m <= *before_m),
                    "seed {seed} {improved:?}: {before:?} {after:?}"
                );
                compared += 1;
                shorter += usize::from(after < before);
            }
        }
    }
    println!("{shorter} of {compared} distances are shorter");
    assert!(compared > 2000 && shorter > 200, "{shorter} of {compared}");
}

/// Nothing is negative, and all together is at least the best single one, for any factor and any number of slices, with
/// strays and misses allowed.
#[test]
fn no_improvement_makes_anything_worse() {
    for (seed, factor, slices) in [(1, 0.5, 2), (2, 0.8, 5), (3, 0.0, 1), (4, 0.95, 3)] {
        let mut dive = Ground::new(seed).set("heading_slices", slices).set("heading_bias_deg", 3).dive(1.0);
        dive.budget.misses = (seed % 2) as u8;
        let report = report_of(&dive, factor);
        let mut scopes =
            vec![(report.bounds.iter().map(|b| b.change).collect::<Vec<_>>(), report.all_together)];
        scopes.extend(report.lines.iter().map(|line| (line.changes.clone(), line.all_together)));
        for (singles, all) in scopes {
            for change in &singles {
                assert!(change.share_gained >= 0.0 && change.fix_gained_share >= 0.0, "{change:?}");
                assert!(change.sooner_median_m.is_none_or(|m| m >= 0.0), "{change:?}");
                assert!(all.share_gained >= change.share_gained - 1e-12, "{all:?} {change:?}");
                assert!(all.segments_gaining_fix >= change.segments_gaining_fix);
                assert!(all.after.no_fix_share <= change.after.no_fix_share + 1e-12);
            }
        }
        let gains: Vec<f64> = report.bounds.iter().map(|b| b.change.share_gained).collect();
        assert!(gains.windows(2).all(|w| w[0] >= w[1] - 1e-8), "{gains:?}");
        let ranks: Vec<usize> = report.bounds.iter().map(|b| b.rank.unwrap_or(99)).collect();
        assert!(ranks[0] == 1 && ranks.windows(2).all(|w| w[0] <= w[1]), "{ranks:?}");
    }
}

/// One bound is far too large and all others are tiny: it comes first, alone, and gains as much as all together.
#[test]
fn the_bound_that_matters_comes_first() {
    let tiny = || {
        Ground { landmarks: 90, ..Ground::new(8) }
            .set("scale_error_pct", "0.01")
            .set("heading_bias_deg", "0.01")
            .set("heading_noise_deg", "0.01")
            .set("drift_mps", "0.0")
            .set("range_error_m", "0.01")
            .set("range_error_pct", "0.01")
            .set("bearing_error_deg", "0.02")
            .set("altitude_error_m", "0.01")
    };
    /// Keys and values that replace tiny ones.
    type Keys = Vec<(&'static str, &'static str)>;
    let cases: [(ErrorBound, f64, Keys); 4] = [
        (ErrorBound::LandmarkBoxes, 2.2, vec![]),
        (ErrorBound::RangeConstant, 0.01, vec![("range_error_m", "4")]),
        (ErrorBound::HeadingNoise, 0.01, vec![("heading_noise_deg", "4")]),
        (ErrorBound::DistanceScale, 0.01, vec![("scale_error_pct", "6")]),
    ];
    for (bound, boxes, keys) in cases {
        let ground = keys.iter().fold(tiny(), |ground, (key, value)| ground.set(key, value));
        let report = report_of(&ground.dive(boxes), 0.5);
        let first = &report.bounds[0];
        println!("{bound:?}: {}", report.verdict.text);
        assert_eq!(report.verdict.first, [bound], "{}", report.verdict.text);
        assert_eq!((first.bound, first.rank), (bound, Some(1)));
        assert!(report.verdict.text.contains(bound.words()), "{}", report.verdict.text);
        assert_eq!(report.zero.iter().map(|zero| zero.bound).collect::<Vec<_>>(), [ErrorBound::Drift]);
    }
}

#[test]
fn nothing_that_helps_is_said_so() {
    // A pair of landmarks: no fix whatever the errors.
    let report = report_of(&Ground { landmarks: 2, ..Ground::new(1) }.dive(1.0), 0.5);
    assert!(report.verdict.first.is_empty() && report.bounds.iter().all(|row| row.rank.is_none()));
    assert!(report.verdict.text.contains("no improvement changes"), "{}", report.verdict.text);
    assert_eq!(report.all_together.sooner_median_m, None);
    let mut dive = Ground::new(1).dive(1.0);
    dive.sonar.detection_chance = 0.9;
    let uncertain = Ground::new(1).set("altitude_error_m", "0.4\ndetection_chance = 0.9").dive(1.0);
    let report = report_of(&uncertain, 0.5);
    assert!(report.verdict.text.contains("set budget.misses"), "{}", report.verdict.text);
    // No landmarks at all.
    let report = report_of(&Ground { landmarks: 0, ..Ground::new(1) }.dive(1.0), 0.5);
    assert_eq!(report.present.within_required_share, 0.0);
    assert!(report.zero.iter().any(|zero| zero.bound == ErrorBound::LandmarkBoxes));
}

#[test]
fn files_hold_the_report_and_do_not_depend_on_threads() {
    let place = Ground::new(3).place(1.0);
    for threads in ["1", "2"] {
        place
            .run(&format!("sensitivity dive.toml --factor 0.25 --threads {threads} --out {threads}"))
            .expect(0);
    }
    assert_eq!(place.names("1"), ["sensitivity.csv", "sensitivity.json", "sensitivity.png"]);
    for name in place.names("1") {
        assert!(place.bytes(format!("1/{name}")) == place.bytes(format!("2/{name}")), "{name}");
    }
    let report = report_of(&Ground::new(3).dive(1.0), 0.25);
    let json: serde_json::Value = serde_json::from_slice(&place.bytes("1/sensitivity.json")).unwrap();
    assert_eq!(
        (json["schema"].as_str(), json["factor"].as_f64()),
        (Some("fixability.sensitivity"), Some(0.25))
    );
    assert_eq!(json["bounds"][0]["key"], report.bounds[0].key);
    assert_eq!(json["bounds"][0]["bound"], serde_json::to_value(report.bounds[0].bound).unwrap());
    let csv = place.bytes("1/sensitivity.csv");
    let mut reader = csv::Reader::from_reader(csv.as_slice());
    let header = reader.headers().unwrap().clone();
    let rows: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    assert_eq!(rows.len(), 3 * (report.bounds.len() + 1));
    let field =
        |row: &csv::StringRecord, name: &str| row[header.iter().position(|c| c == name).unwrap()].to_owned();
    for (row, bound) in rows.iter().zip(&report.bounds) {
        assert_eq!(field(row, "line"), "");
        assert_eq!(field(row, "key"), bound.key);
        assert_eq!(field(row, "share_gained").parse::<f64>().unwrap(), bound.change.share_gained);
        assert_eq!(field(row, "sooner_median_m").parse::<f64>().ok(), bound.change.sooner_median_m);
    }
    assert_eq!(field(&rows[report.bounds.len()], "improved"), "all");
    assert_eq!(field(&rows[report.bounds.len() + 1], "line"), "A");
    let ran = place.run("sensitivity dive.toml --factor 1").expect(2);
    assert!(ran.stderr.contains("0 to below 1"), "{}", ran.stderr);
}

#[test]
fn texts_of_the_chart_keep_clear_of_each_other() {
    let mut reports = vec![
        report_of(&Ground::new(3).dive(1.0), 0.5),
        report_of(&Ground { landmarks: 2, ..Ground::new(1) }.dive(1.0), 0.5),
        report_of(&Ground { landmarks: 0, ..Ground::new(1) }.dive(1.0), 0.5),
    ];
    let mut long = reports[0].clone();
    long.verdict.text = "wählen Sie ".repeat(60);
    long.provenance.dive = "Ein sehr langer Name für einen Tauchgang ".repeat(8);
    reports.push(long);
    for (number, report) in reports.iter().enumerate() {
        for (width_px, height_px) in [(1754, 1240), (800, 560), (1240, 1754), (2480, 1754)] {
            let size = ChartSize::pixels(width_px, height_px);
            let texts = render::sensitivity_layout(report, &size).unwrap();
            assert_clear(&texts, &size, &format!("{number} {size:?}"));
        }
    }
}

/// On the demo, landmark boxes come first: the map was made so that its boxes are the largest error.
#[test]
fn the_demo_asks_for_a_better_map() {
    let dive = Dive::read(&project("demo-data/dive.toml")).unwrap();
    let report = report_of(&dive, 0.5);
    assert_eq!(report.verdict.first, [ErrorBound::LandmarkBoxes], "{}", report.verdict.text);
}

#[test]
#[ignore = "writes pictures for the eye into FIXABILITY_PICTURES"]
fn write_pictures_of_sensitivity() {
    let Some(folder) = std::env::var_os("FIXABILITY_PICTURES") else { return };
    let folder = std::path::PathBuf::from(folder);
    let none = report_of(&Ground { landmarks: 2, ..Ground::new(1) }.dive(1.0), 0.5);
    let small = ChartSize::pixels(800, 560);
    let some = report_of(&Ground::new(3).dive(1.0), 0.5);
    for (name, report, size) in [
        ("none", &none, ChartSize::default()),
        ("some", &some, ChartSize::default()),
        ("small", &some, small),
    ] {
        let bytes = render::sensitivity_png(report, &size).unwrap();
        std::fs::write(folder.join(format!("sensitivity-{name}.png")), bytes).unwrap();
    }
}
