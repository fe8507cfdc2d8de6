//! The blend sheet: everything someone needs to make a blend, and what it will measure.
//!
//! Shares are given by radiant power, by luminous flux and by photons, each named; no share stands without its kind.
//! Every assumption a reader made, every correction in force and the SHA-256 of every source file go with it.

mod table;

pub use table::blend_sheet_csv;

use colour::{Measurement, Observer, Tensor, TensorSet, locus, measure};
use project::{
    CorrectionStep, Emitter, Geometry, Limit, Maximise, Metric, Mounting, Origin, Project, Region, SetId,
    SourceFile, WhiteSpec,
};
use ron::ser::PrettyConfig;
use serde::Serialize;

/// Version of the blend sheet's keys.
pub const SHEET_VERSION: u32 = 1;

/// A blend sheet; its serialised names are its documented keys.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct BlendSheet {
    /// [`SHEET_VERSION`].
    pub sheet_version: u32,
    /// Name and version of the program that wrote it.
    pub program: String,
    /// Name of the project.
    pub project: String,
    /// Name of the emitter set.
    pub set: String,
    /// The set's note.
    pub note: String,
    /// What the blend is to meet.
    pub white_spec: WhiteSpec,
    /// The emitters in use, in row order.
    pub emitters: Vec<SheetEmitter>,
    /// What the blend will measure.
    pub predicted: Predicted,
    /// Every limit of the white spec, and whether the prediction keeps it.
    pub limits: Vec<SheetLimit>,
    /// What is known of the answer's worth (the proof), when the blend was solved.
    pub proof: Option<String>,
    /// What was taken for granted, one sentence each.
    pub assumptions: Vec<String>,
    /// Cautions that go with the numbers, one sentence each.
    pub cautions: Vec<String>,
}

/// One emitter of a blend sheet.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SheetEmitter {
    /// Its name.
    pub name: String,
    /// True for data that was never measured.
    pub invented: bool,
    /// Share of the blend's radiant power, 380–780 nm.
    pub share_radiant: f64,
    /// Share of the blend's luminous flux.
    pub share_luminous: f64,
    /// Share of the blend's photons, 380–780 nm.
    pub share_photon: f64,
    /// Peak wavelength, nm.
    pub peak_nm: f64,
    /// Full width at half maximum, nm.
    pub fwhm_nm: Option<f64>,
    /// Mean wavelength ∫Sλ/∫S over 380–780 nm.
    pub mean_wavelength_nm: f64,
    /// Luminous efficacy of its radiation, lm per optical watt.
    pub ler_lm_per_w: f64,
    /// Optical watts per electrical watt.
    pub wall_plug: Option<f64>,
    /// Optical watts for the wanted lumens.
    pub optical_w: Option<f64>,
    /// Electrical watts for the wanted lumens, driver not counted.
    pub electrical_w: Option<f64>,
    /// How the light was collected.
    pub geometry: Geometry,
    /// What made the light.
    pub origin: Origin,
    /// Alone or in the stack.
    pub mounting: Mounting,
    /// The file and its SHA-256; `None` for invented or typed spectra.
    pub source: Option<SourceFile>,
    /// What the reader assumed.
    pub reader_assumptions: Vec<String>,
    /// What the reader warned of.
    pub reader_warnings: Vec<String>,
    /// The corrections, those switched off included.
    pub corrections: Vec<CorrectionStep>,
}

/// What the blend will measure: the keys of the `measure` command, and what follows for the device.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Predicted {
    /// Every colour number.
    pub colour: Measurement,
    /// Distance from the target in u′v′.
    pub distance_from_target_uv_prime: f64,
    /// Luminous efficacy of the device, lm per electrical watt, driver not counted.
    pub efficacy_lm_per_w: Option<f64>,
    /// Optical watts for the wanted lumens.
    pub optical_w: Option<f64>,
}

/// One limit of the white spec.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SheetLimit {
    /// Key of the metric.
    pub name: &'static str,
    /// The predicted value.
    pub value: Option<f64>,
    /// Least value allowed.
    pub low: Option<f64>,
    /// Greatest value allowed.
    pub high: Option<f64>,
    /// Whether the prediction keeps it.
    pub met: bool,
}

/// Why there is no blend sheet.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum SheetError {
    /// The set is not in the project.
    #[error("there is no such set in this project")]
    NoSet,
    /// Nothing in the set has a share.
    #[error("no emitter of this set has a share, so there is no blend to write down")]
    NoBlend,
    /// An emitter in use makes no spectrum.
    #[error(transparent)]
    Spectrum(#[from] project::SpectrumProblem),
    /// An emitter in use has no light.
    #[error("{0}: there is no positive light between 380 and 780 nm")]
    NoLight(String),
}

/// The light of the emitters in use, and their radiant shares scaled to sum to 1.
pub(crate) struct Used<'a> {
    pub(crate) emitters: Vec<&'a Emitter>,
    pub(crate) spectra: Vec<colour::Spectrum>,
    pub(crate) shares: Vec<f64>,
    pub(crate) tensors: TensorSet,
}

impl<'a> Used<'a> {
    pub(crate) fn of(project: &'a Project, set: SetId) -> Result<Self, SheetError> {
        let set = project.set(set).ok_or(SheetError::NoSet)?;
        let mut used = Self {
            emitters: Vec::new(),
            spectra: Vec::new(),
            shares: Vec::new(),
            tensors: TensorSet::default(),
        };
        let mut tensors = Vec::new();
        for member in set.members.iter().filter(|m| m.on && m.share > 0.0) {
            let emitter = project.emitter(member.emitter).ok_or(SheetError::NoSet)?;
            let spectrum = emitter.spectrum()?;
            let tensor = Tensor::of(&spectrum);
            if !tensor.is_light() {
                return Err(SheetError::NoLight(emitter.name.clone()));
            }
            used.emitters.push(emitter);
            used.spectra.push(spectrum);
            used.shares.push(member.share);
            tensors.push(tensor);
        }
        let sum: f64 = used.shares.iter().sum();
        if sum.is_nan() || sum <= 0.0 {
            return Err(SheetError::NoBlend);
        }
        used.shares.iter_mut().for_each(|share| *share /= sum);
        used.tensors = TensorSet::new(&tensors);
        Ok(used)
    }
}

impl BlendSheet {
    /// The sheet of a set's blend as it stands. `program` is the writing program's name and version; `proof` what is
    /// known of the answer's worth.
    ///
    /// # Errors
    /// When there is no blend to write down.
    pub fn of(
        project: &Project,
        set: SetId,
        program: &str,
        proof: Option<String>,
    ) -> Result<Self, SheetError> {
        let used = Used::of(project, set)?;
        let set = project.set(set).ok_or(SheetError::NoSet)?;
        let blend = used.tensors.blend(&used.shares);
        let colour = measure::measure(&blend);
        let ler = blend.ler_lm_per_w();
        let optical_w = set.white.lumens.map(|lumens| lumens / ler);
        let photons: f64 = blend.mean_wavelength_nm();
        let mut electrical = Some(0.0);
        let mut emitters = Vec::with_capacity(used.emitters.len());
        for (k, emitter) in used.emitters.iter().enumerate() {
            let (share, tensor) = (used.shares[k], used.tensors.tensor(k));
            let features = used.spectra[k].features();
            let wall_plug = emitter.wall_plug.or(emitter.sheet.wall_plug).filter(|w| *w > 0.0);
            electrical = electrical.zip(wall_plug).map(|(sum, wall_plug)| sum + share / wall_plug);
            let own_w = optical_w.map(|watts| watts * share);
            emitters.push(SheetEmitter {
                name: emitter.name.clone(),
                invented: emitter.invented,
                share_radiant: share,
                share_luminous: share * tensor.ler_lm_per_w() / ler,
                share_photon: share * tensor.mean_wavelength_nm() / photons,
                peak_nm: features.peak_nm,
                fwhm_nm: features.fwhm_nm,
                mean_wavelength_nm: tensor.mean_wavelength_nm(),
                ler_lm_per_w: tensor.ler_lm_per_w(),
                wall_plug,
                optical_w: own_w,
                electrical_w: own_w.zip(wall_plug).map(|(watts, wall_plug)| watts / wall_plug),
                geometry: emitter.geometry,
                origin: emitter.origin,
                mounting: emitter.mounting,
                source: emitter.import.source.clone(),
                reader_assumptions: emitter.import.assumptions.clone(),
                reader_warnings: emitter.import.warnings.clone(),
                corrections: emitter.corrections.clone(),
            });
        }
        let target = locus::uv_at(set.white.cct_k, set.white.duv).uv_prime();
        let predicted = Predicted {
            distance_from_target_uv_prime: blend.xyz(Observer::Cie1931).uv_prime().distance(target),
            efficacy_lm_per_w: electrical.filter(|e| *e > 0.0).map(|electrical| ler / electrical),
            optical_w,
            colour,
        };
        Ok(Self {
            sheet_version: SHEET_VERSION,
            program: program.to_owned(),
            project: project.name.clone(),
            set: set.name.clone(),
            note: set.note.clone(),
            white_spec: set.white.clone(),
            limits: limits(&set.white, &predicted),
            assumptions: assumptions(&used, &set.white),
            cautions: cautions(&predicted),
            emitters,
            predicted,
            proof,
        })
    }

    /// The sheet as RON text.
    ///
    /// # Errors
    /// When the text cannot be made (a nesting deeper than RON allows: not for sheets made by [`BlendSheet::of`]).
    pub fn to_ron(&self) -> Result<String, ron::Error> {
        let config = PrettyConfig::new().indentor("  ").depth_limit(5);
        let body = ron::Options::default().to_string_pretty(self, config)?;
        Ok(format!(
            "// A Whitesmith blend sheet, version {}. No share stands without its kind.\n{body}\n",
            self.sheet_version
        ))
    }
}

fn limits(white: &WhiteSpec, predicted: &Predicted) -> Vec<SheetLimit> {
    let colour = &predicted.colour;
    Metric::ALL
        .into_iter()
        .filter(|metric| !white.limits.of(*metric).is_open())
        .map(|metric| {
            let limit: &Limit = white.limits.of(metric);
            let value = match metric {
                Metric::Ra => colour.ra,
                Metric::R9 => colour.r9(),
                Metric::Rf => colour.rf,
                Metric::Rg => colour.rg,
                Metric::Ler => Some(colour.ler_lm_per_w),
                Metric::Efficacy => predicted.efficacy_lm_per_w,
            };
            // Solved blends sit on their limits; the last bits of rounding are no shortfall.
            let met = value.and_then(|value| limit.margin(value)).is_some_and(|margin| margin >= -1e-6);
            SheetLimit { name: metric.key(), value, low: limit.low, high: limit.high, met }
        })
        .collect()
}

fn assumptions(used: &Used<'_>, white: &WhiteSpec) -> Vec<String> {
    let mut out = vec![
        "Colour is for the CIE 1931 2\u{b0} observer; colour sums run over 380 to 780 nm at 1 nm.".to_owned(),
        "Samples between those of a file are interpolated linearly; finer ones are averaged over 1 nm."
            .to_owned(),
        "Light of the emitters adds without acting on one another: no reabsorption, no heating.".to_owned(),
    ];
    if white.lumens.is_some() {
        out.push(
            "Watts are at the state the spectra were measured in; driver losses are not counted.".to_owned(),
        );
    }
    let mut geometries: Vec<String> = used.emitters.iter().map(|e| format!("{:?}", e.geometry)).collect();
    geometries.sort();
    geometries.dedup();
    if geometries.len() > 1 {
        out.push(format!("Spectra of different geometries are blended: {}.", geometries.join(", ")));
    }
    let films = used.emitters.iter().filter(|e| e.origin == Origin::FilmPhotoluminescence);
    out.extend(
        films.map(|e| format!("{}: photoluminescence of a film stands for what the device emits.", e.name)),
    );
    let unknown = used.emitters.iter().filter(|e| e.geometry == Geometry::Unknown);
    out.extend(unknown.map(|e| format!("{}: how its light was collected is not stated.", e.name)));
    out
}

fn cautions(predicted: &Predicted) -> Vec<String> {
    let mut out = predicted.colour.warnings.clone();
    out.push(format!("Blue-light efficacy: {}", colour::photobiology::BLUE_LIGHT_CAUTION));
    out.push("Melanopic figures describe the light; they are no statement about health.".to_owned());
    out
}

/// "±175 K, ±0.006 Duv" and the like, as a limit argument would be written.
pub(crate) fn region_text(region: &Region) -> String {
    region.to_string()
}

/// What is maximised, as the `--maximise` argument says it.
pub(crate) const fn maximise_text(maximise: Maximise) -> &'static str {
    match maximise {
        Maximise::Ler => "ler",
        Maximise::Efficacy => "efficacy",
        Maximise::Ra => "ra",
        Maximise::Rf => "rf",
    }
}

#[cfg(test)]
pub(crate) mod tests;
