//! Powers and logarithms that the compiler can turn into vector code.
//!
//! Each function is a straight line of arithmetic and bit moves, so a loop over lanes becomes vector instructions
//! under whatever instruction set the caller was dispatched to. `FMA` says whether fused multiply-add is one
//! instruction there; without it `mul_add` would be a library call. The polynomials interpolate at the Chebyshev
//! points (fitted in 60-digit arithmetic); their errors are 1e-13 of the result or less.

/// a·b + c.
#[inline(always)]
pub(crate) fn fma<const FMA: bool>(a: f64, b: f64, c: f64) -> f64 {
    if FMA { a.mul_add(b, c) } else { a * b + c }
}

/// The larger of a value and a floor; one instruction, unlike `f64::max`, whose care for NaN costs two more.
#[inline(always)]
pub(crate) fn at_least(x: f64, floor: f64) -> f64 {
    if x > floor { x } else { floor }
}

/// (2/ln 2)·artanh(s)/s over s² for s = (m − 1)/(m + 1), √½ ≤ m < √2.
const LOG2: [f64; 6] = [
    2.885_390_081_777_851,
    0.961_796_694_112_264_9,
    0.577_077_942_660_304_4,
    0.412_209_224_061_104_33,
    0.319_906_803_807_013_36,
    0.282_885_023_407_482_34,
];

/// 2ˣ over |x| ≤ ½.
const EXP2: [f64; 10] = [
    1.000_000_000_000_013_5,
    0.693_147_180_559_946_2,
    0.240_226_506_956_403_4,
    0.055_504_108_664_651_67,
    0.009_618_129_193_934_313,
    0.001_333_355_820_079_459_2,
    0.000_154_034_337_512_510_1,
    1.525_267_292_485_073_7e-5,
    1.325_964_524_488_711e-6,
    1.020_590_541_376_559_5e-7,
];

/// Bits of √½: mantissas are taken from here upward, so that m lies in [√½, √2).
const HALF_ROOT: u64 = 0x3fe6_a09e_667f_3bcd;
const MANTISSA: u64 = (1 << 52) - 1;
/// Keeps the exponent positive while it is shifted down.
const BIAS: u64 = 1024;
/// 2⁵²: an integer below it, put into the mantissa, is that number of units.
const TWO_52_BITS: u64 = 0x4330_0000_0000_0000;
/// 1.5 · 2⁵²: adding it rounds to the nearest whole number, kept in the low bits.
const ROUNDER: f64 = 6_755_399_441_055_744.0;

/// A positive number split for its logarithm: whole exponent, m − 1 and m + 1. The quotient of the last two is left
/// to the caller, who can share one division among several logarithms.
#[inline(always)]
pub(crate) fn split(x: f64) -> (f64, f64, f64) {
    let shifted = x.to_bits().wrapping_add(BIAS << 52).wrapping_sub(HALF_ROOT);
    let m = f64::from_bits((shifted & MANTISSA).wrapping_add(HALF_ROOT));
    // No integer-to-float conversion of 64 bits exists below AVX-512; a mantissa trick does it.
    let exponent = f64::from_bits((shifted >> 52) | TWO_52_BITS) - (4_503_599_627_370_496.0 + BIAS as f64);
    (exponent, m - 1.0, m + 1.0)
}

/// Base-2 logarithm from the parts of [`split`], s = (m − 1)/(m + 1).
#[inline(always)]
pub(crate) fn log2_of<const FMA: bool>(exponent: f64, s: f64) -> f64 {
    let z = s * s;
    let p = fma::<FMA>(LOG2[5], z, LOG2[4]);
    let p = fma::<FMA>(p, z, LOG2[3]);
    let p = fma::<FMA>(p, z, LOG2[2]);
    let p = fma::<FMA>(p, z, LOG2[1]);
    let p = fma::<FMA>(p, z, LOG2[0]);
    fma::<FMA>(s, p, exponent)
}

/// Base-2 logarithm of a positive, normal number.
#[inline(always)]
pub(crate) fn log2<const FMA: bool>(x: f64) -> f64 {
    let (exponent, less, more) = split(x);
    log2_of::<FMA>(exponent, less / more)
}

/// 2ˣ for |x| < 1000.
#[inline(always)]
pub(crate) fn exp2<const FMA: bool>(x: f64) -> f64 {
    let rounded = x + ROUNDER;
    let f = x - (rounded - ROUNDER);
    let p = fma::<FMA>(EXP2[9], f, EXP2[8]);
    let p = fma::<FMA>(p, f, EXP2[7]);
    let p = fma::<FMA>(p, f, EXP2[6]);
    let p = fma::<FMA>(p, f, EXP2[5]);
    let p = fma::<FMA>(p, f, EXP2[4]);
    let p = fma::<FMA>(p, f, EXP2[3]);
    let p = fma::<FMA>(p, f, EXP2[2]);
    let p = fma::<FMA>(p, f, EXP2[1]);
    let p = fma::<FMA>(p, f, EXP2[0]);
    f64::from_bits(p.to_bits().wrapping_add(rounded.to_bits() << 52))
}

/// xᵉ of a positive, normal number.
#[inline(always)]
pub(crate) fn pow<const FMA: bool>(x: f64, e: f64) -> f64 {
    exp2::<FMA>(e * log2::<FMA>(x))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn samples() -> impl Iterator<Item = f64> {
        (0..200_000).map(|i| 10f64.powf(-17.5 + 20.0 * (f64::from(i) + 0.371) / 200_000.0))
    }

    #[test]
    fn logarithms_agree_with_std_to_1e_12() {
        for x in samples().chain([1.0, 2.0, 0.5, std::f64::consts::SQRT_2, 1.0 + 1e-9, 1.0 - 1e-9]) {
            let expected = x.log2();
            assert!((log2::<false>(x) - expected).abs() < 1e-12 * expected.abs().max(1.0), "{x}");
            assert!((log2::<true>(x) - expected).abs() < 1e-12 * expected.abs().max(1.0), "{x}");
        }
    }

    #[test]
    fn exponentials_agree_with_std_to_1e_12() {
        for i in 0..200_000 {
            let x = -80.0 + 160.0 * (f64::from(i) + 0.123) / 200_000.0;
            for got in [exp2::<false>(x), exp2::<true>(x)] {
                assert!((got / x.exp2() - 1.0).abs() < 1e-12, "{x} {got}");
            }
        }
        assert!((exp2::<false>(0.0) - 1.0).abs() < 1e-13);
    }

    #[test]
    fn powers_agree_with_std_to_1e_12() {
        for x in samples() {
            for e in [0.42, 0.9, 1.0 / 3.0] {
                assert!((pow::<true>(x, e) / x.powf(e) - 1.0).abs() < 1e-12, "{x}^{e}");
                assert!((pow::<false>(x, e) / x.powf(e) - 1.0).abs() < 1e-12, "{x}^{e}");
            }
        }
    }
}
