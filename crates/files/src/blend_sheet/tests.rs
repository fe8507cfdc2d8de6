//! Facts about blend sheets.

use super::*;
use project::{Correction, EmitterId, EmitterSet, Import, Member};

fn emitter(id: u64, name: &str, peak_nm: f64, fwhm_nm: f64) -> Emitter {
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
        import: Import {
            wavelengths_nm,
            power_per_nm,
            source: Some(SourceFile {
                name: format!("{name}.txt"),
                sha256: crate::digest::sha256(name.as_bytes()),
                column: "Signal".into(),
            }),
            assumptions: vec!["Relative power per nm was assumed.".into()],
            warnings: vec![],
        },
        corrections: vec![CorrectionStep { correction: Correction::Shift { by_nm: 0.0 }, on: false }],
        geometry: Geometry::Sphere,
        origin: Origin::Modelled,
        mounting: Mounting::SingleDevice,
        instrument_range_nm: None,
        wall_plug: Some(0.25),
        sheet: device::Sheet::default(),
    }
}

/// Gaussians 455/25, 530/60, 612/80 nm mixed to about 4000 K.
pub(crate) fn demo() -> Project {
    let mut project = Project::new("Deck corridor");
    project.emitters = vec![
        emitter(1, "Kingfisher blue", 455.0, 25.0),
        emitter(2, "Fern green", 530.0, 60.0),
        emitter(3, "Rowan red", 612.0, 80.0),
    ];
    let members = [0.171, 0.307, 0.522]
        .iter()
        .enumerate()
        .map(|(k, &share)| Member { share, ..Member::new(EmitterId(1 + k as u64)) })
        .collect();
    let mut white = WhiteSpec {
        cct_k: 4000.0,
        region: Region::Box { cct_k: 275.0, duv: 0.006 },
        lumens: Some(500.0),
        ..WhiteSpec::default()
    };
    white.limits.ra = Limit::at_least(90.0);
    white.limits.r9 = Limit::at_least(60.0);
    white.limits.efficacy = Limit::at_least(80.0);
    let note = "as first mixed".into();
    project.sets =
        vec![EmitterSet { id: SetId(9), name: "Set A".into(), note, members, white, recipes: Vec::new() }];
    project.current_set = Some(SetId(9));
    project.next_id = 10;
    project
}

fn sheet() -> BlendSheet {
    BlendSheet::of(&demo(), SetId(9), "whitesmith 0.1.0", Some("best found".into())).unwrap()
}

/// Worked example of our methods notes: lumens .018/.460/.522, photons .139/.291/.571.
#[test]
fn shares_of_every_kind_sum_to_one_and_are_those_of_the_worked_example() {
    let sheet = sheet();
    let sum = |f: fn(&SheetEmitter) -> f64| sheet.emitters.iter().map(f).sum::<f64>();
    for total in [sum(|e| e.share_radiant), sum(|e| e.share_luminous), sum(|e| e.share_photon)] {
        assert!((total - 1.0).abs() < 1e-12, "{total}");
    }
    for (emitter, (luminous, photon)) in
        sheet.emitters.iter().zip([(0.018, 0.139), (0.460, 0.291), (0.522, 0.571)])
    {
        assert!((emitter.share_luminous - luminous).abs() < 1e-3);
        assert!((emitter.share_photon - photon).abs() < 1e-3);
    }
    let watts: f64 = sheet.emitters.iter().filter_map(|e| e.electrical_w).sum();
    assert!((watts - 500.0 / sheet.predicted.efficacy_lm_per_w.unwrap()).abs() < 1e-9);
}

#[test]
fn limits_are_judged_on_the_predicted_values() {
    let met: Vec<(&str, bool)> = sheet().limits.iter().map(|l| (l.name, l.met)).collect();
    assert_eq!(met, [("ra", true), ("r9", false), ("efficacy", true)]);
}

#[test]
fn the_sheet_as_ron_is_read_by_any_ron_reader_and_names_its_sources() {
    let sheet = sheet();
    let text = sheet.to_ron().unwrap();
    let value: ron::Value = ron::from_str(&text).unwrap();
    assert!(matches!(value, ron::Value::Map(_)));
    for word in
        ["share_radiant", "share_luminous", "share_photon", "whitesmith 0.1.0", "Relative power per nm"]
    {
        assert!(text.contains(word), "{word}");
    }
    assert!(text.contains(&crate::digest::sha256(b"Fern green")));
}

#[test]
fn the_sheet_as_csv_reads_back_and_no_cell_runs() {
    let mut project = demo();
    project.name = "=1+1".into();
    project.emitters[0].name = "-2+3, \"blue\"".into();
    project.sets[0].note = "@SUM(A1:A9)\nsecond line".into();
    let sheet = BlendSheet::of(&project, SetId(9), "whitesmith 0.1.0", None).unwrap();
    let text = blend_sheet_csv(&sheet).unwrap();
    let mut reader = csv::ReaderBuilder::new().flexible(true).has_headers(false).from_reader(text.as_bytes());
    let rows: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    for cell in rows.iter().flatten() {
        let runs = cell.starts_with(['=', '+', '-', '@']) && cell.parse::<f64>().is_err();
        assert!(!runs, "{cell}");
    }
    let ra = rows.iter().find(|r| &r[0] == "ra" && r.len() == 2).unwrap();
    assert_eq!(ra[1].parse::<f64>().unwrap(), sheet.predicted.colour.ra.unwrap());
    let blue = rows.iter().find(|r| r[0].starts_with("'-2+3")).unwrap();
    assert_eq!(blue[1].parse::<f64>().unwrap(), sheet.emitters[0].share_radiant);
}

#[test]
fn there_is_no_sheet_without_a_blend() {
    let mut project = demo();
    assert_eq!(BlendSheet::of(&project, SetId(1), "", None).unwrap_err(), SheetError::NoSet);
    project.sets[0].members.iter_mut().for_each(|m| m.on = false);
    assert_eq!(BlendSheet::of(&project, SetId(9), "", None).unwrap_err(), SheetError::NoBlend);
    project.sets[0].members[0].on = true;
    project.emitters[0].import.power_per_nm.iter_mut().for_each(|p| *p = -1.0);
    assert!(BlendSheet::of(&project, SetId(9), "", None).is_err());
}
