//! The missing emitter: how the answer would improve with one more, over peak, width and shape.

use crate::answer::Outcome;
use crate::problem::{Control, Problem, ProblemError};
use crate::solve::{best_objective, solve};
use colour::Tensor;
use colour::tensor::TensorSet;
use rayon::prelude::*;

/// A family of emitters over peak and width, both in nm: the power per nm at 380, 381 … 780 nm.
pub type Family<'a> = &'a (dyn Fn(f64, f64) -> Vec<f64> + Sync);

/// What to try.
#[derive(Clone)]
pub struct Trial<'a> {
    /// Peaks, nm.
    pub peaks_nm: Vec<f64>,
    /// Widths, nm.
    pub widths_nm: Vec<f64>,
    /// Shapes, with a name each.
    pub shapes: Vec<(&'static str, Family<'a>)>,
    /// Wall-plug efficiency assumed for the added emitter (used only with efficacies).
    pub wall_plug: f64,
}

/// One proposal.
#[derive(Clone, Debug, PartialEq)]
pub struct Proposal {
    /// Which shape, by its place in the trial.
    pub shape: usize,
    /// Peak, nm.
    pub peak_nm: f64,
    /// Width, nm.
    pub width_nm: f64,
    /// The full answer with it; the added emitter comes last.
    pub outcome: Outcome,
}

/// The map and the best proposals.
#[derive(Clone, Debug, PartialEq)]
pub struct Missing {
    /// The answer without an added emitter.
    pub without: Outcome,
    /// Objective for each shape, width and peak (shape-major, then width, then peak); None where no blend meets the limits.
    pub map: Vec<Option<f64>>,
    /// Up to three proposals, best first, each the best of its own neighbourhood, refined between the grid's points.
    pub best: Vec<Proposal>,
}

fn with_emitter(problem: &Problem, trial: &Trial<'_>, grid: &[f64]) -> Problem {
    let mut tensors: Vec<Tensor> = (0..problem.emitters.len()).map(|i| problem.emitters.tensor(i)).collect();
    tensors.push(Tensor::of_grid(grid));
    let mut p = problem.clone();
    p.emitters = TensorSet::new(&tensors);
    if !p.bounds.is_empty() {
        p.bounds.push((0.0, 1.0));
    }
    if !p.wall_plug.is_empty() {
        p.wall_plug.push(trial.wall_plug);
    }
    for r in &mut p.rows {
        r.coefficients.push(0.0);
    }
    p
}

/// Tries one more emitter over a grid of peaks, widths and shapes, and refines the best three.
///
/// # Errors
/// As [`solve`].
pub fn missing(problem: &Problem, trial: &Trial<'_>, control: &Control<'_>) -> Result<Missing, ProblemError> {
    problem.check()?;
    let without = solve(problem, control)?;
    let mut near: Vec<f64> = match &without {
        Outcome::Optimal(s) => s.shares.clone(),
        Outcome::Infeasible(i) => i.nearest.shares.clone(),
    };
    near.push(0.0);
    let value = |shape: usize, width: f64, peak: f64| {
        let p = with_emitter(problem, trial, &trial.shapes[shape].1(peak, width));
        best_objective(&p, &near, control)
    };
    let (np, nw) = (trial.peaks_nm.len(), trial.widths_nm.len());
    let cells: Vec<(usize, usize, usize)> = (0..trial.shapes.len())
        .flat_map(|s| (0..nw).flat_map(move |w| (0..np).map(move |p| (s, w, p))))
        .collect();
    let map: Vec<Option<f64>> = cells
        .par_iter()
        .map(|&(s, w, p)| if control.stop() { None } else { value(s, trial.widths_nm[w], trial.peaks_nm[p]) })
        .collect();
    (control.progress)(0.8);
    // The peaks of the map: better than their neighbours.
    let at = |s: usize, w: usize, p: usize| map[(s * nw + w) * np + p].unwrap_or(f64::NEG_INFINITY);
    let mut summits: Vec<(f64, usize, usize, usize)> = cells
        .iter()
        .filter_map(|&(s, w, p)| {
            let v = at(s, w, p);
            let top = v.is_finite()
                && (w.saturating_sub(1)..=(w + 1).min(nw - 1))
                    .flat_map(|w2| (p.saturating_sub(1)..=(p + 1).min(np - 1)).map(move |p2| (w2, p2)))
                    .all(|(w2, p2)| {
                        (w2, p2) == (w, p) || at(s, w2, p2) < v || (at(s, w2, p2) <= v && (w2, p2) > (w, p))
                    });
            top.then_some((v, s, w, p))
        })
        .collect();
    summits.sort_by(|a, b| b.0.total_cmp(&a.0).then((a.1, a.2, a.3).cmp(&(b.1, b.2, b.3))));
    let best: Result<Vec<Proposal>, ProblemError> = summits
        .iter()
        .take(3)
        .collect::<Vec<_>>()
        .par_iter()
        .map(|&&(v, s, w, p)| {
            let gap = |x: &[f64], i: usize| {
                if x.len() < 2 {
                    0.0
                } else {
                    (x[(i + 1).min(x.len() - 1)] - x[i.saturating_sub(1)]).abs() / 2.0
                }
            };
            let range = |x: &[f64]| {
                (x.iter().copied().fold(f64::INFINITY, f64::min), x.iter().copied().fold(0.0, f64::max))
            };
            let (pr, wr) = (range(&trial.peaks_nm), range(&trial.widths_nm));
            let (mut v, mut peak, mut width) = (v, trial.peaks_nm[p], trial.widths_nm[w]);
            let (mut dp, mut dw) = (0.5 * gap(&trial.peaks_nm, p), 0.5 * gap(&trial.widths_nm, w));
            for _ in 0..24 {
                if (dp < 0.02 && dw < 0.02) || control.stop() {
                    break;
                }
                let mut moved = false;
                for (a, b) in [(dp, 0.0), (-dp, 0.0), (0.0, dw), (0.0, -dw)] {
                    let (x, y) = ((peak + a).clamp(pr.0, pr.1), (width + b).clamp(wr.0, wr.1));
                    if (x, y) == (peak, width) {
                        continue;
                    }
                    if let Some(u) = value(s, y, x)
                        && u > v
                    {
                        (v, peak, width, moved) = (u, x, y, true);
                        break;
                    }
                }
                if !moved {
                    dp *= 0.5;
                    dw *= 0.5;
                }
            }
            let q = with_emitter(problem, trial, &trial.shapes[s].1(peak, width));
            Ok(Proposal { shape: s, peak_nm: peak, width_nm: width, outcome: solve(&q, control)? })
        })
        .collect();
    let mut best = best?;
    best.sort_by(|a, b| {
        let v = |p: &Proposal| p.outcome.solution().map_or(f64::NEG_INFINITY, |s| s.objective);
        v(b).total_cmp(&v(a))
    });
    (control.progress)(1.0);
    Ok(Missing { without, map, best })
}
