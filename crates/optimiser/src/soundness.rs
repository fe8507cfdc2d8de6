//! Is the bound a bound? Random boxes against random blends inside them.
//!
//! `WHITESMITH_SOUNDNESS_PAIRS=1000000 cargo test -p optimiser soundness -- --nocapture` runs the full count and prints the tightest slacks.

use crate::ask::{Ask, Wanted, Work};
use crate::fixed::{Plan, solve_ask, values_of};
use crate::local::Dice;
use crate::models::Model;
use crate::problem::{Control, Limits, Metric, Problem, Range, Target};
use crate::space::inner;
use colour::locus::uv_at;
use colour::tensor::{Tensor, TensorSet};
use colour::{Reference, shapes::Shape};
use rayon::prelude::*;

const METRICS: [Metric; 4] = [Metric::Ra, Metric::R9, Metric::Rf, Metric::Rg];
/// Sets of random emitters.
const SETS: usize = 240;
/// Halvings from the whole polytope down to a millionth.
const LEVELS: usize = 21;
/// How far each remainder is weakened on purpose. Half of it is caught for Ra, R9 and Rf; Rg adds the remainders of 99 samples whose
/// true bends have either sign, so a pair needs a twentieth of it at most and only a larger cut shows.
const WEAKENED: [f64; 4] = [0.5, 0.5, 0.5, 0.02];
/// Rounding: values of the two paths agree to about 1e-10, internal units.
const ROUNDING: f64 = 2e-9;

/// Pairs examined unless the environment asks for more.
fn pairs() -> usize {
    std::env::var("WHITESMITH_SOUNDNESS_PAIRS").ok().and_then(|s| s.parse().ok()).unwrap_or(24_000)
}

/// A random set of four to eight invented emitters that reaches a random white.
pub(crate) fn random_problem(seed: u64) -> Problem {
    let mut dice = Dice::new(seed);
    loop {
        let n = 4 + (dice.unit() * 5.0) as usize;
        let broad = dice.unit() < 0.5;
        let tensors: Vec<Tensor> = (0..n)
            .map(|i| {
                let peak_nm = 440.0 + 205.0 * (i as f64 + 0.8 * dice.unit()) / n as f64;
                let mut width = || if broad { 35.0 + 60.0 * dice.unit() } else { 15.0 + 25.0 * dice.unit() };
                let (fwhm_below_nm, fwhm_above_nm) = (width(), width());
                let shape = Shape::SplitGaussian { peak_nm, fwhm_below_nm, fwhm_above_nm };
                Tensor::of_grid(&shape.colour_grid().expect("a valid shape"))
            })
            .collect();
        let target = Target { cct_k: 2500.0 + 4000.0 * dice.unit(), duv: 0.006 * (dice.unit() - 0.5) };
        let p = Problem::new(TensorSet::new(&tensors), target);
        let reference = Reference::at(target.cct_k);
        let white = uv_at(target.cct_k, target.duv);
        let wanted = Wanted { metric: Metric::Ler, sign: 1.0 };
        if Ask::new(&p, white, &reference, wanted, false).is_ok_and(|a| a.space.d >= 1) {
            return p;
        }
    }
}

fn compile(problem: &Problem, limits: Limits) -> Ask {
    let mut p = problem.clone();
    p.limits = limits;
    let t = p.target;
    let wanted = Wanted { metric: Metric::Ler, sign: 1.0 };
    Ask::new(&p, uv_at(t.cct_k, t.duv), &Reference::at(t.cct_k), wanted, true)
        .expect("the white is reachable")
}

/// Limits that ask nothing but make every model be built, from above and from below.
fn watch_everything() -> Limits {
    Limits {
        ra: Range::between(-900.0, 101.0),
        r9: Range::between(-2000.0, 101.0),
        rf: Range::between(1e-9, 101.0),
        rg: Range::between(1.0, 900.0),
        ..Limits::default()
    }
}

/// A point of the polytope on the way from `from` to `to`, as near `to` as it gets.
fn inside(ask: &Ask, from: &[f64], to: &[f64]) -> Vec<f64> {
    let mut part: f64 = 1.0;
    for r in &ask.space.rows {
        let (a, b) = (inner(&r.a, from), inner(&r.a, to));
        if b > r.b && b > a {
            part = part.min(((r.b - a) / (b - a)).max(0.0));
        }
    }
    from.iter().zip(to).map(|(f, t)| f + part * (t - f)).collect()
}

#[derive(Clone, Debug)]
struct Tally {
    pairs: usize,
    /// Worst excess of a value over its bound, each metric, both sides.
    worst: [f64; 4],
    /// Pairs that break a bound whose remainder was weakened to [`WEAKENED`] of itself.
    caught: [usize; 4],
    /// Greatest part of a remainder that a pair really needed.
    needed: [f64; 4],
    /// Tightest slack of each metric at each halving round the incumbent.
    tightest: [[f64; LEVELS]; 4],
    /// Greatest difference between the search's values and the measuring path.
    path: f64,
}

impl Tally {
    fn new() -> Tally {
        Tally {
            pairs: 0,
            worst: [f64::NEG_INFINITY; 4],
            caught: [0; 4],
            needed: [0.0; 4],
            tightest: [[f64::INFINITY; LEVELS]; 4],
            path: 0.0,
        }
    }

    fn merge(mut self, o: &Tally) -> Tally {
        self.pairs += o.pairs;
        self.path = self.path.max(o.path);
        for k in 0..4 {
            self.worst[k] = self.worst[k].max(o.worst[k]);
            self.caught[k] += o.caught[k];
            self.needed[k] = self.needed[k].max(o.needed[k]);
            for l in 0..LEVELS {
                self.tightest[k][l] = self.tightest[k][l].min(o.tightest[k][l]);
            }
        }
        self
    }
}

fn examine_set(seed: u64, pairs: usize) -> Tally {
    let problem = random_problem(seed);
    let ask = compile(&problem, watch_everything());
    let d = ask.space.d;
    let mut dice = Dice::new(seed ^ 0x5eed);
    let mut tally = Tally::new();
    // the incumbent: the best LER with an Ra a little below what random blends reach
    let mut limits = Limits::default();
    let mut work = Work::default();
    ask.at(&vec![0.0; d], &mut work);
    limits.ra = Range::at_least(ask.model(Metric::Ra, &work).upper);
    let plan = Plan { starts: Some(4), boxes: 0, until: None, gap: 1e-3 };
    let found = solve_ask(compile(&problem, limits), &[], plan, &Control::none());
    let incumbent = inside(&ask, &vec![0.0; d], &found.best.expect("the centre meets the limit").t);
    let reference = Reference::at(problem.target.cct_k);
    for pair in 0..pairs {
        let round_incumbent = pair % 2 == 0;
        let level = (pair / 2) % LEVELS;
        let (centre, radius): (Vec<f64>, Vec<f64>) = if round_incumbent {
            let size = 0.5f64.powi(level as i32);
            let radius: Vec<f64> =
                (0..d).map(|j| 0.5 * size * (ask.space.high[j] - ask.space.low[j])).collect();
            // the incumbent lies somewhere in the box
            let to: Vec<f64> =
                (0..d).map(|j| incumbent[j] + 0.9 * radius[j] * (2.0 * dice.unit() - 1.0)).collect();
            (inside(&ask, &incumbent, &to), radius)
        } else {
            let centre = dice.mixture(&ask.space.corners, d);
            let size = 0.5f64.powf(12.0 * dice.unit());
            let radius = (0..d)
                .map(|j| 0.5 * size * (0.1 + 0.9 * dice.unit()) * (ask.space.high[j] - ask.space.low[j]))
                .collect();
            (centre, radius)
        };
        let corner = dice.unit() < 0.5;
        let to: Vec<f64> = (0..d)
            .map(|j| {
                let x = 2.0 * dice.unit() - 1.0;
                centre[j] + radius[j] * if corner { x.signum() } else { x }
            })
            .collect();
        let t = inside(&ask, &centre, &to);
        ask.at(&t, &mut work);
        let values: Vec<f64> = METRICS.iter().map(|m| ask.model(*m, &work).upper).collect();
        ask.at(&centre, &mut work);
        let at_centre: Vec<f64> = METRICS.iter().map(|m| ask.model(*m, &work).upper).collect();
        ask.over_box(&centre, &radius, &mut work);
        let step: Vec<f64> = t.iter().zip(&centre).map(|(a, b)| a - b).collect();
        for (k, metric) in METRICS.iter().enumerate() {
            let m: &Model = ask.model(*metric, &work);
            let along = inner(&m.grad[..d], &step);
            let (above, below) = (m.upper + along - values[k], values[k] - m.lower - along);
            let slack = above.min(below);
            tally.worst[k] = tally.worst[k].max(-slack);
            if round_incumbent {
                tally.tightest[k][level] = tally.tightest[k][level].min(slack);
            }
            // part of the remainder only: must fail somewhere
            let weak = |bound: f64| at_centre[k] + WEAKENED[k] * (bound - at_centre[k]);
            let bend = values[k] - at_centre[k] - along;
            let remainder = if bend > 0.0 { m.upper } else { m.lower } - at_centre[k];
            if bend.abs() > 1e-6 && remainder.is_finite() {
                tally.needed[k] = tally.needed[k].max(bend / remainder);
            }
            if weak(m.upper) + along < values[k] - ROUNDING || weak(m.lower) + along > values[k] + ROUNDING {
                tally.caught[k] += 1;
            }
        }
        if pair % 50 == 0 {
            // the searches and the measuring path tell the same
            let v = values_of(&problem, &ask.shares(&t), &reference);
            for (k, metric) in METRICS.iter().enumerate() {
                let outward = crate::ask::outward(*metric, values[k]);
                if v.get(*metric).is_finite() {
                    tally.path = tally.path.max((v.get(*metric) - outward).abs());
                }
            }
        }
        tally.pairs += 1;
    }
    tally
}

#[test]
fn soundness_no_blend_beats_the_bound_of_its_box() {
    let each = pairs().div_ceil(SETS);
    let tally = (0..SETS as u64)
        .into_par_iter()
        .map(|s| examine_set(1000 + s, each))
        .collect::<Vec<_>>()
        .iter()
        .fold(Tally::new(), Tally::merge);
    let mut report = format!("{} pairs over {SETS} sets; paths agree to {:.1e}\n", tally.pairs, tally.path);
    for (k, metric) in METRICS.iter().enumerate() {
        report.push_str(&format!(
            "{:>3}: worst excess {:.1e}, needs {:.2} of the remainder, {} of it caught {} times, tightest slack by halving: {}\n",
            metric.title(),
            tally.worst[k],
            tally.needed[k],
            WEAKENED[k],
            tally.caught[k],
            tally.tightest[k].iter().map(|s| format!("{s:.1e}")).collect::<Vec<_>>().join(" ")
        ));
    }
    println!("{report}");
    assert!(tally.path < 1e-8, "{report}");
    for k in 0..4 {
        assert!(tally.worst[k] < ROUNDING, "a blend beats its bound\n{report}");
        assert!(tally.caught[k] > 0, "a bound weakened on purpose went unnoticed\n{report}");
        // second order: about fourfold a halving, over the halvings that stand clear of rounding
        let (first, last) = (tally.tightest[k][3], tally.tightest[k][13]);
        let fold = (first / last).powf(0.1);
        assert!(
            (3.0..5.5).contains(&fold),
            "{} falls {fold:.2}-fold a halving\n{report}",
            METRICS[k].title()
        );
    }
}

/// The same for whites that move: the true value of a blend against its own reference stays under the models of its slice.
#[test]
fn soundness_of_slices_no_blend_beats_the_bound_whatever_its_reference() {
    let each = (pairs() / 8).div_ceil(SETS);
    let worst = (0..SETS as u64).into_par_iter().map(|s| examine_slice(5000 + s, each)).collect::<Vec<_>>();
    let checked: usize = worst.iter().map(|w| w.0).sum();
    let excess = worst.iter().map(|w| w.1).fold(f64::NEG_INFINITY, f64::max);
    println!("{checked} pairs in slices, worst excess {excess:.1e}");
    assert!(checked * 4 > each * SETS, "only {checked} blends lay in their slice");
    assert!(excess < 1e-6, "a blend beats the bound of its slice by {excess}");
}

fn examine_slice(seed: u64, pairs: usize) -> (usize, f64) {
    let mut problem = random_problem(seed);
    let t = problem.target;
    let mut dice = Dice::new(seed);
    problem.region = crate::problem::Region::Box { cct_k: 150.0, duv: 0.003 };
    problem.limits = Limits { rg: Range::OPEN, ..watch_everything() };
    let mut problem_with_rg = problem.clone();
    problem_with_rg.limits = watch_everything();
    let wanted = Wanted { metric: Metric::Ler, sign: 1.0 };
    let (mut checked, mut worst) = (0, f64::NEG_INFINITY);
    for piece in crate::region::pieces(&problem) {
        let crate::region::Piece::Box { cct_k, .. } = piece else { continue };
        for _ in 0..2 {
            let width = (cct_k[1] - cct_k[0]) * 0.5f64.powf(6.0 * dice.unit());
            let start = cct_k[0] + (cct_k[1] - cct_k[0] - width) * dice.unit();
            // the references of CIE 224 have a kink at 4000 K, where regions are cut
            if start < 4000.0 && start + width > 4000.0 {
                continue;
            }
            let Some(slice) = crate::region_proof::Slice::new(&piece, [start, start + width]) else {
                continue;
            };
            let Ok(ask) = Ask::within(&problem, &slice, wanted, None) else { continue };
            let d = ask.space.d;
            let mut work = Work::default();
            for _ in 0..pairs.div_ceil(2) {
                let centre = dice.mixture(&ask.space.corners, d);
                let size = 0.5f64.powf(12.0 * dice.unit());
                let radius: Vec<f64> =
                    (0..d).map(|j| 0.5 * size * (ask.space.high[j] - ask.space.low[j])).collect();
                let to: Vec<f64> =
                    (0..d).map(|j| centre[j] + radius[j] * (2.0 * dice.unit() - 1.0)).collect();
                let t2 = inside(&ask, &centre, &to);
                let shares = ask.shares(&t2);
                let uv = problem.emitters.blend(&shares).xyz(colour::Observer::Cie1931).uv();
                let Some(white) = colour::locus::cct_duv(uv) else { continue };
                if white.cct_k < start || white.cct_k > start + width || (white.duv - t.duv).abs() > 0.003 {
                    continue; // the slice's polygon covers a hair more than the slice
                }
                let v = values_of(&problem, &shares, &Reference::at(white.cct_k));
                ask.over_box(&centre, &radius, &mut work);
                let step: Vec<f64> = t2.iter().zip(&centre).map(|(a, b)| a - b).collect();
                for metric in [Metric::Ra, Metric::R9, Metric::Rf] {
                    let m = ask.model(metric, &work);
                    let along = inner(&m.grad[..d], &step);
                    let value = crate::ask::inward(metric, v.get(metric));
                    worst = worst.max(value - m.upper - along).max(m.lower + along - value);
                }
                // Rg against the bins of its own reference, which must be those of one end
                let own = Reference::at(white.cct_k);
                let same = |end: &&&Reference| (0..99).all(|i| own.hue_bin(i) == end.hue_bin(i));
                if let Some(bins) = slice.bins().iter().flatten().find(same).filter(|_| checked % 4 == 0)
                    && let Ok(with_rg) = Ask::within(&problem_with_rg, &slice, wanted, Some(bins))
                {
                    with_rg.over_box(&centre, &radius, &mut work);
                    let m = with_rg.model(Metric::Rg, &work);
                    let along = inner(&m.grad[..d], &step);
                    let ratio = crate::ces::reference_area(&own, bins)
                        / crate::ces::reference_area(&slice.middle, bins);
                    assert!(
                        (ratio - 1.0).abs() <= slice.area_change(bins),
                        "the reference's area strays by {ratio}"
                    );
                    let value = v.rg * ratio;
                    worst = worst.max(value - m.upper - along).max(m.lower + along - value);
                }
                checked += 1;
            }
        }
    }
    (checked, worst)
}
