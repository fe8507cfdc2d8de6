//! Planckian and CIE daylight spectra, and the CIE's published sources.

use crate::spectrum::Spectrum;
use crate::{FIRST_NM, GRID_POINTS, SECOND_RADIATION_CONSTANT_M_K, tables};
use std::sync::LazyLock;

/// Spectral concentration of a full radiator, relative to its value at 560 nm.
///
/// (λ/560)⁻⁵ · (exp(c₂/560T) − 1)/(exp(c₂/λT) − 1), c₂ = 1.4388e-2 m·K.
/// *Units:* nm, K. *Valid range:* λ, T above zero. *Source:* Planck; CIE 15.
pub fn planckian_relative(nm: f64, temperature_k: f64) -> f64 {
    let scale = SECOND_RADIATION_CONSTANT_M_K * 1e9 / temperature_k;
    (nm / 560.0).powi(-5) * (scale / 560.0).exp_m1() / (scale / nm).exp_m1()
}

/// Spectral exitance of a full radiator, W·m⁻²·nm⁻¹: c₁ λ⁻⁵/(exp(c₂/λT) − 1).
///
/// *Units:* nm, K. *Source:* Planck; c₁ = 2πhc² of CODATA 2018, c₂ = 1.4388e-2 m·K as all colorimetric Planckians here.
pub fn planckian_exitance_w_per_m2_nm(nm: f64, temperature_k: f64) -> f64 {
    const C1_W_M2: f64 = 3.741_771_852e-16;
    let metres = nm * 1e-9;
    let exponent = SECOND_RADIATION_CONSTANT_M_K / (metres * temperature_k);
    C1_W_M2 * metres.powi(-5) / exponent.exp_m1() * 1e-9
}

/// Planckian spectrum at 380, 381 … 780 nm, relative to 560 nm.
pub fn planckian_grid(temperature_k: f64) -> Vec<f64> {
    (0..GRID_POINTS).map(|i| planckian_relative(FIRST_NM + i as f64, temperature_k)).collect()
}

/// Which of the two published polynomials gives the daylight locus.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum DaylightBranch {
    /// 4000–7000 K.
    Low,
    /// Above 7000 K to 25 000 K.
    High,
}

impl DaylightBranch {
    pub(crate) fn of(cct_k: f64) -> DaylightBranch {
        if cct_k <= 7000.0 { DaylightBranch::Low } else { DaylightBranch::High }
    }
}

/// Chromaticity x, y of CIE daylight.
///
/// 4000–7000 K: x = −4.6070e9/T³ + 2.9678e6/T² + 99.11/T + 0.244063; above, to 25 000 K: x = −2.0064e9/T³ +
/// 1.9018e6/T² + 247.48/T + 0.237040; y = −3x² + 2.870x − 0.275. *Source:* CIE 15.
pub fn daylight_xy(cct_k: f64) -> crate::Xy {
    daylight_xy_on(cct_k, DaylightBranch::of(cct_k))
}

fn daylight_xy_on(t: f64, branch: DaylightBranch) -> crate::Xy {
    let x = match branch {
        DaylightBranch::Low => 0.244063 + 99.11 / t + 2.9678e6 / (t * t) - 4.6070e9 / (t * t * t),
        DaylightBranch::High => 0.237040 + 247.48 / t + 1.9018e6 / (t * t) - 2.0064e9 / (t * t * t),
    };
    crate::Xy { x, y: -3.0 * x * x + 2.870 * x - 0.275 }
}

/// Daylight components on the colour grid (S0, S1, S2; linear between the 5 nm rows).
static DAYLIGHT_GRID: LazyLock<[Vec<f64>; 3]> =
    LazyLock::new(|| std::array::from_fn(|k| tables::DAYLIGHT.on_grid(k)));

/// CIE daylight spectrum at 380, 381 … 780 nm, 100 at 560 nm.
///
/// S = S0 + M1·S1 + M2·S2, M1 = (−1.3515 − 1.7703x + 5.9114y)/q, M2 = (0.0300 − 31.4424x + 30.0717y)/q,
/// q = 0.0241 + 0.2562x − 0.7341y; M1, M2 not rounded, S0–S2 linear between 5 nm rows.
/// *Valid range:* 4000–25 000 K. *Source:* CIE 15.
pub fn daylight_grid(cct_k: f64) -> Vec<f64> {
    daylight_grid_on(cct_k, DaylightBranch::of(cct_k))
}

pub(crate) fn daylight_grid_on(cct_k: f64, branch: DaylightBranch) -> Vec<f64> {
    let crate::Xy { x, y } = daylight_xy_on(cct_k, branch);
    let q = 0.0241 + 0.2562 * x - 0.7341 * y;
    let m1 = (-1.3515 - 1.7703 * x + 5.9114 * y) / q;
    let m2 = (0.0300 - 31.4424 * x + 30.0717 * y) / q;
    let [s0, s1, s2] = &*DAYLIGHT_GRID;
    (0..GRID_POINTS).map(|i| s0[i] + m1 * s1[i] + m2 * s2[i]).collect()
}

fn source_tables() -> [&'static tables::Table; 5] {
    [
        &tables::SOURCES_A_C_D,
        &tables::SOURCES_FL,
        &tables::SOURCES_FL3,
        &tables::SOURCES_HP,
        &tables::SOURCES_LED,
    ]
}

/// Names of the 47 embedded CIE sources (A, C, D50 … FL1 … FL3.15, HP1 … LED-V2).
pub fn cie_source_names() -> Vec<&'static str> {
    source_tables().iter().flat_map(|table| table.names.iter().map(String::as_str)).collect()
}

/// A CIE source by its name, as tabulated at 5 nm. None for a name not in [`cie_source_names`].
///
/// *Source:* CIE 15 (A–D75 from 300 nm, the others 380–780 nm).
pub fn cie_source(name: &str) -> Option<Spectrum> {
    source_tables().iter().find_map(|table| {
        let k = table.names.iter().position(|candidate| candidate == name)?;
        Spectrum::new(table.wavelengths_nm.clone(), table.columns[k].clone()).ok()
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn daylight_is_100_at_560_nm_and_close_to_the_tabulated_d65() {
        // CIE 15: D65 is daylight of 6500 K × 1.4388/1.4380, M1 and M2 rounded to three decimals.
        let grid = daylight_grid(6500.0 * 1.4388 / 1.4380);
        let table = cie_source("D65").unwrap().on_colour_grid();
        assert!((grid[180] - 100.0).abs() < 1e-9);
        for (a, b) in grid.iter().zip(&table) {
            assert!((a - b).abs() < 0.06, "{a} {b}");
        }
    }

    #[test]
    fn planckian_matches_illuminant_a() {
        // CIE 15: illuminant A = 100 (560/λ)⁵ (exp(1.435e7/(2848·560)) − 1)/(exp(1.435e7/(2848 λ)) − 1), which is
        // the radiator of 2848 K × 1.4388/1.435 under today's constant.
        let grid = planckian_grid(2848.0 * 1.4388 / 1.435);
        let a = cie_source("A").unwrap().on_colour_grid();
        for i in (0..GRID_POINTS).step_by(5) {
            assert!(
                (100.0 * grid[i] - a[i]).abs() < 1e-3 * (1.0 + a[i] / 100.0),
                "{i}: {} {}",
                100.0 * grid[i],
                a[i]
            );
        }
    }

    #[test]
    fn there_are_47_sources() {
        assert_eq!(cie_source_names().len(), 47);
        assert!(cie_source("FL3.15").is_some() && cie_source("F2").is_none());
    }
}
