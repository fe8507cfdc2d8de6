//! Exit codes and the errors that lead to them.

use std::process::ExitCode;

/// How a command ended; ordered from best to worst, so that several files end with the worst.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Exit {
    /// Done: code 0.
    Done = 0,
    /// Answered "no" (an infeasible white, an open question): code 1.
    No = 1,
    /// Bad input: code 2.
    Bad = 2,
}

impl From<Exit> for ExitCode {
    fn from(exit: Exit) -> Self {
        Self::from(exit as u8)
    }
}

/// Input a command cannot work with: one sentence for one line on the error stream.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct BadInput(String);

impl BadInput {
    /// A sentence about the place `place` (an option, `file` or `file:line`); line breaks become spaces.
    pub fn at(place: &str, sentence: &str) -> Self {
        Self::line(&format!("{place}: {sentence}"))
    }

    /// A whole line as it is.
    pub fn line(text: &str) -> Self {
        Self(text.split_whitespace().collect::<Vec<_>>().join(" "))
    }
}

impl std::fmt::Display for BadInput {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(&self.0)
    }
}
