//! Spectra of formats that state their axis: pairs of cells become one spectrum by the same rules as delimited text.

use super::answers::{Answers, AxisUnit, Per};
use super::convert::{axis_sentence, nm_from, visible};
use super::number::Cell;
use super::reading::Draft;
use super::samples::{AxisSource, Samples};
use super::segments::Block;
use super::spectrum::{Meaning, Naming, Open, finish_spectrum, ordinate, report_samples, unusable};
use super::split::Separator;
use super::table::Table;
use super::text::Refusal;
use super::units::OrdinateHint;

/// One data block of a file.
pub(super) struct Pairs {
    pub(super) name: String,
    /// The file line of the first pair.
    pub(super) line: usize,
    pub(super) axis: Vec<Cell>,
    pub(super) values: Vec<Cell>,
    /// The unit the file states.
    pub(super) unit: Option<AxisUnit>,
    pub(super) hint: OrdinateHint,
    /// The ordinate's unit as the file words it.
    pub(super) unit_text: String,
}

/// Adds the spectrum of one block to the draft.
///
/// # Errors
/// Why no answer could make a spectrum of it.
pub(super) fn add(
    draft: &mut Draft,
    pairs: &Pairs,
    place: usize,
    many: bool,
    answers: &Answers,
) -> Result<(), Refusal> {
    let line = Some(pairs.line);
    let mut open = Open::default();
    let numbers: Vec<f64> = pairs.axis.iter().filter_map(|cell| cell.number()).collect();
    let unit = axis(draft, pairs, &numbers, answers, &mut open).map_err(|sentence| (line, sentence))?;
    let damaged = (0..pairs.axis.len())
        .filter(|&row| {
            pairs.axis[row] == Cell::Word || pairs.values.get(row).is_none_or(|cell| *cell == Cell::Word)
        })
        .count();
    if damaged > 0 && damaged * 5 >= pairs.axis.len() {
        return Err((
            line,
            format!("expected pairs of numbers, found {damaged} of {} unreadable", pairs.axis.len()),
        ));
    }
    let table = Table::upright(
        &[pairs.axis.clone(), pairs.values.clone()],
        Separator::Tab,
        u32::try_from(pairs.line).unwrap_or(u32::MAX),
    );
    let rows = 0..table.rows.len();
    let block = Block { rows: vec![rows], unreadable: 0, first_unreadable: 0 };
    let source = AxisSource::Column { column: 0, unit, scale: 1.0 };
    let samples = Samples::collect(&table, &block, source, 1, false);
    if let Some(sentence) = unusable(&samples) {
        return Err((line, sentence));
    }
    let label = if many { format!("{:?}: ", pairs.name) } else { String::new() };
    report_samples(draft, &label, &samples, true);
    let meaning = ordinate(draft, &pairs.hint, &pairs.unit_text, unit, answers, &mut open);
    let naming = Naming {
        name: &pairs.name,
        label: &label,
        place,
        unit: &pairs.unit_text,
        accepted: answers.columns.as_ref().is_some_and(|wanted| wanted.contains(&place)),
    };
    let meaning = Meaning { axis_unit: unit, ..meaning };
    draft.facts.rows += samples.nm.len();
    if let Some(spectrum) = finish_spectrum(draft, &samples, &meaning, &naming, open) {
        draft.spectra.push(spectrum);
    }
    Ok(())
}

fn axis(
    draft: &mut Draft,
    pairs: &Pairs,
    numbers: &[f64],
    answers: &Answers,
    open: &mut Open,
) -> Result<AxisUnit, String> {
    let stated = answers.axis.or(pairs.unit);
    let fitting = super::columns::plausible_units(numbers);
    let unit = match (stated, fitting.as_slice()) {
        (Some(unit), _) => unit,
        (None, [unit, ..]) => {
            draft.assume(format!("Unit of the axis not stated: taken as {}, by its numbers.", unit.symbol()));
            *unit
        }
        (None, []) => AxisUnit::Nm,
    };
    if answers.axis.is_some() {
        draft.assume(format!("The axis is in {}, as answered.", unit.symbol()));
    } else if unit == AxisUnit::M || (pairs.unit.is_none() && fitting.len() > 1) {
        let keys: Vec<&str> = fitting.iter().map(|unit| unit.key()).collect();
        draft.ask("Which unit is the axis in?", "--axis", if keys.is_empty() { &["m"] } else { &keys });
        *open = Open { axis: true, values: true, ..*open };
    }
    if !numbers.iter().any(|&value| visible(nm_from(value, unit))) {
        return Err(format!(
            "expected wavelengths between 380 and 780 nm, found none among {} axis values in {}",
            numbers.len(),
            unit.symbol()
        ));
    }
    if let Some(sentence) = axis_sentence(unit, 1.0) {
        draft.assume(sentence);
    }
    Ok(unit)
}

/// The hint of a quantity that is power per nm in a file whose axis is nm.
pub(super) fn power_per_nm(absolute: bool) -> OrdinateHint {
    OrdinateHint {
        ordinate: Some(super::Ordinate::Power),
        per: Some(Per::Nm),
        absolute,
        ..OrdinateHint::default()
    }
}
