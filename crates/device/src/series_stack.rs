//! Units in series: one current density J through all, `N_i = (J/e)·EQE_i`, voltages add.
//!
//! The white fixes the ratios of the units' EQEs: `EQE_i ∝ photon share`. Repeating a unit multiplies its EQE;
//! thickness, dopant or cavity position lower it. Once made, only J is left at drive, and unequal roll-off
//! moves the white when J changes: dimming by pulse width keeps it.

use serde::{Deserialize, Serialize};

use crate::error::DeviceError;
use crate::form::{BuildFace, ChannelState, Context, Realised, States, checked_fill};
use crate::power::{Coupling, PowerModel};
use crate::whole_numbers::WholeNumbers;

/// Most units tried where repeats are searched and no limit is given (common practice: 2 to 6 are built).
pub const DEFAULT_MOST_UNITS: u32 = 6;

/// Whether the EQE of a unit can still be tuned.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Tuning {
    /// Units are still being designed: each can be lowered to the EQE the white needs.
    #[default]
    Designed,
    /// Units as measured: the white is what whole repeats give.
    AsMeasured,
}

/// One unit of the stack.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub struct StackUnit {
    /// Emitter index.
    pub emitter: usize,
    /// How many of it are stacked.
    pub repeats: u32,
}

/// Settings of the series-stack form.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct SeriesStack {
    /// Units from the substrate up; driven emitters not listed follow in set order, once each.
    pub units: Vec<StackUnit>,
    /// Voltage lost in each junction between neighbouring units, V; `None` takes 0 and says so.
    pub junction_drop_v: Option<f64>,
    /// Fixed current density, mA/cm²; `None` takes the least that gives the light.
    pub current_ma_per_cm2: Option<f64>,
    /// Lit fraction of the panel; `None` takes 1 and says so.
    pub fill: Option<f64>,
    /// Whether units can be tuned.
    pub tuning: Tuning,
    /// With units as measured: search repeats up to this many units in all; `None` keeps the repeats listed.
    pub most_units: Option<u32>,
}

/// Fabrication quantities, one entry a driven channel.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Stack {
    /// Channel numbers from the substrate up.
    pub order: Vec<usize>,
    /// Repeats of each channel's unit.
    pub repeats: Vec<u32>,
    /// External quantum efficiency each channel must show at the working current, summed over its repeats.
    pub eqe: Vec<f64>,
    /// Working current density, mA/cm².
    pub current_ma_per_cm2: f64,
}

/// What one unit needs and has at the working current.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct UnitNeed {
    /// Emitter name.
    pub name: String,
    /// Repeats of the unit.
    pub repeats: u32,
    /// EQE the white needs, summed over repeats.
    pub needed_eqe: f64,
    /// EQE the sheet gives, summed over repeats; `None` where unknown.
    pub measured_eqe: Option<f64>,
    /// What is lacking, 0 where there is enough.
    pub lacking_eqe: Option<f64>,
    /// Whole repeats that would be enough at this current.
    pub repeats_needed: Option<u32>,
}

/// EQE of each unit that photon shares ask for when the largest is `largest_eqe`.
///
/// [`Stack::eqe`] at any current is proportional to these.
pub fn needed_eqe(photon_shares: &[f64], largest_eqe: f64) -> Vec<f64> {
    let largest = photon_shares.iter().copied().fold(0.0, f64::max);
    photon_shares.iter().map(|share| largest_eqe * share / largest).collect()
}

impl SeriesStack {
    fn fill(&self) -> Result<f64, DeviceError> {
        checked_fill(self.fill.unwrap_or(1.0))
    }

    /// Order and repeats over channels, from the listed units.
    fn layout(&self, context: &Context<'_>) -> Result<(Vec<usize>, Vec<u32>), DeviceError> {
        let driven = &context.channels.driven;
        let mut order = Vec::with_capacity(driven.len());
        let mut repeats = vec![0u32; driven.len()];
        for unit in &self.units {
            let Some(k) = driven.iter().position(|&d| d == unit.emitter) else {
                return Err(DeviceError::BadSetting {
                    what: "the emitter number of a stacked unit",
                    value: unit.emitter as f64,
                    expected: "a driven emitter of the set is expected, not a converter",
                });
            };
            if unit.repeats == 0 || repeats[k] != 0 {
                return Err(DeviceError::BadSetting {
                    what: "the repeats of a stacked unit",
                    value: f64::from(unit.repeats),
                    expected: "each emitter once, with one repeat or more",
                });
            }
            order.push(k);
            repeats[k] = unit.repeats;
        }
        for k in 0..driven.len() {
            if repeats[k] == 0 {
                order.push(k);
                repeats[k] = 1;
            }
        }
        Ok((order, repeats))
    }

    /// The same settings with order, repeats, current and fill of a made stack fixed.
    pub fn holding(&self, made: &Stack, driven: &[usize]) -> SeriesStack {
        let unit = |&k: &usize| StackUnit { emitter: driven[k], repeats: made.repeats[k] };
        SeriesStack {
            units: made.order.iter().filter(|&&k| made.repeats[k] > 0).map(unit).collect(),
            current_ma_per_cm2: Some(made.current_ma_per_cm2),
            most_units: None,
            ..self.clone()
        }
    }

    fn junctions_v(&self, repeats: &[u32], demands: &[f64]) -> f64 {
        let lit = repeats.iter().zip(demands).filter(|(_, d)| **d > 0.0);
        let units: u32 = lit.map(|(r, _)| *r).sum();
        self.junction_drop_v.unwrap_or(0.0) * f64::from(units.saturating_sub(1))
    }

    fn designed(
        &self,
        context: &Context<'_>,
        demands: &[f64],
        (order, repeats): (Vec<usize>, Vec<u32>),
        out: &mut Vec<String>,
    ) -> Result<Stack, DeviceError> {
        let fill = self.fill()?;
        let current = match self.current_ma_per_cm2 {
            Some(current) => {
                for k in Context::lit(demands) {
                    context.characteristics[k].at(current)?;
                }
                current
            }
            None => self.least_current(context, demands, &repeats, fill)?,
        };
        let eqe: Vec<f64> = demands.iter().map(|d| d / (fill * current)).collect();
        for k in Context::lit(demands) {
            let has = f64::from(repeats[k]) * context.characteristics[k].eqe(current);
            if eqe[k] > has * (1.0 + 1e-9) {
                out.push(format!(
                    "{} lacks EQE at {current} mA/cm²: {:.4} is needed, {has:.4} is there with {} repeat(s)",
                    context.characteristics[k].name(),
                    eqe[k],
                    repeats[k]
                ));
            }
        }
        Ok(Stack { order, repeats, eqe, current_ma_per_cm2: current })
    }

    /// The least-power current that gives every unit its photons; needs no voltage where none is known.
    fn least_current(
        &self,
        context: &Context<'_>,
        demands: &[f64],
        repeats: &[u32],
        fill: f64,
    ) -> Result<f64, DeviceError> {
        let lit: Vec<usize> = Context::lit(demands).collect();
        if lit.iter().all(|&k| context.characteristics[k].has_voltage()) {
            // Dark units are left out of the stack.
            let first = *lit.first().ok_or_else(no_light)?;
            let stand_in =
                |k: usize| context.characteristics[if demands[k] > 0.0 { k } else { first }].clone();
            let coupling = Coupling::Series {
                fill,
                repeats: (0..demands.len())
                    .map(|k| if demands[k] > 0.0 { f64::from(repeats[k]) } else { 0.0 })
                    .collect(),
                junctions_v: self.junctions_v(repeats, demands),
            };
            let characteristics = (0..demands.len()).map(stand_in).collect();
            let model = PowerModel::new(context.channels.clone(), characteristics, coupling, 10.0)?;
            return Ok(model.least_power_of_demands(demands)?.currents[first]);
        }
        let mut current = 0.0f64;
        for &k in &lit {
            let c = &context.characteristics[k];
            let wanted = demands[k] / (fill * f64::from(repeats[k]));
            let floor = c.range().0;
            let least = if wanted <= c.photon_current(floor) { Some(floor) } else { c.current_for(wanted) };
            current = current.max(least.ok_or_else(|| DeviceError::Unreachable {
                reason: format!(
                    "{} gives too few photons at any current of its sheet: repeat the unit",
                    c.name()
                ),
            })?);
        }
        Ok(current)
    }

    fn as_measured(
        &self,
        context: &Context<'_>,
        demands: &[f64],
        (order, mut repeats): (Vec<usize>, Vec<u32>),
        out: &mut Vec<String>,
    ) -> Result<Stack, DeviceError> {
        let fill = self.fill()?;
        let lit: Vec<usize> = Context::lit(demands).collect();
        // Lumens stand for the level; the light of a channel is that of its pump and converters together.
        let lumens_per_photon: Vec<f64> = context.channel_lights().iter().map(|light| light.lumens).collect();
        let wanted: f64 = lit.iter().map(|&k| demands[k] * lumens_per_photon[k]).sum();
        let current_of = |repeats: &[u32]| -> Result<f64, DeviceError> {
            if let Some(current) = self.current_ma_per_cm2 {
                return Ok(current);
            }
            let give = |j: f64| -> f64 {
                let one = |&k: &usize| {
                    let photons = f64::from(repeats[k]) * context.characteristics[k].photon_current(j);
                    fill * photons * lumens_per_photon[k]
                };
                lit.iter().map(one).sum()
            };
            self.current_for_lumens(context, &lit, wanted, give)
        };
        let mut current = match self.most_units {
            // A first guess for the search of repeats: every lit unit as often as the limit allows on average.
            Some(most) => {
                let average = (most / lit.len().max(1) as u32).max(1);
                let spread: Vec<u32> = repeats.iter().map(|_| average).collect();
                current_of(&spread)?
            }
            None => current_of(&repeats)?,
        };
        if let Some(most) = self.most_units {
            // Repeats and current depend on each other only through roll-off: a few rounds settle them.
            for _ in 0..8 {
                let best = closest_repeats(context, demands, current, most).ok_or_else(|| {
                    DeviceError::Unreachable {
                        reason: format!("{most} units are fewer than the emitters of the blend"),
                    }
                })?;
                let mut next = vec![0; repeats.len()];
                lit.iter().zip(&best.counts).for_each(|(&k, &count)| next[k] = count);
                let settled = next == repeats;
                repeats = next;
                current = current_of(&repeats)?;
                if settled {
                    break;
                }
            }
        }
        for &k in &lit {
            context.characteristics[k].at(current)?;
        }
        let eqe: Vec<f64> = (0..demands.len())
            .map(|k| {
                if demands[k] > 0.0 {
                    f64::from(repeats[k]) * context.characteristics[k].eqe(current)
                } else {
                    0.0
                }
            })
            .collect();
        out.push("units as measured: the white is the closest these whole repeats give".to_owned());
        Ok(Stack { order, repeats, eqe, current_ma_per_cm2: current })
    }

    fn current_for_lumens(
        &self,
        context: &Context<'_>,
        lit: &[usize],
        wanted: f64,
        give: impl Fn(f64) -> f64,
    ) -> Result<f64, DeviceError> {
        let (mut low, mut high) = (0.0f64, f64::INFINITY);
        for &k in lit {
            let range = context.characteristics[k].range();
            (low, high) = (low.max(range.0), high.min(range.1));
        }
        if low > high || give(high) < wanted {
            return Err(DeviceError::Unreachable {
                reason: format!(
                    "the stack gives {:.4} of the wanted lumens at its highest common current: add units or ask \
                     for less light",
                    if low > high { 0.0 } else { give(high) / wanted }
                ),
            });
        }
        if give(low) >= wanted {
            return Ok(low);
        }
        let (mut a, mut b) = (low.ln(), high.ln());
        for _ in 0..80 {
            let middle = 0.5 * (a + b);
            if middle <= a || middle >= b {
                break;
            }
            if give(middle.exp()) < wanted { a = middle } else { b = middle }
        }
        Ok(b.exp().clamp(low, high))
    }

    /// What every unit needs and has.
    pub(crate) fn needs(&self, context: &Context<'_>, made: &Stack) -> Vec<UnitNeed> {
        let need = |&k: &usize| {
            let c = &context.characteristics[k];
            let repeats = made.repeats[k];
            let one = (c.has_eqe() && made.eqe[k] > 0.0).then(|| c.eqe(made.current_ma_per_cm2));
            let measured = one.map(|eqe| f64::from(repeats) * eqe);
            UnitNeed {
                name: c.name().to_owned(),
                repeats,
                needed_eqe: made.eqe[k],
                measured_eqe: measured,
                lacking_eqe: measured.map(|has| (made.eqe[k] - has).max(0.0)),
                // A rounding-sized excess is no further unit.
                repeats_needed: one.map(|eqe| (made.eqe[k] / eqe - 1e-9).ceil().max(1.0) as u32),
            }
        };
        made.order.iter().filter(|&&k| made.eqe[k] > 0.0).map(need).collect()
    }
}

fn no_light() -> DeviceError {
    DeviceError::Unreachable { reason: "there is no light to make".to_owned() }
}

/// Whole repeats of the lit units whose white at one current comes closest to that of the demands.
pub(crate) fn closest_repeats(
    context: &Context<'_>,
    demands: &[f64],
    current_ma_per_cm2: f64,
    most_units: u32,
) -> Option<crate::whole_numbers::Closest> {
    let lit: Vec<usize> = Context::lit(demands).collect();
    let lights = context.channel_lights();
    let target = context.white(&lights, demands)?;
    let xyz_each = lit
        .iter()
        .map(|&k| {
            let each = context.characteristics[k].eqe(current_ma_per_cm2);
            lights[k].xyz.map(|part| part * each)
        })
        .collect();
    let search =
        WholeNumbers { xyz_each, target, at_least: vec![1; lit.len()], at_most: most_units, least_y: 0.0 };
    search.closest()
}

impl BuildFace for SeriesStack {
    type Quantities = Stack;

    fn realise(&self, context: &Context<'_>, demands: &[f64]) -> Result<Realised<Stack>, DeviceError> {
        context.need_eqe(demands)?;
        let (mut order, mut repeats) = self.layout(context)?;
        // A unit without light is left out of the stack.
        order.retain(|&k| demands[k] > 0.0);
        (0..demands.len()).filter(|&k| demands[k] <= 0.0).for_each(|k| repeats[k] = 0);
        let layout = (order, repeats);
        let mut notices = Vec::new();
        let stack = match self.tuning {
            Tuning::Designed => self.designed(context, demands, layout, &mut notices)?,
            Tuning::AsMeasured => self.as_measured(context, demands, layout, &mut notices)?,
        };
        let mut out = Realised::new(stack);
        out.notices = notices;
        if self.fill.is_none() {
            out.assumptions.push("the whole panel is lit (fill 1)".to_owned());
        }
        if self.junction_drop_v.is_none() {
            out.assumptions.push("no voltage is lost in the junctions between units".to_owned());
        }
        if self.tuning == Tuning::Designed {
            out.assumptions
                .push("a unit tuned to less EQE keeps its measured voltage and roll-off".to_owned());
        }
        Ok(out)
    }

    fn states(&self, context: &Context<'_>, made: &Stack) -> Result<States, DeviceError> {
        let count = context.channels.len();
        if made.eqe.len() != count || made.repeats.len() != count {
            let found = made.eqe.len();
            return Err(DeviceError::LengthMismatch { what: "stacked units", expected: count, found });
        }
        let fill = self.fill()?;
        let current = made.current_ma_per_cm2;
        let mut states =
            States { channels: Vec::new(), absolute: true, shared_electrical_w: None, notices: Vec::new() };
        for k in 0..count {
            if made.eqe[k] <= 0.0 {
                states.channels.push(ChannelState { area_share: Some(0.0), ..ChannelState::default() });
                continue;
            }
            let mut at = context.characteristics[k].at(current)?;
            states.notices.append(&mut at.notices);
            let volts = at.voltage_v.map(|volts| f64::from(made.repeats[k]) * volts);
            states.channels.push(ChannelState {
                photon_current: fill * current * made.eqe[k],
                eqe: Some(made.eqe[k]),
                current_density_ma_per_cm2: Some(current),
                voltage_v: volts,
                area_share: Some(fill),
                lit_area: Some(fill),
                electrical_w: volts.map(|volts| 10.0 * fill * current * volts),
            });
        }
        states.shared_electrical_w = Some(10.0 * fill * current * self.junctions_v(&made.repeats, &made.eqe));
        Ok(states)
    }

    fn coupling(&self, context: &Context<'_>) -> Result<Coupling, DeviceError> {
        let (_, repeats) = self.layout(context)?;
        let lit = vec![1.0; repeats.len()];
        Ok(Coupling::Series {
            fill: self.fill()?,
            junctions_v: self.junctions_v(&repeats, &lit),
            repeats: repeats.into_iter().map(f64::from).collect(),
        })
    }

    fn freedoms(&self, _context: &Context<'_>) -> Vec<String> {
        let mut out =
            vec!["the order of the units is free".to_owned(), "the repeats of each unit are free".to_owned()];
        if self.current_ma_per_cm2.is_none() {
            out.push("the current density is free, traded against the EQE each unit needs".to_owned());
        }
        out
    }
}
