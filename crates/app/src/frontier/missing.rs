//! The emitter that is missing: how the answer improves with one more, over its peak and width.

use super::{Aim, Basis, asked, number};
use crate::jobs::Token;
use colour::shapes::Shape;
use optimiser::{Control, Trial};
use project::{Project, SetId};

/// Peaks tried, nm: first, step, number.
const PEAKS_NM: (f64, f64, usize) = (420.0, 6.5, 41);
/// Full widths at half maximum tried, nm.
const WIDTHS_NM: (f64, f64, usize) = (15.0, 6.0, 15);

/// lm/W from which an emitter counts as a help.
const HELPS: f64 = 0.05;

/// One emitter proposed.
#[derive(Debug, Clone, PartialEq)]
pub struct Proposal {
    /// Its peak, nm.
    pub peak_nm: f64,
    /// Its full width at half maximum, nm.
    pub width_nm: f64,
    /// The most lm/W with it.
    pub objective: f64,
    /// Its radiant share in that blend, 0 to 1.
    pub share: f64,
    /// The sentence.
    pub words: String,
}

/// The map and the proposals.
#[derive(Debug, Clone, PartialEq)]
pub struct Missing {
    /// What it holds for.
    pub basis: Basis,
    /// What is made as large as possible.
    pub aim: Aim,
    /// Peaks tried, nm, ascending.
    pub peaks_nm: Vec<f64>,
    /// Full widths at half maximum tried, nm, ascending.
    pub widths_nm: Vec<f64>,
    /// The most lm/W without it; `None` when there is no blend without it.
    pub without: Option<f64>,
    /// The most lm/W with it, width by width, peaks side by side; `None` where no blend meets the limits.
    pub map: Vec<Option<f64>>,
    /// Up to three, best first.
    pub proposals: Vec<Proposal>,
    /// Why nothing was tried.
    pub refusal: Option<String>,
}

fn gaussian(peak_nm: f64, fwhm_nm: f64) -> Vec<f64> {
    // Peaks and widths are above zero; a curve with nothing between 380 and 780 nm is dark and helps nobody.
    Shape::GaussianNm { peak_nm, fwhm_nm }.colour_grid().unwrap_or_else(|_| vec![0.0; colour::GRID_POINTS])
}

fn steps((first, step, count): (f64, f64, usize)) -> Vec<f64> {
    (0..count).map(|k| first + step * k as f64).collect()
}

/// Tries one more emitter, Gaussian over wavelength, for a set; `None` without such a set.
pub fn missing(project: &Project, set: SetId, aim: Aim, token: &Token) -> Option<Missing> {
    let current = project.set(set)?;
    let mut answer = Missing {
        basis: Basis::of_set(project, current),
        aim,
        peaks_nm: steps(PEAKS_NM),
        widths_nm: steps(WIDTHS_NM),
        without: None,
        map: Vec::new(),
        proposals: Vec::new(),
        refusal: None,
    };
    let asked = match asked(project, set, aim) {
        Ok(asked) => asked,
        Err(sentence) => {
            answer.refusal = Some(sentence);
            return Some(answer);
        }
    };
    let plugs = &asked.problem.wall_plug;
    let trial = Trial {
        peaks_nm: answer.peaks_nm.clone(),
        widths_nm: answer.widths_nm.clone(),
        shapes: vec![("gaussian", &gaussian)],
        wall_plug: if plugs.is_empty() { 1.0 } else { plugs.iter().sum::<f64>() / plugs.len() as f64 },
    };
    let cancelled = token.flag();
    let control = Control { progress: &|part| token.progress(f64::from(part)), cancelled: &cancelled };
    let found = match optimiser::missing(&asked.problem, &trial, &control) {
        Ok(found) => found,
        Err(error) => {
            answer.refusal = Some(error.to_string());
            return Some(answer);
        }
    };
    answer.without = found.without.solution().map(|solution| solution.objective);
    answer.map = found.map;
    answer.proposals = found
        .best
        .iter()
        .filter_map(|proposal| {
            let solution = proposal.outcome.solution()?;
            let gain = answer.without.map_or(f64::INFINITY, |without| solution.objective - without);
            if gain < HELPS {
                return None;
            }
            let mut one = Proposal {
                peak_nm: proposal.peak_nm,
                width_nm: proposal.width_nm,
                objective: solution.objective,
                share: solution.shares.last().copied().unwrap_or_default(),
                words: String::new(),
            };
            one.words = answer.proposal_words(&one);
            Some(one)
        })
        .collect();
    Some(answer)
}

impl Missing {
    /// The value at one cell of the map.
    pub fn at(&self, width: usize, peak: usize) -> Option<f64> {
        self.map.get(width * self.peaks_nm.len() + peak).copied().flatten()
    }

    /// Least and greatest value of the map; `None` when no cell has one.
    pub fn span(&self) -> Option<(f64, f64)> {
        self.map.iter().flatten().fold(None, |span: Option<(f64, f64)>, &value| {
            Some(span.map_or((value, value), |(low, high)| (low.min(value), high.max(value))))
        })
    }

    /// The cell nearest a peak and a width.
    pub fn cell(&self, peak_nm: f64, width_nm: f64) -> (usize, usize) {
        let nearest = |values: &[f64], wanted: f64| {
            (0..values.len())
                .min_by(|a, b| (values[*a] - wanted).abs().total_cmp(&(values[*b] - wanted).abs()))
                .unwrap_or(0)
        };
        (nearest(&self.widths_nm, width_nm), nearest(&self.peaks_nm, peak_nm))
    }

    /// One cell in words.
    pub fn cell_words(&self, width: usize, peak: usize) -> String {
        let place = format!(
            "Peak {} nm, {} nm wide",
            number(self.peaks_nm[peak], 1),
            number(self.widths_nm[width], 0)
        );
        match self.at(width, peak) {
            None => format!("{place}: no blend meets the limits"),
            Some(value) => format!("{place}: {}", self.value_words(value)),
        }
    }

    fn value_words(&self, value: f64) -> String {
        let gain = self.without.map(|without| value - without);
        match gain {
            None => format!("{} lm/W, where there is no blend without it", number(value, 1)),
            Some(gain) if gain < HELPS => format!("{} lm/W, no better than without it", number(value, 1)),
            Some(gain) => format!("{} lm/W, {} more than without it", number(value, 1), number(gain, 1)),
        }
    }

    fn proposal_words(&self, one: &Proposal) -> String {
        format!(
            "{} nm, {} nm wide, with {} % of the radiant power: {}",
            number(one.peak_nm, 0),
            number(one.width_nm, 0),
            number(one.share * 100.0, 1),
            self.value_words(one.objective)
        )
    }

    /// The map in words.
    pub fn words(&self) -> String {
        let (Some(first), Some(last)) = (self.peaks_nm.first(), self.peaks_nm.last()) else {
            return String::new();
        };
        let best = self
            .proposals
            .first()
            .map_or_else(|| "none of them helps".to_owned(), |best| format!("best {}", best.words));
        format!(
            "Map of the lm/W with one emitter more, peaks from {} to {} nm and widths from {} to {} nm: {best}.",
            number(*first, 0),
            number(*last, 0),
            number(self.widths_nm.first().copied().unwrap_or_default(), 0),
            number(self.widths_nm.last().copied().unwrap_or_default(), 0),
        )
    }
}
