//! `recipe`: the blends of a saved project as devices, one record a recipe.

use super::{BadInput, Exit, OutputArgs, output};
use crate::making::document::{LimitLine, RecipeDocument, SourceLine, program};
use crate::making::{Making, MakingError, Number, best, make};
use ::files::project_file::open_project;
use ::files::tm27::{Tm27Header, Tm27Quantity, tm27_text};
use clap::Args;
use device::BuildForm;
use device::recipe::{Details, RecipeEmitter};
use optimiser::Control;
use project::{Project, SetId};
use serde::Serialize;
use std::path::{Path, PathBuf};

/// Turn the blends of a saved project into fabrication quantities
#[derive(Debug, Args)]
pub struct RecipeArgs {
    /// The project
    #[arg(value_name = "PROJECT")]
    pub project: PathBuf,
    /// Only this emitter set
    #[arg(long, value_name = "NAME")]
    pub set: Option<String>,
    /// Only recipes of this name
    #[arg(long, value_name = "NAME")]
    pub recipe: Option<String>,
    /// First find the blend with the most lumens per electrical watt of the device itself
    #[arg(long)]
    pub best: bool,
    /// Write the first recipe to FILE: .ron or .csv the recipe, .spectrum.csv or .spdx (TM-27) its predicted spectrum
    #[arg(short, long, value_name = "FILE")]
    pub output_file: Option<PathBuf>,
    /// The printing.
    #[command(flatten)]
    pub output: OutputArgs,
}

/// One emitter, of the light after conversion.
#[derive(Debug, Clone, Serialize)]
struct EmitterRecord {
    name: String,
    share_radiant: f64,
    share_luminous: f64,
    share_photon: f64,
    mean_wavelength_nm: f64,
    eqe: Option<f64>,
    current_density_ma_per_cm2: Option<f64>,
    voltage_v: Option<f64>,
    radiant_exitance_w_per_m2: Option<f64>,
    area_share: Option<f64>,
    converted_by: Option<String>,
    optical_depth: Option<f64>,
    loading_percent: Option<f64>,
}

impl From<&RecipeEmitter> for EmitterRecord {
    fn from(e: &RecipeEmitter) -> Self {
        Self {
            name: e.name.clone(),
            share_radiant: e.share_radiant,
            share_luminous: e.share_luminous,
            share_photon: e.share_photon,
            mean_wavelength_nm: e.mean_wavelength_nm,
            eqe: e.eqe,
            current_density_ma_per_cm2: e.current_density_ma_per_cm2,
            voltage_v: e.voltage_v,
            radiant_exitance_w_per_m2: e.radiant_exitance_w_per_m2,
            area_share: e.area_share,
            converted_by: e.converted_by.clone(),
            optical_depth: e.optical_depth,
            loading_percent: e.loading_percent,
        }
    }
}

/// What the search for the device's best blend found.
#[derive(Debug, Clone, Serialize)]
struct BestRecord {
    efficacy_lm_per_w: f64,
    upper_bound_lm_per_w: Option<f64>,
    gap: Option<f64>,
    grade: &'static str,
    sentence: String,
}

/// One recipe; the names of the fields are the documented keys.
#[derive(Debug, Clone, Serialize)]
struct RecipeRecord {
    set: String,
    recipe: String,
    build_form: Option<BuildForm>,
    luminance_cd_per_m2: Option<f64>,
    luminous_exitance_lm_per_m2: Option<f64>,
    luminous_flux_lm: Option<f64>,
    angular_factor: Option<f64>,
    emitters: Vec<EmitterRecord>,
    #[serde(flatten)]
    details: Option<Details>,
    electrical_power_w_per_m2: Option<f64>,
    electrical_power_w: Option<f64>,
    efficacy_lm_per_w: Option<f64>,
    wall_plug: Option<f64>,
    u_prime: Option<f64>,
    v_prime: Option<f64>,
    cct_k: Option<f64>,
    duv: Option<f64>,
    delta_uv_prime: Option<f64>,
    white_met: Option<bool>,
    limits: Vec<LimitLine>,
    numbers: Vec<Number>,
    bands_keep: Option<String>,
    best: Option<BestRecord>,
    freedoms: Vec<String>,
    assumptions: Vec<String>,
    untouched_defaults: Vec<String>,
    missing: Vec<String>,
    notices: Vec<String>,
    sources: Vec<SourceLine>,
    program: String,
    message: Option<String>,
}

impl RecipeRecord {
    fn of(making: &Making, document: &RecipeDocument, best: Option<BestRecord>) -> Self {
        let r = &making.recipe;
        Self {
            set: making.set_name.clone(),
            recipe: making.plan.name.clone(),
            build_form: Some(r.build_form),
            luminance_cd_per_m2: r.luminance_cd_per_m2,
            luminous_exitance_lm_per_m2: r.luminous_exitance_lm_per_m2,
            luminous_flux_lm: r.luminous_flux_lm,
            angular_factor: Some(r.angular_factor),
            emitters: r.emitters.iter().map(EmitterRecord::from).collect(),
            details: r.details.clone(),
            electrical_power_w_per_m2: r.electrical_power_w_per_m2,
            electrical_power_w: r.electrical_power_w,
            efficacy_lm_per_w: r.efficacy_lm_per_w,
            wall_plug: r.wall_plug,
            u_prime: r.u_prime,
            v_prime: r.v_prime,
            cct_k: making.measured.cct_k,
            duv: making.measured.duv,
            delta_uv_prime: r.delta_uv_prime.filter(|d| d.is_finite()),
            white_met: Some(making.white_met()),
            limits: document.limits.clone(),
            numbers: document.numbers.clone(),
            bands_keep: document.no_bands.is_none().then(|| document.bands_keep.clone()),
            best,
            freedoms: r.freedoms.clone(),
            assumptions: document.assumptions.clone(),
            untouched_defaults: document.untouched_defaults.clone(),
            missing: document.missing.clone(),
            notices: document.notices.clone(),
            sources: document.sources.clone(),
            program: document.program.clone(),
            message: document.no_bands.clone(),
        }
    }

    fn without(set: &str, recipe: &str, form: Option<BuildForm>, error: &MakingError) -> Self {
        Self {
            set: set.to_owned(),
            recipe: recipe.to_owned(),
            build_form: form,
            luminance_cd_per_m2: None,
            luminous_exitance_lm_per_m2: None,
            luminous_flux_lm: None,
            angular_factor: None,
            emitters: Vec::new(),
            details: None,
            electrical_power_w_per_m2: None,
            electrical_power_w: None,
            efficacy_lm_per_w: None,
            wall_plug: None,
            u_prime: None,
            v_prime: None,
            cct_k: None,
            duv: None,
            delta_uv_prime: None,
            white_met: None,
            limits: Vec::new(),
            numbers: Vec::new(),
            bands_keep: None,
            best: None,
            freedoms: Vec::new(),
            assumptions: Vec::new(),
            untouched_defaults: Vec::new(),
            missing: Vec::new(),
            notices: Vec::new(),
            sources: Vec::new(),
            program: program(),
            message: Some(error.to_string()),
        }
    }

    fn print(&self) {
        let form = self.build_form.map_or("no build form", BuildForm::name);
        output::text(&format!("{} · {} · {form}", self.set, self.recipe));
        if self.emitters.is_empty() {
            return;
        }
        let mut table =
            output::Table::new(&["Emitter", "radiant", "luminous", "photon", "EQE", "mA/cm²", "V", "area"]);
        for e in &self.emitters {
            table.row([
                e.name.clone(),
                output::cell(Some(100.0 * e.share_radiant), 2) + " %",
                output::cell(Some(100.0 * e.share_luminous), 2) + " %",
                output::cell(Some(100.0 * e.share_photon), 2) + " %",
                output::cell(e.eqe, 4),
                output::cell(e.current_density_ma_per_cm2, 3),
                output::cell(e.voltage_v, 3),
                output::cell(e.area_share, 4),
            ]);
        }
        output::text(&table.to_string());
        let mut table = output::Table::new(&["Number", "target", "allowed from", "to", "unit"]);
        for n in &self.numbers {
            let name =
                if n.part.is_empty() { n.quantity.clone() } else { format!("{}, {}", n.part, n.quantity) };
            table.row([
                name,
                output::cell(Some(n.value), 4),
                output::cell(n.low, 4),
                output::cell(n.high, 4),
                n.unit.to_owned(),
            ]);
        }
        output::text(&table.to_string());
        output::text(&format!(
            "{} cd/m², {} lm, {} lm/W; CCT {} K, Duv {}",
            output::cell(self.luminance_cd_per_m2, 0),
            output::cell(self.luminous_flux_lm, 1),
            output::cell(self.efficacy_lm_per_w, 2),
            output::cell(self.cct_k, 0),
            output::cell(self.duv, 5)
        ));
        for (title, list) in [
            ("assumed", &self.assumptions),
            ("default", &self.untouched_defaults),
            ("missing", &self.missing),
            ("notice", &self.notices),
        ] {
            list.iter().for_each(|sentence| output::text(&format!("{title}: {sentence}")));
        }
    }
}

/// The recipes asked for: set and number in the set, the current set first.
pub(super) fn chosen(project: &Project, set: Option<&str>, recipe: Option<&str>) -> Vec<(SetId, usize)> {
    let mut out = Vec::new();
    for row in &project.sets {
        if set.is_some_and(|name| name != row.name) {
            continue;
        }
        for (index, plan) in row.recipes.iter().enumerate() {
            if recipe.is_none_or(|name| name == plan.name) {
                out.push((row.id, index));
            }
        }
    }
    // A project without any recipe has the default one of its current set.
    if out.is_empty() && recipe.is_none() {
        let row = project.sets.iter().find(|row| set == Some(row.name.as_str()));
        let row = if set.is_some() { row } else { project.current() };
        out.extend(row.map(|row| (row.id, 0)));
    }
    out
}

/// Opens a project; bad input ends the command.
pub(super) fn open(path: &Path) -> Result<Project, Exit> {
    open_project(path).map(|opened| opened.project).map_err(|error| {
        let place = path.display().to_string();
        let text = error.to_string();
        let place = match error.line() {
            Some(line) => format!("{place}:{line}"),
            None => place,
        };
        let text = text.strip_prefix(&format!("{place}: ")).unwrap_or(&text);
        output::sentence(BadInput::at(&place, text));
        Exit::Bad
    })
}

/// Says why a recipe could not be made; returns the exit code.
pub(super) fn refused(place: &str, error: &MakingError) -> Exit {
    output::sentence(BadInput::at(place, &error.to_string()));
    if error.is_a_no() { Exit::No } else { Exit::Bad }
}

/// Runs the command.
pub(super) fn run(args: &RecipeArgs) -> Exit {
    let mut project = match open(&args.project) {
        Ok(project) => project,
        Err(exit) => {
            if args.output.json {
                output::json::<[RecipeRecord; 0]>(&[]);
            }
            return exit;
        }
    };
    let wanted = chosen(&project, args.set.as_deref(), args.recipe.as_deref());
    let place = args.project.display().to_string();
    if wanted.is_empty() {
        output::sentence(BadInput::at(&place, "expected a set and recipe of these names, found none"));
        if args.output.json {
            output::json::<[RecipeRecord; 0]>(&[]);
        }
        return Exit::Bad;
    }
    let (mut records, mut exit) = (Vec::new(), Exit::Done);
    for (set, index) in wanted {
        let best = match args.best.then(|| improve(&mut project, set, index)).transpose() {
            Ok(best) => best,
            Err(error) => {
                exit = exit.max(refused(&place, &error));
                records.push(unmade(&project, set, index, &error));
                continue;
            }
        };
        match make(&project, set, index) {
            Ok(making) => {
                let document = making.document(&project);
                if let (Some(path), true) = (&args.output_file, records.is_empty()) {
                    exit = exit.max(write(path, &making, &document));
                }
                records.push(RecipeRecord::of(&making, &document, best));
            }
            Err(error) => {
                exit = exit.max(refused(&place, &error));
                records.push(unmade(&project, set, index, &error));
            }
        }
    }
    if args.output.json {
        output::json(&records);
    } else {
        records.iter().for_each(RecipeRecord::print);
    }
    exit
}

fn unmade(project: &Project, set: SetId, index: usize, error: &MakingError) -> RecipeRecord {
    let row = project.set(set);
    let plan = row.and_then(|row| row.recipes.get(index));
    let name = row.map_or("", |row| row.name.as_str());
    RecipeRecord::without(
        name,
        plan.map_or("", |p| p.name.as_str()),
        plan.map(|p| p.build.build_form()),
        error,
    )
}

/// Puts the device's best blend in place of the set's.
fn improve(project: &mut Project, set: SetId, index: usize) -> Result<BestRecord, MakingError> {
    let row = project.set(set).ok_or(MakingError::NoSet)?;
    let fallback = crate::making::default_plan(row);
    let plan = row.recipes.get(index).unwrap_or(&fallback);
    let found = best::best_for_device(project, row, plan, &Control::none())?;
    if let Some(row) = project.set_mut(set) {
        row.members.iter_mut().zip(&found.shares).for_each(|(member, share)| member.share = *share);
        if let Some(plan) = row.recipes.get_mut(index) {
            plan.made = None;
        }
    }
    Ok(BestRecord {
        efficacy_lm_per_w: found.efficacy_lm_per_w,
        upper_bound_lm_per_w: found.bound_lm_per_w,
        gap: found.gap,
        grade: found.grade.key(),
        sentence: found.sentence,
    })
}

fn write(path: &Path, making: &Making, document: &RecipeDocument) -> Exit {
    let name = path.file_name().and_then(|n| n.to_str()).unwrap_or_default().to_lowercase();
    let text = if name.ends_with(".spectrum.csv") {
        Ok(spectrum_csv(making))
    } else if name.ends_with(".csv") {
        document.to_csv().map_err(|e| e.to_string())
    } else if name.ends_with(".spdx") || name.ends_with(".xml") {
        spectrum_tm27(making, document).map_err(|e| e.to_string())
    } else if name.ends_with(".ron") {
        document.to_ron().map_err(|e| e.to_string())
    } else {
        Err("expected a name ending in .ron, .csv, .spectrum.csv or .spdx".to_owned())
    };
    let place = path.display().to_string();
    let written = text.and_then(|text| {
        ::files::save::save(path, text.as_bytes(), None).map(drop).map_err(|e| e.to_string())
    });
    match written {
        Ok(()) => Exit::Done,
        Err(why) => {
            output::sentence(BadInput::at(&place, &why));
            Exit::Bad
        }
    }
}

/// The predicted spectrum of one optical watt as two columns.
pub(crate) fn spectrum_csv(making: &Making) -> String {
    let mut text = "Wavelength (nm),Power of one optical watt (W/nm)\n".to_owned();
    for (nm, power) in (380..).zip(making.devices.curve(&making.recipe.shares_radiant())) {
        text.push_str(&format!("{nm},{power:e}\n"));
    }
    text
}

/// The predicted spectrum as TM-27.
pub(crate) fn spectrum_tm27(making: &Making, document: &RecipeDocument) -> std::io::Result<String> {
    let seconds =
        std::time::SystemTime::now().duration_since(std::time::UNIX_EPOCH).map_or(0, |since| since.as_secs());
    let header = Tm27Header {
        description: format!("{}, {}: predicted", making.set_name, making.plan.name),
        document_creator: document.program.clone(),
        document_creation_date: crate::making::report::iso_day(seconds),
        comments: "predicted from measured emitter spectra, not a measurement of a device".to_owned(),
    };
    let wavelengths: Vec<f64> = (380..=780).map(f64::from).collect();
    let curve = making.devices.curve(&making.recipe.shares_radiant());
    tm27_text(&header, Tm27Quantity::Relative, &wavelengths, &curve)
}
