//! Device power as an objective: against brute force over currents, and its bounds against its own optimum.

#![allow(clippy::unwrap_used, reason = "a test fails by panicking")]

mod support;

use device::curve::Table;
use device::packages::Packages;
use device::power::PowerModel;
use device::series_stack::{SeriesStack, StackUnit};
use device::shared_zone::SharedZone;
use device::sheet::{EqeModel, VoltageModel};
use device::side_by_side::{Drive, Freedom, SideBySide};
use device::{Build, Characteristic, DeviceEmitter, FormSettings, Level, Sheet};
use support::{Dice, emitter, random_light, random_package, random_set, random_shares, random_sheet};

/// Random sheets tried for each form.
const CASES: u64 = 60;
/// Never worse than brute force by more than this.
const ALLOWED: f64 = 1e-3;

fn characteristics(emitters: &[DeviceEmitter]) -> Vec<Characteristic> {
    emitters.iter().map(|emitter| Characteristic::of(emitter).unwrap()).collect()
}

/// Photon currents (mA/cm² of panel) of radiant exitances.
fn demands(emitters: &[DeviceEmitter], radiant: &[f64]) -> Vec<f64> {
    emitters.iter().zip(radiant).map(|(e, watts)| watts / e.light.watts_per_photon_current()).collect()
}

fn log_scan(low: f64, high: f64, count: usize) -> impl Iterator<Item = f64> {
    (0..=count).map(move |k| (low * (high / low).powf(k as f64 / count as f64)).clamp(low, high))
}

fn common_range(all: &[Characteristic]) -> (f64, f64) {
    all.iter().fold((0.0, f64::INFINITY), |(low, high), c| (low.max(c.range().0), high.min(c.range().1)))
}

struct Case {
    emitters: Vec<DeviceEmitter>,
    radiant: Vec<f64>,
    level: Level,
    shares: Vec<f64>,
}

/// A set whose blend needs `load` of the light that the whole fill gives at a middling current.
fn case(dice: &mut Dice, build: &Build, count: usize, load: f64) -> Case {
    let emitters = random_set(dice, count);
    let shares = random_shares(dice, count);
    let unit = build.radiant_powers(&emitters, &shares, Level::LuminousExitance(1.0)).unwrap();
    let area: f64 = emitters
        .iter()
        .zip(demands(&emitters, &unit))
        .map(|(e, d)| d / Characteristic::of(e).unwrap().photon_current(8.0))
        .sum();
    let level = Level::LuminousExitance(load * 0.75 / area);
    let radiant = build.radiant_powers(&emitters, &shares, level).unwrap();
    Case { emitters, radiant, level, shares }
}

fn side_by_side(drive: Drive) -> Build {
    Build {
        form: FormSettings::SideBySide(SideBySide { drive, ..SideBySide::default() }),
        ..Build::default()
    }
}

/// Compares with the brute-force value, and the bound of the cells with both.
#[track_caller]
fn compare(build: &Build, case: &Case, brute: Option<f64>, pieces: usize, slack: f64) {
    let least = build.least_power(&case.emitters, &case.shares, case.level);
    let (Some(brute), Ok(least)) = (brute, &least) else {
        assert!(brute.is_none(), "brute force found {brute:?}, the model says {least:?}");
        return;
    };
    assert!(least.watts <= brute * (1.0 + ALLOWED), "{} is worse than {brute}", least.watts);
    let model = build.power_model(&case.emitters).unwrap();
    let cells = model.cells(pieces);
    let bound = PowerModel::lower_bound(&cells, &case.radiant).unwrap();
    assert!(bound <= least.watts * (1.0 + 1e-9), "the bound {bound} lies above the optimum {}", least.watts);
    assert!(bound >= least.watts * (1.0 - slack), "the bound {bound} is far below {}", least.watts);
}

/// Own currents by brute force: every pair of scanned currents for two emitters, the best for the third on
/// the area that is left.
fn brute_own(case: &Case, fill: f64) -> Option<f64> {
    let all = characteristics(&case.emitters);
    let wanted = demands(&case.emitters, &case.radiant);
    let tables: Vec<Vec<(f64, f64)>> = all
        .iter()
        .zip(&wanted)
        .map(|(c, d)| {
            log_scan(c.range().0, c.range().1, 400)
                .map(|j| (d / c.photon_current(j), 10.0 * d * c.voltage(j) / c.eqe(j)))
                .collect()
        })
        .collect();
    // Cheapest third emitter within an area: sorted by area, running minimum of cost.
    let mut third = tables[2].clone();
    third.sort_by(|a, b| a.0.total_cmp(&b.0));
    for k in 1..third.len() {
        third[k].1 = third[k].1.min(third[k - 1].1);
    }
    let mut best: Option<f64> = None;
    for first in &tables[0] {
        for second in &tables[1] {
            let left = fill - first.0 - second.0;
            let within = third.partition_point(|point| point.0 <= left);
            if within > 0 {
                let watts = first.1 + second.1 + third[within - 1].1;
                best = Some(best.map_or(watts, |best: f64| best.min(watts)));
            }
        }
    }
    best
}

#[test]
fn own_currents_are_never_worse_than_a_fine_scan() {
    let build = side_by_side(Drive::OwnCurrent(Freedom::LeastPower));
    for seed in 1..=CASES {
        let mut dice = Dice::new(seed);
        let load = dice.between(0.15, 2.5);
        let case = case(&mut dice, &build, 3, load);
        let brute = brute_own(&case, 0.75);
        compare(&build, &case, brute, 60, 0.02);
    }
}

/// Voltage and EQE jump within a fifth of the current, twice: cost against area is far from convex.
fn jumpy_sheet(dice: &mut Dice) -> Sheet {
    let mut eqe = vec![(0.05, dice.between(0.15, 0.25))];
    let mut voltage = vec![(0.05, dice.between(2.4, 3.0))];
    let mut at = 0.05;
    for _ in 0..2 {
        at *= dice.between(4.0, 15.0);
        let (level, volts) = (eqe[eqe.len() - 1].1, voltage[voltage.len() - 1].1);
        eqe.extend([(at, 0.995 * level), (1.2 * at, level * dice.between(0.84, 0.9))]);
        voltage.extend([(at, volts + 0.05), (1.2 * at, volts * dice.between(1.2, 1.8))]);
        at *= 1.2;
    }
    let (level, volts) = (eqe[eqe.len() - 1].1, voltage[voltage.len() - 1].1);
    eqe.push((200.0, 0.9 * level));
    voltage.push((200.0, volts + 0.3));
    Sheet {
        eqe: Some(EqeModel::Table(Table::new(eqe))),
        voltage: Some(VoltageModel::Table(Table::new(voltage))),
        ..Sheet::default()
    }
}

#[test]
fn own_currents_on_jumping_sheets_are_never_worse_than_a_fine_scan() {
    let build = side_by_side(Drive::OwnCurrent(Freedom::LeastPower));
    for seed in 1..=CASES {
        let mut dice = Dice::new(7000 + seed);
        let load = dice.between(0.1, 2.0);
        let mut case = case(&mut dice, &build, 3, load);
        for emitter in &mut case.emitters {
            emitter.sheet = jumpy_sheet(&mut dice);
        }
        let brute = brute_own(&case, 0.75);
        // Prices alone cannot close the gap of such curves: the bound may lie well below.
        compare(&build, &case, brute, 60, 0.3);
    }
}

#[test]
fn one_common_current_is_never_worse_than_a_fine_scan() {
    let build = side_by_side(Drive::CommonCurrent(None));
    for seed in 1..=CASES {
        let mut dice = Dice::new(1000 + seed);
        let count = dice.whole(3, 6) as usize;
        let load = dice.between(0.15, 2.5);
        let case = case(&mut dice, &build, count, load);
        let all = characteristics(&case.emitters);
        let wanted = demands(&case.emitters, &case.radiant);
        let (low, high) = common_range(&all);
        let brute = log_scan(low, high, 20_000)
            .filter(|&j| all.iter().zip(&wanted).map(|(c, d)| d / c.photon_current(j)).sum::<f64>() <= 0.75)
            .map(|j| all.iter().zip(&wanted).map(|(c, d)| 10.0 * d * c.voltage(j) / c.eqe(j)).sum::<f64>())
            .min_by(f64::total_cmp);
        compare(&build, &case, brute, 2000, 0.01);
    }
}

#[test]
fn one_common_voltage_is_never_worse_than_a_fine_scan() {
    let build = side_by_side(Drive::CommonVoltage(None));
    for seed in 1..=CASES {
        let mut dice = Dice::new(2000 + seed);
        let load = dice.between(0.15, 1.5);
        let case = case(&mut dice, &build, 3, load);
        let all = characteristics(&case.emitters);
        let wanted = demands(&case.emitters, &case.radiant);
        let low = all.iter().map(|c| c.voltage(c.range().0)).fold(0.0, f64::max);
        let high = all.iter().map(|c| c.voltage(c.range().1)).fold(f64::INFINITY, f64::min);
        let brute = (low < high)
            .then(|| {
                log_scan(low, high, 4000)
                    .filter_map(|volts| {
                        let (mut area, mut watts) = (0.0, 0.0);
                        for (c, d) in all.iter().zip(&wanted) {
                            let j = c.current_at_voltage(volts);
                            area += d / c.photon_current(j);
                            watts += 10.0 * d * volts / c.eqe(j);
                        }
                        (area <= 0.75).then_some(watts)
                    })
                    .min_by(f64::total_cmp)
            })
            .flatten();
        compare(&build, &case, brute, 2000, 0.01);
    }
}

#[test]
fn a_series_stack_is_never_worse_than_a_fine_scan() {
    for seed in 1..=CASES {
        let mut dice = Dice::new(3000 + seed);
        let count = dice.whole(3, 5) as usize;
        let repeats: Vec<u32> = (0..count).map(|_| dice.whole(1, 2)).collect();
        let units =
            repeats.iter().enumerate().map(|(emitter, &repeats)| StackUnit { emitter, repeats }).collect();
        let stack = SeriesStack { units, junction_drop_v: Some(0.05), ..SeriesStack::default() };
        let build = Build { form: FormSettings::SeriesStack(stack), ..Build::default() };
        let load = dice.between(0.5, 8.0);
        let case = case(&mut dice, &build, count, load);
        let all = characteristics(&case.emitters);
        let wanted = demands(&case.emitters, &case.radiant);
        let (low, high) = common_range(&all);
        let junctions = 0.05 * f64::from(repeats.iter().sum::<u32>() - 1);
        let brute = log_scan(low, high, 20_000)
            .filter(|&j| {
                all.iter()
                    .zip(&wanted)
                    .zip(&repeats)
                    .all(|((c, d), r)| *d <= f64::from(*r) * c.photon_current(j))
            })
            .map(|j| {
                let volts: f64 = all.iter().zip(&repeats).map(|(c, r)| f64::from(*r) * c.voltage(j)).sum();
                10.0 * j * (volts + junctions)
            })
            .min_by(f64::total_cmp);
        compare(&build, &case, brute, 2000, 0.02);
    }
}

#[test]
fn a_shared_zone_is_never_worse_than_a_fine_scan() {
    let build = Build { form: FormSettings::SharedZone(SharedZone::default()), ..Build::default() };
    for seed in 1..=CASES {
        let mut dice = Dice::new(4000 + seed);
        let count = dice.whole(3, 6) as usize;
        let load = dice.between(0.2, 4.0);
        let case = case(&mut dice, &build, count, load);
        let all = characteristics(&case.emitters);
        let wanted = demands(&case.emitters, &case.radiant);
        let (low, high) = common_range(&all);
        let brute = log_scan(low, high, 20_000)
            .filter(|&j| all.iter().zip(&wanted).map(|(c, d)| d / c.eqe(j)).sum::<f64>() <= j)
            .map(|j| 10.0 * j * all.iter().map(|c| c.voltage(j)).fold(0.0, f64::max))
            .min_by(f64::total_cmp);
        // The cell takes the lowest voltage of all emitters, the zone the highest: a looser bound.
        compare(&build, &case, brute, 1000, 0.6);
    }
}

#[test]
fn whole_packages_are_never_worse_than_every_combination() {
    for seed in 1..=CASES {
        let mut dice = Dice::new(5000 + seed);
        let at_most = dice.whole(9, 18);
        let packages = Packages { at_most: Some(at_most), ..Packages::default() };
        let build = Build { form: FormSettings::Packages(packages), ..Build::default() };
        let emitters: Vec<DeviceEmitter> = [(450.0, 470.0), (520.0, 560.0), (610.0, 640.0)]
            .iter()
            .map(|&(low, high)| {
                let light = random_light(&mut dice, low, high);
                let sheet = random_package(&mut dice, light);
                emitter("Invented package", light, sheet)
            })
            .collect();
        let shares = random_shares(&mut dice, 3);
        let level = Level::LuminousFlux(dice.between(20.0, 120.0));
        let radiant = build.radiant_powers(&emitters, &shares, level).unwrap();
        let all: Vec<Characteristic> =
            emitters.iter().map(|e| Characteristic::of_package(e).unwrap()).collect();
        // Photon current in mA: ten thousand times less than per cm² over a m².
        let wanted: Vec<f64> = demands(&emitters, &radiant).iter().map(|d| d * 1e4).collect();
        let watts = |k: usize, n: u32| {
            let current = all[k].current_for(wanted[k] / f64::from(n))?;
            Some(f64::from(n) * current * 1e-3 * all[k].voltage(current))
        };
        let mut brute: Option<f64> = None;
        for a in 1..=at_most {
            for b in 1..=at_most - a {
                for c in 1..=at_most - a - b {
                    if let (Some(a), Some(b), Some(c)) = (watts(0, a), watts(1, b), watts(2, c)) {
                        brute = Some(brute.map_or(a + b + c, |best: f64| best.min(a + b + c)));
                    }
                }
            }
        }
        let found = build.least_power(&emitters, &shares, level);
        match (brute, found) {
            (Some(brute), Ok(found)) => {
                assert!(found.watts <= brute * (1.0 + 1e-9), "{} {brute}", found.watts);
                // The relaxation to real counts lies below.
                let cells = build.power_model(&emitters).unwrap().cells(60);
                let bound = PowerModel::lower_bound(&cells, &radiant).unwrap();
                assert!(bound <= found.watts * (1.0 + 1e-9));
            }
            (None, Err(_)) => {}
            (brute, found) => panic!("brute force {brute:?}, found {found:?}"),
        }
    }
}

#[test]
fn no_blend_at_all_costs_less_than_the_bound() {
    // The cells bound every blend of the set, not only the one they were made beside.
    for (seed, drive) in [
        (1, Drive::OwnCurrent(Freedom::LeastPower)),
        (2, Drive::CommonCurrent(None)),
        (3, Drive::CommonVoltage(None)),
    ] {
        let build = side_by_side(drive);
        let mut dice = Dice::new(6000 + seed);
        let case = case(&mut dice, &build, 4, 0.6);
        let model = build.power_model(&case.emitters).unwrap();
        let cells = model.cells(100);
        let mut compared = 0;
        for _ in 0..200 {
            let shares = random_shares(&mut dice, 4);
            let radiant = build.radiant_powers(&case.emitters, &shares, case.level).unwrap();
            let Ok(least) = model.least_power(&radiant) else { continue };
            let bound = PowerModel::lower_bound(&cells, &radiant).unwrap();
            assert!(bound <= least.watts * (1.0 + 1e-9));
            compared += 1;
        }
        assert!(compared > 50, "only {compared} blends could be made");
    }
}

#[test]
fn splitting_a_cell_never_lowers_its_bound() {
    let build = side_by_side(Drive::CommonCurrent(None));
    let mut dice = Dice::new(77);
    let case = case(&mut dice, &build, 3, 0.5);
    let model = build.power_model(&case.emitters).unwrap();
    let mut cells = model.cells(4);
    let mut last = PowerModel::lower_bound(&cells, &case.radiant).unwrap();
    for _ in 0..6 {
        cells = cells.iter().flat_map(|cell| model.split(cell)).collect();
        let bound = PowerModel::lower_bound(&cells, &case.radiant).unwrap();
        assert!(bound >= last * (1.0 - 1e-12));
        last = bound;
    }
    let exact = model.least_power(&case.radiant).unwrap().watts;
    assert!(last > 0.9 * exact && last <= exact);
}

#[test]
fn an_emitter_without_voltage_is_named() {
    let build = side_by_side(Drive::OwnCurrent(Freedom::LeastPower));
    let mut dice = Dice::new(5);
    let mut emitters = random_set(&mut dice, 3);
    emitters[1].sheet = random_sheet(&mut dice);
    emitters[1].sheet.voltage = None;
    let error = build.power_model(&emitters).unwrap_err().to_string();
    assert!(error.contains("Invented 1") && error.contains("voltage"), "{error}");
}
