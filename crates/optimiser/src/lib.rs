//! The blend that meets a white within limits, and what the answer is worth.
//!
//! A [`Problem`] holds emitters, a white, limits, bounds and what to maximise; [`solve`] answers with an [`Outcome`]: a blend with a
//! proven bound, or why there is none and what comes nearest. Same question, same answer, whatever the number of threads.
//!
//! [`unmix`] goes the other way: the shares of known emitters in a measured white.

mod answer;
mod ask;
mod branch;
mod ces;
mod choose;
mod economy;
mod fixed;
mod frontier;
mod gamut;
mod infeasible;
mod lanes;
mod local;
mod missing;
mod models;
mod packages;
mod problem;
#[cfg(test)]
mod properties;
mod quadratic;
mod region;
mod region_proof;
mod simplex;
mod solve;
#[cfg(test)]
mod soundness;
mod space;
mod table;
mod tcs;
pub mod unmix;
mod viewing;

pub use answer::{
    Binding, Grade, Infeasible, Nearest, Outcome, PROVEN_GAP, Reachable, Relaxation, Shortfall, Solution,
    Stop, Values,
};
pub use choose::{Choice, Chosen, MOST_SUBSETS, choose};
pub use economy::{Dropped, Price, Requirement, drop_each, prices};
pub use frontier::{FrontierPoint, Levels, frontier, most};
pub use missing::{Family, Missing, Proposal, Trial, missing};
pub use packages::{MOST_VECTORS, PackageAnswer, PackageChoice, PackageError, packages};
pub use problem::{
    Budget, Control, DEFAULT_BOXES, Limits, LinearRow, MOST_EMITTERS, Metric, Objective, Problem,
    ProblemError, ROUND_SIDES, Range, Region, Target, circle, ellipse,
};
pub use solve::solve;
pub use table::{Table, table};
