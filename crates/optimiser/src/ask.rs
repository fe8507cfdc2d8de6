//! A problem at one exact white, ready for the searches: the polytope, the rendering forms, limits in internal units.

use crate::ces::{CesForms, CesModels, CesWants, CesWork, delta_of, rf_of};
use crate::models::Model;
use crate::problem::{Metric, Objective, Problem, Range};
use crate::region_proof::Slice;
use crate::space::{NoSpace, Space, SpaceInput, WattRow, WhiteWanted};
use crate::tcs::MovingTcs;
use crate::tcs::{TcsForms, TcsModels, xyz2};
use colour::{PHOTOPIC_EFFICACY_LM_PER_W as KM, Reference, Tensor, Uv};

/// What is maximised, on the free directions.
#[derive(Clone, Debug)]
pub(crate) enum Aim {
    /// 683 / (c0 + c·t): LER or efficacy, by least cost.
    LeastCost { c0: f64, c: Vec<f64> },
    /// A rendering metric, times `sign`.
    Rendering { metric: Metric, sign: f64 },
}

/// A rendering limit in internal units (Rf is −ΔE′).
#[derive(Clone, Copy, Debug)]
pub(crate) struct Goal {
    pub(crate) metric: Metric,
    pub(crate) low: Option<f64>,
    pub(crate) high: Option<f64>,
}

/// What the search maximises; a sign of −1 asks for the least.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Wanted {
    pub(crate) metric: Metric,
    pub(crate) sign: f64,
}

impl From<Objective> for Wanted {
    fn from(o: Objective) -> Wanted {
        Wanted { metric: o.metric(), sign: 1.0 }
    }
}

/// The compiled problem.
#[derive(Clone)]
pub(crate) struct Ask {
    pub(crate) space: Space,
    /// Emitters of the problem that take part; the others have share 0.
    pub(crate) used: Vec<usize>,
    /// Emitters in all.
    pub(crate) all: usize,
    pub(crate) tcs: Option<TcsForms>,
    /// In place of `tcs` where the white may move.
    pub(crate) moving: Option<MovingTcs>,
    /// How far −ΔE′ may shift with the reference inside a slice of a region.
    pub(crate) rf_slack: f64,
    pub(crate) ces: Option<CesForms>,
    pub(crate) wants: CesWants,
    /// Upper limits on Ra or R9 exist.
    pub(crate) tcs_high: bool,
    pub(crate) goals: Vec<Goal>,
    pub(crate) aim: Aim,
}

/// Scratch memory of one thread.
#[derive(Clone, Default)]
pub(crate) struct Work {
    pub(crate) tcs: TcsModels,
    pub(crate) ces: CesModels,
    pub(crate) lanes: Box<CesWork>,
}

/// Internal value of a metric.
pub(crate) fn inward(metric: Metric, value: f64) -> f64 {
    if metric == Metric::Rf { -delta_of(value) } else { value }
}

/// Metric of an internal value.
pub(crate) fn outward(metric: Metric, value: f64) -> f64 {
    if metric == Metric::Rf { rf_of(-value) } else { value }
}

/// A step of each metric that matters about equally (internal units).
pub(crate) fn scale(metric: Metric) -> f64 {
    match metric {
        Metric::R9 => 30.0,
        Metric::Rf => 1.5,
        _ => 10.0,
    }
}

/// X, Y = 1, Z of a chromaticity.
pub(crate) fn white_of(uv: Uv) -> [f64; 3] {
    [1.5 * uv.u / uv.v, 1.0, (4.0 - uv.u - 10.0 * uv.v) / (2.0 * uv.v)]
}

/// Emitters that take part, and their share bounds. An emitter without visible light is held at its lower bound.
pub(crate) fn participants(problem: &Problem) -> (Vec<usize>, Vec<Tensor>, Vec<(f64, f64)>) {
    let (mut used, mut tensors, mut bounds) = (Vec::new(), Vec::new(), Vec::new());
    for i in 0..problem.emitters.len() {
        let t = problem.emitters.tensor(i);
        let (lo, hi) = problem.bound(i);
        let x = xyz2(&t);
        let dark =
            t.radiant_power() <= 0.0 || x.iter().any(|v| !v.is_finite()) || x.iter().sum::<f64>() < 1e-9;
        let hi = if dark { lo } else { hi.min(1.0) };
        if hi > 0.0 {
            used.push(i);
            tensors.push(t);
            bounds.push((lo.min(1.0), hi));
        }
    }
    (used, tensors, bounds)
}

/// The linear limits of a problem as rows on watts per unit Y.
pub(crate) fn watt_rows(problem: &Problem, used: &[usize]) -> Vec<WattRow> {
    let mut rows = Vec::new();
    let ones = vec![1.0; used.len()];
    let electrical: Vec<f64> =
        used.iter().map(|&i| problem.wall_plug.get(i).map_or(1.0, |w| 1.0 / w)).collect();
    let mut push = |cost: &[f64], range: Range| {
        // value = 683 / (cost·p)
        if let Some(l) = range.low.filter(|l| *l > 0.0) {
            rows.push(WattRow { c: cost.to_vec(), b: KM / (l + 1e-9) });
        }
        if let Some(h) = range.high {
            let b = if h > 0.0 { -KM / (h - 1e-9) } else { -1e9 };
            rows.push(WattRow { c: cost.iter().map(|c| -c).collect(), b });
        }
    };
    push(&ones, problem.limits.ler);
    if !problem.wall_plug.is_empty() {
        push(&electrical, problem.limits.efficacy);
    }
    for row in &problem.rows {
        rows.push(WattRow { c: used.iter().map(|&i| row.coefficients[i]).collect(), b: row.at_most * KM });
    }
    rows
}

/// Margin by which limits are tightened inside, so that rounding never breaks them (natural units).
const INSIDE: f64 = 5e-9;

impl Ask {
    /// Compiles a problem at a white with a reference; `limits` false drops every limit (bounds stay).
    pub(crate) fn new(
        problem: &Problem,
        white: Uv,
        reference: &Reference,
        wanted: Wanted,
        limits: bool,
    ) -> Result<Ask, NoSpace> {
        let (used, tensors, bounds) = participants(problem);
        let xyz: Vec<[f64; 3]> = tensors.iter().map(xyz2).collect();
        if used.is_empty() {
            return Err(NoSpace::White);
        }
        let rows = if limits { watt_rows(problem, &used) } else { Vec::new() };
        let space = Space::new(&SpaceInput {
            xyz: &xyz,
            white: WhiteWanted::Exact(white_of(white)),
            bounds: &bounds,
            rows: &rows,
        })?;
        Ok(Ask::over(problem, &used, &tensors, space, reference, wanted, limits))
    }

    /// Compiles a problem for whites inside a slice of a region. Limits on Rg count when the hue bins to use are given.
    pub(crate) fn within(
        problem: &Problem,
        slice: &Slice,
        wanted: Wanted,
        bins: Option<&Reference>,
    ) -> Result<Ask, NoSpace> {
        let (used, tensors, bounds) = participants(problem);
        let xyz: Vec<[f64; 3]> = tensors.iter().map(xyz2).collect();
        if used.is_empty() {
            return Err(NoSpace::White);
        }
        let rows = watt_rows(problem, &used);
        let space = Space::new(&SpaceInput {
            xyz: &xyz,
            white: WhiteWanted::Within(&slice.sides, slice.most),
            bounds: &bounds,
            rows: &rows,
        })?;
        if space.d == 0 {
            return Err(NoSpace::White);
        }
        let mut bare = problem.clone();
        bare.limits.rg = match bins {
            // the reference's own area changes over the slice: the limits give way by as much
            Some(bins) => {
                let give = slice.area_change(bins);
                let asked = problem.limits.rg;
                Range {
                    low: asked.low.map(|l| l - give * l.abs()),
                    high: asked.high.map(|h| h + give * h.abs()),
                }
            }
            None => Range::OPEN,
        };
        let mut ask = Ask::over(&bare, &used, &tensors, space, &slice.middle, wanted, true);
        if ask.tcs.take().is_some() {
            ask.moving = Some(MovingTcs::new(&tensors, &ask.space, slice));
        }
        ask.rf_slack = slice.rf_slack;
        if let (Some(ces), Some(bins)) = (&mut ask.ces, bins) {
            ces.take_bins(bins);
        }
        Ok(ask)
    }

    fn over(
        problem: &Problem,
        used: &[usize],
        tensors: &[Tensor],
        space: Space,
        reference: &Reference,
        wanted: Wanted,
        limits: bool,
    ) -> Ask {
        let mut goals = Vec::new();
        if limits {
            for metric in [Metric::Ra, Metric::R9, Metric::Rf, Metric::Rg] {
                let range = problem.limits.get(metric);
                // an Rf floor at or below 0 asks nothing
                let low = range.low.filter(|l| metric != Metric::Rf || *l > 0.0);
                if low.is_some() || range.high.is_some() {
                    goals.push(Goal {
                        metric,
                        low: low.map(|l| inward(metric, l + INSIDE)),
                        high: range.high.map(|h| inward(metric, h - INSIDE)),
                    });
                }
            }
        }
        let aim = match wanted.metric {
            Metric::Ler => {
                let (c0, c) = space.linear(&vec![1.0; used.len()]);
                Aim::LeastCost { c0, c }
            }
            Metric::Efficacy => {
                let cost: Vec<f64> =
                    used.iter().map(|&i| problem.wall_plug.get(i).map_or(1.0, |w| 1.0 / w)).collect();
                let (c0, c) = space.linear(&cost);
                Aim::LeastCost { c0, c }
            }
            metric => Aim::Rendering { metric, sign: wanted.sign },
        };
        let aimed = |m: Metric| matches!(aim, Aim::Rendering { metric, .. } if metric == m);
        let aimed_low =
            |m: Metric| matches!(aim, Aim::Rendering { metric, sign } if metric == m && sign < 0.0);
        let limited = |m: Metric| goals.iter().any(|g| g.metric == m);
        let capped = |m: Metric| goals.iter().any(|g| g.metric == m && g.high.is_some()) || aimed_low(m);
        let any = |m: Metric| limited(m) || aimed(m);
        let tcs = (any(Metric::Ra) || any(Metric::R9)).then(|| TcsForms::new(tensors, &space, reference));
        let ces = (any(Metric::Rf) || any(Metric::Rg)).then(|| CesForms::new(tensors, &space, reference));
        Ask {
            tcs_high: capped(Metric::Ra) || capped(Metric::R9),
            wants: CesWants { rf_high: capped(Metric::Rf), rg: any(Metric::Rg) },
            used: used.to_vec(),
            all: problem.emitters.len(),
            space,
            tcs,
            moving: None,
            rf_slack: 0.0,
            ces,
            goals,
            aim,
        }
    }

    /// Models of every needed metric at a point (tangents).
    pub(crate) fn at(&self, t: &[f64], work: &mut Work) {
        pulp::Arch::new().dispatch(At { ask: self, t, work });
    }

    /// Models of every needed metric over a box.
    pub(crate) fn over_box(&self, centre: &[f64], radius: &[f64], work: &mut Work) {
        pulp::Arch::new().dispatch(OverBox { ask: self, centre, radius, work });
    }

    /// Watts to radiant shares of all emitters.
    pub(crate) fn shares(&self, t: &[f64]) -> Vec<f64> {
        let p = self.space.watts(t);
        let mut shares = vec![0.0; self.all];
        for (&i, p) in self.used.iter().zip(&p) {
            shares[i] = if *p > 1e-12 { *p } else { 0.0 };
        }
        let sum: f64 = shares.iter().sum();
        for s in &mut shares {
            *s /= sum;
        }
        shares
    }

    /// Free coordinates of a blend given as shares of all emitters (projected onto the white).
    pub(crate) fn free_of(&self, shares: &[f64], luminance: &[f64]) -> Vec<f64> {
        let y: f64 = shares.iter().zip(luminance).map(|(s, y)| s * y).sum();
        let watts: Vec<f64> = self.used.iter().map(|&i| shares[i] / y).collect();
        self.space.free(&watts)
    }

    /// The model of a rendering metric in the work memory.
    pub(crate) fn model<'w>(&self, metric: Metric, work: &'w Work) -> &'w Model {
        match metric {
            Metric::Ra => &work.tcs.ra,
            Metric::R9 => &work.tcs.r9,
            Metric::Rf => &work.ces.rf,
            _ => &work.ces.rg,
        }
    }

    /// Objective (natural units, more is better) at a point already evaluated with [`Ask::at`].
    pub(crate) fn objective(&self, t: &[f64], work: &Work) -> f64 {
        match &self.aim {
            Aim::LeastCost { c0, c } => KM / (c0 + crate::space::inner(c, t)),
            Aim::Rendering { metric, sign } => sign * outward(*metric, self.model(*metric, work).upper),
        }
    }
}

struct At<'a> {
    ask: &'a Ask,
    t: &'a [f64],
    work: &'a mut Work,
}

impl At<'_> {
    #[inline(always)]
    fn run<const F: bool>(self) {
        if let Some(tcs) = &self.ask.tcs {
            tcs.point::<F>(self.t, &mut self.work.tcs);
        }
        if let Some(moving) = &self.ask.moving {
            moving.point::<F>(self.t, &mut self.work.tcs);
        }
        if let Some(ces) = &self.ask.ces {
            ces.point::<F>(self.t, self.ask.wants.rg, &mut self.work.lanes, &mut self.work.ces);
        }
    }
}

impl pulp::WithSimd for At<'_> {
    type Output = ();
    #[inline(always)]
    fn with_simd<S: pulp::Simd>(self, _: S) {
        if S::IS_SCALAR { self.run::<false>() } else { self.run::<true>() }
    }
}

struct OverBox<'a> {
    ask: &'a Ask,
    centre: &'a [f64],
    radius: &'a [f64],
    work: &'a mut Work,
}

impl OverBox<'_> {
    #[inline(always)]
    fn run<const F: bool>(self) {
        let (a, w) = (self.ask, self.work);
        if let Some(tcs) = &a.tcs {
            if a.tcs_high {
                tcs.around::<F, true, true>(self.centre, self.radius, &mut w.tcs);
            } else {
                tcs.around::<F, true, false>(self.centre, self.radius, &mut w.tcs);
            }
        }
        if let Some(moving) = &a.moving {
            moving.around::<F>(self.centre, self.radius, &mut w.tcs);
        }
        if let Some(ces) = &a.ces {
            ces.around::<F, true>(self.centre, self.radius, a.wants, &mut w.lanes, &mut w.ces);
            w.ces.rf.upper += a.rf_slack;
            w.ces.rf.lower -= a.rf_slack;
        }
    }
}

impl pulp::WithSimd for OverBox<'_> {
    type Output = ();
    #[inline(always)]
    fn with_simd<S: pulp::Simd>(self, _: S) {
        if S::IS_SCALAR { self.run::<false>() } else { self.run::<true>() }
    }
}
