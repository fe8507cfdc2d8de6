//! The project itself: format version, identities, and the checks every loaded project passes.

use crate::{Emitter, EmitterId, EmitterSet, Metric, SetId, ShareKind};
use serde::{Deserialize, Serialize};
use std::collections::BTreeSet;

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
    /// An emitter stands in a set twice.
    #[error("set \u{201c}{set}\u{201d} holds \u{201c}{emitter}\u{201d} twice")]
    RepeatedMember {
        /// Name of the set.
        set: String,
        /// Name of the emitter.
        emitter: String,
    },
    /// The columns of an import differ in length.
    #[error("{emitter}: {wavelengths} wavelengths but {values} values")]
    Ragged {
        /// Name of the emitter.
        emitter: String,
        /// Number of wavelengths.
        wavelengths: usize,
        /// Number of values.
        values: usize,
    },
    /// A share outside its range.
    #[error("{place}: expected {expected}, found {found}")]
    OutOfRange {
        /// Where.
        place: String,
        /// What was expected.
        expected: &'static str,
        /// What stood there.
        found: String,
    },
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
        let mut seen = BTreeSet::new();
        for emitter in &self.emitters {
            if !seen.insert(emitter.id.0) {
                return Err(ProjectError::DuplicateIdentity(emitter.id.0));
            }
            check_emitter(emitter)?;
        }
        let mut seen = BTreeSet::new();
        for set in &self.sets {
            if !seen.insert(set.id.0) {
                return Err(ProjectError::DuplicateIdentity(set.id.0));
            }
            self.check_set(set)?;
        }
        Ok(())
    }

    fn check_set(&self, set: &EmitterSet) -> Result<(), ProjectError> {
        let place = |what: &str| format!("{}, {what}", set.name);
        finite(|| place("target CCT"), set.white.cct_k)?;
        finite(|| place("target Duv"), set.white.duv)?;
        for metric in Metric::ALL {
            let limit = set.white.limits.of(metric);
            for end in [limit.low, limit.high].into_iter().flatten() {
                finite(|| place(&format!("limit on {}", metric.key())), end)?;
            }
        }
        for wanted in [set.white.lumens, set.white.luminance_cd_per_m2].into_iter().flatten() {
            finite(|| place("wanted light"), wanted)?;
        }
        let mut seen = BTreeSet::new();
        for member in &set.members {
            let Some(emitter) = self.emitter(member.emitter) else {
                return Err(ProjectError::UnknownEmitter {
                    set: set.name.clone(),
                    emitter: member.emitter.0,
                });
            };
            if !seen.insert(member.emitter) {
                return Err(ProjectError::RepeatedMember {
                    set: set.name.clone(),
                    emitter: emitter.name.clone(),
                });
            }
            for (what, value) in
                [("share", member.share), ("least share", member.least), ("greatest share", member.most)]
            {
                let place = || place(&format!("{what} of {}", emitter.name));
                finite(place, value)?;
                if !(0.0..=1.0 + SHARE_ROUNDING).contains(&value) {
                    return Err(ProjectError::OutOfRange {
                        place: place(),
                        expected: "0 to 1",
                        found: value.to_string(),
                    });
                }
            }
        }
        Ok(())
    }
}

/// A share may exceed 1 by the rounding of a sum.
const SHARE_ROUNDING: f64 = 1e-9;

fn finite(place: impl Fn() -> String, value: f64) -> Result<(), ProjectError> {
    if value.is_finite() {
        Ok(())
    } else {
        Err(ProjectError::NotFinite { place: place(), found: value.to_string() })
    }
}

fn check_emitter(emitter: &Emitter) -> Result<(), ProjectError> {
    let (wavelengths, values) = (&emitter.import.wavelengths_nm, &emitter.import.power_per_nm);
    if wavelengths.len() != values.len() {
        return Err(ProjectError::Ragged {
            emitter: emitter.name.clone(),
            wavelengths: wavelengths.len(),
            values: values.len(),
        });
    }
    for value in wavelengths.iter().chain(values) {
        finite(|| format!("{}, samples", emitter.name), *value)?;
    }
    if let Some(wall_plug) = emitter.wall_plug {
        let place = || format!("{}, wall-plug efficiency", emitter.name);
        finite(place, wall_plug)?;
        if !(0.0..=1.0).contains(&wall_plug) {
            return Err(ProjectError::OutOfRange {
                place: place(),
                expected: "0 to 1",
                found: wall_plug.to_string(),
            });
        }
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::{Import, Member, WhiteSpec};

    fn emitter(id: u64) -> Emitter {
        let import =
            Import { wavelengths_nm: vec![500.0, 510.0], power_per_nm: vec![1.0, 2.0], ..Import::default() };
        Emitter {
            id: EmitterId(id),
            name: format!("Emitter {id}"),
            invented: true,
            note: String::new(),
            import,
            corrections: Vec::new(),
            geometry: crate::Geometry::Unknown,
            origin: crate::Origin::Unknown,
            mounting: crate::Mounting::Unknown,
            instrument_range_nm: None,
            wall_plug: None,
            sheet: device::Sheet::default(),
        }
    }

    fn project() -> Project {
        let mut project = Project::new("Library");
        project.emitters = vec![emitter(1), emitter(2)];
        let members = vec![Member { share: 1.0, ..Member::new(EmitterId(1)) }, Member::new(EmitterId(2))];
        let white = WhiteSpec::default();
        project.sets = vec![EmitterSet {
            id: SetId(3),
            name: "A".into(),
            note: String::new(),
            members,
            white,
            recipes: Vec::new(),
        }];
        project
    }

    #[test]
    fn a_project_in_order_passes() {
        assert_eq!(project().check(), Ok(()));
    }

    #[test]
    fn what_other_parts_rely_on_is_checked_and_named() {
        type Damage = fn(&mut Project);
        let damages: [(&str, Damage); 9] = [
            ("newer", |p| p.version = FORMAT_VERSION + 1),
            ("identity 1", |p| p.emitters[1].id = EmitterId(1)),
            ("not in the project", |p| p.sets[0].members[1].emitter = EmitterId(8)),
            ("twice", |p| p.sets[0].members[1].emitter = EmitterId(1)),
            ("NaN", |p| p.sets[0].members[0].share = f64::NAN),
            ("0 to 1", |p| p.sets[0].members[0].share = -0.1),
            ("Emitter 2, samples", |p| p.emitters[1].import.power_per_nm[0] = f64::INFINITY),
            ("2 wavelengths but 1 values", |p| p.emitters[0].import.power_per_nm.truncate(1)),
            ("limit on ra", |p| p.sets[0].white.limits.ra.low = Some(f64::NAN)),
        ];
        for (word, damage) in damages {
            let mut project = project();
            damage(&mut project);
            let error = project.check().unwrap_err().to_string();
            assert!(error.contains(word), "{word}: {error}");
        }
    }

    #[test]
    fn identities_are_never_given_twice() {
        let mut project = project();
        assert_eq!(project.unused_id(), 4);
        let first = project.take_id();
        assert!(first < project.take_id());
        project.emitters.clear();
        assert!(project.take_id() > first + 1);
    }
}
