//! The Planckian locus: correlated colour temperature and Duv.
//!
//! CCT is the temperature of the nearest point of the Planckian locus in the CIE 1960 diagram; Duv is the distance
//! to it, positive above. The locus is summed over 360–830 nm at 1 nm with the CIE 1931 observer, c₂ = 1.4388e-2
//! m·K. *Source:* CIE 15; Ohno, Leukos 10:47 (2014) for the sign and the limits.

use crate::chromaticity::Uv;
use crate::{SECOND_RADIATION_CONSTANT_M_K, tables};
use serde::{Deserialize, Serialize};
use std::sync::LazyLock;

/// Beyond this distance from the locus a CCT means nothing (CIE 15).
pub const GREATEST_DUV: f64 = 0.05;
/// Lowest CCT reported, K.
pub const LOWEST_CCT_K: f64 = 1000.0;
/// Highest CCT reported, K.
pub const HIGHEST_CCT_K: f64 = 20_000.0;

/// Correlated colour temperature and distance from the Planckian locus.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct CctDuv {
    /// Correlated colour temperature, K.
    pub cct_k: f64,
    /// Signed distance from the locus in CIE 1960 u, v; positive above (greenish).
    pub duv: f64,
}

/// CCT and Duv with their slopes over u and v.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CctDuvSlopes {
    /// The value.
    pub value: CctDuv,
    /// ∂CCT/∂u, ∂CCT/∂v, K.
    pub cct_over_uv: [f64; 2],
    /// ∂Duv/∂u, ∂Duv/∂v.
    pub duv_over_uv: [f64; 2],
}

impl CctDuv {
    /// Whether the value lies where CCT is reported: |Duv| ≤ 0.05 and 1000–20 000 K.
    pub fn is_reportable(self) -> bool {
        // The slack lets a point made for exactly 1000 K pass in spite of rounding.
        let slack = 1e-7;
        self.duv.abs() <= GREATEST_DUV * (1.0 + slack)
            && self.cct_k >= LOWEST_CCT_K * (1.0 - slack)
            && self.cct_k <= HIGHEST_CCT_K * (1.0 + slack)
    }
}

/// CCT and Duv of a chromaticity; None when |Duv| > 0.05 or the CCT lies outside 1000–20 000 K.
///
/// Nearest point of a tabulated locus (quintic between nodes 2 mired apart), within 1e-9 of [`cct_duv_exact`].
pub fn cct_duv(uv: Uv) -> Option<CctDuv> {
    cct_duv_slopes(uv).map(|slopes| slopes.value)
}

/// [`cct_duv`] with its slopes over u and v.
pub fn cct_duv_slopes(uv: Uv) -> Option<CctDuvSlopes> {
    let slopes = nearest(uv)?;
    slopes.value.is_reportable().then_some(slopes)
}

/// CCT and Duv by direct integration of the locus; None as [`cct_duv`]. Slow; the yardstick of the fast path.
pub fn cct_duv_exact(uv: Uv) -> Option<CctDuv> {
    let mut mired = 1e6 / nearest(uv)?.value.cct_k;
    for _ in 0..20 {
        let point = LocusPoint::at_mired(mired);
        let (du, dv) = (uv.u - point.uv[0], uv.v - point.uv[1]);
        let along = du * point.first[0] + dv * point.first[1];
        let curve =
            point.first[0].powi(2) + point.first[1].powi(2) - du * point.second[0] - dv * point.second[1];
        let step = along / curve;
        mired = (mired + step).clamp(TABLE_FIRST_MIRED, TABLE_LAST_MIRED);
        if step.abs() < 1e-12 * mired {
            break;
        }
    }
    let point = LocusPoint::at_mired(mired);
    let value = CctDuv { cct_k: 1e6 / mired, duv: point.offset(uv) };
    value.is_reportable().then_some(value)
}

/// Chromaticity of the full radiator at a temperature (K, above zero).
pub fn planckian_uv(cct_k: f64) -> Uv {
    let [u, v] = LocusPoint::at_mired(1e6 / cct_k).uv;
    Uv { u, v }
}

/// Chromaticity at a CCT and Duv: the point of the locus plus Duv along its normal.
pub fn uv_at(cct_k: f64, duv: f64) -> Uv {
    let point = LocusPoint::at_mired(1e6 / cct_k);
    let [nu, nv] = point.normal();
    Uv { u: point.uv[0] + duv * nu, v: point.uv[1] + duv * nv }
}

/// Duv by the polynomial of Ohno 2014, a quick check independent of the search: within about 1e-5 for
/// 2600–20 000 K and |Duv| ≤ 0.03.
pub fn duv_by_polynomial(uv: Uv) -> f64 {
    const K: [f64; 7] =
        [-0.471_106, 1.925_865, -2.424_378_7, 1.531_740_3, -0.517_972_2, 0.089_394_4, -0.006_167_93];
    let (du, dv) = (uv.u - 0.292, uv.v - 0.24);
    let length = du.hypot(dv);
    let angle = (du / length).acos();
    length - K.iter().rev().fold(0.0, |sum, k| sum * angle + k)
}

/// A point of the locus with its first and second derivatives over mired.
#[derive(Debug, Clone, Copy)]
struct LocusPoint {
    uv: [f64; 2],
    first: [f64; 2],
    second: [f64; 2],
}

impl LocusPoint {
    /// Direct sums over 360–830 nm.
    fn at_mired(mired: f64) -> LocusPoint {
        let table = &*tables::CMF_1931;
        // n = 1/(eˣ − 1), x = c₂·m/λ: dn/dx = −n(1+n), d²n/dx² = n(1+n)(1+2n).
        let mut sums = [[0.0; 3]; 3];
        for (i, nm) in table.wavelengths_nm.iter().enumerate() {
            let slope = SECOND_RADIATION_CONSTANT_M_K * 1e3 / nm;
            let n = 1.0 / (slope * mired).exp_m1();
            let power = (nm / 560.0).powi(-5);
            let values = [
                power * n,
                -power * slope * n * (1.0 + n),
                power * slope * slope * n * (1.0 + n) * (1.0 + 2.0 * n),
            ];
            for (k, column) in table.columns.iter().enumerate() {
                for (sum, value) in sums.iter_mut().zip(values) {
                    sum[k] += value * column[i];
                }
            }
        }
        let denominator = sums.map(|[x, y, z]| x + 15.0 * y + 3.0 * z);
        let ratio = |numerator: [f64; 3]| {
            let value = numerator[0] / denominator[0];
            let first = (numerator[1] - value * denominator[1]) / denominator[0];
            let second =
                (numerator[2] - 2.0 * first * denominator[1] - value * denominator[2]) / denominator[0];
            [value, first, second]
        };
        let u = ratio(sums.map(|s| 4.0 * s[0]));
        let v = ratio(sums.map(|s| 6.0 * s[1]));
        LocusPoint { uv: [u[0], v[0]], first: [u[1], v[1]], second: [u[2], v[2]] }
    }

    /// Unit normal with positive v. Along rising mired u grows everywhere on the locus.
    fn normal(&self) -> [f64; 2] {
        let length = self.first[0].hypot(self.first[1]);
        [-self.first[1] / length, self.first[0] / length]
    }

    fn offset(&self, uv: Uv) -> f64 {
        let [nu, nv] = self.normal();
        (uv.u - self.uv[0]) * nu + (uv.v - self.uv[1]) * nv
    }
}

const TABLE_FIRST_MIRED: f64 = 30.0;
const TABLE_LAST_MIRED: f64 = 1030.0;
const TABLE_STEP_MIRED: f64 = 2.0;
const TABLE_INTERVALS: usize = 500;

/// The locus as quintics over 2 mired, and its nodes for the search.
struct LocusTable {
    /// u, v, du/dm, dv/dm at each node.
    nodes: Vec<[f64; 4]>,
    /// Coefficients over t = 0..1 of u and v.
    quintics: Vec<[[f64; 2]; 6]>,
}

static TABLE: LazyLock<LocusTable> = LazyLock::new(|| {
    let points: Vec<LocusPoint> = (0..=TABLE_INTERVALS)
        .map(|i| LocusPoint::at_mired(TABLE_FIRST_MIRED + TABLE_STEP_MIRED * i as f64))
        .collect();
    let nodes = points.iter().map(|p| [p.uv[0], p.uv[1], p.first[0], p.first[1]]).collect();
    let h = TABLE_STEP_MIRED;
    let quintics = points
        .windows(2)
        .map(|pair| {
            let mut c = [[0.0; 2]; 6];
            for k in 0..2 {
                let (p0, d0, s0) = (pair[0].uv[k], pair[0].first[k] * h, pair[0].second[k] * h * h);
                let (p1, d1, s1) = (pair[1].uv[k], pair[1].first[k] * h, pair[1].second[k] * h * h);
                let (a, b, s) = (p1 - p0 - d0 - 0.5 * s0, d1 - d0 - s0, s1 - s0);
                c[0][k] = p0;
                c[1][k] = d0;
                c[2][k] = 0.5 * s0;
                c[3][k] = 10.0 * a - 4.0 * b + 0.5 * s;
                c[4][k] = -15.0 * a + 7.0 * b - s;
                c[5][k] = 6.0 * a - 3.0 * b + 0.5 * s;
            }
            c
        })
        .collect();
    LocusTable { nodes, quintics }
});

/// Nearest point of the tabulated locus, whatever the distance; None for a chromaticity that is not finite.
pub(crate) fn nearest(uv: Uv) -> Option<CctDuvSlopes> {
    if !uv.u.is_finite() || !uv.v.is_finite() {
        return None;
    }
    let table = &*TABLE;
    // The projection on the tangent is positive at nodes before the nearest point and negative after it.
    let ahead = |i: usize| {
        let n = &table.nodes[i];
        (uv.u - n[0]) * n[2] + (uv.v - n[1]) * n[3]
    };
    let (mut at, mut size) = (0, TABLE_INTERVALS);
    while size > 1 {
        let half = size / 2;
        if ahead(at + half) >= 0.0 {
            at += half;
        }
        size -= half;
    }
    let (before, after) = (ahead(at), ahead(at + 1));
    let mut t = if before > after { (before / (before - after)).clamp(0.0, 1.0) } else { 0.0 };
    let quintic = &table.quintics[at];
    let evaluate = |t: f64| {
        let mut value = [0.0; 2];
        let mut first = [0.0; 2];
        let mut second = [0.0; 2];
        for k in 0..2 {
            let c = |i: usize| quintic[i][k];
            value[k] = c(0) + t * (c(1) + t * (c(2) + t * (c(3) + t * (c(4) + t * c(5)))));
            first[k] = c(1) + t * (2.0 * c(2) + t * (3.0 * c(3) + t * (4.0 * c(4) + t * 5.0 * c(5))));
            second[k] = 2.0 * c(2) + t * (6.0 * c(3) + t * (12.0 * c(4) + t * 20.0 * c(5)));
        }
        LocusPoint { uv: value, first, second }
    };
    let mut point = evaluate(t);
    let curvature = |point: &LocusPoint| {
        let (du, dv) = (uv.u - point.uv[0], uv.v - point.uv[1]);
        point.first[0].powi(2) + point.first[1].powi(2) - du * point.second[0] - dv * point.second[1]
    };
    for _ in 0..3 {
        let (du, dv) = (uv.u - point.uv[0], uv.v - point.uv[1]);
        let step = (du * point.first[0] + dv * point.first[1]) / curvature(&point);
        // Beyond the ends of the table, and where the point is farther than the radius of curvature, stay put.
        if !step.is_finite() {
            break;
        }
        t = (t + step).clamp(0.0, 1.0);
        point = evaluate(t);
        if step.abs() < 1e-8 {
            break;
        }
    }
    let mired = TABLE_FIRST_MIRED + TABLE_STEP_MIRED * (at as f64 + t);
    let cct_k = 1e6 / mired;
    let normal = point.normal();
    let duv = point.offset(uv);
    // The ends are no perpendicular feet: there the plain distance keeps far points far.
    let end = t <= 0.0 && at == 0 || t >= 1.0 && at + 1 == TABLE_INTERVALS;
    let distance = (uv.u - point.uv[0]).hypot(uv.v - point.uv[1]);
    let duv = if end { distance.copysign(duv) } else { duv };
    let over = -cct_k * cct_k * 1e-6 * TABLE_STEP_MIRED / curvature(&point);
    Some(CctDuvSlopes {
        value: CctDuv { cct_k, duv },
        cct_over_uv: [over * point.first[0], over * point.first[1]],
        duv_over_uv: normal,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn duv_is_zero_on_the_locus_and_cct_its_temperature() {
        for cct_k in [1000.0, 1667.0, 2700.0, 4000.0, 6504.0, 12_345.0, 20_000.0] {
            let found = cct_duv(planckian_uv(cct_k)).unwrap();
            assert!((found.cct_k / cct_k - 1.0).abs() < 1e-9, "{cct_k} {found:?}");
            assert!(found.duv.abs() < 1e-12, "{cct_k} {found:?}");
        }
    }

    #[test]
    fn a_white_made_at_a_cct_and_duv_is_measured_there() {
        for cct_k in [1100.0, 1500.0, 2200.0, 3000.0, 5000.0, 9000.0, 18_000.0] {
            for duv in [-0.049, -0.02, -0.003, 0.0, 0.001, 0.01, 0.03, 0.049] {
                let found = cct_duv(uv_at(cct_k, duv)).unwrap();
                assert!((found.cct_k / cct_k - 1.0).abs() < 1e-9, "{cct_k} {duv} {found:?}");
                assert!((found.duv - duv).abs() < 1e-11, "{cct_k} {duv} {found:?}");
            }
        }
    }

    #[test]
    fn the_table_agrees_with_direct_integration_to_1e_9() {
        // A deterministic scatter of points round the locus, including far ones that have no CCT.
        let mut state = 12_345_u64;
        let mut random = move || {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            (state >> 11) as f64 / (1u64 << 53) as f64
        };
        let mut reported = 0;
        for _ in 0..400 {
            let uv = uv_at(1e6 / (45.0 + 960.0 * random()), 0.12 * (random() - 0.5));
            let (fast, exact) = (cct_duv(uv), cct_duv_exact(uv));
            assert_eq!(fast.is_some(), exact.is_some(), "{uv:?} {fast:?} {exact:?}");
            if let (Some(fast), Some(exact)) = (fast, exact) {
                reported += 1;
                assert!((fast.cct_k / exact.cct_k - 1.0).abs() < 1e-9, "{uv:?} {fast:?} {exact:?}");
                assert!((fast.duv - exact.duv).abs() < 1e-9, "{uv:?} {fast:?} {exact:?}");
            }
        }
        assert!(reported > 250);
    }

    #[test]
    fn the_point_found_is_the_nearest_of_the_whole_locus() {
        let locus: Vec<Uv> = (0..2000).map(|i| planckian_uv(1e6 / (45.0 + 0.48 * f64::from(i)))).collect();
        for (u, v) in
            [(0.2, 0.3), (0.25, 0.345), (0.3, 0.33), (0.19, 0.33), (0.22, 0.36), (0.4, 0.36), (0.26, 0.30)]
        {
            let uv = Uv { u, v };
            let least = locus.iter().map(|p| p.distance(uv)).fold(f64::INFINITY, f64::min);
            if let Some(found) = cct_duv(uv) {
                assert!((found.duv.abs() - least).abs() < 2e-6, "{uv:?} {found:?} {least}");
            } else {
                assert!(least > 0.049 || nearest(uv).unwrap().value.cct_k > 19_000.0, "{uv:?} {least}");
            }
        }
    }

    #[test]
    fn no_cct_beyond_duv_0_05_or_outside_1000_to_20000_k() {
        assert!(cct_duv(uv_at(4000.0, 0.0502)).is_none());
        assert!(cct_duv(uv_at(980.0, 0.0)).is_none());
        assert!(cct_duv(planckian_uv(22_000.0)).is_none());
        assert!(cct_duv(Uv { u: 0.05, v: 0.38 }).is_none(), "saturated green");
        assert!(cct_duv(Uv { u: 0.25, v: 0.02 }).is_none(), "saturated blue");
        assert!(cct_duv(Uv { u: 0.62, v: 0.34 }).is_none(), "saturated red");
        assert!(cct_duv(Uv { u: f64::NAN, v: 0.3 }).is_none());
    }

    #[test]
    fn slopes_are_those_of_small_steps() {
        let uv = uv_at(3500.0, 0.004);
        let slopes = cct_duv_slopes(uv).unwrap();
        let e = 1e-6;
        for k in 0..2 {
            let shift = |s: f64| {
                cct_duv(Uv {
                    u: uv.u + s * f64::from(u8::from(k == 0)),
                    v: uv.v + s * f64::from(u8::from(k == 1)),
                })
                .unwrap()
            };
            let (more, less) = (shift(e), shift(-e));
            let cct = (more.cct_k - less.cct_k) / (2.0 * e);
            let duv = (more.duv - less.duv) / (2.0 * e);
            assert!((cct / slopes.cct_over_uv[k] - 1.0).abs() < 1e-5, "{cct} {}", slopes.cct_over_uv[k]);
            assert!((duv - slopes.duv_over_uv[k]).abs() < 1e-6, "{duv}");
        }
    }

    #[test]
    fn the_polynomial_of_ohno_2014_gives_nearly_the_same_duv() {
        for (cct_k, duv) in [(2700.0, 0.003), (4000.0, -0.010), (6500.0, 0.020)] {
            let quick = duv_by_polynomial(uv_at(cct_k, duv));
            assert!((quick - duv).abs() < 6e-6, "{cct_k} {duv} {quick}");
        }
    }
}
