//! The Mixing bench as a user works it: pulling, typing, keys, locks, the held white, solving.

mod window_support;

use egui::accesskit::Role;
use egui::{Key, Modifiers, vec2};
use egui_kittest::kittest::{NodeT, Queryable};
use std::time::{Duration, Instant};
use window_support::Driven;

const FERN: &str = "Fern green, share of radiant power in percent";
const BRASS: &str = "Brass amber, share of radiant power in percent";
/// Rows of the demonstration's cabin set.
const FERN_ROW: usize = 2;
const BRASS_ROW: usize = 3;

fn row(driven: &Driven, name: &str) -> egui::Rect {
    driven.harness.get_by_role_and_label(Role::Slider, name).rect()
}

fn wait_for_solver(driven: &mut Driven) {
    let begun = Instant::now();
    while driven.harness.state().is_solving() {
        assert!(begun.elapsed() < Duration::from_secs(300), "the solver does not come back");
        std::thread::sleep(Duration::from_millis(20));
        driven.harness.step();
    }
    driven.harness.run_steps(2);
}

#[test]
fn a_pull_on_a_curve_changes_shares_and_ledger_within_the_frame() {
    let mut driven = Driven::usual();
    let before = driven.shares();
    let cct_before = driven.spoken("CCT ");
    let at = row(&driven, FERN).center();
    driven.press(at);
    driven.move_to(at - vec2(0.0, 8.0));
    driven.move_to(at - vec2(0.0, 25.0));
    let shares = driven.shares();
    assert!(shares[FERN_ROW] > before[FERN_ROW] + 0.02, "{before:?} -> {shares:?}");
    assert!((shares.iter().sum::<f64>() - 1.0).abs() < 1e-12);
    // What is on the screen after this one frame is what the shares give, not what they gave before.
    let derived = driven.harness.state_mut().derived();
    let line = derived.ledger.iter().find(|line| line.key == "cct").unwrap().text.clone();
    let spoken = driven.spoken("CCT ");
    assert_ne!(spoken, cct_before);
    assert!(spoken.starts_with(&format!("CCT {line} K")), "{spoken} against {line}");

    driven.release(at - vec2(0.0, 25.0));
    assert_eq!(driven.shares(), shares);
    driven.harness.key_press_modifiers(Modifiers::COMMAND, Key::Z);
    driven.harness.run_steps(2);
    assert_eq!(driven.shares(), before, "the whole pull is one step");
    driven.harness.key_press_modifiers(Modifiers::COMMAND, Key::Y);
    driven.harness.run_steps(2);
    assert_eq!(driven.shares(), shares);
}

#[test]
fn a_pull_depends_on_where_the_hand_is_and_not_on_how_it_got_there() {
    let mut driven = Driven::usual();
    let before = driven.shares();
    let at = row(&driven, BRASS).center();
    driven.press(at);
    driven.move_to(at - vec2(0.0, 60.0));
    driven.move_to(at + vec2(0.0, 90.0));
    driven.move_to(at);
    let after = driven.shares();
    for (a, b) in before.iter().zip(&after) {
        assert!((a - b).abs() < 1e-12, "{before:?} -> {after:?}");
    }
}

#[test]
fn escape_takes_a_pull_back() {
    let mut driven = Driven::usual();
    let before = driven.shares();
    let at = row(&driven, FERN).center();
    driven.press(at);
    driven.move_to(at - vec2(0.0, 30.0));
    assert_ne!(driven.shares(), before);
    driven.harness.key_press(Key::Escape);
    driven.harness.run_steps(2);
    assert_eq!(driven.shares(), before);
    assert!(driven.harness.state().state().undo_label().is_none());
}

#[test]
fn keys_change_a_share_lock_it_and_switch_it_off() {
    let mut driven = Driven::usual();
    driven.harness.get_by_role_and_label(Role::Slider, FERN).focus();
    driven.harness.run_steps(2);
    let before = driven.shares()[FERN_ROW];
    driven.harness.key_press(Key::ArrowUp);
    driven.harness.run_steps(2);
    assert!((driven.shares()[FERN_ROW] - before - 0.01).abs() < 1e-9);
    driven.harness.key_press_modifiers(Modifiers::SHIFT, Key::ArrowDown);
    driven.harness.run_steps(2);
    assert!((driven.shares()[FERN_ROW] - before - 0.009).abs() < 1e-9);
    driven.harness.key_press(Key::L);
    driven.harness.run_steps(2);
    let member = driven.harness.state().state().current_set().unwrap().members[FERN_ROW];
    assert!(member.locked);
    driven.harness.key_press(Key::ArrowUp);
    driven.harness.run_steps(2);
    assert_eq!(driven.shares()[FERN_ROW], member.share, "a locked share stays");
    driven.spoken("This share is locked");
    driven.harness.get_by_role_and_label(Role::Slider, BRASS).focus();
    driven.harness.run_steps(2);
    driven.harness.key_press(Key::O);
    driven.harness.run_steps(2);
    assert!(!driven.harness.state().state().current_set().unwrap().members[BRASS_ROW].on);
    assert_eq!(driven.shares()[BRASS_ROW], 0.0);
    assert_eq!(driven.shares()[FERN_ROW], member.share);
}

#[test]
fn a_typed_share_is_taken_as_typed() {
    let mut driven = Driven::usual();
    let name = "Fern green: share of radiant power in percent";
    driven.harness.get_by_role_and_label(Role::SpinButton, name).focus();
    driven.harness.run_steps(2);
    driven.harness.key_press_modifiers(Modifiers::COMMAND, Key::A);
    driven.harness.event(egui::Event::Text("30,5 %".to_owned()));
    driven.harness.step();
    driven.harness.key_press(Key::Enter);
    driven.harness.run_steps(2);
    assert!((driven.shares()[FERN_ROW] - 0.305).abs() < 1e-12, "{:?}", driven.shares());
}

#[test]
fn assistive_technology_can_set_a_share() {
    let mut driven = Driven::usual();
    driven.harness.get_by_role_and_label(Role::Slider, BRASS).set_value_accesskit(40.0);
    driven.harness.run_steps(2);
    assert!((driven.shares()[BRASS_ROW] - 0.4).abs() < 1e-12);
}

#[test]
fn with_the_white_held_a_pull_keeps_the_chromaticity() {
    let mut driven = Driven::usual();
    driven.harness.key_press_modifiers(Modifiers::COMMAND, Key::H);
    driven.harness.run_steps(2);
    let white = driven.harness.state_mut().derived().blend.as_ref().unwrap().uv_prime();
    let before = driven.shares();
    let at = row(&driven, BRASS).center();
    driven.press(at);
    driven.move_to(at - vec2(0.0, 20.0));
    let after = driven.shares();
    let moved = driven.harness.state_mut().derived().blend.as_ref().unwrap().uv_prime();
    assert!((after[BRASS_ROW] - before[BRASS_ROW]).abs() > 0.02, "{before:?} -> {after:?}");
    assert!(white.distance(moved) < 1e-9, "{white:?} {moved:?}");
}

#[test]
fn with_three_free_rows_the_held_white_says_why_nothing_moves() {
    let mut driven = Driven::usual();
    // Three emitters at one white have one blend: no freedom is left (two equations and the sum).
    for name in ["Switch Reed teal off", "Lock Brass amber"] {
        driven.harness.get_by_label(name).click();
        driven.harness.run_steps(2);
    }
    driven.harness.key_press_modifiers(Modifiers::COMMAND, Key::H);
    driven.harness.run_steps(2);
    let before = driven.shares();
    let at = row(&driven, FERN).center();
    driven.press(at);
    driven.move_to(at - vec2(0.0, 30.0));
    assert_eq!(driven.shares(), before);
    let blend = driven.harness.state_mut().derived().blend.clone().unwrap();
    assert!(
        blend.rows[FERN_ROW].held_span.as_ref().unwrap_err().to_string().contains("only 3 rows are free")
    );
}

#[test]
fn solve_runs_in_the_background_and_ends_with_a_proof() {
    let mut driven = Driven::usual();
    driven
        .harness
        .get_by_role_and_label(Role::SpinButton, "target CCT in kelvin")
        .set_value_accesskit(3100.0);
    driven.harness.run_steps(2);
    let before = driven.shares();
    driven.harness.get_by_label("Solve").click();
    driven.harness.step();
    driven.harness.step();
    wait_for_solver(&mut driven);
    assert_ne!(driven.shares(), before);
    let cct_k = driven.harness.state_mut().derived().blend.as_ref().unwrap().measurement().cct_k.unwrap();
    assert!((cct_k - 3100.0).abs() < 0.5, "{cct_k}");
    assert!(driven.spoken("Proof: ").contains("Proven best"), "{}", driven.spoken("Proof: "));
    // The proof belongs to this blend: it goes with a change and comes back with undo.
    let at = row(&driven, FERN).center();
    driven.press(at);
    driven.move_to(at - vec2(0.0, 20.0));
    driven.release(at - vec2(0.0, 20.0));
    driven.harness.run_steps(2);
    assert!(driven.harness.state().proof_words().is_none());
    driven.harness.key_press_modifiers(Modifiers::COMMAND, Key::Z);
    driven.harness.run_steps(2);
    assert!(driven.harness.state().proof_words().is_some());
}

#[test]
fn an_impossible_limit_is_refused_with_a_way_out_that_opens_it() {
    let mut driven = Driven::usual();
    driven.harness.get_by_role_and_label(Role::SpinButton, "least Ra").set_value_accesskit(99.5);
    driven.harness.run_steps(2);
    let before = driven.shares();
    driven.harness.key_press_modifiers(Modifiers::COMMAND, Key::Enter);
    driven.harness.run_steps(2);
    wait_for_solver(&mut driven);
    assert_eq!(driven.shares(), before, "a refusal changes nothing");
    let label = driven
        .harness
        .root()
        .children_recursive()
        .filter_map(|node| node.accesskit_node().label())
        .find(|label| label.starts_with("Ra ") && label.ends_with("would open it"))
        .unwrap_or_else(|| panic!("no way out: {}", driven.spoken("Proof: ")));
    driven.harness.get_by_label(&label).click();
    driven.harness.run_steps(2);
    wait_for_solver(&mut driven);
    assert!(driven.spoken("Proof: ").contains("Proven best"), "{label}: {}", driven.spoken("Proof: "));
    let low = driven.harness.state().state().current_set().unwrap().white.limits.ra.low.unwrap();
    assert!(low < 99.5, "the way out relaxes the limit: {low}");
    let ra = driven.harness.state_mut().derived().blend.as_ref().unwrap().measurement().ra.unwrap();
    assert!(ra >= low - 1e-6, "{ra} against {low}");
}

#[test]
fn lumens_wanted_give_every_emitter_its_watts() {
    let mut driven = Driven::usual();
    driven.harness.get_by_role_and_label(Role::SpinButton, "lumens wanted").set_value_accesskit(480.0);
    driven.harness.run_steps(2);
    let derived = driven.harness.state_mut().derived();
    let blend = derived.blend.as_ref().unwrap();
    let watts: f64 = blend.rows.iter().filter_map(|row| row.watts).sum();
    assert!((watts * blend.measurement().ler_lm_per_w - 480.0).abs() < 1e-6);
}

#[test]
fn every_control_has_a_name() {
    let mut driven = Driven::usual();
    for section in ["Show the fifteen test colours", "Show the sixteen hue bins"] {
        if let Some(node) = driven.harness.query_by_label(section) {
            node.click();
            driven.harness.run_steps(2);
        }
    }
    assert_eq!(driven.harness.unnamed_widgets(), Vec::<String>::new());
    driven.harness.get_by_label("More about Fern green").click();
    driven.harness.run_steps(2);
    driven.harness.get_by_label("Details\u{2026}").click();
    driven.harness.run_steps(2);
    assert_eq!(driven.harness.unnamed_widgets(), Vec::<String>::new());
}

#[test]
fn twelve_and_more_rows_scroll_and_keep_their_height() {
    let mut driven = Driven::open(1280.0, 720.0, egui::Theme::Light);
    for _ in 0..3 {
        let table = include_str!("../data/window/three_emitters.tsv");
        driven.harness.event(egui::Event::Paste(table.to_owned()));
        driven.harness.run_steps(3);
        driven.harness.get_by_label("Add 3 emitters").click();
        driven.harness.run_steps(3);
    }
    let set = driven.harness.state().state().current_set().unwrap();
    assert_eq!(set.members.len(), 14);
    assert!(row(&driven, FERN).height() >= 60.0);
}
