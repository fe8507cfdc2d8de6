//! `read`: outcomes, keys and exit codes.

use crate::support::{data, file, gaussians, keys, whitesmith, words};
use serde_json::Value;

const FILE_KEYS: &str = "file outcome spectra assumptions warnings questions message";
const SPECTRUM_KEYS: &str = "name peak_nm fwhm_nm first_nm last_nm points quantity";

#[track_caller]
fn read(arguments: &[&str]) -> (i32, Value, String) {
    let mut line = vec!["read", "--json"];
    line.extend(arguments);
    let run = whitesmith(&line);
    let value = run.json();
    for record in value.as_array().expect("an array") {
        assert_eq!(keys(record), words(FILE_KEYS));
        for spectrum in record["spectra"].as_array().expect("spectra") {
            assert_eq!(keys(spectrum), words(SPECTRUM_KEYS));
        }
    }
    (run.code, value, run.err)
}

#[test]
fn a_plain_file_is_read_without_a_word() {
    let (_folder, path) = file("lamp.csv", gaussians(&[(455.0, 25.0), (612.0, 80.0)]));
    let (code, value, err) = read(&[&path]);
    assert_eq!((code, err.as_str()), (0, ""), "{value}");
    let record = &value[0];
    assert_eq!(record["outcome"], "read", "{value}");
    assert_eq!(record["spectra"][0]["name"], "emitter 1");
    assert_eq!(record["spectra"][0]["peak_nm"], 455.0);
    assert!((record["spectra"][1]["fwhm_nm"].as_f64().unwrap() - 80.0).abs() < 0.2);
    assert_eq!(record["spectra"][0]["first_nm"], 380.0);
    assert_eq!(record["spectra"][0]["last_nm"], 780.0);
    assert_eq!(record["spectra"][0]["points"], 401);
    assert!(
        !record["assumptions"].as_array().unwrap().is_empty(),
        "an unstated ordinate is an assumption: {value}"
    );
    assert!(record["message"].is_null());
}

#[test]
fn the_first_of_several_faults_decides_nothing_the_worst_does() {
    let (_a, good) = file("good.csv", gaussians(&[(530.0, 30.0)]));
    let (_b, picture) = file("picture.png", b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR");
    let (code, value, err) = read(&[&good, &picture, &good]);
    assert_eq!(code, 2);
    assert_eq!(value.as_array().unwrap().len(), 3);
    assert_eq!(value[1]["outcome"], "refused");
    assert!(value[1]["spectra"].as_array().unwrap().is_empty());
    assert_eq!(value[2]["outcome"], "read");
    assert_eq!(err.lines().count(), 1, "{err}");
    assert!(
        err.contains("picture.png")
            && value[1]["message"].as_str().is_some_and(|m| m.contains("picture.png"))
    );
}

#[test]
fn a_file_that_is_not_there_is_refused_with_a_sentence() {
    let (code, value, err) = read(&["no such file.csv"]);
    assert_eq!((code, err.lines().count()), (2, 1), "{err}");
    assert_eq!(value[0]["outcome"], "refused");
    assert!(err.starts_with("no such file.csv"), "{err}");
}

#[test]
fn an_energy_axis_asks_and_the_answer_settles_it() {
    // A Gaussian in photons per eV at 2.25 eV, FWHM 0.30 eV, peaks at 545.84 nm in power per nm (S ∝ E³ N).
    let mut text = String::from("energy (eV),signal\n");
    for k in 0..=300 {
        let ev = 1.6 + 0.005 * f64::from(k);
        text.push_str(&format!("{ev},{:e}\n", (-4.0 * 2f64.ln() * ((ev - 2.25) / 0.30_f64).powi(2)).exp()));
    }
    let (_folder, path) = file("energy.csv", text);
    let (code, value, err) = read(&[&path]);
    assert_eq!(code, 1, "{value}");
    assert_eq!(value[0]["outcome"], "ask");
    let questions = value[0]["questions"].to_string();
    assert!(questions.contains("--per"), "{questions}");
    assert!(err.contains("--per") && err.contains("energy.csv"), "{err}");
    assert!(value[0]["spectra"][0]["peak_nm"].is_null());
    let (code, value, _) = read(&["--per", "ev", "--ordinate", "photons", &path]);
    assert_eq!(code, 0, "{value}");
    let peak_nm = value[0]["spectra"][0]["peak_nm"].as_f64().unwrap();
    assert!((peak_nm - 545.84).abs() < 0.8, "{peak_nm}");
    // Measuring needs the answer as well.
    let asked = whitesmith(&["measure", "--json", &path]);
    assert_eq!((asked.code, asked.json().as_array().unwrap().len()), (1, 0));
    assert!(asked.err.contains("--per"), "{}", asked.err);
    assert_eq!(whitesmith(&["measure", "--per", "ev", "--ordinate", "photons", &path]).code, 0);
    let solve = whitesmith(&["solve", "--json", "--emitters", &path, "--cct", "3000"]);
    assert_eq!(solve.code, 1);
    assert!(solve.json()["status"].is_null());
}

#[test]
fn the_forty_seven_published_sources_read_clean() {
    let path = data("golden/spectra_1nm.csv");
    let (code, value, err) = read(&[path.to_str().unwrap()]);
    assert_eq!(code, 0, "{err}");
    assert_eq!(value[0]["spectra"].as_array().unwrap().len(), 47, "{value}");
}
