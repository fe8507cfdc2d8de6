//! From arguments to a problem: the emitters file, the wall-plug efficiencies, the white and the budget.

use super::answer::Asked;
use super::args::{BudgetArgs, EmitterArgs, SolvingArgs};
use super::{AnswerArgs, BadInput, Exit, files, output};
use crate::solving::{self, SolvingError, Sources};
use ::files::read::{Outcome, Reading};
use optimiser::{Budget, Problem};
use project::WhiteSpec;
use serde::Serialize;
use std::path::Path;
use std::time::Instant;

/// Why nothing could be asked: the exit code and the sentence (already printed on the error stream).
#[derive(Debug)]
pub(super) struct Stopped {
    pub(super) exit: Exit,
    pub(super) message: String,
}

impl Stopped {
    /// Bad input at an option.
    pub(super) fn at(option: &str, sentence: impl std::fmt::Display) -> Self {
        let line = BadInput::at(option, &sentence.to_string());
        output::sentence(&line);
        Self { exit: Exit::Bad, message: line.to_string() }
    }
}

/// The emitters of a command.
#[derive(Debug)]
pub(super) struct Loaded {
    pub(super) sources: Sources,
    pub(super) wall_plug: Vec<f64>,
}

/// Reads a file whose spectra are needed; refusals and open questions end the command.
pub(super) fn spectra_of(path: &Path, answers: &AnswerArgs) -> Result<Reading, Stopped> {
    let reading = files::read(path, answers);
    let exit = files::explain(&reading);
    match reading.outcome {
        Outcome::Read | Outcome::Warned => {}
        Outcome::Ask => {
            let questions: Vec<String> = reading.questions.iter().map(files::question).collect();
            return Err(Stopped { exit, message: questions.join(" ") });
        }
        Outcome::Refused => return Err(Stopped { exit, message: reading.message.unwrap_or_default() }),
    }
    for warning in &reading.warnings {
        output::sentence(BadInput::at(&reading.file, &format!("warning: {warning}")));
    }
    Ok(reading)
}

/// Reads the emitters file and checks the wall-plug efficiencies against it.
pub(super) fn load(args: &EmitterArgs, answers: &AnswerArgs) -> Result<Loaded, Stopped> {
    let reading = spectra_of(&args.emitters, answers)?;
    let named = reading.spectra.iter().map(|s| (s.name.as_str(), &s.spectrum));
    let sources = Sources::new(named).map_err(|e| Stopped::at(&reading.file, e))?;
    let wall_plug = args.wall_plug.clone().unwrap_or_default();
    if args.wall_plug.is_some() && wall_plug.len() != sources.len() {
        let count = SolvingError::WallPlugCount { expected: sources.len(), found: wall_plug.len() };
        return Err(Stopped::at("--wall-plug", count));
    }
    Ok(Loaded { sources, wall_plug })
}

impl Loaded {
    /// The question of one white.
    pub(super) fn asked<'a>(&'a self, white: &'a WhiteSpec) -> Asked<'a> {
        Asked { sources: &self.sources, white, wall_plug: &self.wall_plug }
    }

    /// The problem of one white under the budget.
    pub(super) fn problem(&self, white: &WhiteSpec, budget: BudgetArgs) -> Result<Problem, Stopped> {
        let mut problem = solving::problem(&self.sources, white, &self.wall_plug)
            .map_err(|error| Stopped::at(option_of(&error), error))?;
        problem.budget = budget_of(budget);
        Ok(problem)
    }
}

/// Runs a job on the optimiser and tells how long it took.
pub(super) fn timed<T, E: std::fmt::Display>(
    option: &str,
    job: impl FnOnce() -> Result<T, E>,
) -> Result<(T, f64), Stopped> {
    let start = Instant::now();
    let done = job().map_err(|error| Stopped::at(option, error))?;
    Ok((done, start.elapsed().as_secs_f64()))
}

/// Finishes a command: the exit code of what was done, or the record of what could not be asked.
pub(super) fn finish<R: Serialize>(
    result: Result<Exit, Stopped>,
    json: bool,
    unanswered: impl FnOnce(String) -> R,
) -> Exit {
    result.unwrap_or_else(|stopped| {
        if json {
            output::json(&unanswered(stopped.message));
        }
        stopped.exit
    })
}

/// The option a faulty question comes from.
fn option_of(error: &SolvingError) -> &'static str {
    match error {
        SolvingError::WallPlugCount { .. } | SolvingError::WallPlugMissing => "--wall-plug",
        SolvingError::Quadrangle { .. } | SolvingError::Centre { .. } | SolvingError::Concave => "--within",
        _ => "arguments",
    }
}

fn budget_of(args: BudgetArgs) -> Budget {
    let standard = Budget::default();
    Budget { boxes: args.budget_boxes.unwrap_or(standard.boxes), seconds: args.budget.or(standard.seconds) }
}

/// Loads the emitters of a solving command.
pub(super) fn load_for(args: &SolvingArgs) -> Result<Loaded, Stopped> {
    load(&args.emitters, &args.answers)
}
