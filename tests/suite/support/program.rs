//! Runs the built program in a folder of its own.

use std::ffi::OsStr;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};

/// The program under test.
pub const PROGRAM: &str = env!("CARGO_BIN_EXE_fixability");

/// A folder that is gone after the test.
pub struct Workplace {
    folder: tempfile::TempDir,
}

/// How a run ended.
#[derive(Debug)]
pub struct Ran {
    /// Exit code; none when a signal ended it.
    pub code: Option<i32>,
    /// Standard output.
    pub stdout: String,
    /// Standard error.
    pub stderr: String,
}

impl Ran {
    /// Takes the output apart. Everything the program prints is UTF-8.
    pub fn of(output: Output) -> Self {
        let text = |bytes| String::from_utf8(bytes).expect("the program prints UTF-8");
        Self { code: output.status.code(), stdout: text(output.stdout), stderr: text(output.stderr) }
    }

    /// Fails the test unless the exit code is `code`.
    pub fn expect(self, code: i32) -> Self {
        assert_eq!(self.code, Some(code), "stdout:\n{}\nstderr:\n{}", self.stdout, self.stderr);
        self
    }

    /// Standard output as JSON.
    pub fn json(&self) -> serde_json::Value {
        serde_json::from_str(&self.stdout).expect("standard output is JSON")
    }
}

impl Workplace {
    /// An empty folder.
    pub fn new() -> Self {
        Self { folder: tempfile::tempdir().expect("a temporary folder") }
    }

    /// A folder with a small dive: 40 landmarks in local metres, two lines, four draws.
    pub fn with_small_dive() -> Self {
        Self::new()
            .write("dive.toml", SMALL_DIVE)
            .write("landmarks.csv", &small_landmarks())
            .write("lines.csv", "line,easting,northing\nEast,0,220\nEast,700,260\nBack,700,430\nBack,0,400\n")
    }

    /// The same place with a file written.
    pub fn write(self, name: impl AsRef<Path>, text: &str) -> Self {
        let path = self.path(name);
        fs::create_dir_all(path.parent().expect("inside the folder")).expect("a folder");
        fs::write(path, text).expect("a file");
        self
    }

    /// Where a file of this place is.
    pub fn path(&self, name: impl AsRef<Path>) -> PathBuf {
        self.folder.path().join(name)
    }

    /// The bytes of a file.
    pub fn bytes(&self, name: impl AsRef<Path>) -> Vec<u8> {
        let path = self.path(name);
        fs::read(&path).unwrap_or_else(|e| panic!("{}: {e}", path.display()))
    }

    /// Names in a folder of this place, sorted.
    pub fn names(&self, folder: &str) -> Vec<String> {
        let mut names: Vec<String> = fs::read_dir(self.path(folder))
            .expect("a folder")
            .map(|entry| entry.expect("an entry").file_name().to_string_lossy().into_owned())
            .collect();
        names.sort();
        names
    }

    /// The program with arguments, to be started in this folder.
    pub fn command<S: AsRef<OsStr>>(&self, arguments: impl IntoIterator<Item = S>) -> Command {
        let mut command = Command::new(PROGRAM);
        command.current_dir(self.folder.path()).args(arguments).stdin(Stdio::null());
        command
    }

    /// Runs the program with blank-separated arguments.
    pub fn run(&self, arguments: &str) -> Ran {
        Ran::of(self.command(arguments.split_whitespace()).output().expect("the program starts"))
    }
}

/// Path of a file of the project.
pub fn project(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(name)
}

const SMALL_DIVE: &str = "\
name = \"Small dive\"
[map]
landmarks = \"landmarks.csv\"
crs = \"local\"
uncertainty = \"bound\"
[lines]
files = [\"lines.csv\"]
[vehicle]
speed_mps = 1.5
turn_radius_m = 10
[dead_reckoning]
scale_error_pct = 0.5
heading_bias_deg = 1
heading_noise_deg = 0.5
[sonar]
kind = \"side-looking\"
range_max_m = 90
altitude_m = 8
range_error_m = 0.5
bearing_error_deg = 1
[start]
scatter_m = 10
[scoring]
fix_size_m = 30
required_fix_m = 300
segment_m = 100
draws = 4
seed = 11
";

/// 40 landmarks on 700 m by 600 m, placed by multiplication modulo a prime: irregular, and the same everywhere.
fn small_landmarks() -> String {
    let mut text = String::from("id,easting,northing,uncertainty_m\n");
    for i in 1..=40u32 {
        let (east, north) = (i * 257 % 701, i * i * 131 % 601);
        text += &format!("L{i:02},{east},{north},1.5\n");
    }
    text
}
