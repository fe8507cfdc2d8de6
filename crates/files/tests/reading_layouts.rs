//! Spectra in the layouts instruments and spreadsheets write; all data invented.

mod support;

use files::read::{Answers, AxisUnit, Decimal, Ordinate, Outcome, Per, QUANTITIES, read_bytes};
use support::{answered, fern, gaussian, grid, is_fern, is_peak, outcome, read, rows, table};

const HC: f64 = 1_239.841_984_332;

/// A function of the wavelength in nm.
type Curve = fn(f64) -> f64;

#[track_caller]
fn one(text: &str, expected: Outcome, name: &str) -> files::read::Reading {
    let reading = read(text);
    outcome(&reading, expected);
    assert_eq!(reading.spectra.len(), 1);
    assert_eq!(reading.spectra[0].name, name);
    assert_eq!(reading.spectra[0].points, Some(401));
    is_fern(&reading.spectra[0]);
    assert!(reading.spectra[0].quantity.is_some_and(|quantity| QUANTITIES.contains(&quantity)));
    reading
}

#[test]
fn separators_and_decimal_marks() {
    for separator in ["\t", ";", ",", " ", "   ", ", ", "; ", " \t ", "|"] {
        one(
            &format!("Wavelength (nm){separator}Power (W/nm)\n{}", rows(separator))
                .replace("Wavelength (nm) ", "Wavelength(nm) "),
            Outcome::Read,
            "Power (W/nm)",
        );
        one(&rows(separator), Outcome::Read, "fern");
    }
    for separator in ["\t", ";", " ", "; "] {
        let text = rows(separator).replace('.', ",");
        let reading =
            one(&format!("Wellenlänge [nm]{separator}Intensität\n{text}"), Outcome::Read, "Intensität");
        assert_eq!(reading.facts.decimal, Some(Decimal::Comma));
        one(&text, Outcome::Read, "fern");
    }
    let quoted: String =
        grid().iter().map(|nm| format!("\"{nm},0\",\"{:.5}\"\n", fern(*nm)).replace('.', ",")).collect();
    one(&format!("\"Wavelength, nm\",\"Signal\"\n{quoted}"), Outcome::Read, "Signal");
}

#[test]
fn commas_that_separate_and_mark_decimals() {
    let half: String = (0..801)
        .map(|row| {
            let nm = 380.0 + 0.5 * f64::from(row);
            format!("{nm:.1},{:.4}\n", fern(nm)).replace('.', ",")
        })
        .collect();
    let whole = rows(",").replace('.', ",");
    for (text, points) in [(half, 801), (whole, 401)] {
        // The header tells the number of columns.
        let reading = read(&format!("Wavelength (nm),Signal\n{text}"));
        outcome(&reading, Outcome::Read);
        assert!(reading.assumptions[0].contains("Commas separate"));
        is_fern(&reading.spectra[0]);
        assert_eq!(reading.spectra[0].points, Some(points));
        // Without one it is asked.
        let reading = read(&text);
        outcome(&reading, Outcome::Ask);
        assert_eq!((reading.questions[0].option, reading.spectra[0].peak_nm), ("--decimal", None));
        let reading = answered(&text, &Answers { decimal: Some(Decimal::Comma), ..Answers::default() });
        outcome(&reading, Outcome::Read);
        is_fern(&reading.spectra[0]);
    }
    // Whole numbers are whole numbers.
    let counts: String =
        grid().iter().map(|nm| format!("{nm},{},{}\n", (900.0 * fern(*nm)) as u32, 7)).collect();
    let reading = read(&format!("nm,Fern,Other\n{counts}"));
    assert_eq!((reading.spectra.len(), reading.spectra[0].peak_nm), (2, Some(530.0)));
}

#[test]
fn numbers_as_instruments_write_them() {
    let exponent = |mark: &str, letter: &str| -> String {
        grid()
            .iter()
            .map(|nm| {
                format!("{nm}\t{:.4e}\n", fern(*nm) * 1e-3 + 1e-9).replace('e', letter).replace('.', mark)
            })
            .collect()
    };
    for (mark, letter) in [(".", "E"), (".", "e"), (".", "D"), (",", "E"), (",", "e")] {
        one(&format!("nm\tsignal\n{}", exponent(mark, letter)), Outcome::Read, "signal");
    }
    let grouped = |group: &str, decimal: &str| -> String {
        grid()
            .iter()
            .map(|nm| {
                let value = 4_000.0 * fern(*nm);
                let (whole, part) = (value.trunc() as u32, (value.fract() * 100.0) as u32);
                let whole = if whole >= 1000 {
                    format!("{}{group}{:03}", whole / 1000, whole % 1000)
                } else {
                    whole.to_string()
                };
                format!("{nm}{decimal}5\t{whole}{decimal}{part:02}\n")
            })
            .collect()
    };
    for (group, decimal) in
        [(",", "."), (".", ","), (" ", ","), ("'", "."), ("\u{a0}", ","), ("\u{202f}", ",")]
    {
        let reading = read(&format!("Wavelength (nm)\tPower (W)\n{}", grouped(group, decimal)));
        outcome(&reading, Outcome::Read);
        is_peak(&reading.spectra[0], 530.5, 32.0);
    }
}

#[test]
fn encodings_and_line_ends() {
    let text = format!("Wellenlänge (nm)\tIntensität\n{}", rows("\t"));
    let utf16 = |big: bool, mark: bool, text: &str| -> Vec<u8> {
        let units = mark.then_some(0xfeff).into_iter().chain(text.encode_utf16());
        units.flat_map(|unit| if big { unit.to_be_bytes() } else { unit.to_le_bytes() }).collect()
    };
    let latin: Vec<u8> = text.chars().map(|c| u8::try_from(u32::from(c)).unwrap()).collect();
    let utf8_marked = [b"\xef\xbb\xbf".as_slice(), text.as_bytes()].concat();
    for (bytes, expected) in [
        (text.clone().into_bytes(), Outcome::Read),
        (utf8_marked, Outcome::Read),
        (utf16(false, true, &text), Outcome::Read),
        (utf16(true, true, &text), Outcome::Read),
        (utf16(false, false, &text), Outcome::Read),
        (utf16(true, false, &text), Outcome::Read),
        (latin, Outcome::Warned),
        (text.replace('\n', "\r\n").into_bytes(), Outcome::Read),
        (text.replace('\n', "\r").into_bytes(), Outcome::Read),
        (format!("{text}\u{1a}").into_bytes(), Outcome::Read),
    ] {
        let reading = read_bytes("fern.txt", &bytes, &Answers::default());
        outcome(&reading, expected);
        assert_eq!(reading.spectra[0].name, "Intensität");
        is_fern(&reading.spectra[0]);
    }
    let (sjis, ..) = encoding_rs::SHIFT_JIS.encode("波長(nm),強度\n");
    let reading = read_bytes("fern.csv", &[&sjis, rows(",").as_bytes()].concat(), &Answers::default());
    outcome(&reading, Outcome::Warned);
    assert_eq!((reading.spectra[0].name.as_str(), reading.facts.encoding), ("強度", "Shift_JIS"));
}

#[test]
fn header_blocks_marks_units_and_footers() {
    let tab = rows("\t");
    for (head, name) in [
        (
            "Sample: fern green\nDate: 2031-05-12\nIntegration: 50 ms\nY: relative spectral power\n[Data]\n",
            "fern",
        ),
        (
            "Sample\tfern green\nAverages\t10\nBoxcar\t3\nTemperature\t25.0\n\nWavelength\tSignal\nnm\ta.u.\n",
            "Signal",
        ),
        ("# invented\n# nm\tW/nm\n", "W/nm"),
        ("% Wavelength (nm)\tFern\n", "Fern"),
        ("// a remark\n! another, with a comma\n' and a third\n", "fern"),
        ("; a remark\n", "fern"),
        ("401\n", "fern"),
        ("Data from the invented spectrometer No. 12\n>>>>>Begin Spectral Data<<<<<\n", "fern"),
        ("Wavelength (nm), Irradiance (µW/cm²/nm)\n", "Irradiance (µW/cm²/nm)"),
        ("λ / nm\tΦ / mW nm⁻¹\n", "Φ / mW nm⁻¹"),
        ("Longueur d'onde (nm)\tPuissance (W/nm)\n", "Puissance (W/nm)"),
        ("Sample:\tfern\nOperator:\tnobody\nGain:\t3\n", "fern"),
    ] {
        one(&format!("{head}{tab}"), Outcome::Read, name);
        one(&format!("{head}{tab}\nPeak: 530 nm\nEnd of data\n"), Outcome::Read, name);
    }
    one(
        &format!(
            "\"wl\" \"power\"\n{}",
            grid()
                .iter()
                .enumerate()
                .map(|(i, nm)| format!("\"{}\" {nm} {:.5}\n", i + 1, fern(*nm)))
                .collect::<String>()
        ),
        Outcome::Read,
        "power",
    );
    one(
        &format!(
            ",wavelength_nm,power\n{}",
            grid()
                .iter()
                .enumerate()
                .map(|(i, nm)| format!("{i},{nm},{:.5}\n", fern(*nm)))
                .collect::<String>()
        ),
        Outcome::Read,
        "power",
    );
    one(&format!("Wavelength,Power,\nnm,W/nm,\n{}", rows(",").replace('\n', ",\n")), Outcome::Read, "Power");
    one(&rows(" ").lines().map(|line| format!("   {line}  \n\n")).collect::<String>(), Outcome::Read, "fern");
    one(
        &format!(
            "Power (W/nm);Wavelength (nm)\n{}",
            grid().iter().map(|nm| format!("{:.5};{nm}\n", fern(*nm))).collect::<String>()
        ),
        Outcome::Read,
        "Power (W/nm)",
    );
}

#[test]
fn several_emitters_in_one_file() {
    let peaks = [455.0, 530.0, 620.0];
    let common = |head: &str, separator: &str| -> String {
        let body: String = grid()
            .iter()
            .map(|nm| {
                format!(
                    "{nm}{separator}{}\n",
                    peaks.map(|peak| format!("{:.6}", gaussian(*nm, peak, 32.0))).join(separator)
                )
            })
            .collect();
        format!("{head}{body}")
    };
    let check = |text: &str, names: [&str; 3]| {
        let reading = read(text);
        outcome(&reading, Outcome::Read);
        assert_eq!(reading.spectra.iter().map(|one| one.name.as_str()).collect::<Vec<_>>(), names);
        for (spectrum, peak) in reading.spectra.iter().zip(peaks) {
            is_peak(spectrum, peak, 32.0);
        }
    };
    check(&common("wavelength_nm,Kingfisher,Fern,Rowan\n", ","), ["Kingfisher", "Fern", "Rowan"]);
    check(&common("Wavelength (nm);10 mA;20 mA;50 mA\n", ";"), ["10 mA", "20 mA", "50 mA"]);
    check(&common("Wavelength (nm)\t10\t20\t50\n", "\t"), ["10", "20", "50"]);
    check(&common("\t10\t20\t50\n", "\t"), ["10", "20", "50"]);
    check(&common("nm,R,G,B\n", ","), ["R", "G", "B"]);
    check(&common("", ","), ["fern 1", "fern 2", "fern 3"]);
    check(&common("Wavelength,Blue,Green,Red\nnm,W/nm,W/nm,W/nm\n", ","), ["Blue", "Green", "Red"]);
    check(
        &common("Sample,day,night,dusk\nWavelength,Power,Power,Power\nnm,W/nm,W/nm,W/nm\n", ","),
        ["day", "night", "dusk"],
    );
    // Pairs of unequal length, with and without closing separators.
    let pairs = |close: bool| -> String {
        let lines = (0..401).map(|row: usize| {
            let cells: Vec<String> = peaks
                .iter()
                .enumerate()
                .map(|(emitter, peak)| {
                    let nm = 380.0 + row as f64;
                    if row < 401 - 40 * emitter {
                        format!("{nm},{:.6}", gaussian(nm, *peak, 32.0))
                    } else {
                        ",".to_owned()
                    }
                })
                .collect();
            let line = cells.join(",");
            if close { line } else { line.trim_end_matches(',').to_owned() }
        });
        lines.map(|line| line + "\n").collect()
    };
    for close in [true, false] {
        check(
            &format!("Kingfisher,,Fern,,Rowan,\nnm,rel,nm,rel,nm,rel\n{}", pairs(close)),
            ["Kingfisher", "Fern", "Rowan"],
        );
        check(&format!("nm,Kingfisher,nm,Fern,nm,Rowan\n{}", pairs(close)), ["Kingfisher", "Fern", "Rowan"]);
        check(&pairs(close), ["fern 1", "fern 2", "fern 3"]);
    }
    // On its side.
    let side = |head: bool, separator: &str| -> String {
        let row = |label: &str, value: &dyn Fn(f64) -> String| {
            let cells: Vec<String> = grid().iter().map(|nm| value(*nm)).collect();
            if head {
                format!("{label}{separator}{}\n", cells.join(separator))
            } else {
                format!("{}\n", cells.join(separator))
            }
        };
        let mut text = row("Wavelength (nm)", &|nm| nm.to_string());
        for (name, peak) in ["Kingfisher", "Fern", "Rowan"].iter().zip(peaks) {
            text += &row(name, &|nm| format!("{:.6}", gaussian(nm, peak, 32.0)));
        }
        text
    };
    for separator in [",", "\t", ";"] {
        check(&side(true, separator), ["Kingfisher", "Fern", "Rowan"]);
        check(&side(false, separator), ["fern 1", "fern 2", "fern 3"]);
    }
    // One table below the other.
    let blocks: String = ["Kingfisher", "Fern", "Rowan"]
        .iter()
        .zip(peaks)
        .map(|(name, peak)| format!("[{name}]\n{}\n", table("\t", |nm| gaussian(nm, peak, 32.0))))
        .collect();
    check(&blocks, ["Kingfisher", "Fern", "Rowan"]);
}

#[test]
fn order_and_duplicates() {
    let mut lines: Vec<String> = rows(",").lines().map(str::to_owned).collect();
    lines.reverse();
    one(&format!("nm,rel\n{}\n", lines.join("\n")), Outcome::Read, "rel");
    // A fixed shuffle: 401 is prime, so 100·i mod 401 visits every row.
    let shuffled: Vec<&str> = (0..401).map(|index| lines[index * 100 % 401].as_str()).collect();
    let reading = one(&format!("nm,rel\n{}\n", shuffled.join("\n")), Outcome::Read, "rel");
    assert!(reading.assumptions.iter().any(|one| one.contains("sorted")));
    one(&shuffled.join("\n"), Outcome::Read, "fern");
    let doubled: String = rows(",").lines().map(|line| format!("{line}\n{line}\n")).collect();
    let reading = one(&format!("nm,rel\n{doubled}"), Outcome::Warned, "rel");
    assert!(reading.warnings[0].contains("averag"));
}

#[test]
fn axes_in_every_unit_and_conversions_listed() {
    let cases: [(&str, &str, AxisUnit, Curve); 6] = [
        ("Wavelength (nm)", "Power (W/nm)", AxisUnit::Nm, |nm| nm),
        ("Wavelength (µm)", "Power (W/nm)", AxisUnit::Um, |nm| nm / 1e3),
        ("Wavelength (Å)", "Power (W/Å)", AxisUnit::Angstrom, |nm| nm * 10.0),
        ("Wavelength (um)", "Power (W/um)", AxisUnit::Um, |nm| nm / 1e3),
        ("Wavenumber (cm-1)", "Power (W/nm)", AxisUnit::Cm1, |nm| 1e7 / nm),
        ("Energy (eV)", "Power (W/nm)", AxisUnit::Ev, |nm| HC / nm),
    ];
    for (axis, ordinate, unit, from_nm) in cases {
        let body: String =
            grid().iter().map(|nm| format!("{:.9},{:.6}\n", from_nm(*nm), fern(*nm))).collect();
        let reading = one(&format!("{axis},{ordinate}\n{body}"), Outcome::Read, ordinate);
        assert_eq!(
            reading.assumptions.iter().any(|one| one.contains("Axis converted")),
            unit != AxisUnit::Nm,
            "{axis}"
        );
        assert_eq!(reading.spectra[0].raw.axis_unit, unit);
        // The unit can be found by the numbers where only one makes sense.
        let bare = read(&body);
        if unit.is_wavelength() {
            outcome(&bare, Outcome::Read);
            is_fern(&bare.spectra[0]);
            assert!(bare.assumptions.iter().any(|one| one.contains("not stated")));
        } else {
            outcome(&bare, Outcome::Ask);
            assert!(bare.questions.iter().any(|one| one.option == "--per"), "{axis}");
        }
    }
}

#[test]
fn densities_and_photons_become_power_per_nm() {
    let cases: [(&str, &str, Curve); 8] = [
        ("Wavelength (nm)", "Photon flux (photons/s/nm)", |nm| fern(nm) * nm),
        ("Wavelength (nm)", "µmol m⁻² s⁻¹ nm⁻¹", |nm| fern(nm) * nm),
        ("Wavelength (nm)", "Power (mW/eV)", |nm| fern(nm) * nm * nm),
        ("Energy (eV)", "Power (rel. per eV)", |nm| fern(nm) * nm * nm),
        ("Energy (eV)", "Photons per eV", |nm| fern(nm) * nm.powi(3)),
        ("Wavenumber (1/cm)", "W/cm-1", |nm| fern(nm) * nm * nm),
        ("Wavenumber [cm⁻¹]", "photons per cm-1", |nm| fern(nm) * nm.powi(3)),
        ("Energie [eV]", "Leistung pro eV", |nm| fern(nm) * nm * nm),
    ];
    for (axis, ordinate, value) in cases {
        let body: String = grid()
            .iter()
            .map(|nm| {
                let x = if axis.starts_with("Wavel") {
                    *nm
                } else if axis.contains("eV") {
                    HC / nm
                } else {
                    1e7 / nm
                };
                format!("{x:.9}\t{:.9e}\n", value(*nm))
            })
            .collect();
        let reading = one(&format!("{axis}\t{ordinate}\n{body}"), Outcome::Read, ordinate);
        assert!(reading.assumptions.iter().any(|one| one.contains("Values converted")), "{ordinate}");
        let values = reading.spectra[0].spectrum.values();
        let scale = values.iter().copied().fold(0.0, f64::max);
        for (nm, got) in reading.spectra[0].spectrum.wavelengths_nm().iter().zip(values) {
            assert!((got / scale - fern(*nm)).abs() < 2e-4, "{ordinate} {nm}");
        }
    }
}

#[test]
fn questions_name_the_option_that_answers_them() {
    let columns = |head: &str| -> String {
        format!(
            "{head}\n{}",
            grid()
                .iter()
                .map(|nm| format!("{nm},{:.5},{:.5},{:.5}\n", fern(*nm), 0.01, 1.0 + fern(*nm)))
                .collect::<String>()
        )
    };
    // Energy without saying per what.
    let energy: String = grid().iter().map(|nm| format!("{:.6},{:.6}\n", HC / nm, fern(*nm))).collect();
    let text = format!("Energy (eV),Intensity\n{energy}");
    let reading = read(&text);
    outcome(&reading, Outcome::Ask);
    assert_eq!(reading.questions[0].option, "--per");
    let best = &reading.spectra[0];
    assert_eq!((best.peak_nm, best.fwhm_nm, best.quantity, best.points), (None, None, None, Some(401)));
    assert!(best.first_nm.is_some());
    let reading = answered(&text, &Answers { per: Some(Per::Nm), ..Answers::default() });
    outcome(&reading, Outcome::Read);
    is_fern(&reading.spectra[0]);
    // Metres.
    let metres: String = grid().iter().map(|nm| format!("{:e},{:.6}\n", nm * 1e-9, fern(*nm))).collect();
    for head in ["", "Wavelength (m),Power\n"] {
        let text = format!("{head}{metres}");
        let reading = read(&text);
        outcome(&reading, Outcome::Ask);
        assert_eq!((reading.questions[0].option, reading.spectra[0].peak_nm), ("--axis", None));
        let reading = answered(&text, &Answers { axis: Some(AxisUnit::M), ..Answers::default() });
        outcome(&reading, Outcome::Read);
        is_fern(&reading.spectra[0]);
    }
    // Header and values disagree.
    let micro: String = grid().iter().map(|nm| format!("{},{:.6}\n", nm / 1e3, fern(*nm))).collect();
    let text = format!("Wavelength (nm),Power\n{micro}");
    let reading = read(&text);
    outcome(&reading, Outcome::Ask);
    assert_eq!((reading.questions[0].option, reading.questions[0].choices[0].as_str()), ("--axis", "um"));
    outcome(&answered(&text, &Answers { axis: Some(AxisUnit::Um), ..Answers::default() }), Outcome::Read);
    // No axis.
    let bare: String = grid().iter().map(|nm| format!("{:.6}\n", fern(*nm))).collect();
    for text in [bare.clone(), format!("Intensity\n{bare}"), bare.replace('.', ",")] {
        let reading = read(&text);
        outcome(&reading, Outcome::Ask);
        assert!(reading.questions[0].option.contains("--start"));
        assert_eq!(
            (reading.spectra[0].peak_nm, reading.spectra[0].first_nm, reading.spectra[0].points),
            (None, None, Some(401))
        );
        let reading =
            answered(&text, &Answers { start_nm: Some(380.0), step_nm: Some(1.0), ..Answers::default() });
        outcome(&reading, Outcome::Read);
        is_fern(&reading.spectra[0]);
    }
    let pixels: String =
        grid().iter().enumerate().map(|(index, nm)| format!("{index},{:.6}\n", fern(*nm))).collect();
    for head in ["", "Pixel,Signal\n"] {
        let reading = read(&format!("{head}{pixels}"));
        outcome(&reading, Outcome::Ask);
        assert!(reading.questions[0].option.contains("--start"));
        outcome(
            &answered(
                &format!("{head}{pixels}"),
                &Answers { start_nm: Some(380.0), step_nm: Some(1.0), ..Answers::default() },
            ),
            Outcome::Read,
        );
    }
    // Commas that may be decimal or thousands.
    let commas: String = grid()
        .iter()
        .map(|nm| {
            let value = (1000.0 + 8000.0 * fern(*nm)) as u32;
            format!("{nm};{},{:03}\n", value / 1000, value % 1000)
        })
        .collect();
    let reading = read(&commas);
    outcome(&reading, Outcome::Ask);
    assert_eq!((reading.questions[0].option, reading.spectra[0].first_nm), ("--decimal", Some(380.0)));
    for decimal in Decimal::ALL {
        let reading = answered(&commas, &Answers { decimal: Some(decimal), ..Answers::default() });
        assert_ne!(reading.outcome, Outcome::Ask);
        assert!((reading.spectra[0].peak_nm.unwrap() - 530.0).abs() < 1.0);
    }
    // Marks and separators that change.
    let changed: String = rows("\t")
        .lines()
        .enumerate()
        .map(
            |(index, line)| {
                if index < 200 { format!("{line}\n") } else { format!("{}\n", line.replace('.', ",")) }
            },
        )
        .collect();
    let reading = read(&changed);
    outcome(&reading, Outcome::Ask);
    assert_eq!(reading.questions[0].option, "--decimal");
    let changed: String = rows("\t")
        .lines()
        .enumerate()
        .map(
            |(index, line)| {
                if index < 200 { format!("{line}\n") } else { format!("{}\n", line.replace('\t', ";")) }
            },
        )
        .collect();
    outcome(&read(&changed), Outcome::Ask);
    // Columns with names that say they are no emission.
    let reading = read(&columns("Wavelength (nm),Sample,Dark,Reference"));
    outcome(&reading, Outcome::Ask);
    assert_eq!((reading.questions[0].option, reading.questions[0].choices[0].as_str()), ("--columns", "2"));
    assert_eq!(reading.spectra.len(), 1);
    is_fern(&reading.spectra[0]);
    let reading = answered(
        &columns("Wavelength (nm),Sample,Dark,Reference"),
        &Answers { columns: Some(vec![2, 4]), ..Answers::default() },
    );
    assert_eq!(
        reading.spectra.iter().map(|one| one.name.as_str()).collect::<Vec<_>>(),
        ["Sample", "Reference"]
    );
    assert_ne!(reading.outcome, Outcome::Ask);
    // What is no emission.
    for head in ["Wavelength (nm),Transmission (%)", "nm,Absorbance", "Wellenlänge (nm),Reflexion"] {
        let text = format!("{head}\n{}", rows(","));
        let reading = read(&text);
        outcome(&reading, Outcome::Ask);
        assert_eq!((reading.questions[0].option, reading.spectra[0].quantity), ("--ordinate", None));
        outcome(
            &answered(&text, &Answers { ordinate: Some(Ordinate::Power), ..Answers::default() }),
            Outcome::Read,
        );
    }
}

#[test]
fn what_is_unstated_is_assumed_and_listed() {
    for name in ["Intensity", "Signal", "a.u.", "Detector (V)", "Current (A)", "Fern"] {
        let reading = one(&format!("Wavelength (nm),{name}\n{}", rows(",")), Outcome::Read, name);
        assert!(reading.assumptions.iter().any(|one| one.contains("relative power per nm")), "{name}");
        assert_eq!(reading.spectra[0].quantity, Some("power per nm (relative)"));
    }
    let reading = one(&format!("Wavelength (nm),Counts\n{}", rows(",")), Outcome::Warned, "Counts");
    assert!(
        reading.warnings[0].contains("counts")
            && reading.assumptions.iter().any(|one| one.contains("relative power per nm"))
    );
    let reading = one(&format!("Wavelength (nm),Raw\n{}", rows(",")), Outcome::Warned, "Raw");
    assert!(reading.warnings[0].contains("raw"));
    let reading = one(&format!("Wavelength (nm),Power (W/nm)\n{}", rows(",")), Outcome::Read, "Power (W/nm)");
    assert_eq!((reading.assumptions.len(), reading.spectra[0].quantity), (0, Some("power per nm")));
}

#[test]
fn a_dark_offset_is_told_and_left() {
    let text = format!("Wavelength (nm),Power (W/nm)\n{}", table(",", |nm| 0.1 + fern(nm)));
    let reading = read(&text);
    outcome(&reading, Outcome::Warned);
    let spectrum = &reading.spectra[0];
    is_fern(spectrum);
    assert!((spectrum.dark.unwrap().level - 0.1).abs() < 1e-4);
    assert!((spectrum.spectrum.values()[0] - 0.1).abs() < 1e-4);
    assert!(spectrum.offered.iter().any(
        |step| matches!(step, project::Correction::SubtractDark { level } if (level - 0.1).abs() < 1e-4)
    ));
}
