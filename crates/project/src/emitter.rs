//! Emitters: the spectrum as it was read, the reversible steps over it, and what is known of its making.

use colour::Spectrum;
use serde::{Deserialize, Serialize};

/// The identity of an emitter inside one project; never reused.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub struct EmitterId(pub u64);

/// How the light was collected. Sphere and normal-direction spectra of one device differ, so kinds must not be mixed.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize, Deserialize)]
pub enum Geometry {
    /// All directions, in an integrating sphere.
    Sphere,
    /// Along the surface normal.
    Normal,
    /// At one angle from the normal, in degrees.
    Angle(f64),
    /// Not stated.
    #[default]
    Unknown,
}

/// What made the light.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize, Deserialize)]
pub enum Origin {
    /// Electroluminescence, with the current density when it is known.
    Electroluminescence {
        /// Drive level in mA/cm².
        current_density_ma_per_cm2: Option<f64>,
    },
    /// Photoluminescence of a film: not what a device emits.
    FilmPhotoluminescence,
    /// A modelled curve, not a measurement.
    Modelled,
    /// Not stated.
    #[default]
    Unknown,
}

/// Whether the emitter was measured alone or inside the stack it is to be used in.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
pub enum Mounting {
    /// A device of its own.
    SingleDevice,
    /// Inside the finished stack.
    InStack,
    /// Not stated.
    #[default]
    Unknown,
}

/// The file a spectrum came from.
#[derive(Debug, Clone, PartialEq, Eq, Default, Serialize, Deserialize)]
pub struct SourceFile {
    /// File name without its folder.
    pub name: String,
    /// SHA-256 of the file's bytes, lower-case hexadecimal.
    pub sha256: String,
    /// The column or data block inside the file.
    #[serde(default)]
    pub column: String,
}

/// The samples as they were read, in power per nm, never changed afterwards.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
pub struct Import {
    /// Ascending wavelengths in nm.
    pub wavelengths_nm: Vec<f64>,
    /// Power per nm at those wavelengths, in the file's own (mostly relative) scale.
    pub power_per_nm: Vec<f64>,
    /// Where they came from; `None` for invented or typed spectra.
    #[serde(default)]
    pub source: Option<SourceFile>,
    /// What the reader assumed and converted, one sentence each.
    #[serde(default)]
    pub assumptions: Vec<String>,
    /// What the reader warned of, one sentence each.
    #[serde(default)]
    pub warnings: Vec<String>,
}

/// A change laid over the imported samples; each can be switched off again.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub enum Correction {
    /// Subtract a constant dark level, in the import's own scale.
    SubtractDark {
        /// Level to subtract from every sample.
        level: f64,
    },
    /// Set negative samples to zero.
    RemoveNegatives,
    /// Keep only the samples between two wavelengths.
    Crop {
        /// First wavelength kept, nm.
        first_nm: f64,
        /// Last wavelength kept, nm.
        last_nm: f64,
    },
    /// Move the whole curve along the axis.
    Shift {
        /// Displacement in nm, positive towards the red.
        by_nm: f64,
    },
}

/// A correction and whether it is in force.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct CorrectionStep {
    /// What is done.
    pub correction: Correction,
    /// Whether it is done; a step switched off stays in the history.
    pub on: bool,
}

/// One source spectrum, with what is known of it.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Emitter {
    /// Identity inside the project.
    pub id: EmitterId,
    /// The user's name for it.
    pub name: String,
    /// True for demonstration data that was never measured.
    #[serde(default)]
    pub invented: bool,
    /// Free text.
    #[serde(default)]
    pub note: String,
    /// The samples as read.
    pub import: Import,
    /// Reversible steps, in order.
    #[serde(default)]
    pub corrections: Vec<CorrectionStep>,
    /// How the light was collected.
    #[serde(default)]
    pub geometry: Geometry,
    /// What made the light.
    #[serde(default)]
    pub origin: Origin,
    /// Alone or in the stack.
    #[serde(default)]
    pub mounting: Mounting,
    /// Range over which the instrument is trusted, nm.
    #[serde(default)]
    pub instrument_range_nm: Option<(f64, f64)>,
    /// Optical watts per electrical watt, when nothing finer is known; 0 to 1.
    #[serde(default)]
    pub wall_plug: Option<f64>,
    /// Electrical and thermal data.
    #[serde(default)]
    pub sheet: device::Sheet,
}

/// Why an emitter's samples make no spectrum.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum SpectrumProblem {
    /// The corrections left too little.
    #[error("{name}: {source}")]
    Invalid {
        /// Name of the emitter.
        name: String,
        /// What the colour crate refused.
        source: colour::SpectrumError,
    },
}

impl Emitter {
    /// The spectrum after the corrections in force, in their order.
    ///
    /// # Errors
    /// When the samples, or what the corrections leave of them, are no spectrum.
    pub fn spectrum(&self) -> Result<Spectrum, SpectrumProblem> {
        let mut wavelengths_nm = self.import.wavelengths_nm.clone();
        let mut power = self.import.power_per_nm.clone();
        for step in self.corrections.iter().filter(|step| step.on) {
            match step.correction {
                Correction::SubtractDark { level } => power.iter_mut().for_each(|p| *p -= level),
                Correction::RemoveNegatives => power.iter_mut().for_each(|p| *p = p.max(0.0)),
                Correction::Crop { first_nm, last_nm } => {
                    let keep: Vec<bool> =
                        wavelengths_nm.iter().map(|w| (first_nm..=last_nm).contains(w)).collect();
                    let mut flags = keep.iter();
                    wavelengths_nm.retain(|_| *flags.next().unwrap_or(&false));
                    let mut flags = keep.iter();
                    power.retain(|_| *flags.next().unwrap_or(&false));
                }
                Correction::Shift { by_nm } => wavelengths_nm.iter_mut().for_each(|w| *w += by_nm),
            }
        }
        Spectrum::new(wavelengths_nm, power)
            .map_err(|source| SpectrumProblem::Invalid { name: self.name.clone(), source })
    }
}
