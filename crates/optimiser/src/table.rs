//! Tunable white: one blend a white, neighbouring rows no further apart than a step.
//!
//! Rows are solved and proven one by one. When the step limit holds by itself that is the answer; otherwise all rows are optimised together, from several starts. The
//! mean of the rows' own bounds bounds the table either way.

use crate::answer::{Grade, Outcome, Solution, Stop};
use crate::ask::{Aim, Ask, Wanted, Work, outward, scale};
use crate::fixed::{finish, held_by};
use crate::local::{MET, Point, Searcher, Smooth, short};
use crate::problem::{Control, Metric, Problem, ProblemError, Target};
use crate::solve::solve;
use crate::space::{FreeRow, inner};
use colour::locus::{cct_duv, uv_at};
use colour::{PHOTOPIC_EFFICACY_LM_PER_W as KM, Reference, Uv};
use rayon::prelude::*;

/// A whole table.
#[derive(Clone, Debug, PartialEq)]
pub struct Table {
    /// One answer a target, in order. With a binding step limit each row's bound is its own, without the step.
    pub rows: Vec<Outcome>,
    /// Mean of the objectives; None when a row has no blend or the step limit cannot be kept.
    pub objective: Option<f64>,
    /// No table of these whites exceeds this mean.
    pub upper_bound: Option<f64>,
    /// (upper bound − objective) / |objective|.
    pub gap: Option<f64>,
    /// What it is worth.
    pub grade: Grade,
    /// Greatest change of a share between neighbouring rows.
    pub greatest_step: f64,
    /// True when the step limit holds the table back.
    pub step_binds: bool,
    /// A sentence when there is no table.
    pub explanation: Option<String>,
    /// Boxes of all proofs.
    pub boxes: u64,
    /// Why a proof ended early, if one did.
    pub stopped_by: Option<Stop>,
}

struct Joint {
    asks: Vec<Ask>,
    /// First variable of each row.
    first: Vec<usize>,
    dims: usize,
    rows: Vec<FreeRow>,
    extent: f64,
    max_step: f64,
    objective_scale: f64,
}

/// Steps are compared in units of this share.
const STEP_SCALE: f64 = 0.1;

impl Joint {
    fn new(asks: Vec<Ask>, max_step: f64, objective_scale: f64) -> Joint {
        let mut first = Vec::new();
        let mut dims = 0;
        for a in &asks {
            first.push(dims);
            dims += a.space.d;
        }
        let mut rows = Vec::new();
        let mut extent: f64 = 1e-9;
        for (a, &at) in asks.iter().zip(&first) {
            for r in &a.space.rows {
                let mut c = vec![0.0; dims];
                c[at..at + a.space.d].copy_from_slice(&r.a);
                rows.push(FreeRow { a: c, b: r.b });
            }
            for j in 0..a.space.d {
                extent = extent.max(a.space.high[j] - a.space.low[j]);
            }
        }
        Joint { asks, first, dims, rows, extent, max_step, objective_scale }
    }

    fn part<'t>(&self, r: usize, t: &'t [f64]) -> &'t [f64] {
        &t[self.first[r]..self.first[r] + self.asks[r].space.d]
    }
}

impl Smooth for Joint {
    fn dims(&self) -> usize {
        self.dims
    }

    fn rows(&self) -> &[FreeRow] {
        &self.rows
    }

    fn extent(&self) -> f64 {
        self.extent
    }

    fn evaluate(&self, t: &[f64], work: &mut Work) -> Point {
        let n = self.dims;
        let count = self.asks.len() as f64;
        let (mut f, mut df) = (0.0, vec![0.0; n]);
        let (mut g, mut dg): (Vec<f64>, Vec<f64>) = (Vec::new(), Vec::new());
        // shares of each row and their slopes
        let mut shares: Vec<(Vec<f64>, Vec<Vec<f64>>)> = Vec::new();
        for (r, a) in self.asks.iter().enumerate() {
            let x = self.part(r, t);
            let (d, at) = (a.space.d, self.first[r]);
            a.at(x, work);
            let s = -1.0 / (count * self.objective_scale);
            match &a.aim {
                Aim::LeastCost { c0, c } => {
                    let cost = c0 + inner(c, x);
                    f += s * KM / cost;
                    for j in 0..d {
                        df[at + j] += -s * KM / (cost * cost) * c[j];
                    }
                }
                Aim::Rendering { metric, sign } => {
                    let m = a.model(*metric, work);
                    let v = outward(*metric, m.upper);
                    // Rf bends against ΔE near zero only
                    let slope = if *metric == Metric::Rf {
                        6.73 / (1.0 + (-(100.0 + 6.73 * m.upper) / 10.0).exp())
                    } else {
                        1.0
                    };
                    f += s * sign * v;
                    for j in 0..d {
                        df[at + j] += s * sign * slope * m.grad[j];
                    }
                }
            }
            for goal in &a.goals {
                let m = a.model(goal.metric, work);
                let s = scale(goal.metric);
                let mut add = |value: f64, sign: f64| {
                    g.push(value / s);
                    let mut row = vec![0.0; n];
                    for j in 0..d {
                        row[at + j] = sign * m.grad[j] / s;
                    }
                    dg.extend(row);
                };
                if let Some(low) = goal.low {
                    add(m.upper - low, 1.0);
                }
                if let Some(high) = goal.high {
                    add(high - m.upper, -1.0);
                }
            }
            let p = a.space.watts(x);
            let sum: f64 = p.iter().sum();
            let share: Vec<f64> = p.iter().map(|w| w / sum).collect();
            let slopes = (0..d)
                .map(|j| {
                    let e = a.space.direction(j);
                    let es: f64 = e.iter().sum();
                    e.iter().zip(&share).map(|(e, s)| (e - s * es) / sum).collect()
                })
                .collect();
            shares.push((share, slopes));
        }
        for r in 0..self.asks.len().saturating_sub(1) {
            let (a, b) = (&shares[r], &shares[r + 1]);
            for i in 0..a.0.len() {
                for sign in [1.0, -1.0] {
                    g.push((self.max_step - sign * (b.0[i] - a.0[i])) / STEP_SCALE);
                    let mut row = vec![0.0; n];
                    for (j, s) in a.1.iter().enumerate() {
                        row[self.first[r] + j] = sign * s[i] / STEP_SCALE;
                    }
                    for (j, s) in b.1.iter().enumerate() {
                        row[self.first[r + 1] + j] = -sign * s[i] / STEP_SCALE;
                    }
                    dg.extend(row);
                }
            }
        }
        Point { t: t.to_vec(), f, df, g, dg }
    }
}

fn greatest_step(rows: &[Vec<f64>]) -> f64 {
    rows.windows(2).flat_map(|w| w[0].iter().zip(&w[1]).map(|(a, b)| (a - b).abs())).fold(0.0, f64::max)
}

/// Solves one blend for each target; shares of neighbouring rows differ by at most `max_step` (None: no limit).
///
/// The problem's own target is not used; its region, if not a point, applies round every target.
///
/// # Errors
/// As [`solve`], for each target.
pub fn table(
    problem: &Problem,
    targets: &[Target],
    max_step: Option<f64>,
    control: &Control<'_>,
) -> Result<Table, ProblemError> {
    let single = |t: &Target| {
        let mut p = problem.clone();
        p.target = *t;
        p
    };
    for t in targets {
        single(t).check()?;
    }
    let rows: Result<Vec<Outcome>, ProblemError> =
        targets.par_iter().map(|t| solve(&single(t), control)).collect();
    let mut rows = rows?;
    let count = rows.len().max(1) as f64;
    let mut table = Table {
        rows: Vec::new(),
        objective: None,
        upper_bound: None,
        gap: None,
        grade: Grade::BestFound,
        greatest_step: 0.0,
        step_binds: false,
        explanation: None,
        boxes: rows.iter().filter_map(Outcome::solution).map(|s| s.boxes).sum(),
        stopped_by: rows.iter().filter_map(Outcome::solution).find_map(|s| s.stopped_by),
    };
    let solutions: Option<Vec<Solution>> = rows.iter().map(|r| r.solution().cloned()).collect();
    let Some(mut solutions) = solutions else {
        let missing: Vec<String> = rows
            .iter()
            .zip(targets)
            .filter(|(r, _)| r.solution().is_none())
            .map(|(_, t)| format!("{} K", t.cct_k))
            .collect();
        table.explanation = Some(format!("There is no blend at {}.", missing.join(", ")));
        table.rows = rows;
        return Ok(table);
    };
    table.upper_bound = solutions.iter().map(|s| s.upper_bound).sum::<Option<f64>>().map(|u| u / count);
    let shares: Vec<Vec<f64>> = solutions.iter().map(|s| s.shares.clone()).collect();
    table.greatest_step = greatest_step(&shares);
    if let Some(step) = max_step
        && table.greatest_step > step
    {
        table.step_binds = true;
        match jointly(problem, targets, &solutions, step, control) {
            Ok(joint) => {
                for (s, shares) in solutions.iter_mut().zip(joint) {
                    let reference = Reference::at(s.reference_cct_k);
                    let upper = s.upper_bound.unwrap_or(f64::INFINITY);
                    *s = finish(problem, shares, upper, s.boxes, s.stopped_by, &reference);
                    s.held_by = held_by(problem, &s.shares, &s.values);
                }
                let shares: Vec<Vec<f64>> = solutions.iter().map(|s| s.shares.clone()).collect();
                table.greatest_step = greatest_step(&shares);
                rows = solutions.iter().cloned().map(Outcome::Optimal).collect();
            }
            Err(least) => {
                table.explanation = Some(format!(
                    "No table keeps every share within {step} of its neighbour row; the smallest step found is {least:.4}."
                ));
                table.rows = rows;
                return Ok(table);
            }
        }
    }
    let objective = solutions.iter().map(|s| s.objective).sum::<f64>() / count;
    table.objective = Some(objective);
    table.gap = table.upper_bound.map(|u| (u - objective) / objective.abs());
    table.grade = Grade::of(table.gap);
    table.rows = rows;
    Ok(table)
}

/// All rows together; the smallest step reached when the limit cannot be kept.
fn jointly(
    problem: &Problem,
    targets: &[Target],
    alone: &[Solution],
    step: f64,
    control: &Control<'_>,
) -> Result<Vec<Vec<f64>>, f64> {
    let mut asks = Vec::new();
    for (t, s) in targets.iter().zip(alone) {
        // at an exact white the target's own; in a region the white the row found
        let (uv, cct_k) = if matches!(problem.region, crate::problem::Region::Point) {
            (uv_at(t.cct_k, t.duv), t.cct_k)
        } else {
            let uv: Uv = problem.emitters.blend(&s.shares).xyz(colour::Observer::Cie1931).uv();
            (uv, cct_duv(uv).map_or(t.cct_k, |c| c.cct_k))
        };
        match Ask::new(problem, uv, &Reference::at(cct_k), Wanted::from(problem.maximise), true) {
            Ok(a) => asks.push(a),
            Err(_) => return Err(f64::INFINITY),
        }
    }
    let luminance: Vec<f64> =
        (0..problem.emitters.len()).map(|i| crate::tcs::xyz2(&problem.emitters.tensor(i))[1]).collect();
    let own: Vec<Vec<f64>> = asks.iter().zip(alone).map(|(a, s)| a.free_of(&s.shares, &luminance)).collect();
    let mean: f64 = alone.iter().map(|s| s.objective.abs()).sum::<f64>() / alone.len() as f64;
    // the limit is kept with a hair to spare, so that rounding does not break it
    let joint = Joint::new(asks, step - 1e-9, mean.max(1e-9));
    let starts: Vec<Vec<f64>> = [1.0, 0.75, 0.5, 0.25, 0.0]
        .iter()
        .map(|w| own.iter().flat_map(|t| t.iter().map(move |x| w * x)).collect())
        .collect();
    let mut found: Vec<(Point, f64)> = starts
        .par_iter()
        .map_init(Work::default, |work, t| {
            let p = if control.stop() { joint.evaluate(t, work) } else { Searcher::new(&joint).run(t, work) };
            let missed = short(&p);
            (p, missed)
        })
        .collect();
    let best = found
        .iter()
        .enumerate()
        .filter(|(_, (_, s))| *s <= MET.max(1e-9))
        .min_by(|a, b| a.1.0.f.total_cmp(&b.1.0.f))
        .map(|(i, _)| i);
    let shares = |p: &Point| -> Vec<Vec<f64>> {
        joint.asks.iter().enumerate().map(|(r, a)| a.shares(joint.part(r, &p.t))).collect()
    };
    match best {
        Some(i) => Ok(shares(&found.swap_remove(i).0)),
        None => Err(found.iter().map(|(p, _)| greatest_step(&shares(p))).fold(f64::INFINITY, f64::min)),
    }
}
