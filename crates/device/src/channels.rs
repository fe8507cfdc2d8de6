//! Driven channels: emitters that take current, each with the converters it pumps.
//!
//! A blend has one share per emitter; a build form drives one channel per pump or plain emitter. Demands are
//! photon currents: electrons that must leave as photons, mA per cm² of panel, or mA for packages.

use serde::{Deserialize, Serialize};

use crate::conversion::Conversion;
use crate::error::DeviceError;
use crate::light::EmitterLight;
use crate::units::PHOTON_ENERGY_EV_NM;

/// What amounts of light are counted over.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub enum Basis {
    /// A square metre of panel: W/m², mA/cm².
    PanelArea,
    /// The whole board: W, mA.
    Whole,
}

impl Basis {
    /// Amperes (per m² on a panel) in one unit of current (mA/cm², mA).
    pub fn amperes_per_unit(self) -> f64 {
        match self {
            Basis::PanelArea => 10.0,
            Basis::Whole => 1e-3,
        }
    }
}

/// The channels of an emitter set.
#[derive(Debug, Clone)]
pub(crate) struct Channels {
    /// Emitter index of each driven channel, ascending.
    pub(crate) driven: Vec<usize>,
    /// The conversion of each channel, if any.
    pub(crate) conversion: Vec<Option<Conversion>>,
    /// Channel of each emitter.
    channel_of: Vec<usize>,
    /// Photons of pump at least needed per photon of this emitter.
    pump_photons_per_photon: Vec<f64>,
    /// Radiant power per unit of photon current of each emitter.
    watts_per_photon_current: Vec<f64>,
}

impl Channels {
    pub(crate) fn new(
        lights: &[EmitterLight],
        conversions: &[Conversion],
        basis: Basis,
    ) -> Result<Channels, DeviceError> {
        let count = lights.len();
        let mut pump_of: Vec<Option<usize>> = vec![None; count];
        let mut taken = vec![false; count];
        let mut pump_photons_per_photon = vec![1.0; count];
        for conversion in conversions {
            conversion.check(count)?;
            let members = conversion.layers.iter().map(|layer| layer.emitter).chain([conversion.pump]);
            for index in members {
                if std::mem::replace(&mut taken[index], true) {
                    return Err(DeviceError::BadSetting {
                        what: "an emitter number used by two conversions",
                        value: index as f64,
                        expected: "each emitter belongs to at most one conversion",
                    });
                }
            }
            for layer in &conversion.layers {
                pump_of[layer.emitter] = Some(conversion.pump);
                pump_photons_per_photon[layer.emitter] = 1.0 / layer.quantum_yield;
            }
        }
        let driven: Vec<usize> = (0..count).filter(|&index| pump_of[index].is_none()).collect();
        let channel_of_driven = |index: usize| driven.iter().position(|&d| d == index);
        let mut channel_of = Vec::with_capacity(count);
        for index in 0..count {
            let owner = pump_of[index].unwrap_or(index);
            channel_of.push(channel_of_driven(owner).ok_or(DeviceError::BadSetting {
                what: "the pump of a converter",
                value: owner as f64,
                expected: "a pump cannot itself be a converter",
            })?);
        }
        let conversion =
            driven.iter().map(|&index| conversions.iter().find(|c| c.pump == index).cloned()).collect();
        let watts_per_photon_current = lights
            .iter()
            .map(|light| basis.amperes_per_unit() * PHOTON_ENERGY_EV_NM / light.mean_wavelength_nm)
            .collect();
        Ok(Channels { driven, conversion, channel_of, pump_photons_per_photon, watts_per_photon_current })
    }

    pub(crate) fn len(&self) -> usize {
        self.driven.len()
    }

    pub(crate) fn emitters(&self) -> usize {
        self.channel_of.len()
    }

    /// Watts of an emitter per unit of photon current.
    pub(crate) fn watts_per_photon_current(&self, emitter: usize) -> f64 {
        self.watts_per_photon_current[emitter]
    }

    /// Photon demand of each channel and optical depths of its layers, for radiant powers of the emitters.
    pub(crate) fn demands(&self, radiant: &[f64]) -> Result<(Vec<f64>, Vec<Vec<f64>>), DeviceError> {
        let photons: Vec<f64> =
            radiant.iter().zip(&self.watts_per_photon_current).map(|(watts, per)| watts / per).collect();
        let mut demands = Vec::with_capacity(self.len());
        let mut depths = Vec::with_capacity(self.len());
        for (&pump, conversion) in self.driven.iter().zip(&self.conversion) {
            match conversion {
                None => {
                    demands.push(photons[pump]);
                    depths.push(Vec::new());
                }
                Some(conversion) => {
                    let bands: Vec<f64> =
                        conversion.layers.iter().map(|layer| photons[layer.emitter]).collect();
                    let loading = conversion.depths_for(photons[pump], &bands)?;
                    demands.push(loading.pump_photons);
                    depths.push(loading.depths);
                }
            }
        }
        Ok((demands, depths))
    }

    /// Photon current of every emitter, for channel photon currents and layer depths.
    pub(crate) fn photons(&self, channel_photons: &[f64], depths: &[Vec<f64>]) -> Vec<f64> {
        let mut photons = vec![0.0; self.emitters()];
        for (channel, &pump) in self.driven.iter().enumerate() {
            let emitted = channel_photons[channel];
            match &self.conversion[channel] {
                None => photons[pump] = emitted,
                Some(conversion) => {
                    let none = Vec::new();
                    let out = conversion.outputs(depths.get(channel).unwrap_or(&none));
                    photons[pump] = emitted * out.leak;
                    for (layer, band) in conversion.layers.iter().zip(out.bands) {
                        photons[layer.emitter] = emitted * band;
                    }
                }
            }
        }
        photons
    }

    /// Channel and least channel demand per radiant watt of an emitter; exact unless light is absorbed again.
    pub(crate) fn least_demand_per_watt(&self, emitter: usize) -> (usize, f64) {
        let per_watt = self.pump_photons_per_photon[emitter] / self.watts_per_photon_current[emitter];
        (self.channel_of[emitter], per_watt)
    }
}
