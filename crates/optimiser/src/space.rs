//! The blends of a set at one exact white: a polytope in few dimensions.
//!
//! A blend is written as watts per unit of Y, p ≥ 0. The white fixes three linear equalities, every lock one more; what is left
//! is p = origin + Σ tⱼ directionⱼ with the tⱼ free inside linear rows (p ≥ 0, share bounds, LER, the caller's rows). The axes are those of
//! the spread of the polytope's corners, its box is their extent.

use crate::models::MOST;
use crate::simplex::{Lp, LpEnd};

/// A linear condition a·t ≤ b on the free directions.
#[derive(Clone, Debug)]
pub(crate) struct FreeRow {
    pub(crate) a: Vec<f64>,
    pub(crate) b: f64,
}

/// A linear condition c·p ≤ b on the watts per unit Y.
#[derive(Clone, Debug)]
pub(crate) struct WattRow {
    pub(crate) c: Vec<f64>,
    pub(crate) b: f64,
}

/// The polytope.
#[derive(Clone, Debug)]
pub(crate) struct Space {
    /// Emitters.
    pub(crate) n: usize,
    /// Free directions.
    pub(crate) d: usize,
    /// The white: X, 1, Z (the greatest of them where the white may move).
    pub(crate) white: [f64; 3],
    /// A point of the polytope (a mean of corners).
    pub(crate) origin: Vec<f64>,
    /// Directions, one after the other, orthonormal.
    basis: Vec<f64>,
    /// Rows a·t ≤ b.
    pub(crate) rows: Vec<FreeRow>,
    /// Extent of the polytope.
    pub(crate) low: Vec<f64>,
    pub(crate) high: Vec<f64>,
    /// Corners found while measuring the extent, as t.
    pub(crate) corners: Vec<Vec<f64>>,
}

/// Why there is no polytope.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum NoSpace {
    /// The white cannot be mixed at all (or not within the share bounds).
    White,
    /// The white can be mixed, but not within the linear limits (LER, efficacy, the caller's rows).
    Rows,
}

/// The white of a space.
#[derive(Clone, Copy)]
pub(crate) enum WhiteWanted<'a> {
    /// Exactly X, 1, Z.
    Exact([f64; 3]),
    /// Anywhere inside half-planes g·(u, v) ≤ c of CIE 1960; the second is the greatest X, 1, Z in there.
    Within(&'a [([f64; 2], f64)], [f64; 3]),
}

/// Equalities and bounds handed in.
pub(crate) struct SpaceInput<'a> {
    /// 2° XYZ of each emitter at unit power.
    pub(crate) xyz: &'a [[f64; 3]],
    /// The white wanted.
    pub(crate) white: WhiteWanted<'a>,
    /// Share bounds of each emitter.
    pub(crate) bounds: &'a [(f64, f64)],
    /// Further rows.
    pub(crate) rows: &'a [WattRow],
}

const LOCKED: f64 = 1e-12;

impl Space {
    /// Builds the polytope, or says why there is none.
    pub(crate) fn new(input: &SpaceInput<'_>) -> Result<Space, NoSpace> {
        let n = input.xyz.len();
        // Orthonormal equalities by modified Gram–Schmidt, right-hand sides carried along.
        let mut q: Vec<(Vec<f64>, f64)> = Vec::new();
        let mut consistent = true;
        let mut equality = |mut a: Vec<f64>, mut b: f64| {
            let size = norm(&a).max(1e-300);
            let size_b = b.abs().max(size);
            for _ in 0..2 {
                for (e, r) in &q {
                    let s = inner(e, &a);
                    for (x, y) in a.iter_mut().zip(e) {
                        *x -= s * y;
                    }
                    b -= s * r;
                }
            }
            let left = norm(&a);
            if left > 1e-9 * size {
                q.push((a.iter().map(|x| x / left).collect(), b / left));
            } else if b.abs() > 1e-9 * size_b {
                consistent = false;
            }
        };
        let w = match input.white {
            WhiteWanted::Exact(w) | WhiteWanted::Within(_, w) => w,
        };
        equality(input.xyz.iter().map(|x| x[1]).collect(), w[1]);
        if let WhiteWanted::Exact(_) = input.white {
            equality(input.xyz.iter().map(|x| x[0]).collect(), w[0]);
            equality(input.xyz.iter().map(|x| x[2]).collect(), w[2]);
        }
        for i in 0..n {
            let (lo, hi) = input.bounds[i];
            if hi - lo <= LOCKED {
                // pᵢ − s Σp = 0
                equality((0..n).map(|j| f64::from(i == j) - lo).collect(), 0.0);
            }
        }
        if !consistent {
            return Err(NoSpace::White);
        }
        let rank = q.len();
        let d = n - rank;
        if d > MOST {
            return Err(NoSpace::White);
        }
        let particular: Vec<f64> = (0..n).map(|i| q.iter().map(|(e, r)| e[i] * r).sum()).collect();
        let mut basis: Vec<Vec<f64>> = Vec::with_capacity(d);
        while basis.len() < d {
            // the unit vector that keeps most of itself
            let mut best: (f64, Vec<f64>) = (0.0, Vec::new());
            for i in 0..n {
                let mut v = vec![0.0; n];
                v[i] = 1.0;
                for _ in 0..2 {
                    for e in q.iter().map(|(e, _)| e).chain(&basis) {
                        let s = inner(e, &v);
                        for (x, y) in v.iter_mut().zip(e) {
                            *x -= s * y;
                        }
                    }
                }
                let size = norm(&v);
                if size > best.0 + 1e-12 {
                    best = (size, v);
                }
            }
            let size = best.0;
            basis.push(best.1.into_iter().map(|x| x / size).collect());
        }
        let basis: Vec<f64> = basis.concat();
        // No emitter can give more of X, Y or Z than the white has.
        let most: Vec<f64> = input
            .xyz
            .iter()
            .map(|x| {
                (0..3).filter(|&k| x[k] > 1e-12).map(|k| w[k] / x[k]).fold(f64::INFINITY, f64::min).min(1e6)
            })
            .collect();
        let total: f64 = most.iter().sum();
        let mut space = Space {
            n,
            d,
            white: w,
            origin: particular,
            basis,
            rows: Vec::new(),
            low: vec![-1.0; d],
            high: vec![1.0; d],
            corners: Vec::new(),
        };
        for j in 0..d {
            let dir = space.direction(j);
            let at = inner(dir, &space.origin);
            let (mut lo, mut hi) = (-at, -at);
            for (x, m) in dir.iter().zip(&most) {
                if *x > 0.0 {
                    hi += x * m;
                } else {
                    lo += x * m;
                }
            }
            let slack = 1e-9 * (1.0 + hi - lo);
            space.low[j] = lo - slack;
            space.high[j] = hi + slack;
        }
        let mut rows: Vec<WattRow> = Vec::new();
        for i in 0..n {
            let (lo, hi) = input.bounds[i];
            if hi - lo <= LOCKED {
                continue;
            }
            rows.push(WattRow { c: (0..n).map(|j| lo - f64::from(i == j)).collect(), b: 0.0 });
            if hi < 1.0 {
                rows.push(WattRow { c: (0..n).map(|j| f64::from(i == j) - hi).collect(), b: 0.0 });
            }
        }
        // locks that turned out dependent may still leave a negative share
        for i in 0..n {
            if input.bounds[i].1 - input.bounds[i].0 <= LOCKED {
                rows.push(WattRow { c: (0..n).map(|j| -f64::from(i == j)).collect(), b: 1e-9 });
            }
        }
        if let WhiteWanted::Within(sides, _) = input.white {
            for (g, c) in sides {
                // g·(4X, 6Y) − c (X + 15Y + 3Z) ≤ 0
                let of = |x: &[f64; 3]| {
                    4.0 * g[0] * x[0] + 6.0 * g[1] * x[1] - c * (x[0] + 15.0 * x[1] + 3.0 * x[2])
                };
                rows.push(WattRow { c: input.xyz.iter().map(of).collect(), b: 0.0 });
            }
        }
        let white_rows = rows.len();
        rows.extend(input.rows.iter().cloned());
        if d == 0 {
            for (k, row) in rows.iter().enumerate() {
                let v = inner(&row.c, &space.origin) - row.b;
                let scale = 1e-9 * (1.0 + total.min(1e3));
                if v > scale {
                    return Err(if k < white_rows { NoSpace::White } else { NoSpace::Rows });
                }
            }
            for x in &mut space.origin {
                *x = x.max(0.0);
            }
            return Ok(space);
        }
        let to_free = |s: &Space, row: &WattRow| FreeRow {
            a: (0..s.d).map(|j| inner(&row.c, s.direction(j))).collect(),
            b: row.b - inner(&row.c, &s.origin),
        };
        space.rows = rows.iter().map(|r| to_free(&space, r)).collect();
        let mut lp = Lp::default();
        lp.begin(&space.low, &space.high);
        for r in &space.rows[..white_rows] {
            lp.row(&r.a, r.b);
        }
        let zero = vec![0.0; d];
        if !matches!(lp.maximise(&zero, f64::NEG_INFINITY), LpEnd::Optimal(_)) {
            return Err(NoSpace::White);
        }
        for r in &space.rows[white_rows..] {
            lp.row(&r.a, r.b);
        }
        if !matches!(lp.maximise(&zero, f64::NEG_INFINITY), LpEnd::Optimal(_)) {
            return Err(NoSpace::Rows);
        }
        // Corners: most and least of every emitter.
        let mut corners: Vec<Vec<f64>> = Vec::new();
        for i in 0..n {
            for sign in [1.0, -1.0] {
                let c: Vec<f64> = (0..d).map(|j| sign * space.basis[j * n + i]).collect();
                if let LpEnd::Optimal(_) = lp.maximise(&c, f64::NEG_INFINITY) {
                    let t = lp.point().to_vec();
                    if !corners.iter().any(|k| k.iter().zip(&t).all(|(a, b)| (a - b).abs() < 1e-9)) {
                        corners.push(t);
                    }
                }
            }
        }
        space.recentre(&corners);
        space.rows = rows.iter().map(|r| to_free(&space, r)).collect();
        space.extent(&mut lp);
        Ok(space)
    }

    /// Moves the origin to the mean of the corners and turns the axes along their spread.
    fn recentre(&mut self, corners: &[Vec<f64>]) {
        let (n, d) = (self.n, self.d);
        let k = corners.len().max(1) as f64;
        let mean: Vec<f64> = (0..d).map(|j| corners.iter().map(|c| c[j]).sum::<f64>() / k).collect();
        let spread = nalgebra::DMatrix::from_fn(d, d, |a, b| {
            corners.iter().map(|c| (c[a] - mean[a]) * (c[b] - mean[b])).sum::<f64>() / k
        });
        let eigen = nalgebra::SymmetricEigen::new(spread);
        let mut order: Vec<usize> = (0..d).collect();
        order.sort_by(|&a, &b| eigen.eigenvalues[b].total_cmp(&eigen.eigenvalues[a]));
        let mut basis = Vec::with_capacity(n * d);
        for &c in &order {
            // a fixed sign, so that the axes do not depend on the library's taste
            let column = eigen.eigenvectors.column(c);
            let largest =
                column.iter().copied().fold(0.0, |m: f64, x| if x.abs() > m.abs() + 1e-12 { x } else { m });
            let sign = if largest < 0.0 { -1.0 } else { 1.0 };
            for i in 0..n {
                basis.push(sign * (0..d).map(|j| column[j] * self.basis[j * n + i]).sum::<f64>());
            }
        }
        self.origin = self.watts(&mean);
        self.basis = basis;
        self.corners = corners
            .iter()
            .map(|c| {
                (0..d)
                    .map(|a| {
                        let column = eigen.eigenvectors.column(order[a]);
                        let sign = {
                            let largest = column
                                .iter()
                                .copied()
                                .fold(0.0, |m: f64, x| if x.abs() > m.abs() + 1e-12 { x } else { m });
                            if largest < 0.0 { -1.0 } else { 1.0 }
                        };
                        sign * (0..d).map(|j| column[j] * (c[j] - mean[j])).sum::<f64>()
                    })
                    .collect()
            })
            .collect();
    }

    fn extent(&mut self, lp: &mut Lp) {
        let d = self.d;
        let reach: f64 = self.low.iter().zip(&self.high).map(|(l, h)| (h - l) * (h - l)).sum::<f64>().sqrt();
        let (lo, hi) = (vec![-reach; d], vec![reach; d]);
        lp.begin(&lo, &hi);
        for r in &self.rows {
            lp.row(&r.a, r.b);
        }
        let mut c = vec![0.0; d];
        for j in 0..d {
            let (mut low, mut high) = (-reach, reach);
            c[j] = 1.0;
            if let LpEnd::Optimal(v) = lp.maximise(&c, f64::NEG_INFINITY) {
                high = v;
                self.corners.push(lp.point().to_vec());
            }
            c[j] = -1.0;
            if let LpEnd::Optimal(v) = lp.maximise(&c, f64::NEG_INFINITY) {
                low = -v;
                self.corners.push(lp.point().to_vec());
            }
            c[j] = 0.0;
            self.low[j] = low - 1e-10;
            self.high[j] = high + 1e-10;
        }
        let mut kept: Vec<Vec<f64>> = Vec::new();
        for t in self.corners.drain(..) {
            if !kept.iter().any(|k| k.iter().zip(&t).all(|(a, b)| (a - b).abs() < 1e-8)) {
                kept.push(t);
            }
        }
        self.corners = kept;
    }

    /// Direction j as watts of each emitter.
    pub(crate) fn direction(&self, j: usize) -> &[f64] {
        &self.basis[j * self.n..(j + 1) * self.n]
    }

    /// Watts per unit Y at a point.
    pub(crate) fn watts(&self, t: &[f64]) -> Vec<f64> {
        let mut p = self.origin.clone();
        for (j, t) in t.iter().enumerate() {
            for (x, y) in p.iter_mut().zip(self.direction(j)) {
                *x += t * y;
            }
        }
        p
    }

    /// The free coordinates nearest to given watts.
    pub(crate) fn free(&self, watts: &[f64]) -> Vec<f64> {
        (0..self.d)
            .map(|j| {
                self.direction(j).iter().zip(watts).zip(&self.origin).map(|((e, p), o)| e * (p - o)).sum()
            })
            .collect()
    }

    /// Linear costs on watts, as a constant and a slope on the free directions.
    pub(crate) fn linear(&self, cost: &[f64]) -> (f64, Vec<f64>) {
        (inner(cost, &self.origin), (0..self.d).map(|j| inner(cost, self.direction(j))).collect())
    }
}

pub(crate) fn inner(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(x, y)| x * y).sum()
}

fn norm(a: &[f64]) -> f64 {
    inner(a, a).sqrt()
}
