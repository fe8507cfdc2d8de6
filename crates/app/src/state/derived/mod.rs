//! What follows from the project: everything the window shows, computed once and remembered by content.
//!
//! * [`Cache::of`]: the [`Derived`] of a state; only what changed is computed again.
//! * [`light`]: one emitter's spectrum as numbers ([`Light`]).
//! * [`blend`]: a set's blend ([`BlendView`]) with its rows.
//! * [`reach`]: which whites a set can make at all.
//! * [`region`]: where the white may lie ([`WhiteRegion`]).
//! * [`ledger`]: every requirement as data ([`LedgerLine`]).
//!
//! An emitter's light is remembered by a hash of its samples and corrections, a blend's numbers by its lights, shares
//! and target, so renaming, notes and sheets never integrate a spectrum again.

pub mod blend;
pub mod ledger;
pub mod light;
pub mod reach;
pub mod region;

mod sensitivity;

pub use blend::{BlendView, ReferenceCurve, RowView, Shift};
pub use ledger::{LedgerLine, LineState};
pub use light::Light;
pub use region::WhiteRegion;

use super::State;
use blend::Numbers;
use project::{Emitter, EmitterId, Project, SetId};
use std::collections::BTreeMap;
use std::sync::Arc;

/// Number of line patterns that tell emitters apart without colour.
pub const PATTERNS: usize = 6;

/// One emitter as it is shown.
#[derive(Debug, Clone)]
pub struct EmitterView {
    /// Which emitter.
    pub id: EmitterId,
    /// Index of its line pattern, below [`PATTERNS`]; stays with the emitter when rows change places.
    pub pattern: usize,
    /// Its light, or the sentence that says why it has none.
    pub light: Result<Arc<Light>, String>,
}

/// Everything derived from one revision of the project.
#[derive(Debug, Clone)]
pub struct Derived {
    /// The revision it belongs to.
    pub revision: u64,
    /// Every emitter of the project, in its order.
    pub emitters: Vec<EmitterView>,
    /// The blend on the benches; `None` without a set or without light.
    pub blend: Option<Arc<BlendView>>,
    /// The requirements on it, in ledger order; empty without a set.
    pub ledger: Vec<LedgerLine>,
    /// What makes the numbers doubtful, one sentence each.
    pub warnings: Vec<String>,
}

impl Derived {
    /// The view of one emitter.
    pub fn emitter(&self, id: EmitterId) -> Option<&EmitterView> {
        self.emitters.iter().find(|view| view.id == id)
    }

    /// The light of one emitter.
    pub fn light(&self, id: EmitterId) -> Option<&Arc<Light>> {
        self.emitter(id)?.light.as_ref().ok()
    }

    /// Lines that are limited, and how many of them are met.
    pub fn met_of_limited(&self) -> (usize, usize) {
        let limited = self.ledger.iter().filter(|line| line.state != LineState::NotLimited).count();
        let met = self.ledger.iter().filter(|line| line.state == LineState::Met).count();
        (met, limited)
    }
}

/// Remembers what has been derived.
#[derive(Debug, Default)]
pub struct Cache {
    lights: BTreeMap<u64, Arc<Light>>,
    numbers: BTreeMap<u64, Arc<Numbers>>,
    last: Option<Arc<Derived>>,
}

/// Blends remembered besides the one on the benches.
const NUMBERS_KEPT: usize = 64;

impl Cache {
    /// Nothing remembered.
    pub fn new() -> Self {
        Self::default()
    }

    /// Everything derived from the state as it stands; the same `Arc` while the revision stays.
    pub fn of(&mut self, state: &State) -> Arc<Derived> {
        if let Some(last) = self.last.as_ref().filter(|last| last.revision == state.revision()) {
            return Arc::clone(last);
        }
        let derived = Arc::new(self.of_project(state.project(), state.revision()));
        self.last = Some(Arc::clone(&derived));
        derived
    }

    /// Forgets which revision was last: call when another [`State`] takes the place of the one before.
    pub fn forget_revision(&mut self) {
        self.last = None;
    }

    /// Everything derived from a project, marked with `revision`.
    pub fn of_project(&mut self, project: &Project, revision: u64) -> Derived {
        let emitters = self.views(project);
        let Some(set) = project.current() else {
            return Derived { revision, emitters, blend: None, ledger: Vec::new(), warnings: Vec::new() };
        };
        let blend = self.view(project, set.id, &emitters).map(Arc::new);
        let ledger = ledger::lines(project, set, blend.as_deref());
        let warnings = ledger::warnings(project, set, &emitters, blend.as_deref());
        Derived { revision, emitters, blend, ledger, warnings }
    }

    /// The blend of any set, such as one that is compared; `None` when there is no such set or it has no light.
    pub fn blend(&mut self, project: &Project, set: SetId) -> Option<BlendView> {
        let emitters = self.views(project);
        self.view(project, set, &emitters)
    }

    fn views(&mut self, project: &Project) -> Vec<EmitterView> {
        let mut kept = BTreeMap::new();
        let mut ranks: Vec<EmitterId> = project.emitters.iter().map(|e| e.id).collect();
        ranks.sort_unstable();
        let views = project
            .emitters
            .iter()
            .map(|emitter| {
                let key = light::content_key(emitter);
                let light = self.light_of(emitter, key);
                if let Ok(light) = &light {
                    kept.insert(key, Arc::clone(light));
                }
                let pattern = ranks.binary_search(&emitter.id).unwrap_or_default() % PATTERNS;
                EmitterView { id: emitter.id, pattern, light }
            })
            .collect();
        self.lights = kept;
        views
    }

    fn light_of(&self, emitter: &Emitter, key: u64) -> Result<Arc<Light>, String> {
        if let Some(light) = self.lights.get(&key) {
            return Ok(Arc::clone(light));
        }
        let spectrum = emitter.spectrum().map_err(|problem| problem.to_string())?;
        Light::of(spectrum, key)
            .map(Arc::new)
            .ok_or_else(|| format!("{}: there is no positive light between 380 and 780 nm", emitter.name))
    }

    fn view(&mut self, project: &Project, set: SetId, emitters: &[EmitterView]) -> Option<BlendView> {
        let set = project.set(set)?;
        let rows: Vec<Option<Arc<Light>>> = set
            .members
            .iter()
            .map(|m| emitters.iter().find(|e| e.id == m.emitter)?.light.as_ref().ok().cloned())
            .collect();
        let key = blend::content_key(set, &rows);
        let numbers = match self.numbers.get(&key) {
            Some(numbers) => Arc::clone(numbers),
            None => {
                let numbers = Arc::new(Numbers::of(set, &rows)?);
                if self.numbers.len() >= NUMBERS_KEPT {
                    self.numbers.clear();
                }
                self.numbers.insert(key, Arc::clone(&numbers));
                numbers
            }
        };
        Some(BlendView::of(project, set, rows, numbers))
    }
}

/// A running 64-bit hash over whole words: the key under which something derived is remembered.
#[derive(Debug, Clone, Copy)]
struct ContentKey(u64);

impl ContentKey {
    fn new() -> Self {
        Self(0x9e37_79b9_7f4a_7c15)
    }

    fn word(&mut self, word: u64) {
        let product = u128::from(self.0 ^ word) * u128::from(0xff51_afd7_ed55_8ccd_u64);
        self.0 = (product as u64) ^ ((product >> 64) as u64).rotate_left(29) ^ 0x2545_f491_4f6c_dd1d;
    }

    fn number(&mut self, value: f64) {
        self.word(value.to_bits());
    }

    fn numbers(&mut self, values: &[f64]) {
        self.word(values.len() as u64);
        values.iter().for_each(|value| self.number(*value));
    }
}

#[cfg(test)]
mod tests;
