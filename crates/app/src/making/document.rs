//! A recipe as it leaves the program: every number, band, share, assumption and source in one serialisable whole.

use super::{Making, Number};
use colour::Measurement;
use device::Recipe;
use device::build::Sensitivity;
use project::{Metric, Project, SourceFile, WhiteSpec};
use serde::Serialize;

/// Version of the document's keys.
pub const RECIPE_VERSION: u32 = 1;

/// The program's name and version.
pub fn program() -> String {
    format!("Whitesmith {}", env!("CARGO_PKG_VERSION"))
}

/// A recipe document; its serialised names are its documented keys.
#[derive(Debug, Clone, Serialize)]
pub struct RecipeDocument {
    /// [`RECIPE_VERSION`].
    pub recipe_version: u32,
    /// Program and version.
    pub program: String,
    /// Name of the project.
    pub project: String,
    /// Name of the set.
    pub set: String,
    /// Name of the recipe.
    pub recipe: String,
    /// The white asked for.
    pub white_spec: WhiteSpec,
    /// Every number the line sets, with target and allowed band.
    pub numbers: Vec<Number>,
    /// Words for the region the bands keep the white in.
    pub bands_keep: String,
    /// Why there are no bands, where there are none.
    pub no_bands: Option<String>,
    /// Corners of the joint box that were checked.
    pub corners_checked: usize,
    /// The device and what it gives, with the three kinds of share side by side.
    pub device: Recipe,
    /// Every colour number of its light.
    pub predicted: Measurement,
    /// Every limit of the white spec.
    pub limits: Vec<LimitLine>,
    /// What +1 % of every number does.
    pub sensitivities: Vec<Sensitivity>,
    /// What was assumed.
    pub assumptions: Vec<String>,
    /// Defaults left untouched.
    pub untouched_defaults: Vec<String>,
    /// What is missing.
    pub missing: Vec<String>,
    /// Remarks and cautions.
    pub notices: Vec<String>,
    /// Where the spectra came from.
    pub sources: Vec<SourceLine>,
}

/// One limit of the white spec, with the prediction for the device.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct LimitLine {
    /// Key of the metric.
    pub name: &'static str,
    /// Predicted value.
    pub value: Option<f64>,
    /// Least value allowed.
    pub low: Option<f64>,
    /// Greatest value allowed.
    pub high: Option<f64>,
    /// Whether it is met.
    pub met: bool,
}

/// Where one emitter's spectrum came from.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SourceLine {
    /// Name of the emitter.
    pub emitter: String,
    /// True for data that was never measured.
    pub invented: bool,
    /// The file and its SHA-256; `None` for invented or typed spectra.
    pub source: Option<SourceFile>,
}

impl Making {
    /// Every limit of the white spec against what the device gives; efficacy is the device's own.
    pub fn limits(&self) -> Vec<LimitLine> {
        let white = self.white();
        let value = |metric| match metric {
            Metric::Ra => self.measured.ra,
            Metric::R9 => self.measured.r9(),
            Metric::Rf => self.measured.rf,
            Metric::Rg => self.measured.rg,
            Metric::Ler => Some(self.measured.ler_lm_per_w),
            Metric::Efficacy => self.recipe.efficacy_lm_per_w,
        };
        Metric::ALL
            .into_iter()
            .filter(|metric| !white.limits.of(*metric).is_open())
            .map(|metric| {
                let (limit, value) = (white.limits.of(metric), value(metric));
                let met = value.is_some_and(|value| limit.contains(value));
                LimitLine { name: metric.key(), value, low: limit.low, high: limit.high, met }
            })
            .collect()
    }

    /// Where every emitter's spectrum came from.
    pub fn sources(&self, project: &Project) -> Vec<SourceLine> {
        self.devices
            .ids
            .iter()
            .filter_map(|id| project.emitter(*id))
            .map(|emitter| SourceLine {
                emitter: emitter.name.clone(),
                invented: emitter.invented,
                source: emitter.import.source.clone(),
            })
            .collect()
    }

    /// The whole document.
    pub fn document(&self, project: &Project) -> RecipeDocument {
        let (numbers, bands) = self.numbers_and_bands();
        let mut notices = self.recipe.notices.clone();
        notices.extend(self.measured.warnings.iter().cloned());
        notices.push(CAUTION.to_owned());
        RecipeDocument {
            recipe_version: RECIPE_VERSION,
            program: program(),
            project: project.name.clone(),
            set: self.set_name.clone(),
            recipe: self.plan.name.clone(),
            white_spec: self.white().clone(),
            numbers,
            bands_keep: self.band_region().to_owned(),
            no_bands: bands.as_ref().err().map(ToString::to_string),
            corners_checked: bands.map_or(0, |bands| bands.corners_checked),
            device: self.recipe.clone(),
            predicted: self.measured.clone(),
            limits: self.limits(),
            sensitivities: self.sensitivities().unwrap_or_default(),
            assumptions: self.assumptions.clone(),
            untouched_defaults: self.defaults.clone(),
            missing: self.recipe.missing.clone(),
            notices,
            sources: self.sources(project),
        }
    }
}

/// The caution that goes with every recipe.
pub const CAUTION: &str = "indicative figures from measured emitter spectra, no classification: photobiological safety \
     needs measurement of the finished product by a competent laboratory";

impl RecipeDocument {
    /// The document as RON text.
    ///
    /// # Errors
    /// When the text cannot be made.
    pub fn to_ron(&self) -> Result<String, ron::Error> {
        let mut text = ron::ser::to_string_pretty(self, ron::ser::PrettyConfig::new())?;
        text.push('\n');
        Ok(text)
    }

    /// The document as CSV: one section after another, cells safe for spreadsheets.
    ///
    /// # Errors
    /// When the table cannot be written.
    pub fn to_csv(&self) -> Result<String, csv::Error> {
        let mut out = files::cells::writer(Vec::new());
        let number = |value: Option<f64>| value.map_or_else(String::new, |value| value.to_string());
        let mut row = |cells: &[&str]| files::cells::write_row(&mut out, cells);
        row(&["Recipe", &self.recipe, "Set", &self.set, "Project", &self.project, "Program", &self.program])?;
        row(&["Part", "Quantity", "Unit", "Value", "Target", "Allowed low", "Allowed high", "Low alone", "High alone"])?;
        for line in &self.numbers {
            row(&[
                if line.part.is_empty() { "whole device" } else { &line.part },
                &line.quantity,
                line.unit,
                &line.value.to_string(),
                &number(line.target),
                &number(line.low),
                &number(line.high),
                &number(line.low_alone),
                &number(line.high_alone),
            ])?;
        }
        row(&[
            "Emitter",
            "Share of radiant power",
            "Share of luminous flux",
            "Share of photons",
            "Mean wavelength (nm)",
            "EQE",
            "Current density (mA/cm\u{b2})",
            "Voltage (V)",
            "Area share",
        ])?;
        for e in &self.device.emitters {
            row(&[
                &e.name,
                &e.share_radiant.to_string(),
                &e.share_luminous.to_string(),
                &e.share_photon.to_string(),
                &e.mean_wavelength_nm.to_string(),
                &number(e.eqe),
                &number(e.current_density_ma_per_cm2),
                &number(e.voltage_v),
                &number(e.area_share),
            ])?;
        }
        row(&["Predicted", "Value", "Unit"])?;
        let p = &self.predicted;
        let d = &self.device;
        for (name, value, unit) in [
            ("CCT", p.cct_k, "K"),
            ("Duv", p.duv, ""),
            ("u\u{2032}", Some(p.u_prime), ""),
            ("v\u{2032}", Some(p.v_prime), ""),
            ("Ra", p.ra, ""),
            ("R9", p.r9(), ""),
            ("Rf", p.rf, ""),
            ("Rg", p.rg, ""),
            ("Luminance", d.luminance_cd_per_m2, "cd/m\u{b2}"),
            ("Luminous flux", d.luminous_flux_lm, "lm"),
            ("Luminous efficacy", d.efficacy_lm_per_w, "lm/W"),
            ("Electrical power", d.electrical_power_w, "W"),
        ] {
            row(&[name, &number(value), unit])?;
        }
        for (title, sentences) in [
            ("Assumption", &self.assumptions),
            ("Untouched default", &self.untouched_defaults),
            ("Missing", &self.missing),
            ("Notice", &self.notices),
        ] {
            for sentence in sentences {
                row(&[title, sentence])?;
            }
        }
        for line in &self.sources {
            let (file, digest) =
                line.source.as_ref().map_or(("", ""), |s| (s.name.as_str(), s.sha256.as_str()));
            let kind = if line.invented { "invented" } else { "measured" };
            row(&["Source", &line.emitter, kind, file, digest])?;
        }
        let bytes = out.into_inner().map_err(|e| csv::Error::from(e.into_error()))?;
        Ok(String::from_utf8_lossy(&bytes).into_owned())
    }
}
