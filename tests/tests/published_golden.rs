//! Every number of `measure` against the golden record of the 47 CIE sources (tests/data/golden, conventions there).

use checks::table::Table;
use colour::measure::{Measurement, measure};
use colour::{Reference, Tensor};

/// x, y: the record's own 1 nm sums, printed to nine digits.
const XY: f64 = 2e-6;
/// CCT, relative: Ohno 2014 against the nearest point, and 360–780 against 360–830 nm.
const CCT_RELATIVE: f64 = 3e-4;
/// Duv: as CCT.
const DUV: f64 = 2e-5;
/// LER, relative.
const LER_RELATIVE: f64 = 1e-4;
/// Ra against the strict columns.
const RA: f64 = 0.05;
/// R1–R14 against the strict columns.
const RI: f64 = 0.15;
/// Rf: the record rounds M1 and M2 and takes S0–S2 by Sprague.
const RF: f64 = 0.03;
/// Rg: as Rf.
const RG: f64 = 0.05;

fn sources() -> Vec<(String, Measurement)> {
    let spectra = Table::read("golden/spectra_1nm.csv");
    spectra.header()[1..]
        .iter()
        .map(|name| (name.clone(), measure(&Tensor::of_grid(&spectra.column(name)))))
        .collect()
}

#[track_caller]
fn check(name: &str, what: &str, got: f64, expected: f64, tolerance: f64) {
    assert!(
        (got - expected).abs() <= tolerance,
        "{name} {what}: {got}, the record has {expected} (± {tolerance})"
    );
}

#[test]
fn white_efficacy_and_gamut_agree_with_the_record() {
    let record = Table::read("golden/illuminants_1nm.csv");
    let sources = sources();
    assert_eq!(sources.len(), 47);
    for (row, (name, got)) in sources.iter().enumerate() {
        assert_eq!(record.text(row, "name"), name);
        let value = |column: &str| record.number(row, column).expect("the record has the value");
        check(name, "x", got.x, value("x"), XY);
        check(name, "y", got.y, value("y"), XY);
        check(name, "u'", got.u_prime, value("u_prime"), XY);
        check(name, "v'", got.v_prime, value("v_prime"), XY);
        let cct_k = value("CCT_ohno2013");
        check(name, "CCT", got.cct_k.expect("a CCT"), cct_k, CCT_RELATIVE * cct_k);
        check(name, "Duv", got.duv.expect("a Duv"), value("Duv_ohno2013"), DUV);
        let ler = value("LER_lm_per_W");
        check(name, "LER", got.ler_lm_per_w, ler, LER_RELATIVE * ler);
        check(name, "S/P", got.sp_ratio, value("SP_ratio"), 1e-6);
        check(name, "melanopic DER", got.melanopic_der, value("mel_DER"), 1e-6);
        check(name, "K_B,v", got.kbv_w_per_lm, value("K_Bv_W_per_lm"), 1e-9);
        check(name, "Rf", got.rf.expect("an Rf"), value("Rf_CIE2017"), RF);
        match record.number(row, "Rg_TM30_18") {
            Some(rg) => check(name, "Rg", got.rg.expect("an Rg"), rg, RG),
            None => assert_eq!(got.rg, None, "{name}: an empty hue bin leaves Rg undefined"),
        }
    }
}

#[test]
fn rendering_indices_agree_with_the_strict_record() {
    let record = Table::read("golden/cri_strict_1nm.csv");
    for (row, (name, got)) in sources().iter().enumerate() {
        assert_eq!(record.text(row, "name"), name);
        check(
            name,
            "CCT",
            got.cct_k.expect("a CCT"),
            record.number(row, "CCT_exact").expect("exact CCT"),
            2e-3,
        );
        check(name, "Ra", got.ra.expect("an Ra"), record.number(row, "Ra").expect("Ra"), RA);
        let r = got.r.expect("special indices");
        for (i, value) in r[..14].iter().enumerate() {
            let column = format!("R{}", i + 1);
            check(name, &column, *value, record.number(row, &column).expect("the index"), RI);
        }
    }
}

/// R15 is only in the record of the other convention (Sprague samples, Robertson CCT), so the tolerance is wider.
#[test]
fn r15_agrees_with_the_record_within_its_convention() {
    let record = Table::read("golden/illuminants_1nm.csv");
    let mut compared = 0;
    for (row, (name, got)) in sources().iter().enumerate() {
        if got.cct_k.expect("a CCT") > 1700.0 {
            check(name, "R15", got.r.expect("R15")[14], record.number(row, "R15").expect("R15"), 0.3);
            compared += 1;
        }
    }
    assert!(compared >= 45);
}

#[test]
fn hue_bins_agree_with_the_record() {
    let record = Table::read("golden/illuminants_1nm.csv");
    for (row, (name, got)) in sources().iter().enumerate() {
        let rf = got.rf_bins.expect("Rf bins");
        let rcs = got.rcs_bins.expect("Rcs bins");
        let rhs = got.rhs_bins.expect("Rhs bins");
        for bin in 0..16 {
            let of = |kind: &str| record.number(row, &format!("{kind}_h{}", bin + 1));
            let Some(value) = rf[bin] else {
                assert_eq!(of("Rcs"), None, "{name} bin {bin} is empty");
                continue;
            };
            check(name, "Rf,h", value, of("Rfh").expect("Rfh"), 0.05);
            check(name, "Rcs,h", rcs[bin].expect("Rcs"), of("Rcs").expect("Rcs"), 0.05);
            check(name, "Rhs,h", rhs[bin].expect("Rhs"), of("Rhs").expect("Rhs"), 5e-4);
        }
    }
}

#[test]
fn sample_scores_agree_with_the_record() {
    let record = Table::read("golden/ces_rf_1nm.csv");
    let spectra = Table::read("golden/spectra_1nm.csv");
    for row in 0..record.len() {
        let name = record.text(row, "name");
        let light = Tensor::of_grid(&spectra.column(name));
        let cct_k = measure(&light).cct_k.expect("a CCT");
        let numbers = colour::fidelity::fidelity(&light, &Reference::at(cct_k));
        for (i, score) in numbers.samples.iter().enumerate() {
            let expected = record.number(row, &format!("Rf_CES{:02}", i + 1)).expect("a score");
            // 0.04 is what rounding M1 and M2 and Sprague daylight components are worth for one sample.
            check(name, &format!("CES{:02}", i + 1), *score, expected, 0.05);
        }
    }
}
