//! Properties of the reader: nothing makes it panic, and what any dialect writes reads back equal. Data invented.

mod support;

use files::read::{Answers, AxisUnit, Decimal, Ordinate, Outcome, Per, Reading, read_bytes};
use proptest::prelude::*;
use support::{fern, gaussian};

/// What must hold of any reading.
fn sound(reading: &Reading) {
    assert_eq!(reading.outcome == Outcome::Refused, reading.message.is_some());
    assert_eq!(reading.outcome == Outcome::Refused, reading.spectra.is_empty());
    assert_eq!(reading.outcome == Outcome::Ask, !reading.questions.is_empty());
    assert!(reading.outcome != Outcome::Read || reading.warnings.is_empty());
    for spectrum in &reading.spectra {
        let (nm, values) = (spectrum.spectrum.wavelengths_nm(), spectrum.spectrum.values());
        assert!(nm.len() >= 5 && nm.len() == values.len() && nm.len() == spectrum.raw.values.len());
        assert!(nm.windows(2).all(|pair| pair[0] < pair[1]));
        assert!(nm.iter().chain(values).all(|value| value.is_finite()));
        for value in
            [spectrum.peak_nm, spectrum.fwhm_nm, spectrum.first_nm, spectrum.last_nm].into_iter().flatten()
        {
            assert!(value.is_finite() && value > 0.0);
        }
    }
}

fn answers() -> impl Strategy<Value = Answers> {
    let one = |values: &'static [AxisUnit]| proptest::option::weighted(0.3, proptest::sample::select(values));
    (
        one(&AxisUnit::ALL),
        proptest::option::weighted(0.2, proptest::sample::select(&Ordinate::ALL[..])),
        proptest::option::weighted(0.2, proptest::sample::select(&Per::ALL[..])),
        proptest::option::weighted(0.2, proptest::sample::select(&Decimal::ALL[..])),
        proptest::option::weighted(0.2, proptest::collection::vec(0_usize..6, 0..3)),
        proptest::option::weighted(0.2, (-10.0..900.0_f64, -2.0..5.0_f64)),
    )
        .prop_map(|(axis, ordinate, per, decimal, columns, steps)| Answers {
            axis,
            ordinate,
            per,
            decimal,
            columns,
            start_nm: steps.map(|one| one.0),
            step_nm: steps.map(|one| one.1),
        })
}

/// Pieces files are made of, good and bad.
fn pieces() -> impl Strategy<Value = String> {
    let piece = prop_oneof![
        8 => (300_u32..900, -1.0..5.0_f64, proptest::sample::select(&["\t", ";", ",", " ", ", "][..]))
            .prop_map(|(nm, value, separator)| format!("{nm}{separator}{value:.4}\n")),
        1 => proptest::sample::select(
            &["\"", "\n\n", "nm", "eV", "Wavelength (nm)", "Dark", "[Data]\n", "#", ",,,", "1e999", "NaN", "\t", ";", "\r", "1,234", "0,5", "µ", "\0", "(", "/", "-", "1.2.3", "##TITLE=", "<", "Power per eV\n"][..]
        )
        .prop_map(str::to_owned),
        1 => "[ -~]{0,20}\n".prop_map(|line| line),
    ];
    proptest::collection::vec(piece, 0..80).prop_map(|list| list.concat())
}

#[derive(Debug, Clone, Copy)]
struct Writing {
    separator: &'static str,
    comma: bool,
    exponent: bool,
    line_end: &'static str,
    header: bool,
    descending: bool,
    encoding: u8,
}

fn writing() -> impl Strategy<Value = Writing> {
    (
        proptest::sample::select(&["\t", ";", ",", " ", "  ", ", "][..]),
        any::<bool>(),
        any::<bool>(),
        proptest::sample::select(&["\n", "\r\n", "\r"][..]),
        any::<bool>(),
        any::<bool>(),
        0_u8..4,
    )
        .prop_map(|(separator, comma, exponent, line_end, header, descending, encoding)| Writing {
            separator,
            comma: comma && !separator.starts_with(','),
            exponent,
            line_end,
            header,
            descending,
            encoding,
        })
}

fn written(spectra: &[(Vec<f64>, &str)], nm: &[f64], how: Writing) -> Vec<u8> {
    let number = |value: f64| {
        let text = if how.exponent { format!("{value:e}") } else { format!("{value}") };
        if how.comma { text.replace('.', ",") } else { text }
    };
    let mut rows: Vec<String> = (0..nm.len())
        .map(|row| {
            let mut cells = vec![number(nm[row])];
            cells.extend(spectra.iter().map(|(values, _)| number(values[row])));
            cells.join(how.separator)
        })
        .collect();
    if how.descending {
        rows.reverse();
    }
    if how.header {
        let names: Vec<&str> =
            std::iter::once("Wavelength(nm)").chain(spectra.iter().map(|one| one.1)).collect();
        rows.insert(0, names.join(how.separator));
    }
    let text = rows.join(how.line_end) + how.line_end;
    match how.encoding {
        0 => text.into_bytes(),
        1 => [b"\xef\xbb\xbf".as_slice(), text.as_bytes()].concat(),
        2 => [0xfeff].into_iter().chain(text.encode_utf16()).flat_map(u16::to_le_bytes).collect(),
        _ => text.encode_utf16().flat_map(u16::to_be_bytes).collect(),
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(300))]

    #[test]
    fn any_bytes_are_answered(bytes in proptest::collection::vec(any::<u8>(), 0..600), answers in answers()) {
        sound(&read_bytes("any", &bytes, &answers));
    }

    #[test]
    fn any_text_of_the_trade_is_answered(text in pieces(), answers in answers()) {
        sound(&read_bytes("any", text.as_bytes(), &answers));
    }

    #[test]
    fn damaged_good_files_are_answered(
        how in writing(),
        damage in proptest::collection::vec((any::<prop::sample::Index>(), any::<u8>(), 0_usize..40), 0..20),
        cut in any::<prop::sample::Index>(),
        answers in answers(),
    ) {
        let nm: Vec<f64> = (0..81).map(|step| 380.0 + 5.0 * f64::from(step)).collect();
        let values = nm.iter().map(|&nm| fern(nm)).collect();
        let mut bytes = written(&[(values, "fern")], &nm, how);
        for (at, byte, gone) in damage {
            let at = at.index(bytes.len().max(1)).min(bytes.len());
            if gone > 20 && at + 1 < bytes.len() {
                let end = (at + gone - 20).min(bytes.len());
                bytes.drain(at..end);
            } else if at < bytes.len() {
                bytes[at] = byte;
            }
        }
        if byte_is_even(&bytes) {
            bytes.truncate(cut.index(bytes.len() + 1));
        }
        sound(&read_bytes("damaged.csv", &bytes, &answers));
    }

    #[test]
    fn what_any_dialect_writes_reads_back_equal(
        how in writing(),
        peaks in proptest::collection::vec((430.0..700.0_f64, 15.0..60.0_f64), 1..4),
        scale in 1e-6..1e6_f64,
    ) {
        let nm: Vec<f64> = (0..401).map(|step| 380.0 + f64::from(step)).collect();
        let names = ["Kingfisher", "Fern", "Rowan"];
        let spectra: Vec<(Vec<f64>, &str)> = peaks
            .iter()
            .zip(names)
            .map(|((peak, width), name)| (nm.iter().map(|&nm| scale * (1e-9 + gaussian(nm, *peak, *width))).collect(), name))
            .collect();
        let reading = read_bytes("written.csv", &written(&spectra, &nm, how), &Answers::default());
        sound(&reading);
        prop_assert!(matches!(reading.outcome, Outcome::Read | Outcome::Warned), "{:?} {:?}", reading.message, reading.questions);
        prop_assert_eq!(reading.spectra.len(), spectra.len());
        for (read, (values, name)) in reading.spectra.iter().zip(&spectra) {
            prop_assert_eq!(read.spectrum.wavelengths_nm(), nm.as_slice());
            prop_assert_eq!(read.spectrum.values(), values.as_slice());
            prop_assert!(!how.header || read.name == *name);
        }
    }
}

fn byte_is_even(bytes: &[u8]) -> bool {
    bytes.iter().fold(0_u8, |sum, byte| sum.wrapping_add(*byte)).is_multiple_of(2)
}
