//! `prices`: what one step of each requirement costs, checked by solving again.

use super::Exit;
use super::args::{SolvingArgs, TargetArgs};
use super::asking::{Stopped, finish, load_for, timed};
use super::output::{self, Table, cell};
use clap::Args;
use optimiser::{Control, Metric, Requirement};
use serde::Serialize;

/// Show what one step of each requirement costs
#[derive(Debug, Args)]
pub struct PricesArgs {
    /// The target.
    #[command(flatten)]
    pub target: TargetArgs,
    /// Everything else.
    #[command(flatten)]
    pub solving: SolvingArgs,
}

/// All prices; empty when there is no blend.
#[derive(Debug, Default, Serialize)]
struct PricesRecord {
    prices: Vec<PriceRecord>,
    seconds: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    message: Option<String>,
}

/// One price: the change of the objective for one step of a requirement.
#[derive(Debug, Serialize)]
struct PriceRecord {
    of: &'static str,
    end: Option<&'static str>,
    step: f64,
    unit: &'static str,
    per_step: f64,
    easier_side: Option<f64>,
    harder_side: Option<f64>,
}

/// Runs the command.
pub(super) fn run(args: &PricesArgs) -> Exit {
    finish(prices(args), args.solving.output.json, |message| PricesRecord {
        message: Some(message),
        ..PricesRecord::default()
    })
}

fn prices(args: &PricesArgs) -> Result<Exit, Stopped> {
    let loaded = load_for(&args.solving)?;
    let white = args.solving.limits.spec(args.target.cct, args.target.duv);
    let problem = loaded.problem(&white, args.solving.budget)?;
    let (found, seconds) = timed("arguments", || optimiser::prices(&problem, &Control::none()))?;
    let prices: Vec<PriceRecord> = found
        .iter()
        .map(|price| {
            let (of, end, step, unit) = step_of(price.of);
            PriceRecord {
                of,
                end,
                step,
                unit,
                per_step: price.per_step,
                easier_side: price.easier_side,
                harder_side: price.harder_side,
            }
        })
        .collect();
    let message = prices.is_empty().then(|| "no blend meets these limits, so nothing has a price".to_owned());
    let record = PricesRecord { prices, seconds: Some(seconds), message };
    if args.solving.output.json {
        output::json(&record);
        record.message.iter().for_each(output::sentence);
    } else {
        print(&record);
    }
    Ok(if record.prices.is_empty() { Exit::No } else { Exit::Done })
}

fn step_of(requirement: Requirement) -> (&'static str, Option<&'static str>, f64, &'static str) {
    let unit = |metric: Metric| match metric {
        Metric::Ler | Metric::Efficacy => "lm/W",
        _ => "point",
    };
    match requirement {
        Requirement::Low(metric) => (metric.key(), Some("low"), 1.0, unit(metric)),
        Requirement::High(metric) => (metric.key(), Some("high"), -1.0, unit(metric)),
        Requirement::Duv => ("duv", None, 0.001, "Duv"),
        Requirement::Cct => ("cct", None, 1.0, "% of CCT"),
    }
}

fn print(record: &PricesRecord) {
    let mut table = Table::new(&["requirement", "step", "changes the objective by"]);
    for price in &record.prices {
        let name = match price.end {
            Some("low") => format!("{} at least", price.of),
            Some(_) => format!("{} at most", price.of),
            None => price.of.to_owned(),
        };
        table.row([name, format!("{:+} {}", price.step, price.unit), cell(Some(price.per_step), 4)]);
    }
    output::text(&table.to_string());
    record.message.iter().for_each(|m| output::text(m));
}
