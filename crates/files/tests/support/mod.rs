//! Invented spectra, and the ways instruments write them down.
#![allow(dead_code, reason = "each test file uses a part of it")]

use files::read::{Answers, Outcome, ReadSpectrum, Reading, read_bytes};

/// 380–780 nm in steps of 1 nm.
pub(crate) fn grid() -> Vec<f64> {
    (380..=780).map(f64::from).collect()
}

/// A Gaussian of unit height.
pub(crate) fn gaussian(nm: f64, centre: f64, width: f64) -> f64 {
    (-4.0 * 2f64.ln() * ((nm - centre) / width).powi(2)).exp()
}

/// The invented emitter most tests use: peak 530 nm, FWHM 32 nm.
pub(crate) fn fern(nm: f64) -> f64 {
    gaussian(nm, 530.0, 32.0)
}

/// Rows of `wavelength<separator>value` with five digits.
pub(crate) fn rows(separator: &str) -> String {
    table(separator, fern)
}

/// Rows of any function of the wavelength.
pub(crate) fn table(separator: &str, value: impl Fn(f64) -> f64) -> String {
    grid().into_iter().map(|nm| format!("{nm}{separator}{:.5}\n", value(nm))).collect()
}

/// Reads text without any answer.
pub(crate) fn read(text: &str) -> Reading {
    read_bytes("fern.csv", text.as_bytes(), &Answers::default())
}

/// Reads text with answers.
pub(crate) fn answered(text: &str, answers: &Answers) -> Reading {
    read_bytes("fern.csv", text.as_bytes(), answers)
}

#[track_caller]
pub(crate) fn outcome(reading: &Reading, expected: Outcome) {
    assert_eq!(
        reading.outcome, expected,
        "message {:?}\nassumptions {:#?}\nwarnings {:#?}\nquestions {:#?}",
        reading.message, reading.assumptions, reading.warnings, reading.questions
    );
}

/// The spectrum of fern: 530 nm, 32 nm.
#[track_caller]
pub(crate) fn is_fern(spectrum: &ReadSpectrum) {
    is_peak(spectrum, 530.0, 32.0);
}

#[track_caller]
pub(crate) fn is_peak(spectrum: &ReadSpectrum, peak_nm: f64, fwhm_nm: f64) {
    let peak = spectrum.peak_nm.expect("the peak is known");
    let fwhm = spectrum.fwhm_nm.expect("the width is known");
    assert!(
        (peak - peak_nm).abs() <= 1.0 && (fwhm - fwhm_nm).abs() <= 0.5,
        "{}: {peak} {fwhm}",
        spectrum.name
    );
}
