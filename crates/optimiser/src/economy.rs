//! What each emitter and each limit is worth, by solving again.

use crate::answer::Outcome;
use crate::problem::{Control, Metric, Problem, ProblemError};
use crate::solve::solve;
use rayon::prelude::*;

/// The answer without one emitter.
#[derive(Clone, Debug, PartialEq)]
pub struct Dropped {
    /// The emitter left out, from 0.
    pub emitter: usize,
    /// The answer without it (shares over the whole set, 0 for the one left out).
    pub outcome: Outcome,
    /// What leaving it out costs: objective with it − without it; None when there is no blend without it.
    pub price: Option<f64>,
}

/// The problem's own answer and the answer without each emitter in turn.
///
/// # Errors
/// As [`solve`].
pub fn drop_each(problem: &Problem, control: &Control<'_>) -> Result<(Outcome, Vec<Dropped>), ProblemError> {
    let whole = solve(problem, control)?;
    let n = problem.emitters.len();
    let dropped: Result<Vec<Dropped>, ProblemError> = (0..n)
        .into_par_iter()
        .map(|emitter| {
            let mut p = problem.clone();
            if p.bounds.is_empty() {
                p.bounds = vec![(0.0, 1.0); n];
            }
            p.bounds[emitter] = (0.0, 0.0);
            let outcome = solve(&p, control)?;
            let price = match (whole.solution(), outcome.solution()) {
                (Some(with), Some(without)) => Some(with.objective - without.objective),
                _ => None,
            };
            Ok(Dropped { emitter, outcome, price })
        })
        .collect();
    Ok((whole, dropped?))
}

/// What a step of one requirement costs.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Requirement {
    /// One point of a rendering metric (or one lm/W) more at the low end of its range.
    Low(Metric),
    /// One point less at the high end of its range.
    High(Metric),
    /// The white moved up by 0.001 of Duv.
    Duv,
    /// The white moved up by 1 % of its CCT.
    Cct,
}

/// A shadow price, by differences of solved problems.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Price {
    /// What is moved.
    pub of: Requirement,
    /// Change of the objective for one step of it: one point harder, 0.001 of Duv, 1 % of CCT. 0 where the limit does not bind.
    pub per_step: f64,
    /// The same measured on the easier side, where that could be solved; the two differ where something else begins to bind.
    pub easier_side: Option<f64>,
    /// The same measured on the harder side; None when one small step harder leaves no blend.
    pub harder_side: Option<f64>,
}

/// Shadow prices of every limit, of Duv and of CCT at the problem's answer; empty when there is none.
///
/// Each is the difference quotient of two solved problems a small step apart (0.05 points, 5e-5 of Duv, 0.05 % of CCT).
///
/// # Errors
/// As [`solve`].
pub fn prices(problem: &Problem, control: &Control<'_>) -> Result<Vec<Price>, ProblemError> {
    let Some(here) = solve(problem, control)?.solution().cloned() else { return Ok(Vec::new()) };
    let mut asked = Vec::new();
    for (metric, range) in problem.limits.active() {
        if range.low.is_some() {
            asked.push(Requirement::Low(metric));
        }
        if range.high.is_some() {
            asked.push(Requirement::High(metric));
        }
    }
    asked.push(Requirement::Duv);
    asked.push(Requirement::Cct);
    const PART: f64 = 0.05;
    asked
        .par_iter()
        .map(|&of| {
            let value = |by: f64| -> Result<Option<f64>, ProblemError> {
                let mut p = problem.clone();
                p.budget.boxes = 0;
                match of {
                    Requirement::Low(m) => {
                        let mut r = p.limits.get(m);
                        r.low = r.low.map(|l| l + by);
                        p.limits.set(m, r);
                    }
                    Requirement::High(m) => {
                        let mut r = p.limits.get(m);
                        r.high = r.high.map(|h| h - by);
                        p.limits.set(m, r);
                    }
                    Requirement::Duv => p.target.duv += 1e-3 * by,
                    Requirement::Cct => p.target.cct_k *= 1.0 + 0.01 * by,
                }
                if p.check().is_err() {
                    return Ok(None);
                }
                Ok(crate::solve::best_objective(&p, &here.shares, control))
            };
            let harder = value(PART)?.map(|v| (v - here.objective) / PART);
            let easier = value(-PART)?.map(|v| (here.objective - v) / PART);
            let per_step = match (harder, easier) {
                (Some(a), Some(b)) => 0.5 * (a + b),
                (Some(a), None) | (None, Some(a)) => a,
                (None, None) => 0.0,
            };
            Ok(Price { of, per_step, easier_side: easier, harder_side: harder })
        })
        .collect()
}
