//! Frontiers: the best objective at each level of one metric, every point with its own proof.

use crate::answer::{Outcome, Solution};
use crate::problem::{Control, Metric, Problem, ProblemError};
use crate::solve::solve;
use rayon::prelude::*;

/// Which levels to solve at.
#[derive(Clone, Debug, PartialEq)]
pub enum Levels {
    /// These.
    At(Vec<f64>),
    /// So many, spread from where the metric costs nothing to the most it can reach, closer where the curve bends.
    Adaptive(usize),
}

/// One point of a frontier.
#[derive(Clone, Debug, PartialEq)]
pub struct FrontierPoint {
    /// The metric is asked to be at least this.
    pub level: f64,
    /// The answer at that level.
    pub outcome: Outcome,
}

/// The problem with one more floor. A floor the problem already has is kept where it is higher.
fn at_level(problem: &Problem, metric: Metric, level: f64) -> Problem {
    let mut p = problem.clone();
    let mut range = p.limits.get(metric);
    range.low = Some(range.low.map_or(level, |l| l.max(level)));
    p.limits.set(metric, range);
    p
}

fn solve_levels(
    problem: &Problem,
    metric: Metric,
    levels: &[f64],
    control: &Control<'_>,
) -> Result<Vec<FrontierPoint>, ProblemError> {
    levels
        .par_iter()
        .map(|&level| {
            Ok(FrontierPoint { level, outcome: solve(&at_level(problem, metric, level), control)? })
        })
        .collect()
}

/// Solves the problem once a level of `metric`, levels in ascending order in the answer.
///
/// # Errors
/// As [`solve`]; a level that is not finite or above the metric's own upper limit is one too.
pub fn frontier(
    problem: &Problem,
    metric: Metric,
    levels: &Levels,
    control: &Control<'_>,
) -> Result<Vec<FrontierPoint>, ProblemError> {
    problem.check()?;
    match levels {
        Levels::At(levels) => {
            let mut levels = levels.clone();
            levels.sort_by(f64::total_cmp);
            solve_levels(problem, metric, &levels, control)
        }
        Levels::Adaptive(count) => adaptive(problem, metric, (*count).max(2), control),
    }
}

/// The most a metric can reach with the problem's other limits kept, where it can be told.
pub fn most(
    problem: &Problem,
    metric: Metric,
    control: &Control<'_>,
) -> Result<Option<Solution>, ProblemError> {
    problem.check()?;
    crate::solve::most_of(problem, metric, control)
}

fn adaptive(
    problem: &Problem,
    metric: Metric,
    count: usize,
    control: &Control<'_>,
) -> Result<Vec<FrontierPoint>, ProblemError> {
    // From the level the unlimited optimum has by itself ...
    let start = solve(problem, control)?;
    let Some(first) = start.solution().cloned() else {
        return Ok(vec![FrontierPoint { level: f64::NEG_INFINITY, outcome: start }]);
    };
    let low = first.values.get(metric);
    // ... to the most it can reach.
    let Some(top) = most(problem, metric, control)? else { return Ok(Vec::new()) };
    let high = top.values.get(metric);
    let mut points = vec![FrontierPoint { level: low, outcome: start }];
    if high.is_nan() || low.is_nan() || high <= low + 1e-6 {
        return Ok(points);
    }
    let seed = (count / 3).clamp(2, 9);
    // the very top is reached only to rounding
    let last = high - 1e-6 * high.abs().max(1.0);
    let levels: Vec<f64> = (1..=seed).map(|k| low + (last - low) * k as f64 / seed as f64).collect();
    points.extend(solve_levels(problem, metric, &levels, control)?);
    while points.len() < count && !control.stop() {
        (control.progress)(points.len() as f32 / count as f32);
        // The middle of the spans whose ends a straight line would serve worst: the turn at either end times the span's length.
        let xy: Vec<Option<(f64, f64)>> =
            points.iter().map(|p| p.outcome.solution().map(|s| (p.level, s.objective))).collect();
        let (Some(a), Some(b)) = (xy.iter().flatten().next(), xy.iter().flatten().last()) else { break };
        let (w, h) = ((b.0 - a.0).abs().max(1e-12), (b.1 - a.1).abs().max(1e-12));
        let slope = |i: usize| match (xy.get(i).copied().flatten(), xy.get(i + 1).copied().flatten()) {
            (Some(p), Some(q)) => Some((q.1 - p.1) / h / ((q.0 - p.0) / w).max(1e-12)),
            _ => None,
        };
        let mut marks: Vec<(f64, usize)> = (0..points.len() - 1)
            .map(|i| {
                let span = (points[i + 1].level - points[i].level) / w;
                let turn = |a: Option<f64>, b: Option<f64>| match (a, b) {
                    (Some(a), Some(b)) => (a - b).abs(),
                    _ => 0.0,
                };
                let here = slope(i);
                let before = if i > 0 { turn(slope(i - 1), here) } else { 0.0 };
                let after = turn(here, slope(i + 1));
                (span * span * (1.0 + before + after), i)
            })
            .collect();
        marks.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
        let more = (count - points.len()).min((points.len() / 2).max(1));
        let levels: Vec<f64> =
            marks.iter().take(more).map(|&(_, i)| 0.5 * (points[i].level + points[i + 1].level)).collect();
        if levels.is_empty() {
            break;
        }
        points.extend(solve_levels(problem, metric, &levels, control)?);
        points.sort_by(|a, b| a.level.total_cmp(&b.level));
    }
    Ok(points)
}
