//! Putting finished bytes on disk: all checks first, every file whole or not at all.

use std::fs;
use std::io::Write;
use std::path::{Path, PathBuf};

use tempfile::{Builder, NamedTempFile};

use super::ExportError;

/// Beginning of the names of temporary files, so that a file left by a power cut can be recognised.
pub(super) const TEMPORARY_PREFIX: &str = ".fixability-";

/// Checks before a long run that `names` can be written into `dir`: none of them is there already (unless `force`),
/// and a file can be made in the folder, or in the nearest folder above it that exists. Leaves nothing behind.
///
/// # Errors
///
/// [`ExportError`] that says what is in the way.
pub fn prepare(dir: &Path, names: &[&str], force: bool) -> Result<(), ExportError> {
    refuse_existing(dir, names, force)?;
    let nearest = nearest_existing(dir);
    if !nearest.is_dir() {
        return Err(ExportError::NotAFolder(nearest));
    }
    temporary(&nearest).map(drop)
}

/// Writes `files` (name, bytes) into `dir`, which is made if need be.
///
/// Every file is first written whole to a temporary file in the same folder; only when all of them are on disk are
/// they renamed. A reader never sees half a file, and an error before the renaming leaves the folder as it was.
///
/// # Errors
///
/// [`ExportError`] that names the file or folder, what the system answered, and what to do. Temporary files are
/// removed. Without `force`, files already put in place by this call are removed too.
pub fn write_all(dir: &Path, files: &[(&str, Vec<u8>)], force: bool) -> Result<(), ExportError> {
    let names: Vec<&str> = files.iter().map(|(name, _)| *name).collect();
    refuse_existing(dir, &names, force)?;
    fs::create_dir_all(dir).map_err(|error| failed(dir, "make this folder", error))?;
    let written = files.iter().map(|(name, bytes)| {
        let path = dir.join(name);
        let mut file = temporary(dir)?;
        file.write_all(bytes)
            .and_then(|()| file.as_file().sync_all())
            .map_err(|error| failed(&path, "write this file", error))?;
        Ok((path, file))
    });
    // An error here drops, and so removes, the temporary files written so far.
    let written: Vec<(PathBuf, NamedTempFile)> = written.collect::<Result<_, ExportError>>()?;
    let mut placed: Vec<PathBuf> = Vec::new();
    for (path, file) in written {
        let outcome = if force { file.persist(&path) } else { file.persist_noclobber(&path) };
        match outcome {
            Ok(_) => placed.push(path),
            Err(error) => {
                if !force {
                    // These files did not exist before; half of a set of results is worse than none.
                    for path in &placed {
                        let _ = fs::remove_file(path);
                    }
                }
                return Err(failed(&path, "put this file in place", error.error));
            }
        }
    }
    Ok(())
}

fn refuse_existing(dir: &Path, names: &[&str], force: bool) -> Result<(), ExportError> {
    // A dangling link counts: renaming would replace it.
    let there = |name: &&&str| fs::symlink_metadata(dir.join(name)).is_ok();
    let names: Vec<String> = names.iter().filter(there).map(|name| (*name).to_owned()).collect();
    if names.is_empty() || force { Ok(()) } else { Err(ExportError::Exists { dir: dir.to_owned(), names }) }
}

pub(super) fn nearest_existing(dir: &Path) -> PathBuf {
    let named = dir.ancestors().find(|path| path.exists() && !path.as_os_str().is_empty());
    // A relative path with no existing part starts in the current folder.
    named.map_or_else(|| PathBuf::from("."), Path::to_owned)
}

/// A temporary file with the permissions a new file normally gets.
pub(super) fn temporary(dir: &Path) -> Result<NamedTempFile, ExportError> {
    let mut builder = Builder::new();
    builder.prefix(TEMPORARY_PREFIX);
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        // The system takes the user's mask off these bits.
        builder.permissions(fs::Permissions::from_mode(0o666));
    }
    builder.tempfile_in(dir).map_err(|error| failed(dir, "write into this folder", error))
}

pub(super) fn failed(path: &Path, what: &'static str, source: std::io::Error) -> ExportError {
    ExportError::Io { path: path.to_owned(), what, source }
}
