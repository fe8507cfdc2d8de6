//! The local search: sequential quadratic programming on the free directions.
//!
//! Each step solves a quadratic programme with the linear rows kept exactly and the rendering limits linearised; one slack
//! variable at a high price keeps it solvable. The Hessian of the Lagrangian is built by damped BFGS (Powell 1978), steps are shortened on the
//! exact penalty, and a second-order correction is tried before shortening.

use crate::ask::{Aim, Ask, Work, scale};
use crate::quadratic::{Qp, QpEnd};
use crate::space::{FreeRow, inner};

/// Where a local search ended.
#[derive(Clone, Debug)]
pub(crate) struct Local {
    pub(crate) t: Vec<f64>,
    /// Objective, natural units.
    pub(crate) objective: f64,
    /// Greatest shortfall of a rendering limit, in scaled units; ≤ [`MET`] when all are met.
    pub(crate) short: f64,
}

/// Scaled shortfall that counts as met. The limits carry a margin inside that is larger.
pub(crate) const MET: f64 = 1e-10;

/// Values and slopes at a point.
#[derive(Clone, Debug)]
pub(crate) struct Point {
    pub(crate) t: Vec<f64>,
    /// What is minimised, scaled to about one.
    pub(crate) f: f64,
    pub(crate) df: Vec<f64>,
    /// Limits, met when not negative, scaled.
    pub(crate) g: Vec<f64>,
    /// Their slopes, one limit after the other.
    pub(crate) dg: Vec<f64>,
}

/// A smooth problem with linear rows that are kept exactly.
pub(crate) trait Smooth {
    /// Variables.
    fn dims(&self) -> usize;
    /// Rows a·t ≤ b.
    fn rows(&self) -> &[FreeRow];
    /// A length over which things change.
    fn extent(&self) -> f64;
    /// Values and slopes.
    fn evaluate(&self, t: &[f64], work: &mut Work) -> Point;
}

/// A compiled fixed-white problem as a smooth one.
pub(crate) struct OfAsk<'a> {
    ask: &'a Ask,
    /// True: only meet the limits, whatever the objective.
    feasibility: bool,
    cost_scale: f64,
}

impl Smooth for OfAsk<'_> {
    fn dims(&self) -> usize {
        self.ask.space.d
    }

    fn rows(&self) -> &[FreeRow] {
        &self.ask.space.rows
    }

    fn extent(&self) -> f64 {
        (0..self.ask.space.d).map(|j| self.ask.space.high[j] - self.ask.space.low[j]).fold(1e-9, f64::max)
    }

    fn evaluate(&self, t: &[f64], work: &mut Work) -> Point {
        let a = self.ask;
        a.at(t, work);
        let d = a.space.d;
        let (f, df) = if self.feasibility {
            (0.0, vec![0.0; d])
        } else {
            match &a.aim {
                Aim::LeastCost { c0, c } => {
                    ((c0 + inner(c, t)) / self.cost_scale, c.iter().map(|c| c / self.cost_scale).collect())
                }
                Aim::Rendering { metric, sign } => {
                    let m = a.model(*metric, work);
                    let s = -sign / self.cost_scale;
                    (s * m.upper, m.grad[..d].iter().map(|g| s * g).collect())
                }
            }
        };
        let (mut g, mut dg) = (Vec::new(), Vec::new());
        for goal in &a.goals {
            let m = a.model(goal.metric, work);
            let s = scale(goal.metric);
            if let Some(low) = goal.low {
                g.push((m.upper - low) / s);
                dg.extend(m.grad[..d].iter().map(|g| g / s));
            }
            if let Some(high) = goal.high {
                g.push((high - m.upper) / s);
                dg.extend(m.grad[..d].iter().map(|g| -g / s));
            }
        }
        Point { t: t.to_vec(), f, df, g, dg }
    }
}

/// Searches a compiled problem from a start inside its polytope.
pub(crate) fn search(ask: &Ask, feasibility: bool, start: &[f64], work: &mut Work) -> Local {
    let cost_scale = match &ask.aim {
        Aim::LeastCost { c0, .. } => c0.abs().max(1e-12),
        Aim::Rendering { metric, .. } => scale(*metric),
    };
    let smooth = OfAsk { ask, feasibility, cost_scale };
    let p = Searcher::new(&smooth).run(start, work);
    ask.at(&p.t, work);
    Local { objective: ask.objective(&p.t, work), short: short(&p), t: p.t }
}

/// The search and its memory.
pub(crate) struct Searcher<'a, S: Smooth> {
    of: &'a S,
    qp: Qp,
    hessian: Vec<f64>,
}

/// Greatest shortfall of a limit.
pub(crate) fn short(p: &Point) -> f64 {
    p.g.iter().fold(0.0, |s: f64, g| s.max(-g))
}

impl<'a, S: Smooth> Searcher<'a, S> {
    pub(crate) fn new(of: &'a S) -> Searcher<'a, S> {
        Searcher { of, qp: Qp::default(), hessian: Vec::new() }
    }

    /// One quadratic programme; `shift` replaces the constraint values (second-order correction).
    fn step(&mut self, p: &Point, g: &[f64], price: f64) -> Option<Vec<f64>> {
        let d = self.of.dims();
        let k = g.len();
        let n = if k > 0 { d + 1 } else { d };
        self.qp.begin(n);
        for i in 0..d {
            for j in 0..d {
                self.qp.matrix[i * n + j] = self.hessian[i * d + j];
            }
            self.qp.linear[i] = p.df[i];
        }
        let mut row = vec![0.0; n];
        if k > 0 {
            self.qp.matrix[d * n + d] = 1e-3 * price;
            self.qp.linear[d] = price;
            row[d] = 1.0;
            self.qp.at_least(&row, 0.0);
            for c in 0..k {
                row[..d].copy_from_slice(&p.dg[c * d..(c + 1) * d]);
                row[d] = 1.0;
                self.qp.at_least(&row, -g[c]);
            }
            row[d] = 0.0;
        }
        for r in self.of.rows() {
            for j in 0..d {
                row[j] = -r.a[j];
            }
            // t is inside; keep a tiny violation by rounding from making the step impossible
            let slack = r.b - inner(&r.a, &p.t);
            self.qp.at_least(&row, -slack.max(0.0));
        }
        (self.qp.solve() == QpEnd::Optimal).then(|| self.qp.x.clone())
    }

    /// Searches from a start inside the polytope.
    pub(crate) fn run(&mut self, start: &[f64], work: &mut Work) -> Point {
        let d = self.of.dims();
        let extent = self.of.extent();
        let mut p = self.of.evaluate(start, work);
        let slope = inner(&p.df, &p.df).sqrt().max(1e-3);
        self.hessian = vec![0.0; d * d];
        for j in 0..d {
            self.hessian[j * d + j] = slope / extent;
        }
        let mut price = 30.0;
        let mut fresh = true;
        let mut stalls = 0;
        for _ in 0..80 {
            let g = p.g.clone();
            let Some(x) = self.step(&p, &g, price) else { break };
            let k = p.g.len();
            let step: Vec<f64> = x[..d].to_vec();
            let size = step.iter().fold(0.0, |m: f64, s| m.max(s.abs()));
            let slack = if k > 0 { x[d].max(0.0) } else { 0.0 };
            let missed = short(&p);
            // multipliers of the rendering limits (the first constraint is the slack's sign)
            let lambda: Vec<f64> = (0..k).map(|c| self.qp.multipliers[c + 1]).collect();
            let wanted = 1.2 * lambda.iter().sum::<f64>();
            if slack > 1e-9 && wanted > 0.9 * price && price < 1e7 && missed > MET {
                price *= 10.0;
            }
            let merit = |p: &Point| p.f + price * short(p);
            let curvature: f64 = (0..d)
                .map(|i| (0..d).map(|j| step[i] * self.hessian[i * d + j] * step[j]).sum::<f64>())
                .sum();
            let predicted = -inner(&p.df, &step) + price * (missed - slack);
            if size < 1e-11 * extent || (predicted.abs() < 1e-11 && curvature < 1e-11) {
                break;
            }
            let here = merit(&p);
            let mut alpha = 1.0;
            let mut next: Option<Point> = None;
            for tries in 0..14 {
                let t: Vec<f64> = p.t.iter().zip(&step).map(|(t, s)| t + alpha * s).collect();
                let q = self.of.evaluate(&t, work);
                let gain = here - merit(&q);
                if gain >= 1e-4 * alpha * predicted.max(0.0) - 1e-15 {
                    next = Some(q);
                    break;
                }
                if tries == 0 && k > 0 {
                    // second-order correction: constraint values at the full step, slopes at the start
                    let corrected: Vec<f64> =
                        (0..k).map(|c| q.g[c] - inner(&p.dg[c * d..(c + 1) * d], &step)).collect();
                    if let Some(y) = self.step(&p, &corrected, price) {
                        let t: Vec<f64> = p.t.iter().zip(&y).map(|(t, s)| t + s).collect();
                        let q = self.of.evaluate(&t, work);
                        if here - merit(&q) >= 1e-4 * predicted.max(0.0) {
                            next = Some(q);
                            break;
                        }
                    }
                }
                alpha *= if tries < 3 { 0.5 } else { 0.2 };
            }
            let Some(q) = next else {
                if fresh {
                    break;
                }
                // start the curvature afresh once
                for i in 0..d {
                    for j in 0..d {
                        self.hessian[i * d + j] = if i == j { slope / extent } else { 0.0 };
                    }
                }
                fresh = true;
                continue;
            };
            let gained = here - merit(&q);
            self.update(&p, &q, &lambda, fresh);
            fresh = false;
            p = q;
            if gained < 1e-9 {
                stalls += 1;
                if stalls >= 3 {
                    break;
                }
            } else {
                stalls = 0;
            }
        }
        self.polish(&mut p, work);
        p
    }

    /// Newton steps back onto limits missed by rounding.
    fn polish(&mut self, p: &mut Point, work: &mut Work) {
        for _ in 0..4 {
            let missed = short(p);
            if missed <= MET || missed > 1e-4 {
                return;
            }
            let aimed: Vec<f64> = p.g.iter().map(|g| g - 1e-11).collect();
            let d = self.of.dims();
            for i in 0..d {
                for j in 0..d {
                    self.hessian[i * d + j] = f64::from(i == j);
                }
            }
            let df = std::mem::replace(&mut p.df, vec![0.0; d]);
            let Some(x) = self.step(p, &aimed, 1e4) else {
                p.df = df;
                return;
            };
            let t: Vec<f64> = p.t.iter().zip(&x).map(|(t, s)| t + s).collect();
            let q = self.of.evaluate(&t, work);
            if short(&q) >= missed {
                p.df = df;
                return;
            }
            *p = q;
        }
    }

    /// Damped BFGS on the Lagrangian.
    fn update(&mut self, p: &Point, q: &Point, lambda: &[f64], fresh: bool) {
        let d = p.t.len();
        let s: Vec<f64> = q.t.iter().zip(&p.t).map(|(a, b)| a - b).collect();
        let of = |x: &Point, j: usize| {
            x.df[j] - lambda.iter().enumerate().map(|(c, l)| l * x.dg[c * d + j]).sum::<f64>()
        };
        let mut y: Vec<f64> = (0..d).map(|j| of(q, j) - of(p, j)).collect();
        let ss = inner(&s, &s);
        if ss < 1e-30 {
            return;
        }
        let sy = inner(&s, &y);
        if fresh && sy > 1e-14 {
            let c = (inner(&y, &y) / sy).clamp(1e-6, 1e6);
            for i in 0..d {
                for j in 0..d {
                    self.hessian[i * d + j] = if i == j { c } else { 0.0 };
                }
            }
        }
        let bs: Vec<f64> = (0..d).map(|i| (0..d).map(|j| self.hessian[i * d + j] * s[j]).sum()).collect();
        let sbs = inner(&s, &bs).max(1e-300);
        if sy < 0.2 * sbs {
            let theta = 0.8 * sbs / (sbs - sy);
            for j in 0..d {
                y[j] = theta * y[j] + (1.0 - theta) * bs[j];
            }
        }
        let sy = inner(&s, &y);
        if sy <= 1e-300 {
            return;
        }
        for i in 0..d {
            for j in 0..d {
                self.hessian[i * d + j] += y[i] * y[j] / sy - bs[i] * bs[j] / sbs;
            }
        }
        for j in 0..d {
            self.hessian[j * d + j] += 1e-9;
        }
    }
}

/// A small deterministic generator (SplitMix64), so that starts never depend on the run.
#[derive(Clone, Debug)]
pub(crate) struct Dice(u64);

impl Dice {
    pub(crate) fn new(seed: u64) -> Dice {
        Dice(seed)
    }

    /// Uniform in [0, 1).
    pub(crate) fn unit(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((z ^ (z >> 31)) >> 11) as f64 / (1u64 << 53) as f64
    }

    /// A random mixture of points (exponential weights, to reach near the corners too).
    pub(crate) fn mixture(&mut self, points: &[Vec<f64>], d: usize) -> Vec<f64> {
        let w: Vec<f64> = points.iter().map(|_| (-(1.0 - self.unit()).ln()).powf(1.5)).collect();
        let sum: f64 = w.iter().sum::<f64>().max(1e-300);
        (0..d).map(|j| points.iter().zip(&w).map(|(p, w)| p[j] * w).sum::<f64>() / sum).collect()
    }
}
