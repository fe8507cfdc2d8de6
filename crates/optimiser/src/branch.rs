//! The proof: branch and bound on the free directions.
//!
//! Best box first, in batches of fixed size examined side by side and merged in a fixed order, so that the answer does not depend on
//! threads or clock. In a box every limited metric has a linear model that holds throughout; a small linear programme over the models
//! bounds the objective, or shows that nothing in the box meets the limits. Boxes shrink to what could still beat the
//! best blend known before they are split.

use crate::answer::Stop;
use crate::ask::{Aim, Ask, Work, outward};
use crate::local::{Local, MET, search};
use crate::models::{MOST, Model};
use crate::problem::Control;
use crate::simplex::{Lp, LpEnd};
use crate::space::inner;
use colour::PHOTOPIC_EFFICACY_LM_PER_W as KM;
use rayon::prelude::*;
use std::cmp::Ordering;
use std::collections::BinaryHeap;
use std::time::Instant;

/// Relative gap at which the proof is good enough to stop.
pub(crate) const GOAL_GAP: f64 = 2e-4;
/// Boxes examined before results are merged.
const BATCH: usize = 32;

/// How long the proof may go on.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Effort {
    pub(crate) boxes: u64,
    pub(crate) until: Option<Instant>,
    pub(crate) gap: f64,
    /// A value found elsewhere that has to be beaten.
    pub(crate) floor: f64,
    /// Look for better blends where the relaxation points.
    pub(crate) hints: bool,
}

/// What the proof found.
#[derive(Clone, Debug)]
pub(crate) struct Proof {
    /// The best blend known (may have improved on the way).
    pub(crate) best: Option<Local>,
    /// Nothing exceeds this; −∞ when nothing meets the limits.
    pub(crate) upper: f64,
    pub(crate) boxes: u64,
    pub(crate) stop: Option<Stop>,
}

#[derive(Clone, Debug)]
struct Node {
    bound: f64,
    id: u64,
    low: Vec<f64>,
    high: Vec<f64>,
}

impl PartialEq for Node {
    fn eq(&self, other: &Node) -> bool {
        self.id == other.id
    }
}
impl Eq for Node {}
impl PartialOrd for Node {
    fn partial_cmp(&self, other: &Node) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}
impl Ord for Node {
    fn cmp(&self, other: &Node) -> Ordering {
        self.bound.total_cmp(&other.bound).then(other.id.cmp(&self.id))
    }
}

/// A box after examination.
struct Examined {
    bound: f64,
    low: Vec<f64>,
    high: Vec<f64>,
    split: usize,
    /// The most promising point of the relaxation.
    hint: Vec<f64>,
}

/// Memory of one thread.
#[derive(Clone, Default)]
pub(crate) struct BoxWork {
    pub(crate) work: Work,
    lp: Lp,
    row: Vec<f64>,
}

/// Absolute difference that a relative gap means at a value.
pub(crate) fn gap_at(value: f64, gap: f64) -> f64 {
    gap * value.abs().max(10.0)
}

fn push_upper(lp: &mut Lp, row: &mut [f64], m: &Model, centre: &[f64], at_least: f64) {
    // upper + g·(t − c) ≥ at_least
    let d = centre.len();
    if !m.upper.is_finite() {
        return;
    }
    let mut b = m.upper - at_least;
    for j in 0..d {
        row[j] = -m.grad[j];
        b -= m.grad[j] * centre[j];
    }
    lp.row(row, b);
}

fn push_lower(lp: &mut Lp, row: &mut [f64], m: &Model, centre: &[f64], at_most: f64) {
    let d = centre.len();
    if !m.lower.is_finite() {
        return;
    }
    let mut b = at_most - m.lower;
    for j in 0..d {
        row[j] = m.grad[j];
        b += m.grad[j] * centre[j];
    }
    lp.row(row, b);
}

/// Examines one box against a value to beat. None: nothing in it both meets the limits and beats the value.
fn examine(ask: &Ask, node: &Node, beat: f64, tighten: bool, w: &mut BoxWork) -> Option<Examined> {
    let d = ask.space.d;
    let (mut low, mut high) = (node.low.clone(), node.high.clone());
    let mut bound = node.bound;
    w.row.clear();
    w.row.resize(d, 0.0);
    let mut hint = Vec::new();
    let rounds = if !tighten {
        1
    } else if d <= 4 {
        3
    } else {
        2
    };
    for round in 0..rounds {
        let centre: Vec<f64> = (0..d).map(|j| 0.5 * (low[j] + high[j])).collect();
        let radius: Vec<f64> = (0..d).map(|j| 0.5 * (high[j] - low[j])).collect();
        ask.over_box(&centre, &radius, &mut w.work);
        w.lp.begin(&low, &high);
        for r in &ask.space.rows {
            // rows that cannot bind inside the box only cost time
            let most: f64 = (0..d).map(|j| (r.a[j] * low[j]).max(r.a[j] * high[j])).sum();
            if most > r.b {
                w.lp.row(&r.a, r.b);
            }
        }
        for goal in &ask.goals {
            let m = ask.model(goal.metric, &w.work);
            if let Some(l) = goal.low {
                push_upper(&mut w.lp, &mut w.row, m, &centre, l);
            }
            if let Some(h) = goal.high {
                push_lower(&mut w.lp, &mut w.row, m, &centre, h);
            }
        }
        // the objective as a linear form to maximise, and what beating the value means on it
        let mut c = [0.0; MOST];
        let (base, needed) = match &ask.aim {
            Aim::LeastCost { c0, c: cost } => {
                for j in 0..d {
                    c[j] = -cost[j];
                }
                let needed = if beat > 0.0 { -KM / beat } else { f64::NEG_INFINITY };
                (-c0, needed)
            }
            Aim::Rendering { metric, sign } => {
                let m = ask.model(*metric, &w.work);
                let value = if *sign > 0.0 { m.upper } else { -m.lower };
                let needed = if beat.is_finite() {
                    sign * crate::ask::inward(*metric, sign * beat)
                } else {
                    f64::NEG_INFINITY
                };
                if value.is_finite() {
                    for j in 0..d {
                        c[j] = sign * m.grad[j];
                    }
                    (value - inner(&c[..d], &centre), needed)
                } else {
                    (f64::INFINITY, needed)
                }
            }
        };
        let c = &c[..d];
        let loose = !base.is_finite();
        if loose {
            if w.lp.maximise(c, f64::NEG_INFINITY) == LpEnd::Empty {
                return None;
            }
            hint = centre;
            break;
        }
        match w.lp.maximise(c, needed - base) {
            LpEnd::Empty | LpEnd::Below => return None,
            LpEnd::Unknown => {
                hint = centre;
                break;
            }
            LpEnd::Optimal(v) => {
                let v = v + base + 1e-12 * (1.0 + base.abs());
                if v < needed {
                    return None;
                }
                let here = match &ask.aim {
                    Aim::LeastCost { .. } => {
                        if v < 0.0 {
                            -KM / v
                        } else {
                            f64::INFINITY
                        }
                    }
                    Aim::Rendering { metric, sign } => sign * outward(*metric, sign * v),
                };
                bound = bound.min(here);
                hint.clear();
                hint.extend_from_slice(w.lp.point());
            }
        }
        if round + 1 == rounds {
            break;
        }
        // shrink to what could still beat the value
        if needed.is_finite() {
            for j in 0..d {
                w.row[j] = -c[j];
            }
            let row = std::mem::take(&mut w.row);
            w.lp.row(&row, base - needed);
            w.row = row;
        }
        let mut shrink = 1.0;
        let mut e = [0.0; MOST];
        for j in 0..d {
            let width = high[j] - low[j];
            if width < 1e-12 {
                continue;
            }
            e[j] = 1.0;
            let up = match w.lp.maximise(&e[..d], f64::NEG_INFINITY) {
                LpEnd::Empty => return None,
                LpEnd::Optimal(v) => high[j].min(v + 1e-11),
                _ => high[j],
            };
            e[j] = -1.0;
            let down = match w.lp.maximise(&e[..d], f64::NEG_INFINITY) {
                LpEnd::Empty => return None,
                LpEnd::Optimal(v) => low[j].max(-v - 1e-11),
                _ => low[j],
            };
            e[j] = 0.0;
            if up <= down {
                let m = 0.5 * (up + down);
                high[j] = m + 1e-11;
                low[j] = m - 1e-11;
            } else {
                high[j] = up;
                low[j] = down;
            }
            w.lp.set_box(&low, &high);
            shrink *= (high[j] - low[j]) / width;
        }
        if shrink > 0.5 {
            break;
        }
    }
    let split = (0..d)
        .max_by(|&a, &b| (high[a] - low[a]).total_cmp(&(high[b] - low[b])).then(b.cmp(&a)))
        .unwrap_or(0);
    Some(Examined { bound, low, high, split, hint })
}

/// Runs the proof from the best blend known, if any.
pub(crate) fn prove(ask: &Ask, best: Option<Local>, effort: Effort, control: &Control<'_>) -> Proof {
    let mut best = best;
    let mut heap = BinaryHeap::new();
    let mut next_id = 0u64;
    heap.push(Node {
        bound: f64::INFINITY,
        id: next_id,
        low: ask.space.low.clone(),
        high: ask.space.high.clone(),
    });
    let mut boxes = 0u64;
    let mut stop = None;
    let mut batches = 0u64;
    let threads = rayon::current_num_threads().max(1);
    let mut own = BoxWork::default();
    let beat_of = |best: &Option<Local>| {
        let value = best.as_ref().map_or(f64::NEG_INFINITY, |b| b.objective).max(effort.floor);
        if value.is_finite() { value + gap_at(value, effort.gap) } else { value }
    };
    while let Some(top) = heap.peek() {
        let beat = beat_of(&best);
        if top.bound <= beat {
            break;
        }
        if control.stop() {
            stop = Some(Stop::Cancelled);
            break;
        }
        if effort.until.is_some_and(|t| Instant::now() >= t) {
            stop = Some(Stop::Seconds);
            break;
        }
        if boxes >= effort.boxes {
            stop = Some(Stop::Boxes);
            break;
        }
        let mut batch = Vec::with_capacity(BATCH);
        while batch.len() < BATCH && boxes + (batch.len() as u64) < effort.boxes {
            match heap.peek() {
                Some(n) if n.bound > beat => batch.extend(heap.pop()),
                _ => break,
            }
        }
        boxes += batch.len() as u64;
        batches += 1;
        let results: Vec<Option<Examined>> =
            if batch.len() >= 8 && threads > 1 && (ask.ces.is_some() || ask.space.d >= 4) {
                batch
                    .par_iter()
                    .with_min_len(4)
                    .map_init(BoxWork::default, |w, n| examine(ask, n, beat, true, w))
                    .collect()
            } else {
                batch.iter().map(|n| examine(ask, n, beat, true, &mut own)).collect()
            };
        // A better blend may show up where the relaxation points.
        let tries = if !effort.hints {
            0
        } else if batches <= 8 || batches.is_multiple_of(8) {
            2
        } else {
            0
        };
        for r in results.iter().flatten().filter(|r| !r.hint.is_empty()).take(tries) {
            let found = search(ask, false, &r.hint, &mut own.work);
            if found.short <= MET && best.as_ref().is_none_or(|b| found.objective > b.objective) {
                best = Some(found);
            }
        }
        let beat = beat_of(&best);
        for r in results.into_iter().flatten() {
            if r.bound <= beat {
                continue;
            }
            let mid = 0.5 * (r.low[r.split] + r.high[r.split]);
            let (mut left, mut right) = (r.high.clone(), r.low.clone());
            left[r.split] = mid;
            right[r.split] = mid;
            next_id += 1;
            heap.push(Node { bound: r.bound, id: next_id, low: r.low, high: left });
            next_id += 1;
            heap.push(Node { bound: r.bound, id: next_id, low: right, high: r.high });
        }
        if batches.is_multiple_of(16) {
            (control.progress)((boxes as f32 / effort.boxes as f32).min(1.0));
        }
    }
    let open = heap.peek().map_or(f64::NEG_INFINITY, |n| n.bound);
    let upper = open.max(beat_of(&best));
    Proof { best, upper, boxes, stop }
}

/// A bound from one box: the whole polytope, without splitting.
pub(crate) fn root_bound(ask: &Ask, beat: f64, w: &mut BoxWork) -> f64 {
    let node = Node { bound: f64::INFINITY, id: 0, low: ask.space.low.clone(), high: ask.space.high.clone() };
    examine(ask, &node, beat, false, w).map_or(f64::NEG_INFINITY, |e| e.bound)
}
