//! Suggested dive points: an exhaustive search finds the same ones, no simulated dive fixes later, and `lines` reads the
//! files and agrees.

use fixability::assess::{Setup, suggest, suggest_area_options};
use fixability::detect::{DrawnErrors, simulate};
use fixability::dive::{AreaOptions, Dive, ErrorShape};
use fixability::frame::LocalPoint;
use fixability::locate::{StraightOutcome, StraightRuns, steps};
use fixability::render::{self, ChartSize, ramp};
use fixability::report::{SuggestReport, Suggestion};
use fixability::track::plan::Plan;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use crate::support::layout::assert_clear;
use crate::support::program::Workplace;

/// West and south end of the search area, in UTM zone 31N; it is square.
const CORNER: (f64, f64) = (512_000.0, 6_171_000.0);
const SIDE_M: f64 = 420.0;

const DIVE: &str = "\
name = \"where to dive\"
[map]
landmarks = \"l.csv\"
crs = \"EPSG:32631\"
uncertainty = \"bound\"
[lines]
files = [\"t.csv\"]
[vehicle]
speed_mps = 1.5
turn_radius_m = 10
[dead_reckoning]
scale_error_pct = 0.4
heading_bias_deg = 0.8
heading_noise_deg = 0.3
[sonar]
kind = \"side-looking\"
range_max_m = 50
nadir_gap_deg = 20
altitude_m = 8
range_error_m = 0.3
bearing_error_deg = 1
altitude_error_m = 0.3
[start]
search_area = \"a.geojson\"
crs = \"EPSG:32631\"
scatter_m = 28
[scoring]
fix_size_m = 22
required_fix_m = 160
draws = 1
[area]
headings = 8
longest_run_m = 300
[suggest]
listed = 6
lead_m = 30
";

/// Landmarks over the search area and 60 m beyond it.
fn landmarks(count: usize, seed: u64) -> Vec<(f64, f64)> {
    let mut random = ChaCha8Rng::seed_from_u64(seed);
    (0..count)
        .map(|_| (random.random_range(-60.0..SIDE_M + 60.0), random.random_range(-60.0..SIDE_M + 60.0)))
        .collect()
}

fn place(landmarks: &[(f64, f64)], replaced: &[(&str, &str)]) -> Workplace {
    let mut dive = DIVE.to_owned();
    for (old, new) in replaced {
        assert!(dive.contains(old), "{old}");
        dive = dive.replace(old, new);
    }
    let mut rows = String::from("id,easting,northing,uncertainty_m\n");
    for (i, (e, n)) in landmarks.iter().enumerate() {
        rows += &format!("L{i},{},{},1.2\n", CORNER.0 + e, CORNER.1 + n);
    }
    let (w, s, e, n) = (CORNER.0, CORNER.1, CORNER.0 + SIDE_M, CORNER.1 + SIDE_M);
    let area = format!(
        "{{\"type\":\"Polygon\",\"coordinates\":[[[{w},{s}],[{e},{s}],[{e},{n}],[{w},{n}],[{w},{s}]]]}}"
    );
    Workplace::new()
        .write("dive.toml", &dive)
        .write("l.csv", &rows)
        .write(
            "t.csv",
            &format!("line,easting,northing\nL,{},{}\nL,{},{}\n", w + 60.0, s + 60.0, e - 60.0, n - 60.0),
        )
        .write("a.geojson", &area)
}

fn read(place: &Workplace) -> Dive {
    Dive::read(&place.path("dive.toml")).unwrap_or_else(|e| panic!("{e}"))
}

fn report_of(dive: &Dive) -> SuggestReport {
    suggest(&Setup::new(dive), &suggest_area_options(dive), &|_| {})
}

/// What the exhaustive search knows of a candidate.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Plain {
    at: LocalPoint,
    heading: usize,
    fix_m: f64,
    median_m: f64,
    starts: usize,
}

/// Every candidate with a fix, by the plain solver, in the order of the list: dive points row by row from the south, west to
/// east.
fn exhaustive(dive: &Dive, search: &AreaOptions) -> Vec<Plain> {
    let setup = Setup::new(dive);
    let runs = StraightRuns::new(
        setup.scene(),
        setup.solver(),
        setup.bounds(),
        dive.budget.misses,
        search.longest_run_m,
    );
    let (cell, scatter) = (search.cell_m, dive.start.scatter_m);
    let (west, south) = CORNER;
    let edge_m = |p: LocalPoint| {
        [p.east_m - west, west + SIDE_M - p.east_m, p.north_m - south, south + SIDE_M - p.north_m]
            .into_iter()
            .fold(f64::INFINITY, f64::min)
    };
    let mut found = Vec::new();
    let centres = |low: f64| {
        (0..)
            .map(move |k| ((low / cell).floor() + f64::from(k) + 0.5) * cell)
            .take_while(move |c| *c < low + SIDE_M)
    };
    for north in centres(south) {
        for east in centres(west) {
            let at = LocalPoint::new(east, north);
            if edge_m(at) < scatter + 1.0 {
                continue;
            }
            let mut starts = vec![at];
            if scatter > 0.0 {
                for k in 0..12 {
                    let angle = f64::from(k) * 30f64.to_radians();
                    starts.push(LocalPoint::new(east + scatter * angle.sin(), north + scatter * angle.cos()));
                }
                for k in 0..6 {
                    let angle = (30.0 + 60.0 * f64::from(k)).to_radians();
                    let half = 0.5 * scatter;
                    starts.push(LocalPoint::new(east + half * angle.sin(), north + half * angle.cos()));
                }
                for (columns, rows) in
                    (-9..=9).flat_map(|c| (-9..=9).map(move |r| (f64::from(c), f64::from(r))))
                {
                    let off = (columns * cell).hypot(rows * cell);
                    if off > 0.0 && off <= scatter {
                        starts.push(LocalPoint::new(east + columns * cell, north + rows * cell));
                    }
                }
            }
            for heading in 0..search.headings {
                let heading_rad = std::f64::consts::TAU * heading as f64 / search.headings as f64;
                let fixes: Option<Vec<f64>> = starts
                    .iter()
                    .map(|&start| match runs.solve_plainly(heading_rad, start) {
                        StraightOutcome::Fix(fix_m) => Some(fix_m),
                        _ => None,
                    })
                    .collect();
                let Some(mut fixes) = fixes else { continue };
                fixes.sort_by(f64::total_cmp);
                let fix_m = fixes[fixes.len() - 1];
                let ahead = fix_m + 1.0;
                let end =
                    LocalPoint::new(east + ahead * heading_rad.sin(), north + ahead * heading_rad.cos());
                if edge_m(end) >= scatter + 1.0 {
                    let median_m = fixes[fixes.len().div_ceil(2) - 1];
                    found.push(Plain { at, heading, fix_m, median_m, starts: fixes.len() });
                }
            }
        }
    }
    found
}

/// The best alternatives.
fn listed(mut candidates: Vec<Plain>, most: usize, apart_m: f64) -> Vec<Plain> {
    // The sort keeps the order of equal ones.
    candidates.sort_by(|a, b| a.fix_m.total_cmp(&b.fix_m).then(a.median_m.total_cmp(&b.median_m)));
    let mut list: Vec<Plain> = Vec::new();
    for candidate in candidates {
        if list.len() < most && list.iter().all(|taken| taken.at.distance_m(candidate.at) >= apart_m) {
            list.push(candidate);
        }
    }
    list
}

#[test]
fn an_exhaustive_search_finds_the_same() {
    let mut lists = 0;
    for (seed, scatter, cells) in [(1, "28", "25"), (2, "12", "25"), (3, "0", "30"), (4, "45", "30")] {
        let scatter_line = format!("scatter_m = {scatter}\n");
        let area_line = format!("[area]\ncell_m = {cells}\n");
        let place =
            place(&landmarks(70, seed), &[("scatter_m = 28\n", &scatter_line), ("[area]\n", &area_line)]);
        let dive = read(&place);
        let search = suggest_area_options(&dive);
        let report = report_of(&dive);
        assert_eq!(search.cell_m, if scatter == "12" { 12.5 } else { cells.parse().unwrap() });
        let scatter_m = dive.start.scatter_m;
        let apart_m = f64::max(2.0 * scatter_m, 2.0 * (50f64.powi(2) - 8f64.powi(2)).sqrt());
        assert!((report.apart_m - apart_m).abs() < 1e-9);
        let wanted = listed(exhaustive(&dive, &search), 6, apart_m);
        println!("seed {seed}: {} listed, best {:?}", wanted.len(), wanted.first());
        assert_eq!(report.suggestions.len(), wanted.len(), "seed {seed}");
        for (number, (found, wanted)) in report.suggestions.iter().zip(&wanted).enumerate() {
            assert_eq!((found.number, found.dive_point), (number + 1, wanted.at), "seed {seed}");
            assert_eq!(found.heading_deg, 45.0 * wanted.heading as f64, "seed {seed}");
            assert_eq!(found.starts.len(), wanted.starts);
            // The starts on the rings are computed in another way here: the last digits may differ.
            assert!((found.fix_m - wanted.fix_m).abs() < 1e-6, "seed {seed}: {found:?} {wanted:?}");
            assert!((found.median_fix_m - wanted.median_m).abs() < 1e-6);
            assert_eq!(found.within_required, found.fix_m <= 160.0);
        }
        lists += usize::from(wanted.len() >= 3);
    }
    assert!(lists >= 3, "{lists}");
}

/// From every start in the disc that was computed, no dive within the bounds fixes later.
#[test]
fn no_simulated_dive_fixes_later_than_suggested() {
    let mut dive = read(&place(&landmarks(70, 5), &[]));
    let report = report_of(&dive);
    assert!(report.suggestions.len() >= 3);
    // The starts are the scatter: what is simulated has no more of it.
    dive.start.scatter_m = 0.0;
    let setup = Setup::new(&dive);
    let (mut dives, mut tight) = (0, 0);
    for suggestion in &report.suggestions {
        for (number, start) in suggestion.starts.iter().enumerate() {
            assert!(start.fix_m <= suggestion.fix_m && start.fix_m >= suggestion.shortest_fix_m);
            let plan = Plan::straight(start.position, suggestion.heading_deg.to_radians(), 300.0);
            for (draw, shape) in
                [ErrorShape::Uniform, ErrorShape::Corners, ErrorShape::Steady].into_iter().enumerate()
            {
                let errors = DrawnErrors::new(number as u64, &suggestion.name, draw as u64, shape);
                let log = simulate(&setup.scene(), &plan, &[0.0], &errors).log;
                let all = steps(&log, &setup.bounds());
                let mark = all.iter().position(|step| step.sighting.is_none()).expect("the mark");
                let outcome = setup.solver().run(&all[mark + 1..], |_, _| {});
                let fix_m = outcome.first_fix_along_m(dive.scoring.fix_size_m);
                assert!(fix_m.is_some_and(|fix_m| fix_m <= start.fix_m), "{fix_m:?} {start:?}");
                tight += usize::from(fix_m.is_some_and(|fix_m| fix_m > 0.8 * start.fix_m));
                dives += 1;
            }
        }
    }
    println!("{dives} dives, {tight} within a fifth of the guarantee");
    assert!(dives > 150 && tight > dives / 4, "{tight} of {dives}");
}

fn first_segment_fix(report: &serde_json::Value, name: &str) -> f64 {
    let line = report["lines"].as_array().unwrap().iter().find(|line| line["name"] == name).unwrap();
    line["segments"][0]["guaranteed"]["distance_m"].as_f64().expect("a guaranteed fix")
}

/// The worst of the starts for which `lines` computes its guarantee: the planned one and six at the rim.
fn of_offset_tracks(suggestion: &Suggestion, scatter_m: f64) -> f64 {
    let offset = |start: &LocalPoint| {
        let (e, n) =
            (start.east_m - suggestion.dive_point.east_m, start.north_m - suggestion.dive_point.north_m);
        let sixths = libm::atan2(e, n).to_degrees() / 60.0;
        let is_rim = (e.hypot(n) - scatter_m).abs() < 1e-6 && (sixths - sixths.round()).abs() < 1e-6;
        is_rim || e.hypot(n) < 1e-6
    };
    let starts: Vec<_> = suggestion.starts.iter().filter(|start| offset(&start.position)).collect();
    assert_eq!(starts.len(), 7);
    starts.into_iter().map(|start| start.fix_m).fold(0.0, f64::max)
}

#[test]
fn lines_reads_every_file_and_guarantees_the_same() {
    let place = place(&landmarks(70, 6), &[]);
    place.run("suggest dive.toml --out out").expect(0);
    let names =
        ["suggest-lines.csv", "suggest.csv", "suggest.geojson", "suggest.gpx", "suggest.json", "suggest.png"];
    assert_eq!(place.names("out"), names);
    let dive = read(&place);
    let report = report_of(&dive);
    let json: serde_json::Value = serde_json::from_slice(&place.bytes("out/suggest.json")).unwrap();
    assert_eq!(json["schema"], "fixability.suggest");
    assert_eq!(json["suggestions"].as_array().unwrap().len(), report.suggestions.len());
    assert!(report.suggestions.len() >= 3);
    // Read with the grid's code and with latitude and longitude.
    let geographic = "[lines]\ncrs = \"EPSG:4326\"\n";
    let cases = [
        ("out/suggest-lines.csv", "[lines]\n", 1e-6),
        ("out/suggest-lines.csv", geographic, 1e-3),
        ("out/suggest.geojson", "[lines]\n", 0.05),
        ("out/suggest.gpx", "[lines]\n", 0.05),
    ];
    for (file, lines, tolerance_m) in cases {
        let text = DIVE.replace("[lines]\n", lines).replace("\"t.csv\"", &format!("\"{file}\""));
        std::fs::write(place.path("scored.toml"), text).unwrap();
        let scored = place.run("lines scored.toml --json --quiet").expect(0).json();
        for suggestion in &report.suggestions {
            let fix_m = first_segment_fix(&scored, &suggestion.name);
            let expected_m = of_offset_tracks(suggestion, 28.0);
            assert!((fix_m - expected_m).abs() <= tolerance_m, "{file}: {fix_m} {expected_m} {suggestion:?}");
            assert!(fix_m <= suggestion.fix_m + tolerance_m);
        }
    }
    // The lines are long enough to hold fix and lead, or end at the edge of the search area.
    for suggestion in &report.suggestions {
        assert!(
            suggestion.line_m >= suggestion.fix_m + 1.0
                && suggestion.line_m <= f64::max(160.0, suggestion.fix_m + 30.0)
        );
        assert!((suggestion.dive_point.distance_m(suggestion.line_end) - suggestion.line_m).abs() < 1e-6);
    }
}

#[test]
fn no_suggestion_is_an_answer_with_a_reason() {
    let run = |landmarks: &[(f64, f64)], replaced: &[(&str, &str)]| {
        let place = place(landmarks, replaced);
        let ran = place.run("suggest dive.toml --out out").expect(0);
        assert_eq!(place.names("out").len(), 6);
        (ran.stdout, read(&place))
    };
    let (text, dive) = run(&[], &[]);
    assert!(text.contains("there are no landmarks"), "{text}");
    assert!(report_of(&dive).suggestions.is_empty());
    let (text, dive) = run(&[(100.0, 100.0)], &[]);
    assert!(text.contains("meet too few landmarks"), "{text}");
    let report = report_of(&dive);
    let counted: usize = report.without_fix.iter().map(|count| count.candidates).sum();
    assert_eq!(counted + report.candidates_leaving, report.candidates);
    // A disc wider than the search area, and cells wider than it. (A dive file with a line refuses the former.)
    let mut dive = read(&place(&landmarks(70, 1), &[]));
    dive.start.scatter_m = 250.0;
    let report = report_of(&dive);
    assert!(report.verdict.contains("fits nowhere inside the search area"), "{}", report.verdict);
    assert_eq!((report.dive_points, report.candidates), (0, 0));
    dive.area.cell_m = 10_000.0;
    assert_eq!(report_of(&dive).cells, 0);
    let (text, _) = run(&landmarks(70, 1), &[("altitude_error_m = 0.3", "detection_chance = 0.9")]);
    assert!(text.contains("no certain detection"), "{text}");
}

#[test]
fn local_metres_have_no_earth_and_an_exhausted_budget_is_said() {
    let place = place(
        &landmarks(70, 6),
        &[("EPSG:32631", "local"), ("draws = 1\n", "draws = 1\ncell_budget = 100\n")],
    );
    let ran = place.run("suggest dive.toml --out out");
    assert_eq!(place.names("out"), ["suggest-lines.csv", "suggest.csv", "suggest.json", "suggest.png"]);
    let header = String::from_utf8(place.bytes("out/suggest-lines.csv")).unwrap();
    assert!(header.starts_with("line,order,easting_m,northing_m\n"), "{header}");
    let undecided = ran.stderr.contains("raise scoring.cell_budget");
    assert_eq!(ran.code, Some(if undecided { 5 } else { 0 }), "{}", ran.stderr);
}

#[test]
fn suggestions_do_not_depend_on_threads() {
    let place = place(&landmarks(70, 7), &[]);
    for threads in ["1", "2"] {
        place.run(&format!("suggest dive.toml --threads {threads} --out {threads}")).expect(0);
    }
    for name in place.names("1") {
        assert!(place.bytes(format!("1/{name}")) == place.bytes(format!("2/{name}")), "{name}");
    }
}

/// The report with suggestions all over the place, with long names of the dive.
fn crowded(seed: u64, count: usize) -> SuggestReport {
    let mut random = ChaCha8Rng::seed_from_u64(seed);
    let dive = read(&place(
        &landmarks(70, 1),
        &[
            (
                "where to dive",
                "Ein sehr langer Name für einen Tauchgang — überall gekürzt, nie abgeschnitten",
            ),
            ("listed = 6", "listed = 1"),
        ],
    ));
    let mut report = report_of(&dive);
    let first = report.suggestions[0].clone();
    report.suggestions = (1..=count)
        .map(|number| {
            let mut draw = || random.random_range(40.0..SIDE_M - 40.0);
            let at = |(e, n): (f64, f64)| LocalPoint::new(CORNER.0 + e, CORNER.1 + n);
            let (dive_point, line_end) = (at((draw(), draw())), at((draw(), draw())));
            let line_m = dive_point.distance_m(line_end);
            Suggestion {
                number,
                name: format!("S{number}"),
                dive_point,
                line_end,
                line_m,
                fix_m: 0.6 * line_m,
                ..first.clone()
            }
        })
        .collect();
    report
}

#[test]
fn texts_of_the_chart_keep_clear_of_each_other() {
    let empty = report_of(&read(&place(&[(100.0, 100.0)], &[])));
    let crowds = (0..10).map(|seed| crowded(seed, 1 + 2 * seed as usize)).chain([empty]);
    for (number, report) in crowds.enumerate() {
        for (width_px, height_px) in [(1754, 1240), (800, 560), (1240, 1754)] {
            let size = ChartSize::pixels(width_px, height_px);
            let texts = render::suggest_layout(&report, &size).unwrap();
            assert_clear(&texts, &size, &format!("{number} {size:?}"));
        }
    }
}

/// The run is drawn in the colour of its class, and in no other.
#[test]
fn the_chart_shows_the_class_of_the_run() {
    let mut report = crowded(1, 1);
    report.suggestions[0].fix_m = 150.0;
    report.suggestions[0].line_end =
        LocalPoint::new(report.suggestions[0].dive_point.east_m, CORNER.1 + SIDE_M);
    let bytes = render::suggest_png(&report, &ChartSize::default()).unwrap();
    let mut reader = png::Decoder::new(std::io::Cursor::new(bytes)).read_info().unwrap();
    let mut buffer = vec![0; reader.output_buffer_size().unwrap()];
    let width = reader.next_frame(&mut buffer).unwrap().width as usize;
    let map = |colour: (u8, u8, u8)| {
        let is_map = |(n, _): &(usize, &[u8])| n % width < width * 70 / 100;
        let pixels = buffer.chunks_exact(3).enumerate().filter(is_map);
        pixels.filter(|(_, p)| (p[0], p[1], p[2]) == colour).count()
    };
    let counts = ramp().map(map);
    assert_eq!(counts.iter().filter(|&&count| count > 0).count(), 1, "{counts:?}");
    assert!(counts.iter().sum::<usize>() > 1000, "{counts:?}");
}

#[test]
#[ignore = "writes pictures for the eye into FIXABILITY_PICTURES"]
fn write_pictures_of_suggestions() {
    let Some(folder) = std::env::var_os("FIXABILITY_PICTURES") else { return };
    let folder = std::path::PathBuf::from(folder);
    let empty = report_of(&read(&place(&[(100.0, 100.0)], &[])));
    for (name, report) in [("crowded", crowded(5, 14)), ("none", empty)] {
        let bytes = render::suggest_png(&report, &ChartSize::default()).unwrap();
        std::fs::write(folder.join(format!("suggest-{name}.png")), bytes).unwrap();
    }
}
