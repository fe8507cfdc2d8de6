//! Every change a project can undergo, and how it is made.
//!
//! An [`Edit`] states what shall be true afterwards, never how the user got there, so that the list of edits can
//! be written to disk and played again. Making one returns the edit that takes it back.

use project::{
    CorrectionStep, Emitter, EmitterId, EmitterSet, Geometry, Member, Mounting, Origin, Project, RecipePlan,
    SetId, ShareKind, WhiteSpec,
};
use serde::{Deserialize, Serialize};

/// One change of the project.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[non_exhaustive]
pub enum Edit {
    /// Name the project.
    ProjectName(String),
    /// Replace the project's note.
    ProjectNote(String),
    /// Show and type shares in another kind; the shares themselves stay.
    ShareKind(ShareKind),
    /// Put another project in place of this one.
    ReplaceProject(Box<Project>),
    /// Set the next unused identity; only found inside the undoing of insertions.
    NextId(u64),

    /// Insert an emitter into the project, in no set yet.
    InsertEmitter {
        /// Place among the emitters; the end when beyond it.
        at: usize,
        /// The emitter, with an unused identity.
        emitter: Box<Emitter>,
    },
    /// Remove an emitter from the project and from every set, the rest of each set making up its share.
    RemoveEmitter(EmitterId),
    /// Move an emitter in the project's list.
    MoveEmitter {
        /// Which emitter.
        emitter: EmitterId,
        /// Its place afterwards.
        to: usize,
    },
    /// Name an emitter.
    EmitterName {
        /// Which emitter.
        emitter: EmitterId,
        /// The name.
        name: String,
    },
    /// Replace an emitter's note.
    EmitterNote {
        /// Which emitter.
        emitter: EmitterId,
        /// The text.
        note: String,
    },
    /// State how an emitter's light was collected.
    EmitterGeometry {
        /// Which emitter.
        emitter: EmitterId,
        /// How.
        geometry: Geometry,
    },
    /// State what made an emitter's light.
    EmitterOrigin {
        /// Which emitter.
        emitter: EmitterId,
        /// What.
        origin: Origin,
    },
    /// State whether an emitter was measured alone or in the stack.
    EmitterMounting {
        /// Which emitter.
        emitter: EmitterId,
        /// Where.
        mounting: Mounting,
    },
    /// State the range over which the instrument is trusted.
    InstrumentRange {
        /// Which emitter.
        emitter: EmitterId,
        /// First and last wavelength, nm; `None` when not known.
        range_nm: Option<(f64, f64)>,
    },
    /// State an emitter's wall-plug efficiency.
    WallPlug {
        /// Which emitter.
        emitter: EmitterId,
        /// Optical watts per electrical watt, above 0 and at most 1; `None` when not known.
        wall_plug: Option<f64>,
    },
    /// Replace an emitter's electrical and thermal data.
    Sheet {
        /// Which emitter.
        emitter: EmitterId,
        /// The data.
        sheet: Box<device::Sheet>,
    },
    /// Replace the reversible steps over an emitter's import.
    Corrections {
        /// Which emitter.
        emitter: EmitterId,
        /// The steps, in order.
        steps: Vec<CorrectionStep>,
    },

    /// Insert a set.
    InsertSet {
        /// Place among the sets; the end when beyond it.
        at: usize,
        /// The set, with an unused identity.
        set: Box<EmitterSet>,
    },
    /// Remove a set.
    RemoveSet(SetId),
    /// Move a set in the project's list.
    MoveSet {
        /// Which set.
        set: SetId,
        /// Its place afterwards.
        to: usize,
    },
    /// Put a set on the benches.
    SelectSet(Option<SetId>),
    /// Name a set.
    SetName {
        /// Which set.
        set: SetId,
        /// The name.
        name: String,
    },
    /// Replace a set's note.
    SetNote {
        /// Which set.
        set: SetId,
        /// The text.
        note: String,
    },
    /// Replace a set's white spec.
    White {
        /// Which set.
        set: SetId,
        /// The spec.
        white: Box<WhiteSpec>,
    },

    /// Replace all shares of a set, in member order; not negative, 0 where off, summing to 1.
    Shares {
        /// Which set.
        set: SetId,
        /// Radiant shares.
        shares: Vec<f64>,
    },
    /// Lock or free a share.
    Lock {
        /// Which set.
        set: SetId,
        /// Which emitter in it.
        emitter: EmitterId,
        /// Whether it is to be locked.
        locked: bool,
    },
    /// Switch an emitter of a set on or off; off moves its share to the free rows.
    Switch {
        /// Which set.
        set: SetId,
        /// Which emitter in it.
        emitter: EmitterId,
        /// Whether it is to be on.
        on: bool,
    },
    /// Set the least and the greatest share solving may use.
    Bounds {
        /// Which set.
        set: SetId,
        /// Which emitter in it.
        emitter: EmitterId,
        /// Least share, 0 to `most`.
        least: f64,
        /// Greatest share, `least` to 1.
        most: f64,
    },
    /// Put an emitter of the project into a set, with share 0 (or 1 when it is the only one that is on).
    AddMember {
        /// Which set.
        set: SetId,
        /// Which emitter.
        emitter: EmitterId,
        /// Place among the members; the end when beyond it.
        at: usize,
    },
    /// Take an emitter out of a set; the free rows make up its share.
    RemoveMember {
        /// Which set.
        set: SetId,
        /// Which emitter.
        emitter: EmitterId,
    },
    /// Move an emitter among the rows of a set.
    MoveMember {
        /// Which set.
        set: SetId,
        /// Which emitter.
        emitter: EmitterId,
        /// Its row afterwards.
        to: usize,
    },
    /// Replace all members of a set at once.
    Members {
        /// Which set.
        set: SetId,
        /// The members, in row order.
        members: Vec<Member>,
    },

    /// Replace a set's recipe plans: build forms, settings, numbers set by hand, locks.
    Recipes {
        /// Which set.
        set: SetId,
        /// The plans, in display order.
        recipes: Vec<RecipePlan>,
    },

    /// Several edits that stand or fall together.
    Together {
        /// What they do, in the user's words.
        label: String,
        /// The edits, in order.
        edits: Vec<Edit>,
    },
}

/// Why an edit was not made; the project is then as it was.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum EditError {
    /// The emitter is not in the project.
    #[error("there is no emitter {0} in this project")]
    NoEmitter(u64),
    /// The set is not in the project.
    #[error("there is no set {0} in this project")]
    NoSet(u64),
    /// The emitter is not in the set.
    #[error("emitter {emitter} is not in the set \u{201c}{set}\u{201d}")]
    NotInSet {
        /// Name of the set.
        set: String,
        /// The emitter.
        emitter: u64,
    },
    /// The emitter is in the set already.
    #[error("\u{201c}{emitter}\u{201d} is in the set \u{201c}{set}\u{201d} already")]
    AlreadyInSet {
        /// Name of the set.
        set: String,
        /// Name of the emitter.
        emitter: String,
    },
    /// The identity is taken.
    #[error("identity {0} is taken")]
    IdentityTaken(u64),
    /// Shares that are no blend.
    #[error("these shares make no blend: {0}")]
    Shares(ShareFault),
    /// A locked set cannot make up a share.
    #[error(
        "every other emitter of \u{201c}{set}\u{201d} is locked, so none can make up the share of \u{201c}{emitter}\u{201d}: unlock one first"
    )]
    Locked {
        /// Name of the set.
        set: String,
        /// Name of the emitter.
        emitter: String,
    },
    /// A locked share would change.
    #[error("\u{201c}{emitter}\u{201d} holds {share:.4} and is locked: unlock it first")]
    LockedShare {
        /// Name of the emitter.
        emitter: String,
        /// The share it holds.
        share: f64,
    },
    /// The last emitter that is on.
    #[error("\u{201c}{0}\u{201d} is the only emitter that is on: switch another one on first")]
    LastOn(String),
    /// A number outside its range.
    #[error("{what}: expected {expected}, found {found}")]
    Range {
        /// What it is.
        what: &'static str,
        /// What was expected.
        expected: &'static str,
        /// What was found.
        found: f64,
    },
    /// The samples no longer make a spectrum.
    #[error(transparent)]
    Spectrum(#[from] project::SpectrumProblem),
    /// The project would not hold together.
    #[error(transparent)]
    Project(#[from] project::ProjectError),
    /// A name without a letter.
    #[error("a name needs at least one letter or figure")]
    EmptyName,
}

/// What is wrong with a list of shares.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum ShareFault {
    /// Another number of shares than members.
    #[error("the set has {expected} emitters, but {found} shares were given")]
    Count {
        /// Number of members.
        expected: usize,
        /// Number of shares.
        found: usize,
    },
    /// A negative or non-finite share.
    #[error("share {row} is {found}")]
    Value {
        /// Row, counted from 1.
        row: usize,
        /// The share.
        found: f64,
    },
    /// An emitter that is off has a share.
    #[error("emitter {row} is off but has share {found}")]
    Off {
        /// Row, counted from 1.
        row: usize,
        /// The share.
        found: f64,
    },
    /// The shares do not sum to 1.
    #[error("they sum to {0}, not to 1")]
    Sum(f64),
}

/// How far a sum of shares may be from 1 and still be taken as 1 (it is then scaled).
pub const SHARE_SUM_TOLERANCE: f64 = 1e-6;

impl Edit {
    /// What the edit does, for the undo menu.
    pub fn label(&self) -> String {
        let text = match self {
            Self::ProjectName(_) => "rename project",
            Self::ProjectNote(_) | Self::EmitterNote { .. } | Self::SetNote { .. } => "change note",
            Self::ShareKind(_) => "change kind of share",
            Self::ReplaceProject(_) => "replace project",
            Self::NextId(_) => "next identity",
            Self::InsertEmitter { emitter, .. } => return format!("add {}", emitter.name),
            Self::RemoveEmitter(_) => "remove emitter",
            Self::MoveEmitter { .. } | Self::MoveMember { .. } => "reorder emitters",
            Self::EmitterName { .. } => "rename emitter",
            Self::EmitterGeometry { .. }
            | Self::EmitterOrigin { .. }
            | Self::EmitterMounting { .. }
            | Self::InstrumentRange { .. } => "describe measurement",
            Self::WallPlug { .. } => "change wall-plug efficiency",
            Self::Sheet { .. } => "change emitter sheet",
            Self::Corrections { .. } => "change corrections",
            Self::InsertSet { set, .. } => return format!("add set {}", set.name),
            Self::RemoveSet(_) => "remove set",
            Self::MoveSet { .. } => "reorder sets",
            Self::SelectSet(_) => "choose set",
            Self::SetName { .. } => "rename set",
            Self::White { .. } => "change white spec",
            Self::Shares { .. } => "change shares",
            Self::Lock { locked: true, .. } => "lock share",
            Self::Lock { .. } => "unlock share",
            Self::Switch { on: true, .. } => "switch emitter on",
            Self::Switch { .. } => "switch emitter off",
            Self::Bounds { .. } => "change bounds",
            Self::AddMember { .. } => "add emitter to set",
            Self::RemoveMember { .. } => "take emitter out of set",
            Self::Members { .. } => "change set",
            Self::Recipes { .. } => "change recipe",
            Self::Together { label, .. } => return label.clone(),
        };
        text.to_owned()
    }

    /// True when making `self` after `earlier` leaves nothing of `earlier`: both set the same thing absolutely.
    pub(crate) fn supersedes(&self, earlier: &Self) -> bool {
        match (self, earlier) {
            (Self::ProjectName(_), Self::ProjectName(_))
            | (Self::ProjectNote(_), Self::ProjectNote(_))
            | (Self::ShareKind(_), Self::ShareKind(_)) => true,
            (Self::Shares { set: a, .. }, Self::Shares { set: b, .. })
            | (Self::White { set: a, .. }, Self::White { set: b, .. })
            | (Self::Recipes { set: a, .. }, Self::Recipes { set: b, .. })
            | (Self::SetName { set: a, .. }, Self::SetName { set: b, .. })
            | (Self::SetNote { set: a, .. }, Self::SetNote { set: b, .. }) => a == b,
            (Self::WallPlug { emitter: a, .. }, Self::WallPlug { emitter: b, .. })
            | (Self::Sheet { emitter: a, .. }, Self::Sheet { emitter: b, .. })
            | (Self::EmitterName { emitter: a, .. }, Self::EmitterName { emitter: b, .. })
            | (Self::EmitterNote { emitter: a, .. }, Self::EmitterNote { emitter: b, .. })
            | (Self::EmitterGeometry { emitter: a, .. }, Self::EmitterGeometry { emitter: b, .. })
            | (Self::EmitterOrigin { emitter: a, .. }, Self::EmitterOrigin { emitter: b, .. })
            | (Self::Corrections { emitter: a, .. }, Self::Corrections { emitter: b, .. }) => a == b,
            (Self::Bounds { set: a, emitter: e, .. }, Self::Bounds { set: b, emitter: f, .. }) => {
                a == b && e == f
            }
            _ => false,
        }
    }
}
