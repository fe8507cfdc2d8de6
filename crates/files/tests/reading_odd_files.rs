//! Files with something odd about them, each with the spectra a person would read from it; all data invented.

mod support;

use files::read::{Answers, Outcome};
use support::{answered, fern, grid, is_fern, outcome, read};

/// What to type, the outcome, and the name and peak in nm of each spectrum.
type Case = (&'static str, String, Outcome, &'static [(&'static str, Option<f64>)]);

/// One line for each wavelength.
fn lines(line: impl Fn(f64) -> String) -> String {
    grid().into_iter().map(|nm| line(nm) + "\n").collect()
}

fn pair(separator: char) -> String {
    lines(|nm| format!("{nm}{separator}{:.5}", fern(nm)))
}

#[track_caller]
fn all(cases: Vec<Case>) {
    for (kind, text, expected, spectra) in cases {
        let reading = read(&text);
        assert_eq!(reading.outcome, expected, "{kind}: {reading:#?}");
        let found: Vec<_> = reading.spectra.iter().map(|one| (one.name.as_str(), one.peak_nm)).collect();
        assert_eq!(found, spectra, "{kind}");
    }
}

#[test]
fn a_damaged_row_neither_splits_nor_names_a_table() {
    let damaged =
        |row: &str| format!("nm,Fern\n{}", pair(',').replacen("\n500,", &format!("\n{row}\n500,"), 1));
    let descending = {
        let text = pair(',');
        let mut list: Vec<_> = text.lines().rev().collect();
        list.insert(100, "2016-03-04,abc");
        format!("nm,Fern\n{}", list.join("\n"))
    };
    let part = |low: f64, high: f64, shift: f64| -> String {
        let nm = grid().into_iter().filter(|nm| (low..=high).contains(nm));
        nm.map(|nm| format!("{nm},{:.5}\n", fern(nm - shift))).collect()
    };
    let fern_alone: &[_] = &[("Fern", Some(530.0))];
    all(vec![
        ("date", damaged("2016-03-04,abc"), Outcome::Warned, fern_alone),
        ("words", damaged("abc,def"), Outcome::Warned, fern_alone),
        ("header again", damaged("nm,Fern"), Outcome::Warned, fern_alone),
        ("descending", descending, Outcome::Warned, fern_alone),
        ("remark", damaged("# lamp warmed, 2 min"), Outcome::Read, fern_alone),
        (
            "own headers",
            format!("nm,Fern\n{}nm,Rowan\n{}", part(380.0, 600.0, 0.0), part(601.0, 780.0, 150.0)),
            Outcome::Read,
            &[("Fern", Some(530.0)), ("Rowan", Some(680.0))],
        ),
        (
            "stacked",
            format!("nm,Fern\n{}nm,Teal\n{}", pair(','), pair(',')),
            Outcome::Read,
            &[("Fern", Some(530.0)), ("Teal", Some(530.0))],
        ),
    ]);
}

#[test]
fn letters_may_be_names() {
    let pairs = lines(|nm| format!("{nm},{:.5},{nm},{:.5}", fern(nm), fern(nm + 30.0)));
    let two = lines(|nm| format!("{nm},{:.5},{:.5}", fern(nm), fern(nm + 30.0)));
    let letters: &[_] = &[("A", Some(530.0)), ("B", Some(500.0))];
    all(vec![
        ("pairs over units", format!("A,,B,\nnm,W,nm,W\n{pairs}"), Outcome::Read, letters),
        ("pairs", format!("A,,B,\n{pairs}"), Outcome::Read, letters),
        (
            "V and W over units",
            format!("nm,V,W\nnm,mW,mW\n{two}"),
            Outcome::Read,
            &[("V", Some(530.0)), ("W", Some(500.0))],
        ),
    ]);
}

#[test]
fn columns_of_words_and_of_row_numbers_are_set_aside() {
    let value = |nm: f64| format!("{nm},{:.5}", fern(nm));
    let fern_alone: &[_] = &[("Fern", Some(530.0))];
    let cases: Vec<Case> = vec![
        ("flag", format!("nm,Fern,Status\n{}", lines(|nm| value(nm) + ",ok")), Outcome::Read, fern_alone),
        (
            "flag between",
            format!("nm,Flag,Fern\n{}", lines(|nm| format!("{nm},valid,{:.5}", fern(nm)))),
            Outcome::Read,
            fern_alone,
        ),
        (
            "times",
            format!("Time,nm,Fern\n{}", lines(|nm| format!("2026-03-04 10:11:12,{}", value(nm)))),
            Outcome::Read,
            fern_alone,
        ),
        (
            "one remark",
            format!("nm,Fern,Note\n{}", lines(|nm| value(nm) + if nm == 500.0 { ",look" } else { "," })),
            Outcome::Read,
            fern_alone,
        ),
        (
            "row numbers",
            format!("No,Wavelength,Fern\n{}", lines(|nm| format!("{},{}", nm - 379.0, value(nm)))),
            Outcome::Read,
            fern_alone,
        ),
    ];
    for (kind, text, ..) in &cases {
        assert!(read(text).assumptions.iter().any(|one| one.contains("not used")), "{kind}");
    }
    all(cases);
}

#[test]
fn one_row_of_values_asks_for_its_wavelengths() {
    let row: Vec<String> = grid().iter().map(|nm| format!("{:.4}", fern(*nm))).collect();
    for text in [row.join(","), row.join("\t"), format!("Spectrum\n{}\n", row.join(";"))] {
        let reading = read(&text);
        outcome(&reading, Outcome::Ask);
        assert_eq!(reading.questions[0].option, "--start and --step");
        assert_eq!((reading.spectra[0].peak_nm, reading.spectra[0].points), (None, Some(401)));
        let answers = Answers { start_nm: Some(380.0), step_nm: Some(1.0), ..Answers::default() };
        let reading = answered(&text, &answers);
        outcome(&reading, Outcome::Read);
        is_fern(&reading.spectra[0]);
    }
}

#[test]
fn logarithms_and_lumens_are_asked_about() {
    let named = |name: &str| format!("Wavelength (nm),{name}\n{}", pair(','));
    all(vec![
        ("dBm", named("Power (dBm)"), Outcome::Ask, &[("Power (dBm)", None)]),
        ("dB", named("dB"), Outcome::Ask, &[("dB", None)]),
        ("log", named("log10(Intensity)"), Outcome::Ask, &[("log10(Intensity)", None)]),
        ("lumens", named("lm/nm"), Outcome::Ask, &[("lm/nm", None)]),
        ("joules", named("Energy (J/nm)"), Outcome::Read, &[("Energy (J/nm)", Some(530.0))]),
    ]);
    assert!(read(&named("Energy (J/nm)")).assumptions.is_empty(), "a column of joules is no second axis");
}
