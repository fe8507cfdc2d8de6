//! The best k of N emitters.
//!
//! At an exact white every subset has a bound free of rendering: the best of its three-emitter whites. Subsets are taken best bound first; one look at the whole
//! polytope (a linear programme over rendering models) discards most of those that remain, the rest get local searches and a proof against the best
//! found so far. When the bound of the next subset falls to the best found, nothing is left to look at.

use crate::answer::{Infeasible, Outcome, Solution, Stop};
use crate::ask::{Ask, Wanted, participants, white_of};
use crate::branch::{BoxWork, Effort, GOAL_GAP, gap_at, prove, root_bound};
use crate::fixed::{Plan, finish, solve_at};
use crate::infeasible::explain;
use crate::local::{Dice, Local, MET, search};
use crate::problem::{Control, Metric, Problem, ProblemError, Region};
use crate::region::solve_region;
use crate::solve::solve;
use crate::tcs::xyz2;
use colour::locus::uv_at;
use colour::{PHOTOPIC_EFFICACY_LM_PER_W as KM, Reference, Uv};
use rayon::prelude::*;
use std::time::Instant;

/// Subsets looked at one by one at most; beyond, emitters are swapped in and out.
pub const MOST_SUBSETS: u64 = 10_000_000;
const CHUNK: usize = 128;

/// A subset with its best blend.
#[derive(Clone, Debug, PartialEq)]
pub struct Chosen {
    /// Emitters used, from 0, ascending.
    pub emitters: Vec<usize>,
    /// Shares over all emitters.
    pub shares: Vec<f64>,
    /// Value of what is maximised.
    pub objective: f64,
}

/// The answer of a choice.
#[derive(Clone, Debug, PartialEq)]
pub struct Choice {
    /// The best subset's answer, shares over all emitters.
    pub outcome: Outcome,
    /// The emitters it may use, from 0; empty when there is none.
    pub chosen: Vec<usize>,
    /// Other subsets that were solved, best first. Subsets discarded by their bound are not among them.
    pub runners_up: Vec<Chosen>,
    /// Subsets in all.
    pub subsets: u64,
    /// Subsets that reach the white.
    pub reach_white: u64,
    /// Subsets solved or bounded one by one.
    pub examined: u64,
}

fn binomial(n: u64, k: u64) -> u64 {
    if k > n {
        return 0;
    }
    let mut c = 1u128;
    for i in 0..k {
        c = c * u128::from(n - i) / u128::from(i + 1);
        if c > u128::from(u64::MAX) {
            return u64::MAX;
        }
    }
    c as u64
}

/// The objective of every three-emitter white, −∞ where three emitters do not reach it.
struct Triples {
    n: usize,
    value: Vec<f64>,
}

impl Triples {
    fn new(xyz: &[[f64; 3]], white: [f64; 3], cost: &[f64]) -> Triples {
        let n = xyz.len();
        let mut value = Vec::with_capacity(binomial(n as u64, 3) as usize);
        for c in 2..n {
            for b in 1..c {
                for a in 0..b {
                    let m = nalgebra::Matrix3::from_fn(|i, j| xyz[[a, b, c][j]][i]);
                    let v = m
                        .lu()
                        .solve(&nalgebra::Vector3::from(white))
                        .filter(|p| p.iter().all(|x| x.is_finite() && *x >= -1e-10))
                        .map_or(f64::NEG_INFINITY, |p| {
                            KM / (p[0] * cost[a] + p[1] * cost[b] + p[2] * cost[c])
                        });
                    value.push(v);
                }
            }
        }
        Triples { n, value }
    }

    fn at(&self, a: usize, b: usize, c: usize) -> f64 {
        debug_assert!(a < b && b < c && c < self.n);
        self.value[c * (c - 1) * (c - 2) / 6 + b * (b - 1) / 2 + a]
    }

    fn bound(&self, subset: &[usize]) -> f64 {
        let mut best = f64::NEG_INFINITY;
        for k in 2..subset.len() {
            for j in 1..k {
                for i in 0..j {
                    best = best.max(self.at(subset[i], subset[j], subset[k]));
                }
            }
        }
        best
    }
}

fn unpack(mut bits: u64) -> Vec<usize> {
    let mut out = Vec::with_capacity(bits.count_ones() as usize);
    while bits != 0 {
        out.push(bits.trailing_zeros() as usize);
        bits &= bits - 1;
    }
    out
}

struct Tried {
    best: Option<Local>,
    shares: Vec<f64>,
    short: Option<(f64, Vec<f64>)>,
    upper: f64,
    boxes: u64,
    stop: Option<Stop>,
}

struct Chooser<'a> {
    problem: &'a Problem,
    white: Uv,
    reference: &'a Reference,
    used: Vec<usize>,
}

impl Chooser<'_> {
    fn ask(&self, subset: &[usize]) -> Option<(Ask, Vec<usize>)> {
        let ids: Vec<usize> = subset.iter().map(|&i| self.used[i]).collect();
        let p = self.problem.subset(&ids);
        let ask = Ask::new(&p, self.white, self.reference, Wanted::from(self.problem.maximise), true).ok()?;
        Some((ask, ids))
    }

    fn spread(&self, ask: &Ask, ids: &[usize], t: &[f64]) -> Vec<f64> {
        let mut shares = vec![0.0; self.problem.emitters.len()];
        for (&i, s) in ids.iter().zip(ask.shares(t)) {
            shares[i] = s;
        }
        shares
    }

    /// One subset against a value to beat.
    fn attempt(
        &self,
        subset: &[usize],
        floor: f64,
        effort: Effort,
        starts: usize,
        control: &Control<'_>,
        w: &mut BoxWork,
    ) -> Tried {
        let none = |upper| Tried { best: None, shares: Vec::new(), short: None, upper, boxes: 0, stop: None };
        let Some((ask, ids)) = self.ask(subset) else { return none(f64::NEG_INFINITY) };
        let beat = if floor.is_finite() { floor + gap_at(floor, effort.gap) } else { floor };
        let d = ask.space.d;
        if d == 0 || ask.goals.is_empty() {
            let plan = Plan { starts: Some(0), boxes: effort.boxes, until: effort.until, gap: effort.gap };
            let f = crate::fixed::solve_ask(ask, &[], plan, control);
            let shares = f.best.as_ref().map_or_else(Vec::new, |b| self.spread(&f.ask, &ids, &b.t));
            let short = f.nearest.as_ref().map(|n| (n.short, self.spread(&f.ask, &ids, &n.t)));
            return Tried { best: f.best, shares, short, upper: f.upper, boxes: f.boxes, stop: f.stop };
        }
        let root = root_bound(&ask, beat, w);
        if root == f64::NEG_INFINITY {
            return Tried { boxes: 1, ..none(f64::NEG_INFINITY) };
        }
        let mut best: Option<Local> = None;
        let mut short: Option<Local> = None;
        let mut dice = Dice::new(11);
        for k in 0..starts {
            let t = if k == 0 { vec![0.0; d] } else { dice.mixture(&ask.space.corners, d) };
            let l = search(&ask, false, &t, &mut w.work);
            if l.short <= MET {
                if best.as_ref().is_none_or(|b| l.objective > b.objective) {
                    best = Some(l);
                }
            } else if short.as_ref().is_none_or(|s| l.short < s.short) {
                short = Some(l);
            }
        }
        let proof = prove(&ask, best, Effort { floor, ..effort }, control);
        let shares = proof.best.as_ref().map_or_else(Vec::new, |b| self.spread(&ask, &ids, &b.t));
        let short = short.map(|s| (s.short, self.spread(&ask, &ids, &s.t)));
        Tried {
            best: proof.best,
            shares,
            short,
            upper: proof.upper,
            boxes: proof.boxes + 1,
            stop: proof.stop,
        }
    }
}

/// Chooses the best `count` of the problem's emitters and solves with them.
///
/// Emitters with a lower share bound above 0 are always among them. With a white region, subsets are ranked at the target white and
/// the best dozen solved over the region (no bound is claimed then).
///
/// # Errors
/// As [`solve`].
pub fn choose(problem: &Problem, count: usize, control: &Control<'_>) -> Result<Choice, ProblemError> {
    problem.check()?;
    let n = problem.emitters.len();
    if count >= n {
        let outcome = solve(problem, control)?;
        return Ok(Choice {
            outcome,
            chosen: (0..n).collect(),
            runners_up: Vec::new(),
            subsets: 1,
            reach_white: 1,
            examined: 1,
        });
    }
    let reference = Reference::at(problem.target.cct_k);
    let white = uv_at(problem.target.cct_k, problem.target.duv);
    let (used, tensors, bounds) = participants(problem);
    let xyz: Vec<[f64; 3]> = tensors.iter().map(xyz2).collect();
    let m = used.len();
    let k = count.clamp(1, m.max(1));
    let linear = match problem.maximise.metric() {
        Metric::Ler => Some(vec![1.0; m]),
        Metric::Efficacy => Some(used.iter().map(|&i| 1.0 / problem.wall_plug[i]).collect::<Vec<f64>>()),
        _ => None,
    };
    let triples = Triples::new(&xyz, white_of(white), linear.as_deref().unwrap_or(&vec![1.0; m]));
    let must: u64 = (0..m).filter(|&i| bounds[i].0 > 0.0).fold(0, |b, i| b | 1 << i);
    let total = binomial(m as u64, k as u64);
    let chooser = Chooser { problem, white, reference: &reference, used };
    let plan = Plan::of(problem);
    let mut state = State::new(problem, plan);
    if total > MOST_SUBSETS || m > 60 {
        state.swap(&chooser, &triples, k, m, control);
        return Ok(state.finish(&chooser, total, total, k, control));
    }
    // every subset that reaches the white, with its bound
    let mut list: Vec<(f64, u64)> = Vec::new();
    let mut pick: Vec<usize> = (0..k).collect();
    loop {
        let bits = pick.iter().fold(0u64, |b, &i| b | 1 << i);
        if bits & must == must {
            let bound = if k >= 3 { triples.bound(&pick) } else { f64::INFINITY };
            if bound > f64::NEG_INFINITY {
                list.push((if linear.is_some() { bound } else { f64::INFINITY }, bits));
            }
        }
        let Some(at) = (0..k).rev().find(|&i| pick[i] < m - k + i) else { break };
        pick[at] += 1;
        for i in at + 1..k {
            pick[i] = pick[i - 1] + 1;
        }
    }
    let reach = list.len() as u64;
    list.sort_unstable_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
    if !matches!(problem.region, Region::Point) {
        return region_choice(&chooser, &list, total, reach, control);
    }
    // A first good blend from subsets spread over the list.
    let spread = (list.len() / 96).max(1);
    let sample: Vec<u64> = list.iter().step_by(spread).map(|l| l.1).collect();
    let first: Vec<Tried> = sample
        .par_iter()
        .map_init(BoxWork::default, |w, &bits| {
            let effort =
                Effort { boxes: 0, until: plan.until, gap: GOAL_GAP, floor: f64::NEG_INFINITY, hints: true };
            chooser.attempt(&unpack(bits), f64::NEG_INFINITY, effort, 1, control, w)
        })
        .collect();
    for (t, bits) in first.into_iter().zip(&sample) {
        state.note(t, *bits, false);
    }
    let mut at = 0;
    while at < list.len() {
        let beat = state.beat();
        if list[at].0 <= beat {
            break;
        }
        if let Some(stop) = state.out_of(control) {
            state.stop = Some(stop);
            state.open = state.open.max(list[at].0);
            break;
        }
        let end = (at + CHUNK).min(list.len());
        let chunk: Vec<u64> = list[at..end].iter().take_while(|l| l.0 > beat).map(|l| l.1).collect();
        let effort = Effort {
            boxes: state.boxes_left,
            until: plan.until,
            gap: GOAL_GAP,
            floor: state.best_value(),
            hints: true,
        };
        let tried: Vec<Tried> = chunk
            .par_iter()
            .with_min_len(4)
            .map_init(BoxWork::default, |w, &bits| {
                chooser.attempt(&unpack(bits), effort.floor, effort, 2, control, w)
            })
            .collect();
        for (t, bits) in tried.into_iter().zip(&chunk) {
            state.note(t, *bits, true);
        }
        at = end;
        (control.progress)(at as f32 / list.len() as f32);
    }
    Ok(state.finish(&chooser, total, reach, k, control))
}

struct State<'a> {
    problem: &'a Problem,
    found: Vec<(f64, u64, Vec<f64>)>,
    nearest: Option<(f64, Vec<f64>)>,
    boxes: u64,
    boxes_left: u64,
    until: Option<Instant>,
    /// Greatest bound left open.
    open: f64,
    stop: Option<Stop>,
    examined: u64,
}

impl<'a> State<'a> {
    fn new(problem: &'a Problem, plan: Plan) -> State<'a> {
        State {
            problem,
            found: Vec::new(),
            nearest: None,
            boxes: 0,
            boxes_left: plan.boxes.saturating_mul(4),
            until: plan.until,
            open: f64::NEG_INFINITY,
            stop: None,
            examined: 0,
        }
    }

    fn best_value(&self) -> f64 {
        self.found.iter().map(|f| f.0).fold(f64::NEG_INFINITY, f64::max)
    }

    fn beat(&self) -> f64 {
        let v = self.best_value();
        if v.is_finite() { v + gap_at(v, GOAL_GAP) } else { v }
    }

    fn out_of(&self, control: &Control<'_>) -> Option<Stop> {
        if control.stop() {
            Some(Stop::Cancelled)
        } else if self.until.is_some_and(|t| Instant::now() >= t) {
            Some(Stop::Seconds)
        } else if self.boxes_left == 0 {
            Some(Stop::Boxes)
        } else {
            None
        }
    }

    fn note(&mut self, t: Tried, bits: u64, counts: bool) {
        if counts {
            self.examined += 1;
            self.boxes += t.boxes;
            self.boxes_left = self.boxes_left.saturating_sub(t.boxes);
            if let Some(stop) = t.stop {
                self.open = self.open.max(t.upper);
                self.stop.get_or_insert(stop);
            }
        }
        if let Some(b) = t.best {
            match self.found.iter_mut().find(|f| f.1 == bits) {
                Some(f) if f.0 >= b.objective => {}
                Some(f) => *f = (b.objective, bits, t.shares),
                None => self.found.push((b.objective, bits, t.shares)),
            }
        } else if let Some((short, shares)) = t.short
            && self.nearest.as_ref().is_none_or(|n| short < n.0)
        {
            self.nearest = Some((short, shares));
        }
    }

    /// Adds the best emitter at a time, then swaps one for another while that helps.
    fn swap(&mut self, chooser: &Chooser<'_>, triples: &Triples, k: usize, m: usize, control: &Control<'_>) {
        let effort =
            Effort { boxes: 0, until: self.until, gap: GOAL_GAP, floor: f64::NEG_INFINITY, hints: true };
        let rank = |t: &Tried| match (&t.best, &t.short) {
            (Some(b), _) => (1, b.objective),
            (None, Some((s, _))) => (0, -s),
            _ => (-1, 0.0),
        };
        let mut subset: Vec<usize> = Vec::new();
        let mut best = f64::NEG_INFINITY;
        for c in 2..m {
            for b in 1..c {
                for a in 0..b {
                    if triples.at(a, b, c) > best {
                        best = triples.at(a, b, c);
                        subset = vec![a, b, c];
                    }
                }
            }
        }
        if subset.is_empty() {
            return;
        }
        let bits_of = |s: &[usize]| s.iter().fold(0u64, |b, &i| b | 1u64.wrapping_shl(i as u32));
        let mut score = (-2, 0.0);
        loop {
            let grow = subset.len() < k;
            let mut options: Vec<Vec<usize>> = Vec::new();
            for i in (0..m).filter(|i| !subset.contains(i)) {
                if grow {
                    options.push(subset.iter().copied().chain([i]).collect());
                } else {
                    for at in 0..k {
                        let mut s = subset.clone();
                        s[at] = i;
                        options.push(s);
                    }
                }
            }
            for o in &mut options {
                o.sort_unstable();
            }
            let tried: Vec<Tried> = options
                .par_iter()
                .map_init(BoxWork::default, |w, s| {
                    chooser.attempt(s, f64::NEG_INFINITY, effort, 2, control, w)
                })
                .collect();
            let mut next: Option<(usize, (i32, f64))> = None;
            for (i, t) in tried.iter().enumerate() {
                let r = rank(t);
                if next.is_none_or(|n| r > n.1) {
                    next = Some((i, r));
                }
            }
            for (t, s) in tried.into_iter().zip(&options) {
                if s.len() == k {
                    self.note(t, bits_of(s), true);
                }
            }
            let Some((i, r)) = next else { break };
            if !grow && (r <= score || control.stop()) {
                break;
            }
            score = r;
            subset.clone_from(&options[i]);
        }
        // All emitters together bound every subset.
        let whole = solve_at(
            self.problem,
            chooser.white,
            chooser.reference,
            Wanted::from(self.problem.maximise),
            true,
            &[],
            Plan { boxes: self.boxes_left.min(256), ..Plan::of(self.problem) },
            control,
        );
        self.open = whole.map_or(f64::NEG_INFINITY, |w| w.upper);
        self.stop = Some(Stop::Boxes);
    }

    fn finish(
        mut self,
        chooser: &Chooser<'_>,
        subsets: u64,
        reach: u64,
        k: usize,
        control: &Control<'_>,
    ) -> Choice {
        self.found.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
        let upper = self.beat().max(self.open);
        let ids = |bits: u64| -> Vec<usize> { unpack(bits).into_iter().map(|i| chooser.used[i]).collect() };
        if self.found.is_empty() {
            let found = solve_at(
                self.problem,
                chooser.white,
                chooser.reference,
                Wanted::from(self.problem.maximise),
                true,
                &[],
                Plan::of(self.problem).unproven(),
                control,
            );
            let feasible = found.as_ref().is_ok_and(|f| f.best.is_some());
            let mut why: Infeasible = explain(
                self.problem,
                chooser.white,
                chooser.reference,
                &found,
                Plan::of(self.problem),
                control,
            );
            why.proven = self.stop.is_none();
            why.stopped_by = self.stop;
            why.boxes += self.boxes;
            if feasible {
                why.relaxations.clear();
                why.explanation = format!(
                    "All {} emitters together meet the limits, but no {k} of them do{}.",
                    self.problem.emitters.len(),
                    if why.proven { "" } else { " (of those looked at)" }
                );
            }
            if let Some((_, shares)) = self.nearest.filter(|n| !n.1.is_empty()) {
                let values = crate::fixed::values_of(self.problem, &shares, chooser.reference);
                why.nearest.shortfalls = crate::fixed::shortfalls(self.problem, &values, 1e-6);
                why.nearest.values = Some(values);
                why.nearest.shares = shares;
            }
            return Choice {
                outcome: Outcome::Infeasible(why),
                chosen: Vec::new(),
                runners_up: Vec::new(),
                subsets,
                reach_white: reach,
                examined: self.examined,
            };
        }
        let (_, bits, shares) = self.found[0].clone();
        let solution: Solution =
            finish(self.problem, shares, upper, self.boxes, self.stop, chooser.reference);
        let runners_up = self.found[1..]
            .iter()
            .take(10)
            .map(|(objective, bits, shares)| Chosen {
                emitters: ids(*bits),
                shares: shares.clone(),
                objective: *objective,
            })
            .collect();
        Choice {
            outcome: Outcome::Optimal(solution),
            chosen: ids(bits),
            runners_up,
            subsets,
            reach_white: reach,
            examined: self.examined,
        }
    }
}

/// With a region: subsets ranked at the target white, the best dozen solved over the region.
fn region_choice(
    chooser: &Chooser<'_>,
    list: &[(f64, u64)],
    subsets: u64,
    reach_white: u64,
    control: &Control<'_>,
) -> Result<Choice, ProblemError> {
    let problem = chooser.problem;
    let mut ranked: Vec<(i32, f64, u64)> = list
        .iter()
        .take(4000)
        .collect::<Vec<_>>()
        .par_iter()
        .map_init(BoxWork::default, |w, &&(_, bits)| {
            let effort =
                Effort { boxes: 0, until: None, gap: GOAL_GAP, floor: f64::NEG_INFINITY, hints: true };
            let t = chooser.attempt(&unpack(bits), f64::NEG_INFINITY, effort, 1, control, w);
            match (t.best, t.short) {
                (Some(b), _) => (1, b.objective, bits),
                (None, Some((s, _))) => (0, -s, bits),
                _ => (-1, 0.0, bits),
            }
        })
        .collect();
    ranked.sort_by(|a, b| {
        (b.0, b.1).partial_cmp(&(a.0, a.1)).unwrap_or(std::cmp::Ordering::Equal).then(a.2.cmp(&b.2))
    });
    let mut found: Vec<(Chosen, Solution)> = Vec::new();
    for &(_, _, bits) in ranked.iter().take(12) {
        let ids: Vec<usize> = unpack(bits).into_iter().map(|i| chooser.used[i]).collect();
        let p = problem.subset(&ids);
        if let Outcome::Optimal(s) = solve_region(&p, Plan::of(&p).unproven(), control) {
            let mut shares = vec![0.0; problem.emitters.len()];
            for (&i, w) in ids.iter().zip(&s.shares) {
                shares[i] = *w;
            }
            let chosen = Chosen { emitters: ids, shares: shares.clone(), objective: s.objective };
            let reference = Reference::at(s.reference_cct_k);
            found.push((chosen, finish(problem, shares, f64::INFINITY, 0, None, &reference)));
        }
    }
    found.sort_by(|a, b| b.0.objective.total_cmp(&a.0.objective));
    let examined = ranked.len() as u64;
    if found.is_empty() {
        let mut outcome = solve(problem, control)?;
        if let Outcome::Optimal(s) = &outcome {
            let nearest = crate::answer::Nearest {
                shares: s.shares.clone(),
                u: f64::NAN,
                v: f64::NAN,
                distance_uv1960: 0.0,
                cct_k: Some(s.reference_cct_k),
                duv: None,
                shortfalls: Vec::new(),
                values: Some(s.values),
            };
            outcome = Outcome::Infeasible(Infeasible {
                nearest,
                reachable: Vec::new(),
                relaxations: Vec::new(),
                explanation: "All emitters together meet the limits, but no subset of this size that was looked at does.".to_owned(),
                proven: false,
                boxes: 0,
                stopped_by: None,
            });
        }
        return Ok(Choice {
            outcome,
            chosen: Vec::new(),
            runners_up: Vec::new(),
            subsets,
            reach_white,
            examined,
        });
    }
    let (best, solution) = found.remove(0);
    Ok(Choice {
        outcome: Outcome::Optimal(solution),
        chosen: best.emitters,
        runners_up: found.into_iter().map(|f| f.0).collect(),
        subsets,
        reach_white,
        examined,
    })
}
