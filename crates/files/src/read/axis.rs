//! The unit of every axis: stated, found by its numbers, or asked.

use super::answers::{Answers, AxisUnit};
use super::columns::{Layout, plausible_units};
use super::convert::{axis_sentence, nm_from, visible};
use super::header::Header;
use super::judge;
use super::reading::Draft;
use super::samples::AxisSource;
use super::segments::Block;
use super::spectrum::Open;
use super::table::Table;
use super::text::Refusal;
use super::units::AxisKind;

/// The axis of every spectrum; decided once for each axis column.
pub(super) fn axis_sources(
    draft: &mut Draft,
    table: &Table<'_>,
    parts: &[Block],
    header: &Header,
    layout: &Layout,
    answers: &Answers,
    open: &mut Open,
) -> Result<Vec<AxisSource>, Refusal> {
    let mut known: Vec<(Option<usize>, AxisSource)> = Vec::new();
    let mut sources = Vec::with_capacity(layout.series.len());
    for series in &layout.series {
        if let Some((_, source)) = known.iter().find(|(axis, _)| *axis == series.axis) {
            sources.push(*source);
            continue;
        }
        let source = match (series.axis, answers.start_nm, answers.step_nm) {
            (_, Some(start_nm), Some(step_nm)) => {
                let rows = parts.iter().map(Block::len).max().unwrap_or(0);
                let last = start_nm + step_nm * rows.saturating_sub(1) as f64;
                if start_nm.min(last) > 780.0 || start_nm.max(last) < 380.0 {
                    return Err((
                        None,
                        format!(
                            "expected wavelengths between 380 and 780 nm, found {start_nm} to {last} nm by --start and --step"
                        ),
                    ));
                }
                draft.assume(format!(
                    "Wavelengths run from {start_nm} nm in steps of {step_nm} nm, as answered."
                ));
                AxisSource::Steps { start_nm, step_nm }
            }
            (Some(axis), ..) => axis_column(draft, table, parts, header, axis, answers, open)?,
            (None, ..) => {
                draft.ask(
                    "No column holds wavelengths: what is the first, and what the step?",
                    "--start and --step",
                    &[],
                );
                *open = Open { axis: true, values: true, ..*open };
                AxisSource::Steps { start_nm: 1.0, step_nm: 1.0 }
            }
        };
        known.push((series.axis, source));
        sources.push(source);
    }
    Ok(sources)
}

fn axis_column(
    draft: &mut Draft,
    table: &Table<'_>,
    parts: &[Block],
    header: &Header,
    column: usize,
    answers: &Answers,
    open: &mut Open,
) -> Result<AxisSource, Refusal> {
    let values: Vec<f64> =
        parts.iter().flat_map(Block::iter).filter_map(|row| table.at(row, column).number()).collect();
    let line = Some(draft.facts.first_data_line);
    let seen = |unit: AxisUnit, scale: f64| {
        values.iter().filter(|&&value| visible(nm_from(value * scale, unit))).count()
    };
    let positive: Vec<f64> = values.iter().copied().filter(|&value| value > 0.0).collect();
    let (low, high) = values
        .iter()
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), &value| (low.min(value), high.max(value)));
    let range = format!("{} to {}", judge::short(low), judge::short(high));
    let nothing = |unit: AxisUnit| {
        Err((
            line,
            format!(
                "expected wavelengths between 380 and 780 nm, found an axis from {range} {}",
                unit.symbol()
            ),
        ))
    };
    let hint = header.columns.get(column).and_then(|one| one.axis);
    let stated = hint.and_then(|hint| hint.unit).or(header
        .axis
        .filter(|_| {
            header.columns.get(column).is_none_or(|one| one.axis.is_none_or(|hint| hint.unit.is_none()))
        })
        .and_then(|hint| hint.unit));
    if let Some(unit) = answers.axis {
        if seen(unit, 1.0) == 0 {
            return nothing(unit);
        }
        draft.assume(format!("The axis is in {}, as answered.", unit.symbol()));
        return Ok(accept(draft, column, unit, 1.0));
    }
    let all = plausible_units(&positive);
    if let Some((unit, scale)) = stated {
        if seen(unit, scale) > 0 {
            if unit == AxisUnit::M {
                ask_axis(draft, open, "The axis is in metres, which is rare: is that right?", &[AxisUnit::M]);
            }
            return Ok(accept(draft, column, unit, scale));
        }
        // Light just outside the visible is no mistake of the header; anything else may be.
        let optical = positive
            .iter()
            .filter(|&&value| (100.0..=3000.0).contains(&nm_from(value * scale, unit)))
            .count()
            * 2
            > positive.len();
        if optical || all.is_empty() {
            return nothing(unit);
        }
        ask_axis(
            draft,
            open,
            &format!(
                "The header says {}, but the axis runs from {range}: which unit is it in?",
                unit.symbol()
            ),
            &all,
        );
        return Ok(accept(draft, column, all[0], 1.0));
    }
    let kind = hint.or(header.axis).map(|hint| hint.kind);
    let fits = |unit: &AxisUnit| match kind {
        Some(AxisKind::Wavelength) => unit.is_wavelength(),
        Some(AxisKind::Energy) => *unit == AxisUnit::Ev,
        Some(AxisKind::Wavenumber) => *unit == AxisUnit::Cm1,
        _ => true,
    };
    let fitting: Vec<AxisUnit> = all.iter().copied().filter(fits).collect();
    match fitting.as_slice() {
        [] if all.is_empty() => {
            Err((line, format!("expected wavelengths between 380 and 780 nm, found an axis from {range}")))
        }
        [] => {
            ask_axis(
                draft,
                open,
                &format!("The axis runs from {range}, which does not fit its name: which unit is it in?"),
                &all,
            );
            Ok(accept(draft, column, all[0], 1.0))
        }
        [AxisUnit::M] => {
            ask_axis(draft, open, &format!("The axis runs from {range}: is it in metres?"), &[AxisUnit::M]);
            Ok(accept(draft, column, AxisUnit::M, 1.0))
        }
        [unit] => {
            draft.assume(format!(
                "Unit of the axis not stated: taken as {}, since it runs from {range}.",
                unit.symbol()
            ));
            Ok(accept(draft, column, *unit, 1.0))
        }
        [AxisUnit::Nm, ..] if kind == Some(AxisKind::Wavelength) => {
            draft.assume(format!("Unit of the axis not stated: taken as nm, since it runs from {range}."));
            Ok(accept(draft, column, AxisUnit::Nm, 1.0))
        }
        several => {
            ask_axis(
                draft,
                open,
                &format!("The axis runs from {range}, which fits several units: which is it?"),
                several,
            );
            Ok(accept(draft, column, several[0], 1.0))
        }
    }
}

fn ask_axis(draft: &mut Draft, open: &mut Open, text: &str, units: &[AxisUnit]) {
    let keys: Vec<&str> = units.iter().map(|unit| unit.key()).collect();
    draft.ask(text, "--axis", &keys);
    *open = Open { axis: true, values: true, ..*open };
}

fn accept(draft: &mut Draft, column: usize, unit: AxisUnit, scale: f64) -> AxisSource {
    if let Some(sentence) = axis_sentence(unit, scale) {
        draft.assume(sentence);
    }
    AxisSource::Column { column, unit, scale }
}
