//! CIE 13.3 over sixteen lanes (fifteen samples and a spare).
//!
//! With a sample's Y, Z and L = 2.718 Y − 0.92 X + 0.202 Z the standard's c is 2Z/Y and its d is L/Y, so adapted u and
//! v are quotients of linear forms in Y, Z, L: one division a sample.

use super::lanes::sum16;
use super::maths::{fma, pow};
use crate::reference::Reference;
use crate::tensor::{ADAPTATION_L, adaptation_l};

const LANES: usize = 16;

/// The white's part of the adaptation.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Adaptation {
    /// c of the reference over c of the white.
    alpha: f64,
    /// d of the reference over d of the white.
    beta: f64,
    /// 100/Y of the white.
    scale: f64,
    white: [f64; 3],
    white_l: f64,
}

impl Adaptation {
    #[inline(always)]
    pub(crate) fn new(white: [f64; 3], reference: &Reference) -> Adaptation {
        let [x, y, z] = white;
        let white_l = adaptation_l(x, y, z);
        let (u, v) = (reference.white.u, reference.white.v);
        let c_reference = (4.0 - u - 10.0 * v) / v;
        let d_reference = (1.708 * v + 0.404 - 1.481 * u) / v;
        Adaptation {
            alpha: c_reference * y / (2.0 * z),
            beta: d_reference * y / white_l,
            scale: 100.0 / y,
            white,
            white_l,
        }
    }
}

/// ΔE of each sample.
#[inline(always)]
pub(crate) fn differences<const FMA: bool>(
    adaptation: &Adaptation,
    samples: &[f64; 3 * LANES],
    reference: &Reference,
    out: &mut [f64; LANES],
) {
    let (u0, v0) = (reference.white.u, reference.white.v);
    let r = &reference.tcs_uvw;
    let (z_u, z_d) = (0.808 * adaptation.alpha, 2.962 * adaptation.alpha);
    for i in 0..LANES {
        let (y, z, bl) = (samples[i], samples[LANES + i], adaptation.beta * samples[2 * LANES + i]);
        let inverse = 1.0 / fma::<FMA>(16.518, y, fma::<FMA>(z_d, z, -bl));
        let w = fma::<FMA>(25.0, pow::<FMA>(adaptation.scale * y, 1.0 / 3.0), -17.0);
        let k = 13.0 * w;
        let u = fma::<FMA>(10.872, y, fma::<FMA>(z_u, z, -4.0 * bl)) * inverse;
        let v = 5.52 * y * inverse;
        let du = fma::<FMA>(k, u - u0, -r[i]);
        let dv = fma::<FMA>(k, v - v0, -r[LANES + i]);
        let dw = w - r[2 * LANES + i];
        out[i] = fma::<FMA>(du, du, fma::<FMA>(dv, dv, dw * dw)).sqrt();
    }
}

/// Adjoints of Σ weightᵢ·ΔEᵢ over the samples' Y | Z | L and over the white's X, Y, Z.
#[inline(always)]
pub(crate) fn adjoints<const FMA: bool>(
    adaptation: &Adaptation,
    samples: &[f64; 3 * LANES],
    reference: &Reference,
    weights: &[f64; LANES],
    out: &mut [f64; 3 * LANES],
) -> [f64; 3] {
    let (u0, v0) = (reference.white.u, reference.white.v);
    let r = &reference.tcs_uvw;
    let Adaptation { alpha, beta, scale, white, white_l } = *adaptation;
    let (z_u, z_d) = (0.808 * alpha, 2.962 * alpha);
    let mut over_alpha = [0.0; LANES];
    let mut over_beta = [0.0; LANES];
    let mut over_scale = [0.0; LANES];
    for i in 0..LANES {
        let (y, z, l) = (samples[i], samples[LANES + i], samples[2 * LANES + i]);
        let bl = beta * l;
        let inverse = 1.0 / fma::<FMA>(16.518, y, fma::<FMA>(z_d, z, -bl));
        let root = 25.0 * pow::<FMA>(scale * y, 1.0 / 3.0);
        let w = root - 17.0;
        let k = 13.0 * w;
        let u = fma::<FMA>(10.872, y, fma::<FMA>(z_u, z, -4.0 * bl)) * inverse;
        let v = 5.52 * y * inverse;
        let du = fma::<FMA>(k, u - u0, -r[i]);
        let dv = fma::<FMA>(k, v - v0, -r[LANES + i]);
        let dw = w - r[2 * LANES + i];
        // The tiny addend keeps a perfect sample from dividing by zero; its slope is then zero.
        let per_length =
            weights[i] / fma::<FMA>(du, du, fma::<FMA>(dv, dv, fma::<FMA>(dw, dw, 1e-24))).sqrt();
        let (eu, ev, ew) = (du * per_length, dv * per_length, dw * per_length);
        // Over ln Y, by way of W*.
        let by_lightness = (ew + 13.0 * (eu * (u - u0) + ev * (v - v0))) * root * (1.0 / 3.0);
        let (over_nu, over_nv) = (eu * k * inverse, ev * k * inverse);
        let over_d = -(over_nu * u + over_nv * v);
        let over_z = 0.808 * over_nu + 2.962 * over_d;
        let over_l = -4.0 * over_nu - over_d;
        out[i] = by_lightness / y + 10.872 * over_nu + 5.52 * over_nv + 16.518 * over_d;
        out[LANES + i] = over_z * alpha;
        out[2 * LANES + i] = over_l * beta;
        over_alpha[i] = over_z * z;
        over_beta[i] = over_l * l;
        over_scale[i] = by_lightness;
    }
    let by_alpha = sum16(&over_alpha) * alpha;
    let by_beta = sum16(&over_beta) * beta;
    let [_, y, z] = white;
    [
        -ADAPTATION_L[0] * by_beta / white_l,
        (by_alpha + by_beta - sum16(&over_scale)) / y - ADAPTATION_L[1] * by_beta / white_l,
        -by_alpha / z - ADAPTATION_L[2] * by_beta / white_l,
    ]
}
