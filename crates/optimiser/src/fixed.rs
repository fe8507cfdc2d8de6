//! The solve at one exact white: starts, local searches, proof.

use crate::answer::{Binding, Grade, Shortfall, Solution, Stop, Values};
use crate::ask::{Aim, Ask, Wanted, Work};
use crate::branch::{Effort, GOAL_GAP, prove};
use crate::local::{Dice, Local, MET, search};
use crate::problem::{Control, Metric, Problem};
use crate::simplex::{Lp, LpEnd};
use crate::space::NoSpace;
use colour::{Reference, Uv, cri::cri, fidelity::fidelity};
use rayon::prelude::*;
use std::time::{Duration, Instant};

/// How hard to look.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Plan {
    /// Random starts beside the fixed ones; None: by the kind of problem.
    pub(crate) starts: Option<usize>,
    /// Boxes of the proof; 0: no proof.
    pub(crate) boxes: u64,
    pub(crate) until: Option<Instant>,
    pub(crate) gap: f64,
}

impl Plan {
    /// The plan of a problem's own budget.
    pub(crate) fn of(problem: &Problem) -> Plan {
        Plan {
            starts: None,
            boxes: problem.budget.boxes,
            until: problem
                .budget
                .seconds
                .map(|s| Instant::now() + Duration::from_secs_f64(s.clamp(0.0, 1e6))),
            gap: GOAL_GAP,
        }
    }

    /// The same without a proof.
    pub(crate) fn unproven(self) -> Plan {
        Plan { boxes: 0, ..self }
    }

    fn effort(&self) -> Effort {
        Effort { boxes: self.boxes, until: self.until, gap: self.gap, floor: f64::NEG_INFINITY, hints: true }
    }
}

/// What a fixed solve found.
#[derive(Clone)]
pub(crate) struct Found {
    pub(crate) ask: Ask,
    /// The best blend that meets everything.
    pub(crate) best: Option<Local>,
    /// The blend with the least shortfall, when none meets everything.
    pub(crate) nearest: Option<Local>,
    /// A proven bound: +∞ unknown, −∞ nothing meets the limits.
    pub(crate) upper: f64,
    pub(crate) boxes: u64,
    pub(crate) stop: Option<Stop>,
}

/// The corner of the polytope that is best for a linear aim, rendering ignored, with the value there.
fn linear_best(ask: &Ask) -> Option<(Vec<f64>, f64)> {
    let Aim::LeastCost { c, .. } = &ask.aim else { return None };
    let mut lp = Lp::default();
    lp.begin(&ask.space.low, &ask.space.high);
    for r in &ask.space.rows {
        lp.row(&r.a, r.b);
    }
    let minus: Vec<f64> = c.iter().map(|c| -c).collect();
    match lp.maximise(&minus, f64::NEG_INFINITY) {
        LpEnd::Optimal(_) => {
            let t = lp.point().to_vec();
            let v = match &ask.aim {
                Aim::LeastCost { c0, c } => {
                    colour::PHOTOPIC_EFFICACY_LM_PER_W / (c0 + crate::space::inner(c, &t))
                }
                Aim::Rendering { .. } => f64::INFINITY,
            };
            Some((t, v))
        }
        _ => None,
    }
}

/// Solves a compiled problem; `warm` are further starts (free coordinates).
pub(crate) fn solve_ask(ask: Ask, warm: &[Vec<f64>], plan: Plan, control: &Control<'_>) -> Found {
    let d = ask.space.d;
    let mut work = Work::default();
    if d == 0 {
        ask.at(&[], &mut work);
        let short = shortness(&ask, &work);
        let local = Local { t: Vec::new(), objective: ask.objective(&[], &work), short };
        let met = short <= MET;
        let upper = if met { local.objective } else { f64::NEG_INFINITY };
        return Found {
            best: met.then(|| local.clone()),
            nearest: (!met).then_some(local),
            upper,
            boxes: 0,
            stop: None,
            ask,
        };
    }
    let linear = linear_best(&ask);
    if ask.goals.is_empty()
        && let Some((t, v)) = &linear
    {
        // nothing but linear conditions: the programme's answer is exact
        let local = Local { t: t.clone(), objective: *v, short: 0.0 };
        return Found { best: Some(local), nearest: None, upper: *v, boxes: 0, stop: None, ask };
    }
    let hard = matches!(ask.aim, Aim::Rendering { .. }) || ask.goals.iter().any(|g| g.high.is_some());
    let count = plan.starts.unwrap_or(if hard { 8 + 2 * d.min(8) } else { 4 + d.min(8) });
    let mut starts: Vec<Vec<f64>> = warm.to_vec();
    let corners = &ask.space.corners;
    if plan.starts != Some(0) || starts.is_empty() {
        starts.extend(linear.iter().map(|(t, _)| t.clone()));
        starts.push(vec![0.0; d]);
        let mut dice = Dice::new(7);
        for _ in 0..count {
            starts.push(dice.mixture(corners, d));
        }
    }
    let run = |t: &Vec<f64>, work: &mut Work| search(&ask, false, t, work);
    let found: Vec<Local> = if starts.len() >= 4 && ask.ces.is_some() {
        starts.par_iter().map_init(Work::default, |w, t| run(t, w)).collect()
    } else {
        starts.iter().map(|t| run(t, &mut work)).collect()
    };
    let mut best: Option<Local> = None;
    let mut nearest: Option<Local> = None;
    for l in found {
        if l.short <= MET {
            if best.as_ref().is_none_or(|b| l.objective > b.objective) {
                best = Some(l);
            }
        } else if nearest.as_ref().is_none_or(|n| l.short < n.short) {
            nearest = Some(l);
        }
    }
    if best.is_none() && !ask.goals.is_empty() {
        // look for any blend that meets the limits
        for t in &starts {
            let l = search(&ask, true, t, &mut work);
            if nearest.as_ref().is_none_or(|n| l.short < n.short) {
                nearest = Some(l.clone());
            }
            if l.short <= MET {
                let again = search(&ask, false, &l.t, &mut work);
                best = Some(if again.short <= MET { again } else { l });
                break;
            }
        }
    }
    if plan.boxes == 0 {
        return Found { ask, best, nearest, upper: f64::INFINITY, boxes: 0, stop: None };
    }
    let proof = prove(&ask, best, plan.effort(), control);
    Found { best: proof.best, nearest, upper: proof.upper, boxes: proof.boxes, stop: proof.stop, ask }
}

fn shortness(ask: &Ask, work: &Work) -> f64 {
    let mut short: f64 = 0.0;
    for g in &ask.goals {
        let v = ask.model(g.metric, work).upper;
        let s = crate::ask::scale(g.metric);
        if let Some(low) = g.low {
            short = short.max((low - v) / s);
        }
        if let Some(high) = g.high {
            short = short.max((v - high) / s);
        }
    }
    short
}

/// Solves at an exact white with a fixed reference.
#[expect(clippy::too_many_arguments, reason = "every caller needs each of them")]
pub(crate) fn solve_at(
    problem: &Problem,
    white: Uv,
    reference: &Reference,
    wanted: Wanted,
    limits: bool,
    warm: &[Vec<f64>],
    plan: Plan,
    control: &Control<'_>,
) -> Result<Found, NoSpace> {
    let ask = Ask::new(problem, white, reference, wanted, limits)?;
    let luminance: Vec<f64> =
        (0..problem.emitters.len()).map(|i| crate::tcs::xyz2(&problem.emitters.tensor(i))[1]).collect();
    let warm: Vec<Vec<f64>> = warm
        .iter()
        .map(|s| ask.free_of(s, &luminance))
        .filter(|t| ask.space.rows.iter().all(|r| crate::space::inner(&r.a, t) <= r.b + 1e-7))
        .collect();
    Ok(solve_ask(ask, &warm, plan, control))
}

/// Every number of a blend against a reference, by the one measuring path.
pub(crate) fn values_of(problem: &Problem, shares: &[f64], reference: &Reference) -> Values {
    let blend = problem.emitters.blend(shares);
    let c = cri(&blend, reference);
    let f = fidelity(&blend, reference);
    let ler = blend.ler_lm_per_w();
    let electrical: f64 = if problem.wall_plug.is_empty() {
        f64::INFINITY
    } else {
        shares.iter().zip(&problem.wall_plug).map(|(s, w)| s / w).sum()
    };
    Values { ra: c.ra, r9: c.r[8], rf: f.rf, rg: f.rg.unwrap_or(f64::NAN), ler, efficacy: ler / electrical }
}

/// Limits a blend misses by more than `tolerance`.
pub(crate) fn shortfalls(problem: &Problem, values: &Values, tolerance: f64) -> Vec<Shortfall> {
    problem
        .limits
        .active()
        .into_iter()
        .filter_map(|(metric, range)| {
            let value = values.get(metric);
            let by = range.excess(value);
            // an undefined Rg meets no limit
            (by.abs() > tolerance || value.is_nan()).then_some(Shortfall { metric, value, range, by })
        })
        .collect()
}

/// What holds a blend: limits without margin and shares at their bounds.
pub(crate) fn held_by(problem: &Problem, shares: &[f64], values: &Values) -> Vec<Binding> {
    let mut held = Vec::new();
    for (metric, range) in problem.limits.active() {
        let v = values.get(metric);
        let tight = if matches!(metric, Metric::Ler | Metric::Efficacy) { 1e-4 } else { 1e-5 };
        if range.low.is_some_and(|l| (v - l).abs() < tight)
            || range.high.is_some_and(|h| (v - h).abs() < tight)
        {
            held.push(Binding::Limit(metric));
        }
    }
    for (i, s) in shares.iter().enumerate() {
        let (lo, hi) = problem.bound(i);
        if s - lo < 1e-9 {
            held.push(Binding::Low(i));
        } else if hi < 1.0 && hi - s < 1e-9 {
            held.push(Binding::High(i));
        }
    }
    let lumens: f64 = values.ler;
    for (k, row) in problem.rows.iter().enumerate() {
        let v: f64 = row.coefficients.iter().zip(shares).map(|(c, s)| c * s).sum::<f64>() / lumens;
        if (v - row.at_most).abs() <= 1e-7 * row.at_most.abs().max(1e-12) {
            held.push(Binding::Row(k));
        }
    }
    held
}

/// Turns a found blend into the public answer.
pub(crate) fn solution_of(problem: &Problem, found: &Found, reference: &Reference) -> Option<Solution> {
    let best = found.best.as_ref()?;
    let shares = found.ask.shares(&best.t);
    Some(finish(problem, shares, found.upper, found.boxes, found.stop, reference))
}

/// Assembles a solution from shares and a bound (+∞ when unknown).
pub(crate) fn finish(
    problem: &Problem,
    shares: Vec<f64>,
    upper: f64,
    boxes: u64,
    stop: Option<Stop>,
    reference: &Reference,
) -> Solution {
    let values = values_of(problem, &shares, reference);
    let objective = values.get(problem.maximise.metric());
    // an exact answer's own bound differs from it by the rounding of two paths only
    let exact = (upper - objective).abs() <= 1e-12 * objective.abs();
    let upper_bound = upper.is_finite().then(|| if exact { objective } else { upper.max(objective) });
    let gap = upper_bound.map(|u| (u - objective) / objective.abs().max(1e-300));
    Solution {
        held_by: held_by(problem, &shares, &values),
        shares,
        objective,
        upper_bound,
        gap,
        grade: Grade::of(gap),
        values,
        reference_cct_k: reference.cct_k(),
        boxes,
        stopped_by: stop,
    }
}
