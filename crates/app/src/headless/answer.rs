//! The answer of a solve as the contract words it, shared by every solving command.

use super::Exit;
use super::output::{self, Table, cell};
use crate::solving::{Sources, measure_blend, metric, value_of};
use colour::Measurement;
use optimiser::{Infeasible, Nearest, Outcome, Solution};
use project::{Limit, Metric, WhiteSpec};
use serde::Serialize;
use serde_json::{Map, Value};

/// How far past a limit still counts as met, in points or lm/W: rounding, nothing more.
const MET_TOLERANCE: f64 = 1e-6;

/// What a solve is about: everything needed to word its answer.
#[derive(Debug, Clone, Copy)]
pub(super) struct Asked<'a> {
    pub(super) sources: &'a Sources,
    pub(super) white: &'a WhiteSpec,
    pub(super) wall_plug: &'a [f64],
}

/// One solve. Keys of an infeasible answer are absent from the others; everything else is null where unknown.
#[derive(Debug, Clone, Default, Serialize)]
pub(super) struct AnswerRecord {
    pub(super) status: Option<&'static str>,
    pub(super) shares: Option<Vec<f64>>,
    pub(super) objective: Option<f64>,
    pub(super) upper_bound: Option<f64>,
    pub(super) gap: Option<f64>,
    pub(super) grade: Option<&'static str>,
    pub(super) measured: Option<Measurement>,
    pub(super) limits: Vec<LimitRecord>,
    /// Null inside a list that was solved as one.
    pub(super) seconds: Option<f64>,
    pub(super) boxes: u64,
    pub(super) stopped_by: Option<&'static str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub(super) nearest: Option<NearestRecord>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub(super) reachable: Option<Map<String, Value>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub(super) relaxations: Option<Vec<RelaxationRecord>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub(super) message: Option<String>,
}

/// One limit and how the blend stands to it.
#[derive(Debug, Clone, Serialize)]
pub(super) struct LimitRecord {
    pub(super) name: &'static str,
    pub(super) value: Option<f64>,
    pub(super) low: Option<f64>,
    pub(super) high: Option<f64>,
    pub(super) met: bool,
}

/// The blend that comes nearest to an infeasible question.
#[derive(Debug, Clone, Serialize)]
pub(super) struct NearestRecord {
    pub(super) shares: Vec<f64>,
    pub(super) u: f64,
    pub(super) v: f64,
    pub(super) distance_uv1960: f64,
    pub(super) cct_k: Option<f64>,
    pub(super) duv: Option<f64>,
    pub(super) shortfalls: Vec<ShortfallRecord>,
}

/// A limit the nearest blend misses: `short_by` is the distance to the nearer end, always positive.
#[derive(Debug, Clone, Serialize)]
pub(super) struct ShortfallRecord {
    pub(super) name: &'static str,
    pub(super) value: f64,
    pub(super) low: Option<f64>,
    pub(super) high: Option<f64>,
    pub(super) short_by: f64,
}

/// One limit relaxed so far that a blend exists, the others kept.
#[derive(Debug, Clone, Serialize)]
pub(super) struct RelaxationRecord {
    pub(super) name: &'static str,
    pub(super) end: &'static str,
    pub(super) from: f64,
    pub(super) to: f64,
}

impl Asked<'_> {
    /// How `shares` stand to each limit that was set.
    pub(super) fn limits(&self, measured: &Measurement, shares: &[f64]) -> Vec<LimitRecord> {
        let set = Metric::ALL.into_iter().filter(|m| !self.white.limits.of(*m).is_open());
        set.map(|m| {
            let limit = *self.white.limits.of(m);
            let value = value_of(m, measured, shares, self.wall_plug);
            LimitRecord { name: m.key(), value, low: limit.low, high: limit.high, met: is_met(limit, value) }
        })
        .collect()
    }

    /// The numbers of a blend, with peak and width of its curve.
    pub(super) fn measured(&self, shares: &[f64]) -> Measurement {
        let mut measured = measure_blend(&self.sources.tensors.blend(shares), self.white);
        if let Some(spectrum) = self.sources.blend_spectrum(shares) {
            let features = spectrum.features();
            measured.peak_nm = Some(features.peak_nm);
            measured.fwhm_nm = features.fwhm_nm;
        }
        measured
    }

    /// The answer in the contract's words.
    pub(super) fn record(&self, outcome: &Outcome, seconds: Option<f64>) -> AnswerRecord {
        match outcome {
            Outcome::Optimal(solution) => self.optimal(solution, seconds),
            Outcome::Infeasible(infeasible) => self.infeasible(infeasible, seconds),
        }
    }

    fn optimal(&self, solution: &Solution, seconds: Option<f64>) -> AnswerRecord {
        let measured = self.measured(&solution.shares);
        AnswerRecord {
            status: Some("optimal"),
            objective: Some(solution.objective),
            upper_bound: solution.upper_bound,
            gap: solution.gap,
            grade: Some(solution.grade.key()),
            limits: self.limits(&measured, &solution.shares),
            measured: Some(measured),
            shares: Some(solution.shares.clone()),
            seconds,
            boxes: solution.boxes,
            stopped_by: solution.stopped_by.map(optimiser::Stop::key),
            ..AnswerRecord::default()
        }
    }

    fn infeasible(&self, infeasible: &Infeasible, seconds: Option<f64>) -> AnswerRecord {
        let nearest = &infeasible.nearest;
        let measured = self.measured(&nearest.shares);
        AnswerRecord {
            status: Some("infeasible"),
            limits: self.limits(&measured, &nearest.shares),
            seconds,
            boxes: infeasible.boxes,
            stopped_by: infeasible.stopped_by.map(optimiser::Stop::key),
            nearest: Some(self.nearest(nearest)),
            reachable: Some(
                infeasible
                    .reachable
                    .iter()
                    .map(|r| (r.metric.key().to_owned(), Value::from(r.best)))
                    .collect(),
            ),
            relaxations: Some(
                infeasible
                    .relaxations
                    .iter()
                    .map(|r| RelaxationRecord {
                        name: r.metric.key(),
                        end: if r.lower_end { "low" } else { "high" },
                        from: r.from,
                        to: r.to,
                    })
                    .collect(),
            ),
            message: Some(infeasible.explanation.clone()),
            ..AnswerRecord::default()
        }
    }
}

impl Asked<'_> {
    /// The nearest blend in the contract's words.
    pub(super) fn nearest(&self, nearest: &Nearest) -> NearestRecord {
        let limit_of = |m: optimiser::Metric| {
            let one = Metric::ALL.into_iter().find(|one| metric(*one) == m);
            one.map_or_else(Limit::default, |one| *self.white.limits.of(one))
        };
        NearestRecord {
            shares: nearest.shares.clone(),
            u: nearest.u,
            v: nearest.v,
            distance_uv1960: nearest.distance_uv1960,
            cct_k: nearest.cct_k,
            duv: nearest.duv,
            shortfalls: nearest
                .shortfalls
                .iter()
                .map(|s| ShortfallRecord {
                    name: s.metric.key(),
                    value: s.value,
                    low: limit_of(s.metric).low,
                    high: limit_of(s.metric).high,
                    short_by: s.by.abs(),
                })
                .collect(),
        }
    }
}

fn is_met(limit: Limit, value: Option<f64>) -> bool {
    value.is_some_and(|v| limit.margin(v).is_none_or(|margin| margin >= -MET_TOLERANCE))
}

impl AnswerRecord {
    /// The record of a question that could not be put: every key null, the reason in `message`.
    pub(super) fn unanswered(message: String) -> Self {
        Self { message: Some(message), ..Self::default() }
    }

    /// True when there is a blend.
    pub(super) fn is_optimal(&self) -> bool {
        self.status == Some("optimal")
    }

    /// The exit code the answer leads to.
    pub(super) fn exit(&self) -> Exit {
        if self.is_optimal() { Exit::Done } else { Exit::No }
    }

    /// The proof in a sentence.
    pub(super) fn proof(&self) -> String {
        let stopped = match self.stopped_by {
            Some("boxes") => "; the budget of boxes was used up",
            Some("seconds") => "; stopped by the clock",
            Some(_) => "; stopped early",
            None => "",
        };
        match (self.upper_bound, self.gap) {
            (Some(bound), Some(gap)) => format!(
                "no blend of these emitters at this white within these limits exceeds {bound:.4}; gap {:.3} %; {} boxes; floating-point rounding not covered{stopped}",
                100.0 * gap,
                self.boxes
            ),
            _ => format!("the best blend found; no bound is known{stopped}"),
        }
    }

    /// Prints the answer for people.
    pub(super) fn print(&self, asked: &Asked<'_>) {
        match (self.status, &self.nearest) {
            (Some("optimal"), _) => self.print_blend(asked),
            (_, Some(nearest)) => self.print_infeasible(asked, nearest),
            _ => {}
        }
    }

    fn print_blend(&self, asked: &Asked<'_>) {
        let what = match asked.white.maximise {
            project::Maximise::Ler => "lm per optical W",
            project::Maximise::Efficacy => "lm per electrical W",
            project::Maximise::Ra => "Ra",
            project::Maximise::Rf => "Rf",
        };
        output::text(&format!("{} {what}, {}", cell(self.objective, 3), self.grade.unwrap_or("–")));
        output::text(&format!("  {}", self.proof()));
        if let Some(shares) = &self.shares {
            output::text(&share_table(&asked.sources.names, shares).to_string());
        }
        if let Some(m) = &self.measured {
            let mut table =
                Table::new(&["white", "CCT K", "Duv", "u′", "v′", "lm/W", "Ra", "R9", "Rf", "Rg"]);
            table.row([
                "blend".to_owned(),
                cell(m.cct_k, 1),
                cell(m.duv, 5),
                cell(Some(m.u_prime), 4),
                cell(Some(m.v_prime), 4),
                cell(Some(m.ler_lm_per_w), 2),
                cell(m.ra, 2),
                cell(m.r9(), 2),
                cell(m.rf, 2),
                cell(m.rg, 2),
            ]);
            output::text(&table.to_string());
        }
        self.print_limits();
    }

    fn print_limits(&self) {
        if self.limits.is_empty() {
            return;
        }
        let mut table = Table::new(&["limit", "value", "least", "most", ""]);
        for l in &self.limits {
            let met = if l.met { "met" } else { "short" };
            table.row([l.name.to_owned(), cell(l.value, 3), cell(l.low, 3), cell(l.high, 3), met.to_owned()]);
        }
        output::text(&table.to_string());
    }

    fn print_infeasible(&self, asked: &Asked<'_>, nearest: &NearestRecord) {
        output::text(&format!("no blend: {}", self.message.as_deref().unwrap_or("the limits cannot be met")));
        output::text(&format!(
            "nearest blend: {} K, Duv {}, {:.5} (u, v) from the target",
            cell(nearest.cct_k, 0),
            cell(nearest.duv, 4),
            nearest.distance_uv1960
        ));
        output::text(&share_table(&asked.sources.names, &nearest.shares).to_string());
        self.print_limits();
        for (name, best) in self.reachable.iter().flatten() {
            output::text(&format!("  {name} alone reaches {}", cell(best.as_f64(), 3)));
        }
        for relaxed in self.relaxations.iter().flatten() {
            output::text(&format!(
                "  a blend exists with {} {} {:.3} instead of {}",
                relaxed.name,
                if relaxed.end == "low" { "at least" } else { "at most" },
                relaxed.to,
                relaxed.from
            ));
        }
    }
}

/// Shares by name, with their kind.
pub(super) fn share_table(names: &[String], shares: &[f64]) -> Table {
    let mut table = Table::new(&["emitter", "radiant share %"]);
    for (name, share) in names.iter().zip(shares) {
        table.row([name.clone(), cell(Some(100.0 * share), 3)]);
    }
    table
}
