//! Table of contents to come.

pub mod unmix;
