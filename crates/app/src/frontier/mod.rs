//! What a white spec costs: trade-offs, prices, choices and the emitter that is missing, as data for the window.
//!
//! * [`trade()`]: the best lm/W at each level of a rendering metric, the price of each requirement and of each emitter.
//! * [`choose()`]: the best few of all emitters of the project.
//! * [`missing()`]: how the answer improves with one emitter more, over its peak and width.
//! * [`Basis`]: what an answer holds for, so that a stale one can be told.
//! * [`Refusal`]: why there is no blend, and the ways out.
//! * [`contour`]: lines of equal value on a map.
//!
//! All of it runs on a job's thread on a copy of the project; the optimiser does the work.

mod basis;
mod choose;
pub mod contour;
mod missing;
mod refusal;
#[cfg(test)]
mod tests;
mod trade;

pub use basis::Basis;
pub use choose::{Choice, Pick, PickRow, choose, set_edit};
pub use missing::{Missing, Proposal, missing};
pub use refusal::{Refusal, Relax};
pub use trade::{DropLine, Point, PriceLine, Spec, Trade, trade};

use crate::solving::{SetProblem, set_problem};
use project::{EmitterSet, Maximise, Metric, Project, SetId};

/// Boxes of the proof at each point, so that a whole curve stays a matter of seconds.
const BOXES_A_POINT: u64 = 8_000;

/// What is made as large as possible, and in which every price is counted.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Aim {
    /// Luminous efficacy of radiation, lm per optical watt.
    Ler,
    /// Lumens per electrical watt with the wall-plug efficiencies of the emitters.
    Efficacy,
}

impl Aim {
    /// Both.
    pub const ALL: [Self; 2] = [Self::Ler, Self::Efficacy];

    /// The aim that goes with a white spec: the device's efficacy where that is maximised, else that of the radiation.
    pub const fn of(maximise: Maximise) -> Self {
        match maximise {
            Maximise::Efficacy => Self::Efficacy,
            Maximise::Ler | Maximise::Ra | Maximise::Rf => Self::Ler,
        }
    }

    /// The quantity in words.
    pub const fn words(self) -> &'static str {
        match self {
            Self::Ler => "lm per optical watt",
            Self::Efficacy => "lm/W of the device",
        }
    }

    /// As a metric that can be limited.
    pub const fn metric(self) -> Metric {
        match self {
            Self::Ler => Metric::Ler,
            Self::Efficacy => Metric::Efficacy,
        }
    }

    const fn maximise(self) -> Maximise {
        match self {
            Self::Ler => Maximise::Ler,
            Self::Efficacy => Maximise::Efficacy,
        }
    }
}

/// The metrics a curve can be drawn against.
pub const RENDERING: [Metric; 4] = [Metric::Ra, Metric::R9, Metric::Rf, Metric::Rg];

/// The name of a metric as people write it.
pub fn title(metric: Metric) -> &'static str {
    match metric {
        Metric::Efficacy => "device lm/W",
        other => crate::solving::metric(other).title(),
    }
}

/// A number with so many decimals and a true minus sign; never minus nothing.
fn number(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    match text.strip_prefix('-') {
        Some(rest) if rest.chars().all(|c| matches!(c, '0' | '.')) => rest.to_owned(),
        Some(rest) => format!("\u{2212}{rest}"),
        None => text,
    }
}

/// The problem of a set with lm/W as what is maximised.
fn asked(project: &Project, set: SetId, aim: Aim) -> Result<SetProblem, String> {
    let mut project = project.clone();
    for one in project.sets.iter_mut().filter(|one| one.id == set) {
        one.white.maximise = aim.maximise();
    }
    let mut asked = set_problem(&project, set).map_err(|error| error.to_string())?;
    asked.problem.budget.boxes = BOXES_A_POINT;
    Ok(asked)
}

/// Shares of a whole set from shares of the members that took part.
fn whole(set: &EmitterSet, members: &[usize], shares: &[f64]) -> Vec<f64> {
    let mut whole = vec![0.0; set.members.len()];
    for (member, share) in members.iter().zip(shares) {
        whole[*member] = *share;
    }
    // A locked share is left exactly as it is kept.
    for (share, member) in whole.iter_mut().zip(&set.members) {
        if member.locked && member.on {
            *share = member.share;
        }
    }
    whole
}
