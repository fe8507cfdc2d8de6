//! Reading the reference tables of `tests/data`.

use std::path::PathBuf;

/// A table with a header row; lines that start with `#` say where its numbers come from.
#[derive(Debug)]
pub struct Table {
    file: String,
    header: Vec<String>,
    rows: Vec<Vec<String>>,
}

impl Table {
    /// Reads a file below `tests/data`. Panics when it cannot: a check without its data has no worth.
    pub fn read(file: &str) -> Table {
        let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("data").join(file);
        let mut reader = csv::ReaderBuilder::new()
            .comment(Some(b'#'))
            .flexible(true)
            .from_path(&path)
            .unwrap_or_else(|error| panic!("{}: {error}", path.display()));
        let header = reader.headers().expect("the table has a header").iter().map(str::to_owned).collect();
        let rows = reader
            .records()
            .map(|record| record.expect("every row can be read").iter().map(str::to_owned).collect())
            .collect();
        Table { file: file.to_owned(), header, rows }
    }

    /// Number of rows.
    pub fn len(&self) -> usize {
        self.rows.len()
    }

    /// Whether the table has no row.
    pub fn is_empty(&self) -> bool {
        self.rows.is_empty()
    }

    /// Column names.
    pub fn header(&self) -> &[String] {
        &self.header
    }

    /// Text of a cell.
    pub fn text(&self, row: usize, column: &str) -> &str {
        let at = self
            .header
            .iter()
            .position(|name| name == column)
            .unwrap_or_else(|| panic!("{} has no column {column}", self.file));
        self.rows[row].get(at).map_or("", String::as_str)
    }

    /// Number in a cell; None when it is blank.
    pub fn number(&self, row: usize, column: &str) -> Option<f64> {
        match self.text(row, column).trim() {
            "" => None,
            text => Some(
                text.parse()
                    .unwrap_or_else(|_| panic!("{} row {row} {column}: {text} is no number", self.file)),
            ),
        }
    }

    /// A whole column of numbers.
    pub fn column(&self, column: &str) -> Vec<f64> {
        (0..self.len())
            .map(|row| {
                self.number(row, column)
                    .unwrap_or_else(|| panic!("{} row {row} {column} is blank", self.file))
            })
            .collect()
    }
}
