//! What a file certainly is when it is no spectrum: pictures, archives, documents, markup.

/// The sentence for bytes that are a known kind of binary file or nothing at all.
pub(super) fn foreign_bytes(bytes: &[u8]) -> Option<String> {
    if bytes.is_empty() {
        return Some("expected rows of wavelength and value, found an empty file".into());
    }
    let found =
        KINDS.iter().find(|(magic, _)| bytes.starts_with(magic)).map(|&(_, kind)| kind).or_else(|| {
            let at = |from: usize, magic: &[u8]| bytes.get(from..from + magic.len()) == Some(magic);
            if bytes.starts_with(b"BM") && at(6, &[0, 0, 0, 0]) {
                Some("a picture (BMP)")
            } else if bytes.starts_with(b"RIFF") && at(8, b"WEBP") {
                Some("a picture (WebP)")
            } else if bytes.starts_with(b"RIFF") {
                Some("a sound or video file (RIFF)")
            } else if at(4, b"ftyp") {
                Some("a picture or video (ISO media)")
            } else if at(257, b"ustar") {
                Some("an archive (tar)")
            } else {
                None
            }
        })?;
    let advice = if found.contains("workbook") { "; save the sheet as CSV" } else { "" };
    Some(format!("expected text with rows of wavelength and value, found {found}{advice}"))
}

const KINDS: [(&[u8], &str); 26] = [
    (b"\x89PNG\r\n\x1a\n", "a picture (PNG)"),
    (b"\xff\xd8\xff", "a picture (JPEG)"),
    (b"GIF87a", "a picture (GIF)"),
    (b"GIF89a", "a picture (GIF)"),
    (b"II*\0", "a picture (TIFF)"),
    (b"MM\0*", "a picture (TIFF)"),
    (b"\0\0\x01\0", "a picture (icon)"),
    (b"%PDF", "a PDF document"),
    (b"%!PS", "a PostScript document"),
    (b"{\\rtf", "a word processor's document (RTF)"),
    (b"PK\x03\x04", "a zip archive or a workbook"),
    (b"PK\x05\x06", "an empty zip archive"),
    (b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", "an old office document or a workbook"),
    (b"\x1f\x8b", "an archive (gzip)"),
    (b"7z\xbc\xaf\x27\x1c", "an archive (7z)"),
    (b"Rar!\x1a\x07", "an archive (RAR)"),
    (b"\xfd7zXZ\0", "an archive (xz)"),
    (b"BZh", "an archive (bzip2)"),
    (b"\x28\xb5\x2f\xfd", "an archive (zstd)"),
    (b"\x7fELF", "a program (ELF)"),
    (b"MZ\x90\0", "a program (PE)"),
    (b"\x89HDF\r\n\x1a\n", "a binary data file (HDF5)"),
    (b"CDF\x01", "a binary data file (netCDF)"),
    (b"MATLAB 5.0", "a binary data file (MAT)"),
    (b"\x93NUMPY", "a binary data file (NPY)"),
    (b"SQLite format 3\0", "a database (SQLite)"),
];

/// The sentence for text that is markup or structured data rather than a table.
pub(super) fn foreign_text(text: &str) -> Option<String> {
    let head = text.trim_start_matches(|c: char| c.is_whitespace() || c == '\0' || c == '\u{feff}');
    if head.is_empty() {
        return Some("expected rows of wavelength and value, found only blanks".into());
    }
    let found = if head.starts_with('<') {
        markup(head)?
    } else if head.starts_with('{') || looks_like_json_list(head) {
        "JSON that is no spectrum this program knows"
    } else {
        return None;
    };
    Some(format!("expected rows of wavelength and value, found {found}"))
}

fn markup(head: &str) -> Option<&'static str> {
    let mut start: String = head.chars().take(4096).collect();
    start.make_ascii_lowercase();
    let after = start[1..].chars().next().unwrap_or(' ');
    if start.starts_with("<!doctype html") || start.contains("<html") {
        Some("a web page (HTML)")
    } else if start.contains("<svg") {
        Some("a picture (SVG)")
    } else if start.starts_with("<?xml") || start.starts_with("<!") || after.is_ascii_alphabetic() {
        // A lone "<" in a note is no markup: a tag must close.
        start.contains('>').then_some("XML that is no spectrum this program knows")
    } else {
        None
    }
}

/// `[` opens a JSON list unless its line is a section mark such as `[Data]`.
fn looks_like_json_list(head: &str) -> bool {
    let Some(rest) = head.strip_prefix('[') else { return false };
    let line = rest.split(['\n', '\r']).next().unwrap_or("");
    if line.trim_end().ends_with(']') && line.trim_start().starts_with(|c: char| c.is_alphabetic()) {
        return false;
    }
    match rest.trim_start().chars().next() {
        None => false,
        Some(first) => matches!(first, '{' | '[' | '"' | ']' | '-') || first.is_ascii_digit(),
    }
}

/// Whether a text starts like RON: `Name(` or `(` followed by `field:`, after comments and attributes.
pub(super) fn looks_like_ron(text: &str) -> bool {
    let mut rest = text.trim_start_matches(|c: char| c.is_whitespace() || c == '\0' || c == '\u{feff}');
    loop {
        rest = rest.trim_start();
        if rest.starts_with("#![enable") {
            return true;
        }
        if rest.starts_with("//") {
            match rest.find('\n') {
                Some(end) => rest = &rest[end..],
                None => return false,
            }
        } else {
            break;
        }
    }
    let name = rest.find(|c: char| !(c.is_ascii_alphanumeric() || c == '_')).unwrap_or(rest.len());
    let Some(inside) = rest[name..].strip_prefix('(') else { return false };
    let inside = inside.trim_start();
    let field = inside.find(|c: char| !(c.is_ascii_alphanumeric() || c == '_')).unwrap_or(inside.len());
    let opens_line = rest[name + 1..].starts_with(['\n', '\r']);
    field > 0
        && inside[field..].trim_start().starts_with(':')
        && (opens_line || name > 0 || rest.trim_end().ends_with(')'))
}
