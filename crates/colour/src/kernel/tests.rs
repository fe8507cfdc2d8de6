//! The fast paths against the plain ones, and gradients against differences.

use super::*;
use crate::cri::{cri_plain, cri_with};
use crate::fidelity::{Fidelity, fidelity_plain, fidelity_with};
use crate::illuminant::{cie_source, cie_source_names};
use crate::locus::cct_duv;

const BOTH: [Arithmetic; 2] = [Arithmetic::Dispatched, Arithmetic::Plain];

fn gaussian(peak_nm: f64, fwhm_nm: f64) -> Tensor {
    let grid: Vec<f64> = (0..401)
        .map(|i| (-4.0 * 2f64.ln() * ((380.0 + f64::from(i) - peak_nm) / fwhm_nm).powi(2)).exp())
        .collect();
    Tensor::of_grid(&grid)
}

/// Six invented emitters.
fn set() -> TensorSet {
    TensorSet::new(&[
        gaussian(447.0, 21.0),
        gaussian(492.0, 33.0),
        gaussian(531.0, 58.0),
        gaussian(566.0, 41.0),
        gaussian(603.0, 77.0),
        gaussian(634.0, 22.0),
    ])
}

/// A deterministic scatter of shares.
fn shares(seed: u64) -> [f64; 6] {
    let mut state = seed.wrapping_mul(0x9e37_79b9_7f4a_7c15) | 1;
    let raw: [f64; 6] = std::array::from_fn(|_| {
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        0.02 + (state >> 11) as f64 / (1u64 << 53) as f64
    });
    let sum: f64 = raw.iter().sum();
    raw.map(|share| share / sum)
}

#[track_caller]
fn close(a: f64, b: f64, what: &str) {
    assert!((a - b).abs() < 1e-9, "{what}: {a} against {b}");
}

fn close_fidelity(a: &Fidelity, b: &Fidelity) {
    close(a.rf, b.rf, "Rf");
    assert_eq!(a.rg.is_some(), b.rg.is_some());
    close(a.rg.unwrap_or(0.0), b.rg.unwrap_or(0.0), "Rg");
    for i in 0..99 {
        close(a.samples[i], b.samples[i], "sample");
    }
    for bin in 0..16 {
        close(a.rf_bins[bin].unwrap_or(0.0), b.rf_bins[bin].unwrap_or(0.0), "Rf,h");
        close(a.rcs_bins[bin].unwrap_or(0.0), b.rcs_bins[bin].unwrap_or(0.0), "Rcs,h");
        close(a.rhs_bins[bin].unwrap_or(0.0), b.rhs_bins[bin].unwrap_or(0.0), "Rhs,h");
    }
}

#[test]
fn every_fast_number_of_the_cie_sources_agrees_with_the_plain_one_to_1e_9() {
    for name in cie_source_names() {
        let light = Tensor::of(&cie_source(name).unwrap());
        let reference = Reference::exact(cct_duv(light.xyz(Observer::Cie1931).uv()).unwrap().cct_k);
        let (plain_cri, plain_fidelity) = (cri_plain(&light, &reference), fidelity_plain(&light, &reference));
        for arithmetic in BOTH {
            let fast = cri_with(&light, &reference, arithmetic);
            close(fast.ra, plain_cri.ra, name);
            for i in 0..15 {
                close(fast.r[i], plain_cri.r[i], name);
            }
            close_fidelity(&fidelity_with(&light, &reference, arithmetic), &plain_fidelity);
        }
    }
}

#[test]
fn the_kernel_agrees_with_the_plain_numbers_of_the_blend_to_1e_9() {
    let set = set();
    for (seed, cct_k) in (1..60).zip([2700.0, 4000.0, 4600.0, 5000.0, 6500.0, 9000.0].into_iter().cycle()) {
        let reference = Reference::exact(cct_k);
        let shares = shares(seed);
        let light = set.blend(&shares);
        let (cri, fidelity) = (cri_plain(&light, &reference), fidelity_plain(&light, &reference));
        for arithmetic in BOTH {
            let kernel = RenderingKernel::with_arithmetic(&set, &reference, arithmetic);
            let (ra, r9) = kernel.ra_r9(&shares);
            close(ra, cri.ra, "Ra");
            close(r9, cri.r[8], "R9");
            close(kernel.rf(&shares), fidelity.rf, "Rf");
            let (rf, rg) = kernel.rf_rg(&shares);
            close(rf, fidelity.rf, "Rf");
            close(rg.unwrap(), fidelity.rg.unwrap(), "Rg");
            for (fast, plain) in kernel.cri(&shares).iter().zip(cri.r) {
                close(*fast, plain, "Ri");
            }
            let mut differences = [0.0; CES_LANES];
            kernel.ces_differences(&shares, &mut differences);
            close(fidelity_of_difference(differences[42]), fidelity.samples[42], "CES43");
            // Scaling all shares changes nothing.
            close(kernel.rf(&shares.map(|share| 7.5 * share)), fidelity.rf, "Rf of scaled shares");
        }
    }
}

/// Slope by extrapolated central differences of the kernel's own values.
fn slope(of: impl Fn(&[f64]) -> f64, at: &[f64; 6], k: usize) -> f64 {
    let difference = |e: f64| {
        let (mut more, mut less) = (*at, *at);
        more[k] += e;
        less[k] -= e;
        (of(&more) - of(&less)) / (2.0 * e)
    };
    // Fourth order: the values bend fast near a small difference.
    (4.0 * difference(2e-5) - difference(4e-5)) / 3.0
}

#[test]
fn gradients_are_the_slopes_of_the_values() {
    let set = set();
    for (seed, cct_k) in (100..120).zip([3000.0, 4400.0, 5600.0].into_iter().cycle()) {
        let reference = Reference::exact(cct_k);
        let at = shares(seed);
        for arithmetic in BOTH {
            let kernel = RenderingKernel::with_arithmetic(&set, &reference, arithmetic);
            let (mut ra, mut r9, mut rf, mut rf_too, mut rg, mut sum) =
                ([0.0; 6], [0.0; 6], [0.0; 6], [0.0; 6], [0.0; 6], [0.0; 6]);
            let values = kernel.ra_r9_gradients(&at, &mut ra, &mut r9);
            assert_eq!(values, kernel.ra_r9(&at));
            close(kernel.rf_gradient(&at, &mut rf), kernel.rf(&at), "Rf");
            let both = kernel.rf_rg_gradients(&at, &mut rf_too, &mut rg);
            close(both.1.unwrap(), kernel.rf_rg(&at).1.unwrap(), "Rg");
            let weights: [f64; 15] = std::array::from_fn(|i| 0.1 * i as f64 - 0.4);
            let weighted =
                |shares: &[f64]| kernel.cri(shares).iter().zip(weights).map(|(r, w)| r * w).sum::<f64>();
            close(kernel.cri_gradient(&at, &weights, &mut sum), weighted(&at), "weighted sum");
            for k in 0..6 {
                let check = |name: &str, got: f64, expected: f64| {
                    assert!(
                        (got - expected).abs() < 2e-6 * (1.0 + expected.abs()),
                        "{name} {k}: {got} {expected}"
                    );
                };
                check("Ra", ra[k], slope(|s| kernel.ra_r9(s).0, &at, k));
                check("R9", r9[k], slope(|s| kernel.ra_r9(s).1, &at, k));
                check("Rf", rf[k], slope(|s| kernel.rf(s), &at, k));
                check("Rf", rf_too[k], rf[k]);
                check("Rg", rg[k], slope(|s| kernel.rf_rg(s).1.unwrap(), &at, k));
                check("ΣwR", sum[k], slope(weighted, &at, k));
            }
        }
    }
}

#[test]
fn another_reference_is_as_good_as_another_kernel() {
    let set = set();
    let mut kernel = RenderingKernel::new(&set, &Reference::exact(3000.0));
    kernel.set_reference(Reference::exact(4200.0));
    let other = RenderingKernel::new(&set, &Reference::exact(4200.0));
    assert_eq!(kernel.ra_r9(&shares(7)), other.ra_r9(&shares(7)));
    assert_eq!(kernel.rf_rg(&shares(7)), other.rf_rg(&shares(7)));
}

#[test]
fn the_kernel_shows_each_emitters_own_quantities() {
    let set = set();
    let kernel = RenderingKernel::new(&set, &Reference::exact(3000.0));
    let emitter = set.tensor(2);
    assert_eq!(kernel.len(), 6);
    assert_eq!(kernel.white2(2), emitter.xyz(Observer::Cie1931).to_array());
    assert_eq!(kernel.tcs_xyz(2), emitter.tcs_xyz());
    assert_eq!(kernel.ces_rgb(2)[5], emitter.ces_rgb()[5][0]);
    assert_eq!(kernel.tcs_lanes(2)[15], kernel.tcs_lanes(2)[14]);
}
