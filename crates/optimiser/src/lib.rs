//! The blend that meets a white within limits, and what the answer is worth.
//!
//! A [`Problem`] holds emitters, a white, limits, bounds and what to maximise; [`solve`] answers with an [`Outcome`]: a blend with a
//! proven bound, or why there is none and what comes nearest. Same question, same answer, whatever the number of threads.

mod answer;
mod ask;
mod branch;
mod ces;
mod fixed;
mod gamut;
mod infeasible;
mod lanes;
mod local;
mod models;
mod problem;
mod quadratic;
mod simplex;
mod solve;
mod space;
mod tcs;

pub use answer::{
    Binding, Grade, Infeasible, Nearest, Outcome, PROVEN_GAP, Reachable, Relaxation, Shortfall, Solution,
    Stop, Values,
};
pub use problem::{
    Budget, Control, DEFAULT_BOXES, Limits, LinearRow, Metric, Objective, Problem, ProblemError, ROUND_SIDES,
    Range, Region, Target, circle, ellipse,
};
pub use solve::solve;
