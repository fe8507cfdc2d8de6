//! ANSI/IES TM-30-18: hue-bin values of FL12 (worked values of the standard, quoted second-hand in open code) and the
//! printed integers of its calculator for FL2.

use checks::table::Table;
use colour::Tensor;
use colour::illuminant::cie_source;
use colour::measure::{Measurement, measure};

fn of(name: &str) -> Measurement {
    measure(&Tensor::of(&cie_source(name).expect("an embedded source")))
}

fn check_bins(name: &str, source: &str, tolerance: impl Fn(&str) -> f64) -> usize {
    let published = Table::read("golden/published.csv");
    let got = of(name);
    let (rf, rcs, rhs) = (got.rf_bins.expect("Rf"), got.rcs_bins.expect("Rcs"), got.rhs_bins.expect("Rhs"));
    let mut compared = 0;
    for row in 0..published.len() {
        if published.text(row, "name") != name || !published.text(row, "source").contains(source) {
            continue;
        }
        let quantity = published.text(row, "quantity");
        let Some((kind, bin)) = quantity.split_once("_h") else { continue };
        let bin = bin.parse::<usize>().expect("a bin number") - 1;
        let value = match kind {
            "Rfh" => rf[bin],
            "Rcs" => rcs[bin],
            _ => rhs[bin],
        };
        let (value, expected) =
            (value.expect("a value"), published.number(row, "published").expect("a number"));
        assert!(
            (value - expected).abs() <= tolerance(kind),
            "{name} {quantity}: {value}, published {expected}"
        );
        compared += 1;
    }
    compared
}

/// 1 nm sums, linear between 5 nm samples; printed to three decimals (Rhs: five).
#[test]
fn hue_bins_of_fl12() {
    let compared =
        check_bins("FL12", "worked values for CIE F12", |kind| if kind == "Rhs" { 2e-5 } else { 1.5e-3 });
    assert_eq!(compared, 48);
}

/// Printed as integers (Rhs: two decimals), from 5 nm sums.
#[test]
fn hue_bins_and_indices_of_fl2() {
    let compared =
        check_bins("FL2", "official IES TM-30-18", |kind| if kind == "Rhs" { 0.0055 } else { 0.65 });
    assert_eq!(compared, 48);
    let got = of("FL2");
    assert_eq!(got.rf.expect("Rf").round(), 70.0);
    assert_eq!(got.rg.expect("Rg").round(), 86.0);
    assert_eq!(got.cct_k.expect("CCT").round(), 4225.0);
    assert!((got.duv.expect("Duv") - 0.0019).abs() < 5e-5);
}
