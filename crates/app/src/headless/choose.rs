//! `choose`: the best few of a file's emitters.

use super::answer::AnswerRecord;
use super::args::{SolvingArgs, TargetArgs};
use super::asking::{Stopped, finish, load_for, timed};
use super::output::{self, Table, cell};
use super::{Exit, numbers};
use clap::Args;
use optimiser::Control;
use serde::Serialize;

/// Choose the best few of a file's emitters
#[derive(Debug, Args)]
pub struct ChooseArgs {
    /// The target.
    #[command(flatten)]
    pub target: TargetArgs,
    /// How many emitters may be used
    #[arg(long, value_name = "K", value_parser = numbers::count)]
    pub count: usize,
    /// Everything else.
    #[command(flatten)]
    pub solving: SolvingArgs,
}

/// The choice: the answer of the best subset, and what it was chosen from.
#[derive(Debug, Default, Serialize)]
struct ChoiceRecord {
    #[serde(flatten)]
    answer: AnswerRecord,
    chosen: Vec<usize>,
    runners_up: Vec<RunnerUp>,
    subsets: u64,
    reach_white: u64,
    examined: u64,
}

/// Another subset that was solved.
#[derive(Debug, Serialize)]
struct RunnerUp {
    chosen: Vec<usize>,
    shares: Vec<f64>,
    objective: f64,
}

/// Runs the command.
pub(super) fn run(args: &ChooseArgs) -> Exit {
    finish(choose(args), args.solving.output.json, |message| ChoiceRecord {
        answer: AnswerRecord::unanswered(message),
        ..ChoiceRecord::default()
    })
}

fn choose(args: &ChooseArgs) -> Result<Exit, Stopped> {
    let loaded = load_for(&args.solving)?;
    let white = args.solving.limits.spec(args.target.cct, args.target.duv);
    let problem = loaded.problem(&white, args.solving.budget)?;
    let (found, seconds) = timed("--count", || optimiser::choose(&problem, args.count, &Control::none()))?;
    let asked = loaded.asked(&white);
    let runners_up = found.runners_up.into_iter();
    let record = ChoiceRecord {
        answer: asked.record(&found.outcome, Some(seconds)),
        chosen: found.chosen,
        runners_up: runners_up
            .map(|r| RunnerUp { chosen: r.emitters, shares: r.shares, objective: r.objective })
            .collect(),
        subsets: found.subsets,
        reach_white: found.reach_white,
        examined: found.examined,
    };
    if args.solving.output.json {
        output::json(&record);
    } else {
        let names = &loaded.sources.names;
        let listed =
            |chosen: &[usize]| chosen.iter().map(|&i| names[i].as_str()).collect::<Vec<_>>().join(", ");
        output::text(&format!("chosen: {}", listed(&record.chosen)));
        record.answer.print(&asked);
        output::text(&format!(
            "{} subsets, {} reach the white, {} examined",
            record.subsets, record.reach_white, record.examined
        ));
        let mut table = Table::new(&["runner-up", "objective"]);
        for other in &record.runners_up {
            table.row([listed(&other.chosen), cell(Some(other.objective), 3)]);
        }
        output::text(&table.to_string());
    }
    Ok(record.answer.exit())
}
