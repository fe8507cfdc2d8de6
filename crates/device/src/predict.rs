//! From fabrication numbers to everything a recipe says.

use crate::bands::Outcome;
use crate::build::{Build, FormSettings, angular_factor};
use crate::channels::Basis;
use crate::error::DeviceError;
use crate::form::{BuildFace, ChannelState, Context, States};
use crate::light::u_prime_v_prime;
use crate::made::{Made, Quantities};
use crate::recipe::{Details, Recipe, RecipeEmitter};
use crate::shares;
use crate::side_by_side::StripeCurrents;

impl Build {
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

    pub(crate) fn predicted(
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
        state: &ChannelState,
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
    pub(crate) fn bare(&self, context: &Context<'_>, radiant: &[f64], depths: &[Vec<f64>]) -> Recipe {
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
}

/// Lumens of radiant powers.
pub(crate) fn lumens_of(context: &Context<'_>, radiant: &[f64]) -> f64 {
    radiant.iter().zip(&context.lights).map(|(watts, light)| watts * light.ler_lm_per_w).sum()
}
