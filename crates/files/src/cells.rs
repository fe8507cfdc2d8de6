//! CSV cells that a spreadsheet shows but does not run.
//!
//! A cell that begins with `=`, `+`, `-`, `@`, a tab or a carriage return is taken for a formula by spreadsheets.
//! [`safe_cell`] puts an apostrophe before such a cell unless it is a plain number; an apostrophe already leading such a
//! cell is doubled, so that [`read_cell`] gives back exactly what was written. Numbers are written in the
//! shortest form that reads back to the same value.

use std::borrow::Cow;

/// Why a table could not be written.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum CsvError {
    /// A row is longer or shorter than the header.
    #[error("row {row}: expected {expected} cells, found {found}")]
    Ragged {
        /// Row number, the header being 1.
        row: usize,
        /// Cells of the header.
        expected: usize,
        /// Cells of the row.
        found: usize,
    },
    /// The writer gave up.
    #[error("the table could not be written: {0}")]
    Write(String),
}

/// True when a spreadsheet might run the cell.
fn is_risky(text: &str) -> bool {
    // Leading spaces and invisible marks are skipped by some spreadsheets before they look for a formula; full-width
    // forms of the signs are folded to the plain ones.
    let first = text.chars().find(|c| !matches!(c, ' ' | '\u{a0}' | '\u{feff}' | '\u{200b}'));
    let signed = matches!(
        first,
        Some('=' | '+' | '-' | '@' | '\t' | '\r' | '\n' | '|' | '＝' | '＋' | '－' | '＠' | '\0')
    );
    signed && !is_number(text)
}

/// A plain decimal number, such as `-1.25e-3`: harmless although it may begin with a sign.
fn is_number(text: &str) -> bool {
    text.bytes().all(|b| b.is_ascii_digit() || matches!(b, b'+' | b'-' | b'.' | b'e' | b'E'))
        && text.parse::<f64>().is_ok()
}

/// A cell made safe.
pub fn safe_cell(text: &str) -> Cow<'_, str> {
    if is_risky(text.trim_start_matches('\'')) { Cow::Owned(format!("'{text}")) } else { Cow::Borrowed(text) }
}

/// What [`safe_cell`] was given.
pub fn read_cell(text: &str) -> &str {
    match text.strip_prefix('\'') {
        Some(rest) if is_risky(rest.trim_start_matches('\'')) => rest,
        _ => text,
    }
}

/// A number's cell: the shortest text that reads back to it; empty when it is not finite.
pub fn number(value: f64) -> String {
    if value.is_finite() { format!("{value}") } else { String::new() }
}

/// One CSV line of such cells, ended by a line feed (RFC 4180 quoting).
pub fn write_row<W: std::io::Write>(out: &mut csv::Writer<W>, cells: &[&str]) -> csv::Result<()> {
    out.write_record(cells.iter().map(|cell| safe_cell(cell).into_owned()))
}

/// A writer for such lines, rows of any length.
pub fn writer<W: std::io::Write>(out: W) -> csv::Writer<W> {
    csv::WriterBuilder::new().flexible(true).from_writer(out)
}

/// A table as UTF-8 text with `\r\n` line ends (RFC 4180), every cell made safe.
///
/// # Errors
/// When a row has another number of cells than the header.
pub fn table<R, C>(header: &[&str], rows: R) -> Result<String, CsvError>
where
    R: IntoIterator,
    R::Item: IntoIterator<Item = C>,
    C: AsRef<str>,
{
    let refused = |error: csv::Error| CsvError::Write(error.to_string());
    let mut writer =
        csv::WriterBuilder::new().terminator(csv::Terminator::CRLF).flexible(true).from_writer(Vec::new());
    writer.write_record(header.iter().map(|name| safe_cell(name).into_owned())).map_err(refused)?;
    for (index, row) in rows.into_iter().enumerate() {
        let cells: Vec<String> = row.into_iter().map(|c| safe_cell(c.as_ref()).into_owned()).collect();
        if cells.len() != header.len() {
            return Err(CsvError::Ragged { row: index + 2, expected: header.len(), found: cells.len() });
        }
        writer.write_record(&cells).map_err(refused)?;
    }
    let bytes = writer.into_inner().map_err(|error| CsvError::Write(error.to_string()))?;
    String::from_utf8(bytes).map_err(|error| CsvError::Write(error.to_string()))
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn read_back(text: &str) -> Vec<Vec<String>> {
        csv::ReaderBuilder::new()
            .has_headers(false)
            .from_reader(text.as_bytes())
            .records()
            .map(|r| r.expect("a row").iter().map(|c| read_cell(c).to_owned()).collect())
            .collect()
    }

    #[test]
    fn formulas_are_disarmed_and_numbers_are_left_alone() {
        for formula in
            ["=1+1", "+SUM(A1)", "-2+3", "@cmd", "\tx", "\r=1", " =1+1", "=HYPERLINK(\"x\")", "+", "-"]
        {
            assert_eq!(safe_cell(formula), format!("'{formula}"));
        }
        for plain in ["-1.25", "+0.0012", "1e-9", "-1E5", "Rowan red", "0", "", "'quoted'", "3000 K"] {
            assert_eq!(safe_cell(plain), plain);
        }
    }

    #[test]
    fn infinity_and_words_that_parse_as_numbers_are_not_taken_for_plain_ones() {
        assert_eq!(safe_cell("-inf"), "'-inf");
        assert_eq!(safe_cell("+NaN"), "'+NaN");
        assert_eq!(number(f64::NAN), "");
        assert_eq!(number(f64::INFINITY), "");
    }

    #[test]
    fn a_ragged_row_is_named() {
        let refused = table(&["a", "b"], [vec!["1", "2"], vec!["1"]]);
        assert!(matches!(refused, Err(CsvError::Ragged { row: 3, expected: 2, found: 1 })));
    }

    #[test]
    fn text_that_would_run_is_defused_and_numbers_are_left() {
        for text in
            ["=1+1", "+cmd|' /C calc'!A0", "-2+3", "@SUM(A1)", "\t=1", "\r=1", "  =1", "-inf", "\u{feff}=1"]
        {
            assert_eq!(safe_cell(text), format!("'{text}"), "{text:?}");
        }
        for text in ["-1.5", "+2", "-3e-4", "Fern green", "", "0.0012", "a=b"] {
            assert_eq!(safe_cell(text), text);
        }
    }

    #[test]
    fn a_defused_cell_is_still_quoted() {
        let mut out = writer(Vec::new());
        write_row(&mut out, &["=A1,\"B\"", "2"]).unwrap();
        assert_eq!(String::from_utf8(out.into_inner().unwrap()).unwrap(), "\"'=A1,\"\"B\"\"\",2\n");
    }

    proptest! {
        #[test]
        fn every_cell_reads_back(text in "[=+@'\t\r\n ,\"a-]{0,8}|.{0,12}") {
            let safe = safe_cell(&text);
            prop_assert_eq!(read_cell(&safe), &*text);
        }

        #[test]
        fn no_cell_starts_as_a_formula(text in any::<String>()) {
            let safe = safe_cell(&text);
            let harmless = !safe.starts_with(['=', '+', '-', '@', '\t', '\r']) || safe.parse::<f64>().is_ok();
            prop_assert!(harmless);
        }

        #[test]
        fn a_table_reads_back_cell_for_cell(
            rows in prop::collection::vec(prop::collection::vec("[=+@'\t\r\n ,\"a-]{0,8}", 3), 0..6)
        ) {
            let text = table(&["one", "two", "three"], rows.clone()).expect("a table");
            let back = read_back(&text);
            prop_assert_eq!(&back[1..], &rows[..]);
        }

        #[test]
        fn numbers_read_back_to_the_bit(value in prop::num::f64::NORMAL | prop::num::f64::ZERO) {
            prop_assert_eq!(number(value).parse::<f64>().expect("a number").to_bits(), value.to_bits());
        }
    }
}
