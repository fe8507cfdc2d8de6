//! Blue-light hazard efficacy: an indicative figure, never a verdict.

use crate::tensor::Tensor;

/// What must stand beside every blue-light figure.
pub const BLUE_LIGHT_CAUTION: &str = "Indicative figure from a spectrum; it is no risk-group classification. That needs \
     measurement of the finished product, at the distance and field of view of the standard, by a competent \
     (accredited) laboratory (IEC 62471, IEC TR 62778).";

/// Blue-light hazard efficacy of luminous radiation K_B,v = Σ S B / (683 Σ S ȳ), W/lm.
///
/// B is zero above 700 nm (outside the standard's range). *Source:* IEC 62471:2006 Table 4.2.
/// Read with [`BLUE_LIGHT_CAUTION`].
pub fn blue_light_efficacy_w_per_lm(light: &Tensor) -> f64 {
    light.blue_light_power() / light.luminous_flux_lm()
}

/// Blue-light weighted radiance of a uniform surface, W·m⁻²·sr⁻¹: K_B,v × luminance (cd/m²).
///
/// Read with [`BLUE_LIGHT_CAUTION`].
pub fn blue_light_radiance_w_per_m2_sr(light: &Tensor, luminance_cd_per_m2: f64) -> f64 {
    blue_light_efficacy_w_per_lm(light) * luminance_cd_per_m2
}
