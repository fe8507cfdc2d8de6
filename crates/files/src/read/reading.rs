//! The answer of a reader.

use super::answers::{AxisUnit, Decimal, Ordinate, Per};
use colour::Spectrum;
use project::Correction;

/// What came of reading a file.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Outcome {
    /// Nothing was dropped, changed or doubtful.
    Read,
    /// Usable, but something was dropped, merged, bridged, rescaled, decoded by fallback, or looks wrong.
    Warned,
    /// A question is open; the spectra are the best reading.
    Ask,
    /// No answer could make a spectrum of it.
    Refused,
}

impl Outcome {
    /// The word of the headless contract.
    pub const fn key(self) -> &'static str {
        match self {
            Self::Read => "read",
            Self::Warned => "warned",
            Self::Ask => "ask",
            Self::Refused => "refused",
        }
    }
}

/// One open question and the option that answers it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Question {
    /// The question, one sentence.
    pub text: String,
    /// The option that answers it, such as `--per`.
    pub option: &'static str,
    /// The answers that fit the file, best first; empty when any number will do.
    pub choices: Vec<String>,
}

/// The dark level of a wing without emission.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct DarkEstimate {
    /// Median of the wing, in the file's own ordinate.
    pub level: f64,
    /// Standard deviation of the wing about its median, estimated from the median absolute deviation.
    pub noise: f64,
    /// Level as a fraction of the largest sample.
    pub of_peak: f64,
    /// First and last wavelength of the wing, nm.
    pub wing_nm: (f64, f64),
}

/// The usable samples in the file's own units, in order of ascending wavelength, duplicates merged.
#[derive(Debug, Clone, PartialEq)]
pub struct Raw {
    /// Axis values.
    pub axis: Vec<f64>,
    /// Unit of `axis`.
    pub axis_unit: AxisUnit,
    /// Ordinates.
    pub values: Vec<f64>,
    /// What the ordinates count.
    pub ordinate: Ordinate,
    /// The interval the ordinates are a density over.
    pub per: Per,
    /// The ordinate's unit as the file words it; empty when it has none.
    pub unit: String,
}

/// The strings [`ReadSpectrum::quantity`] may hold.
pub const QUANTITIES: [&str; 12] = [
    "power per nm",
    "power per nm (relative)",
    "power per eV",
    "power per eV (relative)",
    "power per cm-1",
    "power per cm-1 (relative)",
    "photons per nm",
    "photons per nm (relative)",
    "photons per eV",
    "photons per eV (relative)",
    "photons per cm-1",
    "photons per cm-1 (relative)",
];

/// One spectrum as the reader understands it. `None` marks what depends on an open question.
#[derive(Debug, Clone)]
pub struct ReadSpectrum {
    /// The column header verbatim, else the file's stem.
    pub name: String,
    /// The file column (row, when transposed) of the values, counted from 1.
    pub column: usize,
    /// Wavelength of the largest sample above the dark level, nm.
    pub peak_nm: Option<f64>,
    /// Distance of the outermost half-maximum crossings above the dark level, nm; `None` also when a side has none.
    pub fwhm_nm: Option<f64>,
    /// Shortest wavelength kept, nm.
    pub first_nm: Option<f64>,
    /// Longest wavelength kept, nm.
    pub last_nm: Option<f64>,
    /// Usable samples kept.
    pub points: Option<usize>,
    /// What the file's ordinate was taken to be, before conversion: one of [`QUANTITIES`].
    pub quantity: Option<&'static str>,
    /// The samples in the file's own units.
    pub raw: Raw,
    /// Power per nm over ascending nm, all conversions made, no sample changed.
    pub spectrum: Spectrum,
    /// The dark level, when a wing without emission was found.
    pub dark: Option<DarkEstimate>,
    /// Reversible steps worth offering; none is applied.
    pub offered: Vec<Correction>,
}

/// How the file was taken apart, for a preview.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Facts {
    /// What kind of file: `delimited text`, `TM-27 XML`, `JCAMP-DX`; empty when refused before that was known.
    pub format: &'static str,
    /// Character encoding.
    pub encoding: &'static str,
    /// Separator of cells.
    pub separator: &'static str,
    /// Decimal mark.
    pub decimal: Option<Decimal>,
    /// File line of the first row of numbers, counted from 1.
    pub first_data_line: usize,
    /// Rows of numbers used.
    pub rows: usize,
    /// Each file column's header and role.
    pub columns: Vec<(String, &'static str)>,
    /// True when wavelengths run along a row.
    pub transposed: bool,
}

/// Everything a reader has to say about one file.
#[derive(Debug, Clone)]
pub struct Reading {
    /// The file's name as given.
    pub file: String,
    /// What came of it.
    pub outcome: Outcome,
    /// The spectra; empty when refused.
    pub spectra: Vec<ReadSpectrum>,
    /// What had to be assumed and every conversion made, one sentence each.
    pub assumptions: Vec<String>,
    /// What was dropped, merged, bridged, rescaled or looks wrong, one sentence each.
    pub warnings: Vec<String>,
    /// Open questions.
    pub questions: Vec<Question>,
    /// For a refusal `file:line: what was expected, what was found`, fit to print as it stands.
    pub message: Option<String>,
    /// SHA-256 of the file's bytes, lower-case hexadecimal; empty when the file could not be opened.
    pub sha256: String,
    /// How the file was taken apart.
    pub facts: Facts,
}

/// A reading under way.
#[derive(Debug, Default)]
pub(super) struct Draft {
    pub(super) spectra: Vec<ReadSpectrum>,
    pub(super) assumptions: Vec<String>,
    pub(super) warnings: Vec<String>,
    pub(super) questions: Vec<Question>,
    pub(super) refusal: Option<(Option<usize>, String)>,
    pub(super) facts: Facts,
}

impl Draft {
    pub(super) fn refused(line: Option<usize>, message: impl Into<String>) -> Self {
        let mut draft = Self::default();
        draft.refuse(line, message);
        draft
    }

    pub(super) fn refuse(&mut self, line: Option<usize>, message: impl Into<String>) {
        if self.refusal.is_none() {
            self.refusal = Some((line, message.into()));
        }
    }

    pub(super) fn assume(&mut self, sentence: impl Into<String>) {
        push_once(&mut self.assumptions, sentence.into());
    }

    pub(super) fn warn(&mut self, sentence: impl Into<String>) {
        push_once(&mut self.warnings, sentence.into());
    }

    pub(super) fn ask(&mut self, text: impl Into<String>, option: &'static str, choices: &[&str]) {
        let text = text.into();
        if !self.questions.iter().any(|question| question.text == text) {
            let choices = choices.iter().map(|&choice| choice.to_owned()).collect();
            self.questions.push(Question { text, option, choices });
        }
    }

    pub(super) fn finish(mut self, file: &str, sha256: String) -> Reading {
        let message = self.refusal.take().map(|(line, message)| match line {
            Some(line) => format!("{file}:{line}: {message}"),
            None => format!("{file}: {message}"),
        });
        let outcome = if message.is_some() {
            Outcome::Refused
        } else if !self.questions.is_empty() {
            Outcome::Ask
        } else if !self.warnings.is_empty() {
            Outcome::Warned
        } else {
            Outcome::Read
        };
        if outcome == Outcome::Refused {
            self.spectra.clear();
            self.questions.clear();
        }
        Reading {
            file: file.to_owned(),
            outcome,
            spectra: self.spectra,
            assumptions: self.assumptions,
            warnings: self.warnings,
            questions: self.questions,
            message,
            sha256,
            facts: self.facts,
        }
    }
}

fn push_once(list: &mut Vec<String>, sentence: String) {
    if list.last() != Some(&sentence) && !list.contains(&sentence) {
        list.push(sentence);
    }
}
