//! `recipe` and `report`: the demo projects as devices, with what physics ties together.

use crate::support::whitesmith;
use serde_json::Value;
use std::path::{Path, PathBuf};

fn asset(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../../assets").join(name)
}

/// Every project under `assets`.
fn projects() -> Vec<PathBuf> {
    let mut found: Vec<PathBuf> = std::fs::read_dir(asset(""))
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.extension().is_some_and(|e| e == "ron"))
        .collect();
    found.sort();
    assert!(!found.is_empty());
    found
}

fn recipes(path: &Path) -> Vec<Value> {
    let run = whitesmith(&["recipe", "--json", path.to_str().unwrap()]);
    assert_eq!(run.code, 0, "{}: {}", path.display(), run.err);
    run.json().as_array().unwrap().clone()
}

const EMITTER_KEYS: [&str; 11] = [
    "name",
    "share_radiant",
    "share_luminous",
    "share_photon",
    "mean_wavelength_nm",
    "eqe",
    "current_density_ma_per_cm2",
    "voltage_v",
    "radiant_exitance_w_per_m2",
    "area_share",
    "converted_by",
];

#[test]
fn every_demo_project_has_recipes_and_between_them_every_form_and_a_conversion() {
    let mut forms = Vec::new();
    let mut converted = 0;
    for path in projects() {
        let all = recipes(&path);
        assert!(!all.is_empty(), "{}", path.display());
        for recipe in &all {
            forms.push(recipe["build_form"].as_str().unwrap().to_owned());
            for key in ["luminance_cd_per_m2", "luminous_exitance_lm_per_m2", "angular_factor"] {
                assert!(recipe.get(key).is_some(), "{key}");
            }
            for emitter in recipe["emitters"].as_array().unwrap() {
                assert!(EMITTER_KEYS.iter().all(|key| emitter.get(key).is_some()), "{emitter}");
                converted += usize::from(emitter["converted_by"].is_string());
            }
        }
    }
    for form in ["side-by-side", "series-stack", "shared-zone", "packages"] {
        assert!(forms.iter().any(|f| f == form), "{form}: {forms:?}");
    }
    assert!(converted > 0);
}

/// hc = 1239.842 eV·nm; radiant exitance of the lit area 10·J·EQE·hc/λ̄ W/m².
#[test]
fn shares_currents_and_exitances_of_every_demo_recipe_agree() {
    for path in projects() {
        for recipe in recipes(&path) {
            let place = format!("{} {} {}", path.display(), recipe["set"], recipe["recipe"]);
            let emitters = recipe["emitters"].as_array().unwrap();
            let of = |key: &str| -> Vec<f64> { emitters.iter().map(|e| e[key].as_f64().unwrap()).collect() };
            let (radiant, photon, nm) = (of("share_radiant"), of("share_photon"), of("mean_wavelength_nm"));
            for kind in ["share_radiant", "share_luminous", "share_photon"] {
                assert!((of(kind).iter().sum::<f64>() - 1.0).abs() < 1e-9, "{place} {kind}");
            }
            let mean: f64 = radiant.iter().zip(&nm).map(|(s, nm)| s * nm).sum();
            for k in 0..emitters.len() {
                assert!((photon[k] - radiant[k] * nm[k] / mean).abs() < 1e-9, "{place}");
            }
            let mut powers = Vec::new();
            for e in emitters {
                let n = |key: &str| e[key].as_f64();
                if let (Some(j), Some(eqe), Some(m)) =
                    (n("current_density_ma_per_cm2"), n("eqe"), n("radiant_exitance_w_per_m2"))
                {
                    let expected = 10.0 * j * eqe * 1239.842 / n("mean_wavelength_nm").unwrap();
                    assert!((m - expected).abs() <= 1e-5 * expected.abs(), "{place} {e}");
                }
                powers.push(n("area_share").zip(n("radiant_exitance_w_per_m2")).map(|(a, m)| a * m));
            }
            // Areas times exitances are the radiant shares, where areas are known.
            if let Some(powers) = powers
                .into_iter()
                .zip(&radiant)
                .map(|(p, s)| p.or((*s == 0.0).then_some(0.0)))
                .collect::<Option<Vec<f64>>>()
            {
                let sum: f64 = powers.iter().sum();
                for (power, share) in powers.iter().zip(&radiant) {
                    assert!((power / sum - share).abs() < 1e-6, "{place}");
                }
            }
            let luminance = recipe["luminance_cd_per_m2"].as_f64();
            let exitance = recipe["luminous_exitance_lm_per_m2"].as_f64();
            if let (Some(l), Some(m)) = (luminance, exitance) {
                let factor = recipe["angular_factor"].as_f64().unwrap();
                assert!((std::f64::consts::PI * l / m - factor).abs() < 1e-9, "{place}");
            }
        }
    }
}

#[test]
fn recipes_and_reports_are_written_and_spectra_read_back() {
    let folder = tempfile::tempdir().unwrap();
    let project = asset("night-ferry-cabin.ron");
    let project = project.to_str().unwrap();
    let path = |name: &str| folder.path().join(name).to_str().unwrap().to_owned();
    for name in ["r.ron", "r.csv", "r.spectrum.csv", "r.spdx"] {
        let run = whitesmith(&["recipe", project, "--set", "Cabin, five organic", "-o", &path(name)]);
        assert_eq!(run.code, 0, "{name}: {}", run.err);
    }
    let rows = files::report::recipe_csv::read(&std::fs::read_to_string(path("r.csv")).unwrap()).unwrap();
    assert!(rows.iter().any(|row| row.quantity == "stripe width" && row.allowed_low < row.target));
    assert!(rows.iter().any(|row| row.quantity == "assumption"));
    let measured: Vec<Value> = ["r.spectrum.csv", "r.spdx"]
        .iter()
        .map(|name| {
            let run = whitesmith(&["measure", "--json", &path(name)]);
            assert_eq!(run.code, 0, "{name}: {}", run.err);
            run.json()[0].clone()
        })
        .collect();
    // Two formats, the same numbers to the last digit.
    assert_eq!(measured[0]["x"], measured[1]["x"]);
    assert_eq!(measured[0]["ra"], measured[1]["ra"]);
    let html = whitesmith(&["report", project, "-o", &path("r.html"), "--date", "1 January 2026"]);
    assert_eq!(html.code, 0, "{}", html.err);
    let html = std::fs::read_to_string(path("r.html")).unwrap();
    assert!(html.contains("1 January 2026") && html.contains("photobiological") && !html.contains("<script"));
    assert_eq!(whitesmith(&["report", project, "-o", &path("r.pdf")]).code, 0);
    assert!(std::fs::read(path("r.pdf")).unwrap().starts_with(b"%PDF-"));
}

#[test]
fn what_is_no_project_or_no_ending_is_bad_input_in_one_line() {
    let project = asset("night-ferry-cabin.ron");
    let project = project.to_str().unwrap();
    for arguments in [
        vec!["recipe", "--json", "no-such-file.ron"],
        vec!["recipe", project, "--set", "no such set"],
        vec!["report", project, "-o", "report.txt"],
        vec!["report", project],
    ] {
        let run = whitesmith(&arguments);
        assert_eq!(run.code, 2, "{arguments:?}");
        assert_eq!(run.err.trim_end().lines().count(), 1, "{}", run.err);
        if arguments.contains(&"--json") {
            assert_eq!(run.json(), serde_json::json!([]));
        }
    }
}
