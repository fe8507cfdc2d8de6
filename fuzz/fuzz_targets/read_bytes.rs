//! The reader of spectra answers any bytes, with any answers, and what it returns holds together.
//! The first byte of an input chooses the answers.

#![no_main]

use files::read::{Answers, AxisUnit, Decimal, Ordinate, Outcome, Per, read_bytes};
use libfuzzer_sys::fuzz_target;

fuzz_target!(|input: &[u8]| {
    let (choice, bytes) = input.split_first().map_or((b'0', input), |(first, rest)| (*first, rest));
    let mut answers = Answers::default();
    match choice {
        b'1' => answers.axis = Some(AxisUnit::Ev),
        b'2' => answers.per = Some(Per::Cm1),
        b'3' => answers.decimal = Some(Decimal::Comma),
        b'4' => answers.ordinate = Some(Ordinate::Photons),
        b'5' => answers.columns = Some(vec![2, 3]),
        b'6' => (answers.start_nm, answers.step_nm) = (Some(380.0), Some(1.0)),
        _ => {}
    }
    let reading = read_bytes("fuzz", bytes, &answers);
    assert_eq!(reading.outcome == Outcome::Refused, reading.message.is_some());
    assert_eq!(reading.outcome == Outcome::Refused, reading.spectra.is_empty());
    for spectrum in &reading.spectra {
        let values = spectrum.spectrum.values();
        assert!(values.len() >= 2 && values.iter().all(|value| value.is_finite()));
    }
});
