//! Physical constants behind the sheet formulas.
//!
//! Exact values of the 2019 SI (CODATA 2018), so no uncertainty enters from here.

/// Photon energy times wavelength, eV·nm: `h·c/e`.
///
/// *Source*: SI 2019 defining constants.
pub const PHOTON_ENERGY_EV_NM: f64 = 1_239.841_984_332_002_8;

/// Elementary charge, coulomb. *Source*: SI 2019 defining constant.
pub const ELEMENTARY_CHARGE_C: f64 = 1.602_176_634e-19;

/// Amperes per square metre in one milliampere per square centimetre.
pub const A_PER_M2_IN_MA_PER_CM2: f64 = 10.0;

/// Photons per second and square metre carried by one unit of photon current (mA/cm² of electrons that
/// would emit one photon each): `10/e`.
pub const PHOTONS_PER_S_M2_IN_MA_PER_CM2: f64 = A_PER_M2_IN_MA_PER_CM2 / ELEMENTARY_CHARGE_C;

/// Radiant exitance, W/m², of one unit of photon current (mA/cm²) at a mean wavelength in nm:
/// `10·1239.842/λ̄`.
pub fn watts_per_photon_current(mean_wavelength_nm: f64) -> f64 {
    A_PER_M2_IN_MA_PER_CM2 * PHOTON_ENERGY_EV_NM / mean_wavelength_nm
}
