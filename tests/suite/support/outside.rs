//! Programs from outside the project that read its files. `tests/run` installs them; without them the tests that need them
//! pass and say what they left out, unless `FIXABILITY_REQUIRE_READERS=1` is set.

use std::io::Write;
use std::path::Path;
use std::process::{Command, Stdio};
use std::sync::LazyLock;

/// Set to 1 to fail where a reader is missing.
pub const REQUIRE: &str = "FIXABILITY_REQUIRE_READERS";

/// Says that `checks` were left out because `reader` is missing; fails instead when readers are required.
pub fn left_out(reader: &str, checks: &str) {
    assert!(
        std::env::var(REQUIRE).as_deref() != Ok("1"),
        "{reader} is missing and {REQUIRE}=1 is set; tests/run installs it"
    );
    // Past the test runner, which keeps what a passing test prints to itself.
    let text = format!("NOT CHECKED, because {reader} is missing (tests/run installs it): {checks}\n");
    let _ = std::io::stderr().write_all(text.as_bytes());
}

/// The command-line programs of GDAL (Debian package `gdal-bin`).
#[derive(Clone, Copy, Debug)]
pub struct Gdal;

static IS_THERE: LazyLock<bool> = LazyLock::new(|| {
    let tools = ["gdalinfo", "gdallocationinfo", "gdaltransform", "ogr2ogr", "ogrinfo"];
    tools.iter().all(|tool| {
        // gdaltransform and ogrinfo of some versions answer --version with another exit code than 0.
        Command::new(tool).arg("--version").stdin(Stdio::null()).output().is_ok()
    })
});

/// GDAL, where it is installed; `checks` names what is left out otherwise.
pub fn gdal(checks: &str) -> Option<Gdal> {
    if *IS_THERE {
        return Some(Gdal);
    }
    left_out("GDAL (Debian package gdal-bin)", checks);
    None
}

impl Gdal {
    /// Runs a tool in `folder`; standard output. Fails when the tool does, or when it complains.
    pub fn run(self, folder: &Path, tool: &str, arguments: &[&str], input: &str) -> String {
        let mut child = Command::new(tool)
            .args(arguments)
            .current_dir(folder)
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap_or_else(|error| panic!("{tool}: {error}"));
        let mut stdin = child.stdin.take().expect("a pipe");
        let input = input.to_owned();
        // From a thread of its own: the tool answers line by line, and both pipes could fill up.
        let feeder = std::thread::spawn(move || stdin.write_all(input.as_bytes()));
        let output = child.wait_with_output().expect("it ends");
        feeder.join().expect("no panic").expect("the tool reads its input");
        let text = |bytes: Vec<u8>| String::from_utf8(bytes).expect("UTF-8");
        let (stdout, stderr) = (text(output.stdout), text(output.stderr));
        assert!(output.status.success(), "{tool} {arguments:?}\n{stdout}\n{stderr}");
        for word in ["ERROR", "Warning"] {
            assert!(!stderr.contains(word), "{tool} {arguments:?} complains:\n{stderr}");
        }
        stdout
    }

    /// `gdalinfo` or `ogrinfo` and the like with an answer in JSON.
    pub fn json(self, folder: &Path, tool: &str, arguments: &[&str]) -> serde_json::Value {
        let text = self.run(folder, tool, arguments, "");
        serde_json::from_str(&text).unwrap_or_else(|error| panic!("{tool} {arguments:?}: {error}\n{text}"))
    }

    /// Longitude and latitude to a grid.
    pub fn to_grid(self, epsg: u16, positions: &[[f64; 2]]) -> Vec<[f64; 2]> {
        let input: String = positions.iter().map(|[x, y]| format!("{x:.12} {y:.12}\n")).collect();
        let code = format!("EPSG:{epsg}");
        let text = self.run(
            Path::new("."),
            "gdaltransform",
            &["-s_srs", "EPSG:4326", "-t_srs", &code, "-output_xy"],
            &input,
        );
        let found: Vec<[f64; 2]> = text
            .lines()
            .map(|line| {
                let numbers: Vec<f64> = line.split_whitespace().map(|n| n.parse().expect(line)).collect();
                [numbers[0], numbers[1]]
            })
            .collect();
        assert_eq!(found.len(), positions.len());
        found
    }
}
