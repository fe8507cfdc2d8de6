//! Questions about how a table is written and which of its columns are wanted.

use super::answers::{Answers, Decimal};
use super::columns::{Layout, MANY_COLUMNS, Series};
use super::dialect::{Dialect, Doubt};
use super::header::Header;
use super::reading::Draft;
use super::spectrum::Open;
use super::table::Table;
use super::vocabulary::Aside;

pub(super) fn ask_dialect(
    draft: &mut Draft,
    table: &Table<'_>,
    dialect: &Dialect,
    answers: &Answers,
    open: &mut Open,
) {
    match dialect.doubt {
        Some(Doubt::Commas(line)) => {
            draft.ask(
                format!("Line {line}: does the comma mark decimals or group thousands?"),
                "--decimal",
                &["comma", "point"],
            );
            *open = Open { values: true, ..*open };
        }
        Some(Doubt::Points(line)) => {
            draft.ask(
                format!("Line {line}: does the point mark decimals or group thousands?"),
                "--decimal",
                &["comma", "point"],
            );
            *open = Open { values: true, ..*open };
        }
        Some(Doubt::Pairs(line)) => {
            draft.ask(
                format!(
                    "Line {line}: does every comma separate columns, or is every second one a decimal mark?"
                ),
                "--decimal",
                &["comma", "point"],
            );
            *open = Open { axis: true, values: true, points: true, ..*open };
        }
        Some(Doubt::MarksChange(line)) => {
            draft.ask(
                format!("The decimal mark changes in line {line}: which of point and comma marks decimals?"),
                "--decimal",
                &["point", "comma"],
            );
            *open = Open { axis: true, values: true, points: true, ..*open };
        }
        None => {}
    }
    if let Some((rows, line)) = table.other_separator {
        if answers.columns.is_some() {
            draft.warn(format!("{rows} rows from line {line} on are separated otherwise than the rest."));
        } else {
            draft.ask(format!("{rows} rows from line {line} on are separated otherwise than the rest: which columns hold the values?"), "--columns", &[]);
            *open = Open { values: true, points: true, ..*open };
        }
    }
    if answers.decimal == Some(Decimal::Comma) && dialect.decimal == Decimal::Comma {
        draft.assume("Commas mark the decimals, as answered.");
    }
}

pub(super) fn ask_columns(
    draft: &mut Draft,
    header: &Header,
    layout: &Layout,
    answers: &Answers,
    places: &[usize],
) {
    let name = |column: usize| header.columns.get(column).map(|one| one.name.as_str()).unwrap_or_default();
    for &column in &layout.spare_axes {
        draft.assume(format!(
            "Column {} ({:?}) is a second axis of the same samples and is not used.",
            places[column],
            name(column)
        ));
    }
    if let Some(index) = layout.index {
        draft.assume(format!("Column {} counts the rows and is not used.", places[index]));
    }
    for &column in layout.no_numbers.iter().filter(|&&column| layout.role(column) != "value") {
        draft.assume(format!(
            "Column {} ({:?}) holds words, not numbers, and is not used.",
            places[column],
            name(column)
        ));
    }
    if layout.axis_by_numbers
        && let Some(axis) = layout.axis()
    {
        draft.assume(format!("Column {} is taken as the axis, by its numbers.", places[axis]));
    }
    if answers.columns.is_some() {
        return;
    }
    if !layout.aside.is_empty() {
        let list: Vec<String> = layout
            .aside
            .iter()
            .map(|(column, aside)| format!("{} ({:?}: {})", places[*column], name(*column), aside.word()))
            .collect();
        let kept: Vec<String> = layout.series.iter().map(|series| places[series.value].to_string()).collect();
        let kept = kept.join(",");
        draft.ask(
            format!("Columns set aside: {}. Which columns hold the spectra?", list.join(", ")),
            "--columns",
            &[&kept],
        );
    } else if layout.values > MANY_COLUMNS {
        draft.ask(
            format!("{} columns of values: which of them are wanted?", layout.values),
            "--columns",
            &[],
        );
    }
    let role = |series: &Series| header.columns.get(series.value).and_then(|one| one.ordinate.aside);
    for series in &layout.series {
        if let Some(aside @ (Aside::Dark | Aside::Reference | Aside::Raw | Aside::Uncertainty)) = role(series)
        {
            draft.warn(format!(
                "Column {} ({:?}) is named {}: it is read because no other values remain.",
                places[series.value],
                name(series.value),
                aside.word()
            ));
        }
    }
    let doubtful = layout.series.iter().filter(|series| role(series).is_some()).count();
    if doubtful > 1 && layout.aside.is_empty() {
        draft.ask(
            "All columns of values are named raw, dark or reference: which of them hold the spectra?",
            "--columns",
            &[],
        );
    }
}
