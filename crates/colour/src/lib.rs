//! Spectra in, colour numbers out.
//!
//! Every metric of a blend of light is a function of a few hundred quantities that are *linear* in the
//! spectrum: tristimulus values, the same for each test-colour sample, luminous, scotopic, α-opic and hazard
//! weighted power, radiant power, photon count. So the data path is
//!
//! ```text
//! Spectrum --(once)--> Tensor            one column of those linear quantities
//! TensorSet × shares  --> Tensor         a blend is a tensor too
//! Tensor              --> numbers        only what is asked
//! ```
//!
//! and [`measure::measure_spectrum`] of a file, a slider and a solver all run the same code.
//!
//! * Inputs: [`spectrum`], [shapes] (emitter models), [`illuminant`] (Planckian, daylight, the CIE sources).
//! * Linear quantities: [`tensor`], [`observer`].
//! * White: [`chromaticity`], [`locus`] (CCT and Duv), [`dominant`], [`tolerance`] (bins, ellipses, circles).
//! * Rendering: [`mod@reference`], [`cri`] (CIE 13.3), [`fidelity`] (CIE 224, TM-30), [`annex_e`].
//! * Other actions of light: [`alpha_opic`], [`photobiology`].
//! * Everything at once: [`measure`]. For a solver's inner loop: [`kernel`]. For a screen: [`appearance`].
//!
//! Out of scope: files, units of instruments, solvers, windows. Colour sums run over 380–780 nm at 1 nm; only the
//! Planckian locus behind CCT runs over 360–830 nm. Published tables are embedded from `assets/tables`, each with
//! its source and licence on its first lines.

pub mod alpha_opic;
pub mod annex_e;
pub mod appearance;
pub mod chromaticity;
pub mod cri;
pub mod dominant;
pub mod fidelity;
pub mod illuminant;
pub mod kernel;
pub mod locus;
pub mod measure;
pub mod observer;
pub mod photobiology;
pub mod reference;
pub mod shapes;
pub mod spectrum;
pub mod tensor;
pub mod tolerance;

mod appearance_model;
mod tables;

pub use chromaticity::{Uv, UvPrime, Xy, Xyz};
pub use locus::CctDuv;
pub use measure::Measurement;
pub use observer::Observer;
pub use reference::Reference;
pub use spectrum::{Spectrum, SpectrumError};
pub use tensor::{Tensor, TensorSet};

/// Maximum luminous efficacy of photopic vision, lm/W (CIE S 010, 683 without the 0.002 of 683.002).
pub const PHOTOPIC_EFFICACY_LM_PER_W: f64 = 683.0;
/// Maximum luminous efficacy of scotopic vision, lm/W (CIE S 010, 1700 without the 0.06 of 1700.06).
pub const SCOTOPIC_EFFICACY_LM_PER_W: f64 = 1700.0;
/// Second radiation constant used for colorimetric Planckians, m·K (1.4388e-2, ITS-90 as used by CIE 15).
pub const SECOND_RADIATION_CONSTANT_M_K: f64 = 1.4388e-2;
/// First wavelength of the colour sums, nm.
pub const FIRST_NM: f64 = 380.0;
/// Last wavelength of the colour sums, nm.
pub const LAST_NM: f64 = 780.0;
/// Number of wavelengths of the colour sums: 380, 381 … 780 nm.
pub const GRID_POINTS: usize = 401;
