//! `read`: what a reader makes of each file.

use super::args::{AnswerArgs, OutputArgs};
use super::output::{self, Table, cell};
use super::{Exit, files};
use ::files::read::{ReadSpectrum, Reading};
use clap::Args;
use serde::Serialize;
use std::path::PathBuf;

/// Show what the reader makes of spectra files: spectra, assumptions, warnings, open questions
#[derive(Debug, Args)]
pub struct ReadArgs {
    /// Files to read
    #[arg(required = true, value_name = "FILE")]
    pub files: Vec<PathBuf>,
    /// The answers.
    #[command(flatten)]
    pub answers: AnswerArgs,
    /// The printing.
    #[command(flatten)]
    pub output: OutputArgs,
}

/// One file, with the keys of the contract.
#[derive(Debug, Serialize)]
struct FileRecord {
    file: String,
    outcome: &'static str,
    spectra: Vec<SpectrumRecord>,
    assumptions: Vec<String>,
    warnings: Vec<String>,
    questions: Vec<String>,
    message: Option<String>,
}

/// One spectrum of a file; null where it depends on an open question.
#[derive(Debug, Serialize)]
struct SpectrumRecord {
    name: String,
    peak_nm: Option<f64>,
    fwhm_nm: Option<f64>,
    first_nm: Option<f64>,
    last_nm: Option<f64>,
    points: Option<usize>,
    quantity: Option<&'static str>,
}

impl From<&ReadSpectrum> for SpectrumRecord {
    fn from(read: &ReadSpectrum) -> Self {
        Self {
            name: read.name.clone(),
            peak_nm: read.peak_nm,
            fwhm_nm: read.fwhm_nm,
            first_nm: read.first_nm,
            last_nm: read.last_nm,
            points: read.points,
            quantity: read.quantity,
        }
    }
}

impl From<&Reading> for FileRecord {
    fn from(reading: &Reading) -> Self {
        Self {
            file: reading.file.clone(),
            outcome: reading.outcome.key(),
            spectra: reading.spectra.iter().map(SpectrumRecord::from).collect(),
            assumptions: reading.assumptions.clone(),
            warnings: reading.warnings.clone(),
            questions: reading.questions.iter().map(files::question).collect(),
            message: reading.message.clone(),
        }
    }
}

/// Runs the command.
pub(super) fn run(args: &ReadArgs) -> Exit {
    let mut exit = Exit::Done;
    let mut records = Vec::with_capacity(args.files.len());
    for path in &args.files {
        let reading = files::read(path, &args.answers);
        exit = exit.max(files::explain(&reading));
        records.push(FileRecord::from(&reading));
    }
    if args.output.json {
        output::json(&records);
    } else {
        for record in &records {
            print(record);
        }
    }
    exit
}

fn print(record: &FileRecord) {
    output::text(&format!("{}: {}", record.file, record.outcome));
    if !record.spectra.is_empty() {
        let mut table =
            Table::new(&["  spectrum", "peak nm", "FWHM nm", "from nm", "to nm", "points", "quantity"]);
        for s in &record.spectra {
            table.row([
                format!("  {}", s.name),
                cell(s.peak_nm, 2),
                cell(s.fwhm_nm, 2),
                cell(s.first_nm, 2),
                cell(s.last_nm, 2),
                s.points.map_or_else(|| "–".to_owned(), |p| p.to_string()),
                s.quantity.unwrap_or("–").to_owned(),
            ]);
        }
        output::text(&table.to_string());
    }
    for (kind, sentences) in [("assumed", &record.assumptions), ("warning", &record.warnings)] {
        for sentence in sentences {
            output::text(&format!("  {kind}: {sentence}"));
        }
    }
}
