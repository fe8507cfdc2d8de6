//! The commands that need no window: arguments in, documented JSON or a readable table out.
//!
//! Results go to the output stream, sentences to the error stream. The exit code is 0 when the work is done, 1 when
//! the answer is "no" (an infeasible white, an open question) and 2 for bad input; several files end with the worst.
//! The keys are documented in `docs/headless.md`.

mod answer;
mod args;
mod asking;
mod choose;
mod correct;
mod drop;
mod exit;
mod files;
mod frontier;
mod measure;
mod missing;
mod numbers;
mod output;
mod packages;
mod prices;
mod read;
pub(crate) mod recipe;
mod report;
mod solve;
mod table;
mod usage;

pub use args::{
    AnswerArgs, AxisAnswer, BudgetArgs, DecimalAnswer, EmitterArgs, LimitArgs, MaximiseChoice, MetricChoice,
    OrdinateAnswer, OutputArgs, PerAnswer, SolvingArgs, TargetArgs,
};
pub use choose::ChooseArgs;
pub use correct::CorrectArgs;
pub use drop::DropArgs;
pub use exit::{BadInput, Exit};
pub use frontier::FrontierArgs;
pub use measure::MeasureArgs;
pub use missing::MissingArgs;
pub use packages::PackagesArgs;
pub use prices::PricesArgs;
pub use read::ReadArgs;
pub use recipe::RecipeArgs;
pub use report::ReportArgs;
pub use solve::SolveArgs;
pub use table::TableArgs;

use crate::window::{self, Renderer};
use clap::{Parser, Subcommand};
use std::{ffi::OsString, path::PathBuf, process::ExitCode};

/// White light sources from measured emitters: blend weights with proof, a ledger and a recipe.
///
/// Without a command the window opens, on the demonstration project or on what is named.
#[derive(Debug, Parser)]
#[command(name = "whitesmith", version, args_conflicts_with_subcommands = true)]
pub struct Cli {
    /// What to do without a window
    #[command(subcommand)]
    pub command: Option<Command>,
    /// A project, or spectra files, to open in the window
    #[arg(value_name = "PROJECT | FILES")]
    pub open: Vec<PathBuf>,
    /// What draws the window
    #[arg(long, value_enum, default_value_t)]
    pub renderer: Renderer,
}

/// The headless commands.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// See [`ReadArgs`].
    Read(ReadArgs),
    /// See [`MeasureArgs`].
    Measure(MeasureArgs),
    /// See [`SolveArgs`].
    Solve(Box<SolveArgs>),
    /// See [`FrontierArgs`].
    Frontier(Box<FrontierArgs>),
    /// See [`ChooseArgs`].
    Choose(Box<ChooseArgs>),
    /// See [`TableArgs`].
    Table(Box<TableArgs>),
    /// See [`PackagesArgs`].
    Packages(Box<PackagesArgs>),
    /// See [`MissingArgs`].
    Missing(Box<MissingArgs>),
    /// See [`DropArgs`].
    Drop(Box<DropArgs>),
    /// See [`PricesArgs`].
    Prices(Box<PricesArgs>),
    /// See [`RecipeArgs`].
    Recipe(RecipeArgs),
    /// See [`ReportArgs`].
    Report(ReportArgs),
    /// See [`CorrectArgs`].
    Correct(CorrectArgs),
}

/// Runs the program with its arguments (the first is its own name) and returns its exit code.
pub fn run<I, T>(arguments: I) -> ExitCode
where
    I: IntoIterator<Item = T>,
    T: Into<OsString> + Clone,
{
    let arguments: Vec<OsString> = arguments.into_iter().map(Into::into).collect();
    match Cli::try_parse_from(&arguments) {
        Ok(Cli { command: Some(command), .. }) => perform(&command).into(),
        Ok(cli) => window::open(&cli.open, cli.renderer),
        Err(error) => usage::answer(&error, &arguments).into(),
    }
}

fn perform(command: &Command) -> Exit {
    match command {
        Command::Read(args) => read::run(args),
        Command::Measure(args) => measure::run(args),
        Command::Solve(args) => solve::run(args),
        Command::Frontier(args) => frontier::run(args),
        Command::Choose(args) => choose::run(args),
        Command::Table(args) => table::run(args),
        Command::Packages(args) => packages::run(args),
        Command::Missing(args) => missing::run(args),
        Command::Drop(args) => drop::run(args),
        Command::Prices(args) => prices::run(args),
        Command::Recipe(args) => recipe::run(args),
        Command::Report(args) => report::run(args),
        Command::Correct(args) => correct::run(args),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use clap::CommandFactory;

    #[test]
    fn the_argument_definitions_are_sound() {
        Cli::command().debug_assert();
    }

    #[test]
    fn negative_numbers_are_values_in_both_forms() {
        for duv in [vec!["--duv", "-0.002"], vec!["--duv=-0.002"]] {
            let mut line =
                vec!["whitesmith", "solve", "--emitters", "a.csv", "--cct", "3000", "--r9", "-20..30"];
            line.extend(duv);
            let cli = Cli::try_parse_from(line).unwrap();
            let Some(Command::Solve(args)) = cli.command else { panic!("solve") };
            assert_eq!(args.target.duv, -0.002);
            assert_eq!(args.solving.limits.r9, Some(project::Limit::between(-20.0, 30.0)));
        }
    }
}
