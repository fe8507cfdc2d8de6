//! The emitter sheet: what a maker knows about one emitter's electrical behaviour, however little.
//!
//! Plain data for storage and editing. Every field may be absent; [`Sheet::missing`] says in sentences what
//! cannot be computed without it. Turned into numbers elsewhere in this crate.

use serde::{Deserialize, Serialize};

use crate::curve::Table;
use crate::out_coupling::{Inclusion, OutCoupling};
use crate::roll_off::{AbcRollOff, TripletRollOff};

/// How the external quantum efficiency depends on current density.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub enum EqeModel {
    /// Measured: current density in mA/cm², EQE as a fraction.
    Table(Table),
    /// Triplet–triplet annihilation.
    TripletTriplet(TripletRollOff),
    /// The ABC model of inorganic emitters.
    Abc(AbcRollOff),
    /// One number, taken as the same at every current (listed among the assumptions).
    Constant(f64),
}

/// How the voltage depends on current density.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub enum VoltageModel {
    /// Measured: current density in mA/cm², volts.
    Table(Table),
    /// One number, taken as the same at every current (listed among the assumptions).
    Constant(f64),
}

/// Change with temperature, as the user measured it. Zero where not given.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct TemperatureCoefficients {
    /// Temperature at which the sheet was measured, °C.
    pub reference_c: Option<f64>,
    /// Change of the EQE, per cent of its value per kelvin.
    pub eqe_percent_per_k: Option<f64>,
    /// Change of the voltage, millivolts per kelvin.
    pub voltage_mv_per_k: Option<f64>,
    /// Shift of the peak, nanometres per kelvin.
    pub peak_nm_per_k: Option<f64>,
}

/// Wear of the emitter at a reference current: `τ(J) = τ_ref·(J_ref/J)^n`.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct Wear {
    /// Current density of the life test, mA/cm².
    pub reference_current_ma_per_cm2: Option<f64>,
    /// Time constant τ of the stretched exponential `L/L0 = exp(−(t/τ)^β)` at the reference current, hours.
    pub time_constant_h: Option<f64>,
    /// Stretching exponent β.
    pub stretch: Option<f64>,
    /// Acceleration exponent n of life with current density.
    pub acceleration: Option<f64>,
}

/// A packaged emitter as its data sheet gives it.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct Package {
    /// Current at which flux and voltage are given, mA.
    pub test_current_ma: Option<f64>,
    /// Lower edge of the flux bin at the test current, lm.
    pub flux_bin_low_lm: Option<f64>,
    /// Upper edge of the flux bin at the test current, lm.
    pub flux_bin_high_lm: Option<f64>,
    /// Radiant flux at the test current, W; used before the flux bin where both are given.
    pub radiant_flux_w: Option<f64>,
    /// Forward voltage at the test current, V.
    pub forward_voltage_v: Option<f64>,
    /// Largest allowed current, mA.
    pub maximum_current_ma: Option<f64>,
    /// Smallest current at which the package may be run, mA.
    pub minimum_current_ma: Option<f64>,
    /// Emitting area of the die, mm²: needed for current density and exitance.
    pub die_area_mm2: Option<f64>,
    /// Flux against current (mA), relative to the flux at the test current.
    pub relative_flux: Option<Table>,
    /// Forward voltage (V) against current (mA).
    pub forward_voltage: Option<Table>,
}

/// The sheet of one emitter. All fields optional; unknown fields of later versions are skipped on reading.
///
/// Current densities are mA/cm² of the emitter's own lit area, efficiencies are fractions.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct Sheet {
    /// External quantum efficiency against current density.
    pub eqe: Option<EqeModel>,
    /// Voltage against current density.
    pub voltage: Option<VoltageModel>,
    /// Out-coupling: a factor on the light, and whether the EQE already contains it.
    pub out_coupling: Option<OutCoupling>,
    /// Radiant watts per electrical watt, where nothing else is known.
    pub wall_plug: Option<f64>,
    /// `π·L/M` of this emitter: 1 (taken when absent) is Lambertian.
    pub angular_factor: Option<f64>,
    /// Lowest current density at which the emitter may be run, mA/cm².
    pub minimum_current_ma_per_cm2: Option<f64>,
    /// Highest current density at which the emitter may be run, mA/cm².
    pub maximum_current_ma_per_cm2: Option<f64>,
    /// Current density at which the spectrum was measured, mA/cm².
    pub reference_current_ma_per_cm2: Option<f64>,
    /// Change with temperature.
    pub temperature: Option<TemperatureCoefficients>,
    /// Wear.
    pub wear: Option<Wear>,
    /// Data of a packaged emitter.
    pub package: Option<Package>,
}

impl Sheet {
    /// Whether nothing at all has been entered.
    pub fn is_empty(&self) -> bool {
        *self == Sheet::default()
    }

    /// What is missing for a panel emitter, one sentence each; empty when everything can be computed.
    pub fn missing(&self) -> Vec<String> {
        let mut sentences = Vec::new();
        let mut say = |sentence: &str| sentences.push(sentence.to_owned());
        if self.eqe.is_none() {
            say(
                "EQE against current density is missing: photons, exitance, luminance and stripe areas need it",
            );
        }
        if self.voltage.is_none() && self.wall_plug.is_none() {
            say("voltage against current density is missing (or a wall-plug efficiency): lm/W needs it");
        } else if self.voltage.is_none() {
            say("voltage against current density is missing: lm/W rests on the wall-plug efficiency alone");
        }
        if let Some(out_coupling) = &self.out_coupling
            && out_coupling.inclusion == Inclusion::Unasked
        {
            say("it is not said whether the out-coupling is already in the measured EQE: answer yes or no");
        }
        if let Some(wear) = &self.wear {
            if wear.reference_current_ma_per_cm2.is_none() || wear.time_constant_h.is_none() {
                say("wear lacks its reference current or its time constant: equal ageing needs both");
            }
            if wear.acceleration.is_none() {
                say("wear lacks its acceleration exponent: equal ageing needs it");
            }
        } else {
            say("wear is missing: equal ageing and life need it");
        }
        sentences
    }

    /// What is missing for a packaged emitter, one sentence each.
    pub fn missing_for_package(&self) -> Vec<String> {
        let mut sentences = Vec::new();
        let mut say = |sentence: &str| sentences.push(sentence.to_owned());
        let Some(package) = &self.package else {
            say("the package data are missing: flux, forward voltage and maximum current");
            return sentences;
        };
        if package.test_current_ma.is_none() {
            say("the package's test current is missing: its flux and voltage hold at that current");
        }
        if package.radiant_flux_w.is_none()
            && (package.flux_bin_low_lm.is_none() || package.flux_bin_high_lm.is_none())
        {
            say("the package's flux is missing: both edges of its bin in lm, or radiant watts");
        }
        if package.forward_voltage_v.is_none() && package.forward_voltage.is_none() {
            say("the package's forward voltage is missing: strings and lm/W need it");
        }
        if package.maximum_current_ma.is_none() {
            say("the package's maximum current is missing: it is held at its test current or below");
        }
        sentences
    }

    /// What is taken for granted by the sheet as it stands, one sentence each.
    pub fn assumptions(&self) -> Vec<String> {
        let mut sentences = Vec::new();
        if let Some(EqeModel::Constant(eqe)) = self.eqe {
            sentences.push(format!("EQE {eqe} is taken as the same at every current"));
        }
        if let Some(VoltageModel::Constant(voltage_v)) = self.voltage {
            sentences.push(format!("{voltage_v} V is taken as the same at every current"));
        }
        if self.angular_factor.is_none() {
            sentences.push("the emitter is taken as Lambertian".to_owned());
        }
        if self.voltage.is_none() && self.wall_plug.is_some() {
            sentences.push("the wall-plug efficiency is taken as the same at every current".to_owned());
        }
        sentences
    }
}
