//! Facts about the state: what random hands cannot break.

use super::mixing::rebalance;
use super::*;
use project::{Correction, CorrectionStep, Geometry, Import, Limit, Member, ShareKind, WhiteSpec};
use proptest::prelude::*;

/// An invented bell curve at `peak_nm`.
fn emitter(id: u64, name: &str, peak_nm: f64) -> Emitter {
    let wavelengths_nm: Vec<f64> = (380..=780).step_by(5).map(f64::from).collect();
    let power_per_nm = wavelengths_nm.iter().map(|w| (-((w - peak_nm) / 18.0).powi(2)).exp()).collect();
    Emitter {
        id: EmitterId(id),
        name: name.to_owned(),
        invented: true,
        note: String::new(),
        import: Import { wavelengths_nm, power_per_nm, ..Import::default() },
        corrections: Vec::new(),
        geometry: Geometry::Sphere,
        origin: project::Origin::Modelled,
        mounting: project::Mounting::SingleDevice,
        instrument_range_nm: None,
        wall_plug: Some(0.3),
        sheet: device::Sheet::default(),
    }
}

fn start() -> State {
    let mut project = Project::new("Night ferries");
    let names = ["Kingfisher blue", "Reed teal", "Fern green", "Brass amber", "Rowan red"];
    for (k, name) in names.iter().enumerate() {
        project.emitters.push(emitter(1 + k as u64, name, 455.0 + 42.0 * k as f64));
    }
    let members = [0.1, 0.0, 0.3, 0.25, 0.35]
        .iter()
        .enumerate()
        .map(|(k, &share)| Member { share, ..Member::new(EmitterId(1 + k as u64)) })
        .collect();
    project.sets.push(EmitterSet {
        id: SetId(10),
        name: "Set A".to_owned(),
        note: String::new(),
        members,
        white: WhiteSpec::default(),
        recipes: Vec::new(),
    });
    project.next_id = 11;
    State::new(project, None).unwrap()
}

fn check_blends(project: &Project) {
    project.check().unwrap();
    for set in &project.sets {
        if set.members.iter().any(|m| m.on) {
            assert!((set.share_sum() - 1.0).abs() < 1e-9, "{}", set.share_sum());
        }
        assert!(set.members.iter().all(|m| m.share >= 0.0 && (m.on || m.share == 0.0)), "{:?}", set.members);
    }
}

#[test]
fn a_drag_is_one_undo_step_and_one_edit() {
    let mut state = start();
    let before = state.project().clone();
    state.begin_gesture("pull Fern green");
    for k in 1..50 {
        let members = &before.sets[0].members;
        let shares = rebalance::pull(members, 2, 0.3 + 0.01 * f64::from(k)).unwrap().shares;
        state.apply(Edit::Shares { set: SetId(10), shares }).unwrap();
    }
    assert!(state.take_journal().is_empty(), "a drag is journalled when it ends");
    state.end_gesture();
    assert_eq!(state.undo_label(), Some("pull Fern green"));
    match state.take_journal().as_slice() {
        [JournalEntry::Step { edits, .. }] => assert_eq!(edits.len(), 1),
        other => panic!("{other:?}"),
    }
    let after = state.project().clone();
    assert!((after.sets[0].members[2].share - 0.79).abs() < 1e-12);
    assert!(state.undo() && !state.undo());
    assert_eq!(*state.project(), before);
    assert!(state.redo() && !state.redo());
    assert_eq!(*state.project(), after);
}

#[test]
fn a_cancelled_drag_leaves_nothing() {
    let mut state = start();
    let before = state.project().clone();
    state.begin_gesture("pull");
    state.apply(Edit::Shares { set: SetId(10), shares: vec![1.0, 0.0, 0.0, 0.0, 0.0] }).unwrap();
    state.cancel_gesture();
    assert_eq!(*state.project(), before);
    assert!(state.undo_label().is_none() && state.take_journal().is_empty());
}

#[test]
fn an_edit_that_cannot_be_made_leaves_the_project_alone() {
    let mut state = start();
    let before = state.project().clone();
    let set = SetId(10);
    let refused = [
        Edit::ProjectName("  ".into()),
        Edit::Shares { set, shares: vec![0.5, 0.5] },
        Edit::Shares { set, shares: vec![0.5, 0.5, 0.5, -0.5, 0.0] },
        Edit::Shares { set, shares: vec![0.5, 0.2, 0.0, 0.0, 0.0] },
        Edit::Shares { set, shares: vec![f64::NAN, 0.2, 0.0, 0.0, 0.0] },
        Edit::Bounds { set, emitter: EmitterId(1), least: 0.6, most: 0.5 },
        Edit::WallPlug { emitter: EmitterId(1), wall_plug: Some(1.2) },
        Edit::AddMember { set, emitter: EmitterId(1), at: 0 },
        Edit::RemoveEmitter(EmitterId(99)),
        Edit::SelectSet(Some(SetId(99))),
        Edit::InsertEmitter { at: 0, emitter: Box::new(emitter(1, "Twin", 500.0)) },
        Edit::White { set, white: Box::new(WhiteSpec { cct_k: 300.0, ..WhiteSpec::default() }) },
        Edit::Corrections {
            emitter: EmitterId(1),
            steps: vec![CorrectionStep {
                correction: Correction::Crop { first_nm: 10.0, last_nm: 20.0 },
                on: true,
            }],
        },
        Edit::Together {
            label: "half".into(),
            edits: vec![Edit::ProjectName("Other".into()), Edit::RemoveSet(SetId(99))],
        },
    ];
    for edit in refused {
        let error = state.apply(edit.clone()).unwrap_err();
        assert!(!error.to_string().is_empty());
        assert_eq!(*state.project(), before, "{edit:?}");
    }
    assert_eq!(state.revision(), 0);
}

#[test]
fn switching_off_gives_the_share_to_the_free_rows() {
    let mut state = start();
    state.apply(Edit::Lock { set: SetId(10), emitter: EmitterId(5), locked: true }).unwrap();
    state.apply(Edit::Switch { set: SetId(10), emitter: EmitterId(1), on: false }).unwrap();
    let members = &state.current_set().unwrap().members;
    assert_eq!((members[0].share, members[4].share), (0.0, 0.35));
    assert!((members[2].share / members[3].share - 0.3 / 0.25).abs() < 1e-12);
    check_blends(state.project());
}

#[test]
fn the_last_emitter_that_is_on_stays_on_and_locks_are_named() {
    let mut state = start();
    for id in 1..=4 {
        state.apply(Edit::Switch { set: SetId(10), emitter: EmitterId(id), on: false }).unwrap();
    }
    let edit = Edit::Switch { set: SetId(10), emitter: EmitterId(5), on: false };
    assert_eq!(state.apply(edit).unwrap_err(), EditError::LastOn("Rowan red".into()));
    let mut state = start();
    for id in 2..=5 {
        state.apply(Edit::Lock { set: SetId(10), emitter: EmitterId(id), locked: true }).unwrap();
    }
    let error = state.apply(Edit::RemoveMember { set: SetId(10), emitter: EmitterId(1) }).unwrap_err();
    assert!(error.to_string().contains("unlock one first"), "{error}");
}

#[test]
fn removing_an_emitter_takes_it_out_of_every_set_and_undo_brings_it_back() {
    let mut state = start();
    let copy = state.duplicating(SetId(10)).unwrap();
    state.apply(copy).unwrap();
    assert_eq!(state.current_set().unwrap().name, "Set A copy");
    let before = state.project().clone();
    state.apply(Edit::RemoveEmitter(EmitterId(3))).unwrap();
    check_blends(state.project());
    assert!(state.project().sets.iter().all(|s| s.members.len() == 4));
    state.undo();
    assert_eq!(*state.project(), before);
}

#[test]
fn added_emitters_get_their_own_identities_and_names() {
    let mut state = start();
    let adding =
        state.adding(vec![emitter(0, "Fern green", 520.0), emitter(0, "Fern green", 525.0)], Some(SetId(10)));
    assert_eq!(adding.label(), "add 2 emitters");
    state.apply(adding).unwrap();
    let names: Vec<&str> = state.project().emitters[5..].iter().map(|e| e.name.as_str()).collect();
    assert_eq!(names, ["Fern green 2", "Fern green 3"]);
    assert_eq!(state.current_set().unwrap().members.len(), 7);
    check_blends(state.project());
    assert!(state.undo() && state.project().emitters.len() == 5);
}

fn random_edit(state: &State, kind: u8, a: u64, b: f64) -> Edit {
    let project = state.project();
    let set = project.sets.get(a as usize % project.sets.len().max(1)).map_or(SetId(0), |s| s.id);
    let members = project.set(set).map_or(&[][..], |s| &s.members);
    let row = (a / 7) as usize % members.len().max(1);
    let member = members.get(row).map_or(EmitterId(0), |m| m.emitter);
    let emitter_id =
        project.emitters.get((a / 3) as usize % project.emitters.len().max(1)).map_or(EmitterId(0), |e| e.id);
    let steps =
        vec![CorrectionStep { correction: Correction::Shift { by_nm: 10.0 * b }, on: a.is_multiple_of(2) }];
    match kind {
        0..=5 => match rebalance::pull(members, row, b) {
            Ok(pulled) => Edit::Shares { set, shares: pulled.shares },
            Err(_) => Edit::Lock { set, emitter: member, locked: false },
        },
        6 => Edit::Lock { set, emitter: member, locked: a.is_multiple_of(2) },
        7 => Edit::Switch { set, emitter: member, on: a.is_multiple_of(3) },
        8 => Edit::AddMember { set, emitter: emitter_id, at: row },
        9 => Edit::RemoveMember { set, emitter: member },
        10 => Edit::MoveMember { set, emitter: member, to: (a % 5) as usize },
        11 => Edit::RemoveEmitter(emitter_id),
        12 => state.adding(vec![emitter(0, "Harbour lime", 400.0 + 300.0 * b)], Some(set)),
        13 => state.duplicating(set).unwrap_or(Edit::NextId(project.next_id)),
        14 => Edit::RemoveSet(set),
        15 => Edit::SelectSet(Some(set)),
        16 => Edit::MoveSet { set, to: (a % 4) as usize },
        17 => {
            let mut white = WhiteSpec { cct_k: 2000.0 + 4000.0 * b, ..WhiteSpec::default() };
            white.limits.ra = Limit::at_least(90.0 * b);
            Edit::White { set, white: Box::new(white) }
        }
        18 => Edit::EmitterName { emitter: emitter_id, name: format!("Tarn violet {a}") },
        19 => Edit::Corrections { emitter: emitter_id, steps },
        20 => Edit::ShareKind([ShareKind::Radiant, ShareKind::Luminous, ShareKind::Photon][(a % 3) as usize]),
        21 => Edit::WallPlug { emitter: emitter_id, wall_plug: a.is_multiple_of(2).then_some(b) },
        22 => Edit::Bounds { set, emitter: member, least: 0.2 * b, most: 1.0 - 0.3 * b },
        23 => state.adding_set(format!("Set {a}")),
        24 => Edit::MoveEmitter { emitter: emitter_id, to: (a % 6) as usize },
        25 => Edit::ReplaceProject(Box::new(start().project().clone())),
        _ => Edit::ProjectName(format!("Ferry {a}")),
    }
}

fn locked_shares(project: &Project) -> Vec<(SetId, EmitterId, u64)> {
    project
        .sets
        .iter()
        .flat_map(|s| {
            s.members.iter().filter(|m| m.locked && m.on).map(|m| (s.id, m.emitter, m.share.to_bits()))
        })
        .collect()
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 200, ..ProptestConfig::default() })]

    #[test]
    fn random_hands_break_nothing_and_undo_gives_the_start(
        hands in prop::collection::vec((0..34_u8, any::<u64>(), 0.0..1.0_f64), 1..60)
    ) {
        let mut state = start();
        let first = state.project().clone();
        let mut journal = Vec::new();
        for (kind, a, b) in hands {
            match kind {
                27..=29 => { state.undo(); }
                30 => { state.redo(); }
                31 => state.begin_gesture("drag"),
                32 => state.end_gesture(),
                33 => state.cancel_gesture(),
                kind => {
                    let edit = random_edit(&state, kind, a, b);
                    let before = state.project().clone();
                    let locks = locked_shares(&before);
                    let keeps_locks = matches!(edit, Edit::Shares { .. } | Edit::Switch { on: false, .. });
                    match state.apply(edit.clone()) {
                        Ok(()) if keeps_locks => {
                            let after = locked_shares(state.project());
                            let gone = match edit { Edit::Switch { emitter, .. } => Some(emitter), _ => None };
                            for lock in locks.iter().filter(|l| Some(l.1) != gone) {
                                prop_assert!(after.contains(lock), "{edit:?}");
                            }
                        }
                        Ok(()) => {}
                        Err(_) => prop_assert!(state.project() == &before, "a refused edit changed something"),
                    }
                }
            }
            check_blends(state.project());
            journal.append(&mut state.take_journal());
        }
        state.end_gesture();
        journal.append(&mut state.take_journal());
        let last = state.project().clone();

        let mut again = State::new(first.clone(), None).unwrap();
        for entry in journal {
            let line = serde_json::to_string(&entry).unwrap();
            again.replay(serde_json::from_str(&line).unwrap()).unwrap();
        }
        prop_assert!(again.project() == &last, "the journal gives the last state");

        let mut steps = 0;
        while state.undo() {
            steps += 1;
        }
        prop_assert!(state.project() == &first, "undo to the start gives the start");
        for _ in 0..steps {
            prop_assert!(state.redo());
        }
        prop_assert!(state.project() == &last, "redo to the end gives the end");
    }
}
