//! Files in the window: pasting, importing, saving, opening, exporting, all without a system dialog.

#![allow(clippy::unwrap_used, reason = "a test fails by panicking")]

mod window_support;

use egui::{Event, Key, Modifiers};
use egui_kittest::kittest::Queryable;
use window_support::Driven;

/// Invented spectra as a spreadsheet copies them.
const TABLE: &str = include_str!("../data/window/three_emitters.tsv");

fn type_path(driven: &mut Driven, path: &std::path::Path) {
    driven.harness.key_press_modifiers(Modifiers::COMMAND, Key::A);
    driven.harness.event(Event::Text(path.display().to_string()));
    driven.harness.step();
    driven.harness.key_press(Key::Enter);
    driven.harness.run_steps(3);
}

#[test]
fn a_pasted_table_is_previewed_and_becomes_emitters() {
    let mut driven = Driven::usual();
    let before = driven.harness.state().state().project().emitters.len();
    driven.harness.event(Event::Paste(TABLE.to_owned()));
    driven.harness.run_steps(3);
    driven.harness.get_by_label("Import pasted table");
    driven.harness.get_by_label("take Gorse yellow (W/nm)").click();
    driven.harness.run_steps(2);
    assert_eq!(driven.harness.unnamed_widgets(), Vec::<String>::new());
    driven.harness.get_by_label("Add 2 emitters").click();
    driven.harness.run_steps(3);
    let project = driven.harness.state().state().project();
    assert_eq!(project.emitters.len(), before + 2);
    let added = project.emitters.last().unwrap();
    assert_eq!(added.import.wavelengths_nm.len(), 81);
    assert!(!added.invented && added.import.source.as_ref().unwrap().sha256.len() == 64);
    assert_eq!(driven.shares().len(), 7, "they are in the set on the bench");
    driven.harness.key_press_modifiers(Modifiers::COMMAND, Key::Z);
    driven.harness.run_steps(2);
    assert_eq!(
        driven.harness.state().state().project().emitters.len(),
        before,
        "one step takes them out again"
    );
}

#[test]
fn a_table_without_an_axis_asks_and_is_read_once_answered() {
    let mut driven = Driven::usual();
    let values: String =
        (0..81).map(|k| format!("{:.4}\n", (-((f64::from(k) - 30.0) / 6.0).powi(2)).exp())).collect();
    driven.harness.event(Event::Paste(format!("value\n{values}")));
    driven.harness.run_steps(3);
    for name in ["state the first wavelength in nm", "state the step in nm"] {
        driven.harness.get_by_label(name).click();
        driven.harness.run_steps(2);
    }
    driven.harness.get_by_label("step in nm").set_value_accesskit(5.0);
    driven.harness.run_steps(4);
    let before = driven.harness.state().state().project().emitters.len();
    driven.harness.get_by_label("Add 1 emitter").click();
    driven.harness.run_steps(3);
    assert_eq!(driven.harness.state().state().project().emitters.len(), before + 1);
    let emitter = driven.harness.state().state().project().emitters.last().unwrap();
    let grid = &emitter.import.wavelengths_nm;
    assert_eq!((grid[0], grid[1], grid.len()), (380.0, 385.0, 81));
}

#[test]
fn a_picture_pasted_as_text_is_refused_with_a_sentence() {
    let mut driven = Driven::usual();
    driven.harness.event(Event::Paste("<html><body>no spectrum</body></html>".to_owned()));
    driven.harness.run_steps(3);
    driven.harness.get_by_label("This file was not read");
    driven.harness.get_by_label("Cancel").click();
    driven.harness.run_steps(2);
    assert!(driven.harness.query_by_label("This file was not read").is_none());
}

#[test]
fn a_project_is_saved_by_typed_path_and_opens_again_the_same() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("cabin.ron");
    let mut driven = Driven::usual();
    driven.harness.key_press_modifiers(Modifiers::COMMAND, Key::S);
    driven.harness.run_steps(3);
    type_path(&mut driven, &path);
    let saved = driven.harness.state().state().project().clone();
    assert!(path.is_file() && !driven.harness.state().state().unsaved());

    let mut other = Driven::usual();
    other.harness.key_press_modifiers(Modifiers::COMMAND, Key::N);
    other.harness.run_steps(2);
    assert!(other.harness.state().state().project().emitters.is_empty());
    other.harness.key_press_modifiers(Modifiers::COMMAND, Key::O);
    other.harness.run_steps(3);
    type_path(&mut other, &path);
    assert!(other.harness.state().state().project() == &saved);
}

#[test]
fn blend_sheet_and_spectrum_are_written() {
    let folder = tempfile::tempdir().unwrap();
    let mut driven = Driven::usual();
    for (item, file, within) in [
        ("Blend sheet (CSV)\u{2026}", "sheet.csv", "Kingfisher blue"),
        ("Blend sheet (RON)\u{2026}", "sheet.ron", "sheet_version"),
        ("Predicted spectrum (CSV)\u{2026}", "spectrum.csv", "780"),
    ] {
        driven.harness.get_by_label("Menu").click();
        driven.harness.run_steps(2);
        driven.harness.get_by_label_contains(item).click();
        driven.harness.run_steps(3);
        let path = folder.path().join(file);
        type_path(&mut driven, &path);
        let text = std::fs::read_to_string(&path).unwrap_or_else(|error| panic!("{file}: {error}"));
        assert!(text.contains(within), "{file}");
    }
}
