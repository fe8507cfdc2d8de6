//! Why there is no blend, and the way out.
//!
//! In this order: can the white be made at all; how far can each limit alone be met; do the limits together exclude every blend; which blend comes
//! nearest and by how much it is short; which single limit, moved how far, opens the problem.

use crate::answer::{Infeasible, Nearest, Reachable, Relaxation, Shortfall};
use crate::ask::{Wanted, participants};
use crate::branch::gap_at;
use crate::fixed::{Found, Plan, shortfalls, solve_at, values_of};
use crate::gamut::Gamut;
use crate::problem::{Control, Metric, Problem};
use crate::space::NoSpace;
use crate::tcs::xyz2;
use colour::locus::cct_duv;
use colour::{Reference, Uv};

/// Shares of all emitters from shares of those that take part.
pub(crate) fn spread(shares: &[f64], used: &[usize], all: usize) -> Vec<f64> {
    let mut out = vec![0.0; all];
    for (&i, s) in used.iter().zip(shares) {
        out[i] = *s;
    }
    out
}

/// The answer when the white lies outside what the emitters (within their bounds) can make.
pub(crate) fn outside(problem: &Problem, region: &[[f64; 2]]) -> Infeasible {
    let (used, tensors, bounds) = participants(problem);
    let xyz: Vec<[f64; 3]> = tensors.iter().map(xyz2).collect();
    let all = problem.emitters.len();
    let gamut = if used.is_empty() { None } else { Gamut::new(&xyz, &bounds) };
    let Some(gamut) = gamut else {
        return Infeasible {
            nearest: Nearest {
                shares: vec![1.0 / all as f64; all],
                u: f64::NAN,
                v: f64::NAN,
                distance_uv1960: f64::INFINITY,
                cct_k: None,
                duv: None,
                shortfalls: Vec::new(),
                values: None,
            },
            reachable: Vec::new(),
            relaxations: Vec::new(),
            explanation: "The share bounds admit no blend that gives light: the lower bounds must sum to at most 1, the upper \
                          bounds to at least 1."
                .to_owned(),
            proven: true,
            boxes: 0,
            stopped_by: None,
        };
    };
    let near = gamut.nearest_to_polygon(region, &xyz);
    let uv = Uv { u: near.uv[0], v: near.uv[1] };
    let white = cct_duv(uv);
    let place = white.map_or_else(String::new, |w| format!(" ({:.0} K, Duv {:+.4})", w.cct_k, w.duv));
    let shares = spread(&near.shares, &used, all);
    // The limits are judged there too, where the white has a reference at all.
    let values = white.map(|w| values_of(problem, &shares, &Reference::at(w.cct_k)));
    let short = values.as_ref().map_or_else(Vec::new, |v| shortfalls(problem, v, 1e-6));
    let why = if problem.bounds.iter().any(|b| *b != (0.0, 1.0)) { " within their share bounds" } else { "" };
    Infeasible {
        nearest: Nearest {
            shares,
            u: near.uv[0],
            v: near.uv[1],
            distance_uv1960: near.distance,
            cct_k: white.map(|w| w.cct_k),
            duv: white.map(|w| w.duv),
            shortfalls: short,
            values,
        },
        reachable: Vec::new(),
        relaxations: Vec::new(),
        explanation: format!(
            "The white is outside what these emitters can mix{why}: the nearest white they make{place} is {:.4} away in CIE 1960 uv.",
            near.distance
        ),
        proven: true,
        boxes: 0,
        stopped_by: None,
    }
}

/// Explains why a fixed-white problem has no blend.
pub(crate) fn explain(
    problem: &Problem,
    white: Uv,
    reference: &Reference,
    found: &Result<Found, NoSpace>,
    plan: Plan,
    control: &Control<'_>,
) -> Infeasible {
    if matches!(found, Err(NoSpace::White)) {
        return outside(problem, &[[white.u, white.v]]);
    }
    let all = problem.emitters.len();
    let (mut boxes, mut stopped_by) = (0, None);
    let mut proven = true;
    let mut nearest_shares: Option<Vec<f64>> = None;
    if let Ok(f) = found {
        boxes += f.boxes;
        stopped_by = f.stop;
        proven = f.upper == f64::NEG_INFINITY;
        nearest_shares = f.nearest.as_ref().map(|n| f.ask.shares(&n.t));
    }
    // Each limit alone, as far as it goes.
    let side = Plan { boxes: (plan.boxes / 4).min(20_000), ..plan };
    let mut reachable: Vec<Reachable> = Vec::new();
    let mut alone: Option<String> = None;
    for (metric, range) in problem.limits.active() {
        let mut try_sign = |sign: f64| -> Option<Reachable> {
            let mut free = problem.clone();
            free.limits = crate::problem::Limits::default();
            free.rows.clear();
            let wanted = Wanted { metric, sign };
            let (best, upper, shares) = match (metric, sign > 0.0) {
                (Metric::Ler | Metric::Efficacy, false) => {
                    least_efficacy(&free, white, reference, metric, plan, control)?
                }
                _ => {
                    let f = solve_at(&free, white, reference, wanted, false, &[], side, control).ok()?;
                    boxes += f.boxes;
                    let b = f.best.as_ref()?;
                    (sign * b.objective, sign * f.upper, f.ask.shares(&b.t))
                }
            };
            Some(Reachable {
                metric,
                best,
                least: sign < 0.0,
                bound: upper.is_finite().then_some(upper),
                shares,
            })
        };
        // Which end is in the way: the upper one only when the metric's best lies above it or there is no lower one.
        let entry = match (range.low, range.high) {
            (Some(_), Some(high)) => {
                let up = try_sign(1.0);
                match up {
                    Some(r) if r.best > high => {
                        let down = try_sign(-1.0);
                        match down {
                            Some(d) if d.best > high => Some(d),
                            _ => Some(r),
                        }
                    }
                    other => other,
                }
            }
            (None, Some(_)) => try_sign(-1.0),
            _ => try_sign(1.0),
        };
        if let Some(entry) = entry.filter(|e| e.best.is_finite()) {
            // The entry is the end in the way: its greatest value below the range, or its least above it.
            let by = range.excess(entry.best);
            let (word, asked) = if by < 0.0 { ("the most", range.low) } else { ("the least", range.high) };
            let extreme = if by < 0.0 { true } else { entry.least };
            if by.abs() > 1e-6 && extreme && alone.is_none() {
                alone = Some(format!(
                    "{} {:.2} is {word} these emitters reach at this white, whatever the other limits; {:.2} was asked.",
                    metric.title(),
                    entry.best,
                    asked.unwrap_or(f64::NAN)
                ));
            }
            reachable.push(entry);
        }
    }
    // The nearest blend.
    let shares = nearest_shares
        .or_else(|| {
            // only the linear limits stand in the way: the blend that is best for the one that fails
            reachable
                .iter()
                .find(|r| problem.limits.get(r.metric).excess(r.best).abs() > 1e-6)
                .or_else(|| reachable.first())
                .map(|r| r.shares.clone())
        })
        .unwrap_or_else(|| vec![1.0 / all as f64; all]);
    let values = values_of(problem, &shares, reference);
    let short = shortfalls(problem, &values, 1e-6);
    let uv = {
        let x = problem.emitters.blend(&shares).xyz(colour::Observer::Cie1931);
        x.uv()
    };
    let cd = cct_duv(uv);
    let relaxations = relax(problem, white, reference, plan, control, &mut boxes);
    let explanation = alone.unwrap_or_else(|| together(&short, &relaxations));
    Infeasible {
        nearest: Nearest {
            shares,
            u: uv.u,
            v: uv.v,
            distance_uv1960: uv.distance(white),
            cct_k: cd.map(|c| c.cct_k),
            duv: cd.map(|c| c.duv),
            shortfalls: short,
            values: Some(values),
        },
        reachable,
        relaxations,
        explanation,
        proven,
        boxes,
        stopped_by,
    }
}

/// The least LER or efficacy at a white: the greatest cost per lumen is a linear programme of its own.
fn least_efficacy(
    problem: &Problem,
    white: Uv,
    reference: &Reference,
    metric: Metric,
    plan: Plan,
    control: &Control<'_>,
) -> Option<(f64, f64, Vec<f64>)> {
    let f = solve_at(
        problem,
        white,
        reference,
        Wanted { metric, sign: 1.0 },
        false,
        &[],
        plan.unproven(),
        control,
    )
    .ok()?;
    let crate::ask::Aim::LeastCost { c0, c } = &f.ask.aim else { return None };
    let mut lp = crate::simplex::Lp::default();
    lp.begin(&f.ask.space.low, &f.ask.space.high);
    for r in &f.ask.space.rows {
        lp.row(&r.a, r.b);
    }
    let t = if f.ask.space.d == 0 {
        Vec::new()
    } else {
        match lp.maximise(c, f64::NEG_INFINITY) {
            crate::simplex::LpEnd::Optimal(_) => lp.point().to_vec(),
            _ => return None,
        }
    };
    let v = colour::PHOTOPIC_EFFICACY_LM_PER_W / (c0 + crate::space::inner(c, &t));
    Some((v, v, f.ask.shares(&t)))
}

/// For each limit end, the value that opens the problem when the others are kept.
fn relax(
    problem: &Problem,
    white: Uv,
    reference: &Reference,
    plan: Plan,
    control: &Control<'_>,
    boxes: &mut u64,
) -> Vec<Relaxation> {
    let mut out = Vec::new();
    let side = Plan { boxes: (plan.boxes / 8).min(5_000), ..plan };
    for (metric, range) in problem.limits.active() {
        for (lower_end, from) in [(true, range.low), (false, range.high)] {
            let Some(from) = from else { continue };
            let mut free = problem.clone();
            let mut kept = range;
            if lower_end {
                kept.low = None;
            } else {
                kept.high = None;
            }
            free.limits.set(metric, kept);
            let sign = if lower_end { 1.0 } else { -1.0 };
            if matches!(metric, Metric::Ler | Metric::Efficacy) && sign < 0.0 {
                // an upper limit on efficacy is hardly ever what stands in the way; any blend of the others tells
                continue;
            }
            let Ok(f) = solve_at(&free, white, reference, Wanted { metric, sign }, true, &[], side, control)
            else {
                continue;
            };
            *boxes += f.boxes;
            let Some(b) = &f.best else { continue };
            let to = sign * b.objective;
            // nothing to relax when it is not what stands in the way
            if (lower_end && to >= from - gap_at(from, 1e-9))
                || (!lower_end && to <= from + gap_at(from, 1e-9))
            {
                continue;
            }
            out.push(Relaxation { metric, lower_end, from, to, shares: f.ask.shares(&b.t) });
        }
    }
    out
}

fn together(short: &[Shortfall], relaxations: &[Relaxation]) -> String {
    let mut s = String::from("Each limit can be met alone, but no blend meets all of them at this white.");
    if !short.is_empty() {
        let list: Vec<String> = short
            .iter()
            .map(|s| {
                let asked = if s.by < 0.0 { s.range.low } else { s.range.high }.unwrap_or(f64::NAN);
                format!("{} {:.2} of {:.2}", s.metric.title(), s.value, asked)
            })
            .collect();
        s.push_str(&format!(" The nearest blend has {}.", list.join(", ")));
    }
    let ways: Vec<String> = relaxations
        .iter()
        .map(|r| format!("{} {:.2} instead of {:.2}", r.metric.title(), r.to, r.from))
        .collect();
    if !ways.is_empty() {
        s.push_str(&format!(" It would open with {}.", ways.join(", or with ")));
    }
    s
}
