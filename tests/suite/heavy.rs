//! A job as large as they come: a hundred thousand landmarks, a thousand lines, two hundred draws. It has to run to its end
//! in bounded memory, say how long it will take, and leave no broken file when it is interrupted.
//!
//! The whole job is an ignored test (`cargo test --release -- --ignored --nocapture heavy`); a small one of the same make
//! runs every time. The progress bar is drawn on a terminal only, so `script` (util-linux) lends one; without it the bar is
//! not looked at, and the test says so.

use std::fmt::Write as _;
use std::fs;
use std::path::Path;
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

use rand::RngExt;

use crate::reports::generator;
use crate::support::program::{PROGRAM, Workplace};

/// How large a job is.
#[derive(Clone, Copy)]
struct Job {
    landmarks: u32,
    lines: u32,
    draws: u32,
}

/// Landmarks per square kilometre.
const DENSITY_PER_KM2: f64 = 100.0;
/// Length of a line, metres: one start each, at which most vehicles have a fix.
const LINE_M: f64 = 400.0;

impl Job {
    /// The job in a folder of its own.
    fn place(self) -> Workplace {
        let mut rng = generator(20_261_201);
        let side_m = 1000.0 * (f64::from(self.landmarks) / DENSITY_PER_KM2).sqrt();
        let mut landmarks = String::from("id,easting,northing,uncertainty_m\n");
        for i in 0..self.landmarks {
            let at = (rng.random_range(0.0..side_m), rng.random_range(0.0..side_m));
            writeln!(landmarks, "K{i},{:.2},{:.2},{:.2}", at.0, at.1, rng.random_range(0.5..2.0))
                .expect("memory");
        }
        let mut lines = String::from("line,easting,northing\n");
        for i in 0..self.lines {
            let angle = rng.random_range(0.0..std::f64::consts::TAU);
            let (east, north) =
                (rng.random_range(LINE_M..side_m - LINE_M), rng.random_range(LINE_M..side_m - LINE_M));
            let end = (east + LINE_M * angle.sin(), north + LINE_M * angle.cos());
            writeln!(lines, "L{i},{east:.2},{north:.2}\nL{i},{:.2},{:.2}", end.0, end.1).expect("memory");
        }
        let dive = DIVE.replace("DRAWS", &self.draws.to_string());
        Workplace::new()
            .write("dive.toml", &dive)
            .write("landmarks.csv", &landmarks)
            .write("lines.csv", &lines)
    }
}

const DIVE: &str = "\
name = \"Large job\"
[map]
landmarks = \"landmarks.csv\"
crs = \"local\"
uncertainty = \"bound\"
[lines]
files = [\"lines.csv\"]
[vehicle]
speed_mps = 1.5
[dead_reckoning]
scale_error_pct = 0.3
heading_bias_deg = 0.5
heading_noise_deg = 0.3
[sonar]
kind = \"side-looking\"
range_max_m = 75
altitude_m = 10
range_error_m = 0.3
bearing_error_deg = 1
[start]
scatter_m = 20
[scoring]
fix_size_m = 25
required_fix_m = 400
segment_m = 400
draws = DRAWS
seed = 1
";

/// What a run was seen to do.
struct Seen {
    code: Option<i32>,
    took: Duration,
    /// Most memory held at once, MB; none where the system does not tell.
    peak_mb: Option<f64>,
    /// The terminal's text; empty without a terminal.
    terminal: String,
}

/// Runs `lines` on a terminal lent by `script`, or without one.
fn run(place: &Workplace) -> Seen {
    let start = Instant::now();
    let line = format!("exec '{PROGRAM}' lines dive.toml --out out");
    let mut command = if has_script() {
        let mut command = Command::new("script");
        command.args(["-qefc", &line, "terminal.txt"]);
        command
    } else {
        println!("skipped: the progress bar (no `script` on this machine)");
        let mut command = Command::new("sh");
        command.args(["-c", &line]);
        command
    };
    let mut child = command
        .current_dir(place.path("."))
        .stdin(Stdio::null())
        .stdout(Stdio::null())
        .stderr(Stdio::null())
        .spawn()
        .expect("the program starts");
    let mut peak_mb: Option<f64> = None;
    let status = loop {
        if let Some(status) = child.try_wait().expect("a child") {
            break status;
        }
        // The last reading before the end is within a fraction of a second of the peak's; the peak itself never falls.
        for process in family(child.id()) {
            peak_mb = [peak_mb, peak_of(process)].into_iter().flatten().reduce(f64::max);
        }
        std::thread::sleep(Duration::from_millis(50));
    };
    let terminal = fs::read(place.path("terminal.txt")).unwrap_or_default();
    Seen {
        code: status.code(),
        took: start.elapsed(),
        peak_mb,
        terminal: String::from_utf8_lossy(&terminal).into_owned(),
    }
}

fn has_script() -> bool {
    Command::new("script")
        .arg("--version")
        .stdout(Stdio::null())
        .stderr(Stdio::null())
        .status()
        .is_ok_and(|s| s.success())
}

/// A process and its children, as Linux tells them.
fn family(process: u32) -> Vec<u32> {
    let children = fs::read_to_string(format!("/proc/{process}/task/{process}/children")).unwrap_or_default();
    std::iter::once(process).chain(children.split_whitespace().filter_map(|id| id.parse().ok())).collect()
}

/// Most memory that a process has held, MB, as Linux tells it.
fn peak_of(process: u32) -> Option<f64> {
    let status = fs::read_to_string(Path::new("/proc").join(process.to_string()).join("status")).ok()?;
    let line = status.lines().find(|line| line.starts_with("VmHWM:"))?;
    line.split_whitespace().nth(1)?.parse::<f64>().ok().map(|kb| kb / 1024.0)
}

/// The time that a text such as `3h`, `12m`, `44s` means.
fn seconds(text: &str) -> Option<f64> {
    let (number, unit) = text.split_at(text.find(|c: char| !c.is_ascii_digit())?);
    let number: f64 = number.parse().ok()?;
    let scale = match unit {
        "s" => 1.0,
        "m" => 60.0,
        "h" => 3600.0,
        "d" => 86_400.0,
        _ => return None,
    };
    Some(number * scale)
}

/// Estimates of the time left on the terminal: share done, seconds left.
fn estimates(terminal: &str) -> Vec<(f64, f64)> {
    let drawn = terminal.split(['\r', '\n']).filter(|piece| piece.contains(" dives, "));
    let of = |piece: &str| {
        let words: Vec<&str> = piece.split_whitespace().collect();
        let count = words.iter().find(|word| word.contains('/'))?;
        let (done, all) = count.split_once('/')?;
        let left =
            words.iter().position(|word| word.starts_with("left")).and_then(|at| seconds(words[at - 1]))?;
        Some((done.parse::<f64>().ok()? / all.parse::<f64>().ok()?, left))
    };
    drawn.filter_map(of).collect()
}

/// Runs a job to its end and checks what it leaves.
fn runs_to_the_end(job: Job, memory_mb: f64) {
    let place = job.place();
    let seen = run(&place);
    let took_s = seen.took.as_secs_f64();
    println!(
        "{} landmarks, {} lines, {} draws: {took_s:.0} s, {} MB at most, exit code {:?}",
        job.landmarks,
        job.lines,
        job.draws,
        seen.peak_mb.map_or_else(|| "unknown".to_owned(), |mb| format!("{mb:.0}")),
        seen.code
    );
    assert_eq!(seen.code, Some(0), "{}", seen.terminal);
    assert!(seen.peak_mb.is_none_or(|mb| mb < memory_mb), "{:?} MB", seen.peak_mb);
    let json: serde_json::Value = serde_json::from_slice(&place.bytes("out/lines.json")).expect("whole JSON");
    assert_eq!(json["lines"].as_array().expect("lines").len(), job.lines as usize);
    assert!(place.bytes("out/lines.png").ends_with(b"IEND\xaeB`\x82"), "the picture is whole");
    let told = estimates(&seen.terminal);
    for share in [0.1, 0.25, 0.5, 0.75] {
        if let Some((done, left_s)) = told.iter().find(|(done, _)| *done >= share) {
            println!("at {:.0} % of the dives: {left_s:.0} s left by the bar", 100.0 * done);
        }
    }
    if has_script() {
        assert!(!told.is_empty(), "no progress bar on the terminal: {}", seen.terminal);
    }
}

#[test]
fn a_job_of_the_same_make_runs_to_its_end() {
    runs_to_the_end(Job { landmarks: 2000, lines: 30, draws: 20 }, 400.0);
}

#[test]
#[ignore = "the whole job takes long; its figures are printed with --nocapture"]
fn the_largest_job_runs_to_its_end() {
    let of = |name: &str, default: u32| {
        std::env::var(name).ok().and_then(|text| text.parse().ok()).unwrap_or(default)
    };
    let job = Job {
        landmarks: of("FIXABILITY_LANDMARKS", 100_000),
        lines: of("FIXABILITY_LINES", 1000),
        draws: of("FIXABILITY_DRAWS", 200),
    };
    runs_to_the_end(job, 1024.0);
}

/// Interrupted at any moment: nothing, or whole files.
#[cfg(unix)]
#[test]
fn an_interrupted_job_leaves_no_broken_file() {
    let place = Job { landmarks: 1000, lines: 10, draws: 20 }.place();
    let start = Instant::now();
    place.run("lines dive.toml --out whole").expect(0);
    let whole = start.elapsed();
    for part in 1..=8u32 {
        let out = format!("out{part}");
        let mut child = place
            .command(["lines", "dive.toml", "--out", &out])
            .stdout(Stdio::null())
            .stderr(Stdio::null())
            .spawn()
            .expect("the program starts");
        std::thread::sleep(whole * part / 8);
        let _ = Command::new("kill").args(["-INT", &child.id().to_string()]).status();
        child.wait().expect("ends");
        if place.path(&out).exists() {
            for name in place.names(&out) {
                assert!(!name.starts_with('.'), "{name} is left");
                assert!(
                    place.bytes(format!("{out}/{name}")) == place.bytes(format!("whole/{name}")),
                    "{name} is torn"
                );
            }
        }
    }
}
