//! What the window remembers besides the project: nothing here is saved with it or undone.

use super::dialogs::emitter::Details;
use super::frontier::Frontier;
use super::loom::Pull;
use super::recipe::RecipeView;
use super::theme::Palette;
use crate::jobs::Running;
use crate::state::derived::Derived;
use crate::state::{Edit, State};
use project::EmitterId;
use std::collections::BTreeSet;

/// What a frame draws from.
pub(super) struct Scene<'a> {
    pub(super) palette: Palette,
    pub(super) state: &'a State,
    pub(super) derived: &'a Derived,
    /// The solver's last word on the current set, while it still belongs to it.
    pub(super) proof: Option<&'a Proof>,
    /// How far a running solve is, 0 to 1.
    pub(super) solving: Option<f64>,
    /// The jobs that have not ended.
    pub(super) jobs: &'a [Running],
    /// True while the best blend of a device is searched.
    pub(super) device_job: bool,
}

/// The benches along the top.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub(super) enum Bench {
    #[default]
    Mixing,
    Frontier,
    Recipe,
}

impl Bench {
    /// All of them, in the order of their tabs.
    pub(super) const ALL: [Self; 3] = [Self::Mixing, Self::Frontier, Self::Recipe];

    /// The word on its tab.
    pub(super) const fn words(self) -> &'static str {
        match self {
            Self::Mixing => "Mixing",
            Self::Frontier => "Frontier",
            Self::Recipe => "Recipe",
        }
    }
}

/// The solver's last word, as the ledger's last line shows it.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Proof {
    /// The sentence.
    pub(super) words: String,
    /// What could be done about it, when the answer was no.
    pub(super) ways_out: Vec<WayOut>,
    /// True when every limit could be met.
    pub(super) met: bool,
}

/// Something that could be done when the answer was no.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct WayOut {
    pub(super) words: String,
    pub(super) edit: Edit,
    /// The limit it moves, when it moves one.
    pub(super) limit: Option<project::Metric>,
    /// Solve again afterwards.
    pub(super) solve: bool,
}

/// The pictures and edits that can be opened inside the ledger.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub(super) enum Section {
    White,
    Ra,
    Rf,
    Other,
}

/// The window's own state.
#[derive(Debug)]
pub(super) struct View {
    /// What the Frontier bench remembers.
    pub(super) frontier: Frontier,
    /// Pulling moves along the blends that keep the white.
    pub(super) hold_white: bool,
    /// The pull under way.
    pub(super) pull: Option<Pull>,
    /// The scale a pull began with.
    pub(super) pull_scale: f64,
    /// The share at which a row is full.
    pub(super) scale: f64,
    /// The row whose typed share is to take the keyboard.
    pub(super) focus_share: Option<EmitterId>,
    /// What is open inside the ledger.
    pub(super) open: BTreeSet<Section>,
    /// True while the user has not opened or closed any section: then the room decides.
    pub(super) open_by_room: bool,
    /// The emitter whose details are shown.
    pub(super) details: Option<Details>,
    /// A dialog covers the benches.
    pub(super) dialog_open: bool,
    /// The bench that is shown.
    pub(super) bench: Bench,
    /// What is open on the Recipe bench.
    pub(super) recipe: RecipeView,
}

impl Default for View {
    fn default() -> Self {
        Self {
            frontier: Frontier::default(),
            hold_white: false,
            pull: None,
            pull_scale: 1.0,
            scale: 0.4,
            focus_share: None,
            open: BTreeSet::from([Section::White]),
            open_by_room: true,
            details: None,
            dialog_open: false,
            bench: Bench::default(),
            recipe: RecipeView::default(),
        }
    }
}

impl View {
    /// Opens or closes a section of the ledger.
    pub(super) fn toggle(&mut self, section: Section) {
        self.open_by_room = false;
        if !self.open.remove(&section) {
            self.open.insert(section);
        }
    }
}
