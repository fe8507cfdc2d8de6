//! The pictures inside the ledger.

mod hues;
mod neighbourhood;
mod samples;

pub(super) use hues::show as hues;
pub(super) use neighbourhood::show as neighbourhood;
pub(super) use samples::show as samples;
