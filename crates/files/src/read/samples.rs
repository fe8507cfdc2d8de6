//! The usable samples of one spectrum: what is no number is left out, order restored, duplicates averaged.

use super::answers::AxisUnit;
use super::convert::nm_from;
use super::number::Cell;
use super::segments::Block;
use super::split::Separator;
use super::table::Table;

/// Where a spectrum's axis comes from.
#[derive(Debug, Clone, Copy)]
pub(super) enum AxisSource {
    /// A column, in a unit, after multiplication by a scale.
    Column { column: usize, unit: AxisUnit, scale: f64 },
    /// First value and step in nm.
    Steps { start_nm: f64, step_nm: f64 },
}

/// The samples in ascending wavelength, in the file's units and in nm, and what happened to the rest.
#[derive(Debug, Clone, Default)]
pub(super) struct Samples {
    pub(super) axis: Vec<f64>,
    pub(super) values: Vec<f64>,
    pub(super) nm: Vec<f64>,
    /// Rows whose axis is missing or ≤ 0.
    pub(super) no_axis: usize,
    /// Rows whose value is missing, away from the ends.
    pub(super) missing_inside: usize,
    /// Rows whose value is missing at the ends.
    pub(super) missing_at_ends: usize,
    /// Rows whose axis or value is words.
    pub(super) unreadable: usize,
    /// File line of the first unreadable or missing sample.
    pub(super) first_bad_line: usize,
    /// Samples merged into another of the same wavelength.
    pub(super) merged: usize,
    /// Rows neither ascending nor descending.
    pub(super) shuffled: bool,
    /// Longest run of rows with an axis but without value, and the wavelengths around it.
    pub(super) rows: usize,
}

impl Samples {
    /// Collects the samples of `value` over the rows of `block`. `paired` rows may end before the table does.
    pub(super) fn collect(
        table: &Table<'_>,
        block: &Block,
        source: AxisSource,
        value: usize,
        paired: bool,
    ) -> Self {
        let mut samples = Self::default();
        let (mut before, mut pending) = (true, 0);
        let (mut ups, mut downs, mut last) = (0_usize, 0_usize, f64::NAN);
        for (index, row) in block.iter().enumerate() {
            let line = table.rows[row].line as usize;
            if table.separator == Separator::Blanks && table.row_len(row) < table.width && !paired {
                samples.unreadable += 1;
                samples.bad(line);
                continue;
            }
            let (axis, nm) = match source {
                AxisSource::Steps { start_nm, step_nm } => {
                    let nm = start_nm + index as f64 * step_nm;
                    (Cell::Number(nm), nm)
                }
                AxisSource::Column { column, unit, scale } => {
                    let cell = table.at(row, column);
                    (cell, cell.number().map_or(f64::NAN, |axis| nm_from(axis * scale, unit)))
                }
            };
            let cell = table.at(row, value);
            match (axis, cell) {
                (Cell::Missing, Cell::Missing) => continue,
                (Cell::Word, _) | (_, Cell::Word) => {
                    samples.rows += 1;
                    samples.unreadable += 1;
                    samples.bad(line);
                    continue;
                }
                _ => samples.rows += 1,
            }
            let Some(axis) = axis.number().filter(|_| nm.is_finite() && nm > 0.0 && nm < 1e12) else {
                samples.no_axis += 1;
                samples.bad(line);
                continue;
            };
            let Some(number) = cell.number() else {
                if before {
                    samples.missing_at_ends += 1;
                } else {
                    pending += 1;
                }
                samples.bad(line);
                continue;
            };
            samples.missing_inside += pending;
            (before, pending) = (false, 0);
            ups += usize::from(nm > last);
            downs += usize::from(nm < last);
            last = nm;
            samples.axis.push(axis);
            samples.values.push(number);
            samples.nm.push(nm);
        }
        samples.missing_at_ends += pending;
        samples.shuffled = ups > 0 && downs > 0;
        if downs > 0 {
            samples.sort();
        }
        samples.merge();
        samples
    }

    fn bad(&mut self, line: usize) {
        if self.first_bad_line == 0 {
            self.first_bad_line = line;
        }
    }

    fn sort(&mut self) {
        let mut order: Vec<u32> = (0..self.nm.len() as u32).collect();
        order.sort_by(|&a, &b| self.nm[a as usize].total_cmp(&self.nm[b as usize]));
        let pick = |from: &[f64]| order.iter().map(|&index| from[index as usize]).collect::<Vec<_>>();
        self.axis = pick(&self.axis);
        self.values = pick(&self.values);
        self.nm = pick(&self.nm);
    }

    /// Averages samples of one wavelength (equal within one part in 10⁹).
    fn merge(&mut self) {
        let count = self.nm.len();
        let mut kept = 0;
        let mut start = 0;
        while start < count {
            let mut end = start + 1;
            while end < count && self.nm[end] - self.nm[start] <= 1e-9 * self.nm[start] {
                end += 1;
            }
            let times = (end - start) as f64;
            // Dividing first keeps sums of very large values finite.
            let value = if end - start == 1 {
                self.values[start]
            } else {
                self.values[start..end].iter().map(|value| value / times).sum()
            };
            self.axis[kept] = self.axis[start];
            self.nm[kept] = self.nm[start];
            self.values[kept] = value;
            kept += 1;
            start = end;
        }
        self.merged = count - kept;
        self.axis.truncate(kept);
        self.values.truncate(kept);
        self.nm.truncate(kept);
    }
}
