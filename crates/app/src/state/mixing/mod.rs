//! Shares: how the rows of a blend give way to one another.
//!
//! * [`rebalance`]: one share is set, the free rows make up for it in proportion.
//! * [`held`]: the same along blends of one chromaticity, with the span each row can reach.
//! * [`kinds`]: radiant, luminous and photon shares, both ways.
//!
//! Everything here is plain arithmetic on the members of a set. A pull should always be computed from the shares at
//! the moment it began: the outcome then depends on where the hand is, not on how it got there.

pub mod held;
pub mod kinds;
pub mod rebalance;

use std::fmt;

/// Why a row cannot be moved.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
#[non_exhaustive]
pub enum Stuck {
    /// There is no such row.
    NoRow,
    /// The row itself is locked.
    Locked,
    /// The row itself is off.
    Off,
    /// Every other row is locked or off.
    NoOther,
    /// The free rows are no more than the white needs.
    WhiteTakesAll {
        /// Number of free rows, this one counted.
        free: usize,
    },
    /// More rows than the white needs, but none can give way without going below zero.
    NoneCanGiveWay,
    /// No combination of the other free rows makes this row's contribution to the white.
    Irreplaceable,
    /// The row's light has no weight in this kind of share.
    NoWeight,
    /// The blend has no light to keep the colour of.
    NoLight,
}

impl fmt::Display for Stuck {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::NoRow => f.write_str("this emitter is not in the set"),
            Self::Locked => f.write_str("this share is locked"),
            Self::Off => f.write_str("this emitter is off"),
            Self::NoOther => f.write_str("every other row is locked or off: unlock one to make room"),
            Self::WhiteTakesAll { free } => write!(
                f,
                "{}: the white fixes {}. Unlock or switch on another row, or let the white go",
                match free {
                    1 => "only this row is free".to_owned(),
                    n => format!("only {n} rows are free"),
                },
                if *free == 1 { "its share" } else { "all their shares" },
            ),
            Self::NoneCanGiveWay => f.write_str(
                "no row can give way without another going below zero: this white is at the edge of what the free rows make",
            ),
            Self::Irreplaceable => {
                f.write_str("no other free row can stand in for this one at this white: unlock or switch on another")
            }
            Self::NoWeight => f.write_str("this emitter has no visible light, so its share of it cannot be set"),
            Self::NoLight => f.write_str("the blend has no light"),
        }
    }
}

/// The shares after a pull.
#[derive(Debug, Clone, PartialEq)]
pub struct Pulled {
    /// Radiant shares in row order: not negative, summing to 1, locked rows untouched.
    pub shares: Vec<f64>,
    /// The radiant share the pulled row has now.
    pub given: f64,
    /// True when that is not what was asked for because the row's span ends there.
    pub at_end: bool,
}

/// Brings the sum to exactly 1 (as nearly as numbers allow) by the largest row that may move.
fn settle(shares: &mut [f64], may_move: impl Fn(usize) -> bool) {
    for share in shares.iter_mut() {
        *share = if *share > 1e-15 { *share } else { 0.0 };
    }
    let excess = shares.iter().sum::<f64>() - 1.0;
    let largest = (0..shares.len())
        .filter(|&k| may_move(k))
        .max_by(|&a, &b| shares[a].total_cmp(&shares[b]).then(b.cmp(&a)));
    if let Some(k) = largest {
        shares[k] = (shares[k] - excess).max(0.0);
    }
}
