//! Emitter sets: which emitters, with what freedom, for which white.

use crate::{EmitterId, RecipePlan, WhiteSpec};
use serde::{Deserialize, Serialize};

/// The identity of a set inside one project; never reused.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub struct SetId(pub u64);

/// The quantity a share is a fraction of. A share is never shown or saved without its kind.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
pub enum ShareKind {
    /// Fraction of the blend's radiant power, 380–780 nm.
    #[default]
    Radiant,
    /// Fraction of the blend's luminous flux.
    Luminous,
    /// Fraction of the blend's photon count.
    Photon,
}

/// One emitter in a set.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Member {
    /// Which emitter.
    pub emitter: EmitterId,
    /// Share of the blend's radiant power, 0 to 1; the shares of a set sum to 1.
    pub share: f64,
    /// A locked share is left alone by pulling and solving.
    #[serde(default)]
    pub locked: bool,
    /// An emitter switched off has share 0 and is left out of solving.
    #[serde(default = "yes")]
    pub on: bool,
    /// Least share allowed when solving.
    #[serde(default)]
    pub least: f64,
    /// Greatest share allowed when solving.
    #[serde(default = "one")]
    pub most: f64,
}

fn yes() -> bool {
    true
}

fn one() -> f64 {
    1.0
}

impl Member {
    /// A free member that is on, with share 0.
    pub fn new(emitter: EmitterId) -> Self {
        Self { emitter, share: 0.0, locked: false, on: true, least: 0.0, most: 1.0 }
    }
}

/// A choice of emitters and the white they are to make.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct EmitterSet {
    /// Identity inside the project.
    pub id: SetId,
    /// The user's name for it.
    pub name: String,
    /// Free text.
    #[serde(default)]
    pub note: String,
    /// The emitters, in display order.
    pub members: Vec<Member>,
    /// What the blend must meet.
    pub white: WhiteSpec,
    /// Ways of building the blend, in display order.
    #[serde(default)]
    pub recipes: Vec<RecipePlan>,
}

impl EmitterSet {
    /// Sum of all shares; 1 for a set in order.
    pub fn share_sum(&self) -> f64 {
        self.members.iter().map(|m| m.share).sum()
    }
}
