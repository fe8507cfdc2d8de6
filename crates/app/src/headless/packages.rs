//! `packages`: whole numbers of packages.

use super::answer::{AnswerRecord, Asked, NearestRecord};
use super::args::{SolvingArgs, TargetArgs};
use super::asking::{Stopped, finish, load_for};
use super::output::{self, Table, cell};
use super::{Exit, numbers};
use clap::Args;
use optimiser::{Control, Grade, PackageAnswer, PackageError};
use serde::Serialize;
use serde_json::Map;
use std::time::Instant;

/// Ranked answers that are kept.
const KEPT: usize = 5;

/// Find whole numbers of packages; every combination is looked at
#[derive(Debug, Args)]
pub struct PackagesArgs {
    /// The target.
    #[command(flatten)]
    pub target: TargetArgs,
    /// Optical watts of one package, one number a column of the file
    #[arg(long, value_name = "W,W", value_delimiter = ',', required = true, allow_hyphen_values = true, value_parser = numbers::positive)]
    pub watts_each: Vec<f64>,
    /// Packages in all
    #[arg(long, value_name = "N", value_parser = numbers::count)]
    pub at_most: usize,
    /// Everything else.
    #[command(flatten)]
    pub solving: SolvingArgs,
}

/// The answer with its counts.
#[derive(Debug, Default, Serialize)]
struct PackagesRecord {
    #[serde(flatten)]
    answer: AnswerRecord,
    counts: Option<Vec<u32>>,
    nearest_counts: Option<Vec<u32>>,
    runners_up: Vec<RunnerUp>,
    combinations: u64,
    inside: u64,
}

/// Other counts that meet the limits.
#[derive(Debug, Serialize)]
struct RunnerUp {
    counts: Vec<u32>,
    shares: Vec<f64>,
    objective: f64,
}

/// Runs the command.
pub(super) fn run(args: &PackagesArgs) -> Exit {
    finish(packages(args), args.solving.output.json, |message| PackagesRecord {
        answer: AnswerRecord::unanswered(message),
        ..PackagesRecord::default()
    })
}

fn packages(args: &PackagesArgs) -> Result<Exit, Stopped> {
    let loaded = load_for(&args.solving)?;
    let white = args.solving.limits.spec(args.target.cct, args.target.duv);
    let problem = loaded.problem(&white, args.solving.budget)?;
    let at_most = u32::try_from(args.at_most)
        .map_err(|_| Stopped::at("--at-most", format!("expected fewer packages, found {}", args.at_most)))?;
    let start = Instant::now();
    let found = optimiser::packages(&problem, &args.watts_each, at_most, KEPT, &Control::none())
        .map_err(|error| Stopped::at(option_of(&error), error))?;
    let seconds = start.elapsed().as_secs_f64();
    let asked = loaded.asked(&white);
    let record = record(&asked, found, seconds);
    if args.solving.output.json {
        output::json(&record);
        record.answer.message.iter().for_each(output::sentence);
    } else {
        print(&record, &asked);
    }
    Ok(record.answer.exit())
}

fn option_of(error: &PackageError) -> &'static str {
    match error {
        PackageError::Watts { .. } => "--watts-each",
        PackageError::TooMany { .. } => "--at-most",
        _ => "arguments",
    }
}

fn record(asked: &Asked<'_>, found: PackageAnswer, seconds: f64) -> PackagesRecord {
    let mut ranked = found.ranked.into_iter();
    let mut out =
        PackagesRecord { combinations: found.vectors, inside: found.inside, ..PackagesRecord::default() };
    if let Some(best) = ranked.next() {
        let measured = asked.measured(&best.shares);
        out.answer = AnswerRecord {
            status: Some("optimal"),
            objective: Some(best.objective),
            // Every combination was looked at.
            upper_bound: Some(best.objective),
            gap: Some(0.0),
            grade: Some(Grade::Proven.key()),
            limits: asked.limits(&measured, &best.shares),
            measured: Some(measured),
            shares: Some(best.shares),
            seconds: Some(seconds),
            ..AnswerRecord::default()
        };
        out.counts = Some(best.counts);
    } else {
        let message = "no combination of whole packages meets the white and the limits";
        out.answer = AnswerRecord {
            status: Some("infeasible"),
            seconds: Some(seconds),
            message: Some(message.to_owned()),
            reachable: Some(Map::new()),
            ..AnswerRecord::default()
        };
        if let Some((counts, nearest)) = found.nearest {
            let nearest: NearestRecord = asked.nearest(&nearest);
            out.answer.limits = asked.limits(&asked.measured(&nearest.shares), &nearest.shares);
            out.answer.nearest = Some(nearest);
            out.nearest_counts = Some(counts);
        }
    }
    out.runners_up =
        ranked.map(|r| RunnerUp { counts: r.counts, shares: r.shares, objective: r.objective }).collect();
    out
}

fn print(record: &PackagesRecord, asked: &Asked<'_>) {
    if let Some(counts) = record.counts.as_ref().or(record.nearest_counts.as_ref()) {
        let mut table = Table::new(&["emitter", "packages"]);
        for (name, count) in asked.sources.names.iter().zip(counts) {
            table.row([name.clone(), count.to_string()]);
        }
        output::text(&table.to_string());
    }
    record.answer.print(asked);
    output::text(&format!("{} combinations, {} inside the white region", record.combinations, record.inside));
    for other in &record.runners_up {
        output::text(&format!("  also {:?}: {}", other.counts, cell(Some(other.objective), 3)));
    }
}
