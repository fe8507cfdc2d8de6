//! The role of every column: axis, value, index, or set aside.

use super::answers::{Answers, AxisUnit};
use super::convert::{nm_from, visible};
use super::header::Header;
use super::number::Cell;
use super::table::Table;
use super::units::AxisKind;
use super::vocabulary::{self, Aside, fold};
use std::ops::Range;

/// Rows looked at to tell columns apart.
const SAMPLE_ROWS: usize = 20_000;
/// More value columns than this are asked about.
pub(super) const MANY_COLUMNS: usize = 500;

/// One spectrum's columns, counted from 0.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Series {
    pub(super) axis: Option<usize>,
    pub(super) value: usize,
}

/// The roles of all columns.
#[derive(Debug, Clone, Default)]
pub(super) struct Layout {
    pub(super) series: Vec<Series>,
    /// Columns set aside that the header calls dark, reference, raw or no emission.
    pub(super) aside: Vec<(usize, Aside)>,
    /// Columns of words: flags, remarks, times.
    pub(super) no_numbers: Vec<usize>,
    /// A column of row numbers.
    pub(super) index: Option<usize>,
    /// Second axes of the same samples (energy beside wavelength).
    pub(super) spare_axes: Vec<usize>,
    /// The axis was chosen by its numbers, not by a header.
    pub(super) axis_by_numbers: bool,
    /// All value columns, before any was set aside.
    pub(super) values: usize,
    /// The header names a frequency axis.
    pub(super) frequency: bool,
}

impl Layout {
    /// The axis column of the first spectrum.
    pub(super) fn axis(&self) -> Option<usize> {
        self.series.first().and_then(|series| series.axis)
    }

    /// The word for a column in a preview.
    pub(super) fn role(&self, column: usize) -> &'static str {
        if self.series.iter().any(|series| series.axis == Some(column)) {
            "axis"
        } else if self.series.iter().any(|series| series.value == column) {
            "value"
        } else if let Some((_, aside)) = self.aside.iter().find(|(one, _)| *one == column) {
            aside.word()
        } else if self.index == Some(column) {
            "row number"
        } else if self.no_numbers.contains(&column) {
            "words"
        } else if self.spare_axes.contains(&column) {
            "second axis"
        } else {
            "unused"
        }
    }
}

/// Numbers of a column over the sampled rows.
struct Column {
    values: Vec<f64>,
    rows: usize,
    words: usize,
}

impl Column {
    fn of(table: &Table<'_>, rows: &Range<usize>, column: usize) -> Self {
        let rows = rows.start..rows.end.min(rows.start + SAMPLE_ROWS);
        let mut values = Vec::with_capacity(rows.len());
        let mut words = 0;
        for row in rows.clone() {
            match table.at(row, column) {
                Cell::Number(value) => values.push(value),
                Cell::Word => words += 1,
                Cell::Missing => {}
            }
        }
        Self { values, rows: rows.len(), words }
    }

    fn is_empty(&self) -> bool {
        self.values.is_empty() && self.words == 0
    }

    fn ordered(&self) -> bool {
        let steps = self.values.len().saturating_sub(1);
        let up = self.values.windows(2).filter(|pair| pair[1] > pair[0]).count();
        let down = self.values.windows(2).filter(|pair| pair[1] < pair[0]).count();
        steps > 0 && up.max(down) * 20 >= steps * 19
    }

    /// 0, 1, 2, … or 1, 2, 3, …
    fn counts_rows(&self) -> bool {
        self.values.len() >= 3
            && self.values.len() == self.rows
            && (self.values[0] == 0.0 || self.values[0] == 1.0)
            && self.values.windows(2).all(|pair| pair[1] - pair[0] == 1.0)
    }

    /// Could be an axis by its numbers alone: mostly filled, mostly different, in no wild steps, in a range of light.
    fn axis_like(&self) -> bool {
        if self.values.len() * 5 < self.rows * 3 || self.values.len() < 2 {
            return false;
        }
        let positive: Vec<f64> = self.values.iter().copied().filter(|&value| value > 0.0).collect();
        if positive.len() * 5 < self.values.len() * 4 || plausible_units(&positive).is_empty() {
            return false;
        }
        if self.ordered() {
            return true;
        }
        let mut sorted = positive;
        sorted.sort_by(f64::total_cmp);
        let before = sorted.len();
        let mut steps: Vec<f64> =
            sorted.windows(2).map(|pair| pair[1] - pair[0]).filter(|&step| step > 0.0).collect();
        if (steps.len() + 1) * 2 < before || steps.is_empty() {
            return false;
        }
        steps.sort_by(f64::total_cmp);
        let median = steps[steps.len() / 2];
        // The steps of a shuffled grid are even; those of shuffled readings are not.
        steps[steps.len() * 9 / 10] <= 8.0 * median && steps[steps.len() / 10] * 8.0 >= median
    }
}

/// Units in which numbers of an axis cover some of 380–780 nm and lie mostly in 100–5000 nm, best covered first.
pub(super) fn plausible_units(values: &[f64]) -> Vec<AxisUnit> {
    let shares = AxisUnit::ALL.map(|unit| {
        let nm = values.iter().map(|&value| nm_from(value, unit));
        let optical = nm.clone().filter(|nm| (100.0..=5000.0).contains(nm)).count();
        let seen = nm.filter(|&nm| visible(nm)).count();
        (unit, if optical * 10 >= values.len() * 9 { seen } else { 0 })
    });
    let most = shares.iter().map(|share| share.1).max().unwrap_or(0);
    let mut fitting: Vec<_> = shares.into_iter().filter(|share| share.1 > 0 && share.1 * 3 >= most).collect();
    fitting.sort_by_key(|share| std::cmp::Reverse(share.1));
    fitting.into_iter().map(|share| share.0).collect()
}

/// Gives every column its role.
///
/// # Errors
/// A sentence when the answer `--columns` names columns that hold no values.
pub(super) fn assign(
    table: &Table<'_>,
    rows: &Range<usize>,
    header: &Header,
    answers: &Answers,
) -> Result<Layout, String> {
    let width = table.width;
    let mut layout = Layout::default();
    let named = |column: usize| header.columns.get(column).and_then(|one| one.axis);
    let hints: Vec<usize> = (0..width)
        .filter(|&column| named(column).is_some_and(|hint| hint.kind != AxisKind::Frequency))
        .collect();
    let columns: Vec<Column> = if width <= 64 {
        (0..width).map(|column| Column::of(table, rows, column)).collect()
    } else {
        Vec::new()
    };
    let column = |index: usize| {
        if columns.is_empty() {
            Column::of(table, rows, index)
        } else {
            Column { values: columns[index].values.clone(), ..columns[index] }
        }
    };
    layout.frequency = hints.is_empty() && (0..width).any(|column| named(column).is_some());

    layout.no_numbers.clone_from(&table.text_columns);
    let hints: Vec<usize> = hints.into_iter().filter(|one| !table.text_columns.contains(one)).collect();
    let mut axes = if answers.start_nm.is_some() {
        hints.clone()
    } else {
        axes_by_name(&hints, width, &mut layout, header)
    };
    axes.retain(|&axis| {
        answers.columns.as_ref().is_none_or(|wanted| !wanted.contains(&(axis + 1)) || hints.len() == 1)
    });
    let first = column(0);
    if axes.is_empty() && width > 1 && !layout.frequency {
        axes = axes_by_numbers(width, &column, header);
        layout.axis_by_numbers = !axes.is_empty();
    }
    for index in 0..width.min(2) {
        let header = header.columns.get(index);
        let says = header.is_some_and(|one| vocabulary::names_index(&fold(&one.all)));
        let blank = header.is_none_or(|one| one.all.is_empty());
        let counts = if index == 0 { first.counts_rows() } else { column(index).counts_rows() };
        if !axes.contains(&index)
            && (says || counts && (blank || index == 0 && axes.contains(&1)))
            && width > 1
        {
            layout.index = layout.index.or(Some(index));
        }
    }
    let values: Vec<usize> = (0..width)
        .filter(|index| {
            !axes.contains(index) && layout.index != Some(*index) && !layout.spare_axes.contains(index)
        })
        .filter(|&index| width > 200 || !column(index).is_empty())
        .collect();
    let wordy = |index: &usize| width <= 200 && column(*index).values.is_empty();
    let values = if values.iter().any(|index| !wordy(index)) {
        let (words, values) = values.into_iter().partition::<Vec<_>, _>(wordy);
        layout.no_numbers.extend(words);
        values
    } else {
        values
    };
    // Columns without a single number are read when there is nothing else, to say so.
    let values = if values.is_empty() {
        (0..width).filter(|index| !axes.contains(index) && layout.index != Some(*index)).collect()
    } else {
        values
    };
    layout.values = values.len();
    let axis_of = |value: usize| -> Option<usize> {
        if answers.start_nm.is_some() {
            return None;
        }
        axes.iter().copied().rfind(|&axis| axis < value).or(axes.first().copied())
    };
    let chosen = match &answers.columns {
        Some(wanted) => named_columns(wanted, width, &axes)?,
        None => set_aside(&values, header, &mut layout),
    };
    layout.series = chosen.into_iter().map(|value| Series { axis: axis_of(value), value }).collect();
    Ok(layout)
}

fn named_columns(wanted: &[usize], width: usize, axes: &[usize]) -> Result<Vec<usize>, String> {
    wanted
        .iter()
        .map(|&number| match number.checked_sub(1) {
            Some(index) if index < width && axes.contains(&index) => {
                Err(format!("expected columns of values in --columns, found the axis, column {number}"))
            }
            Some(index) if index < width => Ok(index),
            _ => Err(format!("expected columns between 1 and {width} in --columns, found {number}")),
        })
        .collect()
}

/// The axes among the columns whose header names one: one for all, or one for each pair.
fn axes_by_name(hints: &[usize], width: usize, layout: &mut Layout, header: &Header) -> Vec<usize> {
    let Some(&first) = hints.first() else { return Vec::new() };
    // Columns side by side that all name an axis are one axis in several units.
    let adjacent = hints.windows(2).any(|pair| pair[1] == pair[0] + 1)
        || hints.last() == Some(&(width - 1)) && hints.len() > 1;
    if hints.len() > 1 && adjacent {
        let kind = |column: &usize| header.columns[*column].axis.map(|hint| hint.kind);
        let best = hints
            .iter()
            .copied()
            .find(|column| kind(column) == Some(AxisKind::Wavelength))
            .or_else(|| hints.iter().copied().find(|column| kind(column) != Some(AxisKind::Energy)))
            .unwrap_or(first);
        layout.spare_axes = hints.iter().copied().filter(|&column| column != best).collect();
        return vec![best];
    }
    hints.to_vec()
}

fn axes_by_numbers(width: usize, column: &dyn Fn(usize) -> Column, header: &Header) -> Vec<usize> {
    let first = column(0);
    let says_index =
        |index: usize| header.columns.get(index).is_some_and(|one| vocabulary::names_index(&fold(&one.all)));
    let value_named = |index: usize| {
        header.columns.get(index).is_some_and(|one| {
            let hint = &one.ordinate;
            hint.ordinate.is_some()
                || hint.counts
                || hint.aside.is_some()
                || fold(&one.all).starts_with("intens")
        })
    };
    let fits = |index: usize, one: &Column| one.axis_like() && !says_index(index) && !value_named(index);
    if fits(0, &first) && !(first.counts_rows() && first.values[0] <= 1.0) {
        // Pairs: every other column is an axis too, and none of the rest is.
        let pairs = width >= 4
            && width.is_multiple_of(2)
            && width <= 2000
            && (2..width).step_by(2).all(|index| {
                let one = column(index);
                one.ordered() && fits(index, &one)
            })
            && (1..width).step_by(2).all(|index| {
                let one = column(index);
                !(one.ordered() && one.axis_like())
            });
        return if pairs { (0..width).step_by(2).collect() } else { vec![0] };
    }
    // An axis behind a column of row numbers, or the last column, or any that is in order.
    // Numbers in strict order are an axis even where they mean no light.
    let strict = |one: &Column| {
        one.values.len() == one.rows
            && one.rows >= 5
            && (one.values.windows(2).all(|pair| pair[1] > pair[0])
                || one.values.windows(2).all(|pair| pair[1] < pair[0]))
    };
    let candidates = std::iter::once(1).chain(std::iter::once(width - 1)).chain(2..width.min(50));
    for index in candidates {
        let one = column(index);
        let leaves_values = width > 2 || index == 0 || !first.counts_rows();
        if one.ordered() && fits(index, &one) && leaves_values {
            return vec![index];
        }
    }
    if strict(&first) && !says_index(0) && !value_named(0) && !first.counts_rows() {
        vec![0]
    } else {
        Vec::new()
    }
}

/// Sets aside what the header calls no emission, dark, reference, raw or uncertain, as long as something remains.
fn set_aside(values: &[usize], header: &Header, layout: &mut Layout) -> Vec<usize> {
    let mut kept = values.to_vec();
    let role = |column: usize| {
        let hint = header.columns.get(column).map(|one| &one.ordinate)?;
        hint.aside.or(hint.not_emission.map(Aside::NotEmission))
    };
    let rank = |aside: Aside| match aside {
        Aside::NotEmission(_) | Aside::Uncertainty => 0,
        Aside::Dark => 1,
        Aside::Reference => 2,
        Aside::Raw => 3,
    };
    for level in 0..4 {
        let (out, rest): (Vec<usize>, Vec<usize>) =
            kept.iter().copied().partition(|&column| role(column).is_some_and(|one| rank(one) == level));
        if rest.is_empty() {
            break;
        }
        layout.aside.extend(out.into_iter().filter_map(|column| role(column).map(|one| (column, one))));
        kept = rest;
    }
    kept
}
