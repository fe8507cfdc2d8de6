//! Facts about what is derived.

use super::*;
use project::{Geometry, Import, Limit, Member, Region, WhiteSpec};

fn gaussian(id: u64, name: &str, peak_nm: f64, fwhm_nm: f64) -> Emitter {
    let wavelengths_nm: Vec<f64> = (380..=780).map(f64::from).collect();
    let power_per_nm = wavelengths_nm
        .iter()
        .map(|w| (-4.0 * std::f64::consts::LN_2 * ((w - peak_nm) / fwhm_nm).powi(2)).exp())
        .collect();
    Emitter {
        id: EmitterId(id),
        name: name.to_owned(),
        invented: true,
        note: String::new(),
        import: Import { wavelengths_nm, power_per_nm, ..Import::default() },
        corrections: Vec::new(),
        geometry: Geometry::Sphere,
        origin: project::Origin::Modelled,
        mounting: project::Mounting::Unknown,
        instrument_range_nm: None,
        wall_plug: Some(0.25),
        sheet: device::Sheet::default(),
    }
}

/// Gaussians 455/25, 530/60, 612/80 nm mixed to 4000 K, Duv 0 (the worked example of our methods notes).
fn four_thousand() -> Project {
    let mut project = Project::new("Deck corridor");
    project.emitters = vec![
        gaussian(1, "Kingfisher blue", 455.0, 25.0),
        gaussian(2, "Fern green", 530.0, 60.0),
        gaussian(3, "Rowan red", 612.0, 80.0),
    ];
    let members = [0.171, 0.307, 0.522]
        .iter()
        .enumerate()
        .map(|(k, &share)| Member { share, ..Member::new(EmitterId(1 + k as u64)) })
        .collect();
    let white = WhiteSpec {
        cct_k: 4000.0,
        region: Region::Box { cct_k: 275.0, duv: 0.006 },
        lumens: Some(336.9),
        ..WhiteSpec::default()
    };
    project.sets = vec![project::EmitterSet {
        id: SetId(9),
        name: "A".into(),
        note: String::new(),
        members,
        white,
        recipes: Vec::new(),
    }];
    project
}

fn derive(project: &Project) -> Derived {
    Cache::new().of_project(project, 0)
}

fn line<'a>(derived: &'a Derived, key: &str) -> &'a LedgerLine {
    derived.ledger.iter().find(|line| line.key == key).unwrap()
}

/// Stated: Ra 91.65, R9 49.1, Rf 88.20, Rg 99.9, melanopic DER 0.634, LER 336.9, lumens .018/.460/.522, photons
/// .139/.291/.571; the shares there are given to three digits only.
#[test]
fn the_worked_example_comes_out() {
    let derived = derive(&four_thousand());
    for (key, stated, tolerance) in [
        ("cct", 4000.0, 15.0),
        ("duv", 0.0, 5e-4),
        ("ra", 91.65, 0.3),
        ("r9", 49.1, 1.5),
        ("rf", 88.20, 0.3),
        ("rg", 99.9, 0.3),
        ("ler", 336.9, 0.3),
        ("melanopic_der", 0.634, 0.003),
        ("efficacy", 336.9 / 4.0, 0.1),
        ("light", 1.0, 0.001),
    ] {
        let found = line(&derived, key).value.unwrap();
        assert!((found - stated).abs() < tolerance, "{key}: {found}, stated {stated}");
    }
    let rows = &derived.blend.as_ref().unwrap().rows;
    for (row, (luminous, photon)) in rows.iter().zip([(0.018, 0.139), (0.460, 0.291), (0.522, 0.571)]) {
        assert!((row.luminous - luminous).abs() < 0.001 && (row.photon - photon).abs() < 0.001, "{row:?}");
        assert!((row.electrical_watts.unwrap() - 4.0 * row.watts.unwrap()).abs() < 1e-12);
    }
}

/// Stated for the same mix, in 1e-3: +1 % power B (-.03, -.49), G (-.56, .27), R (.59, .22); +1 nm B (-.32, .52), G
/// (.28, .63), R (.62, -.60).
#[test]
fn one_per_cent_and_one_nanometre_move_the_white_as_stated() {
    let derived = derive(&four_thousand());
    let rows = &derived.blend.as_ref().unwrap().rows;
    let stated =
        [((-0.03, -0.49), (-0.32, 0.52)), ((-0.56, 0.27), (0.28, 0.63)), ((0.59, 0.22), (0.62, -0.60))];
    for (row, (percent, nm)) in rows.iter().zip(stated) {
        for (found, stated) in [(row.plus_one_percent, percent), (row.plus_one_nm, nm)] {
            assert!((1e3 * found.du - stated.0).abs() < 0.02, "{found:?} {stated:?}");
            assert!((1e3 * found.dv - stated.1).abs() < 0.02, "{found:?} {stated:?}");
        }
    }
}

#[test]
fn the_reference_curve_has_the_lumens_of_the_blend() {
    let derived = derive(&four_thousand());
    let blend = derived.blend.unwrap();
    let reference = colour::Tensor::of_grid(&blend.reference().unwrap().curve);
    let ratio = reference.luminous_flux_lm() / blend.tensor().luminous_flux_lm();
    assert!((ratio - 1.0).abs() < 1e-12, "{ratio}");
    assert!(blend.reference().unwrap().words.starts_with("Planckian 4"));
}

#[test]
fn lines_say_what_they_need() {
    let mut project = four_thousand();
    project.emitters[1].wall_plug = None;
    project.emitters[2].wall_plug = None;
    project.sets[0].white.limits.efficacy = Limit::at_least(80.0);
    let derived = derive(&project);
    let needs = "needs the wall-plug efficiency of Fern green and Rowan red";
    assert_eq!(line(&derived, "efficacy").state, LineState::Needs(needs.to_owned()));
    project.emitters[1].sheet.wall_plug = Some(0.25);
    project.emitters[2].sheet.wall_plug = Some(0.25);
    assert_eq!(line(&derive(&project), "efficacy").state, LineState::Met);
}

#[test]
fn a_limit_is_met_or_short_by_its_margin() {
    let mut project = four_thousand();
    project.sets[0].white.limits.ra = Limit::at_least(90.0);
    project.sets[0].white.limits.r9 = Limit::at_least(60.0);
    let derived = derive(&project);
    let (ra, r9) = (line(&derived, "ra"), line(&derived, "r9"));
    assert!(ra.state == LineState::Met && ra.margin.unwrap() > 1.0 && ra.limit == "at least 90");
    assert!(r9.state == LineState::Short && r9.remark.ends_with("short") && r9.bar.unwrap() < 0.0);
    assert_eq!(line(&derived, "rf").state, LineState::NotLimited);
    assert_eq!(derived.met_of_limited(), (3, 4));
}

#[test]
fn mixed_kinds_of_spectra_are_warned_of() {
    let mut project = four_thousand();
    assert!(derive(&project).warnings.is_empty(), "{:?}", derive(&project).warnings);
    project.emitters[0].geometry = Geometry::Normal;
    project.emitters[1].origin = project::Origin::FilmPhotoluminescence;
    project.emitters[1].mounting = project::Mounting::SingleDevice;
    project.emitters[2].mounting = project::Mounting::InStack;
    project.sets[0].members[0].share = 0.2;
    let warnings = derive(&project).warnings.join("\n");
    for word in ["Geometries are mixed", "film", "Mountings are mixed", "sum to 1.0290"] {
        assert!(warnings.contains(word), "{word}: {warnings}");
    }
}

#[test]
fn an_emitter_without_light_is_named_and_the_rest_still_shown() {
    let mut project = four_thousand();
    project.emitters[2].import.power_per_nm.iter_mut().for_each(|v| *v = 0.0);
    let derived = derive(&project);
    assert!(derived.emitters[2].light.as_ref().unwrap_err().contains("Rowan red"));
    assert!(derived.blend.is_some() && derived.warnings.iter().any(|w| w.contains("Rowan red")));
    project.emitters.iter_mut().for_each(|e| e.import.power_per_nm.iter_mut().for_each(|v| *v = 0.0));
    let derived = derive(&project);
    assert!(derived.blend.is_none());
    assert!(matches!(line(&derived, "cct").state, LineState::Needs(_)));
}

#[test]
fn only_what_changed_is_computed_again() {
    let mut state = State::new(four_thousand(), None).unwrap();
    let mut cache = Cache::new();
    let before = cache.of(&state);
    assert!(Arc::ptr_eq(&before, &cache.of(&state)));
    state.apply(crate::state::Edit::EmitterName { emitter: EmitterId(1), name: "Tarn blue".into() }).unwrap();
    let renamed = cache.of(&state);
    assert!(Arc::ptr_eq(before.light(EmitterId(1)).unwrap(), renamed.light(EmitterId(1)).unwrap()));
    let measured = |d: &Derived| std::ptr::from_ref(d.blend.as_ref().unwrap().measurement());
    assert_eq!(measured(&before), measured(&renamed));
    let steps =
        vec![project::CorrectionStep { correction: project::Correction::Shift { by_nm: 3.0 }, on: true }];
    state.apply(crate::state::Edit::Corrections { emitter: EmitterId(1), steps }).unwrap();
    let shifted = cache.of(&state);
    assert!((shifted.light(EmitterId(1)).unwrap().features.peak_nm - 458.0).abs() < 0.5);
    assert!(Arc::ptr_eq(renamed.light(EmitterId(2)).unwrap(), shifted.light(EmitterId(2)).unwrap()));
    assert_ne!(measured(&renamed), measured(&shifted));
}

#[test]
fn what_would_move_a_line_names_a_row_each_way() {
    let project = four_thousand();
    let derived = derive(&project);
    let blend = derived.blend.unwrap();
    let words = blend.what_would_move(&project, &project.sets[0], "ler").unwrap();
    assert!(words.contains("more Fern green raises it"), "{words}");
    assert!(words.contains("more Kingfisher blue lowers it"), "{words}");
    let changes = blend.sensitivity(&project.sets[0], "cct");
    assert!(changes[0].1 > 0.0 && changes[2].1 < 0.0, "{changes:?}");
}

#[test]
fn patterns_stay_with_their_emitters_when_rows_change_places() {
    let mut project = four_thousand();
    let before = derive(&project);
    project.emitters.reverse();
    let after = derive(&project);
    for view in &before.emitters {
        assert_eq!(view.pattern, after.emitter(view.id).unwrap().pattern);
    }
}
