//! The built program as a user meets it: what it prints, what it writes, how it exits.

use std::io::Read;
use std::process::Stdio;

use sha2::{Digest, Sha256};

use crate::support::program::{Ran, Workplace, project};

const COMMANDS: [&str; 5] = ["check", "lines", "trace", "lookalikes", "completions"];

#[test]
fn help_teaches() {
    let place = Workplace::new();
    let help = place.run("--help").expect(0).stdout;
    for command in COMMANDS {
        assert!(help.contains(command), "{help}");
        let text = place.run(&format!("{command} --help")).expect(0).stdout;
        assert!(text.contains("Usage: fixability") && text.contains("--seed"), "{text}");
    }
    for code in ["0 ", "1 ", "2 ", "3 ", "4 ", "5 ", "130"] {
        assert!(help.lines().any(|line| line.trim_start().starts_with(code)), "exit code {code}: {help}");
    }
    assert!(help.contains("not for navigation"));
    let lines = place.run("lines --help").expect(0).stdout;
    for word in ["unknown start", "lines.json", "lines.csv", "lines.png", "--require", "--rank-by", "no-fix"]
    {
        assert!(lines.contains(word), "{word}: {lines}");
    }
    let trace = place.run("trace --help").expect(0).stdout;
    for word in ["trace.json", "trace.png", "--line", "--from-m", "--draw"] {
        assert!(trace.contains(word), "{word}: {trace}");
    }
}

/// A3 at 200 dots per inch: 420 mm and 297 mm over 25.4 mm.
#[test]
fn paper_and_resolution_reach_every_chart() {
    let place = Workplace::with_small_dive();
    place.run("lines dive.toml --draws 1 --out out --paper a3 --dpi 200 -q").expect(0);
    place.run("trace dive.toml --out out --paper a3 --dpi 200 -q --force").expect(0);
    place.run("lookalikes dive.toml --out out --paper a3 --dpi 200 -q --force").expect(0);
    for name in ["lines.png", "profiles.png", "trace.png", "lookalikes.png", "lookalikes-panels.png"] {
        let bytes = place.bytes(format!("out/{name}"));
        // The size stands in the first chunk of a PNG file, after 16 bytes, most significant byte first.
        let number = |at: usize| u32::from_be_bytes(bytes[at..at + 4].try_into().unwrap());
        assert_eq!((number(16), number(20)), (3307, 2339), "{name}");
    }
}

#[test]
fn wrong_command_lines_exit_with_2_and_say_why() {
    let place = Workplace::with_small_dive();
    for (arguments, word) in [
        ("frobnicate", "frobnicate"),
        ("lines", "<DIVE>"),
        ("lines dive.toml --rank-by luck", "share"),
        ("lines dive.toml --require 2", "a share from 0 to 1"),
        ("lines dive.toml --draws 0", "--draws"),
        ("lines dive.toml --threads 0", "--threads"),
        ("lines dive.toml --dpi 600", "150..=300"),
        ("lines dive.toml --paper a5", "a4, a3"),
        ("check dive.toml --out x", "--out"),
        ("trace dive.toml --from-m far", "--from-m"),
        ("completions sh", "bash"),
        ("", "Usage"),
    ] {
        let ran = place.run(arguments).expect(2);
        assert!(ran.stdout.is_empty() && ran.stderr.contains(word), "{arguments}: {}", ran.stderr);
    }
    assert_eq!(place.names("."), ["dive.toml", "landmarks.csv", "lines.csv"]);
}

#[test]
fn bad_input_exits_with_3_names_every_problem_and_writes_nothing() {
    let place = Workplace::with_small_dive();
    let dive = String::from_utf8(place.bytes("dive.toml")).unwrap();
    let landmarks = String::from_utf8(place.bytes("landmarks.csv")).unwrap();
    let place = place
        .write("dive.toml", &dive.replace("turn_radius_m = 10", "turn_radius = 10"))
        .write("landmarks.csv", &landmarks.replacen(",1.5\n", ",nan\n", 1).replacen(",1.5\n", ",-1\n", 1));
    for command in ["check", "lines", "trace"] {
        let out = if command == "check" { "" } else { "--out out" };
        let ran = place.run(&format!("{command} dive.toml {out} --quiet")).expect(3);
        assert!(ran.stdout.is_empty());
        for word in [
            "dive.toml:10: key vehicle.turn_radius",
            "turn_radius_m",
            "landmarks.csv:2: column uncertainty_m: \"nan\"",
            "landmarks.csv:3: column uncertainty_m: \"-1\" is negative",
        ] {
            assert!(ran.stderr.contains(word), "{word}: {}", ran.stderr);
        }
    }
    let missing = place.run("lines elsewhere.toml --out out").expect(3);
    assert!(missing.stderr.contains("elsewhere.toml: no such file"), "{}", missing.stderr);
    assert_eq!(place.names("."), ["dive.toml", "landmarks.csv", "lines.csv"]);
}

#[test]
fn case_35_existing_output_is_refused_without_force_and_left_as_it_was() {
    let place =
        Workplace::with_small_dive().write("out/lines.csv", "mine").write("out/notes.txt", "mine too");
    let ran = place.run("lines dive.toml --out out").expect(3);
    for word in ["out", "lines.csv", "nothing was written", "--force"] {
        assert!(ran.stderr.contains(word), "{word}: {}", ran.stderr);
    }
    assert!(!ran.stderr.contains("lines.json"), "only what is there is named: {}", ran.stderr);
    assert!(ran.stdout.is_empty());
    assert_eq!(place.names("out"), ["lines.csv", "notes.txt"]);
    assert_eq!(place.bytes("out/lines.csv"), b"mine");

    let forced = place.run("lines dive.toml --out out --force").expect(0);
    assert!(forced.stderr.contains("wrote"), "{}", forced.stderr);
    assert_eq!(place.names("out"), ["lines.csv", "lines.json", "lines.png", "notes.txt", "profiles.png"]);
    assert!(place.bytes("out/lines.csv").starts_with(b"line,"));
    assert_eq!(place.bytes("out/notes.txt"), b"mine too");

    let trace = place.run("trace dive.toml --out out").expect(0);
    assert!(trace.stdout.contains("truth inside"));
    let ran = place.run("trace dive.toml --out out").expect(3);
    assert!(ran.stderr.contains("trace.json, trace.png"), "{}", ran.stderr);
}

#[test]
fn an_output_folder_that_is_a_file_is_refused() {
    let place = Workplace::with_small_dive().write("out", "a file");
    let ran = place.run("lines dive.toml --out out").expect(3);
    assert!(ran.stderr.contains("not a folder"), "{}", ran.stderr);
    assert_eq!(place.bytes("out"), b"a file");
}

#[test]
fn without_out_nothing_is_written() {
    let place = Workplace::with_small_dive();
    for command in ["check", "lines", "trace"] {
        place.run(&format!("{command} dive.toml")).expect(0);
    }
    assert_eq!(place.names("."), ["dive.toml", "landmarks.csv", "lines.csv"]);
}

#[test]
fn json_says_what_it_is_and_what_it_was_made_from() {
    let place = Workplace::with_small_dive();
    let inputs: Vec<(String, String)> = ["dive.toml", "landmarks.csv", "lines.csv"]
        .map(|name| {
            let digest = Sha256::digest(place.bytes(name));
            (name.to_owned(), digest.iter().map(|byte| format!("{byte:02x}")).collect())
        })
        .to_vec();
    for command in ["check", "lines", "trace"] {
        let json = place.run(&format!("{command} dive.toml --json --quiet")).expect(0).json();
        assert_eq!(json["schema"], format!("fixability.{command}"));
        assert_eq!(json["schema_version"], 1);
        assert_eq!(json["tool_version"], env!("CARGO_PKG_VERSION"));
        assert_eq!(json["seed"], 11);
        assert_eq!(json["generator"], "ChaCha8");
        assert_eq!(json["coordinate_system"], "local metres");
        assert_eq!(json["parameters"]["range_max_m"], 90.0);
        assert!(json["caution"].as_str().is_some_and(|text| text.contains("not for navigation")));
        let named: Vec<(String, String)> = json["inputs"]
            .as_array()
            .expect("a list")
            .iter()
            .map(|i| (i["name"].as_str().unwrap().to_owned(), i["sha256"].as_str().unwrap().to_owned()))
            .collect();
        assert_eq!(named, inputs);
    }
    let printed = place.run("lines dive.toml --json --out out").expect(0).stdout;
    assert_eq!(printed.as_bytes(), place.bytes("out/lines.json"));
}

#[test]
fn quiet_leaves_standard_error_empty() {
    let place = Workplace::with_small_dive();
    let loud = place.run("lines dive.toml --out loud").expect(0);
    assert!(loud.stderr.contains("note: wrote"), "{}", loud.stderr);
    for arguments in ["lines dive.toml --quiet --out a", "trace dive.toml -q --out a", "check dive.toml -q"] {
        let ran = place.run(arguments).expect(0);
        assert_eq!(ran.stderr, "", "{arguments}");
        assert!(!ran.stdout.is_empty());
    }
    assert_eq!(loud.stdout, place.run("lines dive.toml --quiet").expect(0).stdout);
}

#[test]
fn the_seed_changes_results_and_repeats_them() {
    let place = Workplace::with_small_dive();
    let scores = |options: &str| {
        let json = place.run(&format!("lines dive.toml --json -q {options}")).expect(0).json();
        (json["seed"].clone(), json["lines"].to_string())
    };
    let (own, seven) = (scores(""), scores("--seed 7"));
    assert_eq!(own, scores("--seed 11"));
    assert_eq!(seven, scores("--seed 7"));
    assert_eq!(seven.0, 7);
    assert_ne!(own.1, seven.1);
}

#[test]
fn draws_and_rank_by_replace_the_settings() {
    let place = Workplace::with_small_dive();
    let json = place.run("lines dive.toml --json -q --draws 2 --rank-by no-fix").expect(0).json();
    assert_eq!(json["parameters"]["draws"], 2);
    assert_eq!(json["rank_by"], "no-fix");
    let share = |line: &serde_json::Value| line["estimated"]["no_fix_share"]["value"].as_f64().unwrap();
    let lines = json["lines"].as_array().unwrap();
    let first = lines.iter().find(|line| line["rank"] == 1).unwrap();
    assert!(lines.iter().all(|line| share(first) <= share(line)));
}

#[test]
fn an_unmet_requirement_exits_with_1_and_still_writes() {
    let place = Workplace::with_small_dive();
    let met = place.run("lines dive.toml --require 0").expect(0);
    let unmet = place.run("lines dive.toml --require 1 --out out").expect(1);
    assert_eq!(met.stdout, unmet.stdout);
    assert!(unmet.stderr.contains("below the 100.0 % asked for"), "{}", unmet.stderr);
    assert_eq!(place.names("out"), ["lines.csv", "lines.json", "lines.png", "profiles.png"]);
}

/// Fewer cells allowed than the first detection needs: the answer is "undecided", never a fix.
#[test]
fn case_29_an_exhausted_budget_exits_with_5() {
    let place = Workplace::with_small_dive();
    let dive = String::from_utf8(place.bytes("dive.toml")).unwrap() + "cell_budget = 100\n";
    let mut landmarks = String::from("id,easting,northing,uncertainty_m\n");
    for i in 0..144 {
        landmarks += &format!("G{i},{},{},1\n", 60 * (i % 12), 50 * (i / 12));
    }
    let place = place.write("dive.toml", &dive).write("landmarks.csv", &landmarks);
    let lines = place.run("lines dive.toml --json").expect(5);
    assert!(
        lines.stderr.contains("undecided") && lines.stderr.contains("scoring.cell_budget"),
        "{}",
        lines.stderr
    );
    let first = &lines.json()["lines"][0]["segments"][0]["estimated"];
    assert_eq!(first["undecided_share"], 1.0);
    assert_eq!(first["within_required_share"]["value"], 0.0);
    assert!(first["median_m"]["value"].is_null());
    let trace = place.run("trace dive.toml").expect(5);
    assert!(trace.stdout.contains("undecided"), "{}", trace.stdout);
}

#[test]
fn every_shell_gets_completions() {
    let place = Workplace::new();
    for shell in ["bash", "zsh", "fish", "powershell", "elvish"] {
        let script = place.run(&format!("completions {shell}")).expect(0).stdout;
        for word in COMMANDS.iter().chain(&["fixability", "rank-by", "from-m"]) {
            assert!(script.contains(word), "{shell}: {word}");
        }
    }
}

/// Like `fixability … | head -1`: the reader goes away, the program stops without a word.
#[test]
fn case_36_a_closed_pipe_is_no_error() {
    let place = Workplace::new();
    let dive = project("demo-data/dive.toml");
    let dive = dive.to_str().expect("a plain path");
    // The trace of the demo is longer than any pipe buffer, so that the program meets the closed end.
    let trace = Ran::of(place.command(["trace", dive, "--json", "-q"]).output().expect("starts")).expect(0);
    assert!(trace.stdout.len() > 100_000, "{}", trace.stdout.len());
    for arguments in [&["trace", dive, "--json", "-q"][..], &["--help"], &["completions", "zsh"]] {
        let mut child = place
            .command(arguments)
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("the program starts");
        drop(child.stdout.take());
        let mut stderr = String::new();
        child.stderr.take().expect("piped").read_to_string(&mut stderr).expect("text");
        assert_eq!(child.wait().expect("ends").code(), Some(0), "{arguments:?}: {stderr}");
        assert_eq!(stderr, "", "{arguments:?}");
    }
}

#[test]
fn a_trace_of_no_line_or_off_the_line_says_what_there_is() {
    let place = Workplace::with_small_dive();
    let unknown = place.run("trace dive.toml --line West --out out").expect(3);
    assert!(unknown.stderr.contains("there is no line \"West\""), "{}", unknown.stderr);
    assert!(unknown.stderr.contains("East, Back"), "{}", unknown.stderr);
    for from in ["701.2", "1e9", "nan", "inf"] {
        let off = place.run(&format!("trace dive.toml --from-m {from} --out out")).expect(3);
        assert!(off.stderr.contains("off line \"East\"; accepted: 0 to below 701.1 m"), "{}", off.stderr);
    }
    assert_eq!(place.names("."), ["dive.toml", "landmarks.csv", "lines.csv"]);
}

#[test]
fn a_trace_shows_the_run_asked_for() {
    let place = Workplace::with_small_dive();
    let json = place.run("trace dive.toml --line Back --from-m 200 --draw 3 --json -q").expect(0).json();
    assert_eq!((&json["line"], &json["from_m"], &json["draw"]), (&"Back".into(), &200.0.into(), &3.into()));
    // Draws take the error shapes in turn; number 3 of three shapes is the first again.
    assert_eq!(json["error_shape"], "uniform");
    let events = json["events"].as_array().unwrap();
    assert!(!events.is_empty());
    for event in events {
        assert_eq!(event["truth_inside"], true);
        let (run, along) = (event["run_m"].as_f64().unwrap(), event["along_m"].as_f64().unwrap());
        assert!((along - run - 200.0).abs() < 1e-9 && run >= 0.0);
    }
}

#[test]
fn case_39_names_need_not_be_ascii() {
    let place = Workplace::with_small_dive();
    let dive = String::from_utf8(place.bytes("dive.toml")).unwrap();
    let lines = String::from_utf8(place.bytes("lines.csv")).unwrap();
    let (title, name) = ("Пробный спуск № 1", "Süd–Œst 水深");
    let place = place
        .write("größe/dive.toml", &dive.replace("Small dive", title).replace("lines.csv", "línies.csv"))
        .write("größe/línies.csv", &lines.replace("East", name))
        .write("größe/landmarks.csv", &String::from_utf8(place_landmarks()).unwrap());
    let scored =
        Ran::of(place.command(["lines", "größe/dive.toml", "--out", "größe/сюда"]).output().expect("starts"))
            .expect(0);
    assert!(scored.stdout.contains(name), "{}", scored.stdout);
    assert_eq!(place.names("größe/сюда"), ["lines.csv", "lines.json", "lines.png", "profiles.png"]);
    let json: serde_json::Value = serde_json::from_slice(&place.bytes("größe/сюда/lines.json")).unwrap();
    assert_eq!((json["dive"].as_str(), json["lines"][0]["name"].as_str()), (Some(title), Some(name)));
    let traced = Ran::of(
        place
            .command(["trace", "größe/dive.toml", "--line", name, "--out", "größe/сюда"])
            .output()
            .expect("starts"),
    )
    .expect(0);
    assert!(traced.stdout.contains(name), "{}", traced.stdout);
}

/// The landmarks of the small dive.
fn place_landmarks() -> Vec<u8> {
    Workplace::with_small_dive().bytes("landmarks.csv")
}

#[test]
fn case_22_a_contradicted_dive_names_the_event_and_the_budget_that_explains_it() {
    // Many simulated strays, none of them budgeted: sooner or later nothing explains the detections.
    let place = Workplace::with_small_dive();
    let text = String::from_utf8(place.bytes("dive.toml")).unwrap();
    let place = place.write("dive.toml", &text.replace("[sonar]", "[sonar]\nstrays_per_km = 6"));
    let mut seen = 0;
    for draw in 0..6 {
        let ran = place.run(&format!("trace dive.toml --line Back --draw {draw}"));
        if ran.code != Some(4) {
            continue;
        }
        seen += 1;
        let (out, err) = (&ran.stdout, &ran.stderr);
        assert!(out.contains("no position explains the detections from event"), "{out}");
        assert!(out.contains("a stray budget of") || out.contains("no stray budget up to"), "{out}");
        assert!(!out.contains("fix after"), "an empty set is never a fix: {out}");
        assert!(err.contains("wrong but not empty is possible"), "{err}");
        // With the budget that it names the same dive is explained.
        let budget = out.split("a stray budget of ").nth(1).and_then(|rest| rest.split(' ').next());
        if let Some(budget) = budget {
            let text = String::from_utf8(place.bytes("dive.toml")).unwrap();
            let explained = Workplace::with_small_dive().write(
                "dive.toml",
                &text.replace("[start]", &format!("[budget]\nstrays = {budget}\n[start]")),
            );
            explained.run(&format!("trace dive.toml --line Back --draw {draw}")).expect(0);
        }
    }
    assert!(seen > 0, "none of the dives was contradicted");
}
