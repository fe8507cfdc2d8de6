//! `drop`: what leaving each emitter out costs.

use super::Exit;
use super::answer::AnswerRecord;
use super::args::{SolvingArgs, TargetArgs};
use super::asking::{Stopped, finish, load_for, timed};
use super::output::{self, Table, cell};
use clap::Args;
use optimiser::Control;
use serde::Serialize;

/// Show what leaving each emitter out costs
#[derive(Debug, Args)]
pub struct DropArgs {
    /// The target.
    #[command(flatten)]
    pub target: TargetArgs,
    /// Everything else.
    #[command(flatten)]
    pub solving: SolvingArgs,
}

/// The whole set's answer and the answer without each emitter.
#[derive(Debug, Default, Serialize)]
struct DropRecord {
    #[serde(flatten)]
    answer: AnswerRecord,
    without: Vec<WithoutRecord>,
}

/// The answer without one emitter; `price` is null when there is no blend without it.
#[derive(Debug, Serialize)]
struct WithoutRecord {
    emitter: usize,
    name: String,
    price: Option<f64>,
    #[serde(flatten)]
    answer: AnswerRecord,
}

/// Runs the command.
pub(super) fn run(args: &DropArgs) -> Exit {
    finish(drop_each(args), args.solving.output.json, |message| DropRecord {
        answer: AnswerRecord::unanswered(message),
        ..DropRecord::default()
    })
}

fn drop_each(args: &DropArgs) -> Result<Exit, Stopped> {
    let loaded = load_for(&args.solving)?;
    let white = args.solving.limits.spec(args.target.cct, args.target.duv);
    let problem = loaded.problem(&white, args.solving.budget)?;
    let ((whole, dropped), seconds) =
        timed("arguments", || optimiser::drop_each(&problem, &Control::none()))?;
    let asked = loaded.asked(&white);
    let without = dropped.iter().map(|one| WithoutRecord {
        emitter: one.emitter,
        name: loaded.sources.names[one.emitter].clone(),
        price: one.price,
        answer: asked.record(&one.outcome, None),
    });
    let record = DropRecord { answer: asked.record(&whole, Some(seconds)), without: without.collect() };
    if args.solving.output.json {
        output::json(&record);
        record.answer.message.iter().for_each(output::sentence);
    } else {
        record.answer.print(&asked);
        let mut table = Table::new(&["without", "objective", "costs"]);
        for one in &record.without {
            table.row([one.name.clone(), cell(one.answer.objective, 3), cell(one.price, 3)]);
        }
        output::text(&table.to_string());
    }
    Ok(record.answer.exit())
}
