//! SDCM ellipses of IEC 60081 in x, y.

use crate::chromaticity::Xy;

/// An ellipse of standard deviations of colour matching round a named centre: inside n steps where
/// g₁₁·dx² + 2·g₁₂·dx·dy + g₂₂·dy² ≤ n².
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Ellipse {
    /// Name of the centre, such as F3000.
    pub name: &'static str,
    /// The centre.
    pub centre: Xy,
    /// g₁₁.
    pub g11: f64,
    /// g₁₂.
    pub g12: f64,
    /// g₂₂.
    pub g22: f64,
}

const fn row(name: &'static str, x: f64, y: f64, g: [f64; 3]) -> Ellipse {
    Ellipse { name, centre: Xy { x, y }, g11: 1e4 * g[0], g12: 1e4 * g[1], g22: 1e4 * g[2] }
}

/// The six ellipses of IEC 60081 (centres and coefficients as published open code carries them; not seen in the document).
///
/// Their centres are not those of the C78.377 quadrangles: F6500 lies at Duv +0.0071.
pub static IEC_60081: [Ellipse; 6] = [
    row("F6500", 0.313, 0.337, [86.0, -40.0, 45.0]),
    row("F5000", 0.346, 0.359, [56.0, -25.0, 28.0]),
    row("F4000", 0.380, 0.380, [39.5, -21.5, 26.0]),
    row("F3500", 0.409, 0.394, [38.0, -20.0, 25.0]),
    row("F3000", 0.440, 0.403, [39.0, -19.5, 27.5]),
    row("F2700", 0.463, 0.420, [44.0, -18.6, 27.0]),
];

impl Ellipse {
    /// An ellipse of IEC 60081 by the name of its centre, F2700 … F6500.
    pub fn iec_60081(name: &str) -> Option<&'static Ellipse> {
        IEC_60081.iter().find(|ellipse| ellipse.name == name)
    }

    /// Steps from the centre: the square root of the form.
    pub fn steps(&self, point: Xy) -> f64 {
        let (dx, dy) = (point.x - self.centre.x, point.y - self.centre.y);
        (self.g11 * dx * dx + 2.0 * self.g12 * dx * dy + self.g22 * dy * dy).sqrt()
    }

    /// Whether a point lies within `steps`.
    pub fn contains(&self, point: Xy, steps: f64) -> bool {
        self.steps(point) <= steps
    }

    /// Semi-axes a ≥ b of one step, and the angle of the long one from the x axis in degrees (0..180).
    pub fn axes(&self) -> (f64, f64, f64) {
        let mean = 0.5 * (self.g11 + self.g22);
        let half = 0.5 * (self.g11 - self.g22);
        let radius = half.hypot(self.g12);
        let (least, most) = (mean - radius, mean + radius);
        // The long axis lies along the smaller eigenvalue.
        let angle = (0.5 * (2.0 * self.g12).atan2(self.g11 - self.g22)).to_degrees() + 90.0;
        (1.0 / least.sqrt(), 1.0 / most.sqrt(), angle.rem_euclid(180.0))
    }

    /// `count` points round the ellipse of `steps`.
    pub fn boundary(&self, steps: f64, count: usize) -> Vec<Xy> {
        let (a, b, angle) = self.axes();
        let (sin, cos) = angle.to_radians().sin_cos();
        (0..count)
            .map(|i| {
                let (s, c) = (std::f64::consts::TAU * i as f64 / count as f64).sin_cos();
                let (p, q) = (steps * a * c, steps * b * s);
                Xy { x: self.centre.x + p * cos - q * sin, y: self.centre.y + p * sin + q * cos }
            })
            .collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_boundary_lies_at_its_steps() {
        for ellipse in &IEC_60081 {
            for point in ellipse.boundary(5.0, 23) {
                assert!((ellipse.steps(point) - 5.0).abs() < 1e-9, "{}", ellipse.name);
            }
        }
    }

    #[test]
    fn names_are_found() {
        assert_eq!(Ellipse::iec_60081("F3000").unwrap().centre, Xy { x: 0.440, y: 0.403 });
        assert!(Ellipse::iec_60081("F3001").is_none());
    }
}
