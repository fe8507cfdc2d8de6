//! Published roll-off formulas for EQE(J), and their fits to a measured table.

use serde::{Deserialize, Serialize};

use crate::curve::Table;
use crate::error::DeviceError;
use crate::search::scan_minimum;
use crate::units::ELEMENTARY_CHARGE_C;

/// Triplet–triplet annihilation: `EQE/EQE0 = (J0/4J)·(√(1+8J/J0) − 1)`.
///
/// One half at `J = J0`. *Source*: Baldo, Adachi, Forrest, Phys. Rev. B 62:10967 (2000), formula from memory.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct TripletRollOff {
    /// EQE at vanishing current, a fraction.
    pub low_current_eqe: f64,
    /// Current density J0 at which the EQE is half of that, mA/cm².
    pub half_current_ma_per_cm2: f64,
}

impl TripletRollOff {
    /// EQE at a current density in mA/cm² (> 0).
    pub fn eqe(&self, current_ma_per_cm2: f64) -> f64 {
        self.low_current_eqe * triplet_ratio(current_ma_per_cm2 / self.half_current_ma_per_cm2)
    }

    /// Least-squares fit to a table of J (mA/cm²) and EQE; returns the root-mean-square residual with it.
    ///
    /// For each J0 the best EQE0 is known in closed form, so J0 alone is searched.
    ///
    /// # Errors
    /// Fewer than three usable rows.
    pub fn fit(table: &Table) -> Result<(TripletRollOff, f64), DeviceError> {
        let rows = fit_rows(table, 3)?;
        let (low, high) = (rows[0].0.ln() - 7.0, rows[rows.len() - 1].0.ln() + 7.0);
        let ratio = |log_half: f64, at: f64| triplet_ratio(at / log_half.exp());
        let score = |log_half: f64| scaled_residual(&rows, |at| ratio(log_half, at)).1;
        let log_half = scan_minimum(score, low, high, 400);
        let (scale, squares) = scaled_residual(&rows, |at| ratio(log_half, at));
        let fit = TripletRollOff { low_current_eqe: scale, half_current_ma_per_cm2: log_half.exp() };
        Ok((fit, (squares / rows.len() as f64).sqrt()))
    }
}

/// `(√(1+8r) − 1)/4r`, written so that it stays exact for small r.
fn triplet_ratio(r: f64) -> f64 {
    2.0 / ((1.0 + 8.0 * r).sqrt() + 1.0)
}

/// The ABC model: `IQE = B·n²/(A·n + B·n² + C·n³)`, `J = e·d·(A·n + B·n² + C·n³)`, times an out-coupling.
///
/// Held in its three observable numbers; with `x = n/√(A/C)` and `b = B/√(AC)`,
/// `IQE = b·x/(1 + b·x + x²)`, `J/J_peak = (x + b·x² + x³)/(2 + b)`, peak `b/(b+2) = 1/(1+2√(AC)/B)`.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct AbcRollOff {
    /// Internal quantum efficiency at the peak, a fraction below 1.
    pub peak_iqe: f64,
    /// Current density of the peak, mA/cm².
    pub peak_current_ma_per_cm2: f64,
    /// EQE per IQE: light extraction times injection, a fraction.
    pub extraction: f64,
}

impl AbcRollOff {
    /// From recombination coefficients A (1/s), B (cm³/s), C (cm⁶/s), active thickness (nm) and extraction.
    pub fn from_coefficients(
        a_per_s: f64,
        b_cm3_per_s: f64,
        c_cm6_per_s: f64,
        thickness_nm: f64,
        extraction: f64,
    ) -> AbcRollOff {
        let density = (a_per_s / c_cm6_per_s).sqrt();
        let rate = a_per_s * density + b_cm3_per_s * density.powi(2) + c_cm6_per_s * density.powi(3);
        // nm to cm, then A/cm² to mA/cm².
        let peak_current = ELEMENTARY_CHARGE_C * thickness_nm * 1e-7 * rate * 1e3;
        AbcRollOff {
            peak_iqe: 1.0 / (1.0 + 2.0 * (a_per_s * c_cm6_per_s).sqrt() / b_cm3_per_s),
            peak_current_ma_per_cm2: peak_current,
            extraction,
        }
    }

    /// EQE at a current density in mA/cm² (> 0).
    pub fn eqe(&self, current_ma_per_cm2: f64) -> f64 {
        let b = 2.0 * self.peak_iqe / (1.0 - self.peak_iqe);
        self.extraction * abc_iqe(b, current_ma_per_cm2 / self.peak_current_ma_per_cm2)
    }

    /// Least-squares fit to a table of J (mA/cm²) and EQE; returns the root-mean-square residual with it.
    ///
    /// Extraction is found in closed form inside a search over peak current and peak IQE. The two
    /// efficiencies are told apart only by the width of the peak: a table that does not pass over its peak
    /// leaves them loose, which a large change of the fit between similar tables shows.
    ///
    /// # Errors
    /// Fewer than four usable rows.
    pub fn fit(table: &Table) -> Result<(AbcRollOff, f64), DeviceError> {
        let rows = fit_rows(table, 4)?;
        let (low, high) = (rows[0].0.ln() - 4.0, rows[rows.len() - 1].0.ln() + 4.0);
        let shape = |log_peak: f64, log_b: f64, at: f64| abc_iqe(log_b.exp(), at / log_peak.exp());
        let squares = |log_peak: f64, log_b: f64| scaled_residual(&rows, |at| shape(log_peak, log_b, at)).1;
        // Outer search over b, inner over the peak current; b from 0.02 (IQE 0.01) to 2000 (IQE 0.999).
        let best_peak = |log_b: f64| scan_minimum(|log_peak| squares(log_peak, log_b), low, high, 60);
        let log_b = scan_minimum(|log_b| squares(best_peak(log_b), log_b), 0.02f64.ln(), 2000f64.ln(), 60);
        let log_peak = best_peak(log_b);
        let (extraction, left) = scaled_residual(&rows, |at| shape(log_peak, log_b, at));
        let b = log_b.exp();
        let fit = AbcRollOff { peak_iqe: b / (b + 2.0), peak_current_ma_per_cm2: log_peak.exp(), extraction };
        Ok((fit, (left / rows.len() as f64).sqrt()))
    }
}

/// IQE at `j = J/J_peak` for `b = B/√(AC)`: solves `x + b·x² + x³ = (2+b)·j` for x.
fn abc_iqe(b: f64, j: f64) -> f64 {
    let right = (2.0 + b) * j;
    // The left side rises steadily and is convex for x > 0: Newton from above settles without overshoot.
    let mut x = right.cbrt().min((right / b).sqrt()).min(right).max(f64::MIN_POSITIVE);
    while x + b * x.powi(2) + x.powi(3) < right {
        x *= 2.0;
    }
    for _ in 0..100 {
        let value = x + b * x * x + x * x * x - right;
        let next = x - value / (1.0 + 2.0 * b * x + 3.0 * x * x);
        if (next - x).abs() <= 1e-15 * x {
            x = next;
            break;
        }
        x = next;
    }
    b * x / (1.0 + b * x + x * x)
}

/// Rows of a table, checked and ascending.
fn fit_rows(table: &Table, least: usize) -> Result<Vec<(f64, f64)>, DeviceError> {
    table.curve("EQE", "mA/cm²")?;
    let mut rows = table.points.clone();
    if rows.len() < least {
        return Err(DeviceError::NotEnoughData {
            reason: format!(
                "the fit needs at least {least} rows of EQE against current, {} given",
                rows.len()
            ),
        });
    }
    rows.sort_by(|a, b| a.0.total_cmp(&b.0));
    Ok(rows)
}

/// Best scale of a shape on the rows and the sum of squares left.
fn scaled_residual(rows: &[(f64, f64)], shape: impl Fn(f64) -> f64) -> (f64, f64) {
    let (mut cross, mut own) = (0.0, 0.0);
    for &(at, value) in rows {
        let s = shape(at);
        cross += s * value;
        own += s * s;
    }
    let scale = if own > 0.0 { cross / own } else { 0.0 };
    let squares = rows.iter().map(|&(at, value)| (value - scale * shape(at)).powi(2)).sum();
    (scale, squares)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn check(found: f64, expected: f64, tolerance: f64) {
        assert!((found - expected).abs() <= tolerance, "{found} is not {expected}");
    }

    #[test]
    fn annihilation_halves_the_eqe_at_j0() {
        // [C11] Baldo et al., Phys. Rev. B 62:10967 (2000): .854 at 0.1·J0, .5 at J0, .2 at 10·J0.
        let model = TripletRollOff { low_current_eqe: 1.0, half_current_ma_per_cm2: 7.0 };
        check(model.eqe(0.7), 0.854, 5e-4);
        check(model.eqe(7.0), 0.5, 1e-12);
        check(model.eqe(70.0), 0.2, 1e-12);
    }

    #[test]
    fn abc_model_peaks_at_its_published_place() {
        // [C11] typical coefficients from memory: 0.721 at 5.9 A/cm².
        let model = AbcRollOff::from_coefficients(1e7, 2e-11, 1.5e-30, 2.0, 1.0);
        check(model.peak_iqe, 0.721, 5e-4);
        check(model.peak_current_ma_per_cm2 / 1e3, 5.9, 0.05);
        check(model.eqe(model.peak_current_ma_per_cm2), model.peak_iqe, 1e-12);
        assert!(model.eqe(0.8 * model.peak_current_ma_per_cm2) < model.peak_iqe);
        assert!(model.eqe(1.25 * model.peak_current_ma_per_cm2) < model.peak_iqe);
    }

    #[test]
    fn abc_model_agrees_with_its_rate_equation() {
        let (a, b, c, d_nm) = (1e7, 2e-11, 1.5e-30, 2.0);
        let model = AbcRollOff::from_coefficients(a, b, c, d_nm, 0.8);
        for exponent in [16.5, 17.5, 18.0, 18.7, 19.3] {
            let n = 10f64.powf(exponent);
            let rate = a * n + b * n * n + c * n * n * n;
            let current_ma_per_cm2 = ELEMENTARY_CHARGE_C * d_nm * 1e-7 * rate * 1e3;
            check(model.eqe(current_ma_per_cm2), 0.8 * b * n * n / rate, 1e-12);
        }
    }

    #[test]
    fn fits_return_the_models_that_made_the_table() {
        let currents = [0.05, 0.2, 1.0, 5.0, 20.0, 100.0];
        let made = TripletRollOff { low_current_eqe: 0.21, half_current_ma_per_cm2: 30.0 };
        let table = Table::new(currents.iter().map(|&j| (j, made.eqe(j))).collect());
        let (found, residual) = TripletRollOff::fit(&table).unwrap();
        check(found.low_current_eqe, 0.21, 1e-7);
        check(found.half_current_ma_per_cm2, 30.0, 1e-4);
        assert!(residual < 1e-8);

        let made = AbcRollOff { peak_iqe: 0.72, peak_current_ma_per_cm2: 900.0, extraction: 0.8 };
        let currents = [1.0, 10.0, 100.0, 400.0, 1000.0, 5000.0, 30000.0];
        let table = Table::new(currents.iter().map(|&j| (j, made.eqe(j))).collect());
        let (found, residual) = AbcRollOff::fit(&table).unwrap();
        check(found.peak_iqe, 0.72, 1e-3);
        check(found.peak_current_ma_per_cm2, 900.0, 5.0);
        check(found.extraction, 0.8, 1e-3);
        assert!(residual < 1e-5);
    }

    #[test]
    fn too_few_rows_are_refused() {
        assert!(TripletRollOff::fit(&Table::new(vec![(1.0, 0.2), (2.0, 0.1)])).is_err());
        assert!(AbcRollOff::fit(&Table::new(vec![(1.0, 0.2), (2.0, 0.1), (3.0, 0.05)])).is_err());
    }
}
