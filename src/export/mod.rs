//! Exporters: one report value in, bytes out. Only [`write_all`] and [`prepare`] touch the file system.
//!
//! Data files carry full precision and the names of their units; a missing value is empty or absent, never zero.

mod area;
mod csv;
mod files;
mod geojson;
mod geojson_cut;
mod geotiff;
mod geotiff_area;
mod gpx;
mod json;
mod landmarks;
mod lookalikes;
mod remap;
mod sensitivity;
mod suggest;
mod table;

pub use area::{AreaCsv, AreaJson, area_table};
pub use csv::{LinesCsv, LinesGeoJson};
pub use files::{prepare, write_all};
pub use geotiff_area::{AreaTiff, NONE_CODE};
pub use gpx::RecommendedGpx;
pub use json::{LinesJson, TraceJson, check_json};
pub use landmarks::LandmarksGeoJson;
pub use lookalikes::{LookAlikesCsv, LookAlikesGeoJson, LookAlikesJson, lookalikes_table};
pub use remap::{RemapCsv, RemapGeoJson, RemapJson, remap_table};
pub use sensitivity::{SensitivityCsv, SensitivityJson, sensitivity_table};
pub use suggest::{SuggestCsv, SuggestGeoJson, SuggestGpx, SuggestJson, SuggestLinesCsv, suggest_table};
pub use table::{check_text, lines_table, trace_table};

use std::path::PathBuf;

/// Turns one kind of report into the bytes of one file.
pub trait Exporter {
    /// The report exported.
    type Report;

    /// Name of the file, such as `lines.json`.
    fn file_name(&self) -> &'static str;

    /// The file's bytes.
    ///
    /// # Errors
    ///
    /// [`ExportError::Format`] when a value cannot be written in this format.
    fn bytes(&self, report: &Self::Report) -> Result<Vec<u8>, ExportError>;
}

/// Why an output could not be written.
#[derive(Debug, thiserror::Error)]
pub enum ExportError {
    /// Output files are already there.
    #[error("{}: already there: {}; nothing was written; choose another folder or add --force to overwrite", .dir.display(), .names.join(", "))]
    Exists {
        /// The output folder.
        dir: PathBuf,
        /// The files that are there.
        names: Vec<String>,
    },
    /// The output folder's path names something that is not a folder.
    #[error("{}: not a folder, so no output can be written there; name a folder", .0.display())]
    NotAFolder(PathBuf),
    /// A folder or file could not be made, written or put in place.
    #[error("{}: cannot {what}: {source}; {}", .path.display(), advice(.source))]
    Io {
        /// The folder or file.
        path: PathBuf,
        /// What was tried.
        what: &'static str,
        /// What the system answered.
        source: std::io::Error,
    },
    /// A value cannot be written in the format.
    #[error("{file}: cannot write this format: {reason}")]
    Format {
        /// Name of the file.
        file: &'static str,
        /// What the format's library answered.
        reason: String,
    },
}

/// What a user can do about a failed write.
fn advice(error: &std::io::Error) -> &'static str {
    use std::io::ErrorKind;
    match error.kind() {
        ErrorKind::PermissionDenied | ErrorKind::ReadOnlyFilesystem => {
            "choose a folder you may write to, or change its permissions"
        }
        ErrorKind::StorageFull | ErrorKind::QuotaExceeded => "free some space or choose another disk",
        ErrorKind::NotADirectory => "one part of the path is a file; name a folder",
        _ => "check the path, or choose another folder",
    }
}
