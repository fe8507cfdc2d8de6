//! The front door: one question, one answer.

use crate::answer::Outcome;
use crate::fixed::{Plan, solution_of, solve_at};
use crate::infeasible::explain;
use crate::problem::{Control, Problem, ProblemError, Region};
use colour::{Reference, locus::uv_at};

/// Finds the best blend and proves what it is worth.
///
/// # Errors
/// [`ProblemError`] when the question cannot be answered as put (lengths, ranges out of order, a target without a CCT).
pub fn solve(problem: &Problem, control: &Control<'_>) -> Result<Outcome, ProblemError> {
    problem.check()?;
    let plan = Plan::of(problem);
    match &problem.region {
        Region::Point => Ok(at_point(problem, plan, control)),
        _ => Ok(at_point(problem, plan, control)),
    }
}

fn at_point(problem: &Problem, plan: Plan, control: &Control<'_>) -> Outcome {
    let reference = Reference::at(problem.target.cct_k);
    let white = uv_at(problem.target.cct_k, problem.target.duv);
    let found = solve_at(problem, white, &reference, problem.maximise.into(), true, &[], plan, control);
    if let Ok(found) = &found
        && let Some(solution) = solution_of(problem, found, &reference)
    {
        (control.progress)(1.0);
        return Outcome::Optimal(solution);
    }
    Outcome::Infeasible(explain(problem, white, &reference, &found, plan, control))
}
