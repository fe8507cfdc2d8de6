//! The journal: every change since the last save, so that nothing is lost however the program ends.
//!
//! One file a window, in a folder of the user's state. Its first line holds the project as it was saved or opened, each
//! further line one change. A line is a checksum and one JSON value, so a line cut short by a crash is noticed and left
//! out. The file is locked while its window lives: what is not locked was left behind and can be recovered.

use crate::digest::sha256;
use project::Project;
use serde::{Deserialize, Serialize, de::DeserializeOwned};
use std::fs::{self, File, OpenOptions, TryLockError};
use std::io::{self, BufRead, BufReader, Write};
use std::path::{Path, PathBuf};
use std::time::{SystemTime, UNIX_EPOCH};

/// Version of the journal's lines; a journal of another version is left alone.
pub const JOURNAL_VERSION: u32 = 1;
/// Ending of journal files.
pub const EXTENSION: &str = "journal";
/// Longest line that is read back, bytes.
const GREATEST_LINE: u64 = 256 * 1024 * 1024;

/// What the changes are changes of.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Header {
    /// [`JOURNAL_VERSION`].
    pub journal_version: u32,
    /// Name and version of the program that wrote it.
    pub program: String,
    /// Where the project is kept, if it was ever saved.
    pub path: Option<PathBuf>,
    /// The project before the first change.
    pub base: Project,
}

impl Header {
    /// A header of the newest version.
    pub fn new(program: impl Into<String>, path: Option<PathBuf>, base: Project) -> Self {
        Self { journal_version: JOURNAL_VERSION, program: program.into(), path, base }
    }
}

/// An open journal, locked for as long as it lives.
#[derive(Debug)]
pub struct Journal {
    path: PathBuf,
    file: File,
    entries: usize,
}

/// A journal that was left behind.
#[derive(Debug, Clone, PartialEq)]
pub struct LeftBehind<T> {
    /// The journal file.
    pub path: PathBuf,
    /// What the changes are changes of.
    pub header: Header,
    /// The changes, in order, up to the first damaged line.
    pub entries: Vec<T>,
    /// True when a line was damaged or cut short; it and what follows is left out.
    pub damaged: bool,
    /// When the journal was last written.
    pub modified: Option<SystemTime>,
}

impl Journal {
    /// Starts a journal in `folder`, which is made when it is not there.
    ///
    /// # Errors
    /// When the folder or file cannot be written.
    pub fn begin(folder: &Path, header: &Header) -> io::Result<Self> {
        fs::create_dir_all(folder)?;
        let since = SystemTime::now().duration_since(UNIX_EPOCH).unwrap_or_default();
        let name = format!("{:013}-{}", since.as_millis(), std::process::id());
        for k in 0.. {
            let path = folder.join(format!("{name}-{k}.{EXTENSION}"));
            match open_new(&path, header) {
                Ok(file) => return Ok(Self { path, file, entries: 0 }),
                Err(error) if error.kind() == io::ErrorKind::AlreadyExists && k < 1000 => {}
                Err(error) => return Err(error),
            }
        }
        Err(io::ErrorKind::AlreadyExists.into())
    }

    /// The journal file.
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// Changes written since the start or the last [`Journal::restart`].
    pub fn entries(&self) -> usize {
        self.entries
    }

    /// Appends changes; once this returns they survive the end of the program (not yet of the machine: see
    /// [`Journal::flush`]).
    ///
    /// # Errors
    /// When a change cannot be written.
    pub fn append<T: Serialize>(&mut self, entries: &[T]) -> io::Result<()> {
        let mut lines = Vec::new();
        for entry in entries {
            write_line(&mut lines, entry)?;
        }
        self.file.write_all(&lines)?;
        self.entries += entries.len();
        Ok(())
    }

    /// Waits until everything is on the disk; a few milliseconds, so not for every frame.
    ///
    /// # Errors
    /// When the disk refuses.
    pub fn flush(&self) -> io::Result<()> {
        self.file.sync_data()
    }

    /// Starts over from another project, as after a save. The old lines are replaced in one step.
    ///
    /// # Errors
    /// When the new file cannot be written; the journal then goes on as before.
    pub fn restart(&mut self, header: &Header) -> io::Result<()> {
        let fresh = self.path.with_extension("part");
        let _ = fs::remove_file(&fresh);
        let file = open_new(&fresh, header)?;
        fs::rename(&fresh, &self.path).inspect_err(|_| drop(fs::remove_file(&fresh)))?;
        self.file = file;
        self.entries = 0;
        Ok(())
    }

    /// Ends the journal when nothing in it is needed any more.
    ///
    /// # Errors
    /// When the file cannot be removed.
    pub fn finish(self) -> io::Result<()> {
        fs::remove_file(&self.path)
    }
}

fn open_new(path: &Path, header: &Header) -> io::Result<File> {
    let mut file = OpenOptions::new().append(true).read(true).create_new(true).open(path)?;
    match file.try_lock() {
        // A disk without locks still keeps the journal; only the notice of another window is lost.
        Ok(()) | Err(TryLockError::Error(_)) => {}
        Err(TryLockError::WouldBlock) => return Err(io::ErrorKind::AlreadyExists.into()),
    }
    let mut line = Vec::new();
    write_line(&mut line, header)?;
    file.write_all(&line)?;
    file.sync_data()?;
    Ok(file)
}

fn write_line<T: Serialize>(out: &mut Vec<u8>, value: &T) -> io::Result<()> {
    let json = serde_json::to_string(value).map_err(io::Error::other)?;
    out.extend_from_slice(&sha256(json.as_bytes()).as_bytes()[..16]);
    out.push(b' ');
    out.extend_from_slice(json.as_bytes());
    out.push(b'\n');
    Ok(())
}

/// Every journal in `folder` that no window holds, the newest first. What cannot be read at all is left alone and out.
pub fn left_behind<T: DeserializeOwned>(folder: &Path) -> Vec<LeftBehind<T>> {
    let mut found: Vec<LeftBehind<T>> =
        journals(folder).filter(|path| !is_held(path)).filter_map(|path| read_journal(&path).ok()).collect();
    found.sort_by(|a, b| b.path.file_name().cmp(&a.path.file_name()));
    found
}

/// The process-wide question "is this project open in another window?": true when a journal that a window holds is
/// about that path.
pub fn is_open_elsewhere(folder: &Path, project: &Path, own: Option<&Path>) -> bool {
    let same = |path: &Path| {
        path == project
            || fs::canonicalize(path).ok().is_some_and(|p| fs::canonicalize(project).is_ok_and(|q| p == q))
    };
    journals(folder).filter(|path| own != Some(path.as_path()) && is_held(path)).any(|path| {
        let header = File::open(path).and_then(|file| read_header(&mut BufReader::new(file)));
        header.is_ok_and(|header| header.path.as_deref().is_some_and(same))
    })
}

/// Reads one journal.
///
/// # Errors
/// When the file cannot be read, or its first line is damaged or of another version.
pub fn read_journal<T: DeserializeOwned>(path: &Path) -> io::Result<LeftBehind<T>> {
    let file = File::open(path)?;
    let modified = file.metadata().and_then(|about| about.modified()).ok();
    let mut reader = BufReader::new(file);
    let header = read_header(&mut reader)?;
    let mut entries = Vec::new();
    let mut damaged = false;
    while !damaged {
        match read_line(&mut reader) {
            Ok(None) => break,
            Ok(Some(entry)) => entries.push(entry),
            Err(_) => damaged = true,
        }
    }
    Ok(LeftBehind { path: path.to_owned(), header, entries, damaged, modified })
}

fn read_header(reader: &mut impl BufRead) -> io::Result<Header> {
    let header: Header = read_line(reader)?.ok_or_else(damaged)?;
    if header.journal_version != JOURNAL_VERSION {
        return Err(io::Error::other(format!(
            "expected a journal of version {JOURNAL_VERSION}, found {}",
            header.journal_version
        )));
    }
    header.base.check().map_err(io::Error::other)?;
    Ok(header)
}

fn read_line<T: DeserializeOwned>(reader: &mut impl BufRead) -> io::Result<Option<T>> {
    let mut line = Vec::new();
    io::Read::take(&mut *reader, GREATEST_LINE).read_until(b'\n', &mut line)?;
    if line.is_empty() {
        return Ok(None);
    }
    let json = line.strip_suffix(b"\n").and_then(|line| line.get(17..)).ok_or_else(damaged)?;
    if line.get(..16) != Some(&sha256(json).as_bytes()[..16]) {
        return Err(damaged());
    }
    serde_json::from_slice(json).map(Some).map_err(io::Error::other)
}

fn damaged() -> io::Error {
    io::Error::new(io::ErrorKind::InvalidData, "a line of the journal is damaged or cut short")
}

fn journals(folder: &Path) -> impl Iterator<Item = PathBuf> {
    fs::read_dir(folder)
        .into_iter()
        .flatten()
        .flatten()
        .map(|entry| entry.path())
        .filter(|path| path.extension().is_some_and(|extension| extension == EXTENSION))
}

fn is_held(path: &Path) -> bool {
    File::open(path).is_ok_and(|file| matches!(file.try_lock_shared(), Err(TryLockError::WouldBlock)))
}

/// The folder of this user's journals: `XDG_STATE_HOME` or `~/.local/state`, on Windows `LOCALAPPDATA`, on macOS
/// `~/Library/Application Support`, and in it `whitesmith`. `None` when the system names none.
pub fn default_folder() -> Option<PathBuf> {
    let from = |name: &str| std::env::var_os(name).map(PathBuf::from).filter(|path| path.is_absolute());
    let base = if cfg!(windows) {
        from("LOCALAPPDATA")
    } else if cfg!(target_os = "macos") {
        from("HOME").map(|home| home.join("Library/Application Support"))
    } else {
        from("XDG_STATE_HOME").or_else(|| from("HOME").map(|home| home.join(".local/state")))
    };
    base.map(|base| base.join("whitesmith"))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::blend_sheet::tests::demo;

    fn begin(folder: &Path) -> Journal {
        Journal::begin(folder, &Header::new("test 1", Some("/harbour/cabin.ron".into()), demo())).unwrap()
    }

    #[test]
    fn what_was_appended_is_found_once_the_window_is_gone() {
        let folder = tempfile::tempdir().unwrap();
        let mut journal = begin(folder.path());
        journal.append(&["pull", "type"]).unwrap();
        journal.append(&["lock"]).unwrap();
        assert_eq!(journal.entries(), 3);
        assert!(left_behind::<String>(folder.path()).is_empty(), "held by a living window");
        drop(journal);
        let found = left_behind::<String>(folder.path());
        assert_eq!(found.len(), 1);
        assert_eq!(found[0].entries, ["pull", "type", "lock"]);
        assert_eq!(found[0].header.base, demo());
        assert!(!found[0].damaged);
    }

    #[test]
    fn a_line_cut_short_loses_only_itself() {
        let folder = tempfile::tempdir().unwrap();
        let mut journal = begin(folder.path());
        let path = journal.path().to_owned();
        let start = fs::metadata(&path).unwrap().len();
        journal.append(&["one", "two", "three"]).unwrap();
        drop(journal);
        let whole = fs::read(&path).unwrap();
        for length in start as usize..whole.len() {
            fs::write(&path, &whole[..length]).unwrap();
            let found = read_journal::<String>(&path).unwrap();
            let lines = whole[start as usize..length].iter().filter(|b| **b == b'\n').count();
            assert_eq!(found.entries.len(), lines, "{length}");
            assert_eq!(found.damaged, length > start as usize && whole[length - 1] != b'\n');
        }
        for length in 0..start as usize {
            if length % 4099 == 0 {
                fs::write(&path, &whole[..length]).unwrap();
                assert!(read_journal::<String>(&path).is_err(), "{length}");
            }
        }
    }

    #[test]
    fn a_changed_byte_is_noticed() {
        let folder = tempfile::tempdir().unwrap();
        let mut journal = begin(folder.path());
        journal.append(&["one", "two"]).unwrap();
        let path = journal.path().to_owned();
        drop(journal);
        let mut bytes = fs::read(&path).unwrap();
        let at = bytes.len() - 4;
        bytes[at] ^= 1;
        fs::write(&path, bytes).unwrap();
        let found = read_journal::<String>(&path).unwrap();
        assert!(found.damaged && found.entries == ["one"]);
    }

    #[test]
    fn after_a_save_the_journal_starts_over_and_stays_locked() {
        let folder = tempfile::tempdir().unwrap();
        let mut journal = begin(folder.path());
        journal.append(&["one"]).unwrap();
        let mut saved = demo();
        saved.name = "Saved".into();
        journal.restart(&Header::new("test 1", None, saved.clone())).unwrap();
        assert!(left_behind::<String>(folder.path()).is_empty());
        journal.append(&["two"]).unwrap();
        drop(journal);
        let found = left_behind::<String>(folder.path());
        assert_eq!((found[0].entries.as_slice(), &found[0].header.base), (&["two".to_owned()][..], &saved));
    }

    #[test]
    fn a_finished_journal_is_gone_and_another_window_is_noticed() {
        let folder = tempfile::tempdir().unwrap();
        let journal = begin(folder.path());
        let project = Path::new("/harbour/cabin.ron");
        assert!(is_open_elsewhere(folder.path(), project, None));
        assert!(!is_open_elsewhere(folder.path(), project, Some(journal.path())));
        assert!(!is_open_elsewhere(folder.path(), Path::new("/harbour/other.ron"), None));
        journal.finish().unwrap();
        assert!(!is_open_elsewhere(folder.path(), project, None));
        assert!(left_behind::<String>(folder.path()).is_empty());
    }

    #[test]
    fn strange_files_in_the_folder_are_left_alone() {
        let folder = tempfile::tempdir().unwrap();
        fs::write(folder.path().join("x.journal"), b"\xff\xfe nonsense").unwrap();
        fs::write(folder.path().join("empty.journal"), b"").unwrap();
        fs::create_dir(folder.path().join("folder.journal")).unwrap();
        assert!(left_behind::<String>(folder.path()).is_empty());
        assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 3);
    }
}
