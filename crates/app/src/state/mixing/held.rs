//! Pulls that keep the chromaticity of the blend.
//!
//! With unit-power tristimulus columns (Xᵢ, Yᵢ, Zᵢ) and the blend's white (Xw, Yw, Zw), the radiant shares p of the
//! free rows that keep the white satisfy three linear equations
//!
//! ```text
//! Σ pᵢ (Xᵢ·Yw − Yᵢ·Xw) = 0    Σ pᵢ (Zᵢ·Yw − Yᵢ·Zw) = 0    Σ pᵢ = 1    pᵢ ≥ 0
//! ```
//!
//! with locked rows at their shares. The set is a bounded polytope: each share is least and greatest at a vertex, and
//! a vertex has no more rows above zero than there are independent equations. All of them are tried, so spans are
//! exact. A pull follows the smallest change (least squares) that keeps the equations, leaving rows at zero once they
//! get there, and ends on the straight line to the extreme vertex when that path closes.

use super::kinds::Weights;
use super::rebalance::is_free;
use super::{Pulled, Stuck, settle};
use project::{Member, ShareKind};

/// Below this a span counts as no freedom.
const LEAST_SPAN: f64 = 1e-7;
/// Pivots below this count as dependent (columns are of order 1).
const DEPENDENT: f64 = 1e-10;

type Column = [f64; 3];

/// The blends of one chromaticity that the free rows can make.
#[derive(Debug, Clone)]
pub struct HeldWhite {
    shares: Vec<f64>,
    free: Vec<usize>,
    columns: Vec<Column>,
    rank: usize,
    /// Per free row, in the order of `free`: the whole blend at its least and at its greatest share.
    ends: Vec<[Vec<f64>; 2]>,
    locked: Vec<bool>,
    on: Vec<bool>,
}

impl HeldWhite {
    /// The blends with the chromaticity of `members` as they stand. `xyz` holds each row's tristimulus values at unit
    /// radiant power, in row order (any observer).
    ///
    /// # Errors
    /// When the blend has no light.
    pub fn new(members: &[Member], xyz: &[[f64; 3]]) -> Result<Self, Stuck> {
        let shares: Vec<f64> = members.iter().map(|m| if m.on { m.share } else { 0.0 }).collect();
        let mut white = [0.0; 3];
        for (share, column) in shares.iter().zip(xyz) {
            (0..3).for_each(|c| white[c] += share * column[c]);
        }
        let scale = white.iter().map(|w| w.abs()).sum::<f64>();
        if scale.is_nan() || scale <= 0.0 {
            return Err(Stuck::NoLight);
        }
        let white = white.map(|w| w / scale);
        let raw: Vec<Column> = xyz
            .iter()
            .map(|c| [c[0] * white[1] - c[1] * white[0], c[2] * white[1] - c[1] * white[2], 1.0])
            .collect();
        let size = raw.iter().flat_map(|c| [c[0].abs(), c[1].abs()]).fold(0.0, f64::max);
        let size = if size > 0.0 { size } else { 1.0 };
        let columns: Vec<Column> = raw.iter().map(|c| [c[0] / size, c[1] / size, 1.0]).collect();
        let free: Vec<usize> = (0..members.len()).filter(|&k| is_free(&members[k])).collect();
        let mut held = Self {
            rank: 0,
            ends: free.iter().map(|_| [shares.clone(), shares.clone()]).collect(),
            shares,
            free,
            columns,
            locked: members.iter().map(|m| m.locked).collect(),
            on: members.iter().map(|m| m.on).collect(),
        };
        held.find_ends();
        Ok(held)
    }

    /// The least and greatest radiant share of row `row` with the white held.
    ///
    /// # Errors
    /// Why the row has no freedom.
    pub fn span(&self, row: usize) -> Result<(f64, f64), Stuck> {
        let at = self.place(row)?;
        let (low, high) = (self.ends[at][0][row], self.ends[at][1][row]);
        if high - low > LEAST_SPAN {
            return Ok((low, high));
        }
        let others: Vec<usize> = self.free.iter().copied().filter(|&k| k != row).collect();
        Err(if others.is_empty() {
            Stuck::NoOther
        } else if self.free.len() <= self.rank {
            Stuck::WhiteTakesAll { free: self.free.len() }
        } else if self.direction(row, &others).is_none() {
            Stuck::Irreplaceable
        } else {
            Stuck::NoneCanGiveWay
        })
    }

    /// Gives row `row` the radiant share `wanted` (or the nearest end of its span), the white held.
    ///
    /// # Errors
    /// Why the row has no freedom.
    pub fn pull(&self, row: usize, wanted: f64) -> Result<Pulled, Stuck> {
        let (low, high) = self.span(row)?;
        let at = self.place(row)?;
        let wanted = if wanted.is_finite() { wanted } else { self.shares[row] };
        let given = wanted.clamp(low, high);
        let up = given >= self.shares[row];
        let mut shares = self.follow(row, given, up);
        if (shares[row] - given).abs() > 1e-12 {
            let end = &self.ends[at][usize::from(up)];
            let whole = end[row] - shares[row];
            let part = if whole == 0.0 { 0.0 } else { ((given - shares[row]) / whole).clamp(0.0, 1.0) };
            for k in 0..shares.len() {
                shares[k] += part * (end[k] - shares[k]);
            }
        }
        settle(&mut shares, |k| k != row && self.free.contains(&k));
        Ok(Pulled { given: shares[row], shares, at_end: given != wanted })
    }

    /// Gives row `row` the share `wanted` in `kind`, the white held.
    ///
    /// # Errors
    /// Why the row has no freedom.
    pub fn pull_in_kind(
        &self,
        row: usize,
        wanted: f64,
        weights: &[Weights],
        kind: ShareKind,
    ) -> Result<Pulled, Stuck> {
        let (mut low, mut high) = self.span(row)?;
        if kind == ShareKind::Radiant {
            return self.pull(row, wanted);
        }
        if weights[row].of(kind) <= 0.0 {
            return Err(Stuck::NoWeight);
        }
        let share = |t: f64| -> Result<f64, Stuck> {
            Ok(super::kinds::from_radiant(&self.pull(row, t)?.shares, weights, kind)[row])
        };
        if wanted.is_nan() || wanted <= share(low)? || wanted >= share(high)? {
            let end = if wanted >= share(high)? { high } else { low };
            return Ok(Pulled { at_end: true, ..self.pull(row, end)? });
        }
        for _ in 0..60 {
            let middle = 0.5 * (low + high);
            if share(middle)? < wanted { low = middle } else { high = middle }
        }
        self.pull(row, 0.5 * (low + high))
    }

    fn place(&self, row: usize) -> Result<usize, Stuck> {
        if row >= self.shares.len() {
            Err(Stuck::NoRow)
        } else if !self.on[row] {
            Err(Stuck::Off)
        } else if self.locked[row] {
            Err(Stuck::Locked)
        } else {
            self.free.iter().position(|&k| k == row).ok_or(Stuck::NoRow)
        }
    }

    /// Tries every vertex of the polytope.
    fn find_ends(&mut self) {
        let m = self.free.len();
        let mut target = [0.0; 3];
        for &k in &self.free {
            (0..3).for_each(|c| target[c] += self.columns[k][c] * self.shares[k]);
        }
        let (rows, target) = independent(self.free.iter().map(|&k| self.columns[k]).collect(), target);
        self.rank = rows.rank;
        let mut basis = [0; 3];
        let mut found: Vec<([usize; 3], [f64; 3])> = Vec::new();
        combinations(m, rows.rank, &mut basis, 0, 0, &mut |basis| {
            let matrix: Vec<Column> = basis[..rows.rank].iter().map(|&j| rows.columns[j]).collect();
            if let Some(x) = solve(&matrix, &target, rows.rank)
                && x[..rows.rank].iter().all(|v| *v >= -1e-11)
            {
                found.push((*basis, x));
            }
        });
        for (basis, x) in found {
            let mut vertex = self.shares.clone();
            self.free.iter().for_each(|&k| vertex[k] = 0.0);
            for (j, value) in basis[..rows.rank].iter().zip(x) {
                vertex[self.free[*j]] = value.max(0.0);
            }
            for (at, &row) in self.free.iter().enumerate() {
                if vertex[row] < self.ends[at][0][row] {
                    self.ends[at][0].clone_from(&vertex);
                }
                if vertex[row] > self.ends[at][1][row] {
                    self.ends[at][1].clone_from(&vertex);
                }
            }
        }
    }

    /// The path of smallest change from the present blend towards `given`; stops early where it closes.
    fn follow(&self, row: usize, given: f64, up: bool) -> Vec<f64> {
        let sign = if up { 1.0 } else { -1.0 };
        let mut shares = self.shares.clone();
        let mut moving: Vec<usize> = self.free.iter().copied().filter(|&k| k != row).collect();
        while let Some(direction) = self.direction(row, &moving) {
            let mut step = (given - shares[row]).abs();
            let mut blocking = None;
            for (at, &k) in moving.iter().enumerate() {
                let rate = sign * direction[at];
                if rate < -1e-13 && shares[k] < -rate * step {
                    step = shares[k] / -rate;
                    blocking = Some(at);
                }
            }
            shares[row] += sign * step;
            for (at, &k) in moving.iter().enumerate() {
                shares[k] = (shares[k] + sign * direction[at] * step).max(0.0);
            }
            match blocking {
                None => {
                    shares[row] = given;
                    break;
                }
                Some(at) => {
                    shares[moving[at]] = 0.0;
                    moving.remove(at);
                }
            }
        }
        shares
    }

    /// The smallest change of the `moving` rows that makes up for +1 of `row`; `None` when they cannot.
    fn direction(&self, row: usize, moving: &[usize]) -> Option<Vec<f64>> {
        let mut gram = [[0.0; 3]; 3];
        for &k in moving {
            let c = &self.columns[k];
            for i in 0..3 {
                for j in 0..3 {
                    gram[i][j] += c[i] * c[j];
                }
            }
        }
        let wanted = self.columns[row].map(|c| -c);
        let y = solve_singular(gram, wanted)?;
        let change: Vec<f64> =
            moving.iter().map(|&k| self.columns[k].iter().zip(&y).map(|(c, y)| c * y).sum::<f64>()).collect();
        let reached = (0..3).all(|c| {
            let sum: f64 = moving.iter().zip(&change).map(|(&k, d)| self.columns[k][c] * d).sum();
            (sum - wanted[c]).abs() < 1e-9
        });
        reached.then_some(change)
    }
}

struct Equations {
    columns: Vec<Column>,
    rank: usize,
}

/// Rows of the equations that are independent, by elimination with full pivoting.
fn independent(mut columns: Vec<Column>, mut target: Column) -> (Equations, Column) {
    let mut rank = 0;
    let mut used = vec![false; columns.len()];
    while rank < 3 {
        let mut pivot = (0.0, rank, 0);
        for r in rank..3 {
            for (j, column) in columns.iter().enumerate().filter(|(j, _)| !used[*j]) {
                if column[r].abs() > pivot.0 {
                    pivot = (column[r].abs(), r, j);
                }
            }
        }
        let (size, r, j) = pivot;
        if size < DEPENDENT {
            break;
        }
        columns.iter_mut().for_each(|c| c.swap(rank, r));
        target.swap(rank, r);
        let head = columns[j][rank];
        for below in rank + 1..3 {
            let factor = columns[j][below] / head;
            columns.iter_mut().for_each(|c| c[below] -= factor * c[rank]);
            target[below] -= factor * target[rank];
        }
        used[j] = true;
        rank += 1;
    }
    (Equations { columns, rank }, target)
}

fn combinations(
    m: usize,
    size: usize,
    basis: &mut [usize; 3],
    depth: usize,
    from: usize,
    visit: &mut impl FnMut(&[usize; 3]),
) {
    if depth == size {
        visit(basis);
        return;
    }
    for j in from..m {
        basis[depth] = j;
        combinations(m, size, basis, depth + 1, j + 1, visit);
    }
}

/// Solves the square system whose columns are `matrix`; `None` when it is singular.
fn solve(matrix: &[Column], target: &Column, size: usize) -> Option<Column> {
    let mut a = [[0.0; 4]; 3];
    for i in 0..size {
        for j in 0..size {
            a[i][j] = matrix[j][i];
        }
        a[i][3] = target[i];
    }
    for k in 0..size {
        let pivot = (k..size).max_by(|&i, &j| a[i][k].abs().total_cmp(&a[j][k].abs()))?;
        if a[pivot][k].abs() < DEPENDENT {
            return None;
        }
        a.swap(k, pivot);
        for i in 0..size {
            if i != k {
                let factor = a[i][k] / a[k][k];
                for j in k..4 {
                    a[i][j] -= factor * a[k][j];
                }
            }
        }
    }
    let mut x = [0.0; 3];
    (0..size).for_each(|k| x[k] = a[k][3] / a[k][k]);
    Some(x)
}

/// One solution of a symmetric system that may be singular; the caller checks that it is a solution.
fn solve_singular(gram: [[f64; 3]; 3], target: Column) -> Option<Column> {
    let scale = (0..3).map(|k| gram[k][k]).fold(0.0, f64::max);
    if scale <= 0.0 {
        return None;
    }
    let mut a = [[0.0; 4]; 3];
    for i in 0..3 {
        a[i][..3].copy_from_slice(&gram[i]);
        a[i][3] = target[i];
    }
    let mut taken = [None; 3];
    for row in 0..3 {
        let mut pivot = (scale * 1e-13, 0, 0);
        for (i, line) in a.iter().enumerate().skip(row) {
            for (j, value) in line[..3].iter().enumerate() {
                if taken[..row].iter().all(|t| *t != Some(j)) && value.abs() > pivot.0 {
                    pivot = (value.abs(), i, j);
                }
            }
        }
        if pivot.0 <= scale * 1e-13 {
            break;
        }
        a.swap(row, pivot.1);
        let j = pivot.2;
        taken[row] = Some(j);
        for i in 0..3 {
            if i != row {
                let factor = a[i][j] / a[row][j];
                for c in 0..4 {
                    a[i][c] -= factor * a[row][c];
                }
            }
        }
    }
    let mut x = [0.0; 3];
    for row in 0..3 {
        if let Some(j) = taken[row] {
            x[j] = a[row][3] / a[row][j];
        }
    }
    Some(x)
}

#[cfg(test)]
mod tests {
    use super::*;
    use project::EmitterId;
    use proptest::prelude::*;

    /// Invented tristimulus columns: blue, green, amber, red, deep red, teal.
    const XYZ: [[f64; 3]; 6] = [
        [0.30, 0.06, 1.70],
        [0.25, 0.85, 0.12],
        [0.95, 0.70, 0.01],
        [0.80, 0.35, 0.00],
        [0.40, 0.16, 0.00],
        [0.10, 0.45, 0.40],
    ];

    fn rows(shares: &[f64]) -> Vec<Member> {
        shares
            .iter()
            .enumerate()
            .map(|(k, &share)| Member { share, ..Member::new(EmitterId(k as u64)) })
            .collect()
    }

    fn xy(shares: &[f64], columns: &[[f64; 3]]) -> (f64, f64) {
        let mut sum = [0.0; 3];
        for (p, c) in shares.iter().zip(columns) {
            (0..3).for_each(|k| sum[k] += p * c[k]);
        }
        let total: f64 = sum.iter().sum();
        (sum[0] / total, sum[1] / total)
    }

    #[test]
    fn three_free_rows_have_no_freedom_and_say_so() {
        let held = HeldWhite::new(&rows(&[0.2, 0.3, 0.5]), &XYZ[..3]).unwrap();
        for row in 0..3 {
            assert_eq!(held.span(row), Err(Stuck::WhiteTakesAll { free: 3 }));
        }
    }

    #[test]
    fn a_fourth_row_gives_each_share_a_span_that_ends_where_one_row_is_gone() {
        let held = HeldWhite::new(&rows(&[0.15, 0.3, 0.25, 0.3]), &XYZ[..4]).unwrap();
        for row in 0..4 {
            let (low, high) = held.span(row).unwrap();
            for end in [low, high] {
                let pulled = held.pull(row, end).unwrap();
                assert!(pulled.shares.iter().any(|s| *s < 1e-12), "{pulled:?}");
            }
        }
    }

    #[test]
    fn two_emitters_of_one_colour_can_stand_in_for_each_other() {
        let columns = [XYZ[0], XYZ[0], XYZ[1], XYZ[2]];
        let held = HeldWhite::new(&rows(&[0.1, 0.1, 0.3, 0.5]), &columns).unwrap();
        let (low, high) = held.span(0).unwrap();
        assert!(low.abs() < 1e-12 && (high - 0.2).abs() < 1e-12, "{low} {high}");
        assert_eq!(held.span(2), Err(Stuck::Irreplaceable));
    }

    #[test]
    fn locks_and_switches_leave_fewer_free_rows() {
        let mut members = rows(&[0.15, 0.3, 0.25, 0.3]);
        members[3].locked = true;
        let held = HeldWhite::new(&members, &XYZ[..4]).unwrap();
        assert_eq!(held.span(0), Err(Stuck::WhiteTakesAll { free: 3 }));
        assert_eq!(held.span(3), Err(Stuck::Locked));
        assert_eq!(held.span(9), Err(Stuck::NoRow));
    }

    proptest! {
        #[test]
        fn the_white_stays_and_the_span_is_kept_to(
            weights in prop::collection::vec(0.0..1.0_f64, 6),
            locked in 0..8_usize,
            row in 0..6_usize,
            wanted in -0.2..1.2_f64,
        ) {
            let total: f64 = weights.iter().sum();
            prop_assume!(total > 0.3);
            let mut members = rows(&weights.iter().map(|w| w / total).collect::<Vec<_>>());
            if locked < 6 { members[locked].locked = true; }
            let before: Vec<f64> = members.iter().map(|m| m.share).collect();
            let held = HeldWhite::new(&members, &XYZ).unwrap();
            if let Ok((low, high)) = held.span(row) {
                prop_assert!(low <= before[row] + 1e-12 && before[row] <= high + 1e-12);
                let pulled = held.pull(row, wanted).unwrap();
                let (x0, y0) = xy(&before, &XYZ);
                let (x, y) = xy(&pulled.shares, &XYZ);
                prop_assert!((x - x0).abs() < 1e-9 && (y - y0).abs() < 1e-9, "{x} {x0} {y} {y0}");
                prop_assert!((pulled.shares.iter().sum::<f64>() - 1.0).abs() < 1e-12);
                prop_assert!(pulled.shares.iter().all(|s| *s >= 0.0));
                prop_assert!((pulled.given - wanted.clamp(low, high)).abs() < 1e-9);
                if locked < 6 { prop_assert_eq!(pulled.shares[locked], before[locked]); }
            }
        }

        /// No feasible blend lies outside the span: random feasible blends are convex mixtures of the ends found.
        #[test]
        fn nothing_of_this_white_lies_beyond_the_span(
            weights in prop::collection::vec(0.05..1.0_f64, 6),
            mix in prop::collection::vec(0.0..1.0_f64, 12),
        ) {
            let total: f64 = weights.iter().sum();
            let members = rows(&weights.iter().map(|w| w / total).collect::<Vec<_>>());
            let held = HeldWhite::new(&members, &XYZ).unwrap();
            let sum: f64 = mix.iter().sum::<f64>() + 1e-9;
            let mut blend = vec![0.0; 6];
            for (k, part) in mix.iter().enumerate() {
                for j in 0..6 { blend[j] += part / sum * held.ends[k / 2][k % 2][j]; }
            }
            let again = HeldWhite::new(&rows(&blend), &XYZ).unwrap();
            for row in 0..6 {
                let (a, b) = (held.span(row).unwrap(), again.span(row).unwrap());
                prop_assert!((a.0 - b.0).abs() < 1e-8 && (a.1 - b.1).abs() < 1e-8, "{a:?} {b:?}");
            }
        }

        #[test]
        fn a_typed_luminous_share_is_met_with_the_white_held(wanted in 0.0..1.0_f64, row in 0..5_usize) {
            let members = rows(&[0.15, 0.25, 0.2, 0.2, 0.2]);
            let weights: Vec<Weights> = XYZ[..5]
                .iter()
                .map(|c| Weights { lm_per_w: 683.0 * c[1], mean_wavelength_nm: 550.0 })
                .collect();
            let held = HeldWhite::new(&members, &XYZ[..5]).unwrap();
            let pulled = held.pull_in_kind(row, wanted, &weights, ShareKind::Luminous).unwrap();
            let found = super::super::kinds::from_radiant(&pulled.shares, &weights, ShareKind::Luminous)[row];
            prop_assert!(pulled.at_end || (found - wanted).abs() < 1e-9, "{found} {wanted}");
        }
    }
}
