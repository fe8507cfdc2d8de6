//! TM-27 XML, JCAMP-DX and project files; samples written by hand from the published grammars, data invented.

mod support;

use files::read::{Answers, AxisUnit, Ordinate, Outcome, Reading, read_bytes};
use files::tm27::{Tm27Header, Tm27Quantity, tm27_text};
use proptest::prelude::*;
use std::fmt::Write;
use support::{fern, grid, is_fern, is_peak, outcome};

fn read(text: &str) -> Reading {
    read_bytes("fern.spdx", text.as_bytes(), &Answers::default())
}

fn tm27(quantity: &str, more: &str) -> String {
    let mut text = format!(
        "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n<!-- invented -->\n<IESTM2714 xmlns=\"iestm2714\" version=\"1.0\">\n<Header><Description>Fern &amp; moss</Description>\
         <DocumentCreator>nobody</DocumentCreator><DocumentCreationDate>2031-05-12</DocumentCreationDate></Header>\n<SpectralDistribution>\n\
         <SpectralQuantity>{quantity}</SpectralQuantity>{more}\n"
    );
    for nm in grid() {
        text += &format!("<SpectralData wavelength=\"{nm}\">{:.5}</SpectralData>\n", fern(nm));
    }
    text + "</SpectralDistribution>\n</IESTM2714>\n"
}

#[test]
fn tm27_by_its_quantity() {
    for (quantity, expected, word) in [
        ("flux", Outcome::Read, "power per nm"),
        ("irradiance", Outcome::Read, "power per nm"),
        ("relative", Outcome::Read, "power per nm (relative)"),
        ("other", Outcome::Read, "power per nm (relative)"),
    ] {
        let reading = read(&tm27(
            quantity,
            "<BandwidthFWHM>2.5</BandwidthFWHM><BandwidthCorrected>true</BandwidthCorrected>",
        ));
        outcome(&reading, expected);
        assert_eq!(reading.spectra[0].quantity, Some(word), "{quantity}");
        assert_eq!((reading.spectra[0].name.as_str(), reading.spectra[0].points), ("Fern & moss", Some(401)));
        is_fern(&reading.spectra[0]);
    }
    for quantity in ["transmittance", "reflectance", "absorptance", "R-Factor", "T-Factor"] {
        let reading = read(&tm27(quantity, ""));
        outcome(&reading, Outcome::Ask);
        assert_eq!((reading.questions[0].option, reading.spectra[0].quantity), ("--ordinate", None));
        let answers = Answers { ordinate: Some(Ordinate::Power), ..Answers::default() };
        outcome(&read_bytes("fern.spdx", tm27(quantity, "").as_bytes(), &answers), Outcome::Read);
    }
    let utf16: Vec<u8> =
        [0xfeff].into_iter().chain(tm27("flux", "").encode_utf16()).flat_map(u16::to_le_bytes).collect();
    outcome(&read_bytes("fern.spdx", &utf16, &Answers::default()), Outcome::Read);
}

#[test]
fn bad_tm27_files_are_refused_with_a_sentence() {
    let good = tm27("flux", "");
    let entity = "<!DOCTYPE IESTM2714 [<!ENTITY a \"1\"><!ENTITY b \"&a;&a;&a;&a;&a;&a;&a;&a;\">]>\n<IESTM2714 version=\"1.0\"><SpectralDistribution>";
    let bomb = format!(
        "{entity}{}</SpectralDistribution></IESTM2714>",
        "<SpectralData wavelength=\"500\">&b;</SpectralData>".repeat(50)
    );
    let external = good
        .replace("nobody", "&secret;")
        .replace("<IESTM2714", "<!DOCTYPE a [<!ENTITY secret SYSTEM \"file:///etc/hostname\">]>\n<IESTM2714");
    for (kind, text, word) in [
        ("truncated", good[..good.len() / 2].to_owned(), "expected"),
        ("no data", good.replace("SpectralData", "Note"), "SpectralData"),
        ("another version", good.replace("version=\"1.0\">\n<Header", "version=\"7.0\">\n<Header"), "7.0"),
        (
            "another root",
            good.replace("<IESTM2714 ", "<Wrapper ").replace("</IESTM2714>", "</Wrapper>"),
            "IESTM2714|XML",
        ),
        ("words for values", good.replace(">0.0", ">word"), "unreadable"),
        ("deep nesting", format!("<IESTM2714 version=\"1.0\">{}", "<a>".repeat(100_000)), "nested"),
        ("entity bomb", bomb, "expected"),
        ("all zero", good.replace("0.", "0.0000000"), "expected"),
    ] {
        let reading = read(&text);
        let refused = reading.outcome == Outcome::Refused
            && reading
                .message
                .as_ref()
                .is_some_and(|message| word.split('|').any(|word| message.contains(word)));
        assert!(refused || kind == "all zero", "{kind}: {:?} {:?}", reading.outcome, reading.message);
    }
    let reading = read(&external);
    outcome(&reading, Outcome::Read);
    assert_eq!(reading.spectra[0].name, "Fern & moss");
}

fn jcamp(head: &str, data: &str) -> String {
    format!(
        "##TITLE=Fern $$ invented\n##JCAMP-DX=4.24\n##DATA TYPE=UV/VIS SPECTRUM\n##ORIGIN=nowhere\n##OWNER=nobody\n{head}{data}##END=\n"
    )
}

#[test]
fn jcamp_in_pairs_lines_and_packed_digits() {
    let pairs: String = grid()
        .iter()
        .map(|nm| format!("{nm}, {:.6}; ", fern(*nm)))
        .collect::<String>()
        .replace("; 4", ";\n4");
    let text = jcamp(
        "##XUNITS=NANOMETERS\n##YUNITS=ARBITRARY UNITS\n##XFACTOR=1\n##YFACTOR=1\n##NPOINTS=401\n",
        &format!("##XYPOINTS=(XY..XY)\n{pairs}\n"),
    );
    let whole: Vec<i64> = grid().iter().map(|nm| (1e4 * fern(*nm)).round() as i64).collect();
    let evenly = |x_units: &str, y_units: &str| {
        format!(
            "##XUNITS={x_units}\n##YUNITS={y_units}\n##XFACTOR=1.0\n##YFACTOR=1e-4\n##FIRSTX=380\n##LASTX=780\n##NPOINTS=401\n##X Y-DATA=(X++(Y..Y))\n"
        )
    };
    let plain: String = whole
        .chunks(10)
        .enumerate()
        .map(|(line, chunk)| {
            format!("{}{}\n", 380 + 10 * line, chunk.iter().map(|y| format!(" {y}")).collect::<String>())
        })
        .collect();
    let signed: String = whole
        .chunks(10)
        .enumerate()
        .map(|(line, chunk)| {
            format!("{}{}\n", 380 + 10 * line, chunk.iter().map(|y| format!("{y:+}")).collect::<String>())
        })
        .collect();
    let squeezed = |y: i64, zero: char, up: char, down: char| {
        let digits = y.unsigned_abs().to_string();
        let (first, rest) = digits.split_at(1);
        let first = first.parse::<u8>().unwrap();
        let lead = if first == 0 {
            zero
        } else if y > 0 {
            (up as u8 + first - 1) as char
        } else {
            (down as u8 + first - 1) as char
        };
        format!("{lead}{rest}")
    };
    let sqz: String = whole
        .chunks(10)
        .enumerate()
        .map(|(line, chunk)| {
            format!(
                "{}{}\n",
                380 + 10 * line,
                chunk.iter().map(|y| squeezed(*y, '@', 'A', 'a')).collect::<String>()
            )
        })
        .collect();
    let mut dif = String::new();
    let mut from = 0;
    while from < whole.len() {
        let to = (from + 12).min(whole.len());
        // Every line starts with the last value of the line before.
        let start = from.saturating_sub(1);
        write!(dif, "{}{}", 380 + start, squeezed(whole[start], '@', 'A', 'a')).unwrap();
        for index in start + 1..to {
            dif += &squeezed(whole[index] - whole[index - 1], '%', 'J', 'j');
        }
        dif.push('\n');
        from = to;
    }
    for (kind, text) in [
        ("pairs", text),
        ("plain", jcamp(&evenly("NANOMETERS", "INTENSITY"), &plain)),
        ("signed", jcamp(&evenly("nanometers", ""), &signed)),
        ("squeezed", jcamp(&evenly("Nanometers", "RELATIVE INTENSITY"), &sqz)),
        ("differences", jcamp(&evenly("NANOMETERS", "ARBITRARY UNITS"), &dif)),
    ] {
        let reading = read_bytes("fern.jdx", text.as_bytes(), &Answers::default());
        outcome(&reading, Outcome::Read);
        assert_eq!(
            (reading.spectra[0].name.as_str(), reading.spectra[0].points),
            ("Fern", Some(401)),
            "{kind}"
        );
        is_fern(&reading.spectra[0]);
        assert!(reading.assumptions.iter().any(|one| one.contains("relative power per nm")), "{kind}");
        for (value, nm) in reading.spectra[0].spectrum.values().iter().zip(grid()) {
            assert!((value - fern(nm)).abs() < 6e-5, "{kind} {nm}");
        }
    }
    let reading = read_bytes(
        "fern.jdx",
        jcamp(&evenly("NANOMETERS", "ABSORBANCE"), &plain).as_bytes(),
        &Answers::default(),
    );
    outcome(&reading, Outcome::Ask);
    assert_eq!(reading.questions[0].option, "--ordinate");
    let reading = read_bytes(
        "fern.jdx",
        jcamp(&evenly("NANOMETERS", "COUNTS"), &plain).as_bytes(),
        &Answers::default(),
    );
    outcome(&reading, Outcome::Warned);
    let wavenumbers = "##XUNITS=1/CM\n##YUNITS=ARBITRARY UNITS\n##FIRSTX=12800\n##LASTX=26300\n##NPOINTS=136\n##XYDATA=(X++(Y..Y))\n";
    let lines: String = (0..136)
        .map(|row| {
            let x = 12_800.0 + 100.0 * f64::from(row);
            format!("{x} {:.6}\n", fern(1e7 / x))
        })
        .collect();
    let reading = read_bytes("fern.jdx", jcamp(wavenumbers, &lines).as_bytes(), &Answers::default());
    outcome(&reading, Outcome::Ask);
    assert_eq!((reading.questions[0].option, reading.spectra[0].raw.axis_unit), ("--per", AxisUnit::Cm1));
    let answers = Answers { per: Some(files::read::Per::Nm), ..Answers::default() };
    is_peak(&read_bytes("fern.jdx", jcamp(wavenumbers, &lines).as_bytes(), &answers).spectra[0], 529.7, 32.0);
    for (kind, text, word) in [
        ("no data", jcamp("", ""), "expected"),
        ("peak table", jcamp("", "##PEAK TABLE=(XY..XY)\n450,1\n"), "PEAK"),
        ("another form", jcamp("", "##XYDATA=(XYZ)\n1 2 3\n"), "(XYZ)"),
        (
            "words",
            jcamp(&evenly("NANOMETERS", ""), "380 ?? !! // words\n390 none of these\n400 are numbers\n"),
            "expected",
        ),
    ] {
        let reading = read_bytes("fern.jdx", text.as_bytes(), &Answers::default());
        assert!(
            reading.outcome == Outcome::Refused && reading.message.as_ref().unwrap().contains(word),
            "{kind}: {:?}",
            reading.message
        );
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(120))]

    #[test]
    fn tm27_reads_back_what_was_written(
        points in proptest::collection::btree_map(200_000_u32..1_200_000, 1e-12..1e6_f64, 5..200),
        description in "[ -~µäé<>&\"']{0,40}",
    ) {
        let nm: Vec<f64> = points.keys().map(|&key| f64::from(key) / 1000.0).chain([1250.0]).collect();
        let mut values: Vec<f64> = points.values().copied().collect();
        values.push(0.5);
        prop_assume!(nm.iter().any(|nm| (380.0..=780.0).contains(nm)));
        let header = Tm27Header { description: description.clone(), document_creator: "nobody".into(), document_creation_date: "2031-05-12".into(), comments: "<&>".into() };
        let text = tm27_text(&header, Tm27Quantity::Flux, &nm, &values).unwrap();
        let reading = read_bytes("written.spdx", text.as_bytes(), &Answers::default());
        prop_assert_ne!(reading.outcome, Outcome::Refused, "{:?}", reading.message);
        prop_assert_eq!(reading.spectra[0].spectrum.wavelengths_nm(), nm.as_slice());
        prop_assert_eq!(reading.spectra[0].spectrum.values(), values.as_slice());
        if !description.trim().is_empty() {
            prop_assert_eq!(reading.spectra[0].name.as_str(), description.trim());
        }
    }

    #[test]
    fn damaged_marked_files_are_answered(
        which in 0..3,
        damage in proptest::collection::vec((any::<prop::sample::Index>(), any::<u8>()), 0..30),
        cut in any::<prop::sample::Index>(),
    ) {
        let mut bytes = match which {
            0 => tm27("flux", "").into_bytes(),
            1 => jcamp("##XUNITS=NANOMETERS\n##FIRSTX=380\n##LASTX=780\n##NPOINTS=41\n", "##XYDATA=(X++(Y..Y))\n380A0J0K0%l0T\n450@J5K5ZA2B2\n520+5-5+9E5\n").into_bytes(),
            _ => jcamp("##XUNITS=NANOMETERS\n", "##XYPOINTS=(XY..XY)\n380,1;390,2;400,3\n410,4 420,5 430,6\n").into_bytes(),
        };
        for (at, byte) in damage {
            let at = at.index(bytes.len());
            bytes[at] = byte;
        }
        if which > 0 || cut.index(2) == 0 {
            bytes.truncate(cut.index(bytes.len() + 1));
        }
        let reading = read_bytes("damaged", &bytes, &Answers::default());
        prop_assert_eq!(reading.outcome == Outcome::Refused, reading.message.is_some());
    }
}

#[test]
fn a_project_is_a_file_of_its_emitters() {
    let mut project = project::Project::new("night ferry");
    let import = project::Import {
        wavelengths_nm: grid(),
        power_per_nm: grid().into_iter().map(fern).collect(),
        source: None,
        assumptions: Vec::new(),
        warnings: Vec::new(),
    };
    let id = project::EmitterId(project.take_id());
    project.emitters.push(project::Emitter {
        id,
        name: "Fern green".into(),
        invented: true,
        note: String::new(),
        import,
        corrections: Vec::new(),
        geometry: project::Geometry::default(),
        origin: project::Origin::default(),
        mounting: project::Mounting::default(),
        instrument_range_nm: None,
        wall_plug: None,
        sheet: device::Sheet::default(),
    });
    let text = files::project_file::project_text(&project).unwrap();
    let reading = read_bytes("ferry.ron", text.as_bytes(), &Answers::default());
    outcome(&reading, Outcome::Read);
    assert_eq!(reading.spectra[0].name, "Fern green");
    is_fern(&reading.spectra[0]);
    outcome(
        &read_bytes("ferry.ron", &text.as_bytes()[..text.len() / 2], &Answers::default()),
        Outcome::Refused,
    );
    outcome(
        &read_bytes(
            "ferry.ron",
            text.replacen("version: 1", "version: 99", 1).as_bytes(),
            &Answers::default(),
        ),
        Outcome::Refused,
    );
}
