//! How long the numbers of a blend take, beside the published crate `colorimetry` on the same spectra in the same run.

use colour::kernel::{Arithmetic, RenderingKernel};
use colour::measure::measure_with;
use colour::shapes::Shape;
use colour::{Observer, Reference, Tensor, TensorSet};
use criterion::{BatchSize, Criterion, criterion_group, criterion_main};
use std::hint::black_box;

const SHARES: [f64; 6] = [0.14, 0.11, 0.19, 0.15, 0.26, 0.15];

/// Six invented emitters at unit radiant power, 380–780 nm, 1 nm.
fn emitters() -> Vec<Vec<f64>> {
    [(447.0, 21.0), (492.0, 33.0), (531.0, 58.0), (566.0, 41.0), (603.0, 77.0), (634.0, 22.0)]
        .into_iter()
        .map(|(peak_nm, fwhm_nm)| {
            Shape::GaussianNm { peak_nm, fwhm_nm }.colour_grid().expect("a valid shape")
        })
        .collect()
}

fn metrics(criterion: &mut Criterion) {
    let emitters = emitters();
    let tensors: Vec<Tensor> = emitters.iter().map(|grid| Tensor::of_grid(grid)).collect();
    let set = TensorSet::new(&tensors);
    let blend = set.blend(&SHARES);
    let cct_k = colour::locus::cct_duv(blend.xyz(Observer::Cie1931).uv()).expect("a white").cct_k;
    let reference = Reference::at(cct_k);

    for (label, arithmetic) in [("dispatched", Arithmetic::Dispatched), ("plain", Arithmetic::Plain)] {
        let mut group = criterion.benchmark_group(label);
        let kernel = RenderingKernel::with_arithmetic(&set, &reference, arithmetic);
        let mut first = [0.0; 6];
        let mut second = [0.0; 6];
        group.bench_function("every number of a blend", |b| {
            b.iter(|| measure_with(&set.blend_with(black_box(&SHARES), arithmetic), None, arithmetic));
        });
        group.bench_function("Ra and R9", |b| b.iter(|| kernel.ra_r9(black_box(&SHARES))));
        group.bench_function("Rf", |b| b.iter(|| kernel.rf(black_box(&SHARES))));
        group.bench_function("Rf and Rg", |b| b.iter(|| kernel.rf_rg(black_box(&SHARES))));
        group.bench_function("Ra and R9 with gradients", |b| {
            b.iter(|| kernel.ra_r9_gradients(black_box(&SHARES), &mut first, &mut second));
        });
        group.bench_function("Ra and Rf with gradients", |b| {
            b.iter(|| {
                let weights = [
                    0.125, 0.125, 0.125, 0.125, 0.125, 0.125, 0.125, 0.125, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0,
                ];
                let ra = kernel.cri_gradient(black_box(&SHARES), &weights, &mut first);
                (ra, kernel.rf_gradient(black_box(&SHARES), &mut second))
            });
        });
        group.bench_function("Rf and Rg with gradients", |b| {
            b.iter(|| kernel.rf_rg_gradients(black_box(&SHARES), &mut first, &mut second));
        });
        group.bench_function("references of a CCT", |b| {
            b.iter(|| Reference::at_with(black_box(cct_k), arithmetic));
        });
        group.finish();
    }

    let mut group = criterion.benchmark_group("whole spectra");
    let uv = blend.xyz(Observer::Cie1931).uv();
    group.bench_function("CCT and Duv", |b| b.iter(|| colour::locus::cct_duv(black_box(uv))));
    let grid: Vec<f64> =
        (0..401).map(|i| emitters.iter().zip(SHARES).map(|(grid, share)| share * grid[i]).sum()).collect();
    group.bench_function("tensor of a spectrum", |b| b.iter(|| Tensor::of_grid(black_box(&grid))));
    group.bench_function("spectrum to every number", |b| {
        b.iter(|| colour::measure::measure(&Tensor::of_grid(black_box(&grid))));
    });
    group.bench_function("colorimetry 0.1: spectrum to CCT, Ra, Ri, Rf, Rg", |b| {
        b.iter_batched(
            || peer_illuminant(&grid),
            |light| {
                let cct = light.cct().expect("a CCT").t();
                let cri = colorimetry::illuminant::CRI::try_from(&light).expect("a rendering index");
                let cfi = colorimetry::illuminant::CFI::new(&light).expect("a fidelity index");
                (cct, cri.ra(), cfi.color_fidelity_index(), cfi.color_gamut_index())
            },
            BatchSize::SmallInput,
        );
    });
    group.finish();
}

fn peer_illuminant(grid: &[f64]) -> colorimetry::illuminant::Illuminant {
    let array: [f64; 401] = grid.try_into().expect("401 values");
    colorimetry::illuminant::Illuminant::from(colorimetry::spectrum::Spectrum::from(array))
}

criterion_group!(benches, metrics);
criterion_main!(benches);
