//! Choice of instruction set at run time.

use pulp::{Arch, Simd, WithSimd};
use std::sync::LazyLock;

/// Which instructions the kernels use.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Arithmetic {
    /// The best set this processor has (AVX2 with FMA where present), found at run time.
    #[default]
    Dispatched,
    /// The set the program was compiled for (SSE2 on x86-64): for checks and measurements.
    Plain,
}

static BEST: LazyLock<Arch> = LazyLock::new(Arch::new);

/// A computation whose loops are compiled once per instruction set. `run` must be `#[inline(always)]`, and so must all it
/// calls, or the loops stay outside the function that has the instructions enabled.
pub(crate) trait Lanewise {
    type Output;
    fn run<const FMA: bool>(self) -> Self::Output;
}

struct Dispatch<K>(K);

impl<K: Lanewise> WithSimd for Dispatch<K> {
    type Output = K::Output;

    #[inline(always)]
    fn with_simd<S: Simd>(self, _: S) -> K::Output {
        if S::IS_SCALAR { self.0.run::<false>() } else { self.0.run::<true>() }
    }
}

impl Arithmetic {
    #[inline]
    pub(crate) fn run<K: Lanewise>(self, computation: K) -> K::Output {
        match self {
            Arithmetic::Dispatched => BEST.dispatch(Dispatch(computation)),
            Arithmetic::Plain => computation.run::<false>(),
        }
    }
}
