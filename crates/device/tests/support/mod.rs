//! Invented emitters and sheets for the tests.
#![allow(dead_code, reason = "each test file uses its own part")]

use colour::Tensor;
use device::calibration::{ZoneRun, ZoneSetting};
use device::curve::Table;
use device::out_coupling::OutCoupling;
use device::shared_zone::{Knob, SharedZone, ZoneHold};
use device::sheet::{EqeModel, Package, VoltageModel, Wear};
use device::{Build, DeviceEmitter, EmitterLight, FormSettings, ShareKind, Sheet};

/// A small deterministic generator (xorshift64*), so that every run sees the same sheets.
pub(crate) struct Dice(u64);

impl Dice {
    pub(crate) fn new(seed: u64) -> Dice {
        Dice(seed.wrapping_mul(0x9E37_79B9_7F4A_7C15) | 1)
    }

    /// Evenly spread between two numbers.
    pub(crate) fn between(&mut self, low: f64, high: f64) -> f64 {
        self.0 ^= self.0 >> 12;
        self.0 ^= self.0 << 25;
        self.0 ^= self.0 >> 27;
        let bits = self.0.wrapping_mul(0x2545_F491_4F6C_DD1D) >> 11;
        low + (high - low) * bits as f64 / (1u64 << 53) as f64
    }

    pub(crate) fn whole(&mut self, low: u32, high: u32) -> u32 {
        (self.between(f64::from(low), f64::from(high) + 1.0) as u32).min(high)
    }
}

pub(crate) fn gaussian_grid(peak_nm: f64, fwhm_nm: f64) -> Vec<f64> {
    (380..=780).map(|nm| (-4.0 * 2f64.ln() * ((f64::from(nm) - peak_nm) / fwhm_nm).powi(2)).exp()).collect()
}

pub(crate) fn gaussian_light(peak_nm: f64, fwhm_nm: f64) -> EmitterLight {
    EmitterLight::of_tensor(&Tensor::of_grid(&gaussian_grid(peak_nm, fwhm_nm)))
}

pub(crate) fn emitter(name: &str, light: EmitterLight, sheet: Sheet) -> DeviceEmitter {
    DeviceEmitter { name: name.to_owned(), light, sheet, temperature_c: None }
}

/// EQE rises a little or not at all, then falls; the voltage rises. 0.05 to 200 mA/cm².
pub(crate) fn random_sheet(dice: &mut Dice) -> Sheet {
    let rows = dice.whole(5, 9);
    let top = dice.between(0.06, 0.28);
    let peak_at = dice.between(0.0, 0.5);
    let fall = dice.between(0.2, 0.9);
    let (turn_on, swing) = (dice.between(2.0, 3.2), dice.between(1.0, 5.0));
    let mut eqe = Vec::new();
    let mut voltage = Vec::new();
    for k in 0..rows {
        let t = f64::from(k) / f64::from(rows - 1);
        let current = 0.05 * 4000f64.powf(t);
        let shape = if t < peak_at {
            1.0 - 0.5 * ((peak_at - t) / peak_at.max(1e-9)).powi(2)
        } else {
            1.0 - fall * ((t - peak_at) / (1.0 - peak_at)).powf(1.5)
        };
        eqe.push((current, top * shape * dice.between(0.97, 1.03)));
        voltage.push((current, turn_on + swing * t * t + 0.02 * f64::from(k)));
    }
    Sheet {
        eqe: Some(EqeModel::Table(Table::new(eqe))),
        voltage: Some(VoltageModel::Table(Table::new(voltage))),
        wear: Some(Wear {
            reference_current_ma_per_cm2: Some(dice.between(2.0, 10.0)),
            time_constant_h: Some(dice.between(2e3, 5e4)),
            stretch: Some(0.7),
            acceleration: Some(dice.between(1.2, 2.0)),
        }),
        ..Sheet::default()
    }
}

pub(crate) fn random_light(dice: &mut Dice, low_nm: f64, high_nm: f64) -> EmitterLight {
    let fwhm_nm = dice.between(20.0, 80.0);
    gaussian_light(dice.between(low_nm, high_nm), fwhm_nm)
}

/// `count` emitters spread over the visible range, each with a random sheet.
pub(crate) fn random_set(dice: &mut Dice, count: usize) -> Vec<DeviceEmitter> {
    (0..count)
        .map(|k| {
            let step = 190.0 / count as f64;
            let low = 445.0 + step * k as f64;
            let light = random_light(dice, low, low + 0.8 * step);
            let sheet = random_sheet(dice);
            emitter(&format!("Invented {k}"), light, sheet)
        })
        .collect()
}

/// Positive shares that sum to 1.
pub(crate) fn random_shares(dice: &mut Dice, count: usize) -> Vec<f64> {
    let raw: Vec<f64> = (0..count).map(|_| dice.between(0.15, 1.0)).collect();
    let sum: f64 = raw.iter().sum();
    raw.iter().map(|share| share / sum).collect()
}

/// A packaged emitter: 20–120 lm-like flux at 65 mA, up to 200 mA, flux droops with current.
pub(crate) fn random_package(dice: &mut Dice, light: EmitterLight) -> Sheet {
    let droop = dice.between(0.05, 0.25);
    let (volts, slope) = (dice.between(2.0, 3.0), dice.between(0.1, 0.4));
    let currents = [5.0, 20.0, 65.0, 120.0, 200.0];
    let flux = |ma: f64| (ma / 65.0) * (1.0 - droop * (ma / 65.0).ln());
    let watts = dice.between(0.02, 0.065);
    Sheet {
        package: Some(Package {
            test_current_ma: Some(65.0),
            flux_bin_low_lm: Some(0.95 * watts * light.ler_lm_per_w),
            flux_bin_high_lm: Some(1.05 * watts * light.ler_lm_per_w),
            maximum_current_ma: Some(200.0),
            die_area_mm2: Some(0.3),
            relative_flux: Some(Table::new(currents.iter().map(|&ma| (ma, flux(ma))).collect())),
            forward_voltage: Some(Table::new(
                currents.iter().map(|&ma| (ma, volts + slope * (ma / 5.0).ln())).collect(),
            )),
            ..Package::default()
        }),
        ..Sheet::default()
    }
}

pub(crate) fn with_out_coupling(mut sheet: Sheet, out_coupling: OutCoupling) -> Sheet {
    sheet.out_coupling = Some(out_coupling);
    sheet
}

/// A zone of `count` emitters whose runs follow an exact hidden law, and shares inside its range.
pub(crate) fn zone(dice: &mut Dice, emitters: &[DeviceEmitter]) -> (Build, Vec<f64>) {
    let count = emitters.len();
    let laws: Vec<(f64, f64, f64)> = (0..count)
        .map(|_| (dice.between(-0.5, 0.5), dice.between(0.5, 1.2), dice.between(0.02, 0.08)))
        .collect();
    let photons = |settings: &[(f64, f64)]| -> Vec<f64> {
        let ratio = |k: usize| {
            let ((alpha, beta, delta), (c, t)) = (laws[k], settings[k]);
            if k == 0 { 1.0 } else { (alpha + beta * f64::ln(c) + delta * t).exp() }
        };
        (0..count).map(ratio).collect()
    };
    let radiant = |photons: &[f64]| -> Vec<f64> {
        let watts: Vec<f64> =
            photons.iter().zip(emitters).map(|(n, e)| n / e.light.mean_wavelength_nm).collect();
        let sum: f64 = watts.iter().sum();
        watts.iter().map(|w| w / sum).collect()
    };
    let corners = [(0.2, 5.0), (0.2, 15.0), (1.0, 5.0), (1.0, 15.0), (0.5, 9.0), (0.4, 11.0), (0.7, 8.0)];
    let runs = (0..corners.len())
        .map(|r| {
            // Each emitter walks the corners from another start, so that no two move together.
            let settings: Vec<(f64, f64)> = (0..count).map(|k| corners[(r + k) % corners.len()]).collect();
            let setting =
                |&(c, t): &(f64, f64)| ZoneSetting { concentration_percent: Some(c), thickness_nm: Some(t) };
            ZoneRun {
                id: format!("invented run {r}"),
                current_ma_per_cm2: Some(5.0),
                settings: settings.iter().map(setting).collect(),
                shares: radiant(&photons(&settings)),
                kind: ShareKind::Radiant,
            }
        })
        .collect();
    let wanted: Vec<(f64, f64)> =
        (0..count).map(|_| (dice.between(0.25, 0.9), dice.between(6.0, 14.0))).collect();
    // Odd emitters turn their thickness at a held concentration, even ones the other way round.
    let holds = (1..count)
        .map(|emitter| {
            let (c, t) = wanted[emitter];
            if emitter % 2 == 1 {
                ZoneHold { emitter, turn: Knob::Thickness, other: Some(c) }
            } else {
                ZoneHold { emitter, turn: Knob::Concentration, other: Some(t) }
            }
        })
        .collect();
    let form = SharedZone { runs, holds, ..SharedZone::default() };
    (Build { form: FormSettings::SharedZone(form), ..Build::default() }, radiant(&photons(&wanted)))
}

#[track_caller]
pub(crate) fn check(found: f64, expected: f64, tolerance: f64) {
    assert!((found - expected).abs() <= tolerance, "{found} is not {expected} within {tolerance}");
}
