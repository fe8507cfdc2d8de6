//! A small strictly convex quadratic programme by the dual active-set method (Goldfarb and Idnani, Mathematical Programming 27, 1983).
//!
//! minimise ½ xᵀG x + g·x subject to aᵢ·x ≥ bᵢ. Sizes here are a dozen or two, so everything is dense.

/// How the programme ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum QpEnd {
    /// Optimal point found.
    Optimal,
    /// No point satisfies the constraints, or G is not positive definite.
    Failed,
}

/// Reusable storage; fill `g_matrix`, `g`, `a`, `b`, then [`Qp::solve`].
#[derive(Clone, Debug, Default)]
pub(crate) struct Qp {
    /// Variables.
    pub(crate) n: usize,
    /// G, row by row.
    pub(crate) matrix: Vec<f64>,
    /// Linear term.
    pub(crate) linear: Vec<f64>,
    /// Constraint rows, row by row.
    pub(crate) a: Vec<f64>,
    /// Right-hand sides.
    pub(crate) b: Vec<f64>,
    /// The solution.
    pub(crate) x: Vec<f64>,
    /// Multiplier of each constraint (0 when inactive).
    pub(crate) multipliers: Vec<f64>,
    l: Vec<f64>,
    j: Vec<f64>,
    r: Vec<f64>,
    d: Vec<f64>,
    z: Vec<f64>,
    step: Vec<f64>,
    u: Vec<f64>,
    active: Vec<usize>,
    inside: Vec<bool>,
}

impl Qp {
    /// Starts a programme of `n` variables with zero terms.
    pub(crate) fn begin(&mut self, n: usize) {
        self.n = n;
        self.matrix.clear();
        self.matrix.resize(n * n, 0.0);
        self.linear.clear();
        self.linear.resize(n, 0.0);
        self.a.clear();
        self.b.clear();
    }

    /// Adds the constraint a·x ≥ b.
    pub(crate) fn at_least(&mut self, a: &[f64], b: f64) {
        debug_assert_eq!(a.len(), self.n);
        self.a.extend_from_slice(a);
        self.b.push(b);
    }

    fn factor(&mut self) -> bool {
        let n = self.n;
        self.l.clear();
        self.l.resize(n * n, 0.0);
        for i in 0..n {
            for k in 0..=i {
                let mut s = self.matrix[i * n + k];
                for q in 0..k {
                    s -= self.l[i * n + q] * self.l[k * n + q];
                }
                if i == k {
                    if s <= 1e-14 {
                        return false;
                    }
                    self.l[i * n + i] = s.sqrt();
                } else {
                    self.l[i * n + k] = s / self.l[k * n + k];
                }
            }
        }
        // J = L⁻ᵀ: column c of J solves Lᵀ J e_c = e_c
        self.j.clear();
        self.j.resize(n * n, 0.0);
        for c in 0..n {
            for i in (0..n).rev() {
                let mut s = f64::from(i == c);
                for q in i + 1..n {
                    s -= self.l[q * n + i] * self.j[q * n + c];
                }
                self.j[i * n + c] = s / self.l[i * n + i];
            }
        }
        true
    }

    /// Solves; on success `x` and `multipliers` hold the answer.
    pub(crate) fn solve(&mut self) -> QpEnd {
        let n = self.n;
        let m = self.b.len();
        if !self.factor() {
            return QpEnd::Failed;
        }
        // x = −J Jᵀ g
        self.d.clear();
        self.d.resize(n, 0.0);
        for c in 0..n {
            self.d[c] = (0..n).map(|i| self.j[i * n + c] * self.linear[i]).sum();
        }
        self.x.clear();
        for i in 0..n {
            let v: f64 = (0..n).map(|c| self.j[i * n + c] * self.d[c]).sum();
            self.x.push(-v);
        }
        self.r.clear();
        self.r.resize(n * n, 0.0);
        self.z.clear();
        self.z.resize(n, 0.0);
        self.step.clear();
        self.step.resize(n, 0.0);
        self.u.clear();
        self.active.clear();
        self.inside.clear();
        self.inside.resize(m, false);
        self.multipliers.clear();
        self.multipliers.resize(m, 0.0);
        let scale: Vec<f64> = (0..m)
            .map(|i| self.a[i * n..(i + 1) * n].iter().map(|a| a * a).sum::<f64>().sqrt().max(1e-300))
            .collect();
        for _ in 0..60 + 10 * (m + n) {
            let mut pick = m;
            let mut worst = -1e-11;
            for i in 0..m {
                if self.inside[i] {
                    continue;
                }
                let s = (self.dot(i) - self.b[i]) / scale[i];
                if s < worst {
                    worst = s;
                    pick = i;
                }
            }
            if pick == m {
                for (&i, &u) in self.active.iter().zip(&self.u) {
                    self.multipliers[i] = u;
                }
                return QpEnd::Optimal;
            }
            let mut u_new = 0.0;
            loop {
                let q = self.active.len();
                for c in 0..n {
                    self.d[c] = (0..n).map(|i| self.j[i * n + c] * self.a[pick * n + i]).sum();
                }
                for i in 0..n {
                    self.z[i] = (q..n).map(|c| self.j[i * n + c] * self.d[c]).sum();
                }
                for i in (0..q).rev() {
                    let s: f64 = (i + 1..q).map(|c| self.r[i * n + c] * self.step[c]).sum();
                    self.step[i] = (self.d[i] - s) / self.r[i * n + i];
                }
                let (mut t1, mut drop) = (f64::INFINITY, q);
                for i in 0..q {
                    if self.step[i] > 1e-14 {
                        let t = self.u[i] / self.step[i];
                        if t < t1 {
                            t1 = t;
                            drop = i;
                        }
                    }
                }
                let zz: f64 = self.z.iter().map(|z| z * z).sum();
                let along: f64 = (0..n).map(|i| self.z[i] * self.a[pick * n + i]).sum();
                let t2 = if zz.sqrt() > 1e-13 * scale[pick] && along > 0.0 {
                    (self.b[pick] - self.dot(pick)) / along
                } else {
                    f64::INFINITY
                };
                let t = t1.min(t2);
                if !t.is_finite() {
                    return QpEnd::Failed;
                }
                for i in 0..q {
                    self.u[i] -= t * self.step[i];
                }
                u_new += t;
                if t2.is_finite() {
                    for i in 0..n {
                        self.x[i] += t * self.z[i];
                    }
                }
                if t2 <= t1 {
                    if !self.add(q) {
                        return QpEnd::Failed;
                    }
                    self.active.push(pick);
                    self.inside[pick] = true;
                    self.u.push(u_new);
                    break;
                }
                self.drop(drop);
            }
        }
        QpEnd::Failed
    }

    fn dot(&self, i: usize) -> f64 {
        self.a[i * self.n..(i + 1) * self.n].iter().zip(&self.x).map(|(a, x)| a * x).sum()
    }

    /// Rotates `d` so that only its first q + 1 entries remain, appends them to R.
    fn add(&mut self, q: usize) -> bool {
        let n = self.n;
        for c in (q + 1..n).rev() {
            let (a, b) = (self.d[c - 1], self.d[c]);
            if b == 0.0 {
                continue;
            }
            let h = a.hypot(b);
            let (cs, sn) = (a / h, b / h);
            self.d[c - 1] = h;
            self.d[c] = 0.0;
            self.rotate(c - 1, cs, sn);
        }
        for i in 0..=q {
            self.r[i * n + q] = self.d[i];
        }
        self.d[q].abs() > 1e-14
    }

    fn rotate(&mut self, c: usize, cs: f64, sn: f64) {
        let n = self.n;
        for i in 0..n {
            let (a, b) = (self.j[i * n + c], self.j[i * n + c + 1]);
            self.j[i * n + c] = cs * a + sn * b;
            self.j[i * n + c + 1] = cs * b - sn * a;
        }
    }

    fn drop(&mut self, at: usize) {
        let n = self.n;
        let q = self.active.len();
        self.inside[self.active[at]] = false;
        self.active.remove(at);
        self.u.remove(at);
        for c in at..q - 1 {
            for i in 0..n {
                self.r[i * n + c] = self.r[i * n + c + 1];
            }
        }
        for i in 0..n {
            self.r[i * n + q - 1] = 0.0;
        }
        for c in at..q - 1 {
            let (a, b) = (self.r[c * n + c], self.r[(c + 1) * n + c]);
            if b == 0.0 {
                continue;
            }
            let h = a.hypot(b);
            let (cs, sn) = (a / h, b / h);
            for k in c..q - 1 {
                let (a, b) = (self.r[c * n + k], self.r[(c + 1) * n + k]);
                self.r[c * n + k] = cs * a + sn * b;
                self.r[(c + 1) * n + k] = cs * b - sn * a;
            }
            self.rotate(c, cs, sn);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        /// Karush–Kuhn–Tucker conditions hold: stationarity, feasibility, signs, complementarity.
        #[test]
        fn the_answer_is_stationary_feasible_and_complementary(
            n in 1usize..6,
            m in 0usize..9,
            seed in prop::collection::vec(-1.0f64..1.0, 140),
        ) {
            let mut qp = Qp::default();
            qp.begin(n);
            let mut s = seed.iter().copied().cycle();
            let mut next = || s.next().unwrap();
            let root: Vec<f64> = (0..n * n).map(|_| next()).collect();
            for i in 0..n {
                for k in 0..n {
                    qp.matrix[i * n + k] = (0..n).map(|q| root[i * n + q] * root[k * n + q]).sum::<f64>()
                        + if i == k { 0.3 } else { 0.0 };
                }
                qp.linear[i] = next();
            }
            for _ in 0..m {
                let a: Vec<f64> = (0..n).map(|_| next()).collect();
                let b = next() - 0.7;          // the origin satisfies most rows, not all
                qp.at_least(&a, b.min(0.0));   // the origin satisfies every row: never empty
            }
            prop_assert_eq!(qp.solve(), QpEnd::Optimal);
            for i in 0..n {
                let mut g = qp.linear[i];
                for k in 0..n { g += qp.matrix[i * n + k] * qp.x[k]; }
                for c in 0..m { g -= qp.multipliers[c] * qp.a[c * n + i]; }
                prop_assert!(g.abs() < 1e-8, "stationarity {g}");
            }
            for c in 0..m {
                let slack = qp.dot(c) - qp.b[c];
                prop_assert!(slack > -1e-9 && qp.multipliers[c] >= -1e-12);
                prop_assert!((slack * qp.multipliers[c]).abs() < 1e-8);
            }
        }
    }
}
