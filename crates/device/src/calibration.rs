//! Log-linear calibration of a shared recombination zone from the user's own runs.
//!
//! `ln(n_i/n_ref) = α_i + β_i·ln c_i + δ_i·t_i`, with n the emitted photons of an emitter, c its concentration
//! (wt%) and t its thickness (nm). Quantum yield and out-coupling ride in α, so nothing about them is invented.
//! Least squares; an interval from the scatter of the runs; nothing outside the range of the runs.

use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};

use crate::error::DeviceError;
use crate::shares::ShareKind;

/// What a layer or dopant was set to.
#[derive(Debug, Clone, Copy, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct ZoneSetting {
    /// Concentration, weight per cent.
    pub concentration_percent: Option<f64>,
    /// Layer thickness, nm.
    pub thickness_nm: Option<f64>,
}

/// One calibration run.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct ZoneRun {
    /// The line's own name of the run.
    pub id: String,
    /// Current density at which it was measured, mA/cm².
    pub current_ma_per_cm2: Option<f64>,
    /// Setting of every emitter of the set.
    pub settings: Vec<ZoneSetting>,
    /// Measured share of every emitter of the set.
    pub shares: Vec<f64>,
    /// What kind of share.
    pub kind: ShareKind,
}

/// One observation of one emitter: its setting and `ln(n/n_ref)`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Observation {
    /// Setting.
    pub setting: ZoneSetting,
    /// Logarithm of the photon ratio to the reference emitter.
    pub log_ratio: f64,
}

/// The fitted law of one emitter.
#[derive(Debug, Clone, PartialEq)]
pub struct LogLinear {
    /// Intercept α.
    pub alpha: f64,
    /// Slope β over ln concentration, where the runs varied it.
    pub beta: Option<f64>,
    /// Slope δ over thickness in 1/nm, where the runs varied it.
    pub delta_per_nm: Option<f64>,
    /// Standard deviation of the residuals, in ln ratio.
    pub sigma: f64,
    /// Runs minus coefficients.
    pub degrees_of_freedom: usize,
    /// Range of the runs' concentrations, wt%.
    pub concentration_range: Option<(f64, f64)>,
    /// Range of the runs' thicknesses, nm.
    pub thickness_range: Option<(f64, f64)>,
    /// `(XᵀX)⁻¹` over the coefficients in the order α, β, δ.
    covariance: DMatrix<f64>,
    means: ZoneSetting,
}

/// Runs beyond the number of coefficients a fit must have.
pub const SPARE_RUNS: usize = 2;

impl LogLinear {
    /// Least-squares fit; a quantity that did not vary gets no coefficient and stays fixed.
    ///
    /// # Errors
    /// [`DeviceError::NotEnoughData`] naming how many runs are short; settings that cannot be used.
    pub fn fit(name: &str, observations: &[Observation]) -> Result<LogLinear, DeviceError> {
        let concentrations = column(observations, |s| s.concentration_percent, "a concentration in wt%")?;
        let thicknesses = column(observations, |s| s.thickness_nm, "a thickness in nm")?;
        let with_beta = varies(&concentrations);
        let with_delta = varies(&thicknesses);
        let coefficients = 1 + usize::from(with_beta) + usize::from(with_delta);
        let (count, needed) = (observations.len(), coefficients + SPARE_RUNS);
        if count < needed {
            return Err(DeviceError::NotEnoughData {
                reason: format!(
                    "{name} has {coefficients} coefficient(s) to fit and {count} run(s): {} more run(s) are needed",
                    needed - count
                ),
            });
        }
        let row = |k: usize| {
            let mut row = vec![1.0];
            if let (true, Some(c)) = (with_beta, &concentrations) {
                row.push(c[k].ln());
            }
            if let (true, Some(t)) = (with_delta, &thicknesses) {
                row.push(t[k]);
            }
            row
        };
        let rows: Vec<f64> = (0..count).flat_map(row).collect();
        let x = DMatrix::from_row_slice(count, coefficients, &rows);
        let y = DVector::from_iterator(count, observations.iter().map(|o| o.log_ratio));
        let singular = || DeviceError::NotEnoughData {
            reason: format!(
                "the runs change the concentration and thickness of {name} together: make a run that changes only one"
            ),
        };
        // Orthogonal solution; the normal matrix only serves the interval.
        let svd = x.clone().svd(true, true);
        let largest = svd.singular_values.max();
        if svd.singular_values.min() < 1e-9 * largest {
            return Err(singular());
        }
        let solution = svd.solve(&y, 1e-12 * largest).map_err(|_| singular())?;
        let covariance = (x.transpose() * &x).try_inverse().ok_or_else(singular)?;
        let degrees_of_freedom = count - coefficients;
        let squares = (&y - &x * &solution).norm_squared();
        Ok(LogLinear {
            alpha: solution[0],
            beta: with_beta.then(|| solution[1]),
            delta_per_nm: with_delta.then(|| solution[coefficients - 1]),
            sigma: (squares / degrees_of_freedom as f64).sqrt(),
            degrees_of_freedom,
            concentration_range: concentrations.as_deref().map(range_of),
            thickness_range: thicknesses.as_deref().map(range_of),
            covariance,
            means: ZoneSetting {
                // The mean in the logarithm, where the law is straight.
                concentration_percent: concentrations
                    .as_deref()
                    .map(|c| (c.iter().map(|c| c.ln()).sum::<f64>() / count as f64).exp()),
                thickness_nm: thicknesses.as_deref().map(|t| t.iter().sum::<f64>() / count as f64),
            },
        })
    }

    /// The middle of the runs' settings.
    pub fn mean_setting(&self) -> ZoneSetting {
        self.means
    }

    /// Refuses a setting outside the runs.
    ///
    /// # Errors
    /// [`DeviceError::OutsideTable`] with the runs' range; [`DeviceError::NotEnoughData`] for a value not given.
    pub fn check_inside(&self, setting: &ZoneSetting) -> Result<(), DeviceError> {
        within(
            "the concentration of a dopant",
            "wt%",
            setting.concentration_percent,
            self.concentration_range,
        )?;
        within("the thickness of a layer", "nm", setting.thickness_nm, self.thickness_range)
    }

    fn regressors(&self, setting: &ZoneSetting) -> DVector<f64> {
        let mut row = vec![1.0];
        if self.beta.is_some() {
            row.push(setting.concentration_percent.map_or(0.0, f64::ln));
        }
        if self.delta_per_nm.is_some() {
            row.push(setting.thickness_nm.unwrap_or(0.0));
        }
        DVector::from_vec(row)
    }

    /// `ln(n/n_ref)` at a setting inside the runs.
    ///
    /// # Errors
    /// As [`LogLinear::check_inside`].
    pub fn log_ratio(&self, setting: &ZoneSetting) -> Result<f64, DeviceError> {
        self.check_inside(setting)?;
        let mut sum = self.alpha;
        if let (Some(beta), Some(c)) = (self.beta, setting.concentration_percent) {
            sum += beta * c.ln();
        }
        if let (Some(delta), Some(t)) = (self.delta_per_nm, setting.thickness_nm) {
            sum += delta * t;
        }
        Ok(sum)
    }

    /// Half width of the 95 % interval of a new run's `ln(n/n_ref)` at a setting.
    pub fn half_width(&self, setting: &ZoneSetting) -> f64 {
        let x = self.regressors(setting);
        let leverage = (x.transpose() * &self.covariance * &x)[(0, 0)];
        student_97_5(self.degrees_of_freedom) * self.sigma * (1.0 + leverage).sqrt()
    }

    /// The setting of the next run that would narrow the law most at a wanted setting.
    ///
    /// Candidates are the wanted setting and the corners of the runs' ranges; a candidate z lowers the variance
    /// at x by `(xᵀCz)²/(1+zᵀCz)`. A wanted setting outside the runs is itself the run to make.
    pub fn next_run(&self, wanted: &ZoneSetting) -> ZoneSetting {
        if self.check_inside(wanted).is_err() {
            return *wanted;
        }
        let ends = |range: Option<(f64, f64)>, at: Option<f64>| -> Vec<Option<f64>> {
            range.map_or(vec![at], |(low, high)| vec![Some(low), Some(high)])
        };
        let x = self.regressors(wanted);
        let mut best = (*wanted, self.gain(&x, &x));
        for c in ends(self.concentration_range, wanted.concentration_percent) {
            for t in ends(self.thickness_range, wanted.thickness_nm) {
                let candidate = ZoneSetting { concentration_percent: c, thickness_nm: t };
                let gain = self.gain(&x, &self.regressors(&candidate));
                if gain > best.1 * (1.0 + 1e-12) {
                    best = (candidate, gain);
                }
            }
        }
        best.0
    }

    fn gain(&self, x: &DVector<f64>, z: &DVector<f64>) -> f64 {
        let cross = (x.transpose() * &self.covariance * z)[(0, 0)];
        let own = (z.transpose() * &self.covariance * z)[(0, 0)];
        cross * cross / (1.0 + own)
    }
}

fn column(
    observations: &[Observation],
    of: impl Fn(&ZoneSetting) -> Option<f64>,
    what: &'static str,
) -> Result<Option<Vec<f64>>, DeviceError> {
    let values: Vec<Option<f64>> = observations.iter().map(|o| of(&o.setting)).collect();
    if values.iter().all(Option::is_none) {
        return Ok(None);
    }
    let mut out = Vec::with_capacity(values.len());
    for value in values {
        let value = value.ok_or_else(|| DeviceError::NotEnoughData {
            reason: format!("{what} is given in some calibration runs and missing in others"),
        })?;
        if !(value.is_finite() && value > 0.0) {
            return Err(DeviceError::BadSetting { what, value, expected: "a number above zero is expected" });
        }
        out.push(value);
    }
    Ok(Some(out))
}

fn range_of(values: &[f64]) -> (f64, f64) {
    values.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), &v| (a.min(v), b.max(v)))
}

fn varies(values: &Option<Vec<f64>>) -> bool {
    values.as_deref().map(range_of).is_some_and(|(low, high)| high > low * (1.0 + 1e-9))
}

fn within(
    quantity: &'static str,
    unit: &'static str,
    value: Option<f64>,
    range: Option<(f64, f64)>,
) -> Result<(), DeviceError> {
    let Some((low, high)) = range else {
        return Ok(());
    };
    let Some(at) = value else {
        return Err(DeviceError::NotEnoughData { reason: format!("{quantity} is not given") });
    };
    // Range ends are runs: rounding at an end is not extrapolation.
    if at >= low * (1.0 - 1e-9) && at <= high * (1.0 + 1e-9) {
        Ok(())
    } else {
        Err(DeviceError::OutsideTable { quantity, at, low, high, unit })
    }
}

/// 97.5 % quantile of Student's t. *Source*: standard table; beyond 30 degrees `1.96 + 2.37/f`, from memory.
fn student_97_5(degrees_of_freedom: usize) -> f64 {
    const TABLE: [f64; 30] = [
        12.706, 4.303, 3.182, 2.776, 2.571, 2.447, 2.365, 2.306, 2.262, 2.228, 2.201, 2.179, 2.160, 2.145,
        2.131, 2.120, 2.110, 2.101, 2.093, 2.086, 2.080, 2.074, 2.069, 2.064, 2.060, 2.056, 2.052, 2.048,
        2.045, 2.042,
    ];
    match degrees_of_freedom {
        0 => f64::INFINITY,
        f if f <= 30 => TABLE[f - 1],
        f => 1.96 + 2.37 / f as f64,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn setting(c: f64, t: f64) -> ZoneSetting {
        ZoneSetting { concentration_percent: Some(c), thickness_nm: Some(t) }
    }

    fn law(s: &ZoneSetting) -> f64 {
        0.4 + 0.8 * s.concentration_percent.unwrap().ln() + 0.05 * s.thickness_nm.unwrap()
    }

    fn runs(noise: f64) -> Vec<Observation> {
        [(0.2, 5.0), (0.8, 5.0), (0.2, 12.0), (0.8, 12.0), (0.4, 8.0), (0.5, 9.0)]
            .iter()
            .enumerate()
            .map(|(k, &(c, t))| {
                let setting = setting(c, t);
                let off = if k % 2 == 0 { noise } else { -noise };
                Observation { setting, log_ratio: law(&setting) + off }
            })
            .collect()
    }

    #[test]
    fn an_exact_law_is_found_again() {
        let fit = LogLinear::fit("Rowan red", &runs(0.0)).unwrap();
        assert!((fit.alpha - 0.4).abs() < 1e-10);
        assert!((fit.beta.unwrap() - 0.8).abs() < 1e-10);
        assert!((fit.delta_per_nm.unwrap() - 0.05).abs() < 1e-11);
        assert!(fit.sigma < 1e-10);
        let at = setting(0.3, 7.0);
        assert!((fit.log_ratio(&at).unwrap() - law(&at)).abs() < 1e-10);
    }

    #[test]
    fn scatter_widens_the_interval_and_the_edge_is_wider_than_the_middle() {
        let fit = LogLinear::fit("Rowan red", &runs(0.05)).unwrap();
        let middle = fit.half_width(&fit.mean_setting());
        assert!(middle > 0.05);
        assert!(fit.half_width(&setting(0.2, 12.0)) > middle);
    }

    #[test]
    fn nothing_is_said_outside_the_runs() {
        let fit = LogLinear::fit("Rowan red", &runs(0.0)).unwrap();
        assert!(matches!(fit.log_ratio(&setting(0.9, 8.0)), Err(DeviceError::OutsideTable { .. })));
        assert!(matches!(fit.log_ratio(&setting(0.4, 4.0)), Err(DeviceError::OutsideTable { .. })));
        assert!(fit.log_ratio(&setting(0.8, 12.0)).is_ok());
    }

    #[test]
    fn too_few_runs_say_how_many_more() {
        let error = LogLinear::fit("Rowan red", &runs(0.0)[..4]).unwrap_err();
        assert!(error.to_string().contains("1 more run"), "{error}");
    }

    #[test]
    fn runs_that_change_both_together_are_refused() {
        let together: Vec<Observation> = (1..=6)
            .map(|k| Observation {
                setting: setting((0.1 * f64::from(k)).exp(), 5.0 + 2.0 * f64::from(k)),
                log_ratio: 0.1 * f64::from(k),
            })
            .collect();
        assert!(matches!(LogLinear::fit("Rowan red", &together), Err(DeviceError::NotEnoughData { .. })));
    }

    #[test]
    fn the_next_run_narrows_the_law_where_it_is_wanted() {
        let fit = LogLinear::fit("Rowan red", &runs(0.05)).unwrap();
        let wanted = setting(0.75, 11.0);
        let next = fit.next_run(&wanted);
        let x = fit.regressors(&wanted);
        for candidate in [setting(0.2, 5.0), setting(0.8, 12.0), setting(0.2, 12.0), wanted] {
            assert!(
                fit.gain(&x, &fit.regressors(&next))
                    >= fit.gain(&x, &fit.regressors(&candidate)) * (1.0 - 1e-9)
            );
        }
        let outside = setting(1.2, 8.0);
        assert_eq!(fit.next_run(&outside), outside);
    }
}
