//! Tables lying on their side: wavelengths along a row, one spectrum to a row.

use super::columns::plausible_units;
use super::dialect::Dialect;
use super::number::Cell;
use super::split::{Lines, Separator, cell_list};
use super::table::{MAX_NUMBERS, read_row};
use super::units::axis_hint;

/// A row of at least this many numbers may hold a spectrum.
const LEAST_NUMBERS: usize = 5;
/// A table on its side has few rows; looking stops here.
const MAX_ROWS: usize = 5000;

/// A table turned upright.
pub(super) struct Turned {
    /// The labels of the rows, which become column headers; the axis first.
    pub(super) labels: Vec<String>,
    /// The rows, which become columns; the axis first.
    pub(super) columns: Vec<Vec<Cell>>,
    /// The place of each row among the rows of numbers of the file, from 1.
    pub(super) places: Vec<usize>,
    /// The file line of the axis.
    pub(super) line: usize,
    /// The lines of text above the axis.
    pub(super) notes: Vec<String>,
}

struct WideRow {
    label: String,
    cells: Vec<Cell>,
    line: usize,
}

/// Finds a table on its side; `None` when there is none.
pub(super) fn find(text: &str, dialect: &Dialect) -> Option<Turned> {
    let mut rows: Vec<WideRow> = Vec::new();
    let mut notes = Vec::new();
    let mut total = 0;
    for line in Lines::new(text) {
        let (number, line) = line.ok()?;
        if line.trim().is_empty() {
            continue;
        }
        match wide_row(line, dialect) {
            Some((label, cells)) => {
                total += cells.len();
                rows.push(WideRow { label, cells, line: number });
            }
            None if notes.len() < 500 && line.len() < 1000 => notes.push(line.to_owned()),
            None => {}
        }
        if rows.len() > MAX_ROWS || total > MAX_NUMBERS {
            return None;
        }
    }
    if rows.len() < 2 {
        return None;
    }
    let axis = rows.iter().position(is_axis)?;
    let length = rows[axis].cells.len();
    let labelled = !rows[axis].label.is_empty();
    let mut turned =
        Turned { labels: Vec::new(), columns: Vec::new(), places: Vec::new(), line: rows[axis].line, notes };
    let order = std::iter::once(axis).chain((0..rows.len()).filter(|&index| index != axis));
    for index in order {
        let row = &mut rows[index];
        if row.cells.len() == length + 1 && labelled && index != axis {
            // A number labels this row: a current, an angle.
            let first = row.cells.remove(0).number().unwrap_or_default();
            row.label = first.to_string();
        }
        // Rows of another length belong to something else, unless only their end is missing.
        if row.cells.len() > length || row.cells.len() * 2 < length {
            continue;
        }
        turned.labels.push(row.label.clone());
        turned.columns.push(row.cells.clone());
        turned.places.push(index + 1);
    }
    (turned.columns.len() > 1).then_some(turned)
}

/// The one row of numbers of a file that holds nothing else: values without wavelengths.
pub(super) fn single(text: &str, dialect: &Dialect) -> Option<Turned> {
    let mut notes = Vec::new();
    let mut found: Option<(usize, String, Vec<Cell>)> = None;
    for line in Lines::new(text) {
        let (number, line) = line.ok()?;
        match wide_row(line, dialect) {
            Some(_) if found.is_some() => return None,
            Some((label, cells)) => found = Some((number, label, cells)),
            None if !line.trim().is_empty() && notes.len() < 500 => notes.push(line.to_owned()),
            None => {}
        }
    }
    let (line, label, cells) = found?;
    Some(Turned { labels: vec![label], columns: vec![cells], places: vec![1], line, notes })
}

/// The label and the cells of a line that holds mostly numbers after at most two cells of words.
fn wide_row(line: &str, dialect: &Dialect) -> Option<(String, Vec<Cell>)> {
    let separator = if matches!(dialect.separator, Separator::CommaPairs { .. }) {
        Separator::Comma
    } else {
        dialect.separator
    };
    let mut cells = Vec::new();
    read_row(line, dialect, separator, &mut cells);
    let words = cells.iter().take(4).take_while(|cell| !matches!(cell, Cell::Number(_))).count();
    if words > 3 {
        return None;
    }
    let mut body: Vec<Cell> = cells.split_off(words);
    while matches!(body.last(), Some(Cell::Missing)) {
        body.pop();
    }
    let numbers = body.iter().filter(|cell| cell.number().is_some()).count();
    if numbers < LEAST_NUMBERS || numbers * 10 < body.len() * 8 {
        return None;
    }
    let label = cell_list(line, separator)
        .into_iter()
        .take(words)
        .filter(|cell| !cell.is_empty())
        .collect::<Vec<_>>()
        .join(" ");
    Some((label, body))
}

fn is_axis(row: &WideRow) -> bool {
    let values: Vec<f64> = row.cells.iter().filter_map(|cell| cell.number()).collect();
    let up = values.windows(2).all(|pair| pair[1] > pair[0]);
    let down = values.windows(2).all(|pair| pair[1] < pair[0]);
    if axis_hint(&row.label).is_some() {
        return up || down || values.len() == row.cells.len();
    }
    (up || down) && values.len() == row.cells.len() && !plausible_units(&values).is_empty()
}
