//! A recipe as it leaves the program: every number, band, share, assumption and source in one serialisable whole.

use super::{Making, Number};
use colour::Measurement;
use device::Recipe;
use device::sensitivity::Sensitivity;
use files::report::RecipeRow;
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

    /// The document as CSV: one row a number of the line, then shares, predictions, assumptions and sources; cells
    /// safe for spreadsheets, numbers in full, read back unchanged by [`files::report::recipe_csv::read`].
    ///
    /// # Errors
    /// When the table cannot be written.
    pub fn to_csv(&self) -> Result<String, files::cells::CsvError> {
        let row = |part: &str, quantity: &str, target: Option<f64>, unit: &str, remark: &str| RecipeRow {
            part: part.to_owned(),
            quantity: quantity.to_owned(),
            target,
            unit: unit.to_owned(),
            remark: remark.to_owned(),
            ..RecipeRow::default()
        };
        let mut rows = self.rows();
        for e in &self.device.emitters {
            for (kind, share) in [
                ("share of radiant power", e.share_radiant),
                ("share of luminous flux", e.share_luminous),
                ("share of photons", e.share_photon),
            ] {
                rows.push(row(&e.name, kind, Some(share), "", "predicted"));
            }
        }
        let (p, d) = (&self.predicted, &self.device);
        for (name, value, unit) in [
            ("CCT", p.cct_k, "K"),
            ("Duv", p.duv, ""),
            ("u\u{2032}", Some(p.u_prime), ""),
            ("v\u{2032}", Some(p.v_prime), ""),
            ("Ra", p.ra, ""),
            ("R9", p.r9(), ""),
            ("Rf", p.rf, ""),
            ("Rg", p.rg, ""),
            ("luminance", d.luminance_cd_per_m2, "cd/m\u{b2}"),
            ("luminous flux", d.luminous_flux_lm, "lm"),
            ("luminous efficacy", d.efficacy_lm_per_w, "lm/W"),
            ("electrical power", d.electrical_power_w, "W"),
        ] {
            rows.push(row("", name, value.filter(|v| v.is_finite()), unit, "predicted"));
        }
        for (kind, sentences) in [
            ("assumption", &self.assumptions),
            ("untouched default", &self.untouched_defaults),
            ("missing", &self.missing),
            ("notice", &self.notices),
        ] {
            rows.extend(sentences.iter().map(|sentence| row("", kind, None, "", sentence)));
        }
        for line in &self.sources {
            let remark = match (&line.source, line.invented) {
                (Some(file), _) => format!("{}, SHA-256 {}", file.name, file.sha256),
                (None, true) => "invented, never measured".to_owned(),
                (None, false) => "typed in".to_owned(),
            };
            rows.push(row(&line.emitter, "source", None, "", &remark));
        }
        rows.push(row("", "program", None, "", &self.program));
        files::report::recipe_csv::write(&rows)
    }

    /// One row a number of the line.
    pub fn rows(&self) -> Vec<RecipeRow> {
        let runs = match &self.device.details {
            Some(device::recipe::Details::SharedZone { calibration_runs, .. }) => calibration_runs.clone(),
            _ => Vec::new(),
        };
        self.numbers
            .iter()
            .map(|line| {
                let calibrated = matches!(
                    line.key.map(|key| key.kind),
                    Some(device::QuantityKind::Concentration | device::QuantityKind::Thickness)
                );
                let mut remark = String::new();
                if line.target.is_some_and(|target| (target - line.value).abs() > 1e-9 * target.abs()) {
                    remark = format!("set by hand to {}", files::report::number::significant(line.value, 5));
                }
                RecipeRow {
                    part: line.part.clone(),
                    quantity: line.quantity.clone(),
                    target: line.target.or(Some(line.value)),
                    allowed_low: line.low,
                    allowed_high: line.high,
                    unit: line.unit.to_owned(),
                    calibration_runs: if calibrated { runs.clone() } else { Vec::new() },
                    remark,
                }
            })
            .collect()
    }
}
