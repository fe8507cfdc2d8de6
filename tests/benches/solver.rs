//! Times of the solver: fixed whites with their proofs, frontiers, choices, the missing emitter.
//!
//! `cargo bench -p checks --bench solver`. Sets are random Gaussians from fixed seeds, so every run solves the same problems.

#![allow(missing_docs, reason = "the entry points criterion makes have no documentation")]
#![allow(clippy::print_stderr, reason = "a time is read beside the gap it reached")]

use colour::Reference;
use colour::shapes::Shape;
use colour::tensor::{Tensor, TensorSet};
use criterion::{Criterion, criterion_group, criterion_main};
use optimiser::{
    Control, Levels, Metric, Objective, Outcome, Problem, Range, Target, Trial, choose, frontier, missing,
    solve,
};
use std::hint::black_box;

/// Emitters spread over 440–660 nm, narrow (16–40 nm) or broad (35–95 nm).
fn set(n: usize, seed: u64, broad: bool) -> TensorSet {
    let mut state = seed;
    let mut unit = move || {
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (state >> 33) as f64 / (1u64 << 31) as f64
    };
    let tensors: Vec<Tensor> = (0..n)
        .map(|i| {
            let peak_nm = 440.0 + (i as f64 + 0.6 * unit()) / n as f64 * 220.0;
            let fwhm_nm = if broad { 35.0 + 60.0 * unit() } else { 16.0 + 24.0 * unit() };
            Tensor::of_grid(&Shape::GaussianNm { peak_nm, fwhm_nm }.colour_grid().expect("a valid shape"))
        })
        .collect();
    TensorSet::new(&tensors)
}

fn at(emitters: TensorSet, cct_k: f64) -> Problem {
    Problem::new(emitters, Target { cct_k, duv: 0.0 })
}

fn answer(p: &Problem) -> Outcome {
    solve(black_box(p), &Control::none()).expect("a valid problem")
}

/// States what a case solves, so that a time can be read with its gap.
fn state(name: &str, p: &Problem) {
    match answer(p) {
        Outcome::Optimal(s) => {
            eprintln!("{name}: {:.3}, gap {:?}, {} boxes, {}", s.objective, s.gap, s.boxes, s.grade.key());
        }
        Outcome::Infeasible(why) => eprintln!("{name}: {}", why.explanation),
    }
}

fn fixed(c: &mut Criterion) {
    let _ = Reference::at(4000.0);
    let mut group = c.benchmark_group("fixed white");
    group.sample_size(20);
    for (n, seed) in [(5, 159), (6, 83), (6, 160), (7, 84), (8, 85), (8, 162), (12, 89)] {
        let mut p = at(set(n, seed, false), 4000.0);
        p.limits.ra = Range::at_least(92.0);
        p.limits.r9 = Range::at_least(50.0);
        let mut search = p.clone();
        search.budget.boxes = 0;
        let name = format!("Ra R9 n={n} seed {seed}");
        state(&name, &p);
        group.bench_function(format!("{name}, search"), |b| b.iter(|| answer(&search)));
        group.bench_function(format!("{name}, with proof"), |b| b.iter(|| answer(&p)));
    }
    for (n, seed) in [(5, 82), (5, 159), (6, 83), (6, 160), (7, 84)] {
        let mut p = at(set(n, seed, true), 4000.0);
        p.limits.rf = Range::at_least(88.0);
        let name = format!("Rf n={n} seed {seed}");
        state(&name, &p);
        group.bench_function(format!("{name}, with proof"), |b| b.iter(|| answer(&p)));
    }
    for (n, seed) in [(5, 10), (6, 11), (7, 12)] {
        for maximise in [Objective::Ra, Objective::Rf] {
            let mut p = at(set(n, seed, true), 4000.0);
            p.maximise = maximise;
            let name = format!("most {} n={n} seed {seed}", maximise.metric().title());
            state(&name, &p);
            group.bench_function(format!("{name}, with proof"), |b| b.iter(|| answer(&p)));
        }
    }
    group.finish();
}

fn jobs(c: &mut Criterion) {
    let mut group = c.benchmark_group("jobs");
    group.sample_size(10);
    for (metric, broad) in [(Metric::Ra, false), (Metric::Rf, true)] {
        let p = at(set(5, 3, broad), 3500.0);
        group.bench_function(format!("frontier of {}, 50 points, n=5", metric.title()), |b| {
            b.iter(|| {
                frontier(black_box(&p), metric, &Levels::Adaptive(50), &Control::none()).expect("valid")
            });
        });
    }
    let mut p = at(set(30, 9, false), 3000.0);
    p.limits.ra = Range::at_least(90.0);
    p.limits.r9 = Range::at_least(0.0);
    for k in [4, 5] {
        group.bench_function(format!("best {k} of 30 with proof"), |b| {
            b.iter(|| choose(black_box(&p), k, &Control::none()).expect("valid"));
        });
    }
    let mut p = at(set(4, 3, false), 3500.0);
    p.limits.ra = Range::at_least(85.0);
    let gauss = |peak_nm: f64, fwhm_nm: f64| {
        Shape::GaussianNm { peak_nm, fwhm_nm }.colour_grid().expect("a valid shape")
    };
    let trial = Trial {
        peaks_nm: (0..40).map(|i| 430.0 + 6.0 * f64::from(i)).collect(),
        widths_nm: (0..15).map(|i| 15.0 + 5.0 * f64::from(i)).collect(),
        shapes: vec![("gauss", &gauss)],
        wall_plug: 0.4,
    };
    group.bench_function("missing emitter, 40 × 15", |b| {
        b.iter(|| missing(black_box(&p), &trial, &Control::none()).expect("valid"));
    });
    group.finish();
}

criterion_group!(benches, fixed, jobs);
criterion_main!(benches);
