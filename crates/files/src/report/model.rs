//! What a report says, as plain data.

use crate::drawing::figures::{
    DevicePicture, FidelityBars, HueBins, Look, Neighbourhood, RenderingBars, SpectrumPlot,
};
use serde::{Deserialize, Serialize};

/// Everything a report says. Parts that are absent or empty leave their section out.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
#[serde(default)]
pub struct ReportModel {
    /// Name of the white.
    pub title: String,
    /// Name of the project.
    pub project: String,
    /// Name of the emitter set.
    pub set: String,
    /// Program and version that computed it.
    pub program: String,
    /// Date, as it shall be printed.
    pub date: String,
    /// A note on the data, such as that it is invented; printed under the title.
    pub data_note: String,
    /// The white asked for, in a sentence.
    pub white: String,
    /// The requirements with their margins.
    pub ledger: Vec<LedgerLine>,
    /// What is proven about the blend, in a sentence.
    pub proof: String,
    /// The blend by every kind of share.
    pub shares: Vec<ShareRow>,
    /// Measured or predicted values of the blend.
    pub measured: Vec<MeasuredValue>,
    /// The spectrum.
    pub spectrum: Option<SpectrumPlot>,
    /// The white in u′v′.
    pub chromaticity: Option<Neighbourhood>,
    /// R1–R15.
    pub rendering: Option<RenderingBars>,
    /// Fidelity by hue bin.
    pub fidelity: Option<FidelityBars>,
    /// Shifts by hue bin.
    pub hue: Option<HueBins>,
    /// What the line sets.
    pub recipe: Option<RecipeSheet>,
    /// What was taken for granted.
    pub assumptions: Vec<Assumption>,
    /// Where the spectra came from.
    pub sources: Vec<SourceFile>,
    /// How the numbers were computed.
    pub methods: Vec<Method>,
    /// Indicative photobiological figures; the caution is printed with or without them.
    pub photobiology: Vec<MeasuredValue>,
    /// Who signs, such as `prepared by`.
    pub signatures: Vec<String>,
}

/// One requirement.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
#[serde(default)]
pub struct LedgerLine {
    /// What is required, such as `Ra`.
    pub name: String,
    /// Its value; `None` when data is lacking.
    pub value: Option<f64>,
    /// Decimals to print value, limit and margin with.
    pub decimals: usize,
    /// Unit, empty for none.
    pub unit: String,
    /// Least value allowed.
    pub low: Option<f64>,
    /// Greatest value allowed.
    pub high: Option<f64>,
    /// Met, short, or not known.
    pub met: Option<bool>,
    /// What else is to be said, such as the bin's name or what the line still needs.
    pub note: String,
}

impl LedgerLine {
    /// Distance to the nearer limit: positive inside, negative when short; `None` without a value or a limit.
    pub fn margin(&self) -> Option<f64> {
        let value = self.value?;
        let below = self.low.map(|low| value - low);
        let above = self.high.map(|high| high - value);
        match (below, above) {
            (Some(a), Some(b)) => Some(a.min(b)),
            (a, b) => a.or(b),
        }
    }
}

/// One emitter's part of the blend, by all three kinds of share (fractions, each kind summing to 1).
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ShareRow {
    /// How the emitter is told apart.
    pub look: Look,
    /// Share of radiant power, 380–780 nm.
    pub radiant: Option<f64>,
    /// Share of luminous flux.
    pub luminous: Option<f64>,
    /// Share of photons.
    pub photon: Option<f64>,
    /// Power-weighted mean wavelength, nm.
    pub mean_wavelength_nm: Option<f64>,
}

/// One value with its unit and source.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
#[serde(default)]
pub struct MeasuredValue {
    /// What it is.
    pub name: String,
    /// The value; `None` when unknown.
    pub value: Option<f64>,
    /// Decimals to print.
    pub decimals: usize,
    /// Unit, empty for none.
    pub unit: String,
    /// Standard or formula behind it.
    pub source: String,
}

/// The recipe of one build form.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
#[serde(default)]
pub struct RecipeSheet {
    /// `side-by-side`, `series-stack`, `shared-zone` or `packages`.
    pub build_form: String,
    /// What is built, in a sentence.
    pub summary: String,
    /// The quantities the line sets.
    pub rows: Vec<RecipeRow>,
    /// The device to scale.
    pub picture: Option<DevicePicture>,
    /// What the device is predicted to do.
    pub predicted: Vec<MeasuredValue>,
}

/// One quantity the line sets.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
#[serde(default)]
pub struct RecipeRow {
    /// The part it belongs to, such as an emitter or a layer; empty for the whole device.
    pub part: String,
    /// What is set, such as `stripe width`.
    pub quantity: String,
    /// The value to set, in `unit`.
    pub target: Option<f64>,
    /// Lower end of the band that keeps the white inside its spec.
    pub allowed_low: Option<f64>,
    /// Upper end of that band.
    pub allowed_high: Option<f64>,
    /// Unit, empty for a plain number.
    pub unit: String,
    /// Calibration runs it rests on.
    pub calibration_runs: Vec<String>,
    /// What else the line must know.
    pub remark: String,
}

/// Something taken for granted.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
#[serde(default)]
pub struct Assumption {
    /// What, in a sentence.
    pub statement: String,
    /// True when it is a default that nobody touched.
    pub untouched_default: bool,
}

/// A file spectra were read from.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
#[serde(default)]
pub struct SourceFile {
    /// Emitter read from it.
    pub emitter: String,
    /// File name.
    pub file: String,
    /// SHA-256 of its bytes, hexadecimal.
    pub sha256: String,
    /// Geometry, instrument, corrections.
    pub remark: String,
}

/// How a quantity is computed.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
#[serde(default)]
pub struct Method {
    /// What is computed.
    pub quantity: String,
    /// The standard or formula, with its edition.
    pub source: String,
}
