//! ANSI C78.377-2017: the tabulated quadrangles (a test house's page; corners from open code that names the 2015
//! edition) against the standard's corner rule, computed here.

use colour::Xy;
use colour::tolerance::{C78_377_2017, Quadrangle};

/// The table prints four decimals; the sources differ from the rule by up to 0.0002.
const XY: f64 = 2.5e-4;

fn close(got: Xy, printed: Xy) -> bool {
    (got.x - printed.x).abs() <= XY && (got.y - printed.y).abs() <= XY
}

#[test]
fn corners_follow_the_rule() {
    for row in &C78_377_2017 {
        let rule = Quadrangle::by_rule(row.nominal_cct_k, row.target_cct_k, row.cct_tolerance_k, 0.006);
        for (got, printed) in rule.corners.into_iter().zip(row.corners) {
            assert!(close(got, printed), "{} K: {got:?}, printed {printed:?}", row.nominal_cct_k);
        }
    }
}

#[test]
fn centres_follow_the_nominal_duv() {
    for row in &C78_377_2017 {
        let rule = Quadrangle::by_rule(row.nominal_cct_k, row.target_cct_k, row.cct_tolerance_k, 0.006);
        assert!(close(rule.centre, row.centre), "{} K: {:?}", row.nominal_cct_k, rule.centre);
        assert!(
            (rule.target_duv - row.target_duv).abs() <= 6e-5,
            "{} K: {}",
            row.nominal_cct_k,
            rule.target_duv
        );
    }
    // 4000 K: .3818 .3797.
    assert_eq!(Quadrangle::nominal(4000.0).expect("4000 K is tabulated").centre, Xy { x: 0.3818, y: 0.3797 });
}
