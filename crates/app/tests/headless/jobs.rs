//! The jobs round a solve, on the public problems (`tests/data/solve`; passing rules in its notes).

use crate::solve::{KEYS, arguments, check_optimal, check_white, entry, parse};
use crate::support::{data, file, gaussians, keys, whitesmith, words};
use serde_json::Value;

/// The pack's tolerance on an objective: 0.1 % of the best known.
const OBJECTIVE: f64 = 1e-3;

fn problem(id: &str) -> (Value, Value) {
    (
        entry(&parse("solve/problems.json")["problems"], id),
        entry(&parse("solve/best_known.json")["solutions"], id),
    )
}

#[track_caller]
fn run(command: &str, arguments: &[String], more: &[&str]) -> (i32, Value) {
    let mut line = vec![command.to_owned(), "--json".to_owned()];
    line.extend_from_slice(arguments);
    line.extend(more.iter().map(|&m| m.to_owned()));
    let run = whitesmith(&line);
    (run.code, run.json())
}

fn with(more: &str) -> String {
    format!("{KEYS} {more}")
}

#[test]
fn every_level_of_a_frontier_is_as_good_as_is_known() {
    let (problem, known) = problem("P13");
    let levels: Vec<String> =
        problem["levels"]["values"].as_array().unwrap().iter().map(Value::to_string).collect();
    let (code, answer) =
        run("frontier", &arguments(&problem), &["--of", "ra", "--levels", &levels.join(",")]);
    assert_eq!(code, 0, "{answer}");
    assert_eq!(keys(&answer), words("of points seconds"));
    let points = answer["points"].as_array().unwrap();
    assert_eq!(points.len(), levels.len());
    for (point, known) in points.iter().zip(known["points"].as_array().unwrap()) {
        assert_eq!(keys(point), words(&with("level")));
        assert_eq!(point["level"], known["level"]);
        let id = format!("P13 at Ra {}", known["level"]);
        check_optimal(&id, point, &problem, known["objective"].as_f64().unwrap());
        check_white(&id, point, &problem);
        assert!(point["measured"]["ra"].as_f64().unwrap() >= known["level"].as_f64().unwrap() - 1e-6, "{id}");
    }
}

#[test]
fn levels_of_ones_own_fall_as_the_metric_rises() {
    let (problem, _) = problem("P13");
    let (code, answer) = run("frontier", &arguments(&problem), &["--of", "ra", "--points", "8"]);
    assert_eq!(code, 0);
    let values: Vec<(f64, f64)> = answer["points"]
        .as_array()
        .unwrap()
        .iter()
        .filter_map(|p| Some((p["level"].as_f64()?, p["objective"].as_f64()?)))
        .collect();
    assert!(values.len() >= 5, "{answer}");
    for pair in values.windows(2) {
        assert!(pair[0].0 < pair[1].0 && pair[0].1 >= pair[1].1 - 1e-6, "{pair:?}");
    }
}

#[test]
fn the_best_four_of_twelve_are_found() {
    let (problem, known) = problem("P11");
    let (code, answer) = run("choose", &arguments(&problem), &["--count", &problem["k"].to_string()]);
    assert_eq!(code, 0, "{answer}");
    assert_eq!(keys(&answer), words(&with("chosen runners_up subsets reach_white examined")));
    check_optimal("P11", &answer, &problem, known["objective"].as_f64().unwrap());
    check_white("P11", &answer, &problem);
    // The pack counts emitters from 1, the program from 0.
    let expected: Vec<u64> =
        known["subset"].as_array().unwrap().iter().map(|i| i.as_u64().unwrap() - 1).collect();
    let chosen: Vec<u64> = answer["chosen"].as_array().unwrap().iter().map(|i| i.as_u64().unwrap()).collect();
    assert_eq!(chosen, expected);
    assert_eq!(answer["subsets"], 495);
}

#[test]
fn a_tunable_table_keeps_its_step_and_reaches_the_best_known_mean() {
    let (problem, known) = problem("P14");
    let column = |k: usize| {
        let list: Vec<String> =
            problem["targets"].as_array().unwrap().iter().map(|t| t[k].to_string()).collect();
        list.join(",")
    };
    let step = problem["max_step"].to_string();
    let more = ["--cct", &column(0), "--duv", &column(1), "--max-step", &step];
    let (code, answer) = run("table", &arguments(&problem), &more);
    assert_eq!(code, 0, "{answer}");
    let rows = answer["rows"].as_array().unwrap();
    assert_eq!(rows.len(), 8);
    let shares: Vec<Vec<f64>> = rows
        .iter()
        .map(|r| r["shares"].as_array().unwrap().iter().map(|s| s.as_f64().unwrap()).collect())
        .collect();
    for pair in shares.windows(2) {
        for (a, b) in pair[0].iter().zip(&pair[1]) {
            assert!((a - b).abs() <= problem["max_step"].as_f64().unwrap() + 1e-6, "{a} {b}");
        }
    }
    for row in rows {
        assert_eq!(keys(row), words(&with("target_cct_k target_duv")));
        for limit in row["limits"].as_array().unwrap() {
            assert_eq!(limit["met"], true, "{row}");
        }
        let off = row["measured"]["cct_k"].as_f64().unwrap() - row["target_cct_k"].as_f64().unwrap();
        assert!(off.abs() < 1e-2, "{row}");
    }
    let (mean, best) = (answer["objective"].as_f64().unwrap(), known["objective"].as_f64().unwrap());
    assert!((mean - best).abs() <= OBJECTIVE * best, "{mean}, best known {best}");
    assert!(answer["upper_bound"].as_f64().unwrap() >= mean);
}

#[test]
fn whole_packages_are_the_best_known_counts() {
    let (problem, known) = problem("P12");
    let watts: Vec<String> =
        problem["counts"]["power_per_package_W"].as_array().unwrap().iter().map(Value::to_string).collect();
    let most = problem["counts"]["max_total"].to_string();
    let (code, answer) =
        run("packages", &arguments(&problem), &["--watts-each", &watts.join(","), "--at-most", &most]);
    assert_eq!(code, 0, "{answer}");
    assert_eq!(answer["counts"], known["counts"]);
    check_optimal("P12", &answer, &problem, known["objective"].as_f64().unwrap());
    let (code, answer) = run("packages", &arguments(&problem), &["--watts-each", "1,2", "--at-most", "20"]);
    assert_eq!(code, 2);
    assert!(answer["message"].as_str().unwrap().contains("--watts-each"), "{answer}");
}

#[test]
fn leaving_an_emitter_out_never_pays() {
    let (problem, _) = problem("P02");
    let (code, answer) = run("drop", &arguments(&problem), &[]);
    assert_eq!(code, 0);
    let without = answer["without"].as_array().unwrap();
    assert_eq!(without.len(), 5);
    for (k, one) in without.iter().enumerate() {
        assert_eq!(one["emitter"], k);
        match one["price"].as_f64() {
            Some(price) => {
                assert!(price >= -1e-3, "{one}");
                assert_eq!(one["shares"][k], 0.0);
            }
            None => assert_eq!(one["status"], "infeasible", "{one}"),
        }
    }
}

#[test]
fn prices_are_what_solving_again_says() {
    let (problem, _) = problem("P02");
    let line = arguments(&problem);
    let (code, answer) = run("prices", &line, &[]);
    assert_eq!(code, 0);
    let prices = answer["prices"].as_array().unwrap();
    let price = |of: &str| {
        prices.iter().find(|p| p["of"] == of).unwrap_or_else(|| panic!("a price of {of}: {answer}"))["per_step"]
            .as_f64()
            .unwrap()
    };
    let objective = |ra: &str| {
        let line: Vec<String> = line
            .iter()
            .map(|a| if a.starts_with("--ra=") { format!("--ra={ra}..") } else { a.clone() })
            .collect();
        run("solve", &line, &[]).1["objective"].as_f64().unwrap()
    };
    let by_hand = (objective("90.1") - objective("89.9")) / 0.2;
    assert!(
        by_hand < 0.0 && (price("ra") - by_hand).abs() < 0.2 * by_hand.abs() + 0.02,
        "{} {by_hand}",
        price("ra")
    );
    assert!(price("duv") != 0.0);
}

#[test]
fn the_missing_emitter_is_proposed() {
    // Blue, green and red cannot reach Ra 90 at 3000 K; a fourth between green and red can.
    let (_folder, path) = file("three.csv", gaussians(&[(455.0, 22.0), (530.0, 30.0), (630.0, 24.0)]));
    let line = ["--emitters", &path, "--cct", "3000", "--ra", "90.."].map(str::to_owned);
    let (code, answer) = run("missing", &line, &["--peaks", "480..620", "--widths", "20..80"]);
    assert_eq!(code, 0, "{answer}");
    assert_eq!(keys(&answer), words("without peaks_nm widths_nm map proposals seconds"));
    assert_eq!(answer["without"]["status"], "infeasible");
    assert_eq!(answer["map"].as_array().unwrap().len(), answer["widths_nm"].as_array().unwrap().len());
    assert_eq!(answer["map"][0].as_array().unwrap().len(), answer["peaks_nm"].as_array().unwrap().len());
    let best = &answer["proposals"][0];
    assert_eq!(best["status"], "optimal");
    assert_eq!(best["shares"].as_array().unwrap().len(), 4);
    assert!((550.0..600.0).contains(&best["peak_nm"].as_f64().unwrap()), "{best}");
    assert!(best["measured"]["ra"].as_f64().unwrap() >= 90.0 - 1e-6);
}

#[test]
fn twelve_emitters_at_once_are_solved() {
    let path = data("solve/spectra/P11.csv");
    let line = ["--emitters", path.to_str().unwrap(), "--cct", "3000", "--ra", "90..", "--r9", "0.."]
        .map(str::to_owned);
    let (code, answer) = run("solve", &line, &["--budget-boxes", "2000"]);
    assert_eq!(code, 0);
    // No fewer lm/W than the best four of them (best known 385.39).
    assert!(answer["objective"].as_f64().unwrap() >= 385.39, "{answer}");
}
