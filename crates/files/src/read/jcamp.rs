//! JCAMP-DX 4.24 and 5 (McDonald & Wilks, Applied Spectroscopy 42, 1988; labels and the digits of the packed forms from memory
//! and from open readers): XYPOINTS, and XYDATA in plain or packed digits.

use super::answers::{Answers, AxisUnit};
use super::number::Cell;
use super::pairs::{self, Pairs};
use super::reading::Draft;
use super::table::MAX_NUMBERS;
use super::text::Refusal;
use super::tm27::many_wanted;
use super::units::{axis_unit, ordinate_hint};

/// Whether the text starts like a JCAMP-DX file.
pub(super) fn recognises(text: &str) -> bool {
    let first = text.lines().map(str::trim).find(|line| !line.is_empty() && !line.starts_with("$$"));
    first.and_then(labelled).is_some_and(|(label, _)| label == "TITLE" || label == "JCAMPDX")
}

/// Reads a JCAMP-DX file.
pub(super) fn read(stem: &str, text: &str, answers: &Answers) -> Draft {
    let mut draft = Draft::default();
    draft.facts.format = "JCAMP-DX";
    if let Err((line, sentence)) = read_into(&mut draft, stem, text, answers) {
        draft.refuse(line, sentence);
    }
    draft
}

/// Label and value of a line `##LABEL=value`; case, blanks, `-`, `_` and `/` in labels do not count.
fn labelled(line: &str) -> Option<(String, &str)> {
    let (label, value) = line.trim_start().strip_prefix("##")?.split_once('=')?;
    let label =
        label.chars().filter(|c| !matches!(c, ' ' | '-' | '_' | '/')).flat_map(char::to_uppercase).collect();
    Some((label, value.trim()))
}

#[derive(Default)]
struct BlockOf<'a> {
    title: &'a str,
    x_units: &'a str,
    y_units: &'a str,
    x_factor: Option<f64>,
    y_factor: Option<f64>,
    first_x: Option<f64>,
    last_x: Option<f64>,
    delta_x: Option<f64>,
    points: Option<usize>,
    data: Option<Data<'a>>,
}

struct Data<'a> {
    pairs: bool,
    line: usize,
    lines: Vec<&'a str>,
}

fn read_into(draft: &mut Draft, stem: &str, text: &str, answers: &Answers) -> Result<(), Refusal> {
    let mut blocks: Vec<BlockOf<'_>> = Vec::new();
    let mut block = BlockOf::default();
    let mut in_data = false;
    for (index, line) in text.lines().enumerate() {
        let line = line.split_once("$$").map_or(line, |(before, _)| before);
        let Some((label, value)) = labelled(line) else {
            if in_data
                && let Some(data) = &mut block.data
                && !line.trim().is_empty()
            {
                data.lines.push(line);
            }
            continue;
        };
        in_data = false;
        let number = || {
            value
                .split_whitespace()
                .next()
                .and_then(|word| word.parse::<f64>().ok())
                .filter(|value| value.is_finite())
        };
        match label.as_str() {
            "TITLE" => {
                if block.data.is_some() {
                    blocks.push(std::mem::take(&mut block));
                }
                block = BlockOf { title: value, ..BlockOf::default() };
            }
            "XUNITS" => block.x_units = value,
            "YUNITS" => block.y_units = value,
            "XFACTOR" => block.x_factor = number(),
            "YFACTOR" => block.y_factor = number(),
            "FIRSTX" => block.first_x = number(),
            "LASTX" => block.last_x = number(),
            "DELTAX" => block.delta_x = number(),
            "NPOINTS" => block.points = value.parse().ok(),
            "XYDATA" | "XYPOINTS" => {
                let form: String = value.chars().filter(|c| !c.is_whitespace()).collect();
                let pairs = match form.as_str() {
                    "(X++(Y..Y))" => false,
                    "(XY..XY)" => true,
                    _ => {
                        return Err((
                            Some(index + 1),
                            format!("expected (X++(Y..Y)) or (XY..XY), found {form:?}"),
                        ));
                    }
                };
                block.data = Some(Data { pairs, line: index + 2, lines: Vec::new() });
                in_data = true;
            }
            "NTUPLES" | "PEAKTABLE" | "PEAKASSIGNMENTS" | "RADATA"
                if block.data.is_none() && blocks.is_empty() =>
            {
                return Err((
                    Some(index + 1),
                    format!("expected XYDATA or XYPOINTS, found {label}, which is not read"),
                ));
            }
            "END" if block.data.is_some() => blocks.push(std::mem::take(&mut block)),
            _ => {}
        }
    }
    if block.data.is_some() {
        draft.warn("The last block has no ##END=: the file may be cut short.");
        blocks.push(block);
    }
    if blocks.is_empty() {
        return Err((None, "expected a block with XYDATA or XYPOINTS, found none".into()));
    }
    let many = blocks.len() > 1;
    let mut failures = Vec::new();
    for (index, block) in blocks.iter().enumerate() {
        let place = index + 1;
        if !many_wanted(answers, place) {
            continue;
        }
        let result = pairs_of(draft, block, stem, place, many).and_then(|pairs| {
            draft.facts.first_data_line = draft.facts.first_data_line.max(pairs.line);
            pairs::add(draft, &pairs, place, many, answers)
        });
        failures.extend(result.err());
    }
    if draft.spectra.is_empty() {
        return Err(failures
            .into_iter()
            .next()
            .unwrap_or((None, "expected a block of that number in --columns, found none".into())));
    }
    for (_, sentence) in failures {
        draft.warn(format!("Left out a block: {sentence}."));
    }
    Ok(())
}

fn pairs_of(
    draft: &mut Draft,
    block: &BlockOf<'_>,
    stem: &str,
    place: usize,
    many: bool,
) -> Result<Pairs, Refusal> {
    let empty = Data { pairs: true, line: 1, lines: Vec::new() };
    let data = block.data.as_ref().unwrap_or(&empty);
    let (x_factor, y_factor) = (block.x_factor.unwrap_or(1.0), block.y_factor.unwrap_or(1.0));
    let scaled = |cell: Cell, factor: f64| cell.number().map_or(cell, |value| finite(value * factor));
    let (mut axis, mut values) = (Vec::new(), Vec::new());
    let mut starts: Vec<(usize, Cell)> = Vec::new();
    let mut check = None;
    let mut failed_checks = 0;
    for line in &data.lines {
        if axis.len() + values.len() > MAX_NUMBERS {
            return Err((Some(data.line), "expected at most 5 million numbers, found more".into()));
        }
        if data.pairs {
            let words: Vec<&str> =
                line.split([',', ';', ' ', '\t']).filter(|word| !word.is_empty()).collect();
            for pair in words.chunks(2) {
                axis.push(scaled(plain(pair[0]), x_factor));
                values.push(pair.get(1).map_or(Cell::Missing, |word| scaled(plain(word), y_factor)));
            }
        } else {
            let row = digits(line);
            let mut ordinates = row.values.as_slice();
            let mut repeated = 0;
            // After differences the next line repeats the last value.
            if let (Some(expected), Some(first)) = (check, ordinates.first()) {
                if first.number().is_some_and(|first| first != expected) {
                    failed_checks += 1;
                }
                ordinates = &ordinates[1..];
                repeated = 1;
            }
            check = row.differences.then(|| row.values.last().and_then(|cell| cell.number())).flatten();
            starts.push((values.len().saturating_sub(repeated), scaled(row.x, x_factor)));
            values.extend(ordinates.iter().map(|&cell| scaled(cell, y_factor)));
        }
    }
    if !data.pairs {
        axis = even_axis(draft, block, values.len(), &starts);
    }
    if failed_checks > 0 {
        draft.warn(format!(
            "{failed_checks} lines of packed digits do not repeat the value before them: damaged?"
        ));
    }
    if let Some(points) = block.points.filter(|&points| points != values.len()) {
        draft.warn(format!("The file announces {points} points and holds {}.", values.len()));
    }
    let title = block.title.trim();
    let name = match (title.is_empty(), many) {
        (false, _) => title.chars().take(300).collect(),
        (true, false) => stem.to_owned(),
        (true, true) => format!("{stem} {place}"),
    };
    Ok(Pairs {
        name,
        line: data.line,
        axis,
        values,
        unit: x_unit(block.x_units),
        hint: ordinate_hint(block.y_units),
        unit_text: block.y_units.to_owned(),
    })
}

fn x_unit(text: &str) -> Option<AxisUnit> {
    axis_unit(text).filter(|unit| unit.1 == 1.0).map(|unit| unit.0)
}

fn finite(value: f64) -> Cell {
    if value.is_finite() { Cell::Number(value) } else { Cell::Missing }
}

/// Evenly spaced axis values: from FIRSTX and LASTX, else FIRSTX and DELTAX, else from the first number of each line.
fn even_axis(draft: &mut Draft, block: &BlockOf<'_>, count: usize, starts: &[(usize, Cell)]) -> Vec<Cell> {
    let step = match (block.first_x, block.last_x, block.points) {
        (Some(first), Some(last), Some(points)) if points > 1 => {
            Some((first, (last - first) / (points - 1) as f64))
        }
        (Some(first), Some(last), None) if count > 1 => Some((first, (last - first) / (count - 1) as f64)),
        (Some(first), ..) => block.delta_x.map(|step| (first, step)),
        _ => None,
    };
    if let Some((first, step)) = step {
        let far = starts.iter().filter(|(index, x)| {
            x.number().is_some_and(|x| {
                (x - (first + *index as f64 * step)).abs() > 0.51 * step.abs().max(x.abs() * 1e-4)
            })
        });
        let far = far.count();
        if far > 0 {
            draft.warn(format!("{far} lines start at another axis value than FIRSTX and the step give: samples may be missing."));
        }
        return (0..count).map(|index| Cell::Number(first + index as f64 * step)).collect();
    }
    let mut axis = vec![Cell::Missing; count];
    for pair in starts.windows(2) {
        let ((from, first), (to, last)) = (pair[0], pair[1]);
        if let (Some(first), Some(last)) = (first.number(), last.number()) {
            for index in from..to {
                axis[index] =
                    Cell::Number(first + (last - first) * (index - from) as f64 / (to - from) as f64);
            }
        }
    }
    if let Some(&(from, start)) = starts.last()
        && let Some(start) = start.number()
    {
        let step =
            from.checked_sub(1).and_then(|before| axis[before].number()).map_or(0.0, |before| start - before);
        for (offset, cell) in axis[from.min(count)..].iter_mut().enumerate() {
            *cell = Cell::Number(start + step * offset as f64);
        }
    }
    axis
}

fn plain(word: &str) -> Cell {
    super::number::cell(word, super::Decimal::Point, false)
}

/// One line of XYDATA.
struct DataLine {
    x: Cell,
    values: Vec<Cell>,
    /// The line ends in difference form.
    differences: bool,
}

#[derive(Clone, Copy, PartialEq)]
enum Form {
    Plain,
    Difference,
    Duplicate,
}

/// Values of one line beyond which repeats are ignored.
const MAX_REPEATS: usize = 1_000_000;

/// Reads a line in plain, packed, squeezed, difference and duplicate form.
fn digits(line: &str) -> DataLine {
    let mut result = DataLine { x: Cell::Missing, values: Vec::new(), differences: false };
    let bytes = line.as_bytes();
    let mut index = 0;
    let mut have_x = false;
    let mut last_difference: Option<f64> = None;
    while index < bytes.len() {
        let first = bytes[index];
        if matches!(first, b' ' | b'\t' | b',' | b';') {
            index += 1;
            continue;
        }
        if first == b'?' {
            push(&mut result, &mut have_x, Cell::Missing);
            last_difference = None;
            index += 1;
            continue;
        }
        let (form, lead) = match first {
            b'@' => (Form::Plain, "0".to_owned()),
            b'A'..=b'I' => (Form::Plain, char::from(first - b'A' + b'1').to_string()),
            b'a'..=b'i' => (Form::Plain, format!("-{}", char::from(first - b'a' + b'1'))),
            b'%' => (Form::Difference, "0".to_owned()),
            b'J'..=b'R' => (Form::Difference, char::from(first - b'J' + b'1').to_string()),
            b'j'..=b'r' => (Form::Difference, format!("-{}", char::from(first - b'j' + b'1'))),
            b'S'..=b'Z' => (Form::Duplicate, char::from(first - b'S' + b'1').to_string()),
            b's' => (Form::Duplicate, "9".to_owned()),
            b'+' | b'-' | b'.' | b'0'..=b'9' => (Form::Plain, char::from(first).to_string()),
            _ => {
                // Words: one unreadable value, however long.
                while index < bytes.len() && !matches!(bytes[index], b' ' | b'\t' | b',' | b';') {
                    index += 1;
                }
                push(&mut result, &mut have_x, Cell::Word);
                last_difference = None;
                continue;
            }
        };
        let mut token = lead;
        index += 1;
        while index < bytes.len() {
            let byte = bytes[index];
            let exponent = matches!(byte, b'e' | b'E')
                && token.ends_with(|c: char| c.is_ascii_digit() || c == '.')
                && matches!(bytes.get(index + 1), Some(b'+' | b'-'))
                && bytes.get(index + 2).is_some_and(u8::is_ascii_digit);
            if byte.is_ascii_digit() || byte == b'.' {
                token.push(char::from(byte));
                index += 1;
            } else if exponent {
                token.push('e');
                token.push(char::from(bytes[index + 1]));
                index += 2;
            } else {
                break;
            }
        }
        let number = token.parse::<f64>().ok().filter(|value| value.is_finite());
        match (form, number) {
            (_, None) => {
                push(&mut result, &mut have_x, Cell::Word);
                last_difference = None;
            }
            (Form::Plain, Some(value)) => {
                push(&mut result, &mut have_x, Cell::Number(value));
                last_difference = None;
                result.differences = false;
            }
            (Form::Difference, Some(step)) => {
                let value = result
                    .values
                    .last()
                    .and_then(|cell| cell.number())
                    .map_or(Cell::Word, |last| finite(last + step));
                result.values.push(value);
                last_difference = Some(step);
                result.differences = true;
            }
            (Form::Duplicate, Some(times)) => {
                let repeats =
                    (times as usize).saturating_sub(1).min(MAX_REPEATS.saturating_sub(result.values.len()));
                for _ in 0..repeats {
                    let last = result.values.last().copied().unwrap_or(Cell::Word);
                    let step = last_difference.unwrap_or(0.0);
                    result.values.push(last.number().map_or(last, |value| finite(value + step)));
                }
            }
        }
    }
    result
}

fn push(line: &mut DataLine, have_x: &mut bool, cell: Cell) {
    if *have_x {
        line.values.push(cell);
    } else {
        line.x = cell;
        *have_x = true;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn values(line: &str) -> Vec<f64> {
        digits(line).values.iter().map(|cell| cell.number().unwrap()).collect()
    }

    /// The same five values in every form; digits of the forms as in McDonald & Wilks 1988 (from memory).
    #[test]
    fn packed_forms_say_the_same() {
        for line in [
            "400 100 120 130 130 125",
            "400+100+120+130+130+125",
            "400A00A20A30A30A25",
            "400A00K0J0%n",
            "400A00A20A30TA25",
            "400 1.00E+02 1.2E+2 130 130 125",
        ] {
            assert_eq!(values(line), [100.0, 120.0, 130.0, 130.0, 125.0], "{line}");
        }
        assert_eq!(values("400a00j0"), [-100.0, -110.0]);
        assert_eq!(values("400A0J0U"), [10.0, 20.0, 30.0, 40.0]);
        assert!(digits("400A00K0").differences && !digits("400A00").differences);
    }
}
