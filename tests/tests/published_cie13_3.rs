//! CIE 13.3-1995 by way of CIE 15:2004 Table T.8: special indices of FL3.1 and FL3.11 (quoted in open code), and Ra of
//! FL1–FL12 (from memory). Printed as integers, from 5 nm sums.

use checks::table::Table;
use colour::cri::{Cri, cri};
use colour::illuminant::cie_source;
use colour::locus::cct_duv;
use colour::reference::cri_reference_grid;
use colour::{Observer, Reference, Tensor};

fn every_fifth(grid: &[f64]) -> Vec<f64> {
    grid.iter().enumerate().map(|(i, value)| if i % 5 == 0 { *value } else { 0.0 }).collect()
}

/// At 5 nm, source and reference alike.
fn rendering(name: &str) -> (Cri, f64) {
    let source = cie_source(name).expect("an embedded source");
    let light = Tensor::of_grid(&every_fifth(&source.on_colour_grid()));
    let cct_k = cct_duv(light.xyz(Observer::Cie1931).uv()).expect("a CCT").cct_k;
    let reference = every_fifth(&cri_reference_grid(cct_k));
    (cri(&light, &Reference::of_grids(cct_k, &reference, &reference)), cct_k)
}

#[test]
fn special_indices_of_fl3_1_and_fl3_11() {
    let published = Table::read("golden/published.csv");
    let mut compared = 0;
    for name in ["FL3.1", "FL3.11"] {
        let (numbers, cct_k) = rendering(name);
        for row in 0..published.len() {
            if published.text(row, "name") != name || !published.text(row, "source").contains("Table T.8") {
                continue;
            }
            let quantity = published.text(row, "quantity");
            let expected = published.number(row, "published").expect("a number");
            let (got, tolerance) = match quantity {
                "CCT" => (cct_k, 2.0),
                "Ra" => (numbers.ra, 0.5),
                // Half of the last printed digit, and as much for the rounded spectra the table was made from.
                special => (numbers.r[special[1..].parse::<usize>().expect("an index") - 1], 1.0),
            };
            assert!((got - expected).abs() <= tolerance, "{name} {quantity}: {got}, published {expected}");
            compared += 1;
        }
    }
    assert_eq!(compared, 31);
}

#[test]
fn ra_of_fl1_to_fl12() {
    let published = Table::read("golden/published.csv");
    let mut compared = 0;
    for row in 0..published.len() {
        if published.text(row, "quantity") == "Ra" && published.text(row, "source").contains("from memory") {
            let name = published.text(row, "name");
            let got = rendering(name).0.ra;
            let expected = published.number(row, "published").expect("a number");
            assert!((got - expected).abs() <= 0.6, "{name}: {got}, published {expected}");
            compared += 1;
        }
    }
    assert_eq!(compared, 12);
}
