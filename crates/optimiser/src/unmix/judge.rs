//! What the fit is worth: uncertainties of the shares, light left over, and doubts.

use super::fit::{Found, Problem};
use super::nnls::Normal;
use super::{Doubt, Freedom, GREATEST_SHIFT_NM, SMOOTHING_NM, STRETCH_RANGE, Unmixed};

/// Left-over light below this share of the power is never called a missing emitter.
const NOTICED_SHARE: f64 = 0.004;
/// Left-over light must stand this many times above what noise alone would leave.
const ABOVE_NOISE: f64 = 4.0;
/// Light of an emitter outside the measured range is mentioned from this share on.
const MENTIONED_OUTSIDE: f64 = 0.01;

pub(super) fn judge(problem: &Problem, found: Found, freedom: Freedom) -> Unmixed {
    let n = found.powers.len();
    let total: f64 = found.powers.iter().sum();
    let shares: Vec<f64> = found.powers.iter().map(|p| p / total).collect();
    let peak = problem.measured.iter().copied().fold(f64::MIN_POSITIVE, f64::max);
    let mean_square = found.residual.iter().map(|r| r * r).sum::<f64>() / found.residual.len() as f64;
    let share_sigma = sigmas(&found, &shares, total);
    let left = LeftOver::of(problem, &found.residual);
    let mut doubts = left.doubts();
    for i in 0..n {
        if share_sigma[i].is_none() {
            doubts.push(Doubt::Alike { emitter: i });
        }
        let at_end = found.pose.shift_nm[i].abs() >= GREATEST_SHIFT_NM
            || !(STRETCH_RANGE.0 < found.pose.stretch[i] && found.pose.stretch[i] < STRETCH_RANGE.1);
        if at_end {
            doubts.push(Doubt::AtTheEnd { emitter: i });
        }
        let outside = problem.not_measured(i);
        if outside > MENTIONED_OUTSIDE {
            doubts.push(Doubt::NotMeasured { emitter: i, share: outside });
        }
    }
    Unmixed {
        shares,
        share_sigma,
        powers: found.powers,
        shift_nm: freedom.shift.then_some(found.pose.shift_nm),
        stretch: freedom.stretch.then_some(found.pose.stretch),
        unexplained: left.missing,
        residual_rms: mean_square.sqrt() / peak,
        wavelengths_nm: problem.nm.clone(),
        residual: found.residual,
        doubts,
    }
}

/// Standard uncertainty of each share.
///
/// s² = Σr²/(m − p); covariance of the amplitudes s²·(AᵀA)⁻¹ over the emitters found (and, for an emitter at zero,
/// over those and itself); ∂shareᵢ/∂powerⱼ = (δᵢⱼ − shareᵢ)/Σ power.
fn sigmas(found: &Found, shares: &[f64], total: f64) -> Vec<Option<f64>> {
    let n = shares.len();
    let free: Vec<usize> =
        (0..found.columns.len()).filter(|&c| found.amplitudes[found.column_emitter[c]] > 0.0).collect();
    let samples = found.residual.len();
    let freedom = samples.saturating_sub(free.len()).max(1);
    let variance = found.residual.iter().map(|r| r * r).sum::<f64>() / freedom as f64;
    let normal = Normal::of(&found.columns, &found.residual);
    let sigma_over = |columns: &[usize], i: usize| {
        let inverse = normal.inverse(columns)?;
        let gradient: Vec<f64> = columns
            .iter()
            .map(|&c| {
                if c >= n {
                    return 0.0;
                }
                let own = if c == i { 1.0 } else { 0.0 };
                (own - shares[i]) / total * found.unit_powers[c]
            })
            .collect();
        let mut sum = 0.0;
        for (a, ga) in gradient.iter().enumerate() {
            for (b, gb) in gradient.iter().enumerate() {
                sum += ga * gb * inverse[(a, b)];
            }
        }
        Some((variance * sum.max(0.0)).sqrt())
    };
    (0..n)
        .map(|i| {
            if found.amplitudes[i] > 0.0 {
                sigma_over(&free, i)
            } else {
                let mut with_it = free.clone();
                with_it.push(i);
                with_it.sort_unstable();
                sigma_over(&with_it, i)
            }
        })
        .collect()
}

/// Light the fit leaves over or adds, once noise is averaged away.
struct LeftOver {
    /// Share of the measured power missing from the fit.
    missing: f64,
    /// Where most of it is, nm.
    missing_near_nm: f64,
    /// Share of the measured power the fit has too much.
    extra: f64,
    extra_near_nm: f64,
    /// What noise alone would leave of either.
    noise: f64,
}

impl LeftOver {
    fn of(problem: &Problem, residual: &[f64]) -> Self {
        let nm = &problem.nm;
        let samples = nm.len();
        let widths: Vec<f64> =
            (0..samples).map(|k| 0.5 * (nm[(k + 1).min(samples - 1)] - nm[k.saturating_sub(1)])).collect();
        let power =
            problem.measured.iter().zip(&widths).map(|(v, w)| v * w).sum::<f64>().max(f64::MIN_POSITIVE);
        let mut out =
            Self { missing: 0.0, missing_near_nm: nm[0], extra: 0.0, extra_near_nm: nm[0], noise: 0.0 };
        let (mut most, mut least) = (0.0, 0.0);
        let (mut low, mut high) = (0, 0);
        let mut averaged = 0.0;
        for k in 0..samples {
            while nm[low] < nm[k] - 0.5 * SMOOTHING_NM {
                low += 1;
            }
            while high < samples && nm[high] <= nm[k] + 0.5 * SMOOTHING_NM {
                high += 1;
            }
            let window = low..high;
            let mean = residual[window.clone()].iter().sum::<f64>() / window.len() as f64;
            averaged += widths[k] / (window.len() as f64).sqrt();
            if mean > 0.0 {
                out.missing += mean * widths[k] / power;
            } else {
                out.extra -= mean * widths[k] / power;
            }
            if mean > most {
                (most, out.missing_near_nm) = (mean, nm[k]);
            }
            if mean < least {
                (least, out.extra_near_nm) = (mean, nm[k]);
            }
        }
        // Noise from neighbouring differences, which a smooth bump hardly changes; the positive part of a
        // normal deviate has the mean σ/√(2π).
        let differences: f64 = residual.windows(2).map(|p| (p[1] - p[0]).powi(2)).sum();
        let sigma = (differences / (2.0 * (samples - 1).max(1) as f64)).sqrt();
        out.noise = sigma * averaged / (std::f64::consts::TAU.sqrt() * power);
        out
    }

    fn doubts(&self) -> Vec<Doubt> {
        let threshold = NOTICED_SHARE.max(ABOVE_NOISE * self.noise);
        let mut doubts = Vec::new();
        if self.missing > threshold {
            doubts.push(Doubt::MissingLight { share: self.missing, near_nm: self.missing_near_nm });
        }
        if self.extra > threshold {
            doubts.push(Doubt::TooMuchLight { share: self.extra, near_nm: self.extra_near_nm });
        }
        doubts
    }
}
