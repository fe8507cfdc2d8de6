//! Several emitters in one recombination zone: layers or dopants share the electrons.
//!
//! `N_i = (J/e)·γ·r_i·q_i·η_i` with `Σr_i = 1`. The division r cannot be predicted; it is calibrated on the
//! user's own runs ([`crate::calibration`]). With EQE_i the efficiency each emitter would have alone in the
//! zone, photon shares p give the electrons `J = Σ D_i/EQE_i(J)`, so the zone's EQE is `1/Σ(p_i/EQE_i)`.

use std::sync::Arc;

use serde::{Deserialize, Serialize};

use crate::calibration::{LogLinear, Observation, ZoneRun, ZoneSetting};
use crate::error::DeviceError;
use crate::form::{BuildFace, ChannelState, Context, Realised, States, checked_fill};
use crate::light::DeviceEmitter;
use crate::power::Coupling;
use crate::shares;
use crate::sheet::{Sheet, VoltageModel};
use crate::working::Characteristic;

/// Which number of an emitter is turned to meet the white.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Knob {
    /// Its concentration.
    Concentration,
    /// Its thickness.
    Thickness,
}

/// How one emitter's two numbers are treated.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct ZoneHold {
    /// Emitter index.
    pub emitter: usize,
    /// The number that is turned.
    pub turn: Knob,
    /// Value of the other number (wt% or nm); `None` keeps the middle of the runs.
    pub other: Option<f64>,
}

/// Settings of the shared-zone form.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct SharedZone {
    /// The emitter the others are compared with.
    pub reference: usize,
    /// The user's calibration runs.
    pub runs: Vec<ZoneRun>,
    /// Which numbers are turned and which stay; emitters not listed turn their concentration where calibrated.
    pub holds: Vec<ZoneHold>,
    /// Voltage of the whole zone against its current density; `None` takes the highest of the emitters'.
    pub voltage: Option<VoltageModel>,
    /// Fixed current density, mA/cm²: then the level follows. `None` takes the current that gives the level.
    pub current_ma_per_cm2: Option<f64>,
    /// Lit fraction of the panel; `None` takes 1 and says so.
    pub fill: Option<f64>,
}

/// Fabrication quantities, one entry a driven channel.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Zone {
    /// Concentration and thickness of each channel's emitter.
    pub settings: Vec<ZoneSetting>,
    /// Working current density, mA/cm²; `None` where no sheet gives it.
    pub current_ma_per_cm2: Option<f64>,
}

/// One emitter's line of a zone recipe.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ZoneLine {
    /// Emitter name.
    pub name: String,
    /// Concentration, wt%.
    pub concentration_percent: Option<f64>,
    /// Thickness, nm.
    pub thickness_nm: Option<f64>,
    /// Lower end of the 95 % interval of its photon ratio to the reference, as a factor on the ratio.
    pub ratio_factor_low: Option<f64>,
    /// Upper end.
    pub ratio_factor_high: Option<f64>,
    /// Setting of the next run that would narrow the calibration most here.
    pub next_run: Option<ZoneSetting>,
}

impl SharedZone {
    fn fill(&self) -> Result<f64, DeviceError> {
        checked_fill(self.fill.unwrap_or(1.0))
    }

    /// The calibrated law of each channel; `None` for the reference and for emitters dark in every run.
    pub(crate) fn laws(&self, context: &Context<'_>) -> Result<(usize, Vec<Option<LogLinear>>), DeviceError> {
        let driven = &context.channels.driven;
        let Some(reference) = driven.iter().position(|&d| d == self.reference) else {
            return Err(DeviceError::BadSetting {
                what: "the reference emitter's number",
                value: self.reference as f64,
                expected: "a driven emitter of the set is expected",
            });
        };
        let mut observed: Vec<Vec<Observation>> = vec![Vec::new(); driven.len()];
        for run in &self.runs {
            if run.settings.len() != context.emitters.len() {
                let (expected, found) = (context.emitters.len(), run.settings.len());
                return Err(DeviceError::LengthMismatch {
                    what: "settings of a calibration run",
                    expected,
                    found,
                });
            }
            let radiant =
                shares::convert(&run.shares, run.kind, shares::ShareKind::Radiant, &context.lights)?;
            let (photons, _) = context.channels.demands(&radiant)?;
            for (k, &emitter) in driven.iter().enumerate() {
                if k == reference || photons[k] <= 0.0 {
                    continue;
                }
                if photons[reference] <= 0.0 {
                    return Err(DeviceError::NotEnoughData {
                        reason: format!("run {} shows no light of the reference emitter", run.id),
                    });
                }
                let log_ratio = (photons[k] / photons[reference]).ln();
                observed[k].push(Observation { setting: run.settings[emitter], log_ratio });
            }
        }
        let mut laws = Vec::with_capacity(driven.len());
        for (k, observations) in observed.iter().enumerate() {
            let dark = k == reference || (observations.is_empty() && !self.runs.is_empty());
            let name = context.characteristics[k].name();
            laws.push(if dark { None } else { Some(LogLinear::fit(name, observations)?) });
        }
        Ok((reference, laws))
    }

    fn hold_of(&self, emitter: usize) -> Option<&ZoneHold> {
        self.holds.iter().find(|hold| hold.emitter == emitter)
    }

    /// The setting that gives a wanted log ratio.
    fn solve(
        &self,
        name: &str,
        emitter: usize,
        law: &LogLinear,
        wanted: f64,
    ) -> Result<ZoneSetting, DeviceError> {
        let mut setting = law.mean_setting();
        let hold = self.hold_of(emitter);
        let turn = hold
            .map_or(if law.beta.is_some() { Knob::Concentration } else { Knob::Thickness }, |hold| hold.turn);
        if let Some(other) = hold.and_then(|hold| hold.other) {
            match turn {
                Knob::Concentration => setting.thickness_nm = Some(other),
                Knob::Thickness => setting.concentration_percent = Some(other),
            }
        }
        let uncalibrated = |what: &str| DeviceError::NotEnoughData {
            reason: format!("the calibration runs of {name} do not vary its {what}: make runs that do"),
        };
        match turn {
            Knob::Concentration => {
                let beta =
                    law.beta.filter(|b| b.abs() > 1e-9).ok_or_else(|| uncalibrated("concentration"))?;
                let rest = law.delta_per_nm.zip(setting.thickness_nm).map_or(0.0, |(d, t)| d * t);
                setting.concentration_percent = Some(((wanted - law.alpha - rest) / beta).exp());
            }
            Knob::Thickness => {
                let delta =
                    law.delta_per_nm.filter(|d| d.abs() > 1e-12).ok_or_else(|| uncalibrated("thickness"))?;
                let rest = law.beta.zip(setting.concentration_percent).map_or(0.0, |(b, c)| b * c.ln());
                setting.thickness_nm = Some((wanted - law.alpha - rest) / delta);
            }
        }
        law.check_inside(&setting).map_err(|error| DeviceError::Unreachable {
            reason: format!("{name}: {error}; it is the next run to make for this white"),
        })?;
        Ok(setting)
    }

    /// The reference emitter's setting: the middle of the runs.
    fn reference_setting(&self) -> ZoneSetting {
        let mean = |of: fn(&ZoneSetting) -> Option<f64>| -> Option<f64> {
            let values: Vec<f64> =
                self.runs.iter().filter_map(|run| run.settings.get(self.reference).and_then(of)).collect();
            (!values.is_empty()).then(|| values.iter().sum::<f64>() / values.len() as f64)
        };
        ZoneSetting {
            concentration_percent: mean(|s| s.concentration_percent),
            thickness_nm: mean(|s| s.thickness_nm),
        }
    }

    /// The zone's voltage law as a characteristic, where given.
    fn zone_voltage(&self) -> Result<Option<Arc<Characteristic>>, DeviceError> {
        let Some(voltage) = &self.voltage else {
            return Ok(None);
        };
        let emitter = DeviceEmitter {
            name: "the zone".to_owned(),
            light: crate::light::EmitterLight::new(1.0, 550.0, [1.0; 3]),
            sheet: Sheet { voltage: Some(voltage.clone()), ..Sheet::default() },
            temperature_c: None,
        };
        Characteristic::of(&emitter).map(|c| Some(Arc::new(c)))
    }

    /// Current density at which the electrons `Σ D_i/EQE_i(J)` equal the lit current.
    fn current_for(&self, context: &Context<'_>, demands: &[f64], fill: f64) -> Result<f64, DeviceError> {
        let (mut low, mut high) = (0.0f64, f64::INFINITY);
        let mut narrow = |range: (f64, f64)| (low, high) = (low.max(range.0), high.min(range.1));
        Context::lit(demands).for_each(|k| narrow(context.characteristics[k].range()));
        if let Some(zone) = self.zone_voltage()? {
            narrow(zone.range());
        }
        let surplus = |j: f64| {
            let electrons: f64 =
                Context::lit(demands).map(|k| demands[k] / context.characteristics[k].eqe(j)).sum();
            fill * j - electrons
        };
        let unreachable = |reason: String| Err(DeviceError::Unreachable { reason });
        if low > high {
            return unreachable("the sheets have no current density in common".to_owned());
        }
        if surplus(low) > 1e-12 * low {
            return unreachable(format!(
                "the zone gives more light than asked for at its lowest current {low} mA/cm²"
            ));
        }
        let steps = 400;
        let at = |k: usize| low * (high / low).powf(k as f64 / steps as f64);
        let Some(first) = (0..=steps).find(|&k| surplus(at(k)) >= -1e-12 * at(k)) else {
            return unreachable(format!(
                "the zone gives too little light up to {high} mA/cm²: ask for less light or more lit area"
            ));
        };
        let (mut a, mut b) = (at(first.saturating_sub(1)).ln(), at(first).ln());
        for _ in 0..80 {
            let middle = 0.5 * (a + b);
            if middle <= a || middle >= b {
                break;
            }
            if surplus(middle.exp()) < 0.0 { a = middle } else { b = middle }
        }
        Ok(b.exp().clamp(low, high))
    }

    /// The same settings with the numbers that were not turned fixed as in a made zone.
    pub(crate) fn holding(&self, context: &Context<'_>, made: &Zone) -> Result<SharedZone, DeviceError> {
        let (_, laws) = self.laws(context)?;
        let mut holds = Vec::new();
        for ((&emitter, setting), law) in context.channels.driven.iter().zip(&made.settings).zip(&laws) {
            let Some(law) = law else { continue };
            let turn = self.knob(emitter, law);
            let other = match turn {
                Knob::Concentration => setting.thickness_nm,
                Knob::Thickness => setting.concentration_percent,
            };
            holds.push(ZoneHold { emitter, turn, other });
        }
        Ok(SharedZone { holds, ..self.clone() })
    }

    /// The knob that is turned for an emitter: as set, or the concentration where it is calibrated.
    fn knob(&self, emitter: usize, law: &LogLinear) -> Knob {
        let calibrated = if law.beta.is_some() { Knob::Concentration } else { Knob::Thickness };
        self.hold_of(emitter).map_or(calibrated, |hold| hold.turn)
    }

    /// The lines of a zone recipe, with intervals and next runs.
    pub(crate) fn lines(&self, context: &Context<'_>, made: &Zone) -> Result<Vec<ZoneLine>, DeviceError> {
        let (_, laws) = self.laws(context)?;
        let line = |((k, setting), law): ((usize, &ZoneSetting), &Option<LogLinear>)| {
            let width = law.as_ref().map(|law| law.half_width(setting));
            ZoneLine {
                name: context.characteristics[k].name().to_owned(),
                concentration_percent: setting.concentration_percent,
                thickness_nm: setting.thickness_nm,
                ratio_factor_low: width.map(|w| (-w).exp()),
                ratio_factor_high: width.map(f64::exp),
                next_run: law.as_ref().map(|law| law.next_run(setting)),
            }
        };
        Ok(made.settings.iter().enumerate().zip(&laws).map(line).collect())
    }
}

impl BuildFace for SharedZone {
    type Quantities = Zone;

    fn realise(&self, context: &Context<'_>, demands: &[f64]) -> Result<Realised<Zone>, DeviceError> {
        let (reference, laws) = self.laws(context)?;
        if demands[reference] <= 0.0 {
            return Err(DeviceError::Unreachable {
                reason: "the reference emitter of the calibration is dark in this blend: choose another"
                    .to_owned(),
            });
        }
        let mut settings = Vec::with_capacity(demands.len());
        for (k, law) in laws.iter().enumerate() {
            let (name, emitter) = (context.characteristics[k].name(), context.channels.driven[k]);
            settings.push(match law {
                _ if k == reference => self.reference_setting(),
                Some(law) if demands[k] > 0.0 => {
                    self.solve(name, emitter, law, (demands[k] / demands[reference]).ln())?
                }
                None if demands[k] > 0.0 => {
                    return Err(DeviceError::NotEnoughData {
                        reason: format!("no calibration run shows light of {name}"),
                    });
                }
                _ => {
                    return Err(DeviceError::Unreachable {
                        reason: format!(
                            "{name} has no light in this blend, but a log-linear law never reaches zero: take it out \
                             of the set"
                        ),
                    });
                }
            });
        }
        let mut out = Realised::new(Zone { settings, current_ma_per_cm2: None });
        let fill = self.fill()?;
        if self.fill.is_none() {
            out.assumptions.push("the whole panel is lit (fill 1)".to_owned());
        }
        if self.voltage.is_none() {
            out.assumptions
                .push("the zone's voltage is the highest of its emitters' at that current".to_owned());
        }
        let known = Context::lit(demands).all(|k| context.characteristics[k].has_eqe());
        out.quantities.current_ma_per_cm2 = match (self.current_ma_per_cm2, known) {
            (Some(current), _) => Some(current),
            (None, true) => Some(self.current_for(context, demands, fill)?),
            (None, false) => None,
        };
        let runs_at: Vec<f64> = self.runs.iter().filter_map(|run| run.current_ma_per_cm2).collect();
        if let Some(current) = out.quantities.current_ma_per_cm2
            && let Some(far) = runs_at.iter().find(|at| (current / **at).ln().abs() > 0.1)
        {
            out.notices.push(format!(
                "the zone moves with current: it was calibrated at {far} mA/cm² and works at {current} mA/cm²"
            ));
        }
        Ok(out)
    }

    fn states(&self, context: &Context<'_>, made: &Zone) -> Result<States, DeviceError> {
        let count = context.channels.len();
        if made.settings.len() != count {
            let found = made.settings.len();
            return Err(DeviceError::LengthMismatch { what: "zone settings", expected: count, found });
        }
        let (reference, laws) = self.laws(context)?;
        let mut ratios = Vec::with_capacity(count);
        for (k, law) in laws.iter().enumerate() {
            ratios.push(match law {
                _ if k == reference => 1.0,
                Some(law) => law.log_ratio(&made.settings[k])?.exp(),
                None => 0.0,
            });
        }
        let total: f64 = ratios.iter().sum();
        let shares: Vec<f64> = ratios.iter().map(|r| r / total).collect();
        let fill = self.fill()?;
        let mut states =
            States { channels: Vec::new(), absolute: false, shared_electrical_w: None, notices: Vec::new() };
        let known = Context::lit(&shares).all(|k| context.characteristics[k].has_eqe());
        let Some(current) = made.current_ma_per_cm2.filter(|_| known) else {
            let state = |&share: &f64| ChannelState {
                photon_current: share,
                area_share: Some(fill),
                lit_area: Some(fill),
                current_density_ma_per_cm2: made.current_ma_per_cm2,
                ..ChannelState::default()
            };
            states.channels = shares.iter().map(state).collect();
            return Ok(states);
        };
        let mut per_photon = 0.0;
        let mut highest: Option<f64> = None;
        let mut all_volts = true;
        for k in Context::lit(&shares) {
            let mut at = context.characteristics[k].at(current)?;
            states.notices.append(&mut at.notices);
            per_photon += shares[k] / at.eqe.unwrap_or(f64::NAN);
            all_volts &= at.voltage_v.is_some();
            highest =
                at.voltage_v.map(|volts| highest.map_or(volts, |most: f64| most.max(volts))).or(highest);
        }
        let volts = match self.zone_voltage()? {
            Some(zone) => zone.at(current)?.voltage_v,
            None => highest.filter(|_| all_volts),
        };
        let zone_eqe = 1.0 / per_photon;
        states.absolute = true;
        states.shared_electrical_w = volts.map(|volts| 10.0 * fill * current * volts);
        let state = |&share: &f64| ChannelState {
            photon_current: fill * current * zone_eqe * share,
            eqe: Some(zone_eqe * share),
            current_density_ma_per_cm2: Some(current),
            voltage_v: volts,
            area_share: Some(fill),
            lit_area: Some(fill),
            // The zone's power belongs to all its emitters at once.
            electrical_w: Some(0.0),
        };
        states.channels = shares.iter().map(state).collect();
        Ok(states)
    }

    fn coupling(&self, _context: &Context<'_>) -> Result<Coupling, DeviceError> {
        Ok(Coupling::Zone { fill: self.fill()?, voltage: self.zone_voltage()? })
    }

    fn freedoms(&self, context: &Context<'_>) -> Vec<String> {
        let Ok((_, laws)) = self.laws(context) else {
            return Vec::new();
        };
        let both =
            laws.iter().flatten().filter(|law| law.beta.is_some() && law.delta_per_nm.is_some()).count();
        vec![format!(
            "{both} emitter(s) have both concentration and thickness calibrated: one of the two is free"
        )]
    }
}
