//! Worked values of colour that were computed independently (another language, other code) under the conventions of
//! tests/data/golden/README.md; the tolerance is the last digit given.

use colour::illuminant::cie_source;
use colour::locus::{cct_duv, duv_by_polynomial, planckian_uv, uv_at};
use colour::measure::{Measurement, measure};
use colour::photobiology::blue_light_radiance_w_per_m2_sr;
use colour::shapes::Shape;
use colour::{Observer, Tensor, TensorSet, UvPrime};

fn source(name: &str) -> Measurement {
    measure(&Tensor::of(&cie_source(name).expect("an embedded source")))
}

fn gaussian(peak_nm: f64, fwhm_nm: f64) -> Vec<f64> {
    Shape::GaussianNm { peak_nm, fwhm_nm }.colour_grid().expect("a valid shape")
}

#[track_caller]
fn check(what: &str, got: f64, expected: f64, tolerance: f64) {
    assert!((got - expected).abs() <= tolerance, "{what}: {got}, worked value {expected}");
}

/// Gaussians 455/25, 530/60, 612/80 nm mixed to a CCT at Duv 0: shares and the blend's spectrum.
fn mix(cct_k: f64) -> ([f64; 3], Vec<f64>) {
    let grids = [gaussian(455.0, 25.0), gaussian(530.0, 60.0), gaussian(612.0, 80.0)];
    let set = TensorSet::new(&grids.clone().map(|grid| Tensor::of_grid(&grid)));
    let target = uv_at(cct_k, 0.0).xy().xyz(1.0).to_array();
    let columns: Vec<[f64; 3]> = (0..3).map(|i| set.tensor(i).xyz(Observer::Cie1931).to_array()).collect();
    // Cramer's rule.
    let determinant = |m: [[f64; 3]; 3]| {
        m[0][0] * (m[1][1] * m[2][2] - m[1][2] * m[2][1]) - m[1][0] * (m[0][1] * m[2][2] - m[0][2] * m[2][1])
            + m[2][0] * (m[0][1] * m[1][2] - m[0][2] * m[1][1])
    };
    let all = [columns[0], columns[1], columns[2]];
    let mut shares = [0.0; 3];
    for i in 0..3 {
        let mut replaced = all;
        replaced[i] = target;
        shares[i] = determinant(replaced) / determinant(all);
    }
    let sum: f64 = shares.iter().sum();
    let shares = shares.map(|share| share / sum);
    let grid = (0..401).map(|k| (0..3).map(|i| shares[i] * grids[i][k]).sum()).collect();
    (shares, grid)
}

#[test]
fn efficacies_of_gaussians_and_equal_energy() {
    for (peak_nm, fwhm_nm, lm_per_w) in [(450.0, 20.0, 27.6), (530.0, 30.0, 558.7), (620.0, 30.0, 265.6)] {
        check("LER", Tensor::of_grid(&gaussian(peak_nm, fwhm_nm)).ler_lm_per_w(), lm_per_w, 0.05);
    }
    check("LER of equal energy", Tensor::of_grid(&[1.0; 401]).ler_lm_per_w(), 182.0, 0.05);
}

#[test]
fn daylight_and_incandescence() {
    let (a, d65) = (source("A"), source("D65"));
    // CIE 15 prints four digits of 5 nm sums; 1 nm sums lie a little off.
    check("D65 x", d65.x, 0.3127, 1e-4);
    check("D65 y", d65.y, 0.3290, 1e-4);
    check("D65 CCT", d65.cct_k.expect("CCT"), 6501.9, 0.05);
    check("D65 Duv", d65.duv.expect("Duv"), 0.0032, 5e-5);
    check("A CCT", a.cct_k.expect("CCT"), 2855.7, 0.05);
    check("A Duv", a.duv.expect("Duv"), 0.0, 5e-5);
    check("A S/P", a.sp_ratio, 1.412, 5e-4);
    check("D65 S/P", d65.sp_ratio, 2.465, 5e-4);
    check("A melanopic DER", a.melanopic_der, 0.4958, 5e-5);
    check("A K_B,v", a.kbv_w_per_lm, 3.07e-4, 5e-7);
    check("D65 K_B,v", d65.kbv_w_per_lm, 9.85e-4, 5e-7);
}

#[test]
fn duv_by_the_polynomial_of_ohno_2014() {
    check("Duv", duv_by_polynomial(uv_at(4000.0, -0.01)), -0.0100, 5e-5);
}

#[test]
fn rendering_of_fluorescent_sources() {
    let (fl2, fl11) = (source("FL2"), source("FL11"));
    check("FL2 Ra", fl2.ra.expect("Ra"), 64.27, 0.005);
    check("FL2 R9", fl2.r9().expect("R9"), -83.3, 0.05);
    check("FL2 Rf", fl2.rf.expect("Rf"), 70.21, 0.005);
    check("FL11 Ra", fl11.ra.expect("Ra"), 82.88, 0.005);
    check("FL11 R9", fl11.r9().expect("R9"), 25.1, 0.05);
}

#[test]
fn three_gaussians_at_4000_k() {
    let (shares, grid) = mix(4000.0);
    for (share, expected) in shares.into_iter().zip([0.171, 0.307, 0.522]) {
        check("share", share, expected, 5e-4);
    }
    let got = measure(&Tensor::of_grid(&grid));
    check("CCT", got.cct_k.expect("CCT"), 4000.0, 1e-6);
    check("LER", got.ler_lm_per_w, 336.9, 0.05);
    check("Ra", got.ra.expect("Ra"), 91.65, 0.005);
    check("R9", got.r9().expect("R9"), 49.1, 0.05);
    check("Rf", got.rf.expect("Rf"), 88.20, 0.005);
    check("Rg", got.rg.expect("Rg"), 99.9, 0.05);
    check("Rcs,h1", got.rcs_bins.expect("bins")[0].expect("bin 1"), -6.1, 0.05);
    check("melanopic DER", got.melanopic_der, 0.634, 5e-4);
    check("K_B,v", got.kbv_w_per_lm, 4.89e-4, 5e-7);
    let at_3000_cd_per_m2 = blue_light_radiance_w_per_m2_sr(&Tensor::of_grid(&grid), 3000.0);
    check("L_B", at_3000_cd_per_m2, 1.5, 0.05);
}

/// The switch of CIE 13.3 at 5000 K: 92.18 / 61.4 with the Planckian, 91.90 / 60.3 with daylight.
#[test]
fn the_switch_at_5000_k_makes_a_step() {
    let (_, grid) = mix(5000.0);
    let light = Tensor::of_grid(&grid);
    for (cct_k, ra, r9) in [(4999.9, 92.18, 61.4), (5000.0, 91.90, 60.3)] {
        let got = colour::cri::cri(&light, &colour::Reference::exact(cct_k));
        // The worked values used test samples by Sprague, which moves Ra and R9 by about 0.02 and 0.1.
        check("Ra", got.ra, ra, 0.03);
        check("R9", got.r[8], r9, 0.15);
    }
}

/// An offset of 0.5 % of the peak over 380–780 nm: +7.6 K, Δu′v′ 0.00023, 336.9 → 334.9 lm/W.
#[test]
fn a_dark_offset_left_in() {
    let (_, grid) = mix(4000.0);
    let peak = grid.iter().copied().fold(0.0, f64::max);
    let clean = measure(&Tensor::of_grid(&grid));
    let offset: Vec<f64> = grid.iter().map(|value| value + 0.005 * peak).collect();
    let got = measure(&Tensor::of_grid(&offset));
    check("CCT", got.cct_k.expect("CCT") - clean.cct_k.expect("CCT"), 7.6, 0.1);
    check("Δu′v′", got.uv_prime().distance(clean.uv_prime()), 0.00023, 5e-6);
    check("LER", got.ler_lm_per_w, 334.9, 0.05);
}

/// A 20 nm Gaussian at 530 nm: xy 0.16391, 0.79083; cut of the mix to 400–700 nm: 4e-6 in u′v′, 0.24 % of its power.
#[test]
fn chromaticity_of_a_line_and_of_cut_ends() {
    let xy = Tensor::of_grid(&gaussian(530.0, 20.0)).xyz(Observer::Cie1931).xy();
    check("x", xy.x, 0.16391, 5e-6);
    check("y", xy.y, 0.79083, 5e-6);
    let (_, grid) = mix(4000.0);
    let cut: Vec<f64> = grid
        .iter()
        .enumerate()
        .map(|(i, value)| if (20..=320).contains(&i) { *value } else { 0.0 })
        .collect();
    let uv = |grid: &[f64]| Tensor::of_grid(grid).xyz(Observer::Cie1931).uv_prime();
    check("Δu′v′", uv(&grid).distance(uv(&cut)), 4e-6, 5e-7);
    check("lost power", 1.0 - cut.iter().sum::<f64>() / grid.iter().sum::<f64>(), 0.0024, 5e-5);
}

/// Δu′v′ of 100 K along the locus: 4.7e-3 at 2700 K, 2.5e-3 at 4000 K, 1.2e-3 at 6500 K.
#[test]
fn a_hundred_kelvin_along_the_locus() {
    let at = |cct_k: f64| -> UvPrime { planckian_uv(cct_k).uv_prime() };
    for (cct_k, expected) in [(2700.0, 4.7e-3), (4000.0, 2.5e-3), (6500.0, 1.2e-3)] {
        check("Δu′v′", at(cct_k).distance(at(cct_k + 100.0)), expected, 5e-5);
    }
}

/// +1 % of one emitter's power in the mix, ×1e-3 in (u′, v′): blue (−.03, −.49), green (−.56, .27), red (.59, .22).
#[test]
fn one_per_cent_more_of_one_emitter() {
    let (shares, _) = mix(4000.0);
    let set = TensorSet::new(
        &[gaussian(455.0, 25.0), gaussian(530.0, 60.0), gaussian(612.0, 80.0)]
            .map(|grid| Tensor::of_grid(&grid)),
    );
    let uv = |shares: &[f64]| set.blend(shares).xyz(Observer::Cie1931).uv_prime();
    for (i, (u, v)) in [(-0.03, -0.49), (-0.56, 0.27), (0.59, 0.22)].into_iter().enumerate() {
        let mut more = shares;
        more[i] *= 1.01;
        let (before, after) = (uv(&shares), uv(&more));
        check("Δu′", 1e3 * (after.u - before.u), u, 0.006);
        check("Δv′", 1e3 * (after.v - before.v), v, 0.006);
    }
    assert!(cct_duv(set.blend(&shares).xyz(Observer::Cie1931).uv()).is_some());
}
