//! A sheet made ready for computing, and everything it gives at one current density.
//!
//! `N = (J/e)·EQE`, `M_e = J·EQE·1239.842/λ̄`, `M_v = M_e·LER`, `L = a·M_v/π` (a = 1 Lambertian),
//! lm/W `= M_v/(J·V)`, wall-plug `= M_e/(J·V)`, cd/A `= L/J`.

use crate::curve::{Curve, TABLE_REACH};
use crate::error::{DeviceError, Notice};
use crate::light::{DeviceEmitter, EmitterLight};
use crate::out_coupling::{CouplingFactor, Inclusion};
use crate::roll_off::{AbcRollOff, TripletRollOff};
use crate::search::root_between;
use crate::sheet::{EqeModel, Sheet, VoltageModel};
use crate::units::{A_PER_M2_IN_MA_PER_CM2, PHOTONS_PER_S_M2_IN_MA_PER_CM2};

/// Current densities searched where neither tables nor limits say anything, mA/cm² (common practice).
pub const DEFAULT_CURRENT_RANGE_MA_PER_CM2: (f64, f64) = (1e-3, 1e3);

/// Samples of the photon current kept to find the first current that gives a wanted one.
const LADDER_STEPS: usize = 160;

/// Everything a sheet gives at one current density. `None` where the sheet lacks something.
#[derive(Debug, Clone, PartialEq)]
pub struct Working {
    /// The current density, mA/cm².
    pub current_density_ma_per_cm2: f64,
    /// External quantum efficiency, a fraction.
    pub eqe: Option<f64>,
    /// Voltage, V.
    pub voltage_v: Option<f64>,
    /// Photons per second and square metre of lit area.
    pub photon_exitance_per_s_m2: Option<f64>,
    /// Radiant exitance, W/m² of lit area.
    pub radiant_exitance_w_per_m2: Option<f64>,
    /// Luminous exitance, lm/m² of lit area.
    pub luminous_exitance_lm_per_m2: Option<f64>,
    /// Luminance of the lit area along its normal, cd/m².
    pub luminance_cd_per_m2: Option<f64>,
    /// Current efficiency, cd/A.
    pub cd_per_a: Option<f64>,
    /// Luminous efficacy, lumens per electrical watt.
    pub lm_per_w: Option<f64>,
    /// Radiant watts per electrical watt.
    pub wall_plug: Option<f64>,
    /// Remarks on how the values were read.
    pub notices: Vec<Notice>,
}

#[derive(Debug, Clone)]
enum EqeLaw {
    Curve(Curve),
    Triplet(TripletRollOff),
    Abc(AbcRollOff),
    Constant(f64),
}

#[derive(Debug, Clone)]
enum VoltageLaw {
    Curve(Curve),
    Constant(f64),
}

/// A checked sheet with its light, at its working temperature.
#[derive(Debug, Clone)]
pub struct Characteristic {
    name: String,
    light: EmitterLight,
    angular_factor: f64,
    eqe: Option<EqeLaw>,
    eqe_factor: f64,
    voltage: Option<VoltageLaw>,
    voltage_offset_v: f64,
    wall_plug: Option<f64>,
    range: (f64, f64),
    range_is_assumed: bool,
    missing: Vec<String>,
    unit: &'static str,
    /// Ascending currents and their photon currents, for [`Characteristic::current_for`].
    ladder: Vec<(f64, f64)>,
}

impl Characteristic {
    /// Checks a sheet and prepares it.
    ///
    /// # Errors
    /// Tables that cannot be used, numbers that make no sense, a current range without room. What is merely
    /// absent is no error: see [`Characteristic::missing`].
    pub fn of(emitter: &DeviceEmitter) -> Result<Characteristic, DeviceError> {
        Characteristic::in_unit(emitter, "mA/cm²")
    }

    /// As [`Characteristic::of`], with currents in another unit.
    pub(crate) fn in_unit(
        emitter: &DeviceEmitter,
        unit: &'static str,
    ) -> Result<Characteristic, DeviceError> {
        let sheet = &emitter.sheet;
        let mut missing = Vec::new();
        let mut eqe_factor = 1.0;
        let mut eqe = match &sheet.eqe {
            None => None,
            Some(EqeModel::Table(table)) => Some(EqeLaw::Curve(table.curve("EQE", unit)?)),
            Some(EqeModel::Constant(value)) => {
                Some(EqeLaw::Constant(above_zero("the constant EQE", *value)?))
            }
            Some(EqeModel::TripletTriplet(model)) => {
                above_zero("the low-current EQE of the roll-off", model.low_current_eqe)?;
                above_zero("the half current of the roll-off", model.half_current_ma_per_cm2)?;
                Some(EqeLaw::Triplet(*model))
            }
            Some(EqeModel::Abc(model)) => {
                above_zero("the peak IQE of the roll-off", model.peak_iqe)?;
                above_zero("one minus the peak IQE of the roll-off", 1.0 - model.peak_iqe)?;
                above_zero("the peak current of the roll-off", model.peak_current_ma_per_cm2)?;
                above_zero("the extraction of the roll-off", model.extraction)?;
                Some(EqeLaw::Abc(*model))
            }
        };
        if let Some(out_coupling) = &sheet.out_coupling {
            out_coupling.check()?;
            match (out_coupling.inclusion, &out_coupling.factor) {
                (Inclusion::InMeasuredEqe, _) => {}
                (Inclusion::NotInMeasuredEqe, CouplingFactor::Number(factor)) => eqe_factor *= factor,
                (Inclusion::NotInMeasuredEqe, CouplingFactor::PerWavelength(_)) => {
                    eqe_factor *=
                        above_zero("the photon factor of the out-coupling", emitter.light.photon_factor)?;
                }
                // Either reading could be wrong by the whole factor, so neither is taken.
                (Inclusion::Unasked, _) => eqe = None,
            }
        }
        let mut voltage_offset_v = 0.0;
        if let Some(temperature_c) = emitter.temperature_c {
            match &sheet.temperature {
                Some(coefficients) => match coefficients.reference_c {
                    Some(reference_c) => {
                        let rise = temperature_c - reference_c;
                        let change = coefficients.eqe_percent_per_k.unwrap_or(0.0) / 100.0 * rise;
                        eqe_factor *= above_zero("the EQE's temperature factor", 1.0 + change)?;
                        voltage_offset_v = coefficients.voltage_mv_per_k.unwrap_or(0.0) * 1e-3 * rise;
                    }
                    None => missing.push(
                        "the temperature at which the sheet was measured is missing: the working temperature \
                         has no effect"
                            .to_owned(),
                    ),
                },
                None => missing.push(
                    "temperature coefficients are missing: the working temperature has no effect".to_owned(),
                ),
            }
        }
        let voltage = match &sheet.voltage {
            None => None,
            Some(VoltageModel::Table(table)) => Some(VoltageLaw::Curve(table.curve("voltage", unit)?)),
            Some(VoltageModel::Constant(value)) => {
                Some(VoltageLaw::Constant(above_zero("the constant voltage", *value)?))
            }
        };
        let wall_plug =
            sheet.wall_plug.map(|value| above_zero("the wall-plug efficiency", value)).transpose()?;
        if let Some(value) = wall_plug.filter(|value| *value > 1.0) {
            return Err(DeviceError::BadSetting {
                what: "the wall-plug efficiency",
                value,
                expected: "a fraction of at most 1 is expected",
            });
        }
        let angular_factor =
            sheet.angular_factor.map_or(Ok(1.0), |value| above_zero("the angular factor", value))?;

        let mut made = Characteristic {
            name: emitter.name.clone(),
            light: emitter.light,
            angular_factor,
            eqe,
            eqe_factor,
            voltage,
            voltage_offset_v,
            wall_plug,
            range: DEFAULT_CURRENT_RANGE_MA_PER_CM2,
            range_is_assumed: false,
            missing,
            unit,
            ladder: Vec::new(),
        };
        made.missing.extend(sheet.missing());
        made.set_range(sheet.minimum_current_ma_per_cm2, sheet.maximum_current_ma_per_cm2)?;
        let efficient = |eqe: f64| eqe <= 1.0 + 1e-9;
        if made.eqe.is_some() {
            let highest = made.eqe_extremes(made.range.0, made.range.1).1;
            if !efficient(highest) {
                return Err(DeviceError::BadSetting {
                    what: "the external quantum efficiency",
                    value: highest,
                    expected: "a fraction of at most 1 is expected (is the table in per cent, or out-coupling \
                               counted twice?)",
                });
            }
            made.climb();
        }
        Ok(made)
    }

    fn set_range(&mut self, minimum: Option<f64>, maximum: Option<f64>) -> Result<(), DeviceError> {
        let (mut low, mut high) = (0.0f64, f64::INFINITY);
        for curve in [self.eqe_curve(), self.voltage_curve()].into_iter().flatten() {
            low = low.max(curve.range().0);
            high = high.min(curve.range().1);
        }
        if let Some(minimum) = minimum {
            low = low.max(above_zero("the lowest current density", minimum)?);
        }
        if let Some(maximum) = maximum {
            high = high.min(above_zero("the highest current density", maximum)?);
        }
        self.range_is_assumed = low <= 0.0 || high.is_infinite();
        if low <= 0.0 {
            low = DEFAULT_CURRENT_RANGE_MA_PER_CM2.0.min(high * 1e-3);
        }
        if high.is_infinite() {
            high = DEFAULT_CURRENT_RANGE_MA_PER_CM2.1.max(low * 1e3);
        }
        if low > high {
            return Err(DeviceError::BadSetting {
                what: "the highest usable current density",
                value: high,
                expected: "it lies below the lowest one: the EQE and voltage tables and the limits must overlap",
            });
        }
        self.range = (low, high);
        Ok(())
    }

    fn climb(&mut self) {
        let (low, high) = self.range;
        let mut currents: Vec<f64> =
            (0..=LADDER_STEPS).map(|k| low * (high / low).powf(k as f64 / LADDER_STEPS as f64)).collect();
        if let Some(last) = currents.last_mut() {
            *last = high;
        }
        let mut ladder: Vec<(f64, f64)> =
            currents.into_iter().map(|at| (at, self.photon_current(at))).collect();
        ladder.dedup_by(|a, b| a.0 <= b.0);
        self.ladder = ladder;
    }

    fn eqe_curve(&self) -> Option<&Curve> {
        match &self.eqe {
            Some(EqeLaw::Curve(curve)) => Some(curve),
            _ => None,
        }
    }

    fn voltage_curve(&self) -> Option<&Curve> {
        match &self.voltage {
            Some(VoltageLaw::Curve(curve)) => Some(curve),
            _ => None,
        }
    }

    /// The emitter's name.
    pub fn name(&self) -> &str {
        &self.name
    }

    /// The emitter's light.
    pub fn light(&self) -> &EmitterLight {
        &self.light
    }

    /// `π·L/M` of this emitter.
    pub fn angular_factor(&self) -> f64 {
        self.angular_factor
    }

    /// Unit of this characteristic's currents: mA/cm², or mA for a package.
    pub fn current_unit(&self) -> &'static str {
        self.unit
    }

    /// A characteristic that knows nothing but its light, with the sentences that say why.
    pub(crate) fn unknown(
        emitter: &DeviceEmitter,
        missing: Vec<String>,
    ) -> Result<Characteristic, DeviceError> {
        let bare = DeviceEmitter { sheet: Sheet::default(), temperature_c: None, ..emitter.clone() };
        Ok(Characteristic { missing, ..Characteristic::of(&bare)? })
    }

    /// The same characteristic with other sentences on what is missing.
    pub(crate) fn saying(self, missing: Vec<String>) -> Characteristic {
        Characteristic { missing, ..self }
    }

    /// Whether EQE(J) is known.
    pub fn has_eqe(&self) -> bool {
        self.eqe.is_some()
    }

    /// Whether V(J) is known.
    pub fn has_voltage(&self) -> bool {
        self.voltage.is_some()
    }

    /// The wall-plug efficiency of the sheet, used only where EQE or voltage is unknown.
    pub fn wall_plug(&self) -> Option<f64> {
        self.wall_plug
    }

    /// Currents inside every table and limit, mA/cm².
    pub fn range(&self) -> (f64, f64) {
        self.range
    }

    /// Whether an end of the range is our default and not the sheet's.
    pub fn range_is_assumed(&self) -> bool {
        self.range_is_assumed
    }

    /// What the sheet lacks, one sentence each.
    pub fn missing(&self) -> &[String] {
        &self.missing
    }

    /// EQE at a current inside the range; 0 where it is unknown.
    pub fn eqe(&self, current_ma_per_cm2: f64) -> f64 {
        let bare = match &self.eqe {
            None => 0.0,
            Some(EqeLaw::Curve(curve)) => curve.value(current_ma_per_cm2),
            Some(EqeLaw::Triplet(model)) => model.eqe(current_ma_per_cm2),
            Some(EqeLaw::Abc(model)) => model.eqe(current_ma_per_cm2),
            Some(EqeLaw::Constant(value)) => *value,
        };
        bare * self.eqe_factor
    }

    /// Voltage at a current inside the range; 0 where it is unknown.
    pub fn voltage(&self, current_ma_per_cm2: f64) -> f64 {
        match &self.voltage {
            None => 0.0,
            Some(VoltageLaw::Curve(curve)) => curve.value(current_ma_per_cm2) + self.voltage_offset_v,
            Some(VoltageLaw::Constant(value)) => value + self.voltage_offset_v,
        }
    }

    /// Currents of the tables' rows strictly inside the range.
    pub(crate) fn rows_inside(&self) -> Vec<f64> {
        let (low, high) = self.range;
        let curves = [self.eqe_curve(), self.voltage_curve()].into_iter().flatten();
        curves.flat_map(Curve::rows).filter(|at| *at > low && *at < high).collect()
    }

    /// Photon current `J·EQE(J)`, mA/cm²: electrons that leave as photons.
    pub fn photon_current(&self, current_ma_per_cm2: f64) -> f64 {
        current_ma_per_cm2 * self.eqe(current_ma_per_cm2)
    }

    /// Smallest and largest EQE over a span of currents inside the range.
    pub fn eqe_extremes(&self, low: f64, high: f64) -> (f64, f64) {
        let (smallest, largest) = match &self.eqe {
            None => (0.0, 0.0),
            Some(EqeLaw::Curve(curve)) => curve.extremes(low, high),
            Some(EqeLaw::Triplet(model)) => (model.eqe(high), model.eqe(low)),
            Some(EqeLaw::Abc(model)) => {
                let ends = (model.eqe(low), model.eqe(high));
                let peak = model.peak_current_ma_per_cm2;
                let top = if peak > low && peak < high { model.eqe(peak) } else { ends.0.max(ends.1) };
                (ends.0.min(ends.1), top)
            }
            Some(EqeLaw::Constant(value)) => (*value, *value),
        };
        (smallest * self.eqe_factor, largest * self.eqe_factor)
    }

    /// Smallest and largest voltage over a span of currents inside the range.
    pub fn voltage_extremes(&self, low: f64, high: f64) -> (f64, f64) {
        let (smallest, largest) = match &self.voltage {
            None => return (0.0, 0.0),
            Some(VoltageLaw::Curve(curve)) => curve.extremes(low, high),
            Some(VoltageLaw::Constant(value)) => (*value, *value),
        };
        (smallest + self.voltage_offset_v, largest + self.voltage_offset_v)
    }

    /// The smallest current of the range with `J·EQE(J)` equal to a wanted photon current, mA/cm².
    ///
    /// `None` where the wanted value is below what the lowest current gives or above all the range gives.
    pub fn current_for(&self, photon_current_ma_per_cm2: f64) -> Option<f64> {
        let wanted = photon_current_ma_per_cm2;
        let first = self.ladder.first()?;
        // A rounding-sized miss at an end is that end.
        let tolerance = 1e-12 * wanted.abs();
        if (first.1 - wanted).abs() <= tolerance {
            return Some(first.0);
        }
        if wanted.is_nan() || wanted <= first.1 {
            return None;
        }
        let Some(step) = self.ladder.windows(2).find(|pair| pair[1].1 >= wanted) else {
            let last = self.ladder.last()?;
            return ((last.1 - wanted).abs() <= tolerance).then_some(last.0);
        };
        let excess = |log: f64| self.photon_current(log.exp()) - wanted;
        let log = root_between(excess, step[0].0.ln(), step[1].0.ln());
        Some(log.exp().clamp(step[0].0, step[1].0))
    }

    /// Smallest current of the range with a wanted voltage; the range's ends where it lies outside.
    pub fn current_at_voltage(&self, voltage_v: f64) -> f64 {
        let (low, high) = self.range;
        if self.voltage(low) >= voltage_v {
            return low;
        }
        if self.voltage(high) <= voltage_v {
            return high;
        }
        let log = root_between(|log| self.voltage(log.exp()) - voltage_v, low.ln(), high.ln());
        log.exp().clamp(low, high)
    }

    /// Everything the sheet gives at one current density.
    ///
    /// # Errors
    /// [`DeviceError::OutsideTable`] more than a factor [`TABLE_REACH`] past a table or a stated limit.
    pub fn at(&self, current_ma_per_cm2: f64) -> Result<Working, DeviceError> {
        let (low, high) = self.range;
        let reach = TABLE_REACH * (1.0 + 1e-12);
        let at = current_ma_per_cm2;
        let near = at > 0.0 && at * reach >= low && at <= high * reach;
        if !(near || self.range_is_assumed) {
            let quantity = "the emitter's working range";
            return Err(DeviceError::OutsideTable { quantity, at, low, high, unit: self.unit });
        }
        if !(at > 0.0 && at.is_finite()) {
            return Err(DeviceError::BadSetting {
                what: "the current density",
                value: at,
                expected: "a number above zero is expected",
            });
        }
        let mut notices = Vec::new();
        let mut read = |curve: &Curve| -> Result<f64, DeviceError> {
            let reading = curve.read(at)?;
            notices.extend(reading.notice);
            Ok(reading.value)
        };
        let eqe = match &self.eqe {
            None => None,
            Some(EqeLaw::Curve(curve)) => Some(read(curve)? * self.eqe_factor),
            Some(_) => Some(self.eqe(at)),
        };
        let voltage_v = match &self.voltage {
            None => None,
            Some(VoltageLaw::Curve(curve)) => Some(read(curve)? + self.voltage_offset_v),
            Some(VoltageLaw::Constant(_)) => Some(self.voltage(at)),
        };
        if matches!(self.eqe, Some(EqeLaw::Constant(_))) {
            notices.push(Notice::HeldConstant { quantity: "EQE" });
        }
        if matches!(self.voltage, Some(VoltageLaw::Constant(_))) {
            notices.push(Notice::HeldConstant { quantity: "voltage" });
        }
        let radiant = eqe.map(|eqe| at * eqe * self.light.watts_per_photon_current());
        let luminous = radiant.map(|watts| watts * self.light.ler_lm_per_w);
        let luminance = luminous.map(|lumens| self.angular_factor * lumens / std::f64::consts::PI);
        let electrical = voltage_v.map(|volts| A_PER_M2_IN_MA_PER_CM2 * at * volts);
        let wall_plug = match (radiant, electrical) {
            (Some(radiant), Some(electrical)) => Some(radiant / electrical),
            _ => self.wall_plug,
        };
        Ok(Working {
            current_density_ma_per_cm2: at,
            eqe,
            voltage_v,
            photon_exitance_per_s_m2: eqe.map(|eqe| at * eqe * PHOTONS_PER_S_M2_IN_MA_PER_CM2),
            radiant_exitance_w_per_m2: radiant,
            luminous_exitance_lm_per_m2: luminous,
            luminance_cd_per_m2: luminance,
            cd_per_a: luminance.map(|luminance| luminance / (A_PER_M2_IN_MA_PER_CM2 * at)),
            lm_per_w: wall_plug.map(|wall_plug| wall_plug * self.light.ler_lm_per_w),
            wall_plug,
            notices,
        })
    }
}

/// A setting that must be a finite number above zero.
pub(crate) fn above_zero(what: &'static str, value: f64) -> Result<f64, DeviceError> {
    if value.is_finite() && value > 0.0 {
        Ok(value)
    } else {
        Err(DeviceError::BadSetting { what, value, expected: "a number above zero is expected" })
    }
}
