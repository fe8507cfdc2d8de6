//! What the checks beside it share.

pub mod table;
