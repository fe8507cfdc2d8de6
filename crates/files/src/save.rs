//! Saving: the file at a path is whole at any instant, and the generation before it is kept.
//!
//! The new text is written beside the file and flushed to the disk; the old file becomes `NAME.before`; then the new one
//! takes its place in one step. Whenever the program is stopped, the path holds the last text or the one before it.

use crate::digest::sha256;
use std::fs;
use std::io::{self, Write};
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicU64, Ordering};
use std::time::Duration;

/// What was saved.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Saved {
    /// The file, links followed.
    pub path: PathBuf,
    /// SHA-256 of its bytes, to notice later that another program changed it.
    pub sha256: String,
}

/// Why saving failed. The file at the path is then as it was.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum SaveError {
    /// The file changed since it was opened: another window or program has it.
    #[error(
        "{path} was changed by another window or program since it was opened here; save under another name, or save anyway to replace it (it is kept as {backup})"
    )]
    ChangedOnDisk {
        /// The file.
        path: String,
        /// Where the other's text would be kept.
        backup: String,
    },
    /// There is no file name in the path.
    #[error("{0} has no file name to save under")]
    NoName(String),
    /// The disk refused.
    #[error("{path} was not saved: {reason}. What was there before is unchanged")]
    Refused {
        /// The file.
        path: String,
        /// In the user's words.
        reason: String,
        /// What the system said.
        source: io::Error,
    },
}

/// The few things saving asks of a disk; a test puts a failing one in its place.
pub(crate) trait Disk {
    fn create(&self, path: &Path) -> io::Result<Box<dyn DiskFile>>;
    fn read(&self, path: &Path) -> io::Result<Vec<u8>>;
    fn copy_permissions(&self, from: &Path, to: &Path) -> io::Result<()>;
    fn link(&self, from: &Path, to: &Path) -> io::Result<()>;
    fn copy(&self, from: &Path, to: &Path) -> io::Result<()>;
    fn rename(&self, from: &Path, to: &Path) -> io::Result<()>;
    fn remove(&self, path: &Path) -> io::Result<()>;
    fn sync_folder(&self, folder: &Path) -> io::Result<()>;
}

/// An open file of such a disk.
pub(crate) trait DiskFile: Write {
    fn sync(&self) -> io::Result<()>;
}

impl DiskFile for fs::File {
    fn sync(&self) -> io::Result<()> {
        self.sync_all()
    }
}

/// The real disk.
pub(crate) struct RealDisk;

impl Disk for RealDisk {
    fn create(&self, path: &Path) -> io::Result<Box<dyn DiskFile>> {
        Ok(Box::new(fs::OpenOptions::new().write(true).create_new(true).open(path)?))
    }
    fn read(&self, path: &Path) -> io::Result<Vec<u8>> {
        fs::read(path)
    }
    fn copy_permissions(&self, from: &Path, to: &Path) -> io::Result<()> {
        fs::set_permissions(to, fs::metadata(from)?.permissions())
    }
    fn link(&self, from: &Path, to: &Path) -> io::Result<()> {
        fs::hard_link(from, to)
    }
    fn copy(&self, from: &Path, to: &Path) -> io::Result<()> {
        fs::copy(from, to)?;
        fs::File::open(to)?.sync_all()
    }
    fn rename(&self, from: &Path, to: &Path) -> io::Result<()> {
        fs::rename(from, to)
    }
    fn remove(&self, path: &Path) -> io::Result<()> {
        fs::remove_file(path)
    }
    #[cfg(unix)]
    fn sync_folder(&self, folder: &Path) -> io::Result<()> {
        fs::File::open(folder)?.sync_all()
    }
    #[cfg(not(unix))]
    fn sync_folder(&self, _folder: &Path) -> io::Result<()> {
        Ok(())
    }
}

/// Where the generation before is kept: `NAME.before`.
pub fn backup_path(path: &Path) -> PathBuf {
    let mut name = path.file_name().unwrap_or_default().to_owned();
    name.push(".before");
    path.with_file_name(name)
}

/// Saves text at a path. `expected` is the SHA-256 the file had when it was opened or last saved here; when another
/// program has changed it since, nothing is written. `None` saves whatever is there.
///
/// # Errors
/// With a sentence; the file is then as it was.
pub fn save(path: &Path, text: &[u8], expected: Option<&str>) -> Result<Saved, SaveError> {
    let saved = save_on(&RealDisk, path, text, expected)?;
    remove_leftovers(&saved.path);
    Ok(saved)
}

pub(crate) fn save_on(
    disk: &dyn Disk,
    path: &Path,
    text: &[u8],
    expected: Option<&str>,
) -> Result<Saved, SaveError> {
    // A link stays a link: what it points to is saved.
    let path = fs::canonicalize(path).unwrap_or_else(|_| path.to_owned());
    if path.file_name().is_none() {
        return Err(SaveError::NoName(path.display().to_string()));
    }
    let backup = backup_path(&path);
    let exists = path.symlink_metadata().is_ok();
    let refused = |source: io::Error| SaveError::Refused {
        path: path.display().to_string(),
        reason: reason_of(&source),
        source,
    };
    if exists && path.is_dir() {
        return Err(refused(io::Error::from(io::ErrorKind::IsADirectory)));
    }
    if exists && fs::metadata(&path).is_ok_and(|about| about.permissions().readonly()) {
        // Renaming over it would succeed; a file marked read-only is meant to stay.
        return Err(refused(io::Error::from(io::ErrorKind::PermissionDenied)));
    }
    if let Some(expected) = expected.filter(|_| exists) {
        let found = disk.read(&path).map_err(refused)?;
        if sha256(&found) != expected {
            return Err(SaveError::ChangedOnDisk {
                path: path.display().to_string(),
                backup: backup.display().to_string(),
            });
        }
    }
    let fresh = beside(&path);
    let written = write_new(disk, &fresh, text).and_then(|()| {
        if exists {
            disk.copy_permissions(&path, &fresh)?;
            keep_before(disk, &path, &backup)?;
        }
        disk.rename(&fresh, &path)
    });
    if let Err(error) = written {
        // Only our own unfinished file is removed; that it may be gone already does not matter.
        let _ = disk.remove(&fresh);
        return Err(refused(error));
    }
    // The new text is in place. A folder that cannot be flushed only delays it, so it is no failure of saving.
    let _ = disk.sync_folder(path.parent().unwrap_or(Path::new(".")));
    Ok(Saved { path, sha256: sha256(text) })
}

fn write_new(disk: &dyn Disk, path: &Path, text: &[u8]) -> io::Result<()> {
    let mut file = disk.create(path)?;
    file.write_all(text)?;
    file.flush()?;
    file.sync()
}

/// Makes the present file also the one before, in one step, without ever taking it from its place.
fn keep_before(disk: &dyn Disk, path: &Path, backup: &Path) -> io::Result<()> {
    let step = beside(backup);
    if disk.link(path, &step).is_err() {
        disk.copy(path, &step).inspect_err(|_| drop(disk.remove(&step)))?;
    }
    disk.rename(&step, backup).inspect_err(|_| drop(disk.remove(&step)))
}

/// A name beside `path` that no other save uses.
fn beside(path: &Path) -> PathBuf {
    static COUNT: AtomicU64 = AtomicU64::new(0);
    let count = COUNT.fetch_add(1, Ordering::Relaxed);
    let name = path.file_name().unwrap_or_default().to_string_lossy();
    path.with_file_name(format!(".{name}.{}-{count}.part", std::process::id()))
}

/// Removes unfinished files that a stopped program left beside `path` more than an hour ago.
fn remove_leftovers(path: &Path) {
    let (Some(folder), Some(name)) = (path.parent(), path.file_name()) else { return };
    let start = format!(".{}.", name.to_string_lossy());
    let Ok(entries) = fs::read_dir(folder) else { return };
    for entry in entries.flatten() {
        let file = entry.file_name();
        let file = file.to_string_lossy();
        let old = entry
            .metadata()
            .and_then(|about| about.modified())
            .is_ok_and(|at| at.elapsed().is_ok_and(|age| age > Duration::from_secs(3600)));
        if old && file.starts_with(&start) && file.ends_with(".part") {
            let _ = fs::remove_file(entry.path());
        }
    }
}

/// What the system said, in words that say what to do.
pub fn reason_of(error: &io::Error) -> String {
    match error.kind() {
        io::ErrorKind::StorageFull | io::ErrorKind::QuotaExceeded => {
            "the disk is full; make room or save elsewhere".to_owned()
        }
        io::ErrorKind::ReadOnlyFilesystem => "the disk is read-only; save elsewhere".to_owned(),
        io::ErrorKind::PermissionDenied => {
            "the file or its folder may not be written by you; save elsewhere or change its permissions"
                .to_owned()
        }
        io::ErrorKind::NotFound => "its folder is not there".to_owned(),
        io::ErrorKind::IsADirectory => "there is a folder of that name".to_owned(),
        io::ErrorKind::InvalidFilename => {
            "the name is too long or holds a character the disk does not allow".to_owned()
        }
        _ => error.to_string(),
    }
}

#[cfg(test)]
mod faults;
