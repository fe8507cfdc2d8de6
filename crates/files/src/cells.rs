//! CSV cells that no spreadsheet takes for a formula.

use std::borrow::Cow;

/// The cell as it may be written: text that a spreadsheet would run (starting with `=` `+` `-` `@`, a tab or a
/// carriage return, also behind spaces) gets an apostrophe in front. Numbers stay numbers, also negative ones.
pub fn safe_cell(text: &str) -> Cow<'_, str> {
    let shown = text.trim_start_matches([' ', '\u{feff}']);
    let runs =
        shown.starts_with(['=', '+', '-', '@', '\t', '\r', '\u{ff1d}', '\u{ff0b}', '\u{ff0d}', '\u{ff20}']);
    if runs && text.parse::<f64>().map_or(true, |number| !number.is_finite()) {
        Cow::Owned(format!("'{text}"))
    } else {
        Cow::Borrowed(text)
    }
}

/// One CSV line of such cells, ended by a line feed (RFC 4180 quoting).
pub fn write_row<W: std::io::Write>(out: &mut csv::Writer<W>, cells: &[&str]) -> csv::Result<()> {
    out.write_record(cells.iter().map(|cell| safe_cell(cell).into_owned()))
}

/// A writer for such lines, rows of any length.
pub fn writer<W: std::io::Write>(out: W) -> csv::Writer<W> {
    csv::WriterBuilder::new().flexible(true).from_writer(out)
}

#[cfg(test)]
mod tests {
    use super::*;

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
}
