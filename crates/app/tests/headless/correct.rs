//! `correct`: what went into a white is found again.

use crate::support::{file, gaussians, keys, whitesmith, words};

const KEYS: &str = "name shares share_sigma shift_nm stretch unexplained residual_rms warnings";
const EMITTERS: [(f64, f64); 4] = [(455.0, 25.0), (530.0, 60.0), (590.0, 40.0), (625.0, 30.0)];

/// A white of the four emitters with these shares of radiant power, each moved by `shift_nm`.
fn white(shares: [f64; 4], shift_nm: f64) -> String {
    let mut text = String::from("wavelength_nm,panel 7\n");
    for nm in 380..=780 {
        let value: f64 = EMITTERS
            .iter()
            .zip(shares)
            .map(|((peak, fwhm), share)| {
                let x = (f64::from(nm) - peak - shift_nm) / fwhm;
                share / fwhm * (-4.0 * 2f64.ln() * x * x).exp()
            })
            .sum();
        text.push_str(&format!("{nm},{value:e}\n"));
    }
    text
}

#[test]
fn known_shares_come_back() {
    let shares = [0.17, 0.31, 0.22, 0.30];
    let (_a, emitters) = file("emitters.csv", gaussians(&EMITTERS));
    let (_b, measured) = file("panel.csv", white(shares, 0.0));
    let run = whitesmith(&["correct", "--json", "--emitters", &emitters, "--measured", &measured]);
    assert_eq!(run.code, 0, "{}", run.err);
    let value = run.json();
    assert_eq!(value.as_array().unwrap().len(), 1);
    let record = &value[0];
    assert_eq!(keys(record), words(KEYS));
    assert_eq!(record["name"], "panel 7");
    for (found, share) in record["shares"].as_array().unwrap().iter().zip(shares) {
        assert!((found.as_f64().unwrap() - share).abs() < 1e-6, "{record}");
    }
    assert!(record["shift_nm"].is_null() && record["stretch"].is_null());
    assert!(
        record["unexplained"].as_f64().unwrap() < 1e-6 && record["residual_rms"].as_f64().unwrap() < 1e-6
    );
    assert_eq!(record["share_sigma"].as_array().unwrap().len(), 4);
}

#[test]
fn a_common_shift_is_found_when_asked_for() {
    let (_a, emitters) = file("emitters.csv", gaussians(&EMITTERS));
    let (_b, measured) = file("panel.csv", white([0.17, 0.31, 0.22, 0.30], 1.5));
    let run = whitesmith(&["correct", "--json", "--emitters", &emitters, "--measured", &measured, "--shift"]);
    let record = &run.json()[0];
    for shift in record["shift_nm"].as_array().unwrap() {
        assert!((shift.as_f64().unwrap() - 1.5).abs() < 0.01, "{record}");
    }
    assert!(record["stretch"].is_null());
    assert!(record["residual_rms"].as_f64().unwrap() < 1e-4, "{record}");
}

#[test]
fn an_emitter_the_file_does_not_have_is_noticed() {
    let (_a, emitters) = file("emitters.csv", gaussians(&EMITTERS[..3]));
    let (_b, measured) = file("panel.csv", white([0.17, 0.31, 0.22, 0.30], 0.0));
    let run = whitesmith(&["correct", "--json", "--emitters", &emitters, "--measured", &measured]);
    let record = &run.json()[0];
    assert!(record["unexplained"].as_f64().unwrap() > 0.05, "{record}");
    assert!(record["warnings"][0].as_str().unwrap().contains("none of the emitters"), "{record}");
}

#[test]
fn a_measured_file_that_is_refused_does_not_hide_the_others() {
    let (_a, emitters) = file("emitters.csv", gaussians(&EMITTERS));
    let (_b, measured) = file("panel.csv", white([0.25, 0.25, 0.25, 0.25], 0.0));
    let run =
        whitesmith(&["correct", "--json", "--emitters", &emitters, "--measured", "none.csv", &measured]);
    assert_eq!((run.code, run.json().as_array().unwrap().len()), (2, 1), "{}", run.err);
    let run = whitesmith(&["correct", "--json", "--emitters", "none.csv", "--measured", &measured]);
    assert_eq!((run.code, run.json().as_array().unwrap().len()), (2, 0), "{}", run.err);
}
