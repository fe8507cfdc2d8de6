//! One column of quantities linear in the spectrum, and sets of such columns.
//!
//! All sums are plain sums over 380, 381 … 780 nm. Layout, in lanes of eight: scalars, then the test-colour samples
//! as Y | Z | L (16 lanes each, L = 2.718 Y − 0.92 X + 0.202 Z), then the colour evaluation samples as R | G | B
//! of CAT02 on the 10° observer (104 lanes each). Spare lanes repeat the last real sample, so that no lane ever
//! holds a value that cannot occur.

use crate::appearance_model::CAT02;
use crate::chromaticity::Xyz;
use crate::kernel::{Arithmetic, Lanewise, fma};
use crate::observer::Observer;
use crate::spectrum::Spectrum;
use crate::{FIRST_NM, GRID_POINTS, PHOTOPIC_EFFICACY_LM_PER_W, SCOTOPIC_EFFICACY_LM_PER_W, tables};
use std::sync::LazyLock;

/// Where each linear quantity stands in a tensor.
pub(crate) mod column {
    /// Radiant power.
    pub(crate) const POWER: usize = 0;
    /// Power times wavelength (nm).
    pub(crate) const POWER_NM: usize = 1;
    /// Power weighted by V′.
    pub(crate) const SCOTOPIC: usize = 2;
    /// Power weighted by the five α-opic spectra (S, M, L, rhodopic, melanopic).
    pub(crate) const ALPHA_OPIC: usize = 3;
    /// Power weighted by B of IEC 62471.
    pub(crate) const BLUE_LIGHT: usize = 8;
    /// X Y Z of the four observers.
    pub(crate) const XYZ: usize = 9;
    /// Scalars, padded.
    pub(crate) const SCALARS: usize = 24;
    /// Lanes of the 15 test-colour samples.
    pub(crate) const TCS_LANES: usize = 16;
    /// Lanes of the 99 colour evaluation samples.
    pub(crate) const CES_LANES: usize = 104;
    /// First test-colour lane.
    pub(crate) const TCS: usize = SCALARS;
    /// First colour-evaluation lane.
    pub(crate) const CES: usize = TCS + 3 * TCS_LANES;
    /// Length of a tensor.
    pub(crate) const COUNT: usize = CES + 3 * CES_LANES;
}
use column::{CES_LANES, COUNT, TCS_LANES};

/// L = −0.92 X + 2.718 Y + 0.202 Z: CIE 13.3's d, (1.708v + 0.404 − 1.481u)/v, is L/Y.
#[expect(
    clippy::approx_constant,
    reason = "2.718 follows from the coefficients of CIE 13.3; it is not Euler's number"
)]
pub(crate) const ADAPTATION_L: [f64; 3] = [-0.92, 2.718, 0.202];

#[inline(always)]
pub(crate) fn adaptation_l(x: f64, y: f64, z: f64) -> f64 {
    ADAPTATION_L[1] * y + ADAPTATION_L[0] * x + ADAPTATION_L[2] * z
}

/// X, Y, Z of a sample from its lanes.
pub(crate) fn sample_xyz(y: f64, z: f64, l: f64) -> Xyz {
    Xyz { x: (l - ADAPTATION_L[1] * y - ADAPTATION_L[2] * z) / ADAPTATION_L[0], y, z }
}

/// The linear quantities of one spectrum or blend (380–780 nm, 1 nm sums).
#[derive(Clone, PartialEq)]
pub struct Tensor {
    values: Box<[f64; COUNT]>,
}

impl std::fmt::Debug for Tensor {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Tensor")
            .field("radiant_power", &self.radiant_power())
            .field("xyz", &self.xyz(Observer::Cie1931))
            .finish_non_exhaustive()
    }
}

/// Weights: row λ holds what one unit of power at λ adds to every column.
static WEIGHTS: LazyLock<Vec<WeightRow>> = LazyLock::new(|| {
    let mut rows = vec![[0.0; COUNT]; GRID_POINTS];
    let mut set = |at: usize, values: &[f64]| {
        for (row, value) in rows.iter_mut().zip(values) {
            row[at] = *value;
        }
    };
    set(column::POWER, &[1.0; GRID_POINTS]);
    set(column::POWER_NM, &std::array::from_fn::<f64, GRID_POINTS, _>(|i| FIRST_NM + i as f64));
    set(column::SCOTOPIC, &tables::SCOTOPIC.on_grid(0));
    for k in 0..5 {
        set(column::ALPHA_OPIC + k, &tables::ALPHA_OPIC.on_grid(k));
    }
    set(column::BLUE_LIGHT, &tables::BLUE_LIGHT.on_grid(0));
    for observer in Observer::ALL {
        for (k, values) in observer.matching_functions().iter().enumerate() {
            set(observer.column() + k, values);
        }
    }
    let tcs: Vec<Vec<f64>> =
        (0..14).map(|k| tables::TCS_1_TO_14.on_grid(k)).chain([tables::TCS_15.on_grid(0)]).collect();
    let ces: Vec<Vec<f64>> = (0..99).map(|k| tables::CES.on_grid(k)).collect();
    for (i, row) in rows.iter_mut().enumerate() {
        let two = Observer::Cie1931.column();
        let (x, y, z) = (row[two], row[two + 1], row[two + 2]);
        let l = adaptation_l(x, y, z);
        for lane in 0..TCS_LANES {
            let reflectance = tcs[lane.min(14)][i];
            row[column::TCS + lane] = reflectance * y;
            row[column::TCS + TCS_LANES + lane] = reflectance * z;
            row[column::TCS + 2 * TCS_LANES + lane] = reflectance * l;
        }
        let ten = Observer::Cie1964.column();
        let rgb = CAT02.times([row[ten], row[ten + 1], row[ten + 2]]);
        for lane in 0..CES_LANES {
            let reflectance = ces[lane.min(98)][i];
            for (k, value) in rgb.iter().enumerate() {
                row[column::CES + k * CES_LANES + lane] = reflectance * value;
            }
        }
    }
    rows.into_iter().map(WeightRow).collect()
});

/// sums += Σ factor · row.
struct Accumulate<'a, R> {
    factors: &'a [f64],
    rows: &'a [R],
    sums: &'a mut [f64; COUNT],
}

impl<R: Column> Lanewise for Accumulate<'_, R> {
    type Output = ();

    #[inline(always)]
    fn run<const FMA: bool>(self) {
        for (factor, row) in self.factors.iter().zip(self.rows) {
            if *factor != 0.0 {
                let row = row.column();
                for lane in 0..COUNT {
                    self.sums[lane] = fma::<FMA>(*factor, row[lane], self.sums[lane]);
                }
            }
        }
    }
}

/// Access for [`Accumulate`], kept off the public face.
trait Column {
    fn column(&self) -> &[f64; COUNT];
}

impl Column for Tensor {
    #[inline(always)]
    fn column(&self) -> &[f64; COUNT] {
        &self.values
    }
}

/// What one unit of power at one wavelength adds to every column.
struct WeightRow([f64; COUNT]);

impl Column for WeightRow {
    #[inline(always)]
    fn column(&self) -> &[f64; COUNT] {
        &self.0
    }
}

impl Tensor {
    /// The tensor of a spectrum, by way of [`Spectrum::on_colour_grid`].
    pub fn of(spectrum: &Spectrum) -> Tensor {
        Tensor::of_grid(&spectrum.on_colour_grid())
    }

    /// The tensor of power per nm at 380, 381 … 780 nm. Values beyond the 401st are ignored, missing ones are zero.
    pub fn of_grid(power_per_nm: &[f64]) -> Tensor {
        let mut values = Box::new([0.0; COUNT]);
        Arithmetic::Dispatched.run(Accumulate { factors: power_per_nm, rows: &WEIGHTS, sums: &mut values });
        Tensor { values }
    }

    /// The tensor of the same light multiplied by `factor`.
    pub fn scaled(&self, factor: f64) -> Tensor {
        let mut values = self.values.clone();
        for value in values.iter_mut() {
            *value *= factor;
        }
        Tensor { values }
    }

    /// Adds `factor` times another light to this one.
    pub fn add_scaled(&mut self, other: &Tensor, factor: f64) {
        for (value, more) in self.values.iter_mut().zip(other.values.iter()) {
            *value += factor * more;
        }
    }

    /// No light at all.
    pub fn dark() -> Tensor {
        Tensor { values: Box::new([0.0; COUNT]) }
    }

    /// Radiant power inside 380–780 nm, W for W/nm: Σ S.
    pub fn radiant_power(&self) -> f64 {
        self.values[column::POWER]
    }

    /// Power-weighted mean wavelength Σ S λ / Σ S, nm; 1239.842 / this is the mean photon energy in eV that turns
    /// radiant into photon shares. Not finite when there is no power.
    pub fn mean_wavelength_nm(&self) -> f64 {
        self.values[column::POWER_NM] / self.values[column::POWER]
    }

    /// Luminous flux 683 Σ S ȳ, lm for W/nm.
    pub fn luminous_flux_lm(&self) -> f64 {
        PHOTOPIC_EFFICACY_LM_PER_W * self.values[column::XYZ + 1]
    }

    /// Scotopic flux 1700 Σ S V′, scotopic lm for W/nm.
    pub fn scotopic_flux_lm(&self) -> f64 {
        SCOTOPIC_EFFICACY_LM_PER_W * self.values[column::SCOTOPIC]
    }

    /// Luminous efficacy of radiation 683 Σ S ȳ / Σ S, lm/W inside 380–780 nm.
    pub fn ler_lm_per_w(&self) -> f64 {
        self.luminous_flux_lm() / self.radiant_power()
    }

    /// S/P ratio 1700 Σ S V′ / (683 Σ S ȳ).
    pub fn sp_ratio(&self) -> f64 {
        self.scotopic_flux_lm() / self.luminous_flux_lm()
    }

    /// Power weighted by the five α-opic action spectra (S, M, L cone, rhodopic, melanopic), W.
    pub fn alpha_opic_power(&self) -> [f64; 5] {
        std::array::from_fn(|k| self.values[column::ALPHA_OPIC + k])
    }

    /// Power weighted by the blue-light hazard function B of IEC 62471, W.
    pub fn blue_light_power(&self) -> f64 {
        self.values[column::BLUE_LIGHT]
    }

    /// Tristimulus values for an observer, Σ S x̄ …
    pub fn xyz(&self, observer: Observer) -> Xyz {
        let at = observer.column();
        Xyz { x: self.values[at], y: self.values[at + 1], z: self.values[at + 2] }
    }

    /// 2° tristimulus values of the light reflected by the 15 test-colour samples of CIE 13.3.
    pub fn tcs_xyz(&self) -> [Xyz; 15] {
        std::array::from_fn(|i| {
            let y = self.values[column::TCS + i];
            let z = self.values[column::TCS + TCS_LANES + i];
            let l = self.values[column::TCS + 2 * TCS_LANES + i];
            sample_xyz(y, z, l)
        })
    }

    /// CAT02 R G B (of the 10° tristimulus values) of the light reflected by the 99 samples of CIE 224.
    pub fn ces_rgb(&self) -> [[f64; 3]; 99] {
        std::array::from_fn(|i| std::array::from_fn(|k| self.values[column::CES + k * CES_LANES + i]))
    }

    /// Whether there is enough light for ratios of its quantities to mean something: positive power, positive Y of
    /// both reference observers, and positive X + Y + Z.
    pub fn is_light(&self) -> bool {
        let white = self.xyz(Observer::Cie1931);
        let ten = self.xyz(Observer::Cie1964);
        self.radiant_power() > 0.0
            && self.values[column::POWER_NM].is_finite()
            && white.y > 0.0
            && white.x + white.y + white.z > 0.0
            && white.x + 15.0 * white.y + 3.0 * white.z > 0.0
            && ten.y > 0.0
    }

    /// Every linear quantity, in the module's layout.
    pub(crate) fn values(&self) -> &[f64; COUNT] {
        &self.values
    }
}

/// Emitters scaled to unit radiant power (380–780 nm), ready to be blended.
#[derive(Clone, PartialEq, Debug, Default)]
pub struct TensorSet {
    columns: Vec<Tensor>,
}

impl TensorSet {
    /// A set of emitters, each scaled to unit radiant power. One without positive power is kept as it is.
    pub fn new(emitters: &[Tensor]) -> TensorSet {
        let columns = emitters
            .iter()
            .map(|tensor| match tensor.radiant_power() {
                power if power > 0.0 => tensor.scaled(1.0 / power),
                _ => tensor.clone(),
            })
            .collect();
        TensorSet { columns }
    }

    /// Number of emitters.
    pub fn len(&self) -> usize {
        self.columns.len()
    }

    /// Whether the set has no emitter.
    pub fn is_empty(&self) -> bool {
        self.columns.is_empty()
    }

    /// Emitter `i` at unit radiant power. Panics when `i` is not below [`Self::len`].
    pub fn tensor(&self, i: usize) -> Tensor {
        self.columns[i].clone()
    }

    /// The blend Σ shareᵢ · emitterᵢ. Shares beyond the last emitter are ignored, missing ones are zero.
    pub fn blend(&self, shares: &[f64]) -> Tensor {
        self.blend_with(shares, Arithmetic::Dispatched)
    }

    /// [`Self::blend`] with a chosen instruction set.
    pub fn blend_with(&self, shares: &[f64], arithmetic: Arithmetic) -> Tensor {
        let mut blend = Tensor::dark();
        arithmetic.run(Accumulate { factors: shares, rows: &self.columns, sums: &mut blend.values });
        blend
    }

    /// The set of the named emitters, in that order. Panics when an index is not below [`Self::len`].
    pub fn subset(&self, indices: &[usize]) -> TensorSet {
        TensorSet { columns: indices.iter().map(|i| self.columns[*i].clone()).collect() }
    }

    pub(crate) fn columns(&self) -> &[Tensor] {
        &self.columns
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::illuminant::cie_source;

    #[test]
    fn a_blend_of_tensors_is_the_tensor_of_the_blend() {
        let (a, b) =
            (cie_source("FL2").unwrap().on_colour_grid(), cie_source("LED-B3").unwrap().on_colour_grid());
        let set = TensorSet::new(&[Tensor::of_grid(&a), Tensor::of_grid(&b)]);
        let blend = set.blend(&[0.3, 0.7]);
        let (pa, pb) = (a.iter().sum::<f64>(), b.iter().sum::<f64>());
        let mixed: Vec<f64> = a.iter().zip(&b).map(|(x, y)| 0.3 * x / pa + 0.7 * y / pb).collect();
        let direct = Tensor::of_grid(&mixed);
        for (x, y) in blend.values().iter().zip(direct.values()) {
            assert!((x - y).abs() < 1e-14 * (1.0 + y.abs()), "{x} {y}");
        }
        assert!((blend.radiant_power() - 1.0).abs() < 1e-14);
    }

    #[test]
    fn monochromatic_light_at_555_nm_has_683_lm_per_w() {
        // CIE S 010: V(555 nm) = 1.
        let mut grid = vec![0.0; GRID_POINTS];
        grid[175] = 2.0;
        let tensor = Tensor::of_grid(&grid);
        assert!((tensor.ler_lm_per_w() - 683.0).abs() < 0.01);
        assert_eq!(tensor.mean_wavelength_nm(), 555.0);
    }

    #[test]
    fn sample_tristimulus_values_are_recovered_from_their_lanes() {
        let grid = cie_source("D65").unwrap().on_colour_grid();
        let tensor = Tensor::of_grid(&grid);
        let cmf = Observer::Cie1931.matching_functions();
        let tcs = tables::TCS_1_TO_14.on_grid(8);
        let x: f64 = (0..GRID_POINTS).map(|i| grid[i] * tcs[i] * cmf[0][i]).sum();
        assert!((tensor.tcs_xyz()[8].x - x).abs() < 1e-10 * x);
    }

    #[test]
    fn spare_lanes_repeat_a_real_sample() {
        let tensor = Tensor::of_grid(&[1.0; GRID_POINTS]);
        let v = tensor.values();
        assert_eq!(v[column::TCS + 15], v[column::TCS + 14]);
        assert_eq!(v[column::CES + 103], v[column::CES + 98]);
    }
}
