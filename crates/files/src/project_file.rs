//! Projects as RON text: one version number, old ones migrated, newer ones refused untouched.
//!
//! A project file is UTF-8 text, a comment line and one RON value. It says its own format version; any change that an
//! older program would lose on saving raises it. Nothing in it is executed or fetched.

use crate::digest::sha256;
use project::{FORMAT_VERSION, Project, ProjectError};
use ron::ser::PrettyConfig;
use serde::Deserialize;
use std::path::Path;

/// Largest project file that is read, bytes.
pub const GREATEST_SIZE: u64 = 64 * 1024 * 1024;
/// Deepest nesting that is read.
pub const GREATEST_DEPTH: usize = 64;
/// Ending of project files.
pub const EXTENSION: &str = "ron";

/// A project as it was read.
#[derive(Debug, Clone, PartialEq)]
pub struct OpenedProject {
    /// The project, in the newest format.
    pub project: Project,
    /// SHA-256 of the bytes it was read from.
    pub sha256: String,
    /// The format version in the file.
    pub version: u32,
}

/// Why a file is not read as a project.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum ProjectFileError {
    /// The file could not be read at all.
    #[error("{path} could not be read: {source}")]
    Io {
        /// The file.
        path: String,
        /// What the system said.
        source: std::io::Error,
    },
    /// Too large to be a project.
    #[error("a project file has at most {GREATEST_SIZE} bytes, this one has {found}")]
    TooLarge {
        /// Its size in bytes.
        found: u64,
    },
    /// Not text.
    #[error("expected UTF-8 text, found byte {value:#04x} at position {offset}")]
    NotText {
        /// Where, counted from 0.
        offset: usize,
        /// What stood there.
        value: u8,
    },
    /// Text that is no project.
    #[error("line {line}, column {column}: expected a project, found an error: {message}")]
    Syntax {
        /// Line, counted from 1.
        line: usize,
        /// Column, counted from 1.
        column: usize,
        /// What the parser said.
        message: String,
    },
    /// A version that never was.
    #[error("expected a project format of 1 to {FORMAT_VERSION}, found {found}")]
    UnknownVersion {
        /// The version in the file.
        found: u32,
    },
    /// A project that does not hold together, or is of a newer format.
    #[error(transparent)]
    Content(#[from] ProjectError),
}

impl ProjectFileError {
    /// The line of the file the error is on, where it has one.
    pub fn line(&self) -> Option<usize> {
        match self {
            Self::Syntax { line, .. } => Some(*line),
            _ => None,
        }
    }
}

#[derive(Deserialize)]
struct VersionOnly {
    version: u32,
}

/// Reads a project from the bytes of a file.
///
/// # Errors
/// A sentence with the place: too large, no text, no project, a newer format, or a project that does not hold together.
pub fn read_project(bytes: &[u8]) -> Result<OpenedProject, ProjectFileError> {
    if bytes.len() as u64 > GREATEST_SIZE {
        return Err(ProjectFileError::TooLarge { found: bytes.len() as u64 });
    }
    let text = std::str::from_utf8(bytes).map_err(|error| {
        let offset = error.valid_up_to();
        ProjectFileError::NotText { offset, value: bytes.get(offset).copied().unwrap_or_default() }
    })?;
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let VersionOnly { version } = parse(text)?;
    let project = match version {
        newer if newer > FORMAT_VERSION => return Err(ProjectError::TooNew { found: newer }.into()),
        // Every earlier format is read by its own types and brought to the next one here.
        1 => parse::<Project>(text)?,
        found => return Err(ProjectFileError::UnknownVersion { found }),
    };
    project.check()?;
    Ok(OpenedProject { project, sha256: sha256(bytes), version })
}

/// Reads a project from a file.
///
/// # Errors
/// As [`read_project`], and when the file cannot be read.
pub fn open_project(path: &Path) -> Result<OpenedProject, ProjectFileError> {
    let io = |source| ProjectFileError::Io { path: path.display().to_string(), source };
    let file = std::fs::File::open(path).map_err(io)?;
    let about = file.metadata().map_err(io)?;
    if !about.is_file() {
        return Err(io(std::io::Error::other("it is not a file")));
    }
    // The size may grow between looking and reading; the limit holds all the same.
    let mut bytes = Vec::new();
    std::io::Read::read_to_end(&mut std::io::Read::take(file, GREATEST_SIZE + 1), &mut bytes).map_err(io)?;
    if bytes.len() as u64 > GREATEST_SIZE {
        return Err(ProjectFileError::TooLarge { found: about.len().max(bytes.len() as u64) });
    }
    read_project(&bytes)
}

/// The text of a project file.
///
/// # Errors
/// When the project does not hold together: nothing is written that could not be opened again.
pub fn project_text(project: &Project) -> Result<String, ProjectFileError> {
    project.check()?;
    let config = PrettyConfig::new().indentor("  ").compact_arrays(true).depth_limit(6);
    let body = options().to_string_pretty(project, config).map_err(|error| ProjectFileError::Syntax {
        line: 0,
        column: 0,
        message: error.to_string(),
    })?;
    Ok(format!(
        "// A Whitesmith project, format {}. Text in RON; open it with `whitesmith FILE`.\n{body}\n",
        project.version
    ))
}

fn options() -> ron::Options {
    ron::Options::default().with_recursion_limit(GREATEST_DEPTH)
}

fn parse<'a, T: Deserialize<'a>>(text: &'a str) -> Result<T, ProjectFileError> {
    options().from_str(text).map_err(|error| ProjectFileError::Syntax {
        line: error.span.start.line,
        column: error.span.start.col,
        message: error.code.to_string(),
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::blend_sheet::tests::demo;
    use proptest::prelude::*;

    #[test]
    fn a_project_reads_back_as_it_was() {
        let project = demo();
        let text = project_text(&project).unwrap();
        let opened = read_project(text.as_bytes()).unwrap();
        assert_eq!(opened.project, project);
        assert_eq!(opened.sha256, sha256(text.as_bytes()));
        assert_eq!(project_text(&opened.project).unwrap(), text, "writing is settled");
    }

    /// The file is kept as format 1 was first written; it must open for ever.
    #[test]
    fn the_golden_project_of_version_1_opens() {
        let opened = read_project(include_bytes!("../tests/golden/project-v1.ron")).unwrap();
        assert_eq!(opened.version, 1);
        let project = opened.project;
        assert_eq!(project.name, "Harbour test panel");
        assert_eq!(project.emitters.len(), 3);
        assert_eq!(project.emitters[0].corrections.len(), 4);
        assert_eq!(project.emitters[2].sheet.wall_plug, Some(0.31));
        let set = project.current().unwrap();
        assert_eq!(set.white.region.to_string(), "sdcm:3@F3000");
        assert_eq!(set.white.limits.ra.low, Some(90.0));
        assert!(set.members[1].locked && !set.members[2].on);
    }

    #[test]
    fn a_newer_project_is_refused_whatever_else_it_holds() {
        let error = read_project(b"(version: 2, marvels: [(1, \"x\")], name: 5)").unwrap_err();
        assert!(matches!(error, ProjectFileError::Content(ProjectError::TooNew { found: 2 })), "{error}");
        assert!(error.to_string().contains("left untouched"));
        assert!(matches!(read_project(b"(version: 0)"), Err(ProjectFileError::UnknownVersion { found: 0 })));
    }

    #[test]
    fn what_is_no_project_is_refused_with_its_place() {
        let deep = "(".repeat(100_000);
        let long_list = format!("(version: 1, name: \"x\", emitters: {}", "[".repeat(5000));
        for (bytes, word) in [
            (&b""[..], "line 1"),
            (b"\xff\xfe(", "position 0"),
            (b"(version: 1,\n name: \"a\",\n emitters: 7)", "line 3"),
            (b"(version: 1, name: \"cut", "line 1"),
            (b"{\"version\": 1}", "line 1"),
            (b"(name: \"no version\")", "version"),
            (b"(version: 1, name: \"a\", sets: [(id: (1), name: \"s\", members: [(emitter: (5), share: 1)], white: (cct_k: 3000, duv: 0))])", "not in the project"),
            (deep.as_bytes(), "line 1"),
            (long_list.as_bytes(), "line 1"),
        ] {
            let error = read_project(bytes).unwrap_err().to_string();
            assert!(error.contains(word), "{word}: {error}");
        }
    }

    #[test]
    fn a_truncated_project_never_opens_and_never_panics() {
        let text = project_text(&demo()).unwrap();
        let end = text.rfind(')').unwrap();
        for cut in (0..end).step_by(97) {
            if text.is_char_boundary(cut) {
                assert!(read_project(&text.as_bytes()[..cut]).is_err(), "{cut}");
            }
        }
    }

    #[test]
    fn a_file_that_is_none_says_so() {
        let folder = tempfile::tempdir().unwrap();
        let error = open_project(folder.path()).unwrap_err().to_string();
        assert!(error.contains("could not be read"), "{error}");
        assert!(open_project(&folder.path().join("absent.ron")).is_err());
    }

    proptest! {
        #[test]
        fn damaged_bytes_never_panic(at in 0..4000_usize, value in any::<u8>(), remove in 0..40_usize) {
            let mut bytes = project_text(&demo()).unwrap().into_bytes();
            let at = at % bytes.len();
            bytes[at] = value;
            let end = (at + remove).min(bytes.len());
            bytes.drain(at..end);
            if let Ok(opened) = read_project(&bytes) {
                prop_assert!(opened.project.check().is_ok());
            }
        }
    }
}
