//! CIE 224:2017: the worksheet's Rf and 99 sample scores of its sample spectrum, FL1 and FL2.
//!
//! FL1 and FL2 are summed at 5 nm there, source and reference alike (a spectrum that is zero between its 5 nm samples
//! turns 1 nm sums into 5 nm sums); the sample spectrum is summed at 1 nm.

use checks::table::Table;
use colour::fidelity::fidelity;
use colour::illuminant::cie_source;
use colour::locus::cct_duv;
use colour::reference::fidelity_reference_grid;
use colour::{Observer, Reference, Tensor};

/// Scores are printed to one decimal; the rest is for rounded M1 and M2 in the worksheet's daylight.
const PRINTED: f64 = 0.05 + 0.01;

fn every_fifth(grid: &[f64]) -> Vec<f64> {
    grid.iter().enumerate().map(|(i, value)| if i % 5 == 0 { *value } else { 0.0 }).collect()
}

fn sample_spectrum() -> Vec<f64> {
    let table = Table::read("golden/published_sample_1nm.csv");
    let mut grid = vec![0.0; 401];
    for row in 0..table.len() {
        let nm = table.number(row, "wavelength_nm").expect("a wavelength");
        if (380.0..=780.0).contains(&nm) {
            grid[(nm - 380.0) as usize] = table.number(row, "sample").expect("a value");
        }
    }
    grid
}

/// How the sums' step is chosen.
type Step = fn(&[f64]) -> Vec<f64>;

#[test]
fn scores_of_the_worksheet() {
    let published = Table::read("golden/published.csv");
    let mut compared = 0;
    for name in ["sample", "FL1", "FL2"] {
        let (grid, thin): (Vec<f64>, Step) = match cie_source(name) {
            Some(source) => (source.on_colour_grid(), every_fifth),
            None => (sample_spectrum(), <[f64]>::to_vec),
        };
        let light = Tensor::of_grid(&thin(&grid));
        let cct_k = cct_duv(light.xyz(Observer::Cie1931).uv()).expect("a CCT").cct_k;
        let reference = thin(&fidelity_reference_grid(cct_k));
        let numbers = fidelity(&light, &Reference::of_grids(cct_k, &reference, &reference));
        for row in 0..published.len() {
            let quantity = published.text(row, "quantity");
            if published.text(row, "name") != name || !published.text(row, "source").contains("CIE 224:2017")
            {
                continue;
            }
            let got = match quantity.strip_prefix("Rf_CES") {
                Some(sample) => numbers.samples[sample.parse::<usize>().expect("a sample number") - 1],
                None => numbers.rf,
            };
            let expected = published.number(row, "published").expect("a published value");
            assert!(
                (got - expected).abs() <= PRINTED,
                "{name} {quantity}: {got}, the worksheet has {expected}"
            );
            compared += 1;
        }
    }
    assert_eq!(compared, 300);
}
