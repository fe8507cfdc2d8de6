//! What a header, a unit row or a line of notes says about the axis and the ordinate.

use super::answers::{AxisUnit, Ordinate, Per};
use super::vocabulary::{self, Aside, fold, words};

/// What kind of axis a header names.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum AxisKind {
    Wavelength,
    Energy,
    Wavenumber,
    /// Named by its unit alone.
    Unit,
    /// A spectral axis no answer covers: frequency.
    Frequency,
}

/// What a text says about the axis.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct AxisHint {
    pub(super) kind: AxisKind,
    /// The unit and the factor that brings the file's numbers to it.
    pub(super) unit: Option<(AxisUnit, f64)>,
}

/// What a text says about an ordinate.
#[derive(Debug, Clone, Default, PartialEq)]
pub(super) struct OrdinateHint {
    pub(super) ordinate: Option<Ordinate>,
    pub(super) counts: bool,
    pub(super) per: Option<Per>,
    /// True when an absolute unit such as W or mol stands there and nothing says "relative".
    pub(super) absolute: bool,
    pub(super) relative: bool,
    pub(super) not_emission: Option<&'static str>,
    pub(super) aside: Option<Aside>,
}

impl OrdinateHint {
    /// Fills what this hint leaves open from a wider one.
    pub(super) fn or(self, wider: &Self) -> Self {
        let stated = self.ordinate.is_some() || self.counts;
        Self {
            ordinate: if stated { self.ordinate } else { wider.ordinate },
            counts: self.counts || (!stated && wider.counts),
            per: self.per.or(wider.per),
            absolute: (self.absolute || wider.absolute) && !self.relative && !wider.relative,
            relative: self.relative || wider.relative,
            not_emission: self.not_emission.or(if stated { None } else { wider.not_emission }),
            aside: self.aside,
        }
    }
}

/// The unit of an axis written alone, such as `nm`, `[µm]`, `1/cm`.
pub(super) fn axis_unit(text: &str) -> Option<(AxisUnit, f64)> {
    let bare = text
        .trim()
        .trim_matches(|c: char| matches!(c, '(' | ')' | '[' | ']' | '{' | '}' | '<' | '>' | ':' | '=' | '.'))
        .trim();
    // Case tells Å from a and M from m.
    if bare == "A" {
        return Some((AxisUnit::Angstrom, 1.0));
    }
    let folded = fold(bare).replace(' ', "");
    Some(match folded.as_str() {
        "nm" | "nanometer" | "nanometers" | "nanometre" | "nanometres" | "nanometri" | "nanometros"
        | "нм" | "ナノメートル" | "纳米" | "nanom" => (AxisUnit::Nm, 1.0),
        "um" | "mum" | "micron" | "microns" | "micrometer" | "micrometers" | "micrometre" | "micrometres"
        | "mikrometer" | "мкм" | "mikron" | "micrometri" => (AxisUnit::Um, 1.0),
        "å" | "angstrom" | "angstroms" | "angstroem" | "ångstrom" | "ångström" | "å.u." | "aa" => {
            (AxisUnit::Angstrom, 1.0)
        }
        "m" | "meter" | "meters" | "metre" | "metres" => (AxisUnit::M, 1.0),
        "mm" => (AxisUnit::M, 1e-3),
        "pm" | "picometer" | "picometre" => (AxisUnit::Nm, 1e-3),
        "cm-1" | "cm**-1" | "1/cm" | "/cm" | "cm1" | "1/cm-1" | "cm(-1)" | "cm{-1}" | "percm" | "kayser"
        | "см-1" | "cm-1shift" => (AxisUnit::Cm1, 1.0),
        "ev" | "electronvolt" | "electronvolts" | "electron-volt" | "elektronenvolt" | "эв" => {
            (AxisUnit::Ev, 1.0)
        }
        "mev" => (AxisUnit::Ev, 1e-3),
        "kev" => (AxisUnit::Ev, 1e3),
        _ => return None,
    })
}

/// The unit inside a longer header: in brackets, after a slash, comma, `in` or underscore, or as its last word.
fn unit_inside(text: &str) -> Option<(AxisUnit, f64)> {
    for (open, close) in [('(', ')'), ('[', ']'), ('{', '}'), ('<', '>')] {
        let mut rest = text;
        while let Some(start) = rest.find(open) {
            let inside = &rest[start + open.len_utf8()..];
            let end = inside.rfind(close).unwrap_or(inside.len());
            if let Some(unit) =
                axis_unit(&inside[..end]).or_else(|| axis_unit(inside.split(close).next().unwrap_or("")))
            {
                return Some(unit);
            }
            rest = inside;
        }
    }
    if let Some((_, unit)) = text.split_once('/')
        && let Some(unit) = axis_unit(unit)
    {
        return Some(unit);
    }
    let tail = text.rsplit([' ', ',', '_', ':', ';', '/', '\t', '.', '=', '-']).next().unwrap_or("");
    let last = text.rsplit([' ', ',', '_', ':', ';', '\t', '=']).next().unwrap_or("");
    axis_unit(last)
        .or_else(|| axis_unit(tail))
        .filter(|(unit, _)| last.len() > 1 || *unit == AxisUnit::Angstrom || text.contains(['/', '_', ',']))
        .or_else(|| {
            text.split([' ', ',', ';', '_', '\t'])
                .find_map(|word| axis_unit(word).filter(|_| word.chars().count() > 1))
        })
}

/// What a column header says when it names an axis; `None` for anything else.
pub(super) fn axis_hint(text: &str) -> Option<AxisHint> {
    let text = text.trim();
    if text.is_empty() || text.len() > 200 {
        return None;
    }
    if let Some(unit) = axis_unit(text) {
        // A bare m or A names nothing by itself.
        let alone = fold(text.trim_matches(['(', ')', '[', ']'])).chars().count() < 2
            && !text.starts_with(['(', '[']);
        let sure = !alone || unit.0 == AxisUnit::Angstrom && !text.contains('A');
        return sure.then_some(AxisHint { kind: AxisKind::Unit, unit: Some(unit) });
    }
    let folded = fold(text);
    let head = folded.trim_start_matches(|c: char| !c.is_alphanumeric());
    // A wavelength of something is a note, not the axis.
    let of_something = |word: &&str| {
        matches!(
            *word,
            "peak"
                | "dominant"
                | "centre"
                | "center"
                | "central"
                | "centroid"
                | "range"
                | "start"
                | "end"
                | "stop"
                | "first"
                | "last"
                | "min"
                | "max"
                | "minimum"
                | "maximum"
                | "resolution"
                | "step"
                | "interval"
                | "calibration"
                | "excitation"
                | "laser"
                | "accuracy"
                | "offset"
                | "shift"
                | "mean"
                | "bereich"
                | "plage"
                | "spitzen"
                | "increment"
                | "count"
                | "counts"
                | "number"
                | "from"
                | "to"
                | "correction"
        )
    };
    if words(&folded).iter().any(of_something) && !vocabulary::names_wavenumber(&folded) {
        return None;
    }
    let unit = unit_inside(text);
    let mut lead = folded.split(['(', '[', '/', ',', ';']).next().unwrap_or("").to_owned();
    if lead.trim().is_empty() {
        lead.clone_from(&folded);
    }
    if vocabulary::names_wavenumber(&lead) {
        return Some(AxisHint {
            kind: AxisKind::Wavenumber,
            unit: unit.filter(|unit| unit.0 == AxisUnit::Cm1),
        });
    }
    let ordinate_first = {
        let first = words(head).first().copied().unwrap_or("").to_owned();
        vocabulary::names_power(&first)
            || vocabulary::names_counts(&first)
            || matches!(
                first.as_str(),
                "intensity" | "spectral" | "signal" | "intensitat" | "intensite" | "per"
            )
    };
    if vocabulary::names_wavelength(&lead) && !ordinate_first && !lead.contains(" per ") {
        return Some(AxisHint {
            kind: AxisKind::Wavelength,
            unit: unit.filter(|unit| unit.0.is_wavelength()),
        });
    }
    if vocabulary::names_energy(&lead)
        && !ordinate_first
        && !lead.contains("radiant")
        && !lead.contains("density")
        && !lead.contains(" per ")
    {
        let joules =
            words(&folded).iter().any(|&word| matches!(word, "j" | "mj" | "uj" | "joule" | "joules"));
        let other_unit = joules || folded.contains(['(', '[']) && unit.is_none();
        return (!other_unit).then_some(AxisHint {
            kind: AxisKind::Energy,
            unit: unit.filter(|unit| unit.0 == AxisUnit::Ev),
        });
    }
    let list = words(&folded);
    let frequency = list.iter().any(|&word| {
        matches!(
            word,
            "frequency" | "frequenz" | "frequence" | "frequenza" | "frecuencia" | "thz" | "hz" | "ghz"
        )
    });
    if frequency && !ordinate_first {
        return Some(AxisHint { kind: AxisKind::Frequency, unit: None });
    }
    // x (nm), X [nm], "nm " with a bracket.
    let short = matches!(
        words(&lead).as_slice(),
        [] | ["x"]
            | ["l"]
            | ["e"]
            | ["x", "axis"]
            | ["xaxis"]
            | ["x", "value" | "values"]
            | ["xvalue" | "xvalues"]
            | ["nm"]
    );
    if short && unit.is_some() {
        return Some(AxisHint { kind: AxisKind::Unit, unit });
    }
    None
}

/// What a header, unit or statement says about an ordinate.
pub(super) fn ordinate_hint(text: &str) -> OrdinateHint {
    let folded = fold(text);
    let list = words(&folded);
    let factors = factors(&folded);
    let has = |names: &[&str]| factors.iter().any(|factor| names.contains(&factor.symbol.as_str()));
    let watts = factors.iter().any(|factor| is_watt(&factor.symbol, text));
    let moles = has(&["mol", "umol", "nmol", "mmol", "pmol", "kmol"]);
    let counts = vocabulary::names_counts(&folded);
    let photons = moles
        || (vocabulary::names_photons(&folded)
            && !folded.contains("photon energy")
            && !folded.contains("photon counting"));
    let power = watts || has(&["j", "mj", "uj"]) && folded.contains('/') || vocabulary::names_power(&folded);
    let ordinate = if counts {
        None
    } else if photons {
        Some(Ordinate::Photons)
    } else if power {
        Some(Ordinate::Power)
    } else {
        None
    };
    let relative = list.iter().any(|&word| {
        matches!(
            word,
            "rel"
                | "relative"
                | "relativ"
                | "relativa"
                | "relativo"
                | "norm"
                | "normalised"
                | "normalized"
                | "normiert"
                | "arb"
                | "au"
                | "willk"
        )
    }) || folded.contains("a.u.")
        || folded.contains("相对")
        || folded.contains("相対");
    OrdinateHint {
        ordinate,
        counts,
        per: per(&folded, &factors),
        absolute: (watts || moles || (photons && has(&["s"]))) && !relative,
        relative,
        not_emission: if photons || watts { None } else { vocabulary::not_emission(&folded) },
        aside: vocabulary::aside(&folded)
            .or_else(|| vocabulary::names_uncertainty(&folded).then_some(Aside::Uncertainty)),
    }
}

fn is_watt(symbol: &str, text: &str) -> bool {
    match symbol {
        "mw" | "uw" | "nw" | "pw" | "kw" | "watt" | "watts" | "вт" | "мвт" => true,
        // A lone letter only counts as a capital.
        "w" => text.contains('W') && text.trim() != "W",
        _ => false,
    }
}

/// True when a text is nothing but a unit or a word for a relative scale.
pub(super) fn is_unit_cell(text: &str) -> bool {
    let text = text.trim();
    if text.is_empty() || axis_unit(text).is_some() {
        return true;
    }
    let folded = fold(text);
    let bare = folded.trim_matches(|c: char| matches!(c, '(' | ')' | '[' | ']' | ' '));
    if matches!(
        bare,
        "a.u."
            | "a. u."
            | "au"
            | "a.u"
            | "arb"
            | "arb."
            | "arb. units"
            | "arb. u."
            | "arb.u."
            | "arbitrary units"
            | "arbitrary"
            | "rel"
            | "rel."
            | "rel. units"
            | "relative"
            | "r.u."
            | "counts"
            | "cts"
            | "cps"
            | "counts/s"
            | "%"
            | "-"
            | "1"
            | "w.e."
            | "willk. einh."
            | "u.a."
            | "norm"
            | "norm."
            | "normalised"
            | "normalized"
            | "deg"
            | "°"
            | "v"
            | "mv"
            | "ma"
            | "photons"
    ) {
        return true;
    }
    let parts = factors(&folded);
    !parts.is_empty() && parts.iter().all(|factor| known_symbol(&factor.symbol))
}

fn known_symbol(symbol: &str) -> bool {
    matches!(
        symbol,
        "w" | "mw"
            | "uw"
            | "nw"
            | "pw"
            | "kw"
            | "j"
            | "mj"
            | "m"
            | "cm"
            | "mm"
            | "nm"
            | "um"
            | "ev"
            | "sr"
            | "s"
            | "mol"
            | "umol"
            | "nmol"
            | "mmol"
            | "photons"
            | "photon"
            | "quanta"
            | "counts"
            | "cts"
            | "hz"
            | "per"
            | "rel"
            | "lm"
            | "lx"
    )
}

/// One factor of a unit expression.
#[derive(Debug, Clone, PartialEq)]
struct Factor {
    symbol: String,
    exponent: i32,
    after_slash: bool,
}

/// Splits a folded text into factors with exponents: `uw/cm2/nm`, `mol m-2 s-1 nm-1`, `w/(m2 nm)`.
fn factors(folded: &str) -> Vec<Factor> {
    let text = folded.replace(" per ", "/").replace("**", "");
    let mut list = Vec::new();
    let mut slash = false;
    let mut slash_depth: Option<usize> = None;
    let mut depth = 0_usize;
    let bytes: Vec<char> = text.chars().take(400).collect();
    let mut index = 0;
    while index < bytes.len() {
        let c = bytes[index];
        if c.is_alphabetic() {
            let start = index;
            while index < bytes.len() && bytes[index].is_alphabetic() {
                index += 1;
            }
            let symbol: String = bytes[start..index].iter().collect();
            let mut exponent = 1;
            let mut next = index;
            // Only short symbols take exponents: "m2", "nm-1", "cm -2" is two things.
            let opened = bytes.get(next).is_some_and(|&c| matches!(c, '(' | '{'))
                && bytes.get(next + 1).is_some_and(|&c| c == '-');
            if opened {
                next += 1;
            }
            let negative = bytes.get(next) == Some(&'-');
            if negative {
                next += 1;
            }
            let first_digit = next;
            while bytes.get(next).is_some_and(char::is_ascii_digit) {
                next += 1;
            }
            if next > first_digit && next - first_digit < 3 && symbol.chars().count() <= 4 {
                exponent = bytes[first_digit..next]
                    .iter()
                    .fold(0, |sum, digit| 10 * sum + (*digit as i32 - '0' as i32));
                if negative {
                    exponent = -exponent;
                }
                index = if opened { next + 1 } else { next };
            }
            let below = slash || slash_depth.is_some();
            list.push(Factor { symbol, exponent, after_slash: below });
            slash = false;
        } else {
            match c {
                '/' => slash = true,
                '(' | '[' => {
                    depth += 1;
                    if slash {
                        slash_depth = Some(depth);
                        slash = false;
                    }
                }
                ')' | ']' => {
                    if slash_depth == Some(depth) {
                        slash_depth = None;
                    }
                    depth = depth.saturating_sub(1);
                    slash = false;
                }
                ' ' => {}
                _ => slash = false,
            }
            index += 1;
        }
    }
    list
}

/// The interval of the density, from the unit's factors or from words.
fn per(folded: &str, factors: &[Factor]) -> Option<Per> {
    let mut found = None;
    for factor in factors {
        let below = if factor.after_slash { factor.exponent > 0 } else { factor.exponent < 0 };
        let one = match factor.symbol.as_str() {
            "nm" | "nanometer" | "nanometre" | "um" | "pm" | "å" | "angstrom" | "нм" | "nanometers"
            | "nanometres"
                if below =>
            {
                Per::Nm
            }
            "ev" | "electronvolt" | "mev" | "эв" if below => Per::Ev,
            // W/cm⁻¹ is W cm: wavenumber intervals stand out by the sign under the slash.
            "cm" if factor.after_slash && factor.exponent == -1 => Per::Cm1,
            "cm" if !factor.after_slash
                && factor.exponent == 1
                && factors.iter().any(|other| other.symbol.ends_with('w') || other.symbol == "photons")
                && factors.len() > 1 =>
            {
                Per::Cm1
            }
            "wavenumber" | "wavenumbers" | "kayser" if below => Per::Cm1,
            "wavelength" if below => Per::Nm,
            "energy" if below => Per::Ev,
            _ => continue,
        };
        found = found.or(Some(one));
    }
    if found.is_some() {
        return found;
    }
    for (phrase, per) in [
        ("per nm", Per::Nm),
        ("pro nm", Per::Nm),
        ("par nm", Per::Nm),
        ("per ev", Per::Ev),
        ("pro ev", Per::Ev),
        ("par ev", Per::Ev),
        ("per cm-1", Per::Cm1),
        ("pro cm-1", Per::Cm1),
        ("per wavenumber", Per::Cm1),
        ("per unit wavelength", Per::Nm),
        ("per unit energy", Per::Ev),
        ("per nanomet", Per::Nm),
        ("per electron", Per::Ev),
        ("per 1/cm", Per::Cm1),
        ("/(1/cm)", Per::Cm1),
        ("(cm-1)-1", Per::Cm1),
        ("/ev", Per::Ev),
        ("/nm", Per::Nm),
    ] {
        if folded.contains(phrase) {
            return Some(per);
        }
    }
    None
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn axis_units_in_many_spellings() {
        for (text, unit) in [
            ("Wavelength (nm)", AxisUnit::Nm),
            ("wavelength_nm", AxisUnit::Nm),
            ("Wellenlänge [nm]", AxisUnit::Nm),
            ("Longueur d'onde (nm)", AxisUnit::Nm),
            ("λ / nm", AxisUnit::Nm),
            ("Wavelength, nm", AxisUnit::Nm),
            ("nm", AxisUnit::Nm),
            ("[nm]", AxisUnit::Nm),
            ("波長(nm)", AxisUnit::Nm),
            ("Длина волны, нм", AxisUnit::Nm),
            ("Wavelength (µm)", AxisUnit::Um),
            ("wavelength_um", AxisUnit::Um),
            ("λ (Å)", AxisUnit::Angstrom),
            ("Wavelength (A)", AxisUnit::Angstrom),
            ("Wavelength [angstrom]", AxisUnit::Angstrom),
            ("Wavelength (m)", AxisUnit::M),
            ("Wellenzahl (cm⁻¹)", AxisUnit::Cm1),
            ("Wavenumber [1/cm]", AxisUnit::Cm1),
            ("cm-1", AxisUnit::Cm1),
            ("Wavenumber (cm^-1)", AxisUnit::Cm1),
            ("Energy (eV)", AxisUnit::Ev),
            ("Energie [eV]", AxisUnit::Ev),
            ("Photon energy / eV", AxisUnit::Ev),
            ("eV", AxisUnit::Ev),
        ] {
            let hint = axis_hint(text).unwrap_or_else(|| panic!("{text:?} names no axis"));
            assert_eq!(hint.unit.map(|unit| unit.0), Some(unit), "{text:?}");
        }
    }

    #[test]
    fn ordinates_do_not_pass_for_axes() {
        for text in [
            "Intensity",
            "Power (W/nm)",
            "A",
            "C",
            "W/nm",
            "Irradiance (µW/cm²/nm)",
            "counts",
            "Blue 450 nm LED",
            "E1",
            "D65",
            "rel",
            "11 mA",
            "Energy density (J/m²)",
            "Spectral power per wavelength",
        ] {
            assert_eq!(axis_hint(text), None, "{text:?}");
        }
    }

    #[test]
    fn ordinates_in_many_spellings() {
        use Ordinate::{Photons, Power};
        for (text, ordinate, per) in [
            ("Power (W/nm)", Some(Power), Some(Per::Nm)),
            ("µW/cm²/nm", Some(Power), Some(Per::Nm)),
            ("W/(m²·sr·nm)", Some(Power), Some(Per::Nm)),
            ("Irradiance [W m-2 nm-1]", Some(Power), Some(Per::Nm)),
            ("Power (rel. per eV)", Some(Power), Some(Per::Ev)),
            ("W/eV", Some(Power), Some(Per::Ev)),
            ("mW/cm-1", Some(Power), Some(Per::Cm1)),
            ("power per cm-1", Some(Power), Some(Per::Cm1)),
            ("photon flux density, mol m-2 s-1 nm-1, resampled by us", Some(Photons), Some(Per::Nm)),
            ("µmol m⁻² s⁻¹ nm⁻¹", Some(Photons), Some(Per::Nm)),
            ("Photons/s/eV", Some(Photons), Some(Per::Ev)),
            ("Photonenfluss (1/s/nm)", Some(Photons), Some(Per::Nm)),
            ("Intensity (a.u.)", None, None),
            ("Blue 450 nm", None, None),
            ("Signal", None, None),
            ("A", None, None),
        ] {
            let hint = ordinate_hint(text);
            assert_eq!((hint.ordinate, hint.per), (ordinate, per), "{text:?}");
            assert!(!hint.counts && hint.not_emission.is_none(), "{text:?}");
        }
        assert!(ordinate_hint("Counts").counts && ordinate_hint("Intensity (counts/s)").counts);
        assert_eq!(ordinate_hint("Transmission (%)").not_emission, Some("transmission"));
        assert_eq!(ordinate_hint("Absorbance").not_emission, Some("absorbance"));
    }

    #[test]
    fn dark_is_a_role_and_dark_red_a_colour() {
        assert_eq!(ordinate_hint("Dark").aside, Some(Aside::Dark));
        assert_eq!(ordinate_hint("Dark counts").aside, Some(Aside::Dark));
        assert_eq!(ordinate_hint("Reference").aside, Some(Aside::Reference));
        assert_eq!(ordinate_hint("Raw signal").aside, Some(Aside::Raw));
        for name in ["Dark red", "Reflow", "Straw", "Refined blue", "Rowan red"] {
            assert_eq!(ordinate_hint(name).aside, None, "{name:?}");
        }
    }
}
