//! Delimited text, from decoded characters to spectra.

use super::answers::{Answers, AxisUnit, Decimal, Ordinate, Per};
use super::columns::{self, Layout, MANY_COLUMNS, Series, plausible_units};
use super::convert::{axis_sentence, factor, nm_from, ordinate_sentences, visible};
use super::decode::Decoded;
use super::dialect::{self, Dialect, Doubt};
use super::header::Header;
use super::judge::{self, judge};
use super::reading::{Draft, QUANTITIES, Raw, ReadSpectrum};
use super::samples::{AxisSource, Samples};
use super::segments::{Block, LEAST_ROWS, blocks, longest_run};
use super::split::without_comment_mark;
use super::table::{Table, TableError};
use super::transposed::{self, Turned};
use super::units::{AxisHint, AxisKind, OrdinateHint};
use super::vocabulary::Aside;
use colour::Spectrum;
use project::Correction;

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

type Refusal = (Option<usize>, String);

fn read_into(draft: &mut Draft, stem: &str, text: &str, answers: &Answers) -> Result<(), Refusal> {
    check_answers(answers)?;
    let open_quote = |line: usize| {
        (Some(line), "expected a closing quote, found none before the end of the file".to_owned())
    };
    let dialect = dialect::choose(text, answers).map_err(|quote| open_quote(quote.0))?;
    draft.facts.separator = dialect.separator.name();
    draft.facts.decimal = Some(dialect.decimal);
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
    let header = Header::read(table.texts_before(main.start), table.separator, table.width, indexed);
    let mut layout = columns::assign(&table, &main, &header, answers).map_err(|sentence| (None, sentence))?;
    // A table on its side reads as too few rows, or as rows without an axis column.
    if (main.len() < LEAST_ROWS
        || layout.axis().is_none()
        || layout.axis_by_numbers && table.width > table.rows.len())
        && answers.start_nm.is_none()
        && let Some(turned) = transposed::find(text, &dialect)
    {
        return read_turned(draft, stem, &turned, &dialect, answers);
    }
    if table.rows.is_empty() {
        return Err(no_rows(text, &table));
    }
    for sentence in &dialect.assumptions {
        draft.assume(sentence.clone());
    }
    let mut header = header;
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
        let word = |column: usize| table.at(row, column) == super::number::Cell::Word;
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

fn ask_dialect(draft: &mut Draft, table: &Table<'_>, dialect: &Dialect, answers: &Answers, open: &mut Open) {
    match dialect.doubt {
        Some(Doubt::Commas(line)) => {
            draft.ask(
                format!("Line {line}: does the comma mark decimals or group thousands?"),
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

fn ask_columns(draft: &mut Draft, header: &Header, layout: &Layout, answers: &Answers, places: &[usize]) {
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

/// The axis of every spectrum; decided once for each axis column.
fn axis_sources(
    draft: &mut Draft,
    table: &Table<'_>,
    parts: &[Block],
    header: &Header,
    layout: &Layout,
    answers: &Answers,
    open: &mut Open,
) -> Result<Vec<AxisSource>, Refusal> {
    let mut known: Vec<(Option<usize>, AxisSource)> = Vec::new();
    let mut sources = Vec::with_capacity(layout.series.len());
    for series in &layout.series {
        if let Some((_, source)) = known.iter().find(|(axis, _)| *axis == series.axis) {
            sources.push(*source);
            continue;
        }
        let source = match (series.axis, answers.start_nm, answers.step_nm) {
            (_, Some(start_nm), Some(step_nm)) => {
                let rows = parts.iter().map(Block::len).max().unwrap_or(0);
                let last = start_nm + step_nm * rows.saturating_sub(1) as f64;
                if start_nm.min(last) > 780.0 || start_nm.max(last) < 380.0 {
                    return Err((
                        None,
                        format!(
                            "expected wavelengths between 380 and 780 nm, found {start_nm} to {last} nm by --start and --step"
                        ),
                    ));
                }
                draft.assume(format!(
                    "Wavelengths run from {start_nm} nm in steps of {step_nm} nm, as answered."
                ));
                AxisSource::Steps { start_nm, step_nm }
            }
            (Some(axis), ..) => axis_column(draft, table, parts, header, axis, answers, open)?,
            (None, ..) => {
                draft.ask(
                    "No column holds wavelengths: what is the first, and what the step?",
                    "--start and --step",
                    &[],
                );
                *open = Open { axis: true, values: true, ..*open };
                AxisSource::Steps { start_nm: 1.0, step_nm: 1.0 }
            }
        };
        known.push((series.axis, source));
        sources.push(source);
    }
    Ok(sources)
}

fn axis_column(
    draft: &mut Draft,
    table: &Table<'_>,
    parts: &[Block],
    header: &Header,
    column: usize,
    answers: &Answers,
    open: &mut Open,
) -> Result<AxisSource, Refusal> {
    let values: Vec<f64> =
        parts.iter().flat_map(Block::iter).filter_map(|row| table.at(row, column).number()).collect();
    let line = Some(draft.facts.first_data_line);
    let seen = |unit: AxisUnit, scale: f64| {
        values.iter().filter(|&&value| visible(nm_from(value * scale, unit))).count()
    };
    let positive: Vec<f64> = values.iter().copied().filter(|&value| value > 0.0).collect();
    let (low, high) = values
        .iter()
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), &value| (low.min(value), high.max(value)));
    let range = format!("{} to {}", judge::short(low), judge::short(high));
    let nothing = |unit: AxisUnit| {
        Err((
            line,
            format!(
                "expected wavelengths between 380 and 780 nm, found an axis from {range} {}",
                unit.symbol()
            ),
        ))
    };
    let hint = header.columns.get(column).and_then(|one| one.axis);
    let stated = hint.and_then(|hint| hint.unit).or(header
        .axis
        .filter(|_| {
            header.columns.get(column).is_none_or(|one| one.axis.is_none_or(|hint| hint.unit.is_none()))
        })
        .and_then(|hint| hint.unit));
    if let Some(unit) = answers.axis {
        if seen(unit, 1.0) == 0 {
            return nothing(unit);
        }
        draft.assume(format!("The axis is in {}, as answered.", unit.symbol()));
        return Ok(accept(draft, column, unit, 1.0));
    }
    let all = plausible_units(&positive);
    if let Some((unit, scale)) = stated {
        if seen(unit, scale) > 0 {
            if unit == AxisUnit::M {
                ask_axis(draft, open, "The axis is in metres, which is rare: is that right?", &[AxisUnit::M]);
            }
            return Ok(accept(draft, column, unit, scale));
        }
        // Light just outside the visible is no mistake of the header; anything else may be.
        let optical = positive
            .iter()
            .filter(|&&value| (100.0..=3000.0).contains(&nm_from(value * scale, unit)))
            .count()
            * 2
            > positive.len();
        if optical || all.is_empty() {
            return nothing(unit);
        }
        ask_axis(
            draft,
            open,
            &format!(
                "The header says {}, but the axis runs from {range}: which unit is it in?",
                unit.symbol()
            ),
            &all,
        );
        return Ok(accept(draft, column, all[0], 1.0));
    }
    let kind = hint.or(header.axis).map(|hint| hint.kind);
    let fits = |unit: &AxisUnit| match kind {
        Some(AxisKind::Wavelength) => unit.is_wavelength(),
        Some(AxisKind::Energy) => *unit == AxisUnit::Ev,
        Some(AxisKind::Wavenumber) => *unit == AxisUnit::Cm1,
        _ => true,
    };
    let fitting: Vec<AxisUnit> = all.iter().copied().filter(fits).collect();
    match fitting.as_slice() {
        [] if all.is_empty() => {
            Err((line, format!("expected wavelengths between 380 and 780 nm, found an axis from {range}")))
        }
        [] => {
            ask_axis(
                draft,
                open,
                &format!("The axis runs from {range}, which does not fit its name: which unit is it in?"),
                &all,
            );
            Ok(accept(draft, column, all[0], 1.0))
        }
        [AxisUnit::M] => {
            ask_axis(draft, open, &format!("The axis runs from {range}: is it in metres?"), &[AxisUnit::M]);
            Ok(accept(draft, column, AxisUnit::M, 1.0))
        }
        [unit] => {
            draft.assume(format!(
                "Unit of the axis not stated: taken as {}, since it runs from {range}.",
                unit.symbol()
            ));
            Ok(accept(draft, column, *unit, 1.0))
        }
        [AxisUnit::Nm, ..] if kind == Some(AxisKind::Wavelength) => {
            draft.assume(format!("Unit of the axis not stated: taken as nm, since it runs from {range}."));
            Ok(accept(draft, column, AxisUnit::Nm, 1.0))
        }
        several => {
            ask_axis(
                draft,
                open,
                &format!("The axis runs from {range}, which fits several units: which is it?"),
                several,
            );
            Ok(accept(draft, column, several[0], 1.0))
        }
    }
}

fn ask_axis(draft: &mut Draft, open: &mut Open, text: &str, units: &[AxisUnit]) {
    let keys: Vec<&str> = units.iter().map(|unit| unit.key()).collect();
    draft.ask(text, "--axis", &keys);
    *open = Open { axis: true, values: true, ..*open };
}

fn accept(draft: &mut Draft, column: usize, unit: AxisUnit, scale: f64) -> AxisSource {
    if let Some(sentence) = axis_sentence(unit, scale) {
        draft.assume(sentence);
    }
    AxisSource::Column { column, unit, scale }
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

/// Why samples make no spectrum.
fn unusable(samples: &Samples) -> Option<String> {
    let count = samples.nm.len();
    if count < LEAST_ROWS {
        return Some(format!("expected at least {LEAST_ROWS} usable samples, found {count}"));
    }
    if !samples.values.iter().any(|&value| value > 0.0) {
        return Some("expected a value above 0, found none".into());
    }
    None
}

/// Warnings and assumptions about samples left out, merged or reordered.
fn report(draft: &mut Draft, label: &str, samples: &Samples, layout: &Layout, many: bool) {
    let rows =
        |count: usize| if count == 1 { "1 sample was".to_owned() } else { format!("{count} samples were") };
    let at = samples.first_bad_line;
    if samples.no_axis > 0 {
        draft.warn(format!(
            "{label}{} left out: the axis is missing or not above 0, line {at} first.",
            rows(samples.no_axis)
        ));
    }
    if samples.unreadable > 0 {
        draft.warn(format!("{label}{} left out as unreadable, line {at} first.", rows(samples.unreadable)));
    }
    let missing =
        samples.missing_inside + if many && layout.series.len() > 1 { 0 } else { samples.missing_at_ends };
    if missing > 0 {
        draft.warn(format!(
            "{label}{} left out without a value, line {at} first; gaps are bridged by straight lines.",
            rows(missing)
        ));
    }
    if samples.merged > 0 {
        draft.warn(format!(
            "{label}{} merged by averaging: the wavelength occurs more than once.",
            rows(samples.merged)
        ));
    }
    if samples.shuffled {
        draft.assume(format!("{label}The rows are in no order of wavelength: they were sorted."));
    }
}

struct SpectrumAsk<'a> {
    name: &'a str,
    label: &'a str,
    place: usize,
    open: Open,
}

/// Converts and judges one spectrum.
fn make(
    draft: &mut Draft,
    samples: &Samples,
    source: AxisSource,
    header: &Header,
    series: &Series,
    answers: &Answers,
    about: &SpectrumAsk<'_>,
) -> Option<ReadSpectrum> {
    let own = header.columns.get(series.value);
    let hint = own.map(|one| one.ordinate.clone()).unwrap_or_default().or(&header.ordinate);
    let axis_unit = match source {
        AxisSource::Column { unit, .. } => unit,
        AxisSource::Steps { .. } => AxisUnit::Nm,
    };
    let mut open = about.open;
    let meaning =
        ordinate(draft, &hint, own.map_or("", |one| one.name.as_str()), axis_unit, answers, &mut open);
    finish_spectrum(
        draft,
        samples,
        &Meaning { axis_unit, ..meaning },
        &Naming {
            name: about.name,
            label: about.label,
            place: about.place,
            unit: own.map_or("", |one| one.all.as_str()),
            accepted: answers.columns.is_some(),
        },
        open,
    )
}

/// What the numbers of a spectrum mean.
#[derive(Debug, Clone, Copy)]
pub(super) struct Meaning {
    pub(super) axis_unit: AxisUnit,
    pub(super) ordinate: Ordinate,
    pub(super) per: Per,
    pub(super) absolute: bool,
}

/// How a spectrum is called.
pub(super) struct Naming<'a> {
    pub(super) name: &'a str,
    /// Opens every sentence about this spectrum when there are several.
    pub(super) label: &'a str,
    pub(super) place: usize,
    pub(super) unit: &'a str,
    /// The column was named in an answer and is taken as it is.
    pub(super) accepted: bool,
}

/// What open questions leave unknown of a spectrum.
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct Open {
    pub(super) axis: bool,
    pub(super) values: bool,
    pub(super) quantity: bool,
    pub(super) points: bool,
}

/// Decides what the ordinate is, listing every assumption and conversion.
fn ordinate(
    draft: &mut Draft,
    hint: &OrdinateHint,
    name: &str,
    axis: AxisUnit,
    answers: &Answers,
    open: &mut Open,
) -> Meaning {
    let shown = if name.is_empty() { String::new() } else { format!(" ({name:?})") };
    if let Some(what) = hint.not_emission
        && answers.ordinate.is_none()
    {
        draft.ask(
            format!(
                "The values{shown} are {what}, which is no emission: are they power or photons after all?"
            ),
            "--ordinate",
            &["power", "photons"],
        );
        *open = Open { values: true, quantity: true, ..*open };
    }
    if hint.counts {
        draft.warn(format!("The values{shown} are counts: without a calibration of the instrument they are no spectrum of power."));
    }
    let kind = answers.ordinate.or(hint.ordinate).unwrap_or(Ordinate::Power);
    let natural = match axis {
        AxisUnit::Ev => Per::Ev,
        AxisUnit::Cm1 => Per::Cm1,
        _ => Per::Nm,
    };
    let per = answers.per.or(hint.per).unwrap_or(natural);
    if answers.per.or(hint.per).is_none() && !axis.is_wavelength() {
        let own = natural.key();
        draft.ask(format!("The axis is in {}, but nothing says per what the values{shown} are counted: per {} or per nm?", axis.symbol(), natural.symbol()), "--per", &[own, "nm"]);
        *open = Open { values: true, quantity: true, ..*open };
    }
    let stated = hint.ordinate.is_some();
    match (answers.ordinate, stated, hint.per.is_some()) {
        (Some(kind), ..) => draft.assume(format!("The values{shown} are {}, as answered.", kind.key())),
        (None, false, _) => draft.assume(if name.is_empty() {
            format!("The values are not named: taken as relative power per {}.", per.symbol())
        } else {
            format!("The quantity of {name:?} is not stated: taken as relative power per {}.", per.symbol())
        }),
        (None, true, false) if axis.is_wavelength() => draft.assume(format!(
            "{} taken as per nm{shown}.",
            if kind == Ordinate::Power { "Power" } else { "Photons" }
        )),
        _ => {}
    }
    if let Some(per) = answers.per {
        draft.assume(format!("The values{shown} are per {}, as answered.", per.symbol()));
    }
    for sentence in ordinate_sentences(kind, per) {
        draft.assume(sentence);
    }
    Meaning {
        axis_unit: axis,
        ordinate: kind,
        per,
        absolute: hint.absolute && !hint.relative && !hint.counts,
    }
}

/// Converts, judges and names one spectrum; `None` when it holds nothing the colour sums could use.
pub(super) fn finish_spectrum(
    draft: &mut Draft,
    samples: &Samples,
    meaning: &Meaning,
    naming: &Naming<'_>,
    open: Open,
) -> Option<ReadSpectrum> {
    let label = naming.label;
    let mut open = open;
    let largest = samples.values.iter().fold(0.0_f64, |largest, value| largest.max(value.abs()));
    // Sums and squares of such numbers would leave the range of double precision.
    let rescale = if largest > 1e100 || largest < 1e-100 { 1.0 / largest } else { 1.0 };
    if rescale != 1.0 {
        draft.warn(format!("{label}The values reach {largest:e} and were divided by that to stay in range."));
    }
    let values: Vec<f64> = if rescale == 1.0 {
        samples.values.clone()
    } else {
        samples.values.iter().map(|value| value / largest).collect()
    };
    let factors = |nm: f64| factor(nm, meaning.ordinate, meaning.per);
    let judged = judge(&samples.nm, &values, &factors);
    for sentence in &judged.warnings {
        draft.warn(if label.is_empty() { sentence_case(sentence) } else { format!("{label}{sentence}.") });
    }
    if let Some((from, to)) = judged.hole
        && !naming.accepted
    {
        draft.ask(
            format!("{label}The peak may lie in the gap between {from} and {to} nm: is the spectrum to be used with the gap bridged by a straight line?"),
            "--columns",
            &[&naming.place.to_string()],
        );
        open.values = true;
    }
    if judged.mostly_negative && !naming.accepted {
        draft.ask(
            format!("{label}Most of the spectrum is negative: is it to be used as it is?"),
            "--columns",
            &[&naming.place.to_string()],
        );
        open.values = true;
    }
    let power: Vec<f64> = samples.nm.iter().zip(&values).map(|(&nm, &value)| value * factors(nm)).collect();
    let spectrum = match Spectrum::new(samples.nm.clone(), power) {
        Ok(spectrum) => spectrum,
        Err(error) => {
            draft.warn(format!("Left out {label}{error}."));
            return None;
        }
    };
    let mut offered = Vec::new();
    if let Some(dark) = judged.dark.filter(|dark| dark.of_peak.abs() > 0.001)
        && meaning.per == Per::Nm
        && meaning.ordinate == Ordinate::Power
    {
        offered.push(Correction::SubtractDark { level: dark.level });
    }
    if judged.negative_area > 0.0 {
        offered.push(Correction::RemoveNegatives);
    }
    let known = !(open.axis || open.values);
    let count = samples.nm.len();
    Some(ReadSpectrum {
        name: naming.name.to_owned(),
        column: naming.place,
        peak_nm: known.then_some(judged.peak_nm),
        fwhm_nm: judged.fwhm_nm.filter(|_| known),
        first_nm: (!open.axis).then(|| samples.nm[0]),
        last_nm: (!open.axis).then(|| samples.nm[count - 1]),
        points: (!open.points).then_some(count),
        quantity: (!open.quantity).then(|| quantity(meaning)),
        raw: Raw {
            axis: samples.axis.clone(),
            axis_unit: meaning.axis_unit,
            values: samples.values.clone(),
            ordinate: meaning.ordinate,
            per: meaning.per,
            unit: naming.unit.to_owned(),
        },
        spectrum,
        dark: judged.dark,
        offered,
    })
}

fn sentence_case(sentence: &str) -> String {
    let mut letters = sentence.chars();
    letters.next().map_or_else(String::new, |first| format!("{}{}.", first.to_uppercase(), letters.as_str()))
}

fn quantity(meaning: &Meaning) -> &'static str {
    let per = match meaning.per {
        Per::Nm => 0,
        Per::Ev => 2,
        Per::Cm1 => 4,
    };
    let kind = if meaning.ordinate == Ordinate::Photons { 6 } else { 0 };
    QUANTITIES[kind + per + usize::from(!meaning.absolute)]
}
