//! The three kinds of share, and the change from one to another.
//!
//! Reading one kind as another is the costliest mistake of the trade: for the three-Gaussian 4000 K white of
//! the tests it moves the white by Δu′v′ 0.04–0.06 (luminous for radiant) or 0.013 (photon for radiant).

use serde::{Deserialize, Serialize};

use crate::error::DeviceError;
use crate::light::EmitterLight;

/// What a share is a share of.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum ShareKind {
    /// Of radiant power: watts.
    #[default]
    Radiant,
    /// Of luminous flux: lumens, `∝ P·LER`.
    Luminous,
    /// Of emitted photons: `∝ P·λ̄`.
    Photon,
}

impl ShareKind {
    /// How much of this kind one radiant watt of the light carries, up to a common factor.
    pub fn per_radiant_watt(self, light: &EmitterLight) -> f64 {
        match self {
            ShareKind::Radiant => 1.0,
            ShareKind::Luminous => light.ler_lm_per_w,
            ShareKind::Photon => light.mean_wavelength_nm,
        }
    }
}

/// Turns shares of one kind into shares of another; the result sums to 1.
///
/// # Errors
/// A length that does not match, a share that is negative or not finite, nothing above zero, or a share of a
/// kind an emitter cannot have (lumens of an invisible emitter).
pub fn convert(
    shares: &[f64],
    from: ShareKind,
    to: ShareKind,
    lights: &[EmitterLight],
) -> Result<Vec<f64>, DeviceError> {
    check(shares, lights.len())?;
    let mut out = Vec::with_capacity(shares.len());
    for (&share, light) in shares.iter().zip(lights) {
        let per_watt = from.per_radiant_watt(light);
        if share > 0.0 && (per_watt <= 0.0 || !per_watt.is_finite()) {
            return Err(DeviceError::BadSetting {
                what: "the luminous efficacy of an emitter given by its luminous share",
                value: per_watt,
                expected: "an emitter without lumens needs a radiant or photon share",
            });
        }
        out.push(if share > 0.0 { share / per_watt * to.per_radiant_watt(light) } else { 0.0 });
    }
    normalise(&mut out)?;
    Ok(out)
}

/// Checks that shares are usable: right count, finite, not negative, something above zero.
pub(crate) fn check(shares: &[f64], expected: usize) -> Result<(), DeviceError> {
    if shares.len() != expected {
        return Err(DeviceError::LengthMismatch { what: "shares", expected, found: shares.len() });
    }
    for &value in shares {
        if !(value.is_finite() && value >= 0.0) {
            return Err(DeviceError::BadSetting {
                what: "a share",
                value,
                expected: "a number from zero up is expected",
            });
        }
    }
    let total: f64 = shares.iter().sum();
    if total <= 0.0 {
        return Err(DeviceError::BadSetting {
            what: "the sum of the shares",
            value: total,
            expected: "some light is expected",
        });
    }
    Ok(())
}

/// Scales a list to sum 1.
pub(crate) fn normalise(values: &mut [f64]) -> Result<(), DeviceError> {
    let total: f64 = values.iter().sum();
    if !(total.is_finite() && total > 0.0) {
        return Err(DeviceError::BadSetting {
            what: "the sum of the shares",
            value: total,
            expected: "some light is expected",
        });
    }
    values.iter_mut().for_each(|value| *value /= total);
    Ok(())
}
