//! The report of a white and its recipe: one self-contained HTML file, or an A4 PDF.
//!
//! A [`ReportModel`] is plain data that others fill. [`html::page`] and [`pdf::pages`] both print the same list of
//! blocks made from it, so the two can never say different things. Neither runs, fetches or expands anything:
//! names are escaped, there are no scripts and no addresses, fonts and figures are inside. The bytes depend on the
//! model alone; the date is a text of the model.

mod content;
pub mod html;
mod layout;
pub mod model;
pub mod number;
pub mod pdf;
pub mod recipe_csv;

pub use content::PHOTOBIOLOGY_CAUTION;
pub use model::{
    Assumption, LedgerLine, MeasuredValue, Method, RecipeRow, RecipeSheet, ReportModel, ShareRow, SourceFile,
};
