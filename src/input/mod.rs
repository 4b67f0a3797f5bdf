//! Text files as they come: bytes with a fingerprint, encoding, format, tables, GeoJSON features and KML placemarks.
//!
//! What a row means is decided by [`crate::map`] and [`crate::track`]; this module knows where it stands and how it is
//! written, so that every error can say so.

pub mod geojson;
pub mod kml;
mod kml_text;
pub mod position;
mod strict_json;
pub mod table;
pub mod xml;

use std::fs::{self, File};
use std::io::{self, Read};
use std::path::{Path, PathBuf};

use sha2::{Digest, Sha256};

use crate::bounds::{FILE_SIZE_MAX, file_size_words};
use crate::problem::{Findings, Problem, ProblemList};

/// First bytes of a ZIP archive (its local file header signature).
const ZIP_START: &[u8] = b"PK\x03\x04";

/// A text file, read once.
#[derive(Clone, Debug)]
pub struct InputText {
    /// As the user named it, for messages.
    pub name: PathBuf,
    /// SHA-256 of the bytes, lower-case hexadecimal.
    pub sha256: String,
    /// The text without a byte-order mark.
    pub text: String,
}

/// The format of a file of positions.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Format {
    /// Separated values.
    Csv,
    /// GeoJSON.
    GeoJson,
    /// GPX.
    Gpx,
    /// KML.
    Kml,
}

/// Gives the bytes of a file: [`disk`], or something that keeps files elsewhere.
pub type Source<'a> = &'a dyn Fn(&Path) -> Result<Vec<u8>, ReadFault>;

/// Why the bytes of a file cannot be had.
#[derive(Debug)]
pub enum ReadFault {
    /// There is none.
    NotFound,
    /// A folder, pipe or device: what it is.
    NotRegular(&'static str),
    /// Above [`FILE_SIZE_MAX`].
    TooLarge,
    /// Anything else.
    Other(io::Error),
}

impl From<io::Error> for ReadFault {
    fn from(error: io::Error) -> Self {
        match error.kind() {
            io::ErrorKind::NotFound => Self::NotFound,
            _ => Self::Other(error),
        }
    }
}

/// The bytes of a regular file of the disk, symbolic links followed.
///
/// # Errors
/// [`ReadFault`]. What is no regular file is not even opened: a pipe would wait for a writer, and a device may never end.
pub fn disk(path: &Path) -> Result<Vec<u8>, ReadFault> {
    let kind = fs::metadata(path)?;
    if kind.is_dir() {
        return Err(ReadFault::NotRegular("a folder"));
    }
    if !kind.is_file() {
        return Err(ReadFault::NotRegular("a pipe, a socket or a device"));
    }
    if kind.len() > FILE_SIZE_MAX {
        return Err(ReadFault::TooLarge);
    }
    // The length that the system states is a hint: a file may grow, and some state none.
    let mut bytes = Vec::with_capacity(usize::try_from(kind.len()).unwrap_or(0) + 1);
    File::open(path)?.take(FILE_SIZE_MAX + 1).read_to_end(&mut bytes)?;
    if bytes.len() as u64 > FILE_SIZE_MAX { Err(ReadFault::TooLarge) } else { Ok(bytes) }
}

impl InputText {
    /// Reads `path` through `source`, to be called `name` in messages. On failure the finding says why and the result is none.
    pub fn read(path: &Path, name: &Path, source: Source<'_>, findings: &mut Findings) -> Option<Self> {
        let fault = match source(path) {
            Ok(bytes) => return Self::new(bytes, name, findings),
            Err(fault) => fault,
        };
        let problem = match fault {
            ReadFault::NotFound => {
                let advice =
                    if path == name { "" } else { "check the name; it is relative to the dive file" };
                Problem::new(name, format!("no such file (looked for {})", path.display())).advice(advice)
            }
            ReadFault::NotRegular(what) => Problem::new(name, format!("is {what}"))
                .accepted("a regular file")
                .advice("copy its content into a file, and name that"),
            ReadFault::TooLarge => Problem::new(name, "is too large")
                .accepted(format!("files of at most {}", file_size_words()))
                .advice("leave out what the dive does not need, or split it into several dives"),
            ReadFault::Other(error) => Problem::new(name, format!("cannot be read: {error}")),
        };
        findings.problem(problem);
        None
    }

    /// Takes a copy of the bytes of a file; see [`InputText::new`].
    pub fn from_bytes(bytes: &[u8], name: &Path, findings: &mut Findings) -> Option<Self> {
        Self::new(bytes.to_vec(), name, findings)
    }

    /// Takes the bytes of a file apart: fingerprint, byte-order mark, encoding, control characters.
    pub fn new(mut bytes: Vec<u8>, name: &Path, findings: &mut Findings) -> Option<Self> {
        let sha256 = fingerprint(&bytes);
        if bytes.starts_with(&[0xFF, 0xFE]) || bytes.starts_with(&[0xFE, 0xFF]) {
            findings.problem(
                Problem::new(name, "is UTF-16 text").accepted("UTF-8 text").advice("save the file as UTF-8"),
            );
            return None;
        }
        if bytes.starts_with(ZIP_START) {
            findings.problem(
                Problem::new(name, "is a compressed archive (ZIP)")
                    .accepted("text files; of a KMZ archive, the KML file inside")
                    .advice("unpack it, and name the file inside (in a KMZ archive usually doc.kml)"),
            );
            return None;
        }
        let mark = if bytes.starts_with(&[0xEF, 0xBB, 0xBF]) { 3 } else { 0 };
        let refuse = |bytes: &[u8], offset: usize, what: &str, advice: &str| {
            let line = 1 + bytes[..offset].iter().filter(|b| **b == b'\n').count() as u64;
            Problem::new(name, format!("byte {} (0x{:02X}) {what}", offset + 1, bytes[offset]))
                .line(line)
                .accepted("UTF-8 text")
                .advice(advice)
        };
        let is_control = |b: &u8| (*b < b' ' && !matches!(b, b'\t' | b'\n' | b'\r')) || *b == 0x7F;
        if let Some(offset) = bytes.iter().position(is_control) {
            let advice = "if the file is text, remove the character";
            findings.problem(refuse(&bytes, offset, "is a control character, which no text holds", advice));
            return None;
        }
        bytes.drain(..mark);
        match String::from_utf8(bytes) {
            Ok(text) => Some(Self { name: name.to_path_buf(), sha256, text }),
            Err(error) => {
                let offset = error.utf8_error().valid_up_to() + mark;
                let mut bytes = error.into_bytes();
                bytes.splice(..0, std::iter::repeat_n(b' ', mark));
                findings.problem(refuse(&bytes, offset, "is not UTF-8 text", "save the file as UTF-8"));
                None
            }
        }
    }

    /// The format by the ending of the name, or by the first character where the ending says nothing.
    pub fn format(&self) -> Option<Format> {
        let ending = self.name.extension().and_then(|e| e.to_str()).unwrap_or("").to_ascii_lowercase();
        match ending.as_str() {
            "csv" | "txt" | "tsv" => Some(Format::Csv),
            "geojson" | "json" => Some(Format::GeoJson),
            "gpx" => Some(Format::Gpx),
            "kml" => Some(Format::Kml),
            _ => match self.text.trim_start().chars().next() {
                Some('{') => Some(Format::GeoJson),
                Some('<') if self.text.contains("<gpx") => Some(Format::Gpx),
                Some('<') if self.text.contains("<kml") => Some(Format::Kml),
                _ => None,
            },
        }
    }
}

/// SHA-256 in hexadecimal digits.
pub fn fingerprint(bytes: &[u8]) -> String {
    Sha256::digest(bytes).iter().map(|b| format!("{b:02x}")).collect()
}

/// Rows that could not be used, kept apart until the whole file is read: they stop the run, or they are left out and
/// counted when the user asked for that.
#[derive(Debug, Default)]
pub struct BadRows {
    problems: ProblemList,
    rows: usize,
}

impl BadRows {
    /// Adds the problems of one row.
    pub fn add(&mut self, problems: impl IntoIterator<Item = Problem>) {
        let before = self.problems.len();
        self.problems.extend(problems);
        if self.problems.len() > before {
            self.rows += 1;
        }
    }

    /// Adds a row of `file` with one problem, which is only made when it is kept.
    pub fn add_with(&mut self, file: &Path, make: impl FnOnce() -> Problem) {
        self.problems.push_with(file, make);
        self.rows += 1;
    }

    /// The first problem, if there is one.
    pub fn first(&self) -> Option<&Problem> {
        self.problems.first()
    }

    /// Reports them: as problems, or as one warning when `skip` is set.
    pub fn finish(self, file: &Path, skip: bool, findings: &mut Findings) {
        if self.rows == 0 {
            return;
        }
        if skip {
            let rows = crate::units::count_words(self.rows, "row");
            let first = self.problems.first().map_or_else(String::new, Problem::to_string);
            findings.warn(
                Some(file),
                format!("{rows} with problems left out because skip_bad_rows = true; the first: {first}"),
            );
        } else {
            findings.problems.extend(self.problems);
        }
    }
}
