//! Down-conversion: a pump, converters over it in order, and what leaves.
//!
//! Each converter layer absorbs by Beer–Lambert, `α = 1 − exp(−x)` at the pump's light, `x = σ·c·t`, and gives
//! `α·QY` photons back in its own band. Light of a layer nearer the pump crosses the layers outside it and
//! may be absorbed there again, with an optical depth `s·x` (`s` is the outer layer's absorption of that
//! light relative to its absorption of the pump). In watts a photon of mean wavelength λ̄ made from one of
//! λ_p carries `λ_p/λ̄`: the Stokes loss.
//!
//! Single pass outward; the shapes of leaking and converted spectra are taken unchanged by absorption.

use serde::{Deserialize, Serialize};

use crate::error::DeviceError;

/// One converter layer.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct Converter {
    /// Index in the emitter set of the converter's emission.
    pub emitter: usize,
    /// Photons out per photon absorbed, a fraction.
    pub quantum_yield: f64,
    /// Absorption of other converters' light relative to that of the pump: emitter index and ratio; 0 where
    /// not listed. Only layers nearer the pump matter, so layers can change order without editing this.
    pub relative_absorption: Vec<(usize, f64)>,
    /// Optical depth per weight per cent and micrometre, where measured: gives the loading.
    pub depth_per_percent_um: Option<f64>,
    /// Thickness of the layer, µm.
    pub thickness_um: Option<f64>,
}

impl Converter {
    /// Loading in weight per cent that gives an optical depth, where absorption and thickness are known.
    pub fn loading_percent(&self, depth: f64) -> Option<f64> {
        let per_percent = self.depth_per_percent_um? * self.thickness_um?;
        (per_percent > 0.0).then(|| depth / per_percent)
    }

    /// Optical depth at a loading in weight per cent: `x = σ·c·t`.
    pub fn depth(&self, loading_percent: f64) -> Option<f64> {
        Some(self.depth_per_percent_um? * self.thickness_um? * loading_percent)
    }
}

/// A pump and its converter layers, from the pump outward.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct Conversion {
    /// Index in the emitter set of the pump.
    pub pump: usize,
    /// Layers from the pump outward.
    pub layers: Vec<Converter>,
}

/// What leaves, in photons per photon the pump emits.
#[derive(Debug, Clone, PartialEq)]
pub struct Converted {
    /// Pump photons that leak through every layer.
    pub leak: f64,
    /// Photons of each layer's band, in layer order.
    pub bands: Vec<f64>,
}

/// Layer depths and pump photons that give wanted outputs.
#[derive(Debug, Clone, PartialEq)]
pub struct Loading {
    /// Optical depth of each layer at the pump's light.
    pub depths: Vec<f64>,
    /// Pump photons needed, in the unit of the wanted outputs.
    pub pump_photons: f64,
}

impl Conversion {
    /// Checks the numbers of the conversion against a set of `emitters`.
    ///
    /// # Errors
    /// An index outside the set or used twice; a yield outside 0..=1; a negative relative absorption.
    pub fn check(&self, emitters: usize) -> Result<(), DeviceError> {
        let mut seen = vec![false; emitters];
        for index in std::iter::once(self.pump).chain(self.layers.iter().map(|layer| layer.emitter)) {
            match seen.get_mut(index) {
                Some(used) if !*used => *used = true,
                _ => {
                    return Err(DeviceError::BadSetting {
                        what: "an emitter number of a conversion",
                        value: index as f64,
                        expected: "pump and converters must be different emitters of the set",
                    });
                }
            }
        }
        for layer in &self.layers {
            if !(layer.quantum_yield > 0.0 && layer.quantum_yield <= 1.0) {
                return Err(DeviceError::BadSetting {
                    what: "a converter's quantum yield",
                    value: layer.quantum_yield,
                    expected: "a fraction above 0 and at most 1 is expected",
                });
            }
            if let Some(&value) =
                layer.relative_absorption.iter().map(|(_, s)| s).find(|s| !(s.is_finite() && **s >= 0.0))
            {
                return Err(DeviceError::BadSetting {
                    what: "a converter's relative absorption",
                    value,
                    expected: "a number from zero up is expected",
                });
            }
        }
        Ok(())
    }

    fn relative(&self, outer: usize, inner: usize) -> f64 {
        let source = self.layers[inner].emitter;
        let listed = self.layers[outer].relative_absorption.iter();
        listed.filter(|entry| entry.0 == source).map(|entry| entry.1).sum()
    }

    /// What leaves at given optical depths (one a layer), per pump photon.
    pub fn outputs(&self, depths: &[f64]) -> Converted {
        let mut leak = 1.0;
        let mut bands: Vec<f64> = Vec::with_capacity(self.layers.len());
        for (outer, layer) in self.layers.iter().enumerate() {
            let depth = depths.get(outer).copied().unwrap_or(0.0);
            let mut absorbed = -leak * (-depth).exp_m1();
            leak *= (-depth).exp();
            for (inner, band) in bands.iter_mut().enumerate() {
                let crossing = self.relative(outer, inner) * depth;
                absorbed -= *band * (-crossing).exp_m1();
                *band *= (-crossing).exp();
            }
            bands.push(layer.quantum_yield * absorbed);
        }
        Converted { leak, bands }
    }

    /// The depths that give wanted photon outputs.
    ///
    /// Layers are peeled from the outside in: what leaves fixes the outermost depth alone, because its band is
    /// `QY·(leak·(eˣ−1) + Σ inner·(e^{s·x}−1))`, which only rises with x; then the light that reached it is
    /// known, and so on inward. The answer is unique.
    ///
    /// # Errors
    /// [`DeviceError::Unreachable`] where no pump light leaks (the depth would be infinite).
    pub fn depths_for(&self, leak: f64, bands: &[f64]) -> Result<Loading, DeviceError> {
        if bands.len() != self.layers.len() {
            let (expected, found) = (self.layers.len(), bands.len());
            return Err(DeviceError::LengthMismatch { what: "converter bands", expected, found });
        }
        if leak <= 0.0 && bands.iter().any(|band| *band > 0.0) {
            return Err(DeviceError::Unreachable {
                reason:
                    "converted light without any leaking pump light would need an infinitely deep layer: \
                         give the pump a share above zero"
                        .to_owned(),
            });
        }
        let mut leak = leak;
        let mut bands = bands.to_vec();
        let mut depths = vec![0.0; self.layers.len()];
        for outer in (0..self.layers.len()).rev() {
            let wanted = bands[outer] / self.layers[outer].quantum_yield;
            let absorbed = |depth: f64| {
                let inner: f64 = (0..outer)
                    .map(|inner| bands[inner] * (self.relative(outer, inner) * depth).exp_m1())
                    .sum();
                leak * depth.exp_m1() + inner
            };
            let depth =
                if wanted > 0.0 { rising_root(absorbed, wanted, (wanted / leak).ln_1p()) } else { 0.0 };
            depths[outer] = depth;
            leak *= depth.exp();
            for inner in 0..outer {
                bands[inner] *= (self.relative(outer, inner) * depth).exp();
            }
        }
        Ok(Loading { depths, pump_photons: leak })
    }

    /// A lower bound on the pump photons, linear in the outputs: `leak + Σ band/QY`; exact without
    /// re-absorption.
    pub fn least_pump_photons(&self, leak: f64, bands: &[f64]) -> f64 {
        leak + self.layers.iter().zip(bands).map(|(layer, band)| band / layer.quantum_yield).sum::<f64>()
    }
}

/// Root of a rising function that is 0 at 0, known to lie at or below `above`.
fn rising_root(f: impl Fn(f64) -> f64, wanted: f64, above: f64) -> f64 {
    let (mut low, mut high) = (0.0, above);
    if f(high) <= wanted {
        // Without re-absorption the bound is the root itself.
        return high;
    }
    for _ in 0..200 {
        let middle = 0.5 * (low + high);
        if middle <= low || middle >= high {
            break;
        }
        if f(middle) < wanted { low = middle } else { high = middle }
    }
    0.5 * (low + high)
}

/// Watts of converted light per watt of absorbed pump light at quantum yield 1: `λ_p/λ̄`.
pub fn stokes_ratio(pump_nm: f64, converter_nm: f64) -> f64 {
    pump_nm / converter_nm
}

#[cfg(test)]
mod tests {
    use super::*;

    fn layer(emitter: usize, quantum_yield: f64, relative_absorption: &[(usize, f64)]) -> Converter {
        Converter {
            emitter,
            quantum_yield,
            relative_absorption: relative_absorption.to_vec(),
            ..Converter::default()
        }
    }

    #[test]
    fn a_yellow_converter_on_blue_gives_the_worked_powers() {
        // [C20] 450 → 560 nm: quantum .804; α .85, QY .9: converted .615 and leak .150 of the pump's power.
        assert!((stokes_ratio(450.0, 560.0) - 0.804).abs() < 5e-4);
        let conversion = Conversion { pump: 0, layers: vec![layer(1, 0.9, &[])] };
        let out = conversion.outputs(&[-(0.15f64.ln())]);
        assert!((out.leak - 0.150).abs() < 1e-12);
        assert!((out.bands[0] * stokes_ratio(450.0, 560.0) - 0.615).abs() < 5e-4);
    }

    #[test]
    fn order_matters_when_light_is_absorbed_again() {
        let (green, red) = (layer(1, 0.9, &[]), layer(2, 0.8, &[(1, 0.6)]));
        let green_inside = Conversion { pump: 0, layers: vec![green.clone(), red.clone()] };
        let red_inside = Conversion { pump: 0, layers: vec![red, green] };
        let a = green_inside.outputs(&[0.7, 0.5]);
        let b = red_inside.outputs(&[0.5, 0.7]);
        assert!((a.leak - b.leak).abs() < 1e-12, "the leak does not depend on the order");
        // Green behind red: 0.9·(1−e^−0.7) made, e^−0.3 of it passes the red layer.
        assert!((a.bands[0] - 0.9 * (1.0 - (-0.7f64).exp()) * (-0.3f64).exp()).abs() < 1e-12);
        // Red first: green sees what red left of the pump and nothing is absorbed again.
        assert!((b.bands[1] - 0.9 * (-0.5f64).exp() * (1.0 - (-0.7f64).exp())).abs() < 1e-12);
        let total = |out: &Converted| out.bands.iter().sum::<f64>();
        assert!(total(&a) < total(&b), "each further step costs photons");
    }

    #[test]
    fn depths_are_found_again_from_what_leaves() {
        let conversion = Conversion {
            pump: 0,
            layers: vec![
                layer(1, 0.95, &[]),
                layer(2, 0.85, &[(1, 0.4)]),
                layer(3, 0.8, &[(1, 0.2), (2, 0.7)]),
            ],
        };
        let depths = [0.31, 0.9, 0.17];
        let out = conversion.outputs(&depths);
        let bands: Vec<f64> = out.bands.iter().map(|band| band * 3.0).collect();
        let found = conversion.depths_for(out.leak * 3.0, &bands).unwrap();
        for (found, expected) in found.depths.iter().zip(depths) {
            assert!((found - expected).abs() < 1e-12, "{found} {expected}");
        }
        assert!((found.pump_photons - 3.0).abs() < 1e-11);
        assert!(conversion.least_pump_photons(out.leak * 3.0, &bands) <= 3.0);
    }

    #[test]
    fn photons_out_never_exceed_photons_in() {
        let conversion = Conversion { pump: 0, layers: vec![layer(1, 1.0, &[]), layer(2, 1.0, &[(1, 0.5)])] };
        for depth in [0.0, 0.1, 1.0, 10.0] {
            let out = conversion.outputs(&[depth, 0.5 * depth]);
            let total = out.leak + out.bands.iter().sum::<f64>();
            assert!((total - 1.0).abs() < 1e-12, "at yield 1 every photon leaves once: {total}");
        }
    }

    #[test]
    fn loading_and_depth_belong_together() {
        let mut converter = layer(1, 0.9, &[]);
        assert_eq!(converter.loading_percent(1.0), None);
        converter.depth_per_percent_um = Some(0.002);
        converter.thickness_um = Some(50.0);
        assert!((converter.loading_percent(0.8).unwrap() - 8.0).abs() < 1e-12);
        assert!((converter.depth(8.0).unwrap() - 0.8).abs() < 1e-12);
    }

    #[test]
    fn no_leak_is_refused() {
        let conversion = Conversion { pump: 0, layers: vec![layer(1, 0.9, &[])] };
        assert!(matches!(conversion.depths_for(0.0, &[1.0]), Err(DeviceError::Unreachable { .. })));
    }
}
