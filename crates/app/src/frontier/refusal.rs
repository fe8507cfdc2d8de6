//! Why there is no blend, and the ways out.

use super::{number, title, whole};
use optimiser::Infeasible;
use project::{EmitterSet, Metric, WhiteSpec};

/// Why no blend meets a white spec.
#[derive(Debug, Clone, PartialEq)]
pub struct Refusal {
    /// The reason in sentences.
    pub words: String,
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
        let mut words = true_minus(&infeasible.explanation);
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
        let shares = whole(set, members, &infeasible.nearest.shares);
        let is_blend = (shares.iter().sum::<f64>() - 1.0).abs() < 1e-6;
        Self { words, nearest: is_blend.then_some(shares), relaxations }
    }
}

fn tenth(value: f64) -> String {
    let text = number(value, 1);
    text.strip_suffix(".0").map_or(text.clone(), str::to_owned)
}

/// Typewriter minus signs before figures as true ones.
fn true_minus(words: &str) -> String {
    let mut out = String::with_capacity(words.len());
    let mut rest = words.chars().peekable();
    let mut before = ' ';
    while let Some(c) = rest.next() {
        let is_sign = c == '-' && before == ' ' && rest.peek().is_some_and(char::is_ascii_digit);
        out.push(if is_sign { '\u{2212}' } else { c });
        before = c;
    }
    out
}

#[cfg(test)]
mod tests {
    use super::true_minus;

    #[test]
    fn signs_become_true_minus_signs_and_hyphens_stay() {
        assert_eq!(true_minus("R9 -94.35 of a well-known 1-2"), "R9 \u{2212}94.35 of a well-known 1-2");
    }
}
