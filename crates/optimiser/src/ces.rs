//! Rf and Rg at a fixed white: values, gradients, and bounds over a box of the free directions.
//!
//! With full adaptation a sample enters CIECAM02 only through its ratios to the white, gₘ = Rₘ/Wₘ (CAT02, 10°). Both are
//! linear in the blend, so gₘ − gₘ₀ = (∇Rₘ − gₘ₀∇Wₘ)·δ / Wₘ is exact, and the 10° white hardly moves. From there on the
//! sample's colour is a function of three cone responses aₖ = φ(xₖ), x = H g:
//!
//! * φ is concave with a convex derivative, so aₖ lies between its tangent and the tangent less a known κₖ;
//! * against a fixed direction e, S(a) = e₀J′ + M′(e·u) with u the hue direction has the gradient
//!   Sₖ = e₀J′_A αₖ + M/(1+βM) (e·u) mₖ + (M′/C)(e·u⊥)(u⊥·cₖ), mₖ = ∂ln M/∂aₖ. How far each factor can stray inside the box is bounded
//!   by centre ± deviation; deviations are convex along the ray from the centre, so their mean over the ray is at most half.
//!
//! The mean colour difference then has a tangent with a second-order remainder; for e along the shift the projection bounds
//! its length from below. Rg is the area of a polygon of bin means: a projection of every sample on a fixed direction, plus
//! products of bin movements.

use crate::lanes::{dot, exp2, fma, log2, pow};
use crate::models::{MOST, Model};
use crate::space::Space;
use crate::viewing::{CAT02, Viewing};
use colour::{Observer, Reference, Tensor};

/// The 99 samples padded to a multiple of eight.
pub(crate) const CES: usize = 104;
const SAMPLES: usize = 99;
const BINS: usize = 16;
type Lane = [f64; CES];
type Lanes3 = [Lane; 3];

/// Coefficients of redness, yellowness and the divisor of t in the cone responses (CIE 159:2004).
const RED: [f64; 3] = [1.0, -12.0 / 11.0, 1.0 / 11.0];
const YELLOW: [f64; 3] = [1.0 / 9.0, 1.0 / 9.0, -2.0 / 9.0];
const DIVISOR: [f64; 3] = [1.0, 1.0, 1.05];
const BETA: f64 = 0.0228;
const ONES: Lane = [1.0; CES];
/// Fidelity points per unit of mean colour difference (CIE 224:2017).
const FACTOR: f64 = 6.73;

/// Rf and Rg as functions of the free directions.
#[derive(Clone)]
pub(crate) struct CesForms {
    view: Viewing,
    white: [f64; 3],
    white_along: Vec<[f64; 3]>,
    base: Box<Lanes3>,
    along: Vec<Lanes3>,
    reference: Box<Lanes3>,
    /// 1/99 for the samples, 0 for the padding.
    weight: Box<Lane>,
    bin: [usize; SAMPLES],
    bin_count: [f64; BINS],
    reference_area: f64,
}

/// What a call is to deliver.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(crate) struct CesWants {
    /// Bound the colour difference from above too (upper limits on Rf).
    pub(crate) rf_high: bool,
    /// Rg as well.
    pub(crate) rg: bool,
}

/// Models of the mean colour difference with its sign turned (so that more is better) and of Rg.
#[derive(Clone, Debug, Default)]
pub(crate) struct CesModels {
    /// −mean ΔE′.
    pub(crate) rf: Model,
    pub(crate) rg: Model,
}

/// Scratch lanes, one set a thread.
#[derive(Clone)]
pub(crate) struct CesWork {
    g: Lanes3,
    x: Lanes3,
    gamma: Lanes3,
    reach: Lanes3,
    a: Lanes3,
    slope: Lanes3,
    kappa: Lanes3,
    a_reach: Lanes3,
    white_slack: Lanes3,
    qq: Lane,
    m: Lane,
    mp: Lane,
    sound: Lane,
    jab: Lanes3,
    pull: [Lane; 2],
    rf_co: Lanes3,
    rg_co: Lanes3,
    rf_low: Lane,
    rf_high: Lane,
    rg_low: Lane,
    rg_high: Lane,
    stray: Lane,
}

impl Default for CesWork {
    fn default() -> CesWork {
        let z3 = [[0.0; CES]; 3];
        let z = [0.0; CES];
        CesWork {
            g: z3,
            x: z3,
            gamma: z3,
            reach: z3,
            a: z3,
            slope: z3,
            kappa: z3,
            a_reach: z3,
            white_slack: z3,
            qq: z,
            m: z,
            mp: z,
            sound: z,
            jab: z3,
            pull: [z; 2],
            rf_co: z3,
            rg_co: z3,
            rf_low: z,
            rf_high: z,
            rg_low: z,
            rg_high: z,
            stray: z,
        }
    }
}

/// Rf of a mean colour difference: 10 ln(1 + exp((100 − 6.73 ΔE)/10)).
pub(crate) fn rf_of(delta: f64) -> f64 {
    let x = (100.0 - FACTOR * delta) / 10.0;
    10.0 * (x.max(0.0) + (-x.abs()).exp().ln_1p())
}

/// Mean colour difference of an Rf. Values at or below 0 give +∞.
pub(crate) fn delta_of(rf: f64) -> f64 {
    if rf <= 0.0 {
        return f64::INFINITY;
    }
    let y = rf / 10.0;
    // ln(eʸ − 1) without overflow
    let ln = y + (-(-y).exp()).ln_1p();
    (100.0 - 10.0 * ln) / FACTOR
}

impl CesForms {
    /// Builds the forms for emitters (unit power) at the white of `space`.
    pub(crate) fn new(emitters: &[Tensor], space: &Space, reference: &Reference) -> CesForms {
        let each: Vec<(Lanes3, [f64; 3])> = emitters
            .iter()
            .map(|t| {
                let rgb = t.ces_rgb();
                let mut l = [[0.0; CES]; 3];
                for i in 0..CES {
                    for k in 0..3 {
                        l[k][i] = rgb[i.min(SAMPLES - 1)][k];
                    }
                }
                let w = t.xyz(Observer::Cie1964);
                (l, CAT02.map(|r| r[0] * w.x + r[1] * w.y + r[2] * w.z))
            })
            .collect();
        let combine = |weights: &[f64]| {
            let mut l = [[0.0; CES]; 3];
            let mut w = [0.0; 3];
            for ((e, white), share) in each.iter().zip(weights) {
                for k in 0..3 {
                    w[k] += share * white[k];
                    for i in 0..CES {
                        l[k][i] += share * e[k][i];
                    }
                }
            }
            (l, w)
        };
        let (base, white) = combine(&space.origin);
        let (along, white_along) = (0..space.d).map(|j| combine(space.direction(j))).unzip();
        let mut r = Box::new([[0.0; CES]; 3]);
        let mut weight = Box::new([0.0; CES]);
        for i in 0..CES {
            let jab = reference.ces_jab(i.min(SAMPLES - 1));
            for k in 0..3 {
                r[k][i] = jab[k];
            }
            weight[i] = if i < SAMPLES { 1.0 / SAMPLES as f64 } else { 0.0 };
        }
        let bin: [usize; SAMPLES] = std::array::from_fn(|i| reference.hue_bin(i));
        let mut bin_count = [0.0; BINS];
        for b in bin {
            bin_count[b] += 1.0;
        }
        let mut forms = CesForms {
            view: Viewing::of_cie_224(),
            white,
            white_along,
            base: Box::new(base),
            along,
            reference: r,
            weight,
            bin,
            bin_count,
            reference_area: 0.0,
        };
        let means = forms.bin_means(&forms.reference[1], &forms.reference[2]);
        forms.reference_area = area(&means);
        forms
    }

    /// Takes the hue bins of another reference; colours stay those of the own one.
    pub(crate) fn take_bins(&mut self, of: &Reference) {
        self.bin = std::array::from_fn(|i| of.hue_bin(i));
        self.bin_count = [0.0; BINS];
        for b in self.bin {
            self.bin_count[b] += 1.0;
        }
        let means = self.bin_means(&self.reference[1], &self.reference[2]);
        self.reference_area = area(&means);
    }

    fn bin_means(&self, a: &Lane, b: &Lane) -> [[f64; BINS]; 2] {
        let mut s = [[0.0; BINS]; 2];
        for i in 0..SAMPLES {
            s[0][self.bin[i]] += a[i];
            s[1][self.bin[i]] += b[i];
        }
        for k in 0..BINS {
            s[0][k] /= self.bin_count[k];
            s[1][k] /= self.bin_count[k];
        }
        s
    }

    /// Values and gradients at a point.
    #[inline(always)]
    pub(crate) fn point<const F: bool>(&self, t: &[f64], rg: bool, work: &mut CesWork, out: &mut CesModels) {
        self.around::<F, false>(t, t, CesWants { rf_high: false, rg }, work, out);
    }

    /// Models over the box centre ± radius.
    #[inline(always)]
    pub(crate) fn around<const F: bool, const BOX: bool>(
        &self,
        centre: &[f64],
        radius: &[f64],
        wants: CesWants,
        w: &mut CesWork,
        out: &mut CesModels,
    ) {
        let d = self.along.len();
        // The 10° white at the centre, and 1/W over the box.
        let mut white = self.white;
        let mut white_half = [0.0; 3];
        for j in 0..d {
            for m in 0..3 {
                white[m] += centre[j] * self.white_along[j][m];
                if BOX {
                    white_half[m] += radius[j] * self.white_along[j][m].abs();
                }
            }
        }
        if BOX && (0..3).any(|m| white[m] - white_half[m] <= 0.05 * white[m].abs()) {
            out.rf = Model::default();
            out.rg = Model::default();
            return;
        }
        let (mut omega, mut stray) = ([0.0; 3], [0.0; 3]);
        for m in 0..3 {
            let (lo, hi) = (1.0 / (white[m] + white_half[m]), 1.0 / (white[m] - white_half[m]));
            omega[m] = if BOX { 0.5 * (lo + hi) } else { 1.0 / white[m] };
            stray[m] = 0.5 * (hi - lo);
        }
        self.adapt::<F, BOX>(centre, radius, &white, &omega, &stray, w);
        self.respond::<F, BOX>(w);
        self.appear::<F>(w);
        if wants.rg {
            self.pull_of_area(w);
        }
        match (BOX, wants.rg) {
            (false, false) => self.project::<false, false>(wants, w),
            (false, true) => self.project::<false, true>(wants, w),
            (true, false) => self.project::<true, false>(wants, w),
            (true, true) => self.project::<true, true>(wants, w),
        }
        self.gather::<F>(&w.rf_co, &self.weight, &omega, w, &mut out.rf.grad);
        for g in &mut out.rf.grad[..d] {
            *g = -*g;
        }
        out.rf.upper = -dot::<F, CES>(&w.rf_low, &self.weight);
        out.rf.lower = if !BOX {
            out.rf.upper
        } else if wants.rf_high {
            let high = dot::<F, CES>(&w.rf_high, &self.weight);
            if high.is_finite() { -high } else { f64::NEG_INFINITY }
        } else {
            f64::NEG_INFINITY
        };
        if wants.rg {
            self.gather::<F>(&w.rg_co, &ONES, &omega, w, &mut out.rg.grad);
            let means = self.bin_means(&w.jab[1], &w.jab[2]);
            let scale = 100.0 / self.reference_area;
            let value = scale * area(&means);
            out.rg.set_point(value);
            if BOX {
                let mut moves = [0.0; BINS];
                let (mut low, mut high) = (0.0, 0.0);
                for i in 0..SAMPLES {
                    moves[self.bin[i]] += w.stray[i] / self.bin_count[self.bin[i]];
                    low += w.rg_low[i];
                    high += w.rg_high[i];
                }
                let products: f64 = (0..BINS).map(|b| moves[b] * moves[(b + 1) % BINS]).sum();
                let second = 0.5 * scale.abs() * products;
                out.rg.upper = value + high + second;
                out.rg.lower = value - low - second;
                if !out.rg.upper.is_finite() || !out.rg.lower.is_finite() {
                    out.rg = Model::default();
                }
            }
        }
    }

    /// Coefficients on the cone responses, brought to the ratios gₘ and then to the free directions.
    // A function, not a closure: closures are not inlined where the processor's features are known, and fused
    // multiply-adds outside of it are calls into the library.
    #[inline(always)]
    fn gather<const F: bool>(
        &self,
        co: &Lanes3,
        weight: &Lane,
        omega: &[f64; 3],
        w: &CesWork,
        grad: &mut [f64; MOST],
    ) {
        let h = &self.view.cones;
        let mut on = [[0.0; CES]; 3];
        for i in 0..CES {
            let (s0, s1, s2) = (
                co[0][i] * w.slope[0][i] * weight[i],
                co[1][i] * w.slope[1][i] * weight[i],
                co[2][i] * w.slope[2][i] * weight[i],
            );
            on[0][i] = omega[0] * (h[0][0] * s0 + h[1][0] * s1 + h[2][0] * s2);
            on[1][i] = omega[1] * (h[0][1] * s0 + h[1][1] * s1 + h[2][1] * s2);
            on[2][i] = omega[2] * (h[0][2] * s0 + h[1][2] * s1 + h[2][2] * s2);
        }
        let mut by_white = [0.0; 3];
        for m in 0..3 {
            by_white[m] = dot::<F, CES>(&on[m], &w.g[m]);
        }
        for j in 0..self.along.len() {
            let mut s = 0.0;
            for m in 0..3 {
                s += dot::<F, CES>(&on[m], &self.along[j][m]) - by_white[m] * self.white_along[j][m];
            }
            grad[j] = s;
        }
    }

    /// g, x and how far x can go.
    #[inline(always)]
    fn adapt<const F: bool, const BOX: bool>(
        &self,
        centre: &[f64],
        radius: &[f64],
        white: &[f64; 3],
        omega: &[f64; 3],
        stray: &[f64; 3],
        w: &mut CesWork,
    ) {
        let d = self.along.len();
        let h = &self.view.cones;
        w.g = *self.base;
        for j in 0..d {
            let (c, q) = (centre[j], &self.along[j]);
            for m in 0..3 {
                for i in 0..CES {
                    w.g[m][i] = fma::<F>(c, q[m][i], w.g[m][i]);
                }
            }
        }
        for m in 0..3 {
            let inv = 1.0 / white[m];
            for i in 0..CES {
                w.g[m][i] *= inv;
            }
        }
        for k in 0..3 {
            for i in 0..CES {
                w.x[k][i] = h[k][0] * w.g[0][i] + h[k][1] * w.g[1][i] + h[k][2] * w.g[2][i];
            }
        }
        if !BOX {
            return;
        }
        w.gamma = [[0.0; CES]; 3];
        w.reach = [[0.0; CES]; 3];
        let mut ho = [[0.0; 3]; 3];
        for k in 0..3 {
            for m in 0..3 {
                ho[k][m] = h[k][m] * omega[m];
            }
        }
        for j in 0..d {
            let (r, q, wa) = (radius[j], &self.along[j], self.white_along[j]);
            for i in 0..CES {
                let (y0, y1, y2) = (
                    fma::<F>(-w.g[0][i], wa[0], q[0][i]),
                    fma::<F>(-w.g[1][i], wa[1], q[1][i]),
                    fma::<F>(-w.g[2][i], wa[2], q[2][i]),
                );
                w.gamma[0][i] = fma::<F>(r, y0.abs(), w.gamma[0][i]);
                w.gamma[1][i] = fma::<F>(r, y1.abs(), w.gamma[1][i]);
                w.gamma[2][i] = fma::<F>(r, y2.abs(), w.gamma[2][i]);
                for k in 0..3 {
                    let xi = fma::<F>(ho[k][0], y0, fma::<F>(ho[k][1], y1, ho[k][2] * y2));
                    w.reach[k][i] = fma::<F>(r, xi.abs(), w.reach[k][i]);
                }
            }
        }
        for k in 0..3 {
            for i in 0..CES {
                let e = h[k][0].abs() * stray[0] * w.gamma[0][i]
                    + h[k][1].abs() * stray[1] * w.gamma[1][i]
                    + h[k][2].abs() * stray[2] * w.gamma[2][i];
                w.white_slack[k][i] = e;
                w.reach[k][i] += e;
            }
        }
    }

    /// The compressed cone responses, their slopes, and how far they fall below their tangents.
    #[inline(always)]
    fn respond<const F: bool, const BOX: bool>(&self, w: &mut CesWork) {
        w.sound = [1.0; CES];
        for k in 0..3 {
            for i in 0..CES {
                let x = w.x[k][i].max(1e-9);
                let p = pow::<F>(x, 0.42);
                let den = 27.13 + p;
                let slope = (400.0 * 27.13 * 0.42) * p / (x * den * den);
                w.a[k][i] = 400.0 * p / den + 0.1;
                w.slope[k][i] = slope;
                if BOX {
                    let r = w.reach[k][i];
                    let xl = w.x[k][i] - r;
                    let sound = xl > 1e-3 * x;
                    let xl = xl.max(1e-3 * x);
                    let pl = pow::<F>(xl, 0.42);
                    let dl = 27.13 + pl;
                    let steep = (400.0 * 27.13 * 0.42) * pl / (xl * dl * dl);
                    w.kappa[k][i] = (0.5 * r * (steep - slope)).max(0.0);
                    w.a_reach[k][i] = 0.5 * r * (steep + slope);
                    w.white_slack[k][i] *= slope;
                    w.sound[i] = if sound { w.sound[i] } else { 0.0 };
                }
            }
        }
    }

    /// J′a′b′ at the centre, keeping what the projection needs again.
    #[inline(always)]
    fn appear<const F: bool>(&self, w: &mut CesWork) {
        let v = &self.view;
        for i in 0..CES {
            let (a0, a1, a2) = (w.a[0][i], w.a[1][i], w.a[2][i]);
            let lum =
                (v.achromatic[0] * a0 + v.achromatic[1] * a1 + v.achromatic[2] * a2 - v.offset).max(1e-9);
            w.qq[i] = 0.5 * v.cz * log2::<F>(lum);
            let den = (a0 + a1 + 1.05 * a2).max(1e-6);
            let ca = RED[0] * a0 + RED[1] * a1 + RED[2] * a2;
            let cb = YELLOW[0] * a0 + YELLOW[1] * a1 + YELLOW[2] * a2;
            let c = (ca * ca + cb * cb + 1e-18).sqrt();
            let e4 = v.cos2 * ca - v.sin2 * cb + 3.8 * c;
            w.m[i] = (0.25 * v.chroma * e4 / den).max(1e-18);
        }
        for i in 0..CES {
            let lq = w.qq[i];
            w.m[i] = v.colourfulness * exp2::<F>(fma::<F>(0.9, log2::<F>(w.m[i]), lq));
            w.qq[i] = exp2::<F>(lq);
        }
        for i in 0..CES {
            w.mp[i] = log2::<F>(fma::<F>(BETA, w.m[i], 1.0)) * (std::f64::consts::LN_2 / BETA);
        }
        for i in 0..CES {
            let (a0, a1, a2) = (w.a[0][i], w.a[1][i], w.a[2][i]);
            let ca = RED[0] * a0 + RED[1] * a1 + RED[2] * a2;
            let cb = YELLOW[0] * a0 + YELLOW[1] * a1 + YELLOW[2] * a2;
            let c = (ca * ca + cb * cb + 1e-18).sqrt();
            let q2 = w.qq[i] * w.qq[i];
            let f = w.mp[i] / c;
            w.jab[0][i] = 170.0 * q2 / (1.0 + 0.7 * q2);
            w.jab[1][i] = f * ca;
            w.jab[2][i] = f * cb;
        }
    }

    /// d Rg / d(a′, b′) of each sample at the centre.
    fn pull_of_area(&self, w: &mut CesWork) {
        let means = self.bin_means(&w.jab[1], &w.jab[2]);
        let scale = 50.0 / self.reference_area;
        let mut pull = [[0.0; 2]; BINS];
        for b in 0..BINS {
            let (next, last) = ((b + 1) % BINS, (b + BINS - 1) % BINS);
            pull[b] = [
                scale * (means[1][next] - means[1][last]) / self.bin_count[b],
                scale * (means[0][last] - means[0][next]) / self.bin_count[b],
            ];
        }
        w.pull = [[0.0; CES]; 2];
        for i in 0..SAMPLES {
            w.pull[0][i] = pull[self.bin[i]][0];
            w.pull[1][i] = pull[self.bin[i]][1];
        }
    }

    /// Projects every sample on its direction: coefficients on the cone responses, and the remainders.
    #[inline(always)]
    fn project<const BOX: bool, const RG: bool>(&self, wants: CesWants, w: &mut CesWork) {
        let v = &self.view;
        let al = v.achromatic;
        // norms of the columns (redness, yellowness) of each cone response
        for i in 0..CES {
            let a = [w.a[0][i], w.a[1][i], w.a[2][i]];
            let lum = (al[0] * a[0] + al[1] * a[1] + al[2] * a[2] - v.offset).max(1e-9);
            let den = (a[0] + a[1] + 1.05 * a[2]).max(1e-6);
            let ca = RED[0] * a[0] + RED[1] * a[1] + RED[2] * a[2];
            let cb = YELLOW[0] * a[0] + YELLOW[1] * a[1] + YELLOW[2] * a[2];
            let c = (ca * ca + cb * cb + 1e-18).sqrt();
            let (ic, iden, ilum) = (1.0 / c, 1.0 / den, 1.0 / lum);
            let (u0, u1) = (ca * ic, cb * ic);
            let e4 = (v.cos2 * ca - v.sin2 * cb + 3.8 * c).max(1e-12);
            let ie4 = 1.0 / e4;
            let m = w.m[i];
            let bm = 1.0 + BETA * m;
            let ibm = 1.0 / bm;
            let p = m * ibm;
            let q2 = w.qq[i] * w.qq[i];
            let jd = 1.0 / (1.0 + 0.7 * q2);
            let j_a = 170.0 * v.cz * q2 * ilum * jd * jd;
            let rho = w.mp[i] * ic;
            let along: [f64; 3] = std::array::from_fn(|k| u0 * RED[k] + u1 * YELLOW[k]);
            let across: [f64; 3] = std::array::from_fn(|k| u0 * YELLOW[k] - u1 * RED[k]);
            let e4k: [f64; 3] =
                std::array::from_fn(|k| v.cos2 * RED[k] - v.sin2 * YELLOW[k] + 3.8 * along[k]);
            let mk: [f64; 3] =
                std::array::from_fn(|k| 0.9 * (e4k[k] * ie4 - DIVISOR[k] * iden) + 0.5 * v.cz * al[k] * ilum);
            // the shift and its direction
            let (dj, da, db) = (
                w.jab[0][i] - self.reference[0][i],
                w.jab[1][i] - self.reference[1][i],
                w.jab[2][i] - self.reference[2][i],
            );
            let n = (dj * dj + da * da + db * db + 1e-24).sqrt();
            let is = 1.0 / n;
            let (ej, ea, eb) = (dj * is, da * is, db * is);
            let (e_in, e_off) = (ea * u0 + eb * u1, eb * u0 - ea * u1);
            let s: [f64; 3] =
                std::array::from_fn(|k| ej * j_a * al[k] + p * e_in * mk[k] + rho * e_off * across[k]);
            let (g_in, g_off) = if RG {
                let (va, vb) = (w.pull[0][i], w.pull[1][i]);
                (va * u0 + vb * u1, vb * u0 - va * u1)
            } else {
                (0.0, 0.0)
            };
            let gs: [f64; 3] = std::array::from_fn(|k| p * g_in * mk[k] + rho * g_off * across[k]);
            if !BOX {
                for k in 0..3 {
                    w.rf_co[k][i] = s[k];
                    if RG {
                        w.rg_co[k][i] = gs[k];
                    }
                }
                w.rf_low[i] = n;
                continue;
            }
            let r = [w.a_reach[0][i], w.a_reach[1][i], w.a_reach[2][i]];
            let d_lum = al[0] * r[0] + al[1] * r[1] + al[2] * r[2];
            let d_den = r[0] + r[1] + 1.05 * r[2];
            let r_red = r[0] + RED[1].abs() * r[1] + RED[2] * r[2];
            let r_yellow = YELLOW[0] * (r[0] + r[1] + 2.0 * r[2]);
            let rc = (r_red * r_red + r_yellow * r_yellow).sqrt();
            let y = rc * ic;
            let z = d_lum * ilum;
            let de = 4.8 * rc * ie4;
            let dd = d_den * iden;
            let fits = y < 0.5 && z < 0.9 && de < 0.8 && dd < 0.9;
            let (y, z, de, dd) = (y.min(0.5), z.min(0.9), de.min(0.8), dd.min(0.9));
            let bend = 0.54 * y * y;
            let i1e = ie4 / (1.0 - de);
            let d_ie = i1e * de;
            let d_iden = iden * dd / (1.0 - dd);
            let d_ilum = ilum * z / (1.0 - z);
            let d_along: [f64; 3] = std::array::from_fn(|k| across[k].abs() * y + along[k].abs() * bend);
            let d_across: [f64; 3] = std::array::from_fn(|k| along[k].abs() * y + across[k].abs() * bend);
            let d_mk: [f64; 3] = std::array::from_fn(|k| {
                0.9 * (e4k[k].abs() * d_ie + 3.8 * d_along[k] * i1e + DIVISOR[k] * d_iden)
                    + 0.5 * v.cz * al[k] * d_ilum
            });
            let mh: [f64; 3] = std::array::from_fn(|k| mk[k].abs() + d_mk[k]);
            let d_ln_m = mh[0] * r[0] + mh[1] * r[1] + mh[2] * r[2];
            let fits = fits && d_ln_m < 0.8;
            let d_ln_m = d_ln_m.min(0.8);
            let (grow, fall) = (1.0 / (1.0 - d_ln_m), 1.0 - d_ln_m);
            let low_bm = 1.0 + BETA * m * fall;
            let d_p = (m * grow / (low_bm * low_bm)).min(10.97) * d_ln_m;
            let ph = p + d_p;
            // ρ = M′/C: its logarithm moves far less than that of M or of C
            let pi = p / w.mp[i];
            let ic_high = ic / (1.0 - y);
            let d_ic = ic_high * y;
            let mut lambda = 0.0;
            for k in 0..3 {
                let nk = pi * mk[k] - along[k] * ic;
                let d_nk =
                    0.167 * d_ln_m * mh[k] + pi * d_mk[k] + along[k].abs() * d_ic + d_along[k] * ic_high;
                lambda += (nk.abs() + d_nk) * r[k];
            }
            let fits = fits && lambda < 0.8;
            let lambda = lambda.min(0.8);
            let rho_high = rho / (1.0 - lambda);
            // second derivative of J′ in the achromatic response
            let q_low = q2 * (1.0 - 1.33 * z).max(0.0);
            let q_high = q2 * (1.0 + 1.33 * z + 0.22 * z * z);
            let jl = 1.0 / (1.0 + 0.7 * q_low);
            let (b1, b2) = (v.cz - 1.0, 0.7 * (v.cz + 1.0));
            let turn = (b1 - b2 * q_low).abs().max((b1 - b2 * q_high).abs());
            let j_aa = 170.0 * v.cz * q2 * ilum * ilum / (1.0 - z) * jl * jl * jl * turn;
            let d_ja = j_aa * d_lum;
            let good = if fits { w.sound[i] } else { 0.0 };
            // remainder of a projection with in-line and off-line parts
            let mut half_dev = 0.0;
            let (mut below, mut above, mut by_white) = (0.0, 0.0, 0.0);
            let (ein, eoff) = (e_in.abs(), e_off.abs());
            let (einh, eoffh) = (ein + eoff * y + ein * bend, eoff + ein * y + eoff * bend);
            for k in 0..3 {
                let dev = ej.abs() * al[k] * d_ja
                    + (ph * einh * mh[k] - p * ein * mk[k].abs())
                    + (rho_high * eoffh * (across[k].abs() + d_across[k]) - rho * eoff * across[k].abs());
                half_dev += 0.5 * dev * r[k];
                below += s[k].max(0.0) * w.kappa[k][i];
                above += (-s[k]).max(0.0) * w.kappa[k][i];
                by_white += s[k].abs() * w.white_slack[k][i];
            }
            let low = n - (half_dev + below + by_white);
            let keep = if good > 0.0 && low > 0.0 { 1.0 } else { 0.0 };
            w.rf_low[i] = keep * low.max(0.0);
            for k in 0..3 {
                w.rf_co[k][i] = keep * s[k];
            }
            if wants.rf_high || RG {
                let mut move_ab = 0.0;
                for k in 0..3 {
                    move_ab += (ph * mh[k] + rho_high * (across[k].abs() + d_across[k])) * r[k];
                }
                let move_j = (j_a + d_ja) * d_lum;
                let moved = (move_ab * move_ab + move_j * move_j).sqrt();
                let side = if n > 2.0 * moved { moved * moved / (2.0 * (n - moved)) } else { 2.0 * moved };
                // The tangent kept for the lower bound must serve the upper one too; where it was dropped the
                // difference can still grow by all its movement.
                let with = n + half_dev + above + by_white + side;
                let without = n + moved;
                let high = if keep > 0.0 { with } else { without };
                w.rf_high[i] = if good > 0.0 { high } else { f64::INFINITY };
                // Where nothing fits, M′ itself limits the movement.
                let far =
                    w.mp[i] + m * (1.0 + 0.9 * 4.8 * rc * ie4) * (1.0 + 0.67 * d_lum * ilum) / (1.0 - dd);
                let loose = w.sound[i] > 0.0 && d_den * iden < 0.9;
                let wild = if loose { far } else { f64::INFINITY };
                w.stray[i] = if good > 0.0 { move_ab.min(wild) } else { wild };
                if RG {
                    let (gin, goff) = (g_in.abs(), g_off.abs());
                    let (ginh, goffh) = (gin + goff * y + gin * bend, goff + gin * y + goff * bend);
                    let (mut hd, mut lo, mut hi) = (0.0, 0.0, 0.0);
                    for k in 0..3 {
                        let dev = (ph * ginh * mh[k] - p * gin * mk[k].abs())
                            + (rho_high * goffh * (across[k].abs() + d_across[k])
                                - rho * goff * across[k].abs());
                        hd += 0.5 * dev * r[k];
                        lo += gs[k].max(0.0) * w.kappa[k][i];
                        hi += (-gs[k]).max(0.0) * w.kappa[k][i];
                        hd += gs[k].abs() * w.white_slack[k][i];
                    }
                    let pull = (gin * gin + goff * goff).sqrt();
                    let all = pull * wild;
                    let use_tangent = good > 0.0 && hd + lo.max(hi) < all;
                    for k in 0..3 {
                        w.rg_co[k][i] = if use_tangent { gs[k] } else { 0.0 };
                    }
                    w.rg_low[i] = if use_tangent { hd + lo } else { all };
                    w.rg_high[i] = if use_tangent { hd + hi } else { all };
                }
            }
        }
    }
}

/// Area of the reference's polygon when samples are binned by the hues of another.
pub(crate) fn reference_area(of: &Reference, binned_by: &Reference) -> f64 {
    let (mut sums, mut count) = ([[0.0; BINS]; 2], [0.0; BINS]);
    for i in 0..SAMPLES {
        let (jab, b) = (of.ces_jab(i), binned_by.hue_bin(i));
        sums[0][b] += jab[1];
        sums[1][b] += jab[2];
        count[b] += 1.0;
    }
    for b in 0..BINS {
        sums[0][b] /= count[b];
        sums[1][b] /= count[b];
    }
    area(&sums)
}

/// The signed area of the polygon of bin means.
fn area(p: &[[f64; BINS]; 2]) -> f64 {
    0.5 * (0..BINS)
        .map(|b| {
            let next = (b + 1) % BINS;
            p[0][b] * p[1][next] - p[0][next] * p[1][b]
        })
        .sum::<f64>()
}
