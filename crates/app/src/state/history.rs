//! What can be taken back and made again.

use super::edit::Edit;
use serde::{Deserialize, Serialize};

/// One undo step: everything between two moments a user would call one action.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Step {
    /// What was done, in the user's words.
    pub(crate) label: String,
    /// The edits as made, in order.
    pub(crate) made: Vec<Edit>,
    /// Their inverses, in the order they were made; taking back runs from the end.
    pub(crate) inverses: Vec<Edit>,
}

impl Step {
    pub(crate) fn new(label: String) -> Self {
        Self { label, made: Vec::new(), inverses: Vec::new() }
    }

    /// Adds an edit; one that leaves nothing of the last one takes its place, so a drag stays one edit.
    pub(crate) fn add(&mut self, edit: Edit, inverse: Edit) {
        match self.made.last_mut() {
            Some(last) if edit.supersedes(last) => *last = edit,
            _ => {
                self.made.push(edit);
                self.inverses.push(inverse);
            }
        }
    }
}

/// The steps made and the steps taken back.
#[derive(Debug, Clone, Default)]
pub(crate) struct History {
    pub(crate) done: Vec<Step>,
    pub(crate) undone: Vec<Step>,
}

/// One line of the journal: enough to make every step again, and to take it back again.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub enum JournalEntry {
    /// An undo step was made.
    Step {
        /// What was done.
        label: String,
        /// The edits, in order.
        edits: Vec<Edit>,
    },
    /// The last step was taken back by these edits.
    Undo {
        /// The inverses, in the order they were made.
        edits: Vec<Edit>,
    },
    /// The step taken back last was made again by these edits.
    Redo {
        /// The edits, in order.
        edits: Vec<Edit>,
    },
}
