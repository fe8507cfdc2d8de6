//! A project of this program as a file of spectra: its emitters, with the corrections in force.

use super::answers::{Answers, AxisUnit, Ordinate, Per};
use super::judge::judge;
use super::reading::{Draft, QUANTITIES, Raw, ReadSpectrum};
use super::tm27::many_wanted;
use crate::project_file::read_project;

/// Reads the emitters of a project file.
pub(super) fn read(bytes: &[u8], answers: &Answers) -> Draft {
    let mut draft = Draft::default();
    draft.facts.format = "project";
    draft.facts.encoding = "UTF-8";
    let project = match read_project(bytes) {
        Ok(opened) => opened.project,
        Err(error) => {
            let sentence: String = error.to_string().replace('\n', " ").chars().take(300).collect();
            draft.refuse(
                error.line(),
                format!(
                    "expected a project of a version this program knows, found RON that is none: {sentence}"
                ),
            );
            return draft;
        }
    };
    for (index, emitter) in project.emitters.iter().enumerate() {
        if !many_wanted(answers, index + 1) {
            continue;
        }
        let spectrum = match emitter.spectrum() {
            Ok(spectrum) => spectrum,
            Err(error) => {
                draft.warn(format!("Left out {error}."));
                continue;
            }
        };
        if emitter.corrections.iter().any(|step| step.on) {
            draft.assume(format!("{:?}: the corrections in force are applied.", emitter.name));
        }
        let (nm, values) = (spectrum.wavelengths_nm(), spectrum.values());
        let judged = judge(nm, values, &|_| 1.0);
        draft.spectra.push(ReadSpectrum {
            name: emitter.name.clone(),
            column: index + 1,
            peak_nm: Some(judged.peak_nm),
            fwhm_nm: judged.fwhm_nm,
            first_nm: nm.first().copied(),
            last_nm: nm.last().copied(),
            points: Some(nm.len()),
            quantity: Some(QUANTITIES[1]),
            raw: Raw {
                axis: nm.to_vec(),
                axis_unit: AxisUnit::Nm,
                values: values.to_vec(),
                ordinate: Ordinate::Power,
                per: Per::Nm,
                unit: String::new(),
            },
            dark: judged.dark,
            offered: Vec::new(),
            spectrum,
        });
    }
    if draft.spectra.is_empty() {
        draft.refuse(None, "expected a project with emitters, found none");
    }
    draft
}
