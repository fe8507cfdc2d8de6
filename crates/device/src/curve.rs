//! Measured tables over current: monotone interpolation in log J, and no silent extrapolation.

use serde::{Deserialize, Serialize};

use crate::error::{DeviceError, Notice};

/// How far past its ends a table may be continued, with a notice: a factor in current (common practice).
pub const TABLE_REACH: f64 = 1.5;

/// A measured table: pairs of current (mA/cm², or mA for a package) and value, in any order.
///
/// Plain data, as pasted; [`Table::curve`] checks it and makes it readable at any current inside it.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(transparent)]
pub struct Table {
    /// Rows `(current, value)`.
    pub points: Vec<(f64, f64)>,
}

impl Table {
    /// A table from its rows.
    pub fn new(points: Vec<(f64, f64)>) -> Table {
        Table { points }
    }

    /// The checked, interpolating form of the table.
    ///
    /// *Valid range*: at least one row; currents above zero and all different; values finite and above zero.
    ///
    /// # Errors
    /// [`DeviceError::EmptyTable`], [`DeviceError::BadRow`] (with the row number), [`DeviceError::RepeatedRow`].
    pub fn curve(&self, quantity: &'static str, unit: &'static str) -> Result<Curve, DeviceError> {
        if self.points.is_empty() {
            return Err(DeviceError::EmptyTable { quantity });
        }
        for (row, &(at, value)) in self.points.iter().enumerate() {
            let usable = at.is_finite() && at > 0.0 && value.is_finite() && value > 0.0;
            if !usable {
                return Err(DeviceError::BadRow {
                    quantity,
                    row: row + 1,
                    at,
                    value,
                    expected: "two numbers above zero are expected",
                });
            }
        }
        let mut rows = self.points.clone();
        rows.sort_by(|a, b| a.0.total_cmp(&b.0));
        for pair in rows.windows(2) {
            if pair[1].0 <= pair[0].0 {
                return Err(DeviceError::RepeatedRow { quantity, at: pair[0].0 });
            }
        }
        let log_at: Vec<f64> = rows.iter().map(|row| row.0.ln()).collect();
        let values: Vec<f64> = rows.iter().map(|row| row.1).collect();
        let slopes = monotone_slopes(&log_at, &values);
        Ok(Curve { at: rows.iter().map(|row| row.0).collect(), log_at, values, slopes, quantity, unit })
    }
}

/// A value read from a curve, with the remark it needs, if any.
#[derive(Debug, Clone, PartialEq)]
pub struct Reading {
    /// The value.
    pub value: f64,
    /// Present when the value stands on more than the measured range.
    pub notice: Option<Notice>,
}

/// A table made readable: piecewise cubic in the logarithm of the current, monotone between rows.
///
/// Between two rows the curve never leaves the interval of their values, so the extremes over any span of
/// currents are found at its ends and at the rows inside it.
///
/// *Source*: F. N. Fritsch and J. Butland, SIAM J. Sci. Stat. Comput. 5:300 (1984), formula from memory.
#[derive(Debug, Clone, PartialEq)]
pub struct Curve {
    at: Vec<f64>,
    log_at: Vec<f64>,
    values: Vec<f64>,
    slopes: Vec<f64>,
    quantity: &'static str,
    unit: &'static str,
}

impl Curve {
    /// Lowest and highest measured current.
    pub fn range(&self) -> (f64, f64) {
        (self.at[0], self.at[self.at.len() - 1])
    }

    /// Currents of the rows, ascending.
    pub(crate) fn rows(&self) -> impl Iterator<Item = f64> + '_ {
        self.at.iter().copied()
    }

    /// The value at a current, with a notice just past the table and an error further out.
    ///
    /// Past an end the curve goes on along its end slope in log J, at most by [`TABLE_REACH`].
    ///
    /// # Errors
    /// [`DeviceError::OutsideTable`] beyond that, or for a current that is not a positive number.
    pub fn read(&self, current: f64) -> Result<Reading, DeviceError> {
        let (low, high) = self.range();
        let (quantity, unit) = (self.quantity, self.unit);
        let refuse = DeviceError::OutsideTable { quantity, at: current, low, high, unit };
        // Comparing products keeps a current that equals an end after rounding inside the table.
        let reach = TABLE_REACH * (1.0 + 1e-12);
        let usable = current > 0.0 && current * reach >= low && current <= high * reach;
        if !usable {
            return Err(refuse);
        }
        let value = self.value(current);
        if value <= 0.0 || !value.is_finite() {
            return Err(refuse);
        }
        let inside = current >= low * (1.0 - 1e-12) && current <= high * (1.0 + 1e-12);
        let notice = (!inside).then_some(Notice::BeyondTable { quantity, at: current, low, high, unit });
        Ok(Reading { value, notice })
    }

    /// The value at a current the caller knows to be inside the table; straight continuation outside.
    pub fn value(&self, current: f64) -> f64 {
        let x = current.ln();
        let last = self.log_at.len() - 1;
        if last == 0 {
            return self.values[0];
        }
        if x <= self.log_at[0] {
            return self.values[0] + self.slopes[0] * (x - self.log_at[0]);
        }
        if x >= self.log_at[last] {
            return self.values[last] + self.slopes[last] * (x - self.log_at[last]);
        }
        let upper = self.log_at.partition_point(|&node| node <= x);
        let lower = upper - 1;
        let width = self.log_at[upper] - self.log_at[lower];
        let t = (x - self.log_at[lower]) / width;
        let (t2, t3) = (t * t, t * t * t);
        (2.0 * t3 - 3.0 * t2 + 1.0) * self.values[lower]
            + (t3 - 2.0 * t2 + t) * width * self.slopes[lower]
            + (3.0 * t2 - 2.0 * t3) * self.values[upper]
            + (t3 - t2) * width * self.slopes[upper]
    }

    /// Smallest and largest value over a span of currents inside the table.
    pub fn extremes(&self, low: f64, high: f64) -> (f64, f64) {
        let ends = [self.value(low), self.value(high)];
        let mut smallest = ends[0].min(ends[1]);
        let mut largest = ends[0].max(ends[1]);
        for (&at, &value) in self.at.iter().zip(&self.values) {
            if at > low && at < high {
                smallest = smallest.min(value);
                largest = largest.max(value);
            }
        }
        (smallest, largest)
    }
}

/// End slopes of zero curvature and inner slopes by weighted harmonic means: no overshoot.
fn monotone_slopes(x: &[f64], y: &[f64]) -> Vec<f64> {
    let count = x.len();
    if count == 1 {
        return vec![0.0];
    }
    let step: Vec<f64> = x.windows(2).map(|pair| pair[1] - pair[0]).collect();
    let secant: Vec<f64> = (0..count - 1).map(|k| (y[k + 1] - y[k]) / step[k]).collect();
    if count == 2 {
        return vec![secant[0]; 2];
    }
    let mut slopes = vec![0.0; count];
    for k in 1..count - 1 {
        if secant[k - 1] * secant[k] > 0.0 {
            let before = 2.0 * step[k] + step[k - 1];
            let after = step[k] + 2.0 * step[k - 1];
            slopes[k] = (before + after) / (before / secant[k - 1] + after / secant[k]);
        }
    }
    slopes[0] = end_slope(step[0], step[1], secant[0], secant[1]);
    slopes[count - 1] = end_slope(step[count - 2], step[count - 3], secant[count - 2], secant[count - 3]);
    slopes
}

/// Three-point end slope, limited so that the first piece stays monotone.
fn end_slope(near: f64, far: f64, near_secant: f64, far_secant: f64) -> f64 {
    let slope = ((2.0 * near + far) * near_secant - near * far_secant) / (near + far);
    if slope * near_secant <= 0.0 {
        0.0
    } else if near_secant * far_secant <= 0.0 && slope.abs() > 3.0 * near_secant.abs() {
        3.0 * near_secant
    } else {
        slope
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn falling() -> Curve {
        Table::new(vec![(10.0, 0.15), (1.0, 0.20), (100.0, 0.08), (0.1, 0.19)])
            .curve("EQE", "mA/cm²")
            .unwrap()
    }

    #[test]
    fn rows_are_met_exactly_and_order_does_not_matter() {
        let curve = falling();
        for (at, value) in [(0.1, 0.19), (1.0, 0.20), (10.0, 0.15), (100.0, 0.08)] {
            assert!((curve.read(at).unwrap().value - value).abs() < 1e-15);
        }
    }

    #[test]
    fn no_value_between_two_rows_leaves_their_interval() {
        let curve = falling();
        for step in 0..=1000 {
            let at = 10f64.powf(-1.0 + 3.0 * f64::from(step) / 1000.0);
            let (low, high) = match at {
                a if a <= 1.0 => (0.19, 0.20),
                a if a <= 10.0 => (0.15, 0.20),
                _ => (0.08, 0.15),
            };
            let value = curve.value(at);
            assert!(value >= low - 1e-12 && value <= high + 1e-12, "{at}: {value}");
        }
    }

    #[test]
    fn just_past_the_table_there_is_a_notice_and_further_out_a_refusal() {
        let curve = falling();
        assert!(curve.read(100.0).unwrap().notice.is_none());
        assert!(matches!(curve.read(149.0).unwrap().notice, Some(Notice::BeyondTable { .. })));
        assert!(matches!(curve.read(151.0), Err(DeviceError::OutsideTable { .. })));
        assert!(matches!(curve.read(0.06), Err(DeviceError::OutsideTable { .. })));
        assert!(curve.read(f64::NAN).is_err());
    }

    #[test]
    fn extremes_over_a_span_hold_every_value_in_it() {
        let curve = falling();
        let (low, high) = curve.extremes(0.5, 40.0);
        for step in 0..=500 {
            let value = curve.value(0.5 * 80f64.powf(f64::from(step) / 500.0));
            assert!(value >= low - 1e-12 && value <= high + 1e-12);
        }
    }

    #[test]
    fn unusable_rows_are_named() {
        let bad = Table::new(vec![(1.0, 0.2), (0.0, 0.1)]).curve("EQE", "mA/cm²");
        assert!(matches!(bad, Err(DeviceError::BadRow { row: 2, .. })));
        let twice = Table::new(vec![(1.0, 0.2), (1.0, 0.1)]).curve("EQE", "mA/cm²");
        assert!(matches!(twice, Err(DeviceError::RepeatedRow { .. })));
        assert!(matches!(Table::default().curve("EQE", "mA/cm²"), Err(DeviceError::EmptyTable { .. })));
    }
}
