//! An invented report: a cabin panel of a night ferry, five invented emitters, side by side.

use colour::shapes::Shape;
use colour::tolerance::Quadrangle;
use colour::{Observer, Tensor, UvPrime, appearance, illuminant, locus, measure};
use files::digest;
use files::drawing::figures::{
    Board, BoardPackage, DevicePicture, FidelityBars, HueBins, Look, Neighbourhood, RenderingBars,
    SpectrumLine, SpectrumPlot, StackLayer, StackSection, Stripe, StripePlan,
};
use files::drawing::{Ink, Pattern};
use files::report::{
    Assumption, LedgerLine, MeasuredValue, Method, RecipeRow, RecipeSheet, ReportModel, ShareRow, SourceFile,
};

/// Name, peak, width (nm), share of radiant power, current density (mA/cm²), stripe width (µm).
const EMITTERS: [(&str, f64, f64, f64, f64, f64); 5] = [
    ("Kingfisher blue", 458.0, 27.0, 0.1020, 6.2, 96.0),
    ("Reed teal", 497.0, 37.0, 0.0300, 5.1, 42.0),
    ("Fern green", 531.0, 55.0, 0.2201, 5.1, 151.0),
    ("Brass amber", 586.0, 70.0, 0.2920, 4.7, 188.0),
    ("Rowan red", 627.0, 46.0, 0.3559, 7.4, 203.0),
];

fn value(name: &str, value: f64, decimals: usize, unit: &str, source: &str) -> MeasuredValue {
    MeasuredValue {
        name: name.to_owned(),
        value: Some(value),
        decimals,
        unit: unit.to_owned(),
        source: source.to_owned(),
    }
}

pub(crate) fn looks() -> Vec<Look> {
    EMITTERS
        .iter()
        .enumerate()
        .map(|(index, (name, peak_nm, fwhm_nm, ..))| {
            let shape = Shape::GaussianNm { peak_nm: *peak_nm, fwhm_nm: *fwhm_nm };
            let seen = appearance::of_light(&Tensor::of_grid(&shape.colour_grid().expect("a shape")));
            Look {
                name: (*name).to_owned(),
                ink: Ink(seen.r, seen.g, seen.b),
                pattern: Pattern::of_index(index),
            }
        })
        .collect()
}

fn ledger(measured: &colour::Measurement) -> Vec<LedgerLine> {
    let line = |name: &str, value: Option<f64>, decimals, unit: &str, low: Option<f64>, high: Option<f64>| {
        let inside = value.map(|v| low.is_none_or(|l| v >= l) && high.is_none_or(|h| v <= h));
        LedgerLine {
            name: name.to_owned(),
            value,
            decimals,
            unit: unit.to_owned(),
            low,
            high,
            met: inside,
            note: String::new(),
        }
    };
    let mut out = vec![
        line("CCT", measured.cct_k, 0, "K", Some(2870.0), Some(3220.0)),
        line("Duv", measured.duv, 4, "", Some(-0.006), Some(0.006)),
        line("Ra", measured.ra, 1, "", Some(90.0), None),
        line("R9", measured.r9(), 1, "", Some(50.0), None),
        line("Rf", measured.rf, 1, "", Some(85.0), None),
        line("Rg", measured.rg, 1, "", Some(95.0), Some(105.0)),
        line("luminance", Some(3020.0), 0, "cd/m²", Some(3000.0), None),
        line("device efficacy", Some(41.7), 1, "lm/W", Some(45.0), None),
        line("LT95", None, 0, "h", Some(10_000.0), None),
    ];
    out[0].note = "inside the 3000 K quadrangle, ANSI C78.377".to_owned();
    out[7].note = "of electrical power, drivers left out".to_owned();
    out[8].note = "needs wear data of Reed teal".to_owned();
    out
}

pub(crate) fn stripes() -> StripePlan {
    let mut stripes = Vec::new();
    for (look, (.., width_um)) in looks().into_iter().zip(EMITTERS) {
        stripes.push(Stripe { look: Some(look), width_um });
        stripes.push(Stripe { look: None, width_um: 20.0 });
    }
    StripePlan { stripes, minimum_feature_um: Some(40.0) }
}

pub(crate) fn stack() -> StackSection {
    let looks = looks();
    let layer = |name: &str, thickness_nm: f64, look: Option<usize>, remark: &str| StackLayer {
        name: name.to_owned(),
        thickness_nm,
        look: look.map(|i| looks[i].clone()),
        remark: remark.to_owned(),
    };
    StackSection {
        layers: vec![
            layer("cathode", 120.0, None, "silver"),
            layer("electron injection", 1.5, None, ""),
            layer("electron transport", 35.0, None, ""),
            layer("unit 2", 30.0, Some(4), "6 % doped"),
            layer("hole transport", 60.0, None, ""),
            layer("charge generation", 12.0, None, ""),
            layer("electron transport", 30.0, None, ""),
            layer("unit 1", 25.0, Some(0), "12 % doped"),
            layer("hole transport", 95.0, None, ""),
            layer("anode", 110.0, None, "indium tin oxide"),
        ],
        substrate: "glass 0.7 mm".to_owned(),
    }
}

pub(crate) fn board() -> Board {
    let counts = [2, 1, 5, 6, 4];
    Board {
        packages: looks()
            .into_iter()
            .zip(counts)
            .map(|(look, count)| BoardPackage { look, count, remark: String::new() })
            .collect(),
        package_mm: 3.0,
        pitch_mm: 4.5,
        columns: 6,
    }
}

/// The whole model; every colour number is computed from the invented emitters.
pub(crate) fn model() -> ReportModel {
    let grids: Vec<Vec<f64>> = EMITTERS
        .iter()
        .map(|(_, peak_nm, fwhm_nm, share, ..)| {
            let shape = Shape::GaussianNm { peak_nm: *peak_nm, fwhm_nm: *fwhm_nm };
            shape.colour_grid().expect("a shape").iter().map(|p| p * share).collect()
        })
        .collect();
    let blend: Vec<f64> = (0..401).map(|i| grids.iter().map(|g| g[i]).sum()).collect();
    let light = Tensor::of_grid(&blend);
    let measured = measure::measure(&light);
    let cct_k = measured.cct_k.expect("a white");
    let planckian = illuminant::planckian_grid(cct_k);
    let same_lumens = light.luminous_flux_lm() / Tensor::of_grid(&planckian).luminous_flux_lm();
    let looks = looks();
    let tensors: Vec<Tensor> = grids.iter().map(|g| Tensor::of_grid(g)).collect();
    let lumens = light.luminous_flux_lm();
    let photons: f64 = tensors.iter().map(|t| t.radiant_power() * t.mean_wavelength_nm()).sum();
    let shares = looks
        .iter()
        .zip(&tensors)
        .map(|(look, t)| ShareRow {
            look: look.clone(),
            radiant: Some(t.radiant_power() / light.radiant_power()),
            luminous: Some(t.luminous_flux_lm() / lumens),
            photon: Some(t.radiant_power() * t.mean_wavelength_nm() / photons),
            mean_wavelength_nm: Some(t.mean_wavelength_nm()),
        })
        .collect();
    let quadrangle = Quadrangle::nominal(3000.0).and_then(|q| q.polygon().ok());
    let corners: Vec<UvPrime> = quadrangle.map(|p| p.vertices().to_vec()).unwrap_or_default();
    ReportModel {
        title: "Cabin panel, 3000 K".to_owned(),
        project: "Night ferry".to_owned(),
        set: "Set A, five emitters".to_owned(),
        program: "Whitesmith 0.1.0".to_owned(),
        date: "14 March 2026".to_owned(),
        data_note: "Invented demonstration data: emitters, sheets and calibration runs do not exist.".to_owned(),
        white: "3000 K at Duv +0.0005, inside the 3000 K quadrangle of ANSI C78.377".to_owned(),
        ledger: ledger(&measured),
        proof: "Invented sentence for the layout: no blend of this set inside these limits gives more than 342.0 lm per \
                optical watt; this one gives 341.9 (gap 0.03 %)."
            .to_owned(),
        shares,
        measured: vec![
            value("luminous efficacy of radiation", measured.ler_lm_per_w, 1, "lm/W", "380–780 nm, 683 lm/W"),
            value("CCT", cct_k, 0, "K", "CIE 15:2018, nearest Planckian in u, v"),
            value("Duv", measured.duv.unwrap_or(f64::NAN), 4, "", "CIE 1960 u, v; positive above the locus"),
            value("u′", measured.u_prime, 4, "", "CIE 1976, 1931 observer"),
            value("v′", measured.v_prime, 4, "", "CIE 1976, 1931 observer"),
            value("Ra", measured.ra.unwrap_or(f64::NAN), 1, "", "CIE 13.3-1995"),
            value("Rf", measured.rf.unwrap_or(f64::NAN), 1, "", "CIE 224:2017, ANSI/IES TM-30"),
            value("Rg", measured.rg.unwrap_or(f64::NAN), 1, "", "ANSI/IES TM-30"),
            value("S/P ratio", measured.sp_ratio, 2, "", "1700 and 683 lm/W"),
            value("melanopic DER", measured.melanopic_der, 3, "", "CIE S 026:2018"),
        ],
        spectrum: Some(SpectrumPlot {
            wavelengths_nm: (380..=780).map(f64::from).collect(),
            reference: Some((
                format!("Planckian {cct_k:.0} K, same lumens"),
                planckian.iter().map(|p| p * same_lumens * 1e3).collect(),
            )),
            blend: blend.iter().map(|p| p * 1e3).collect(),
            emitters: looks
                .iter()
                .zip(&grids)
                .zip(EMITTERS)
                .map(|((look, grid), (.., share, _, _))| SpectrumLine {
                    look: look.clone(),
                    power_per_nm: grid.iter().map(|p| p * 1e3).collect(),
                    remark: format!("{:.1} %", 100.0 * share),
                })
                .collect(),
            ordinate: "mW per nm, per optical watt".to_owned(),
        }),
        chromaticity: Some(Neighbourhood {
            blend: light.xyz(Observer::Cie1931).uv_prime(),
            target: Some(locus::uv_at(3000.0, 0.0005).uv_prime()),
            bin: corners,
            bin_name: "3000 K quadrangle, ANSI C78.377".to_owned(),
            circles: vec![1, 2, 4],
        }),
        rendering: measured.r.map(|r| RenderingBars { r: r.to_vec() }),
        fidelity: measured.rf_bins.map(|rf| FidelityBars { rf: rf.to_vec() }),
        hue: measured.rcs_bins.zip(measured.rhs_bins).map(|(chroma, hue)| HueBins {
            chroma_shift_percent: chroma.to_vec(),
            hue_shift: hue.to_vec(),
        }),
        recipe: Some(RecipeSheet {
            build_form: "side-by-side".to_owned(),
            summary: "Five stripes on one pitch, each at its own current, 3020 cd/m² at the normal.".to_owned(),
            rows: recipe_rows(),
            picture: Some(DevicePicture::Stripes(stripes())),
            predicted: vec![
                value("luminance", 3020.0, 0, "cd/m²", "at the normal, Lambertian"),
                value("luminous exitance", 9488.0, 0, "lm/m²", "π times the luminance"),
                value("device efficacy", 41.7, 1, "lm/W", "electrical power of the stripes"),
            ],
        }),
        assumptions: vec![
            Assumption { statement: "Emission is Lambertian.".to_owned(), untouched_default: true },
            Assumption {
                statement: "Out-coupling is contained in the measured EQE.".to_owned(),
                untouched_default: false,
            },
            Assumption { statement: "Sheet temperature 25 °C.".to_owned(), untouched_default: true },
        ],
        sources: EMITTERS
            .iter()
            .map(|(name, ..)| SourceFile {
                emitter: (*name).to_owned(),
                file: "invented-emitters.csv".to_owned(),
                sha256: digest::sha256(name.as_bytes()),
                remark: "modelled, no geometry".to_owned(),
            })
            .collect(),
        methods: [
            ("tristimulus values", "CIE 15:2018, 380–780 nm, 1 nm sums, ISO/CIE 11664-1 observers"),
            ("CCT and Duv", "nearest point of the Planckian locus in CIE 1960 u, v; second radiation constant 1.4388e-2 m·K"),
            ("Ra, R1–R15", "CIE 13.3-1995, reference of the same CCT, no rounding"),
            ("Rf, Rg, hue bins", "CIE 224:2017 and ANSI/IES TM-30-20, 99 samples, 10° observer"),
            ("allowed bands", "linear sensitivities of u′v′ and every limit, checked at the corners"),
        ]
        .into_iter()
        .map(|(quantity, source)| Method { quantity: quantity.to_owned(), source: source.to_owned() })
        .collect(),
        photobiology: vec![value(
            "blue-light efficacy of the luminous flux",
            1e3 * measured.kbv_w_per_lm,
            3,
            "mW/lm",
            "indicative; IEC 62471:2006 weighting on a modelled spectrum",
        )],
        signatures: vec!["prepared by".to_owned(), "process line".to_owned(), "released by".to_owned()],
    }
}

fn recipe_rows() -> Vec<RecipeRow> {
    let mut rows = Vec::new();
    for (index, (name, .., current, width)) in EMITTERS.into_iter().enumerate() {
        let mut set = |quantity: &str, target: f64, tolerance: f64, unit: &str, runs: Vec<String>| {
            rows.push(RecipeRow {
                part: name.to_owned(),
                quantity: quantity.to_owned(),
                target: Some(target),
                allowed_low: Some(target * (1.0 - tolerance)),
                allowed_high: Some(target * (1.0 + tolerance)),
                unit: unit.to_owned(),
                calibration_runs: runs,
                remark: String::new(),
            });
        };
        set("stripe width", width, 0.04, "µm", vec![]);
        let run = format!("R-{:03}", 118 + index);
        set("current density", current, 0.025, "mA/cm²", vec![run.clone()]);
        set("voltage", 3.1 + 0.12 * index as f64, 0.02, "V", vec![run]);
    }
    rows
}
