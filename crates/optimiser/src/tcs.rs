//! Ra and R9 at a fixed white: values, gradients, and bounds over a box of the free directions.
//!
//! With the white and the reference fixed, CIE 13.3 turns each sample into three linear forms of the blend, A, B and C, and
//! its Y: U* = 13 W A/C, V* = 13 W B/C, W* = 25 Y^⅓ − 17. Against a fixed direction e the colour shift projects to
//! S = W·Q with Q = (13(e₀A + e₁B) + e₂C)/C, a product of two functions whose differences from the centre are *exactly*
//! Q − Q₀ = (ν·δ)/C with ν = ∇(13(e₀A + e₁B) + e₂C) − Q₀∇C, and W − W₀ = slope·(∇Y·δ). So
//! S − S₀ = (W/C)(ν·δ) + Q₀·slope·(∇Y·δ), and intervals of the two scalar factors over the box give a tangent with a
//! second-order remainder, from below and from above.

use crate::lanes::{fma, pow};
use crate::models::Model;
use crate::region_proof::Slice;
use crate::space::Space;
use colour::{Observer, Reference, Tensor};

/// Samples 1–9, padded to a multiple of four.
pub(crate) const TCS: usize = 12;

/// Factor of Y in d = (1.708v + 0.404 − 1.481u)/v once u, v are written as X, Y, Z.
#[expect(clippy::approx_constant, reason = "CIE 13.3 gives this number; it is not e")]
const L_OF_Y: f64 = 2.718;

/// A, B, C, Y of each sample.
type Forms = [[f64; TCS]; 4];

/// Ra and R9 as functions of the free directions.
#[derive(Clone)]
pub(crate) struct TcsForms {
    base: Forms,
    along: Vec<Forms>,
    reference: [[f64; TCS]; 3],
    /// How far A, B and C may stray from being linear (0 where the white is fixed).
    stray: [[f64; TCS]; 3],
}

/// Both models of Ra and R9 around a point.
#[derive(Clone, Debug, Default)]
pub(crate) struct TcsModels {
    pub(crate) ra: Model,
    pub(crate) r9: Model,
}

impl TcsForms {
    /// Builds the forms for emitters (unit power) at the white of `space`.
    pub(crate) fn new(emitters: &[Tensor], space: &Space, reference: &Reference) -> TcsForms {
        let ur = reference.white_uv();
        let (cr, dr) = ((4.0 - ur.u - 10.0 * ur.v) / ur.v, (1.708 * ur.v + 0.404 - 1.481 * ur.u) / ur.v);
        // Of the white only its chromaticity and Y matter; both are fixed.
        let w = space.white;
        let (ck, dk) = (2.0 * w[2] / w[1], L_OF_Y - 0.92 * w[0] / w[1] + 0.202 * w[2] / w[1]);
        let (al, be) = (cr / ck, dr / dk);
        let ky = 100.0 / w[1];
        let of = |t: &Tensor| -> Forms {
            let xyz = t.tcs_xyz();
            let mut f = [[0.0; TCS]; 4];
            for i in 0..TCS {
                let s = xyz[i.min(8)];
                let l = L_OF_Y * s.y - 0.92 * s.x + 0.202 * s.z;
                let c = 16.518 * s.y + 2.962 * al * s.z - be * l;
                f[0][i] = ky * (10.872 * s.y + 0.808 * al * s.z - 4.0 * be * l - ur.u * c);
                f[1][i] = ky * (5.52 * s.y - ur.v * c);
                f[2][i] = ky * c;
                f[3][i] = ky * s.y;
            }
            f
        };
        let each: Vec<Forms> = emitters.iter().map(of).collect();
        let combine = |weights: &[f64]| {
            let mut f = [[0.0; TCS]; 4];
            for (e, w) in each.iter().zip(weights) {
                for k in 0..4 {
                    for i in 0..TCS {
                        f[k][i] += w * e[k][i];
                    }
                }
            }
            f
        };
        let mut r = [[0.0; TCS]; 3];
        for i in 0..TCS {
            let uvw = reference.tcs_uvw(i.min(8));
            for k in 0..3 {
                r[k][i] = uvw[k];
            }
        }
        TcsForms {
            base: combine(&space.origin),
            along: (0..space.d).map(|j| combine(space.direction(j))).collect(),
            reference: r,
            stray: [[0.0; TCS]; 3],
        }
    }

    /// Ra and R9 at a point, with gradients in `out.*.grad`.
    #[inline(always)]
    pub(crate) fn point<const F: bool>(&self, t: &[f64], out: &mut TcsModels) {
        self.around::<F, false, false>(t, t, out);
    }

    /// Models over the box centre ± radius. `HIGH` adds the bound from above on the shifts (for upper limits).
    #[inline(always)]
    pub(crate) fn around<const F: bool, const BOX: bool, const HIGH: bool>(
        &self,
        centre: &[f64],
        radius: &[f64],
        out: &mut TcsModels,
    ) {
        let d = self.along.len();
        let mut f = self.base;
        let mut half = [[0.0; TCS]; 4];
        for j in 0..d {
            let (q, c) = (&self.along[j], centre[j]);
            for k in 0..4 {
                for i in 0..TCS {
                    f[k][i] = fma::<F>(c, q[k][i], f[k][i]);
                }
            }
            if BOX {
                let r = radius[j];
                for k in 2..4 {
                    for i in 0..TCS {
                        half[k][i] = fma::<F>(r, q[k][i].abs(), half[k][i]);
                    }
                }
            }
        }
        if BOX {
            for i in 0..TCS {
                half[2][i] += self.stray[2][i];
            }
        }
        let mut low = [0.0; TCS];
        let mut high = [0.0; TCS];
        // coefficients on ∇A, ∇B, ∇C, ∇Y
        let mut co = [[0.0; TCS]; 4];
        // ν = n0∇A + n1∇B + n2∇C and the radii of the two factors
        let mut nu = [[0.0; TCS]; 3];
        let mut rad = [[0.0; TCS]; 2];
        let mut side = [[0.0; TCS]; 4];
        for i in 0..TCS {
            let (a, b, c, y) = (f[0][i], f[1][i], f[2][i], f[3][i]);
            let y = y.max(1e-9);
            let c = if c.abs() < 1e-9 { 1e-9 } else { c };
            let cube = pow::<F>(y, 1.0 / 3.0);
            let w = fma::<F>(25.0, cube, -17.0);
            let slope = 25.0 / 3.0 / (cube * cube);
            let ic = 1.0 / c;
            let (ac, bc) = (a * ic, b * ic);
            let (du, dv, dw) = (
                13.0 * w * ac - self.reference[0][i],
                13.0 * w * bc - self.reference[1][i],
                w - self.reference[2][i],
            );
            let n = (du * du + dv * dv + dw * dw + 1e-24).sqrt();
            let is = 1.0 / n;
            let (e0, e1, e2) = (13.0 * du * is, 13.0 * dv * is, dw * is);
            let q = e0 * ac + e1 * bc + e2;
            let (mut k1, mut k2) = (w * ic, q * slope);
            nu[0][i] = e0;
            nu[1][i] = e1;
            nu[2][i] = e2 - q;
            if BOX {
                let (rc, ry) = (half[2][i], half[3][i]);
                let (cl, ch) = (c - rc, c + rc);
                let (yl, yh) = (y - ry, y + ry);
                let sound = cl > 1e-7 && yl > 1e-4;
                let (cl, yl) = (cl.max(1e-7), yl.max(1e-4));
                let ql = pow::<F>(yl, 1.0 / 3.0);
                let wl = fma::<F>(25.0, ql, -17.0);
                // W is concave: its chord is below the tangent
                let wh = w + slope * (yh - y);
                let (icl, ich) = (1.0 / cl, 1.0 / ch);
                let lo = (wl * ich).min(wl * icl);
                let hi = (wh * ich).max(wh * icl);
                // slope of W between the centre and y: W′ is convex and falls
                let slope_high = 0.5 * (25.0 / 3.0 / (ql * ql) + slope);
                let slope_low = slope * (1.0 - ry / (3.0 * y)).max(0.0);
                k1 = 0.5 * (lo + hi);
                rad[0][i] = 0.5 * (hi - lo);
                k2 = q * 0.5 * (slope_high + slope_low);
                rad[1][i] = q.abs() * 0.5 * (slope_high - slope_low);
                side[2][i] = lo.abs().max(hi.abs());
                if HIGH {
                    side[0][i] = ac;
                    side[1][i] = bc;
                    side[3][i] = slope_high * ry;
                }
                low[i] = if sound { n } else { f64::NEG_INFINITY };
                high[i] = if sound { n } else { f64::INFINITY };
            } else {
                low[i] = n;
            }
            co[0][i] = k1 * e0;
            co[1][i] = k1 * e1;
            co[2][i] = k1 * (e2 - q);
            co[3][i] = k2;
        }
        let (mut reach_n, mut reach_y) = ([0.0; TCS], [0.0; TCS]);
        let (mut reach_a, mut reach_b) = ([0.0; TCS], [0.0; TCS]);
        for j in 0..d {
            let q = &self.along[j];
            let mut g = [0.0; TCS];
            for i in 0..TCS {
                g[i] = fma::<F>(
                    co[0][i],
                    q[0][i],
                    fma::<F>(co[1][i], q[1][i], fma::<F>(co[2][i], q[2][i], co[3][i] * q[3][i])),
                );
            }
            if BOX {
                let r = radius[j];
                for i in 0..TCS {
                    let v = fma::<F>(nu[0][i], q[0][i], fma::<F>(nu[1][i], q[1][i], nu[2][i] * q[2][i]));
                    reach_n[i] = fma::<F>(r, v.abs(), reach_n[i]);
                    reach_y[i] = fma::<F>(r, q[3][i].abs(), reach_y[i]);
                    if HIGH {
                        reach_a[i] = fma::<F>(r, (q[0][i] - side[0][i] * q[2][i]).abs(), reach_a[i]);
                        reach_b[i] = fma::<F>(r, (q[1][i] - side[1][i] * q[2][i]).abs(), reach_b[i]);
                    }
                }
            }
            let sum = ((g[0] + g[4]) + (g[1] + g[5])) + ((g[2] + g[6]) + (g[3] + g[7]));
            out.ra.grad[j] = -4.6 / 8.0 * sum;
            out.r9.grad[j] = -4.6 * g[8];
        }
        if !BOX {
            let ra = 100.0 - 4.6 / 8.0 * low[..8].iter().sum::<f64>();
            out.ra.set_point(ra);
            out.r9.set_point(100.0 - 4.6 * low[8]);
            return;
        }
        for i in 0..TCS {
            let bent = nu[0][i].abs() * self.stray[0][i]
                + nu[1][i].abs() * self.stray[1][i]
                + nu[2][i].abs() * self.stray[2][i];
            let rem = rad[0][i] * reach_n[i] + rad[1][i] * reach_y[i] + side[2][i] * bent;
            low[i] -= rem;
            if HIGH {
                let wy = side[3][i];
                let (ra, rb) = (
                    reach_a[i] + self.stray[0][i] + side[0][i].abs() * self.stray[2][i],
                    reach_b[i] + self.stray[1][i] + side[1][i].abs() * self.stray[2][i],
                );
                let u = 13.0 * (side[2][i] * ra + side[0][i].abs() * wy);
                let v = 13.0 * (side[2][i] * rb + side[1][i].abs() * wy);
                let move_ = (u * u + v * v + wy * wy).sqrt();
                let n = high[i];
                let across = if n > 2.0 * move_ { move_ * move_ / (2.0 * (n - move_)) } else { 2.0 * move_ };
                high[i] += rem + across;
            }
        }
        let mean_low = 1.0 / 8.0 * low[..8].iter().sum::<f64>();
        out.ra.upper = 100.0 - 4.6 * mean_low;
        out.r9.upper = 100.0 - 4.6 * low[8];
        if HIGH {
            out.ra.lower = 100.0 - 4.6 / 8.0 * high[..8].iter().sum::<f64>();
            out.r9.lower = 100.0 - 4.6 * high[8];
        } else {
            out.ra.lower = f64::NEG_INFINITY;
            out.r9.lower = f64::NEG_INFINITY;
        }
    }
}

/// Y, Z, L of each sample and c, d of the white.
#[derive(Clone, Copy)]
struct Plain {
    yzl: [[f64; TCS]; 3],
    cd: [f64; 2],
}

/// Reference numbers of one CCT.
#[derive(Clone)]
struct At {
    c: f64,
    d: f64,
    u: f64,
    v: f64,
    uvw: [[f64; TCS]; 3],
}

impl At {
    fn of(reference: &Reference) -> At {
        let w = reference.white_uv();
        let mut uvw = [[0.0; TCS]; 3];
        for i in 0..TCS {
            let r = reference.tcs_uvw(i.min(8));
            for k in 0..3 {
                uvw[k][i] = r[k];
            }
        }
        At {
            c: (4.0 - w.u - 10.0 * w.v) / w.v,
            d: (1.708 * w.v + 0.404 - 1.481 * w.u) / w.v,
            u: w.u,
            v: w.v,
            uvw,
        }
    }
}

/// Ra and R9 where the white may move inside a slice of CCT.
///
/// With Y = 1 the c and d of the white are linear in the blend, so the adapted sample is a ratio of linear forms whose difference from the centre is exact up to
/// the spread of 1/c and 1/d in the box. The reference moves with the CCT: what that does to a sample is bounded by intervals at both ends of the slice.
#[derive(Clone)]
pub(crate) struct MovingTcs {
    base: Plain,
    along: Vec<Plain>,
    middle: At,
    ends: [At; 2],
}

/// The reference bends so little within a slice that its ends bound it; this much is added.
const BEND: f64 = 1.05;

impl MovingTcs {
    pub(crate) fn new(emitters: &[Tensor], space: &Space, slice: &Slice) -> MovingTcs {
        let each: Vec<Plain> = emitters
            .iter()
            .map(|t| {
                let xyz = t.tcs_xyz();
                let mut p = Plain { yzl: [[0.0; TCS]; 3], cd: [0.0; 2] };
                for i in 0..TCS {
                    let s = xyz[i.min(8)];
                    p.yzl[0][i] = 100.0 * s.y;
                    p.yzl[1][i] = 100.0 * s.z;
                    p.yzl[2][i] = 100.0 * (L_OF_Y * s.y - 0.92 * s.x + 0.202 * s.z);
                }
                let w = xyz2(t);
                p.cd = [2.0 * w[2], L_OF_Y * w[1] - 0.92 * w[0] + 0.202 * w[2]];
                p
            })
            .collect();
        let combine = |weights: &[f64]| {
            let mut p = Plain { yzl: [[0.0; TCS]; 3], cd: [0.0; 2] };
            for (e, w) in each.iter().zip(weights) {
                for k in 0..3 {
                    for i in 0..TCS {
                        p.yzl[k][i] += w * e.yzl[k][i];
                    }
                }
                for k in 0..2 {
                    p.cd[k] += w * e.cd[k];
                }
            }
            p
        };
        MovingTcs {
            base: combine(&space.origin),
            along: (0..space.d).map(|j| combine(space.direction(j))).collect(),
            middle: At::of(&slice.middle),
            ends: [At::of(&slice.ends[0]), At::of(&slice.ends[1])],
        }
    }

    /// Linear forms round a centre, what they leave out, and how far the reference can shift each sample.
    fn local(&self, centre: &[f64], radius: Option<&[f64]>) -> Option<(TcsForms, [f64; TCS])> {
        let d = self.along.len();
        let mut at = self.base;
        let mut cd_half = [0.0; 2];
        for j in 0..d {
            for k in 0..3 {
                for i in 0..TCS {
                    at.yzl[k][i] += centre[j] * self.along[j].yzl[k][i];
                }
            }
            for k in 0..2 {
                at.cd[k] += centre[j] * self.along[j].cd[k];
                cd_half[k] += radius.map_or(0.0, |r| r[j]) * self.along[j].cd[k].abs();
            }
        }
        if (0..2).any(|k| at.cd[k] - cd_half[k] <= 0.05 * at.cd[k].abs()) {
            return None;
        }
        let (mut omega, mut spread) = ([0.0; 2], [0.0; 2]);
        for k in 0..2 {
            let (lo, hi) = (1.0 / (at.cd[k] + cd_half[k]), 1.0 / (at.cd[k] - cd_half[k]));
            omega[k] = 0.5 * (lo + hi);
            spread[k] = 0.5 * (hi - lo);
        }
        let m = &self.middle;
        let (zc, lc) = (
            std::array::from_fn::<f64, TCS, _>(|i| at.yzl[1][i] / at.cd[0]),
            std::array::from_fn::<f64, TCS, _>(|i| at.yzl[2][i] / at.cd[1]),
        );
        let forms = |y: f64, z: f64, l: f64| {
            let c = 16.518 * y + 2.962 * m.c * z - m.d * l;
            [10.872 * y + 0.808 * m.c * z - 4.0 * m.d * l - m.u * c, 5.52 * y - m.v * c, c, y]
        };
        let mut base = [[0.0; TCS]; 4];
        for i in 0..TCS {
            let f = forms(at.yzl[0][i], zc[i], lc[i]);
            for k in 0..4 {
                base[k][i] = f[k];
            }
        }
        let mut reach = [[0.0; TCS]; 3];
        let mut along = Vec::with_capacity(d);
        for j in 0..d {
            let q = &self.along[j];
            let r = radius.map_or(0.0, |r| r[j]);
            let mut f = [[0.0; TCS]; 4];
            for i in 0..TCS {
                let gz = q.yzl[1][i] - zc[i] * q.cd[0];
                let gl = q.yzl[2][i] - lc[i] * q.cd[1];
                let g = forms(q.yzl[0][i], omega[0] * gz, omega[1] * gl);
                for k in 0..4 {
                    f[k][i] = g[k];
                    base[k][i] -= centre[j] * g[k];
                }
                reach[0][i] += r * q.yzl[0][i].abs();
                reach[1][i] += r * gz.abs();
                reach[2][i] += r * gl.abs();
            }
            along.push(f);
        }
        let mut stray = [[0.0; TCS]; 3];
        let mut slack = [0.0; TCS];
        for i in 0..TCS {
            let (ez, el) = (spread[0] * reach[1][i], spread[1] * reach[2][i]);
            let c = 2.962 * m.c * ez + m.d * el;
            stray[2][i] = c;
            stray[0][i] = 0.808 * m.c * ez + 4.0 * m.d * el + m.u * c;
            stray[1][i] = m.v * c;
            // what the reference does between the middle and the ends of the slice
            let span = |x: f64, r: f64| [x - r, x + r];
            let y = span(at.yzl[0][i], reach[0][i]);
            let y = [y[0].max(1e-6), y[1]];
            let z = span(zc[i], (omega[0] + spread[0]) * reach[1][i]);
            let l = span(lc[i], (omega[1] + spread[1]) * reach[2][i]);
            let den = sum(scaled(y, 16.518), sum(scaled(z, 2.962 * m.c), scaled(l, -m.d)));
            let den = [den[0].max(1e-6), den[1].max(2e-6)];
            let num = sum(scaled(y, 10.872), sum(scaled(z, 0.808 * m.c), scaled(l, -4.0 * m.d)));
            let inv = [1.0 / den[1], 1.0 / den[0]];
            let (u, v) = (times(num, inv), times(scaled(y, 5.52), inv));
            let w = [25.0 * y[0].cbrt() - 17.0, 25.0 * y[1].cbrt() - 17.0];
            for end in &self.ends {
                let (dc, dd) = (end.c - m.c, end.d - m.d);
                let more = sum(scaled(z, 2.962 * dc), scaled(l, -dd));
                let new = sum(den, more);
                let new = [new[0].max(1e-6), new[1].max(2e-6)];
                let inv = [1.0 / new[1], 1.0 / new[0]];
                // u(new) − u = (0.808 Δc ζ − 4 Δd λ − u·(2.962 Δc ζ − Δd λ)) / C(new)
                let du = times(
                    sum(sum(scaled(z, 0.808 * dc), scaled(l, -4.0 * dd)), scaled(times(u, more), -1.0)),
                    inv,
                );
                let dv = times(scaled(times(v, more), -1.0), inv);
                let shift = |d: [f64; 2], white: f64, sample: f64| {
                    let s = sum(scaled(times(w, sum(d, [-white, -white])), 13.0), [-sample, -sample]);
                    s[0].abs().max(s[1].abs())
                };
                let a = shift(du, end.u - m.u, end.uvw[0][i] - m.uvw[0][i]);
                let b = shift(dv, end.v - m.v, end.uvw[1][i] - m.uvw[1][i]);
                let c = (end.uvw[2][i] - m.uvw[2][i]).abs();
                slack[i] = BEND * (a * a + b * b + c * c).sqrt().max(slack[i] / BEND);
            }
        }
        Some((TcsForms { base, along, reference: m.uvw, stray }, slack))
    }

    /// Ra and R9 at a point, against the reference in the middle of the slice.
    #[inline(always)]
    pub(crate) fn point<const F: bool>(&self, t: &[f64], out: &mut TcsModels) {
        if let Some((forms, _)) = self.local(t, None) {
            forms.point::<F>(t, out);
        }
    }

    /// Models over a box, whatever the CCT inside the slice.
    #[inline(always)]
    pub(crate) fn around<const F: bool>(&self, centre: &[f64], radius: &[f64], out: &mut TcsModels) {
        let Some((forms, slack)) = self.local(centre, Some(radius)) else {
            *out = TcsModels::default();
            return;
        };
        forms.around::<F, true, true>(centre, radius, out);
        let mean = 4.6 / 8.0 * slack[..8].iter().sum::<f64>();
        out.ra.upper += mean;
        out.ra.lower -= mean;
        out.r9.upper += 4.6 * slack[8];
        out.r9.lower -= 4.6 * slack[8];
    }
}

fn sum(a: [f64; 2], b: [f64; 2]) -> [f64; 2] {
    [a[0] + b[0], a[1] + b[1]]
}

fn scaled(a: [f64; 2], k: f64) -> [f64; 2] {
    if k >= 0.0 { [k * a[0], k * a[1]] } else { [k * a[1], k * a[0]] }
}

fn times(a: [f64; 2], b: [f64; 2]) -> [f64; 2] {
    let q = [a[0] * b[0], a[0] * b[1], a[1] * b[0], a[1] * b[1]];
    [q.iter().copied().fold(f64::INFINITY, f64::min), q.iter().copied().fold(f64::NEG_INFINITY, f64::max)]
}

/// 2° tristimulus values as an array.
pub(crate) fn xyz2(t: &Tensor) -> [f64; 3] {
    let x = t.xyz(Observer::Cie1931);
    [x.x, x.y, x.z]
}
