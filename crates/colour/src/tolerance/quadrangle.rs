//! Nominal CCT quadrangles of ANSI C78.377.

use super::polygon::{Polygon, PolygonError};
use crate::chromaticity::Xy;
use crate::locus::uv_at;

/// The edition of the tabulated quadrangles. The corners of 2008 differ; a 2024 edition adds 1800 and 2000 K.
pub const EDITION: &str = "ANSI C78.377-2017";

/// A quadrangle round a nominal CCT ("7-step").
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Quadrangle {
    /// Nominal CCT, K: its name.
    pub nominal_cct_k: f64,
    /// Target CCT, K.
    pub target_cct_k: f64,
    /// Tolerance of the CCT, ± K.
    pub cct_tolerance_k: f64,
    /// Target Duv.
    pub target_duv: f64,
    /// The centre.
    pub centre: Xy,
    /// Corners: low CCT above, high CCT above, high CCT below, low CCT below the locus.
    pub corners: [Xy; 4],
}

const fn row(nominal: f64, target: f64, tolerance: f64, duv: f64, points: [[f64; 2]; 5]) -> Quadrangle {
    const fn xy(p: [f64; 2]) -> Xy {
        Xy { x: p[0], y: p[1] }
    }
    Quadrangle {
        nominal_cct_k: nominal,
        target_cct_k: target,
        cct_tolerance_k: tolerance,
        target_duv: duv,
        centre: xy(points[0]),
        corners: [xy(points[1]), xy(points[2]), xy(points[3]), xy(points[4])],
    }
}

/// Nominal CCTs of the tabulated quadrangles, K.
pub const NOMINAL_CCTS_K: [f64; 10] =
    [2200.0, 2500.0, 2700.0, 3000.0, 3500.0, 4000.0, 4500.0, 5000.0, 5700.0, 6500.0];

/// The quadrangles of ANSI C78.377-2017. Centres and targets from a test house's page, corners of 2700–6500 K from
/// published open code; those of 2200 and 2500 K computed by the corner rule ([`Quadrangle::by_rule`]).
#[expect(clippy::approx_constant, reason = "a tabulated y of 0.4342 is no logarithm")]
pub static C78_377_2017: [Quadrangle; 10] = [
    row(
        2200.0,
        2238.0,
        102.0,
        0.0,
        [[0.5018, 0.4153], [0.5259, 0.4342], [0.5045, 0.4344], [0.4799, 0.3967], [0.4993, 0.3967]],
    ),
    row(
        2500.0,
        2460.0,
        120.0,
        0.0,
        [[0.4806, 0.4141], [0.5045, 0.4344], [0.4813, 0.4319], [0.4593, 0.3944], [0.4799, 0.3967]],
    ),
    row(
        2700.0,
        2725.0,
        145.0,
        0.0,
        [[0.4578, 0.4101], [0.4813, 0.4319], [0.4562, 0.4260], [0.4373, 0.3893], [0.4593, 0.3944]],
    ),
    row(
        3000.0,
        3045.0,
        175.0,
        0.0001,
        [[0.4339, 0.4033], [0.4562, 0.4260], [0.4303, 0.4173], [0.4150, 0.3821], [0.4373, 0.3893]],
    ),
    row(
        3500.0,
        3465.0,
        245.0,
        0.0005,
        [[0.4078, 0.3930], [0.4303, 0.4173], [0.4003, 0.4035], [0.3895, 0.3709], [0.4150, 0.3821]],
    ),
    row(
        4000.0,
        3985.0,
        275.0,
        0.0010,
        [[0.3818, 0.3797], [0.4003, 0.4035], [0.3737, 0.3880], [0.3671, 0.3583], [0.3895, 0.3709]],
    ),
    row(
        4500.0,
        4503.0,
        243.0,
        0.0015,
        [[0.3613, 0.3670], [0.3737, 0.3882], [0.3550, 0.3754], [0.3514, 0.3482], [0.3672, 0.3585]],
    ),
    row(
        5000.0,
        5029.0,
        283.0,
        0.0020,
        [[0.3446, 0.3551], [0.3550, 0.3753], [0.3375, 0.3619], [0.3366, 0.3373], [0.3515, 0.3481]],
    ),
    row(
        5700.0,
        5667.0,
        355.0,
        0.0025,
        [[0.3287, 0.3425], [0.3375, 0.3619], [0.3205, 0.3476], [0.3221, 0.3256], [0.3366, 0.3374]],
    ),
    row(
        6500.0,
        6532.0,
        510.0,
        0.0031,
        [[0.3123, 0.3283], [0.3205, 0.3477], [0.3026, 0.3311], [0.3067, 0.3119], [0.3221, 0.3255]],
    ),
];

impl Quadrangle {
    /// The tabulated quadrangle of a nominal CCT (K); None for a CCT not in [`NOMINAL_CCTS_K`].
    pub fn nominal(nominal_cct_k: f64) -> Option<&'static Quadrangle> {
        C78_377_2017.iter().find(|quadrangle| (quadrangle.nominal_cct_k - nominal_cct_k).abs() < 0.5)
    }

    /// A quadrangle by the corner rule: corners at T ± ΔT, each at its own nominal Duv ± `half_duv` (the standard: 0.006).
    ///
    /// *Valid range:* T − ΔT at 1000 K or more, T + ΔT at 20 000 K or less.
    pub fn by_rule(nominal_cct_k: f64, target_cct_k: f64, cct_tolerance_k: f64, half_duv: f64) -> Quadrangle {
        let corner = |cct_k: f64, offset: f64| uv_at(cct_k, Self::nominal_duv(cct_k) + offset).xy();
        let (low, high) = (target_cct_k - cct_tolerance_k, target_cct_k + cct_tolerance_k);
        let target_duv = Self::nominal_duv(target_cct_k);
        Quadrangle {
            nominal_cct_k,
            target_cct_k,
            cct_tolerance_k,
            target_duv,
            centre: uv_at(target_cct_k, target_duv).xy(),
            corners: [
                corner(low, half_duv),
                corner(high, half_duv),
                corner(high, -half_duv),
                corner(low, -half_duv),
            ],
        }
    }

    /// Nominal Duv of a CCT: 57 700/T² − 44.6/T + 0.00854 from 2870 K, 0 below.
    ///
    /// *Source:* ANSI C78.377 (from memory; reproduces the tabulated corners within 0.0002).
    pub fn nominal_duv(cct_k: f64) -> f64 {
        if cct_k < 2870.0 { 0.0 } else { 57_700.0 / (cct_k * cct_k) - 44.6 / cct_k + 0.00854 }
    }

    /// Whether a chromaticity lies inside: membership of the polygon in x, y.
    pub fn contains(&self, point: Xy) -> bool {
        self.polygon().is_ok_and(|polygon| polygon.contains(point.uv_prime()))
    }

    /// The same region as a polygon in u′, v′ (straight edges stay straight).
    ///
    /// *Errors:* only for a quadrangle by the rule whose tolerances enclose no area.
    pub fn polygon(&self) -> Result<Polygon, PolygonError> {
        Polygon::new(self.corners.iter().map(|corner| corner.uv_prime()).collect())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn each_quadrangle_holds_its_centre_and_no_other() {
        for a in &C78_377_2017 {
            for b in &C78_377_2017 {
                assert_eq!(a.contains(b.centre), a.nominal_cct_k == b.nominal_cct_k);
            }
        }
    }

    #[test]
    fn a_user_edited_quadrangle_follows_the_rule() {
        let small = Quadrangle::by_rule(3000.0, 3045.0, 100.0, 0.0034);
        assert!(small.contains(small.centre) && small.contains(uv_at(2960.0, 0.003).xy()));
        assert!(!small.contains(uv_at(2930.0, 0.0).xy()) && !small.contains(uv_at(3045.0, 0.004).xy()));
    }

    #[test]
    fn nominal_ccts_name_the_rows() {
        for (row, cct_k) in C78_377_2017.iter().zip(NOMINAL_CCTS_K) {
            assert_eq!(Quadrangle::nominal(cct_k), Some(row));
        }
        assert_eq!(Quadrangle::nominal(3100.0), None);
    }
}
