//! Solving as a job, and its answer in words.

use super::view::{Proof, WayOut};
use crate::frontier::Refusal;
use crate::jobs::Token;
use crate::solving::{SetProblem, set_problem};
use crate::state::Edit;
use optimiser::{Binding, Control, Grade, Infeasible, Metric, Outcome, Solution};
use project::{CorrectionStep, EmitterId, EmitterSet, Maximise, Project, SetId, WhiteSpec};

/// A solved set.
#[derive(Debug)]
pub(super) struct Solved {
    pub(super) set: SetId,
    /// What the answer holds for.
    pub(super) question: Question,
    pub(super) outcome: Result<Outcome, String>,
    /// The members of the set that took part.
    members: Vec<usize>,
    names: Vec<String>,
}

/// What an answer depends on besides the shares that solving sets.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Question {
    white: WhiteSpec,
    rows: Vec<Row>,
}

/// What of one member an answer depends on.
#[derive(Debug, Clone, PartialEq)]
struct Row {
    emitter: EmitterId,
    on: bool,
    /// The share, when it is locked.
    locked: Option<f64>,
    bounds: [f64; 2],
    wall_plug: Option<f64>,
    /// What shapes its light.
    corrections: Vec<CorrectionStep>,
}

impl Question {
    pub(super) fn of(project: &Project, set: &EmitterSet) -> Self {
        // The wanted lumens scale the watts and leave the blend alone.
        let white = WhiteSpec { lumens: None, luminance_cd_per_m2: None, ..set.white.clone() };
        Self {
            white,
            rows: set
                .members
                .iter()
                .map(|member| {
                    let emitter = project.emitter(member.emitter);
                    Row {
                        emitter: member.emitter,
                        on: member.on,
                        locked: (member.locked && member.on).then_some(member.share),
                        bounds: [member.least, member.most],
                        wall_plug: emitter.and_then(|e| e.wall_plug),
                        corrections: emitter.map_or_else(Vec::new, |e| e.corrections.clone()),
                    }
                })
                .collect(),
        }
    }
}

/// Solves a set of a project; runs on a job's thread.
pub(super) fn solve(project: &Project, set: SetId, token: &Token) -> Option<Solved> {
    let current = project.set(set)?;
    let question = Question::of(project, current);
    let failed = |message: String| Solved {
        set,
        question: question.clone(),
        outcome: Err(message),
        members: Vec::new(),
        names: Vec::new(),
    };
    let SetProblem { problem, members, sources } = match set_problem(project, set) {
        Ok(problem) => problem,
        Err(error) => return Some(failed(error.to_string())),
    };
    let cancelled = token.flag();
    let control = Control { progress: &|part| token.progress(f64::from(part)), cancelled: &cancelled };
    Some(match optimiser::solve(&problem, &control) {
        Ok(outcome) => Solved { set, question, outcome: Ok(outcome), members, names: sources.names },
        Err(error) => failed(error.to_string()),
    })
}

impl Solved {
    /// Shares of the whole set from shares of the members that took part.
    fn whole(&self, set: &EmitterSet, shares: &[f64]) -> Vec<f64> {
        let mut whole = vec![0.0; set.members.len()];
        for (member, share) in self.members.iter().zip(shares) {
            whole[*member] = *share;
        }
        // A locked share is left exactly as it is kept.
        for (share, member) in whole.iter_mut().zip(&set.members) {
            if member.locked && member.on {
                *share = member.share;
            }
        }
        whole
    }

    /// The edit that gives the set the blend found.
    pub(super) fn edit(&self, set: &EmitterSet) -> Option<Edit> {
        let solution = self.outcome.as_ref().ok()?.solution()?;
        Some(Edit::Shares { set: set.id, shares: self.whole(set, &solution.shares) })
    }

    /// The answer as the ledger's last line.
    pub(super) fn proof(&self, set: &EmitterSet) -> Proof {
        match &self.outcome {
            Err(message) => Proof { words: message.clone(), ways_out: Vec::new(), met: false },
            Ok(Outcome::Optimal(solution)) => {
                Proof { words: self.solution(solution, set.white.maximise), ways_out: Vec::new(), met: true }
            }
            Ok(Outcome::Infeasible(infeasible)) => self.refusal(infeasible, set),
        }
    }

    fn solution(&self, solution: &Solution, maximise: Maximise) -> String {
        let amount = |value: f64| amount(maximise, value);
        let mut words = match (solution.grade, solution.upper_bound, solution.gap) {
            (Grade::Proven, Some(bound), Some(gap)) if gap <= 1e-9 => {
                format!(
                    "Proven best: {} is the most this set gives at this white within these limits.",
                    amount(bound)
                )
            }
            (Grade::Proven, Some(bound), Some(gap)) => format!(
                "Proven best: no blend of this set gives more than {} at this white within these limits (gap {:.3} %).",
                amount(bound),
                gap * 100.0
            ),
            (_, Some(bound), Some(gap)) => format!(
                "{} found; no blend can beat {} (gap {:.2} %).",
                amount(solution.objective),
                amount(bound),
                gap * 100.0
            ),
            _ => format!("Best found: {}. No bound is known.", amount(solution.objective)),
        };
        let held: Vec<String> = solution.held_by.iter().filter_map(|binding| self.binding(binding)).collect();
        if !held.is_empty() {
            words.push_str(&format!(" Held by {}.", listed(&held)));
        }
        words
    }

    fn binding(&self, binding: &Binding) -> Option<String> {
        let name = |k: &usize| self.names.get(*k).cloned();
        match binding {
            Binding::Limit(metric) => Some(title(*metric).to_owned()),
            Binding::Low(k) => Some(format!("{} at its least", name(k)?)),
            Binding::High(k) => Some(format!("{} at its most", name(k)?)),
            Binding::Region => Some("the edge of the white allowed".to_owned()),
            Binding::Row(_) => None,
        }
    }

    fn refusal(&self, infeasible: &Infeasible, set: &EmitterSet) -> Proof {
        let refusal = Refusal::of(infeasible, set, &self.members);
        Proof { ways_out: ways_out(&refusal, set.id), words: refusal.words, met: false }
    }
}

/// What a refusal offers: one limit relaxed, or the nearest blend.
pub(super) fn ways_out(refusal: &Refusal, set: SetId) -> Vec<WayOut> {
    let mut ways: Vec<WayOut> = refusal
        .relaxations
        .iter()
        .map(|relax| WayOut {
            words: relax.words.clone(),
            edit: Edit::White { set, white: Box::new(relax.white.clone()) },
            limit: Some(relax.metric),
            solve: true,
        })
        .collect();
    ways.extend(refusal.nearest.clone().map(|shares| WayOut {
        words: "Take the nearest blend".to_owned(),
        edit: Edit::Shares { set, shares },
        limit: None,
        solve: false,
    }));
    ways
}

fn amount(maximise: Maximise, value: f64) -> String {
    match maximise {
        Maximise::Ler => format!("{value:.1} lm per optical watt"),
        Maximise::Efficacy => format!("{value:.1} lm/W"),
        Maximise::Ra => format!("Ra {value:.1}"),
        Maximise::Rf => format!("Rf {value:.1}"),
    }
}

fn title(metric: Metric) -> &'static str {
    if metric == Metric::Efficacy { "device lm/W" } else { metric.title() }
}

fn listed(names: &[String]) -> String {
    match names {
        [] => String::new(),
        [one] => one.clone(),
        [rest @ .., last] => format!("{} and {last}", rest.join(", ")),
    }
}
