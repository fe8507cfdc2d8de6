//! Out-coupling: a factor on the light that leaves, and the question whether the EQE already has it.

use serde::{Deserialize, Serialize};

use crate::error::DeviceError;

/// Internal light that leaves a planar organic stack without help, lowest and highest fraction.
///
/// *Source*: Gather and Reineke, J. Photonics for Energy 2015; common practice, user-editable.
pub const PLANAR_OUT_COUPLING: (f64, f64) = (0.20, 0.30);

/// Typical factor on the EQE by an external scattering film or lens array, common practice, user-editable.
pub const EXTERNAL_FILM_FACTOR: f64 = 1.6;

/// Answer to "is the out-coupling already in the measured EQE?".
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
pub enum Inclusion {
    /// Nobody has answered: the EQE cannot be trusted either way and is not computed.
    #[default]
    Unasked,
    /// The EQE was measured with the film or structure in place: the factor is not applied again.
    InMeasuredEqe,
    /// The EQE was measured without it (or is an internal one): the factor is applied.
    NotInMeasuredEqe,
}

/// The factor itself.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub enum CouplingFactor {
    /// The same at every wavelength: a fraction of internal light, or e.g. 1.6 for a film.
    Number(f64),
    /// Rows of wavelength in nm and factor, at least two: straight lines between them, held at the ends.
    PerWavelength(Vec<(f64, f64)>),
}

/// Out-coupling of one emitter.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct OutCoupling {
    /// Factor on the light.
    pub factor: CouplingFactor,
    /// Whether the measured EQE already contains it.
    #[serde(default)]
    pub inclusion: Inclusion,
}

impl OutCoupling {
    /// Checks the numbers.
    ///
    /// # Errors
    /// A factor at or below zero or not finite; fewer than two rows; wavelengths that do not ascend.
    pub fn check(&self) -> Result<(), DeviceError> {
        let above_zero = |value: f64| {
            if value.is_finite() && value > 0.0 {
                Ok(())
            } else {
                Err(DeviceError::BadSetting {
                    what: "the out-coupling factor",
                    value,
                    expected: "a number above zero is expected",
                })
            }
        };
        match &self.factor {
            CouplingFactor::Number(factor) => above_zero(*factor),
            CouplingFactor::PerWavelength(rows) => {
                if rows.len() < 2 {
                    return Err(DeviceError::NotEnoughData {
                        reason: "a per-wavelength out-coupling needs at least two rows".to_owned(),
                    });
                }
                for pair in rows.windows(2) {
                    if pair[1].0.partial_cmp(&pair[0].0) != Some(std::cmp::Ordering::Greater) {
                        return Err(DeviceError::BadSetting {
                            what: "a wavelength of the out-coupling table",
                            value: pair[1].0,
                            expected: "ascending wavelengths are expected",
                        });
                    }
                }
                rows.iter().try_for_each(|row| above_zero(row.1))
            }
        }
    }

    /// The factor at a wavelength, whatever the inclusion.
    pub fn at_nm(&self, wavelength_nm: f64) -> f64 {
        match &self.factor {
            CouplingFactor::Number(factor) => *factor,
            CouplingFactor::PerWavelength(rows) => {
                let upper = rows.partition_point(|row| row.0 <= wavelength_nm);
                match (upper.checked_sub(1).and_then(|k| rows.get(k)), rows.get(upper)) {
                    (Some(a), Some(b)) => a.1 + (b.1 - a.1) * (wavelength_nm - a.0) / (b.0 - a.0),
                    (Some(only), None) | (None, Some(only)) => only.1,
                    (None, None) => 1.0,
                }
            }
        }
    }

    /// Factor on the photon count of a spectrum: `∫S·λ·f / ∫S·λ`.
    ///
    /// *Units and shape*: ascending wavelengths in nm on an even grid, power per nm beside them.
    pub fn photon_factor(&self, wavelengths_nm: &[f64], power_per_nm: &[f64]) -> f64 {
        if let CouplingFactor::Number(factor) = self.factor {
            return factor;
        }
        let (mut with, mut without) = (0.0, 0.0);
        for (&wavelength_nm, &power) in wavelengths_nm.iter().zip(power_per_nm) {
            with += wavelength_nm * power * self.at_nm(wavelength_nm);
            without += wavelength_nm * power;
        }
        if without > 0.0 { with / without } else { 1.0 }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_flat_table_acts_like_the_number() {
        let flat = OutCoupling {
            factor: CouplingFactor::PerWavelength(vec![(400.0, 0.25), (700.0, 0.25)]),
            inclusion: Inclusion::NotInMeasuredEqe,
        };
        let factor = flat.photon_factor(&[450.0, 550.0, 800.0], &[1.0, 3.0, 1.0]);
        assert!((factor - 0.25).abs() < 1e-15);
        flat.check().unwrap();
    }

    #[test]
    fn the_factor_of_a_table_weighs_photons_not_watts() {
        let step = OutCoupling {
            factor: CouplingFactor::PerWavelength(vec![(400.0, 1.0), (800.0, 2.0)]),
            inclusion: Inclusion::NotInMeasuredEqe,
        };
        // Equal watts at 400 and 800 nm: twice as many photons at 800 nm, so (1·1 + 2·2)/3.
        let factor = step.photon_factor(&[400.0, 800.0], &[1.0, 1.0]);
        assert!((factor - 5.0 / 3.0).abs() < 1e-12);
    }

    #[test]
    fn defaults_are_the_common_practice_range_and_film() {
        // Common practice: planar stacks let out 20–30 %, an external film adds about 60 %.
        assert_eq!(PLANAR_OUT_COUPLING, (0.20, 0.30));
        assert!((EXTERNAL_FILM_FACTOR - 1.6).abs() < f64::EPSILON);
    }

    #[test]
    fn an_unusable_factor_is_refused() {
        let zero = OutCoupling { factor: CouplingFactor::Number(0.0), inclusion: Inclusion::Unasked };
        assert!(zero.check().is_err());
        let short = OutCoupling {
            factor: CouplingFactor::PerWavelength(vec![(400.0, 1.0)]),
            inclusion: Inclusion::Unasked,
        };
        assert!(short.check().is_err());
    }
}
