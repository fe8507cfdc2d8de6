//! Readers and writers: spectra, projects, blend sheets.

pub mod read;
