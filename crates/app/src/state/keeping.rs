//! Keeping the project: saving, the journal of unsaved changes, and recovery.
//!
//! ```text
//! Keeper::left_behind   at the start: what earlier windows left unsaved
//! Keeper::start         for each project opened or recovered
//! Keeper::note          once a frame: the changes of that frame go to the journal
//! Keeper::save          the project goes to its file, the journal starts over
//! Keeper::close         nothing unsaved: the journal goes; else it stays for the next start
//! ```

use super::{EditError, JournalEntry, State};
use files::journal::{self, Header, Journal, LeftBehind};
use files::project_file::{self, ProjectFileError};
use files::save::{self, SaveError};
use std::path::{Path, PathBuf};
use std::time::SystemTime;

/// Name and version of the program, as written into journals and sheets.
pub const PROGRAM: &str = concat!("whitesmith ", env!("CARGO_PKG_VERSION"));

/// Keeps one project.
#[derive(Debug)]
pub struct Keeper {
    folder: Option<PathBuf>,
    journal: Option<Journal>,
    disk_sha256: Option<String>,
    problem: Option<String>,
}

/// Why the project was not saved. It is as it was, on the disk and in the window.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum KeepError {
    /// The project does not hold together.
    #[error(transparent)]
    Project(#[from] ProjectFileError),
    /// The disk refused, or another program changed the file.
    #[error(transparent)]
    Save(#[from] SaveError),
}

/// Unsaved work that a window left behind.
#[derive(Debug, Clone)]
pub struct Leftover {
    /// Name of the project.
    pub name: String,
    /// Where it is kept, if it was ever saved.
    pub path: Option<PathBuf>,
    /// Number of changes since it was saved.
    pub changes: usize,
    /// When it was last changed.
    pub modified: Option<SystemTime>,
    /// True when the end of the journal was damaged and is left out.
    pub damaged: bool,
    found: LeftBehind<JournalEntry>,
}

impl Leftover {
    /// The project with its unsaved changes, and how many of them could be made again. They can be taken back as if
    /// they had been made in this window.
    ///
    /// # Errors
    /// When the project in the journal does not hold together.
    pub fn recover(&self) -> Result<(State, usize), EditError> {
        let header = &self.found.header;
        let mut state = State::new(header.base.clone(), header.path.clone())?;
        let mut made = 0;
        for entry in &self.found.entries {
            if state.replay(entry.clone()).is_err() {
                break;
            }
            made += 1;
        }
        Ok((state, made))
    }

    /// Removes the journal: its work was recovered and is kept elsewhere, or is not wanted.
    ///
    /// # Errors
    /// When the file cannot be removed.
    pub fn discard(&self) -> std::io::Result<()> {
        std::fs::remove_file(&self.found.path)
    }
}

impl Keeper {
    /// Keeps the state in this user's journal folder. `disk_sha256` is the fingerprint of the file it was opened from.
    pub fn start(state: &mut State, disk_sha256: Option<String>) -> Self {
        Self::start_in(journal::default_folder(), state, disk_sha256)
    }

    /// Keeps the state in a journal folder, or in none.
    pub fn start_in(folder: Option<PathBuf>, state: &mut State, disk_sha256: Option<String>) -> Self {
        let mut keeper = Self { folder, journal: None, disk_sha256, problem: None };
        state.take_journal();
        keeper.begin(state);
        keeper
    }

    /// What earlier windows left unsaved in this user's journal folder, the newest first. Journals without a change are
    /// removed on the way.
    pub fn left_behind() -> Vec<Leftover> {
        journal::default_folder().map(|folder| Self::left_behind_in(&folder)).unwrap_or_default()
    }

    /// The same in a folder.
    pub fn left_behind_in(folder: &Path) -> Vec<Leftover> {
        let mut out = Vec::new();
        for found in journal::left_behind::<JournalEntry>(folder) {
            if found.entries.is_empty() {
                // Nothing was changed: there is nothing to lose.
                let _ = std::fs::remove_file(&found.path);
                continue;
            }
            out.push(Leftover {
                name: found.header.base.name.clone(),
                path: found.header.path.clone(),
                changes: found.entries.len(),
                modified: found.modified,
                damaged: found.damaged,
                found,
            });
        }
        out
    }

    /// Writes the changes since the last call to the journal. Cheap when there are none.
    pub fn note(&mut self, state: &mut State) {
        let entries = state.take_journal();
        if entries.is_empty() {
            return;
        }
        if self.journal.is_none() {
            // It could not be begun before; try again, from the project as it now stands.
            self.begin(state);
            return;
        }
        if let Some(journal) = &mut self.journal
            && let Err(error) = journal.append(&entries)
        {
            self.problem = Some(unkept(&error));
            self.journal = None;
        }
    }

    /// Saves the project at `path`. Unless `replace`, a file that another program changed since it was opened here is
    /// left alone.
    ///
    /// # Errors
    /// With a sentence; project and file are as they were.
    pub fn save(&mut self, state: &mut State, path: &Path, replace: bool) -> Result<(), KeepError> {
        state.end_gesture();
        let text = project_file::project_text(state.project())?;
        let same_file = state.path() == Some(path);
        let expected = self.disk_sha256.as_deref().filter(|_| same_file && !replace);
        let saved = save::save(path, text.as_bytes(), expected)?;
        self.disk_sha256 = Some(saved.sha256);
        state.mark_saved(path.to_owned(), state.revision());
        state.take_journal();
        let header = header_of(state);
        match &mut self.journal {
            Some(journal) => {
                if let Err(error) = journal.restart(&header) {
                    self.problem = Some(unkept(&error));
                }
            }
            None => self.begin(state),
        }
        Ok(())
    }

    /// True when another window has the same file open.
    pub fn is_open_elsewhere(&self, path: &Path) -> bool {
        let own = self.journal.as_ref().map(Journal::path);
        self.folder.as_deref().is_some_and(|folder| journal::is_open_elsewhere(folder, path, own))
    }

    /// Why unsaved changes are not being kept, when they are not; said once.
    pub fn take_problem(&mut self) -> Option<String> {
        self.problem.take()
    }

    /// The window closes: with nothing unsaved the journal goes, else it stays for the next start.
    pub fn close(mut self, state: &mut State) {
        state.end_gesture();
        self.note(state);
        if let Some(journal) = self.journal.filter(|_| !state.unsaved()) {
            // A journal that cannot be removed is offered at the next start; nothing is lost.
            let _ = journal.finish();
        }
    }

    fn begin(&mut self, state: &State) {
        let Some(folder) = &self.folder else { return };
        match Journal::begin(folder, &header_of(state)) {
            Ok(journal) => self.journal = Some(journal),
            Err(error) => self.problem = Some(unkept(&error)),
        }
    }
}

fn header_of(state: &State) -> Header {
    Header::new(PROGRAM, state.path().map(Path::to_owned), state.project().clone())
}

fn unkept(error: &std::io::Error) -> String {
    format!(
        "Unsaved changes are not being kept for recovery: {}. Save the project often.",
        save::reason_of(error)
    )
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::state::{Edit, demo};

    fn opened(folder: &Path) -> (State, Keeper) {
        let mut state = State::new(demo::cabin().unwrap(), None).unwrap();
        let keeper = Keeper::start_in(Some(folder.to_owned()), &mut state, None);
        (state, keeper)
    }

    fn rename(state: &mut State, name: &str) {
        state.apply(Edit::ProjectName(name.to_owned())).unwrap();
    }

    #[test]
    fn work_survives_a_window_that_ends_without_saving() {
        let folder = tempfile::tempdir().unwrap();
        let (mut state, mut keeper) = opened(folder.path());
        for name in ["one", "two", "three"] {
            rename(&mut state, name);
            keeper.note(&mut state);
        }
        state.undo();
        keeper.note(&mut state);
        let last = state.project().clone();
        drop(keeper);
        let left = Keeper::left_behind_in(folder.path());
        assert_eq!((left.len(), left[0].changes, left[0].damaged), (1, 4, false));
        assert_eq!(left[0].name, "Night-ferry cabin panel");
        let (mut recovered, made) = left[0].recover().unwrap();
        assert!(recovered.project() == &last && made == 4 && recovered.unsaved());
        assert!(recovered.undo() && recovered.project().name == "one");
        left[0].discard().unwrap();
        assert!(Keeper::left_behind_in(folder.path()).is_empty());
    }

    #[test]
    fn after_a_save_only_later_work_is_left_behind_even_undo_of_earlier_work() {
        let folder = tempfile::tempdir().unwrap();
        let (mut state, mut keeper) = opened(folder.path());
        rename(&mut state, "early");
        keeper.note(&mut state);
        let path = folder.path().join("cabin.ron");
        keeper.save(&mut state, &path, false).unwrap();
        assert!(!state.unsaved());
        assert!(state.undo());
        keeper.note(&mut state);
        let last = state.project().clone();
        drop(keeper);
        let left = Keeper::left_behind_in(folder.path());
        assert_eq!((left[0].changes, left[0].path.as_deref()), (1, Some(path.as_path())));
        let (recovered, _) = left[0].recover().unwrap();
        assert!(recovered.project() == &last);
    }

    #[test]
    fn closing_keeps_what_is_unsaved_and_clears_up_after_the_rest() {
        let folder = tempfile::tempdir().unwrap();
        let (mut state, keeper) = opened(folder.path());
        keeper.close(&mut state);
        assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 0);
        let (mut state, keeper) = opened(folder.path());
        rename(&mut state, "unsaved");
        keeper.close(&mut state);
        assert_eq!(Keeper::left_behind_in(folder.path()).len(), 1);
    }

    #[test]
    fn a_file_changed_by_another_window_is_not_replaced_unasked() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("cabin.ron");
        let (mut state, mut keeper) = opened(folder.path());
        keeper.save(&mut state, &path, false).unwrap();
        std::fs::write(&path, "(version: 1, name: \"theirs\")").unwrap();
        rename(&mut state, "mine");
        let error = keeper.save(&mut state, &path, false).unwrap_err().to_string();
        assert!(error.contains("changed by another"), "{error}");
        assert!(state.unsaved());
        keeper.save(&mut state, &path, true).unwrap();
        assert_eq!(project_file::open_project(&path).unwrap().project, *state.project());
    }

    #[test]
    fn two_windows_on_one_file_are_noticed() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("cabin.ron");
        let (mut one, mut keeper) = opened(folder.path());
        keeper.save(&mut one, &path, false).unwrap();
        let (_other, other_keeper) = opened(folder.path());
        assert!(other_keeper.is_open_elsewhere(&path) && !keeper.is_open_elsewhere(&path));
    }

    #[test]
    fn a_folder_that_cannot_be_written_is_said_once_and_work_goes_on() {
        let folder = tempfile::tempdir().unwrap();
        let blocked = folder.path().join("file");
        std::fs::write(&blocked, "").unwrap();
        let (mut state, mut keeper) = opened(&blocked.join("state"));
        assert!(keeper.take_problem().unwrap().contains("not being kept"));
        rename(&mut state, "still works");
        keeper.note(&mut state);
        assert_eq!(state.project().name, "still works");
    }
}
