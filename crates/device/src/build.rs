//! A build: form, conversions and area. From shares to a recipe, and from fabrication numbers back.

use std::sync::Arc;

use serde::{Deserialize, Serialize};

use crate::channels::{Basis, Channels};
use crate::conversion::Conversion;
use crate::error::DeviceError;
use crate::form::{BuildFace, BuildForm, Context, Realised};
use crate::light::{DeviceEmitter, EmitterLight, delta_uv_prime, u_prime_v_prime};
use crate::made::{Made, Quantities};
use crate::packages::Packages;
use crate::power::{LeastPower, PowerModel};
use crate::predict::lumens_of;
use crate::recipe::Recipe;
use crate::series_stack::SeriesStack;
use crate::shared_zone::SharedZone;
use crate::shares;
use crate::side_by_side::SideBySide;
use crate::units::watts_per_photon_current;
use crate::working::Characteristic;

/// Settings of the chosen build form.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum FormSettings {
    /// Stripes side by side.
    SideBySide(SideBySide),
    /// Units in series.
    SeriesStack(SeriesStack),
    /// One recombination zone.
    SharedZone(SharedZone),
    /// Packages on strings.
    Packages(Packages),
}

impl Default for FormSettings {
    fn default() -> FormSettings {
        FormSettings::SideBySide(SideBySide::default())
    }
}

/// How a blend is built. Plain data for storage.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct Build {
    /// The form and its settings.
    pub form: FormSettings,
    /// Down-conversion, with any form.
    pub conversions: Vec<Conversion>,
    /// Area of the panel or board, m²: joins lumens and luminance.
    pub area_m2: Option<f64>,
}

/// How much light is wanted.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub enum Level {
    /// Luminance along the normal, cd/m².
    Luminance(f64),
    /// Luminous exitance, lm/m².
    LuminousExitance(f64),
    /// Luminous flux, lm.
    LuminousFlux(f64),
}

impl Build {
    /// The build form.
    pub fn build_form(&self) -> BuildForm {
        match self.form {
            FormSettings::SideBySide(_) => BuildForm::SideBySide,
            FormSettings::SeriesStack(_) => BuildForm::SeriesStack,
            FormSettings::SharedZone(_) => BuildForm::SharedZone,
            FormSettings::Packages(_) => BuildForm::Packages,
        }
    }

    pub(crate) fn basis(&self) -> Basis {
        if matches!(self.form, FormSettings::Packages(_)) { Basis::Whole } else { Basis::PanelArea }
    }

    pub(crate) fn context<'a>(&self, emitters: &'a [DeviceEmitter]) -> Result<Context<'a>, DeviceError> {
        let lights: Vec<EmitterLight> = emitters.iter().map(|emitter| emitter.light).collect();
        let channels = Channels::new(&lights, &self.conversions, self.basis())?;
        let prepare = |&index: &usize| -> Result<Arc<Characteristic>, DeviceError> {
            let emitter = &emitters[index];
            let made = match self.basis() {
                Basis::PanelArea => Characteristic::of(emitter)?,
                Basis::Whole => match Characteristic::of_package(emitter) {
                    Err(DeviceError::Missing { .. }) => {
                        Characteristic::unknown(emitter, emitter.sheet.missing_for_package())?
                    }
                    made => made?,
                },
            };
            Ok(Arc::new(made))
        };
        let characteristics = channels.driven.iter().map(prepare).collect::<Result<Vec<_>, _>>()?;
        let depths = vec![Vec::new(); channels.len()];
        Ok(Context { emitters, lights, channels, characteristics, depths })
    }

    /// Total lumens per m² of panel (lm of the board for packages) that a level asks of a blend.
    fn lumens(&self, emitters: &[DeviceEmitter], shares: &[f64], level: Level) -> Result<f64, DeviceError> {
        let angular_factor = angular_factor(emitters, shares);
        let area = |why: &'static str| {
            self.area_m2.filter(|area| *area > 0.0).ok_or(DeviceError::BadSetting {
                what: "the area of the panel or board in m²",
                value: self.area_m2.unwrap_or(0.0),
                expected: why,
            })
        };
        let wanted = match level {
            Level::Luminance(value) | Level::LuminousExitance(value) | Level::LuminousFlux(value) => value,
        };
        if !(wanted.is_finite() && wanted > 0.0) {
            return Err(DeviceError::BadSetting {
                what: "the wanted amount of light",
                value: wanted,
                expected: "a number above zero is expected",
            });
        }
        let exitance = |luminance: f64| std::f64::consts::PI * luminance / angular_factor;
        Ok(match (self.basis(), level) {
            (Basis::PanelArea, Level::Luminance(luminance)) => exitance(luminance),
            (Basis::PanelArea, Level::LuminousExitance(exitance)) => exitance,
            (Basis::PanelArea, Level::LuminousFlux(flux)) => flux / area("lumens need the panel's area")?,
            (Basis::Whole, Level::LuminousFlux(flux)) => flux,
            (Basis::Whole, Level::LuminousExitance(exitance)) => {
                exitance * area("a luminous exitance of packages needs the board's area")?
            }
            (Basis::Whole, Level::Luminance(luminance)) => {
                exitance(luminance) * area("a luminance of packages needs the board's area")?
            }
        })
    }

    /// Radiant powers (W/m²; W for packages) of a blend at a level.
    ///
    /// # Errors
    /// Unusable shares, a level that is not above zero, a missing area, a blend without lumens.
    pub fn radiant_powers(
        &self,
        emitters: &[DeviceEmitter],
        shares_radiant: &[f64],
        level: Level,
    ) -> Result<Vec<f64>, DeviceError> {
        shares::check(shares_radiant, emitters.len())?;
        let mut shares = shares_radiant.to_vec();
        shares::normalise(&mut shares)?;
        let lumens_per_w: f64 = shares.iter().zip(emitters).map(|(s, e)| s * e.light.ler_lm_per_w).sum();
        let lumens = self.lumens(emitters, &shares, level)?;
        if lumens_per_w <= 0.0 {
            return Err(DeviceError::Unreachable { reason: "the blend has no lumens".to_owned() });
        }
        Ok(shares.iter().map(|share| share * lumens / lumens_per_w).collect())
    }

    /// The recipe of a blend: radiant shares and a level to fabrication quantities, by the form's rule for what
    /// is free.
    ///
    /// Where a sheet lacks something, the recipe carries what can be said and lists what is missing.
    ///
    /// # Errors
    /// Unusable input, or a blend the form cannot make at this level.
    pub fn recipe(
        &self,
        emitters: &[DeviceEmitter],
        shares_radiant: &[f64],
        level: Level,
    ) -> Result<Recipe, DeviceError> {
        let radiant = self.radiant_powers(emitters, shares_radiant, level)?;
        let mut context = self.context(emitters)?;
        let (demands, depths) = context.channels.demands(&radiant)?;
        context.depths.clone_from(&depths);
        let target = u_prime_v_prime(emitters.iter().map(|e| &e.light), &radiant);
        let realised = match &self.form {
            FormSettings::SideBySide(form) => {
                form.realise(&context, &demands).map(|r| wrap(r, Quantities::SideBySide))
            }
            FormSettings::SeriesStack(form) => {
                form.realise(&context, &demands).map(|r| wrap(r, Quantities::SeriesStack))
            }
            FormSettings::SharedZone(form) => {
                form.realise(&context, &demands).map(|r| wrap(r, Quantities::SharedZone))
            }
            FormSettings::Packages(form) => {
                form.realise(&context, &demands).map(|r| wrap(r, Quantities::Packages))
            }
        };
        let realised = match realised {
            Ok(realised) => realised,
            Err(missing @ DeviceError::Missing { .. }) => {
                let mut recipe = self.bare(&context, &radiant, &depths);
                recipe.missing.insert(0, missing.to_string());
                return Ok(recipe);
            }
            Err(error) => return Err(error),
        };
        let made = Made { quantities: realised.quantities, depths };
        let mut recipe = self.predicted(&context, &made, Some(&radiant))?;
        recipe.delta_uv_prime = Some(delta_uv_prime(recipe.u_prime.zip(recipe.v_prime), target));
        recipe.assumptions.splice(0..0, realised.assumptions);
        recipe.notices.splice(0..0, realised.notices);
        let asked = lumens_of(&context, &radiant);
        let given = match self.basis() {
            Basis::PanelArea => recipe.luminous_exitance_lm_per_m2,
            Basis::Whole => recipe.luminous_flux_lm,
        };
        let differs = |given: &f64| (given / asked - 1.0).abs() > 1e-6;
        if let Some(given) = given.filter(differs) {
            let unit = if self.basis() == Basis::Whole { "lm" } else { "lm/m²" };
            recipe.notices.push(format!("gives {given:.1} {unit} where {asked:.1} {unit} was asked for"));
        }
        Ok(recipe)
    }

    /// What given fabrication numbers give: the way back from a recipe to shares, level and power.
    ///
    /// # Errors
    /// Numbers outside the sheets' or the calibration's range, or of another form.
    pub fn predict(&self, emitters: &[DeviceEmitter], made: &Made) -> Result<Recipe, DeviceError> {
        let mut context = self.context(emitters)?;
        context.depths.clone_from(&made.depths);
        self.predicted(&context, made, None)
    }

    /// The same build with every freedom fixed as in a made device: areas, common current or voltage, order,
    /// repeats, untouched knobs, counts. A recipe made with it gives the device back.
    ///
    /// # Errors
    /// Quantities of another form, or conversions that do not fit the emitters.
    pub fn holding(&self, emitters: &[DeviceEmitter], made: &Made) -> Result<Build, DeviceError> {
        let context = self.context(emitters)?;
        let driven = &context.channels.driven;
        let form = match (&self.form, &made.quantities) {
            (FormSettings::SideBySide(form), Quantities::SideBySide(made)) => {
                FormSettings::SideBySide(form.holding_areas(made, driven))
            }
            (FormSettings::SeriesStack(form), Quantities::SeriesStack(made)) => {
                FormSettings::SeriesStack(form.holding(made, driven))
            }
            (FormSettings::SharedZone(form), Quantities::SharedZone(made)) => {
                FormSettings::SharedZone(form.holding(&context, made)?)
            }
            (FormSettings::Packages(form), Quantities::Packages(made)) => {
                FormSettings::Packages(form.holding(made, driven, emitters.len()))
            }
            _ => {
                return Err(DeviceError::Unreachable {
                    reason: "these quantities belong to another build form".to_owned(),
                });
            }
        };
        Ok(Build { form, ..self.clone() })
    }

    /// The form's electrical power over blends, for device lm/W as an objective.
    ///
    /// For packages the counts are real numbers here: a bound; [`Build::least_power`] is exact.
    ///
    /// # Errors
    /// A sheet that lacks what the power needs.
    pub fn power_model(&self, emitters: &[DeviceEmitter]) -> Result<PowerModel, DeviceError> {
        let context = self.context(emitters)?;
        let coupling = match &self.form {
            FormSettings::SideBySide(form) => form.coupling(&context)?,
            FormSettings::SeriesStack(form) => form.coupling(&context)?,
            FormSettings::SharedZone(form) => form.coupling(&context)?,
            FormSettings::Packages(form) => form.coupling(&context)?,
        };
        let scale = self.basis().amperes_per_unit();
        PowerModel::new(context.channels, context.characteristics, coupling, scale)
    }

    /// The exact least electrical power of one blend at a level, over the form's freedoms.
    ///
    /// # Errors
    /// As [`Build::power_model`] and [`PowerModel::least_power`].
    pub fn least_power(
        &self,
        emitters: &[DeviceEmitter],
        shares_radiant: &[f64],
        level: Level,
    ) -> Result<LeastPower, DeviceError> {
        let radiant = self.radiant_powers(emitters, shares_radiant, level)?;
        if let FormSettings::Packages(packages) = &self.form {
            let context = self.context(emitters)?;
            let (demands, _) = context.channels.demands(&radiant)?;
            return packages.least_power(&context, &demands);
        }
        self.power_model(emitters)?.least_power(&radiant)
    }
}

fn wrap<Q>(realised: Realised<Q>, into: impl FnOnce(Q) -> Quantities) -> Realised<Quantities> {
    Realised {
        quantities: into(realised.quantities),
        assumptions: realised.assumptions,
        notices: realised.notices,
    }
}

/// `π·L/M` of a blend: the emitters' factors weighted by their lumens.
pub fn angular_factor(emitters: &[DeviceEmitter], shares_radiant: &[f64]) -> f64 {
    let (mut weighted, mut lumens) = (0.0, 0.0);
    for (emitter, share) in emitters.iter().zip(shares_radiant) {
        let part = share * emitter.light.ler_lm_per_w;
        lumens += part;
        weighted += part * emitter.sheet.angular_factor.unwrap_or(1.0);
    }
    if lumens > 0.0 && weighted > 0.0 { weighted / lumens } else { 1.0 }
}

/// Radiant exitance of an emitter's own lit area, W/m²: `10·J·EQE·1239.842/λ̄`.
pub fn radiant_exitance(current_ma_per_cm2: f64, eqe: f64, mean_wavelength_nm: f64) -> f64 {
    current_ma_per_cm2 * eqe * watts_per_photon_current(mean_wavelength_nm)
}
