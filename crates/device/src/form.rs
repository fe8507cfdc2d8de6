//! The one face of every build form.

use std::sync::Arc;

use serde::{Deserialize, Serialize};

use crate::channels::Channels;
use crate::error::{DeviceError, Notice};
use crate::light::{DeviceEmitter, EmitterLight, uv_of_xyz};
use crate::power::Coupling;
use crate::working::Characteristic;

/// Fill factor taken for stripes where none is given (common practice: 0.6 to 0.9).
pub const DEFAULT_STRIPE_FILL: f64 = 0.75;

/// The build forms, under their names in files and commands.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum BuildForm {
    /// Stripes or tiles beside one another.
    SideBySide,
    /// Units on top of one another, one current through all.
    SeriesStack,
    /// Emitters that share one recombination zone.
    SharedZone,
    /// Whole packages on strings.
    Packages,
}

impl BuildForm {
    /// The name in files and commands.
    pub fn name(self) -> &'static str {
        match self {
            BuildForm::SideBySide => "side-by-side",
            BuildForm::SeriesStack => "series-stack",
            BuildForm::SharedZone => "shared-zone",
            BuildForm::Packages => "packages",
        }
    }
}

/// What a form works on: the emitters, their channels, and each channel's characteristic.
pub(crate) struct Context<'a> {
    pub(crate) emitters: &'a [DeviceEmitter],
    pub(crate) lights: Vec<EmitterLight>,
    pub(crate) channels: Channels,
    pub(crate) characteristics: Vec<Arc<Characteristic>>,
    /// Optical depths of each channel's converter layers.
    pub(crate) depths: Vec<Vec<f64>>,
}

/// Light of a channel, pump and converters together, per unit of its photon current.
#[derive(Debug, Clone, Copy)]
pub(crate) struct ChannelLight {
    pub(crate) lumens: f64,
    pub(crate) xyz: [f64; 3],
}

impl Context<'_> {
    /// Light of each channel per unit of its photon current, at the context's depths.
    pub(crate) fn channel_lights(&self) -> Vec<ChannelLight> {
        let count = self.channels.len();
        let light_of = |channel: usize| {
            let mut only = vec![0.0; count];
            only[channel] = 1.0;
            let mut sum = ChannelLight { lumens: 0.0, xyz: [0.0; 3] };
            for (emitter, photons) in self.channels.photons(&only, &self.depths).into_iter().enumerate() {
                let watts = photons * self.channels.watts_per_photon_current(emitter);
                sum.lumens += watts * self.lights[emitter].ler_lm_per_w;
                for (total, part) in sum.xyz.iter_mut().zip(self.lights[emitter].xyz_per_w) {
                    *total += watts * part;
                }
            }
            sum
        };
        (0..count).map(light_of).collect()
    }

    /// Chromaticity u′v′ of channel photon currents.
    pub(crate) fn white(&self, lights: &[ChannelLight], photons: &[f64]) -> Option<(f64, f64)> {
        let mut xyz = [0.0; 3];
        for (light, photons) in lights.iter().zip(photons) {
            for (total, part) in xyz.iter_mut().zip(light.xyz) {
                *total += photons * part;
            }
        }
        uv_of_xyz(xyz)
    }

    /// Channels that must give light.
    pub(crate) fn lit(demands: &[f64]) -> impl Iterator<Item = usize> + '_ {
        demands.iter().enumerate().filter(|(_, d)| **d > 0.0).map(|(index, _)| index)
    }

    /// Refuses lit channels without EQE.
    pub(crate) fn need_eqe(&self, demands: &[f64]) -> Result<(), DeviceError> {
        for channel in Self::lit(demands) {
            if !self.characteristics[channel].has_eqe() {
                let c = &self.characteristics[channel];
                let said = c.missing().iter().find(|sentence| sentence.contains("package"));
                let missing = said.map_or(
                    "EQE against current density is missing, or it is not said whether it contains the \
                     out-coupling: currents and areas need it",
                    String::as_str,
                );
                return Err(DeviceError::Missing {
                    emitter: c.name().to_owned(),
                    missing: missing.to_owned(),
                });
            }
        }
        Ok(())
    }
}

/// Quantities a form found for a demand, with what was assumed on the way.
#[derive(Debug, Clone)]
pub(crate) struct Realised<Q> {
    pub(crate) quantities: Q,
    pub(crate) assumptions: Vec<String>,
    pub(crate) notices: Vec<String>,
}

impl<Q> Realised<Q> {
    pub(crate) fn new(quantities: Q) -> Realised<Q> {
        Realised { quantities, assumptions: Vec::new(), notices: Vec::new() }
    }
}

/// One driven channel of a made device.
#[derive(Debug, Clone, Default, PartialEq)]
pub(crate) struct ChannelState {
    /// Photon current over the panel (mA/cm²) or the board (mA), before conversion.
    pub(crate) photon_current: f64,
    pub(crate) eqe: Option<f64>,
    pub(crate) current_density_ma_per_cm2: Option<f64>,
    pub(crate) voltage_v: Option<f64>,
    pub(crate) area_share: Option<f64>,
    /// Lit area on which the radiant exitance is counted, in the unit of the basis.
    pub(crate) lit_area: Option<f64>,
    /// Electrical power, W/m² or W.
    pub(crate) electrical_w: Option<f64>,
}

/// What a made device gives.
#[derive(Debug, Clone)]
pub(crate) struct States {
    pub(crate) channels: Vec<ChannelState>,
    /// Whether photon currents are absolute; otherwise only their ratios are known.
    pub(crate) absolute: bool,
    /// Electrical power that belongs to no single channel, W/m² or W.
    pub(crate) shared_electrical_w: Option<f64>,
    pub(crate) notices: Vec<Notice>,
}

/// The face of a build form: from demands to fabrication quantities and back.
pub(crate) trait BuildFace {
    /// Fabrication quantities of this form.
    type Quantities;
    /// Quantities that give channel photon demands, by the form's rule for its freedoms.
    fn realise(
        &self,
        context: &Context<'_>,
        demands: &[f64],
    ) -> Result<Realised<Self::Quantities>, DeviceError>;
    /// What given quantities give.
    fn states(&self, context: &Context<'_>, made: &Self::Quantities) -> Result<States, DeviceError>;
    /// Electrical coupling, for the power model.
    fn coupling(&self, context: &Context<'_>) -> Result<Coupling, DeviceError>;
    /// The freedoms that are left at a given white and level, one sentence each.
    fn freedoms(&self, context: &Context<'_>) -> Vec<String>;
}

/// Checks a fill factor.
pub(crate) fn checked_fill(fill: f64) -> Result<f64, DeviceError> {
    if fill > 0.0 && fill <= 1.0 {
        Ok(fill)
    } else {
        Err(DeviceError::BadSetting {
            what: "the fill factor",
            value: fill,
            expected: "a fraction above 0 and at most 1 is expected",
        })
    }
}
