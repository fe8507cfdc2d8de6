//! Recipe plans: how a set's blend is to be built, and what has been changed or locked since.

use crate::EmitterId;
use device::{Build, Made, Quantity};
use serde::{Deserialize, Serialize};

/// One way of building a set's blend. The wanted light is that of the set's white spec.
///
/// The numbers of `build`, `made` and `locked` count emitters in the order of `emitters`, so that rows of the set can
/// be moved, added and taken out without touching the plan.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct RecipePlan {
    /// The user's name for it.
    pub name: String,
    /// Free text.
    #[serde(default)]
    pub note: String,
    /// The emitters `build` numbers, in its order. Emitters of the set not listed follow in the set's order.
    #[serde(default)]
    pub emitters: Vec<EmitterId>,
    /// The build form, its settings, down-conversion and area.
    #[serde(default)]
    pub build: Build,
    /// Thickness in nm of one unit of an emitter, for the section of a stack or zone; drawn, never computed with.
    #[serde(default)]
    pub thickness_nm: Vec<(EmitterId, f64)>,
    /// Working temperature of the emitters, °C; `None` leaves the sheets as they were measured.
    #[serde(default)]
    pub temperature_c: Option<f64>,
    /// Fabrication numbers set by hand; `None` follows the blend.
    #[serde(default)]
    pub made: Option<Made>,
    /// Fabrication numbers that must not be changed when the white is brought back.
    #[serde(default)]
    pub locked: Vec<Quantity>,
}

impl RecipePlan {
    /// A plan that follows the blend, over these emitters.
    pub fn new(name: impl Into<String>, emitters: Vec<EmitterId>, build: Build) -> Self {
        Self {
            name: name.into(),
            note: String::new(),
            emitters,
            build,
            thickness_nm: Vec::new(),
            temperature_c: None,
            made: None,
            locked: Vec::new(),
        }
    }
}
