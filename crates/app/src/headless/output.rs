//! Printing: JSON with shortest round-trip numbers, tables for people, sentences on the error stream.

use serde::Serialize;
use std::io::{self, Write};

/// Prints `value` as JSON and a line end on the output stream. A reader that went away is no error of ours.
///
/// Numbers that are not finite are written as null; all others so that they read back as the same number.
pub(super) fn json<T: Serialize>(value: &T) {
    let mut out = io::BufWriter::new(io::stdout().lock());
    if serde_json::to_writer_pretty(&mut out, value).is_ok() {
        let _ = writeln!(out).and_then(|()| out.flush());
    }
}

/// Prints text and a line end on the output stream.
pub(super) fn text(text: &str) {
    let _ = writeln!(io::stdout().lock(), "{text}");
}

/// Prints one sentence on the error stream.
pub(super) fn sentence(sentence: impl std::fmt::Display) {
    let _ = writeln!(io::stderr().lock(), "{sentence}");
}

/// A table with a header row: the first column left, the others right aligned.
pub(super) struct Table {
    rows: Vec<Vec<String>>,
}

impl Table {
    pub(super) fn new(header: &[&str]) -> Self {
        Self { rows: vec![header.iter().map(|&h| h.to_owned()).collect()] }
    }

    pub(super) fn row<I: IntoIterator<Item = String>>(&mut self, cells: I) {
        self.rows.push(cells.into_iter().collect());
    }
}

impl std::fmt::Display for Table {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let columns = self.rows.iter().map(Vec::len).max().unwrap_or(0);
        let width = |c: usize| {
            self.rows.iter().filter_map(|r| r.get(c)).map(|t| t.chars().count()).max().unwrap_or(0)
        };
        let widths: Vec<usize> = (0..columns).map(width).collect();
        for (k, row) in self.rows.iter().enumerate() {
            let mut line = String::new();
            for (c, cell) in row.iter().enumerate() {
                if c == 0 {
                    line.push_str(&format!("{cell:<0$}", widths[0]));
                } else {
                    line.push_str(&format!("  {cell:>0$}", widths[c]));
                }
            }
            if k > 0 {
                f.write_str("\n")?;
            }
            f.write_str(line.trim_end())?;
        }
        Ok(())
    }
}

/// A number with `digits` decimals, or a dash where there is none.
pub(super) fn cell(value: Option<f64>, digits: usize) -> String {
    value.filter(|v| v.is_finite()).map_or_else(|| "–".to_owned(), |v| format!("{v:.digits$}"))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_line_up() {
        let mut table = Table::new(&["name", "peak"]);
        table.row(["Rowan red".to_owned(), cell(Some(625.04), 1)]);
        table.row(["teal".to_owned(), cell(None, 1)]);
        assert_eq!(table.to_string(), "name        peak\nRowan red  625.0\nteal           –");
    }

    #[test]
    fn numbers_without_a_value_become_null_and_others_read_back() {
        let text = serde_json::to_string(&[f64::NAN, f64::INFINITY, 0.1, 1e-7, 3000.0]).unwrap();
        assert_eq!(text, "[null,null,0.1,1e-7,3000.0]");
    }
}
