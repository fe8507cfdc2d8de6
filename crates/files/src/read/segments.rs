//! Which rows of numbers belong together: one table broken by damaged lines, or several tables one below the other.

use super::header::header_line;
use super::split::{cell_list, is_comment};
use super::table::Table;
use std::ops::Range;

/// Fewer rows than this are no spectrum.
pub(super) const LEAST_ROWS: usize = 5;

/// Rows of one table.
#[derive(Debug, Clone)]
pub(super) struct Block {
    pub(super) rows: Vec<Range<usize>>,
    /// Unreadable lines inside, and the file line of the first.
    pub(super) unreadable: usize,
    pub(super) first_unreadable: usize,
}

impl Block {
    pub(super) fn len(&self) -> usize {
        self.rows.iter().map(ExactSizeIterator::len).sum()
    }

    pub(super) fn first_row(&self) -> usize {
        self.rows.first().map_or(0, |range| range.start)
    }

    pub(super) fn iter(&self) -> impl Iterator<Item = usize> + '_ {
        self.rows.iter().cloned().flatten()
    }
}

/// The longest run of rows without a line of text or a blank between; all rows when there are only scraps.
pub(super) fn longest_run(table: &Table<'_>) -> Range<usize> {
    let longest = runs(table).into_iter().max_by_key(ExactSizeIterator::len).unwrap_or(0..0);
    if longest.len() < LEAST_ROWS { 0..table.rows.len() } else { longest }
}

fn runs(table: &Table<'_>) -> Vec<Range<usize>> {
    let mut runs = Vec::new();
    let mut start = 0;
    for row in 1..table.rows.len() {
        if table.rows[row].after_blank || table.rows[row].texts != table.rows[row - 1].texts {
            runs.push(start..row);
            start = row;
        }
    }
    if start < table.rows.len() {
        runs.push(start..table.rows.len());
    }
    runs
}

#[derive(Clone, Copy, PartialEq)]
enum Order {
    Up,
    Down,
    None,
}

/// Joins runs whose axis goes on; the others are tables of their own, or notes when they are short.
pub(super) fn blocks(table: &Table<'_>, axis: Option<usize>) -> (Vec<Block>, Vec<usize>) {
    let runs = runs(table);
    let main = longest_run(table);
    let order = axis.map_or(Order::None, |axis| run_order(table, main, axis));
    let mut blocks: Vec<Block> = Vec::new();
    let mut last: Option<f64> = None;
    let mut named: Option<&str> = None;
    for run in runs {
        let first = axis.and_then(|axis| run.clone().find_map(|row| table.at(row, axis).number()));
        let goes_on = match (order, last, first) {
            (Order::Up, Some(last), Some(first)) => first >= last,
            (Order::Down, Some(last), Some(first)) => first <= last,
            _ => true,
        };
        // A header of its own begins a table; the same header again, as on every printed page, does not.
        let own = header_line(table.texts_before(run.start), table.separator, table.width);
        let goes_on = goes_on && own.is_none_or(|own| named == Some(own));
        named = own.or(named);
        let texts: Vec<_> =
            table.texts_before(run.start).iter().filter(|text| !is_comment(text.text)).collect();
        match blocks.last_mut() {
            Some(block) if goes_on => {
                block.unreadable += texts.len();
                if block.first_unreadable == 0 {
                    block.first_unreadable = texts.first().map_or(0, |text| text.line as usize);
                }
                block.rows.push(run.clone());
            }
            _ => blocks.push(Block { rows: vec![run.clone()], unreadable: 0, first_unreadable: 0 }),
        }
        last = axis.and_then(|axis| run.rev().find_map(|row| table.at(row, axis).number())).or(last);
    }
    let longest = blocks.iter().map(Block::len).max().unwrap_or(0);
    let mut short = Vec::new();
    blocks.retain(|block| {
        let keep = block.len() >= LEAST_ROWS || longest < LEAST_ROWS;
        if !keep {
            short.extend(block.iter().map(|row| table.rows[row].line as usize));
        }
        keep
    });
    if longest < LEAST_ROWS && blocks.len() > 1 {
        // Nothing but scraps: take them as one table, however badly it is broken.
        let unreadable = blocks.iter().map(|block| block.unreadable).sum::<usize>()
            + blocks.iter().skip(1).map(|block| table.texts_before(block.first_row()).len()).sum::<usize>();
        let rows = blocks.into_iter().flat_map(|block| block.rows).collect();
        blocks = vec![Block { rows, unreadable, first_unreadable: 0 }];
    }
    if blocks.len() == 1 {
        count_ends(table, &mut blocks[0]);
    }
    (blocks, short)
}

fn run_order(table: &Table<'_>, run: Range<usize>, axis: usize) -> Order {
    let values: Vec<f64> = run.filter_map(|row| table.at(row, axis).number()).collect();
    let steps = values.len().saturating_sub(1);
    let up = values.windows(2).filter(|pair| pair[1] > pair[0]).count();
    let down = values.windows(2).filter(|pair| pair[1] < pair[0]).count();
    if steps > 0 && up * 10 >= steps * 9 {
        Order::Up
    } else if steps > 0 && down * 10 >= steps * 9 {
        Order::Down
    } else {
        Order::None
    }
}

/// Lines of the table's shape above and below that are no numbers are notes while they are few, damage when they are many.
fn count_ends(table: &Table<'_>, block: &mut Block) {
    let shaped = |text: &str| {
        let cells = cell_list(text, table.separator);
        cells.len() == table.width
            && table.width > 1
            && cells.iter().skip(1).any(|cell| super::number::mark(cell, false).is_some())
    };
    let after = table.rows.last().map_or(0, |row| row.texts as usize).min(table.texts.len());
    let below: Vec<_> = table.texts[after..].iter().filter(|text| shaped(text.text)).collect();
    let above: Vec<_> =
        table.texts_before(block.first_row()).iter().filter(|text| shaped(text.text)).collect();
    for lines in [above, below] {
        if lines.len() >= LEAST_ROWS && lines.len() * 4 >= block.len() {
            block.unreadable += lines.len();
            if block.first_unreadable == 0 {
                block.first_unreadable = lines[0].line as usize;
            }
        }
    }
}
