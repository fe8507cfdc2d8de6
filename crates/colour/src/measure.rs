//! Every headline number of a light at once, with the null rules and warnings of a report.

use crate::alpha_opic::melanopic_der;
use crate::chromaticity::{Uv, UvPrime, Xy};
use crate::cri::{Cri, GREATEST_REFERENCE_DISTANCE_UV, cri_with};
use crate::fidelity::{Fidelity, HUE_BINS, fidelity_with};
use crate::kernel::Arithmetic;
use crate::locus::{self, CctDuv, GREATEST_DUV};
use crate::observer::Observer;
use crate::photobiology::blue_light_efficacy_w_per_lm;
use crate::reference::Reference;
use crate::spectrum::Spectrum;
use crate::tensor::Tensor;
use serde::Serialize;

/// The numbers of one light. Serialises to the keys of the `measure` command.
///
/// `cct_k`, `duv`, `ra`, `r`, `rf`, `rg` and the bins are None when |Duv| > 0.05 or the CCT lies outside
/// 1000–20 000 K; `rg` and an empty bin's entries also when a hue bin is empty. No number is ever NaN: a light
/// without power has zeros and a warning.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Measurement {
    /// CIE 1931 x.
    pub x: f64,
    /// CIE 1931 y.
    pub y: f64,
    /// CIE 1976 u′.
    pub u_prime: f64,
    /// CIE 1976 v′.
    pub v_prime: f64,
    /// Correlated colour temperature, K.
    pub cct_k: Option<f64>,
    /// Distance from the Planckian locus (CIE 1960 u, v), positive above.
    pub duv: Option<f64>,
    /// Luminous efficacy of radiation inside 380–780 nm, lm/W.
    pub ler_lm_per_w: f64,
    /// CIE 13.3 Ra.
    pub ra: Option<f64>,
    /// CIE 13.3 R1–R15.
    pub r: Option<[f64; 15]>,
    /// CIE 224 / TM-30 Rf.
    pub rf: Option<f64>,
    /// TM-30 Rg.
    pub rg: Option<f64>,
    /// TM-30 Rf,h1–16.
    pub rf_bins: Option<[Option<f64>; HUE_BINS]>,
    /// TM-30 Rcs,h1–16, percent.
    pub rcs_bins: Option<[Option<f64>; HUE_BINS]>,
    /// TM-30 Rhs,h1–16.
    pub rhs_bins: Option<[Option<f64>; HUE_BINS]>,
    /// S/P ratio.
    pub sp_ratio: f64,
    /// Melanopic daylight (D65) efficacy ratio.
    pub melanopic_der: f64,
    /// Blue-light hazard efficacy of luminous radiation, W/lm (read with its caution).
    pub kbv_w_per_lm: f64,
    /// Peak wavelength of the samples, nm; None for a blend, which has no samples.
    pub peak_nm: Option<f64>,
    /// Full width at half maximum, nm.
    pub fwhm_nm: Option<f64>,
    /// What limits the worth of these numbers, one sentence each.
    pub warnings: Vec<String>,
}

impl Measurement {
    /// Chromaticity x, y.
    pub fn xy(&self) -> Xy {
        Xy { x: self.x, y: self.y }
    }

    /// Chromaticity u′, v′.
    pub fn uv_prime(&self) -> UvPrime {
        UvPrime { u: self.u_prime, v: self.v_prime }
    }

    /// CIE 13.3 R9.
    pub fn r9(&self) -> Option<f64> {
        self.r.map(|r| r[8])
    }

    /// CCT and Duv together.
    pub fn cct_duv(&self) -> Option<CctDuv> {
        Some(CctDuv { cct_k: self.cct_k?, duv: self.duv? })
    }
}

/// Every number of a spectrum, its peak and width, and its cautions.
pub fn measure_spectrum(spectrum: &Spectrum) -> Measurement {
    let mut measurement = measure(&Tensor::of(spectrum));
    let features = spectrum.features();
    measurement.peak_nm = Some(features.peak_nm);
    measurement.fwhm_nm = features.fwhm_nm;
    measurement.warnings.extend(spectrum.cautions());
    measurement
}

/// Every number of a light, against the reference of its own CCT.
pub fn measure(light: &Tensor) -> Measurement {
    measure_with(light, None, Arithmetic::Dispatched)
}

/// Every number of a light, with the rendering numbers against a fixed reference (a solve at an exact white uses
/// that of the target CCT, so that rounding cannot flip the switch at 5000 K).
pub fn measure_at(light: &Tensor, reference: &Reference) -> Measurement {
    measure_with(light, Some(reference), Arithmetic::Dispatched)
}

/// [`measure`] or [`measure_at`] with a chosen instruction set.
pub fn measure_with(light: &Tensor, fixed: Option<&Reference>, arithmetic: Arithmetic) -> Measurement {
    let mut out = Measurement {
        x: 0.0,
        y: 0.0,
        u_prime: 0.0,
        v_prime: 0.0,
        cct_k: None,
        duv: None,
        ler_lm_per_w: 0.0,
        ra: None,
        r: None,
        rf: None,
        rg: None,
        rf_bins: None,
        rcs_bins: None,
        rhs_bins: None,
        sp_ratio: 0.0,
        melanopic_der: 0.0,
        kbv_w_per_lm: 0.0,
        peak_nm: None,
        fwhm_nm: None,
        warnings: Vec::new(),
    };
    // Ratios do not care for the scale, but products of very small or very large numbers leave the range of a float.
    let scaled;
    let power = light.radiant_power();
    let light = if power.is_finite() && power > 0.0 && !(1e-60..1e60).contains(&power) {
        scaled = light.scaled(1.0 / power);
        &scaled
    } else {
        light
    };
    if !light.is_light() {
        out.warnings.push(
            "There is no positive light between 380 and 780 nm, so the colour numbers are set to zero."
                .to_owned(),
        );
        return out;
    }
    let xyz = light.xyz(Observer::Cie1931);
    let (xy, uv_prime) = (xyz.xy(), xyz.uv_prime());
    (out.x, out.y) = (xy.x, xy.y);
    (out.u_prime, out.v_prime) = (uv_prime.u, uv_prime.v);
    out.ler_lm_per_w = light.ler_lm_per_w();
    out.sp_ratio = light.sp_ratio();
    out.melanopic_der = melanopic_der(light);
    out.kbv_w_per_lm = blue_light_efficacy_w_per_lm(light);
    let Some(found) = locus::cct_duv(xyz.uv()) else {
        out.warnings.push(why_no_cct(xyz.uv()));
        return out;
    };
    (out.cct_k, out.duv) = (Some(found.cct_k), Some(found.duv));
    let own;
    let reference = match fixed {
        Some(reference) => reference,
        None => {
            own = Reference::at_with(found.cct_k, arithmetic);
            &own
        }
    };
    out.fill_cri(&cri_with(light, reference, arithmetic));
    out.fill_fidelity(&fidelity_with(light, reference, arithmetic));
    out
}

fn why_no_cct(uv: Uv) -> String {
    let nearest = locus::nearest(uv).map(|slopes| slopes.value);
    match nearest {
        Some(value) if value.duv.abs() <= GREATEST_DUV => {
            "The nearest Planckian lies outside 1000–20 000 K, so CCT, Duv and the rendering numbers are left out."
                .to_owned()
        }
        Some(value) => format!(
            "The light lies {:.4} (u, v) from the Planckian locus; beyond {GREATEST_DUV} CCT, Duv and the rendering numbers have no meaning.",
            value.duv.abs()
        ),
        None => "The chromaticity is not a number, so CCT, Duv and the rendering numbers are left out.".to_owned(),
    }
}

impl Measurement {
    fn fill_cri(&mut self, rendering: &Cri) {
        // Light with strongly negative parts can be white to the observer and have no rendering at all.
        if !rendering.r.iter().all(|r| r.is_finite()) {
            self.warnings
                .push("Ra and R1–R15 cannot be computed: parts of the spectrum are negative.".to_owned());
            return;
        }
        self.ra = Some(rendering.ra);
        self.r = Some(rendering.r);
        if rendering.reference_distance_uv > GREATEST_REFERENCE_DISTANCE_UV {
            self.warnings.push(format!(
                "The light lies {:.4} (u, v) from its reference; beyond 0.0054 CIE 13.3 calls Ra and R1–R15 uncertain.",
                rendering.reference_distance_uv
            ));
        }
    }

    fn fill_fidelity(&mut self, numbers: &Fidelity) {
        if !numbers.samples.iter().all(|score| score.is_finite()) {
            self.warnings
                .push("Rf and Rg cannot be computed: parts of the spectrum are negative.".to_owned());
            return;
        }
        self.rf = Some(numbers.rf);
        self.rg = numbers.rg.filter(|rg| rg.is_finite());
        self.rf_bins = Some(numbers.rf_bins);
        self.rcs_bins = Some(numbers.rcs_bins);
        self.rhs_bins = Some(numbers.rhs_bins);
        if numbers.rg.is_none() {
            let empty: Vec<String> = numbers
                .rf_bins
                .iter()
                .enumerate()
                .filter(|(_, value)| value.is_none())
                .map(|(bin, _)| (bin + 1).to_string())
                .collect();
            self.warnings.push(format!(
                "No sample falls in hue bin {} under the reference, so Rg and that bin's numbers are left out.",
                empty.join(", ")
            ));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::illuminant::cie_source;
    use proptest::prelude::*;

    #[test]
    fn far_from_the_locus_only_the_plain_numbers_remain() {
        let mut grid = vec![0.0; 401];
        grid[140] = 1.0;
        let green = measure(&Tensor::of_grid(&grid));
        assert!(green.cct_k.is_none() && green.duv.is_none() && green.ra.is_none() && green.r.is_none());
        assert!(
            green.rf.is_none() && green.rg.is_none() && green.rf_bins.is_none() && green.rcs_bins.is_none()
        );
        assert!(
            green.x > 0.0 && green.ler_lm_per_w > 400.0 && green.sp_ratio > 0.0 && green.melanopic_der > 0.0
        );
        assert_eq!(green.warnings.len(), 1);
        assert!(green.warnings[0].contains("Planckian locus"), "{}", green.warnings[0]);
    }

    #[test]
    fn a_light_far_from_its_reference_is_measured_with_a_warning() {
        // FL2 with a third more power from 500 to 570 nm: greenish, yet near enough the locus for a CCT.
        let mut grid = cie_source("FL2").unwrap().on_colour_grid();
        for value in &mut grid[120..190] {
            *value *= 1.3;
        }
        let greenish = measure(&Tensor::of_grid(&grid));
        assert!(greenish.ra.is_some() && greenish.r9().is_some());
        assert!(
            greenish.warnings.iter().any(|sentence| sentence.contains("CIE 13.3")),
            "{:?}",
            greenish.warnings
        );
    }

    #[test]
    fn darkness_has_zeros_and_a_warning_not_nan() {
        for grid in [vec![0.0; 401], vec![-1.0; 401]] {
            let dark = measure(&Tensor::of_grid(&grid));
            assert_eq!((dark.x, dark.ler_lm_per_w, dark.cct_k), (0.0, 0.0, None));
            assert_eq!(dark.warnings.len(), 1);
        }
    }

    /// Every number of a measurement in one list.
    fn numbers(m: &Measurement) -> Vec<f64> {
        let mut all =
            vec![m.x, m.y, m.u_prime, m.v_prime, m.ler_lm_per_w, m.sp_ratio, m.melanopic_der, m.kbv_w_per_lm];
        all.extend([m.cct_k, m.duv, m.ra, m.rf, m.rg, m.peak_nm, m.fwhm_nm].into_iter().flatten());
        all.extend(m.r.into_iter().flatten());
        for bins in [m.rf_bins, m.rcs_bins, m.rhs_bins].into_iter().flatten() {
            all.extend(bins.into_iter().flatten());
        }
        all
    }

    proptest! {
        #[test]
        fn no_number_is_ever_nan_or_infinite(
            values in proptest::collection::vec(prop_oneof![4 => 0.0..1.0f64, 1 => -1.0..1.0f64, 1 => Just(0.0)], 401),
            exponent in -300i32..300,
            slope in -8.0..8.0f64,
        ) {
            let scale = 10f64.powi(exponent);
            let grid: Vec<f64> = values
                .iter()
                .enumerate()
                .map(|(i, value)| scale * value * (slope * i as f64 / 400.0).exp())
                .collect();
            for number in numbers(&measure(&Tensor::of_grid(&grid))) {
                prop_assert!(number.is_finite());
            }
        }

        #[test]
        fn power_does_not_change_the_numbers(
            shares in proptest::collection::vec(0.01..1.0f64, 4),
            factor in 1e-9..1e9f64,
        ) {
            let sources = ["FL2", "LED-B3", "A", "D65"];
            let set = crate::TensorSet::new(&sources.map(|name| Tensor::of(&cie_source(name).unwrap())));
            let light = set.blend(&shares);
            let (one, other) = (measure(&light), measure(&light.scaled(factor)));
            for (a, b) in numbers(&one).into_iter().zip(numbers(&other)) {
                prop_assert!((a - b).abs() <= 1e-7 * (1.0 + a.abs()), "{} {}", a, b);
            }
        }
    }

    #[test]
    fn spectrum_and_tensor_give_the_same_numbers() {
        let spectrum = cie_source("LED-V1").unwrap();
        let (whole, blend) = (measure_spectrum(&spectrum), measure(&Tensor::of(&spectrum)));
        assert_eq!((whole.x, whole.ra, whole.rf), (blend.x, blend.ra, blend.rf));
        assert!(whole.peak_nm.is_some() && blend.peak_nm.is_none());
    }
}
