//! Stripes side by side: `P_i = a_i·M_e,i(J_i)`, `Σa_i ≤ fill`.
//!
//! Own current: areas and currents are both free (2k−1 freedoms for k emitters at a given white). Common
//! current: `a_i ∝ p_i/EQE_i(J)`. Common voltage: `J_i(V)` from the tables. The panel's colour is the sum seen
//! from far enough that the stripes merge.

use serde::{Deserialize, Serialize};

use crate::error::DeviceError;
use crate::form::{BuildFace, ChannelState, Context, DEFAULT_STRIPE_FILL, Realised, States, checked_fill};
use crate::power::{Coupling, LeastPower, PowerModel};
use crate::stripe_rules::{areas_at, equal_ageing, equal_current};
use crate::working::Characteristic;

/// What the areas and currents left free are spent on, with own currents.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Freedom {
    /// Least electrical power.
    #[default]
    LeastPower,
    /// Every emitter ages alike: `J_i = J_ref,i·(τ_ref,i/τ*)^{1/n_i}`, τ* as long as the area allows.
    EqualAgeing,
    /// The same current density everywhere, as low as the area allows.
    EqualCurrent,
}

/// How the stripes are driven.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Drive {
    /// A current of its own for each emitter.
    OwnCurrent(Freedom),
    /// One current density in mA/cm²; `None` takes the one of least power.
    CommonCurrent(Option<f64>),
    /// One voltage; `None` takes the one of least power.
    CommonVoltage(Option<f64>),
}

impl Default for Drive {
    fn default() -> Drive {
        Drive::OwnCurrent(Freedom::LeastPower)
    }
}

/// A number the user has fixed, for own currents: the emitter's area or its current, not both.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub enum StripeHold {
    /// Area share.
    Area {
        /// Emitter index.
        emitter: usize,
        /// Fraction of the panel.
        share: f64,
    },
    /// Current density.
    Current {
        /// Emitter index.
        emitter: usize,
        /// Current density, mA/cm².
        ma_per_cm2: f64,
    },
}

/// Stripes repeated across the panel.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct StripeLayout {
    /// Width of one repeat of all stripes with their gaps, µm.
    pub pitch_um: f64,
    /// Dark gap between neighbours, µm.
    pub gap_um: f64,
    /// Narrowest stripe the mask can make, µm.
    pub minimum_um: f64,
}

/// Settings of the side-by-side form.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct SideBySide {
    /// Lit fraction of the panel; `None` takes [`DEFAULT_STRIPE_FILL`] and says so.
    pub fill: Option<f64>,
    /// How the stripes are driven.
    pub drive: Drive,
    /// Fixed numbers.
    pub holds: Vec<StripeHold>,
    /// Stripe geometry, where widths are wanted.
    pub layout: Option<StripeLayout>,
}

/// Currents of made stripes.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub enum StripeCurrents {
    /// One a channel, mA/cm²; 0 where dark.
    Own(Vec<f64>),
    /// One for all, mA/cm².
    Common(f64),
    /// One voltage for all, V.
    Voltage(f64),
}

/// Fabrication quantities: one area a driven channel, and the drive.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Stripes {
    /// Area share of each channel, a fraction of the panel; 0 where dark.
    pub areas: Vec<f64>,
    /// The drive.
    pub currents: StripeCurrents,
}

impl SideBySide {
    /// The lit area there is: the fill, or less where the gaps of the layout take more.
    fn budget(&self, stripes: usize) -> Result<f64, DeviceError> {
        let fill = checked_fill(self.fill.unwrap_or(DEFAULT_STRIPE_FILL))?;
        let Some(layout) = self.layout else {
            return Ok(fill);
        };
        let open = 1.0 - stripes as f64 * layout.gap_um / layout.pitch_um;
        if !(layout.pitch_um > 0.0 && layout.gap_um >= 0.0 && layout.minimum_um >= 0.0 && open > 0.0) {
            return Err(DeviceError::BadSetting {
                what: "the stripe pitch in µm",
                value: layout.pitch_um,
                expected: "it must leave room for the gaps, and lengths cannot be negative",
            });
        }
        Ok(fill.min(open))
    }

    /// The same settings with the areas of made stripes fixed (own currents) or the drive's number fixed.
    pub fn holding_areas(&self, made: &Stripes, driven: &[usize]) -> SideBySide {
        let mut held = self.clone();
        match made.currents {
            StripeCurrents::Own(_) => {
                let hold = |(&emitter, &share): (&usize, &f64)| StripeHold::Area { emitter, share };
                held.holds = driven.iter().zip(&made.areas).filter(|(_, a)| **a > 0.0).map(hold).collect();
            }
            StripeCurrents::Common(current) => held.drive = Drive::CommonCurrent(Some(current)),
            StripeCurrents::Voltage(voltage) => held.drive = Drive::CommonVoltage(Some(voltage)),
        }
        held
    }

    /// The same settings with the currents of made stripes fixed.
    pub fn holding_currents(&self, made: &Stripes, driven: &[usize]) -> SideBySide {
        let mut held = self.holding_areas(made, driven);
        if let StripeCurrents::Own(currents) = &made.currents {
            let hold = |(&emitter, &ma_per_cm2): (&usize, &f64)| StripeHold::Current { emitter, ma_per_cm2 };
            held.holds = driven.iter().zip(currents).filter(|(_, j)| **j > 0.0).map(hold).collect();
        }
        held
    }

    /// Stripe widths in µm for areas, where there is a layout.
    pub fn widths_um(&self, areas: &[f64]) -> Option<Vec<f64>> {
        self.layout.map(|layout| areas.iter().map(|area| area * layout.pitch_um).collect())
    }

    /// A sentence for every stripe narrower than the mask allows, with the pitch that would do.
    pub fn too_narrow(&self, areas: &[f64], names: &[&str]) -> Vec<String> {
        let Some(layout) = self.layout else {
            return Vec::new();
        };
        let narrow = |(area, name): (&f64, &&str)| {
            let width = area * layout.pitch_um;
            (*area > 0.0 && width < layout.minimum_um * (1.0 - 1e-9)).then(|| {
                format!(
                    "the stripe of {name} would be {width:.1} µm wide, the mask needs {:.1} µm: a pitch of at \
                     least {:.0} µm would do",
                    layout.minimum_um,
                    layout.minimum_um / area
                )
            })
        };
        areas.iter().zip(names).filter_map(narrow).collect()
    }

    fn own(
        &self,
        context: &Context<'_>,
        demands: &[f64],
        freedom: Freedom,
        out: &mut Realised<Stripes>,
    ) -> Result<(), DeviceError> {
        let lit: Vec<usize> = Context::lit(demands).collect();
        let mut budget = self.budget(lit.len())?;
        let mut areas = vec![0.0; demands.len()];
        let mut currents = vec![0.0; demands.len()];
        let mut open = vec![false; demands.len()];
        lit.iter().for_each(|&k| open[k] = true);
        let channel_of = |emitter: usize| context.channels.driven.iter().position(|&d| d == emitter);
        for hold in &self.holds {
            let (emitter, StripeHold::Area { .. } | StripeHold::Current { .. }) = (hold.emitter(), hold);
            let Some(k) = channel_of(emitter).filter(|&k| open[k]) else { continue };
            let c = &context.characteristics[k];
            match *hold {
                StripeHold::Area { share, .. } => {
                    areas[k] = checked_fill(share)?;
                    currents[k] = current_on_area(c, demands[k], share)?;
                }
                StripeHold::Current { ma_per_cm2, .. } => {
                    c.at(ma_per_cm2)?;
                    currents[k] = ma_per_cm2;
                    areas[k] = demands[k] / c.photon_current(ma_per_cm2);
                }
            }
            open[k] = false;
            budget -= areas[k];
        }
        // Fixed numbers that add up to the fill exactly may pass it by rounding.
        if budget < -1e-9 {
            return Err(DeviceError::Unreachable {
                reason: format!("the fixed stripes take {:.4} more than the lit area there is", -budget),
            });
        }
        loop {
            let free: Vec<usize> = lit.iter().copied().filter(|&k| open[k]).collect();
            if free.is_empty() {
                break;
            }
            let mut wanted = vec![0.0; demands.len()];
            free.iter().for_each(|&k| wanted[k] = demands[k]);
            let found = self.spend(context, &wanted, budget, freedom, out)?;
            // A stripe below the mask's minimum is widened to it at a lower current; the rest is shared anew.
            let least_area = self.layout.map_or(0.0, |layout| layout.minimum_um / layout.pitch_um);
            let narrow = free.iter().copied().find(|&k| found.areas[k] < least_area * (1.0 - 1e-9));
            let widened = narrow.and_then(|k| {
                let c = &context.characteristics[k];
                let fits = least_area <= budget;
                fits.then(|| current_on_area(c, demands[k], least_area).ok()).flatten().map(|j| (k, j))
            });
            match widened {
                Some((k, current)) => {
                    (areas[k], currents[k], open[k]) = (least_area, current, false);
                    budget -= least_area;
                    out.notices.push(format!(
                        "{} is widened to the narrowest stripe the mask can make, at a lower current",
                        context.characteristics[k].name()
                    ));
                }
                None => {
                    for k in free {
                        (areas[k], currents[k]) = (found.areas[k], found.currents[k]);
                    }
                    break;
                }
            }
        }
        out.quantities = Stripes { areas, currents: StripeCurrents::Own(currents) };
        Ok(())
    }

    /// Areas and currents of the open channels under a budget of area.
    fn spend(
        &self,
        context: &Context<'_>,
        wanted: &[f64],
        budget: f64,
        freedom: Freedom,
        out: &mut Realised<Stripes>,
    ) -> Result<LeastPower, DeviceError> {
        match freedom {
            Freedom::LeastPower => {
                let known = Context::lit(wanted).all(|k| {
                    let c = &context.characteristics[k];
                    c.has_voltage() || c.wall_plug().is_some()
                });
                if known {
                    return own_least_power(context, wanted, budget);
                }
                out.assumptions
                    .push("least power needs every voltage: the currents are taken equal instead".to_owned());
                equal_current(context, wanted, budget)
            }
            Freedom::EqualCurrent => equal_current(context, wanted, budget),
            Freedom::EqualAgeing => equal_ageing(context, wanted, budget, out),
        }
    }
}

impl StripeHold {
    /// The emitter whose number is fixed.
    pub fn emitter(&self) -> usize {
        match *self {
            StripeHold::Area { emitter, .. } | StripeHold::Current { emitter, .. } => emitter,
        }
    }
}

fn current_on_area(c: &Characteristic, demand: f64, share: f64) -> Result<f64, DeviceError> {
    c.current_for(demand / share).ok_or_else(|| {
        let (low, high) = c.range();
        DeviceError::Unreachable {
            reason: format!(
                "{} on {share:.4} of the panel would have to leave its range of {low} to {high} mA/cm²: it gives \
                 {:.4} to {:.4} of the light needed there",
                c.name(),
                c.photon_current(low) * share / demand,
                c.photon_current(high) * share / demand
            ),
        }
    })
}

fn own_least_power(context: &Context<'_>, wanted: &[f64], budget: f64) -> Result<LeastPower, DeviceError> {
    // Dark channels need no sheet: they are stood in for by a lit one, at zero demand.
    let Some(lit) = Context::lit(wanted).next() else {
        return Ok(LeastPower { watts: 0.0, currents: Vec::new(), areas: Vec::new() });
    };
    let stand_in = |k: usize| context.characteristics[if wanted[k] > 0.0 { k } else { lit }].clone();
    let characteristics = (0..wanted.len()).map(stand_in).collect();
    let coupling = Coupling::Own { budget };
    PowerModel::new(context.channels.clone(), characteristics, coupling, 10.0)?.least_power_of_demands(wanted)
}

impl BuildFace for SideBySide {
    type Quantities = Stripes;

    fn realise(&self, context: &Context<'_>, demands: &[f64]) -> Result<Realised<Stripes>, DeviceError> {
        context.need_eqe(demands)?;
        let empty = Stripes { areas: Vec::new(), currents: StripeCurrents::Own(Vec::new()) };
        let mut out = Realised::new(empty);
        if self.fill.is_none() {
            out.assumptions.push(format!("fill factor {DEFAULT_STRIPE_FILL} (common practice 0.6 to 0.9)"));
        }
        let lit: Vec<usize> = Context::lit(demands).collect();
        let budget = self.budget(lit.len())?;
        match self.drive {
            Drive::OwnCurrent(freedom) => self.own(context, demands, freedom, &mut out)?,
            Drive::CommonCurrent(held) => {
                let currents_known = held.is_some();
                let current = match held {
                    Some(current) => current,
                    None => common_least_power(context, demands, Coupling::CommonCurrent { budget })?,
                };
                if currents_known {
                    lit.iter().try_for_each(|&k| context.characteristics[k].at(current).map(|_| ()))?;
                }
                let currents: Vec<f64> = demands.iter().map(|_| current).collect();
                let areas = areas_at(context, demands, &currents);
                out.quantities = Stripes { areas, currents: StripeCurrents::Common(current) };
            }
            Drive::CommonVoltage(held) => {
                let voltage = match held {
                    Some(voltage) => voltage,
                    None => common_least_power(context, demands, Coupling::CommonVoltage { budget })?,
                };
                for &k in &lit {
                    check_voltage(&context.characteristics[k], voltage)?;
                }
                let currents: Vec<f64> =
                    context.characteristics.iter().map(|c| c.current_at_voltage(voltage)).collect();
                let areas = areas_at(context, demands, &currents);
                out.quantities = Stripes { areas, currents: StripeCurrents::Voltage(voltage) };
                out.notices.push(
                    "parallel stripes share their voltage: currents are unequal and drift with temperature and age"
                        .to_owned(),
                );
            }
        }
        let used: f64 = out.quantities.areas.iter().sum();
        if used > budget * (1.0 + 1e-9) {
            out.notices.push(format!(
                "the stripes take {used:.4} of the panel, {budget:.4} is there: less light or more current"
            ));
        }
        let names: Vec<&str> = context.characteristics.iter().map(|c| c.name()).collect();
        let narrow = self.too_narrow(&out.quantities.areas, &names);
        out.notices.extend(narrow);
        Ok(out)
    }

    fn states(&self, context: &Context<'_>, made: &Stripes) -> Result<States, DeviceError> {
        let count = context.channels.len();
        if made.areas.len() != count {
            let found = made.areas.len();
            return Err(DeviceError::LengthMismatch { what: "stripe areas", expected: count, found });
        }
        let mut states = States {
            channels: Vec::with_capacity(count),
            absolute: true,
            shared_electrical_w: None,
            notices: Vec::new(),
        };
        for (k, &area) in made.areas.iter().enumerate() {
            let c = &context.characteristics[k];
            let current = match &made.currents {
                StripeCurrents::Own(currents) => currents.get(k).copied().unwrap_or(0.0),
                StripeCurrents::Common(current) => *current,
                StripeCurrents::Voltage(voltage) if area > 0.0 => {
                    check_voltage(c, *voltage)?;
                    c.current_at_voltage(*voltage)
                }
                StripeCurrents::Voltage(_) => 0.0,
            };
            if area <= 0.0 || current <= 0.0 {
                states.channels.push(ChannelState { area_share: Some(0.0), ..ChannelState::default() });
                continue;
            }
            let mut at = c.at(current)?;
            let voltage = match &made.currents {
                StripeCurrents::Voltage(voltage) => Some(*voltage),
                _ => at.voltage_v,
            };
            states.notices.append(&mut at.notices);
            let eqe = at.eqe.unwrap_or(0.0);
            let photon_current = area * current * eqe;
            let by_wall_plug = c
                .wall_plug()
                .map(|wall_plug| photon_current * c.light().watts_per_photon_current() / wall_plug);
            states.channels.push(ChannelState {
                photon_current,
                eqe: at.eqe,
                current_density_ma_per_cm2: Some(current),
                voltage_v: voltage,
                area_share: Some(area),
                lit_area: Some(area),
                electrical_w: voltage.map(|volts| 10.0 * area * current * volts).or(by_wall_plug),
            });
        }
        Ok(states)
    }

    fn coupling(&self, context: &Context<'_>) -> Result<Coupling, DeviceError> {
        let budget = self.budget(context.channels.len())?;
        Ok(match self.drive {
            Drive::OwnCurrent(_) => Coupling::Own { budget },
            Drive::CommonCurrent(_) => Coupling::CommonCurrent { budget },
            Drive::CommonVoltage(_) => Coupling::CommonVoltage { budget },
        })
    }

    fn freedoms(&self, context: &Context<'_>) -> Vec<String> {
        let count = context.channels.len();
        match self.drive {
            Drive::OwnCurrent(_) => vec![format!(
                "{count} areas and {count} currents give {count} amounts of light: {} numbers stay free",
                count.saturating_sub(self.holds.len())
            )],
            Drive::CommonCurrent(None) => vec!["the common current density is free".to_owned()],
            Drive::CommonVoltage(None) => vec!["the common voltage is free".to_owned()],
            Drive::CommonCurrent(Some(_)) | Drive::CommonVoltage(Some(_)) => Vec::new(),
        }
    }
}

fn check_voltage(c: &Characteristic, voltage: f64) -> Result<(), DeviceError> {
    let (low, high) = (c.voltage(c.range().0), c.voltage(c.range().1));
    if c.has_voltage() && voltage >= low * (1.0 - 1e-12) && voltage <= high * (1.0 + 1e-12) {
        return Ok(());
    }
    if !c.has_voltage() {
        return Err(DeviceError::Missing {
            emitter: c.name().to_owned(),
            missing: "voltage against current density is missing: a common voltage needs it".to_owned(),
        });
    }
    Err(DeviceError::OutsideTable { quantity: "voltage of a stripe", at: voltage, low, high, unit: "V" })
}

/// The common current or voltage of least power.
fn common_least_power(
    context: &Context<'_>,
    demands: &[f64],
    coupling: Coupling,
) -> Result<f64, DeviceError> {
    let by_voltage = matches!(coupling, Coupling::CommonVoltage { .. });
    let Some(lit) = Context::lit(demands).next() else {
        return Err(DeviceError::Unreachable { reason: "there is no light to make".to_owned() });
    };
    let stand_in = |k: usize| context.characteristics[if demands[k] > 0.0 { k } else { lit }].clone();
    let characteristics = (0..demands.len()).map(stand_in).collect();
    let model = PowerModel::new(context.channels.clone(), characteristics, coupling, 10.0)?;
    let least = model.least_power_of_demands(demands)?;
    let current = least.currents[lit];
    Ok(if by_voltage { context.characteristics[lit].voltage(current) } else { current })
}
