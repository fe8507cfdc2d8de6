//! Colour rendering index of CIE 13.3-1995: Ra and R1–R15.

use crate::kernel::{Arithmetic, tcs_differences};
use crate::observer::Observer;
use crate::reference::Reference;
use crate::tensor::Tensor;

/// Distance from the reference (CIE 1960 u, v) beyond which CIE 13.3 calls its values uncertain.
pub const GREATEST_REFERENCE_DISTANCE_UV: f64 = 5.4e-3;

/// CIE 13.3 rendering of a light.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Cri {
    /// General index: the mean of R1–R8.
    pub ra: f64,
    /// Special indices R1–R15 (R15: Japanese complexion). 100 is perfect; negative values occur.
    pub r: [f64; 15],
    /// Distance of the light from its reference in CIE 1960 u, v; above 5.4e-3 the standard calls the values uncertain.
    pub reference_distance_uv: f64,
}

/// CIE 13.3 Ra and R1–R15 of a light against a reference.
///
/// von Kries adaptation in u, v with c = (4 − u − 10v)/v, d = (1.708v + 0.404 − 1.481u)/v; W* = 25 Y^⅓ − 17,
/// U* = 13W*(u−u₀), V* = 13W*(v−v₀); Rᵢ = 100 − 4.6 ΔEᵢ. Nothing is rounded or clamped.
/// *Source:* CIE 13.3-1995; sample 15 as JIS Z 8726 / CIE 2024 data set.
pub fn cri(light: &Tensor, reference: &Reference) -> Cri {
    cri_with(light, reference, Arithmetic::Dispatched)
}

/// [`cri`] with a chosen instruction set.
pub fn cri_with(light: &Tensor, reference: &Reference, arithmetic: Arithmetic) -> Cri {
    let differences = tcs_differences(light, reference, arithmetic);
    let r: [f64; 15] = std::array::from_fn(|i| 100.0 - 4.6 * differences[i]);
    let distance = light.xyz(Observer::Cie1931).uv().distance(reference.white_uv());
    Cri { ra: r[..8].iter().sum::<f64>() / 8.0, r, reference_distance_uv: distance }
}

/// [`cri`] as the standard writes it, in plain scalar arithmetic: the yardstick of the fast path.
pub fn cri_plain(light: &Tensor, reference: &Reference) -> Cri {
    let white_xyz = light.xyz(Observer::Cie1931);
    let white = white_xyz.uv();
    let c = |u: f64, v: f64| (4.0 - u - 10.0 * v) / v;
    let d = |u: f64, v: f64| (1.708 * v + 0.404 - 1.481 * u) / v;
    let to = reference.white_uv();
    let (c_ratio, d_ratio) = (c(to.u, to.v) / c(white.u, white.v), d(to.u, to.v) / d(white.u, white.v));
    let samples = light.tcs_xyz();
    let r = std::array::from_fn(|i| {
        let sample = samples[i];
        let uv = sample.uv();
        let (ci, di) = (c_ratio * c(uv.u, uv.v), d_ratio * d(uv.u, uv.v));
        let denominator = 16.518 + 1.481 * ci - di;
        let u = (10.872 + 0.404 * ci - 4.0 * di) / denominator;
        let v = 5.520 / denominator;
        let w = 25.0 * (100.0 * sample.y / white_xyz.y).cbrt() - 17.0;
        let [u_ref, v_ref, w_ref] = reference.tcs_uvw(i);
        let du = 13.0 * w * (u - to.u) - u_ref;
        let dv = 13.0 * w * (v - to.v) - v_ref;
        let dw = w - w_ref;
        100.0 - 4.6 * (du * du + dv * dv + dw * dw).sqrt()
    });
    Cri { ra: r[..8].iter().sum::<f64>() / 8.0, r, reference_distance_uv: white.distance(to) }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::illuminant::planckian_grid;

    #[test]
    fn the_reference_itself_renders_perfectly() {
        let light = Tensor::of_grid(&planckian_grid(3000.0));
        let rendering = cri(&light, &Reference::exact(3000.0));
        assert!((rendering.ra - 100.0).abs() < 1e-9);
        assert!(rendering.r.iter().all(|r| (r - 100.0).abs() < 1e-9));
        assert!(rendering.reference_distance_uv < 1e-12);
    }

    #[test]
    fn power_does_not_matter() {
        let light = Tensor::of_grid(&planckian_grid(2500.0));
        let reference = Reference::exact(3000.0);
        let (one, many) = (cri(&light, &reference), cri(&light.scaled(1e-7), &reference));
        assert!((one.ra - many.ra).abs() < 1e-10);
    }
}
