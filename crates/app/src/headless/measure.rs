//! `measure`: every metric of every spectrum in each file, its samples used as they are.

use super::args::{AnswerArgs, OutputArgs};
use super::output::{self, Table, cell};
use super::{Exit, files};
use ::files::read::Outcome;
use clap::Args;
use colour::Measurement;
use colour::measure::measure_spectrum;
use serde::Serialize;
use std::path::PathBuf;

/// Measure every spectrum in each file
#[derive(Debug, Args)]
pub struct MeasureArgs {
    /// Spectra files
    #[arg(required = true, value_name = "FILE")]
    pub files: Vec<PathBuf>,
    /// The answers.
    #[command(flatten)]
    pub answers: AnswerArgs,
    /// The printing.
    #[command(flatten)]
    pub output: OutputArgs,
}

/// One spectrum with the keys of the contract.
#[derive(Debug, Serialize)]
struct SpectrumRecord {
    name: String,
    #[serde(flatten)]
    measurement: Measurement,
}

/// Runs the command. A file that is refused or leaves a question open adds nothing: no number rests on a guess.
pub(super) fn run(args: &MeasureArgs) -> Exit {
    let mut exit = Exit::Done;
    let mut records = Vec::new();
    for path in &args.files {
        let reading = files::read(path, &args.answers);
        exit = exit.max(files::explain(&reading));
        if !matches!(reading.outcome, Outcome::Read | Outcome::Warned) {
            continue;
        }
        for read in &reading.spectra {
            let mut measurement = measure_spectrum(&read.spectrum);
            measurement.warnings.extend(reading.warnings.iter().cloned());
            records.push(SpectrumRecord { name: read.name.clone(), measurement });
        }
    }
    if args.output.json {
        output::json(&records);
    } else {
        print(&records);
    }
    exit
}

fn print(records: &[SpectrumRecord]) {
    if records.is_empty() {
        return;
    }
    let mut table = Table::new(&[
        "spectrum", "CCT K", "Duv", "u′", "v′", "lm/W", "Ra", "R9", "Rf", "Rg", "S/P", "mel. DER", "peak nm",
        "FWHM nm",
    ]);
    for record in records {
        let m = &record.measurement;
        table.row([
            record.name.clone(),
            cell(m.cct_k, 0),
            cell(m.duv, 4),
            cell(Some(m.u_prime), 4),
            cell(Some(m.v_prime), 4),
            cell(Some(m.ler_lm_per_w), 1),
            cell(m.ra, 1),
            cell(m.r9(), 1),
            cell(m.rf, 1),
            cell(m.rg, 1),
            cell(Some(m.sp_ratio), 3),
            cell(Some(m.melanopic_der), 3),
            cell(m.peak_nm, 1),
            cell(m.fwhm_nm, 1),
        ]);
    }
    output::text(&table.to_string());
    for record in records {
        for warning in &record.measurement.warnings {
            output::text(&format!("  {}: {warning}", record.name));
        }
    }
}
