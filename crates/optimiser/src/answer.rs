//! What is answered: the blend with what it is worth, or why there is none.

use crate::problem::{Metric, Range};

/// What an answer is worth.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Grade {
    /// No blend beats it by more than 0.1 %.
    Proven,
    /// A bound is known, further away than 0.1 %.
    Bounded,
    /// The best of the searches; no bound is known.
    BestFound,
}

/// Relative gap up to which an answer counts as proven.
pub const PROVEN_GAP: f64 = 1e-3;

impl Grade {
    /// The grade that goes with a gap.
    #[must_use]
    pub fn of(gap: Option<f64>) -> Grade {
        match gap {
            Some(g) if g <= PROVEN_GAP => Grade::Proven,
            Some(_) => Grade::Bounded,
            None => Grade::BestFound,
        }
    }

    /// The word used in printed answers.
    #[must_use]
    pub fn key(self) -> &'static str {
        match self {
            Grade::Proven => "proven",
            Grade::Bounded => "bounded",
            Grade::BestFound => "best-found",
        }
    }
}

/// Why the proof ended before its goal.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Stop {
    /// The number of boxes allowed was used up.
    Boxes,
    /// The safety stop in seconds.
    Seconds,
    /// Cancelled from outside.
    Cancelled,
}

impl Stop {
    /// The word used in printed answers.
    #[must_use]
    pub fn key(self) -> &'static str {
        match self {
            Stop::Boxes => "boxes",
            Stop::Seconds => "seconds",
            Stop::Cancelled => "cancelled",
        }
    }
}

/// The numbers of a blend that limits and objectives speak of.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Values {
    /// CIE 13.3 general index.
    pub ra: f64,
    /// CIE 13.3 special index 9.
    pub r9: f64,
    /// CIE 224 / TM-30 fidelity.
    pub rf: f64,
    /// TM-30 gamut index (NaN when a hue bin of the reference is empty).
    pub rg: f64,
    /// Luminous efficacy of radiation, lm/W.
    pub ler: f64,
    /// Lumens per electrical watt (0 without wall-plug efficiencies).
    pub efficacy: f64,
}

impl Values {
    /// One of them.
    #[must_use]
    pub fn get(&self, metric: Metric) -> f64 {
        match metric {
            Metric::Ra => self.ra,
            Metric::R9 => self.r9,
            Metric::Rf => self.rf,
            Metric::Rg => self.rg,
            Metric::Ler => self.ler,
            Metric::Efficacy => self.efficacy,
        }
    }
}

/// Something that holds the optimum back.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Binding {
    /// A limit met with no margin.
    Limit(Metric),
    /// An emitter at the low end of its bounds.
    Low(usize),
    /// An emitter at the high end of its bounds.
    High(usize),
    /// The edge of the white region.
    Region,
    /// One of the caller's linear rows.
    Row(usize),
}

/// A blend that meets the limits.
#[derive(Clone, Debug, PartialEq)]
pub struct Solution {
    /// Radiant shares, one an emitter, sum 1.
    pub shares: Vec<f64>,
    /// Value of what is maximised.
    pub objective: f64,
    /// No blend of these emitters in this white region within these limits exceeds this.
    pub upper_bound: Option<f64>,
    /// (upper bound − objective) / |objective|.
    pub gap: Option<f64>,
    /// What the answer is worth.
    pub grade: Grade,
    /// The blend's numbers, against the reference the limits were judged by.
    pub values: Values,
    /// CCT whose reference the rendering values use.
    pub reference_cct_k: f64,
    /// What holds the optimum.
    pub held_by: Vec<Binding>,
    /// Boxes examined for the proof.
    pub boxes: u64,
    /// Why the proof ended early, if it did.
    pub stopped_by: Option<Stop>,
}

/// A limit that is not met.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Shortfall {
    /// The metric.
    pub metric: Metric,
    /// What the nearest blend reaches.
    pub value: f64,
    /// The range asked.
    pub range: Range,
    /// How far the value lies outside; negative below, positive above.
    pub by: f64,
}

/// The blend that comes nearest.
#[derive(Clone, Debug, PartialEq)]
pub struct Nearest {
    /// Radiant shares, sum 1.
    pub shares: Vec<f64>,
    /// CIE 1960 u.
    pub u: f64,
    /// CIE 1960 v.
    pub v: f64,
    /// Distance from the target (or its region) in CIE 1960 uv; 0 when the white is reachable.
    pub distance_uv1960: f64,
    /// CCT of the nearest white, where defined.
    pub cct_k: Option<f64>,
    /// Duv of the nearest white, where defined.
    pub duv: Option<f64>,
    /// What it is short of.
    pub shortfalls: Vec<Shortfall>,
    /// Its numbers (None outside the gamut).
    pub values: Option<Values>,
}

/// The best one limited metric can reach at this white when nothing else is asked.
#[derive(Clone, Debug, PartialEq)]
pub struct Reachable {
    /// The metric.
    pub metric: Metric,
    /// The best value found; the greatest, or the least where the upper limit is in the way.
    pub best: f64,
    /// True when `best` is the least value.
    pub least: bool,
    /// No blend goes beyond this, where known.
    pub bound: Option<f64>,
    /// The blend that reaches it.
    pub shares: Vec<f64>,
}

/// One limit relaxed so far that a blend exists, the others kept.
#[derive(Clone, Debug, PartialEq)]
pub struct Relaxation {
    /// Which limit.
    pub metric: Metric,
    /// True when its lower end is moved, false for the upper end.
    pub lower_end: bool,
    /// The value asked.
    pub from: f64,
    /// The value that opens the problem.
    pub to: f64,
    /// A blend that exists then.
    pub shares: Vec<f64>,
}

/// Why no blend meets the question, and what comes nearest.
#[derive(Clone, Debug, PartialEq)]
pub struct Infeasible {
    /// The nearest blend.
    pub nearest: Nearest,
    /// One entry a limited metric; empty when the white itself is out of reach.
    pub reachable: Vec<Reachable>,
    /// Which single limit, moved by how much, opens the problem.
    pub relaxations: Vec<Relaxation>,
    /// The reason in a sentence.
    pub explanation: String,
    /// True when it is proven that no blend exists; false when the searches found none.
    pub proven: bool,
    /// Boxes examined.
    pub boxes: u64,
    /// Why the proof ended early, if it did.
    pub stopped_by: Option<Stop>,
}

/// The answer.
#[derive(Clone, Debug, PartialEq)]
pub enum Outcome {
    /// A blend that meets everything, with its bound.
    Optimal(Solution),
    /// No blend does.
    Infeasible(Infeasible),
}

impl Outcome {
    /// The solution, if there is one.
    #[must_use]
    pub fn solution(&self) -> Option<&Solution> {
        match self {
            Outcome::Optimal(s) => Some(s),
            Outcome::Infeasible(_) => None,
        }
    }
}
