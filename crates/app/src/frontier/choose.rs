//! The best few of all emitters of a project.

use super::{Aim, BOXES_A_POINT, Basis, number};
use crate::jobs::Token;
use crate::solving::{Sources, problem};
use crate::state::{Edit, State};
use optimiser::{Control, Grade, Outcome};
use project::{EmitterId, EmitterSet, Member, Project, SetId};

/// Choices that are kept, the best included.
const KEPT: usize = 24;

/// One emitter of a choice.
#[derive(Debug, Clone, PartialEq)]
pub struct PickRow {
    /// Which emitter.
    pub emitter: EmitterId,
    /// Its name.
    pub name: String,
    /// Its radiant share, 0 to 1.
    pub share: f64,
}

/// A choice of emitters with its best blend.
#[derive(Debug, Clone, PartialEq)]
pub struct Pick {
    /// The emitters, in the project's order.
    pub rows: Vec<PickRow>,
    /// The most lm/W they give within the limits.
    pub objective: f64,
}

/// The answer to: which so many emitters?
#[derive(Debug, Clone, PartialEq)]
pub struct Choice {
    /// What it holds for.
    pub basis: Basis,
    /// Emitters wanted.
    pub count: usize,
    /// What is made as large as possible.
    pub aim: Aim,
    /// Emitters to choose from.
    pub candidates: usize,
    /// Names of emitters left out because they have no light.
    pub dark: Vec<String>,
    /// Choices in all, choices that reach the white, choices looked at one by one.
    pub looked_at: [u64; 3],
    /// The best first.
    pub picks: Vec<Pick>,
    /// No choice gives more than this.
    pub bound: Option<f64>,
    /// What the first pick is worth; `None` without one.
    pub grade: Option<Grade>,
    /// Why there is no choice.
    pub refusal: Option<String>,
}

/// Chooses the best `count` of all emitters of the project at the white of a set, within its limits; `None` without
/// such a set.
pub fn choose(project: &Project, set: SetId, count: usize, aim: Aim, token: &Token) -> Option<Choice> {
    let current = project.set(set)?;
    let mut choice = Choice {
        basis: Basis::of_project(project, current),
        count,
        aim,
        candidates: 0,
        dark: Vec::new(),
        looked_at: [0; 3],
        picks: Vec::new(),
        bound: None,
        grade: None,
        refusal: None,
    };
    let mut ids = Vec::new();
    let mut spectra = Vec::new();
    let mut wall_plug = Vec::new();
    for emitter in &project.emitters {
        let Some(spectrum) = emitter.spectrum().ok().filter(|s| colour::Tensor::of(s).is_light()) else {
            choice.dark.push(emitter.name.clone());
            continue;
        };
        ids.push(emitter.id);
        wall_plug.extend(emitter.wall_plug);
        spectra.push((emitter.name.as_str(), spectrum));
    }
    choice.candidates = ids.len();
    if wall_plug.len() != ids.len() {
        wall_plug.clear();
    }
    let mut white = current.white.clone();
    white.maximise = aim.maximise();
    let asked = Sources::new(spectra.iter().map(|(name, spectrum)| (*name, spectrum)))
        .and_then(|sources| Ok((problem(&sources, &white, &wall_plug)?, sources)));
    let (mut problem, sources) = match asked {
        Ok(asked) => asked,
        Err(error) => {
            choice.refusal = Some(error.to_string());
            return Some(choice);
        }
    };
    problem.budget.boxes = 4 * BOXES_A_POINT;
    let cancelled = token.flag();
    let control = Control { progress: &|part| token.progress(f64::from(part)), cancelled: &cancelled };
    let found = match optimiser::choose(&problem, count, &control) {
        Ok(found) => found,
        Err(error) => {
            choice.refusal = Some(error.to_string());
            return Some(choice);
        }
    };
    choice.looked_at = [found.subsets, found.reach_white, found.examined];
    let pick = |emitters: &[usize], shares: &[f64], objective: f64| Pick {
        rows: emitters
            .iter()
            .map(|&i| PickRow { emitter: ids[i], name: sources.names[i].clone(), share: shares[i] })
            .collect(),
        objective,
    };
    match &found.outcome {
        Outcome::Optimal(best) => {
            choice.picks.push(pick(&found.chosen, &best.shares, best.objective));
            choice.bound = best.upper_bound;
            choice.grade = Some(best.grade);
        }
        Outcome::Infeasible(infeasible) => choice.refusal = Some(infeasible.explanation.clone()),
    }
    for other in &found.runners_up {
        if choice.picks.len() < KEPT && other.emitters != found.chosen {
            choice.picks.push(pick(&other.emitters, &other.shares, other.objective));
        }
    }
    Some(choice)
}

impl Choice {
    /// What the answer is worth, and how it was found, in sentences.
    pub fn words(&self) -> String {
        let [all, reach, examined] = self.looked_at;
        let how = format!(
            "{all} choices of {} out of {}; {reach} reach the white, {examined} had to be looked at one by one.",
            self.count, self.candidates
        );
        let worth = match (&self.refusal, self.grade, self.bound, self.picks.first()) {
            (Some(why), ..) => format!("No choice of {} meets the limits. {why}", self.count),
            (None, Some(Grade::Proven), Some(bound), _) => {
                format!("Proven best: no choice of {} gives more than {} lm/W.", self.count, number(bound, 1))
            }
            (None, Some(_), Some(bound), Some(best)) => format!(
                "{} lm/W found; no choice of {} can beat {} lm/W.",
                number(best.objective, 1),
                self.count,
                number(bound, 1)
            ),
            _ => "Best found; no bound is known.".to_owned(),
        };
        if all == 0 { worth } else { format!("{worth} {how}") }
    }
}

/// The edit that makes a set of a choice, with the white of the current set, and puts it on the benches; `None`
/// without a current set or when the shares make no blend.
pub fn set_edit(state: &State, pick: &Pick) -> Option<Edit> {
    let current = state.current_set()?;
    let sum: f64 = pick.rows.iter().map(|row| row.share).sum();
    if !(sum > 0.0 && sum.is_finite()) {
        return None;
    }
    let members = pick.rows.iter().map(|row| Member {
        emitter: row.emitter,
        share: row.share.max(0.0) / sum,
        locked: false,
        on: true,
        least: 0.0,
        most: 1.0,
    });
    let taken = |name: &str| state.project().sets.iter().any(|set| set.name == name);
    let wanted = format!("Best {} for {}", pick.rows.len(), current.name);
    let name = std::iter::once(wanted.clone())
        .chain((2..100).map(|k| format!("{wanted} {k}")))
        .find(|name| !taken(name))?;
    let id = SetId(state.unused_id());
    let set = EmitterSet {
        id,
        name,
        note: String::new(),
        members: members.collect(),
        white: current.white.clone(),
        recipes: Vec::new(),
    };
    Some(Edit::Together {
        label: format!("make a set of {} emitters", pick.rows.len()),
        edits: vec![Edit::InsertSet { at: usize::MAX, set: Box::new(set) }, Edit::SelectSet(Some(id))],
    })
}
