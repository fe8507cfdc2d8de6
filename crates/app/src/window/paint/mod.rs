//! Pencils: patterned lines, filled curves, small signs and text at a point.

mod curve;
mod icon;
mod words;

pub(super) use curve::{Pattern, area, band, patterned};
pub(super) use icon::{Icon, icon};
pub(super) use words::{Words, elided, fixed, measure, signed, write};
