//! Rendering numbers of blends at a fixed reference, fast and without allocation, with gradients: a solver's inner loop.
//!
//! The same arithmetic serves [`crate::cri::cri`] and [`crate::fidelity::fidelity`]; it is held to the plain scalar
//! forms there ([`crate::cri::cri_plain`], [`crate::fidelity::fidelity_plain`]) to 1e-9. Every number is of degree
//! zero in the shares: they need not sum to one.

mod ces;
mod dispatch;
mod lanes;
mod maths;
mod tcs;

pub use dispatch::Arithmetic;

use crate::fidelity::{BinSums, FIDELITY_FACTOR, HUE_BINS, fidelity_of_difference};
use crate::observer::Observer;
use crate::reference::Reference;
use crate::tensor::column::{self, CES_LANES, COUNT, TCS_LANES};
use crate::tensor::{Tensor, TensorSet, sample_xyz};
use crate::{Xyz, appearance_model::CAT02};
pub(crate) use dispatch::Lanewise;
use lanes::{Lanes, blend, dot, sum99};
pub(crate) use maths::fma;

const TCS_COUNT: usize = 3 * TCS_LANES;
const CES_COUNT: usize = 3 * CES_LANES;

/// Colour rendering of blends of one emitter set against one reference.
#[derive(Debug, Clone)]
pub struct RenderingKernel {
    reference: Reference,
    arithmetic: Arithmetic,
    tcs: Vec<Lanes<TCS_COUNT>>,
    ces: Vec<Lanes<CES_COUNT>>,
    white2: Vec<[f64; 3]>,
    white10: Vec<[f64; 3]>,
}

impl RenderingKernel {
    /// A kernel for blends of `set` against `reference`.
    pub fn new(set: &TensorSet, reference: &Reference) -> RenderingKernel {
        RenderingKernel::with_arithmetic(set, reference, Arithmetic::Dispatched)
    }

    /// The same with a chosen instruction set.
    pub fn with_arithmetic(
        set: &TensorSet,
        reference: &Reference,
        arithmetic: Arithmetic,
    ) -> RenderingKernel {
        let columns = set.columns();
        RenderingKernel {
            reference: reference.clone(),
            arithmetic,
            tcs: columns.iter().map(tcs_lanes).collect(),
            ces: columns.iter().map(ces_lanes).collect(),
            white2: columns.iter().map(|tensor| tensor.xyz(Observer::Cie1931).to_array()).collect(),
            white10: columns.iter().map(white10).collect(),
        }
    }

    /// Number of emitters.
    pub fn len(&self) -> usize {
        self.white2.len()
    }

    /// Whether there is no emitter.
    pub fn is_empty(&self) -> bool {
        self.white2.is_empty()
    }

    /// The fixed reference.
    pub fn reference(&self) -> &Reference {
        &self.reference
    }

    /// Puts another reference in place of the present one; the emitters stay.
    pub fn set_reference(&mut self, reference: Reference) {
        self.reference = reference;
    }

    /// Emitter `i`'s test-colour samples as lanes Y | Z | L, 16 each (15 samples and a repeat), L = 2.718 Y − 0.92 X + 0.202 Z.
    pub fn tcs_lanes(&self, i: usize) -> &[f64; TCS_COUNT] {
        &self.tcs[i].0
    }

    /// 2° tristimulus values of emitter `i`'s 15 test-colour samples.
    pub fn tcs_xyz(&self, i: usize) -> [Xyz; 15] {
        let lanes = &self.tcs[i].0;
        std::array::from_fn(|s| {
            let (y, z, l) = (lanes[s], lanes[TCS_LANES + s], lanes[2 * TCS_LANES + s]);
            sample_xyz(y, z, l)
        })
    }

    /// Emitter `i`'s colour evaluation samples in CAT02 of the 10° observer as lanes R | G | B, 104 each (99 samples
    /// and repeats of the last).
    pub fn ces_rgb(&self, i: usize) -> &[f64; CES_COUNT] {
        &self.ces[i].0
    }

    /// 2° X, Y, Z of emitter `i` itself.
    pub fn white2(&self, i: usize) -> [f64; 3] {
        self.white2[i]
    }

    /// CAT02 R, G, B (10°) of emitter `i` itself.
    pub fn white10(&self, i: usize) -> [f64; 3] {
        self.white10[i]
    }

    /// CIE 13.3 R1–R15.
    pub fn cri(&self, shares: &[f64]) -> [f64; 15] {
        let differences = self.arithmetic.run(TcsDifferences { kernel: self, shares });
        std::array::from_fn(|i| 100.0 - 4.6 * differences[i])
    }

    /// CIE 13.3 Ra and R9.
    pub fn ra_r9(&self, shares: &[f64]) -> (f64, f64) {
        let d = self.arithmetic.run(TcsDifferences { kernel: self, shares });
        (ra_of(&d), 100.0 - 4.6 * d[8])
    }

    /// Value and gradient over the shares of Σ weightᵢ·Rᵢ (i = R1…R15). Ra: the first eight weights 1/8.
    ///
    /// `gradient` gets one number per emitter; its spare elements are left alone.
    pub fn cri_gradient(&self, shares: &[f64], weights: &[f64; 15], gradient: &mut [f64]) -> f64 {
        let differences = self.arithmetic.run(TcsGradient {
            kernel: self,
            shares,
            weights: [weights],
            gradients: [gradient],
        });
        weights.iter().zip(&differences).map(|(weight, d)| weight * (100.0 - 4.6 * d)).sum()
    }

    /// Ra and R9 with both gradients over the shares.
    pub fn ra_r9_gradients(
        &self,
        shares: &[f64],
        ra_gradient: &mut [f64],
        r9_gradient: &mut [f64],
    ) -> (f64, f64) {
        let d = self.arithmetic.run(TcsGradient {
            kernel: self,
            shares,
            weights: [&RA_WEIGHTS, &R9_WEIGHTS],
            gradients: [ra_gradient, r9_gradient],
        });
        (ra_of(&d), 100.0 - 4.6 * d[8])
    }

    /// CIE 224 / TM-30 Rf.
    pub fn rf(&self, shares: &[f64]) -> f64 {
        fidelity_of_difference(self.arithmetic.run(CesMeanDifference { kernel: self, shares }))
    }

    /// Rf and Rg; Rg is None when a hue bin of the reference is empty.
    pub fn rf_rg(&self, shares: &[f64]) -> (f64, Option<f64>) {
        self.arithmetic.run(CesBins { kernel: self, shares })
    }

    /// ΔE′ of each of the 99 samples (in 104 lanes; the spare ones repeat the last).
    pub fn ces_differences(&self, shares: &[f64], out: &mut [f64; CES_LANES]) {
        self.arithmetic.run(CesDifferences { kernel: self, shares, out });
    }

    /// Rf and its gradient over the shares.
    pub fn rf_gradient(&self, shares: &[f64], gradient: &mut [f64]) -> f64 {
        self.arithmetic.run(CesGradient { kernel: self, shares, rf: gradient, rg: None }).0
    }

    /// Rf and Rg with both gradients. Where a hue bin is empty Rg is None and its gradient zero.
    pub fn rf_rg_gradients(
        &self,
        shares: &[f64],
        rf_gradient: &mut [f64],
        rg_gradient: &mut [f64],
    ) -> (f64, Option<f64>) {
        self.arithmetic.run(CesGradient { kernel: self, shares, rf: rf_gradient, rg: Some(rg_gradient) })
    }
}

const RA_WEIGHTS: [f64; 15] =
    [0.125, 0.125, 0.125, 0.125, 0.125, 0.125, 0.125, 0.125, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0];
const R9_WEIGHTS: [f64; 15] = [0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 1.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0];

fn ra_of(d: &[f64; TCS_LANES]) -> f64 {
    100.0 - 4.6 / 8.0 * (((d[0] + d[1]) + (d[2] + d[3])) + ((d[4] + d[5]) + (d[6] + d[7])))
}

fn tcs_lanes(tensor: &Tensor) -> Lanes<TCS_COUNT> {
    let values: &[f64; COUNT] = tensor.values();
    Lanes(values[column::TCS..column::CES].try_into().expect("the layout of a tensor"))
}

fn ces_lanes(tensor: &Tensor) -> Lanes<CES_COUNT> {
    let values: &[f64; COUNT] = tensor.values();
    Lanes(values[column::CES..].try_into().expect("the layout of a tensor"))
}

fn white10(tensor: &Tensor) -> [f64; 3] {
    CAT02.times(tensor.xyz(Observer::Cie1964).to_array())
}

#[inline(always)]
fn blend3(shares: &[f64], whites: &[[f64; 3]]) -> [f64; 3] {
    let mut sum = [0.0; 3];
    for (share, white) in shares.iter().zip(whites) {
        for k in 0..3 {
            sum[k] += share * white[k];
        }
    }
    sum
}

struct TcsDifferences<'a> {
    kernel: &'a RenderingKernel,
    shares: &'a [f64],
}

impl Lanewise for TcsDifferences<'_> {
    type Output = [f64; TCS_LANES];

    #[inline(always)]
    fn run<const FMA: bool>(self) -> [f64; TCS_LANES] {
        let mut samples = Lanes::zero();
        blend::<FMA, TCS_COUNT>(self.shares, &self.kernel.tcs, &mut samples);
        let white = blend3(self.shares, &self.kernel.white2);
        let adaptation = tcs::Adaptation::new(white, &self.kernel.reference);
        let mut out = [0.0; TCS_LANES];
        tcs::differences::<FMA>(&adaptation, &samples.0, &self.kernel.reference, &mut out);
        out
    }
}

struct TcsGradient<'a, const K: usize> {
    kernel: &'a RenderingKernel,
    shares: &'a [f64],
    weights: [&'a [f64; 15]; K],
    gradients: [&'a mut [f64]; K],
}

impl<const K: usize> Lanewise for TcsGradient<'_, K> {
    type Output = [f64; TCS_LANES];

    #[inline(always)]
    fn run<const FMA: bool>(self) -> Self::Output {
        let kernel = self.kernel;
        let mut samples = Lanes::zero();
        blend::<FMA, TCS_COUNT>(self.shares, &kernel.tcs, &mut samples);
        let adaptation = tcs::Adaptation::new(blend3(self.shares, &kernel.white2), &kernel.reference);
        let mut out = [0.0; TCS_LANES];
        tcs::differences::<FMA>(&adaptation, &samples.0, &kernel.reference, &mut out);
        let mut adjoints = Lanes::<TCS_COUNT>::zero();
        for (weights, gradient) in self.weights.into_iter().zip(self.gradients) {
            let mut on_differences = [0.0; TCS_LANES];
            for i in 0..15 {
                on_differences[i] = -4.6 * weights[i];
            }
            let on_white = tcs::adjoints::<FMA>(
                &adaptation,
                &samples.0,
                &kernel.reference,
                &on_differences,
                &mut adjoints.0,
            );
            for ((slope, column), white) in gradient.iter_mut().zip(&kernel.tcs).zip(&kernel.white2) {
                *slope = dot::<FMA, TCS_COUNT>(&adjoints.0, &column.0)
                    + on_white[0] * white[0]
                    + on_white[1] * white[1]
                    + on_white[2] * white[2];
            }
        }
        out
    }
}

/// The blend's samples in J′ | a′ | b′.
#[inline(always)]
fn blend_jab<const FMA: bool>(kernel: &RenderingKernel, shares: &[f64], jab: &mut Lanes<CES_COUNT>) {
    let mut rgb = Lanes::zero();
    blend::<FMA, CES_COUNT>(shares, &kernel.ces, &mut rgb);
    let mut stages = ces::Stages::new();
    ces::forward::<FMA, false>(blend3(shares, &kernel.white10), &rgb, &mut stages, jab);
}

struct CesMeanDifference<'a> {
    kernel: &'a RenderingKernel,
    shares: &'a [f64],
}

impl Lanewise for CesMeanDifference<'_> {
    type Output = f64;

    #[inline(always)]
    fn run<const FMA: bool>(self) -> f64 {
        let mut jab = Lanes::zero();
        blend_jab::<FMA>(self.kernel, self.shares, &mut jab);
        let mut differences = [0.0; CES_LANES];
        ces::differences::<FMA>(&jab.0, &self.kernel.reference.ces_jab, &mut differences);
        sum99(&differences) / 99.0
    }
}

struct CesDifferences<'a> {
    kernel: &'a RenderingKernel,
    shares: &'a [f64],
    out: &'a mut [f64; CES_LANES],
}

impl Lanewise for CesDifferences<'_> {
    type Output = ();

    #[inline(always)]
    fn run<const FMA: bool>(self) {
        let mut jab = Lanes::zero();
        blend_jab::<FMA>(self.kernel, self.shares, &mut jab);
        ces::differences::<FMA>(&jab.0, &self.kernel.reference.ces_jab, self.out);
    }
}

struct CesBins<'a> {
    kernel: &'a RenderingKernel,
    shares: &'a [f64],
}

impl Lanewise for CesBins<'_> {
    type Output = (f64, Option<f64>);

    #[inline(always)]
    fn run<const FMA: bool>(self) -> (f64, Option<f64>) {
        let mut jab = Lanes::zero();
        blend_jab::<FMA>(self.kernel, self.shares, &mut jab);
        let mut differences = [0.0; CES_LANES];
        ces::differences::<FMA>(&jab.0, &self.kernel.reference.ces_jab, &mut differences);
        let bins = bin_sums(&jab, &self.kernel.reference, &differences);
        (fidelity_of_difference(sum99(&differences) / 99.0), bins.gamut())
    }
}

#[inline(always)]
fn bin_sums(jab: &Lanes<CES_COUNT>, reference: &Reference, differences: &[f64; CES_LANES]) -> BinSums {
    let ([_, a, b], [_, ra, rb]) = (ces::rows(&jab.0), ces::rows(&reference.ces_jab));
    let mut bins = BinSums::default();
    for i in 0..99 {
        bins.add(usize::from(reference.bins[i]), [ra[i], rb[i]], [a[i], b[i]], differences[i]);
    }
    bins
}

struct CesGradient<'a> {
    kernel: &'a RenderingKernel,
    shares: &'a [f64],
    rf: &'a mut [f64],
    rg: Option<&'a mut [f64]>,
}

impl Lanewise for CesGradient<'_> {
    type Output = (f64, Option<f64>);

    #[inline(always)]
    fn run<const FMA: bool>(self) -> (f64, Option<f64>) {
        let kernel = self.kernel;
        let white = blend3(self.shares, &kernel.white10);
        let mut rgb = Lanes::zero();
        blend::<FMA, CES_COUNT>(self.shares, &kernel.ces, &mut rgb);
        let mut stages = ces::Stages::new();
        let mut jab = Lanes::zero();
        ces::forward::<FMA, true>(white, &rgb, &mut stages, &mut jab);
        let mut differences = [0.0; CES_LANES];
        ces::differences::<FMA>(&jab.0, &kernel.reference.ces_jab, &mut differences);
        let mean = sum99(&differences) / 99.0;
        let rf = fidelity_of_difference(mean);

        let mut adjoints = Lanes::zero();
        ces::adjoints_of_mean_difference::<FMA>(&jab.0, &kernel.reference.ces_jab, &mut adjoints);
        let on_white = ces::backward::<FMA>(white, &rgb, &stages, &mut adjoints);
        // dRf/d(mean ΔE′) = −6.73·σ((100 − 6.73 ΔE′)/10).
        let slope = -FIDELITY_FACTOR / (1.0 + (-(100.0 - FIDELITY_FACTOR * mean) / 10.0).exp());
        kernel.project::<FMA>(&adjoints, on_white, slope, self.rf);

        let mut rg = None;
        if let Some(gradient) = self.rg {
            let bins = bin_sums(&jab, &kernel.reference, &differences);
            rg = bins.gamut();
            match bins.gamut_slopes() {
                Some(slopes) => {
                    let (_, ab) = adjoints.0.split_at_mut(CES_LANES);
                    let (a, b) = ab.split_at_mut(CES_LANES);
                    for i in 0..99 {
                        [a[i], b[i]] = slopes[usize::from(kernel.reference.bins[i] & 15)];
                    }
                    a[99..].fill(0.0);
                    b[99..].fill(0.0);
                    adjoints.0[..CES_LANES].fill(0.0);
                    let on_white = ces::backward::<FMA>(white, &rgb, &stages, &mut adjoints);
                    kernel.project::<FMA>(&adjoints, on_white, 1.0, gradient);
                }
                None => gradient[..kernel.len()].fill(0.0),
            }
        }
        (rf, rg)
    }
}

impl RenderingKernel {
    /// Gradient over the shares from adjoints over the blend's samples and white.
    #[inline(always)]
    fn project<const FMA: bool>(
        &self,
        adjoints: &Lanes<CES_COUNT>,
        on_white: [f64; 3],
        scale: f64,
        gradient: &mut [f64],
    ) {
        for ((slope, column), white) in gradient.iter_mut().zip(&self.ces).zip(&self.white10) {
            *slope = scale
                * (dot::<FMA, CES_COUNT>(&adjoints.0, &column.0)
                    + on_white[0] * white[0]
                    + on_white[1] * white[1]
                    + on_white[2] * white[2]);
        }
    }
}

/// ΔE of the test-colour samples of one light.
pub(crate) fn tcs_differences(
    light: &Tensor,
    reference: &Reference,
    arithmetic: Arithmetic,
) -> [f64; TCS_LANES] {
    struct One<'a>(&'a Tensor, &'a Reference);
    impl Lanewise for One<'_> {
        type Output = [f64; TCS_LANES];
        #[inline(always)]
        fn run<const FMA: bool>(self) -> [f64; TCS_LANES] {
            let adaptation = tcs::Adaptation::new(self.0.xyz(Observer::Cie1931).to_array(), self.1);
            let samples: &[f64; TCS_COUNT] =
                self.0.values()[column::TCS..column::CES].try_into().expect("the layout of a tensor");
            let mut out = [0.0; TCS_LANES];
            tcs::differences::<FMA>(&adaptation, samples, self.1, &mut out);
            out
        }
    }
    arithmetic.run(One(light, reference))
}

/// What TM-30 needs of one light.
pub(crate) struct Scored {
    /// Fidelity of each sample.
    pub(crate) scores: [f64; CES_LANES],
    /// Rf.
    pub(crate) rf: f64,
    /// Sums of the hue bins.
    pub(crate) bins: BinSums,
    /// Fidelity of each hue bin (of no meaning where it is empty).
    pub(crate) bin_scores: [f64; HUE_BINS],
}

/// Fidelity of the samples and hue bins of one light.
pub(crate) fn ces_scored(light: &Tensor, reference: &Reference, arithmetic: Arithmetic) -> Scored {
    struct One<'a>(&'a Tensor, &'a Reference);
    impl Lanewise for One<'_> {
        type Output = Scored;
        #[inline(always)]
        fn run<const FMA: bool>(self) -> Scored {
            let mut jab = Lanes::zero();
            ces::forward::<FMA, false>(
                white10(self.0),
                &ces_lanes(self.0),
                &mut ces::Stages::new(),
                &mut jab,
            );
            let mut scores = [0.0; CES_LANES];
            ces::differences::<FMA>(&jab.0, &self.1.ces_jab, &mut scores);
            let mut mean = [sum99(&scores) / 99.0; 8];
            let bins = bin_sums(&jab, self.1, &scores);
            let mut bin_scores = bins.mean_differences();
            ces::fidelities::<FMA>(&mut scores);
            ces::fidelities::<FMA>(&mut bin_scores);
            ces::fidelities::<FMA>(&mut mean);
            Scored { scores, rf: mean[0], bins, bin_scores }
        }
    }
    arithmetic.run(One(light, reference))
}

#[cfg(test)]
mod tests;
