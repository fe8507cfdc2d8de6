//! `frontier`: what each level of a metric costs, one proven solve a level.

use super::answer::AnswerRecord;
use super::args::{MetricChoice, SolvingArgs, TargetArgs};
use super::asking::{Stopped, finish, load_for, timed};
use super::output::{self, Table, cell};
use super::{Exit, numbers};
use crate::solving::metric;
use clap::Args;
use optimiser::{Control, Levels};
use project::Metric;
use serde::Serialize;

/// Trade the objective against a metric, one proven solve a level
#[derive(Debug, Args)]
pub struct FrontierArgs {
    /// The target.
    #[command(flatten)]
    pub target: TargetArgs,
    /// The metric that is raised from level to level
    #[arg(long, value_enum, value_name = "METRIC")]
    pub of: MetricChoice,
    /// Levels the metric must reach; without them, levels are spread where the curve bends
    #[arg(long, value_name = "L,L", value_delimiter = ',', allow_hyphen_values = true, value_parser = numbers::number)]
    pub levels: Option<Vec<f64>>,
    /// Number of levels when none are named
    #[arg(long, value_name = "N", default_value_t = 20, value_parser = numbers::count)]
    pub points: usize,
    /// Everything else.
    #[command(flatten)]
    pub solving: SolvingArgs,
}

/// The frontier with the keys of the contract.
#[derive(Debug, Default, Serialize)]
struct FrontierRecord {
    of: Option<&'static str>,
    points: Vec<PointRecord>,
    seconds: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    message: Option<String>,
}

/// One level: the answer with the metric at least there.
#[derive(Debug, Serialize)]
struct PointRecord {
    level: f64,
    #[serde(flatten)]
    answer: AnswerRecord,
}

/// Runs the command.
pub(super) fn run(args: &FrontierArgs) -> Exit {
    finish(frontier(args), args.solving.output.json, |message| FrontierRecord {
        message: Some(message),
        ..FrontierRecord::default()
    })
}

fn frontier(args: &FrontierArgs) -> Result<Exit, Stopped> {
    let loaded = load_for(&args.solving)?;
    let of = Metric::from(args.of);
    let white = args.solving.limits.spec(args.target.cct, args.target.duv);
    let problem = loaded.problem(&white, args.solving.budget)?;
    let levels = args.levels.clone().map_or(Levels::Adaptive(args.points), Levels::At);
    let (found, seconds) =
        timed("arguments", || optimiser::frontier(&problem, metric(of), &levels, &Control::none()))?;
    let points = found.iter().map(|point| {
        let mut at_level = white.clone();
        let limit = at_level.limits.of_mut(of);
        limit.low = Some(limit.low.map_or(point.level, |low| low.max(point.level)));
        PointRecord { level: point.level, answer: loaded.asked(&at_level).record(&point.outcome, None) }
    });
    let record = FrontierRecord {
        of: Some(of.key()),
        points: points.collect(),
        seconds: Some(seconds),
        ..FrontierRecord::default()
    };
    if args.solving.output.json {
        output::json(&record);
    } else {
        print(&record);
    }
    let any = record.points.iter().any(|p| p.answer.is_optimal());
    Ok(if any { Exit::Done } else { Exit::No })
}

fn print(record: &FrontierRecord) {
    let mut table =
        Table::new(&["level", "objective", "upper bound", "grade", "Ra", "R9", "Rf", "Rg", "lm/W"]);
    for point in &record.points {
        let answer = &point.answer;
        let m = answer.measured.as_ref();
        table.row([
            cell(Some(point.level), 2),
            cell(answer.objective, 3),
            cell(answer.upper_bound, 3),
            answer.grade.or(answer.status).unwrap_or("–").to_owned(),
            cell(m.and_then(|m| m.ra), 2),
            cell(m.and_then(colour::Measurement::r9), 2),
            cell(m.and_then(|m| m.rf), 2),
            cell(m.and_then(|m| m.rg), 2),
            cell(m.map(|m| m.ler_lm_per_w), 2),
        ]);
    }
    output::text(&table.to_string());
}
