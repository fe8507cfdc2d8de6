//! One cell: a number in any of the usual spellings, a mark for "no value", or words.

use super::answers::Decimal;

/// What a cell holds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Cell {
    /// A finite number.
    Number(f64),
    /// Nothing, or a mark for it: empty, NaN, inf, n/a, --, ****.
    Missing,
    /// Anything else.
    Word,
}

impl Cell {
    pub(super) const fn number(self) -> Option<f64> {
        match self {
            Self::Number(value) => Some(value),
            _ => None,
        }
    }
}

/// What the marks inside a number say about the decimal mark of its file.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Mark {
    /// Digits alone.
    None,
    /// Certainly a decimal point (380.5, 0.123) or commas that certainly group thousands (1,234,567).
    Point,
    /// Certainly a decimal comma (380,5, 0,123) or points that certainly group thousands (1.234.567).
    Comma,
    /// 1.234: a decimal point, unless the file uses decimal commas.
    PerhapsPoint,
    /// 1,234: decimal or thousands.
    PerhapsComma,
}

/// Reads a cell, quotes already removed.
pub(super) fn cell(token: &str, decimal: Decimal, spaces_group: bool) -> Cell {
    let token = token.trim();
    if let Some(value) = number(token, decimal, spaces_group) {
        return if value.is_finite() { Cell::Number(value) } else { Cell::Missing };
    }
    if is_missing(token) { Cell::Missing } else { Cell::Word }
}

/// Marks for "no value", as instruments, spreadsheets and programs write them.
pub(super) fn is_missing(token: &str) -> bool {
    if token.is_empty() || token.bytes().all(|byte| matches!(byte, b'-' | b'*' | b'?' | b'.')) {
        return true;
    }
    if token.len() > 12 {
        return false;
    }
    let bare = token.trim_start_matches(['+', '-']).to_ascii_lowercase();
    matches!(
        bare.as_str(),
        "nan"
            | "nan(ind)"
            | "-nan(ind)"
            | "na"
            | "n/a"
            | "n.a."
            | "#n/a"
            | "#na"
            | "null"
            | "none"
            | "nil"
            | "inf"
            | "infinity"
            | "∞"
            | "1.#inf"
            | "1.#ind"
            | "1.#qnan"
            | "1.#snan"
            | "1.#nan"
            | "#value!"
            | "#div/0!"
            | "#num!"
            | "#ref!"
            | "#name?"
            | "—"
            | "–"
            | "missing"
    )
}

/// Parses a number written with `decimal`; the other mark, apostrophes, no-break spaces and, when `spaces_group`, plain
/// spaces may group thousands. Exponents: e, E, Fortran's d, D or a bare sign. An infinite result means overflow.
pub(super) fn number(token: &str, decimal: Decimal, spaces_group: bool) -> Option<f64> {
    let bytes = token.as_bytes();
    let first = *bytes.first()?;
    if bytes.len() > 64 {
        return None;
    }
    if decimal == Decimal::Point
        && (first.is_ascii_digit() || matches!(first, b'-' | b'+' | b'.'))
        && bytes.iter().all(|byte| byte.is_ascii_digit() || matches!(byte, b'.' | b'-' | b'+' | b'e' | b'E'))
        && let Ok(value) = token.parse::<f64>()
    {
        return Some(value);
    }
    let token = token.strip_suffix('%').unwrap_or(token);
    let token = token.strip_suffix("nm").unwrap_or(token).trim_end();
    let mut plain = String::with_capacity(token.len());
    let mut rest = token;
    if let Some(sign) = rest.chars().next().filter(|c| matches!(c, '+' | '-' | '−' | '–')) {
        if sign != '+' {
            plain.push('-');
        }
        rest = rest[sign.len_utf8()..].trim_start();
    }
    let exponent_at = exponent_start(rest)?;
    let (mantissa, exponent) = rest.split_at(exponent_at);
    let mark = if decimal == Decimal::Point { '.' } else { ',' };
    let (whole, fraction) = match mantissa.rsplit_once(mark) {
        Some((whole, fraction)) => (whole, Some(fraction)),
        None => (mantissa, None),
    };
    let digits = |text: &str| text.bytes().all(|byte| byte.is_ascii_digit());
    if digits(whole) {
        plain.push_str(whole);
    } else {
        ungroup(whole, decimal, spaces_group, &mut plain)?;
    }
    if let Some(fraction) = fraction {
        if !digits(fraction) || (whole.is_empty() && fraction.is_empty()) {
            return None;
        }
        plain.push('.');
        plain.push_str(fraction);
    } else if whole.is_empty() {
        return None;
    }
    if !exponent.is_empty() {
        let power = exponent.trim_start_matches(['e', 'E', 'd', 'D']);
        let power = power.strip_prefix('−').map_or_else(|| power.to_owned(), |rest| format!("-{rest}"));
        let unsigned = power.trim_start_matches(['+', '-']);
        if unsigned.is_empty() || unsigned.len() + 1 < power.len() || !digits(unsigned) {
            return None;
        }
        plain.push('e');
        plain.push_str(&power);
    }
    plain.parse().ok()
}

/// Where the exponent of an unsigned number starts: at a letter, or at a sign after three-digit Fortran style (1.2-105).
fn exponent_start(text: &str) -> Option<usize> {
    if !text.starts_with(|c: char| c.is_ascii_digit() || matches!(c, '.' | ',')) {
        return None;
    }
    Some(text.find(['e', 'E', 'd', 'D', '+', '-', '−']).unwrap_or(text.len()))
}

fn ungroup(whole: &str, decimal: Decimal, spaces_group: bool, plain: &mut String) -> Option<()> {
    let other = if decimal == Decimal::Point { ',' } else { '.' };
    let separates = |c: char| {
        c == other
            || matches!(c, '\'' | '’' | '\u{a0}' | '\u{202f}' | '\u{2009}')
            || (spaces_group && c == ' ')
    };
    let mark = whole.chars().find(|&c| separates(c))?;
    let mut groups = whole.split(mark);
    let head = groups.next()?;
    let digits = |text: &str| text.bytes().all(|byte| byte.is_ascii_digit());
    if head.is_empty() || head.len() > 3 || head.starts_with('0') || !digits(head) {
        return None;
    }
    plain.push_str(head);
    for group in groups {
        if group.len() != 3 || !digits(group) {
            return None;
        }
        plain.push_str(group);
    }
    Some(())
}

/// What the marks of `token` say; `None` when it is no number under either mark.
pub(super) fn mark(token: &str, spaces_group: bool) -> Option<Mark> {
    let token = token.trim();
    let bytes = token.as_bytes();
    let first = *bytes.first()?;
    if !(first.is_ascii_digit() || matches!(first, b'+' | b'-' | b'.' | b',') || first >= 128)
        || bytes.len() > 64
    {
        return None;
    }
    let (mut points, mut commas) = (0, 0);
    for byte in bytes {
        points += usize::from(*byte == b'.');
        commas += usize::from(*byte == b',');
    }
    if points + commas == 0 {
        return number(token, Decimal::Point, spaces_group).map(|_| Mark::None);
    }
    let as_point = number(token, Decimal::Point, spaces_group);
    let as_comma = number(token, Decimal::Comma, spaces_group);
    match (as_point, as_comma) {
        (None, None) => None,
        (Some(_), None) => Some(Mark::Point),
        (None, Some(_)) => Some(Mark::Comma),
        (Some(_), Some(_)) if commas > 0 => Some(Mark::PerhapsComma),
        (Some(_), Some(_)) => Some(Mark::PerhapsPoint),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[track_caller]
    fn reads(token: &str, decimal: Decimal, expected: f64) {
        let value = number(token, decimal, true).unwrap_or(f64::NAN);
        assert!(
            (value - expected).abs() <= 1e-12 * expected.abs(),
            "{token:?}: {value} instead of {expected}"
        );
    }

    #[test]
    fn numbers_in_the_spellings_of_instruments() {
        for (token, expected) in [
            ("380", 380.0),
            ("+380.5", 380.5),
            (".5", 0.5),
            ("5.", 5.0),
            ("1.2E-03", 1.2e-3),
            ("1.2D-03", 1.2e-3),
            ("1.234-105", 1.234e-105),
            ("1.2e+05", 1.2e5),
            ("−3.5", -3.5),
            ("1,234.5", 1234.5),
            ("1'234.5", 1234.5),
            ("12\u{a0}345", 12345.0),
            ("1 234 567", 1_234_567.0),
            ("50 %", 50.0),
            ("380 nm", 380.0),
        ] {
            reads(token, Decimal::Point, expected);
        }
        for (token, expected) in
            [("1,2E-03", 1.2e-3), ("0,5", 0.5), ("1.234,5", 1234.5), ("1 234,5", 1234.5), ("-,5", -0.5)]
        {
            reads(token, Decimal::Comma, expected);
        }
    }

    #[test]
    fn what_is_no_number_is_none() {
        for token in [
            "",
            "nm",
            "1.2.3",
            "2024-01-05",
            "12:30",
            "01.02.2024",
            "0x1F",
            "1e",
            "--5",
            "1,23,456",
            "e5",
            ".",
            "inf",
            "nan",
            "5/3",
        ] {
            assert_eq!(number(token, Decimal::Point, true), None, "{token:?}");
            assert!(number(token, Decimal::Comma, true).is_none() || token == "1.2.3", "{token:?}");
        }
    }

    #[test]
    fn marks_are_certain_only_where_the_digits_are() {
        for (token, expected) in [
            ("380", Mark::None),
            ("380.5", Mark::Point),
            ("0.123", Mark::Point),
            ("0,123", Mark::Comma),
            ("380,5", Mark::Comma),
            ("1,234", Mark::PerhapsComma),
            ("1.234", Mark::PerhapsPoint),
            ("1,234,567", Mark::Point),
            ("1.234.567", Mark::Comma),
            ("1,234.5", Mark::Point),
            ("1.234,5", Mark::Comma),
        ] {
            assert_eq!(mark(token, true), Some(expected), "{token:?}");
        }
        assert_eq!(mark("red", true), None);
    }
}
