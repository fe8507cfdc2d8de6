//! Odd and bad files: the right outcome and a sentence for each.

mod support;

use files::read::{Answers, Outcome, read_bytes, read_path};
use support::{fern, grid, outcome, rows, table};

struct Case {
    kind: &'static str,
    bytes: Vec<u8>,
    expected: Outcome,
    /// A word one of the sentences must hold.
    word: &'static str,
}

fn case(kind: &'static str, bytes: impl Into<Vec<u8>>, expected: Outcome, word: &'static str) -> Case {
    Case { kind, bytes: bytes.into(), expected, word }
}

/// Comma rows with every `each`-th line replaced.
fn every(each: usize, line: &str) -> String {
    rows(",")
        .lines()
        .enumerate()
        .map(|(index, good)| if index % each == 1 { format!("{line}\n") } else { format!("{good}\n") })
        .collect()
}

/// Rows where `value` says what to write for a wavelength, or nothing.
fn written(value: impl Fn(f64) -> Option<String>) -> String {
    grid().into_iter().filter_map(|nm| value(nm).map(|value| format!("{nm},{value}\n"))).collect()
}

fn utf16(text: &str) -> Vec<u8> {
    [0xfeff].into_iter().chain(text.encode_utf16()).flat_map(u16::to_le_bytes).collect()
}

fn refused() -> Vec<Case> {
    use Outcome::Refused;
    let xml = |name: &str| format!("<?xml version=\"1.0\"?>\n<{name}><a>1</a></{name}>\n");
    let bomb = "<?xml version=\"1.0\"?><!DOCTYPE a [<!ENTITY b \"bbbbbbbb\"><!ENTITY c \"&b;&b;&b;&b;\">]><a>&c;</a>";
    vec![
        case("empty", "", Refused, "empty"),
        case("blank", "  \n\t\n \r\n", Refused, "blank"),
        case("one line", "Wavelength (nm),Power\n", Refused, "expected"),
        case("one row", "550,1.0\n", Refused, "expected"),
        case("four samples", "nm,W/nm\n450,1\n500,2\n550,3\n600,1\n", Refused, "five|5"),
        case("PNG", b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR".to_vec(), Refused, "picture"),
        case("JPEG", b"\xff\xd8\xff\xe0\0\x10JFIF".to_vec(), Refused, "picture"),
        case("GIF", b"GIF89a\x01\0\x01\0".to_vec(), Refused, "picture"),
        case("zip or workbook", b"PK\x03\x04\x14\0\x06\0".to_vec(), Refused, "workbook"),
        case("old workbook", b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1\0\0".to_vec(), Refused, "workbook"),
        case("gzip", b"\x1f\x8b\x08\0\0\0".to_vec(), Refused, "archive"),
        case("PDF", b"%PDF-1.7\n1 0 obj".to_vec(), Refused, "PDF"),
        case(
            "binary noise",
            (0..4000_u32).map(|index| (index.wrapping_mul(2_654_435_761) >> 13) as u8).collect::<Vec<_>>(),
            Refused,
            "expected",
        ),
        case("only NUL", vec![0; 1000], Refused, "expected"),
        case(
            "web page",
            "<!DOCTYPE html>\n<html><body><table><tr><td>380</td><td>1</td></tr></table></body></html>",
            Refused,
            "web page",
        ),
        case("SVG", "<svg xmlns=\"x\"><path d=\"M 380 1 L 381 2\"/></svg>", Refused, "picture"),
        case("XML", xml("recipe"), Refused, "XML"),
        case("entity bomb", bomb, Refused, "XML"),
        case(
            "JSON object",
            "{\"wavelength\": [380, 381, 382, 383, 384, 385], \"power\": [1, 2, 3, 4, 5, 6]}",
            Refused,
            "JSON",
        ),
        case("JSON list", "[[380, 1], [381, 2],\n [382, 3], [383, 4]]", Refused, "JSON"),
        case("truncated JSON", "{\"wavelength\": [380, 381, 38", Refused, "JSON"),
        case("deep nesting", "[".repeat(200_000), Refused, "JSON"),
        case("RON", "Loom(\n    version: 99,\n    emitters: [],\n)\n", Refused, "RON"),
        case("truncated RON", "(\n version: 1,\n emitters: [(\n", Refused, "RON"),
        case("RON with attributes", "#![enable(implicit_some)]\n(a: 1)\n", Refused, "RON"),
        case("unclosed quote in the header", format!("\"Wavelength,Power\n{}", rows(",")), Refused, "quote"),
        case(
            "unclosed quote in a row",
            format!("nm,rel\n{}450,\"0.5\n{}", rows(","), rows(",")),
            Refused,
            "quote",
        ),
        case(
            "dates",
            (1..29).map(|day| format!("2031-03-{day:02},{day}.5\n")).collect::<String>(),
            Refused,
            "expected",
        ),
        case(
            "dates with points",
            (1..29).map(|day| format!("{day:02}.03.2031;{day},5\n")).collect::<String>(),
            Refused,
            "expected",
        ),
        case("words in a fifth of the rows", every(4, "not a row"), Refused, "unreadable"),
        case(
            "words in a third of the values",
            written(|nm| {
                Some(if (nm as u32).is_multiple_of(3) { "error".into() } else { format!("{:.4}", fern(nm)) })
            }),
            Refused,
            "unreadable",
        ),
        case("dates in a quarter of the rows", every(4, "2031-03-05,0.5"), Refused, "unreadable"),
        case("prose", "This file was moved.\nPlease ask the workshop.\nThank you.\n", Refused, "expected"),
        case("all zero", table(",", |_| 0.0), Refused, "above 0"),
        case("all negative", table(",", |nm| -1.0 - fern(nm)), Refused, "above 0"),
        case("all NaN", written(|_| Some("NaN".into())), Refused, "usable"),
        case(
            "ultraviolet",
            (200..350).map(|nm| format!("{nm},{}\n", fern(f64::from(nm) + 250.0))).collect::<String>(),
            Refused,
            "380",
        ),
        case(
            "near infrared",
            format!(
                "Wavelength (nm),Power\n{}",
                (900..1700).map(|nm| format!("{nm},1.5\n")).collect::<String>()
            ),
            Refused,
            "380",
        ),
        case(
            "infrared energies",
            format!(
                "Energy (eV),Power (W/eV)\n{}",
                (50..100).map(|e| format!("0.{e},1.5\n")).collect::<String>()
            ),
            Refused,
            "380",
        ),
        case(
            "wavelengths below 0",
            (1..400).map(|nm| format!("-{nm},1.5\n")).collect::<String>(),
            Refused,
            "380",
        ),
        case(
            "frequency",
            format!(
                "Frequency (THz),Power\n{}",
                (400..700).map(|f| format!("{f},1.5\n")).collect::<String>()
            ),
            Refused,
            "frequency",
        ),
        case("only infinite values", written(|_| Some("inf".into())), Refused, "usable"),
        case("truncated UTF-16", utf16("nm")[..5].to_vec(), Refused, "expected"),
        case("a program", b"\x7fELF\x02\x01\x01\0".to_vec(), Refused, "program"),
        case("too many numbers", "1 2 3 4 5 6 7 8\n".repeat(1_100_000), Refused, "million"),
    ]
}

fn asked() -> Vec<Case> {
    use Outcome::Ask;
    let many: String = std::iter::once(format!(
        "nm,{}\n",
        (0..501).map(|index| format!("e{index}")).collect::<Vec<_>>().join(",")
    ))
    .chain((0..41).map(|row| {
        let nm = 380.0 + 10.0 * f64::from(row);
        format!("{nm}{}\n", format!(",{:.3}", 0.001 + fern(nm)).repeat(501))
    }))
    .collect();
    vec![
        case("mostly negative", table(",", |nm| fern(nm) - 0.6), Ask, "negative"),
        case(
            "hole across the peak",
            written(|nm| (!(520.0..=541.0).contains(&nm)).then(|| format!("{:.5}", fern(nm)))),
            Ask,
            "gap",
        ),
        case(
            "blanks across the peak",
            written(|nm| {
                Some(if (520.0..=541.0).contains(&nm) { String::new() } else { format!("{:.5}", fern(nm)) })
            }),
            Ask,
            "gap",
        ),
        case("501 columns", many, Ask, "501"),
        case(
            "µm or eV",
            (60..200)
                .map(|x| format!("{:.2},{:.4}\n", f64::from(x) / 100.0, 1.0 + f64::from(x)))
                .collect::<String>(),
            Ask,
            "unit",
        ),
        case(
            "commas everywhere",
            (380..420).map(|nm| format!("{nm},{},0,0{}\n", nm % 2, nm % 7 + 1)).collect::<String>(),
            Ask,
            "comma",
        ),
    ]
}

fn warned() -> Vec<Case> {
    use Outcome::Warned;
    let good = rows(",");
    let head = |text: String| format!("Wavelength (nm),Power (W/nm)\n{text}");
    vec![
        case("one damaged row", head(good.replacen("\n450,", "\n4?50,", 1)), Warned, "unreadable"),
        case(
            "one damaged value",
            head(good.replacen("\n600,0.00000", "\n600,oops", 1)),
            Warned,
            "unreadable",
        ),
        case("one row too wide", head(good.replacen("\n450,", "\n450,7,", 1)), Warned, "unreadable"),
        case("a NaN", head(good.replacen("\n600,0.00000", "\n600,NaN", 1)), Warned, "without a value"),
        case("a blank value", head(good.replacen("\n600,0.00000", "\n600,", 1)), Warned, "without a value"),
        case(
            "an infinite value",
            head(good.replacen("\n600,0.00000", "\n600,inf", 1)),
            Warned,
            "without a value",
        ),
        case("wavelength 0", head(format!("0,0.00000\n{good}")), Warned, "not above 0"),
        case("a duplicate row", head(format!("{good}780,0.00000\n")), Warned, "averag"),
        case(
            "hole beside the peak",
            head(written(|nm| (!(580.0..=620.0).contains(&nm)).then(|| format!("{:.5}", fern(nm))))),
            Warned,
            "bridged",
        ),
        case("spike", head(table(",", |nm| fern(nm) + if nm == 650.0 { 0.8 } else { 0.0 })), Warned, "spike"),
        case("saturated", head(table(",", |nm| fern(nm).min(0.7))), Warned, "saturated"),
        case(
            "full detector",
            head(table(",", |nm| (65_535.0_f64).min(90_000.0 * fern(nm)).round())),
            Warned,
            "saturated",
        ),
        case("flat", head(table(",", |_| 3.0)), Warned, "nearly the same"),
        case(
            "cut",
            head((380..540).map(|nm| format!("{nm},{:.5}\n", fern(f64::from(nm)))).collect()),
            Warned,
            "cut off",
        ),
        case("some negative", head(table(",", |nm| fern(nm) - 0.01)), Warned, "negative"),
        case("dark offset", head(table(",", |nm| fern(nm) + 0.2)), Warned, "dark level"),
        case(
            "huge values",
            head(written(|nm| Some(format!("{:.4}e200", fern(nm) + 0.0001)))),
            Warned,
            "divided",
        ),
        case("counts", format!("Wavelength (nm),Counts\n{good}"), Warned, "counts"),
        case(
            "old code page",
            [b"Wellenl\xe4nge (nm),Leistung (W/nm)\n".as_slice(), good.as_bytes()].concat(),
            Warned,
            "UTF-8",
        ),
        case("NUL bytes at the end", [head(good.clone()).as_bytes(), &[0; 64]].concat(), Warned, "Control"),
        case(
            "a broken character at the end",
            [head(good.clone()).as_bytes(), b"# \xc3"].concat(),
            Warned,
            "cut short",
        ),
        case(
            "odd UTF-16",
            {
                let mut bytes = utf16(&head(good.clone()));
                bytes.pop();
                bytes
            },
            Warned,
            "cut short",
        ),
    ]
}

#[test]
fn every_bad_file_has_its_outcome_and_a_sentence() {
    let cases: Vec<Case> = refused().into_iter().chain(asked()).chain(warned()).collect();
    assert!(cases.len() >= 70);
    let mut wrong = Vec::new();
    for case in &cases {
        let reading = read_bytes("some/odd file.csv", &case.bytes, &Answers::default());
        let sentences: Vec<&String> = reading
            .message
            .iter()
            .chain(&reading.warnings)
            .chain(reading.questions.iter().map(|question| &question.text))
            .collect();
        let told = sentences.iter().any(|one| case.word.split('|').any(|word| one.contains(word)));
        let shaped = reading.message.as_ref().is_none_or(|message| {
            message.starts_with("some/odd file.csv")
                && message.contains("expected")
                && !message.contains('\n')
                && reading.spectra.is_empty()
        });
        let spectra = case.expected == Outcome::Refused || !reading.spectra.is_empty();
        if reading.outcome != case.expected || !told || !shaped || !spectra {
            wrong.push(format!(
                "{}: {:?} instead of {:?}, {sentences:?}",
                case.kind, reading.outcome, case.expected
            ));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn what_is_no_plain_file_is_refused_without_waiting() {
    let folder = tempfile::tempdir().unwrap();
    let refused = |path: &std::path::Path, word: &str| {
        let reading = read_path(path, &Answers::default());
        outcome(&reading, Outcome::Refused);
        assert!(reading.message.as_ref().unwrap().contains(word), "{:?}", reading.message);
    };
    refused(folder.path(), "directory");
    refused(&folder.path().join("not there.csv"), "no file");
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        use std::os::unix::net::UnixListener;
        let socket = folder.path().join("socket");
        let _listener = UnixListener::bind(&socket).unwrap();
        refused(&socket, "pipe");
        refused(std::path::Path::new("/dev/null"), "device");
        let pipe = folder.path().join("pipe");
        if std::process::Command::new("mkfifo").arg(&pipe).status().is_ok_and(|status| status.success()) {
            refused(&pipe, "pipe");
        }
        let locked = folder.path().join("locked.csv");
        std::fs::write(&locked, rows(",")).unwrap();
        std::fs::set_permissions(&locked, std::fs::Permissions::from_mode(0o000)).unwrap();
        // A superuser may read everything.
        if std::fs::File::open(&locked).is_err() {
            refused(&locked, "permission");
        }
    }
    let large = folder.path().join("large.csv");
    std::fs::File::create(&large).unwrap().set_len(files::read::MAX_FILE_BYTES + 1).unwrap();
    refused(&large, "MB");
    let good = folder.path().join("fern.csv");
    std::fs::write(&good, rows(",")).unwrap();
    let reading = read_path(&good, &Answers::default());
    outcome(&reading, Outcome::Read);
    assert_eq!((reading.spectra[0].name.as_str(), reading.sha256.len()), ("fern", 64));
}
