//! Bytes to text: byte-order marks, UTF-8, UTF-16, and the old one- and two-byte code pages.

use super::vocabulary;
use encoding_rs::{EUC_KR, Encoding, GB18030, SHIFT_JIS, UTF_16BE, UTF_16LE, WINDOWS_1251, WINDOWS_1252};
use std::borrow::Cow;

/// Text that is not UTF-8 grows while it is decoded; larger files are refused to keep memory in bounds.
const MAX_RECODED_BYTES: usize = 100 << 20;

/// The text of a file and how it was found.
pub(super) struct Decoded<'a> {
    pub(super) text: Cow<'a, str>,
    pub(super) encoding: &'static str,
    pub(super) assumptions: Vec<String>,
    pub(super) warnings: Vec<String>,
}

impl<'a> Decoded<'a> {
    fn new(text: Cow<'a, str>, encoding: &'static str) -> Self {
        Self { text, encoding, assumptions: Vec::new(), warnings: Vec::new() }
    }
}

/// Decodes `bytes`.
///
/// # Errors
/// A sentence when the bytes are no text at all, or too many to recode.
pub(super) fn decode(bytes: &[u8]) -> Result<Decoded<'_>, String> {
    if bytes.starts_with(&[0xff, 0xfe, 0, 0]) || bytes.starts_with(&[0, 0, 0xfe, 0xff]) {
        return utf32(bytes);
    }
    if let Some(rest) = bytes.strip_prefix(b"\xef\xbb\xbf") {
        return narrow(rest, "UTF-8 with byte-order mark");
    }
    if bytes.starts_with(&[0xff, 0xfe]) {
        return wide(&bytes[2..], UTF_16LE, "UTF-16 LE with byte-order mark");
    }
    if bytes.starts_with(&[0xfe, 0xff]) {
        return wide(&bytes[2..], UTF_16BE, "UTF-16 BE with byte-order mark");
    }
    if let Some(encoding) = unmarked_utf16(bytes) {
        let name = if encoding == UTF_16LE { "UTF-16 LE" } else { "UTF-16 BE" };
        let mut decoded = wide(bytes, encoding, name)?;
        decoded
            .assumptions
            .push(format!("No byte-order mark: read as {name}, since every other byte is zero."));
        return Ok(decoded);
    }
    narrow(bytes, "UTF-8")
}

fn too_large(bytes: &[u8], name: &str) -> Result<(), String> {
    if bytes.len() > MAX_RECODED_BYTES {
        return Err(format!(
            "expected at most {} MB of text that is not UTF-8, found {} MB of {name}",
            MAX_RECODED_BYTES >> 20,
            bytes.len() >> 20
        ));
    }
    Ok(())
}

/// ASCII in UTF-16 leaves one byte of each pair zero.
fn unmarked_utf16(bytes: &[u8]) -> Option<&'static Encoding> {
    let head = &bytes[..bytes.len().min(4096) & !1];
    if head.len() < 4 {
        return None;
    }
    let pairs = head.len() / 2;
    let zeros = |offset: usize| head.iter().skip(offset).step_by(2).filter(|&&byte| byte == 0).count();
    let (even, odd) = (zeros(0), zeros(1));
    // Text is not all zeros: the other half must hold something.
    if odd * 10 >= pairs * 7 && even * 20 <= pairs {
        Some(UTF_16LE)
    } else if even * 10 >= pairs * 7 && odd * 20 <= pairs {
        Some(UTF_16BE)
    } else {
        None
    }
}

fn wide<'a>(bytes: &'a [u8], encoding: &'static Encoding, name: &'static str) -> Result<Decoded<'a>, String> {
    too_large(bytes, name)?;
    let whole = &bytes[..bytes.len() & !1];
    let (text, broken) = encoding.decode_without_bom_handling(whole);
    let mut decoded = Decoded::new(text, name);
    if whole.len() != bytes.len() {
        decoded.warnings.push("The file ends in the middle of a character: it may be cut short.".into());
    }
    if broken {
        decoded.warnings.push("Some characters are damaged and were replaced.".into());
    }
    Ok(decoded)
}

fn utf32(bytes: &[u8]) -> Result<Decoded<'_>, String> {
    too_large(bytes, "UTF-32")?;
    let little = bytes[0] == 0xff;
    let text: String = bytes[4..]
        .chunks_exact(4)
        .map(|four| {
            let four = [four[0], four[1], four[2], four[3]];
            let code = if little { u32::from_le_bytes(four) } else { u32::from_be_bytes(four) };
            char::from_u32(code).unwrap_or(char::REPLACEMENT_CHARACTER)
        })
        .collect();
    Ok(Decoded::new(Cow::Owned(text), "UTF-32 with byte-order mark"))
}

fn narrow<'a>(bytes: &'a [u8], name: &'static str) -> Result<Decoded<'a>, String> {
    let control =
        |byte: &u8| *byte < 32 && !matches!(byte, b'\t' | b'\n' | b'\r' | 0x0b | 0x0c | 0x1a | 0x1b);
    let controls = bytes.iter().filter(|byte| control(byte)).count();
    if controls * 10 > bytes.len() {
        return Err("expected text with rows of wavelength and value, found binary data".into());
    }
    let mut decoded = match std::str::from_utf8(bytes) {
        Ok(text) => Decoded::new(Cow::Borrowed(text), name),
        Err(error) if error.valid_up_to() + 4 > bytes.len() && error.valid_up_to() > 0 => {
            // Only the last character is incomplete.
            let text = String::from_utf8_lossy(&bytes[..error.valid_up_to()]).into_owned();
            let mut decoded = Decoded::new(Cow::Owned(text), name);
            if std::str::from_utf8(bytes).is_err_and(|error| error.error_len().is_none()) {
                decoded
                    .warnings
                    .push("The file ends in the middle of a character: it may be cut short.".into());
                decoded
            } else {
                code_page(bytes)?
            }
        }
        Err(_) => code_page(bytes)?,
    };
    if controls > 0 {
        decoded
            .warnings
            .push(format!("Control characters, which text does not hold, were found ({controls}): damaged?"));
    }
    Ok(decoded)
}

/// Text that is no UTF-8: Windows-1252, unless another page turns the head into words of the trade.
fn code_page(bytes: &[u8]) -> Result<Decoded<'_>, String> {
    too_large(bytes, "text in a code page")?;
    let head = &bytes[..bytes.len().min(1 << 14)];
    let mut best = WINDOWS_1252;
    let mut best_score = vocabulary::foreign_score(&WINDOWS_1252.decode_without_bom_handling(head).0);
    for page in [SHIFT_JIS, GB18030, EUC_KR, WINDOWS_1251] {
        let score = vocabulary::foreign_score(&page.decode_without_bom_handling(head).0);
        if score > best_score {
            (best, best_score) = (page, score);
        }
    }
    let (text, _) = best.decode_without_bom_handling(bytes);
    let mut decoded = Decoded::new(text, best.name());
    decoded
        .warnings
        .push(format!("The text is not UTF-8: it was decoded as {}; check the names.", best.name()));
    Ok(decoded)
}
