//! The blend sheet as a table: one block a subject, blocks apart by an empty line.

use super::{BlendSheet, maximise_text, region_text};
use crate::cells::{write_row, writer};
use project::Correction;

/// The sheet as CSV (UTF-8, RFC 4180): blocks of rows, the first cell of each naming what it is. Cells that a
/// spreadsheet would run are defused.
///
/// # Errors
/// Only if memory cannot be written to.
pub fn blend_sheet_csv(sheet: &BlendSheet) -> csv::Result<String> {
    let mut out = writer(Vec::new());
    let mut row = |cells: &[&str]| write_row(&mut out, cells);
    let white = &sheet.white_spec;
    row(&["blend sheet", &sheet.sheet_version.to_string()])?;
    row(&["program", &sheet.program])?;
    row(&["project", &sheet.project])?;
    row(&["set", &sheet.set])?;
    row(&["note", &sheet.note])?;
    row(&[""])?;
    row(&["white spec", "value"])?;
    row(&["target_cct_k", &number(white.cct_k)])?;
    row(&["target_duv", &number(white.duv)])?;
    row(&["within", &region_text(&white.region)])?;
    row(&["maximise", maximise_text(white.maximise)])?;
    row(&["lumens_wanted", &some(white.lumens)])?;
    row(&["luminance_wanted_cd_per_m2", &some(white.luminance_cd_per_m2)])?;
    row(&[""])?;
    row(&["limit", "value", "low", "high", "met"])?;
    for limit in &sheet.limits {
        let met = if limit.met { "yes" } else { "no" };
        row(&[limit.name, &some(limit.value), &some(limit.low), &some(limit.high), met])?;
    }
    row(&[""])?;
    row(&[
        "emitter",
        "share_radiant",
        "share_luminous",
        "share_photon",
        "peak_nm",
        "fwhm_nm",
        "mean_wavelength_nm",
        "ler_lm_per_w",
        "wall_plug",
        "optical_w",
        "electrical_w",
        "invented",
        "geometry",
        "origin",
        "mounting",
        "source_file",
        "source_column",
        "source_sha256",
        "corrections",
    ])?;
    for emitter in &sheet.emitters {
        let source = emitter.source.clone().unwrap_or_default();
        let corrections: Vec<String> = emitter
            .corrections
            .iter()
            .map(|step| format!("{}{}", words(step.correction), if step.on { "" } else { " (off)" }))
            .collect();
        row(&[
            &emitter.name,
            &number(emitter.share_radiant),
            &number(emitter.share_luminous),
            &number(emitter.share_photon),
            &number(emitter.peak_nm),
            &some(emitter.fwhm_nm),
            &number(emitter.mean_wavelength_nm),
            &number(emitter.ler_lm_per_w),
            &some(emitter.wall_plug),
            &some(emitter.optical_w),
            &some(emitter.electrical_w),
            if emitter.invented { "yes" } else { "no" },
            &format!("{:?}", emitter.geometry),
            &format!("{:?}", emitter.origin),
            &format!("{:?}", emitter.mounting),
            &source.name,
            &source.column,
            &source.sha256,
            &corrections.join("; "),
        ])?;
    }
    row(&[""])?;
    row(&["predicted", "value"])?;
    let colour = &sheet.predicted.colour;
    for (name, value) in [
        ("x", Some(colour.x)),
        ("y", Some(colour.y)),
        ("u_prime", Some(colour.u_prime)),
        ("v_prime", Some(colour.v_prime)),
        ("cct_k", colour.cct_k),
        ("duv", colour.duv),
        ("distance_from_target_uv_prime", Some(sheet.predicted.distance_from_target_uv_prime)),
        ("ler_lm_per_w", Some(colour.ler_lm_per_w)),
        ("efficacy_lm_per_w", sheet.predicted.efficacy_lm_per_w),
        ("optical_w", sheet.predicted.optical_w),
        ("ra", colour.ra),
        ("rf", colour.rf),
        ("rg", colour.rg),
        ("sp_ratio", Some(colour.sp_ratio)),
        ("melanopic_der", Some(colour.melanopic_der)),
        ("kbv_w_per_lm", Some(colour.kbv_w_per_lm)),
    ] {
        row(&[name, &some(value)])?;
    }
    for k in 0..15 {
        row(&[&format!("r{}", k + 1), &some(colour.r.map(|r| r[k]))])?;
    }
    for (name, bins) in [("rf_h", &colour.rf_bins), ("rcs_h", &colour.rcs_bins), ("rhs_h", &colour.rhs_bins)]
    {
        for k in 0..16 {
            row(&[&format!("{name}{}", k + 1), &some(bins.and_then(|bins| bins[k]))])?;
        }
    }
    row(&[""])?;
    if let Some(proof) = &sheet.proof {
        row(&["proof", proof])?;
    }
    for text in &sheet.assumptions {
        row(&["assumption", text])?;
    }
    for emitter in &sheet.emitters {
        for text in &emitter.reader_assumptions {
            row(&["reader assumption", &emitter.name, text])?;
        }
        for text in &emitter.reader_warnings {
            row(&["reader warning", &emitter.name, text])?;
        }
    }
    for text in &sheet.cautions {
        row(&["caution", text])?;
    }
    let bytes = out.into_inner().map_err(|error| csv::Error::from(error.into_error()))?;
    // The writer was given text only.
    Ok(String::from_utf8_lossy(&bytes).into_owned())
}

fn number(value: f64) -> String {
    value.to_string()
}

fn some(value: Option<f64>) -> String {
    value.map(number).unwrap_or_default()
}

fn words(correction: Correction) -> String {
    match correction {
        Correction::SubtractDark { level } => format!("dark level {level} subtracted"),
        Correction::RemoveNegatives => "negative samples set to zero".to_owned(),
        Correction::Crop { first_nm, last_nm } => format!("cut to {first_nm} to {last_nm} nm"),
        Correction::Shift { by_nm } => format!("moved by {by_nm} nm"),
    }
}
