//! A small dense linear programme with box bounds, by the dual simplex method.
//!
//! maximise c·x subject to A x ≤ b and low ≤ x ≤ high, every variable boxed. Starting from the corner of the box that is
//! best for c, the tableau is dual feasible from the first pivot on: the objective only falls, so the work can stop as
//! soon as it drops under a value of interest.

/// How a programme ended.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) enum LpEnd {
    /// The optimum value; the point is in [`Lp::point`].
    Optimal(f64),
    /// The optimum is known to lie below the stop value.
    Below,
    /// No point satisfies the rows.
    Empty,
    /// Too many pivots (numerical trouble): nothing is known.
    Unknown,
}

/// Reusable storage of a programme: set the sizes, fill rows, run.
#[derive(Clone, Debug, Default)]
pub(crate) struct Lp {
    /// Variables.
    d: usize,
    /// Rows used.
    m: usize,
    stride: usize,
    /// A, row by row; kept unchanged by a run.
    a: Vec<f64>,
    b: Vec<f64>,
    low: Vec<f64>,
    high: Vec<f64>,
    // working copy
    t: Vec<f64>,
    beta: Vec<f64>,
    z: Vec<f64>,
    row_var: Vec<usize>,
    col_var: Vec<usize>,
    at_high: Vec<bool>,
    x: Vec<f64>,
}

const FEASIBLE: f64 = 1e-10;
const PIVOT: f64 = 1e-11;

impl Lp {
    /// Starts a programme of `d` variables inside a box, without rows.
    pub(crate) fn begin(&mut self, low: &[f64], high: &[f64]) {
        self.d = low.len();
        self.stride = self.d.next_multiple_of(4).max(4);
        self.m = 0;
        self.a.clear();
        self.b.clear();
        self.low.clear();
        self.low.extend_from_slice(low);
        self.high.clear();
        self.high.extend_from_slice(high);
    }

    /// Replaces the box, keeping the rows.
    pub(crate) fn set_box(&mut self, low: &[f64], high: &[f64]) {
        self.low.copy_from_slice(low);
        self.high.copy_from_slice(high);
    }

    /// Adds the row a·x ≤ b.
    pub(crate) fn row(&mut self, a: &[f64], b: f64) {
        debug_assert_eq!(a.len(), self.d);
        self.a.extend_from_slice(a);
        self.a.resize((self.m + 1) * self.stride, 0.0);
        self.b.push(b);
        self.m += 1;
    }

    /// The optimal point of the last run that ended [`LpEnd::Optimal`].
    pub(crate) fn point(&self) -> &[f64] {
        &self.x
    }

    /// Maximises c·x; stops early once the value is below `stop`.
    pub(crate) fn maximise(&mut self, c: &[f64], stop: f64) -> LpEnd {
        let (d, m, w) = (self.d, self.m, self.stride);
        self.t.clear();
        self.t.extend_from_slice(&self.a);
        self.beta.clear();
        self.z.clear();
        self.z.extend_from_slice(c);
        self.z.resize(w, 0.0);
        self.row_var.clear();
        self.row_var.extend(d..d + m);
        self.col_var.clear();
        self.col_var.extend(0..d);
        self.at_high.clear();
        self.at_high.extend(c.iter().map(|&c| c > 0.0));
        self.x.clear();
        let mut value = 0.0;
        for j in 0..d {
            let v = if self.at_high[j] { self.high[j] } else { self.low[j] };
            self.x.push(v);
            value += c[j] * v;
        }
        for i in 0..m {
            let row = &self.t[i * w..i * w + d];
            let s: f64 = row.iter().zip(&self.x).map(|(a, x)| a * x).sum();
            self.beta.push(self.b[i] - s);
        }
        // Nonbasic values live in `x[j]` by column; basic values in `beta` by row.
        let limit = 60 + 20 * (m + d);
        for _ in 0..limit {
            let mut r = m;
            let mut worst = FEASIBLE;
            for i in 0..m {
                let v = self.row_var[i];
                let short = if v < d {
                    (self.low[v] - self.beta[i]).max(self.beta[i] - self.high[v])
                } else {
                    -self.beta[i]
                };
                if short > worst {
                    worst = short;
                    r = i;
                }
            }
            if r == m {
                self.collect();
                return LpEnd::Optimal(value);
            }
            if value < stop {
                return LpEnd::Below;
            }
            let v = self.row_var[r];
            let (to, to_high) = if v < d {
                if self.beta[r] < self.low[v] { (self.low[v], false) } else { (self.high[v], true) }
            } else {
                (0.0, false)
            };
            // basic = const − Σ t_rj x_j; it must move by `step`
            let step = to - self.beta[r];
            let mut e = d;
            let (mut best, mut size) = (f64::INFINITY, 0.0);
            for j in 0..d {
                let a = self.t[r * w + j];
                if a.abs() < PIVOT {
                    continue;
                }
                // x_j may rise when at its low end, fall when at its high end
                let rises = (step > 0.0) == (a < 0.0);
                if rises == self.at_high[j] {
                    continue;
                }
                let q = self.z[j].abs() / a.abs();
                if q < best - 1e-15 || (q <= best + 1e-15 && a.abs() > size) {
                    best = q;
                    size = a.abs();
                    e = j;
                }
            }
            if e == d {
                return LpEnd::Empty;
            }
            let pivot = self.t[r * w + e];
            let move_e = -step / pivot;
            value += self.z[e] * move_e;
            for i in 0..m {
                self.beta[i] -= self.t[i * w + e] * move_e;
            }
            self.beta[r] = self.x[e] + move_e;
            self.x[e] = to;
            self.at_high[e] = to_high;
            std::mem::swap(&mut self.row_var[r], &mut self.col_var[e]);
            self.pivot(r, e, pivot);
        }
        LpEnd::Unknown
    }

    fn pivot(&mut self, r: usize, e: usize, pivot: f64) {
        let w = self.stride;
        let inv = 1.0 / pivot;
        let (above, rest) = self.t.split_at_mut(r * w);
        let (row, below) = rest.split_at_mut(w);
        for a in row.iter_mut() {
            *a *= inv;
        }
        row[e] = inv;
        for other in above.chunks_exact_mut(w).chain(below.chunks_exact_mut(w)) {
            let f = other[e];
            if f != 0.0 {
                for (o, p) in other.iter_mut().zip(row.iter()) {
                    *o -= f * p;
                }
                other[e] = -f * inv;
            }
        }
        // z: objective = z0 + Σ z_j x_j, and x_e = const − Σ row_j x_j
        let f = self.z[e];
        if f != 0.0 {
            for (o, p) in self.z.iter_mut().zip(row.iter()) {
                *o -= f * p;
            }
            self.z[e] = -f * inv;
        }
    }

    fn collect(&mut self) {
        let d = self.d;
        let mut x = vec![0.0; d];
        for j in 0..d {
            if self.col_var[j] < d {
                x[self.col_var[j]] = self.x[j];
            }
        }
        for (i, &v) in self.row_var.iter().enumerate() {
            if v < d {
                x[v] = self.beta[i];
            }
        }
        self.x.copy_from_slice(&x);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn a_square_cut_by_a_diagonal() {
        let mut lp = Lp::default();
        lp.begin(&[0.0, 0.0], &[1.0, 1.0]);
        lp.row(&[1.0, 1.0], 1.5);
        assert_eq!(lp.maximise(&[1.0, 2.0], f64::NEG_INFINITY), LpEnd::Optimal(2.5));
        assert_eq!(lp.point(), &[0.5, 1.0]);
        // a corner of the box already shows that 3.1 is out of reach
        lp.row(&[1.0, 1.0], 1.2);
        lp.row(&[0.0, 1.0], 0.1);
        assert_eq!(lp.maximise(&[1.0, 2.0], 3.1), LpEnd::Below);
        lp.row(&[-1.0, -1.0], -1.6);
        assert_eq!(lp.maximise(&[1.0, 2.0], f64::NEG_INFINITY), LpEnd::Empty);
    }

    proptest! {
        /// Against every vertex of the arrangement, by brute force in two dimensions.
        #[test]
        fn the_optimum_is_the_best_vertex(
            rows in prop::collection::vec((-1.0f64..1.0, -1.0f64..1.0, -0.5f64..1.0), 1..6),
            c in (-1.0f64..1.0, -1.0f64..1.0),
        ) {
            let mut lp = Lp::default();
            lp.begin(&[-1.0, -1.0], &[1.0, 1.0]);
            let mut all: Vec<(f64, f64, f64)> =
                vec![(1.0, 0.0, 1.0), (-1.0, 0.0, 1.0), (0.0, 1.0, 1.0), (0.0, -1.0, 1.0)];
            for &(a, b, r) in &rows {
                lp.row(&[a, b], r);
                all.push((a, b, r));
            }
            let mut best = f64::NEG_INFINITY;
            for i in 0..all.len() {
                for j in 0..i {
                    let (p, q) = (all[i], all[j]);
                    let det = p.0 * q.1 - p.1 * q.0;
                    if det.abs() < 1e-9 { continue; }
                    let (x, y) = ((p.2 * q.1 - p.1 * q.2) / det, (p.0 * q.2 - p.2 * q.0) / det);
                    if all.iter().all(|r| r.0 * x + r.1 * y <= r.2 + 1e-9) {
                        best = best.max(c.0 * x + c.1 * y);
                    }
                }
            }
            match lp.maximise(&[c.0, c.1], f64::NEG_INFINITY) {
                LpEnd::Optimal(v) => prop_assert!((v - best).abs() < 1e-7, "{v} {best}"),
                LpEnd::Empty => prop_assert!(best == f64::NEG_INFINITY, "{best}"),
                other => prop_assert!(false, "{other:?}"),
            }
        }
    }
}
