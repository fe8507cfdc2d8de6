//! CIECAM02 and CAM02-UCS in the one viewing condition of CIE 224 and TM-30.
//!
//! L_A = 100 cd/m², Y_b = 20, average surround (c = 0.69, N_c = 1), full adaptation D = 1. With D = 1 the adapted
//! CAT02 response of a sample is 100·R/R_w, so only ratios to the white enter and the scale of Y cancels.
//! *Source:* CIE 159:2004 (CIECAM02); Luo, Cui, Li 2006 (CAM02-UCS); CIE 224:2017.

use std::sync::LazyLock;

/// A 3×3 matrix, row by row.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Matrix3(pub(crate) [[f64; 3]; 3]);

impl Matrix3 {
    pub(crate) fn times(&self, v: [f64; 3]) -> [f64; 3] {
        self.0.map(|row| row[0] * v[0] + row[1] * v[1] + row[2] * v[2])
    }

    pub(crate) fn product(&self, other: &Matrix3) -> Matrix3 {
        Matrix3(std::array::from_fn(|i| {
            std::array::from_fn(|j| (0..3).map(|k| self.0[i][k] * other.0[k][j]).sum())
        }))
    }

    /// Inverse by cofactors. Only for the invertible constants of this crate.
    pub(crate) fn inverse(&self) -> Matrix3 {
        let m = &self.0;
        let cofactor = |i: usize, j: usize| {
            let (a, b, p, q) = ((i + 1) % 3, (i + 2) % 3, (j + 1) % 3, (j + 2) % 3);
            m[a][p] * m[b][q] - m[a][q] * m[b][p]
        };
        let determinant: f64 = (0..3).map(|j| m[0][j] * cofactor(0, j)).sum();
        Matrix3(std::array::from_fn(|i| std::array::from_fn(|j| cofactor(j, i) / determinant)))
    }
}

/// CAT02: cone-like R G B from X Y Z.
pub(crate) const CAT02: Matrix3 =
    Matrix3([[0.7328, 0.4296, -0.1624], [-0.7036, 1.6975, 0.0061], [0.0030, 0.0136, 0.9834]]);
/// Hunt–Pointer–Estévez cone responses from X Y Z.
const HUNT_POINTER_ESTEVEZ: Matrix3 =
    Matrix3([[0.38971, 0.68898, -0.07868], [-0.22981, 1.18340, 0.04641], [0.0, 0.0, 1.0]]);

/// Exponent of the response compression.
pub(crate) const COMPRESSION: f64 = 0.42;
/// Half-saturation constant of the response compression.
pub(crate) const HALF_SATURATION: f64 = 27.13;
/// Smallest values let into a power, so that no light however odd yields a value that is not a number.
pub(crate) const LEAST_RESPONSE: f64 = 1e-18;
pub(crate) const LEAST_ACHROMATIC: f64 = 1e-9;
pub(crate) const LEAST_SUM: f64 = 1e-6;

/// The constants of the viewing condition.
#[derive(Debug)]
pub(crate) struct Viewing {
    /// F_L · HPE · CAT02⁻¹, to be applied to R/R_w.
    pub(crate) cones_from_ratio: Matrix3,
    /// N_bb / A_w.
    pub(crate) achromatic_scale: f64,
    /// c·z.
    pub(crate) lightness_exponent: f64,
    /// (50 000/13)·N_c·N_cb.
    pub(crate) chroma_scale: f64,
    /// (1.64 − 0.29ⁿ)^0.73 · F_L^0.25.
    pub(crate) colourfulness_scale: f64,
}

/// The viewing condition of CIE 224.
pub(crate) static VIEWING: LazyLock<Viewing> = LazyLock::new(|| {
    let adapting: f64 = 100.0;
    let n: f64 = 0.2;
    let k = 1.0 / (5.0 * adapting + 1.0);
    let k4 = k.powi(4);
    let luminance_level = 0.2 * k4 * 5.0 * adapting + 0.1 * (1.0 - k4).powi(2) * (5.0 * adapting).cbrt();
    let induction = 0.725 * (1.0 / n).powf(0.2);
    let hpe = HUNT_POINTER_ESTEVEZ.product(&CAT02.inverse());
    let cones_from_ratio = Matrix3(hpe.0.map(|row| row.map(|x| x * luminance_level)));
    let white = cones_from_ratio.times([1.0; 3]).map(compress);
    let achromatic_white = (2.0 * white[0] + white[1] + white[2] / 20.0 - 0.305) * induction;
    Viewing {
        cones_from_ratio,
        achromatic_scale: induction / achromatic_white,
        lightness_exponent: 0.69 * (1.48 + n.sqrt()),
        chroma_scale: 50_000.0 / 13.0 * induction,
        colourfulness_scale: (1.64 - 0.29f64.powf(n)).powf(0.73) * luminance_level.powf(0.25),
    }
});

fn compress(cone: f64) -> f64 {
    let p = cone.abs().max(LEAST_RESPONSE).powf(COMPRESSION);
    (400.0 * p / (HALF_SATURATION + p)).copysign(cone) + 0.1
}

/// CAM02-UCS J′, a′, b′ of a sample from its CAT02 response over that of the white.
pub(crate) fn cam02_ucs(ratio: [f64; 3]) -> [f64; 3] {
    let viewing = &*VIEWING;
    let [ra, ga, ba] = viewing.cones_from_ratio.times(ratio).map(compress);
    let achromatic = ((2.0 * ra + ga + ba / 20.0 - 0.305) * viewing.achromatic_scale).max(LEAST_ACHROMATIC);
    let lightness = 100.0 * achromatic.powf(viewing.lightness_exponent);
    let a = ra - 12.0 * ga / 11.0 + ba / 11.0;
    let b = (ra + ga - 2.0 * ba) / 9.0;
    let length = (a * a + b * b + 1e-18).sqrt();
    // Eccentricity times chroma without an angle: cos(h + 2)·C = a·cos 2 − b·sin 2.
    let eccentric = 0.25 * (2f64.cos() * a - 2f64.sin() * b + 3.8 * length);
    let t = (viewing.chroma_scale * eccentric / (ra + ga + 1.05 * ba).max(LEAST_SUM)).max(LEAST_RESPONSE);
    let colourfulness = t.powf(0.9) * (lightness / 100.0).sqrt() * viewing.colourfulness_scale;
    let stretched = (0.0228 * colourfulness).ln_1p() / 0.0228;
    [1.7 * lightness / (1.0 + 0.007 * lightness), stretched * a / length, stretched * b / length]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_white_is_achromatic_with_lightness_100() {
        let [j, a, b] = cam02_ucs([1.0; 3]);
        assert!((j - 100.0).abs() < 1e-9, "{j}");
        assert!(a.hypot(b) < 0.1, "{a} {b}");
    }

    #[test]
    fn inverse_times_matrix_is_identity() {
        let unit = CAT02.product(&CAT02.inverse());
        for i in 0..3 {
            for j in 0..3 {
                assert!((unit.0[i][j] - f64::from(u8::from(i == j))).abs() < 1e-15);
            }
        }
    }

    #[test]
    fn no_light_however_odd_yields_a_value_that_is_not_a_number() {
        for ratio in [[0.0; 3], [-1.0, 2.0, 0.1], [1e-30, 0.0, 5.0], [-3.0; 3]] {
            assert!(cam02_ucs(ratio).iter().all(|x| x.is_finite()), "{ratio:?}");
        }
    }
}
