//! `correct`: measured whites of made devices, un-mixed into the shares of their emitters.

use super::args::{AnswerArgs, OutputArgs};
use super::asking::{Stopped, spectra_of};
use super::output::{self, Table, cell};
use super::{BadInput, Exit};
use clap::Args;
use colour::Spectrum;
use optimiser::unmix::{Freedom, Unmixed, unmix};
use serde::Serialize;
use std::path::PathBuf;

/// Un-mix measured whites of made devices into the shares of their emitters
#[derive(Debug, Args)]
pub struct CorrectArgs {
    /// Spectra of the emitters: wavelength in the first column, one column an emitter
    #[arg(long, value_name = "FILE")]
    pub emitters: PathBuf,
    /// Measured whites, one or many a file
    #[arg(long, value_name = "FILE", required = true, num_args = 1..)]
    pub measured: Vec<PathBuf>,
    /// Let each emitter move along the axis
    #[arg(long)]
    pub shift: bool,
    /// Let each emitter widen or narrow
    #[arg(long)]
    pub stretch: bool,
    /// The answers.
    #[command(flatten)]
    pub answers: AnswerArgs,
    /// The printing.
    #[command(flatten)]
    pub output: OutputArgs,
}

/// One measured white with the keys of the contract; null where nothing of the emitters was found in it.
#[derive(Debug, Serialize)]
struct CorrectionRecord {
    name: String,
    shares: Option<Vec<f64>>,
    share_sigma: Option<Vec<Option<f64>>>,
    shift_nm: Option<Vec<f64>>,
    stretch: Option<Vec<f64>>,
    unexplained: Option<f64>,
    residual_rms: Option<f64>,
    warnings: Vec<String>,
}

impl CorrectionRecord {
    fn found(name: &str, found: Unmixed, names: &[String]) -> Self {
        let warnings = found.doubts.iter().map(|doubt| match doubt.emitter() {
            Some(emitter) => format!("{}: {doubt}", names[emitter]),
            None => doubt.to_string(),
        });
        Self {
            name: name.to_owned(),
            warnings: warnings.collect(),
            shares: Some(found.shares),
            share_sigma: Some(found.share_sigma),
            shift_nm: found.shift_nm,
            stretch: found.stretch,
            unexplained: Some(found.unexplained),
            residual_rms: Some(found.residual_rms),
        }
    }

    fn nothing(name: &str, reason: String) -> Self {
        Self {
            name: name.to_owned(),
            shares: None,
            share_sigma: None,
            shift_nm: None,
            stretch: None,
            unexplained: None,
            residual_rms: None,
            warnings: vec![reason],
        }
    }
}

/// Runs the command.
pub(super) fn run(args: &CorrectArgs) -> Exit {
    let mut records = Vec::new();
    let (exit, names) = match correct(args, &mut records) {
        Ok(done) => done,
        Err(stopped) => (stopped.exit, Vec::new()),
    };
    if args.output.json {
        output::json(&records);
    } else {
        records.iter().for_each(|record| print(record, &names));
    }
    exit
}

fn correct(args: &CorrectArgs, records: &mut Vec<CorrectionRecord>) -> Result<(Exit, Vec<String>), Stopped> {
    let emitters = spectra_of(&args.emitters, &args.answers)?;
    let names: Vec<String> = emitters.spectra.iter().map(|s| s.name.clone()).collect();
    let curves: Vec<Spectrum> = emitters.spectra.iter().map(|s| s.spectrum.clone()).collect();
    let freedom = Freedom { shift: args.shift, stretch: args.stretch };
    let mut exit = Exit::Done;
    for path in &args.measured {
        let measured = match spectra_of(path, &args.answers) {
            Ok(reading) => reading,
            Err(stopped) => {
                exit = exit.max(stopped.exit);
                continue;
            }
        };
        for white in &measured.spectra {
            records.push(match unmix(&white.spectrum, &curves, freedom) {
                Ok(found) => {
                    let mut record = CorrectionRecord::found(&white.name, found, &names);
                    record.warnings.extend(measured.warnings.iter().cloned());
                    record
                }
                Err(error) => {
                    output::sentence(BadInput::at(&measured.file, &format!("{}: {error}", white.name)));
                    exit = Exit::Bad;
                    CorrectionRecord::nothing(&white.name, error.to_string())
                }
            });
        }
    }
    Ok((exit, names))
}

fn print(record: &CorrectionRecord, names: &[String]) {
    output::text(&format!(
        "{}: unexplained {} %, residual {} % of the peak (rms)",
        record.name,
        cell(record.unexplained.map(|u| 100.0 * u), 2),
        cell(record.residual_rms.map(|r| 100.0 * r), 3)
    ));
    if let (Some(shares), Some(sigma)) = (&record.shares, &record.share_sigma) {
        let mut table = Table::new(&["  emitter", "radiant share %", "σ %", "shift nm", "stretch"]);
        for (i, name) in names.iter().enumerate() {
            let of = |list: &Option<Vec<f64>>| list.as_ref().map(|l| l[i]);
            table.row([
                format!("  {name}"),
                cell(Some(100.0 * shares[i]), 3),
                cell(sigma[i].map(|s| 100.0 * s), 3),
                cell(of(&record.shift_nm), 2),
                cell(of(&record.stretch), 3),
            ]);
        }
        output::text(&table.to_string());
    }
    for warning in &record.warnings {
        output::text(&format!("  {warning}"));
    }
}
