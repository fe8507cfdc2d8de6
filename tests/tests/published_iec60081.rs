//! IEC 60081: semi-axes and angles of the SDCM ellipses, from the coefficients by an eigenvalue solution done elsewhere
//! (the standard tabulates the same axes; coefficients as open code carries them).

use colour::locus::cct_duv;
use colour::tolerance::Ellipse;

#[test]
fn axes_of_the_six_ellipses() {
    for (name, a, b, angle) in [
        ("F6500", 0.00221, 0.00095, 58.6),
        ("F5000", 0.00274, 0.00119, 59.6),
        ("F4000", 0.00313, 0.00134, 53.7),
        ("F3500", 0.00309, 0.00138, 54.0),
        ("F3000", 0.00278, 0.00137, 53.2),
        ("F2700", 0.00258, 0.00134, 57.3),
    ] {
        let got = Ellipse::iec_60081(name).expect("a named ellipse").axes();
        assert!((got.0 - a).abs() <= 6e-6 && (got.1 - b).abs() <= 6e-6, "{name}: {got:?}");
        assert!((got.2 - angle).abs() <= 0.06, "{name}: {got:?}");
    }
}

/// The centre F6500 lies at Duv +0.0071, well above the C78.377 quadrangle's +0.0031.
#[test]
fn f6500_is_not_the_ansi_centre() {
    let centre = Ellipse::iec_60081("F6500").expect("a named ellipse").centre;
    assert!((cct_duv(centre.uv()).expect("a CCT").duv - 0.0071).abs() < 5e-5);
}
