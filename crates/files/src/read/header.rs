//! The lines above a table: column names, unit rows, and statements about the axis and the ordinate.

use super::split::{Separator, cell_list, header_cells, is_comment, without_comment_mark};
use super::table::TextLine;
use super::units::{self, AxisHint, AxisKind, OrdinateHint, axis_hint, is_unit_cell, ordinate_hint};
use super::vocabulary::{self, fold};

/// Header rows taken at most.
const MAX_ROWS: usize = 5;
/// Lines of notes looked at for statements.
const MAX_NOTES: usize = 2000;

/// What stands above one column.
#[derive(Debug, Clone, Default)]
pub(super) struct ColumnHeader {
    /// The name, verbatim; empty when there is none.
    pub(super) name: String,
    /// All cells above the column, joined.
    pub(super) all: String,
    pub(super) axis: Option<AxisHint>,
    pub(super) ordinate: OrdinateHint,
}

/// What stands above a table.
#[derive(Debug, Clone, Default)]
pub(super) struct Header {
    pub(super) columns: Vec<ColumnHeader>,
    /// An axis statement outside the columns.
    pub(super) axis: Option<AxisHint>,
    /// An ordinate statement outside the columns.
    pub(super) ordinate: OrdinateHint,
    /// Header rows found.
    pub(super) rows: usize,
}

impl Header {
    /// A header of one row, as a table lying on its side has.
    pub(super) fn from_labels(labels: &[String]) -> Self {
        let rows = vec![labels.to_vec()];
        Self { columns: columns(&rows, labels.len()), rows: 1, ..Self::default() }
    }

    /// Reads the lines above a table of `width` cells.
    pub(super) fn read(above: &[TextLine<'_>], separator: Separator, width: usize, indexed: bool) -> Self {
        let mut rows: Vec<Vec<String>> = Vec::new();
        let mut used = above.len();
        for (index, line) in above.iter().enumerate().rev().take(MAX_ROWS) {
            let Some(cells) = fitting_cells(line.text, separator, width, indexed) else { break };
            // Rows between the axis' name and the numbers belong to the header, whatever they hold.
            if !accepts(&cells, &rows, &above[..index], separator, width)
                && !names_axis_above(&above[..index], separator, width, indexed, MAX_ROWS - rows.len())
            {
                break;
            }
            rows.insert(0, cells);
            used = index;
        }
        let mut header = Self { columns: columns(&rows, width), rows: rows.len(), ..Self::default() };
        // A table of one column may still have its name above.
        for line in above[..used].iter().take(MAX_NOTES) {
            header.note(line.text);
        }
        header
    }

    /// Takes what a line of notes says about axis and ordinate.
    pub(super) fn note(&mut self, line: &str) {
        let text = without_comment_mark(line).trim_matches(|c| matches!(c, '"' | ',' | ';' | '\t'));
        if text.is_empty() || text.len() > 300 {
            return;
        }
        let pair = text
            .split_once([':', '=', '\t'])
            .or_else(|| text.split_once([';', ',']))
            .filter(|(key, value)| key.len() < 40 && !value.trim().is_empty());
        if let Some((key, value)) = pair {
            let folded = fold(key);
            let key = folded.trim_matches(|c: char| !c.is_alphanumeric() && c != '%');
            let value = value.trim().trim_matches(['"', ',', ';', '\t']);
            if is_axis_key(key) || vocabulary::names_wavelength(key) && key.contains("unit") {
                let hint = axis_hint(value).or_else(|| {
                    units::axis_unit(value).map(|unit| AxisHint { kind: AxisKind::Unit, unit: Some(unit) })
                });
                self.axis = self.axis.or(hint);
                return;
            }
            if is_ordinate_key(key) {
                self.ordinate = std::mem::take(&mut self.ordinate).or(&strip_role(ordinate_hint(value)));
                return;
            }
            if !is_comment(line) || text.contains([':', '=']) && !text.contains(',') {
                return;
            }
        }
        let hint = ordinate_hint(text);
        let short = text.split_whitespace().count() <= 4;
        let clear = hint.ordinate.is_some() && (hint.per.is_some() || hint.absolute)
            || hint.ordinate == Some(super::Ordinate::Photons)
            || short && pair.is_none();
        if clear && (hint.ordinate.is_some() || hint.counts || hint.not_emission.is_some()) {
            self.ordinate = std::mem::take(&mut self.ordinate).or(&strip_role(hint));
        }
        if self.axis.is_none()
            && let Some(hint) = text
                .split([',', ';', '\t'])
                .find_map(axis_hint)
                .filter(|hint| hint.unit.is_some() && hint.kind != AxisKind::Unit)
        {
            self.axis = Some(hint);
        }
    }
}

/// A remark about dark or reference concerns the file, not a column.
fn strip_role(mut hint: OrdinateHint) -> OrdinateHint {
    hint.aside = None;
    hint
}

fn is_axis_key(key: &str) -> bool {
    matches!(
        key,
        "x" | "x axis"
            | "x-axis"
            | "xaxis"
            | "x unit"
            | "x units"
            | "xunit"
            | "xunits"
            | "x-unit"
            | "x-units"
            | "abscissa"
            | "x label"
            | "xlabel"
            | "wavelength unit"
            | "wavelength units"
            | "axis"
            | "x axis unit"
            | "x-achse"
            | "axe x"
            | "x einheit"
            | "unit of wavelength"
            | "unite x"
            | "asse x"
            | "eje x"
    )
}

fn is_ordinate_key(key: &str) -> bool {
    matches!(
        key,
        "y" | "y axis"
            | "y-axis"
            | "yaxis"
            | "y unit"
            | "y units"
            | "yunit"
            | "yunits"
            | "y-unit"
            | "y-units"
            | "ordinate"
            | "y label"
            | "ylabel"
            | "unit"
            | "units"
            | "quantity"
            | "data type"
            | "datatype"
            | "spectrum type"
            | "type"
            | "measurement type"
            | "measurement mode"
            | "measurement"
            | "mode"
            | "y axis unit"
            | "y-achse"
            | "axe y"
            | "einheit"
            | "einheiten"
            | "unite"
            | "unites"
            | "unita"
            | "unita di misura"
            | "unidad"
            | "unidades"
            | "unidade"
            | "eenheid"
            | "enhet"
            | "jednostka"
            | "grosse"
            | "messgrosse"
            | "grandeur"
            | "ordinate unit"
            | "spectral unit"
            | "spectral units"
            | "spectral quantity"
            | "intensity unit"
            | "intensity units"
            | "data unit"
            | "data units"
            | "measured quantity"
            | "signal unit"
            | "asse y"
            | "eje y"
            | "value"
            | "values"
            | "radiometric quantity"
    )
}

/// The cells of a line when they can stand above `width` columns.
fn fitting_cells(line: &str, separator: Separator, width: usize, indexed: bool) -> Option<Vec<String>> {
    if line.len() > 1_000_000 {
        return None;
    }
    let separator =
        if matches!(separator, Separator::CommaPairs { .. }) { Separator::Comma } else { separator };
    let mut cells = if width == 1 {
        vec![without_comment_mark(line).trim_matches('"').to_owned()]
    } else {
        header_cells(line, separator, width)
    };
    while cells.len() > width && cells.last().is_some_and(String::is_empty) {
        cells.pop();
    }
    if indexed && cells.len() + 1 == width {
        cells.insert(0, String::new());
    }
    if cells.len() < width && cells.len() >= 2 && 2 * cells.len() >= width && separator != Separator::Blanks {
        cells.resize(width, String::new());
    }
    (cells.len() == width && cells.iter().any(|cell| !cell.is_empty())).then_some(cells)
}

/// Whether one of the lines directly above, all of the table's width, names an axis in its cells.
fn names_axis_above(
    above: &[TextLine<'_>],
    separator: Separator,
    width: usize,
    indexed: bool,
    most: usize,
) -> bool {
    width > 1
        && above
            .iter()
            .rev()
            .take(most)
            .map_while(|line| fitting_cells(line.text, separator, width, indexed))
            .any(|cells| cells.iter().any(|cell| axis_hint(cell).is_some()))
}

/// The lowest of some lines that names an axis among as many cells as the table has.
pub(super) fn header_line<'a>(lines: &[TextLine<'a>], separator: Separator, width: usize) -> Option<&'a str> {
    let names_axis = |line: &&TextLine<'_>| {
        fitting_cells(line.text, separator, width, false)
            .is_some_and(|cells| cells.iter().any(|cell| axis_hint(cell).is_some()))
    };
    lines.iter().rev().take(MAX_ROWS).filter(|_| width > 1).find(names_axis).map(|line| line.text.trim())
}

/// Whether a line of cells is a header row rather than a line of notes. `below` are the header rows already taken.
fn accepts(
    cells: &[String],
    below: &[Vec<String>],
    above: &[TextLine<'_>],
    separator: Separator,
    width: usize,
) -> bool {
    let names_axis = cells.iter().any(|cell| axis_hint(cell).is_some());
    let all_units = cells.iter().all(|cell| is_unit_cell(cell));
    let filled = cells.iter().filter(|cell| !cell.is_empty()).count();
    if width == 1 {
        let text = &cells[0];
        let folded = fold(text);
        let hint = ordinate_hint(text);
        let single = above.is_empty() && !text.contains([':', '=']);
        return below.is_empty()
            && text.len() < 80
            && !text.starts_with('[')
            && (single
                || hint.ordinate.is_some()
                || hint.counts
                || folded.starts_with("intens")
                || folded.starts_with("signal"));
    }
    let below_units = !below.is_empty() && below.iter().all(|row| row.iter().all(|cell| is_unit_cell(cell)));
    if !below.is_empty() && !below_units {
        // Above a row of names only a row that spans or names the same columns makes sense.
        return width >= 3
            && filled >= 2
            && !cells[0].ends_with(':')
            && (names_axis || all_units || filled + 1 >= width || cells[0].is_empty());
    }
    if names_axis || (all_units && filled >= 2) {
        return true;
    }
    if width >= 3 {
        return filled >= 2 && (filled + 1 >= width || below_units || names_pairs(cells));
    }
    let (first, second) = (&cells[0], &cells[1]);
    let key_value = first.is_empty()
        || second.is_empty()
        || first.ends_with(':')
        || first.contains('=')
        || second.starts_with(|c: char| c.is_ascii_digit())
        || second.starts_with(['=', ':']);
    let notes = above.iter().filter(|line| cell_list(line.text, separator).len() == 2).count();
    let marked = above
        .last()
        .is_some_and(|line| without_comment_mark(line.text).starts_with(['[', '>', '-', '*', '=']));
    !key_value && (notes == 0 || marked || below_units)
}

/// Nothing but units, one of which is longer than a letter that may be a name.
fn is_unit_row(row: &[String]) -> bool {
    row.iter().all(|cell| is_unit_cell(cell)) && row.iter().any(|cell| cell.trim().chars().count() > 1)
}

/// Every other cell is filled: `A,,B,`.
fn names_pairs(cells: &[String]) -> bool {
    cells.len() >= 4
        && cells.len().is_multiple_of(2)
        && cells.iter().enumerate().all(|(index, cell)| cell.is_empty() == (index % 2 == 1))
}

/// Builds the column headers from the header rows, top row first.
fn columns(rows: &[Vec<String>], width: usize) -> Vec<ColumnHeader> {
    let with_units = rows.len() > 1 && rows.iter().any(|row| is_unit_row(row));
    let is_name = |row: &[String], cell: &str| {
        let letter = (with_units || names_pairs(row)) && !is_unit_row(row) && cell.chars().count() == 1;
        letter && cell.chars().all(char::is_alphabetic) || !is_unit_cell(cell) && axis_hint(cell).is_none()
    };
    let name_row = name_row(rows, &is_name);
    // Names of pairs stand above the axis of the pair.
    let over_pairs = name_row.is_some_and(|row| rows.len() > 1 || names_pairs(&rows[row]));
    (0..width)
        .map(|column| {
            let cell = |row: &Vec<String>| row.get(column).cloned().unwrap_or_default();
            let cells: Vec<String> = rows.iter().map(cell).filter(|cell| !cell.is_empty()).collect();
            let own = |cell: &String| !is_unit_cell(cell) && axis_hint(cell).is_none();
            let mut name = name_row.map(|row| cell(&rows[row])).unwrap_or_default();
            if name.is_empty() && over_pairs {
                let left = (column > 0)
                    .then(|| name_row.map(|row| rows[row].get(column - 1).cloned().unwrap_or_default()))
                    .flatten();
                name = left
                    .filter(|left| name_row.is_some_and(|row| is_name(&rows[row], left)))
                    .unwrap_or_default();
            }
            if name.is_empty() {
                name = cells.iter().find(|cell| own(cell)).or(cells.first()).cloned().unwrap_or_default();
            }
            let mut axis = cells.iter().rev().find_map(|cell| axis_hint(cell));
            if let Some(hint) = axis.as_mut()
                && hint.unit.is_none()
            {
                hint.unit = cells.iter().find_map(|cell| units::axis_unit(cell));
            }
            if let Some(kind) = cells
                .iter()
                .find_map(|cell| axis_hint(cell).filter(|hint| hint.kind != AxisKind::Unit))
                .map(|hint| hint.kind)
                && let Some(hint) = axis.as_mut()
            {
                hint.kind = kind;
            }
            // "Power" above "nm": an ordinate's unit row never names an axis alone.
            if axis.is_some_and(|hint| hint.kind == AxisKind::Unit)
                && cells.iter().any(|cell| ordinate_hint(cell).ordinate.is_some())
            {
                axis = None;
            }
            let all = cells.join(" ");
            ColumnHeader { ordinate: ordinate_hint(&all), name, all, axis }
        })
        .collect()
}

/// The row whose cells tell the columns apart best; the topmost of equals, units only when there is nothing else.
fn name_row(rows: &[Vec<String>], is_name: &dyn Fn(&[String], &str) -> bool) -> Option<usize> {
    let distinct = |row: &[String]| {
        let mut names: Vec<&str> = row.iter().map(String::as_str).filter(|cell| is_name(row, cell)).collect();
        names.sort_unstable();
        names.dedup();
        names.len()
    };
    (0..rows.len()).rev().max_by_key(|&row| distinct(&rows[row]))
}
