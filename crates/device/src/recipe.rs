//! What a recipe says: every number of one blend in one build form.

use serde::Serialize;

use crate::form::BuildForm;
use crate::made::Made;
use crate::packages::BoardLine;
use crate::series_stack::UnitNeed;
use crate::shared_zone::ZoneLine;

/// One emitter of a recipe, of the light after conversion. `None` where unknown.
///
/// Identities: `radiant_exitance = 10·J·eqe·1239.842/λ̄` of its own lit area; radiant shares are proportional to
/// `area_share·radiant_exitance`. A converter's `eqe`, current and voltage are `None`; a pump's `eqe` counts only
/// the light that leaks out.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct RecipeEmitter {
    /// Name.
    pub name: String,
    /// Share of the radiant power.
    pub share_radiant: f64,
    /// Share of the luminous flux.
    pub share_luminous: f64,
    /// Share of the photons.
    pub share_photon: f64,
    /// Mean wavelength, nm.
    pub mean_wavelength_nm: f64,
    /// External quantum efficiency, summed over repeated units, inclusive of charge balance, recombination
    /// share, yield and out-coupling.
    pub eqe: Option<f64>,
    /// Current density of its own lit area, mA/cm².
    pub current_density_ma_per_cm2: Option<f64>,
    /// Voltage, V: of the emitter, of its repeated units together, of the zone, or of one package.
    pub voltage_v: Option<f64>,
    /// Radiant exitance of its own lit area, W/m².
    pub radiant_exitance_w_per_m2: Option<f64>,
    /// Fraction of the panel it occupies.
    pub area_share: Option<f64>,
    /// Name of the pump whose light this converter turns into its own.
    pub converted_by: Option<String>,
    /// Optical depth of the converter layer at the pump's light.
    pub optical_depth: Option<f64>,
    /// Loading of the converter layer, wt%, where its absorption and thickness are known.
    pub loading_percent: Option<f64>,
}

/// Quantities of one form beyond the emitters' own.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case", untagged)]
pub enum Details {
    /// Stripes.
    SideBySide {
        /// Lit fraction of the panel.
        lit_area_share: f64,
        /// Width of each channel's stripe, µm, where there is a layout.
        stripe_width_um: Option<Vec<f64>>,
        /// Common current density, mA/cm², where there is one.
        common_current_density_ma_per_cm2: Option<f64>,
        /// Common voltage, V, where there is one.
        common_voltage_v: Option<f64>,
    },
    /// Units, from the substrate up.
    SeriesStack {
        /// Current density, mA/cm².
        current_density_ma_per_cm2: f64,
        /// Sum of the units' voltages and junction drops, V.
        total_voltage_v: Option<f64>,
        /// Lit fraction of the panel.
        lit_area_share: f64,
        /// What each unit needs and has.
        units: Vec<UnitNeed>,
    },
    /// Layers or dopants.
    SharedZone {
        /// Current density, mA/cm².
        current_density_ma_per_cm2: Option<f64>,
        /// Lit fraction of the panel.
        lit_area_share: f64,
        /// Concentrations, thicknesses, intervals, next runs.
        layers: Vec<ZoneLine>,
        /// The runs the calibration rests on.
        calibration_runs: Vec<String>,
    },
    /// Strings.
    Packages {
        /// Packages in all.
        total_count: u32,
        /// Counts, currents, strings.
        packages: Vec<BoardLine>,
    },
}

/// A recipe with what it gives. Panel quantities are per square metre of panel.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Recipe {
    /// The build form.
    pub build_form: BuildForm,
    /// Luminance along the normal, cd/m².
    pub luminance_cd_per_m2: Option<f64>,
    /// Luminous exitance, lm/m².
    pub luminous_exitance_lm_per_m2: Option<f64>,
    /// Luminous flux of the whole panel or board, lm.
    pub luminous_flux_lm: Option<f64>,
    /// `π·L/M`, 1 when Lambertian.
    pub angular_factor: f64,
    /// One entry an emitter of the set, in its order.
    pub emitters: Vec<RecipeEmitter>,
    /// Radiant exitance, W/m² (panels).
    pub radiant_exitance_w_per_m2: Option<f64>,
    /// Electrical power, W/m² (panels).
    pub electrical_power_w_per_m2: Option<f64>,
    /// Electrical power of the whole panel or board, W.
    pub electrical_power_w: Option<f64>,
    /// Lumens per electrical watt, before any driver loss.
    pub efficacy_lm_per_w: Option<f64>,
    /// Radiant per electrical watt.
    pub wall_plug: Option<f64>,
    /// Chromaticity of the light these quantities give.
    pub u_prime: Option<f64>,
    /// Chromaticity of the light these quantities give.
    pub v_prime: Option<f64>,
    /// Distance in u′v′ from the blend that was asked for: 0 where the form meets it exactly.
    pub delta_uv_prime: Option<f64>,
    /// The form's own quantities; `None` where the sheets say too little.
    pub details: Option<Details>,
    /// The made device, to change numbers on.
    pub made: Option<Made>,
    /// What is free, one sentence each.
    pub freedoms: Vec<String>,
    /// What was assumed, one sentence each.
    pub assumptions: Vec<String>,
    /// What is missing, one sentence each, with the emitter's name.
    pub missing: Vec<String>,
    /// Remarks and cautions.
    pub notices: Vec<String>,
}

impl Recipe {
    /// Radiant shares, in set order.
    pub fn shares_radiant(&self) -> Vec<f64> {
        self.emitters.iter().map(|emitter| emitter.share_radiant).collect()
    }
}
