//! An emitter's curve as a smooth function that can be moved and widened.

use colour::Spectrum;

/// A natural cubic spline through the samples, zero outside them.
///
/// Source: any text on splines; the second derivatives solve a tridiagonal system with zero ends.
#[derive(Clone, Debug)]
pub(super) struct Curve {
    nm: Vec<f64>,
    value: Vec<f64>,
    bend: Vec<f64>,
    /// Power-weighted mean wavelength: the point that stays put when the curve is widened.
    pub(super) centre_nm: f64,
}

/// A value with its slope along the axis.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Sample {
    pub(super) value: f64,
    pub(super) slope_per_nm: f64,
}

impl Curve {
    pub(super) fn of(spectrum: &Spectrum) -> Self {
        let (nm, value) = (spectrum.wavelengths_nm().to_vec(), spectrum.values().to_vec());
        let n = nm.len();
        let mut bend = vec![0.0; n];
        let mut carry = vec![0.0; n];
        for i in 1..n - 1 {
            let (before, after) = (nm[i] - nm[i - 1], nm[i + 1] - nm[i]);
            let ratio = before / (before + after);
            let pivot = ratio * bend[i - 1] + 2.0;
            let jump = (value[i + 1] - value[i]) / after - (value[i] - value[i - 1]) / before;
            bend[i] = (ratio - 1.0) / pivot;
            carry[i] = (6.0 * jump / (before + after) - ratio * carry[i - 1]) / pivot;
        }
        bend[n - 1] = 0.0;
        for i in (0..n - 1).rev() {
            bend[i] = bend[i] * bend[i + 1] + carry[i];
        }
        bend[0] = 0.0;
        let features = spectrum.features();
        Self { nm, value, bend, centre_nm: features.centroid_nm.unwrap_or(features.peak_nm) }
    }

    /// The curve itself.
    pub(super) fn at(&self, nm: f64) -> Sample {
        let n = self.nm.len();
        if nm < self.nm[0] || nm > self.nm[n - 1] {
            return Sample { value: 0.0, slope_per_nm: 0.0 };
        }
        let k = self.nm.partition_point(|w| *w <= nm).clamp(1, n - 1) - 1;
        let width = self.nm[k + 1] - self.nm[k];
        let (b, a) = ((nm - self.nm[k]) / width, (self.nm[k + 1] - nm) / width);
        let value = a * self.value[k]
            + b * self.value[k + 1]
            + ((a * a * a - a) * self.bend[k] + (b * b * b - b) * self.bend[k + 1]) * width * width / 6.0;
        let slope_per_nm = (self.value[k + 1] - self.value[k]) / width
            + ((3.0 * b * b - 1.0) * self.bend[k + 1] - (3.0 * a * a - 1.0) * self.bend[k]) * width / 6.0;
        Sample { value, slope_per_nm }
    }

    /// The curve moved by `shift_nm` and widened by `stretch` about its centre, its area kept:
    /// f(c + (λ − c − shift)/stretch) / stretch. Also its derivatives by the shift and by the stretch.
    pub(super) fn moved(&self, nm: f64, shift_nm: f64, stretch: f64) -> (f64, f64, f64) {
        let from_centre = (nm - self.centre_nm - shift_nm) / stretch;
        let sample = self.at(self.centre_nm + from_centre);
        let value = sample.value / stretch;
        let by_shift = -sample.slope_per_nm / (stretch * stretch);
        let by_stretch = -(sample.value + sample.slope_per_nm * from_centre) / (stretch * stretch);
        (value, by_shift, by_stretch)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn gaussian(peak_nm: f64, fwhm_nm: f64) -> impl Fn(f64) -> f64 {
        move |nm| (-4.0 * 2f64.ln() * ((nm - peak_nm) / fwhm_nm).powi(2)).exp()
    }

    fn spectrum(f: impl Fn(f64) -> f64) -> Spectrum {
        let nm: Vec<f64> = (380..=780).map(f64::from).collect();
        let value = nm.iter().map(|w| f(*w)).collect();
        Spectrum::new(nm, value).unwrap()
    }

    #[test]
    fn the_spline_passes_through_its_samples_and_follows_a_gaussian_between_them() {
        let f = gaussian(530.0, 25.0);
        let curve = Curve::of(&spectrum(&f));
        assert_eq!(curve.at(530.0).value, 1.0);
        for k in 0..800 {
            let nm = 380.0 + 0.5 * f64::from(k);
            assert!((curve.at(nm).value - f(nm)).abs() < 2e-6, "{nm} nm");
        }
    }

    #[test]
    fn derivatives_agree_with_differences() {
        let curve = Curve::of(&spectrum(gaussian(530.0, 25.0)));
        for nm in [505.3, 518.7, 530.2, 549.9] {
            let (_, by_shift, by_stretch) = curve.moved(nm, 1.3, 1.1);
            let h = 1e-5;
            let shift = (curve.moved(nm, 1.3 + h, 1.1).0 - curve.moved(nm, 1.3 - h, 1.1).0) / (2.0 * h);
            let stretch = (curve.moved(nm, 1.3, 1.1 + h).0 - curve.moved(nm, 1.3, 1.1 - h).0) / (2.0 * h);
            assert!((by_shift - shift).abs() < 1e-8, "{nm} nm: {by_shift} {shift}");
            assert!((by_stretch - stretch).abs() < 1e-7, "{nm} nm: {by_stretch} {stretch}");
        }
    }

    #[test]
    fn moving_a_gaussian_gives_the_moved_gaussian() {
        let curve = Curve::of(&spectrum(gaussian(530.0, 25.0)));
        let moved = gaussian(533.0, 25.0 * 1.2);
        for k in 0..400 {
            let nm = 380.0 + f64::from(k);
            assert!((curve.moved(nm, 3.0, 1.2).0 * 1.2 - moved(nm)).abs() < 3e-6, "{nm} nm");
        }
    }
}
