//! Text files as they come: bytes with a fingerprint, encoding, format, tables, GeoJSON features and KML placemarks.
//!
//! What a row means is decided by [`crate::map`] and [`crate::track`]; this module knows where it stands and how it is
//! written, so that every error can say so.

pub mod geojson;
pub mod kml;
mod kml_text;
pub mod position;
pub mod table;

use std::path::{Path, PathBuf};

use sha2::{Digest, Sha256};

use crate::problem::{Findings, Problem};

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

impl InputText {
    /// Reads `path`, to be called `name` in messages. On failure the finding says why and the result is none.
    pub fn read(path: &Path, name: &Path, findings: &mut Findings) -> Option<Self> {
        let bytes = match std::fs::read(path) {
            Ok(bytes) => bytes,
            Err(e) => {
                let what = match e.kind() {
                    std::io::ErrorKind::NotFound => format!("no such file (looked for {})", path.display()),
                    _ => format!("cannot be read: {e}"),
                };
                let advice =
                    if path == name { "" } else { "check the name; it is relative to the dive file" };
                findings.problem(Problem::new(name, what).advice(advice));
                return None;
            }
        };
        Self::from_bytes(&bytes, name, findings)
    }

    /// Takes the bytes of a file apart: fingerprint, byte-order mark, encoding.
    pub fn from_bytes(bytes: &[u8], name: &Path, findings: &mut Findings) -> Option<Self> {
        let sha256 = Sha256::digest(bytes).iter().map(|b| format!("{b:02x}")).collect();
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
        let body = bytes.strip_prefix(&[0xEF, 0xBB, 0xBF]).unwrap_or(bytes);
        match std::str::from_utf8(body) {
            Ok(text) => Some(Self { name: name.to_path_buf(), sha256, text: text.to_owned() }),
            Err(e) => {
                let offset = e.valid_up_to();
                let line = 1 + body[..offset].iter().filter(|b| **b == b'\n').count() as u64;
                let byte = body[offset];
                findings.problem(
                    Problem::new(
                        name,
                        format!(
                            "byte {} (0x{byte:02X}) is not UTF-8 text",
                            offset + (bytes.len() - body.len()) + 1
                        ),
                    )
                    .line(line)
                    .accepted("UTF-8 text")
                    .advice("save the file as UTF-8"),
                );
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

    /// Line number, from 1, of a byte offset into the text.
    pub fn line_at(&self, offset: usize) -> u64 {
        line_at(&self.text, offset)
    }
}

/// Line number, from 1, of a byte offset into `text`.
pub fn line_at(text: &str, offset: usize) -> u64 {
    1 + text.as_bytes().iter().take(offset).filter(|b| **b == b'\n').count() as u64
}

/// Rows that could not be used, kept apart until the whole file is read: they stop the run, or they are left out and
/// counted when the user asked for that.
#[derive(Debug, Default)]
pub struct BadRows {
    problems: Vec<Problem>,
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

    /// Reports them: as problems, or as one warning when `skip` is set.
    pub fn finish(self, file: &Path, skip: bool, findings: &mut Findings) {
        if self.rows == 0 {
            return;
        }
        if skip {
            let rows = crate::units::count_words(self.rows, "row");
            let first = self.problems[0].to_string();
            findings.warn(
                Some(file),
                format!("{rows} with problems left out because skip_bad_rows = true; the first: {first}"),
            );
        } else {
            findings.problems.extend(self.problems);
        }
    }
}
