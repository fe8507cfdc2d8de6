//! A disk that fails: whichever step fails and however, the path holds the last text or the one before it.

use super::*;
use std::cell::{Cell, RefCell};
use std::rc::Rc;

/// How the chosen step fails.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Fault {
    /// Nothing is done and the system says so.
    Error(io::ErrorKind),
    /// Half is written, then the system says so (writes only; else as an error).
    ShortWrite,
    /// The program is stopped before the step: nothing after it happens either.
    StoppedBefore,
    /// The program is stopped right after the step.
    StoppedAfter,
}

#[derive(Clone)]
struct FailingDisk {
    fault: Fault,
    at: usize,
    step: Rc<Cell<usize>>,
    stopped: Rc<Cell<bool>>,
    log: Rc<RefCell<Vec<&'static str>>>,
}

impl FailingDisk {
    fn new(fault: Fault, at: usize) -> Self {
        Self { fault, at, step: Rc::default(), stopped: Rc::default(), log: Rc::default() }
    }

    /// Runs a step, or fails as told.
    fn run<T>(&self, name: &'static str, step: impl FnOnce() -> io::Result<T>) -> io::Result<T> {
        let gone = || io::Error::other("the program was stopped");
        if self.stopped.get() {
            return Err(gone());
        }
        let number = self.step.replace(self.step.get() + 1);
        self.log.borrow_mut().push(name);
        if number != self.at {
            return step();
        }
        match self.fault {
            Fault::Error(kind) => Err(kind.into()),
            Fault::ShortWrite => Err(io::ErrorKind::StorageFull.into()),
            Fault::StoppedBefore => {
                self.stopped.set(true);
                Err(gone())
            }
            Fault::StoppedAfter => {
                let done = step();
                self.stopped.set(true);
                done.and_then(|_| Err(gone()))
            }
        }
    }
}

struct FailingFile {
    disk: FailingDisk,
    file: fs::File,
}

impl Write for FailingFile {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        let half = bytes.len() / 2;
        let short = self.disk.fault == Fault::ShortWrite && self.disk.step.get() == self.disk.at;
        if short {
            self.file.write_all(&bytes[..half])?;
        }
        let file = &mut self.file;
        self.disk.run("write", || file.write(bytes))
    }
    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

impl DiskFile for FailingFile {
    fn sync(&self) -> io::Result<()> {
        self.disk.run("sync", || self.file.sync_all())
    }
}

impl Disk for FailingDisk {
    fn create(&self, path: &Path) -> io::Result<Box<dyn DiskFile>> {
        self.run("create", || {
            let file = fs::OpenOptions::new().write(true).create_new(true).open(path)?;
            Ok(Box::new(FailingFile { disk: self.clone(), file }) as Box<dyn DiskFile>)
        })
    }
    fn read(&self, path: &Path) -> io::Result<Vec<u8>> {
        self.run("read", || fs::read(path))
    }
    fn copy_permissions(&self, from: &Path, to: &Path) -> io::Result<()> {
        self.run("permissions", || RealDisk.copy_permissions(from, to))
    }
    fn link(&self, from: &Path, to: &Path) -> io::Result<()> {
        self.run("link", || fs::hard_link(from, to))
    }
    fn copy(&self, from: &Path, to: &Path) -> io::Result<()> {
        self.run("copy", || RealDisk.copy(from, to))
    }
    fn rename(&self, from: &Path, to: &Path) -> io::Result<()> {
        self.run("rename", || fs::rename(from, to))
    }
    fn remove(&self, path: &Path) -> io::Result<()> {
        self.run("remove", || fs::remove_file(path))
    }
    fn sync_folder(&self, folder: &Path) -> io::Result<()> {
        self.run("sync folder", || RealDisk.sync_folder(folder))
    }
}

const FAULTS: [Fault; 7] = [
    Fault::Error(io::ErrorKind::StorageFull),
    Fault::Error(io::ErrorKind::PermissionDenied),
    Fault::Error(io::ErrorKind::ReadOnlyFilesystem),
    Fault::Error(io::ErrorKind::Other),
    Fault::ShortWrite,
    Fault::StoppedBefore,
    Fault::StoppedAfter,
];

#[test]
fn whatever_fails_the_last_or_the_previous_text_is_there() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("cabin.ron");
    let mut steps_seen = Vec::new();
    for fault in FAULTS {
        for at in 0..12 {
            fs::write(&path, "the text before").unwrap();
            let disk = FailingDisk::new(fault, at);
            let expected = sha256(b"the text before");
            let outcome = save_on(&disk, &path, b"the new text", Some(&expected));
            let found = fs::read_to_string(&path).unwrap();
            assert!(found == "the text before" || found == "the new text", "{fault:?} at {at}: {found:?}");
            match outcome {
                Ok(saved) => {
                    assert_eq!((found.as_str(), saved.sha256), ("the new text", sha256(b"the new text")));
                }
                Err(error) => {
                    assert!(error.to_string().contains("not saved"), "{error}");
                    let stopped = matches!(fault, Fault::StoppedBefore | Fault::StoppedAfter);
                    if !stopped {
                        assert_eq!(found, "the text before", "{fault:?} at {at} in {:?}", disk.log.borrow());
                        let left = leftovers(folder.path());
                        assert!(left.is_empty(), "{fault:?} at {at}: {left:?}");
                    }
                }
            }
            let backup = fs::read_to_string(backup_path(&path)).unwrap_or_else(|_| "the text before".into());
            assert_eq!(backup, "the text before");
            steps_seen.extend(disk.log.borrow().iter().copied());
            // The next save, on a disk that works, succeeds.
            save(&path, b"later", None).unwrap();
            assert_eq!(fs::read_to_string(&path).unwrap(), "later");
            clear(folder.path());
        }
    }
    for step in
        ["read", "create", "write", "sync", "permissions", "link", "copy", "rename", "remove", "sync folder"]
    {
        assert!(steps_seen.contains(&step), "no fault met the step {step}");
    }
}

fn leftovers(folder: &Path) -> Vec<PathBuf> {
    fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.extension().is_some_and(|e| e == "part"))
        .collect()
}

fn clear(folder: &Path) {
    for entry in fs::read_dir(folder).unwrap() {
        fs::remove_file(entry.unwrap().path()).unwrap();
    }
}

#[test]
fn one_generation_is_kept() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("cabin.ron");
    for text in ["first", "second", "third"] {
        save(&path, text.as_bytes(), None).unwrap();
    }
    assert_eq!(fs::read_to_string(&path).unwrap(), "third");
    assert_eq!(fs::read_to_string(folder.path().join("cabin.ron.before")).unwrap(), "second");
    assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 2);
}

#[test]
fn a_file_changed_by_another_is_not_replaced_unasked() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("cabin.ron");
    let mine = save(&path, b"mine", None).unwrap();
    fs::write(&path, "theirs").unwrap();
    let error = save(&path, b"mine again", Some(&mine.sha256)).unwrap_err();
    assert!(matches!(error, SaveError::ChangedOnDisk { .. }), "{error}");
    assert_eq!(fs::read_to_string(&path).unwrap(), "theirs");
    save(&path, b"mine again", None).unwrap();
    assert_eq!(fs::read_to_string(backup_path(&path)).unwrap(), "theirs");
}

#[cfg(unix)]
#[test]
fn links_permissions_and_read_only_files_are_respected() {
    use std::os::unix::fs::{PermissionsExt, symlink};
    let folder = tempfile::tempdir().unwrap();
    let real = folder.path().join("real.ron");
    let link = folder.path().join("link.ron");
    fs::write(&real, "old").unwrap();
    fs::set_permissions(&real, fs::Permissions::from_mode(0o640)).unwrap();
    symlink(&real, &link).unwrap();
    save(&link, b"new", None).unwrap();
    assert!(link.symlink_metadata().unwrap().is_symlink());
    assert_eq!(fs::read_to_string(&real).unwrap(), "new");
    assert_eq!(fs::metadata(&real).unwrap().permissions().mode() & 0o777, 0o640);
    fs::set_permissions(&real, fs::Permissions::from_mode(0o440)).unwrap();
    let error = save(&real, b"newer", None).unwrap_err().to_string();
    assert!(error.contains("may not be written"), "{error}");
    assert_eq!(fs::read_to_string(&real).unwrap(), "new");
}

#[test]
fn a_place_that_cannot_be_written_is_a_sentence() {
    let folder = tempfile::tempdir().unwrap();
    for (path, word) in [
        (folder.path().join("absent/cabin.ron"), "folder is not there"),
        (folder.path().to_owned(), "a folder of that name"),
    ] {
        let error = save(&path, b"text", None).unwrap_err().to_string();
        assert!(error.contains(word), "{error}");
    }
}
