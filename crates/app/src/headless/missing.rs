//! `missing`: which emitter to add.

use super::answer::AnswerRecord;
use super::args::{SolvingArgs, TargetArgs};
use super::asking::{Loaded, Stopped, finish, load_for, timed};
use super::output::{self, Table, cell};
use super::{Exit, numbers};
use clap::Args;
use colour::shapes::Shape;
use colour::{Tensor, TensorSet};
use optimiser::{Control, Trial};
use serde::Serialize;

/// Peaks and widths tried.
const PEAKS: usize = 40;
const WIDTHS: usize = 15;

/// Find the emitter that would help most: a map over peak and width, and the best three proposals
#[derive(Debug, Args)]
pub struct MissingArgs {
    /// The target.
    #[command(flatten)]
    pub target: TargetArgs,
    /// Peaks to try, nm
    #[arg(long, value_name = "NM..NM", default_value = "420..680", value_parser = numbers::span)]
    pub peaks: (f64, f64),
    /// Full widths at half maximum to try, nm
    #[arg(long, value_name = "NM..NM", default_value = "15..100", value_parser = numbers::span)]
    pub widths: (f64, f64),
    /// Optical watts per electrical watt of the added emitter; without it, the mean of --wall-plug
    #[arg(long, value_name = "F", value_parser = numbers::fraction)]
    pub added_wall_plug: Option<f64>,
    /// Everything else.
    #[command(flatten)]
    pub solving: SolvingArgs,
}

/// The map and the proposals.
#[derive(Debug, Default, Serialize)]
struct MissingRecord {
    without: Option<AnswerRecord>,
    peaks_nm: Vec<f64>,
    widths_nm: Vec<f64>,
    /// One row a width, one number a peak; null where no blend meets the limits.
    map: Vec<Vec<Option<f64>>>,
    proposals: Vec<ProposalRecord>,
    seconds: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    message: Option<String>,
}

/// One proposal; the added emitter is the last of `shares`.
#[derive(Debug, Serialize)]
struct ProposalRecord {
    peak_nm: f64,
    fwhm_nm: f64,
    #[serde(flatten)]
    answer: AnswerRecord,
}

/// Runs the command.
pub(super) fn run(args: &MissingArgs) -> Exit {
    finish(missing(args), args.solving.output.json, |message| MissingRecord {
        message: Some(message),
        ..MissingRecord::default()
    })
}

fn steps((low, high): (f64, f64), count: usize) -> Vec<f64> {
    if low == high {
        return vec![low];
    }
    (0..count).map(|k| low + (high - low) * k as f64 / (count - 1) as f64).collect()
}

fn gaussian(peak_nm: f64, fwhm_nm: f64) -> Vec<f64> {
    // Peaks and widths are above zero; a curve with nothing between 380 and 780 nm is dark and helps nobody.
    Shape::GaussianNm { peak_nm, fwhm_nm }.colour_grid().unwrap_or_else(|_| vec![0.0; colour::GRID_POINTS])
}

fn missing(args: &MissingArgs) -> Result<Exit, Stopped> {
    let loaded = load_for(&args.solving)?;
    let white = args.solving.limits.spec(args.target.cct, args.target.duv);
    let problem = loaded.problem(&white, args.solving.budget)?;
    let plugs = &loaded.wall_plug;
    let mean = if plugs.is_empty() { 1.0 } else { plugs.iter().sum::<f64>() / plugs.len() as f64 };
    let trial = Trial {
        peaks_nm: steps(args.peaks, PEAKS),
        widths_nm: steps(args.widths, WIDTHS),
        shapes: vec![("gaussian", &gaussian)],
        wall_plug: args.added_wall_plug.unwrap_or(mean),
    };
    let (found, seconds) = timed("arguments", || optimiser::missing(&problem, &trial, &Control::none()))?;
    let proposals = found.best.iter().map(|proposal| {
        let with = with_added(&loaded, proposal.peak_nm, proposal.width_nm, trial.wall_plug);
        ProposalRecord {
            peak_nm: proposal.peak_nm,
            fwhm_nm: proposal.width_nm,
            answer: with.asked(&white).record(&proposal.outcome, None),
        }
    });
    let record = MissingRecord {
        proposals: proposals.collect(),
        without: Some(loaded.asked(&white).record(&found.without, None)),
        map: found.map.chunks(trial.peaks_nm.len()).map(<[Option<f64>]>::to_vec).collect(),
        peaks_nm: trial.peaks_nm.clone(),
        widths_nm: trial.widths_nm.clone(),
        seconds: Some(seconds),
        message: None,
    };
    if args.solving.output.json {
        output::json(&record);
    } else {
        print(&record);
    }
    Ok(if record.proposals.iter().any(|p| p.answer.is_optimal()) { Exit::Done } else { Exit::No })
}

/// The emitters with a Gaussian more.
fn with_added(loaded: &Loaded, peak_nm: f64, fwhm_nm: f64, wall_plug: f64) -> Loaded {
    let mut sources = loaded.sources.clone();
    let grid = gaussian(peak_nm, fwhm_nm);
    let mut tensors: Vec<Tensor> = (0..sources.len()).map(|i| sources.tensors.tensor(i)).collect();
    tensors.push(Tensor::of_grid(&grid));
    sources.tensors = TensorSet::new(&tensors);
    sources.grids.push(grid);
    sources.names.push(format!("added {peak_nm:.1} nm"));
    let mut plugs = loaded.wall_plug.clone();
    if !plugs.is_empty() {
        plugs.push(wall_plug);
    }
    Loaded { sources, wall_plug: plugs }
}

fn print(record: &MissingRecord) {
    let without = record.without.as_ref().and_then(|w| w.objective);
    output::text(&format!("without an added emitter: {}", cell(without, 3)));
    let mut table = Table::new(&["add peak nm", "FWHM nm", "objective", "gain", "share %"]);
    for proposal in &record.proposals {
        let gain = proposal.answer.objective.zip(without).map(|(with, without)| with - without);
        let share = proposal.answer.shares.as_ref().and_then(|s| s.last()).map(|s| 100.0 * s);
        table.row([
            cell(Some(proposal.peak_nm), 1),
            cell(Some(proposal.fwhm_nm), 1),
            cell(proposal.answer.objective, 3),
            cell(gain, 3),
            cell(share, 2),
        ]);
    }
    output::text(&table.to_string());
}
