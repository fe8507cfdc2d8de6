//! The project itself: format version, identities, and the checks every loaded project passes.

use crate::{Emitter, EmitterId, EmitterSet, SetId, ShareKind};
use serde::{Deserialize, Serialize};

/// The newest project format this program writes. Older ones are migrated, newer ones refused untouched.
pub const FORMAT_VERSION: u32 = 1;

/// Everything a user keeps in one file.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Project {
    /// Format version, [`FORMAT_VERSION`] once migrated.
    pub version: u32,
    /// Name shown in the window.
    pub name: String,
    /// Free text.
    #[serde(default)]
    pub note: String,
    /// All emitters, whether a set uses them or not.
    #[serde(default)]
    pub emitters: Vec<Emitter>,
    /// Candidate sets.
    #[serde(default)]
    pub sets: Vec<EmitterSet>,
    /// The set on the benches.
    #[serde(default)]
    pub current_set: Option<SetId>,
    /// The kind in which shares are shown and typed.
    #[serde(default)]
    pub share_kind: ShareKind,
    /// The next unused identity.
    #[serde(default)]
    pub next_id: u64,
}

/// Why a project cannot be used.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum ProjectError {
    /// Written by a newer program.
    #[error(
        "this project is format {found}, newer than the {FORMAT_VERSION} this program knows; it was left untouched"
    )]
    TooNew {
        /// The version in the file.
        found: u32,
    },
    /// A set names an emitter that is not there.
    #[error("set \u{201c}{set}\u{201d} names emitter {emitter}, which is not in the project")]
    UnknownEmitter {
        /// Name of the set.
        set: String,
        /// The missing identity.
        emitter: u64,
    },
    /// Two emitters or two sets share an identity.
    #[error("identity {0} is used twice")]
    DuplicateIdentity(u64),
    /// A number that must be finite is not.
    #[error("{place}: expected a finite number, found {found}")]
    NotFinite {
        /// Where.
        place: String,
        /// What stood there.
        found: String,
    },
}

impl Project {
    /// An empty project.
    pub fn new(name: impl Into<String>) -> Self {
        Self {
            version: FORMAT_VERSION,
            name: name.into(),
            note: String::new(),
            emitters: Vec::new(),
            sets: Vec::new(),
            current_set: None,
            share_kind: ShareKind::Radiant,
            next_id: 1,
        }
    }

    /// The identity [`Project::take_id`] would give: above every one in use and every one given before.
    pub fn unused_id(&self) -> u64 {
        let used = self.emitters.iter().map(|e| e.id.0).chain(self.sets.iter().map(|s| s.id.0)).max();
        self.next_id.max(used.map_or(1, |highest| highest.saturating_add(1)))
    }

    /// A fresh identity.
    pub fn take_id(&mut self) -> u64 {
        let id = self.unused_id();
        self.next_id = id.saturating_add(1);
        id
    }

    /// The emitter of that identity.
    pub fn emitter(&self, id: EmitterId) -> Option<&Emitter> {
        self.emitters.iter().find(|e| e.id == id)
    }

    /// The emitter of that identity, to change.
    pub fn emitter_mut(&mut self, id: EmitterId) -> Option<&mut Emitter> {
        self.emitters.iter_mut().find(|e| e.id == id)
    }

    /// The set of that identity.
    pub fn set(&self, id: SetId) -> Option<&EmitterSet> {
        self.sets.iter().find(|s| s.id == id)
    }

    /// The set of that identity, to change.
    pub fn set_mut(&mut self, id: SetId) -> Option<&mut EmitterSet> {
        self.sets.iter_mut().find(|s| s.id == id)
    }

    /// The set on the benches: the current one, else the first.
    pub fn current(&self) -> Option<&EmitterSet> {
        self.current_set.and_then(|id| self.set(id)).or_else(|| self.sets.first())
    }

    /// Checks what every other part relies on: version, identities, references and finite numbers.
    ///
    /// # Errors
    /// The first thing found wrong, with the place.
    pub fn check(&self) -> Result<(), ProjectError> {
        if self.version > FORMAT_VERSION {
            return Err(ProjectError::TooNew { found: self.version });
        }
        let mut seen = std::collections::BTreeSet::new();
        for id in self.emitters.iter().map(|e| e.id.0) {
            if !seen.insert(id) {
                return Err(ProjectError::DuplicateIdentity(id));
            }
        }
        let mut seen = std::collections::BTreeSet::new();
        for set in &self.sets {
            if !seen.insert(set.id.0) {
                return Err(ProjectError::DuplicateIdentity(set.id.0));
            }
            let finite = |place: &str, value: f64| {
                if value.is_finite() {
                    Ok(())
                } else {
                    Err(ProjectError::NotFinite {
                        place: format!("{}, {place}", set.name),
                        found: value.to_string(),
                    })
                }
            };
            finite("target CCT", set.white.cct_k)?;
            finite("target Duv", set.white.duv)?;
            for member in &set.members {
                if self.emitter(member.emitter).is_none() {
                    return Err(ProjectError::UnknownEmitter {
                        set: set.name.clone(),
                        emitter: member.emitter.0,
                    });
                }
                finite("share", member.share)?;
                finite("least share", member.least)?;
                finite("most share", member.most)?;
            }
        }
        Ok(())
    }
}
