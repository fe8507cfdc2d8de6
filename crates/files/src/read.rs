//! Readers of measured spectra: what a file holds, what had to be assumed, what is doubtful and what must be asked.
//!
//! [`read_path`] and [`read_bytes`] never panic and never guess silently. They return a [`Reading`] with one of four
//! [`Outcome`]s, the best reading of every spectrum found, and the sentences a person needs to agree or to overrule it with
//! [`Answers`]. The rules are written out in `docs/methods/reading.md`.
//!
//! Out of scope: nothing is fetched, executed or expanded; spreadsheets, pictures and archives are refused.

mod answers;
mod axis;
mod columns;
mod convert;
mod decode;
mod dialect;
mod emitters;
mod header;
mod jcamp;
mod judge;
mod number;
mod pairs;
mod path;
mod questions;
mod reading;
mod samples;
mod segments;
mod sniff;
mod spectrum;
mod split;
mod table;
mod text;
mod tm27;
mod transposed;
mod units;
mod vocabulary;

pub use answers::{Answers, AxisUnit, Decimal, Ordinate, Per};
pub use path::{MAX_FILE_BYTES, read_path};
pub use reading::{DarkEstimate, Facts, Outcome, QUANTITIES, Question, Raw, ReadSpectrum, Reading};

use reading::Draft;

/// Reads the spectra in `bytes`; `file_name` is shown in messages and names spectra without a header.
///
/// Runs in time linear in the length of `bytes`. Any input is answered; see [`Outcome`].
pub fn read_bytes(file_name: &str, bytes: &[u8], answers: &Answers) -> Reading {
    let sha256 = crate::digest::sha256(bytes);
    let draft = read_draft(file_name, bytes, answers);
    draft.finish(file_name, sha256)
}

fn read_draft(file_name: &str, bytes: &[u8], answers: &Answers) -> Draft {
    if let Some(what) = sniff::foreign_bytes(bytes) {
        return Draft::refused(None, what);
    }
    let decoded = match decode::decode(bytes) {
        Ok(decoded) => decoded,
        Err(message) => return Draft::refused(None, message),
    };
    let name = stem(file_name);
    let marked: Option<fn(&str, &str, &Answers) -> Draft> = if tm27::recognises(&decoded.text) {
        Some(tm27::read)
    } else if jcamp::recognises(&decoded.text) {
        Some(jcamp::read)
    } else {
        None
    };
    if let Some(read) = marked {
        let mut draft = read(name, &decoded.text, answers);
        draft.facts.encoding = decoded.encoding;
        draft.assumptions.splice(0..0, decoded.assumptions);
        draft.warnings.splice(0..0, decoded.warnings);
        return draft;
    }
    if sniff::looks_like_ron(&decoded.text) {
        return emitters::read(bytes, answers);
    }
    if let Some(what) = sniff::foreign_text(&decoded.text) {
        return Draft::refused(Some(1), what);
    }
    text::read_text(name, &decoded, answers)
}

/// The file's name without folder and ending.
fn stem(file_name: &str) -> &str {
    let base = file_name.rsplit(['/', '\\']).next().unwrap_or(file_name);
    match base.rfind('.') {
        Some(0) | None => base,
        Some(dot) => &base[..dot],
    }
}
