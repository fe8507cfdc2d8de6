//! Files named on the command line, read with the answers given beside them.

use super::args::{AnswerArgs, AxisAnswer, DecimalAnswer, OrdinateAnswer, PerAnswer};
use super::output;
use super::{BadInput, Exit};
use files::read::{Answers, AxisUnit, Decimal, Ordinate, Outcome, Per, Question, Reading, read_path};
use std::path::Path;

impl From<&AnswerArgs> for Answers {
    fn from(args: &AnswerArgs) -> Self {
        Self {
            axis: args.axis.map(|axis| match axis {
                AxisAnswer::Nm => AxisUnit::Nm,
                AxisAnswer::Um => AxisUnit::Um,
                AxisAnswer::Angstrom => AxisUnit::Angstrom,
                AxisAnswer::M => AxisUnit::M,
                AxisAnswer::PerCm => AxisUnit::Cm1,
                AxisAnswer::Ev => AxisUnit::Ev,
            }),
            ordinate: args.ordinate.map(|ordinate| match ordinate {
                OrdinateAnswer::Power => Ordinate::Power,
                OrdinateAnswer::Photons => Ordinate::Photons,
            }),
            per: args.per.map(|per| match per {
                PerAnswer::Nm => Per::Nm,
                PerAnswer::Ev => Per::Ev,
                PerAnswer::PerCm => Per::Cm1,
            }),
            decimal: args.decimal.map(|decimal| match decimal {
                DecimalAnswer::Point => Decimal::Point,
                DecimalAnswer::Comma => Decimal::Comma,
            }),
            columns: args.columns.clone(),
            start_nm: args.start,
            step_nm: args.step,
        }
    }
}

/// What the reader makes of a file.
pub(super) fn read(path: &Path, answers: &AnswerArgs) -> Reading {
    read_path(path, &Answers::from(answers))
}

/// The exit code a reading alone leads to.
pub(super) fn exit_of(outcome: Outcome) -> Exit {
    match outcome {
        Outcome::Read | Outcome::Warned => Exit::Done,
        Outcome::Ask => Exit::No,
        Outcome::Refused => Exit::Bad,
    }
}

/// A question with the option that answers it, in one string.
pub(super) fn question(question: &Question) -> String {
    if question.choices.is_empty() {
        format!("{} Answer with {}.", question.text, question.option)
    } else {
        format!("{} Answer with {} {}.", question.text, question.option, question.choices.join(" or "))
    }
}

/// Says on the error stream why a file was refused or what it leaves open; returns the exit code.
pub(super) fn explain(reading: &Reading) -> Exit {
    match reading.outcome {
        Outcome::Refused => {
            let message = reading.message.as_deref().unwrap_or("expected a spectrum, found none");
            output::sentence(BadInput::line(message));
        }
        Outcome::Ask => {
            for open in &reading.questions {
                output::sentence(BadInput::at(&reading.file, &question(open)));
            }
        }
        Outcome::Read | Outcome::Warned => {}
    }
    exit_of(reading.outcome)
}
