//! Delimited text, from decoded characters to spectra.

use super::answers::Answers;
use super::axis::axis_sources;
use super::columns::{self, Layout};
use super::decode::Decoded;
use super::dialect::{self, Dialect};
use super::header::Header;
use super::number::Cell;
use super::questions::{ask_columns, ask_dialect};
use super::reading::Draft;
use super::samples::Samples;
use super::segments::{Block, LEAST_ROWS, blocks, longest_run};
use super::spectrum::{Open, SpectrumAsk, make, report, unusable};
use super::split::without_comment_mark;
use super::table::{Table, TableError};
use super::transposed::{self, Turned};
use super::units::{AxisHint, AxisKind};

/// Reads a table of spectra from text.
pub(super) fn read_text(stem: &str, decoded: &Decoded<'_>, answers: &Answers) -> Draft {
    let mut draft = Draft {
        assumptions: decoded.assumptions.clone(),
        warnings: decoded.warnings.clone(),
        ..Draft::default()
    };
    draft.facts.format = "delimited text";
    draft.facts.encoding = decoded.encoding;
    if let Err((line, sentence)) = read_into(&mut draft, stem, &decoded.text, answers) {
        draft.refuse(line, sentence);
    }
    draft
}

/// Why a file is refused: the line, when it is one, and a sentence.
pub(super) type Refusal = (Option<usize>, String);

fn read_into(draft: &mut Draft, stem: &str, text: &str, answers: &Answers) -> Result<(), Refusal> {
    check_answers(answers)?;
    let open_quote = |line: usize| {
        (Some(line), "expected a closing quote, found none before the end of the file".to_owned())
    };
    let dialect = dialect::choose(text, answers).map_err(|quote| open_quote(quote.0))?;
    draft.facts.separator = dialect.separator.name();
    draft.facts.decimal = Some(dialect.decimal);
    // A long file without numbers need not be read to its end.
    let text = if dialect.barren && text.len() > 1 << 20 { beginning(text) } else { text };
    let table = Table::parse(text, &dialect).map_err(|error| match error {
        TableError::OpenQuote(line) => open_quote(line),
        TableError::TooManyNumbers => (
            None,
            format!("expected at most {} million numbers, found more", super::table::MAX_NUMBERS / 1_000_000),
        ),
    })?;
    let main = longest_run(&table);
    let indexed = table.width > 1
        && main.len() >= 2
        && table
            .at(main.start + 1, 0)
            .number()
            .zip(table.at(main.start, 0).number())
            .is_some_and(|(b, a)| b - a == 1.0 && a <= 1.0);
    let mut header = Header::read(table.texts_before(main.start), table.separator, table.width, indexed);
    let mut layout = columns::assign(&table, &main, &header, answers).map_err(|sentence| (None, sentence))?;
    // Damaged rows and remarks may stand before the longest run: its header is that of the table it goes on with.
    let start = blocks(&table, layout.axis())
        .0
        .iter()
        .find(|block| block.rows.iter().any(|rows| rows.contains(&main.start)))
        .map_or(main.start, Block::first_row);
    if start < main.start {
        header = Header::read(table.texts_before(start), table.separator, table.width, indexed);
        layout = columns::assign(&table, &main, &header, answers).map_err(|sentence| (None, sentence))?;
    }
    // A table on its side reads as too few rows, or as rows without an axis column.
    if (main.len() < LEAST_ROWS
        || layout.axis().is_none()
        || layout.axis_by_numbers && table.width > table.rows.len())
        && answers.start_nm.is_none()
        && let Some(turned) = transposed::find(text, &dialect)
    {
        return read_turned(draft, stem, &turned, &dialect, answers);
    }
    if table.rows.len() <= 1
        && let Some(row) = transposed::single(text, &dialect)
    {
        return read_row_alone(draft, stem, &row, &dialect, answers);
    }
    if table.rows.is_empty() {
        return Err(no_rows(text, &table));
    }
    for sentence in &dialect.assumptions {
        draft.assume(sentence.clone());
    }
    let (mut parts, short) = blocks(&table, layout.axis());
    if let Some(row) = numeric_header(&table, &parts, &layout, &header) {
        let labels: Vec<String> = super::split::cell_list(table.first_line, table.separator)
            .into_iter()
            .map(str::to_owned)
            .collect();
        header =
            Header { axis: header.axis, ordinate: header.ordinate.clone(), ..Header::from_labels(&labels) };
        if let Some(range) = parts[0].rows.first_mut().filter(|range| range.start == row) {
            range.start += 1;
        }
        layout = columns::assign(&table, &(row + 1..main.end), &header, answers)
            .map_err(|sentence| (None, sentence))?;
    } else if let Some(sentence) = count_line(&table, &mut parts, &layout) {
        draft.assume(sentence);
    }
    if parts.iter().map(Block::len).sum::<usize>() == 0 {
        return Err(no_rows(text, &table));
    }
    if !short.is_empty() {
        draft.assume(format!(
            "{} rows of numbers outside the table are notes, line {} first.",
            short.len(),
            short[0]
        ));
    }
    // Statements may also follow the table.
    let after = table.rows.last().map_or(0, |row| row.texts as usize).min(table.texts.len());
    for text in table.texts[after..].iter().take(50) {
        if without_comment_mark(text.text).len() < 100 && text.text.contains(':') {
            header.note(text.text);
        }
    }
    draft.facts.first_data_line = table.line(parts[0].first_row());
    draft.facts.rows = parts.iter().map(Block::len).sum();
    let places: Vec<usize> = (1..=table.width).collect();
    read_table(draft, stem, &table, &parts, &header, &layout, &dialect, answers, &places)
}

/// The first lines of a long text.
fn beginning(text: &str) -> &str {
    let mut end = 1 << 20;
    while !text.is_char_boundary(end) {
        end -= 1;
    }
    &text[..end]
}

fn check_answers(answers: &Answers) -> Result<(), Refusal> {
    let fail = |sentence: &str| Err((None, sentence.to_owned()));
    match (answers.start_nm, answers.step_nm) {
        (None, None) => {}
        (Some(start), Some(step)) => {
            if !(start.is_finite() && start > 0.0) {
                return fail("expected a wavelength above 0 in --start");
            }
            if !(step.is_finite() && step != 0.0) {
                return fail("expected a step other than 0 in --step");
            }
        }
        _ => return fail("expected --start and --step together, found one of them"),
    }
    if answers.columns.as_ref().is_some_and(Vec::is_empty) {
        return fail("expected at least one column in --columns, found none");
    }
    Ok(())
}

/// The refusal of a file without a single row of numbers.
fn no_rows(text: &str, table: &Table<'_>) -> Refusal {
    let lines = table.texts.len();
    let sample = table.texts.get(lines.saturating_sub(1).min(2)).or(table.texts.first());
    match sample {
        Some(line) => {
            let shown: String = line.text.trim().chars().take(60).collect();
            (Some(line.line as usize), format!("expected rows of wavelength and value, found {shown:?}"))
        }
        None => (
            Some(1),
            format!(
                "expected rows of wavelength and value, found {} characters without a number",
                text.chars().take(1000).count()
            ),
        ),
    }
}

/// A first row without axis value but with a number above every column is a header of numbers: currents, angles.
fn numeric_header(table: &Table<'_>, parts: &[Block], layout: &Layout, header: &Header) -> Option<usize> {
    let row = parts.first()?.first_row();
    let axis = layout.axis()?;
    let bare = header.rows == 0 && row == 0 && table.width > 2;
    (bare
        && table.at(row, axis).number().is_none()
        && (0..table.width)
            .filter(|&column| column != axis)
            .all(|column| table.at(row, column).number().is_some()))
    .then_some(row)
}

/// A first row that counts the rows below it is no sample.
fn count_line(table: &Table<'_>, parts: &mut [Block], layout: &Layout) -> Option<String> {
    let block = parts.first_mut()?;
    let first = block.first_row();
    let axis = layout.axis()?;
    let count = table.at(first, axis).number()?;
    let (one, two) = (table.at(first + 1, axis).number()?, table.at(first + 2, axis).number()?);
    let out_of_order = (count - one) * (one - two) < 0.0;
    let rest = block.len().checked_sub(1)?;
    if !(out_of_order && rest >= LEAST_ROWS && count == rest as f64 && table.width == 2) {
        return None;
    }
    block.rows.first_mut()?.start += 1;
    Some(format!("Line {} counts the rows that follow and is no sample.", table.rows[first].line))
}

/// One row of values: the wavelengths are asked.
fn read_row_alone(
    draft: &mut Draft,
    stem: &str,
    row: &Turned,
    dialect: &Dialect,
    answers: &Answers,
) -> Result<(), Refusal> {
    let table = Table::upright(&row.columns, dialect.separator, row.line as u32);
    let mut header = Header::from_labels(&row.labels);
    header.columns[0].axis = None;
    for note in &row.notes {
        header.note(note);
    }
    for sentence in &dialect.assumptions {
        draft.assume(sentence.clone());
    }
    draft.assume("The values stand in one row.");
    let layout =
        Layout { series: vec![columns::Series { axis: None, value: 0 }], values: 1, ..Layout::default() };
    let all = 0..table.rows.len();
    let block = Block { rows: vec![all], unreadable: 0, first_unreadable: 0 };
    draft.facts.transposed = true;
    draft.facts.first_data_line = row.line;
    draft.facts.rows = 1;
    read_table(draft, stem, &table, &[block], &header, &layout, dialect, answers, &row.places)
}

fn read_turned(
    draft: &mut Draft,
    stem: &str,
    turned: &Turned,
    dialect: &Dialect,
    answers: &Answers,
) -> Result<(), Refusal> {
    let table = Table::upright(&turned.columns, dialect.separator, turned.line as u32);
    let mut header = Header::from_labels(&turned.labels);
    for note in &turned.notes {
        header.note(note);
    }
    draft.assume("Wavelengths run along a row: each further row is a spectrum.");
    for sentence in &dialect.assumptions {
        draft.assume(sentence.clone());
    }
    // The axis is known: it was found as a row.
    let hint = header.columns[0].axis.or(header.axis);
    header.columns[0].axis = hint.or(Some(AxisHint { kind: AxisKind::Unit, unit: None }));
    for column in header.columns.iter_mut().skip(1) {
        column.axis = column.axis.filter(|hint| hint.kind != AxisKind::Unit);
    }
    let inner = Answers {
        columns: match &answers.columns {
            None => None,
            Some(wanted) => Some(
                wanted
                    .iter()
                    .map(|place| {
                        turned.places.iter().position(|one| one == place).map(|index| index + 1).ok_or_else(
                            || (None, format!("expected rows of values in --columns, found {place}")),
                        )
                    })
                    .collect::<Result<_, Refusal>>()?,
            ),
        },
        ..answers.clone()
    };
    let all = 0..table.rows.len();
    let layout = columns::assign(&table, &all, &header, &inner).map_err(|sentence| (None, sentence))?;
    let block = Block { rows: vec![all], unreadable: 0, first_unreadable: 0 };
    draft.facts.transposed = true;
    draft.facts.first_data_line = turned.line;
    draft.facts.rows = turned.columns.len();
    read_table(draft, stem, &table, &[block], &header, &layout, dialect, &inner, &turned.places)
}

#[expect(clippy::too_many_arguments, reason = "the one place where the parts of a file come together")]
fn read_table(
    draft: &mut Draft,
    stem: &str,
    table: &Table<'_>,
    parts: &[Block],
    header: &Header,
    layout: &Layout,
    dialect: &Dialect,
    answers: &Answers,
    places: &[usize],
) -> Result<(), Refusal> {
    draft.facts.columns = (0..table.width.min(2000))
        .map(|column| {
            (header.columns.get(column).map(|one| one.name.clone()).unwrap_or_default(), layout.role(column))
        })
        .collect();
    check_damage(draft, table, parts, layout)?;
    if layout.frequency && answers.axis.is_none() && answers.start_nm.is_none() {
        return Err((
            Some(draft.facts.first_data_line),
            "expected an axis of wavelength, energy or wavenumber, found a frequency".into(),
        ));
    }
    let mut open = Open::default();
    ask_dialect(draft, table, dialect, answers, &mut open);
    ask_columns(draft, header, layout, answers, places);
    let sources = axis_sources(draft, table, parts, header, layout, answers, &mut open)?;
    let paired = sources.len() > 1 && layout.series.iter().any(|series| series.axis != layout.axis());
    let mut failures: Vec<(usize, String)> = Vec::new();
    let names = names(stem, header, layout, parts, table);
    for (part, block) in parts.iter().enumerate() {
        for (index, series) in layout.series.iter().enumerate() {
            let name = &names[part * layout.series.len() + index];
            let source = sources[index];
            let samples = Samples::collect(table, block, source, series.value, paired);
            let many = layout.series.len() * parts.len() > 1;
            let label = if many { format!("{name:?}: ") } else { String::new() };
            if let Some(failure) = unusable(&samples) {
                let line = table.line(block.first_row());
                failures.push((
                    if samples.first_bad_line > 0 { samples.first_bad_line } else { line },
                    format!("{label}{failure}"),
                ));
                continue;
            }
            report(draft, &label, &samples, layout, many);
            let ask = SpectrumAsk { name, label: &label, place: places[series.value], open };
            if let Some(spectrum) = make(draft, &samples, source, header, series, answers, &ask) {
                draft.spectra.push(spectrum);
            }
        }
    }
    if draft.spectra.is_empty() {
        let (line, sentence) =
            failures.into_iter().next().unwrap_or((1, "expected a column of values, found none".into()));
        return Err((Some(line), sentence));
    }
    for (_, sentence) in failures {
        draft.warn(format!("Left out {sentence}."));
    }
    Ok(())
}

/// Refuses tables a fifth of which cannot be read, and warns of lesser damage.
fn check_damage(
    draft: &mut Draft,
    table: &Table<'_>,
    parts: &[Block],
    layout: &Layout,
) -> Result<(), Refusal> {
    let mut unreadable = table.too_wide + parts.iter().map(|block| block.unreadable).sum::<usize>();
    let mut first = parts.iter().map(|block| block.first_unreadable).find(|&line| line > 0).unwrap_or(0);
    let mut rows = 0;
    let single = layout.series.len() == 1;
    for row in parts.iter().flat_map(Block::iter) {
        rows += 1;
        let word = |column: usize| table.at(row, column) == Cell::Word;
        let axis = layout.series.iter().any(|series| series.axis.is_some_and(word));
        let values = layout.series.iter().all(|series| word(series.value));
        if axis || values && (single || !layout.series.is_empty()) {
            unreadable += 1;
            if first == 0 {
                first = table.rows[row].line as usize;
            }
        }
    }
    let total = rows + table.too_wide + parts.iter().map(|block| block.unreadable).sum::<usize>();
    if unreadable > 0 && unreadable * 5 >= total {
        let line = if first > 0 { first } else { draft.facts.first_data_line };
        return Err((
            Some(line),
            format!(
                "expected rows of numbers, found {unreadable} of {total} rows unreadable (words or dates)"
            ),
        ));
    }
    let lost = table.too_wide + parts.iter().map(|block| block.unreadable).sum::<usize>();
    if lost > 0 {
        let at = if first > 0 { format!(", line {first} first") } else { String::new() };
        draft.warn(format!(
            "{lost} unreadable {} left out{at}.",
            if lost == 1 { "row was" } else { "rows were" }
        ));
    }
    Ok(())
}

/// Names of all spectra, block by block.
fn names(stem: &str, header: &Header, layout: &Layout, parts: &[Block], table: &Table<'_>) -> Vec<String> {
    let total = layout.series.len() * parts.len();
    let fallback = |number: usize| if total > 1 { format!("{stem} {number}") } else { stem.to_owned() };
    let mut names = Vec::with_capacity(total);
    for (part, block) in parts.iter().enumerate() {
        let own = (parts.len() > 1).then(|| {
            Header::read(table.texts_before(block.first_row()), table.separator, table.width, false)
        });
        let label = table
            .texts_before(block.first_row())
            .iter()
            .rev()
            .map(|text| {
                without_comment_mark(text.text)
                    .trim_matches(|c: char| matches!(c, '[' | ']' | '<' | '>' | '=' | '-' | '*' | ':' | ' '))
            })
            .find(|text| !text.is_empty() && super::split::cell_list(text, table.separator).len() == 1);
        for series in &layout.series {
            let head = own.as_ref().unwrap_or(header);
            let mut name = head.columns.get(series.value).map(|one| one.name.clone()).unwrap_or_default();
            if parts.len() > 1
                && let Some(label) = label
                && part < parts.len()
            {
                let label = label.split_once(':').map_or(label, |(_, value)| value.trim());
                name = if layout.series.len() > 1 { format!("{label} {name}") } else { label.to_owned() };
            }
            if name.trim().is_empty() {
                name = fallback(names.len() + 1);
            }
            names.push(name.trim().to_owned());
        }
    }
    names
}
