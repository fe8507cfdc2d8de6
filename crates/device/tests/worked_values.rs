//! Worked values of emitter physics and of the building of whites, each with its tag and source.
//!
//! Tags [Cn] are those of the worked examples this project carries: values computed from the stated formulas
//! with CIE 1931 tables and the 2019 SI constants. Tolerances are half of the last digit given.

#![allow(clippy::unwrap_used, reason = "a test fails by panicking")]

mod support;

use colour::locus;
use device::conversion::{Conversion, Converter, stokes_ratio};
use device::curve::Table;
use device::out_coupling::{
    CouplingFactor, EXTERNAL_FILM_FACTOR, Inclusion, OutCoupling, PLANAR_OUT_COUPLING,
};
use device::roll_off::{AbcRollOff, TripletRollOff};
use device::series_stack::{SeriesStack, needed_eqe};
use device::shares::convert;
use device::sheet::{EqeModel, VoltageModel};
use device::side_by_side::{Drive, Freedom, SideBySide, StripeHold};
use device::{Build, Characteristic, EmitterLight, FormSettings, Level, ShareKind, Sheet};
use support::{check, emitter, gaussian_grid, gaussian_light, with_out_coupling};

fn red_620() -> Characteristic {
    let sheet = Sheet {
        eqe: Some(EqeModel::Table(Table::new(vec![(1.0, 0.21), (10.0, 0.20), (100.0, 0.12)]))),
        voltage: Some(VoltageModel::Table(Table::new(vec![(1.0, 2.6), (10.0, 3.5), (100.0, 6.0)]))),
        ..Sheet::default()
    };
    Characteristic::of(&emitter("red", gaussian_light(620.0, 30.0), sheet)).unwrap()
}

/// The three-Gaussian white of the examples: 455/25, 530/60, 612/80 nm at 4000 K, Duv 0.
fn mix4000() -> (Vec<EmitterLight>, Vec<f64>) {
    let lights = vec![gaussian_light(455.0, 25.0), gaussian_light(530.0, 60.0), gaussian_light(612.0, 80.0)];
    let target = locus::uv_at(4000.0, 0.0);
    // One watt in all, and the chromaticity: (u,v) fixes two homogeneous rows in XYZ.
    let (x, y, z) = {
        let (u, v) = (target.u, target.v);
        (3.0 * u, 2.0 * v, 4.0 - u - 10.0 * v)
    };
    let rows = |k: usize| lights[k].xyz_per_w;
    let cross = |a: [f64; 3], b: [f64; 3]| {
        [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]]
    };
    let dot = |a: [f64; 3], b: [f64; 3]| a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
    let white = [x, y, z];
    let raw = [
        dot(white, cross(rows(1), rows(2))),
        dot(white, cross(rows(2), rows(0))),
        dot(white, cross(rows(0), rows(1))),
    ];
    let sum: f64 = raw.iter().sum();
    (lights, raw.iter().map(|r| r / sum).collect())
}

#[test]
fn ten_milliamperes_of_a_620_nm_red() {
    // [C10] 10 mA/cm², EQE 20 %, Gaussian 620/30 nm, 3.5 V.
    let at = red_620().at(10.0).unwrap();
    check(at.photon_exitance_per_s_m2.unwrap() / 1e20, 1.248, 5e-4);
    check(at.radiant_exitance_w_per_m2.unwrap(), 39.99, 5e-3);
    check(at.luminous_exitance_lm_per_m2.unwrap(), 10_621.0, 1.0);
    check(at.luminance_cd_per_m2.unwrap(), 3381.0, 0.5);
    check(at.lm_per_w.unwrap(), 30.3, 0.05);
    check(at.wall_plug.unwrap(), 0.114, 5e-4);
    // cd/A·π = lm/A for a Lambertian emitter only.
    let lm_per_a = at.luminous_exitance_lm_per_m2.unwrap() / 100.0;
    check(at.cd_per_a.unwrap() * std::f64::consts::PI, lm_per_a, 1e-9);
    assert!(at.notices.is_empty());
}

#[test]
fn an_angular_factor_changes_candelas_and_not_lumens() {
    let mut sheet = Sheet { eqe: Some(EqeModel::Constant(0.2)), ..Sheet::default() };
    let light = gaussian_light(620.0, 30.0);
    let lambertian = Characteristic::of(&emitter("red", light, sheet.clone())).unwrap().at(10.0).unwrap();
    sheet.angular_factor = Some(1.2);
    let forward = Characteristic::of(&emitter("red", light, sheet)).unwrap().at(10.0).unwrap();
    check(forward.luminance_cd_per_m2.unwrap(), 1.2 * lambertian.luminance_cd_per_m2.unwrap(), 1e-9);
    assert_eq!(forward.luminous_exitance_lm_per_m2, lambertian.luminous_exitance_lm_per_m2);
    assert_eq!(lambertian.lm_per_w, None, "without a voltage there is no lm/W");
}

#[test]
fn roll_off_formulas_at_their_published_points() {
    // [C11] triplet–triplet annihilation, Baldo et al., Phys. Rev. B 62:10967 (2000).
    let triplet = TripletRollOff { low_current_eqe: 1.0, half_current_ma_per_cm2: 12.0 };
    check(triplet.eqe(12.0), 0.5, 1e-12);
    // [C11] ABC: A 1e7 /s, B 2e-11 cm³/s, C 1.5e-30 cm⁶/s, 2 nm (typical, from memory).
    let abc = AbcRollOff::from_coefficients(1e7, 2e-11, 1.5e-30, 2.0, 1.0);
    check(abc.eqe(abc.peak_current_ma_per_cm2), 0.721, 5e-4);
    check(abc.peak_current_ma_per_cm2 / 1000.0, 5.9, 0.05);
}

#[test]
fn the_three_kinds_of_share_of_the_4000_k_mix() {
    // [C15] power .171/.307/.522, lumens .018/.460/.522, photons .139/.291/.571; LER 336.9.
    let (lights, power) = mix4000();
    let expected = [
        (ShareKind::Radiant, [0.171, 0.307, 0.522]),
        (ShareKind::Luminous, [0.018, 0.460, 0.522]),
        (ShareKind::Photon, [0.139, 0.291, 0.571]),
    ];
    for (kind, values) in expected {
        let shares = convert(&power, ShareKind::Radiant, kind, &lights).unwrap();
        for (found, expected) in shares.iter().zip(values) {
            check(*found, expected, 6e-4);
        }
        let back = convert(&shares, kind, ShareKind::Radiant, &lights).unwrap();
        for (found, expected) in back.iter().zip(&power) {
            check(*found, *expected, 1e-14);
        }
    }
    let ler: f64 = power.iter().zip(&lights).map(|(share, light)| share * light.ler_lm_per_w).sum();
    check(ler, 336.9, 0.05);
}

#[test]
fn reading_one_kind_of_share_as_another_moves_the_white() {
    // Luminous read as radiant: Δu′v′ about 0.04–0.06 and more; photon read as radiant: 0.013.
    let (lights, power) = mix4000();
    let white = |shares: &[f64]| device::light::u_prime_v_prime(&lights, shares);
    let photon = convert(&power, ShareKind::Radiant, ShareKind::Photon, &lights).unwrap();
    let luminous = convert(&power, ShareKind::Radiant, ShareKind::Luminous, &lights).unwrap();
    let moved = |shares: &[f64]| device::light::delta_uv_prime(white(shares), white(&power));
    check(moved(&photon), 0.013, 1e-3);
    assert!(moved(&luminous) > 0.04);
}

#[test]
fn a_tandem_needs_eqe_in_the_ratio_of_photon_shares() {
    // [C16] mix4000 with the largest EQE .20: .049/.102/.200.
    let (lights, power) = mix4000();
    let photon = convert(&power, ShareKind::Radiant, ShareKind::Photon, &lights).unwrap();
    for (found, expected) in needed_eqe(&photon, 0.20).iter().zip([0.049, 0.102, 0.200]) {
        check(*found, expected, 5e-4);
    }
    // The series-stack form asks for the same ratios, at any level.
    let sheet = Sheet {
        eqe: Some(EqeModel::Constant(0.20)),
        voltage: Some(VoltageModel::Constant(3.0)),
        maximum_current_ma_per_cm2: Some(50.0),
        minimum_current_ma_per_cm2: Some(0.1),
        ..Sheet::default()
    };
    let emitters: Vec<_> = lights
        .iter()
        .zip(["B", "G", "R"])
        .map(|(light, name)| emitter(name, *light, sheet.clone()))
        .collect();
    let build = Build { form: FormSettings::SeriesStack(SeriesStack::default()), ..Build::default() };
    let recipe = build.recipe(&emitters, &power, Level::Luminance(3000.0)).unwrap();
    let eqe: Vec<f64> = recipe.emitters.iter().map(|e| e.eqe.unwrap()).collect();
    check(eqe[2], 0.200, 1e-9);
    check(eqe[0], 0.049, 5e-4);
    check(eqe[1], 0.102, 5e-4);
}

#[test]
fn a_converter_loses_by_stokes_and_yield() {
    // [C20] 450 → 560 nm: quantum ratio .804; α .85, QY .9: .615 converted and .150 leaking of the pump's power.
    check(stokes_ratio(450.0, 560.0), 0.804, 5e-4);
    let converter = Converter { emitter: 1, quantum_yield: 0.9, ..Converter::default() };
    let out = Conversion { pump: 0, layers: vec![converter] }.outputs(&[-(0.15f64.ln())]);
    check(out.bands[0] * stokes_ratio(450.0, 560.0), 0.615, 5e-4);
    check(out.leak, 0.150, 1e-12);
}

#[test]
fn out_coupling_acts_once_and_only_when_the_answer_is_known() {
    // Common practice: planar stacks let out 20–30 % of internal light; a film adds about 60 % to the EQE.
    let inside = Sheet { eqe: Some(EqeModel::Constant(0.8)), ..Sheet::default() };
    let light = gaussian_light(530.0, 30.0);
    let planar = |inclusion| OutCoupling { factor: CouplingFactor::Number(PLANAR_OUT_COUPLING.0), inclusion };
    let eqe = |inclusion| {
        let sheet = with_out_coupling(inside.clone(), planar(inclusion));
        Characteristic::of(&emitter("green", light, sheet)).unwrap().at(1.0).unwrap().eqe
    };
    check(eqe(Inclusion::NotInMeasuredEqe).unwrap(), 0.16, 1e-12);
    check(eqe(Inclusion::InMeasuredEqe).unwrap(), 0.80, 1e-12);
    assert_eq!(eqe(Inclusion::Unasked), None);
    let asked = with_out_coupling(inside.clone(), planar(Inclusion::Unasked)).missing();
    assert!(asked.iter().any(|sentence| sentence.contains("answer yes or no")), "{asked:?}");
    // A factor that makes more than one photon an electron is refused, not clipped.
    let film = OutCoupling {
        factor: CouplingFactor::Number(EXTERNAL_FILM_FACTOR),
        inclusion: Inclusion::NotInMeasuredEqe,
    };
    assert!(Characteristic::of(&emitter("green", light, with_out_coupling(inside, film))).is_err());
}

#[test]
fn a_per_wavelength_out_coupling_reshapes_the_light_and_scales_its_photons() {
    let grid = gaussian_grid(530.0, 60.0);
    let coupling = OutCoupling {
        factor: CouplingFactor::PerWavelength(vec![(380.0, 0.1), (780.0, 0.5)]),
        inclusion: Inclusion::NotInMeasuredEqe,
    };
    let sheet =
        with_out_coupling(Sheet { eqe: Some(EqeModel::Constant(0.5)), ..Sheet::default() }, coupling.clone());
    let light = EmitterLight::with_out_coupling(&grid, &sheet);
    let bare = gaussian_light(530.0, 60.0);
    assert!(light.mean_wavelength_nm > bare.mean_wavelength_nm, "red leaves more easily here");
    let at = Characteristic::of(&emitter("green", light, sheet)).unwrap().at(2.0).unwrap();
    // Watts out must equal watts in, wavelength by wavelength times the factor.
    let watts_in = 2.0 * 0.5 * bare.watts_per_photon_current();
    let weight = |with: bool| -> f64 {
        grid.iter()
            .enumerate()
            .map(|(k, p)| p * if with { coupling.at_nm(380.0 + k as f64) } else { 1.0 })
            .sum()
    };
    check(at.radiant_exitance_w_per_m2.unwrap(), watts_in * weight(true) / weight(false), 1e-9);
}

#[test]
fn a_film_of_60_percent_gives_more_than_60_percent_efficacy_at_constant_luminance() {
    // Common practice: +60 % EQE. EQE measured without the film, at a current where EQE(J) falls and V(J) rises.
    let bare = Sheet {
        eqe: Some(EqeModel::Table(Table::new(vec![(0.5, 0.20), (2.0, 0.19), (10.0, 0.15), (40.0, 0.09)]))),
        voltage: Some(VoltageModel::Table(Table::new(vec![
            (0.5, 2.9),
            (2.0, 3.3),
            (10.0, 4.2),
            (40.0, 6.0),
        ]))),
        ..Sheet::default()
    };
    let film = OutCoupling {
        factor: CouplingFactor::Number(EXTERNAL_FILM_FACTOR),
        inclusion: Inclusion::NotInMeasuredEqe,
    };
    let light = gaussian_light(530.0, 60.0);
    let hold = SideBySide {
        holds: vec![StripeHold::Area { emitter: 0, share: 0.7 }],
        drive: Drive::OwnCurrent(Freedom::LeastPower),
        ..SideBySide::default()
    };
    let build = Build { form: FormSettings::SideBySide(hold), ..Build::default() };
    let recipe = |sheet: Sheet| {
        build.recipe(&[emitter("green", light, sheet)], &[1.0], Level::Luminance(3000.0)).unwrap()
    };
    let without = recipe(bare.clone());
    let with = recipe(with_out_coupling(bare, film));
    let current = |r: &device::Recipe| r.emitters[0].current_density_ma_per_cm2.unwrap();
    let gain = with.efficacy_lm_per_w.unwrap() / without.efficacy_lm_per_w.unwrap();
    check(with.luminance_cd_per_m2.unwrap(), without.luminance_cd_per_m2.unwrap(), 1e-6);
    assert!(current(&without) > 2.0, "the working current lies on the falling side");
    assert!(current(&with) < current(&without) / 1.6, "less current than the film alone saves");
    assert!(gain > 1.6, "efficacy grew only {gain} times");
}
