//! A build: form, conversions and area. From shares to a recipe, and from fabrication numbers back.

use std::sync::Arc;

use serde::{Deserialize, Serialize};

use crate::bands::Outcome;
use crate::channels::{Basis, Channels};
use crate::conversion::Conversion;
use crate::error::DeviceError;
use crate::form::{BuildFace, BuildForm, Context, Realised, States};
use crate::light::{DeviceEmitter, EmitterLight, delta_uv_prime, u_prime_v_prime};
use crate::made::{Made, Quantities, Quantity};
use crate::packages::Packages;
use crate::power::{LeastPower, PowerModel};
use crate::recipe::{Details, Recipe, RecipeEmitter};
use crate::series_stack::{self, Dimming, SeriesStack};
use crate::shared_zone::SharedZone;
use crate::shares;
use crate::side_by_side::{SideBySide, StripeCurrents};
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

/// What one fabrication number does to the white.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Sensitivity {
    /// The number.
    pub quantity: Quantity,
    /// Its value.
    pub value: f64,
    /// Change of u′ per +1 % of the number.
    pub du_prime_per_percent: f64,
    /// Change of v′ per +1 % of the number.
    pub dv_prime_per_percent: f64,
    /// Change of the lumens in per cent, per +1 % of the number; `None` where the level is unknown.
    pub flux_percent_per_percent: Option<f64>,
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

    fn basis(&self) -> Basis {
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

    fn states(&self, context: &Context<'_>, made: &Made) -> Result<States, DeviceError> {
        match (&self.form, &made.quantities) {
            (FormSettings::SideBySide(form), Quantities::SideBySide(made)) => form.states(context, made),
            (FormSettings::SeriesStack(form), Quantities::SeriesStack(made)) => form.states(context, made),
            (FormSettings::SharedZone(form), Quantities::SharedZone(made)) => form.states(context, made),
            (FormSettings::Packages(form), Quantities::Packages(made)) => form.states(context, made),
            _ => Err(DeviceError::Unreachable {
                reason: format!(
                    "these quantities belong to the form {}, the build is {}",
                    made.build_form().name(),
                    self.build_form().name()
                ),
            }),
        }
    }

    fn predicted(
        &self,
        context: &Context<'_>,
        made: &Made,
        asked: Option<&[f64]>,
    ) -> Result<Recipe, DeviceError> {
        let states = self.states(context, made)?;
        let channel_photons: Vec<f64> = states.channels.iter().map(|state| state.photon_current).collect();
        let photons = context.channels.photons(&channel_photons, &made.depths);
        let mut radiant: Vec<f64> = photons
            .iter()
            .enumerate()
            .map(|(emitter, n)| n * context.channels.watts_per_photon_current(emitter))
            .collect();
        let mut absolute = states.absolute;
        if !absolute && let Some(asked) = asked {
            // Only ratios are known: the level is the one asked for.
            let (lumens, wanted) = (lumens_of(context, &radiant), lumens_of(context, asked));
            radiant.iter_mut().for_each(|watts| *watts *= wanted / lumens);
            absolute = true;
        }
        let mut recipe = self.frame(context, &radiant, &made.depths, absolute)?;
        let mut electrical = states.shared_electrical_w.or(Some(0.0));
        if !states.absolute {
            electrical = None;
        }
        for (channel, state) in states.channels.iter().enumerate() {
            electrical = match (electrical, state.electrical_w, state.photon_current > 0.0) {
                (Some(sum), Some(watts), _) => Some(sum + watts),
                (sum, None, false) => sum,
                _ => None,
            };
            self.enter(context, &mut recipe, channel, state, &radiant, absolute);
        }
        if let FormSettings::SharedZone(_) = &self.form {
            // Every emitter of the zone carries zero: without the zone's own power there is none to state.
            electrical = electrical.and(states.shared_electrical_w);
        }
        self.state_power(&mut recipe, context, &radiant, electrical);
        recipe.details = Some(self.details(context, made, &recipe)?);
        recipe.made = Some(made.clone());
        recipe.freedoms = match &self.form {
            FormSettings::SideBySide(form) => form.freedoms(context),
            FormSettings::SeriesStack(form) => form.freedoms(context),
            FormSettings::SharedZone(form) => form.freedoms(context),
            FormSettings::Packages(form) => form.freedoms(context),
        };
        for notice in states.notices {
            let sentence = notice.to_string();
            if !recipe.notices.contains(&sentence) {
                recipe.notices.push(sentence);
            }
        }
        Ok(recipe)
    }

    /// Shares and chromaticity of a made device, nothing more: for searches over fabrication numbers.
    pub(crate) fn outcome(&self, context: &Context<'_>, made: &Made) -> Option<Outcome> {
        let states = self.states(context, made).ok()?;
        let channel_photons: Vec<f64> = states.channels.iter().map(|state| state.photon_current).collect();
        let photons = context.channels.photons(&channel_photons, &made.depths);
        let per_photon = |emitter| context.channels.watts_per_photon_current(emitter);
        let mut shares: Vec<f64> = photons.iter().enumerate().map(|(k, n)| n * per_photon(k)).collect();
        shares::normalise(&mut shares).ok()?;
        let white = u_prime_v_prime(&context.lights, &shares)?;
        Some(Outcome { shares, white })
    }

    /// Enters a channel's electrical state and its converters' exitance.
    fn enter(
        &self,
        context: &Context<'_>,
        recipe: &mut Recipe,
        channel: usize,
        state: &crate::form::ChannelState,
        radiant: &[f64],
        absolute: bool,
    ) {
        let pump = context.channels.driven[channel];
        let exitance = |emitter: usize| {
            state.lit_area.filter(|area| *area > 0.0 && absolute).map(|area| radiant[emitter] / area)
        };
        let leak = match &context.channels.conversion[channel] {
            None => 1.0,
            Some(conversion) => {
                let out = conversion.outputs(&context.depths[channel]);
                for layer in &conversion.layers {
                    let entry = &mut recipe.emitters[layer.emitter];
                    entry.radiant_exitance_w_per_m2 = exitance(layer.emitter);
                    entry.area_share = state.area_share;
                }
                out.leak
            }
        };
        let entry = &mut recipe.emitters[pump];
        entry.eqe = state.eqe.map(|eqe| eqe * leak);
        entry.current_density_ma_per_cm2 = state.current_density_ma_per_cm2;
        entry.voltage_v = state.voltage_v;
        entry.area_share = state.area_share;
        entry.radiant_exitance_w_per_m2 = exitance(pump);
    }

    /// A recipe with shares, level and chromaticity, and nothing electrical yet.
    fn frame(
        &self,
        context: &Context<'_>,
        radiant: &[f64],
        depths: &[Vec<f64>],
        absolute: bool,
    ) -> Result<Recipe, DeviceError> {
        let lights = &context.lights;
        let shares_of = |kind: shares::ShareKind| -> Result<Vec<f64>, DeviceError> {
            shares::convert(radiant, shares::ShareKind::Radiant, kind, lights)
        };
        let share_radiant = shares_of(shares::ShareKind::Radiant)?;
        let share_luminous = shares_of(shares::ShareKind::Luminous)?;
        let share_photon = shares_of(shares::ShareKind::Photon)?;
        let mut emitters: Vec<RecipeEmitter> = context
            .emitters
            .iter()
            .enumerate()
            .map(|(k, emitter)| RecipeEmitter {
                name: emitter.name.clone(),
                share_radiant: share_radiant[k],
                share_luminous: share_luminous[k],
                share_photon: share_photon[k],
                mean_wavelength_nm: emitter.light.mean_wavelength_nm,
                eqe: None,
                current_density_ma_per_cm2: None,
                voltage_v: None,
                radiant_exitance_w_per_m2: None,
                area_share: None,
                converted_by: None,
                optical_depth: None,
                loading_percent: None,
            })
            .collect();
        let mut assumptions = Vec::new();
        for (channel, conversion) in context.channels.conversion.iter().enumerate() {
            let Some(conversion) = conversion else { continue };
            let pump = context.emitters[conversion.pump].name.clone();
            for (k, layer) in conversion.layers.iter().enumerate() {
                let depth = depths.get(channel).and_then(|depths| depths.get(k)).copied();
                let entry = &mut emitters[layer.emitter];
                entry.converted_by = Some(pump.clone());
                entry.optical_depth = depth;
                entry.loading_percent = depth.and_then(|depth| layer.loading_percent(depth));
            }
            assumptions
                .push(format!("over {pump}: one pass outward, spectra keep their shape when absorbed"));
        }
        let lumens = lumens_of(context, radiant);
        let level = absolute.then_some(lumens);
        let (exitance, flux) = match self.basis() {
            Basis::PanelArea => (level, level.zip(self.area_m2).map(|(level, area)| level * area)),
            Basis::Whole => (level.zip(self.area_m2).map(|(level, area)| level / area), level),
        };
        let factor = angular_factor(context.emitters, &share_radiant);
        let white = u_prime_v_prime(lights, radiant);
        let mut missing = Vec::new();
        for (channel, characteristic) in context.characteristics.iter().enumerate() {
            let emitter = &context.emitters[context.channels.driven[channel]];
            missing.extend(characteristic.missing().iter().map(|m| format!("{}: {m}", emitter.name)));
            if self.basis() == Basis::PanelArea {
                assumptions
                    .extend(emitter.sheet.assumptions().iter().map(|a| format!("{}: {a}", emitter.name)));
            }
        }
        Ok(Recipe {
            build_form: self.build_form(),
            luminance_cd_per_m2: exitance.map(|exitance| factor * exitance / std::f64::consts::PI),
            luminous_exitance_lm_per_m2: exitance,
            luminous_flux_lm: flux,
            angular_factor: factor,
            emitters,
            radiant_exitance_w_per_m2: None,
            electrical_power_w_per_m2: None,
            electrical_power_w: None,
            efficacy_lm_per_w: None,
            wall_plug: None,
            u_prime: white.map(|white| white.0),
            v_prime: white.map(|white| white.1),
            delta_uv_prime: None,
            details: None,
            made: None,
            freedoms: Vec::new(),
            assumptions,
            missing,
            notices: Vec::new(),
        })
    }

    fn state_power(
        &self,
        recipe: &mut Recipe,
        context: &Context<'_>,
        radiant: &[f64],
        electrical: Option<f64>,
    ) {
        let total: f64 = radiant.iter().sum();
        let lumens = lumens_of(context, radiant);
        recipe.efficacy_lm_per_w = electrical.filter(|watts| *watts > 0.0).map(|watts| lumens / watts);
        recipe.wall_plug = electrical.filter(|watts| *watts > 0.0).map(|watts| total / watts);
        match self.basis() {
            Basis::PanelArea => {
                recipe.radiant_exitance_w_per_m2 = recipe.luminous_exitance_lm_per_m2.map(|_| total);
                recipe.electrical_power_w_per_m2 = electrical;
                recipe.electrical_power_w = electrical.zip(self.area_m2).map(|(watts, area)| watts * area);
            }
            Basis::Whole => {
                recipe.radiant_exitance_w_per_m2 = self.area_m2.map(|area| total / area);
                recipe.electrical_power_w_per_m2 =
                    electrical.zip(self.area_m2).map(|(watts, area)| watts / area);
                recipe.electrical_power_w = electrical;
            }
        }
    }

    /// What can be said without the sheets: shares, level, and power where every wall-plug efficiency is known.
    fn bare(&self, context: &Context<'_>, radiant: &[f64], depths: &[Vec<f64>]) -> Recipe {
        let mut recipe = match self.frame(context, radiant, depths, true) {
            Ok(recipe) => recipe,
            // The radiant powers were made from checked shares of these very emitters.
            Err(_) => unreachable!("shares of a checked blend can be converted"),
        };
        let mut electrical = Some(0.0);
        let (demands, _) = context.channels.demands(radiant).unwrap_or_default();
        for (channel, demand) in demands.iter().enumerate().filter(|(_, demand)| **demand > 0.0) {
            let pump = context.channels.driven[channel];
            let watts = demand * context.channels.watts_per_photon_current(pump);
            let wall_plug = context.emitters[pump].sheet.wall_plug;
            electrical = electrical.zip(wall_plug).map(|(sum, wall_plug)| sum + watts / wall_plug);
        }
        self.state_power(&mut recipe, context, radiant, electrical);
        recipe
    }

    fn details(&self, context: &Context<'_>, made: &Made, recipe: &Recipe) -> Result<Details, DeviceError> {
        let lit = || recipe.emitters.iter().filter_map(|emitter| emitter.area_share).fold(0.0, f64::max);
        Ok(match (&self.form, &made.quantities) {
            (FormSettings::SideBySide(form), Quantities::SideBySide(stripes)) => Details::SideBySide {
                lit_area_share: stripes.areas.iter().sum(),
                stripe_width_um: form.widths_um(&stripes.areas),
                common_current_density_ma_per_cm2: match stripes.currents {
                    StripeCurrents::Common(current) => Some(current),
                    _ => None,
                },
                common_voltage_v: match stripes.currents {
                    StripeCurrents::Voltage(voltage) => Some(voltage),
                    _ => None,
                },
            },
            (FormSettings::SeriesStack(form), Quantities::SeriesStack(stack)) => Details::SeriesStack {
                current_density_ma_per_cm2: stack.current_ma_per_cm2,
                total_voltage_v: recipe
                    .electrical_power_w_per_m2
                    .map(|watts| watts / (10.0 * stack.current_ma_per_cm2 * lit())),
                lit_area_share: lit(),
                units: form.needs(context, stack),
            },
            (FormSettings::SharedZone(form), Quantities::SharedZone(zone)) => Details::SharedZone {
                current_density_ma_per_cm2: zone.current_ma_per_cm2,
                lit_area_share: lit(),
                layers: form.lines(context, zone)?,
                calibration_runs: form.runs.iter().map(|run| run.id.clone()).collect(),
            },
            (FormSettings::Packages(form), Quantities::Packages(board)) => Details::Packages {
                total_count: board.counts.iter().sum(),
                packages: form.lines(context, board),
            },
            _ => {
                return Err(DeviceError::Unreachable {
                    reason: "these quantities belong to another build form".to_owned(),
                });
            }
        })
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

    /// What +1 % of every fabrication number does to the white and the lumens.
    ///
    /// Central differences over ±0.5 %; one-sided where a number sits at the end of what was measured.
    ///
    /// # Errors
    /// As [`Build::predict`] at the numbers themselves.
    pub fn sensitivities(
        &self,
        emitters: &[DeviceEmitter],
        made: &Made,
    ) -> Result<Vec<Sensitivity>, DeviceError> {
        let centre = self.predict(emitters, made)?;
        let at = |quantity: Quantity, value: f64| -> Option<(f64, f64, f64)> {
            let moved = self.predict(emitters, &made.with(quantity, value)).ok()?;
            let lumens = moved.luminous_exitance_lm_per_m2.or(moved.luminous_flux_lm);
            Some((moved.u_prime?, moved.v_prime?, lumens.unwrap_or(f64::NAN)))
        };
        let lumens = centre.luminous_exitance_lm_per_m2.or(centre.luminous_flux_lm);
        let middle = (
            centre.u_prime.unwrap_or(f64::NAN),
            centre.v_prime.unwrap_or(f64::NAN),
            lumens.unwrap_or(f64::NAN),
        );
        let sensitivity = |(quantity, value): (Quantity, f64)| {
            let up = at(quantity, value * 1.005);
            let down = at(quantity, value * 0.995);
            let (high, low, percent) = match (up, down) {
                (Some(up), Some(down)) => (up, down, 1.0),
                (Some(up), None) => (up, middle, 0.5),
                (None, Some(down)) => (middle, down, 0.5),
                (None, None) => (middle, middle, 1.0),
            };
            Sensitivity {
                quantity,
                value,
                du_prime_per_percent: (high.0 - low.0) / percent,
                dv_prime_per_percent: (high.1 - low.1) / percent,
                flux_percent_per_percent: lumens.map(|lumens| 100.0 * (high.2 - low.2) / lumens / percent),
            }
        };
        Ok(made.numbers().into_iter().map(sensitivity).collect())
    }

    /// Drift of a stack's white when dimmed to fractions of its full lumens.
    ///
    /// # Errors
    /// Another form, sheets without EQE, levels below what the sheets cover.
    pub fn dimming(
        &self,
        emitters: &[DeviceEmitter],
        made: &Made,
        levels: &[f64],
    ) -> Result<Vec<Dimming>, DeviceError> {
        let mut context = self.context(emitters)?;
        context.depths.clone_from(&made.depths);
        match &made.quantities {
            Quantities::SeriesStack(stack) => series_stack::dimming(&context, stack, levels),
            _ => Err(DeviceError::Unreachable {
                reason: "the drift when dimmed is worked out for series stacks".to_owned(),
            }),
        }
    }
}

fn wrap<Q>(realised: Realised<Q>, into: impl FnOnce(Q) -> Quantities) -> Realised<Quantities> {
    Realised {
        quantities: into(realised.quantities),
        assumptions: realised.assumptions,
        notices: realised.notices,
    }
}

fn lumens_of(context: &Context<'_>, radiant: &[f64]) -> f64 {
    radiant.iter().zip(&context.lights).map(|(watts, light)| watts * light.ler_lm_per_w).sum()
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
