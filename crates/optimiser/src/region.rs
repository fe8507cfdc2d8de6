//! Whites that may move inside a region.
//!
//! The region is taken in pieces on which the CIE 13.3 reference does not change its kind (it does at 5000 K). In each piece a grid of whites is solved exactly,
//! then the best of them are refined by a compass search that slides along the edges, each white solved from the blend before. Then
//! [`crate::region_proof`] bounds the whole region.

use crate::answer::{Binding, Outcome, Solution};
use crate::fixed::{Plan, finish, solve_at};
use crate::gamut::inside;
use crate::infeasible::{explain, outside};
use crate::problem::{Control, Problem, Region};
use crate::region_proof::bound_region;
use crate::space::NoSpace;
use colour::locus::{cct_duv, uv_at};
use colour::{Reference, Uv};
use rayon::prelude::*;

/// CCT at which CIE 13.3 changes from Planckian to daylight references.
pub(crate) const KIND_CHANGE_K: f64 = 5000.0;
/// Points of the first grid along each direction.
const GRID: usize = 8;
/// Halvings of the compass step.
const HALVINGS: usize = 11;

/// A part of a region on one side of 5000 K, in coordinates of its own.
#[derive(Clone, Debug)]
pub(crate) enum Piece {
    /// CCT and Duv ranges.
    Box { cct_k: [f64; 2], duv: [f64; 2] },
    /// A convex polygon in CIE 1960 uv, with the CCT range its reference is held to.
    Polygon { corners: Vec<[f64; 2]>, cct_k: [f64; 2] },
}

/// A white with the CCT of its reference.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Place {
    pub(crate) uv: Uv,
    pub(crate) cct_k: f64,
}

/// The uv line of one CCT: a point and the direction away from the locus.
pub(crate) fn isotherm(cct_k: f64) -> ([f64; 2], [f64; 2]) {
    let (a, b) = (uv_at(cct_k, 0.0), uv_at(cct_k, 0.02));
    ([a.u, a.v], [(b.u - a.u) / 0.02, (b.v - a.v) / 0.02])
}

/// Keeps the part of a convex polygon where g·x ≤ c.
pub(crate) fn clip(polygon: &[[f64; 2]], g: [f64; 2], c: f64) -> Vec<[f64; 2]> {
    let k = polygon.len();
    let mut out = Vec::new();
    for i in 0..k {
        let (a, b) = (polygon[i], polygon[(i + 1) % k]);
        let (fa, fb) = (g[0] * a[0] + g[1] * a[1] - c, g[0] * b[0] + g[1] * b[1] - c);
        if fa <= 0.0 {
            out.push(a);
        }
        if (fa < 0.0 && fb > 0.0) || (fa > 0.0 && fb < 0.0) {
            let s = fa / (fa - fb);
            out.push([a[0] + s * (b[0] - a[0]), a[1] + s * (b[1] - a[1])]);
        }
    }
    out
}

/// The half-plane of whites on the warm side of a CCT: g·x ≤ c.
pub(crate) fn warm_side(cct_k: f64) -> ([f64; 2], f64) {
    let (p, e) = isotherm(cct_k);
    // along the locus towards lower CCT u grows: the warm side is to the right of the upward normal
    let g = [-e[1], e[0]];
    (g, g[0] * p[0] + g[1] * p[1])
}

/// The pieces of a region.
pub(crate) fn pieces(problem: &Problem) -> Vec<Piece> {
    let t = problem.target;
    let below = KIND_CHANGE_K - 1e-6;
    match &problem.region {
        Region::Point => Vec::new(),
        Region::Box { cct_k, duv } => {
            // drawn in by rounding, so that the measured white never falls outside
            let edge = 1e-7 * t.cct_k.min(1e3) * 1e-2;
            let draw = |c: f64, h: f64, e: f64| if h > e { [c - h + e, c + h - e] } else { [c, c] };
            let k = draw(t.cct_k, *cct_k, edge);
            let k = [k[0].max(1000.0), k[1].min(20_000.0)];
            let d = draw(t.duv, *duv, 1e-9);
            let d = [d[0].max(-0.05), d[1].min(0.05)];
            if k[0] < KIND_CHANGE_K && k[1] >= KIND_CHANGE_K {
                vec![
                    Piece::Box { cct_k: [k[0], below], duv: d },
                    Piece::Box { cct_k: [KIND_CHANGE_K, k[1]], duv: d },
                ]
            } else {
                vec![Piece::Box { cct_k: k, duv: d }]
            }
        }
        Region::Polygon(corners) => {
            let n = corners.len() as f64;
            let (cu, cv) =
                (corners.iter().map(|c| c.u).sum::<f64>() / n, corners.iter().map(|c| c.v).sum::<f64>() / n);
            let uv: Vec<[f64; 2]> = corners
                .iter()
                .map(|c| {
                    let s = 1.0 - 1e-7;
                    [cu + s * (c.u - cu), (cv + s * (c.v - cv)) / 1.5]
                })
                .collect();
            let (g, c) = warm_side(KIND_CHANGE_K);
            let warm = clip(&uv, g, c);
            let cool = clip(&uv, [-g[0], -g[1]], -c);
            let mut out = Vec::new();
            if warm.len() >= 3 {
                out.push(Piece::Polygon { corners: warm, cct_k: [1000.0, below] });
            }
            if cool.len() >= 3 {
                out.push(Piece::Polygon { corners: cool, cct_k: [KIND_CHANGE_K, 20_000.0] });
            }
            out
        }
    }
}

impl Piece {
    /// Lower corner and size of the coordinates.
    fn frame(&self) -> ([f64; 2], [f64; 2]) {
        match self {
            Piece::Box { cct_k, duv } => ([cct_k[0], duv[0]], [cct_k[1] - cct_k[0], duv[1] - duv[0]]),
            Piece::Polygon { corners, .. } => {
                let (mut lo, mut hi) = ([f64::INFINITY; 2], [f64::NEG_INFINITY; 2]);
                for c in corners {
                    for k in 0..2 {
                        lo[k] = lo[k].min(c[k]);
                        hi[k] = hi[k].max(c[k]);
                    }
                }
                (lo, [hi[0] - lo[0], hi[1] - lo[1]])
            }
        }
    }

    /// The admissible point nearest to given coordinates.
    fn project(&self, x: [f64; 2]) -> [f64; 2] {
        match self {
            Piece::Box { cct_k, duv } => [x[0].clamp(cct_k[0], cct_k[1]), x[1].clamp(duv[0], duv[1])],
            Piece::Polygon { corners, .. } => {
                if inside(corners, x) {
                    return x;
                }
                let k = corners.len();
                let mut best = (f64::INFINITY, x);
                for i in 0..k {
                    let (a, b) = (corners[i], corners[(i + 1) % k]);
                    let e = [b[0] - a[0], b[1] - a[1]];
                    let l = (e[0] * e[0] + e[1] * e[1]).max(1e-300);
                    let s = (((x[0] - a[0]) * e[0] + (x[1] - a[1]) * e[1]) / l).clamp(0.0, 1.0);
                    let p = [a[0] + s * e[0], a[1] + s * e[1]];
                    let far = (p[0] - x[0]).hypot(p[1] - x[1]);
                    if far < best.0 {
                        best = (far, p);
                    }
                }
                best.1
            }
        }
    }

    /// The white at given coordinates; None where no CCT is defined.
    fn place(&self, x: [f64; 2]) -> Option<Place> {
        match self {
            Piece::Box { .. } => Some(Place { uv: uv_at(x[0], x[1]), cct_k: x[0] }),
            Piece::Polygon { cct_k, .. } => {
                let uv = Uv { u: x[0], v: x[1] };
                cct_duv(uv).map(|c| Place { uv, cct_k: c.cct_k.clamp(cct_k[0], cct_k[1]) })
            }
        }
    }

    /// Outline in CIE 1960 uv.
    pub(crate) fn outline(&self) -> Vec<[f64; 2]> {
        match self {
            Piece::Box { cct_k, duv } => {
                let n = 24;
                let mut out = Vec::new();
                let at = |k: f64, d: f64| {
                    let p = uv_at(k, d);
                    [p.u, p.v]
                };
                for i in 0..=n {
                    out.push(at(cct_k[0] + (cct_k[1] - cct_k[0]) * f64::from(i) / f64::from(n), duv[0]));
                }
                for i in (0..=n).rev() {
                    out.push(at(cct_k[0] + (cct_k[1] - cct_k[0]) * f64::from(i) / f64::from(n), duv[1]));
                }
                out
            }
            Piece::Polygon { corners, .. } => corners.clone(),
        }
    }
}

/// How good a white is: whites with a blend before whites without, whites outside the gamut last.
#[derive(Clone, Debug)]
struct Mark {
    rank: u8,
    value: f64,
    shares: Vec<f64>,
    x: [f64; 2],
}

impl Mark {
    fn beats(&self, other: &Mark) -> bool {
        (self.rank, self.value) > (other.rank, other.value)
    }
}

fn judge(
    problem: &Problem,
    piece: &Piece,
    x: [f64; 2],
    warm: &[Vec<f64>],
    starts: Option<usize>,
    control: &Control<'_>,
) -> Option<Mark> {
    let place = piece.place(x)?;
    let reference = Reference::at(place.cct_k);
    let plan = Plan { starts, ..Plan::of(problem).unproven() };
    let mark = |rank, value, shares| Some(Mark { rank, value, shares, x });
    match solve_at(problem, place.uv, &reference, problem.maximise.into(), true, warm, plan, control) {
        Ok(f) => match (&f.best, &f.nearest) {
            (Some(b), _) => mark(2, b.objective, f.ask.shares(&b.t)),
            (None, Some(n)) => mark(1, -n.short, f.ask.shares(&n.t)),
            _ => mark(0, 0.0, Vec::new()),
        },
        Err(NoSpace::Rows) => mark(1, -1e6, Vec::new()),
        Err(NoSpace::White) => mark(0, 0.0, Vec::new()),
    }
}

/// The best white of a piece, without proof.
fn search(problem: &Problem, piece: &Piece, control: &Control<'_>) -> Option<Mark> {
    let (low, size) = piece.frame();
    let steps = |k: usize| if size[k] > 0.0 { GRID } else { 0 };
    let mut points: Vec<[f64; 2]> = Vec::new();
    for i in 0..=steps(0) {
        for j in 0..=steps(1) {
            let f = |k: usize, i: usize| {
                if steps(k) == 0 { low[k] } else { low[k] + size[k] * i as f64 / steps(k) as f64 }
            };
            let x = [f(0, i), f(1, j)];
            if matches!(piece, Piece::Box { .. })
                || (piece.project(x)[0] - x[0]).hypot(piece.project(x)[1] - x[1]) < 1e-12
            {
                points.push(x);
            }
        }
    }
    if let Piece::Polygon { corners, .. } = piece {
        points.extend(corners.iter().step_by((corners.len() / 12).max(1)));
    }
    let marks: Vec<Mark> =
        points.par_iter().filter_map(|x| judge(problem, piece, *x, &[], Some(4), control)).collect();
    let mut order: Vec<usize> = (0..marks.len()).collect();
    order.sort_by(|&a, &b| {
        (marks[b].rank, marks[b].value)
            .partial_cmp(&(marks[a].rank, marks[a].value))
            .unwrap_or(std::cmp::Ordering::Equal)
            .then(a.cmp(&b))
    });
    let refined: Vec<Mark> = order
        .iter()
        .take(3)
        .collect::<Vec<_>>()
        .par_iter()
        .map(|&&i| compass(problem, piece, marks[i].clone(), size, control))
        .collect();
    refined.into_iter().reduce(|a, b| if b.beats(&a) { b } else { a })
}

/// Steps in eight directions, halved when none is better.
fn compass(problem: &Problem, piece: &Piece, start: Mark, size: [f64; 2], control: &Control<'_>) -> Mark {
    const WAYS: [[f64; 2]; 8] = [
        [1.0, 0.0],
        [-1.0, 0.0],
        [0.0, 1.0],
        [0.0, -1.0],
        [1.0, 1.0],
        [-1.0, -1.0],
        [1.0, -1.0],
        [-1.0, 1.0],
    ];
    let mut best = start;
    let mut step = 0.5 / GRID as f64;
    let mut halvings = 0;
    while halvings < HALVINGS && !control.stop() {
        let mut moved = false;
        for way in WAYS {
            let to =
                piece.project([best.x[0] + way[0] * step * size[0], best.x[1] + way[1] * step * size[1]]);
            if (to[0] - best.x[0]).abs() <= 1e-12 * size[0] && (to[1] - best.x[1]).abs() <= 1e-12 * size[1] {
                continue;
            }
            let warm = if best.shares.is_empty() { Vec::new() } else { vec![best.shares.clone()] };
            let starts = if warm.is_empty() { None } else { Some(0) };
            if let Some(m) = judge(problem, piece, to, &warm, starts, control)
                && m.beats(&best)
            {
                best = m;
                moved = true;
                break;
            }
        }
        if !moved {
            step *= 0.5;
            halvings += 1;
        }
    }
    best
}

/// Solves a problem whose white may move.
pub(crate) fn solve_region(problem: &Problem, plan: Plan, control: &Control<'_>) -> Outcome {
    let pieces = pieces(problem);
    let mut best: Option<(Mark, &Piece)> = None;
    for (k, piece) in pieces.iter().enumerate() {
        if let Some(m) = search(problem, piece, control)
            && best.as_ref().is_none_or(|(b, _)| m.beats(b))
        {
            best = Some((m, piece));
        }
        (control.progress)(0.5 * (k + 1) as f32 / pieces.len() as f32);
    }
    let Some((mark, piece)) = best else {
        return Outcome::Infeasible(outside(problem, &outline_of(&pieces)));
    };
    let Some(place) = piece.place(mark.x) else {
        return Outcome::Infeasible(outside(problem, &outline_of(&pieces)));
    };
    if mark.rank < 2 {
        if mark.rank == 0 {
            let out = outside(problem, &outline_of(&pieces));
            if out.nearest.distance_uv1960 > 0.0 {
                return Outcome::Infeasible(out);
            }
        }
        // explained at the white that comes nearest
        let reference = Reference::at(place.cct_k);
        let found = solve_at(
            problem,
            place.uv,
            &reference,
            problem.maximise.into(),
            true,
            &[],
            plan.unproven(),
            control,
        );
        let mut why = explain(problem, place.uv, &reference, &found, plan, control);
        why.proven = false;
        if plan.boxes > 0 {
            let proof = bound_region(problem, &pieces, f64::NEG_INFINITY, plan, control);
            why.proven = proof.upper == f64::NEG_INFINITY;
            why.boxes += proof.boxes;
            why.stopped_by = proof.stop;
        }
        return Outcome::Infeasible(why);
    }
    // a last full search at the white found
    let reference = Reference::at(place.cct_k);
    let shares = match solve_at(
        problem,
        place.uv,
        &reference,
        problem.maximise.into(),
        true,
        std::slice::from_ref(&mark.shares),
        plan.unproven(),
        control,
    ) {
        Ok(f) => f.best.as_ref().map(|b| f.ask.shares(&b.t)),
        Err(_) => None,
    }
    .unwrap_or(mark.shares);
    let mut solution: Solution = finish(problem, shares, f64::INFINITY, 0, None, &reference);
    if plan.boxes > 0 {
        let proof = bound_region(problem, &pieces, solution.objective, plan, control);
        solution = finish(problem, solution.shares, proof.upper, proof.boxes, proof.stop, &reference);
    }
    if on_edge(piece, mark.x) {
        solution.held_by.push(Binding::Region);
    }
    (control.progress)(1.0);
    Outcome::Optimal(solution)
}

fn on_edge(piece: &Piece, x: [f64; 2]) -> bool {
    let (_, size) = piece.frame();
    let e = [1e-4 * size[0], 1e-4 * size[1]];
    [[e[0], 0.0], [-e[0], 0.0], [0.0, e[1]], [0.0, -e[1]]].iter().any(|m| {
        let y = [x[0] + m[0], x[1] + m[1]];
        let p = piece.project(y);
        (p[0] - y[0]).abs() > 0.5 * e[0] || (p[1] - y[1]).abs() > 0.5 * e[1]
    })
}

fn outline_of(pieces: &[Piece]) -> Vec<[f64; 2]> {
    // pieces of one region join along an isotherm: their outlines together, as one ring, serve for distances
    let mut all: Vec<[f64; 2]> = pieces.iter().flat_map(Piece::outline).collect();
    let n = all.len().max(1) as f64;
    let c = [all.iter().map(|p| p[0]).sum::<f64>() / n, all.iter().map(|p| p[1]).sum::<f64>() / n];
    all.sort_by(|a, b| (a[1] - c[1]).atan2(a[0] - c[0]).total_cmp(&(b[1] - c[1]).atan2(b[0] - c[0])));
    all
}
