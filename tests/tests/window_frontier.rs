//! The Frontier bench as a user works it: the curve comes, a point is loaded and taken back, a refusal opens, emitters
//! are chosen, the map is read.
//!
//! `UPDATE_SNAPSHOTS=1 cargo test -p checks --test window_frontier` also writes the pictures of the documentation.

#![allow(clippy::unwrap_used, reason = "a test fails by panicking")]

mod window_support;

use egui::accesskit::Role;
use egui::{Key, Modifiers, Theme};
use egui_kittest::kittest::{NodeT, Queryable};
use std::path::PathBuf;
use std::time::{Duration, Instant};
use window_support::Driven;

fn wait(driven: &mut Driven) {
    let begun = Instant::now();
    driven.harness.run_steps(2);
    while driven.harness.state().is_working() {
        assert!(begun.elapsed() < Duration::from_secs(600), "the work does not come to an end");
        std::thread::sleep(Duration::from_millis(20));
        driven.harness.step();
    }
    driven.harness.run_steps(3);
}

fn open_bench(driven: &mut Driven) {
    driven.harness.get_by_role_and_label(Role::Tab, "Frontier bench").click();
    wait(driven);
}

fn press(driven: &mut Driven, role: Role, words: &str) {
    driven.harness.get_by_role_and_label(role, words).click();
    driven.harness.run_steps(3);
}

/// The first name or sentence on the screen with that beginning.
fn heard(driven: &Driven, beginning: &str) -> Option<String> {
    driven
        .harness
        .root()
        .children_recursive()
        .filter_map(|node| {
            let node = node.accesskit_node();
            node.label().or_else(|| node.value())
        })
        .find(|words| words.starts_with(beginning))
}

fn said(driven: &Driven, beginning: &str) -> bool {
    heard(driven, beginning).is_some()
}

/// Keeps a picture for the documentation when asked to; always sees that something is painted.
fn picture(driven: &mut Driven, name: &str) {
    let (columns, rows, bytes) = driven.picture();
    let picture = image::RgbaImage::from_raw(columns as u32, rows as u32, bytes).unwrap();
    let mut colours: Vec<[u8; 4]> = picture.pixels().map(|pixel| pixel.0).collect();
    colours.sort_unstable();
    colours.dedup();
    assert!(colours.len() > 200, "{name} shows {} colours", colours.len());
    if std::env::var_os("UPDATE_SNAPSHOTS").is_some() {
        let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("../docs/pictures");
        std::fs::create_dir_all(&folder).unwrap();
        picture.save(folder.join(format!("{name}.png"))).unwrap();
    }
}

#[test]
fn a_point_of_the_curve_is_loaded_by_keys_and_undone_in_one_step() {
    let mut driven = Driven::open(1280.0, 720.0, Theme::Light);
    let before = driven.shares();
    open_bench(&mut driven);
    let spoken = heard(&driven, "lm/W of the device against R9: ").unwrap();
    assert!(spoken.contains("points, from"), "{spoken}");
    assert!(said(&driven, "One more point of "), "the prices are there");
    assert!(said(&driven, "Without "), "so is what each emitter is worth");
    assert_eq!(driven.shares(), before, "looking changes nothing");

    driven.harness.get_by_role_and_label(Role::Slider, &spoken).focus();
    driven.harness.run_steps(2);
    for _ in 0..4 {
        driven.harness.key_press(Key::ArrowRight);
        driven.harness.run_steps(2);
    }
    let looked = heard(&driven, "R9 at least ").unwrap();
    assert!(looked.contains("lm/W") && looked.contains("no blend gives more than"), "{looked}");
    picture(&mut driven, "frontier-1280x720-light");
    press(&mut driven, Role::Button, "Load this blend");
    let loaded = driven.shares();
    assert_ne!(loaded, before);
    assert!((loaded.iter().sum::<f64>() - 1.0).abs() < 1e-9);
    assert!(!said(&driven, "Out of date"), "free shares do not belong to the question");

    driven.harness.key_press_modifiers(Modifiers::COMMAND, Key::Z);
    driven.harness.run_steps(3);
    assert_eq!(driven.shares(), before, "loading is one step");
}

#[test]
fn the_table_holds_the_same_points_and_loads_them_too() {
    let mut driven = Driven::usual();
    open_bench(&mut driven);
    let before = driven.shares();
    let spoken = heard(&driven, "lm/W of the device against R9: ").unwrap();
    press(&mut driven, Role::RadioButton, "Shown as: Table");
    let rows: Vec<String> = driven
        .harness
        .root()
        .children_recursive()
        .filter(|node| node.accesskit_node().role() == Role::Row)
        .filter_map(|node| node.accesskit_node().label())
        .filter(|label| label.starts_with("R9 at least"))
        .collect();
    assert!(rows.len() >= 8, "{rows:?}");
    let points: usize = spoken["lm/W of the device against R9: ".len()..]
        .split(' ')
        .next()
        .and_then(|word| word.parse().ok())
        .unwrap();
    assert!(rows.len() <= points, "{} rows of {points} points", rows.len());
    press(&mut driven, Role::Row, &rows[3]);
    press(&mut driven, Role::Button, "Load this blend");
    assert_ne!(driven.shares(), before);
    picture(&mut driven, "frontier-table");
}

#[test]
fn another_metric_draws_another_curve() {
    let mut driven = Driven::open(2560.0, 1440.0, Theme::Dark);
    open_bench(&mut driven);
    press(&mut driven, Role::RadioButton, "Against: Rf");
    wait(&mut driven);
    assert!(said(&driven, "lm/W of the device against Rf: "));
    assert!(!said(&driven, "lm/W of the device against R9: "));
    picture(&mut driven, "frontier-2560x1440-dark");
}

#[test]
fn a_changed_set_marks_the_answer_and_asking_again_clears_it() {
    let mut driven = Driven::usual();
    open_bench(&mut driven);
    assert!(!said(&driven, "Out of date"));
    let state = driven.harness.state();
    let set = state.state().current_set().unwrap().clone();
    let member = set.members[0].emitter;
    let edit = whitesmith::state::Edit::Bounds { set: set.id, emitter: member, least: 0.0, most: 0.9 };
    driven.harness.state_mut().make(edit).unwrap();
    driven.harness.run_steps(3);
    assert!(said(&driven, "Out of date"));
    press(&mut driven, Role::Button, "Work it out again");
    wait(&mut driven);
    assert!(!said(&driven, "Out of date"));
}

#[test]
fn a_spec_out_of_reach_says_why_and_one_click_opens_it() {
    let mut driven = Driven::usual();
    let set = driven.harness.state().state().current_set().unwrap().clone();
    let mut white = set.white.clone();
    white.limits.ler = project::Limit::at_least(390.0);
    let edit = whitesmith::state::Edit::White { set: set.id, white: Box::new(white) };
    driven.harness.state_mut().make(edit).unwrap();
    open_bench(&mut driven);
    driven.harness.key_press_modifiers(Modifiers::COMMAND, Key::Enter);
    wait(&mut driven);
    let words: Vec<String> = driven
        .harness
        .root()
        .children_recursive()
        .filter(|node| node.accesskit_node().role() == Role::Button)
        .filter_map(|node| node.accesskit_node().label())
        .filter(|label| label.ends_with("would open it"))
        .collect();
    assert!(!words.is_empty(), "there is a way out");
    picture(&mut driven, "frontier-infeasible");
    let way = words.iter().find(|label| label.starts_with("LER")).expect("the LER can give way");
    driven.harness.get_all_by_role_and_label(Role::Button, way).next().unwrap().click();
    wait(&mut driven);
    let after = driven.harness.state().state().current_set().unwrap().white.limits.ler.low.unwrap();
    assert!(after < 390.0 && after > 200.0, "{after}");
    let proof = driven.harness.state().proof_words().expect("it was solved again").to_owned();
    assert!(!proof.contains("None was found"), "{proof}");
}

#[test]
fn the_best_four_become_a_set() {
    let mut driven = Driven::usual();
    open_bench(&mut driven);
    press(&mut driven, Role::RadioButton, "Tool: Choose emitters");
    press(&mut driven, Role::Button, "Choose");
    wait(&mut driven);
    assert!(said(&driven, "Choice 1: "));
    picture(&mut driven, "frontier-choose");
    let sets = driven.harness.state().state().project().sets.len();
    press(&mut driven, Role::Button, "Make a set of these");
    let state = driven.harness.state().state();
    assert_eq!(state.project().sets.len(), sets + 1);
    assert_eq!(state.current_set().unwrap().members.len(), 4);
    driven.harness.key_press_modifiers(Modifiers::COMMAND, Key::Z);
    driven.harness.run_steps(2);
    assert_eq!(driven.harness.state().state().project().sets.len(), sets);
}

#[test]
fn the_map_of_the_missing_emitter_is_read_by_keys() {
    let mut driven = Driven::usual();
    open_bench(&mut driven);
    press(&mut driven, Role::RadioButton, "Tool: Missing emitter");
    press(&mut driven, Role::Button, "Draw the map");
    wait(&mut driven);
    let spoken = heard(&driven, "Map of the lm/W with one emitter more").unwrap();
    driven.harness.get_by_role_and_label(Role::Slider, &spoken).focus();
    driven.harness.run_steps(2);
    driven.harness.key_press(Key::ArrowUp);
    driven.harness.run_steps(2);
    let first = heard(&driven, "Peak ").unwrap();
    driven.harness.key_press(Key::ArrowRight);
    driven.harness.run_steps(2);
    let second = heard(&driven, "Peak ").unwrap();
    assert_ne!(first, second);
    assert!(first.contains("lm/W") || first.contains("no blend"), "{first}");
    picture(&mut driven, "frontier-missing");
}
