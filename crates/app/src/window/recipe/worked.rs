//! What the bench shows, worked out once a change of the project.

use crate::making::{Making, Number, make};
use crate::state::State;
use colour::appearance::{self, Srgb};
use device::bring_back::WayBack;
use files::drawing::figures::DevicePicture;
use project::{EmitterId, SetId};
use std::sync::Arc;

/// What is open on the bench; nothing here is saved with the project.
#[derive(Debug, Default)]
pub(in crate::window) struct RecipeView {
    /// Number of the plan on the bench.
    pub(in crate::window) chosen: usize,
    /// The emitter whose sheet is open, with what is typed.
    pub(in crate::window) sheet: Option<super::sheet::OpenSheet>,
    worked: Option<(u64, SetId, usize, bool, Arc<Worked>)>,
}

/// A plan worked out.
#[derive(Debug)]
pub(in crate::window) struct Worked {
    /// The plan, or the sentence that says why it cannot be made.
    pub(in crate::window) making: Result<Making, String>,
    /// Its numbers, with bands unless a number is being dragged.
    pub(in crate::window) numbers: Vec<Number>,
    /// Why there are no bands.
    pub(in crate::window) no_bands: Option<String>,
    /// The device to scale.
    pub(in crate::window) picture: Option<DevicePicture>,
    /// Power per nm of one optical watt of the light as it stands.
    pub(in crate::window) curve: Vec<f64>,
    /// What a screen shows for every emitter.
    pub(in crate::window) inks: Vec<Srgb>,
    /// The way back to the blend, when numbers were set by hand.
    pub(in crate::window) way_back: Option<Result<WayBack, String>>,
    /// Whether the electrical power of the form can be computed.
    pub(in crate::window) power_known: bool,
}

impl RecipeView {
    /// The plan on the bench worked out; `None` without a set. Bands and the way back wait until a drag has ended.
    pub(in crate::window) fn work(&mut self, state: &State) -> Option<Arc<Worked>> {
        let set = state.current_set()?;
        self.chosen = self.chosen.min(set.recipes.len().saturating_sub(1));
        let dragging = state.in_gesture();
        if let Some((revision, of, chosen, dragged, worked)) = &self.worked
            && (*revision, *of, *chosen) == (state.revision(), set.id, self.chosen)
            && (*dragged == dragging || dragging)
        {
            return Some(Arc::clone(worked));
        }
        let worked = Arc::new(Worked::of(state, set.id, self.chosen, dragging));
        self.worked = Some((state.revision(), set.id, self.chosen, dragging, Arc::clone(&worked)));
        Some(worked)
    }
}

impl Worked {
    fn of(state: &State, set: SetId, chosen: usize, dragging: bool) -> Self {
        let mut out = Self {
            making: make(state.project(), set, chosen).map_err(|e| e.to_string()),
            numbers: Vec::new(),
            no_bands: None,
            picture: None,
            curve: Vec::new(),
            inks: Vec::new(),
            way_back: None,
            power_known: false,
        };
        let Ok(making) = &out.making else { return out };
        if dragging {
            out.numbers = making.numbers(None);
        } else {
            let (numbers, bands) = making.numbers_and_bands();
            out.numbers = numbers;
            out.no_bands = bands.err().map(|e| e.to_string());
            if making.plan.made.is_some() {
                out.way_back = Some(making.way_back().map_err(|e| e.to_string()));
            }
        }
        out.picture = making.picture();
        out.curve = making.devices.curve(&making.recipe.shares_radiant());
        let count = making.devices.emitters.len();
        out.inks = (0..count).map(|k| appearance::of_light(&making.devices.tensors.tensor(k))).collect();
        out.power_known = making.build.power_model(&making.devices.emitters).is_ok();
        out
    }

    /// Radiant shares of the light as it stands, where numbers set by hand have moved it.
    pub(in crate::window) fn moved(&self) -> Option<Vec<(EmitterId, f64)>> {
        let making = self.making.as_ref().ok()?;
        let away = making.recipe.delta_uv_prime.is_none_or(|d| d > 1e-9);
        (making.plan.made.is_some() || away).then(|| making.shares())
    }
}

/// The project with the shares the device makes in place of the current set's: what the ledger is to judge.
pub(in crate::window) fn device_shares(state: &State, worked: &Worked) -> Option<project::Project> {
    let moved = worked.moved()?;
    let set = state.current_set()?.id;
    let mut project = state.project().clone();
    let row = project.set_mut(set)?;
    for member in &mut row.members {
        member.share = moved.iter().find(|(id, _)| *id == member.emitter).map_or(0.0, |(_, share)| *share);
    }
    let sum: f64 = row.members.iter().map(|m| m.share).sum();
    if sum.is_nan() || sum <= 0.0 {
        return None;
    }
    row.members.iter_mut().for_each(|member| member.share /= sum);
    Some(project)
}
