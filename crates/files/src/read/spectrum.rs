//! From usable samples to one spectrum: its quantity, its conversions, its warnings.

use super::answers::{Answers, AxisUnit, Ordinate, Per};
use super::columns::{Layout, Series};
use super::convert::{factor, ordinate_sentences};
use super::header::Header;
use super::judge::judge;
use super::reading::{Draft, QUANTITIES, Raw, ReadSpectrum};
use super::samples::{AxisSource, Samples};
use super::segments::LEAST_ROWS;
use super::units::OrdinateHint;
use colour::Spectrum;
use project::Correction;

/// Why samples make no spectrum.
pub(super) fn unusable(samples: &Samples) -> Option<String> {
    let count = samples.nm.len();
    if count < LEAST_ROWS {
        return Some(format!("expected at least {LEAST_ROWS} usable samples, found {count}"));
    }
    if !samples.values.iter().any(|&value| value > 0.0) {
        return Some("expected a value above 0, found none".into());
    }
    None
}

/// Warnings and assumptions about samples left out, merged or reordered.
pub(super) fn report(draft: &mut Draft, label: &str, samples: &Samples, layout: &Layout, many: bool) {
    report_samples(draft, label, samples, !many || layout.series.len() < 2);
}

/// The same; columns that share an axis may end early without a word (`ends_too` false).
pub(super) fn report_samples(draft: &mut Draft, label: &str, samples: &Samples, ends_too: bool) {
    let rows =
        |count: usize| if count == 1 { "1 sample was".to_owned() } else { format!("{count} samples were") };
    let at = samples.first_bad_line;
    if samples.no_axis > 0 {
        draft.warn(format!(
            "{label}{} left out: the axis is missing or not above 0, line {at} first.",
            rows(samples.no_axis)
        ));
    }
    if samples.unreadable > 0 {
        draft.warn(format!("{label}{} left out as unreadable, line {at} first.", rows(samples.unreadable)));
    }
    let missing = samples.missing_inside + if ends_too { samples.missing_at_ends } else { 0 };
    if missing > 0 {
        draft.warn(format!(
            "{label}{} left out without a value, line {at} first; gaps are bridged by straight lines.",
            rows(missing)
        ));
    }
    if samples.merged > 0 {
        draft.warn(format!(
            "{label}{} merged by averaging: the wavelength occurs more than once.",
            rows(samples.merged)
        ));
    }
    if samples.shuffled {
        draft.assume(format!("{label}The rows are in no order of wavelength: they were sorted."));
    }
}

/// How one spectrum of a table is called, and what is open about it.
pub(super) struct SpectrumAsk<'a> {
    pub(super) name: &'a str,
    pub(super) label: &'a str,
    pub(super) place: usize,
    pub(super) open: Open,
}

/// Converts and judges one spectrum.
pub(super) fn make(
    draft: &mut Draft,
    samples: &Samples,
    source: AxisSource,
    header: &Header,
    series: &Series,
    answers: &Answers,
    about: &SpectrumAsk<'_>,
) -> Option<ReadSpectrum> {
    let own = header.columns.get(series.value);
    let hint = own.map(|one| one.ordinate.clone()).unwrap_or_default().or(&header.ordinate);
    let axis_unit = match source {
        AxisSource::Column { unit, .. } => unit,
        AxisSource::Steps { .. } => AxisUnit::Nm,
    };
    let mut open = about.open;
    let meaning = ordinate(
        draft,
        &hint,
        if own.is_some_and(|one| !one.name.is_empty()) { about.name } else { "" },
        axis_unit,
        answers,
        &mut open,
    );
    finish_spectrum(
        draft,
        samples,
        &Meaning { axis_unit, ..meaning },
        &Naming {
            name: about.name,
            label: about.label,
            place: about.place,
            unit: own.map_or("", |one| one.all.as_str()),
            accepted: answers.columns.is_some(),
        },
        open,
    )
}

/// What the numbers of a spectrum mean.
#[derive(Debug, Clone, Copy)]
pub(super) struct Meaning {
    pub(super) axis_unit: AxisUnit,
    pub(super) ordinate: Ordinate,
    pub(super) per: Per,
    pub(super) absolute: bool,
}

/// How a spectrum is called.
pub(super) struct Naming<'a> {
    pub(super) name: &'a str,
    /// Opens every sentence about this spectrum when there are several.
    pub(super) label: &'a str,
    pub(super) place: usize,
    pub(super) unit: &'a str,
    /// The column was named in an answer and is taken as it is.
    pub(super) accepted: bool,
}

/// What open questions leave unknown of a spectrum.
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct Open {
    pub(super) axis: bool,
    pub(super) values: bool,
    pub(super) quantity: bool,
    pub(super) points: bool,
}

/// Decides what the ordinate is, listing every assumption and conversion.
pub(super) fn ordinate(
    draft: &mut Draft,
    hint: &OrdinateHint,
    name: &str,
    axis: AxisUnit,
    answers: &Answers,
    open: &mut Open,
) -> Meaning {
    let shown = if name.is_empty() { String::new() } else { format!(" ({name:?})") };
    if let Some(what) = hint.not_emission
        && answers.ordinate.is_none()
    {
        draft.ask(
            format!(
                "The values{shown} are {what}, which is no emission: are they power or photons after all?"
            ),
            "--ordinate",
            &["power", "photons"],
        );
        *open = Open { values: true, quantity: true, ..*open };
    }
    if hint.counts {
        draft.warn(format!("The values{shown} are counts: without a calibration of the instrument they are no spectrum of power."));
    }
    let kind = answers.ordinate.or(hint.ordinate).unwrap_or(Ordinate::Power);
    let natural = match axis {
        AxisUnit::Ev => Per::Ev,
        AxisUnit::Cm1 => Per::Cm1,
        _ => Per::Nm,
    };
    let per = answers.per.or(hint.per).unwrap_or(natural);
    if answers.per.or(hint.per).is_none() && !axis.is_wavelength() {
        let own = natural.key();
        draft.ask(format!("The axis is in {}, but nothing says per what the values{shown} are counted: per {} or per nm?", axis.symbol(), natural.symbol()), "--per", &[own, "nm"]);
        *open = Open { values: true, quantity: true, ..*open };
    }
    let stated = hint.ordinate.is_some();
    match (answers.ordinate, stated, hint.per.is_some()) {
        (Some(kind), ..) => draft.assume(format!("The values{shown} are {}, as answered.", kind.key())),
        (None, false, _) => draft.assume(if name.is_empty() {
            format!("The values are not named: taken as relative power per {}.", per.symbol())
        } else {
            format!("The quantity of {name:?} is not stated: taken as relative power per {}.", per.symbol())
        }),
        (None, true, false) if axis.is_wavelength() => draft.assume(format!(
            "{} taken as per nm{shown}.",
            if kind == Ordinate::Power { "Power" } else { "Photons" }
        )),
        _ => {}
    }
    if let Some(per) = answers.per {
        draft.assume(format!("The values{shown} are per {}, as answered.", per.symbol()));
    }
    for sentence in ordinate_sentences(kind, per) {
        draft.assume(sentence);
    }
    Meaning {
        axis_unit: axis,
        ordinate: kind,
        per,
        absolute: hint.absolute && !hint.relative && !hint.counts,
    }
}

/// Converts, judges and names one spectrum; `None` when it holds nothing the colour sums could use.
pub(super) fn finish_spectrum(
    draft: &mut Draft,
    samples: &Samples,
    meaning: &Meaning,
    naming: &Naming<'_>,
    open: Open,
) -> Option<ReadSpectrum> {
    let label = naming.label;
    let mut open = open;
    let largest = samples.values.iter().fold(0.0_f64, |largest, value| largest.max(value.abs()));
    // Sums and squares of such numbers would leave the range of double precision.
    let rescale = if (1e-100..=1e100).contains(&largest) { 1.0 } else { 1.0 / largest };
    if rescale != 1.0 {
        draft.warn(format!("{label}The values reach {largest:e} and were divided by that to stay in range."));
    }
    let values: Vec<f64> = if rescale == 1.0 {
        samples.values.clone()
    } else {
        samples.values.iter().map(|value| value / largest).collect()
    };
    let factors = |nm: f64| factor(nm, meaning.ordinate, meaning.per);
    let judged = judge(&samples.nm, &values, &factors);
    // Without an axis nothing can be said about places on it.
    for sentence in judged.warnings.iter().filter(|_| !open.axis) {
        draft.warn(if label.is_empty() {
            sentence_case(sentence)
        } else {
            stopped(&format!("{label}{sentence}"))
        });
    }
    if let Some((from, to)) = judged.hole
        && !naming.accepted
        && !open.axis
    {
        draft.ask(
            format!("{label}The peak may lie in the gap between {from} and {to} nm: is the spectrum to be used with the gap bridged by a straight line?"),
            "--columns",
            &[&naming.place.to_string()],
        );
        open.values = true;
    }
    if judged.mostly_negative && !naming.accepted {
        draft.ask(
            format!("{label}Most of the spectrum is negative: is it to be used as it is?"),
            "--columns",
            &[&naming.place.to_string()],
        );
        open.values = true;
    }
    let power: Vec<f64> = samples.nm.iter().zip(&values).map(|(&nm, &value)| value * factors(nm)).collect();
    let spectrum = match Spectrum::new(samples.nm.clone(), power) {
        Ok(spectrum) => spectrum,
        Err(error) => {
            draft.warn(format!("Left out {label}{error}."));
            return None;
        }
    };
    let mut offered = Vec::new();
    if let Some(dark) = judged.dark.filter(|dark| dark.of_peak.abs() > 0.001)
        && meaning.per == Per::Nm
        && meaning.ordinate == Ordinate::Power
    {
        offered.push(Correction::SubtractDark { level: dark.level });
    }
    if judged.negative_area > 0.0 {
        offered.push(Correction::RemoveNegatives);
    }
    let known = !(open.axis || open.values);
    let count = samples.nm.len();
    Some(ReadSpectrum {
        name: naming.name.to_owned(),
        column: naming.place,
        peak_nm: known.then_some(judged.peak_nm),
        fwhm_nm: judged.fwhm_nm.filter(|_| known),
        first_nm: (!open.axis).then(|| samples.nm[0]),
        last_nm: (!open.axis).then(|| samples.nm[count - 1]),
        points: (!open.points).then_some(count),
        quantity: (!open.quantity).then(|| quantity(meaning)),
        raw: Raw {
            axis: samples.axis.clone(),
            axis_unit: meaning.axis_unit,
            values: samples.values.clone(),
            ordinate: meaning.ordinate,
            per: meaning.per,
            unit: naming.unit.to_owned(),
        },
        spectrum,
        dark: judged.dark,
        offered,
    })
}

fn sentence_case(sentence: &str) -> String {
    let mut letters = sentence.chars();
    letters
        .next()
        .map_or_else(String::new, |first| stopped(&format!("{}{}", first.to_uppercase(), letters.as_str())))
}

/// Closes a sentence that has no mark at its end yet.
fn stopped(sentence: &str) -> String {
    if sentence.ends_with('?') { sentence.to_owned() } else { format!("{sentence}.") }
}

fn quantity(meaning: &Meaning) -> &'static str {
    let per = match meaning.per {
        Per::Nm => 0,
        Per::Ev => 2,
        Per::Cm1 => 4,
    };
    let kind = if meaning.ordinate == Ordinate::Photons { 6 } else { 0 };
    QUANTITIES[kind + per + usize::from(!meaning.absolute)]
}
