//! The rows of numbers of a file, and the lines between them.

use super::answers::Decimal;
use super::dialect::Dialect;
use super::number::{Cell, cell, is_missing};
use super::split::{Lines, OpenQuote, Separator, cell_list, cells, is_comment};

/// More numbers than this are refused: no spectrum needs them, and memory is kept in bounds.
pub(super) const MAX_NUMBERS: usize = 5_000_000;
/// Lines of text kept; more are only counted.
const MAX_TEXTS: usize = 100_000;
/// Cells looked at in one line.
const MAX_WIDTH: usize = 100_000;

/// A row of numbers: where it stands and which cells are its own.
#[derive(Debug, Clone, Copy)]
pub(super) struct Row {
    pub(super) line: u32,
    start: u32,
    len: u32,
    /// Lines of text met before this row.
    pub(super) texts: u32,
    /// A blank line stands before it.
    pub(super) after_blank: bool,
}

/// A line that is no row of numbers.
#[derive(Debug, Clone, Copy)]
pub(super) struct TextLine<'a> {
    pub(super) line: u32,
    pub(super) text: &'a str,
}

/// All rows of a file in one dialect.
#[derive(Debug)]
pub(super) struct Table<'a> {
    pub(super) rows: Vec<Row>,
    cells: Vec<Cell>,
    pub(super) texts: Vec<TextLine<'a>>,
    /// Cells of a row.
    pub(super) width: usize,
    pub(super) separator: Separator,
    /// The text of the first row, for headers that are numbers.
    pub(super) first_line: &'a str,
    /// Rows read with another separator than the rest, and the line of the first.
    pub(super) other_separator: Option<(usize, usize)>,
    /// Columns of words, counted from 0.
    pub(super) text_columns: Vec<usize>,
    /// Rows with more cells than the table has columns.
    pub(super) too_wide: usize,
}

/// Why a file yields no table at all.
#[derive(Debug)]
pub(super) enum TableError {
    OpenQuote(usize),
    TooManyNumbers,
}

impl From<OpenQuote> for TableError {
    fn from(quote: OpenQuote) -> Self {
        Self::OpenQuote(quote.0)
    }
}

impl<'a> Table<'a> {
    /// Cell `column` of `row`; missing beyond the row's or the table's end.
    pub(super) fn at(&self, row: usize, column: usize) -> Cell {
        match self.rows.get(row) {
            Some(row) if column < row.len as usize => self.cells[row.start as usize + column],
            _ => Cell::Missing,
        }
    }

    /// Cells in `row`.
    pub(super) fn row_len(&self, row: usize) -> usize {
        self.rows[row].len as usize
    }

    /// The file line of `row`; 1 when there is no such row.
    pub(super) fn line(&self, row: usize) -> usize {
        self.rows.get(row).map_or(1, |row| row.line as usize)
    }

    /// The lines of text directly before `row`, back to the row before it; all of them when there are no rows.
    pub(super) fn texts_before(&self, row: usize) -> &[TextLine<'a>] {
        let until =
            self.rows.get(row).map_or(self.texts.len(), |row| row.texts as usize).min(self.texts.len());
        let from = row
            .checked_sub(1)
            .and_then(|before| self.rows.get(before))
            .map_or(0, |before| before.texts as usize);
        &self.texts[from.min(until)..until]
    }

    /// A table made from columns of numbers and their labels, as if it had been written upright.
    pub(super) fn upright(columns: &[Vec<Cell>], separator: Separator, line: u32) -> Self {
        let height = columns.iter().map(Vec::len).max().unwrap_or(0);
        let width = columns.len();
        let mut cells = Vec::with_capacity(width * height);
        let mut rows = Vec::with_capacity(height);
        for row in 0..height {
            rows.push(Row {
                line,
                start: cells.len() as u32,
                len: width as u32,
                texts: 0,
                after_blank: false,
            });
            cells.extend(columns.iter().map(|column| column.get(row).copied().unwrap_or(Cell::Missing)));
        }
        Self {
            rows,
            cells,
            texts: Vec::new(),
            width,
            separator,
            first_line: "",
            other_separator: None,
            text_columns: Vec::new(),
            too_wide: 0,
        }
    }

    /// Reads every line of `text`.
    ///
    /// # Errors
    /// A quote that never closes, or more than [`MAX_NUMBERS`] numbers.
    pub(super) fn parse(text: &'a str, dialect: &Dialect) -> Result<Self, TableError> {
        let mut table = Self {
            rows: Vec::new(),
            cells: Vec::new(),
            texts: Vec::new(),
            width: dialect.width,
            separator: dialect.separator,
            first_line: "",
            other_separator: None,
            text_columns: dialect.text_columns.clone(),
            too_wide: 0,
        };
        let mut after_blank = false;
        for line in Lines::new(text) {
            let (number, line) = line?;
            if line.trim().is_empty() {
                after_blank = true;
                continue;
            }
            if !table.push(number, line, dialect, after_blank)? && table.texts.len() < MAX_TEXTS {
                table.texts.push(TextLine { line: number as u32, text: line });
            }
            after_blank = false;
        }
        table.settle_width();
        table.read_otherwise(dialect);
        Ok(table)
    }

    /// Adds `line` when it is a row of numbers.
    fn push(
        &mut self,
        number: usize,
        line: &'a str,
        dialect: &Dialect,
        after_blank: bool,
    ) -> Result<bool, TableError> {
        if is_comment(line) {
            return Ok(false);
        }
        let start = self.cells.len();
        read_row(line, dialect, dialect.separator, &mut self.cells);
        if self.cells.len() > MAX_NUMBERS {
            return Err(TableError::TooManyNumbers);
        }
        let row = &self.cells[start..];
        let (numbers, words) = count(row);
        let whole = words == 0 && numbers > 0 && (row.len() > 1) == (dialect.width > 1);
        // An axis value beside unreadable cells is a damaged row, not a note.
        let damaged = words > 0
            && row.len() == dialect.width
            && row.len() > 1
            && row[0].number().is_some()
            && !self.rows.is_empty();
        let blank = numbers == 0 && words == 0;
        if !(whole || damaged) {
            self.cells.truncate(start);
            // A rule or a row of blanks is no text either.
            return Ok(blank && is_missing(line.trim()));
        }
        if self.rows.is_empty() {
            self.first_line = line;
        }
        let len = (self.cells.len() - start) as u32;
        self.rows.push(Row {
            line: number as u32,
            start: start as u32,
            len,
            texts: self.texts.len() as u32,
            after_blank,
        });
        Ok(true)
    }

    /// The commonest number of cells, or that of the first rows when columns of unequal length end one by one.
    fn settle_width(&mut self) {
        let mut counts: Vec<(usize, usize)> = Vec::new();
        for row in &self.rows {
            let len = row.len as usize;
            match counts.iter().position(|(width, _)| *width == len) {
                Some(index) => counts[index].1 += 1,
                None if counts.len() < 256 => counts.push((len, 1)),
                None => {}
            }
        }
        let common = counts
            .iter()
            .max_by_key(|(width, times)| (*times, *width))
            .map_or(self.width, |(width, _)| *width);
        let first = self.rows.first().map_or(0, |row| row.len as usize);
        let firsts = counts.iter().find(|(width, _)| *width == first).map_or(0, |(_, times)| *times);
        self.width = if first > common && firsts >= 5 { first } else { common }.max(1);
        let width = self.width;
        let cells = &self.cells;
        let before = self.rows.len();
        self.rows.retain(|row| {
            let extra = &cells[row.start as usize..(row.start + row.len) as usize];
            extra.len() <= width || extra[width..].iter().all(|cell| *cell == Cell::Missing)
        });
        self.too_wide = before - self.rows.len();
    }

    /// Tries the lines of text inside the table with the other separators.
    fn read_otherwise(&mut self, dialect: &Dialect) {
        let (Some(first), true) = (self.rows.first().map(|row| row.line), self.width > 1) else { return };
        let mut before = 0;
        let mut found: Vec<(usize, Vec<Cell>)> = Vec::new();
        for (index, text) in self.texts.iter().enumerate() {
            if is_comment(text.text) || text.text.len() > 10_000 {
                continue;
            }
            for other in Separator::ALL {
                if other == dialect.separator {
                    continue;
                }
                let mut row = Vec::new();
                read_row(
                    text.text,
                    &Dialect { either_mark: true, text_columns: Vec::new(), ..dialect.clone() },
                    other,
                    &mut row,
                );
                if row.len() == self.width && count(&row) == (self.width, 0) {
                    before += usize::from(text.line < first);
                    found.push((index, row));
                    break;
                }
            }
        }
        // A few numbers above the table are notes.
        if before < 5 {
            found.drain(..before);
        }
        if found.len() < 2 {
            return;
        }
        self.other_separator = Some((found.len(), self.texts[found[0].0].line as usize));
        let mut texts_left = Vec::with_capacity(self.texts.len());
        let mut next = found.iter().peekable();
        let mut removed_before = Vec::with_capacity(self.texts.len() + 1);
        let mut removed = 0_u32;
        for (index, text) in self.texts.iter().enumerate() {
            removed_before.push(removed);
            if next.peek().is_some_and(|(at, _)| *at == index) {
                next.next();
                removed += 1;
            } else {
                texts_left.push(*text);
            }
        }
        removed_before.push(removed);
        for row in &mut self.rows {
            row.texts -= removed_before[(row.texts as usize).min(removed_before.len() - 1)];
        }
        for (index, cells) in &found {
            let start = self.cells.len() as u32;
            self.cells.extend_from_slice(cells);
            let texts = *index as u32 - removed_before[*index];
            let line = self.texts[*index].line;
            self.rows.push(Row { line, start, len: cells.len() as u32, texts, after_blank: false });
        }
        self.texts = texts_left;
        self.rows.sort_by_key(|row| row.line);
    }
}

fn count(row: &[Cell]) -> (usize, usize) {
    let numbers = row.iter().filter(|cell| matches!(cell, Cell::Number(_))).count();
    let words = row.iter().filter(|cell| matches!(cell, Cell::Word)).count();
    (numbers, words)
}

/// Appends the cells of `line`.
pub(super) fn read_row(line: &str, dialect: &Dialect, separator: Separator, into: &mut Vec<Cell>) {
    if let Separator::CommaPairs { whole_axis } = separator {
        let list = cell_list(line, Separator::Comma);
        let (alone, paired) = list.split_at(usize::from(whole_axis).min(list.len()));
        into.extend(alone.iter().map(|token| cell(token, Decimal::Comma, false)));
        if paired.len().is_multiple_of(2) {
            into.extend(paired.chunks(2).map(|pair| {
                let joined = format!("{},{}", pair[0], pair[1]);
                if pair.iter().all(|part| part.is_empty()) {
                    Cell::Missing
                } else {
                    cell(&joined, Decimal::Comma, false)
                }
            }));
        } else {
            into.extend(paired.iter().map(|token| cell(token, Decimal::Comma, false)));
        }
        return;
    }
    let spaces = separator.spaces_group();
    let start = into.len();
    let limit = start + MAX_WIDTH.min(MAX_NUMBERS);
    cells(line, separator, |token| {
        let mut one = cell(token, dialect.decimal, spaces);
        if one == Cell::Word && dialect.text_columns.contains(&(into.len() - start)) {
            one = Cell::Missing;
        } else if one == Cell::Word && dialect.either_mark {
            one = cell(token, dialect.decimal.other(), spaces);
        }
        into.push(one);
        into.len() < limit
    });
}
