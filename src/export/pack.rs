//! Putting a pack in place: a folder that is whole at every instant.
//!
//! A pack is a folder that holds `pack.json` and the files that it lists, nothing else. A new one is written into a
//! temporary folder beside it and reaches its name in one step: by renaming when nothing (or an empty folder) has the name,
//! by an exchange of the two folders when an older pack has it. A reader, a kill or a power cut finds the old pack or the
//! new one. The temporary folder is `.fixability-NAME-` and some letters. Its maker holds a lock on it for as long as it
//! runs, so the next run into the same place can tell one that was left behind, and removes it.

use std::fs::{self, File};
use std::io::Write;
use std::path::{Path, PathBuf};
use std::sync::{Mutex, MutexGuard, PoisonError};

use tempfile::Builder;

use super::files::{TEMPORARY_PREFIX, failed, nearest_existing, temporary};
use super::json::pretty;
use super::{ExportError, Exporter};
use crate::input::fingerprint;
use crate::report::{BriefReport, PackFile};

/// Schema of `pack.json`.
pub const PACK_SCHEMA: &str = "fixability.brief";

/// Writes `pack.json`.
#[derive(Clone, Copy, Debug, Default)]
pub struct BriefJson;

impl Exporter for BriefJson {
    type Report = BriefReport;

    fn file_name(&self) -> &'static str {
        "pack.json"
    }

    fn bytes(&self, report: &BriefReport) -> Result<Vec<u8>, ExportError> {
        pretty(self.file_name(), report)
    }
}

/// The list of files for `pack.json`, sorted by name.
pub fn pack_files(files: &[(String, Vec<u8>)]) -> Vec<PackFile> {
    let mut listed: Vec<PackFile> = files
        .iter()
        .map(|(name, bytes)| PackFile { name: name.clone(), bytes: bytes.len(), sha256: fingerprint(bytes) })
        .collect();
    listed.sort_by(|a, b| a.name.cmp(&b.name));
    listed
}

/// The temporary folder of a pack while there is one. Whoever holds the lock may remove the folder; the writer takes the
/// lock for one file at a time, and for putting the pack in place.
#[derive(Debug, Default)]
pub struct PackInProgress(Mutex<Option<PathBuf>>);

impl PackInProgress {
    /// None yet.
    pub const fn new() -> Self {
        Self(Mutex::new(None))
    }

    fn lock(&self) -> MutexGuard<'_, Option<PathBuf>> {
        // A path is whole even if a thread died while it held the lock.
        self.0.lock().unwrap_or_else(PoisonError::into_inner)
    }

    /// Removes the temporary folder, if there is one, and keeps the lock: nothing is written after this. For an
    /// interrupted program that ends at once.
    pub fn abandon(&self) -> impl Sized {
        let guard = self.lock();
        if let Some(folder) = guard.as_ref() {
            remove_flat(folder);
        }
        guard
    }
}

/// Where a pack goes.
#[derive(Debug)]
struct Place {
    /// The folder, links followed.
    target: PathBuf,
    /// The folder that holds it (made if missing).
    parent: PathBuf,
    /// Its name, for the names of temporary folders.
    name: String,
    /// Whether an older pack stands there.
    has_pack: bool,
}

/// Checks before a long run that a pack can be put at `target`: the place is free, empty, or holds an older pack and
/// nothing else (only with `force`), and a folder can be made beside it. Removes what killed runs left there.
///
/// # Errors
///
/// [`ExportError`] that says what is in the way.
pub fn prepare_pack(target: &Path, force: bool) -> Result<(), ExportError> {
    let place = examine(target, force)?;
    remove_stale(&place)?;
    temporary(&nearest_existing(&place.parent)).map(drop)
}

/// Puts a pack of `files` (which include `pack.json`) at `target`.
///
/// # Errors
///
/// [`ExportError`] that names the folder or file, what the system answered, and what to do. What stood there before
/// stands there still.
pub fn write_pack(
    target: &Path,
    files: &[(String, Vec<u8>)],
    force: bool,
    in_progress: &PackInProgress,
) -> Result<(), ExportError> {
    let place = examine(target, force)?;
    fs::create_dir_all(&place.parent).map_err(|error| failed(&place.parent, "make this folder", error))?;
    let (folder, _lock) = temporary_folder(&place, in_progress)?;
    let outcome = fill(&folder, files, in_progress).and_then(|()| put_in_place(&folder, &place, in_progress));
    let mut guard = in_progress.lock();
    if outcome.is_err() {
        remove_flat(&folder);
    }
    *guard = None;
    outcome
}

/// Looks at the place, and refuses what is not a place for a pack.
fn examine(target: &Path, force: bool) -> Result<Place, ExportError> {
    let unusable =
        |reason: &str| ExportError::PackPlace { path: target.to_owned(), reason: reason.to_owned() };
    let is_there = fs::symlink_metadata(target).is_ok();
    let resolved = if is_there {
        let real = fs::canonicalize(target).map_err(|error| failed(target, "follow this path", error))?;
        if !real.is_dir() {
            return Err(ExportError::NotAFolder(target.to_owned()));
        }
        real
    } else {
        std::path::absolute(target).map_err(|error| failed(target, "follow this path", error))?
    };
    let nearest = nearest_existing(&resolved);
    if !nearest.is_dir() {
        return Err(ExportError::NotAFolder(nearest));
    }
    let (Some(parent), Some(name)) = (resolved.parent(), resolved.file_name()) else {
        return Err(unusable("it has no folder above it"));
    };
    let mut place = Place {
        parent: parent.to_owned(),
        name: name.to_string_lossy().into_owned(),
        has_pack: false,
        target: resolved.clone(),
    };
    if !is_there {
        return Ok(place);
    }
    if std::env::current_dir().is_ok_and(|here| here.starts_with(&resolved)) {
        return Err(unusable("it is the current folder, which cannot be replaced in one step"));
    }
    #[cfg(unix)]
    {
        use std::os::unix::fs::MetadataExt;
        let device = |path: &Path| fs::metadata(path).map(|data| data.dev()).ok();
        if device(&place.target) != device(&place.parent) {
            return Err(unusable("it is the top of a disk, which cannot be replaced in one step"));
        }
    }
    let mut names = names_in(&resolved).map_err(|error| failed(target, "list this folder", error))?;
    if names.is_empty() {
        return Ok(place);
    }
    let known = names_of_pack(&resolved);
    names.retain(|name| !known.contains(name));
    if !names.is_empty() {
        return Err(ExportError::Foreign { dir: target.to_owned(), names });
    }
    if !force {
        return Err(ExportError::Exists {
            dir: target.to_owned(),
            names: vec!["a pack (pack.json)".to_owned()],
        });
    }
    place.has_pack = true;
    Ok(place)
}

/// Names in a folder, sorted. A name that is not Unicode is shown as far as it is, and so is never one of a pack.
fn names_in(folder: &Path) -> std::io::Result<Vec<String>> {
    let mut names = fs::read_dir(folder)?
        .map(|entry| entry.map(|entry| entry.file_name().to_string_lossy().into_owned()))
        .collect::<Result<Vec<_>, _>>()?;
    names.sort();
    Ok(names)
}

/// Names that the `pack.json` of a folder accounts for, its own among them; none when it is not that of a pack. A name
/// counts only where it is a plain file.
fn names_of_pack(folder: &Path) -> Vec<String> {
    let read = || -> Option<Vec<String>> {
        let bytes = fs::read(folder.join("pack.json")).ok()?;
        let pack: serde_json::Value = serde_json::from_slice(&bytes).ok()?;
        if pack["schema"] != PACK_SCHEMA {
            return None;
        }
        let listed = pack["files"].as_array()?.iter().filter_map(|file| file["name"].as_str());
        Some(listed.chain(["pack.json"]).map(str::to_owned).collect())
    };
    let mut names = read().unwrap_or_default();
    names.retain(|name| fs::symlink_metadata(folder.join(name)).is_ok_and(|data| data.is_file()));
    names
}

/// Beginning of the names of temporary folders for this place.
fn prefix(place: &Place) -> String {
    format!("{TEMPORARY_PREFIX}{}-", place.name)
}

/// Makes and locks a temporary folder beside the place.
fn temporary_folder(
    place: &Place,
    in_progress: &PackInProgress,
) -> Result<(PathBuf, Option<File>), ExportError> {
    let mut guard = in_progress.lock();
    let mut builder = Builder::new();
    let prefix = prefix(place);
    builder.prefix(&prefix);
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        // The system takes the user's mask off these bits.
        builder.permissions(fs::Permissions::from_mode(0o777));
    }
    let folder = builder
        .tempdir_in(&place.parent)
        .map_err(|error| failed(&place.parent, "make a folder in this folder", error))?
        .keep();
    // Between the two calls another run could take the new folder for one left behind; then writing into it fails, and
    // says so. Where folders cannot be locked, none is ever removed as left behind.
    let lock = File::open(&folder).ok().filter(|handle| handle.try_lock().is_ok());
    *guard = Some(folder.clone());
    Ok((folder, lock))
}

/// Writes the files, and has the system put them on the disk.
fn fill(folder: &Path, files: &[(String, Vec<u8>)], in_progress: &PackInProgress) -> Result<(), ExportError> {
    for (name, bytes) in files {
        let _guard = in_progress.lock();
        let path = folder.join(name);
        File::create_new(&path)
            .and_then(|mut file| {
                file.write_all(bytes)?;
                file.sync_all()
            })
            .map_err(|error| failed(&path, "write this file", error))?;
    }
    sync_folder(folder);
    Ok(())
}

/// One step from the old state to the new one.
fn put_in_place(folder: &Path, place: &Place, in_progress: &PackInProgress) -> Result<(), ExportError> {
    let mut guard = in_progress.lock();
    let failed = |error| failed(&place.target, "put the pack in place", error);
    if place.has_pack {
        exchange(folder, &place.target).map_err(failed)?;
        // The temporary name now holds the old pack.
        let known = names_of_pack(folder);
        for name in known {
            let _ = fs::remove_file(folder.join(name));
        }
        // Fails, and leaves the folder, when somebody has put a file of their own there in the meantime.
        let _ = fs::remove_dir(folder);
    } else {
        // A system that does not rename onto an empty folder needs it gone; a folder that is not empty stays.
        #[cfg(not(unix))]
        let _ = fs::remove_dir(&place.target);
        fs::rename(folder, &place.target).map_err(failed)?;
    }
    sync_folder(&place.parent);
    *guard = None;
    Ok(())
}

/// Exchanges two folders in one step.
#[cfg(any(target_os = "linux", target_os = "android", target_vendor = "apple"))]
fn exchange(new: &Path, old: &Path) -> std::io::Result<()> {
    use rustix::fs::{CWD, RenameFlags, renameat_with};
    use rustix::io::Errno;
    match renameat_with(CWD, new, CWD, old, RenameFlags::EXCHANGE) {
        // Some file systems cannot; then two steps have to do.
        Err(Errno::INVAL | Errno::NOSYS | Errno::OPNOTSUPP) => exchange_in_steps(new, old),
        other => other.map_err(Into::into),
    }
}

/// Exchanges two folders as far as the system can.
#[cfg(not(any(target_os = "linux", target_os = "android", target_vendor = "apple")))]
fn exchange(new: &Path, old: &Path) -> std::io::Result<()> {
    exchange_in_steps(new, old)
}

/// Ending of the name of an old pack between the steps of an exchange.
const ASIDE: &str = "-old";

/// Exchanges two folders in steps. Between the steps the name is free for an instant, and the old pack whole under its
/// temporary name, from which [`remove_stale`] brings it back.
fn exchange_in_steps(new: &Path, old: &Path) -> std::io::Result<()> {
    let mut aside = new.as_os_str().to_owned();
    aside.push(ASIDE);
    let aside = PathBuf::from(aside);
    fs::rename(old, &aside)?;
    if let Err(error) = fs::rename(new, old) {
        fs::rename(&aside, old)?;
        return Err(error);
    }
    fs::rename(&aside, new)
}

/// Removes the temporary folders that killed runs left for this place: those that nobody has locked. An old pack that
/// was killed on its way aside gets its name back, and is then in the way as any pack.
fn remove_stale(place: &Place) -> Result<(), ExportError> {
    let prefix = prefix(place);
    let Ok(names) = names_in(&place.parent) else { return Ok(()) };
    for name in names.iter().filter(|name| name.starts_with(&prefix)) {
        let folder = place.parent.join(name);
        let is_folder = fs::symlink_metadata(&folder).is_ok_and(|data| data.is_dir());
        if !is_folder || !File::open(&folder).is_ok_and(|handle| handle.try_lock().is_ok()) {
            continue;
        }
        if name.ends_with(ASIDE) && !place.target.exists() {
            fs::rename(&folder, &place.target)
                .map_err(|error| failed(&place.target, "restore this pack", error))?;
            return Err(ExportError::Restored(place.target.clone()));
        }
        remove_flat(&folder);
    }
    Ok(())
}

/// Removes a folder of plain files; one that holds anything else stays.
fn remove_flat(folder: &Path) {
    let Ok(names) = names_in(folder) else { return };
    for name in names {
        let _ = fs::remove_file(folder.join(name));
    }
    let _ = fs::remove_dir(folder);
}

/// Has the system put the names in a folder on the disk. Where that is not possible the names are as safe as the system
/// makes them.
fn sync_folder(folder: &Path) {
    if let Ok(handle) = File::open(folder) {
        let _ = handle.sync_all();
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn folder_with(parent: &Path, name: &str, text: &str) -> PathBuf {
        let folder = parent.join(name);
        fs::create_dir(&folder).unwrap();
        fs::write(folder.join("pack.json"), text).unwrap();
        folder
    }

    fn text(folder: &Path) -> String {
        fs::read_to_string(folder.join("pack.json")).unwrap()
    }

    #[test]
    fn both_ways_of_exchanging_exchange() {
        for way in [exchange, exchange_in_steps] {
            let parent = tempfile::tempdir().unwrap();
            let (new, old) =
                (folder_with(parent.path(), "new", "new"), folder_with(parent.path(), "old", "old"));
            way(&new, &old).unwrap();
            assert_eq!((text(&new), text(&old)), ("old".to_owned(), "new".to_owned()));
            assert_eq!(names_in(parent.path()).unwrap(), ["new", "old"]);
        }
    }

    #[test]
    fn an_exchange_in_steps_that_fails_puts_the_old_one_back() {
        let parent = tempfile::tempdir().unwrap();
        let old = folder_with(parent.path(), "old", "old");
        assert!(exchange_in_steps(&parent.path().join("missing"), &old).is_err());
        assert_eq!(text(&old), "old");
    }

    /// Killed between the steps: the name is free, and the old pack stands aside.
    #[test]
    fn a_pack_left_aside_gets_its_name_back() {
        let parent = tempfile::tempdir().unwrap();
        let target = parent.path().join("pack");
        folder_with(parent.path(), ".fixability-pack-abc-old", "old");
        folder_with(parent.path(), ".fixability-pack-abc", "new");
        let error = prepare_pack(&target, true).unwrap_err();
        assert!(matches!(error, ExportError::Restored(_)), "{error}");
        assert_eq!(text(&target), "old");
    }

    /// A folder that its maker has locked is in use; one that nobody has locked was left behind.
    #[test]
    fn only_what_was_left_behind_is_removed() {
        let parent = tempfile::tempdir().unwrap();
        let in_use = folder_with(parent.path(), ".fixability-pack-aaa", "in use");
        let left = folder_with(parent.path(), ".fixability-pack-bbb", "left");
        let lock = File::open(&in_use).unwrap();
        lock.try_lock().unwrap();
        prepare_pack(&parent.path().join("pack"), false).unwrap();
        assert!(in_use.is_dir() && !left.exists());
    }
}
