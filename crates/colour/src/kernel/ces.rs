//! CAM02-UCS of the 99 samples over 104 lanes, forward and backward.
//!
//! In stages with buffers between them: one long loop body would wait for its own chain of divisions and powers,
//! while several short ones keep many samples in flight. Divisions are shared: one 1/(xyz) serves three quotients.

use super::lanes::Lanes;
use super::maths::{at_least, exp2, fma, log2, log2_of, split};
use crate::appearance_model::{
    COMPRESSION, HALF_SATURATION, LEAST_ACHROMATIC, LEAST_RESPONSE, LEAST_SUM, VIEWING, Viewing,
};
use crate::fidelity::FIDELITY_FACTOR;
use crate::tensor::column::CES_LANES;

type Row = [f64; CES_LANES];

/// 0.0228 of CAM02-UCS.
const STRETCH: f64 = 0.0228;
const LN2_OVER_STRETCH: f64 = std::f64::consts::LN_2 / STRETCH;
/// cos 2 and sin 2 (rad) of the eccentricity factor.
const COS_2: f64 = -0.416_146_836_547_142_4;
const SIN_2: f64 = 0.909_297_426_825_681_7;
/// d/dp of 400 p/(p + 27.13) is 400·27.13/(p + 27.13)², and dp/dy is 0.42 p/y.
const SLOPE: f64 = 400.0 * HALF_SATURATION * COMPRESSION;

/// What the stages leave behind for one another.
#[derive(Debug, Clone)]
#[repr(C, align(64))]
pub(crate) struct Stages {
    /// Compressed cone responses.
    cone: [Row; 3],
    /// Their slopes over the cone signals (only when a gradient is wanted).
    slope: [Row; 3],
    /// Opponent a, b and their length.
    a: Row,
    b: Row,
    length: Row,
    /// ½·c·z·log₂(A), then (J/100).
    lightness: Row,
    /// t, then colourfulness M.
    colourfulness: Row,
    /// M′ over the length.
    factor: Row,
}

impl Stages {
    #[inline(always)]
    pub(crate) fn new() -> Stages {
        let row = [0.0; CES_LANES];
        Stages {
            cone: [row; 3],
            slope: [row; 3],
            a: row,
            b: row,
            length: row,
            lightness: row,
            colourfulness: row,
            factor: row,
        }
    }
}

/// The three rows of a 312-lane array.
#[inline(always)]
pub(crate) fn rows(lanes: &[f64; 3 * CES_LANES]) -> [&Row; 3] {
    let (first, rest) = lanes.split_at(CES_LANES);
    let (second, third) = rest.split_at(CES_LANES);
    [
        first.try_into().expect("a third of the lanes"),
        second.try_into().expect("a third of the lanes"),
        third.try_into().expect("a third of the lanes"),
    ]
}

#[inline(always)]
fn rows_mut(lanes: &mut [f64; 3 * CES_LANES]) -> [&mut Row; 3] {
    let (first, rest) = lanes.split_at_mut(CES_LANES);
    let (second, third) = rest.split_at_mut(CES_LANES);
    [
        first.try_into().expect("a third of the lanes"),
        second.try_into().expect("a third of the lanes"),
        third.try_into().expect("a third of the lanes"),
    ]
}

/// Cone signals from R, G, B: F_L·HPE·CAT02⁻¹·diag(1/white).
#[inline(always)]
fn cones_from_rgb(viewing: &Viewing, white: [f64; 3]) -> [[f64; 3]; 3] {
    let inverse = [1.0 / white[0], 1.0 / white[1], 1.0 / white[2]];
    let mut q = viewing.cones_from_ratio.0;
    for row in &mut q {
        for k in 0..3 {
            row[k] *= inverse[k];
        }
    }
    q
}

/// J′ | a′ | b′ of the samples from their CAT02 R | G | B under a white.
#[inline(always)]
pub(crate) fn forward<const FMA: bool, const SLOPES: bool>(
    white: [f64; 3],
    rgb: &Lanes<{ 3 * CES_LANES }>,
    stages: &mut Stages,
    jab: &mut Lanes<{ 3 * CES_LANES }>,
) {
    let viewing = &*VIEWING;
    adapt::<FMA, SLOPES>(&cones_from_rgb(viewing, white), rows(&rgb.0), stages);
    correlates::<FMA>(viewing, stages);
    powers::<FMA>(viewing, stages);
    coordinates::<FMA>(stages, rows_mut(&mut jab.0));
}

#[inline(always)]
fn adapt<const FMA: bool, const SLOPES: bool>(q: &[[f64; 3]; 3], [r, g, b]: [&Row; 3], stages: &mut Stages) {
    let [c0, c1, c2] = &mut stages.cone;
    let [h0, h1, h2] = &mut stages.slope;
    for i in 0..CES_LANES {
        let y0 = fma::<FMA>(q[0][0], r[i], fma::<FMA>(q[0][1], g[i], q[0][2] * b[i]));
        let y1 = fma::<FMA>(q[1][0], r[i], fma::<FMA>(q[1][1], g[i], q[1][2] * b[i]));
        let y2 = fma::<FMA>(q[2][0], r[i], fma::<FMA>(q[2][1], g[i], q[2][2] * b[i]));
        let (x0, x1, x2) = (
            at_least(y0.abs(), LEAST_RESPONSE),
            at_least(y1.abs(), LEAST_RESPONSE),
            at_least(y2.abs(), LEAST_RESPONSE),
        );
        let ((e0, n0, d0), (e1, n1, d1), (e2, n2, d2)) = (split(x0), split(x1), split(x2));
        let d01 = d0 * d1;
        let inverse = 1.0 / (d01 * d2);
        let inverse_01 = inverse * d2;
        let p0 = exp2::<FMA>(COMPRESSION * log2_of::<FMA>(e0, n0 * (inverse_01 * d1)));
        let p1 = exp2::<FMA>(COMPRESSION * log2_of::<FMA>(e1, n1 * (inverse_01 * d0)));
        let p2 = exp2::<FMA>(COMPRESSION * log2_of::<FMA>(e2, n2 * (inverse * d01)));
        let (s0, s1, s2) = (p0 + HALF_SATURATION, p1 + HALF_SATURATION, p2 + HALF_SATURATION);
        let s01 = s0 * s1;
        let inverse = 1.0 / (s01 * s2);
        let inverse_01 = inverse * s2;
        let (i0, i1, i2) = (inverse_01 * s1, inverse_01 * s0, inverse * s01);
        c0[i] = (400.0 * p0 * i0).copysign(y0) + 0.1;
        c1[i] = (400.0 * p1 * i1).copysign(y1) + 0.1;
        c2[i] = (400.0 * p2 * i2).copysign(y2) + 0.1;
        if SLOPES {
            let x01 = x0 * x1;
            let inverse = SLOPE / (x01 * x2);
            let inverse_01 = inverse * x2;
            h0[i] = p0 * i0 * i0 * (inverse_01 * x1);
            h1[i] = p1 * i1 * i1 * (inverse_01 * x0);
            h2[i] = p2 * i2 * i2 * (inverse * x01);
        }
    }
}

#[inline(always)]
fn achromatic<const FMA: bool>(viewing: &Viewing, c0: f64, c1: f64, c2: f64) -> f64 {
    at_least(
        fma::<FMA>(2.0, c0, fma::<FMA>(0.05, c2, c1 - 0.305)) * viewing.achromatic_scale,
        LEAST_ACHROMATIC,
    )
}

#[inline(always)]
fn response_sum<const FMA: bool>(c0: f64, c1: f64, c2: f64) -> f64 {
    at_least(fma::<FMA>(1.05, c2, c0 + c1), LEAST_SUM)
}

/// Eccentricity times chroma, without a hue angle.
#[inline(always)]
fn eccentric<const FMA: bool>(a: f64, b: f64, length: f64) -> f64 {
    fma::<FMA>(0.25 * COS_2, a, fma::<FMA>(-0.25 * SIN_2, b, 0.95 * length))
}

#[inline(always)]
fn correlates<const FMA: bool>(viewing: &Viewing, stages: &mut Stages) {
    let [c0, c1, c2] = &stages.cone;
    let half_exponent = 0.5 * viewing.lightness_exponent;
    for i in 0..CES_LANES {
        let light = achromatic::<FMA>(viewing, c0[i], c1[i], c2[i]);
        let sum = response_sum::<FMA>(c0[i], c1[i], c2[i]);
        let (exponent, less, more) = split(light);
        let inverse = 1.0 / (more * sum);
        stages.lightness[i] = half_exponent * log2_of::<FMA>(exponent, less * (inverse * sum));
        let a = fma::<FMA>(c1[i], -12.0 / 11.0, fma::<FMA>(c2[i], 1.0 / 11.0, c0[i]));
        let b = fma::<FMA>(-2.0, c2[i], c0[i] + c1[i]) * (1.0 / 9.0);
        let length = fma::<FMA>(a, a, fma::<FMA>(b, b, 1e-18)).sqrt();
        let t = viewing.chroma_scale * eccentric::<FMA>(a, b, length) * (inverse * more);
        stages.colourfulness[i] = at_least(t, LEAST_RESPONSE);
        stages.a[i] = a;
        stages.b[i] = b;
        stages.length[i] = length;
    }
}

#[inline(always)]
fn powers<const FMA: bool>(viewing: &Viewing, stages: &mut Stages) {
    for i in 0..CES_LANES {
        let half = stages.lightness[i];
        let exponent = fma::<FMA>(0.9, log2::<FMA>(stages.colourfulness[i]), half);
        stages.colourfulness[i] = exp2::<FMA>(exponent) * viewing.colourfulness_scale;
        stages.lightness[i] = exp2::<FMA>(half + half);
    }
}

#[inline(always)]
fn coordinates<const FMA: bool>(stages: &mut Stages, [out_j, out_a, out_b]: [&mut Row; 3]) {
    for i in 0..CES_LANES {
        let (light, length) = (stages.lightness[i], stages.length[i]);
        let (exponent, less, more) = split(fma::<FMA>(STRETCH, stages.colourfulness[i], 1.0));
        let lightness_divisor = fma::<FMA>(0.7, light, 1.0);
        let more_length = more * length;
        let inverse = 1.0 / (more_length * lightness_divisor);
        let inverse_more_length = inverse * lightness_divisor;
        let logarithm = log2_of::<FMA>(exponent, less * (inverse_more_length * length));
        let factor = logarithm * LN2_OVER_STRETCH * (inverse_more_length * more);
        stages.factor[i] = factor;
        out_j[i] = 170.0 * light * (inverse * more_length);
        out_a[i] = factor * stages.a[i];
        out_b[i] = factor * stages.b[i];
    }
}

/// ΔE′ of each lane.
#[inline(always)]
pub(crate) fn differences<const FMA: bool>(
    jab: &[f64; 3 * CES_LANES],
    reference: &[f64; 3 * CES_LANES],
    out: &mut Row,
) {
    let ([j, a, b], [rj, ra, rb]) = (rows(jab), rows(reference));
    for i in 0..CES_LANES {
        let (dj, da, db) = (j[i] - rj[i], a[i] - ra[i], b[i] - rb[i]);
        out[i] = fma::<FMA>(dj, dj, fma::<FMA>(da, da, db * db)).sqrt();
    }
}

/// Turns colour differences into fidelities, 10·ln(1 + exp((100 − 6.73 ΔE′)/10)).
#[inline(always)]
pub(crate) fn fidelities<const FMA: bool>(differences: &mut [f64]) {
    const LOG2_E: f64 = std::f64::consts::LOG2_E;
    for value in differences {
        let x = (100.0 - FIDELITY_FACTOR * *value) * 0.1;
        // 2⁻⁹⁹⁰ is nothing beside one, and keeps the exponent in range.
        let rest = exp2::<FMA>(at_least(-x.abs() * LOG2_E, -990.0));
        *value = 10.0 * fma::<FMA>(log2::<FMA>(1.0 + rest), std::f64::consts::LN_2, at_least(x, 0.0));
    }
}

/// Adjoints of Σ ΔE′ᵢ/99 over J′ | a′ | b′; zero in the spare lanes.
#[inline(always)]
pub(crate) fn adjoints_of_mean_difference<const FMA: bool>(
    jab: &[f64; 3 * CES_LANES],
    reference: &[f64; 3 * CES_LANES],
    out: &mut Lanes<{ 3 * CES_LANES }>,
) {
    let ([j, a, b], [rj, ra, rb]) = (rows(jab), rows(reference));
    let [oj, oa, ob] = rows_mut(&mut out.0);
    for i in 0..CES_LANES {
        let (dj, da, db) = (j[i] - rj[i], a[i] - ra[i], b[i] - rb[i]);
        let inverse = (1.0 / 99.0) / fma::<FMA>(dj, dj, fma::<FMA>(da, da, fma::<FMA>(db, db, 1e-24))).sqrt();
        oj[i] = dj * inverse;
        oa[i] = da * inverse;
        ob[i] = db * inverse;
    }
    for i in 99..CES_LANES {
        oj[i] = 0.0;
        oa[i] = 0.0;
        ob[i] = 0.0;
    }
}

/// Turns adjoints over J′ | a′ | b′ into adjoints over R | G | B in place; returns those over the white's R, G, B.
/// The stages must have been left by [`forward`] with slopes.
#[inline(always)]
pub(crate) fn backward<const FMA: bool>(
    white: [f64; 3],
    rgb: &Lanes<{ 3 * CES_LANES }>,
    stages: &Stages,
    adjoints: &mut Lanes<{ 3 * CES_LANES }>,
) -> [f64; 3] {
    let viewing = &*VIEWING;
    let q = cones_from_rgb(viewing, white);
    let [c0, c1, c2] = &stages.cone;
    let [h0, h1, h2] = &stages.slope;
    let [gj, ga, gb] = rows_mut(&mut adjoints.0);
    let half_exponent = 0.5 * viewing.lightness_exponent;
    for i in 0..CES_LANES {
        let (a, b, length, light, colourful) =
            (stages.a[i], stages.b[i], stages.length[i], stages.lightness[i], stages.colourfulness[i]);
        let achromatic = achromatic::<FMA>(viewing, c0[i], c1[i], c2[i]);
        let sum = response_sum::<FMA>(c0[i], c1[i], c2[i]);
        let ecc = eccentric::<FMA>(a, b, length);
        let stretched = fma::<FMA>(STRETCH, colourful, 1.0);
        let lightness_divisor = fma::<FMA>(0.7, light, 1.0);
        // Six reciprocals from two divisions.
        let (length_light, ecc_sum) = (length * lightness_divisor, ecc * sum);
        let first = 1.0 / (length_light * stretched);
        let inverse_length = first * stretched * lightness_divisor;
        let inverse_light = first * stretched * length;
        let inverse_stretched = first * length_light;
        let second = 1.0 / (ecc_sum * achromatic);
        let inverse_ecc = second * achromatic * sum;
        let inverse_sum = second * achromatic * ecc;
        let inverse_achromatic = second * ecc_sum;

        let (ua, ub) = (a * inverse_length, b * inverse_length);
        // Along and across the direction of (a, b).
        let along = fma::<FMA>(ga[i], ua, gb[i] * ub);
        let across = stages.factor[i] * fma::<FMA>(gb[i], ua, -(ga[i] * ub));
        let by_log_m = along * colourful * inverse_stretched;
        let by_log_half = fma::<FMA>(gj[i] * 340.0 * light, inverse_light * inverse_light, by_log_m);
        let over_achromatic = half_exponent * viewing.achromatic_scale * by_log_half * inverse_achromatic;
        let over_ecc = 0.225 * by_log_m * inverse_ecc;
        let over_sum = -0.9 * by_log_m * inverse_sum;
        let over_a = fma::<FMA>(over_ecc, fma::<FMA>(3.8, ua, COS_2), -(across * ub));
        let over_b = fma::<FMA>(over_ecc, fma::<FMA>(3.8, ub, -SIN_2), across * ua) * (1.0 / 9.0);
        let common = over_achromatic + over_sum + over_b;
        let y0 = (common + over_achromatic + over_a) * h0[i];
        let y1 = fma::<FMA>(over_a, -12.0 / 11.0, common) * h1[i];
        let y2 = fma::<FMA>(
            0.05,
            over_achromatic,
            fma::<FMA>(1.05, over_sum, fma::<FMA>(1.0 / 11.0, over_a, -2.0 * over_b)),
        ) * h2[i];
        gj[i] = fma::<FMA>(q[0][0], y0, fma::<FMA>(q[1][0], y1, q[2][0] * y2));
        ga[i] = fma::<FMA>(q[0][1], y0, fma::<FMA>(q[1][1], y1, q[2][1] * y2));
        gb[i] = fma::<FMA>(q[0][2], y0, fma::<FMA>(q[1][2], y1, q[2][2] * y2));
    }
    let (adjoints, samples) = (rows(&adjoints.0), rows(&rgb.0));
    [
        -super::lanes::dot::<FMA, CES_LANES>(adjoints[0], samples[0]) / white[0],
        -super::lanes::dot::<FMA, CES_LANES>(adjoints[1], samples[1]) / white[1],
        -super::lanes::dot::<FMA, CES_LANES>(adjoints[2], samples[2]) / white[2],
    ]
}
