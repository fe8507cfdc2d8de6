//! Running the built program and looking at what came out.

use serde_json::Value;
use std::path::{Path, PathBuf};
use std::process::Command;

/// What a run left behind.
pub(crate) struct Run {
    pub(crate) code: i32,
    pub(crate) out: String,
    pub(crate) err: String,
}

impl Run {
    /// The output stream as JSON.
    #[track_caller]
    pub(crate) fn json(&self) -> Value {
        serde_json::from_str(&self.out)
            .unwrap_or_else(|e| panic!("valid JSON on the output stream: {e}\n{}\n{}", self.out, self.err))
    }
}

/// Runs the program with these arguments.
pub(crate) fn whitesmith<S: AsRef<std::ffi::OsStr>>(arguments: &[S]) -> Run {
    let output =
        Command::new(env!("CARGO_BIN_EXE_whitesmith")).args(arguments).output().expect("the program starts");
    Run {
        code: output.status.code().expect("an exit code, not a signal"),
        out: String::from_utf8(output.stdout).expect("UTF-8 on the output stream"),
        err: String::from_utf8(output.stderr).expect("UTF-8 on the error stream"),
    }
}

/// A file of the checks' data.
pub(crate) fn data(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../../tests/data").join(name)
}

/// A file with this content, in a folder that goes when the returned guard does.
pub(crate) fn file(name: &str, content: impl AsRef<[u8]>) -> (tempfile::TempDir, String) {
    let folder = tempfile::tempdir().expect("a folder for a test file");
    let path = folder.path().join(name);
    std::fs::write(&path, content).expect("a test file");
    let path = path.to_str().expect("a UTF-8 path").to_owned();
    (folder, path)
}

/// The keys of an object, sorted.
#[track_caller]
pub(crate) fn keys(value: &Value) -> Vec<&str> {
    let mut keys: Vec<&str> = value.as_object().expect("an object").keys().map(String::as_str).collect();
    keys.sort_unstable();
    keys
}

/// Space-separated words, sorted: the other side of [`keys`].
pub(crate) fn words(text: &str) -> Vec<&str> {
    let mut words: Vec<&str> = text.split_whitespace().collect();
    words.sort_unstable();
    words
}

/// A comma-separated table with `#` lines before its header.
pub(crate) struct Table {
    header: Vec<String>,
    rows: Vec<Vec<String>>,
}

impl Table {
    pub(crate) fn read(name: &str) -> Self {
        let text = std::fs::read_to_string(data(name)).expect("a table of the checks' data");
        let mut lines = text.lines().filter(|l| !l.starts_with('#') && !l.is_empty());
        let cells = |line: &str| line.split(',').map(|c| c.trim().to_owned()).collect::<Vec<_>>();
        let header = cells(lines.next().expect("a header"));
        Self { header, rows: lines.map(cells).collect() }
    }

    /// The row whose first cell is `name`.
    #[track_caller]
    pub(crate) fn row(&self, name: &str) -> Vec<(&str, &str)> {
        let row = self.rows.iter().find(|r| r[0] == name).unwrap_or_else(|| panic!("a row {name}"));
        self.header.iter().map(String::as_str).zip(row.iter().map(String::as_str)).collect()
    }

    /// One number of the row whose first cell is `name`.
    #[track_caller]
    pub(crate) fn number(&self, name: &str, column: &str) -> f64 {
        let row = self.row(name);
        let cell = row.iter().find(|(c, _)| *c == column).unwrap_or_else(|| panic!("a column {column}")).1;
        cell.parse().unwrap_or_else(|_| panic!("{name}, {column}: a number, found `{cell}`"))
    }
}

/// A small emitters file: Gaussians (peak nm, FWHM nm) at 1 nm, invented.
pub(crate) fn gaussians(emitters: &[(f64, f64)]) -> String {
    let mut text = String::from("wavelength_nm");
    for (k, _) in emitters.iter().enumerate() {
        text.push_str(&format!(",emitter {}", k + 1));
    }
    for nm in 380..=780 {
        text.push_str(&format!("\n{nm}"));
        for (peak, fwhm) in emitters {
            let value = (-4.0 * 2f64.ln() * ((f64::from(nm) - peak) / fwhm).powi(2)).exp();
            text.push_str(&format!(",{value:e}"));
        }
    }
    text.push('\n');
    text
}
