//! The files that a command writes: their names before the run, their bytes after it.

use std::path::{Path, PathBuf};

use anyhow::Result;

use super::args::Common;
use super::terminal::print_notices;
use crate::export;
use crate::frame::Frame;
use crate::problem::Notice;

/// Name and bytes of one output file.
pub(super) type OutputFile = (&'static str, Vec<u8>);

/// Names of the files that a command writes.
#[derive(Clone, Copy, Debug)]
pub(super) struct FileNames {
    /// Of every map.
    pub always: &'static [&'static str],
    /// Of a map on the Earth only: such files hold latitude and longitude.
    pub on_earth: &'static [&'static str],
}

impl FileNames {
    /// Checks before the run that the files can be written.
    pub fn prepare(&self, out: Option<&Path>, frame: &Frame, common: &Common) -> Result<()> {
        let on_earth = if frame.is_local() { &[] } else { self.on_earth };
        let names: Vec<&str> = self.always.iter().chain(on_earth).copied().collect();
        match out {
            Some(out) => Ok(export::prepare(out, &names, common.force)?),
            None => Ok(()),
        }
    }

    /// Puts the names before the bytes, which come in the same order.
    pub fn with(&self, bytes: Vec<Vec<u8>>) -> Vec<OutputFile> {
        self.always.iter().chain(self.on_earth).copied().zip(bytes).collect()
    }

    /// Writes the files, and says which and why some are missing.
    pub fn write(&self, out: &Path, files: &[OutputFile], common: &Common) -> Result<()> {
        let names: Vec<&str> = files.iter().map(|(name, _)| *name).collect();
        let missing: Vec<&str> = self.on_earth.iter().copied().filter(|name| !names.contains(name)).collect();
        if !missing.is_empty() {
            say_local_metres(&missing, common);
        }
        export::write_all(out, files, common.force)?;
        say_written(out, &names, common);
        Ok(())
    }
}

/// Says which files are not written because the map is in local metres.
pub(super) fn say_local_metres(names: &[&str], common: &Common) {
    let verb = if names.len() == 1 { "is" } else { "are" };
    let text = format!(
        "{} {verb} not written: such files hold latitude and longitude, and this map is in local metres",
        names.join(", ")
    );
    print_notices([&Notice { file: None, text, is_warning: false }], common.quiet);
}

/// Names the files written.
fn say_written(out: &Path, names: &[&str], common: &Common) {
    let paths: Vec<PathBuf> = names.iter().map(|name| out.join(name)).collect();
    let text = paths.iter().map(|path| path.display().to_string()).collect::<Vec<_>>().join(", ");
    print_notices([&Notice { file: None, text: format!("wrote {text}"), is_warning: false }], common.quiet);
}
