//! Best lm/W over blends and currents together, against brute force over both.
#![allow(clippy::unwrap_used, reason = "a test fails by panicking")]

mod support;

use device::curve::Table;
use device::efficacy::{BlendSolver, Effort, Question, Reply, best_efficacy};
use device::power::PowerModel;
use device::series_stack::SeriesStack;
use device::shared_zone::SharedZone;
use device::sheet::{EqeModel, VoltageModel};
use device::side_by_side::{Drive, Freedom, SideBySide};
use device::{Build, DeviceEmitter, FormSettings, Sheet};
use nalgebra::{DMatrix, DVector};
use support::{Dice, emitter, gaussian_light, random_sheet};

/// An exact linear solver for small sets at one white: looks at every vertex.
struct Vertices {
    xyz: Vec<[f64; 3]>,
    ler: Vec<f64>,
    white: [f64; 3],
}

impl Vertices {
    fn solve(&self, costs: &[f64], rows: &[(Vec<f64>, f64)]) -> Option<(Vec<f64>, f64)> {
        let (count, extra) = (self.xyz.len(), rows.len());
        let (equations, unknowns) = (3 + extra, count + extra);
        let mut best: Option<(Vec<f64>, f64)> = None;
        for mask in 0u32..1 << unknowns {
            if mask.count_ones() as usize != equations {
                continue;
            }
            let basis: Vec<usize> = (0..unknowns).filter(|k| mask >> k & 1 == 1).collect();
            let entry = |r: usize, c: usize| {
                let unknown = basis[c];
                match (r < 3, unknown < count) {
                    (true, true) => self.xyz[unknown][r],
                    (true, false) => 0.0,
                    // Rows are scaled to a right side of one.
                    (false, true) => rows[r - 3].0[unknown] / rows[r - 3].1,
                    (false, false) => f64::from(u8::from(unknown - count == r - 3)),
                }
            };
            let matrix = DMatrix::from_fn(equations, equations, entry);
            let right = DVector::from_fn(equations, |r, _| if r < 3 { self.white[r] } else { 1.0 });
            let Some(solution) = matrix.lu().solve(&right) else { continue };
            if solution.iter().any(|value| !value.is_finite() || *value < -1e-12) {
                continue;
            }
            let mut radiant = vec![0.0; count];
            for (&unknown, value) in basis.iter().zip(solution.iter()) {
                if unknown < count {
                    radiant[unknown] = value.max(0.0);
                }
            }
            let cost: f64 = radiant.iter().zip(costs).map(|(p, c)| p * c).sum();
            if best.as_ref().is_none_or(|best| cost < best.1) {
                best = Some((radiant, cost));
            }
        }
        best
    }
}

impl BlendSolver for Vertices {
    fn least(&mut self, question: &Question) -> Option<Reply> {
        // One lumen: Y of the white is 1 in lumens.
        let rows: Vec<(Vec<f64>, f64)> =
            question.rows.iter().map(|row| (row.per_radiant_w.clone(), row.at_most)).collect();
        let (radiant, cost) = self.solve(&question.watts_per_radiant_w, &rows)?;
        let sum: f64 = radiant.iter().sum();
        Some(Reply { shares: radiant.iter().map(|p| p / sum).collect(), bound: Some(cost) })
    }

    fn meets(&mut self, shares: &[f64]) -> bool {
        let lumens: f64 = shares.iter().zip(&self.ler).map(|(s, l)| s * l).sum();
        (0..3).all(|axis| {
            let sum: f64 = shares.iter().zip(&self.xyz).map(|(s, xyz)| s * xyz[axis]).sum();
            (sum / lumens - self.white[axis]).abs() < 1e-7
        })
    }
}

fn set(dice: &mut Dice) -> (Vec<DeviceEmitter>, Vertices) {
    let peaks = [455.0, 500.0, 550.0, 620.0];
    let emitters: Vec<DeviceEmitter> = peaks
        .iter()
        .map(|&peak| {
            let light = gaussian_light(peak + dice.between(-6.0, 6.0), dice.between(25.0, 60.0));
            emitter(&format!("Invented {peak}"), light, random_sheet(dice))
        })
        .collect();
    let solver = vertices(&emitters);
    (emitters, solver)
}

/// The solver of a set at the white x 0.38, y 0.377 (near 4000 K), scaled so that one lumen is Y = 1.
fn vertices(emitters: &[DeviceEmitter]) -> Vertices {
    let in_lumens = |e: &DeviceEmitter| {
        let scale = e.light.ler_lm_per_w / e.light.xyz_per_w[1];
        e.light.xyz_per_w.map(|part| part * scale)
    };
    let (x, y) = (0.38, 0.377);
    Vertices {
        xyz: emitters.iter().map(in_lumens).collect(),
        ler: emitters.iter().map(|e| e.light.ler_lm_per_w).collect(),
        white: [x / y, 1.0, (1.0 - x - y) / y],
    }
}

/// Brute force over the one free direction of four emitters at one white.
fn brute(model: &PowerModel, solver: &Vertices, lumens: f64) -> Option<f64> {
    let ends: Vec<Vec<f64>> =
        [1.0, -1.0].iter().map(|sign| solver.solve(&[0.0, *sign, 0.0, 0.0], &[]).unwrap().0).collect();
    (0..=120)
        .filter_map(|k| {
            let t = f64::from(k) / 120.0;
            let radiant: Vec<f64> =
                ends[0].iter().zip(&ends[1]).map(|(a, b)| lumens * (a + (b - a) * t)).collect();
            model.least_power(&radiant).ok().map(|least| least.watts)
        })
        .min_by(f64::total_cmp)
}

#[track_caller]
fn never_worse(build: &Build, first_seed: u64, levels: (f64, f64)) {
    let mut compared = 0;
    for seed in 0..14 {
        let mut dice = Dice::new(first_seed + seed);
        let (emitters, mut solver) = set(&mut dice);
        let lumens = dice.between(levels.0, levels.1);
        let model = build.power_model(&emitters).unwrap();
        let ler = solver.ler.clone();
        let found = best_efficacy(&model, &ler, lumens, &mut solver, Effort::default());
        match (brute(&model, &solver, lumens), found) {
            (Some(brute), Ok(found)) => {
                compared += 1;
                assert!(found.least.watts <= brute * 1.001, "{} W, brute force {brute} W", found.least.watts);
                assert!(solver.meets(&found.shares), "the blend keeps its white");
                let bound = found.bound_lm_per_w.unwrap();
                assert!(bound >= lumens / brute * (1.0 - 1e-9), "bound {bound} below {}", lumens / brute);
                assert!(bound <= found.efficacy_lm_per_w * 1.003, "gap {}", bound / found.efficacy_lm_per_w);
            }
            (None, Err(_)) => {}
            (brute, found) => panic!("brute force {brute:?}, found {found:?}"),
        }
    }
    assert!(compared >= 8, "only {compared} sets could be made");
}

fn stripes(drive: Drive) -> Build {
    Build {
        form: FormSettings::SideBySide(SideBySide { drive, ..SideBySide::default() }),
        ..Build::default()
    }
}

#[test]
fn own_currents_with_the_blend_free() {
    never_worse(&stripes(Drive::OwnCurrent(Freedom::LeastPower)), 1, (500.0, 6000.0));
}

#[test]
fn own_currents_where_area_is_short_and_the_best_blend_lies_between_two() {
    never_worse(&stripes(Drive::OwnCurrent(Freedom::LeastPower)), 20, (8000.0, 40_000.0));
}

#[test]
fn an_efficient_emitter_short_of_current_is_used_as_far_as_it_goes() {
    // Two greens: one efficient that may only run low, one poor that may run high. Neither alone is best.
    let sheet = |eqe: f64, highest: f64| Sheet {
        eqe: Some(EqeModel::Table(Table::new(vec![(0.05, eqe), (highest, eqe)]))),
        voltage: Some(VoltageModel::Table(Table::new(vec![(0.05, 2.9), (highest, 3.1)]))),
        ..Sheet::default()
    };
    let emitters = [
        emitter("blue", gaussian_light(455.0, 25.0), sheet(0.15, 50.0)),
        emitter("green, efficient", gaussian_light(540.0, 40.0), sheet(0.25, 0.6)),
        emitter("green, strong", gaussian_light(545.0, 40.0), sheet(0.06, 50.0)),
        emitter("red", gaussian_light(615.0, 40.0), sheet(0.2, 50.0)),
    ];
    let mut solver = vertices(&emitters);
    let build = stripes(Drive::OwnCurrent(Freedom::LeastPower));
    let model = build.power_model(&emitters).unwrap();
    let ler = solver.ler.clone();
    let mut between = 0;
    for lumens in [1500.0, 2500.0, 3500.0, 5000.0] {
        let found = best_efficacy(&model, &ler, lumens, &mut solver, Effort::default()).unwrap();
        let brute = brute(&model, &solver, lumens).unwrap();
        assert!(found.least.watts <= brute * 1.001, "{} W, brute force {brute} W", found.least.watts);
        assert!(found.bound_lm_per_w.unwrap() <= found.efficacy_lm_per_w * 1.003);
        between += u32::from(found.shares[1] > 0.02 && found.shares[2] > 0.02);
    }
    assert!(between >= 2, "both greens are lit in {between} of 4 answers");
}

#[test]
fn a_common_current_with_the_blend_free() {
    never_worse(&stripes(Drive::CommonCurrent(None)), 100, (500.0, 6000.0));
}

#[test]
fn a_common_voltage_with_the_blend_free() {
    never_worse(&stripes(Drive::CommonVoltage(None)), 200, (200.0, 1500.0));
}

#[test]
fn a_series_stack_with_the_blend_free() {
    never_worse(
        &Build { form: FormSettings::SeriesStack(SeriesStack::default()), ..Build::default() },
        300,
        (1000.0, 10_000.0),
    );
}

#[test]
fn a_shared_zone_with_the_blend_free() {
    // One voltage law of the zone keeps the relaxation tight.
    let zone = SharedZone { voltage: random_sheet(&mut Dice::new(9)).voltage, ..SharedZone::default() };
    never_worse(&Build { form: FormSettings::SharedZone(zone), ..Build::default() }, 400, (500.0, 6000.0));
}
