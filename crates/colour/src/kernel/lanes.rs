//! Fixed arrays of lanes, and the sums that run along them.

use super::maths::fma;

/// An array on a cache-line boundary, so that vector loads do not straddle lines.
#[derive(Debug, Clone)]
#[repr(C, align(64))]
pub(crate) struct Lanes<const N: usize>(pub(crate) [f64; N]);

impl<const N: usize> Lanes<N> {
    #[inline(always)]
    pub(crate) fn zero() -> Self {
        Lanes([0.0; N])
    }
}

/// Lanes blended at a time: few enough to stay in registers while all emitters are added.
const BLOCK: usize = 24;

/// out = Σ shareₖ · columnₖ. N must be a multiple of 24.
#[inline(always)]
pub(crate) fn blend<const FMA: bool, const N: usize>(
    shares: &[f64],
    columns: &[Lanes<N>],
    out: &mut Lanes<N>,
) {
    for start in (0..N).step_by(BLOCK) {
        let mut sums = [0.0; BLOCK];
        for (share, column) in shares.iter().zip(columns) {
            let part: &[f64; BLOCK] =
                column.0[start..start + BLOCK].try_into().expect("N is a multiple of 24");
            for lane in 0..BLOCK {
                sums[lane] = fma::<FMA>(*share, part[lane], sums[lane]);
            }
        }
        out.0[start..start + BLOCK].copy_from_slice(&sums);
    }
}

/// Σ aᵢ·bᵢ. N must be a multiple of 8.
#[inline(always)]
pub(crate) fn dot<const FMA: bool, const N: usize>(a: &[f64; N], b: &[f64; N]) -> f64 {
    // Sixteen sums at once: additions are not reordered by the compiler, and one chain would wait for itself.
    const WIDTH: usize = 8;
    let mut even = [0.0; WIDTH];
    let mut odd = [0.0; WIDTH];
    let mut start = 0;
    while start + 2 * WIDTH <= N {
        for lane in 0..WIDTH {
            even[lane] = fma::<FMA>(a[start + lane], b[start + lane], even[lane]);
            odd[lane] = fma::<FMA>(a[start + WIDTH + lane], b[start + WIDTH + lane], odd[lane]);
        }
        start += 2 * WIDTH;
    }
    while start < N {
        for lane in 0..WIDTH {
            even[lane] = fma::<FMA>(a[start + lane], b[start + lane], even[lane]);
        }
        start += WIDTH;
    }
    for lane in 0..WIDTH {
        even[lane] += odd[lane];
    }
    fold(&even)
}

/// Sum of eight lanes.
#[inline(always)]
pub(crate) fn fold(s: &[f64; 8]) -> f64 {
    ((s[0] + s[4]) + (s[2] + s[6])) + ((s[1] + s[5]) + (s[3] + s[7]))
}

/// Sum of sixteen lanes.
#[inline(always)]
pub(crate) fn sum16(a: &[f64; 16]) -> f64 {
    let mut s = [0.0; 8];
    for lane in 0..8 {
        s[lane] = a[lane] + a[lane + 8];
    }
    fold(&s)
}

/// Sum of the first 99 of 104 lanes.
#[inline(always)]
pub(crate) fn sum99(a: &[f64; 104]) -> f64 {
    let mut s = [0.0; 8];
    for start in (0..96).step_by(8) {
        for lane in 0..8 {
            s[lane] += a[start + lane];
        }
    }
    fold(&s) + (a[96] + a[97] + a[98])
}
