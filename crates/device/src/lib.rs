//! Emitter sheets and build forms: how shares of a blend become a device, and back.
//!
//! | module | subject |
//! |---|---|
//! | [`sheet`] | what a maker knows about one emitter, as plain data |
//! | [`curve`] | measured tables over current |
//! | [`roll_off`] | published EQE roll-off formulas and their fits |
//! | [`out_coupling`] | the factor on outgoing light |
//! | [`units`] | physical constants |
//! | [`error`] | errors and notices |
//!
//! Out of scope: finding the blend (the optimiser does), files, pictures. Nothing here reads a clock, a file
//! or a global.

pub mod curve;
pub mod error;
pub mod out_coupling;
pub mod roll_off;
pub mod sheet;
pub mod units;

pub use error::{DeviceError, Notice};
pub use sheet::Sheet;
