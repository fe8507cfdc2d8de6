//! A set and its recipe as a report.

use super::document::{RecipeDocument, program};
use super::{Making, MakingError, make};
use colour::{illuminant, locus};
use files::drawing::figures::{
    FidelityBars, HueBins, Neighbourhood, RenderingBars, SpectrumLine, SpectrumPlot,
};
use files::report::{
    Assumption, LedgerLine, MeasuredValue, Method, RecipeSheet, ReportModel, ShareRow, SourceFile,
};
use project::{Project, SetId};

/// The report of a set and its recipe number `index`. `date` is printed as it is; `proof` is what is known of the
/// blend's worth, empty for the set's own note.
///
/// # Errors
/// As [`make`].
pub fn report(
    project: &Project,
    set: SetId,
    index: usize,
    date: &str,
    proof: &str,
) -> Result<ReportModel, MakingError> {
    let making = make(project, set, index)?;
    let note = project.set(set).map(|set| set.note.clone()).unwrap_or_default();
    let proof = if proof.is_empty() { note } else { proof.to_owned() };
    Ok(of_making(project, &making, date, &proof))
}

/// The report of a recipe worked out.
pub fn of_making(project: &Project, making: &Making, date: &str, proof: &str) -> ReportModel {
    let document = making.document(project);
    let (m, white) = (&making.measured, making.white());
    let looks = making.looks();
    let shares = &making.recipe.emitters;
    let invented = document.sources.iter().any(|source| source.invented);
    let lumens = m.ler_lm_per_w;
    ReportModel {
        title: format!("{}, {} K", making.set_name, white.cct_k),
        project: project.name.clone(),
        set: format!("{}, {}", making.set_name, making.plan.name),
        program: program(),
        date: date.to_owned(),
        data_note: if invented {
            "Invented data: at least one of these emitters was never measured.".to_owned()
        } else {
            String::new()
        },
        white: format!("{} K at Duv {:+.4}, {}", white.cct_k, white.duv, making.region.words),
        ledger: ledger(making, &document),
        proof: proof.to_owned(),
        shares: looks
            .iter()
            .zip(shares)
            .map(|(look, e)| ShareRow {
                look: look.clone(),
                radiant: Some(e.share_radiant),
                luminous: Some(e.share_luminous),
                photon: Some(e.share_photon),
                mean_wavelength_nm: Some(e.mean_wavelength_nm),
            })
            .collect(),
        measured: measured(making),
        spectrum: Some(SpectrumPlot {
            wavelengths_nm: (380..=780).map(f64::from).collect(),
            blend: making.devices.curve(&making.recipe.shares_radiant()).iter().map(|p| 1e3 * p).collect(),
            reference: m.cct_k.map(|cct_k| {
                let grid = illuminant::planckian_grid(cct_k);
                let scale = 1e3 * lumens / colour::Tensor::of_grid(&grid).luminous_flux_lm();
                (format!("Planckian {cct_k:.0} K, same lumens"), grid.iter().map(|p| p * scale).collect())
            }),
            emitters: looks
                .iter()
                .zip(shares)
                .zip(&making.devices.grids)
                .filter(|((_, e), _)| e.share_radiant > 0.0)
                .map(|((look, e), grid)| SpectrumLine {
                    look: look.clone(),
                    power_per_nm: grid.iter().map(|p| 1e3 * p * e.share_radiant).collect(),
                    remark: format!("{:.1} %", 100.0 * e.share_radiant),
                })
                .collect(),
            ordinate: "mW per nm, per optical watt".to_owned(),
        }),
        chromaticity: Some(Neighbourhood {
            blend: making.uv_prime(),
            target: Some(locus::uv_at(white.cct_k, white.duv).uv_prime()),
            bin: making.region.outline.clone(),
            bin_name: making.region.words.clone(),
            circles: vec![1, 2, 4],
        }),
        rendering: m.r.map(|r| RenderingBars { r: r.to_vec() }),
        fidelity: m.rf_bins.map(|rf| FidelityBars { rf: rf.to_vec() }),
        hue: m
            .rcs_bins
            .zip(m.rhs_bins)
            .map(|(chroma, hue)| HueBins { chroma_shift_percent: chroma.to_vec(), hue_shift: hue.to_vec() }),
        recipe: Some(RecipeSheet {
            build_form: making.build.build_form().name().to_owned(),
            summary: summary(making, &document),
            rows: document.rows(),
            picture: making.picture(),
            predicted: predicted(making),
        }),
        assumptions: sentences(&document.assumptions, false)
            .chain(sentences(&document.untouched_defaults, true))
            .chain(
                document
                    .missing
                    .iter()
                    .map(|m| Assumption { statement: format!("Missing: {m}."), untouched_default: false }),
            )
            .collect(),
        sources: document
            .sources
            .iter()
            .map(|line| SourceFile {
                emitter: line.emitter.clone(),
                file: line.source.as_ref().map_or_else(String::new, |s| s.name.clone()),
                sha256: line.source.as_ref().map_or_else(String::new, |s| s.sha256.clone()),
                remark: if line.invented { "invented, never measured".to_owned() } else { String::new() },
            })
            .collect(),
        methods: methods(),
        photobiology: vec![value(
            "blue-light efficacy of the luminous flux",
            Some(1e3 * m.kbv_w_per_lm),
            3,
            "mW/lm",
            "indicative; IEC 62471:2006 weighting on a modelled spectrum",
        )],
        signatures: ["prepared by", "process line", "released by"].map(str::to_owned).to_vec(),
    }
}

fn sentences(list: &[String], untouched_default: bool) -> impl Iterator<Item = Assumption> + '_ {
    list.iter().map(move |text| {
        let mut statement = text.clone();
        if let Some(first) = text.chars().next() {
            statement = first.to_uppercase().collect::<String>() + &text[first.len_utf8()..];
        }
        if !statement.ends_with('.') {
            statement.push('.');
        }
        Assumption { statement, untouched_default }
    })
}

fn value(name: &str, value: Option<f64>, decimals: usize, unit: &str, source: &str) -> MeasuredValue {
    MeasuredValue { name: name.to_owned(), value, decimals, unit: unit.to_owned(), source: source.to_owned() }
}

fn ledger(making: &Making, document: &RecipeDocument) -> Vec<LedgerLine> {
    let (m, white) = (&making.measured, making.white());
    let line = |name: &str, value: Option<f64>, decimals, unit: &str| LedgerLine {
        name: name.to_owned(),
        value,
        decimals,
        unit: unit.to_owned(),
        ..LedgerLine::default()
    };
    let mut out = vec![
        LedgerLine {
            met: Some(making.white_met()),
            note: making.region.words.clone(),
            ..line("white, distance from the target in u\u{2032}v\u{2032}", Some(distance(making)), 5, "")
        },
        line("CCT", m.cct_k, 0, "K"),
        line("Duv", m.duv, 5, ""),
    ];
    for limit in &document.limits {
        let (name, decimals, unit) = match limit.name {
            "ra" => ("Ra", 1, ""),
            "r9" => ("R9", 1, ""),
            "rf" => ("Rf", 1, ""),
            "rg" => ("Rg", 1, ""),
            "ler" => ("luminous efficacy of radiation", 1, "lm/W"),
            _ => ("device efficacy", 1, "lm/W"),
        };
        out.push(LedgerLine {
            low: limit.low,
            high: limit.high,
            met: limit.value.map(|_| limit.met),
            note: if limit.value.is_none() { "needs emitter sheets".to_owned() } else { String::new() },
            ..line(name, limit.value, decimals, unit)
        });
    }
    let wanted = |name: &str, got: Option<f64>, asked: Option<f64>, unit: &str| {
        asked.map(|asked| LedgerLine {
            low: Some(asked),
            met: got.map(|got| got >= asked * (1.0 - 1e-6)),
            ..line(name, got, 0, unit)
        })
    };
    let recipe = &making.recipe;
    out.extend(wanted("luminance", recipe.luminance_cd_per_m2, white.luminance_cd_per_m2, "cd/m\u{b2}"));
    out.extend(wanted("luminous flux", recipe.luminous_flux_lm, white.lumens, "lm"));
    out
}

fn distance(making: &Making) -> f64 {
    making.uv_prime().distance(making.region.target)
}

fn measured(making: &Making) -> Vec<MeasuredValue> {
    let m = &making.measured;
    vec![
        value(
            "luminous efficacy of radiation",
            Some(m.ler_lm_per_w),
            1,
            "lm/W",
            "380\u{2013}780 nm, 683 lm/W",
        ),
        value("CCT", m.cct_k, 0, "K", "CIE 15:2018, nearest Planckian in u, v"),
        value("Duv", m.duv, 5, "", "CIE 1960 u, v; positive above the locus"),
        value("u\u{2032}", Some(m.u_prime), 5, "", "CIE 1976, 1931 observer"),
        value("v\u{2032}", Some(m.v_prime), 5, "", "CIE 1976, 1931 observer"),
        value("Ra", m.ra, 1, "", "CIE 13.3-1995"),
        value("R9", m.r9(), 1, "", "CIE 13.3-1995"),
        value("Rf", m.rf, 1, "", "CIE 224:2017, ANSI/IES TM-30"),
        value("Rg", m.rg, 1, "", "ANSI/IES TM-30"),
        value("S/P ratio", Some(m.sp_ratio), 2, "", "1700 and 683 lm/W"),
        value("melanopic DER", Some(m.melanopic_der), 3, "", "CIE S 026:2018"),
    ]
}

fn predicted(making: &Making) -> Vec<MeasuredValue> {
    let r = &making.recipe;
    let mut out = vec![
        value("luminance", r.luminance_cd_per_m2, 0, "cd/m\u{b2}", "at the normal"),
        value(
            "luminous exitance",
            r.luminous_exitance_lm_per_m2,
            0,
            "lm/m\u{b2}",
            "\u{3c0} times the luminance over the angular factor",
        ),
        value("luminous flux", r.luminous_flux_lm, 1, "lm", "of the whole panel or board"),
        value("electrical power", r.electrical_power_w, 3, "W", "driver not counted"),
        value("device efficacy", r.efficacy_lm_per_w, 1, "lm/W", "driver not counted"),
        value("wall-plug efficiency", r.wall_plug, 3, "", "radiant over electrical power"),
    ];
    out.retain(|v| v.value.is_some());
    out
}

fn summary(making: &Making, document: &RecipeDocument) -> String {
    let form = match making.build.build_form() {
        device::BuildForm::SideBySide => "Stripes side by side",
        device::BuildForm::SeriesStack => "Units in series, one current through all",
        device::BuildForm::SharedZone => "Emitters sharing one recombination zone",
        device::BuildForm::Packages => "Whole packages on strings",
    };
    let converted = if making.build.conversions.is_empty() { "" } else { ", with down-conversion" };
    let bands = match &document.no_bands {
        None => format!("Allowed bands keep the white in: {}.", document.bands_keep),
        Some(why) => format!("No bands: {why}."),
    };
    let free: String = making.recipe.freedoms.iter().map(|f| format!(" {f}.")).collect();
    format!("{form}{converted}. {bands}{free}")
}

fn methods() -> Vec<Method> {
    [
        ("tristimulus values", "CIE 15:2018, 380\u{2013}780 nm, 1 nm sums, ISO/CIE 11664-1 observers"),
        ("CCT and Duv", "nearest point of the Planckian locus in CIE 1960 u, v; second radiation constant 1.4388e-2 m\u{b7}K"),
        ("Ra, R1\u{2013}R15", "CIE 13.3-1995, reference of the same CCT, no rounding"),
        ("Rf, Rg, hue bins", "CIE 224:2017 and ANSI/IES TM-30-20, 99 samples, 10\u{b0} observer"),
        ("radiant exitance", "10 \u{b7} J \u{b7} EQE \u{b7} 1239.842 / mean wavelength, W/m\u{b2} of lit area"),
        ("allowed bands", "each number moved alone to the edge of the region, then all together, checked at the corners"),
    ]
    .into_iter()
    .map(|(quantity, source)| Method { quantity: quantity.to_owned(), source: source.to_owned() })
    .collect()
}

/// A day of the Gregorian calendar as it is printed, from seconds since 1970 (UTC).
pub fn day(seconds_since_1970: u64) -> String {
    const MONTHS: [&str; 12] = [
        "January",
        "February",
        "March",
        "April",
        "May",
        "June",
        "July",
        "August",
        "September",
        "October",
        "November",
        "December",
    ];
    let (year, month, day) = calendar(seconds_since_1970);
    format!("{day} {} {year}", MONTHS[month as usize - 1])
}

/// The same as `YYYY-MM-DD`.
pub fn iso_day(seconds_since_1970: u64) -> String {
    let (year, month, day) = calendar(seconds_since_1970);
    format!("{year:04}-{month:02}-{day:02}")
}

/// Year, month and day of the Gregorian calendar.
fn calendar(seconds_since_1970: u64) -> (u64, u64, u64) {
    // Years start in March here, so that the leap day comes last.
    let days = seconds_since_1970 / 86_400 + 719_468;
    let (era, of_era) = (days / 146_097, days % 146_097);
    let year_of_era = (of_era - of_era / 1460 + of_era / 36_524 - of_era / 146_096) / 365;
    let of_year = of_era - (365 * year_of_era + year_of_era / 4 - year_of_era / 100);
    let month = (5 * of_year + 2) / 153;
    let day = of_year - (153 * month + 2) / 5 + 1;
    let month = if month < 10 { month + 3 } else { month - 9 };
    let year = era * 400 + year_of_era + u64::from(month <= 2);
    (year, month, day)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn days_of_the_calendar() {
        assert_eq!((day(0).as_str(), iso_day(0).as_str()), ("1 January 1970", "1970-01-01"));
        assert_eq!(day(951_782_400), "29 February 2000");
        assert_eq!(day(1_772_323_199), "28 February 2026");
        assert_eq!(day(1_772_323_200), "1 March 2026");
    }
}
