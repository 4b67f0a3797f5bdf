//! Hard cases and what happens in them, by number. Cases about reading files are in `load`, those about the command line in
//! `cli`, those about look-alikes in `alias`; [`every_case_has_a_test`] holds the list whole.

use std::fs;
use std::process::{Command, Stdio};
use std::time::Duration;

use crate::load::{Scene, holds};
use crate::support::program::{PROGRAM, Ran, Workplace, project};

/// Number of hard cases that the project answers.
const CASES: usize = 40;

/// Every case has at least one test that carries its number in its name.
#[test]
fn every_case_has_a_test() {
    let mut text = String::new();
    for folder in ["tests/suite", "tests/suite/load"] {
        for entry in fs::read_dir(project(folder)).expect("a folder") {
            let path = entry.expect("an entry").path();
            if path.extension().is_some_and(|extension| extension == "rs") {
                text += &fs::read_to_string(&path).expect("a source file");
            }
        }
    }
    let missing: Vec<usize> = (1..=CASES).filter(|n| !text.contains(&format!("fn case_{n}_"))).collect();
    assert!(missing.is_empty(), "no test for cases {missing:?}");
}

/// The small dive with pieces of its dive file replaced.
fn small_dive(swaps: &[(&str, &str)]) -> Workplace {
    let place = Workplace::with_small_dive();
    let mut text = String::from_utf8(place.bytes("dive.toml")).expect("text");
    for (from, to) in swaps {
        assert!(text.contains(from), "the dive file has no {from:?}");
        text = text.replacen(from, to, 1);
    }
    place.write("dive.toml", &text)
}

#[test]
fn case_15_overlapping_boxes_are_kept_and_named_as_clusters() {
    let reef = "id,easting,northing,uncertainty_m\n\
        A,500100,6200100,2\nB,500103,6200100,2\nC,500106,6200101,2\nD,500500,6200120,3\nE,500502,6200118,3\nF,500700,6200080,2\n";
    let scene = Scene::new().file("reef.csv", reef);
    holds(
        &scene.notices(),
        &[
            "warning: reef.csv: 5 landmarks whose box overlaps another's",
            "cannot be told apart by position",
            "A + B + C; D + E",
        ],
    );
    assert_eq!(scene.dive().landmarks.len(), 6, "all are kept");
}

#[test]
fn case_19_tight_turns_detect_nothing_and_the_output_says_so() {
    let bent = "line,easting,northing\nBent,0,220\nBent,350,240\nBent,350,560\n";
    let place = small_dive(&[("turn_radius_m = 10", "turn_radius_m = 60")]).write("lines.csv", bent);
    let said = place.run("check dive.toml").expect(0).stdout;
    holds(&said, &["line Bent:", "m lie in turns, where no landmark is detected (sonar.detect_in_turns)"]);
    let json = place.run("check dive.toml --json").expect(0).json();
    assert!(json["lines"][0]["blind_turn_m"].as_f64().expect("a number") > 80.0);
    let seeing = small_dive(&[
        ("turn_radius_m = 10", "turn_radius_m = 60"),
        ("altitude_m = 8", "altitude_m = 8\ndetect_in_turns = true"),
    ])
    .write("lines.csv", bent);
    let json = seeing.run("check dive.toml --json").expect(0).json();
    assert_eq!(json["lines"][0]["blind_turn_m"], 0.0);
}

/// A dive with as many strays as one wants: the program knows only its budget.
fn stray_dive(per_km: u32, budget: u32) -> Workplace {
    let budget = format!("[budget]\nstrays = {budget}\n[start]");
    small_dive(&[("[sonar]", &format!("[sonar]\nstrays_per_km = {per_km}")), ("[start]", &budget)])
}

#[test]
fn case_23_more_strays_than_the_budget_may_leave_a_wrong_set_and_the_output_says_so() {
    let place = stray_dive(8, 0);
    let mut wrong = 0;
    for draw in 0..20 {
        let ran = place.run(&format!("trace dive.toml --line Back --draw {draw} --json"));
        let json = ran.json();
        let events = json["events"].as_array().expect("events");
        // A set that is not empty and does not hold the truth is what the warning is about.
        wrong += usize::from(events.iter().any(|e| e["cells"] != 0 && e["truth_inside"] == false));
        if ran.code == Some(4) {
            assert!(ran.stderr.contains("wrong but not empty is possible too"), "{}", ran.stderr);
        }
    }
    assert!(wrong > 0, "no dive was misled");
    let lines = place.run("lines dive.toml --draws 20");
    holds(&lines.stderr, &["more strays were drawn than the stray budget"]);
}

#[test]
fn case_24_an_unmapped_rock_uses_the_stray_budget() {
    let place = stray_dive(2, 3);
    let mut strays = 0;
    for draw in 0..12 {
        let json = place.run(&format!("trace dive.toml --line Back --draw {draw} --json")).expect(0).json();
        let events = json["events"].as_array().expect("events");
        let unmapped = events.iter().filter(|e| e["true_landmark"] == "stray").count();
        if unmapped > 3 {
            continue;
        }
        strays += unmapped;
        for event in events {
            assert_eq!(event["truth_inside"], true, "draw {draw}: {event}");
        }
        assert!(json["contradiction"].is_null());
    }
    assert!(strays > 5, "{strays}");
}

#[test]
fn case_25_nothing_seen_is_evidence_only_when_detection_is_certain_and_the_map_complete() {
    let wanted = Scene::new().swap("strays = 0", "strays = 0\nnothing_seen = true");
    holds(&wanted.errors(), &["budget.nothing_seen", "needs map.complete_inside"]);
    let uncertain = Scene::new()
        .swap("strays = 0", "strays = 0\nnothing_seen = true")
        .swap("range_max_m = 100", "range_max_m = 100\ndetection_chance = 0.9");
    holds(&uncertain.errors(), &["sonar.detection_chance is below 1"]);
    let gone = Scene::new()
        .swap("strays = 0", "strays = 0\nnothing_seen = true")
        .swap("uncertainty = \"bound\"", "uncertainty = \"bound\"\ngone_chance = 0.1");
    holds(&gone.errors(), &["map.gone_chance is above 0"]);
    // Off by default, and said so.
    let json = Workplace::with_small_dive().run("check dive.toml --json").expect(0).json();
    assert_eq!(json["parameters"]["nothing_seen"], false);
}

#[test]
fn case_26_a_common_shift_widens_the_start_and_is_never_called_found() {
    let plain = Scene::new();
    let shifted =
        Scene::new().swap("uncertainty = \"bound\"", "uncertainty = \"bound\"\ncommon_shift_m = 15");
    holds(
        &shifted.notices(),
        &[
            "common shift of the whole map of up to 15",
            "cannot be found from relative positions",
            "add it to every absolute position",
        ],
    );
    let (before, after) = (plain.dive(), shifted.dive());
    assert_eq!(after.start.scatter_m, before.start.scatter_m);
    assert!(after.start.scatter_on_map_m() >= before.start.scatter_m + 15.0);
    // The search area has grown by the shift on every side, and by no more than rounding beyond it.
    let west = |dive: &fixability::dive::Dive| {
        dive.start.search_area.iter().map(|p| p.east_m).fold(f64::INFINITY, f64::min)
    };
    let grown = west(&before) - west(&after);
    assert!((15.0..15.001).contains(&grown), "{grown}");
    // Nothing else differs: boxes and places are those of the map.
    assert_eq!(before.landmarks, after.landmarks);
}

/// A stated search area grows too: a vehicle at its edge on the Earth is outside it on a shifted map.
#[test]
fn case_26_a_stated_search_area_grows_by_the_shift() {
    let square = r#"{"type":"Polygon","coordinates":[[[0,150],[700,150],[700,500],[0,500],[0,150]]]}"#;
    let with = |shift: &str| {
        small_dive(&[
            ("uncertainty = \"bound\"", &format!("uncertainty = \"bound\"\ncommon_shift_m = {shift}")),
            ("scatter_m = 10", "scatter_m = 0\nsearch_area = \"area.geojson\"\ncrs = \"local\""),
        ])
        .write("area.geojson", square)
    };
    let km2 = |place: &Workplace| {
        place.run("check dive.toml --json").expect(0).json()["parameters"]["search_area_km2"]
            .as_f64()
            .expect("a number")
    };
    assert!((km2(&with("0")) - 0.7 * 0.35).abs() < 1e-9);
    assert!((km2(&with("20")) - 0.74 * 0.39).abs() < 1e-9);
}

#[test]
fn case_27_old_landmarks_are_left_out_on_request_and_counted() {
    let reef = "id,easting,northing,uncertainty_m,surveyed\n\
        A,500100,6200100,2,2019-04-01\nB,500300,6200050,2,2026-03-01\nC,500500,6200120,3,\nD,500700,6200080,2,2026-03-02\n";
    let limit = "uncertainty = \"bound\"\noldest_survey = 2024-01-01";
    let scene = Scene::new().file("reef.csv", reef).swap("uncertainty = \"bound\"", limit);
    holds(
        &scene.notices(),
        &[
            "warning: reef.csv: 1 landmark of 4 surveyed before 2024-01-01 left out: A",
            "a stray, so allow for them in budget.strays",
            "1 landmark without a survey date kept",
        ],
    );
    assert_eq!(scene.dive().landmarks.iter().map(|l| l.id.as_str()).collect::<Vec<_>>(), ["B", "C", "D"]);
    let undated = Scene::new().swap("uncertainty = \"bound\"", limit);
    holds(&undated.errors(), &["map.oldest_survey", "no landmark has a survey date of its own"]);
    let garbled = Scene::new()
        .file("reef.csv", reef.replace("2026-03-01", "1.3.2026"))
        .swap("uncertainty = \"bound\"", limit);
    holds(&garbled.errors(), &["reef.csv:3", "column surveyed", "\"1.3.2026\" is not a date", "2026-05-31"]);
    let geojson = r#"{"type":"FeatureCollection","features":[
        {"type":"Feature","geometry":{"type":"Point","coordinates":[3.001,55.9]},"properties":{"id":"A","uncertainty_m":1,"surveyed":"2018-01-01"}},
        {"type":"Feature","geometry":{"type":"Point","coordinates":[3.003,55.9]},"properties":{"id":"B","uncertainty_m":1,"surveyed":"yesterday"}}]}"#;
    let scene = Scene::new()
        .file("reef.geojson", geojson)
        .swap("landmarks = \"reef.csv\"", "landmarks = \"reef.geojson\"")
        .swap("crs = \"EPSG:32631\"", "crs = \"EPSG:4326\"")
        .swap("uncertainty = \"bound\"", limit);
    holds(&scene.errors(), &["feature 2", "property surveyed: \"yesterday\" is not a date"]);
}

/// Drop-out: landmarks that are no longer there cost the guarantee unless misses are budgeted, and never the truth.
#[test]
fn case_27_landmarks_that_may_be_gone_need_a_miss_budget() {
    let gone = ("uncertainty = \"bound\"", "uncertainty = \"bound\"\ngone_chance = 0.2");
    let plain = Workplace::with_small_dive().run("trace dive.toml --line Back --json").expect(0).json();
    let dropped = small_dive(&[gone]).run("trace dive.toml --line Back --json").expect(0).json();
    let seen = |json: &serde_json::Value| json["events"].as_array().expect("events").len();
    assert!(seen(&dropped) < seen(&plain), "{} of {}", seen(&dropped), seen(&plain));
    for draw in 0..10 {
        let json = small_dive(&[gone])
            .run(&format!("trace dive.toml --line Back --draw {draw} --json"))
            .expect(0)
            .json();
        for event in json["events"].as_array().expect("events") {
            assert_eq!(event["truth_inside"], true);
        }
    }
    let without = small_dive(&[gone]).run("lines dive.toml --json").expect(0).json();
    let first = &without["lines"][0]["segments"][0]["guaranteed"];
    assert_eq!(first["cause"], "detection-not-certain");
    holds(first["reason"].as_str().expect("text"), &["chance 0.2 that a landmark is gone", "budget.misses"]);
    let budgeted = small_dive(&[gone, ("[start]", "[budget]\nmisses = 2\n[start]")]);
    let with = budgeted.run("lines dive.toml --json").expect(0).json();
    assert_ne!(with["lines"][0]["segments"][0]["guaranteed"]["cause"], "detection-not-certain");
}

/// Undecided is neither a fix nor silence: it is counted, named and has its own exit code, in every analysis.
#[test]
fn case_29_a_reached_limit_is_undecided_in_every_analysis() {
    let mut grid = String::from("id,easting,northing,uncertainty_m\n");
    for i in 0..144 {
        grid += &format!("G{i},{},{},1\n", 60 * (i % 12), 50 * (i / 12));
    }
    let place = small_dive(&[(
        "seed = 11",
        "seed = 11\ncell_budget = 100\n[area]\nheadings = 4\ncell_m = 100\n[budget]\nstrays = 1",
    )])
    .write("landmarks.csv", &grid);
    let area = place.run("area dive.toml --json").expect(5);
    assert!(area.stderr.contains("some runs are undecided"), "{}", area.stderr);
    let lines = place.run("lines dive.toml --json").expect(5).json();
    assert_eq!(lines["lines"][0]["segments"][0]["estimated"]["undecided_share"], 1.0);
    assert_eq!(lines["lines"][0]["guaranteed"]["within_required_share"], 0.0);
}

/// A fix that is lost again is counted as a relapse, and the lasting fix comes after it.
#[test]
fn case_30_a_relapse_is_counted_and_the_lasting_fix_comes_later() {
    let dive = project("demo-data/dive.toml");
    let (mut relapsed, mut held) = (0, 0);
    for draw in 0..30 {
        let out = Command::new(PROGRAM)
            .args([
                "trace",
                dive.to_str().expect("a path"),
                "--line",
                "B",
                "--json",
                "-q",
                "--draw",
                &draw.to_string(),
            ])
            .stdin(Stdio::null())
            .output()
            .expect("the program starts");
        let json = Ran::of(out).expect(0).json();
        let first = json["fix_distance_m"].as_f64();
        let lasting = json["lasting_fix_distance_m"].as_f64();
        if json["relapses"].as_u64().expect("a count") > 0 {
            relapsed += 1;
            assert!(first.is_some());
            assert!(lasting.is_none_or(|lasting| lasting > first.expect("a fix before a relapse")));
        } else {
            held += 1;
            assert_eq!(first, lasting);
        }
    }
    assert!(relapsed > 0 && relapsed + held == 30, "{relapsed} {held}");
}

/// Nothing out of n draws is not zero (Clopper and Pearson 1934: upper end 1 − 0.025^(1/n) at two-sided 95 %), and one
/// draw tells next to nothing.
#[test]
fn case_31_few_draws_have_wide_intervals_and_none_are_refused() {
    let place = Workplace::with_small_dive();
    for draws in [1, 5, 20] {
        let json = place.run(&format!("lines dive.toml --json --draws {draws}")).expect(0).json();
        let mut certain = 0;
        for line in json["lines"].as_array().expect("lines") {
            for segment in line["segments"].as_array().expect("segments") {
                let share = &segment["estimated"]["within_required_share"];
                let [value, low, high] =
                    ["value", "low", "high"].map(|key| share[key].as_f64().expect("a number"));
                assert!(low <= value && value <= high);
                let end = 1.0 - 0.025f64.powf(1.0 / f64::from(draws));
                if value == 0.0 {
                    assert!((high - end).abs() < 1e-6, "{high} {end}");
                    certain += 1;
                } else if value == 1.0 {
                    assert!((low - (1.0 - end)).abs() < 1e-6);
                    certain += 1;
                }
            }
        }
        assert!(certain > 0);
    }
    let none = place.run("lines dive.toml --draws 0").expect(2);
    assert!(none.stderr.contains("--draws"), "{}", none.stderr);
}

/// There is no resuming: an interrupted run leaves nothing that a later one could take up with other inputs, and every
/// result names its inputs by fingerprint.
#[test]
fn case_33_nothing_is_resumed_and_results_name_their_inputs() {
    let place = Workplace::with_small_dive();
    let mut child = place
        .command(["lines", "dive.toml", "--out", "out", "--draws", "5000", "-q"])
        .stdout(Stdio::null())
        .stderr(Stdio::null())
        .spawn()
        .expect("the program starts");
    std::thread::sleep(Duration::from_millis(300));
    child.kill().expect("still running");
    child.wait().expect("ends");
    assert!(!place.path("out").exists() || place.names("out").is_empty(), "half a result is left");
    let before = place.run("lines dive.toml --json").expect(0).json();
    let lines = String::from_utf8(place.bytes("lines.csv")).expect("text").replace("700,260", "700,261");
    let place = place.write("lines.csv", &lines);
    let after = place.run("lines dive.toml --json").expect(0).json();
    let fingerprint = |json: &serde_json::Value, number: usize| json["inputs"][number]["sha256"].clone();
    assert_eq!(fingerprint(&before, 1), fingerprint(&after, 1), "the landmarks are the same");
    assert_ne!(fingerprint(&before, 2), fingerprint(&after, 2), "the lines are not");
}

/// A disk that fills up (here: a limit on the size of files, which fails a write in the same way): a clear message, exit
/// code 3, the old files as they were, and nothing else left behind.
#[cfg(unix)]
#[test]
fn case_34_a_write_that_fails_leaves_the_old_files_whole() {
    let place = Workplace::with_small_dive();
    place.run("lines dive.toml --out out --seed 1").expect(0);
    let names = place.names("out");
    let old: Vec<Vec<u8>> = names.iter().map(|name| place.bytes(format!("out/{name}"))).collect();
    // 16 blocks of 512 or 1024 bytes: more than the table needs, less than the picture.
    let script =
        format!("trap '' XFSZ; ulimit -f 16; exec '{PROGRAM}' lines dive.toml --out out --force --seed 2");
    let output = Command::new("sh")
        .args(["-c", &script])
        .current_dir(place.path("."))
        .stdin(Stdio::null())
        .output()
        .expect("a shell");
    let ran = Ran::of(output).expect(3);
    holds(&ran.stderr, &["error: ", "write this file"]);
    assert_eq!(place.names("out"), names, "a temporary file is left");
    for (name, bytes) in names.iter().zip(&old) {
        assert!(*bytes == place.bytes(format!("out/{name}")), "{name} has changed");
    }
}

/// Killed at any moment: each file is the old one or the new one, whole.
#[test]
fn case_34_a_killed_run_leaves_each_file_old_or_new() {
    let place = Workplace::with_small_dive();
    place.run("lines dive.toml --out new --seed 2").expect(0);
    let start = std::time::Instant::now();
    place.run("lines dive.toml --out out --seed 1").expect(0);
    let whole = start.elapsed();
    let names = place.names("out");
    let old: Vec<Vec<u8>> = names.iter().map(|name| place.bytes(format!("out/{name}"))).collect();
    for part in 1..=12u32 {
        for (name, bytes) in names.iter().zip(&old) {
            fs::write(place.path(format!("out/{name}")), bytes).expect("the old file back");
        }
        let mut child = place
            .command(["lines", "dive.toml", "--out", "out", "--force", "--seed", "2", "-q"])
            .stdout(Stdio::null())
            .spawn()
            .expect("the program starts");
        // Spread over the run, its end included, where the files are put in place.
        std::thread::sleep(whole * part / 12);
        let _ = child.kill();
        child.wait().expect("ends");
        for (name, bytes) in names.iter().zip(&old) {
            let now = place.bytes(format!("out/{name}"));
            assert!(now == *bytes || now == place.bytes(format!("new/{name}")), "{name} is torn");
        }
    }
}
