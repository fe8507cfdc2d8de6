//! `measure` against the golden record of the CIE sources (`tests/data/golden`; conventions in its notes).

use crate::support::{Table, data, file, gaussians, keys, whitesmith, words};

const KEYS: &str = "name x y u_prime v_prime cct_k duv ler_lm_per_w ra r rf rg rf_bins rcs_bins rhs_bins \
    sp_ratio melanopic_der kbv_w_per_lm peak_nm fwhm_nm warnings";

#[test]
fn every_published_source_is_measured_as_the_record_has_it() {
    let path = data("golden/spectra_1nm.csv");
    let run = whitesmith(&["measure", "--json", path.to_str().unwrap()]);
    assert_eq!(run.code, 0, "{}", run.err);
    let value = run.json();
    let spectra = value.as_array().unwrap();
    assert_eq!(spectra.len(), 47);
    let record = Table::read("golden/illuminants_1nm.csv");
    let strict = Table::read("golden/cri_strict_1nm.csv");
    for spectrum in spectra {
        assert_eq!(keys(spectrum), words(KEYS));
        let name = spectrum["name"].as_str().unwrap();
        let number = |key: &str| spectrum[key].as_f64().unwrap_or_else(|| panic!("{name}: a number {key}"));
        let near = |key: &str, found: f64, expected: f64, tolerance: f64| {
            assert!(
                (found - expected).abs() <= tolerance,
                "{name} {key}: {found}, the record has {expected}"
            );
        };
        // Tolerances: 1 nm sums printed to nine digits; Ohno 2014 against the nearest point of a 360–830 nm locus;
        // strict CRI columns; rounded M1 and M2 in the record's Rf.
        near("x", number("x"), record.number(name, "x"), 2e-6);
        near("y", number("y"), record.number(name, "y"), 2e-6);
        let cct_k = record.number(name, "CCT_ohno2013");
        near("cct_k", number("cct_k"), cct_k, 3e-4 * cct_k);
        near("duv", number("duv"), record.number(name, "Duv_ohno2013"), 2e-5);
        let ler = record.number(name, "LER_lm_per_W");
        near("ler", number("ler_lm_per_w"), ler, 1e-4 * ler);
        near("ra", number("ra"), strict.number(name, "Ra"), 0.05);
        for i in 1..=14 {
            let found = spectrum["r"][i - 1].as_f64().unwrap();
            near(&format!("R{i}"), found, strict.number(name, &format!("R{i}")), 0.15);
        }
        assert_eq!(spectrum["r"].as_array().unwrap().len(), 15);
        near("rf", number("rf"), record.number(name, "Rf_CIE2017"), 0.03);
        for bins in ["rf_bins", "rcs_bins", "rhs_bins"] {
            assert_eq!(spectrum[bins].as_array().unwrap().len(), 16, "{name} {bins}");
        }
        if let Some(rg) = spectrum["rg"].as_f64() {
            near("rg", rg, record.number(name, "Rg_TM30_18"), 0.05);
        }
    }
}

#[test]
fn numbers_without_meaning_are_null_with_a_warning() {
    // A single narrow green lies far off the Planckian locus.
    let (_folder, path) = file("green.csv", gaussians(&[(530.0, 20.0)]));
    let run = whitesmith(&["measure", "--json", &path]);
    assert_eq!(run.code, 0);
    let green = &run.json()[0];
    for key in ["cct_k", "duv", "ra", "r", "rf", "rg", "rf_bins", "rcs_bins", "rhs_bins"] {
        assert!(green[key].is_null(), "{key}");
    }
    for key in ["x", "y", "u_prime", "v_prime", "ler_lm_per_w", "sp_ratio", "melanopic_der"] {
        assert!(green[key].as_f64().is_some(), "{key}");
    }
    assert_eq!(green["peak_nm"], 530.0);
    assert!(!green["warnings"].as_array().unwrap().is_empty());
}

#[test]
fn a_refused_file_leaves_the_others_measured() {
    let (_a, good) = file("good.csv", gaussians(&[(560.0, 120.0)]));
    let (_b, bad) = file("bad.csv", "nothing to see here\n");
    let run = whitesmith(&["measure", "--json", &bad, &good]);
    assert_eq!((run.code, run.err.lines().count()), (2, 1), "{}", run.err);
    assert_eq!(run.json().as_array().unwrap().len(), 1);
}

#[test]
fn the_table_names_what_the_json_names() {
    let (_folder, path) = file("good.csv", gaussians(&[(455.0, 25.0)]));
    let run = whitesmith(&["measure", &path]);
    assert_eq!(run.code, 0);
    assert!(run.out.contains("emitter 1") && run.out.contains("455.0"), "{}", run.out);
}

#[test]
fn samples_are_used_as_they_are() {
    // A dark offset of 5 % of the peak is reported by `read` above the dark level but stays in `measure`.
    let clean = gaussians(&[(530.0, 30.0)]);
    let offset: String = clean
        .lines()
        .enumerate()
        .map(|(k, line)| {
            if k == 0 {
                return format!("{line}\n");
            }
            let (nm, value) = line.split_once(',').unwrap();
            format!("{nm},{}\n", value.parse::<f64>().unwrap() + 0.05)
        })
        .collect();
    let (_a, clean) = file("clean.csv", clean);
    let (_b, offset) = file("offset.csv", offset);
    let ler =
        |path: &str| whitesmith(&["measure", "--json", path]).json()[0]["ler_lm_per_w"].as_f64().unwrap();
    assert!(ler(&clean) - ler(&offset) > 50.0, "{} {}", ler(&clean), ler(&offset));
}
