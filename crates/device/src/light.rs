//! The light of one emitter as device work needs it: four numbers for one radiant watt.

use colour::{Observer, Tensor};
use serde::{Deserialize, Serialize};

use crate::out_coupling::{CouplingFactor, Inclusion};
use crate::sheet::Sheet;
use crate::units::watts_per_photon_current;

/// Light of an emitter per radiant watt (380–780 nm), and its mean wavelength.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct EmitterLight {
    /// Luminous efficacy of radiation, lm per radiant W.
    pub ler_lm_per_w: f64,
    /// Mean wavelength `λ̄ = ∫Sλ/∫S`, nm: turns watts into photons.
    pub mean_wavelength_nm: f64,
    /// Tristimulus values X, Y, Z (CIE 1931) of one radiant watt, in any common scale: fixes chromaticity.
    pub xyz_per_w: [f64; 3],
    /// Factor on the photons by a per-wavelength out-coupling, 1 where there is none.
    ///
    /// Already contained in `xyz_per_w` and `mean_wavelength_nm` as a change of shape; the sheet applies
    /// this number in place of its table.
    pub photon_factor: f64,
}

impl EmitterLight {
    /// Light without a per-wavelength out-coupling.
    pub fn new(ler_lm_per_w: f64, mean_wavelength_nm: f64, xyz_per_w: [f64; 3]) -> EmitterLight {
        EmitterLight { ler_lm_per_w, mean_wavelength_nm, xyz_per_w, photon_factor: 1.0 }
    }

    /// Light of a spectrum's tensor: luminous efficacy, mean wavelength, CIE 1931 tristimulus values per watt.
    pub fn of_tensor(tensor: &Tensor) -> EmitterLight {
        let watts = tensor.radiant_power();
        let xyz = tensor.xyz(Observer::Cie1931);
        let xyz_per_w = [xyz.x / watts, xyz.y / watts, xyz.z / watts];
        EmitterLight::new(tensor.ler_lm_per_w(), tensor.mean_wavelength_nm(), xyz_per_w)
    }

    /// Light of samples on the colour grid (380–780 nm, 1 nm), with the sheet's per-wavelength out-coupling.
    ///
    /// A factor table that is not yet in the measured EQE reshapes the spectrum and scales its photons; a
    /// single number leaves the shape alone and is applied by the sheet.
    pub fn with_out_coupling(power_per_nm: &[f64], sheet: &Sheet) -> EmitterLight {
        let applies = sheet.out_coupling.as_ref().filter(|coupling| {
            coupling.inclusion == Inclusion::NotInMeasuredEqe
                && matches!(coupling.factor, CouplingFactor::PerWavelength(_))
        });
        let Some(coupling) = applies else {
            return EmitterLight::of_tensor(&Tensor::of_grid(power_per_nm));
        };
        let wavelengths: Vec<f64> = (0..power_per_nm.len()).map(|k| 380.0 + k as f64).collect();
        let coupled: Vec<f64> =
            wavelengths.iter().zip(power_per_nm).map(|(nm, power)| power * coupling.at_nm(*nm)).collect();
        let photon_factor = coupling.photon_factor(&wavelengths, power_per_nm);
        EmitterLight { photon_factor, ..EmitterLight::of_tensor(&Tensor::of_grid(&coupled)) }
    }

    /// Radiant exitance, W/m², per unit of photon current, mA/cm²: `10·1239.842/λ̄`.
    pub fn watts_per_photon_current(&self) -> f64 {
        watts_per_photon_current(self.mean_wavelength_nm)
    }
}

/// One emitter of a device: its name, its light and its sheet at a working temperature.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct DeviceEmitter {
    /// Name as shown in recipes and messages.
    pub name: String,
    /// Its light per radiant watt.
    pub light: EmitterLight,
    /// Its electrical sheet; may be empty.
    pub sheet: Sheet,
    /// Working temperature, °C; `None` leaves the sheet at the temperature it was measured at.
    #[serde(default)]
    pub temperature_c: Option<f64>,
}

/// Chromaticity u′, v′ (CIE 1976) of a sum of emitters with these radiant powers; `None` for no light.
pub fn u_prime_v_prime<'a>(
    lights: impl IntoIterator<Item = &'a EmitterLight>,
    radiant_w: &[f64],
) -> Option<(f64, f64)> {
    let mut xyz = [0.0; 3];
    for (light, &watts) in lights.into_iter().zip(radiant_w) {
        for (sum, part) in xyz.iter_mut().zip(light.xyz_per_w) {
            *sum += watts * part;
        }
    }
    uv_of_xyz(xyz)
}

/// `u′ = 4X/(X+15Y+3Z)`, `v′ = 9Y/(X+15Y+3Z)`; `None` where the denominator is not above zero.
pub fn uv_of_xyz([x, y, z]: [f64; 3]) -> Option<(f64, f64)> {
    let denominator = x + 15.0 * y + 3.0 * z;
    (denominator > 0.0 && denominator.is_finite()).then(|| (4.0 * x / denominator, 9.0 * y / denominator))
}

/// Distance in u′v′; infinite where either is missing.
pub fn delta_uv_prime(a: Option<(f64, f64)>, b: Option<(f64, f64)>) -> f64 {
    match (a, b) {
        (Some(a), Some(b)) => (a.0 - b.0).hypot(a.1 - b.1),
        _ => f64::INFINITY,
    }
}
