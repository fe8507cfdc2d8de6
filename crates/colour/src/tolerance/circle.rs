//! Circles in u′, v′, in steps.

use crate::chromaticity::UvPrime;

/// Radius of one step, 0.0011 in u′, v′ (CIE TN 001:2014, from memory).
pub const STEP_RADIUS: f64 = 0.0011;

/// Circles round a centre in u′, v′, measured in steps of 0.0011.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StepCircle {
    /// The centre.
    pub centre: UvPrime,
}

impl StepCircle {
    /// Steps from the centre: Δu′v′/0.0011.
    pub fn steps(&self, point: UvPrime) -> f64 {
        self.centre.distance(point) / STEP_RADIUS
    }

    /// Whether a point lies within `steps` of the centre.
    pub fn contains(&self, point: UvPrime, steps: f64) -> bool {
        self.steps(point) <= steps
    }

    /// `count` points round the circle of `steps`.
    pub fn boundary(&self, steps: f64, count: usize) -> Vec<UvPrime> {
        (0..count)
            .map(|i| {
                let (sin, cos) = (std::f64::consts::TAU * i as f64 / count as f64).sin_cos();
                UvPrime {
                    u: self.centre.u + steps * STEP_RADIUS * cos,
                    v: self.centre.v + steps * STEP_RADIUS * sin,
                }
            })
            .collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_step_is_0_0011() {
        let circle = StepCircle { centre: UvPrime { u: 0.25, v: 0.52 } };
        assert!((circle.steps(UvPrime { u: 0.25, v: 0.5222 }) - 2.0).abs() < 1e-9);
        for point in circle.boundary(3.0, 17) {
            assert!((circle.steps(point) - 3.0).abs() < 1e-9);
            assert!(circle.contains(point, 3.000_001) && !circle.contains(point, 2.999));
        }
    }
}
