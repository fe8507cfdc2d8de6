//! Shares to recipe and back, for every form, with random sheets and 3 to 8 emitters.
#![allow(clippy::unwrap_used, reason = "a test fails by panicking")]

mod support;

use support::zone;

use device::conversion::{Conversion, Converter};
use device::packages::Packages;
use device::series_stack::{SeriesStack, StackUnit};
use device::side_by_side::{Drive, Freedom, SideBySide, StripeCurrents};
use device::units::watts_per_photon_current;
use device::{Build, Characteristic, DeviceEmitter, FormSettings, Level, Quantities, Recipe};
use proptest::prelude::*;
use support::{Dice, emitter, random_light, random_package, random_set, random_shares};

const TOLERANCE: f64 = 1e-9;

fn near(a: f64, b: f64) -> bool {
    (a - b).abs() <= TOLERANCE * a.abs().max(b.abs()).max(1e-12)
}

/// What every exact recipe must satisfy.
fn check_recipe(recipe: &Recipe, shares: &[f64], lumens: f64) -> Result<(), TestCaseError> {
    for (found, wanted) in recipe.shares_radiant().iter().zip(shares) {
        prop_assert!((found - wanted).abs() < TOLERANCE, "share {found} is not {wanted}");
    }
    let level = recipe.luminous_exitance_lm_per_m2.or(recipe.luminous_flux_lm).unwrap();
    prop_assert!(near(level, lumens), "level {level} is not {lumens}");
    prop_assert!(recipe.delta_uv_prime.unwrap() < TOLERANCE);
    check_identities(recipe)
}

/// Identities between the entries of one recipe.
fn check_identities(recipe: &Recipe) -> Result<(), TestCaseError> {
    let sum = |of: fn(&device::RecipeEmitter) -> f64| recipe.emitters.iter().map(of).sum::<f64>();
    prop_assert!(near(sum(|e| e.share_radiant), 1.0));
    prop_assert!(near(sum(|e| e.share_luminous), 1.0));
    prop_assert!(near(sum(|e| e.share_photon), 1.0));
    let photons: f64 = recipe.emitters.iter().map(|e| e.share_radiant * e.mean_wavelength_nm).sum();
    for e in &recipe.emitters {
        prop_assert!(near(e.share_photon, e.share_radiant * e.mean_wavelength_nm / photons));
        if let (Some(eqe), Some(current), Some(exitance)) =
            (e.eqe, e.current_density_ma_per_cm2, e.radiant_exitance_w_per_m2)
        {
            prop_assert!(near(exitance, 10.0 * current * eqe * 1_239.841_984 / e.mean_wavelength_nm));
            prop_assert!(eqe <= 1.0, "more photons than electrons");
        }
        if let (Some(area), Some(exitance), Some(total)) =
            (e.area_share, e.radiant_exitance_w_per_m2, recipe.radiant_exitance_w_per_m2)
        {
            prop_assert!(near(area * exitance, e.share_radiant * total));
        }
    }
    Ok(())
}

/// Holding every freedom of the made device, the recipe of its own shares is the device again.
fn check_identity(
    build: &Build,
    emitters: &[DeviceEmitter],
    recipe: &Recipe,
    level: Level,
) -> Result<(), TestCaseError> {
    let made = recipe.made.clone().unwrap();
    let predicted = build.predict(emitters, &made).unwrap();
    prop_assert_eq!(predicted.shares_radiant(), recipe.shares_radiant());
    let held = build.holding(emitters, &made).unwrap();
    let again = held.recipe(emitters, &predicted.shares_radiant(), level).unwrap().made.unwrap();
    let (a, b) = (made.numbers(), again.numbers());
    prop_assert_eq!(a.len(), b.len());
    for ((quantity, a), (other, b)) in a.iter().zip(&b) {
        prop_assert_eq!(quantity, other);
        prop_assert!((a - b).abs() <= 1e-8 * a.abs(), "{:?}: {} became {}", quantity, a, b);
    }
    match (&made.quantities, &again.quantities) {
        (Quantities::SeriesStack(a), Quantities::SeriesStack(b)) => {
            prop_assert_eq!(&a.order, &b.order);
            prop_assert_eq!(&a.repeats, &b.repeats);
        }
        (Quantities::Packages(a), Quantities::Packages(b)) => prop_assert_eq!(&a.counts, &b.counts),
        _ => {}
    }
    Ok(())
}

/// A luminous exitance that takes `load` of the fill at 8 mA/cm².
fn level_for(emitters: &[DeviceEmitter], build: &Build, shares: &[f64], load: f64) -> f64 {
    let unit = build.radiant_powers(emitters, shares, Level::LuminousExitance(1.0)).unwrap();
    let area: f64 = emitters
        .iter()
        .zip(unit)
        .map(|(e, watts)| {
            watts / e.light.watts_per_photon_current() / Characteristic::of(e).unwrap().photon_current(8.0)
        })
        .sum();
    load * 0.75 / area
}

fn side_by_side(drive: Drive) -> Build {
    Build {
        form: FormSettings::SideBySide(SideBySide { drive, ..SideBySide::default() }),
        ..Build::default()
    }
}

fn series() -> Build {
    Build { form: FormSettings::SeriesStack(SeriesStack::default()), ..Build::default() }
}

fn package_set(dice: &mut Dice, count: usize) -> Vec<DeviceEmitter> {
    (0..count)
        .map(|k| {
            let low = 450.0 + 180.0 * k as f64 / count as f64;
            let light = random_light(dice, low, low + 20.0);
            let sheet = random_package(dice, light);
            emitter(&format!("Invented package {k}"), light, sheet)
        })
        .collect()
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 40, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn side_by_side_gives_back_shares_and_recipes(seed in any::<u64>(), count in 3usize..=8, load in 0.2..0.9f64) {
        let mut dice = Dice::new(seed);
        let emitters = random_set(&mut dice, count);
        let shares = random_shares(&mut dice, count);
        for drive in [
            Drive::OwnCurrent(Freedom::LeastPower),
            Drive::OwnCurrent(Freedom::EqualCurrent),
            Drive::OwnCurrent(Freedom::EqualAgeing),
            Drive::CommonCurrent(None),
        ] {
            let build = side_by_side(drive);
            let lumens = level_for(&emitters, &build, &shares, load);
            let level = Level::LuminousExitance(lumens);
            let recipe = build.recipe(&emitters, &shares, level).unwrap();
            check_recipe(&recipe, &shares, lumens)?;
            check_identity(&build, &emitters, &recipe, level)?;
            let lit: f64 = recipe.emitters.iter().map(|e| e.area_share.unwrap()).sum();
            prop_assert!(lit <= 0.75 * (1.0 + 1e-9), "lit {lit}");
            let ler: f64 = emitters.iter().zip(&shares).map(|(e, s)| e.light.ler_lm_per_w * s).sum();
            prop_assert!(near(lumens, ler * recipe.radiant_exitance_w_per_m2.unwrap()));
        }
    }

    #[test]
    fn stripes_at_one_voltage_give_back_shares_and_recipes(seed in any::<u64>(), count in 3usize..=8) {
        let mut dice = Dice::new(seed);
        let emitters = random_set(&mut dice, count);
        let shares = random_shares(&mut dice, count);
        let build = side_by_side(Drive::CommonVoltage(None));
        let lumens = level_for(&emitters, &build, &shares, 0.1);
        let level = Level::LuminousExitance(lumens);
        let low = emitters.iter().map(|e| { let c = Characteristic::of(e).unwrap(); c.voltage(c.range().0) }).fold(0.0, f64::max);
        let high = emitters.iter().map(|e| { let c = Characteristic::of(e).unwrap(); c.voltage(c.range().1) }).fold(f64::INFINITY, f64::min);
        match build.recipe(&emitters, &shares, level) {
            Ok(recipe) => {
                check_recipe(&recipe, &shares, lumens)?;
                check_identity(&build, &emitters, &recipe, level)?;
            }
            // Turn-on voltages that differ too much have no voltage in common, or too little light there.
            Err(error) => prop_assert!(low > high || error.to_string().contains("less light"), "{error}"),
        }
    }

    #[test]
    fn equal_ageing_gives_every_emitter_the_same_life(seed in any::<u64>(), count in 3usize..=8) {
        let mut dice = Dice::new(seed);
        let emitters = random_set(&mut dice, count);
        let shares = random_shares(&mut dice, count);
        let build = side_by_side(Drive::OwnCurrent(Freedom::EqualAgeing));
        let lumens = level_for(&emitters, &build, &shares, 0.6);
        let recipe = build.recipe(&emitters, &shares, Level::LuminousExitance(lumens)).unwrap();
        let lives: Vec<f64> = emitters.iter().zip(&recipe.emitters).map(|(emitter, entry)| {
            let wear = emitter.sheet.wear.as_ref().unwrap();
            let ratio = wear.reference_current_ma_per_cm2.unwrap() / entry.current_density_ma_per_cm2.unwrap();
            wear.time_constant_h.unwrap() * ratio.powf(wear.acceleration.unwrap())
        }).collect();
        for life in &lives {
            prop_assert!((life / lives[0] - 1.0).abs() < 1e-9, "{:?}", lives);
        }
    }

    #[test]
    fn a_series_stack_gives_back_shares_and_recipes(seed in any::<u64>(), count in 3usize..=8, load in 0.2..2.0f64) {
        let mut dice = Dice::new(seed);
        let emitters = random_set(&mut dice, count);
        let shares = random_shares(&mut dice, count);
        let mut build = series();
        if let FormSettings::SeriesStack(stack) = &mut build.form {
            let units = (0..count).rev().map(|emitter| StackUnit { emitter, repeats: dice.whole(1, 3) });
            stack.units = units.collect();
        }
        let lumens = level_for(&emitters, &build, &shares, load);
        let level = Level::LuminousExitance(lumens);
        let recipe = build.recipe(&emitters, &shares, level).unwrap();
        check_recipe(&recipe, &shares, lumens)?;
        check_identity(&build, &emitters, &recipe, level)?;
        // One current; EQE in the ratio of the photon shares; no unit asked for more than it has.
        for entry in &recipe.emitters {
            prop_assert_eq!(entry.current_density_ma_per_cm2, recipe.emitters[0].current_density_ma_per_cm2);
            let ratio = entry.eqe.unwrap() / recipe.emitters[0].eqe.unwrap();
            prop_assert!(near(ratio, entry.share_photon / recipe.emitters[0].share_photon));
        }
        if let Some(device::recipe::Details::SeriesStack { units, .. }) = &recipe.details {
            for unit in units {
                prop_assert!(unit.lacking_eqe.unwrap() < 1e-9, "{:?}", unit);
            }
        } else {
            prop_assert!(false, "a stack has units");
        }
    }

    #[test]
    fn a_shared_zone_gives_back_shares_and_recipes(seed in any::<u64>(), count in 3usize..=6) {
        let mut dice = Dice::new(seed);
        let emitters = random_set(&mut dice, count);
        let (build, shares) = zone(&mut dice, &emitters);
        let lumens = level_for(&emitters, &build, &shares, 0.5);
        let level = Level::LuminousExitance(lumens);
        let recipe = build.recipe(&emitters, &shares, level).unwrap();
        check_recipe(&recipe, &shares, lumens)?;
        check_identity(&build, &emitters, &recipe, level)?;
        let total: f64 = recipe.emitters.iter().map(|e| e.eqe.unwrap()).sum();
        let current = recipe.emitters[0].current_density_ma_per_cm2.unwrap();
        let best = emitters.iter().map(|e| Characteristic::of(e).unwrap().eqe(current)).fold(0.0, f64::max);
        prop_assert!(total <= best, "a zone cannot beat its best emitter");
    }

    #[test]
    fn trimmed_packages_give_back_shares_and_recipes(seed in any::<u64>(), count in 3usize..=8, flux in 20.0..200.0f64) {
        let mut dice = Dice::new(seed);
        let emitters = package_set(&mut dice, count);
        let shares = random_shares(&mut dice, count);
        let build = Build { form: FormSettings::Packages(Packages { at_most: Some(60), ..Packages::default() }), ..Build::default() };
        let level = Level::LuminousFlux(flux);
        match build.recipe(&emitters, &shares, level) {
            Ok(recipe) => {
                check_recipe(&recipe, &shares, flux)?;
                check_identity(&build, &emitters, &recipe, level)?;
            }
            Err(error) => prop_assert!(error.to_string().contains("packages"), "{error}"),
        }
    }

    #[test]
    fn conversion_goes_with_every_form_and_comes_back(seed in any::<u64>(), load in 0.2..0.6f64) {
        let mut dice = Dice::new(seed);
        // Emitter 0 pumps 1 and 2; 3 is driven itself.
        let mut emitters = random_set(&mut dice, 4);
        let converter = |emitter, quantum_yield, relative_absorption: &[(usize, f64)]| Converter {
            emitter,
            quantum_yield,
            relative_absorption: relative_absorption.to_vec(),
            depth_per_percent_um: Some(0.002),
            thickness_um: Some(100.0),
        };
        let layers = vec![
            converter(1, dice.between(0.7, 1.0), &[]),
            converter(2, dice.between(0.7, 1.0), &[(1, dice.between(0.0, 0.8))]),
        ];
        let conversions = vec![Conversion { pump: 0, layers }];
        let shares = random_shares(&mut dice, 4);
        for k in [1, 2] {
            // A converter has no electrical sheet.
            emitters[k].sheet = device::Sheet::default();
        }
        let plain = [
            side_by_side(Drive::OwnCurrent(Freedom::LeastPower)),
            side_by_side(Drive::CommonCurrent(None)),
            series(),
        ];
        for build in plain {
            let build = Build { conversions: conversions.clone(), ..build };
            let mut driven = emitters.clone();
            driven[1].sheet = driven[0].sheet.clone();
            driven[2].sheet = driven[0].sheet.clone();
            let lumens = level_for(&driven, &build, &shares, load);
            let level = Level::LuminousExitance(lumens);
            let recipe = build.recipe(&emitters, &shares, level).unwrap();
            check_recipe(&recipe, &shares, lumens)?;
            check_identity(&build, &emitters, &recipe, level)?;
            let [pump, inner, outer, _] = &recipe.emitters[..] else { panic!("four emitters") };
            prop_assert_eq!(inner.converted_by.as_deref(), Some("Invented 0"));
            prop_assert!(inner.eqe.is_none() && inner.current_density_ma_per_cm2.is_none() && inner.voltage_v.is_none());
            prop_assert!(near(inner.optical_depth.unwrap(), 0.2 * inner.loading_percent.unwrap()));
            prop_assert!(pump.converted_by.is_none());
            // Photons out of pump and converters together never exceed the pump's EQE times its electrons.
            let current = pump.current_density_ma_per_cm2.unwrap();
            let full = Characteristic::of(&emitters[0]).unwrap().eqe(current);
            let photons = |e: &device::RecipeEmitter| {
                e.radiant_exitance_w_per_m2.unwrap() / watts_per_photon_current(e.mean_wavelength_nm)
            };
            let out = photons(pump) + photons(inner) + photons(outer);
            prop_assert!(out <= current * full * (1.0 + 1e-9), "{out} of {}", current * full);
            prop_assert!(pump.eqe.unwrap() < full);
        }
    }

    #[test]
    fn currents_may_be_held_instead_of_areas(seed in any::<u64>(), count in 3usize..=8) {
        let mut dice = Dice::new(seed);
        let emitters = random_set(&mut dice, count);
        let shares = random_shares(&mut dice, count);
        let build = side_by_side(Drive::OwnCurrent(Freedom::LeastPower));
        let lumens = level_for(&emitters, &build, &shares, 0.5);
        let level = Level::LuminousExitance(lumens);
        let made = build.recipe(&emitters, &shares, level).unwrap().made.unwrap();
        let (FormSettings::SideBySide(form), Quantities::SideBySide(stripes)) = (&build.form, &made.quantities) else {
            panic!("stripes were asked for");
        };
        let driven: Vec<usize> = (0..count).collect();
        let held = Build { form: FormSettings::SideBySide(form.holding_currents(stripes, &driven)), ..Build::default() };
        let again = held.recipe(&emitters, &shares, level).unwrap().made.unwrap();
        let Quantities::SideBySide(found) = again.quantities else { panic!("stripes were asked for") };
        prop_assert!(matches!(found.currents, StripeCurrents::Own(_)));
        for (a, b) in stripes.areas.iter().zip(&found.areas) {
            prop_assert!(near(*a, *b));
        }
    }
}
