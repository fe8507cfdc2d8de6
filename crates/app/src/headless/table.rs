//! `table`: a tunable white, one row a target, neighbouring rows not too far apart.

use super::answer::AnswerRecord;
use super::args::SolvingArgs;
use super::asking::{Stopped, finish, load_for, timed};
use super::output::{self, Table, cell};
use super::{Exit, numbers};
use clap::Args;
use optimiser::{Control, Target};
use serde::Serialize;

/// Make a table for a tunable white: the best mean over its rows
#[derive(Debug, Args)]
pub struct TableArgs {
    /// Target correlated colour temperatures in K, one a row
    #[arg(long, value_name = "K,K", value_delimiter = ',', required = true, allow_hyphen_values = true, value_parser = numbers::cct_k)]
    pub cct: Vec<f64>,
    /// Target Duv, one for all rows or one a row
    #[arg(long, value_name = "D,D", value_delimiter = ',', allow_hyphen_values = true, value_parser = numbers::duv)]
    pub duv: Option<Vec<f64>>,
    /// Greatest change of any share from row to row
    #[arg(long, value_name = "SHARE", allow_hyphen_values = true, value_parser = numbers::fraction)]
    pub max_step: Option<f64>,
    /// Everything else.
    #[command(flatten)]
    pub solving: SolvingArgs,
}

/// The table.
#[derive(Debug, Default, Serialize)]
struct TableRecord {
    rows: Vec<RowRecord>,
    objective: Option<f64>,
    upper_bound: Option<f64>,
    gap: Option<f64>,
    grade: Option<&'static str>,
    greatest_step: Option<f64>,
    step_binds: Option<bool>,
    seconds: Option<f64>,
    boxes: u64,
    stopped_by: Option<&'static str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    message: Option<String>,
}

/// One row: its target and the answer.
#[derive(Debug, Serialize)]
struct RowRecord {
    target_cct_k: f64,
    target_duv: f64,
    #[serde(flatten)]
    answer: AnswerRecord,
}

/// Runs the command.
pub(super) fn run(args: &TableArgs) -> Exit {
    finish(table(args), args.solving.output.json, |message| TableRecord {
        message: Some(message),
        ..TableRecord::default()
    })
}

fn targets(args: &TableArgs) -> Result<Vec<Target>, Stopped> {
    let rows = args.cct.len();
    let duv = match args.duv.as_deref() {
        None => vec![0.0; rows],
        Some([one]) => vec![*one; rows],
        Some(list) if list.len() == rows => list.to_vec(),
        Some(list) => {
            let counts = format!("expected one Duv or {rows}, one a CCT, found {}", list.len());
            return Err(Stopped::at("--duv", counts));
        }
    };
    Ok(args.cct.iter().zip(duv).map(|(&cct_k, duv)| Target { cct_k, duv }).collect())
}

fn table(args: &TableArgs) -> Result<Exit, Stopped> {
    let targets = targets(args)?;
    let loaded = load_for(&args.solving)?;
    let specs: Vec<_> = targets.iter().map(|t| args.solving.limits.spec(t.cct_k, t.duv)).collect();
    let problem = loaded.problem(&specs[0], args.solving.budget)?;
    let (found, seconds) =
        timed("arguments", || optimiser::table(&problem, &targets, args.max_step, &Control::none()))?;
    let rows = found.rows.iter().zip(&specs).map(|(outcome, white)| RowRecord {
        target_cct_k: white.cct_k,
        target_duv: white.duv,
        answer: loaded.asked(white).record(outcome, None),
    });
    let record = TableRecord {
        rows: rows.collect(),
        objective: found.objective,
        upper_bound: found.upper_bound,
        gap: found.gap,
        grade: found.objective.is_some().then(|| found.grade.key()),
        greatest_step: Some(found.greatest_step),
        step_binds: Some(found.step_binds),
        seconds: Some(seconds),
        boxes: found.boxes,
        stopped_by: found.stopped_by.map(optimiser::Stop::key),
        message: found.explanation,
    };
    if args.solving.output.json {
        output::json(&record);
        record.message.iter().for_each(output::sentence);
    } else {
        print(&record, &loaded.sources.names);
    }
    Ok(if record.objective.is_some() { Exit::Done } else { Exit::No })
}

fn print(record: &TableRecord, names: &[String]) {
    let mut header = vec!["K", "Duv", "objective"];
    header.extend(names.iter().map(String::as_str));
    let mut table = Table::new(&header);
    for row in &record.rows {
        let mut cells = vec![
            cell(Some(row.target_cct_k), 0),
            cell(Some(row.target_duv), 4),
            cell(row.answer.objective, 3),
        ];
        let shares = row.answer.shares.as_deref().unwrap_or_default();
        cells.extend(shares.iter().map(|s| cell(Some(100.0 * s), 2)));
        table.row(cells);
    }
    output::text(&table.to_string());
    output::text(&format!(
        "radiant shares in %; mean {}, at most {} ({}); greatest step {} %",
        cell(record.objective, 3),
        cell(record.upper_bound, 3),
        record.grade.unwrap_or("–"),
        cell(record.greatest_step.map(|s| 100.0 * s), 2)
    ));
    record.message.iter().for_each(|m| output::text(m));
}
