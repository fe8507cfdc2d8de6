//! The commands that need no window: arguments in, documented JSON or a readable table out.
//!
//! Results go to the output stream, sentences to the error stream. The exit code is 0 when the work is done, 1 when
//! the answer is "no" (an infeasible white, an open question) and 2 for bad input; several files end with the worst.

mod args;
mod exit;

pub use args::{
    AnswerArgs, AxisAnswer, BudgetArgs, DecimalAnswer, EmitterArgs, LimitArgs, MaximiseChoice,
    OrdinateAnswer, OutputArgs, PerAnswer, SolvingArgs, TargetArgs,
};
pub use exit::{BadInput, Exit};

use clap::Parser;
use std::{ffi::OsString, path::PathBuf, process::ExitCode};

/// White light sources from measured emitters: blend weights with proof, a ledger and a recipe.
#[derive(Debug, Parser)]
#[command(name = "whitesmith", version, args_conflicts_with_subcommands = true)]
pub struct Cli {
    /// A project, or spectra files, to open in the window
    #[arg(value_name = "PROJECT | FILES")]
    pub open: Vec<PathBuf>,
}

/// Runs the program with its arguments (the first is its own name) and returns its exit code.
pub fn run<I, T>(arguments: I) -> ExitCode
where
    I: IntoIterator<Item = T>,
    T: Into<OsString> + Clone,
{
    match Cli::try_parse_from(arguments) {
        Ok(_) => Exit::Done.into(),
        Err(error) => error.exit(),
    }
}
