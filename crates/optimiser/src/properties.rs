//! Properties of answers over random sets.

use crate::answer::{Grade, Outcome};
use crate::fixed::{shortfalls, values_of};
use crate::local::Dice;
use crate::problem::{Control, Metric, Objective, Problem, Range, circle};
use crate::solve::solve;
use crate::soundness::random_problem;
use colour::tensor::TensorSet;
use colour::{Observer, Reference, locus::uv_at};

/// Vertices of the blends at the target white: every three emitters that make it.
fn triples(problem: &Problem) -> Vec<Vec<f64>> {
    let n = problem.emitters.len();
    let uv = uv_at(problem.target.cct_k, problem.target.duv);
    let white = nalgebra::Vector3::new(1.5 * uv.u / uv.v, 1.0, (4.0 - uv.u - 10.0 * uv.v) / (2.0 * uv.v));
    let xyz: Vec<[f64; 3]> =
        (0..n).map(|i| problem.emitters.tensor(i).xyz(Observer::Cie1931).to_array()).collect();
    let mut out = Vec::new();
    for c in 2..n {
        for b in 1..c {
            for a in 0..b {
                let m = nalgebra::Matrix3::from_fn(|i, j| xyz[[a, b, c][j]][i]);
                let Some(p) = m.lu().solve(&white) else { continue };
                if p.iter().all(|x| *x >= 0.0) {
                    let mut s = vec![0.0; n];
                    s[a] = p[0];
                    s[b] = p[1];
                    s[c] = p[2];
                    out.push(s);
                }
            }
        }
    }
    out
}

fn with_limits(seed: u64) -> Problem {
    let mut p = random_problem(seed);
    match seed % 4 {
        0 => p.limits.ra = Range::at_least(75.0),
        1 => p.limits.rf = Range::at_least(70.0),
        2 => {
            p.limits.ra = Range::at_least(60.0);
            p.limits.r9 = Range::between(-40.0, 60.0);
        }
        _ => p.maximise = Objective::Ra,
    }
    p
}

#[test]
fn no_random_blend_that_meets_the_limits_beats_the_answer() {
    let mut compared = 0;
    for seed in 0..48 {
        let p = with_limits(seed);
        let outcome = solve(&p, &Control::none()).unwrap();
        let reference = Reference::at(p.target.cct_k);
        let corners = triples(&p);
        let mut dice = Dice::new(seed);
        for _ in 0..120 {
            let watts = dice.mixture(&corners, p.emitters.len());
            let sum: f64 = watts.iter().sum();
            let shares: Vec<f64> = watts.iter().map(|w| w / sum).collect();
            let v = values_of(&p, &shares, &reference);
            if !shortfalls(&p, &v, 0.0).is_empty() {
                continue;
            }
            let value = v.get(p.maximise.metric());
            match &outcome {
                Outcome::Optimal(s) => {
                    compared += 1;
                    assert!(value <= s.objective + 1e-6, "seed {seed}: {value} beats {}", s.objective);
                    assert!(s.upper_bound.is_none_or(|u| value <= u));
                }
                Outcome::Infeasible(why) => {
                    panic!("seed {seed}: a blend exists, answered: {}", why.explanation)
                }
            }
        }
    }
    assert!(compared > 1000, "only {compared} blends could be compared");
}

#[test]
fn an_answer_meets_its_white_its_limits_and_its_bounds() {
    let mut proven = 0;
    for seed in 100..148 {
        let mut p = with_limits(seed);
        let n = p.emitters.len();
        p.bounds = vec![(0.0, 1.0); n];
        p.bounds[(seed as usize) % n] = (0.0, 0.3);
        if let Outcome::Optimal(s) = solve(&p, &Control::none()).unwrap() {
            let uv = p.emitters.blend(&s.shares).xyz(Observer::Cie1931).uv();
            assert!(uv.distance(uv_at(p.target.cct_k, p.target.duv)) < 1e-9);
            assert!((s.shares.iter().sum::<f64>() - 1.0).abs() < 1e-12);
            for (share, (lo, hi)) in s.shares.iter().zip(&p.bounds) {
                assert!(*share >= lo - 1e-9 && *share <= hi + 1e-9);
            }
            assert!(shortfalls(&p, &s.values, 1e-6).is_empty(), "{:?}", s.values);
            assert!(s.upper_bound.is_none_or(|u| u >= s.objective));
            proven += usize::from(s.grade == Grade::Proven);
        }
    }
    assert!(proven > 20, "{proven}");
}

#[test]
fn order_and_duplicates_of_emitters_do_not_matter() {
    for seed in 0..24 {
        let p = with_limits(seed);
        let n = p.emitters.len();
        let Outcome::Optimal(s) = solve(&p, &Control::none()).unwrap() else { continue };
        let order: Vec<usize> = (0..n).map(|i| (i * 5 + 3) % n).collect();
        let order = if (0..n).all(|i| order.contains(&i)) { order } else { (0..n).rev().collect() };
        let turned = solve(&p.subset(&order), &Control::none()).unwrap();
        let turned = turned.solution().expect("the same blend exists");
        assert!((turned.objective - s.objective).abs() <= 2e-6 * s.objective.abs(), "seed {seed}");
        // one emitter twice
        let twice = solve(&p.subset(&(0..n).chain([n / 2]).collect::<Vec<_>>()), &Control::none()).unwrap();
        let twice = twice.solution().expect("the same blend exists");
        assert!((twice.objective - s.objective).abs() <= 2e-6 * s.objective.abs(), "seed {seed} twice");
    }
}

#[test]
fn three_emitters_have_one_blend_and_its_proof_is_exact() {
    let mut seen = 0;
    for seed in 200..240 {
        let p = random_problem(seed);
        let Some(corner) = triples(&p).into_iter().find(|c| c.iter().filter(|x| **x > 1e-6).count() == 3)
        else {
            continue;
        };
        let ids: Vec<usize> = (0..corner.len()).filter(|&i| corner[i] > 0.0).collect();
        let three = p.subset(&ids);
        let outcome = solve(&three, &Control::none()).unwrap();
        let s = outcome.solution().expect("the white is inside the triangle");
        let sum: f64 = corner.iter().sum();
        for (share, &i) in s.shares.iter().zip(&ids) {
            assert!((share - corner[i] / sum).abs() < 1e-9);
        }
        assert_eq!((s.grade, s.gap), (Grade::Proven, Some(0.0)));
        seen += 1;
    }
    assert!(seen > 20);
}

#[test]
fn one_and_two_emitters_reach_a_white_only_by_luck() {
    let p = random_problem(3);
    for ids in [vec![0], vec![0, 1]] {
        let few = p.subset(&ids);
        let Outcome::Infeasible(why) = solve(&few, &Control::none()).unwrap() else {
            panic!("a white off the line")
        };
        assert!(why.nearest.distance_uv1960 > 0.0 && why.reachable.is_empty() && why.proven);
        let uv = few.emitters.blend(&why.nearest.shares).xyz(Observer::Cie1931).uv();
        assert!((uv.u - why.nearest.u).abs() < 1e-9 && (uv.v - why.nearest.v).abs() < 1e-9);
    }
}

#[test]
fn a_dark_emitter_takes_no_share_unless_it_must() {
    let p = random_problem(5);
    let n = p.emitters.len();
    let mut tensors: Vec<colour::Tensor> = (0..n).map(|i| p.emitters.tensor(i)).collect();
    tensors.push(colour::Tensor::dark());
    let mut q = p.clone();
    q.emitters = TensorSet::new(&tensors);
    let (a, b) = (solve(&p, &Control::none()).unwrap(), solve(&q, &Control::none()).unwrap());
    let (a, b) = (a.solution().unwrap(), b.solution().unwrap());
    assert!((a.objective - b.objective).abs() < 1e-9);
    assert_eq!(b.shares[n], 0.0);
}

#[test]
fn a_lock_is_kept_exactly() {
    for seed in 0..12 {
        let mut p = random_problem(seed);
        let Outcome::Optimal(free) = solve(&p, &Control::none()).unwrap() else { continue };
        let n = p.emitters.len();
        let lock = 0.9 * free.shares[0] + 0.01;
        p.bounds = vec![(0.0, 1.0); n];
        p.bounds[0] = (lock, lock);
        if let Outcome::Optimal(s) = solve(&p, &Control::none()).unwrap() {
            assert!((s.shares[0] - lock).abs() < 1e-9, "{} {lock}", s.shares[0]);
            assert!(s.objective <= free.objective + 1e-9);
        }
    }
}

#[test]
fn limits_that_exclude_each_other_are_explained_with_a_way_out_that_works() {
    let mut tried = 0;
    for seed in 0..40 {
        let mut p = random_problem(seed);
        let Outcome::Optimal(best) = solve(&p, &Control::none()).unwrap() else { continue };
        p.maximise = Objective::Ra;
        let Outcome::Optimal(render) = solve(&p, &Control::none()).unwrap() else { continue };
        p.maximise = Objective::Ler;
        if render.objective - best.values.ra < 5.0 || best.objective - render.values.ler < 10.0 {
            continue;
        }
        p.limits.ra = Range::at_least(render.objective - 0.5);
        p.limits.ler = Range::at_least(best.objective - 0.5);
        let Outcome::Infeasible(why) = solve(&p, &Control::none()).unwrap() else { continue };
        tried += 1;
        assert!(why.proven);
        let reach = |m: Metric| why.reachable.iter().find(|r| r.metric == m).expect("limited").best;
        assert!((reach(Metric::Ra) - render.objective).abs() < 0.05);
        assert!((reach(Metric::Ler) - best.objective).abs() < 1e-6 * best.objective);
        assert!(!why.nearest.shortfalls.is_empty());
        for r in &why.relaxations {
            let mut q = p.clone();
            let mut range = q.limits.get(r.metric);
            assert!(r.lower_end && r.to < r.from);
            range.low = Some(r.to - 1e-4);
            q.limits.set(r.metric, range);
            assert!(matches!(solve(&q, &Control::none()).unwrap(), Outcome::Optimal(_)), "seed {seed} {r:?}");
        }
        assert_eq!(why.relaxations.len(), 2, "{}", why.explanation);
    }
    assert!(tried >= 8, "{tried}");
}

#[test]
fn a_region_gives_at_least_what_its_middle_gives_and_its_bound_holds() {
    let (mut proven, mut seen) = (0, 0);
    for seed in 0..16 {
        let mut p = random_problem(seed);
        p.limits.ra = Range::at_least(70.0);
        let Outcome::Optimal(middle) = solve(&p, &Control::none()).unwrap() else { continue };
        let centre = uv_at(p.target.cct_k, p.target.duv).uv_prime();
        for round in [true, false] {
            p.region = if round {
                circle(centre, 0.0022)
            } else {
                crate::problem::Region::Box { cct_k: 100.0, duv: 0.002 }
            };
            let outcome = solve(&p, &Control::none()).unwrap();
            let s = outcome.solution().expect("the middle has a blend");
            assert!(
                s.objective >= middle.objective - 1e-6,
                "seed {seed}: {} {}",
                s.objective,
                middle.objective
            );
            let uv = p.emitters.blend(&s.shares).xyz(Observer::Cie1931).uv();
            if round {
                assert!(uv.uv_prime().distance(centre) <= 0.0022);
            } else {
                let c = colour::locus::cct_duv(uv).unwrap();
                assert!((c.cct_k - p.target.cct_k).abs() <= 100.0 && (c.duv - p.target.duv).abs() <= 0.002);
            }
            assert!(shortfalls(&p, &s.values, 1e-6).is_empty());
            let upper = s.upper_bound.unwrap();
            assert!(upper >= s.objective && upper >= middle.objective);
            proven += usize::from(s.grade == Grade::Proven);
            seen += 1;
        }
    }
    assert!(seen >= 16 && proven * 10 >= seen * 9, "{proven} of {seen} proven");
}

#[test]
fn a_region_without_a_blend_is_proven_empty() {
    let mut p = random_problem(11);
    p.maximise = Objective::Ra;
    let best = solve(&p, &Control::none()).unwrap().solution().unwrap().objective;
    p.maximise = Objective::Ler;
    p.region = crate::problem::Region::Box { cct_k: 20.0, duv: 0.0005 };
    p.limits.ra = Range::at_least((best + 8.0).min(99.9));
    let Outcome::Infeasible(why) = solve(&p, &Control::none()).unwrap() else {
        panic!("Ra {best} plus 8 was reached")
    };
    assert!(why.proven, "{}", why.explanation);
    assert!(!why.nearest.shortfalls.is_empty() && !why.reachable.is_empty());
}
