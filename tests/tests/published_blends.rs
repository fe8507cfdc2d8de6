//! The colour numbers of the best-known blends of `tests/data/solve`, as the judge of those problems computed them (own
//! code in another language; conventions in the README there).

use checks::table::Table;
use colour::measure::measure;
use colour::{Tensor, TensorSet};
use serde_json::Value;

fn emitters(problem: &str) -> TensorSet {
    let table = Table::read(&format!("solve/spectra/{problem}.csv"));
    let tensors: Vec<Tensor> =
        table.header()[1..].iter().map(|name| Tensor::of_grid(&table.column(name))).collect();
    TensorSet::new(&tensors)
}

#[track_caller]
fn check(problem: &str, achieved: &Value, key: &str, got: f64, tolerance: f64) -> usize {
    let Some(expected) = achieved[key].as_f64() else { return 0 };
    assert!((got - expected).abs() <= tolerance, "{problem} {key}: {got}, the judge has {expected}");
    1
}

#[test]
fn best_known_blends_have_the_judges_numbers() {
    let path = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("data/solve/best_known.json");
    let text = std::fs::read_to_string(path).expect("the best-known answers are there");
    let all: Value = serde_json::from_str(&text).expect("the best-known answers are JSON");
    let mut compared = 0;
    for solution in all["solutions"].as_array().expect("a list") {
        let problem = solution["id"].as_str().expect("an id");
        let (Some(shares), achieved) = (solution["shares"].as_array(), &solution["achieved"]) else {
            continue;
        };
        let shares: Vec<f64> = shares.iter().map(|share| share.as_f64().expect("a share")).collect();
        let set = emitters(problem);
        if shares.len() != set.len() {
            continue;
        }
        let got = measure(&set.blend(&shares));
        let of = |number: Option<f64>| number.expect("a white has it");
        compared += check(problem, achieved, "CCT", of(got.cct_k), 0.05);
        compared += check(problem, achieved, "Duv", of(got.duv), 1e-6);
        compared += check(problem, achieved, "LER", got.ler_lm_per_w, 1e-3);
        // The judge has both conventions of the test samples; ours is the linear one.
        compared += check(problem, achieved, "Ra_linear_tcs", of(got.ra), 0.002);
        compared += check(problem, achieved, "R9_linear_tcs", of(got.r9()), 0.005);
        compared += check(problem, achieved, "Rf", of(got.rf), 0.002);
        compared += check(problem, achieved, "Rg", of(got.rg), 0.002);
    }
    assert!(compared >= 60, "{compared}");
}
