//! Facts about trade-offs of the demonstration.

use super::trade::price_words;
use super::*;
use crate::jobs::{Answer, Jobs, Token};
use crate::state::State;
use crate::state::demo;
use optimiser::Requirement;
use project::Limit;
use std::sync::Arc;

fn cabin() -> Project {
    demo::cabin().unwrap()
}

fn on_a_job<T: Send + 'static>(work: impl FnOnce(&Token) -> T + Send + 'static) -> T {
    let mut jobs = Jobs::new(1, Arc::new(|| {}));
    jobs.start("test", 0, work);
    match jobs.wait().expect("a job was started").answer {
        Answer::Done(answer) => answer,
        Answer::Panicked(message) => panic!("{message}"),
    }
}

fn cabin_trade(metric: Metric) -> (Project, SetId, Trade) {
    let project = cabin();
    let set = project.current().unwrap().id;
    let copy = project.clone();
    let trade = on_a_job(move |token| trade(&copy, set, metric, Aim::Ler, token)).unwrap();
    (project, set, trade)
}

#[test]
fn more_rendering_never_gives_more_light_and_the_bound_lies_above() {
    let (project, set, trade) = cabin_trade(Metric::R9);
    assert!(trade.curve.len() >= 10, "{}", trade.curve.len());
    for pair in trade.curve.windows(2) {
        assert!(pair[1].level > pair[0].level);
        let slack = 1e-3 * pair[0].objective;
        assert!(pair[1].objective <= pair[0].objective + slack, "{pair:?}");
    }
    for point in &trade.curve {
        assert!(point.values.r9 >= point.level - 1e-6);
        assert!(point.bound.is_none_or(|bound| bound >= point.objective - 1e-9));
        assert!((point.shares.iter().sum::<f64>() - 1.0).abs() < 1e-6);
        assert_eq!(point.shares.len(), project.set(set).unwrap().members.len());
    }
    // The spec's own answer lies on the curve or under it.
    let Spec::Met(best) = &trade.spec else { panic!("{:?}", trade.spec) };
    let at = trade.nearest(best.level).unwrap();
    let left = &trade.curve[at.saturating_sub(1)];
    assert!(best.objective <= left.objective * (1.0 + 2e-3));
    // Leaving an emitter out never gains; sorted dearest first.
    assert_eq!(trade.dropped.len(), project.set(set).unwrap().members.iter().filter(|m| m.on).count());
    for pair in trade.dropped.windows(2) {
        assert!(pair[0].price.unwrap_or(f64::INFINITY) >= pair[1].price.unwrap_or(f64::INFINITY));
    }
    let table =
        trade.table(&project.set(set).unwrap().members.iter().map(|_| "x".to_owned()).collect::<Vec<_>>());
    assert_eq!(table.lines().count(), trade.curve.len() + 1);
    let columns = table.lines().next().unwrap().split('\t').count();
    assert!(table.lines().all(|line| line.split('\t').count() == columns));
}

#[test]
fn an_answer_is_stale_when_a_limit_moves_and_not_when_a_share_does() {
    let project = cabin();
    let set = project.current().unwrap().clone();
    let before = Basis::of_set(&project, &set);
    let mut moved = set.clone();
    moved.members[0].share += 0.01;
    moved.white.lumens = Some(900.0);
    assert_eq!(Basis::of_set(&project, &moved), before);
    moved.white.limits.of_mut(Metric::Ra).low = Some(91.5);
    assert_ne!(Basis::of_set(&project, &moved), before);
    let mut locked = set.clone();
    locked.members[0].locked = true;
    assert_ne!(Basis::of_set(&project, &locked), before);
    assert_eq!(Basis::of_project(&project, &locked), Basis::of_project(&project, &set));
}

#[test]
fn a_spec_out_of_reach_is_refused_with_a_way_out_that_works() {
    let mut project = cabin();
    let set = project.current().unwrap().id;
    for one in project.sets.iter_mut().filter(|one| one.id == set) {
        *one.white.limits.of_mut(Metric::Ler) = Limit::at_least(390.0);
    }
    let copy = project.clone();
    let refused = on_a_job(move |token| trade(&copy, set, Metric::R9, Aim::Ler, token)).unwrap();
    let Spec::Refused(refusal) = &refused.spec else { panic!("{:?}", refused.spec) };
    assert!(!refusal.words.is_empty() && !refusal.relaxations.is_empty(), "{refusal:?}");
    assert!(refused.prices.is_empty() && refused.dropped.is_empty());
    // The curve leaves its own limits out, so it is there and shows how far away the line is.
    assert!(refused.curve.len() >= 10);
    let relaxed = refusal.relaxations.iter().find(|r| r.metric == Metric::Ler).expect("LER can give way");
    for one in project.sets.iter_mut().filter(|one| one.id == set) {
        one.white = relaxed.white.clone();
    }
    let opened = on_a_job(move |token| trade(&project, set, Metric::R9, Aim::Ler, token)).unwrap();
    assert!(matches!(opened.spec, Spec::Met(_)), "{:?}", opened.spec);
}

#[test]
fn the_best_choice_is_one_of_the_projects_and_makes_a_set_that_undo_removes() {
    let project = cabin();
    let set = project.current().unwrap().id;
    let copy = project.clone();
    let choice = on_a_job(move |token| choose(&copy, set, 5, Aim::Ler, token)).unwrap();
    assert_eq!(choice.candidates + choice.dark.len(), project.emitters.len());
    assert!(choice.refusal.is_none(), "{choice:?}");
    let best = &choice.picks[0];
    assert_eq!(best.rows.len(), 5);
    assert!(choice.picks.iter().skip(1).all(|pick| pick.objective <= best.objective * (1.0 + 1e-3)));
    let mut state = State::new(project, None).unwrap();
    let sets = state.project().sets.len();
    let edit = set_edit(&state, best).unwrap();
    state.apply(edit).unwrap();
    assert_eq!(state.project().sets.len(), sets + 1);
    let made = state.current_set().unwrap();
    assert_eq!(made.members.len(), 5);
    assert!((made.share_sum() - 1.0).abs() < 1e-9);
    assert!(state.undo());
    assert_eq!(state.project().sets.len(), sets);
}

#[test]
fn an_added_emitter_never_makes_the_answer_worse() {
    let project = cabin();
    let set = project.current().unwrap().id;
    let found = on_a_job(move |token| missing(&project, set, Aim::Ler, token)).unwrap();
    assert_eq!(found.map.len(), found.peaks_nm.len() * found.widths_nm.len());
    let without = found.without.expect("the demonstration meets its limits");
    for value in found.map.iter().flatten() {
        assert!(*value >= without * (1.0 - 2e-3), "{value} against {without}");
    }
    let (_, most) = found.span().unwrap();
    let best = &found.proposals[0];
    assert!(best.objective >= most * (1.0 - 1e-3), "{} against {most}", best.objective);
    let (width, peak) = found.cell(best.peak_nm, best.width_nm);
    assert!((found.peaks_nm[peak] - best.peak_nm).abs() <= 3.3);
    assert!(found.cell_words(width, peak).contains("lm/W"), "{}", found.cell_words(width, peak));
}

#[test]
fn prices_read_as_sentences() {
    let ra = Requirement::Low(optimiser::Metric::Ra);
    assert_eq!(price_words(ra, 2.1, [Some(2.1), Some(2.1)], 3000.0), "One more point of Ra costs 2.1 lm/W.");
    assert_eq!(
        price_words(ra, 0.0, [Some(0.0), Some(0.0)], 3000.0),
        "One more point of Ra costs nothing: that limit does not hold the blend."
    );
    assert_eq!(
        price_words(Requirement::Duv, -1.2, [Some(-1.2), Some(-1.2)], 3000.0),
        "A white 0.001 of Duv higher gains 1.2 lm/W."
    );
    assert_eq!(
        price_words(Requirement::Cct, 0.04, [Some(0.04), Some(0.04)], 3000.0),
        "A white 30 K higher costs 0.04 lm/W."
    );
    assert!(price_words(ra, 3.0, [Some(3.0), None], 3000.0).ends_with("The next step leaves no blend."));
}
