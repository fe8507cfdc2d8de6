//! One emitter's spectrum as numbers.

use super::ContentKey;
use crate::state::mixing::kinds::Weights;
use colour::appearance::Srgb;
use colour::spectrum::Features;
use colour::{Observer, Spectrum, Tensor, UvPrime, appearance};
use project::{Correction, Emitter};

/// The light of one emitter, scaled to one watt inside 380–780 nm.
#[derive(Debug, Clone)]
pub struct Light {
    /// The key it is remembered by.
    pub(crate) key: u64,
    /// The spectrum after corrections, in the import's own scale.
    pub spectrum: Spectrum,
    /// Power per nm at 380, 381 … 780 nm, of one watt.
    pub curve: Vec<f64>,
    /// Greatest value of the curve.
    pub curve_peak: f64,
    /// The linear quantities of one watt.
    pub tensor: Tensor,
    /// CIE 1931 tristimulus values of one watt.
    pub xyz: [f64; 3],
    /// The same with the curve moved by +1 nm.
    pub xyz_shifted: [f64; 3],
    /// Peak, width and centroid.
    pub features: Features,
    /// Chromaticity.
    pub uv_prime: UvPrime,
    /// Luminous efficacy and mean wavelength: what a share counts for in each kind.
    pub weights: Weights,
    /// Part of the measured power that lies outside 380–780 nm.
    pub outside: f64,
    /// What a screen shows for it.
    pub srgb: Srgb,
    /// What is doubtful about the spectrum, one sentence each.
    pub cautions: Vec<String>,
}

impl Light {
    /// The numbers of a spectrum; `None` when it has no positive light inside 380–780 nm.
    pub(crate) fn of(spectrum: Spectrum, key: u64) -> Option<Self> {
        let grid = spectrum.on_colour_grid();
        let whole = Tensor::of_grid(&grid);
        if !whole.is_light() {
            return None;
        }
        let watts = whole.radiant_power();
        let tensor = whole.scaled(1.0 / watts);
        let curve: Vec<f64> = grid.iter().map(|v| v / watts).collect();
        let moved = spectrum.wavelengths_nm().iter().map(|w| w + 1.0).collect();
        let shifted = Spectrum::new(moved, spectrum.values().to_vec()).ok()?;
        let shifted = Tensor::of(&shifted);
        let shifted = shifted.scaled(1.0 / shifted.radiant_power());
        let xyz = tensor.xyz(Observer::Cie1931);
        Some(Self {
            key,
            curve_peak: curve.iter().copied().fold(0.0, f64::max),
            xyz: xyz.to_array(),
            xyz_shifted: shifted.xyz(Observer::Cie1931).to_array(),
            features: spectrum.features(),
            uv_prime: xyz.uv_prime(),
            weights: Weights {
                lm_per_w: tensor.ler_lm_per_w(),
                mean_wavelength_nm: tensor.mean_wavelength_nm(),
            },
            outside: spectrum.share_outside_colour_range(),
            srgb: appearance::of_light(&tensor),
            cautions: spectrum.cautions(),
            curve,
            tensor,
            spectrum,
        })
    }
}

/// The key of an emitter's light: its samples and the corrections in force.
pub(crate) fn content_key(emitter: &Emitter) -> u64 {
    let mut key = ContentKey::new();
    key.numbers(&emitter.import.wavelengths_nm);
    key.numbers(&emitter.import.power_per_nm);
    for step in emitter.corrections.iter().filter(|step| step.on) {
        match step.correction {
            Correction::SubtractDark { level } => {
                key.word(1);
                key.number(level);
            }
            Correction::RemoveNegatives => key.word(2),
            Correction::Crop { first_nm, last_nm } => {
                key.word(3);
                key.numbers(&[first_nm, last_nm]);
            }
            Correction::Shift { by_nm } => {
                key.word(4);
                key.number(by_nm);
            }
        }
    }
    key.0
}
