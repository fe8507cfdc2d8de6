//! The recipe's rows as comma-separated text, and back.
//!
//! One row a quantity, numbers in full, cells made safe as [`crate::cells`] says. Calibration runs share one cell,
//! separated by `;` (a `;` or `\` inside a name is written `\;` or `\\`).

use super::model::RecipeRow;
use crate::cells::{self, CsvError};

/// The header.
pub const COLUMNS: [&str; 8] =
    ["part", "quantity", "target", "allowed_low", "allowed_high", "unit", "calibration_runs", "remark"];

/// Why a recipe was not understood.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum RecipeCsvError {
    /// The first line is not the header.
    #[error("line 1: expected the columns {}, found `{found}`", COLUMNS.join(","))]
    Header {
        /// What stands there.
        found: String,
    },
    /// A row that is not text in UTF-8 with eight cells.
    #[error("line {line}: expected 8 cells of text, found {found}")]
    Row {
        /// Line number.
        line: u64,
        /// What stands there.
        found: String,
    },
    /// A cell that should hold a number or nothing.
    #[error("line {line}: expected a number or an empty cell under {column}, found `{found}`")]
    Number {
        /// Line number.
        line: u64,
        /// Name of the column.
        column: &'static str,
        /// What stands there.
        found: String,
    },
}

/// The rows as text.
///
/// # Errors
/// When the writer refuses.
pub fn write(rows: &[RecipeRow]) -> Result<String, CsvError> {
    let number = |value: Option<f64>| value.map_or_else(String::new, cells::number);
    cells::table(
        &COLUMNS,
        rows.iter().map(|row| {
            [
                row.part.clone(),
                row.quantity.clone(),
                number(row.target),
                number(row.allowed_low),
                number(row.allowed_high),
                row.unit.clone(),
                runs_as_cell(&row.calibration_runs),
                row.remark.clone(),
            ]
        }),
    )
}

/// The rows of a text written by [`write()`].
///
/// # Errors
/// When the header, a row or a number is not what was expected; the line is named.
pub fn read(text: &str) -> Result<Vec<RecipeRow>, RecipeCsvError> {
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let mut reader = csv::ReaderBuilder::new().flexible(true).from_reader(text.as_bytes());
    let header = reader.headers().map_err(|e| RecipeCsvError::Header { found: e.to_string() })?;
    if !header.iter().eq(COLUMNS) {
        return Err(RecipeCsvError::Header { found: header.iter().collect::<Vec<_>>().join(",") });
    }
    let mut rows = Vec::new();
    for record in reader.records() {
        let record = record.map_err(|e| RecipeCsvError::Row {
            line: e.position().map_or(0, csv::Position::line),
            found: e.to_string(),
        })?;
        let line = record.position().map_or(0, csv::Position::line);
        if record.len() != COLUMNS.len() {
            return Err(RecipeCsvError::Row { line, found: format!("{} cells", record.len()) });
        }
        let words = |index: usize| cells::read_cell(&record[index]).to_owned();
        let number = |index: usize| match record[index].trim() {
            "" => Ok(None),
            cell => cell.parse::<f64>().ok().filter(|v| v.is_finite()).map(Some).ok_or_else(|| {
                RecipeCsvError::Number { line, column: COLUMNS[index], found: record[index].to_owned() }
            }),
        };
        rows.push(RecipeRow {
            part: words(0),
            quantity: words(1),
            target: number(2)?,
            allowed_low: number(3)?,
            allowed_high: number(4)?,
            unit: words(5),
            calibration_runs: runs_of_cell(&words(6)),
            remark: words(7),
        });
    }
    Ok(rows)
}

/// Every run ends with `;`, so that one run without a name differs from no run.
fn runs_as_cell(runs: &[String]) -> String {
    runs.iter().map(|run| run.replace('\\', "\\\\").replace(';', "\\;") + ";").collect()
}

fn runs_of_cell(cell: &str) -> Vec<String> {
    let (mut runs, mut run, mut chars) = (Vec::new(), String::new(), cell.chars());
    while let Some(c) = chars.next() {
        match c {
            '\\' => run.extend(chars.next()),
            ';' => runs.push(std::mem::take(&mut run)),
            c => run.push(c),
        }
    }
    // A cell edited by hand may lack the last `;`.
    if !run.is_empty() {
        runs.push(run);
    }
    runs
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn value() -> impl Strategy<Value = Option<f64>> {
        prop::option::of(prop::num::f64::NORMAL | prop::num::f64::ZERO)
    }

    fn words() -> impl Strategy<Value = String> {
        "[=+@'\t;\\\\ ,\"a-]{0,8}|[^\r\n]{0,10}"
    }

    prop_compose! {
        fn any_row()(
            part in words(), quantity in words(), target in value(), allowed_low in value(), allowed_high in value(),
            unit in words(), calibration_runs in prop::collection::vec(words(), 0..4), remark in words(),
        ) -> RecipeRow {
            RecipeRow { part, quantity, target, allowed_low, allowed_high, unit, calibration_runs, remark }
        }
    }

    proptest! {
        #[test]
        fn rows_read_back_unchanged(rows in prop::collection::vec(any_row(), 0..6)) {
            let text = write(&rows).expect("a table");
            prop_assert_eq!(read(&text).expect("rows"), rows);
        }

        #[test]
        fn any_text_is_rows_or_a_sentence(text in any::<String>()) {
            if let Err(error) = read(&text) {
                prop_assert!(error.to_string().starts_with("line "));
            }
        }
    }

    #[test]
    fn a_bad_number_is_named_with_its_line_and_column() {
        let text = format!("{}\nblue,width,twelve,,,µm,,\n", COLUMNS.join(","));
        assert_eq!(
            read(&text),
            Err(RecipeCsvError::Number { line: 2, column: "target", found: "twelve".to_owned() })
        );
    }
}
