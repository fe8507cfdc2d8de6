//! Non-negative least squares by an active set on the normal equations.

use nalgebra::{DMatrix, DVector};

/// A column whose pivot, relative to its own square, is below this is a copy of the others.
const DEPENDENT: f64 = 1e-11;

/// The normal equations of a least-squares problem min |A x − b|², columns scaled to unit length.
#[derive(Clone, Debug)]
pub(super) struct Normal {
    /// AᵀA.
    pub(super) gram: DMatrix<f64>,
    /// Aᵀb.
    pub(super) right: DVector<f64>,
}

impl Normal {
    /// From columns and a right-hand side of equal length.
    pub(super) fn of(columns: &[Vec<f64>], target: &[f64]) -> Self {
        let n = columns.len();
        let dot = |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(x, y)| x * y).sum::<f64>();
        let mut gram = DMatrix::zeros(n, n);
        let mut right = DVector::zeros(n);
        for i in 0..n {
            right[i] = dot(&columns[i], target);
            for j in 0..=i {
                let value = dot(&columns[i], &columns[j]);
                gram[(i, j)] = value;
                gram[(j, i)] = value;
            }
        }
        Self { gram, right }
    }

    /// The unconstrained optimum over the columns in `active`; `None` when they depend on one another.
    fn solve(&self, active: &[usize]) -> Option<Vec<f64>> {
        let k = active.len();
        let scale: Vec<f64> = active.iter().map(|&i| self.gram[(i, i)].sqrt()).collect();
        if scale.contains(&0.0) {
            return None;
        }
        let gram = DMatrix::from_fn(k, k, |a, b| self.gram[(active[a], active[b])] / (scale[a] * scale[b]));
        let right = DVector::from_fn(k, |a, _| self.right[active[a]] / scale[a]);
        let factor = gram.cholesky()?;
        if (0..k).any(|a| factor.l_dirty()[(a, a)].powi(2) < DEPENDENT) {
            return None;
        }
        let x = factor.solve(&right);
        Some((0..k).map(|a| x[a] / scale[a]).collect())
    }

    /// The inverse of the normal matrix over `active`, in the order of `active`.
    pub(super) fn inverse(&self, active: &[usize]) -> Option<DMatrix<f64>> {
        let k = active.len();
        let gram = DMatrix::from_fn(k, k, |a, b| self.gram[(active[a], active[b])]);
        let factor = gram.cholesky()?;
        let scaled =
            (0..k).all(|a| factor.l_dirty()[(a, a)].powi(2) >= DEPENDENT * self.gram[(active[a], active[a])]);
        scaled.then(|| factor.inverse())
    }

    /// x ≥ 0 that minimises |A x − b|².
    ///
    /// Columns enter one at a time by their gradient and leave when they would turn negative; a column that is a
    /// combination of those already in stays at zero. Ends after finitely many steps because the error falls at each.
    pub(super) fn non_negative(&self) -> Vec<f64> {
        let n = self.right.len();
        let mut x = vec![0.0; n];
        let mut active: Vec<usize> = Vec::new();
        let mut barred = vec![false; n];
        for _ in 0..10 * n.max(1) {
            let gradient: Vec<f64> = (0..n)
                .map(|i| self.right[i] - (0..n).map(|j| self.gram[(i, j)] * x[j]).sum::<f64>())
                .collect();
            let enter = (0..n)
                .filter(|&i| !barred[i] && !active.contains(&i))
                .map(|i| (i, gradient[i] / self.gram[(i, i)].sqrt().max(f64::MIN_POSITIVE)))
                .filter(|&(i, g)| {
                    g > 1e-14 * (self.right[i].abs() / self.gram[(i, i)].sqrt().max(f64::MIN_POSITIVE))
                })
                .max_by(|a, b| a.1.total_cmp(&b.1));
            let Some((enter, _)) = enter else { break };
            active.push(enter);
            active.sort_unstable();
            let mut entered = false;
            while let Some(trial) = self.solve(&active) {
                entered = true;
                if trial.iter().all(|v| *v > 0.0) {
                    for (a, &i) in active.iter().enumerate() {
                        x[i] = trial[a];
                    }
                    break;
                }
                // Go towards the trial point until the first column reaches zero, and drop it.
                let step = active
                    .iter()
                    .enumerate()
                    .filter(|&(a, _)| trial[a] <= 0.0)
                    .map(|(a, &i)| x[i] / (x[i] - trial[a]).max(f64::MIN_POSITIVE))
                    .fold(1.0, f64::min);
                for (a, &i) in active.iter().enumerate() {
                    x[i] += step * (trial[a] - x[i]);
                }
                let before = active.len();
                active.retain(|&i| x[i] > 1e-300);
                if active.len() == before {
                    break;
                }
                (0..n).filter(|i| !active.contains(i)).for_each(|i| x[i] = 0.0);
                if !active.contains(&enter) {
                    barred[enter] = true;
                }
                if active.is_empty() {
                    break;
                }
            }
            if entered {
                if active.contains(&enter) {
                    barred.fill(false);
                }
            } else {
                active.retain(|&i| i != enter);
                barred[enter] = true;
            }
        }
        x
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_positive_combination_is_found_exactly() {
        let columns = vec![vec![1.0, 0.0, 1.0, 0.0], vec![0.0, 1.0, 1.0, 0.0], vec![0.0, 0.0, 1.0, 1.0]];
        let target = vec![2.0, 3.0, 5.5, 0.5];
        let x = Normal::of(&columns, &target).non_negative();
        for (found, expected) in x.iter().zip([2.0, 3.0, 0.5]) {
            assert!((found - expected).abs() < 1e-12, "{x:?}");
        }
    }

    #[test]
    fn the_optimum_fulfils_the_kuhn_tucker_conditions() {
        // Random-looking but fixed columns: x ≥ 0, gradient ≤ 0 where x = 0, = 0 where x > 0.
        for seed in 1..200_u32 {
            let mut state = seed;
            let mut next = || {
                state = state.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
                f64::from(state >> 8) / f64::from(1 << 24) - 0.3
            };
            let columns: Vec<Vec<f64>> = (0..6).map(|_| (0..12).map(|_| next()).collect()).collect();
            let target: Vec<f64> = (0..12).map(|_| next()).collect();
            let normal = Normal::of(&columns, &target);
            let x = normal.non_negative();
            for i in 0..6 {
                let g = normal.right[i] - (0..6).map(|j| normal.gram[(i, j)] * x[j]).sum::<f64>();
                assert!(x[i] >= 0.0 && g < 1e-9, "seed {seed}: {x:?}, gradient {g}");
                assert!(x[i] == 0.0 || g.abs() < 1e-9, "seed {seed}: {x:?}, gradient {g}");
            }
        }
    }

    #[test]
    fn a_repeated_column_is_used_once() {
        let column = vec![1.0, 2.0, 3.0];
        let x = Normal::of(&[column.clone(), column.clone()], &[2.0, 4.0, 6.0]).non_negative();
        assert!((x[0] + x[1] - 2.0).abs() < 1e-12, "{x:?}");
    }
}
