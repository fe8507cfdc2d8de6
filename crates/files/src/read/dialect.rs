//! How a table is written: its separator and its decimal mark, found by what most lines agree on.

use super::answers::{Answers, Decimal};
use super::number::{Mark, is_missing, mark};
use super::split::{Lines, OpenQuote, Separator, cell_list, cells, is_comment};
use super::units::axis_hint;

/// Lines looked at closely; the rest of a long file is sampled.
const HEAD_LINES: usize = 3000;
/// No more of a line than this is looked at while choosing.
const LINE_BYTES: usize = 1 << 15;
/// Columns whose marks are kept apart.
const MARK_COLUMNS: usize = 64;

/// Something about the marks that the file leaves open.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Doubt {
    /// Commas that may be decimal marks or group thousands; the line of the first.
    Commas(usize),
    /// Points that may group thousands beside whole numbers; the line of the first.
    Points(usize),
    /// Points and commas both mark decimals, from this line on.
    MarksChange(usize),
    /// Every comma separates, or every second one is a decimal mark.
    Pairs(usize),
}

/// The way a table is written.
#[derive(Debug, Clone)]
pub(super) struct Dialect {
    pub(super) separator: Separator,
    pub(super) decimal: Decimal,
    /// Cells in most rows.
    pub(super) width: usize,
    pub(super) doubt: Option<Doubt>,
    /// Cells written with the other decimal mark are read by their own mark.
    pub(super) either_mark: bool,
    pub(super) assumptions: Vec<String>,
    /// Columns that hold words where the others hold numbers, counted from 0.
    pub(super) text_columns: Vec<usize>,
    /// No line looked at holds numbers under any separator.
    pub(super) barren: bool,
}

/// Chooses the dialect of `text`.
///
/// # Errors
/// The line of a quote that never closes.
pub(super) fn choose(text: &str, answers: &Answers) -> Result<Dialect, OpenQuote> {
    let sample = sample(text)?;
    let lines = sample.as_slice();
    let scores: Vec<(Separator, Score)> =
        Separator::ALL.into_iter().map(|one| (one, score(lines, one, text_columns(lines, one)))).collect();
    let best = |value: fn(&Score) -> usize| {
        scores
            .iter()
            .rev()
            .max_by_key(|(_, score)| value(score))
            .map_or((Separator::Tab, 0), |(one, score)| (*one, value(score)))
    };
    // Equal rows are better read without columns of words.
    let (mut separator, rank) =
        best(|score| 2 * score.rows - usize::from(score.rows > 0 && !score.text.is_empty()));
    let rows = rank.div_ceil(2);
    if rows < 5 {
        let singles = scores[0].1.singles;
        let (wide, cells) = best(|score| score.wide);
        if singles >= 5 && cells < 10 {
            separator = Separator::Tab;
        } else if cells >= 5 {
            separator = wide;
        } else if rows == 0 {
            separator = best(|score| score.numbers).0;
        }
    }
    let chosen = scores.iter().find(|(one, _)| *one == separator).map(|(_, score)| score);
    let width = chosen.map_or(1, |score| score.width).max(1);
    let text_columns = chosen.map(|score| score.text.clone()).unwrap_or_default();
    let mut dialect = Dialect {
        separator,
        decimal: Decimal::Point,
        width,
        doubt: None,
        either_mark: false,
        assumptions: Vec::new(),
        text_columns,
        barren: scores
            .iter()
            .all(|(_, score)| score.numbers == 0 || score.rows + score.singles + score.wide == 0),
    };
    if separator == Separator::Comma
        && dialect.text_columns.is_empty()
        && let Some(pairs) = comma_pairs(lines, width, answers)
    {
        let Some(line) = pairs.line else {
            dialect.separator = Separator::Tab;
            dialect.width = 1;
            decide_decimal(text, &mut dialect, answers)?;
            return Ok(dialect);
        };
        dialect.separator = Separator::CommaPairs { whole_axis: pairs.whole_axis };
        dialect.decimal = Decimal::Comma;
        dialect.width = width / 2 + usize::from(pairs.whole_axis);
        if pairs.certain {
            dialect.assumptions.push(format!(
                "Commas separate the columns and mark the decimals too: the header names {} columns, line {line} has {width} cells.",
                dialect.width
            ));
        } else {
            dialect.doubt = Some(Doubt::Pairs(line));
        }
        return Ok(dialect);
    }
    decide_decimal(text, &mut dialect, answers)?;
    Ok(dialect)
}

/// The first lines that are not blank, and some of the later ones.
fn sample(text: &str) -> Result<Vec<(usize, &str)>, OpenQuote> {
    let mut sample = Vec::new();
    let mut later = 0_usize;
    for line in Lines::new(text) {
        let (number, line) = line?;
        if sample.len() >= HEAD_LINES {
            later += 1;
            if !later.is_multiple_of(100) || sample.len() >= HEAD_LINES + 4000 {
                continue;
            }
        }
        if line.trim().is_empty() || is_comment(line) {
            continue;
        }
        let mut end = line.len().min(LINE_BYTES);
        while !line.is_char_boundary(end) {
            end -= 1;
        }
        sample.push((number, &line[..end]));
    }
    Ok(sample)
}

#[derive(Debug, Clone, Default)]
struct Score {
    /// Lines of two or more cells, all numbers or marks for none.
    rows: usize,
    /// The commonest number of cells of such lines.
    width: usize,
    /// Lines that are one number.
    singles: usize,
    /// Numbers in long lines with at most two words: a table lying on its side.
    wide: usize,
    /// Numbers altogether.
    numbers: usize,
    /// Columns of words.
    text: Vec<usize>,
}

/// Columns of flags, remarks or times: at least five words and no number beside two numbers or more, in lines of the
/// commonest length. Labels of a table on its side are no such column.
fn text_columns(lines: &[(usize, &str)], separator: Separator) -> Vec<usize> {
    /// Numbers and words of one column.
    type Kinds = (usize, usize);
    let mut widths: Vec<(usize, usize, Vec<Kinds>)> = Vec::new();
    for (_, line) in lines {
        let mut kinds: Vec<Option<bool>> = Vec::new();
        cells(line, separator, |cell| {
            let number = mark(cell, separator.spaces_group()).is_some();
            kinds.push(if number || !is_missing(cell) { Some(number) } else { None });
            kinds.len() <= MARK_COLUMNS
        });
        let numbers = kinds.iter().filter(|kind| **kind == Some(true)).count();
        if kinds.len() > MARK_COLUMNS || numbers < 2 {
            continue;
        }
        let at = match widths.iter().position(|(width, ..)| *width == kinds.len()) {
            Some(at) => at,
            None if widths.len() < MARK_COLUMNS => {
                let label = cell_list(line, separator).first().is_some_and(|cell| axis_hint(cell).is_some());
                if label {
                    return Vec::new();
                }
                widths.push((kinds.len(), 0, vec![(0, 0); kinds.len()]));
                widths.len() - 1
            }
            None => continue,
        };
        widths[at].1 += 1;
        for (column, kind) in kinds.iter().enumerate() {
            widths[at].2[column].0 += usize::from(*kind == Some(true));
            widths[at].2[column].1 += usize::from(*kind == Some(false));
        }
    }
    widths.into_iter().max_by_key(|(_, times, _)| *times).map_or_else(Vec::new, |(_, _, columns)| {
        let texts = columns.iter().enumerate();
        texts.filter(|(_, (numbers, words))| *words >= 5 && *numbers == 0).map(|(column, _)| column).collect()
    })
}

fn score(lines: &[(usize, &str)], separator: Separator, text: Vec<usize>) -> Score {
    let mut score = Score { text, ..Score::default() };
    let mut widths: Vec<(usize, usize)> = Vec::new();
    for (_, line) in lines {
        let (mut numbers, mut missing, mut words) = (0, 0, 0);
        let text = &score.text;
        cells(line, separator, |cell| {
            if text.contains(&(numbers + missing + words)) {
                missing += 1;
            } else if mark(cell, separator.spaces_group()).is_some() {
                numbers += 1;
            } else if is_missing(cell) {
                missing += 1;
            } else {
                words += 1;
            }
            true
        });
        score.numbers += numbers;
        if words == 0 && numbers == 1 && missing == 0 {
            score.singles += 1;
        }
        if words <= 2 && numbers >= 5 {
            score.wide += numbers;
        }
        let count = numbers + missing;
        if words == 0 && numbers >= 1 && count >= 2 {
            score.rows += 1;
            match widths.iter().position(|(width, _)| *width == count) {
                Some(index) => widths[index].1 += 1,
                None if widths.len() < 64 => widths.push((count, 1)),
                None => {}
            }
        }
    }
    score.width = widths.iter().max_by_key(|(width, times)| (*times, *width)).map_or(0, |(width, _)| *width);
    score
}

/// Commas that separate and mark decimals.
struct Pairs {
    /// The line of the first row; none when all is one column of numbers.
    line: Option<usize>,
    /// The axis is written in whole numbers, without a comma of its own.
    whole_axis: bool,
    /// The header or an answer leaves no other reading.
    certain: bool,
}

/// Whether commas in `380,0,0,123` or `380,0,123` are both separators and decimal marks.
fn comma_pairs(lines: &[(usize, &str)], width: usize, answers: &Answers) -> Option<Pairs> {
    if answers.decimal == Some(Decimal::Point) || width < 2 {
        return None;
    }
    let whole_axis = !width.is_multiple_of(2);
    let digits = |cell: &str| !cell.is_empty() && cell.bytes().all(|byte| byte.is_ascii_digit());
    let (mut rows, mut fitting, mut leading_zero, mut first) = (0, 0, 0, None);
    let mut firsts = Vec::new();
    for (number, line) in lines {
        if line.contains('"') {
            continue;
        }
        let list = cell_list(line, Separator::Comma);
        if list.len() != width || !list.iter().all(|cell| mark(cell, false).is_some()) {
            continue;
        }
        rows += 1;
        first = first.or(Some(*number));
        firsts.push(list[0].to_owned());
        let pairs = &list[usize::from(whole_axis)..];
        let fits = pairs.chunks(2).all(|pair| {
            let fraction = pair[1].split(['e', 'E']).next().unwrap_or("");
            digits(pair[0].trim_start_matches(['-', '+'])) && digits(fraction)
        });
        fitting += usize::from(fits && (!whole_axis || digits(list[0])));
        // Whole numbers are not written with a zero in front: 05 is a fraction.
        leading_zero +=
            usize::from(pairs.chunks(2).any(|pair| pair[1].len() > 1 && pair[1].starts_with('0')));
    }
    let first = first?;
    if rows < 5 || fitting * 20 < rows * 19 {
        return None;
    }
    firsts.dedup();
    let repeated = firsts.len() * 2 < rows;
    let answered = answers.decimal == Some(Decimal::Comma);
    if width == 2 {
        return (repeated || answered).then_some(Pairs { line: None, whole_axis: false, certain: true });
    }
    let header = lines
        .iter()
        .rev()
        .find(|(number, line)| *number < first && !line.trim().is_empty())
        .map(|(_, line)| cell_list(line, Separator::Comma).len());
    if header == Some(width) {
        return None;
    }
    let certain = answered || header == Some(width / 2 + usize::from(whole_axis));
    let doubtful = leading_zero > 0 || repeated && !whole_axis;
    (certain || doubtful).then_some(Pairs { line: Some(first), whole_axis, certain })
}

#[derive(Debug, Clone, Copy, Default)]
struct Marks {
    plain: usize,
    point: usize,
    comma: usize,
    perhaps_point: usize,
    perhaps_comma: usize,
    point_groups: usize,
    comma_groups: usize,
    first_point: usize,
    first_comma: usize,
    first_perhaps: usize,
}

impl Marks {
    const fn numbers(&self) -> usize {
        self.plain + self.point + self.comma + self.perhaps_point + self.perhaps_comma
    }
}

fn decide_decimal(text: &str, dialect: &mut Dialect, answers: &Answers) -> Result<(), OpenQuote> {
    let columns = count_marks(text, dialect)?;
    let total = |value: fn(&Marks) -> usize| columns.iter().map(value).sum::<usize>();
    let (point, comma) = (total(|m| m.point), total(|m| m.comma));
    let (perhaps_point, perhaps_comma) = (total(|m| m.perhaps_point), total(|m| m.perhaps_comma));
    let first =
        |value: fn(&Marks) -> usize| columns.iter().map(value).filter(|&line| line > 0).min().unwrap_or(1);
    if let Some(decimal) = answers.decimal {
        dialect.decimal = decimal;
        dialect.either_mark = true;
        return Ok(());
    }
    dialect.decimal = if comma > point { Decimal::Comma } else { Decimal::Point };
    if point.min(comma) >= 2 {
        // The later of the two beginnings is where the marks change.
        let change = first(|m| m.first_point).max(first(|m| m.first_comma));
        dialect.doubt = Some(Doubt::MarksChange(change));
        dialect.either_mark = true;
        return Ok(());
    }
    if point > comma {
        // 999.5 and 1,001 in one column: grouped thousands, unless the mark changes.
        let same =
            columns.iter().find(|m| m.point > m.point_groups && m.perhaps_comma > 0 && m.point_groups == 0);
        if let Some(column) = same {
            dialect.doubt = Some(Doubt::Commas(column.first_perhaps));
        } else if perhaps_comma > 0 {
            dialect.assumptions.push("Points mark the decimals, so commas group thousands.".into());
        }
    } else if comma > 0 {
        let same =
            columns.iter().find(|m| m.comma > m.comma_groups && m.perhaps_point > 0 && m.comma_groups == 0);
        if let Some(column) = same {
            dialect.doubt = Some(Doubt::MarksChange(column.first_perhaps.max(1)));
        } else if perhaps_point > 0 {
            dialect.assumptions.push("Commas mark the decimals, so points group thousands.".into());
        }
    } else if perhaps_comma > 0 {
        let axis = columns.first().copied().unwrap_or_default();
        if axis.perhaps_comma > 0 && dialect.width > 1 {
            dialect.decimal = Decimal::Comma;
            dialect
                .assumptions
                .push("Commas mark the decimals: as thousands the axis would make no sense.".into());
        } else if axis.perhaps_point > 0 && dialect.width > 1 {
            dialect
                .assumptions
                .push("Points mark the decimals of the axis, so commas group thousands.".into());
        } else {
            let plain = columns.iter().any(|m| m.perhaps_comma > 0 && m.plain > 0);
            dialect.decimal = if plain { Decimal::Point } else { Decimal::Comma };
            dialect.doubt = Some(Doubt::Commas(first(|m| m.first_perhaps)));
        }
    } else if dialect.separator.leaves_commas()
        && let Some(column) = columns
            .iter()
            .skip(1)
            .find(|m| m.perhaps_point > 1 && m.plain > 1 && m.numbers() == m.perhaps_point + m.plain)
        && columns[0].perhaps_point == 0
    {
        // 999 and 1.001 in one column: whole numbers with grouped thousands as likely as decimals.
        dialect.decimal = Decimal::Comma;
        dialect.doubt = Some(Doubt::Points(column.first_perhaps));
    }
    Ok(())
}

/// Counts the marks of every column over all rows of numbers.
fn count_marks(text: &str, dialect: &Dialect) -> Result<Vec<Marks>, OpenQuote> {
    let mut columns: Vec<Marks> = vec![Marks::default(); dialect.width.clamp(1, MARK_COLUMNS)];
    let last = columns.len() - 1;
    // Without marks inside cells there is nothing to decide.
    if !dialect.separator.leaves_commas() && !text.contains('"') || !text.contains([',', '.']) {
        return Ok(columns);
    }
    let mut row: Vec<(Option<Mark>, bool)> = Vec::new();
    for line in Lines::new(text) {
        let (number, line) = line?;
        if line.len() < 2 || is_comment(line) {
            continue;
        }
        row.clear();
        let mut words = false;
        cells(line, dialect.separator, |cell| {
            match mark(cell, dialect.separator.spaces_group()) {
                Some(mark) => row.push((
                    Some(mark),
                    cell.contains(',') && cell.contains('.') || cell.matches([',', '.']).count() > 1,
                )),
                None if is_missing(cell) || dialect.text_columns.contains(&row.len()) => {
                    row.push((None, false));
                }
                None => words = true,
            }
            !words && row.len() < 4096
        });
        if words || row.len() < dialect.width.min(2) {
            continue;
        }
        for (index, (mark, groups)) in row.iter().enumerate() {
            let column = &mut columns[index.min(last)];
            let groups = usize::from(*groups);
            let note = |line: &mut usize| {
                if *line == 0 {
                    *line = number;
                }
            };
            match mark {
                None => {}
                Some(Mark::None) => column.plain += 1,
                Some(Mark::Point) => {
                    column.point += 1;
                    column.point_groups += groups;
                    note(&mut column.first_point);
                }
                Some(Mark::Comma) => {
                    column.comma += 1;
                    column.comma_groups += groups;
                    note(&mut column.first_comma);
                }
                Some(Mark::PerhapsPoint) => {
                    column.perhaps_point += 1;
                    note(&mut column.first_perhaps);
                }
                Some(Mark::PerhapsComma) => {
                    column.perhaps_comma += 1;
                    note(&mut column.first_perhaps);
                }
            }
        }
    }
    Ok(columns)
}
