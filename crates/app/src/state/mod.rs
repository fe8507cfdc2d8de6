//! The state behind the window: the project, every way to change it, and what follows from it.
//!
//! * [`State`]: the project with its history; [`State::apply`] is the only place the project changes.
//! * [`Edit`]: every change, serialisable, with its inverse.
//! * [`mixing`]: pure functions on shares: rebalancing, white-held pulls, conversions between kinds.
//! * [`keeping`]: saving, the journal of unsaved changes, recovery.
//! * [`demo`]: the demo projects the program carries.
//! * [`derived`]: everything the window shows, computed from the project and remembered by content.
//!
//! Out of scope: drawing, files (crate `files`), solving (crate `optimiser`).

pub mod demo;
pub mod derived;
mod edit;
mod history;
pub mod keeping;
mod make;
pub mod mixing;

pub use edit::{Edit, EditError, SHARE_SUM_TOLERANCE, ShareFault};
pub use history::JournalEntry;

use history::{History, Step};
use project::{Emitter, EmitterId, EmitterSet, Project, SetId};
use std::path::{Path, PathBuf};

/// Undo steps kept; older ones are forgotten.
pub const HISTORY_STEPS: usize = 1000;

/// The project, its history and where it is kept.
#[derive(Debug, Clone)]
pub struct State {
    project: Project,
    path: Option<PathBuf>,
    history: History,
    gesture: Option<Step>,
    revision: u64,
    saved_revision: u64,
    journal: Vec<JournalEntry>,
}

impl State {
    /// A state with nothing to undo. `path` is where the project was read from, if it was.
    ///
    /// # Errors
    /// When the project does not pass [`Project::check`].
    pub fn new(project: Project, path: Option<PathBuf>) -> Result<Self, EditError> {
        project.check()?;
        Ok(Self {
            project,
            path,
            history: History::default(),
            gesture: None,
            revision: 0,
            saved_revision: 0,
            journal: Vec::new(),
        })
    }

    /// The project as it stands.
    pub fn project(&self) -> &Project {
        &self.project
    }

    /// The set on the benches.
    pub fn current_set(&self) -> Option<&EmitterSet> {
        self.project.current()
    }

    /// Where the project is kept, if it has been saved or opened.
    pub fn path(&self) -> Option<&Path> {
        self.path.as_deref()
    }

    /// A number that grows with every change; equal numbers mean an equal project.
    pub fn revision(&self) -> u64 {
        self.revision
    }

    /// True when the project differs from what was last saved or opened.
    pub fn unsaved(&self) -> bool {
        self.revision != self.saved_revision
    }

    /// Notes that the project of `revision` is now kept at `path`.
    pub fn mark_saved(&mut self, path: PathBuf, revision: u64) {
        self.path = Some(path);
        self.saved_revision = revision;
    }

    /// Makes an edit: the only place the project changes. Outside a gesture it is an undo step of its own.
    ///
    /// # Errors
    /// When the edit cannot be made; the project is then as it was.
    pub fn apply(&mut self, edit: Edit) -> Result<(), EditError> {
        let inverse = make::make(&mut self.project, edit.clone())?;
        self.revision += 1;
        if let Some(step) = &mut self.gesture {
            step.add(edit, inverse);
        } else {
            let mut step = Step::new(edit.label());
            step.add(edit, inverse);
            self.finish(step);
        }
        Ok(())
    }

    /// Makes several edits as one undo step; all of them or none.
    ///
    /// # Errors
    /// When one of them cannot be made; the project is then as it was.
    pub fn apply_together(&mut self, label: impl Into<String>, edits: Vec<Edit>) -> Result<(), EditError> {
        self.apply(Edit::Together { label: label.into(), edits })
    }

    /// Opens an undo step that lasts until [`State::end_gesture`]; a gesture already open is closed first.
    pub fn begin_gesture(&mut self, label: impl Into<String>) {
        self.end_gesture();
        self.gesture = Some(Step::new(label.into()));
    }

    /// Closes the open undo step; nothing happens when none is open or nothing was done in it.
    pub fn end_gesture(&mut self) {
        if let Some(step) = self.gesture.take().filter(|step| !step.made.is_empty()) {
            self.finish(step);
        }
    }

    /// Takes back what the open gesture did and closes it (the Escape key during a drag).
    pub fn cancel_gesture(&mut self) {
        if let Some(step) = self.gesture.take() {
            self.take_back(&step);
        }
    }

    /// True while a gesture is open.
    pub fn in_gesture(&self) -> bool {
        self.gesture.is_some()
    }

    /// What [`State::undo`] would take back.
    pub fn undo_label(&self) -> Option<&str> {
        self.history.done.last().map(|step| step.label.as_str())
    }

    /// What [`State::redo`] would make again.
    pub fn redo_label(&self) -> Option<&str> {
        self.history.undone.last().map(|step| step.label.as_str())
    }

    /// Takes back the last step; false when there is none.
    pub fn undo(&mut self) -> bool {
        self.end_gesture();
        let Some(step) = self.history.done.pop() else { return false };
        self.take_back(&step);
        self.journal.push(JournalEntry::Undo { edits: step.inverses.iter().rev().cloned().collect() });
        self.history.undone.push(step);
        true
    }

    /// Makes the step taken back last again; false when there is none.
    pub fn redo(&mut self) -> bool {
        self.end_gesture();
        let Some(step) = self.history.undone.pop() else { return false };
        for edit in step.made.iter().cloned() {
            make::make(&mut self.project, edit)
                .expect("a step that was made once can be made from the same state");
        }
        self.revision += 1;
        self.journal.push(JournalEntry::Redo { edits: step.made.clone() });
        self.history.done.push(step);
        true
    }

    /// The journal lines since the last call, to be appended to the journal file.
    pub fn take_journal(&mut self) -> Vec<JournalEntry> {
        std::mem::take(&mut self.journal)
    }

    /// Plays one journal line, as at recovery; nothing is written to the journal.
    ///
    /// # Errors
    /// When the line does not fit the project: the journal belongs to another state.
    pub fn replay(&mut self, entry: JournalEntry) -> Result<(), EditError> {
        match entry {
            JournalEntry::Step { label, edits } => {
                self.begin_gesture(label);
                for edit in edits {
                    if let Err(error) = self.apply(edit) {
                        self.cancel_gesture();
                        return Err(error);
                    }
                }
                self.end_gesture();
            }
            // A step older than the journal is not in this history: its edits are made all the same.
            JournalEntry::Undo { edits } => {
                if self.history.done.last().is_some_and(|s| s.inverses.iter().rev().eq(&edits)) {
                    self.undo();
                } else {
                    self.make_plainly(edits)?;
                }
            }
            JournalEntry::Redo { edits } => {
                if self.history.undone.last().is_some_and(|s| s.made == edits) {
                    self.redo();
                } else {
                    self.make_plainly(edits)?;
                }
            }
        }
        self.journal.clear();
        Ok(())
    }

    /// An identity no emitter and no set has.
    pub fn unused_id(&self) -> u64 {
        self.project.unused_id()
    }

    /// The edit that adds emitters at the end of the project and, when given, of a set. Identities are set here.
    pub fn adding(&self, emitters: Vec<Emitter>, into: Option<SetId>) -> Edit {
        let label = match emitters.as_slice() {
            [one] => format!("add {}", one.name),
            many => format!("add {} emitters", many.len()),
        };
        let first = self.unused_id();
        let mut taken: Vec<String> = self.project.emitters.iter().map(|e| e.name.clone()).collect();
        let mut edits = Vec::new();
        for (k, mut emitter) in emitters.into_iter().enumerate() {
            let id = EmitterId(first + k as u64);
            emitter.id = id;
            emitter.name = free_name(&taken, &emitter.name);
            taken.push(emitter.name.clone());
            edits.push(Edit::InsertEmitter { at: usize::MAX, emitter: Box::new(emitter) });
            if let Some(set) = into {
                edits.push(Edit::AddMember { set, emitter: id, at: usize::MAX });
            }
        }
        Edit::Together { label, edits }
    }

    /// The edit that adds an empty set of that name and puts it on the benches.
    pub fn adding_set(&self, name: impl Into<String>) -> Edit {
        let id = SetId(self.unused_id());
        let white = self.current_set().map(|s| s.white.clone()).unwrap_or_default();
        let set = EmitterSet {
            id,
            name: name.into(),
            note: String::new(),
            members: Vec::new(),
            white,
            recipes: Vec::new(),
        };
        inserting(usize::MAX, set)
    }

    /// The edit that puts a copy of a set after it and on the benches; `None` when there is no such set.
    pub fn duplicating(&self, set: SetId) -> Option<Edit> {
        let at = self.project.sets.iter().position(|s| s.id == set)?;
        let mut copy = self.project.sets[at].clone();
        copy.id = SetId(self.unused_id());
        let taken: Vec<String> = self.project.sets.iter().map(|s| s.name.clone()).collect();
        copy.name = free_name(&taken, &format!("{} copy", copy.name));
        Some(inserting(at + 1, copy))
    }

    fn make_plainly(&mut self, edits: Vec<Edit>) -> Result<(), EditError> {
        make::make(&mut self.project, Edit::Together { label: String::new(), edits })?;
        self.revision += 1;
        Ok(())
    }

    fn finish(&mut self, step: Step) {
        self.journal.push(JournalEntry::Step { label: step.label.clone(), edits: step.made.clone() });
        self.history.undone.clear();
        self.history.done.push(step);
        if self.history.done.len() > HISTORY_STEPS {
            self.history.done.remove(0);
        }
    }

    fn take_back(&mut self, step: &Step) {
        for inverse in step.inverses.iter().rev().cloned() {
            make::make(&mut self.project, inverse).expect("the inverse of an edit fits the state it left");
        }
        self.revision += 1;
    }
}

/// `wanted`, or `wanted 2`, `wanted 3` … when it is taken.
fn free_name(taken: &[String], wanted: &str) -> String {
    let wanted = if wanted.trim().is_empty() { "Unnamed" } else { wanted.trim() };
    let free = |name: &String| !taken.contains(name);
    std::iter::once(wanted.to_owned())
        .chain((2..).map(|k| format!("{wanted} {k}")))
        .find(free)
        .unwrap_or_else(|| wanted.to_owned())
}

fn inserting(at: usize, set: EmitterSet) -> Edit {
    let id = set.id;
    let label = format!("add set {}", set.name);
    Edit::Together {
        label,
        edits: vec![Edit::InsertSet { at, set: Box::new(set) }, Edit::SelectSet(Some(id))],
    }
}

#[cfg(test)]
mod tests;
