//! Why there is no blend, and the ways out.

use super::{number, title, whole};
use optimiser::Infeasible;
use project::{EmitterSet, Metric, WhiteSpec};

/// Why no blend meets a white spec.
#[derive(Debug, Clone, PartialEq)]
pub struct Refusal {
    /// The reason in sentences.
    pub words: String,
    /// What the nearest blend is short of, in words; empty when the white itself is out of reach.
    pub short: Vec<String>,
    /// Shares of the whole set that come nearest, where they make a blend.
    pub nearest: Option<Vec<f64>>,
    /// One limit each, relaxed so far that a blend exists.
    pub relaxations: Vec<Relax>,
}

/// One limit moved so far that a blend exists, the others kept.
#[derive(Debug, Clone, PartialEq)]
pub struct Relax {
    /// Which limit.
    pub metric: Metric,
    /// What would do, in words.
    pub words: String,
    /// The spec with that limit moved.
    pub white: WhiteSpec,
}

impl Refusal {
    /// From the optimiser's answer about a set; `members` are the indices of those that took part.
    pub fn of(infeasible: &Infeasible, set: &EmitterSet, members: &[usize]) -> Self {
        let mut words = infeasible.explanation.clone();
        if !infeasible.proven {
            words.push_str(" (None was found; that none exists is not proven.)");
        }
        let relaxations = infeasible
            .relaxations
            .iter()
            .filter_map(|relaxation| {
                let metric = Metric::ALL.into_iter().find(|m| m.key() == relaxation.metric.key())?;
                // Rounded to the side that opens the problem.
                let to = if relaxation.lower_end {
                    (relaxation.to * 10.0).floor() / 10.0
                } else {
                    (relaxation.to * 10.0).ceil() / 10.0
                };
                let mut white = set.white.clone();
                let limit = white.limits.of_mut(metric);
                let end = if relaxation.lower_end { &mut limit.low } else { &mut limit.high };
                *end = Some(to);
                let words = format!("{} {} would open it", title(metric), tenth(to));
                Some(Relax { metric, words, white })
            })
            .collect();
        let short = infeasible
            .nearest
            .shortfalls
            .iter()
            .map(|short| {
                let asked = match (short.by < 0.0, short.range.low, short.range.high) {
                    (true, Some(low), _) => format!("at least {}", tenth(low)),
                    (false, _, Some(high)) => format!("at most {}", tenth(high)),
                    _ => "its range".to_owned(),
                };
                format!("{} {} of {asked}", short.metric.title(), tenth(short.value))
            })
            .collect();
        let shares = whole(set, members, &infeasible.nearest.shares);
        let is_blend = (shares.iter().sum::<f64>() - 1.0).abs() < 1e-6;
        Self { words, short, nearest: is_blend.then_some(shares), relaxations }
    }
}

fn tenth(value: f64) -> String {
    let text = number(value, 1);
    text.strip_suffix(".0").map_or(text.clone(), str::to_owned)
}
