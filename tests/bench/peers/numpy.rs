//! The NumPy version as a process beside this one: it gets the problem as a file, and solves it whenever it is asked.

use std::io::{BufRead, BufReader, Write};
use std::path::{Path, PathBuf};
use std::process::{Child, Command, Stdio};

use fixability::locate::cell::{DIRECTIONS, Reaches, box_reaches};
use fixability::map::Landmark;
use serde_json::{Value, json};

use crate::report::VariantRow;
use crate::scenes::RandomScene;
use crate::{Dive, shipped, solver_of, summaries};

/// Spread may differ by so much, metres: the program rounds outward.
const AGREE_M: f64 = 1e-6;

fn here(file: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/bench/peers").join(file)
}

/// A Python with the pinned packages, in a virtual environment beside this program.
pub fn python() -> Result<PathBuf, String> {
    let program = std::env::current_exe().map_err(|error| error.to_string())?;
    // target/release/deps/peers-…
    let target = program.ancestors().nth(3).ok_or("no target folder")?;
    let environment = target.join("peers-venv");
    let python = environment.join("bin/python");
    let run = |program: &Path, arguments: &[&str]| {
        let status = Command::new(program).args(arguments).stdout(Stdio::null()).status();
        match status {
            Ok(status) if status.success() => Ok(()),
            Ok(status) => Err(format!("{} {}: {status}", program.display(), arguments.join(" "))),
            Err(error) => Err(format!("{}: {error}", program.display())),
        }
    };
    if !python.exists() {
        run(Path::new("python3"), &["-m", "venv", &environment.to_string_lossy()])?;
    }
    let requirements = here("requirements.txt");
    run(
        &python,
        &["-m", "pip", "install", "-q", "--disable-pip-version-check", "-r", &requirements.to_string_lossy()],
    )?;
    Ok(python)
}

/// One process with one problem.
struct Peer {
    child: Child,
    answers: BufReader<std::process::ChildStdout>,
    versions: Value,
    // The problem is read at the start; the file stays until the process has ended.
    _problem: tempfile::NamedTempFile,
}

impl Peer {
    fn start(python: &Path, scene: &RandomScene, dive: &Dive) -> Self {
        let of_boxes: Vec<Reaches> = scene.landmarks.iter().map(Landmark::bounds).map(box_reaches).collect();
        let steps: Vec<Value> = dive.steps[..dive.until]
            .iter()
            .map(|step| {
                let look =
                    step.sighting.as_ref().map(|looks| looks[0].as_ref().expect("a look").from_landmark);
                json!({ "travel": step.travel[0], "look": look })
            })
            .collect();
        let solver = solver_of(scene);
        let problem = json!({
            "directions": DIRECTIONS,
            "fix_size_m": solver.fix_size_m,
            "search_area": solver.search_area.reaches(),
            "box_reaches": of_boxes,
            "steps": steps,
        });
        let mut file = tempfile::NamedTempFile::new().expect("a temporary file");
        serde_json::to_writer(&mut file, &problem).expect("written");
        file.flush().expect("written");
        let mut command = Command::new(python);
        command.arg(here("numpy_peer.py")).arg(file.path()).stdin(Stdio::piped()).stdout(Stdio::piped());
        for threads in ["OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"] {
            command.env(threads, "1");
        }
        // Set on some machines for the sake of old libraries; the current one finds the best for itself.
        command.env_remove("OPENBLAS_CORETYPE").env_remove("OPENBLAS_L2_SIZE");
        let mut child = command.spawn().expect("Python starts");
        let mut answers = BufReader::new(child.stdout.take().expect("piped"));
        let versions = read(&mut answers);
        Self { child, answers, versions, _problem: file }
    }

    /// Seconds, and the events.
    fn solve(&mut self) -> (f64, Vec<Value>) {
        let stdin = self.child.stdin.as_mut().expect("piped");
        stdin.write_all(b"run\n").and_then(|()| stdin.flush()).expect("Python listens");
        let answer = read(&mut self.answers);
        let events = answer["events"].as_array().expect("events").clone();
        (answer["seconds"].as_f64().expect("seconds"), events)
    }
}

impl Drop for Peer {
    fn drop(&mut self) {
        drop(self.child.stdin.take());
        let _ = self.child.wait();
    }
}

fn read(answers: &mut impl BufRead) -> Value {
    let mut line = String::new();
    answers.read_line(&mut line).expect("Python answers");
    serde_json::from_str(&line).expect("an answer in JSON; Python's own message stands above")
}

/// NumPy against the program on the first dives with a fix, and the versions.
pub fn row(
    python: &Path,
    scene: &RandomScene,
    dives: &[Dive],
    [count, rounds]: [usize; 2],
) -> (VariantRow, String) {
    let solver = solver_of(scene);
    let mut row = VariantRow::new("NumPy, all pairs", scene.landmarks.len());
    let mut versions = String::new();
    for dive in dives.iter().filter(|dive| dive.has_fix).take(count) {
        let mut peer = Peer::start(python, scene, dive);
        let kernel = |blas: &Value| format!("{} {}", blas["internal_api"], blas["architecture"]);
        versions = format!(
            "NumPy {}, Python {}, {}",
            peer.versions["numpy"].as_str().unwrap_or("?"),
            peer.versions["python"].as_str().unwrap_or("?"),
            peer.versions["blas"].as_array().map_or(String::new(), |all| {
                all.iter().map(kernel).collect::<Vec<_>>().join(", ").replace('"', "")
            }),
        );
        // The first solve warms up; its answer is checked.
        let (_, events) = peer.solve();
        let expected = summaries(&solver, &dive.steps[..dive.until]);
        assert_eq!(events.len(), expected.len());
        for (event, expected) in events.iter().zip(&expected) {
            assert_eq!(event[0].as_u64(), Some(expected.cells as u64), "cells {event} {expected:?}");
            assert_eq!(event[1].as_u64(), Some(expected.places as u64), "places {event} {expected:?}");
            let apart = event[2].as_f64().expect("a spread") - expected.spread_m.expect("a spread");
            assert!(apart.abs() <= AGREE_M, "spread {event} {expected:?}");
        }
        for _ in 0..rounds {
            let own = shipped(&solver, dive);
            row.add(own, peer.solve().0);
        }
    }
    (row, versions)
}
