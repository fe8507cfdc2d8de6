//! What recipes say: holds, masks, stacks, strings, partial sheets, bands.
#![allow(clippy::unwrap_used, reason = "a test fails by panicking")]

mod support;

use support::zone;

use device::bands::FURTHEST_FACTOR;
use device::conversion::{Conversion, Converter};
use device::curve::Table;
use device::light::{delta_uv_prime, u_prime_v_prime};
use device::packages::{Packages, StringRule};
use device::recipe::Details;
use device::series_stack::{SeriesStack, StackUnit, Tuning};
use device::sheet::{EqeModel, TemperatureCoefficients, VoltageModel};
use device::side_by_side::{Drive, Freedom, SideBySide, StripeHold, StripeLayout};
use device::{
    Build, Characteristic, DeviceEmitter, DeviceError, FormSettings, Level, Made, Quantities, QuantityKind,
    Sheet,
};
use support::{
    Dice, check, emitter, gaussian_light, random_light, random_package, random_set, random_shares,
};

fn side_by_side(settings: SideBySide) -> Build {
    Build { form: FormSettings::SideBySide(settings), ..Build::default() }
}

fn stack(settings: SeriesStack) -> Build {
    Build { form: FormSettings::SeriesStack(settings), ..Build::default() }
}

fn packages(settings: Packages) -> Build {
    Build { form: FormSettings::Packages(settings), ..Build::default() }
}

fn white(emitters: &[DeviceEmitter], shares: &[f64]) -> Option<(f64, f64)> {
    u_prime_v_prime(emitters.iter().map(|e| &e.light), shares)
}

fn package_set(dice: &mut Dice) -> Vec<DeviceEmitter> {
    [(450.0, 465.0), (520.0, 550.0), (610.0, 635.0)]
        .iter()
        .map(|&(low, high)| {
            let light = random_light(dice, low, high);
            let sheet = random_package(dice, light);
            emitter("Invented package", light, sheet)
        })
        .collect()
}

#[test]
fn parallel_stripes_mostly_have_a_voltage_in_common() {
    // Guards the round-trip property of common voltages against passing on refusals alone.
    let build = side_by_side(SideBySide { drive: Drive::CommonVoltage(None), ..SideBySide::default() });
    let made = (0..40)
        .filter(|&seed| {
            let mut dice = Dice::new(seed);
            let emitters = random_set(&mut dice, 4);
            let shares = random_shares(&mut dice, 4);
            build.recipe(&emitters, &shares, Level::LuminousExitance(300.0)).is_ok()
        })
        .count();
    assert!(made >= 20, "{made} of 40");
}

#[test]
fn a_held_area_is_kept_and_the_rest_is_spent_around_it() {
    let mut dice = Dice::new(3);
    let emitters = random_set(&mut dice, 3);
    let shares = random_shares(&mut dice, 3);
    let level = Level::LuminousExitance(1500.0);
    let free = side_by_side(SideBySide::default()).recipe(&emitters, &shares, level).unwrap();
    let share = 0.8 * free.emitters[0].area_share.unwrap();
    let holds = vec![StripeHold::Area { emitter: 0, share }];
    let held = side_by_side(SideBySide { holds, ..SideBySide::default() });
    let recipe = held.recipe(&emitters, &shares, level).unwrap();
    check(recipe.emitters[0].area_share.unwrap(), share, 1e-12);
    assert!(recipe.delta_uv_prime.unwrap() < 1e-9, "the white is brought back by the other numbers");
    assert!(
        recipe.electrical_power_w_per_m2.unwrap() >= free.electrical_power_w_per_m2.unwrap() * (1.0 - 1e-9)
    );
}

#[test]
fn stripes_have_widths_on_the_pitch_and_none_below_the_mask() {
    let mut dice = Dice::new(4);
    let emitters = random_set(&mut dice, 3);
    let shares = [0.05, 0.35, 0.6];
    let layout = StripeLayout { pitch_um: 600.0, gap_um: 25.0, minimum_um: 60.0 };
    let build = side_by_side(SideBySide { fill: Some(0.9), layout: Some(layout), ..SideBySide::default() });
    let recipe = build.recipe(&emitters, &shares, Level::LuminousExitance(1500.0)).unwrap();
    let Some(Details::SideBySide { stripe_width_um: Some(widths), lit_area_share, .. }) = &recipe.details
    else {
        panic!("stripes with a layout have widths");
    };
    assert!(widths.iter().all(|width| *width >= 60.0 * (1.0 - 1e-9)), "{widths:?}");
    assert!(
        widths.iter().sum::<f64>() + 3.0 * 25.0 <= 600.0 * (1.0 + 1e-9),
        "stripes and gaps fit the pitch"
    );
    check(*lit_area_share, widths.iter().sum::<f64>() / 600.0, 1e-12);
    assert!(recipe.delta_uv_prime.unwrap() < 1e-9);
}

#[test]
fn a_stripe_the_mask_cannot_make_is_named_with_the_pitch_that_would_do() {
    let mut dice = Dice::new(4);
    let emitters = random_set(&mut dice, 3);
    let layout = StripeLayout { pitch_um: 300.0, gap_um: 0.0, minimum_um: 40.0 };
    let drive = Drive::CommonCurrent(None);
    let build = side_by_side(SideBySide { layout: Some(layout), drive, ..SideBySide::default() });
    let recipe = build.recipe(&emitters, &[0.02, 0.38, 0.6], Level::LuminousExitance(1500.0)).unwrap();
    let narrow = recipe.notices.iter().any(|n| n.contains("Invented 0") && n.contains("pitch of at least"));
    assert!(narrow, "{:?}", recipe.notices);
}

#[test]
fn too_much_light_is_refused_with_the_area_it_would_take() {
    let mut dice = Dice::new(9);
    let emitters = random_set(&mut dice, 3);
    let shares = random_shares(&mut dice, 3);
    for drive in [
        Drive::OwnCurrent(Freedom::LeastPower),
        Drive::OwnCurrent(Freedom::EqualCurrent),
        Drive::CommonCurrent(None),
    ] {
        let build = side_by_side(SideBySide { drive, ..SideBySide::default() });
        let error = build.recipe(&emitters, &shares, Level::LuminousExitance(1e7)).unwrap_err();
        assert!(error.to_string().contains("less light"), "{error}");
    }
}

#[test]
fn whole_repeats_give_the_closest_white_of_all_small_stacks() {
    for seed in 0..20 {
        let mut dice = Dice::new(100 + seed);
        let emitters = random_set(&mut dice, 3);
        let shares = random_shares(&mut dice, 3);
        let current = 5.0;
        let build = stack(SeriesStack {
            tuning: Tuning::AsMeasured,
            most_units: Some(7),
            current_ma_per_cm2: Some(current),
            ..SeriesStack::default()
        });
        let recipe = build.recipe(&emitters, &shares, Level::LuminousExitance(1000.0)).unwrap();
        let found = recipe.delta_uv_prime.unwrap();
        let target = white(&emitters, &shares);
        let each: Vec<f64> = emitters
            .iter()
            .map(|e| Characteristic::of(e).unwrap().eqe(current) * e.light.watts_per_photon_current())
            .collect();
        let mut best = f64::INFINITY;
        for a in 1..=5u32 {
            for b in 1..=6 - a {
                for c in 1..=7 - a - b {
                    let watts: Vec<f64> =
                        [a, b, c].iter().zip(&each).map(|(n, each)| f64::from(*n) * each).collect();
                    best = best.min(delta_uv_prime(white(&emitters, &watts), target));
                }
            }
        }
        check(found, best, 1e-12);
    }
}

#[test]
fn a_stack_with_too_little_eqe_says_which_unit_lacks_what() {
    let sheet = |eqe: f64| Sheet {
        eqe: Some(EqeModel::Table(Table::new(vec![(0.1, eqe), (20.0, eqe)]))),
        voltage: Some(VoltageModel::Table(Table::new(vec![(0.1, 2.5), (20.0, 4.0)]))),
        ..Sheet::default()
    };
    let emitters = [
        emitter("Kingfisher blue", gaussian_light(455.0, 25.0), sheet(0.05)),
        emitter("Rowan red", gaussian_light(612.0, 80.0), sheet(0.20)),
    ];
    let held = SeriesStack { current_ma_per_cm2: Some(2.0), ..SeriesStack::default() };
    let recipe = stack(held).recipe(&emitters, &[0.5, 0.5], Level::LuminousExitance(1500.0)).unwrap();
    assert!(recipe.notices.iter().any(|n| n.contains("Kingfisher blue lacks EQE")), "{:?}", recipe.notices);
    let Some(Details::SeriesStack { units, .. }) = &recipe.details else { panic!("a stack has units") };
    let blue = &units[0];
    check(blue.lacking_eqe.unwrap(), blue.needed_eqe - 0.05, 1e-12);
    let enough = blue.repeats_needed.unwrap();
    assert!(f64::from(enough) * 0.05 >= blue.needed_eqe && f64::from(enough - 1) * 0.05 < blue.needed_eqe);
    // With those repeats nothing is lacking.
    let units = vec![StackUnit { emitter: 0, repeats: enough }];
    let repeated = SeriesStack { units, current_ma_per_cm2: Some(2.0), ..SeriesStack::default() };
    let recipe = stack(repeated).recipe(&emitters, &[0.5, 0.5], Level::LuminousExitance(1500.0)).unwrap();
    assert!(recipe.notices.is_empty(), "{:?}", recipe.notices);
}

#[test]
fn voltages_of_a_stack_add_up() {
    let mut dice = Dice::new(21);
    let emitters = random_set(&mut dice, 3);
    let settings = SeriesStack {
        units: vec![StackUnit { emitter: 1, repeats: 2 }],
        junction_drop_v: Some(0.1),
        ..SeriesStack::default()
    };
    let shares = random_shares(&mut dice, 3);
    let recipe = stack(settings).recipe(&emitters, &shares, Level::LuminousExitance(1000.0)).unwrap();
    let Some(Details::SeriesStack { total_voltage_v, current_density_ma_per_cm2: j, units, .. }) =
        &recipe.details
    else {
        panic!("a stack has units")
    };
    let volts = |k: usize| Characteristic::of(&emitters[k]).unwrap().voltage(*j);
    check(total_voltage_v.unwrap(), volts(0) + 2.0 * volts(1) + volts(2) + 3.0 * 0.1, 1e-9);
    assert_eq!(units[0].name, "Invented 1", "listed units come first, from the substrate up");
    check(recipe.emitters[1].voltage_v.unwrap(), 2.0 * volts(1), 1e-12);
}

#[test]
fn dimming_by_amplitude_moves_the_white_of_unequal_roll_off_and_pulse_width_does_not() {
    let steep = Sheet {
        eqe: Some(EqeModel::Table(Table::new(vec![(0.05, 0.2), (1.0, 0.18), (20.0, 0.10)]))),
        voltage: Some(VoltageModel::Table(Table::new(vec![(0.05, 2.5), (20.0, 4.0)]))),
        ..Sheet::default()
    };
    let flat =
        Sheet { eqe: Some(EqeModel::Table(Table::new(vec![(0.05, 0.2), (20.0, 0.2)]))), ..steep.clone() };
    let set = |first: &Sheet| {
        vec![
            emitter("blue", gaussian_light(455.0, 25.0), first.clone()),
            emitter("green", gaussian_light(530.0, 60.0), flat.clone()),
            emitter("red", gaussian_light(612.0, 80.0), flat.clone()),
        ]
    };
    let build = stack(SeriesStack::default());
    let drift = |emitters: &[DeviceEmitter]| {
        let recipe = build.recipe(emitters, &[0.171, 0.307, 0.522], Level::LuminousExitance(4000.0)).unwrap();
        build.dimming(emitters, &recipe.made.unwrap(), &[1.0, 0.5, 0.1]).unwrap()
    };
    let unequal = drift(&set(&steep));
    check(unequal[0].amplitude_delta_uv_prime, 0.0, 1e-12);
    assert!(unequal[2].amplitude_delta_uv_prime > unequal[1].amplitude_delta_uv_prime);
    assert!(unequal[1].amplitude_delta_uv_prime > 1e-3);
    let equal = drift(&set(&flat));
    for step in &equal {
        check(step.amplitude_delta_uv_prime, 0.0, 1e-9);
        // Equal EQE at every current, but the voltage falls: dimming by amplitude saves power.
        assert!(step.efficacy_ratio.unwrap() >= 1.0 - 1e-9);
    }
    assert!(unequal.iter().all(|step| step.pulse_width_delta_uv_prime < 1e-12));
}

#[test]
fn untrimmed_packages_give_the_closest_white_of_all_counts() {
    for seed in 0..12 {
        let mut dice = Dice::new(300 + seed);
        let emitters = package_set(&mut dice);
        let shares = random_shares(&mut dice, 3);
        let flux = dice.between(20.0, 80.0);
        let build = packages(Packages { at_most: Some(16), untrimmed: true, ..Packages::default() });
        let target = white(&emitters, &shares);
        let each: Vec<f64> = emitters
            .iter()
            .map(|e| {
                Characteristic::of_package(e).unwrap().photon_current(65.0)
                    * e.light.watts_per_photon_current()
                    * 1e-4
            })
            .collect();
        let mut best = f64::INFINITY;
        for a in 1..=14u32 {
            for b in 1..=15 - a {
                for c in 1..=16 - a - b {
                    let watts: Vec<f64> =
                        [a, b, c].iter().zip(&each).map(|(n, each)| f64::from(*n) * each).collect();
                    let lumens: f64 =
                        watts.iter().zip(&emitters).map(|(w, e)| w * e.light.ler_lm_per_w).sum();
                    if lumens >= flux {
                        best = best.min(delta_uv_prime(white(&emitters, &watts), target));
                    }
                }
            }
        }
        match build.recipe(&emitters, &shares, Level::LuminousFlux(flux)) {
            Ok(recipe) => {
                check(recipe.delta_uv_prime.unwrap(), best, 1e-12);
                assert!(recipe.luminous_flux_lm.unwrap() >= flux * (1.0 - 1e-9));
            }
            Err(error) => assert!(best.is_infinite(), "{error}"),
        }
    }
}

#[test]
fn strings_stay_inside_the_drivers_window() {
    let mut dice = Dice::new(41);
    let emitters = package_set(&mut dice);
    let shares = [0.2, 0.35, 0.45];
    let rule = StringRule { lowest_v: 9.0, highest_v: 14.0, most_parallel: 4 };
    let build = packages(Packages { at_most: Some(40), strings: Some(rule), ..Packages::default() });
    let recipe = build.recipe(&emitters, &shares, Level::LuminousFlux(200.0)).unwrap();
    let Some(Details::Packages { packages, total_count }) = &recipe.details else {
        panic!("packages have counts")
    };
    assert_eq!(*total_count, packages.iter().map(|line| line.count).sum::<u32>());
    for line in packages {
        let volts = line.string_voltage_v.unwrap();
        assert!((9.0..=14.0).contains(&volts), "{volts} V");
        assert_eq!(line.strings.unwrap() * line.in_series.unwrap(), line.count);
        assert_eq!(line.bin.map(|bin| (bin.0 * 100.0).round()), Some(95.0));
    }
    assert!(recipe.delta_uv_prime.unwrap() < 1e-9, "trimmed currents meet the white exactly");
    let ler: f64 = emitters.iter().zip(&shares).map(|(e, s)| e.light.ler_lm_per_w * s).sum();
    let power = recipe.electrical_power_w.unwrap();
    check(recipe.luminous_flux_lm.unwrap(), ler * recipe.wall_plug.unwrap() * power, 1e-6);
}

#[test]
fn packages_reach_a_luminance_through_the_boards_area() {
    let mut dice = Dice::new(42);
    let emitters = package_set(&mut dice);
    let build = Build { area_m2: Some(0.01), ..packages(Packages::default()) };
    let recipe = build.recipe(&emitters, &[0.2, 0.35, 0.45], Level::Luminance(3000.0)).unwrap();
    check(recipe.luminance_cd_per_m2.unwrap(), 3000.0, 1e-6);
    check(recipe.luminous_flux_lm.unwrap(), 3000.0 * std::f64::consts::PI * 0.01, 1e-6);
    let without =
        packages(Packages::default()).recipe(&emitters, &[0.2, 0.35, 0.45], Level::Luminance(3000.0));
    assert!(without.unwrap_err().to_string().contains("area"));
}

#[test]
fn a_partial_sheet_still_gives_shares_and_says_what_is_missing() {
    let mut dice = Dice::new(50);
    let mut emitters = random_set(&mut dice, 3);
    emitters[1].sheet = Sheet::default();
    let shares = random_shares(&mut dice, 3);
    let recipe =
        side_by_side(SideBySide::default()).recipe(&emitters, &shares, Level::Luminance(1000.0)).unwrap();
    check(recipe.shares_radiant()[2], shares[2], 1e-12);
    check(recipe.luminance_cd_per_m2.unwrap(), 1000.0, 1e-9);
    assert!(recipe.emitters.iter().all(|e| e.area_share.is_none() && e.eqe.is_none()));
    assert!(
        recipe.missing[0].contains("Invented 1") && recipe.missing[0].contains("EQE"),
        "{:?}",
        recipe.missing
    );
    assert_eq!(recipe.efficacy_lm_per_w, None);
    // With a wall-plug efficiency each, and nothing else, lm/W is known.
    for emitter in &mut emitters {
        emitter.sheet = Sheet { wall_plug: Some(0.25), ..Sheet::default() };
    }
    let recipe =
        side_by_side(SideBySide::default()).recipe(&emitters, &shares, Level::Luminance(1000.0)).unwrap();
    let ler: f64 = emitters.iter().zip(&shares).map(|(e, s)| e.light.ler_lm_per_w * s).sum();
    check(recipe.efficacy_lm_per_w.unwrap(), 0.25 * ler, 1e-9);
}

#[test]
fn no_current_is_used_silently_beyond_its_table() {
    let mut dice = Dice::new(60);
    let emitters = random_set(&mut dice, 3);
    let shares = random_shares(&mut dice, 3);
    let at = |current: f64| {
        side_by_side(SideBySide { drive: Drive::CommonCurrent(Some(current)), ..SideBySide::default() })
            .recipe(&emitters, &shares, Level::LuminousExitance(500.0))
    };
    assert!(at(190.0).unwrap().notices.iter().all(|n| !n.contains("continues a table")));
    assert!(at(250.0).unwrap().notices.iter().any(|n| n.contains("continues a table")));
    assert!(matches!(at(400.0), Err(DeviceError::OutsideTable { .. })));
}

#[test]
fn temperature_coefficients_act_from_the_sheets_own_temperature() {
    let mut dice = Dice::new(61);
    let mut one = random_set(&mut dice, 1).remove(0);
    let cool = Characteristic::of(&one).unwrap().at(5.0).unwrap();
    one.temperature_c = Some(65.0);
    let said = Characteristic::of(&one).unwrap();
    assert!(said.missing().iter().any(|m| m.contains("temperature coefficients")));
    one.sheet.temperature = Some(TemperatureCoefficients {
        reference_c: Some(25.0),
        eqe_percent_per_k: Some(-0.2),
        voltage_mv_per_k: Some(-2.0),
        ..TemperatureCoefficients::default()
    });
    let hot = Characteristic::of(&one).unwrap().at(5.0).unwrap();
    check(hot.eqe.unwrap(), cool.eqe.unwrap() * 0.92, 1e-12);
    check(hot.voltage_v.unwrap(), cool.voltage_v.unwrap() - 0.08, 1e-12);
}

#[test]
fn a_sheet_survives_storage_and_later_fields() {
    let mut dice = Dice::new(70);
    let sheet = random_sheet_with_everything(&mut dice);
    let text = ron::to_string(&sheet).unwrap();
    assert_eq!(ron::from_str::<Sheet>(&text).unwrap(), sheet);
    assert_eq!(ron::from_str::<Sheet>("()").unwrap(), Sheet::default());
    let later = "(wall_plug: Some(0.3), a_field_of_a_later_version: 7)";
    assert_eq!(ron::from_str::<Sheet>(later).unwrap().wall_plug, Some(0.3));
    for form in ["side-by-side", "series-stack", "shared-zone", "packages"] {
        let build: Build = ron::from_str(&format!("(form: r#{form}(()))")).unwrap();
        assert_eq!(build.build_form().name(), form);
        assert_eq!(ron::from_str::<Build>(&ron::to_string(&build).unwrap()).unwrap(), build);
    }
}

fn random_sheet_with_everything(dice: &mut Dice) -> Sheet {
    let light = gaussian_light(530.0, 30.0);
    Sheet { package: random_package(dice, light).package, ..support::random_sheet(dice) }
}

/// A u′v′ circle round the white of a made device.
fn circle<'a>(
    emitters: &'a [DeviceEmitter],
    centre: (f64, f64),
    radius: f64,
) -> impl Fn(&[f64]) -> bool + 'a {
    move |shares| delta_uv_prime(white(emitters, shares), Some(centre)) <= radius
}

#[test]
fn bands_keep_the_white_inside_and_are_as_wide_as_that_allows() {
    let radius = 0.0033;
    for seed in 0..6 {
        let mut dice = Dice::new(400 + seed);
        let emitters = random_set(&mut dice, 3);
        let shares = random_shares(&mut dice, 3);
        let build = side_by_side(SideBySide::default());
        let recipe = build.recipe(&emitters, &shares, Level::LuminousExitance(1000.0)).unwrap();
        let (made, centre) = (recipe.made.unwrap(), (recipe.u_prime.unwrap(), recipe.v_prime.unwrap()));
        let inside = circle(&emitters, centre, radius);
        let found = build.bands(&emitters, &made, &inside).unwrap();
        assert!(found.every_corner && found.corners_checked == 64);
        let good =
            |made: &Made| build.predict(&emitters, made).is_ok_and(|recipe| inside(&recipe.shares_radiant()));
        for band in &found.bands {
            assert!(band.alone_low <= band.together_low && band.together_low < band.target);
            assert!(band.target < band.together_high && band.together_high <= band.alone_high);
            assert!(good(&made.with(band.quantity, band.alone_low)));
            assert!(good(&made.with(band.quantity, band.alone_high)));
            if !band.open_high {
                assert!(!good(&made.with(band.quantity, band.alone_high * (1.0 + 1e-6))), "{band:?}");
            }
            if !band.open_low {
                assert!(!good(&made.with(band.quantity, band.alone_low * (1.0 - 1e-6))), "{band:?}");
            }
        }
        // Every corner of the joint box, worked out apart, and points inside it.
        for mask in 0..1u32 << found.bands.len() {
            let corner = found.bands.iter().enumerate().fold(made.clone(), |made, (bit, band)| {
                let value = if mask >> bit & 1 == 1 { band.together_high } else { band.together_low };
                made.with(band.quantity, value)
            });
            assert!(good(&corner), "corner {mask}");
        }
        for _ in 0..100 {
            let point = found.bands.iter().fold(made.clone(), |made, band| {
                made.with(band.quantity, dice.between(band.together_low, band.together_high))
            });
            assert!(good(&point));
        }
    }
}

#[test]
fn many_numbers_are_checked_at_their_furthest_corners() {
    let mut dice = Dice::new(500);
    let emitters = random_set(&mut dice, 7);
    let shares = random_shares(&mut dice, 7);
    let build = side_by_side(SideBySide::default());
    let recipe = build.recipe(&emitters, &shares, Level::LuminousExitance(1000.0)).unwrap();
    let (made, centre) = (recipe.made.unwrap(), (recipe.u_prime.unwrap(), recipe.v_prime.unwrap()));
    let inside = circle(&emitters, centre, 0.0033);
    let found = build.bands(&emitters, &made, &inside).unwrap();
    assert!(!found.every_corner);
    for _ in 0..3000 {
        let corner = found.bands.iter().fold(made.clone(), |made, band| {
            let high = dice.between(0.0, 1.0) > 0.5;
            made.with(band.quantity, if high { band.together_high } else { band.together_low })
        });
        assert!(inside(&build.predict(&emitters, &corner).unwrap().shares_radiant()));
    }
}

#[test]
fn a_number_without_influence_has_an_open_band() {
    let mut dice = Dice::new(501);
    let emitters = random_set(&mut dice, 3);
    let build = stack(SeriesStack::default());
    let shares = random_shares(&mut dice, 3);
    let recipe = build.recipe(&emitters, &shares, Level::LuminousExitance(1000.0)).unwrap();
    let (made, centre) = (recipe.made.unwrap(), (recipe.u_prime.unwrap(), recipe.v_prime.unwrap()));
    let found = build.bands(&emitters, &made, circle(&emitters, centre, 0.002)).unwrap();
    let current = found.bands.iter().find(|b| b.quantity.kind == QuantityKind::CommonCurrentDensity).unwrap();
    assert!(current.open_low && current.open_high, "tuned EQEs fix the white at any current");
    check(current.alone_high, current.target * FURTHEST_FACTOR, 1e-9);
    let outside = build.bands(&emitters, &made, |_| false).unwrap_err();
    assert!(outside.to_string().contains("outside the region"));
}

#[test]
fn sensitivities_foretell_small_changes() {
    let mut dice = Dice::new(502);
    let emitters = random_set(&mut dice, 4);
    let shares = random_shares(&mut dice, 4);
    let build = side_by_side(SideBySide::default());
    let recipe = build.recipe(&emitters, &shares, Level::LuminousExitance(1000.0)).unwrap();
    let made = recipe.made.clone().unwrap();
    for s in build.sensitivities(&emitters, &made).unwrap() {
        let moved = build.predict(&emitters, &made.with(s.quantity, s.value * 1.001)).unwrap();
        let du = moved.u_prime.unwrap() - recipe.u_prime.unwrap();
        let dv = moved.v_prime.unwrap() - recipe.v_prime.unwrap();
        check(du, 0.1 * s.du_prime_per_percent, 2e-6);
        check(dv, 0.1 * s.dv_prime_per_percent, 2e-6);
        if s.quantity.kind == QuantityKind::AreaShare {
            // A wider stripe adds its own lumens and nothing else.
            let share = recipe.emitters[s.quantity.channel.unwrap()].share_luminous;
            check(s.flux_percent_per_percent.unwrap(), share, 1e-6);
        }
    }
}

#[test]
fn quantities_of_another_form_are_refused() {
    let mut dice = Dice::new(503);
    let emitters = random_set(&mut dice, 3);
    let shares = random_shares(&mut dice, 3);
    let made = side_by_side(SideBySide::default())
        .recipe(&emitters, &shares, Level::LuminousExitance(500.0))
        .unwrap()
        .made
        .unwrap();
    assert!(matches!(made.quantities, Quantities::SideBySide(_)));
    let error = stack(SeriesStack::default()).predict(&emitters, &made).unwrap_err();
    assert!(error.to_string().contains("side-by-side") && error.to_string().contains("series-stack"));
}

#[test]
fn unusable_input_is_an_error_and_never_a_panic() {
    let mut dice = Dice::new(504);
    let emitters = random_set(&mut dice, 3);
    let build = side_by_side(SideBySide::default());
    let level = Level::Luminance(1000.0);
    for shares in [vec![], vec![1.0], vec![0.0; 3], vec![f64::NAN, 0.5, 0.5], vec![-0.1, 0.6, 0.5]] {
        assert!(build.recipe(&emitters, &shares, level).is_err(), "{shares:?}");
    }
    for wanted in [0.0, -1.0, f64::NAN, f64::INFINITY] {
        assert!(build.recipe(&emitters, &[0.2, 0.3, 0.5], Level::Luminance(wanted)).is_err());
    }
    let mut bad = emitters.clone();
    bad[0].sheet.eqe = Some(EqeModel::Table(Table::new(vec![(1.0, 20.0), (10.0, 15.0)])));
    let error = build.recipe(&bad, &[0.2, 0.3, 0.5], level).unwrap_err();
    assert!(error.to_string().contains("per cent"), "{error}");
}

#[test]
fn a_dark_emitter_takes_no_area_no_current_and_no_unit() {
    let mut dice = Dice::new(600);
    let emitters = random_set(&mut dice, 3);
    let shares = [0.4, 0.0, 0.6];
    for build in [
        side_by_side(SideBySide::default()),
        side_by_side(SideBySide { drive: Drive::CommonCurrent(None), ..SideBySide::default() }),
        stack(SeriesStack::default()),
    ] {
        let recipe = build.recipe(&emitters, &shares, Level::LuminousExitance(800.0)).unwrap();
        check(recipe.delta_uv_prime.unwrap(), 0.0, 1e-9);
        let dark = &recipe.emitters[1];
        assert_eq!((dark.share_radiant, dark.eqe, dark.voltage_v), (0.0, None, None));
        assert_eq!(dark.area_share, Some(0.0));
        if let Some(Details::SeriesStack { units, .. }) = &recipe.details {
            assert_eq!(units.len(), 2);
        }
    }
}

#[test]
fn a_zone_without_efficiencies_still_gives_its_layers() {
    let mut dice = Dice::new(601);
    let mut emitters = random_set(&mut dice, 3);
    let (build, shares) = zone(&mut dice, &emitters);
    for emitter in &mut emitters {
        emitter.sheet = Sheet::default();
    }
    let recipe = build.recipe(&emitters, &shares, Level::Luminance(1000.0)).unwrap();
    for (found, wanted) in recipe.shares_radiant().iter().zip(&shares) {
        check(*found, *wanted, 1e-9);
    }
    check(recipe.luminance_cd_per_m2.unwrap(), 1000.0, 1e-6);
    assert_eq!(recipe.efficacy_lm_per_w, None);
    let Some(Details::SharedZone { layers, calibration_runs, .. }) = &recipe.details else {
        panic!("a zone has layers")
    };
    assert_eq!(calibration_runs.len(), 7);
    assert!(layers[1].concentration_percent.is_some() && layers[1].next_run.is_some());
    assert!(recipe.missing.iter().any(|m| m.contains("EQE")));
}

#[test]
fn a_white_outside_the_calibration_is_refused_with_the_run_to_make() {
    let mut dice = Dice::new(602);
    let emitters = random_set(&mut dice, 3);
    let (build, _) = zone(&mut dice, &emitters);
    let error =
        build.recipe(&emitters, &[0.97, 0.01, 0.02], Level::Luminance(500.0)).unwrap_err().to_string();
    assert!(error.contains("not extrapolated") && error.contains("next run"), "{error}");
}

#[test]
fn bands_of_concentrations_and_depths_hold_at_points_inside() {
    let mut dice = Dice::new(603);
    let emitters = random_set(&mut dice, 4);
    let (zone_build, zone_shares) = zone(&mut dice, &emitters);
    let layers = [(1, 0.5), (2, 0.4)].map(|(emitter, s)| Converter {
        emitter,
        quantum_yield: 0.9,
        relative_absorption: vec![(1, s)],
        ..Converter::default()
    });
    let conversions = vec![Conversion { pump: 0, layers: layers.to_vec() }];
    let converted = Build { conversions, ..side_by_side(SideBySide::default()) };
    for (build, shares) in [(zone_build, zone_shares), (converted, vec![0.2, 0.3, 0.3, 0.2])] {
        let recipe = build.recipe(&emitters, &shares, Level::LuminousExitance(600.0)).unwrap();
        let (made, centre) = (recipe.made.unwrap(), (recipe.u_prime.unwrap(), recipe.v_prime.unwrap()));
        let inside = circle(&emitters, centre, 0.0033);
        let found = build.bands(&emitters, &made, &inside).unwrap();
        assert!(found.bands.iter().any(|band| !band.open_high && band.together_high < band.alone_high));
        for _ in 0..300 {
            let point = found.bands.iter().fold(made.clone(), |made, band| {
                made.with(band.quantity, dice.between(band.together_low, band.together_high))
            });
            assert!(inside(&build.predict(&emitters, &point).unwrap().shares_radiant()));
        }
    }
}

#[test]
fn a_changed_number_that_is_locked_is_answered_by_the_others() {
    let mut dice = Dice::new(700);
    let emitters = random_set(&mut dice, 3);
    let shares = random_shares(&mut dice, 3);
    let level = Level::LuminousExitance(800.0);
    let (zone_build, zone_shares) = zone(&mut dice, &emitters);
    let common = Drive::CommonCurrent(None);
    let cases = [
        (side_by_side(SideBySide::default()), shares.clone(), QuantityKind::AreaShare),
        (side_by_side(SideBySide::default()), shares.clone(), QuantityKind::CurrentDensity),
        (
            side_by_side(SideBySide { drive: common, ..SideBySide::default() }),
            shares.clone(),
            QuantityKind::AreaShare,
        ),
        (stack(SeriesStack::default()), shares.clone(), QuantityKind::UnitEqe),
        (stack(SeriesStack::default()), shares.clone(), QuantityKind::CommonCurrentDensity),
        (zone_build, zone_shares, QuantityKind::Concentration),
    ];
    for (build, shares, kind) in cases {
        let made = build.recipe(&emitters, &shares, level).unwrap().made.unwrap();
        let last = |number: &&(device::Quantity, f64)| number.0.kind == kind;
        let numbers = made.numbers();
        let (quantity, value) = *numbers.iter().rev().find(last).unwrap();
        let changed = made.with(quantity, 0.985 * value);
        let back = build.bring_back(&emitters, &changed, &[quantity], &shares, level).unwrap();
        assert!(back.recipe.delta_uv_prime.unwrap() < 1e-9);
        check(back.recipe.luminous_exitance_lm_per_m2.unwrap(), 800.0, 1e-6);
        assert!(!back.changes.is_empty() && back.changes.iter().all(|change| change.quantity != quantity));
        // Applying the changes by hand gives the white back.
        let applied = back.changes.iter().fold(changed, |made, change| made.with(change.quantity, change.to));
        let predicted = build.predict(&emitters, &applied).unwrap();
        for (found, wanted) in predicted.shares_radiant().iter().zip(&shares) {
            check(*found, *wanted, 1e-9);
        }
    }
}

#[test]
fn a_locked_depth_cannot_be_answered_by_anything_else() {
    let mut dice = Dice::new(701);
    let emitters = random_set(&mut dice, 3);
    let layers = vec![Converter { emitter: 1, quantum_yield: 0.9, ..Converter::default() }];
    let conversions = vec![Conversion { pump: 0, layers }];
    let build = Build { conversions, ..side_by_side(SideBySide::default()) };
    let shares = [0.2, 0.3, 0.5];
    let level = Level::LuminousExitance(800.0);
    let made = build.recipe(&emitters, &shares, level).unwrap().made.unwrap();
    let is_depth = |number: &&(device::Quantity, f64)| number.0.kind == QuantityKind::OpticalDepth;
    let numbers = made.numbers();
    let (quantity, depth) = *numbers.iter().find(is_depth).unwrap();
    let error = build.bring_back(&emitters, &made.with(quantity, 1.1 * depth), &[quantity], &shares, level);
    assert!(error.unwrap_err().to_string().contains("optical depth"));
}
