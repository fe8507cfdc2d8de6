//! `solve`: the best blend at one white, with what it is worth.

use super::answer::AnswerRecord;
use super::args::{SolvingArgs, TargetArgs};
use super::asking::{Stopped, finish, load_for, timed};
use super::{Exit, output};
use clap::Args;
use optimiser::Control;

/// Find the best blend of a file's emitters at a white, within limits, with its bound
#[derive(Debug, Args)]
pub struct SolveArgs {
    /// The target.
    #[command(flatten)]
    pub target: TargetArgs,
    /// Everything else.
    #[command(flatten)]
    pub solving: SolvingArgs,
}

/// Runs the command.
pub(super) fn run(args: &SolveArgs) -> Exit {
    finish(solve(args), args.solving.output.json, AnswerRecord::unanswered)
}

fn solve(args: &SolveArgs) -> Result<Exit, Stopped> {
    let loaded = load_for(&args.solving)?;
    let white = args.solving.limits.spec(args.target.cct, args.target.duv);
    let problem = loaded.problem(&white, args.solving.budget)?;
    let asked = loaded.asked(&white);
    let (outcome, seconds) = timed("arguments", || optimiser::solve(&problem, &Control::none()))?;
    let record = asked.record(&outcome, Some(seconds));
    if args.solving.output.json {
        output::json(&record);
        record.message.iter().for_each(output::sentence);
    } else {
        record.print(&asked);
    }
    Ok(record.exit())
}
