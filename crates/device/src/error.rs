//! What can go wrong in device work, and what is only worth a remark.

use std::fmt;

/// Why a device quantity or recipe cannot be given. Each message is a sentence a user can act on.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum DeviceError {
    /// A table of a sheet has no points.
    #[error("the {quantity} table is empty: paste at least one row of current density and value")]
    EmptyTable {
        /// What the table holds.
        quantity: &'static str,
    },
    /// A table row holds a number that cannot be used.
    #[error("row {row} of the {quantity} table reads {at} and {value}: {expected}")]
    BadRow {
        /// What the table holds.
        quantity: &'static str,
        /// Row number, from 1, in the order given.
        row: usize,
        /// First number of the row.
        at: f64,
        /// Second number of the row.
        value: f64,
        /// What a usable row looks like.
        expected: &'static str,
    },
    /// Two rows of a table give the same current.
    #[error("the {quantity} table gives two rows at {at}: keep one")]
    RepeatedRow {
        /// What the table holds.
        quantity: &'static str,
        /// The repeated first number.
        at: f64,
    },
    /// A quantity was asked far outside the range that was measured.
    #[error(
        "{quantity} was measured from {low} to {high} {unit} and is not extrapolated to {at}: measure there"
    )]
    OutsideTable {
        /// What was asked for.
        quantity: &'static str,
        /// Where it was asked.
        at: f64,
        /// Lowest measured abscissa.
        low: f64,
        /// Highest measured abscissa.
        high: f64,
        /// Unit of the abscissa.
        unit: &'static str,
    },
    /// Something needed is not in the sheets.
    #[error("{emitter}: {missing}")]
    Missing {
        /// The emitter's name.
        emitter: String,
        /// A sentence that says what to add.
        missing: String,
    },
    /// A setting lies outside what makes sense.
    #[error("{what} is {value}: {expected}")]
    BadSetting {
        /// Which setting.
        what: &'static str,
        /// Its value.
        value: f64,
        /// What it should be.
        expected: &'static str,
    },
    /// Lists that must match in length do not.
    #[error("{what}: {expected} expected, {found} found")]
    LengthMismatch {
        /// What was counted.
        what: &'static str,
        /// Expected count.
        expected: usize,
        /// Found count.
        found: usize,
    },
    /// The build form cannot make this blend at this level.
    #[error("{reason}")]
    Unreachable {
        /// A sentence with the numbers.
        reason: String,
    },
    /// A fit had too little or unsuitable data.
    #[error("{reason}")]
    NotEnoughData {
        /// A sentence that says which runs or rows to add.
        reason: String,
    },
}

/// A remark that goes with a value: the value stands, but on a stated footing.
#[derive(Debug, Clone, PartialEq)]
#[non_exhaustive]
pub enum Notice {
    /// A table was continued a little past its end.
    BeyondTable {
        /// What was read.
        quantity: &'static str,
        /// Where.
        at: f64,
        /// Lowest measured abscissa.
        low: f64,
        /// Highest measured abscissa.
        high: f64,
        /// Unit of the abscissa.
        unit: &'static str,
    },
    /// A quantity is taken constant because the sheet says only that.
    HeldConstant {
        /// Which quantity.
        quantity: &'static str,
    },
}

impl fmt::Display for Notice {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Notice::BeyondTable { quantity, at, low, high, unit } => write!(
                f,
                "{quantity} at {at} {unit} continues a table that was measured from {low} to {high} {unit}"
            ),
            Notice::HeldConstant { quantity } => {
                write!(f, "{quantity} is taken as the same at every current: the sheet gives one number")
            }
        }
    }
}
