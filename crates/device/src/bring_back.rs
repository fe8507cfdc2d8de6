//! What must change to bring a white back when some numbers are fixed.

use serde::Serialize;

use crate::build::{Build, FormSettings, Level};
use crate::calibration::ZoneSetting;
use crate::error::DeviceError;
use crate::form::Context;
use crate::light::DeviceEmitter;
use crate::made::{Made, Quantities, Quantity, QuantityKind};
use crate::recipe::Recipe;
use crate::shared_zone::{Knob, ZoneHold};
use crate::side_by_side::{Drive, StripeCurrents, StripeHold};

/// One number that must change.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Change {
    /// The number.
    pub quantity: Quantity,
    /// Its value now.
    pub from: f64,
    /// The value that brings the white back.
    pub to: f64,
}

/// The way back to a blend.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct WayBack {
    /// The recipe with the fixed numbers kept.
    pub recipe: Recipe,
    /// Every number that differs from the device as it stands.
    pub changes: Vec<Change>,
}

impl Build {
    /// The numbers that bring a changed device back to a blend at a level, keeping the locked ones.
    ///
    /// Numbers that are neither locked nor needed follow the form's rule for its freedoms; counts, order and
    /// repeats stay.
    ///
    /// # Errors
    /// [`DeviceError::Unreachable`] with a sentence where the locked numbers alone already fix another white or
    /// level, and all errors of [`Build::recipe`].
    pub fn bring_back(
        &self,
        emitters: &[DeviceEmitter],
        made: &Made,
        locked: &[Quantity],
        shares_radiant: &[f64],
        level: Level,
    ) -> Result<WayBack, DeviceError> {
        let radiant = self.radiant_powers(emitters, shares_radiant, level)?;
        let context = self.context(emitters)?;
        let (demands, _) = context.channels.demands(&radiant)?;
        let mut build = self.holding(emitters, made)?;
        build.unlock();
        for &quantity in locked {
            build.lock(&context, made, quantity, &demands)?;
        }
        let recipe = build.recipe(emitters, shares_radiant, level)?;
        let now = made.numbers();
        let then = recipe.made.as_ref().map(Made::numbers).unwrap_or_default();
        let change = |&(quantity, to): &(Quantity, f64)| {
            let from = now.iter().find(|number| number.0 == quantity).map_or(0.0, |number| number.1);
            ((to - from).abs() > 1e-9 * from.abs().max(to.abs())).then_some(Change { quantity, from, to })
        };
        let changes: Vec<Change> = then.iter().filter_map(change).collect();
        let kept = |quantity: &Quantity| !changes.iter().any(|change| change.quantity == *quantity);
        if let Some(broken) = locked.iter().find(|quantity| !kept(quantity)) {
            return Err(DeviceError::Unreachable {
                reason: format!(
                    "with the {} fixed as it is, nothing else brings this white back at this level",
                    broken.kind.label()
                ),
            });
        }
        Ok(WayBack { recipe, changes })
    }

    /// Frees what [`Build::holding`] fixed except counts, order and repeats.
    fn unlock(&mut self) {
        match &mut self.form {
            FormSettings::SideBySide(form) => {
                form.holds.clear();
                form.drive = match form.drive {
                    Drive::CommonCurrent(_) => Drive::CommonCurrent(None),
                    Drive::CommonVoltage(_) => Drive::CommonVoltage(None),
                    own => own,
                };
            }
            FormSettings::SeriesStack(form) => form.current_ma_per_cm2 = None,
            FormSettings::SharedZone(form) => form.current_ma_per_cm2 = None,
            FormSettings::Packages(_) => {}
        }
    }

    fn lock(
        &mut self,
        context: &Context<'_>,
        made: &Made,
        quantity: Quantity,
        demands: &[f64],
    ) -> Result<(), DeviceError> {
        let Some(value) = made.numbers().iter().find(|number| number.0 == quantity).map(|number| number.1)
        else {
            return Ok(());
        };
        let k = quantity.channel.unwrap_or(0);
        let emitter = context.channels.driven.get(k).copied().unwrap_or(0);
        match (&mut self.form, &made.quantities, quantity.kind) {
            (FormSettings::SideBySide(form), Quantities::SideBySide(stripes), kind) => {
                match (kind, &stripes.currents) {
                    (QuantityKind::AreaShare, StripeCurrents::Own(_)) => {
                        form.holds.push(StripeHold::Area { emitter, share: value });
                    }
                    (QuantityKind::CurrentDensity, _) => {
                        form.holds.push(StripeHold::Current { emitter, ma_per_cm2: value });
                    }
                    (QuantityKind::AreaShare, StripeCurrents::Common(_)) => {
                        // One area and its light fix the common current.
                        let current = context.characteristics[k].current_for(demands[k] / value);
                        form.drive =
                            Drive::CommonCurrent(Some(current.ok_or_else(|| out_of_range(quantity))?));
                    }
                    (QuantityKind::AreaShare, StripeCurrents::Voltage(_)) => {
                        let c = &context.characteristics[k];
                        let current =
                            c.current_for(demands[k] / value).ok_or_else(|| out_of_range(quantity))?;
                        form.drive = Drive::CommonVoltage(Some(c.voltage(current)));
                    }
                    (QuantityKind::CommonCurrentDensity, _) => form.drive = Drive::CommonCurrent(Some(value)),
                    (QuantityKind::CommonVoltage, _) => form.drive = Drive::CommonVoltage(Some(value)),
                    _ => {}
                }
            }
            (FormSettings::SeriesStack(form), _, QuantityKind::CommonCurrentDensity) => {
                form.current_ma_per_cm2 = Some(value);
            }
            (FormSettings::SeriesStack(form), _, QuantityKind::UnitEqe) => {
                form.current_ma_per_cm2 = Some(demands[k] / (form.fill.unwrap_or(1.0) * value));
            }
            (FormSettings::SharedZone(form), Quantities::SharedZone(zone), kind) => {
                let turn = match kind {
                    QuantityKind::Concentration => Knob::Thickness,
                    QuantityKind::Thickness => Knob::Concentration,
                    // The current sets the level, the locked level sets the current: checked afterwards.
                    _ => return Ok(()),
                };
                let setting: ZoneSetting = zone.settings.get(k).copied().unwrap_or_default();
                let other = match turn {
                    Knob::Thickness => setting.concentration_percent,
                    Knob::Concentration => setting.thickness_nm,
                };
                form.holds.retain(|hold| hold.emitter != emitter);
                form.holds.push(ZoneHold { emitter, turn, other });
            }
            // Package currents and optical depths follow from the white alone: checked afterwards.
            _ => {}
        }
        Ok(())
    }
}

fn out_of_range(quantity: Quantity) -> DeviceError {
    DeviceError::Unreachable {
        reason: format!(
            "with this {} fixed, the current would leave the sheet's range",
            quantity.kind.label()
        ),
    }
}
