//! The reference illuminants of CIE 13.3 and CIE 224 at one CCT, reduced to what their metrics need.

use crate::appearance_model::{CAT02, cam02_ucs};
use crate::chromaticity::Uv;
use crate::illuminant::{DaylightBranch, daylight_grid_on, planckian_grid};
use crate::kernel::Arithmetic;
use crate::observer::Observer;
use crate::tensor::Tensor;
use crate::tensor::column::{CES_LANES, TCS_LANES};

#[path = "reference_table.rs"]
mod table;

/// Both rendering references of one CCT.
///
/// CIE 13.3: Planckian below 5000 K, daylight from 5000 K. CIE 224 / TM-30: Planckian to 4000 K, daylight from
/// 5000 K, between them a linear mix of Planckian(T) and daylight(T), each first scaled to equal Y10.
#[derive(Debug, Clone, PartialEq)]
pub struct Reference {
    pub(crate) cct_k: f64,
    /// u, v of the CIE 13.3 reference (2°).
    pub(crate) white: Uv,
    /// 13·W*(u−u_r) | 13·W*(v−v_r) | W* of the test-colour samples, 16 lanes each.
    pub(crate) tcs_uvw: [f64; 3 * TCS_LANES],
    /// J′ | a′ | b′ of the colour evaluation samples, 104 lanes each.
    pub(crate) ces_jab: Box<[f64; 3 * CES_LANES]>,
    /// Hue bin (0..16) of each colour evaluation sample.
    pub(crate) bins: [u8; CES_LANES],
}

/// Spectrum of the CIE 13.3 reference at 380, 381 … 780 nm (relative).
pub fn cri_reference_grid(cct_k: f64) -> Vec<f64> {
    if cct_k < 5000.0 { planckian_grid(cct_k) } else { daylight_grid_on(cct_k, DaylightBranch::of(cct_k)) }
}

/// Spectrum of the CIE 224 / TM-30 reference at 380, 381 … 780 nm (relative).
pub fn fidelity_reference_grid(cct_k: f64) -> Vec<f64> {
    if cct_k <= 4000.0 {
        planckian_grid(cct_k)
    } else if cct_k >= 5000.0 {
        daylight_grid_on(cct_k, DaylightBranch::of(cct_k))
    } else {
        blended_grid(cct_k)
    }
}

fn blended_grid(cct_k: f64) -> Vec<f64> {
    let (planckian, daylight) = (planckian_grid(cct_k), daylight_grid_on(cct_k, DaylightBranch::Low));
    let ybar = &Observer::Cie1964.matching_functions()[1];
    let y10 = |grid: &[f64]| grid.iter().zip(ybar).map(|(s, y)| s * y).sum::<f64>();
    let weight = (cct_k - 4000.0) / 1000.0;
    let (a, b) = ((1.0 - weight) / y10(&planckian), weight / y10(&daylight));
    planckian.iter().zip(&daylight).map(|(p, d)| a * p + b * d).collect()
}

impl Reference {
    /// Both references of a CCT, from a table over CCT that moves no index by 0.001.
    ///
    /// *Valid range:* 1000–20 000 K; outside, as [`Self::exact`].
    pub fn at(cct_k: f64) -> Reference {
        Reference::at_with(cct_k, Arithmetic::Dispatched)
    }

    /// [`Self::at`] with a chosen instruction set.
    pub fn at_with(cct_k: f64, arithmetic: Arithmetic) -> Reference {
        table::interpolated(cct_k, arithmetic).unwrap_or_else(|| Reference::exact(cct_k))
    }

    /// Both references of a CCT by direct summation.
    ///
    /// *Valid range:* above zero; daylight is defined to 25 000 K.
    pub fn exact(cct_k: f64) -> Reference {
        Reference::of(
            cct_k,
            &Tensor::of_grid(&cri_reference_grid(cct_k)),
            &Tensor::of_grid(&fidelity_reference_grid(cct_k)),
        )
    }

    /// References of given spectra at 380, 381 … 780 nm, for those who want others than the standards' own (sums at a
    /// coarser step, say).
    pub fn of_grids(cct_k: f64, for_cri: &[f64], for_fidelity: &[f64]) -> Reference {
        Reference::of(cct_k, &Tensor::of_grid(for_cri), &Tensor::of_grid(for_fidelity))
    }

    fn of(cct_k: f64, for_cri: &Tensor, for_fidelity: &Tensor) -> Reference {
        let white_xyz = for_cri.xyz(Observer::Cie1931);
        let white = white_xyz.uv();
        let samples = for_cri.tcs_xyz();
        let mut tcs_uvw = [0.0; 3 * TCS_LANES];
        for lane in 0..TCS_LANES {
            let sample = samples[lane.min(14)];
            let uv = sample.uv();
            let w = 25.0 * (100.0 * sample.y / white_xyz.y).cbrt() - 17.0;
            tcs_uvw[lane] = 13.0 * w * (uv.u - white.u);
            tcs_uvw[TCS_LANES + lane] = 13.0 * w * (uv.v - white.v);
            tcs_uvw[2 * TCS_LANES + lane] = w;
        }
        let white_rgb = CAT02.times(for_fidelity.xyz(Observer::Cie1964).to_array());
        let rgb = for_fidelity.ces_rgb();
        let mut ces_jab = Box::new([0.0; 3 * CES_LANES]);
        for lane in 0..CES_LANES {
            let sample = rgb[lane.min(98)];
            let jab = cam02_ucs(std::array::from_fn(|k| sample[k] / white_rgb[k]));
            for k in 0..3 {
                ces_jab[k * CES_LANES + lane] = jab[k];
            }
        }
        let bins = hue_bins(&ces_jab);
        Reference { cct_k, white, tcs_uvw, ces_jab, bins }
    }

    /// CCT of the reference, K.
    pub fn cct_k(&self) -> f64 {
        self.cct_k
    }

    /// Chromaticity of the CIE 13.3 reference (2°).
    pub fn white_uv(&self) -> Uv {
        self.white
    }

    /// J′, a′, b′ of colour evaluation sample `i` (0..99) under the CIE 224 reference.
    pub fn ces_jab(&self, i: usize) -> [f64; 3] {
        std::array::from_fn(|k| self.ces_jab[k * CES_LANES + i])
    }

    /// U*, V*, W* of test-colour sample `i` (0..15) under the CIE 13.3 reference.
    pub fn tcs_uvw(&self, i: usize) -> [f64; 3] {
        std::array::from_fn(|k| self.tcs_uvw[k * TCS_LANES + i])
    }

    /// Hue bin (0..16, 22.5° each, by the reference hue) of colour evaluation sample `i` (0..99).
    pub fn hue_bin(&self, i: usize) -> usize {
        usize::from(self.bins[i])
    }
}

/// Bin of 22.5° by hue angle of the reference a′, b′, without an arctangent.
#[inline(always)]
fn hue_bins(ces_jab: &[f64; 3 * CES_LANES]) -> [u8; CES_LANES] {
    // tan 22.5° and tan 67.5°.
    const LOW: f64 = std::f64::consts::SQRT_2 - 1.0;
    const HIGH: f64 = std::f64::consts::SQRT_2 + 1.0;
    std::array::from_fn(|i| {
        let (a, b) = (ces_jab[CES_LANES + i], ces_jab[2 * CES_LANES + i]);
        let lower = b < 0.0;
        let (a, b) = if lower { (-a, -b) } else { (a, b) };
        let left = a < 0.0;
        // Within its quadrant the hue runs from the x axis to the y axis.
        let (x, y) = if left { (b, -a) } else { (a, b) };
        u8::from(lower) * 8
            + u8::from(left) * 4
            + u8::from(y >= LOW * x)
            + u8::from(y >= x)
            + u8::from(y >= HIGH * x)
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn hue_bins_are_22_5_degrees_wide() {
        let mut jab = [0.0; 3 * CES_LANES];
        for i in 0..CES_LANES {
            let hue = (i as f64 * 3.41 + 0.3).to_radians();
            (jab[CES_LANES + i], jab[2 * CES_LANES + i]) = (20.0 * hue.cos(), 20.0 * hue.sin());
        }
        let bins = hue_bins(&jab);
        for i in 0..CES_LANES {
            assert_eq!(usize::from(bins[i]), ((i as f64 * 3.41 + 0.3) / 22.5) as usize, "{i}");
        }
    }

    #[test]
    fn the_cri_reference_changes_at_5000_k_and_the_fidelity_reference_does_not_jump() {
        assert_eq!(cri_reference_grid(4999.999), planckian_grid(4999.999));
        assert_ne!(cri_reference_grid(5000.0), planckian_grid(5000.0));
        let jump = |a: f64, b: f64| {
            let (a, b) = (Reference::exact(a), Reference::exact(b));
            a.ces_jab.iter().zip(b.ces_jab.iter()).map(|(x, y)| (x - y).abs()).fold(0.0, f64::max)
        };
        assert!(jump(3999.999, 4000.001) < 1e-4);
        assert!(jump(4999.999, 5000.001) < 1e-4);
    }
}
