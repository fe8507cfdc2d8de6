//! Readers and writers: spectra, projects, blend sheets.
//!
//! * [`read`]: spectra files as instruments write them; what was assumed, warned of, and asked.
//! * [`project_file`]: projects as versioned RON, old versions migrated, newer ones refused.
//! * [`save`]: files that are whole at any instant, with one generation of backup.
//! * [`journal`]: every edit since the last save, for recovery.
//! * [`blend_sheet`]: what a blend is made of and what it will measure, as RON and CSV.
//! * [`spectrum_csv`]: the predicted spectrum.
//! * [`cells`]: CSV cells that no spreadsheet takes for a formula.
//! * [`report`]: the report as HTML and PDF, the recipe as CSV.
//! * [`drawing`]: its figures, and any plot, as SVG, PDF and PNG.
//! * [`digest`]: SHA-256 of a file's bytes.
//! * [`tm27`]: one spectrum as ANSI/IES TM-27-14 XML.

pub mod blend_sheet;
pub mod cells;
pub mod digest;
pub mod drawing;
pub mod journal;
pub mod project_file;
pub mod read;
pub mod report;
pub mod save;
pub mod spectrum_csv;
pub mod tm27;
