//! Colour fidelity and gamut: CIE 224:2017 Rf, and TM-30 Rf, Rg and the sixteen hue bins.

use crate::appearance_model::{CAT02, cam02_ucs};
use crate::kernel::{Arithmetic, ces_scored};
use crate::observer::Observer;
use crate::reference::Reference;
use crate::tensor::Tensor;

/// Factor between mean colour difference and fidelity (CIE 224:2017, TM-30-18).
pub(crate) const FIDELITY_FACTOR: f64 = 6.73;
/// Number of colour evaluation samples.
pub const SAMPLES: usize = 99;
/// Number of hue bins.
pub const HUE_BINS: usize = 16;

/// Fidelity, gamut and hue bins of a light.
#[derive(Debug, Clone, PartialEq)]
pub struct Fidelity {
    /// General colour fidelity index Rf, 0..100.
    pub rf: f64,
    /// Gamut index Rg; None when a hue bin holds no sample.
    pub rg: Option<f64>,
    /// Fidelity of each sample, CES 1–99.
    pub samples: [f64; SAMPLES],
    /// Local fidelity Rf,h of each bin; None where the bin is empty.
    pub rf_bins: [Option<f64>; HUE_BINS],
    /// Local chroma shift Rcs,h of each bin in percent; None where the bin is empty.
    pub rcs_bins: [Option<f64>; HUE_BINS],
    /// Local hue shift Rhs,h of each bin (radians for small shifts); None where the bin is empty.
    pub rhs_bins: [Option<f64>; HUE_BINS],
    /// Mean a′, b′ of each bin under the light.
    pub test_means: [Option<[f64; 2]>; HUE_BINS],
    /// Mean a′, b′ of each bin under the reference.
    pub reference_means: [Option<[f64; 2]>; HUE_BINS],
}

/// Fidelity of a (mean) colour difference: 10·ln(1 + exp((100 − 6.73 ΔE′)/10)), never below zero.
pub fn fidelity_of_difference(delta_e: f64) -> f64 {
    let x = (100.0 - FIDELITY_FACTOR * delta_e) / 10.0;
    10.0 * (x.max(0.0) + (-x.abs()).exp().ln_1p())
}

/// CIE 224 / TM-30 numbers of a light against a reference.
///
/// 99 samples, CIE 1964 observer, CAM02-UCS (L_A 100 cd/m², Y_b 20, average surround, D = 1). Bins of 22.5° by
/// reference hue, θⱼ = 11.25° + 22.5°(j−1); with Δ = test − reference bin means and ρ the length of the reference
/// mean: Rcs = (Δa cos θ + Δb sin θ)/ρ, Rhs = (−Δa sin θ + Δb cos θ)/ρ; Rg = 100 × ratio of the polygons of means.
/// *Source:* CIE 224:2017; ANSI/IES TM-30-20.
pub fn fidelity(light: &Tensor, reference: &Reference) -> Fidelity {
    fidelity_with(light, reference, Arithmetic::Dispatched)
}

/// [`fidelity`] with a chosen instruction set.
pub fn fidelity_with(light: &Tensor, reference: &Reference, arithmetic: Arithmetic) -> Fidelity {
    let scored = ces_scored(light, reference, arithmetic);
    let samples = std::array::from_fn(|i| scored.scores[i]);
    scored.bins.finish(scored.rf, samples, scored.bin_scores)
}

/// [`fidelity`] in plain scalar arithmetic with the functions of the standard library: slow, and the yardstick of the
/// fast path.
pub fn fidelity_plain(light: &Tensor, reference: &Reference) -> Fidelity {
    let white = CAT02.times(light.xyz(Observer::Cie1964).to_array());
    let mut differences = [0.0; SAMPLES];
    let mut bins = BinSums::default();
    for (i, rgb) in light.ces_rgb().iter().enumerate() {
        let test = cam02_ucs(std::array::from_fn(|k| rgb[k] / white[k]));
        let of_reference = reference.ces_jab(i);
        let squared: f64 = (0..3).map(|k| (test[k] - of_reference[k]).powi(2)).sum();
        differences[i] = squared.sqrt();
        bins.add(
            reference.hue_bin(i),
            [of_reference[1], of_reference[2]],
            [test[1], test[2]],
            differences[i],
        );
    }
    let rf = fidelity_of_difference(differences.iter().sum::<f64>() / SAMPLES as f64);
    let bin_scores = bins.mean_differences().map(fidelity_of_difference);
    bins.finish(rf, differences.map(fidelity_of_difference), bin_scores)
}

/// Sums per hue bin.
#[derive(Debug, Default, Clone)]
pub(crate) struct BinSums {
    sums: [[f64; 6]; HUE_BINS],
}

impl BinSums {
    #[inline]
    pub(crate) fn add(&mut self, bin: usize, of_reference: [f64; 2], test: [f64; 2], difference: f64) {
        let sums = &mut self.sums[bin & 15];
        for (sum, value) in
            sums.iter_mut().zip([1.0, of_reference[0], of_reference[1], test[0], test[1], difference])
        {
            *sum += value;
        }
    }

    fn mean(&self, bin: usize, k: usize) -> f64 {
        self.sums[bin][k] / self.sums[bin][0]
    }

    fn any_empty(&self) -> bool {
        self.sums.iter().any(|sums| sums[0] == 0.0)
    }

    /// Mean difference of each bin; zero where it is empty.
    #[inline(always)]
    pub(crate) fn mean_differences(&self) -> [f64; HUE_BINS] {
        let mut out = [0.0; HUE_BINS];
        for (mean, sums) in out.iter_mut().zip(&self.sums) {
            if sums[0] > 0.0 {
                *mean = sums[5] / sums[0];
            }
        }
        out
    }

    /// Twice the signed area of the polygon of bin means whose a′ stands at `k`.
    fn area(&self, k: usize) -> f64 {
        (0..HUE_BINS)
            .map(|i| (i, (i + 1) % HUE_BINS))
            .map(|(i, j)| self.mean(i, k) * self.mean(j, k + 1) - self.mean(i, k + 1) * self.mean(j, k))
            .sum()
    }

    /// Rg alone.
    pub(crate) fn gamut(&self) -> Option<f64> {
        (!self.any_empty()).then(|| 100.0 * self.area(3) / self.area(1))
    }

    /// Slopes of Rg over the a′, b′ of any sample of each bin.
    pub(crate) fn gamut_slopes(&self) -> Option<[[f64; 2]; HUE_BINS]> {
        if self.any_empty() {
            return None;
        }
        let scale = 100.0 / self.area(1);
        Some(std::array::from_fn(|i| {
            let (before, after) = ((i + HUE_BINS - 1) % HUE_BINS, (i + 1) % HUE_BINS);
            let per_sample = scale / self.sums[i][0];
            [
                per_sample * (self.mean(after, 4) - self.mean(before, 4)),
                per_sample * (self.mean(before, 3) - self.mean(after, 3)),
            ]
        }))
    }

    pub(crate) fn finish(&self, rf: f64, samples: [f64; SAMPLES], bin_scores: [f64; HUE_BINS]) -> Fidelity {
        let mut out = Fidelity {
            rf,
            rg: self.gamut(),
            samples,
            rf_bins: [None; HUE_BINS],
            rcs_bins: [None; HUE_BINS],
            rhs_bins: [None; HUE_BINS],
            test_means: [None; HUE_BINS],
            reference_means: [None; HUE_BINS],
        };
        for (bin, sums) in self.sums.iter().enumerate() {
            if sums[0] == 0.0 {
                continue;
            }
            let inverse = 1.0 / sums[0];
            let [ra, rb, ta, tb] =
                [sums[1] * inverse, sums[2] * inverse, sums[3] * inverse, sums[4] * inverse];
            let [sin, cos] = BISECTORS[bin];
            let per_length = 1.0 / (ra * ra + rb * rb).sqrt();
            let (da, db) = (ta - ra, tb - rb);
            out.rf_bins[bin] = Some(bin_scores[bin]);
            out.rcs_bins[bin] = Some(100.0 * (da * cos + db * sin) * per_length);
            out.rhs_bins[bin] = Some((db * cos - da * sin) * per_length);
            out.test_means[bin] = Some([ta, tb]);
            out.reference_means[bin] = Some([ra, rb]);
        }
        out
    }
}

/// Sine and cosine of the bins' bisectors, 11.25° + 22.5° j.
static BISECTORS: std::sync::LazyLock<[[f64; 2]; HUE_BINS]> = std::sync::LazyLock::new(|| {
    std::array::from_fn(|j| {
        let (sin, cos) = (11.25 + 22.5 * j as f64).to_radians().sin_cos();
        [sin, cos]
    })
});

#[cfg(test)]
mod tests {
    use super::*;
    use crate::illuminant::planckian_grid;

    #[test]
    fn the_reference_itself_is_faithful_and_shifts_nothing() {
        let light = Tensor::of_grid(&planckian_grid(3000.0));
        let numbers = fidelity(&light, &Reference::exact(3000.0));
        // The softplus of CIE 224 gives 10 ln(1 + e¹⁰) = 100.000454 for no difference at all.
        assert!((numbers.rf - 100.000_454).abs() < 1e-6, "{}", numbers.rf);
        assert!((numbers.rg.unwrap() - 100.0).abs() < 1e-9);
        assert!(numbers.rcs_bins.iter().flatten().all(|shift| shift.abs() < 1e-9));
        assert_eq!(numbers.rcs_bins.iter().flatten().count(), 16);
    }

    #[test]
    fn fidelity_never_falls_below_zero() {
        assert!(fidelity_of_difference(1e4) >= 0.0);
        assert!((fidelity_of_difference(5.0) - 66.353_47).abs() < 1e-2);
    }
}
