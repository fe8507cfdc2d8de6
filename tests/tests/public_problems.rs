//! The solver against a set of problems with best-known answers (`data/solve/README.md` holds conventions and sources).
//!
//! Limits are checked in our own measuring path to 1e-6, which leaves nothing to tolerances; objectives against the best known to 0.1 %.

use colour::tensor::{Tensor, TensorSet};
use colour::{Observer, Reference, locus::cct_duv, measure::measure_at};
use optimiser::{
    Control, Grade, Levels, Limits, Metric, Objective, Outcome, Problem, Region, Solution, Target, choose,
    frontier, packages, solve, table,
};
use serde_json::Value;

/// Objectives agree with the best known when no further below it than this.
const OBJECTIVE: f64 = 1e-3;
/// Limits hold to this.
const LIMIT: f64 = 1e-6;

fn read(name: &str) -> String {
    let path = format!("{}/data/solve/{name}", env!("CARGO_MANIFEST_DIR"));
    std::fs::read_to_string(path).expect("the problem data stand beside the tests")
}

fn json(name: &str) -> Value {
    serde_json::from_str(&read(name)).expect("the problem data are JSON")
}

fn number(v: &Value) -> f64 {
    v.as_f64().expect("a number")
}

fn emitters(id: &str) -> TensorSet {
    let text = read(&format!("spectra/{id}.csv"));
    let mut columns: Vec<Vec<f64>> = Vec::new();
    for line in text.lines().skip(1) {
        let cells: Vec<f64> = line.split(',').map(|c| c.parse().expect("a number")).collect();
        columns.resize(cells.len() - 1, Vec::new());
        for (column, cell) in columns.iter_mut().zip(&cells[1..]) {
            column.push(*cell);
        }
    }
    let tensors: Vec<Tensor> = columns.iter().map(|c| Tensor::of_grid(c)).collect();
    TensorSet::new(&tensors)
}

fn limits(of: &Value) -> Limits {
    let mut limits = Limits::default();
    for (key, value) in of.as_object().expect("constraints") {
        let (name, side) = key.rsplit_once('_').expect("name and side");
        let metric = match name {
            "Ra" => Metric::Ra,
            "R9" => Metric::R9,
            "Rf" => Metric::Rf,
            "Rg" => Metric::Rg,
            "LER" => Metric::Ler,
            other => panic!("unknown metric {other}"),
        };
        let mut range = limits.get(metric);
        match side {
            "min" => range.low = Some(number(value)),
            _ => range.high = Some(number(value)),
        }
        limits.set(metric, range);
    }
    limits
}

struct Case {
    of: Value,
    best: Value,
    problem: Problem,
}

fn case(id: &str) -> Case {
    let find = |list: &Value| {
        list.as_array()
            .expect("a list")
            .iter()
            .find(|x| x["id"] == id)
            .cloned()
            .expect("the problem is in the list")
    };
    let of = find(&json("problems.json")["problems"]);
    let best = find(&json("best_known.json")["solutions"]);
    let t = &of["target"];
    let cct_k = if number(&t["CCT"]) > 0.0 { number(&t["CCT"]) } else { 3000.0 };
    let mut problem = Problem::new(emitters(id), Target { cct_k, duv: number(&t["Duv"]) });
    problem.limits = limits(&of["constraints"]);
    problem.maximise = match of["objective"].as_str() {
        Some("max LER") => Objective::Ler,
        Some("max LER_elec") => Objective::Efficacy,
        Some("max Ra") => Objective::Ra,
        Some("max Rf") => Objective::Rf,
        other => panic!("unknown objective {other:?}"),
    };
    if let Some(wpe) = of["wpe"].as_array() {
        problem.wall_plug = wpe.iter().map(number).collect();
    }
    let (k, d) = (number(&t["CCT_tol"]), number(&t["Duv_tol"]));
    if k > 0.0 || d > 0.0 {
        problem.region = Region::Box { cct_k: k, duv: d };
    }
    Case { of, best, problem }
}

/// Shares are a blend, the white is the one asked, every limit is met in the measuring path.
#[track_caller]
fn meets(problem: &Problem, shares: &[f64], at: Option<Target>) -> f64 {
    assert!(shares.iter().all(|s| *s >= 0.0), "{shares:?}");
    assert!((shares.iter().sum::<f64>() - 1.0).abs() < 1e-12);
    let blend = problem.emitters.blend(shares);
    let white = cct_duv(blend.xyz(Observer::Cie1931).uv()).expect("a white");
    let cct_k = match at {
        Some(t) => {
            assert!((white.cct_k - t.cct_k).abs() < 1e-3, "{} K", white.cct_k);
            assert!((white.duv - t.duv).abs() < 1e-8, "Duv {}", white.duv);
            t.cct_k
        }
        None => {
            if let Region::Box { cct_k, duv } = problem.region {
                assert!((white.cct_k - problem.target.cct_k).abs() <= cct_k + 1e-6, "{} K", white.cct_k);
                assert!((white.duv - problem.target.duv).abs() <= duv + 1e-9, "Duv {}", white.duv);
            }
            white.cct_k
        }
    };
    let m = measure_at(&blend, &Reference::at(cct_k));
    let electrical: f64 = if problem.wall_plug.is_empty() {
        1.0
    } else {
        shares.iter().zip(&problem.wall_plug).map(|(s, w)| s / w).sum()
    };
    let ler = blend.ler_lm_per_w();
    let value = |metric| match metric {
        Metric::Ra => m.ra.expect("Ra"),
        Metric::R9 => m.r9().expect("R9"),
        Metric::Rf => m.rf.expect("Rf"),
        Metric::Rg => m.rg.expect("Rg"),
        Metric::Ler => ler,
        Metric::Efficacy => ler / electrical,
    };
    for (metric, range) in problem.limits.active() {
        let by = range.excess(value(metric));
        assert!(by.abs() <= LIMIT, "{} missed by {by}", metric.title());
    }
    value(problem.maximise.metric())
}

#[track_caller]
fn optimal(outcome: &Outcome) -> &Solution {
    match outcome {
        Outcome::Optimal(s) => s,
        Outcome::Infeasible(i) => panic!("answered infeasible: {}", i.explanation),
    }
}

#[track_caller]
fn close_to_best(found: f64, best: &Value) {
    let best = number(best);
    assert!(found >= best * (1.0 - OBJECTIVE), "{found} falls short of {best}");
    // An answer far better than the best known would mean that the two measure different things.
    assert!(found <= best * (1.0 + OBJECTIVE), "{found} is far above {best}");
}

#[track_caller]
fn bound_is_sound(s: &Solution, best: &Value) {
    let upper = s.upper_bound.expect("a bound");
    assert!(upper >= s.objective);
    assert!(upper >= number(best) * (1.0 - OBJECTIVE));
}

#[track_caller]
fn fixed_and_proven(id: &str) {
    let c = case(id);
    let outcome = solve(&c.problem, &Control::none()).expect("a valid problem");
    let s = optimal(&outcome);
    let value = meets(&c.problem, &s.shares, Some(c.problem.target));
    assert!((value - s.objective).abs() < 1e-6 * value);
    close_to_best(value, &c.best["objective"]);
    bound_is_sound(s, &c.best["objective"]);
    assert_eq!(s.grade, Grade::Proven, "gap {:?} after {} boxes", s.gap, s.boxes);
}

#[test]
fn p01_four_narrow_emitters() {
    fixed_and_proven("P01");
}

#[test]
fn p02_ra_and_r9_floors() {
    fixed_and_proven("P02");
}

#[test]
fn p03_electrical_efficacy_with_an_rg_window_that_binds() {
    fixed_and_proven("P03");
}

#[test]
fn p04_most_rf() {
    fixed_and_proven("P04");
}

#[test]
fn p05_two_separated_feasible_regions() {
    fixed_and_proven("P05");
}

#[test]
fn p06_barely_feasible() {
    fixed_and_proven("P06");
}

#[test]
fn p09_identical_emitters() {
    fixed_and_proven("P09");
}

#[test]
fn p07_a_floor_above_the_best_reachable() {
    let c = case("P07");
    let Outcome::Infeasible(why) = solve(&c.problem, &Control::none()).expect("a valid problem") else {
        panic!("a blend was found");
    };
    assert!(why.proven);
    let reach = why.reachable.iter().find(|r| r.metric == Metric::Ra).expect("Ra is limited");
    let known = number(&c.best["best_reachable"]["Ra"]["best"]);
    assert!((reach.best - known).abs() < 0.1, "{} against {known}", reach.best);
    assert!(reach.bound.expect("a bound") >= reach.best);
    assert_eq!(why.nearest.shortfalls.len(), 1);
    assert!((why.nearest.shortfalls[0].value - reach.best).abs() < 1e-4);
    // the single way out is the floor itself, lowered to what can be reached
    assert_eq!(why.relaxations.len(), 1);
    assert!((why.relaxations[0].to - reach.best).abs() < 1e-3);
}

#[test]
fn p08_a_white_outside_the_gamut() {
    let c = case("P08");
    let Outcome::Infeasible(why) = solve(&c.problem, &Control::none()).expect("a valid problem") else {
        panic!("a blend was found");
    };
    let near = &c.best["nearest"];
    assert!(why.proven && why.reachable.is_empty());
    assert!((why.nearest.distance_uv1960 - number(&near["distance_uv1960"])).abs() < 1e-5);
    assert!((why.nearest.u - number(&near["nearest_u"])).abs() < 1e-5);
    assert!((why.nearest.v - number(&near["nearest_v"])).abs() < 1e-5);
    let made = c.problem.emitters.blend(&why.nearest.shares).xyz(Observer::Cie1931).uv();
    assert!((made.u - why.nearest.u).abs() < 1e-9 && (made.v - why.nearest.v).abs() < 1e-9);
}

#[test]
fn p10_a_box_across_5000_k() {
    let c = case("P10");
    let outcome = solve(&c.problem, &Control::none()).expect("a valid problem");
    let s = optimal(&outcome);
    let value = meets(&c.problem, &s.shares, None);
    close_to_best(value, &c.best["objective"]);
    bound_is_sound(s, &c.best["objective"]);
    assert_eq!(s.grade, Grade::Proven, "gap {:?} after {} boxes", s.gap, s.boxes);
}

#[test]
fn p11_best_four_of_twelve() {
    let c = case("P11");
    let choice = choose(&c.problem, number(&c.of["k"]) as usize, &Control::none()).expect("a valid problem");
    let s = optimal(&choice.outcome);
    let value = meets(&c.problem, &s.shares, Some(c.problem.target));
    close_to_best(value, &c.best["objective"]);
    bound_is_sound(s, &c.best["objective"]);
    assert_eq!(s.grade, Grade::Proven);
    let known: Vec<usize> =
        c.best["subset"].as_array().expect("a subset").iter().map(|x| number(x) as usize - 1).collect();
    assert_eq!(choice.chosen, known);
    assert!(s.shares.iter().filter(|s| **s > 0.0).count() <= 4);
}

#[test]
fn p12_whole_packages() {
    let c = case("P12");
    let of = &c.of["counts"];
    let watts: Vec<f64> = of["power_per_package_W"].as_array().expect("powers").iter().map(number).collect();
    let answer =
        packages(&c.problem, &watts, number(&of["max_total"]) as u32, 2, &Control::none()).expect("valid");
    let best = &answer.ranked[0];
    let known: Vec<u32> =
        c.best["counts"].as_array().expect("counts").iter().map(|x| number(x) as u32).collect();
    assert_eq!(best.counts, known);
    assert_eq!(answer.vectors, 53_129);
    let value = meets(&c.problem, &best.shares, None);
    close_to_best(value, &c.best["objective"]);
}

#[test]
fn p13_a_frontier_of_ra() {
    let c = case("P13");
    let levels: Vec<f64> = c.of["levels"]["values"].as_array().expect("levels").iter().map(number).collect();
    let points =
        frontier(&c.problem, Metric::Ra, &Levels::At(levels.clone()), &Control::none()).expect("valid");
    assert_eq!(points.len(), levels.len());
    let known = c.best["points"].as_array().expect("points");
    let mut last = f64::INFINITY;
    for (point, level) in points.iter().zip(&levels) {
        let mut p = c.problem.clone();
        p.limits.ra.low = Some(*level);
        let s = optimal(&point.outcome);
        let value = meets(&p, &s.shares, Some(p.target));
        let known = known.iter().find(|k| (number(&k["level"]) - level).abs() < 1e-9).expect("the level");
        close_to_best(value, &known["objective"]);
        bound_is_sound(s, &known["objective"]);
        assert_eq!(s.grade, Grade::Proven);
        assert!(value <= last);
        last = value;
    }
    let mut p = c.problem.clone();
    p.maximise = Objective::Ra;
    let outcome = solve(&p, &Control::none()).expect("valid");
    let s = optimal(&outcome);
    assert_eq!(s.grade, Grade::Proven);
    assert!((s.objective - number(&c.best["max_metric"]["value"])).abs() < 0.1);
}

#[test]
fn p14_a_table_with_a_step_limit() {
    let c = case("P14");
    let targets: Vec<Target> = c.of["targets"]
        .as_array()
        .expect("targets")
        .iter()
        .map(|t| Target { cct_k: number(&t[0]), duv: number(&t[1]) })
        .collect();
    let step = number(&c.of["max_step"]);
    let t = table(&c.problem, &targets, Some(step), &Control::none()).expect("valid");
    assert!(t.step_binds && t.greatest_step <= step);
    let mut sum = 0.0;
    let mut last: Option<Vec<f64>> = None;
    for (row, target) in t.rows.iter().zip(&targets) {
        let s = optimal(row);
        sum += meets(&c.problem, &s.shares, Some(*target));
        if let Some(last) = &last {
            for (a, b) in last.iter().zip(&s.shares) {
                assert!((a - b).abs() <= step, "a step of {}", (a - b).abs());
            }
        }
        last = Some(s.shares.clone());
    }
    let mean = sum / targets.len() as f64;
    assert!((mean - t.objective.expect("a table")).abs() < 1e-9 * mean);
    close_to_best(mean, &c.best["objective"]);
    let upper = t.upper_bound.expect("a bound");
    assert!(upper >= mean && upper >= number(&c.best["objective"]) && upper < mean * 1.01);
}

#[test]
fn the_answer_does_not_depend_on_the_threads() {
    for id in ["P03", "P04", "P10"] {
        let c = case(id);
        let run = |threads| {
            rayon::ThreadPoolBuilder::new()
                .num_threads(threads)
                .build()
                .expect("threads")
                .install(|| solve(&c.problem, &Control::none()).expect("valid"))
        };
        assert_eq!(run(1), run(3), "{id}");
    }
}
