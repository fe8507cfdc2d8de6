//! Whole numbers of packages.
//!
//! Every vector of counts up to the total is looked at: the chromaticity decides first (a few sums), then the objective, and only vectors that could
//! win are measured in full. Ties go to the fewest packages.

use crate::answer::{Nearest, Values};
use crate::fixed::{shortfalls, values_of};
use crate::infeasible::outside;
use crate::problem::{Control, Metric, Problem, ProblemError, Region, Target};
use crate::region::pieces;
use crate::tcs::xyz2;
use colour::locus::cct_duv;
use colour::{Reference, Uv};
use rayon::prelude::*;

/// Vectors looked at exhaustively at most; beyond, the answer would take minutes.
pub const MOST_VECTORS: u64 = 400_000_000;

/// Whole counts that meet the limits.
#[derive(Clone, Debug, PartialEq)]
pub struct PackageChoice {
    /// Packages of each emitter.
    pub counts: Vec<u32>,
    /// Radiant shares they give.
    pub shares: Vec<f64>,
    /// Value of what is maximised.
    pub objective: f64,
    /// Its numbers.
    pub values: Values,
    /// CCT of its reference.
    pub reference_cct_k: f64,
}

/// The answer about whole packages. Exhaustive: the best is proven.
#[derive(Clone, Debug, PartialEq)]
pub struct PackageAnswer {
    /// The best counts first, then runners-up with other shares.
    pub ranked: Vec<PackageChoice>,
    /// The blend nearest to the white region when there is none (by chromaticity), with its counts.
    pub nearest: Option<(Vec<u32>, Nearest)>,
    /// Vectors of counts looked at.
    pub vectors: u64,
    /// Of these, inside the white region.
    pub inside: u64,
}

/// Why packages cannot be counted.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum PackageError {
    /// The question itself.
    #[error(transparent)]
    Problem(#[from] ProblemError),
    /// Wrong number of package powers, or one not positive.
    #[error("expected one positive optical power in W for each of {expected} emitters, found {found}")]
    Watts {
        /// Emitters.
        expected: usize,
        /// Entries.
        found: usize,
    },
    /// Too many vectors.
    #[error(
        "{vectors} combinations of packages are too many to look at (at most {MOST_VECTORS}): lower the total or leave emitters out"
    )]
    TooMany {
        /// Combinations.
        vectors: u64,
    },
}

fn combinations(total: u64, kinds: u64) -> u64 {
    // C(total + kinds, kinds)
    let mut c = 1u128;
    for k in 1..=kinds {
        c = c * u128::from(total + k) / u128::from(k);
        if c > u128::from(u64::MAX) {
            return u64::MAX;
        }
    }
    c as u64
}

struct Counting<'a> {
    problem: &'a Problem,
    watts: &'a [f64],
    xyz: Vec<[f64; 3]>,
    cost: Vec<f64>,
    keep: usize,
    /// A frame round the region in uv, and its middle.
    frame: [[f64; 2]; 2],
    centre: Uv,
}

/// What a branch of the enumeration saw.
#[derive(Default)]
struct Seen {
    candidates: Vec<Candidate>,
    vectors: u64,
    inside: u64,
    /// The counts outside the region that come nearest to its centre.
    nearest: Option<(f64, Vec<u32>)>,
}

struct Candidate {
    score: f64,
    total: u32,
    counts: Vec<u32>,
}

/// A white inside the region, with the CCT its reference has.
fn admitted(problem: &Problem, uv: Uv) -> Option<f64> {
    let Target { cct_k, duv } = problem.target;
    match &problem.region {
        Region::Point => {
            let c = cct_duv(uv)?;
            ((c.cct_k - cct_k).abs() <= 1e-6 * cct_k && (c.duv - duv).abs() <= 1e-9).then_some(c.cct_k)
        }
        Region::Box { cct_k: k, duv: d } => {
            let c = cct_duv(uv)?;
            ((c.cct_k - cct_k).abs() <= *k && (c.duv - duv).abs() <= *d).then_some(c.cct_k)
        }
        Region::Polygon(corners) => {
            let poly: Vec<[f64; 2]> = corners.iter().map(|c| [c.u, c.v / 1.5]).collect();
            if !crate::gamut::inside(&poly, [uv.u, uv.v]) {
                return None;
            }
            cct_duv(uv).map(|c| c.cct_k)
        }
    }
}

impl Counting<'_> {
    /// Every count of the emitters from the next on, `left` packages to go; `sums` are X, Y, Z, optical and electrical W.
    fn walk(&self, left: u32, counts: &mut Vec<u32>, sums: [f64; 5], seen: &mut Seen) {
        let at = counts.len();
        if at == self.watts.len() {
            let (x, y, z, p, e) = (sums[0], sums[1], sums[2], sums[3], sums[4]);
            if p <= 0.0 || y <= 0.0 {
                return;
            }
            seen.vectors += 1;
            let den = x + 15.0 * y + 3.0 * z;
            let uv = Uv { u: 4.0 * x / den, v: 6.0 * y / den };
            if self.problem.bounds.iter().enumerate().any(|(i, (lo, hi))| {
                let s = f64::from(counts[i]) * self.watts[i] / p;
                s < lo - 1e-9 || s > hi + 1e-9
            }) {
                return;
            }
            let in_frame = uv.u >= self.frame[0][0]
                && uv.u <= self.frame[1][0]
                && uv.v >= self.frame[0][1]
                && uv.v <= self.frame[1][1];
            let admitted = in_frame && admitted(self.problem, uv).is_some();
            if !admitted {
                let far = uv.distance(self.centre);
                if seen.nearest.as_ref().is_none_or(|n| far < n.0) {
                    seen.nearest = Some((far, counts.clone()));
                }
                return;
            }
            seen.inside += 1;
            let lumens = colour::PHOTOPIC_EFFICACY_LM_PER_W * y;
            let score = match self.problem.maximise.metric() {
                Metric::Ler => lumens / p,
                Metric::Efficacy => lumens / e,
                // rendering is measured later
                _ => f64::INFINITY,
            };
            seen.candidates.push(Candidate { score, total: counts.iter().sum(), counts: counts.clone() });
            return;
        }
        for c in 0..=left {
            let w = f64::from(c) * self.watts[at];
            let x = self.xyz[at];
            counts.push(c);
            let more = [
                sums[0] + w * x[0],
                sums[1] + w * x[1],
                sums[2] + w * x[2],
                sums[3] + w,
                sums[4] + w * self.cost[at],
            ];
            self.walk(left - c, counts, more, seen);
            counts.pop();
        }
    }

    fn measure(&self, c: &Candidate) -> Option<PackageChoice> {
        let watts: Vec<f64> = c.counts.iter().zip(self.watts).map(|(&c, w)| f64::from(c) * w).collect();
        let sum: f64 = watts.iter().sum();
        let shares: Vec<f64> = watts.iter().map(|w| w / sum).collect();
        let uv = self.problem.emitters.blend(&shares).xyz(colour::Observer::Cie1931).uv();
        let cct_k = admitted(self.problem, uv)?;
        let cct_k =
            if matches!(self.problem.region, Region::Point) { self.problem.target.cct_k } else { cct_k };
        let reference = Reference::at(cct_k);
        let values = values_of(self.problem, &shares, &reference);
        if !shortfalls(self.problem, &values, 0.0).is_empty() {
            return None;
        }
        let lumens_per_w = values.ler;
        if self.problem.rows.iter().any(|r| {
            r.coefficients.iter().zip(&shares).map(|(c, s)| c * s).sum::<f64>() / lumens_per_w
                > r.at_most * (1.0 + 1e-12)
        }) {
            return None;
        }
        let objective = values.get(self.problem.maximise.metric());
        Some(PackageChoice { counts: c.counts.clone(), shares, objective, values, reference_cct_k: cct_k })
    }
}

/// The best whole numbers of packages, each emitter's package giving `watts_each` of optical power, `at_most` packages in all.
///
/// The answer holds up to `keep` choices, best first (equal objectives: fewest packages first).
///
/// # Errors
/// [`PackageError`]: the question, the powers, or too many combinations.
pub fn packages(
    problem: &Problem,
    watts_each: &[f64],
    at_most: u32,
    keep: usize,
    control: &Control<'_>,
) -> Result<PackageAnswer, PackageError> {
    problem.check()?;
    let n = problem.emitters.len();
    if watts_each.len() != n || watts_each.iter().any(|w| !(w.is_finite() && *w > 0.0)) {
        return Err(PackageError::Watts { expected: n, found: watts_each.len() });
    }
    let vectors = combinations(u64::from(at_most), n as u64);
    if vectors > MOST_VECTORS {
        return Err(PackageError::TooMany { vectors });
    }
    let xyz: Vec<[f64; 3]> = (0..n).map(|i| xyz2(&problem.emitters.tensor(i))).collect();
    let outline: Vec<[f64; 2]> = match problem.region {
        Region::Point => {
            let p = colour::locus::uv_at(problem.target.cct_k, problem.target.duv);
            vec![[p.u, p.v]]
        }
        _ => pieces(problem).iter().flat_map(crate::region::Piece::outline).collect(),
    };
    let mut frame = [[f64::INFINITY; 2], [f64::NEG_INFINITY; 2]];
    let mut centre = [0.0; 2];
    for p in &outline {
        for k in 0..2 {
            frame[0][k] = frame[0][k].min(p[k] - 1e-4);
            frame[1][k] = frame[1][k].max(p[k] + 1e-4);
            centre[k] += p[k] / outline.len() as f64;
        }
    }
    let centre = Uv { u: centre[0], v: centre[1] };
    let counting = Counting {
        problem,
        watts: watts_each,
        xyz,
        cost: (0..n).map(|i| problem.wall_plug.get(i).map_or(1.0, |w| 1.0 / w)).collect(),
        keep: keep.max(1),
        frame,
        centre,
    };
    // one branch a count of the first emitter
    let parts: Vec<Seen> = (0..=at_most)
        .into_par_iter()
        .map(|c| {
            let mut seen = Seen::default();
            if !control.stop() {
                let w = f64::from(c) * watts_each[0];
                let x = counting.xyz[0];
                let sums = [w * x[0], w * x[1], w * x[2], w, w * counting.cost[0]];
                counting.walk(at_most - c, &mut vec![c], sums, &mut seen);
            }
            seen
        })
        .collect();
    let (mut all, mut vectors, mut inside) = (Vec::new(), 0, 0);
    let mut near: Option<(f64, Vec<u32>)> = None;
    for seen in parts {
        all.extend(seen.candidates);
        vectors += seen.vectors;
        inside += seen.inside;
        if let Some(n) = seen.nearest
            && near.as_ref().is_none_or(|b| n.0 < b.0)
        {
            near = Some(n);
        }
    }
    all.sort_by(|a, b| {
        // equal blends have equal scores only to rounding
        let close = (a.score - b.score).abs() <= 1e-12 * a.score.abs();
        if close {
            a.total.cmp(&b.total).then_with(|| a.counts.cmp(&b.counts))
        } else {
            b.score.total_cmp(&a.score)
        }
    });
    let mut ranked: Vec<PackageChoice> = Vec::new();
    if matches!(problem.maximise.metric(), Metric::Ler | Metric::Efficacy) {
        for c in &all {
            if ranked.len() >= counting.keep {
                break;
            }
            if let Some(choice) = counting.measure(c)
                && !ranked.iter().any(|r| same(&r.shares, &choice.shares))
            {
                ranked.push(choice);
            }
        }
    } else {
        let mut measured: Vec<PackageChoice> = all.par_iter().filter_map(|c| counting.measure(c)).collect();
        measured.sort_by(|a, b| {
            b.objective
                .total_cmp(&a.objective)
                .then_with(|| a.counts.iter().sum::<u32>().cmp(&b.counts.iter().sum()))
                .then_with(|| a.counts.cmp(&b.counts))
        });
        for choice in measured {
            if ranked.len() >= counting.keep {
                break;
            }
            if let Some(r) = ranked.iter_mut().find(|r| same(&r.shares, &choice.shares)) {
                if choice.counts.iter().sum::<u32>() < r.counts.iter().sum() {
                    *r = choice;
                }
                continue;
            }
            ranked.push(choice);
        }
    }
    let nearest = if ranked.is_empty() {
        let mut nearest = outside(problem, &outline).nearest;
        let best = all.first().map(|c| c.counts.clone()).or(near.map(|n| n.1)).unwrap_or_default();
        if !best.is_empty() {
            let watts: Vec<f64> = best.iter().zip(watts_each).map(|(&c, w)| f64::from(c) * w).collect();
            let sum: f64 = watts.iter().sum();
            nearest.shares = watts.iter().map(|w| w / sum).collect();
            let uv = problem.emitters.blend(&nearest.shares).xyz(colour::Observer::Cie1931).uv();
            let white = cct_duv(uv);
            nearest.u = uv.u;
            nearest.v = uv.v;
            nearest.cct_k = white.map(|w| w.cct_k);
            nearest.duv = white.map(|w| w.duv);
            nearest.distance_uv1960 = if all.is_empty() { uv.distance(centre) } else { 0.0 };
            if let Some(w) = white {
                let values = values_of(problem, &nearest.shares, &Reference::at(w.cct_k));
                nearest.shortfalls = shortfalls(problem, &values, 1e-6);
                nearest.values = Some(values);
            }
        }
        Some((best, nearest))
    } else {
        None
    };
    (control.progress)(1.0);
    Ok(PackageAnswer { ranked, nearest, vectors, inside })
}

fn same(a: &[f64], b: &[f64]) -> bool {
    a.iter().zip(b).all(|(x, y)| (x - y).abs() < 1e-9)
}
