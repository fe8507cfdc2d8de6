//! Text to lines and lines to cells, with quotes.

/// What separates cells.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Separator {
    Tab,
    Semicolon,
    Bar,
    Comma,
    /// A comma followed by a blank; commas without one belong to the numbers.
    CommaBlank,
    /// A comma that both separates and marks decimals: every two cells make one number, but for a whole-numbered axis.
    CommaPairs {
        /// The first cell is a number of its own.
        whole_axis: bool,
    },
    /// Runs of blanks and tabs.
    Blanks,
}

impl Separator {
    /// Best first where two fit equally well.
    pub(super) const ALL: [Self; 6] =
        [Self::Tab, Self::Semicolon, Self::Bar, Self::CommaBlank, Self::Comma, Self::Blanks];

    pub(super) const fn name(self) -> &'static str {
        match self {
            Self::Tab => "tab",
            Self::Semicolon => "semicolon",
            Self::Bar => "vertical bar",
            Self::Comma => "comma",
            Self::CommaBlank => "comma and blank",
            Self::CommaPairs { .. } => "comma, which is the decimal mark too",
            Self::Blanks => "blanks",
        }
    }

    /// Whether a plain space inside a cell may group thousands.
    pub(super) const fn spaces_group(self) -> bool {
        matches!(self, Self::Tab | Self::Semicolon | Self::Bar)
    }

    /// Whether decimal commas can stand in unquoted cells.
    pub(super) const fn leaves_commas(self) -> bool {
        !matches!(self, Self::Comma)
    }
}

/// Lines with their numbers (from 1), blank ones included, ended by LF, CRLF or CR. A quoted cell may run over lines.
pub(super) struct Lines<'a> {
    text: &'a str,
    at: usize,
    number: usize,
    quotes: bool,
}

/// A quote that never closes: its line.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct OpenQuote(pub(super) usize);

impl<'a> Lines<'a> {
    pub(super) fn new(text: &'a str) -> Self {
        Self { text, at: 0, number: 0, quotes: text.as_bytes().contains(&b'"') }
    }

    fn end_from(&self, from: usize) -> usize {
        let bytes = &self.text.as_bytes()[from..];
        from + bytes.iter().position(|byte| matches!(byte, b'\n' | b'\r')).unwrap_or(bytes.len())
    }
}

impl<'a> Iterator for Lines<'a> {
    type Item = Result<(usize, &'a str), OpenQuote>;

    fn next(&mut self) -> Option<Self::Item> {
        let bytes = self.text.as_bytes();
        if self.at >= bytes.len() {
            return None;
        }
        self.number += 1;
        let first = self.number;
        let start = self.at;
        let mut end = self.end_from(start);
        if self.quotes && opens_quote(&self.text[start..end]) {
            let Some(close) = closing_quote(&self.text[end..]) else {
                self.at = bytes.len();
                return Some(Err(OpenQuote(first)));
            };
            let inside = &self.text[end..end + close];
            let swallowed = inside
                .split(['\n', '\r'])
                .filter(|line| line.starts_with(|c: char| c.is_ascii_digit()))
                .count();
            if swallowed > 5 {
                self.at = bytes.len();
                return Some(Err(OpenQuote(first)));
            }
            self.number += inside
                .bytes()
                .filter(|&byte| byte == b'\n')
                .count()
                .max(inside.bytes().filter(|&byte| byte == b'\r').count());
            end = self.end_from(end + close);
        }
        self.at = match (bytes.get(end), bytes.get(end + 1)) {
            (Some(b'\r'), Some(b'\n')) => end + 2,
            (Some(_), _) => end + 1,
            (None, _) => end,
        };
        Some(Ok((first, &self.text[start..end])))
    }
}

/// Whether a quote that starts a cell is still open at the end of the line.
fn opens_quote(line: &str) -> bool {
    let bytes = line.as_bytes();
    if !bytes.contains(&b'"') || is_comment(line) {
        return false;
    }
    let mut at_start = true;
    let mut index = 0;
    while index < bytes.len() {
        let byte = bytes[index];
        if byte == b'"' && at_start {
            match closing_quote(&line[index + 1..]) {
                Some(close) => index += 1 + close + 1,
                None => return true,
            }
            at_start = false;
            continue;
        }
        at_start = matches!(byte, b',' | b';' | b'\t' | b'|') || (byte == b' ' && at_start);
        index += 1;
    }
    false
}

/// The first quote that ends a cell: doubled quotes inside are skipped.
fn closing_quote(text: &str) -> Option<usize> {
    let bytes = text.as_bytes();
    let mut index = 0;
    while index < bytes.len() {
        if bytes[index] == b'"' {
            match bytes.get(index + 1) {
                Some(b'"') => index += 1,
                _ => return Some(index),
            }
        }
        index += 1;
    }
    None
}

/// A line that a mark sets apart as a remark.
pub(super) fn is_comment(line: &str) -> bool {
    let line = line.trim_start();
    line.starts_with(['#', '%', '!', '\''])
        || line.starts_with("//")
        || line.starts_with("\" ")
        || (line.starts_with(';') && line[1..].trim_start().starts_with(|c: char| c.is_alphabetic()))
}

/// The text of a remark without its mark, or the line itself.
pub(super) fn without_comment_mark(line: &str) -> &str {
    let trimmed = line.trim();
    if is_comment(trimmed) {
        trimmed.trim_start_matches(['#', '%', '!', '\'', '/', ';', '"']).trim()
    } else {
        trimmed
    }
}

/// Calls `each` for every cell of `line`, trimmed and unquoted, up to 100 000 cells; stops when `each` says no.
pub(super) fn cells<'a>(line: &'a str, separator: Separator, mut each: impl FnMut(&'a str) -> bool) {
    if separator == Separator::Blanks {
        blank_cells(line, each);
        return;
    }
    // A vertical bar also frames the line.
    let line = if separator == Separator::Bar {
        let inner = line.trim();
        let inner = inner.strip_prefix('|').unwrap_or(inner);
        inner.strip_suffix('|').unwrap_or(inner)
    } else {
        line
    };
    let mark = match separator {
        Separator::Tab => b'\t',
        Separator::Semicolon => b';',
        Separator::Bar => b'|',
        _ => b',',
    };
    let bytes = line.as_bytes();
    let mut start = 0;
    loop {
        let mut end = start;
        let blanks = bytes[start..].iter().take_while(|&&byte| byte == b' ').count();
        if bytes.get(start + blanks) == Some(&b'"') {
            let open = start + blanks + 1;
            end = open + closing_quote(&line[open..]).map_or(bytes.len() - open, |close| close + 1);
        }
        while end < bytes.len()
            && !(bytes[end] == mark
                && (separator != Separator::CommaBlank
                    || matches!(bytes.get(end + 1), None | Some(b' ' | b'\t'))))
        {
            end += 1;
        }
        if !each(unquote(&line[start..end])) || end >= bytes.len() {
            return;
        }
        start = end + 1;
    }
}

fn blank_cells<'a>(line: &'a str, mut each: impl FnMut(&'a str) -> bool) {
    let mut rest = line.trim();
    while !rest.is_empty() {
        let end = if let Some(inside) = rest.strip_prefix('"') {
            closing_quote(inside).map_or(rest.len(), |close| close + 2)
        } else {
            rest.find([' ', '\t', '\u{0b}', '\u{0c}']).unwrap_or(rest.len())
        };
        if !each(unquote(&rest[..end])) {
            return;
        }
        rest = rest[end..].trim_start();
    }
}

fn unquote(cell: &str) -> &str {
    let cell =
        cell.trim_matches(|c: char| c.is_whitespace() || c == '\0' || c == '\u{1a}' || c == '\u{feff}');
    match cell.strip_prefix('"') {
        Some(inside) => inside.strip_suffix('"').unwrap_or(inside).trim(),
        None => cell,
    }
}

/// All cells of a line.
pub(super) fn cell_list(line: &str, separator: Separator) -> Vec<&str> {
    let mut list = Vec::new();
    cells(line, separator, |cell| {
        list.push(cell);
        list.len() < 20_000
    });
    list
}

/// The cells of a header line: blanks inside brackets, and single blanks when runs or tabs separate, do not split.
pub(super) fn header_cells(line: &str, separator: Separator, width: usize) -> Vec<String> {
    let owned = |list: Vec<&str>| list.into_iter().map(str::to_owned).collect::<Vec<_>>();
    let line = without_comment_mark(line);
    let plain = cell_list(line, separator);
    if plain.len() == width || (separator != Separator::Blanks && plain.len() > 1) {
        return owned(plain);
    }
    if separator != Separator::Blanks {
        // A header may be separated otherwise than its table.
        for other in [Separator::Tab, Separator::Semicolon, Separator::Comma] {
            let list = cell_list(line, other);
            if list.len() == width && width > 1 {
                return owned(list);
            }
        }
        return owned(plain);
    }
    let wide: Vec<&str> = line
        .split(['\t'])
        .flat_map(|part| part.split("  "))
        .map(str::trim)
        .filter(|part| !part.is_empty())
        .collect();
    if wide.len() == width {
        return owned(wide);
    }
    for other in [Separator::Comma, Separator::Semicolon] {
        let list = cell_list(line, other);
        if list.len() == width && width > 1 {
            return owned(list);
        }
    }
    // Join a bracketed unit to the word before it.
    let mut joined: Vec<String> = Vec::new();
    let mut depth = 0_i32;
    for word in plain {
        let opens = word.matches(['(', '[']).count() as i32;
        let closes = word.matches([')', ']']).count() as i32;
        match joined.last_mut() {
            Some(last) if depth > 0 || word.starts_with(['(', '[', '/']) || last.ends_with('/') => {
                last.push(' ');
                last.push_str(word);
            }
            _ => joined.push(word.to_owned()),
        }
        depth = (depth + opens - closes).max(0);
    }
    joined
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_end_by_any_mark_and_keep_their_numbers() {
        let lines: Vec<_> = Lines::new("a\nb\r\nc\rd").map(Result::unwrap).collect();
        assert_eq!(lines, [(1, "a"), (2, "b"), (3, "c"), (4, "d")]);
    }

    #[test]
    fn quoted_cells_keep_their_separators_and_line_ends() {
        assert_eq!(cell_list("\"a, b\",2, \"c \"\"d\"\"\"", Separator::Comma), ["a, b", "2", "c \"\"d\"\""]);
        let lines: Vec<_> = Lines::new("\"two\nlines\",b\n1,2").map(Result::unwrap).collect();
        assert_eq!(lines, [(1, "\"two\nlines\",b"), (3, "1,2")]);
        assert_eq!(Lines::new("1,2\n3,\"4\n5,6").find_map(Result::err), Some(OpenQuote(2)));
        assert!(Lines::new("size 5\" wafer\n").all(|line| line.is_ok()));
    }

    #[test]
    fn blanks_split_numbers_but_not_bracketed_units() {
        assert_eq!(cell_list("  380.0   0.5\t7 ", Separator::Blanks), ["380.0", "0.5", "7"]);
        assert_eq!(
            header_cells("Wavelength (nm) Power (W / nm)", Separator::Blanks, 2),
            ["Wavelength (nm)", "Power (W / nm)"]
        );
        assert_eq!(header_cells("# nm  rel. units", Separator::Blanks, 2), ["nm", "rel. units"]);
    }
}
