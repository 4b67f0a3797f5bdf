//! The README: its commands run, its tables are those of the program, its pictures are current. And the table of
//! layers in DEVELOPERS.md is the one that is enforced.
//!
//! Parts between `<!-- begin: … -->` and `<!-- end: … -->` and the pictures in `reports/` are made here:
//! `FIXABILITY_WRITE_REPORTS=1 cargo test --release --test suite readme` writes them anew.

use std::collections::{BTreeMap, BTreeSet};
use std::fs;
use std::sync::LazyLock;

use fixability::bounds::{self, KEYS, Need};
use fixability::dive::Dive;
use fixability::frame::{MERIDIAN_LIMIT_DEG, MERIDIAN_WARN_DEG};
use fixability::render::ChartSize;
use fixability::report::TRACE_CELLS_MAX;

use crate::support::program::{Ran, Workplace, project};

/// Set to 1 to write the made parts of the README and `reports/` instead of failing.
const WRITE: &str = "FIXABILITY_WRITE_REPORTS";
const MAIN_JOB: &str = "cargo run --release -- lines demo-data/dive.toml --out demo-out";
const TESTS: &str = "tests/run";
/// What stands before the program's own arguments.
const CARGO_RUN: &str = "cargo run --release -- ";
/// Pictures of `reports/` and the outputs that they are.
const PICTURES: [(&str, &str); 6] = [
    ("reports/lines.png", "demo-out/lines.png"),
    ("reports/trace.png", "demo-out/trace.png"),
    ("reports/lookalikes.png", "demo-out/lookalikes.png"),
    ("reports/lookalikes-panels.png", "demo-out/lookalikes-panels.png"),
    ("reports/area-best.png", "demo-out/area-best.png"),
    ("reports/remap.png", "demo-out/remap.png"),
];

/// A fenced block: language, file name (may be empty), text.
struct Block {
    language: String,
    name: String,
    text: String,
}

/// The README and what its commands did, in the order in which it gives them.
struct Readme {
    on_disk: String,
    made: String,
    ran: Vec<(String, Ran)>,
    outputs: BTreeMap<String, Vec<u8>>,
}

static README: LazyLock<Readme> = LazyLock::new(|| {
    let on_disk = fs::read_to_string(project("README.md")).expect("there is a README");
    let mut place = Workplace::new();
    for entry in fs::read_dir(project("demo-data")).expect("the demo") {
        let path = entry.expect("an entry").path();
        let name = path.file_name().expect("a name").to_string_lossy().into_owned();
        place = place.write(format!("demo-data/{name}"), &fs::read_to_string(path).expect("text"));
    }
    let blocks = blocks(&on_disk);
    for block in blocks.iter().filter(|block| !block.name.is_empty()) {
        place = place.write(&block.name, &block.text);
    }
    let ran: Vec<(String, Ran)> = commands(&blocks)
        .into_iter()
        .filter_map(|command| {
            let arguments = command.strip_prefix(CARGO_RUN)?;
            let ran = place.run(arguments);
            Some((command, ran))
        })
        .collect();
    let mut outputs = BTreeMap::new();
    for folder in ["demo-out", "results"] {
        for name in place.names(folder) {
            let name = format!("{folder}/{name}");
            outputs.insert(name.clone(), place.bytes(&name));
        }
    }
    let printed = |part: &str| {
        let (_, ran) = ran.iter().find(|(command, _)| command.contains(part)).expect("the command is there");
        format!("```text\n{}```", ran.stdout)
    };
    let mut made = on_disk.clone();
    for (part, text) in [
        ("demo ranking", printed("lines demo-data/dive.toml")),
        ("demo look-alikes", printed("lookalikes demo-data/dive.toml")),
        ("example ranking", printed("lines mydive.toml")),
        ("keys", keys_table()),
    ] {
        made = with_part(&made, part, &text);
    }
    if std::env::var(WRITE).is_ok_and(|value| value == "1") {
        fs::write(project("README.md"), &made).expect("the README can be written");
        for (picture, output) in PICTURES {
            fs::write(project(picture), &outputs[output]).expect("the picture can be written");
        }
        return Readme { on_disk: made.clone(), made, ran, outputs };
    }
    Readme { on_disk, made, ran, outputs }
});

/// Fenced blocks of a Markdown text.
fn blocks(text: &str) -> Vec<Block> {
    let mut found: Vec<Block> = Vec::new();
    let mut open = false;
    for line in text.lines() {
        match line.strip_prefix("```") {
            Some(_) if open => open = false,
            Some(info) => {
                let (language, name) = info.split_once(' ').unwrap_or((info, ""));
                found.push(Block { language: language.into(), name: name.into(), text: String::new() });
                open = true;
            }
            None if open => {
                let block = found.last_mut().expect("a block is open");
                block.text += line;
                block.text.push('\n');
            }
            None => {}
        }
    }
    assert!(!open, "a fenced block is not closed");
    found
}

fn commands(blocks: &[Block]) -> Vec<String> {
    let shell = blocks.iter().filter(|block| block.language == "sh");
    shell.flat_map(|block| block.text.lines()).map(str::to_owned).collect()
}

/// The text with the part between its marks replaced.
fn with_part(text: &str, part: &str, new: &str) -> String {
    let (begin, end) = (format!("<!-- begin: {part} -->"), format!("<!-- end: {part} -->"));
    let at = |mark: &str| text.find(mark).unwrap_or_else(|| panic!("the README has no {mark}"));
    format!("{}\n\n{new}\n\n{}", &text[..at(&begin) + begin.len()], &text[at(&end)..])
}

fn keys_table() -> String {
    let mut table = String::from("| key | accepts | default | meaning |\n|---|---|---|---|");
    for key in KEYS {
        let need = match key.need {
            Need::Required => "**required**".to_owned(),
            Need::Default(text) => format!("`{text}`"),
            Need::Without(text) => format!("none: {text}"),
        };
        table += &format!("\n| `{}` | {} | {need} | {} |", key.full_name(), key.accepted(), key.meaning);
    }
    table
}

/// The text from one heading or sentence to the next heading or table of columns.
fn section<'a>(text: &'a str, start: &str) -> &'a str {
    let from = text.find(start).unwrap_or_else(|| panic!("no \"{start}\"")) + start.len();
    let rest = &text[from..];
    let ends = ["\n## ", "\nColumns of `"].map(|end| rest.find(end).unwrap_or(rest.len()));
    let length = ends[0].min(ends[1]);
    &text[from..from + length]
}

/// Cells of the table rows of a text, headers and rules left out.
fn rows(text: &str) -> Vec<Vec<String>> {
    let lines: Vec<&str> = text.lines().filter(|line| line.starts_with('|')).collect();
    let is_rule = |line: &str| line.starts_with("|---");
    let is_head = |i: usize| lines.get(i + 1).is_some_and(|next| is_rule(next));
    (0..lines.len())
        .filter(|&i| !is_rule(lines[i]) && !is_head(i))
        .map(|i| lines[i].trim_matches('|').split('|').map(|cell| cell.trim().to_owned()).collect())
        .collect()
}

/// Words in backticks.
fn quoted(text: &str) -> Vec<String> {
    text.split('`').skip(1).step_by(2).map(str::to_owned).collect()
}

#[test]
fn the_job_comes_first_then_the_two_commands() {
    let text = &README.on_disk;
    let mut paragraphs = text.split("\n\n");
    assert_eq!(paragraphs.next(), Some("# Fixability"));
    let job = paragraphs.next().expect("a paragraph");
    assert!(job.starts_with("Fixability helps") && job.contains("chart") && !job.contains('#'), "{job}");
    let given = commands(&blocks(text));
    assert_eq!(&given[..2], [MAIN_JOB, TESTS]);
    let gate = fs::read_to_string(project(".ci/run")).expect("there is a gate");
    let main_job = MAIN_JOB.strip_suffix("demo-out").expect("it ends so");
    assert!(gate.contains(main_job) && gate.contains(TESTS), "the gate runs the README's commands");
}

#[test]
fn every_command_of_the_readme_runs() {
    let given = commands(&blocks(&README.on_disk));
    assert_eq!(README.ran.len() + 1, given.len(), "only \"{TESTS}\" is not run by itself: {given:?}");
    for (command, ran) in &README.ran {
        assert_eq!(ran.code, Some(0), "{command}\n{}\n{}", ran.stdout, ran.stderr);
        assert!(!ran.stdout.is_empty(), "{command}");
        assert!(!ran.stderr.contains("warning"), "{command} warns: {}", ran.stderr);
    }
    let names: Vec<&str> = README.outputs.keys().map(String::as_str).collect();
    let scores = ["lines.csv", "lines.geojson", "lines.json", "lines.png", "profiles.png", "recommended.gpx"];
    let others = [
        "area-best.png",
        "area-share.png",
        "area-worst.png",
        "area.csv",
        "area.json",
        "area.tif",
        "lookalikes-panels.png",
        "lookalikes.csv",
        "lookalikes.geojson",
        "lookalikes.json",
        "lookalikes.png",
        "remap.csv",
        "remap.geojson",
        "remap.json",
        "remap.png",
        "trace.json",
        "trace.png",
    ];
    let mut all: Vec<String> = scores.iter().chain(&others).map(|name| format!("demo-out/{name}")).collect();
    all.extend(scores.iter().map(|name| format!("results/{name}")));
    all.sort();
    assert_eq!(names, all);
}

#[test]
fn tables_and_results_are_those_of_the_program() {
    assert!(
        README.on_disk == README.made,
        "the key table or a ranking in README.md is out of date; {WRITE}=1 cargo test --release --test suite readme \
         writes it anew"
    );
}

#[test]
fn every_key_is_in_the_readme() {
    let table = section(&README.on_disk, "\n## Keys of the dive file");
    let listed: Vec<String> = rows(table).iter().flat_map(|row| quoted(&row[0])).collect();
    let known: Vec<String> = KEYS.iter().map(bounds::Key::full_name).collect();
    assert_eq!(listed, known);
}

/// Differences that another processor's arithmetic may cause at the edges of shapes: one pixel in a thousand.
const PIXELS_THAT_MAY_DIFFER: f64 = 1e-3;

fn pixels(bytes: &[u8]) -> (u32, u32, Vec<u8>) {
    let mut reader = png::Decoder::new(std::io::Cursor::new(bytes)).read_info().expect("a PNG file");
    let mut pixels = vec![0; reader.output_buffer_size().expect("it fits into memory")];
    let info = reader.next_frame(&mut pixels).expect("a whole picture");
    pixels.truncate(info.buffer_size());
    (info.width, info.height, pixels)
}

#[test]
fn pictures_of_the_readme_are_current() {
    for (picture, output) in PICTURES {
        assert!(README.on_disk.contains(&format!("]({picture})")), "{picture} is shown");
        let (width, height, shown) = pixels(&fs::read(project(picture)).expect(picture));
        let (now_width, now_height, now) = pixels(&README.outputs[output]);
        assert_eq!((width, height, shown.len()), (now_width, now_height, now.len()), "{picture}");
        let differing = shown.iter().zip(&now).filter(|(a, b)| a != b).count();
        let share = differing as f64 / now.len() as f64;
        assert!(
            share <= PIXELS_THAT_MAY_DIFFER,
            "{picture} is out of date ({share:.4} of it differs); {WRITE}=1 cargo test --release --test suite readme \
             writes it anew"
        );
    }
}

/// Names after `names: &[` in a source of the readers.
fn names_in_source(file: &str) -> BTreeSet<String> {
    let text = fs::read_to_string(project(file)).expect(file);
    let lists = text.split("names: &[").skip(1).map(|rest| rest.split(']').next().unwrap_or(""));
    lists.flat_map(|list| list.split('"').skip(1).step_by(2).map(str::to_owned).collect::<Vec<_>>()).collect()
}

#[test]
fn every_column_name_is_listed() {
    let listed: BTreeSet<String> = column_rows().into_iter().flat_map(|(names, _)| names).collect();
    let mut known = BTreeSet::new();
    for file in ["src/map/csv.rs", "src/track/csv.rs", "src/input/position.rs"] {
        let names = names_in_source(file);
        assert!(names.len() > 5, "{file}: is the scan still reading the lists? {names:?}");
        known.extend(names);
    }
    assert_eq!(listed, known);
}

/// Names of each column in the README with the kind of file they belong to.
fn column_rows() -> Vec<(Vec<String>, String)> {
    let table = section(&README.on_disk, "\n## Landmark and line files");
    rows(table).into_iter().map(|row| (quoted(&format!("{} {}", row[0], row[1])), row[2].clone())).collect()
}

const DIVE: &str = "\
name = \"columns\"
[map]
landmarks = \"l.csv\"
crs = \"CRS\"
uncertainty = \"bound\"
uncertainty_m = 2
[lines]
files = [\"t.csv\"]
[vehicle]
speed_mps = 1
[dead_reckoning]
scale_error_pct = 1
heading_bias_deg = 1
heading_noise_deg = 1
[sonar]
kind = \"side-looking\"
range_max_m = 100
range_error_m = 1
bearing_error_deg = 1
[scoring]
fix_size_m = 20
required_fix_m = 500
";

/// Every name in the table, put into a header in place of the first one, is read and used.
#[test]
fn every_listed_column_name_is_read() {
    let mut tried = 0;
    for (names, files) in column_rows() {
        let is_geographic = ["lat", "lon"].contains(&names[0].as_str());
        let (crs, places) =
            if is_geographic { ("EPSG:4326", "lat,lon") } else { ("local", "easting,northing") };
        let (a, b, c) = if is_geographic {
            ("50.001,2.001", "50.002,2.002", "50.001,2.005")
        } else {
            ("10,20", "80,90", "10,300")
        };
        let axes = names[0].starts_with("uncertainty_east") || names[0].starts_with("uncertainty_north");
        let (unc, value) =
            if axes { ("uncertainty_east_m,uncertainty_north_m", "1,2") } else { ("uncertainty_m", "1") };
        let landmarks = format!("id,{places},{unc}\nA,{a},{value}\nB,{b},{value}\nC,{c},{value}\n");
        let lines = format!("line,order,{places}\nL,1,{a}\nL,2,{c}\n");
        for name in &names {
            let renamed = |text: &str| {
                let (head, rest) = text.split_once('\n').expect("a header");
                let head: Vec<&str> =
                    head.split(',').map(|h| if h == names[0] { name.as_str() } else { h }).collect();
                format!("{}\n{rest}", head.join(","))
            };
            let in_landmarks = files == "landmarks" || files == "both";
            let in_lines = files == "lines" || files == "both";
            assert!(in_landmarks || in_lines, "{files}");
            let place = Workplace::new()
                .write("dive.toml", &DIVE.replace("CRS", crs))
                .write("l.csv", &if in_landmarks { renamed(&landmarks) } else { landmarks.clone() })
                .write("t.csv", &if in_lines { renamed(&lines) } else { lines.clone() });
            let dive = Dive::read(&place.path("dive.toml")).unwrap_or_else(|e| panic!("{name}: {e}"));
            let unused = dive.notices.iter().find(|notice| notice.text.contains("not used"));
            assert!(unused.is_none(), "{name}: {unused:?}");
            assert_eq!(dive.landmarks[0].id, "A", "{name}");
            tried += 1;
        }
    }
    assert!(tried > 40, "{tried}");
}

#[test]
fn columns_of_the_files_are_those_written() {
    for file in ["lines.csv", "area.csv", "lookalikes.csv", "suggest.csv", "sensitivity.csv"] {
        let heading = format!("\nColumns of `{file}`");
        let table = section(&README.on_disk, &heading);
        // The tables of several files stand in one section.
        let table = table.split("\nColumns of `").next().expect("the beginning");
        let listed: Vec<String> = rows(table).iter().flat_map(|row| quoted(&row[0])).collect();
        let mut reader = csv::Reader::from_reader(README.outputs[&format!("demo-out/{file}")].as_slice());
        let written: Vec<String> = reader.headers().expect("a header").iter().map(str::to_owned).collect();
        let (listed_set, written_set): (BTreeSet<_>, BTreeSet<_>) =
            (listed.iter().collect(), written.iter().collect());
        assert_eq!(listed_set, written_set, "{file}");
        assert_eq!(listed.len(), written.len(), "{file}");
    }
}

#[test]
fn columns_of_the_regions_are_those_written() {
    let listed: Vec<String> = rows(section(&README.on_disk, "\nColumns of `remap.csv`:"))
        .iter()
        .flat_map(|row| quoted(&row[0]))
        .collect();
    let mut reader = csv::Reader::from_reader(README.outputs["demo-out/remap.csv"].as_slice());
    let written: Vec<String> = reader.headers().expect("a header").iter().map(str::to_owned).collect();
    assert_eq!(listed, written);
}

#[test]
fn exit_codes_are_those_of_the_help() {
    let help = Workplace::new().run("--help").expect(0).stdout;
    let codes = help.split("Exit codes:").nth(1).expect("the help lists them");
    let of_help: Vec<String> = codes
        .lines()
        .skip(1)
        .take_while(|line| !line.trim().is_empty())
        .map(|line| line.split_whitespace().next().expect("a code").to_owned())
        .collect();
    let of_readme: Vec<String> =
        rows(section(&README.on_disk, "\n## Exit codes")).into_iter().map(|row| row[0].clone()).collect();
    assert_eq!(of_readme, of_help);
}

#[test]
fn commands_and_options_are_those_of_the_help() {
    let place = Workplace::new();
    let words = |text: &str| -> BTreeSet<String> {
        text.split(|c: char| !(c.is_ascii_alphanumeric() || c == '-'))
            .filter(|word| word.starts_with("--") && word.len() > 2)
            .map(str::to_owned)
            .collect()
    };
    let table = rows(section(&README.on_disk, "\n## Commands and options"));
    let first: String = table.iter().map(|row| format!("{} ", row[0])).collect();
    let mut known = BTreeSet::new();
    for command in [
        "",
        "check",
        "lines",
        "area",
        "trace",
        "lookalikes",
        "remap",
        "suggest",
        "sensitivity",
        "completions",
    ] {
        let help = place.run(&format!("{command} --help")).expect(0).stdout;
        let listed: BTreeSet<String> = help
            .lines()
            .map(str::trim_start)
            .filter(|line| line.starts_with('-'))
            .flat_map(|line| words(line.split("  ").next().unwrap_or("")))
            .collect();
        known.extend(listed);
        assert!(command.is_empty() || first.contains(&format!("`{command} ")), "{command}");
    }
    assert!(known.len() > 10, "{known:?}");
    assert_eq!(words(&first), known);
}

#[test]
fn stated_constants_are_those_in_force() {
    let text = &README.on_disk;
    let default = |name| match bounds::find("map", name).need {
        Need::Default(value) => value,
        other => panic!("{name}: {other:?}"),
    };
    let size = ChartSize::default();
    for stated in [
        format!("The default {} is the 99.99 % radius", default("sigma_factor")),
        format!("The default {} is the 99.99 % radius over the 95 % radius", default("p95_factor")),
        format!("{} by {} pixels", size.width_px, size.height_px),
        format!("at most {TRACE_CELLS_MAX} cells"),
        format!("more than {MERIDIAN_LIMIT_DEG}° of longitude"),
        format!("warning comes from {MERIDIAN_WARN_DEG}° on"),
        "0 of 60 dives is not 0 %, it is up to 6.0 %".to_owned(),
    ] {
        let plain = text.split_whitespace().collect::<Vec<_>>().join(" ");
        assert!(plain.contains(&stated), "{stated}");
    }
    let none_of_60 = fixability::assess::statistics::share(0, 60, 60).high.expect("an upper end");
    assert_eq!(format!("{:.1}", 100.0 * none_of_60), "6.0");
}

/// "Line C meets the most landmarks and comes last"; every line ends more than 5 % of its runs without a fix.
#[test]
fn what_is_said_of_the_demo_holds() {
    let report: serde_json::Value =
        serde_json::from_slice(&README.outputs["demo-out/lines.json"]).expect("the scores are JSON");
    let lines = report["lines"].as_array().expect("lines");
    let met = |line: &serde_json::Value| line["detections_expected"].as_u64().expect("a count");
    let c = lines.iter().find(|line| line["name"] == "C").expect("line C");
    assert!(lines.iter().all(|line| line["name"] == "C" || met(line) < met(c)));
    assert_eq!(c["rank"], lines.len());
    for line in lines {
        let estimated = &line["estimated"];
        assert!(estimated["p95_m"]["value"].is_null());
        assert!(estimated["no_fix_share"]["value"].as_f64().expect("a share") > 0.05);
    }
}

#[test]
fn links_lead_somewhere() {
    for page in ["README.md", "DEVELOPERS.md"] {
        let text = fs::read_to_string(project(page)).expect(page);
        let headings: BTreeSet<String> = text
            .lines()
            .filter_map(|line| line.strip_prefix("## "))
            .map(|heading| heading.to_lowercase().replace(' ', "-"))
            .collect();
        for target in text.split("](").skip(1).filter_map(|rest| rest.split(')').next()) {
            match target.strip_prefix('#') {
                Some(anchor) => assert!(headings.contains(anchor), "{page}: {target}"),
                None => assert!(project(target).exists(), "{page}: {target}"),
            }
        }
    }
}

/// The table of layers for people and the one that is enforced say the same.
#[test]
fn layers_for_people_are_those_enforced() {
    let page = fs::read_to_string(project("DEVELOPERS.md")).expect("there is a page for developers");
    let mut told = BTreeMap::new();
    for row in rows(section(&page, "\n## Layers")) {
        let rank: u32 = row[0].parse().expect("a rank");
        told.extend(quoted(&row[1]).into_iter().map(|module| (module, rank)));
    }
    let source = fs::read_to_string(project("tests/suite/layers.rs")).expect("the test");
    let table =
        source.split("BTreeMap::from([").nth(1).and_then(|rest| rest.split("])").next()).expect("the table");
    let enforced: BTreeMap<String, u32> = table
        .lines()
        .filter_map(|line| {
            let (name, rank) = line.trim().strip_prefix("(\"")?.split_once("\", ")?;
            Some((name.to_owned(), rank.trim_end_matches("),").parse().ok()?))
        })
        .collect();
    assert!(enforced.len() > 10, "{enforced:?}");
    assert_eq!(told, enforced);
}
