//! Arguments that several commands share.

use super::numbers;
use clap::{Args, ValueEnum};
use project::{Limit, Limits, Maximise, Metric, Region, WhiteSpec};
use std::path::PathBuf;

/// How the answer is printed.
#[derive(Debug, Clone, Copy, Args)]
pub struct OutputArgs {
    /// Print documented JSON keys instead of a table
    #[arg(long)]
    pub json: bool,
}

/// Unit of the spectral axis.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum AxisAnswer {
    /// Nanometres
    Nm,
    /// Micrometres
    Um,
    /// Ångström
    Angstrom,
    /// Metres
    M,
    /// Wavenumber per centimetre
    #[value(name = "cm-1")]
    PerCm,
    /// Electronvolts
    Ev,
}

/// What the ordinate counts.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum OrdinateAnswer {
    /// Radiant power
    Power,
    /// Photons
    Photons,
}

/// What the ordinate is a density over.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum PerAnswer {
    /// Per nanometre
    Nm,
    /// Per electronvolt
    Ev,
    /// Per wavenumber
    #[value(name = "cm-1")]
    PerCm,
}

/// The decimal mark.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum DecimalAnswer {
    /// A point
    Point,
    /// A comma
    Comma,
}

/// Answers to the questions a reader may ask; they apply to every file of the command.
#[derive(Debug, Clone, Default, Args)]
#[command(next_help_heading = "Answers to a reader's questions")]
pub struct AnswerArgs {
    /// Unit of the spectral axis
    #[arg(long, value_enum, value_name = "UNIT")]
    pub axis: Option<AxisAnswer>,
    /// What the values count
    #[arg(long, value_enum, value_name = "QUANTITY")]
    pub ordinate: Option<OrdinateAnswer>,
    /// What the values are a density over
    #[arg(long, value_enum, value_name = "UNIT")]
    pub per: Option<PerAnswer>,
    /// The decimal mark
    #[arg(long, value_enum, value_name = "MARK")]
    pub decimal: Option<DecimalAnswer>,
    /// Value columns to read, counted from 1 with the axis as column 1
    #[arg(long, value_name = "N,N", value_delimiter = ',', allow_hyphen_values = true, value_parser = numbers::count)]
    pub columns: Option<Vec<usize>>,
    /// First wavelength in nm, for a file without an axis
    #[arg(long, value_name = "NM", requires = "step", allow_hyphen_values = true, value_parser = numbers::positive)]
    pub start: Option<f64>,
    /// Distance between samples in nm, for a file without an axis
    #[arg(long, value_name = "NM", requires = "start", allow_hyphen_values = true, value_parser = numbers::number)]
    pub step: Option<f64>,
}

/// What is to be made as large as possible.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, ValueEnum)]
pub enum MaximiseChoice {
    /// Luminous efficacy of radiation, lm per optical watt
    #[default]
    Ler,
    /// Lumens per electrical watt, with --wall-plug
    Efficacy,
    /// CIE 13.3 Ra
    Ra,
    /// CIE 224 / TM-30 Rf
    Rf,
}

impl From<MaximiseChoice> for Maximise {
    fn from(choice: MaximiseChoice) -> Self {
        match choice {
            MaximiseChoice::Ler => Self::Ler,
            MaximiseChoice::Efficacy => Self::Efficacy,
            MaximiseChoice::Ra => Self::Ra,
            MaximiseChoice::Rf => Self::Rf,
        }
    }
}

/// The emitters a solve starts from.
#[derive(Debug, Clone, Args)]
pub struct EmitterArgs {
    /// Spectra file: wavelength in the first column, one column an emitter
    #[arg(long, value_name = "FILE")]
    pub emitters: PathBuf,
    /// Optical watts per electrical watt, one fraction a column of the file
    #[arg(long, value_name = "F,F", value_delimiter = ',', allow_hyphen_values = true, value_parser = numbers::fraction)]
    pub wall_plug: Option<Vec<f64>>,
}

/// The target chromaticity, for commands that aim at one white.
#[derive(Debug, Clone, Copy, Args)]
pub struct TargetArgs {
    /// Target correlated colour temperature in K
    #[arg(long, value_name = "K", allow_hyphen_values = true, value_parser = numbers::cct_k)]
    pub cct: f64,
    /// Target Duv, signed distance from the Planckian locus in CIE 1960 uv
    #[arg(long, value_name = "D", default_value_t = 0.0, allow_hyphen_values = true, value_parser = numbers::duv)]
    pub duv: f64,
}

/// The limits, the region and what is maximised.
#[derive(Debug, Clone, Args)]
pub struct LimitArgs {
    /// Range of Ra, such as 90..
    #[arg(long, value_name = "RANGE", allow_hyphen_values = true)]
    pub ra: Option<Limit>,
    /// Range of R9, such as 0..30 or -20..0
    #[arg(long, value_name = "RANGE", allow_hyphen_values = true)]
    pub r9: Option<Limit>,
    /// Range of Rf
    #[arg(long, value_name = "RANGE", allow_hyphen_values = true)]
    pub rf: Option<Limit>,
    /// Range of Rg, such as 97..103
    #[arg(long, value_name = "RANGE", allow_hyphen_values = true)]
    pub rg: Option<Limit>,
    /// Range of luminous efficacy of radiation in lm per optical watt
    #[arg(long, value_name = "RANGE", allow_hyphen_values = true)]
    pub ler: Option<Limit>,
    /// Range of efficacy in lm per electrical watt, with --wall-plug
    #[arg(long, value_name = "RANGE", allow_hyphen_values = true)]
    pub efficacy: Option<Limit>,
    /// Where the white may lie: point, box:K,DUV, quadrangle:K, sdcm:N@NAME, circle:N, polygon:u,v;u,v;u,v
    #[arg(long, value_name = "REGION", allow_hyphen_values = true)]
    pub within: Option<Region>,
    /// What to make as large as possible
    #[arg(long, value_enum, value_name = "WHAT", default_value_t)]
    pub maximise: MaximiseChoice,
}

impl LimitArgs {
    /// The limits as the project crate keeps them.
    pub fn limits(&self) -> Limits {
        let given = |limit: Option<Limit>| limit.unwrap_or_default();
        Limits {
            ra: given(self.ra),
            r9: given(self.r9),
            rf: given(self.rf),
            rg: given(self.rg),
            ler: given(self.ler),
            efficacy: given(self.efficacy),
        }
    }

    /// The white spec with these limits round one target.
    pub fn spec(&self, cct_k: f64, duv: f64) -> WhiteSpec {
        WhiteSpec {
            cct_k,
            duv,
            region: self.within.clone().unwrap_or_default(),
            limits: self.limits(),
            maximise: self.maximise.into(),
            lumens: None,
            luminance_cd_per_m2: None,
        }
    }
}

/// A metric that can be limited.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum MetricChoice {
    /// CIE 13.3 Ra
    Ra,
    /// CIE 13.3 R9
    R9,
    /// CIE 224 / TM-30 Rf
    Rf,
    /// TM-30 Rg
    Rg,
    /// Luminous efficacy of radiation
    Ler,
    /// Lumens per electrical watt
    Efficacy,
}

impl From<MetricChoice> for Metric {
    fn from(choice: MetricChoice) -> Self {
        match choice {
            MetricChoice::Ra => Self::Ra,
            MetricChoice::R9 => Self::R9,
            MetricChoice::Rf => Self::Rf,
            MetricChoice::Rg => Self::Rg,
            MetricChoice::Ler => Self::Ler,
            MetricChoice::Efficacy => Self::Efficacy,
        }
    }
}

/// How much work may be spent.
#[derive(Debug, Clone, Copy, Default, Args)]
pub struct BudgetArgs {
    /// Boxes the proof may examine; decides the answer, whatever the machine
    #[arg(long, value_name = "N", allow_hyphen_values = true, value_parser = numbers::boxes)]
    pub budget_boxes: Option<u64>,
    /// Safety stop in seconds, reported as `stopped_by`
    #[arg(long, value_name = "SECONDS", allow_hyphen_values = true, value_parser = numbers::positive)]
    pub budget: Option<f64>,
}

/// Everything the solving commands have in common.
#[derive(Debug, Clone, Args)]
pub struct SolvingArgs {
    /// The emitters.
    #[command(flatten)]
    pub emitters: EmitterArgs,
    /// The limits.
    #[command(flatten)]
    pub limits: LimitArgs,
    /// The budget.
    #[command(flatten)]
    pub budget: BudgetArgs,
    /// The answers.
    #[command(flatten)]
    pub answers: AnswerArgs,
    /// The printing.
    #[command(flatten)]
    pub output: OutputArgs,
}
