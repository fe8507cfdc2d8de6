//! The fit: amplitudes by non-negative least squares, shifts and stretches by damped Gauss–Newton steps.

use super::curve::Curve;
use super::nnls::Normal;
use super::{Freedom, GREATEST_SHIFT_NM, STRETCH_RANGE, UnmixError};
use colour::{FIRST_NM, GRID_POINTS, LAST_NM, Spectrum};
use nalgebra::{DMatrix, DVector};

/// Steps after which the search for shifts and stretches ends in any case.
const MOST_STEPS: usize = 200;
/// A step that lowers the squared error by less than this fraction ends the search.
const SETTLED: f64 = 1e-12;

/// A measured white and the curves to find in it.
pub(super) struct Problem {
    pub(super) nm: Vec<f64>,
    pub(super) measured: Vec<f64>,
    pub(super) curves: Vec<Curve>,
    /// Radiant power of each emitter as given, plain 1 nm sums over 380–780 nm.
    powers_as_given: Vec<f64>,
    pub(super) freedom: Freedom,
}

/// Where the emitters stand.
#[derive(Clone, Debug)]
pub(super) struct Pose {
    pub(super) shift_nm: Vec<f64>,
    pub(super) stretch: Vec<f64>,
}

/// The best fit.
pub(super) struct Found {
    pub(super) pose: Pose,
    pub(super) amplitudes: Vec<f64>,
    /// amplitude × radiant power of the moved curve.
    pub(super) powers: Vec<f64>,
    /// Radiant power of each moved curve at amplitude 1.
    pub(super) unit_powers: Vec<f64>,
    pub(super) residual: Vec<f64>,
    /// Columns of the model at the optimum: amplitudes first, then the shifts and stretches that are free.
    pub(super) columns: Vec<Vec<f64>>,
    /// For each column, the emitter it belongs to.
    pub(super) column_emitter: Vec<usize>,
}

impl Problem {
    pub(super) fn new(
        measured: &Spectrum,
        emitters: &[Spectrum],
        freedom: Freedom,
    ) -> Result<Self, UnmixError> {
        let inside = |nm: f64| (FIRST_NM..=LAST_NM).contains(&nm);
        let (nm, values): (Vec<f64>, Vec<f64>) = measured
            .wavelengths_nm()
            .iter()
            .zip(measured.values())
            .filter(|(nm, _)| inside(**nm))
            .map(|(nm, value)| (*nm, *value))
            .unzip();
        let powers_as_given: Vec<f64> = emitters.iter().map(|e| e.on_colour_grid().iter().sum()).collect();
        if let Some(emitter) = powers_as_given.iter().position(|p| *p <= 0.0) {
            return Err(UnmixError::DarkEmitter { emitter });
        }
        let unknowns = emitters.len() * (1 + usize::from(freedom.shift) + usize::from(freedom.stretch));
        if nm.len() < unknowns + 1 {
            return Err(UnmixError::TooFewSamples { needed: unknowns + 1, found: nm.len() });
        }
        Ok(Self {
            nm,
            measured: values,
            curves: emitters.iter().map(Curve::of).collect(),
            powers_as_given,
            freedom,
        })
    }

    fn shapes(&self, pose: &Pose) -> Vec<Vec<f64>> {
        self.curves
            .iter()
            .enumerate()
            .map(|(i, c)| {
                self.nm.iter().map(|nm| c.moved(*nm, pose.shift_nm[i], pose.stretch[i]).0).collect()
            })
            .collect()
    }

    /// Amplitudes, residual and squared error at a pose.
    fn amplitudes(&self, pose: &Pose) -> (Vec<f64>, Vec<f64>, f64) {
        let shapes = self.shapes(pose);
        let amplitudes = Normal::of(&shapes, &self.measured).non_negative();
        let residual: Vec<f64> = (0..self.nm.len())
            .map(|k| self.measured[k] - shapes.iter().zip(&amplitudes).map(|(s, a)| a * s[k]).sum::<f64>())
            .collect();
        let error = residual.iter().map(|r| r * r).sum();
        (amplitudes, residual, error)
    }

    /// Columns of the linearised model and the emitter each belongs to: shapes, then shifts, then stretches.
    fn columns(&self, pose: &Pose, amplitudes: &[f64]) -> (Vec<Vec<f64>>, Vec<usize>) {
        let n = self.curves.len();
        let moved = |i: usize| {
            self.nm.iter().map(move |nm| self.curves[i].moved(*nm, pose.shift_nm[i], pose.stretch[i]))
        };
        let (mut columns, mut owner) = (self.shapes(pose), (0..n).collect::<Vec<_>>());
        let found = || (0..n).filter(|&i| amplitudes[i] > 0.0);
        if self.freedom.shift {
            for i in found() {
                columns.push(moved(i).map(|(_, by_shift, _)| amplitudes[i] * by_shift).collect());
                owner.push(i);
            }
        }
        if self.freedom.stretch {
            for i in found() {
                columns.push(moved(i).map(|(_, _, by_stretch)| amplitudes[i] * by_stretch).collect());
                owner.push(i);
            }
        }
        (columns, owner)
    }

    pub(super) fn solve(&self) -> Found {
        let n = self.curves.len();
        let mut pose = Pose { shift_nm: vec![0.0; n], stretch: vec![1.0; n] };
        let (mut amplitudes, mut residual, mut error) = self.amplitudes(&pose);
        if self.freedom.shift || self.freedom.stretch {
            let scale: f64 = self.measured.iter().map(|v| v * v).sum();
            let mut damping = 1e-3;
            for _ in 0..MOST_STEPS {
                let Some(next) = self.step(&pose, &amplitudes, &residual, damping) else { break };
                let (a, r, e) = self.amplitudes(&next);
                if e < error {
                    let settled = error - e <= SETTLED * error.max(1e-14 * scale);
                    (pose, amplitudes, residual, error) = (next, a, r, e);
                    damping = (damping * 0.2).max(1e-12);
                    if settled {
                        break;
                    }
                } else {
                    damping *= 8.0;
                    if damping > 1e8 {
                        break;
                    }
                }
            }
        }
        let (columns, column_emitter) = self.columns(&pose, &amplitudes);
        let unit_powers: Vec<f64> = (0..n).map(|i| self.unit_power(i, &pose)).collect();
        let powers = amplitudes.iter().zip(&unit_powers).map(|(a, p)| a * p).collect();
        Found { pose, amplitudes, powers, unit_powers, residual, columns, column_emitter }
    }

    /// One damped Gauss–Newton step in the shifts and stretches, kept inside their ranges.
    fn step(&self, pose: &Pose, amplitudes: &[f64], residual: &[f64], damping: f64) -> Option<Pose> {
        let n = self.curves.len();
        let (columns, owner) = self.columns(pose, amplitudes);
        // Amplitudes that are zero stay out of the step.
        let kept: Vec<usize> = (0..columns.len()).filter(|&c| amplitudes[owner[c]] > 0.0).collect();
        let chosen: Vec<Vec<f64>> = kept.iter().map(|&c| columns[c].clone()).collect();
        let normal = Normal::of(&chosen, residual);
        let k = kept.len();
        let damped =
            DMatrix::from_fn(k, k, |a, b| normal.gram[(a, b)] * if a == b { 1.0 + damping } else { 1.0 });
        let step = damped.cholesky()?.solve(&DVector::from_fn(k, |a, _| normal.right[a]));
        let mut next = pose.clone();
        let shifts = if self.freedom.shift { amplitudes.iter().filter(|a| **a > 0.0).count() } else { 0 };
        for (a, &c) in kept.iter().enumerate().filter(|(_, c)| **c >= n) {
            let i = owner[c];
            if c < n + shifts {
                next.shift_nm[i] = (pose.shift_nm[i] + step[a]).clamp(-GREATEST_SHIFT_NM, GREATEST_SHIFT_NM);
            } else {
                next.stretch[i] = (pose.stretch[i] + step[a]).clamp(STRETCH_RANGE.0, STRETCH_RANGE.1);
            }
        }
        Some(next)
    }

    /// Radiant power of the moved curve at amplitude 1, in the scale of the plain sums of the curve as given.
    fn unit_power(&self, i: usize, pose: &Pose) -> f64 {
        let sum = |shift: f64, stretch: f64| -> f64 {
            (0..GRID_POINTS).map(|k| self.curves[i].moved(FIRST_NM + k as f64, shift, stretch).0).sum()
        };
        let (shift, stretch) = (pose.shift_nm[i], pose.stretch[i]);
        if shift == 0.0 && stretch == 1.0 {
            return self.powers_as_given[i];
        }
        let before = sum(0.0, 1.0);
        if before > 0.0 { self.powers_as_given[i] * sum(shift, stretch) / before } else { 0.0 }
    }

    /// Share of an emitter's power (as given) outside the measured range.
    pub(super) fn not_measured(&self, i: usize) -> f64 {
        let (first, last) = (self.nm[0], self.nm[self.nm.len() - 1]);
        let (mut outside, mut total) = (0.0, 0.0);
        for k in 0..GRID_POINTS {
            let nm = FIRST_NM + k as f64;
            let value = self.curves[i].at(nm).value;
            total += value;
            if nm < first || nm > last {
                outside += value;
            }
        }
        if total > 0.0 { (outside / total).max(0.0) } else { 0.0 }
    }
}
