//! Un-mixing: the shares of known emitters in a measured white.
//!
//! [`unmix`] fits aᵢ ≥ 0 in min Σₖ (m(λₖ) − Σᵢ aᵢ sᵢ(λₖ))² over the measured samples inside 380–780 nm
//! (non-negative least squares; Lawson and Hanson, *Solving Least Squares Problems*, 1974, chapter 23). Where asked,
//! each emitter may also move along the axis and widen about its centre; these are found by damped Gauss–Newton steps,
//! the amplitudes again by non-negative least squares at each step.
//!
//! Uncertainties are those of the fit alone: the residual's variance through the inverse normal matrix, carried to
//! the shares by their derivatives. They do not cover errors of the emitter spectra.

mod curve;
mod fit;
mod judge;
mod nnls;

use colour::Spectrum;

/// What may change about the emitters while fitting.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct Freedom {
    /// Each emitter may move along the axis, up to [`GREATEST_SHIFT_NM`].
    pub shift: bool,
    /// Each emitter may widen or narrow about its centre, up to [`STRETCH_RANGE`].
    pub stretch: bool,
}

/// How far an emitter may be moved, nm either way.
pub const GREATEST_SHIFT_NM: f64 = 15.0;

/// Least and greatest widening factor.
pub const STRETCH_RANGE: (f64, f64) = (0.6, 1.6);

/// What was found in a measured spectrum.
#[derive(Debug, Clone, PartialEq)]
pub struct Unmixed {
    /// Shares of the fitted radiant power, 380–780 nm, one an emitter, sum 1.
    pub shares: Vec<f64>,
    /// Standard uncertainty of each share; `None` where the emitter cannot be told from the others.
    pub share_sigma: Vec<Option<f64>>,
    /// Radiant power of each emitter in the measurement's own scale, 380–780 nm.
    pub powers: Vec<f64>,
    /// Displacement of each emitter in nm, when asked; 0 for an emitter that is not found.
    pub shift_nm: Option<Vec<f64>>,
    /// Widening of each emitter, when asked; 1 for an emitter that is not found.
    pub stretch: Option<Vec<f64>>,
    /// Share of the measured radiant power that no emitter accounts for, 0 to 1: the positive part of the residual,
    /// averaged over [`SMOOTHING_NM`] so that noise does not count as light.
    pub unexplained: f64,
    /// Root mean square of the residual over the peak of the measurement.
    pub residual_rms: f64,
    /// Wavelengths fitted, nm.
    pub wavelengths_nm: Vec<f64>,
    /// Measured minus fitted at those wavelengths.
    pub residual: Vec<f64>,
    /// What makes the answer doubtful.
    pub doubts: Vec<Doubt>,
}

/// Width of the running mean under [`Unmixed::unexplained`], nm.
pub const SMOOTHING_NM: f64 = 10.0;

/// Something that makes an un-mixing doubtful.
#[derive(Debug, Clone, PartialEq)]
#[non_exhaustive]
pub enum Doubt {
    /// The residual has a shape: light is there that no emitter of the set makes.
    MissingLight {
        /// Its share of the measured power.
        share: f64,
        /// Where most of it lies, nm.
        near_nm: f64,
    },
    /// The fit puts light where the measurement has none: an emitter has changed its shape or moved.
    TooMuchLight {
        /// Its share of the measured power.
        share: f64,
        /// Where most of it lies, nm.
        near_nm: f64,
    },
    /// Two or more emitters are so alike that their shares cannot be told apart.
    Alike {
        /// The emitter, counted from 0.
        emitter: usize,
    },
    /// A shift or stretch ran to the end of its range.
    AtTheEnd {
        /// The emitter, counted from 0.
        emitter: usize,
    },
    /// Part of 380–780 nm was not measured, where an emitter has light.
    NotMeasured {
        /// The emitter, counted from 0.
        emitter: usize,
        /// Share of its power outside the measured range.
        share: f64,
    },
}

impl Doubt {
    /// The emitter the doubt is about, counted from 0; `None` when it is about the whole fit.
    pub const fn emitter(&self) -> Option<usize> {
        match self {
            Self::MissingLight { .. } | Self::TooMuchLight { .. } => None,
            Self::Alike { emitter } | Self::AtTheEnd { emitter } | Self::NotMeasured { emitter, .. } => {
                Some(*emitter)
            }
        }
    }
}

impl std::fmt::Display for Doubt {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::MissingLight { share, near_nm } => write!(
                f,
                "{:.1} % of the measured power, most of it near {near_nm:.0} nm, comes from none of the emitters: one is missing or has changed its shape",
                100.0 * share
            ),
            Self::TooMuchLight { share, near_nm } => write!(
                f,
                "the fit has {:.1} % of the power too much, most of it near {near_nm:.0} nm: an emitter has changed its shape or moved",
                100.0 * share
            ),
            Self::Alike { .. } => {
                f.write_str("it cannot be told from the others; only the sum of their shares has a meaning")
            }
            Self::AtTheEnd { .. } => f.write_str("its shift or stretch ran to the end of its range"),
            Self::NotMeasured { share, .. } => write!(
                f,
                "{:.1} % of its light lies outside the measured range and is taken on trust",
                100.0 * share
            ),
        }
    }
}

/// Why nothing can be un-mixed.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum UnmixError {
    /// No emitters.
    #[error("expected at least one emitter, found none")]
    NoEmitters,
    /// An emitter without light.
    #[error("expected emitters with power between 380 and 780 nm, found none in emitter {}", .emitter + 1)]
    DarkEmitter {
        /// The emitter, counted from 0.
        emitter: usize,
    },
    /// The measurement holds too little.
    #[error("expected at least {needed} samples between 380 and 780 nm, found {found}")]
    TooFewSamples {
        /// Samples needed: one more than what is fitted.
        needed: usize,
        /// Samples found.
        found: usize,
    },
    /// The measurement has no light that any emitter could have made.
    #[error("expected light of these emitters, found none in the measured spectrum")]
    NothingFound,
}

/// The shares of `emitters` in `measured`.
///
/// Powers are plain 1 nm sums over 380–780 nm of each emitter's (moved, widened) curve; shares are fractions of their
/// sum. The measurement's own samples are fitted, unweighted; emitters are read between their samples by a cubic spline.
///
/// *Valid range:* more samples than unknowns; emitters that differ in shape.
///
/// # Errors
/// No emitters, an emitter without light, too few samples, or no light of these emitters at all.
pub fn unmix(measured: &Spectrum, emitters: &[Spectrum], freedom: Freedom) -> Result<Unmixed, UnmixError> {
    if emitters.is_empty() {
        return Err(UnmixError::NoEmitters);
    }
    let problem = fit::Problem::new(measured, emitters, freedom)?;
    let found = problem.solve();
    if found.powers.iter().sum::<f64>() <= 0.0 {
        return Err(UnmixError::NothingFound);
    }
    Ok(judge::judge(&problem, found, freedom))
}

#[cfg(test)]
mod tests;
