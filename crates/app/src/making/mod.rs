//! From a set's blend to a recipe: the project joined to the device crate, for the window and the commands alike.
//!
//! * [`Making`]: one recipe plan worked out: what follows from the blend, what the numbers give as they stand.
//! * [`devices`]: a plan's emitters as the device crate takes them.
//! * [`numbers`]: every fabrication number in the line's units, with its allowed band.
//! * [`best`]: the blend with the most lumens per electrical watt of the device itself.
//! * [`picture`]: the device to scale.
//! * [`report`]: a set and its recipe as a report.
//! * [`document`]: a recipe as it leaves the program.
//!
//! Out of scope: the formulas of the build forms (crate `device`), drawing, files.

pub mod best;
pub mod devices;
pub mod document;
pub mod numbers;
pub mod picture;
pub mod report;

#[cfg(test)]
mod tests;

pub use devices::Devices;
pub use numbers::Number;

use crate::solving::measure_blend;
use crate::state::derived::WhiteRegion;
use colour::{Measurement, UvPrime, locus};
use device::bands::Bands;
use device::bring_back::WayBack;
use device::light::uv_of_xyz;
use device::sensitivity::Sensitivity;
use device::{Build, BuildForm, DeviceError, Level, Made, Quantity, Recipe};
use project::{EmitterId, EmitterSet, Geometry, Mounting, Origin, Project, RecipePlan, Region, SetId};

/// Luminance taken where a panel is asked for no amount of light, cd/m² (common practice: 1000 to 5000).
pub const DEFAULT_LUMINANCE_CD_PER_M2: f64 = 3000.0;
/// Lumens taken where a board of packages is asked for no amount of light.
pub const DEFAULT_BOARD_LM: f64 = 1000.0;
/// Steps of 0.0011 in u′v′ that bands are given for where the white spec names an exact white only.
pub const BAND_STEPS_OF_AN_EXACT_WHITE: f64 = 2.0;

/// Why a plan cannot be worked out.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum MakingError {
    /// The set is not in the project.
    #[error("there is no such set in this project")]
    NoSet,
    /// The set has no recipe of that number.
    #[error("the set \u{201c}{set}\u{201d} has no recipe number {number}")]
    NoPlan {
        /// Name of the set.
        set: String,
        /// Number asked for, counted from 1.
        number: usize,
    },
    /// The plan was made with an emitter that has left the project.
    #[error(
        "the recipe \u{201c}{plan}\u{201d} was made with an emitter that has left the project: choose its build form anew"
    )]
    EmitterGone {
        /// Name of the plan.
        plan: String,
    },
    /// No emitter has a share.
    #[error("no emitter of the set \u{201c}{set}\u{201d} has a share, so there is nothing to build")]
    NoBlend {
        /// Name of the set.
        set: String,
    },
    /// An emitter's samples make no spectrum.
    #[error(transparent)]
    Samples(#[from] project::SpectrumProblem),
    /// The emitters or the white spec make no problem.
    #[error(transparent)]
    Solving(#[from] crate::solving::SolvingError),
    /// The device crate refuses.
    #[error(transparent)]
    Device(#[from] DeviceError),
    /// No blend meets the white spec.
    #[error("{0}")]
    NoBlendMeets(String),
}

impl MakingError {
    /// True for an answer of "no": the input is sound, but the device cannot be made as asked.
    pub fn is_a_no(&self) -> bool {
        matches!(
            self,
            Self::NoBlend { .. }
                | Self::NoBlendMeets(_)
                | Self::EmitterGone { .. }
                | Self::Device(
                    DeviceError::Unreachable { .. }
                        | DeviceError::Missing { .. }
                        | DeviceError::NotEnoughData { .. }
                        | DeviceError::OutsideTable { .. }
                )
        )
    }
}

/// One recipe plan worked out.
#[derive(Debug, Clone)]
pub struct Making {
    /// The set.
    pub set: SetId,
    /// Name of the set.
    pub set_name: String,
    /// The plan.
    pub plan: RecipePlan,
    /// The plan's build, with the area that follows from lumens and luminance where none is given.
    pub build: Build,
    /// The emitters, in the plan's order.
    pub devices: Devices,
    /// How much light is wanted.
    pub level: Level,
    /// The recipe that follows from the blend; the reason where there is none.
    pub target: Result<Recipe, MakingError>,
    /// What the numbers give as they stand: those set by hand, else the target.
    pub recipe: Recipe,
    /// Every colour number of the light the numbers give.
    pub measured: Measurement,
    /// Where the white may lie.
    pub region: WhiteRegion,
    /// What was assumed, one sentence each.
    pub assumptions: Vec<String>,
    /// Defaults of the build form that nobody touched, one sentence each.
    pub defaults: Vec<String>,
    white: project::WhiteSpec,
    band_region: WhiteRegion,
}

/// The plan taken where a set has none: stripes side by side, over the emitters that are on.
pub fn default_plan(set: &EmitterSet) -> RecipePlan {
    plan_of(set, BuildForm::SideBySide)
}

/// A fresh plan in a build form, over the emitters of a set that are on.
pub fn plan_of(set: &EmitterSet, form: BuildForm) -> RecipePlan {
    use device::FormSettings::{Packages, SeriesStack, SharedZone, SideBySide};
    let emitters = set.members.iter().filter(|m| m.on).map(|m| m.emitter).collect();
    let (name, form) = match form {
        BuildForm::SideBySide => ("Side by side", SideBySide(Default::default())),
        BuildForm::SeriesStack => ("Series stack", SeriesStack(Default::default())),
        BuildForm::SharedZone => ("Shared zone", SharedZone(Default::default())),
        BuildForm::Packages => ("Packages", Packages(Default::default())),
    };
    RecipePlan::new(name, emitters, Build { form, ..Build::default() })
}

/// Works out plan number `index` of a set; a set without plans has the [`default_plan`].
///
/// # Errors
/// Unknown set or plan, samples that make no spectrum, and what the device crate refuses when numbers were set by
/// hand. A blend the form cannot make is an error too.
pub fn make(project: &Project, set: SetId, index: usize) -> Result<Making, MakingError> {
    let row = project.set(set).ok_or(MakingError::NoSet)?;
    let fallback;
    let plan = match row.recipes.get(index) {
        Some(plan) => plan,
        None if row.recipes.is_empty() && index == 0 => {
            fallback = default_plan(row);
            &fallback
        }
        None => return Err(MakingError::NoPlan { set: row.name.clone(), number: index + 1 }),
    };
    make_plan(project, row, plan)
}

/// Works out a plan for a set.
///
/// # Errors
/// As [`make`].
pub fn make_plan(project: &Project, set: &EmitterSet, plan: &RecipePlan) -> Result<Making, MakingError> {
    let devices = Devices::of(project, set, plan)?;
    let mut assumptions = Vec::new();
    let mut build = plan.build.clone();
    let level = level(set, &mut build, &devices, &mut assumptions);
    if set.recipes.is_empty() {
        assumptions.push("no build form is chosen: stripes side by side are taken".to_owned());
    }
    let target = build.recipe(&devices.emitters, &devices.shares, level).map_err(MakingError::from);
    let recipe = match (&plan.made, &target) {
        (Some(made), target) => {
            let mut recipe = build.predict(&devices.emitters, made)?;
            let aim = devices.white(&devices.shares);
            let here = recipe.u_prime.zip(recipe.v_prime);
            recipe.delta_uv_prime = here.zip(aim).map(|((u, v), aim)| UvPrime { u, v }.distance(aim));
            if let Ok(target) = target {
                recipe.assumptions.splice(0..0, extra(&target.assumptions, &recipe.assumptions));
            }
            recipe
        }
        (None, Ok(recipe)) => recipe.clone(),
        (None, Err(error)) => return Err(error.clone()),
    };
    let blend = devices.tensors.blend(&recipe.shares_radiant());
    let white = set.white.clone();
    let measured = measure_blend(&blend, &white);
    assumptions.extend(recipe.assumptions.iter().cloned());
    assumptions.extend(kinds(project, &devices.ids));
    let band_region = match &white.region {
        Region::Point => {
            assumptions.push(format!(
                "the white spec names an exact white: allowed bands keep the white within a \
                 {BAND_STEPS_OF_AN_EXACT_WHITE}-step circle (\u{394}u\u{2032}v\u{2032} {:.4}) round the target",
                BAND_STEPS_OF_AN_EXACT_WHITE * colour::tolerance::STEP_RADIUS
            ));
            let region = Region::Circle { steps: BAND_STEPS_OF_AN_EXACT_WHITE };
            WhiteRegion::of(&project::WhiteSpec { region, ..white.clone() })
        }
        _ => WhiteRegion::of(&white),
    };
    Ok(Making {
        set: set.id,
        set_name: set.name.clone(),
        plan: plan.clone(),
        defaults: defaults(&build),
        build,
        devices,
        level,
        target,
        recipe,
        measured,
        region: WhiteRegion::of(&white),
        assumptions,
        white,
        band_region,
    })
}

/// Sentences of `all` that `known` lacks.
fn extra(all: &[String], known: &[String]) -> Vec<String> {
    all.iter().filter(|sentence| !known.contains(sentence)).cloned().collect()
}

impl Making {
    /// The white spec asked for.
    pub fn white(&self) -> &project::WhiteSpec {
        &self.white
    }

    /// The white of the light the numbers give, u′v′.
    pub fn uv_prime(&self) -> UvPrime {
        self.measured.uv_prime()
    }

    /// Whether the white lies in the region of the spec; for an exact white, within 0.0001 in u′v′ of it.
    pub fn white_met(&self) -> bool {
        self.region.margin_uv_prime(self.uv_prime(), self.measured.cct_duv()) >= 0.0
    }

    /// Words for the region that bands are given for.
    pub fn band_region(&self) -> &str {
        &self.band_region.words
    }

    /// The bands that keep the white inside the spec's region: each number alone, and all together.
    ///
    /// # Errors
    /// No made device, or a white already outside the region.
    pub fn bands(&self) -> Result<Bands, MakingError> {
        let made = self.made()?;
        let boxed = matches!(self.white.region, Region::Box { .. });
        let inside = |shares: &[f64]| {
            self.devices.white(shares).is_some_and(|uv| {
                let at = if boxed { locus::cct_duv(uv.uv()) } else { None };
                self.band_region.margin_uv_prime(uv, at) >= 0.0
            })
        };
        Ok(self.build.bands(&self.devices.emitters, made, inside)?)
    }

    /// The device as it stands.
    ///
    /// # Errors
    /// Where the sheets say too little for a device.
    pub fn made(&self) -> Result<&Made, MakingError> {
        self.recipe.made.as_ref().ok_or_else(|| {
            let reason = self.recipe.missing.first().cloned();
            let reason =
                reason.unwrap_or_else(|| "the sheets say too little for fabrication numbers".to_owned());
            MakingError::Device(DeviceError::Unreachable { reason })
        })
    }

    /// What +1 % of every fabrication number does to the white.
    ///
    /// # Errors
    /// As [`Making::made`].
    pub fn sensitivities(&self) -> Result<Vec<Sensitivity>, MakingError> {
        Ok(self.build.sensitivities(&self.devices.emitters, self.made()?)?)
    }

    /// What must change to bring the white back to the blend at the wanted level, the locked numbers kept.
    ///
    /// # Errors
    /// As [`Making::made`], and where the locked numbers leave no way.
    pub fn way_back(&self) -> Result<WayBack, MakingError> {
        let (emitters, shares) = (&self.devices.emitters, &self.devices.shares);
        Ok(self.build.bring_back(emitters, self.made()?, &self.plan.locked, shares, self.level)?)
    }

    /// The plan with one fabrication number set by hand (in the device crate's own unit).
    ///
    /// # Errors
    /// As [`Making::made`].
    pub fn with_number(&self, quantity: Quantity, value: f64) -> Result<RecipePlan, MakingError> {
        Ok(RecipePlan { made: Some(self.made()?.with(quantity, value)), ..self.plan.clone() })
    }

    /// The name of the emitter a driven channel belongs to.
    pub fn channel_name(&self, channel: usize) -> &str {
        let index = self.devices.driven(&self.build).get(channel).copied();
        index.map_or("", |index| self.devices.emitters[index].name.as_str())
    }

    /// Radiant shares of the light as it stands, by emitter.
    pub fn shares(&self) -> Vec<(EmitterId, f64)> {
        self.devices.ids.iter().copied().zip(self.recipe.shares_radiant()).collect()
    }
}

/// The wanted amount of light; fills the build's area where lumens and luminance together give it.
fn level(set: &EmitterSet, build: &mut Build, devices: &Devices, assumptions: &mut Vec<String>) -> Level {
    let packages = build.build_form() == BuildForm::Packages;
    let white = &set.white;
    match (white.luminance_cd_per_m2, white.lumens) {
        (luminance, Some(lumens)) if packages && build.area_m2.is_none() => {
            if luminance.is_some() {
                assumptions
                    .push("no board area is given: the lumens are met, the luminance is not".to_owned());
            }
            Level::LuminousFlux(lumens)
        }
        (Some(luminance), lumens) if !packages || build.area_m2.is_some() => {
            if let (Some(lumens), None) = (lumens, build.area_m2) {
                let factor = device::build::angular_factor(&devices.emitters, &devices.shares);
                let area = lumens * factor / (std::f64::consts::PI * luminance);
                assumptions.push(format!(
                    "no area is given: {lumens} lm at {luminance} cd/m\u{b2} make {area:.5} m\u{b2}"
                ));
                build.area_m2 = Some(area);
            }
            Level::Luminance(luminance)
        }
        (None, Some(lumens)) if build.area_m2.is_some() => Level::LuminousFlux(lumens),
        (_, lumens) if packages => {
            if lumens.is_none() {
                assumptions.push(format!("no amount of light is asked for: {DEFAULT_BOARD_LM} lm are taken"));
            }
            Level::LuminousFlux(lumens.unwrap_or(DEFAULT_BOARD_LM))
        }
        (_, lumens) => {
            assumptions.push(format!(
                "no luminance is asked for: {DEFAULT_LUMINANCE_CD_PER_M2} cd/m\u{b2} are taken (common practice: 1000 \
                 to 5000)"
            ));
            if let Some(lumens) = lumens {
                let factor = device::build::angular_factor(&devices.emitters, &devices.shares);
                build.area_m2 = Some(lumens * factor / (std::f64::consts::PI * DEFAULT_LUMINANCE_CD_PER_M2));
            }
            Level::Luminance(DEFAULT_LUMINANCE_CD_PER_M2)
        }
    }
}

/// Defaults of the form that were left as they are.
fn defaults(build: &Build) -> Vec<String> {
    let mut out = Vec::new();
    let mut say = |is_default: bool, sentence: String| {
        if is_default {
            out.push(sentence);
        }
    };
    match &build.form {
        device::FormSettings::SideBySide(form) => {
            say(
                form.fill.is_none(),
                format!("fill factor {} (common practice: 0.6 to 0.9)", device::form::DEFAULT_STRIPE_FILL),
            );
            say(form.layout.is_none(), "no stripe layout: widths in \u{b5}m are not given".to_owned());
        }
        device::FormSettings::SeriesStack(form) => {
            say(form.fill.is_none(), "fill factor 1".to_owned());
            say(form.junction_drop_v.is_none(), "no voltage lost between units".to_owned());
        }
        device::FormSettings::SharedZone(form) => {
            say(form.fill.is_none(), "fill factor 1".to_owned());
            say(form.voltage.is_none(), "the zone's voltage is the highest of its emitters'".to_owned());
        }
        device::FormSettings::Packages(form) => {
            say(form.at_most.is_none(), "no limit on the number of packages".to_owned());
            say(form.strings.is_none(), "no voltage window for strings".to_owned());
        }
    }
    for conversion in &build.conversions {
        for layer in &conversion.layers {
            say(
                layer.depth_per_percent_um.is_none() || layer.thickness_um.is_none(),
                "converter loading in wt% is not given: its absorption per wt% and \u{b5}m or its thickness is unknown"
                    .to_owned(),
            );
        }
    }
    out
}

/// Assumptions about how the spectra were measured: mixed kinds, films, models, single devices.
fn kinds(project: &Project, ids: &[EmitterId]) -> Vec<String> {
    let emitters: Vec<&project::Emitter> = ids.iter().filter_map(|id| project.emitter(*id)).collect();
    let named = |test: &dyn Fn(&project::Emitter) -> bool| -> Option<String> {
        let names: Vec<&str> = emitters.iter().filter(|e| test(e)).map(|e| e.name.as_str()).collect();
        (!names.is_empty()).then(|| names.join(", "))
    };
    let mut out = Vec::new();
    if let Some(names) = named(&|e| e.invented) {
        out.push(format!("invented data, never measured: {names}"));
    }
    if let Some(names) = named(&|e| e.origin == Origin::FilmPhotoluminescence) {
        out.push(format!("photoluminescence of a film stands for the device's own light: {names}"));
    }
    if let Some(names) = named(&|e| e.origin == Origin::Modelled) {
        out.push(format!("a modelled spectrum stands for a measured one: {names}"));
    }
    if let Some(names) = named(&|e| e.mounting == Mounting::SingleDevice) {
        out.push(format!("a spectrum of a single device stands for the one in the finished stack: {names}"));
    }
    let mut geometries: Vec<Geometry> = Vec::new();
    for emitter in &emitters {
        if !geometries.contains(&emitter.geometry) {
            geometries.push(emitter.geometry);
        }
    }
    if geometries.len() > 1 {
        out.push("the spectra were collected in different geometries and are added all the same".to_owned());
    }
    for emitter in &emitters {
        out.extend(emitter.import.assumptions.iter().map(|a| format!("{}: {a}", emitter.name)));
    }
    out
}

/// Chromaticity of summed tristimulus values.
fn uv_prime(xyz: [f64; 3]) -> Option<UvPrime> {
    uv_of_xyz(xyz).map(|(u, v)| UvPrime { u, v })
}
