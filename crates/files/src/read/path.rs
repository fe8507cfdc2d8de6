//! Reading from the file system: what is no plain, readable file of sensible size is refused with a sentence.

use super::answers::Answers;
use super::read_bytes;
use super::reading::{Draft, Reading};
use std::fs::{File, Metadata};
use std::io::{ErrorKind, Read};
use std::path::Path;

/// Larger files are refused.
pub const MAX_FILE_BYTES: u64 = 200 << 20;

/// Reads the spectra in the file at `path`. Directories, pipes, devices, files without permission and files over
/// [`MAX_FILE_BYTES`] are refused; nothing is waited for.
pub fn read_path(path: &Path, answers: &Answers) -> Reading {
    let shown = path.display().to_string();
    match bytes_of(path) {
        Ok(bytes) => read_bytes(&shown, &bytes, answers),
        Err(sentence) => Draft::refused(None, sentence).finish(&shown, String::new()),
    }
}

/// The bytes of a plain file.
///
/// # Errors
/// A sentence for everything else.
fn bytes_of(path: &Path) -> Result<Vec<u8>, String> {
    // The kind is looked at first: opening a pipe would wait for its other end.
    let about = std::fs::metadata(path).map_err(|error| sentence(error.kind()))?;
    if let Some(kind) = kind_of(&about) {
        return Err(format!("expected a file, found {kind}"));
    }
    let megabytes = MAX_FILE_BYTES >> 20;
    if about.len() > MAX_FILE_BYTES {
        return Err(format!("expected at most {megabytes} MB, found {} MB", about.len() >> 20));
    }
    let file = File::open(path).map_err(|error| sentence(error.kind()))?;
    let mut bytes = Vec::with_capacity(about.len() as usize);
    // The file may grow while it is read.
    file.take(MAX_FILE_BYTES + 1).read_to_end(&mut bytes).map_err(|error| sentence(error.kind()))?;
    if bytes.len() as u64 > MAX_FILE_BYTES {
        return Err(format!("expected at most {megabytes} MB, found more"));
    }
    Ok(bytes)
}

fn kind_of(about: &Metadata) -> Option<&'static str> {
    if about.is_file() {
        None
    } else if about.is_dir() {
        Some("a directory")
    } else {
        Some("a pipe, a socket or a device")
    }
}

fn sentence(kind: ErrorKind) -> String {
    let found = match kind {
        ErrorKind::NotFound => "no file of that name",
        ErrorKind::PermissionDenied => "no permission to read it",
        ErrorKind::InvalidInput | ErrorKind::InvalidFilename => "a name no file can have",
        _ => return format!("expected a readable file, found an error of the file system: {kind}"),
    };
    format!("expected a readable file, found {found}")
}
