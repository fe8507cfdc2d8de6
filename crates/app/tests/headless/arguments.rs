//! Arguments that cannot be used end with 2 and one line that says what was expected and what was found.

use crate::support::{file, gaussians, whitesmith};

#[track_caller]
fn refused(arguments: &[&str], expected: &[&str]) {
    let run = whitesmith(arguments);
    assert_eq!(run.code, 2, "{arguments:?}: {}", run.err);
    assert_eq!(run.err.lines().count(), 1, "{arguments:?}: {}", run.err);
    for part in expected {
        assert!(run.err.contains(part), "{arguments:?}: `{part}` in {}", run.err);
    }
}

#[test]
fn malformed_values_are_named_with_what_was_expected() {
    let solve = |rest: &[&'static str]| {
        let mut line = vec!["solve", "--emitters", "none.csv"];
        line.extend(rest);
        line
    };
    refused(&solve(&["--cct", "warm"]), &["--cct", "expected", "`warm`"]);
    refused(&solve(&["--cct", "500"]), &["--cct", "1000 to 20000 K", "`500`"]);
    refused(&solve(&["--cct", "nan"]), &["--cct", "`nan`"]);
    refused(&solve(&["--cct", "3000", "--duv", "0.2"]), &["--duv", "0.05", "`0.2`"]);
    refused(&solve(&["--cct", "3000", "--ra", "90"]), &["--ra", "90..", "`90`"]);
    refused(&solve(&["--cct", "3000", "--ra", "95..90"]), &["--ra", "lower end", "`95..90`"]);
    refused(&solve(&["--cct", "3000", "--within", "oval:3"]), &["--within", "box:", "`oval:3`"]);
    refused(&solve(&["--cct", "3000", "--wall-plug", "0.3,1.4"]), &["--wall-plug", "at most 1", "`1.4`"]);
    refused(
        &solve(&["--cct", "3000", "--maximise", "beauty"]),
        &["--maximise", "ler, efficacy, ra, rf", "`beauty`"],
    );
    refused(&solve(&["--cct", "3000", "--budget", "0"]), &["--budget", "above 0"]);
    refused(&solve(&["--cct", "3000", "--brightness"]), &["--brightness"]);
    refused(&solve(&[]), &["--cct"]);
    refused(&["measure"], &["FILE"]);
    refused(
        &["read", "--axis", "furlong", "none.csv"],
        &["--axis", "nm, um, angstrom, m, cm-1, ev", "`furlong`"],
    );
    refused(&["read", "--start", "380", "none.csv"], &["--step"]);
}

#[test]
fn values_that_do_not_fit_the_emitters_are_named() {
    let (_folder, path) = file("three.csv", gaussians(&[(455.0, 25.0), (530.0, 60.0), (612.0, 80.0)]));
    let solve = |rest: &[&'static str]| {
        let mut line = vec!["solve", "--emitters", path.as_str(), "--cct", "3000"];
        line.extend(rest);
        line
    };
    refused(&solve(&["--wall-plug", "0.3,0.4"]), &["--wall-plug", "3 fractions", "found 2"]);
    refused(&solve(&["--maximise", "efficacy"]), &["--wall-plug", "every emitter"]);
    refused(&solve(&["--efficacy", "100.."]), &["--wall-plug", "every emitter"]);
    refused(&solve(&["--within", "quadrangle:3100"]), &["--within", "2700, 3000, 3500", "found 3100"]);
    refused(&solve(&["--within", "sdcm:3@F3100"]), &["--within", "F3000", "found F3100"]);
    refused(&solve(&["--within", "polygon:0.2,0.4;0.3,0.5;0.3,0.4;0.2,0.5"]), &["--within", "convex"]);
}

#[test]
fn an_emitter_without_light_is_named() {
    let mut text = gaussians(&[(455.0, 25.0), (530.0, 60.0), (612.0, 80.0)]);
    // A fourth column whose light lies mostly below zero.
    text = text
        .lines()
        .enumerate()
        .map(|(k, line)| {
            let cell = if k == 0 {
                "upside down".to_owned()
            } else {
                (if k == 200 { "1" } else { "-1" }).to_owned()
            };
            format!("{line},{cell}\n")
        })
        .collect();
    let (_folder, path) = file("four.csv", text);
    let run = whitesmith(&["solve", "--emitters", &path, "--columns", "2,3,4,5", "--cct", "3000", "--json"]);
    assert_eq!(run.code, 2, "{}", run.err);
    assert!(run.err.contains("upside down") && run.err.contains("positive power"), "{}", run.err);
    assert!(
        run.json()["status"].is_null() && run.json()["message"].as_str().unwrap().contains("upside down")
    );
}

#[test]
fn help_and_version_are_answers_not_errors() {
    for arguments in [vec!["--help"], vec!["solve", "--help"], vec!["--version"]] {
        let run = whitesmith(&arguments);
        assert_eq!((run.code, run.err.as_str()), (0, ""), "{arguments:?}");
        assert!(!run.out.is_empty());
    }
}
