//! A packaged emitter's laws over its current in mA, from flux, voltage and die area.

use crate::curve::Table;
use crate::error::DeviceError;
use crate::light::DeviceEmitter;
use crate::roll_off::{AbcRollOff, TripletRollOff};
use crate::sheet::{EqeModel, Sheet, VoltageModel};
use crate::units::PHOTON_ENERGY_EV_NM;
use crate::working::{Characteristic, above_zero};

impl Characteristic {
    /// A packaged emitter: the same laws over its current in mA instead of a current density.
    ///
    /// The flux at the test current fixes the EQE there, `N/(I/e)`; a relative-flux table gives it elsewhere, or
    /// the sheet's EQE(J) over the die area; with neither the EQE is taken constant, and likewise the voltage.
    ///
    /// # Errors
    /// [`DeviceError::Missing`] without test current or flux; otherwise as [`Characteristic::of`].
    pub fn of_package(emitter: &DeviceEmitter) -> Result<Characteristic, DeviceError> {
        let missing = |missing: &str| DeviceError::Missing {
            emitter: emitter.name.clone(),
            missing: missing.to_owned(),
        };
        let lacking = emitter.sheet.missing_for_package();
        let package = emitter.sheet.package.as_ref();
        let (Some(package), Some(test_ma), Some(watts)) =
            (package, package.and_then(|p| p.test_current_ma), package_flux_w(emitter))
        else {
            return Err(missing(lacking.first().map_or("the package data are missing", String::as_str)));
        };
        above_zero("the package's test current", test_ma)?;
        above_zero("the package's flux", watts)?;
        // Photon current in mA over current in mA.
        let eqe = watts * emitter.light.mean_wavelength_nm / PHOTON_ENERGY_EV_NM / (1e-3 * test_ma);
        let area_cm2 = package.die_area_mm2.map(|mm2| mm2 * 1e-2);
        let mut sheet = Sheet { temperature: emitter.sheet.temperature.clone(), ..Sheet::default() };
        sheet.angular_factor = emitter.sheet.angular_factor;
        sheet.eqe = Some(match (&package.relative_flux, &emitter.sheet.eqe, area_cm2) {
            (Some(table), _, _) => {
                let curve = table.curve("relative flux", "mA")?;
                let at_test = curve.read(test_ma)?.value;
                let point = |&(ma, flux): &(f64, f64)| (ma, eqe * (flux / at_test) * (test_ma / ma));
                EqeModel::Table(Table::new(table.points.iter().map(point).collect()))
            }
            (None, Some(law), Some(area)) => {
                above_zero("the die area", area)?;
                let bare = DeviceEmitter {
                    sheet: Sheet { eqe: Some(law.clone()), ..Sheet::default() },
                    temperature_c: None,
                    ..emitter.clone()
                };
                let factor = eqe / Characteristic::of(&bare)?.eqe(test_ma / area);
                match law {
                    EqeModel::Table(table) => EqeModel::Table(Table::new(
                        table.points.iter().map(|&(j, value)| (j * area, value * factor)).collect(),
                    )),
                    EqeModel::TripletTriplet(model) => EqeModel::TripletTriplet(TripletRollOff {
                        low_current_eqe: model.low_current_eqe * factor,
                        half_current_ma_per_cm2: model.half_current_ma_per_cm2 * area,
                    }),
                    EqeModel::Abc(model) => EqeModel::Abc(AbcRollOff {
                        peak_current_ma_per_cm2: model.peak_current_ma_per_cm2 * area,
                        extraction: model.extraction * factor,
                        ..*model
                    }),
                    EqeModel::Constant(_) => EqeModel::Constant(eqe),
                }
            }
            _ => EqeModel::Constant(eqe),
        });
        sheet.voltage = match (&package.forward_voltage, package.forward_voltage_v) {
            (Some(table), _) => Some(VoltageModel::Table(table.clone())),
            (None, Some(volts)) => Some(VoltageModel::Constant(volts)),
            (None, None) => None,
        };
        sheet.wall_plug = emitter.sheet.wall_plug;
        sheet.maximum_current_ma_per_cm2 = Some(package.maximum_current_ma.unwrap_or(test_ma));
        sheet.minimum_current_ma_per_cm2 = package.minimum_current_ma;
        let in_ma = DeviceEmitter { sheet, ..emitter.clone() };
        Ok(Characteristic::in_unit(&in_ma, "mA")?.saying(lacking))
    }
}

/// Radiant watts of a package at its test current: stated, or from the middle of its flux bin.
fn package_flux_w(emitter: &DeviceEmitter) -> Option<f64> {
    let package = emitter.sheet.package.as_ref()?;
    if let Some(watts) = package.radiant_flux_w {
        return Some(watts);
    }
    let lumens = 0.5 * (package.flux_bin_low_lm? + package.flux_bin_high_lm?);
    (emitter.light.ler_lm_per_w > 0.0).then(|| lumens / emitter.light.ler_lm_per_w)
}
