//! A validated emission spectrum on its own wavelengths.

use crate::{FIRST_NM, GRID_POINTS, LAST_NM};
use thiserror::Error;

/// An emission spectrum: power per nanometre at strictly ascending wavelengths, at least two, all finite.
///
/// The samples are kept as they are; negatives are not clipped.
#[derive(Debug, Clone, PartialEq)]
pub struct Spectrum {
    wavelengths_nm: Vec<f64>,
    power_per_nm: Vec<f64>,
}

/// Why a pair of columns is not a spectrum.
#[derive(Debug, Clone, PartialEq, Error)]
#[non_exhaustive]
pub enum SpectrumError {
    /// Fewer than two samples.
    #[error("a spectrum needs at least two samples; {got} given")]
    TooFewSamples {
        /// Samples given.
        got: usize,
    },
    /// The two columns differ in length.
    #[error("{wavelengths} wavelengths stand beside {values} values; both columns must be of one length")]
    LengthsDiffer {
        /// Number of wavelengths.
        wavelengths: usize,
        /// Number of values.
        values: usize,
    },
    /// A wavelength or value is not a finite number.
    #[error("sample {index} is not a finite number (wavelength {nm}, value {value})")]
    NotFinite {
        /// Sample, counted from 0.
        index: usize,
        /// Its wavelength.
        nm: f64,
        /// Its value.
        value: f64,
    },
    /// Wavelengths do not ascend strictly.
    #[error("wavelengths must ascend: {nm} nm follows {previous_nm} nm")]
    NotAscending {
        /// Sample, counted from 0.
        index: usize,
        /// Its wavelength.
        nm: f64,
        /// The wavelength before it.
        previous_nm: f64,
    },
    /// A wavelength is zero or negative.
    #[error("a wavelength must be above zero; {nm} nm found")]
    NotPositive {
        /// The wavelength.
        nm: f64,
    },
}

/// What the samples themselves tell: peak, width, centre.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Features {
    /// Wavelength of the largest sample (the first of equals), nm.
    pub peak_nm: f64,
    /// Full width at half maximum, nm: between the outermost half-maximum crossings, linear between samples.
    /// None when the curve does not fall to half its peak on both sides inside the measured range.
    pub fwhm_nm: Option<f64>,
    /// Power-weighted mean wavelength over the measured range, nm (trapezium rule). None when the power is not positive.
    pub centroid_nm: Option<f64>,
}

impl Spectrum {
    /// A spectrum from wavelengths (nm) and power per nm.
    ///
    /// *Errors:* fewer than two samples, columns of different length, a number that is not finite, wavelengths
    /// that do not ascend strictly or are not above zero.
    pub fn new(wavelengths_nm: Vec<f64>, power_per_nm: Vec<f64>) -> Result<Spectrum, SpectrumError> {
        if wavelengths_nm.len() != power_per_nm.len() {
            return Err(SpectrumError::LengthsDiffer {
                wavelengths: wavelengths_nm.len(),
                values: power_per_nm.len(),
            });
        }
        if wavelengths_nm.len() < 2 {
            return Err(SpectrumError::TooFewSamples { got: wavelengths_nm.len() });
        }
        for (index, (&nm, &value)) in wavelengths_nm.iter().zip(&power_per_nm).enumerate() {
            if !nm.is_finite() || !value.is_finite() {
                return Err(SpectrumError::NotFinite { index, nm, value });
            }
            if nm <= 0.0 {
                return Err(SpectrumError::NotPositive { nm });
            }
            if index > 0 && nm <= wavelengths_nm[index - 1] {
                return Err(SpectrumError::NotAscending {
                    index,
                    nm,
                    previous_nm: wavelengths_nm[index - 1],
                });
            }
        }
        Ok(Spectrum { wavelengths_nm, power_per_nm })
    }

    /// A spectrum of the 401 values at 380, 381 … 780 nm.
    ///
    /// *Errors:* another number of values, or one that is not finite.
    pub fn from_colour_grid(power_per_nm: Vec<f64>) -> Result<Spectrum, SpectrumError> {
        Spectrum::new((0..GRID_POINTS).map(|i| FIRST_NM + i as f64).collect(), power_per_nm)
    }

    /// Wavelengths, nm, strictly ascending.
    pub fn wavelengths_nm(&self) -> &[f64] {
        &self.wavelengths_nm
    }

    /// Power per nm at [`Self::wavelengths_nm`].
    pub fn values(&self) -> &[f64] {
        &self.power_per_nm
    }

    /// First and last wavelength, nm.
    pub fn range_nm(&self) -> (f64, f64) {
        (self.wavelengths_nm[0], self.wavelengths_nm[self.wavelengths_nm.len() - 1])
    }

    /// The same curve multiplied by `factor`.
    ///
    /// *Errors:* a product that is not finite.
    pub fn scaled(&self, factor: f64) -> Result<Spectrum, SpectrumError> {
        Spectrum::new(self.wavelengths_nm.clone(), self.power_per_nm.iter().map(|v| v * factor).collect())
    }

    /// Value at a wavelength: linear between samples, zero outside the range.
    pub fn at(&self, nm: f64) -> f64 {
        let after = self.wavelengths_nm.partition_point(|w| *w <= nm);
        if after == 0 {
            return 0.0;
        }
        let (w0, v0) = (self.wavelengths_nm[after - 1], self.power_per_nm[after - 1]);
        if w0 == nm {
            return v0;
        }
        if after == self.wavelengths_nm.len() {
            return 0.0;
        }
        let (w1, v1) = (self.wavelengths_nm[after], self.power_per_nm[after]);
        v0 + (nm - w0) / (w1 - w0) * (v1 - v0)
    }

    /// The 401 values at 380, 381 … 780 nm.
    ///
    /// Identity for samples at whole nanometres. Where every interval that touches the bin λ ± 0.5 nm is finer
    /// than 1 nm, the mean of the linear interpolant over the bin (clipped to the measured range); elsewhere
    /// linear interpolation. Zero outside the measured range (CIE 224: missing ends are zero).
    pub fn on_colour_grid(&self) -> Vec<f64> {
        (0..GRID_POINTS).map(|i| self.grid_value(FIRST_NM + i as f64)).collect()
    }

    fn grid_value(&self, nm: f64) -> f64 {
        let (first, last) = self.range_nm();
        if nm < first || nm > last {
            return 0.0;
        }
        let (low, high) = ((nm - 0.5).max(first), (nm + 0.5).min(last));
        let w = &self.wavelengths_nm;
        // Intervals that overlap the bin: from the last sample at or below `low` to the first at or above `high`.
        let begin = w.partition_point(|x| *x <= low).saturating_sub(1);
        let end = w.partition_point(|x| *x < high).min(w.len() - 1);
        let finer = w[begin..=end].windows(2).all(|pair| pair[1] - pair[0] < 1.0 - 1e-6);
        if !finer || high - low < 1e-9 {
            return self.at(nm);
        }
        let mut integral = 0.0;
        for k in begin..end {
            let (a, b) = (w[k].max(low), w[k + 1].min(high));
            if b > a {
                integral += self.at_in(k, 0.5 * (a + b)) * (b - a);
            }
        }
        integral / (high - low)
    }

    /// Linear interpolant of interval `k`.
    fn at_in(&self, k: usize, nm: f64) -> f64 {
        let (w0, w1) = (self.wavelengths_nm[k], self.wavelengths_nm[k + 1]);
        let (v0, v1) = (self.power_per_nm[k], self.power_per_nm[k + 1]);
        v0 + (nm - w0) / (w1 - w0) * (v1 - v0)
    }

    /// Radiant power over the whole measured range, W for W/nm (trapezium rule).
    pub fn radiant_power(&self) -> f64 {
        self.trapezium(|_| 1.0)
    }

    /// Photons per second over the whole measured range for power in W/nm: ∫ S λ/(hc) dλ (trapezium rule).
    ///
    /// *Source:* h, c of CODATA 2018 (exact).
    pub fn photons_per_s(&self) -> f64 {
        const HC_J_NM: f64 = 6.626_070_15e-34 * 299_792_458.0 * 1e9;
        self.trapezium(|nm| nm) / HC_J_NM
    }

    /// Share of the (absolute) radiant power measured outside 380–780 nm, 0..1.
    pub fn share_outside_colour_range(&self) -> f64 {
        let w = &self.wavelengths_nm;
        let (mut outside, mut total) = (0.0, 0.0);
        for k in 0..w.len() - 1 {
            let (a, b) = (w[k], w[k + 1]);
            let part = |low: f64, high: f64| {
                if high > low { self.at_in(k, 0.5 * (low + high)) * (high - low) } else { 0.0 }
            };
            total += part(a, b);
            outside += part(a, b.min(FIRST_NM)) + part(a.max(LAST_NM), b);
        }
        if total > 0.0 { (outside / total).max(0.0) } else { 0.0 }
    }

    fn trapezium(&self, weight: impl Fn(f64) -> f64) -> f64 {
        let (w, v) = (&self.wavelengths_nm, &self.power_per_nm);
        (1..w.len())
            .map(|k| 0.5 * (v[k] * weight(w[k]) + v[k - 1] * weight(w[k - 1])) * (w[k] - w[k - 1]))
            .sum()
    }

    /// Peak, full width at half maximum, centroid of the samples as they are.
    pub fn features(&self) -> Features {
        let (w, v) = (&self.wavelengths_nm, &self.power_per_nm);
        let mut top = 0;
        for k in 1..v.len() {
            if v[k] > v[top] {
                top = k;
            }
        }
        let power = self.radiant_power();
        let centroid_nm = (power > 0.0).then(|| self.trapezium(|nm| nm) / power);
        Features { peak_nm: w[top], fwhm_nm: half_maximum_width(w, v, 0.5 * v[top]), centroid_nm }
    }

    /// Sentences about the samples that limit what their colour numbers are worth.
    ///
    /// An end cut inside 380–780 nm with more than 1 % of the peak left; more than 0.1 % of the power outside
    /// 380–780 nm; a step above 5 nm inside it (CIE 224 asks for 5 nm or less); negative power.
    pub fn cautions(&self) -> Vec<String> {
        let (w, v) = (&self.wavelengths_nm, &self.power_per_nm);
        let mut sentences = Vec::new();
        let peak = v.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        let (first, last) = self.range_nm();
        for (end_nm, value, inside, side) in
            [(first, v[0], first > FIRST_NM, "below"), (last, v[v.len() - 1], last < LAST_NM, "above")]
        {
            if inside && peak > 0.0 && value > 0.01 * peak {
                let percent = 100.0 * value / peak;
                sentences.push(format!(
                    "The curve is cut at {end_nm} nm, where {percent:.1} % of the peak is left; power {side} it counts as zero."
                ));
            }
        }
        let outside = self.share_outside_colour_range();
        if outside > 0.001 {
            let percent = 100.0 * outside;
            sentences.push(format!(
                "{percent:.2} % of the measured power lies outside 380–780 nm and is in no colour number."
            ));
        }
        let step = w
            .windows(2)
            .filter(|pair| pair[1] > FIRST_NM && pair[0] < LAST_NM)
            .map(|pair| pair[1] - pair[0])
            .fold(0.0, f64::max);
        if step > 5.0 + 1e-6 {
            sentences.push(format!(
                "Samples lie up to {step:.3} nm apart; CIE 224 asks for 5 nm or less, so rendering numbers are uncertain."
            ));
        }
        sentences
    }
}

/// Width between the outermost crossings of `half`, linear between samples.
fn half_maximum_width(w: &[f64], v: &[f64], half: f64) -> Option<f64> {
    if half <= 0.0 {
        return None;
    }
    let first = v.iter().position(|value| *value >= half)?;
    let last = v.iter().rposition(|value| *value >= half)?;
    if first == 0 || last + 1 == v.len() {
        return None;
    }
    let crossing = |below: usize, above: usize| {
        w[below] + (half - v[below]) / (v[above] - v[below]) * (w[above] - w[below])
    };
    Some(crossing(last + 1, last) - crossing(first - 1, first))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn gaussian(step_nm: f64, peak_nm: f64, fwhm_nm: f64) -> Spectrum {
        let count = (400.0 / step_nm).round() as usize + 1;
        let w: Vec<f64> = (0..count).map(|i| 380.0 + step_nm * i as f64).collect();
        let v = w.iter().map(|nm| (-4.0 * 2f64.ln() * ((nm - peak_nm) / fwhm_nm).powi(2)).exp()).collect();
        Spectrum::new(w, v).unwrap()
    }

    #[test]
    fn one_nanometre_data_pass_unchanged() {
        let spectrum = gaussian(1.0, 530.3, 31.0);
        assert_eq!(spectrum.on_colour_grid(), spectrum.values());
    }

    #[test]
    fn fine_samples_are_averaged_over_the_bin() {
        // A line of 0.2 nm at 500.5 nm: its power lands in the two bins that share it, half each.
        let w: Vec<f64> = (0..4001).map(|i| 380.0 + 0.1 * f64::from(i)).collect();
        let mut v = vec![0.0; w.len()];
        v[1205] = 10.0;
        let spectrum = Spectrum::new(w, v).unwrap();
        let grid = spectrum.on_colour_grid();
        assert!((grid.iter().sum::<f64>() - spectrum.radiant_power()).abs() < 1e-12);
        assert!(
            (grid[120] - 0.5).abs() < 1e-9 && (grid[121] - 0.5).abs() < 1e-9,
            "{} {}",
            grid[120],
            grid[121]
        );
    }

    #[test]
    fn coarse_samples_are_joined_by_straight_lines() {
        let spectrum = Spectrum::new(vec![400.0, 410.0], vec![0.0, 10.0]).unwrap();
        let grid = spectrum.on_colour_grid();
        assert_eq!(grid[23], 3.0);
        assert_eq!(grid[19], 0.0);
        assert_eq!(grid[31], 0.0);
    }

    #[test]
    fn features_of_a_gaussian_are_its_parameters() {
        let features = gaussian(1.0, 530.0, 30.0).features();
        assert_eq!(features.peak_nm, 530.0);
        assert!((features.fwhm_nm.unwrap() - 30.0).abs() < 0.01);
        assert!((features.centroid_nm.unwrap() - 530.0).abs() < 1e-6);
    }

    #[test]
    fn width_is_absent_when_the_curve_does_not_come_down() {
        let spectrum = Spectrum::new(vec![400.0, 500.0, 600.0], vec![1.0, 2.0, 1.5]).unwrap();
        assert_eq!(spectrum.features().fwhm_nm, None);
    }

    #[test]
    fn bad_columns_are_refused_with_the_place() {
        assert_eq!(Spectrum::new(vec![500.0], vec![1.0]), Err(SpectrumError::TooFewSamples { got: 1 }));
        assert_eq!(
            Spectrum::new(vec![500.0, 500.0], vec![1.0, 1.0]),
            Err(SpectrumError::NotAscending { index: 1, nm: 500.0, previous_nm: 500.0 })
        );
        assert!(matches!(
            Spectrum::new(vec![500.0, 501.0], vec![1.0, f64::NAN]),
            Err(SpectrumError::NotFinite { index: 1, .. })
        ));
        assert!(matches!(
            Spectrum::new(vec![500.0, 501.0], vec![1.0]),
            Err(SpectrumError::LengthsDiffer { wavelengths: 2, values: 1 })
        ));
    }

    #[test]
    fn cut_ends_power_outside_and_coarse_steps_are_said() {
        let cut = Spectrum::new(vec![450.0, 451.0, 452.0], vec![0.5, 1.0, 0.0]).unwrap();
        let sentences = cut.cautions();
        assert_eq!(sentences.len(), 1, "{sentences:?}");
        assert!(sentences[0].contains("450 nm"));
        let infrared = Spectrum::new(vec![370.0, 780.0, 900.0], vec![1.0, 1.0, 1.0]).unwrap();
        let sentences = infrared.cautions();
        assert!(sentences.iter().any(|s| s.contains("outside 380–780 nm")), "{sentences:?}");
        assert!(sentences.iter().any(|s| s.contains("410.000 nm apart")), "{sentences:?}");
    }
}
