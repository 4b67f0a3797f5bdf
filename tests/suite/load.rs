//! What the reader says to the person with the file: the text of errors, warnings and information.

mod frames;
mod guard;
mod happy;
mod kml;
mod landmark_files;
mod line_files;
mod settings;
mod site;

use std::path::PathBuf;

use fixability::dive::Dive;
use fixability::problem::Problems;

/// A folder with a dive file and its inputs, gone after the test.
pub struct Scene {
    folder: tempfile::TempDir,
    dive: String,
}

/// A sound dive file: landmarks in UTM 31N, two lines.
const DIVE: &str = r#"name = "Trial"
[map]
landmarks = "reef.csv"
crs = "EPSG:32631"
uncertainty = "bound"
[lines]
files = ["lines.csv"]
[vehicle]
speed_mps = 1.5
turn_radius_m = 10
[dead_reckoning]
scale_error_pct = 1
heading_bias_deg = 1
heading_noise_deg = 0.5
[sonar]
kind = "side-looking"
range_max_m = 100
altitude_m = 10
range_error_m = 0.5
bearing_error_deg = 1
[budget]
strays = 0

[start]
scatter_m = 20
[scoring]
fix_size_m = 20
required_fix_m = 300
"#;

pub const REEF: &str = "id,easting,northing,uncertainty_m\n\
    A,500100,6200100,2\nB,500300,6200050,2\nC,500500,6200120,3\nD,500700,6200080,2\n";

const LINES: &str = "line,easting,northing\nnorth,500000,6200060\nnorth,500800,6200060\n\
    south,500000,6200020\nsouth,500400,6200020\nsouth,500800,6200040\n";

impl Scene {
    pub fn new() -> Self {
        let folder = tempfile::tempdir().expect("a temporary folder");
        let scene = Self { folder, dive: DIVE.to_owned() };
        scene.file("reef.csv", REEF).file("lines.csv", LINES)
    }

    /// With a file.
    pub fn file(self, name: &str, content: impl AsRef<[u8]>) -> Self {
        std::fs::write(self.folder.path().join(name), content).expect("a file in the temporary folder");
        self
    }

    /// With one piece of the dive file replaced.
    pub fn swap(mut self, from: &str, to: &str) -> Self {
        assert!(self.dive.contains(from), "the dive file has no {from:?}");
        self.dive = self.dive.replacen(from, to, 1);
        self
    }

    pub fn path(&self) -> PathBuf {
        self.folder.path().join("dive.toml")
    }

    pub fn read(&self) -> Result<Dive, Problems> {
        std::fs::write(self.path(), &self.dive).expect("a file in the temporary folder");
        Dive::read(&self.path())
    }

    pub fn dive(&self) -> Dive {
        self.read().unwrap_or_else(|e| panic!("the dive is refused:\n{e}"))
    }

    /// All error text; the folder is cut off so that texts can be compared.
    pub fn errors(&self) -> String {
        match self.read() {
            Ok(dive) => panic!("nothing is refused; notices: {:#?}", dive.notices),
            Err(e) => e.to_string().replace(&format!("{}/", self.folder.path().display()), ""),
        }
    }

    /// All notices, one per line, warnings marked.
    pub fn notices(&self) -> String {
        let mark = |w: bool| if w { "warning" } else { "information" };
        let lines = self.dive().notices.into_iter().map(|n| {
            let file = n.file.map_or_else(String::new, |f| format!("{}: ", f.display()));
            format!("{}: {file}{}", mark(n.is_warning), n.text)
        });
        lines.collect::<Vec<_>>().join("\n")
    }
}

/// Fails unless the text holds every piece.
#[track_caller]
pub fn holds(text: &str, pieces: &[&str]) {
    for piece in pieces {
        assert!(text.contains(piece), "no {piece:?} in:\n{text}");
    }
}
