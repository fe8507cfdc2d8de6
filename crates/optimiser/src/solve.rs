//! The front door: one question, one answer.

use crate::answer::{Outcome, Solution};
use crate::ask::Wanted;
use crate::fixed::{Plan, finish, shortfalls, solution_of, solve_at};
use crate::infeasible::explain;
use crate::problem::{Control, Metric, Objective, Problem, ProblemError, Region};
use crate::region::solve_region;
use colour::{Reference, locus::uv_at};

/// Finds the best blend and proves what it is worth.
///
/// At an exact white ([`Region::Point`]) the rendering reference is that of the target CCT (5000 K: daylight). The answer does not depend on
/// the number of threads; only a safety stop in seconds or a cancellation can change it, and is reported.
///
/// # Errors
/// [`ProblemError`] when the question cannot be answered as put (lengths, ranges out of order, a target without a CCT).
pub fn solve(problem: &Problem, control: &Control<'_>) -> Result<Outcome, ProblemError> {
    problem.check()?;
    let plan = Plan::of(problem);
    Ok(match &problem.region {
        Region::Point => at_point(problem, plan, control),
        Region::Box { cct_k, duv } if *cct_k <= 0.0 && *duv <= 0.0 => at_point(problem, plan, control),
        _ => solve_region(problem, plan, control),
    })
}

fn at_point(problem: &Problem, plan: Plan, control: &Control<'_>) -> Outcome {
    let reference = Reference::at(problem.target.cct_k);
    let white = uv_at(problem.target.cct_k, problem.target.duv);
    let found = solve_at(problem, white, &reference, problem.maximise.into(), true, &[], plan, control);
    if let Ok(found) = &found
        && let Some(solution) = solution_of(problem, found, &reference)
        // an Rg that is not defined (an empty hue bin) meets no limit
        && shortfalls(problem, &solution.values, 1e-5).is_empty()
    {
        (control.progress)(1.0);
        return Outcome::Optimal(solution);
    }
    Outcome::Infeasible(explain(problem, white, &reference, &found, plan, control))
}

/// The blend with the most of one metric, the problem's limits kept.
pub(crate) fn most_of(
    problem: &Problem,
    metric: Metric,
    control: &Control<'_>,
) -> Result<Option<Solution>, ProblemError> {
    let objective = match metric {
        Metric::Ler => Some(Objective::Ler),
        Metric::Efficacy => Some(Objective::Efficacy),
        Metric::Ra => Some(Objective::Ra),
        Metric::Rf => Some(Objective::Rf),
        Metric::R9 | Metric::Rg => None,
    };
    if let Some(maximise) = objective {
        let mut p = problem.clone();
        p.maximise = maximise;
        return Ok(solve(&p, control)?.solution().cloned());
    }
    let reference = Reference::at(problem.target.cct_k);
    let white = uv_at(problem.target.cct_k, problem.target.duv);
    let wanted = Wanted { metric, sign: 1.0 };
    let Ok(found) = solve_at(problem, white, &reference, wanted, true, &[], Plan::of(problem), control)
    else {
        return Ok(None);
    };
    Ok(found
        .best
        .as_ref()
        .map(|b| finish(problem, found.ask.shares(&b.t), f64::INFINITY, found.boxes, found.stop, &reference)))
}

/// The objective of a problem's best blend found without proof, warm from shares near it; None when none is found.
pub(crate) fn best_objective(problem: &Problem, near: &[f64], control: &Control<'_>) -> Option<f64> {
    let plan = Plan::of(problem).unproven();
    if !matches!(problem.region, Region::Point) {
        return solve_region(problem, plan, control).solution().map(|s| s.objective);
    }
    let reference = Reference::at(problem.target.cct_k);
    let white = uv_at(problem.target.cct_k, problem.target.duv);
    let warm = [near.to_vec()];
    let found =
        solve_at(problem, white, &reference, problem.maximise.into(), true, &warm, plan, control).ok()?;
    found.best.map(|b| b.objective)
}
