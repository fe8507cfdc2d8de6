//! Emitter models: line shapes with named parameters.

use crate::spectrum::{Spectrum, SpectrumError};
use crate::{FIRST_NM, GRID_POINTS};
use serde::{Deserialize, Serialize};
use thiserror::Error;

/// h·c, eV·nm (CODATA 2018, exact to the digits given).
pub const HC_EV_NM: f64 = 1_239.841_984_332;
const FOUR_LN_2: f64 = 4.0 * std::f64::consts::LN_2;

/// What a curve over photon energy counts.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
pub enum EnergyOrdinate {
    /// Photons per eV: power per nm is the curve times E³.
    #[default]
    Photons,
    /// Power per eV: power per nm is the curve times E².
    Power,
}

/// An emitter's line shape. Widths are full widths at half maximum of the curve in its own variable.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[non_exhaustive]
pub enum Shape {
    /// exp(−4 ln 2 ((λ − λ₀)/w)²), power per nm.
    GaussianNm {
        /// Peak, nm.
        peak_nm: f64,
        /// Full width at half maximum, nm.
        fwhm_nm: f64,
    },
    /// The same over photon energy, brought to power per nm.
    GaussianEv {
        /// Peak of the curve over energy, eV.
        peak_ev: f64,
        /// Full width at half maximum, eV.
        fwhm_ev: f64,
        /// What the curve counts.
        ordinate: EnergyOrdinate,
    },
    /// A Gaussian in nm with one width below and another above its peak. The widths are those of the whole Gaussians,
    /// so the full width at half maximum is their mean.
    SplitGaussian {
        /// Peak, nm.
        peak_nm: f64,
        /// Width of the side below the peak, nm.
        fwhm_below_nm: f64,
        /// Width of the side above the peak, nm.
        fwhm_above_nm: f64,
    },
    /// Fraser–Suzuki: exp(−ln 2 (ln(1 + 2b(λ − λ₀)/w)/b)²), zero where the bracket is not positive. The full width at half
    /// maximum is w·sinh(b)/b; b above zero leans to long wavelengths; b near zero is a Gaussian.
    Skewed {
        /// Peak, nm.
        peak_nm: f64,
        /// w, nm.
        width_nm: f64,
        /// b.
        skew: f64,
    },
    /// Franck–Condon progression: photons per eV ∝ E³ Σₙ (Sⁿ e⁻ˢ/n!) exp(−4 ln 2 ((E − E₀₀ + n·ħω)/w)²), n = 0…7.
    Vibronic {
        /// E₀₀, eV.
        origin_ev: f64,
        /// Huang–Rhys factor S.
        huang_rhys: f64,
        /// Spacing ħω, eV.
        spacing_ev: f64,
        /// Width of each line, eV.
        fwhm_ev: f64,
    },
}

/// Why parameters are no shape.
#[derive(Debug, Clone, PartialEq, Error)]
#[non_exhaustive]
pub enum ShapeError {
    /// A parameter that must be above zero is not.
    #[error("{parameter} must be a number above zero; {got} given")]
    NotPositive {
        /// Which parameter.
        parameter: &'static str,
        /// Its value.
        got: f64,
    },
    /// A parameter that must not be negative is, or is not a number.
    #[error("{parameter} must be a number of zero or more; {got} given")]
    Negative {
        /// Which parameter.
        parameter: &'static str,
        /// Its value.
        got: f64,
    },
    /// A skew that is not finite or beyond ±5.
    #[error("the skew must lie between −5 and 5; {got} given")]
    Skew {
        /// Its value.
        got: f64,
    },
    /// Nothing of the curve lies in the range asked for.
    #[error("the curve has no power in the range asked for")]
    Dark,
    /// The range or step does not make a spectrum.
    #[error(transparent)]
    Samples(#[from] SpectrumError),
}

fn gaussian(distance_over_fwhm: f64) -> f64 {
    (-FOUR_LN_2 * distance_over_fwhm * distance_over_fwhm).exp()
}

impl Shape {
    /// Checks the parameters.
    ///
    /// *Errors:* a peak, energy or width not above zero, a negative Huang–Rhys factor or spacing, a skew beyond ±5.
    pub fn validate(&self) -> Result<(), ShapeError> {
        let positive = |parameter, got: f64| {
            if got.is_finite() && got > 0.0 {
                Ok(())
            } else {
                Err(ShapeError::NotPositive { parameter, got })
            }
        };
        let not_negative = |parameter, got: f64| {
            if got.is_finite() && got >= 0.0 { Ok(()) } else { Err(ShapeError::Negative { parameter, got }) }
        };
        match *self {
            Shape::GaussianNm { peak_nm, fwhm_nm } => {
                positive("the peak", peak_nm)?;
                positive("the width", fwhm_nm)
            }
            Shape::GaussianEv { peak_ev, fwhm_ev, .. } => {
                positive("the peak energy", peak_ev)?;
                positive("the width", fwhm_ev)
            }
            Shape::SplitGaussian { peak_nm, fwhm_below_nm, fwhm_above_nm } => {
                positive("the peak", peak_nm)?;
                positive("the width below the peak", fwhm_below_nm)?;
                positive("the width above the peak", fwhm_above_nm)
            }
            Shape::Skewed { peak_nm, width_nm, skew } => {
                positive("the peak", peak_nm)?;
                positive("the width", width_nm)?;
                if skew.is_finite() && skew.abs() <= 5.0 {
                    Ok(())
                } else {
                    Err(ShapeError::Skew { got: skew })
                }
            }
            Shape::Vibronic { origin_ev, huang_rhys, spacing_ev, fwhm_ev } => {
                positive("the origin energy", origin_ev)?;
                not_negative("the Huang–Rhys factor", huang_rhys)?;
                not_negative("the spacing", spacing_ev)?;
                positive("the line width", fwhm_ev)
            }
        }
    }

    /// Relative power per nm at a wavelength above zero. The scale is that of the formula, not unit power.
    pub fn power_per_nm(&self, nm: f64) -> f64 {
        let ev = HC_EV_NM / nm;
        match *self {
            Shape::GaussianNm { peak_nm, fwhm_nm } => gaussian((nm - peak_nm) / fwhm_nm),
            Shape::GaussianEv { peak_ev, fwhm_ev, ordinate } => {
                let jacobian = match ordinate {
                    EnergyOrdinate::Photons => (ev / peak_ev).powi(3),
                    EnergyOrdinate::Power => (ev / peak_ev).powi(2),
                };
                jacobian * gaussian((ev - peak_ev) / fwhm_ev)
            }
            Shape::SplitGaussian { peak_nm, fwhm_below_nm, fwhm_above_nm } => {
                gaussian((nm - peak_nm) / if nm < peak_nm { fwhm_below_nm } else { fwhm_above_nm })
            }
            Shape::Skewed { peak_nm, width_nm, skew } => {
                if skew.abs() < 1e-6 {
                    return gaussian((nm - peak_nm) / width_nm);
                }
                let bracket = 1.0 + 2.0 * skew * (nm - peak_nm) / width_nm;
                if bracket <= 0.0 {
                    return 0.0;
                }
                (-std::f64::consts::LN_2 * (bracket.ln() / skew).powi(2)).exp()
            }
            Shape::Vibronic { origin_ev, huang_rhys, spacing_ev, fwhm_ev } => {
                let mut weight = (-huang_rhys).exp();
                let mut lines = 0.0;
                for n in 0..8 {
                    let order = f64::from(n);
                    lines += weight * gaussian((ev - origin_ev + order * spacing_ev) / fwhm_ev);
                    weight *= huang_rhys / (order + 1.0);
                }
                (ev / origin_ev).powi(6) * lines
            }
        }
    }

    /// The 401 values at 380, 381 … 780 nm, scaled to unit sum (unit radiant power).
    ///
    /// *Errors:* as [`Self::validate`]; no power between 380 and 780 nm.
    pub fn colour_grid(&self) -> Result<Vec<f64>, ShapeError> {
        self.validate()?;
        let mut grid: Vec<f64> = (0..GRID_POINTS).map(|i| self.power_per_nm(FIRST_NM + i as f64)).collect();
        let sum: f64 = grid.iter().sum();
        if !(sum > 0.0 && sum.is_finite()) {
            return Err(ShapeError::Dark);
        }
        for value in &mut grid {
            *value /= sum;
        }
        Ok(grid)
    }

    /// A spectrum from `first_nm` to `last_nm` in steps of `step_nm`, scaled to unit peak of its samples.
    ///
    /// *Errors:* as [`Self::validate`]; a step not above zero; fewer than two samples; no power in the range.
    pub fn spectrum(&self, first_nm: f64, last_nm: f64, step_nm: f64) -> Result<Spectrum, ShapeError> {
        self.validate()?;
        if !(step_nm.is_finite() && step_nm > 0.0) {
            return Err(ShapeError::NotPositive { parameter: "the step", got: step_nm });
        }
        let count = ((last_nm - first_nm) / step_nm + 1e-9).floor();
        if !(0.0..1e6).contains(&count) {
            return Err(SpectrumError::TooFewSamples { got: 0 }.into());
        }
        let wavelengths: Vec<f64> = (0..=count as usize).map(|i| first_nm + step_nm * i as f64).collect();
        let values: Vec<f64> = wavelengths.iter().map(|nm| self.power_per_nm(*nm)).collect();
        let most = values.iter().copied().fold(0.0, f64::max);
        if !(most > 0.0 && most.is_finite()) {
            return Err(ShapeError::Dark);
        }
        Ok(Spectrum::new(wavelengths, values.into_iter().map(|value| value / most).collect())?)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[track_caller]
    fn check(shape: Shape, peak_nm: f64, fwhm_nm: Option<f64>) {
        let features = shape.spectrum(300.0, 900.0, 0.01).unwrap().features();
        assert!((features.peak_nm - peak_nm).abs() < 0.0101, "{shape:?}: {features:?}");
        if let Some(fwhm_nm) = fwhm_nm {
            assert!((features.fwhm_nm.unwrap() - fwhm_nm).abs() < 0.01, "{shape:?}: {features:?}");
        }
    }

    #[test]
    fn shapes_have_the_peak_and_width_of_their_parameters() {
        check(Shape::GaussianNm { peak_nm: 530.0, fwhm_nm: 30.0 }, 530.0, Some(30.0));
        check(
            Shape::SplitGaussian { peak_nm: 600.0, fwhm_below_nm: 40.0, fwhm_above_nm: 80.0 },
            600.0,
            Some(60.0),
        );
        let (width_nm, skew) = (50.0, 0.4);
        check(
            Shape::Skewed { peak_nm: 560.0, width_nm, skew },
            560.0,
            Some(width_nm * f64::sinh(skew) / skew),
        );
        check(Shape::Skewed { peak_nm: 560.0, width_nm, skew: 0.0 }, 560.0, Some(50.0));
    }

    #[test]
    fn photons_per_ev_become_watts_per_nm() {
        // Own arithmetic (dense search): photons per eV round 2.25 eV, 0.30 eV wide, peak at 545.84 nm in W/nm.
        let shape = Shape::GaussianEv { peak_ev: 2.25, fwhm_ev: 0.30, ordinate: EnergyOrdinate::Photons };
        check(shape, 545.84, None);
    }

    #[test]
    fn vibronic_progression_peaks_where_the_worked_value_says() {
        // Own arithmetic (dense search): E00 2.70 eV, S 0.8, 0.17 eV, 0.12 eV: 458.28 nm.
        let shape = Shape::Vibronic { origin_ev: 2.70, huang_rhys: 0.8, spacing_ev: 0.17, fwhm_ev: 0.12 };
        check(shape, 458.28, None);
    }

    #[test]
    fn a_grid_has_unit_power() {
        let grid = Shape::GaussianNm { peak_nm: 450.0, fwhm_nm: 20.0 }.colour_grid().unwrap();
        assert!((grid.iter().sum::<f64>() - 1.0).abs() < 1e-12);
    }

    #[test]
    fn senseless_parameters_are_refused() {
        assert!(Shape::GaussianNm { peak_nm: 450.0, fwhm_nm: 0.0 }.colour_grid().is_err());
        assert!(Shape::Skewed { peak_nm: 450.0, width_nm: 20.0, skew: f64::NAN }.colour_grid().is_err());
        assert_eq!(Shape::GaussianNm { peak_nm: 3000.0, fwhm_nm: 5.0 }.colour_grid(), Err(ShapeError::Dark));
        assert!(Shape::GaussianNm { peak_nm: 450.0, fwhm_nm: 20.0 }.spectrum(700.0, 400.0, 1.0).is_err());
    }
}
