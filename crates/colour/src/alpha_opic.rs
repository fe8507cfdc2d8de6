//! α-opic quantities of CIE S 026: how a light acts on the five photoreceptor types.
//!
//! These numbers describe a spectrum. They are no claim about health, sleep or comfort.

use crate::illuminant::cie_source;
use crate::tensor::Tensor;
use serde::{Deserialize, Serialize};
use std::sync::LazyLock;

/// One number for each photoreceptor type.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize, Deserialize)]
pub struct AlphaOpic {
    /// S cones.
    pub s_cone: f64,
    /// M cones.
    pub m_cone: f64,
    /// L cones.
    pub l_cone: f64,
    /// Rods (rhodopic).
    pub rhodopic: f64,
    /// Intrinsically photosensitive retinal ganglion cells (melanopic).
    pub melanopic: f64,
}

impl AlphaOpic {
    fn from_array([s_cone, m_cone, l_cone, rhodopic, melanopic]: [f64; 5]) -> AlphaOpic {
        AlphaOpic { s_cone, m_cone, l_cone, rhodopic, melanopic }
    }

    /// S, M, L cone, rhodopic, melanopic.
    pub fn to_array(self) -> [f64; 5] {
        [self.s_cone, self.m_cone, self.l_cone, self.rhodopic, self.melanopic]
    }
}

/// The five efficacies of D65, mW/lm.
static D65: LazyLock<[f64; 5]> = LazyLock::new(|| {
    let d65 = cie_source("D65").expect("D65 is an embedded table");
    luminous_ratios(&Tensor::of(&d65))
});

fn luminous_ratios(light: &Tensor) -> [f64; 5] {
    let flux = light.luminous_flux_lm();
    light.alpha_opic_power().map(|power| 1000.0 * power / flux)
}

/// α-opic efficacy of luminous radiation, mW/lm: Σ S sα / (683 Σ S ȳ).
///
/// *Source:* CIE S 026/E:2018; D65 gives 0.8173, 1.4558, 1.6289, 1.4497, 1.3262.
pub fn alpha_opic_efficacy_mw_per_lm(light: &Tensor) -> AlphaOpic {
    AlphaOpic::from_array(luminous_ratios(light))
}

/// α-opic daylight (D65) efficacy ratio: the efficacy over that of D65.
///
/// *Source:* CIE S 026/E:2018.
pub fn daylight_efficacy_ratio(light: &Tensor) -> AlphaOpic {
    let ratios = luminous_ratios(light);
    AlphaOpic::from_array(std::array::from_fn(|k| ratios[k] / D65[k]))
}

/// Melanopic daylight (D65) efficacy ratio alone.
pub fn melanopic_der(light: &Tensor) -> f64 {
    luminous_ratios(light)[4] / D65[4]
}

/// α-opic equivalent daylight (D65) illuminance, lx, of an illuminance at the eye, lx: ratio × illuminance.
pub fn equivalent_daylight_illuminance_lx(light: &Tensor, illuminance_lx: f64) -> AlphaOpic {
    AlphaOpic::from_array(daylight_efficacy_ratio(light).to_array().map(|ratio| ratio * illuminance_lx))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn daylight_is_its_own_measure() {
        let d65 = Tensor::of(&cie_source("D65").unwrap());
        for ratio in daylight_efficacy_ratio(&d65).to_array() {
            assert!((ratio - 1.0).abs() < 1e-12);
        }
        let edi = equivalent_daylight_illuminance_lx(&d65, 250.0);
        assert!((edi.melanopic - 250.0).abs() < 1e-9);
    }
}
