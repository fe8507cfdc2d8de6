//! Numbers as a reader of paper wants them.

/// A number with so many significant digits, trailing zeros dropped, with a true minus; `unknown` when not finite.
///
/// Valid for 1–15 digits; magnitudes below 1e-9 show as 0 and none is shown with an exponent.
pub fn significant(value: f64, digits: u32) -> String {
    if !value.is_finite() {
        return "unknown".to_owned();
    }
    let magnitude = if value == 0.0 { 0 } else { value.abs().log10().floor() as i32 };
    let decimals = (digits.clamp(1, 15) as i32 - 1 - magnitude).clamp(0, 9) as usize;
    let text = format!("{value:.decimals$}");
    let text = if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.') } else { &text };
    with_true_minus(text)
}

/// The ends of an allowed band with so many significant digits, each rounded towards the inside, so that a value
/// inside the printed band is inside the true one. A band too narrow for the digits gets more of them.
pub fn band(low: Option<f64>, high: Option<f64>, digits: u32) -> (Option<String>, Option<String>) {
    let digits = digits.clamp(1, 15);
    let enough = (digits..=15)
        .find(|n| match (low, high) {
            (Some(low), Some(high)) => inward(low, *n, true) <= inward(high, *n, false),
            _ => true,
        })
        .unwrap_or(15);
    let shown = |value: f64, up: bool| significant(inward(value, enough, up), 15.min(enough + 1));
    (low.map(|v| shown(v, true)), high.map(|v| shown(v, false)))
}

/// The next number with so many significant digits, upwards or downwards.
fn inward(value: f64, digits: u32, up: bool) -> f64 {
    if !value.is_finite() || value == 0.0 {
        return value;
    }
    let magnitude = value.abs().log10().floor() as i32;
    let unit = 10f64.powi((magnitude + 1 - digits as i32).clamp(-9, 0));
    // A value that is already round must not be pushed a whole unit by its last bit.
    let count = value / unit;
    let nearest = count.round();
    let near = (count - nearest).abs() <= 1e-9 * count.abs().max(1.0);
    let whole = match (near, up) {
        (true, _) => nearest,
        (false, true) => count.ceil(),
        (false, false) => count.floor(),
    };
    whole * unit
}

/// A number with so many decimals and a true minus; `unknown` when not finite.
pub fn fixed(value: f64, decimals: usize) -> String {
    if value.is_finite() {
        with_true_minus(&format!("{value:.*}", decimals.min(12)))
    } else {
        "unknown".to_owned()
    }
}

/// A fraction as percent with one decimal.
pub fn percent(fraction: f64) -> String {
    if fraction.is_finite() { format!("{} %", fixed(100.0 * fraction, 1)) } else { "unknown".to_owned() }
}

fn with_true_minus(text: &str) -> String {
    match text.strip_prefix('-') {
        Some(rest) if rest.bytes().any(|b| (b'1'..=b'9').contains(&b)) => format!("−{rest}"),
        Some(rest) => rest.to_owned(),
        None => text.to_owned(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn digits_follow_the_magnitude() {
        assert_eq!(significant(123.456, 4), "123.5");
        assert_eq!(significant(0.001_234_56, 3), "0.00123");
        assert_eq!(significant(12.0, 4), "12");
        assert_eq!(significant(-3.5, 4), "−3.5");
        assert_eq!(significant(123_456.0, 3), "123456");
        assert_eq!(significant(0.0, 4), "0");
    }

    #[test]
    fn a_printed_band_lies_inside_the_true_one() {
        let ends = |low, high| {
            let (low, high) = band(Some(low), Some(high), 4);
            (low.unwrap_or_default(), high.unwrap_or_default())
        };
        assert_eq!(ends(4.97251, 5.22759), ("4.973".to_owned(), "5.227".to_owned()));
        assert_eq!(ends(92.16, 99.84), ("92.16".to_owned(), "99.84".to_owned()));
        assert_eq!(ends(-0.1, 0.3), ("−0.1".to_owned(), "0.3".to_owned()));
        assert_eq!(ends(5.0001, 5.0004), ("5.0001".to_owned(), "5.0004".to_owned()));
        assert_eq!(band(None, None, 4), (None, None));
    }

    #[test]
    fn what_is_unknown_is_said_so_and_zero_has_no_sign() {
        assert_eq!(significant(f64::NAN, 4), "unknown");
        assert_eq!(fixed(f64::INFINITY, 2), "unknown");
        assert_eq!(fixed(-0.0001, 2), "0.00");
        assert_eq!(percent(0.1234), "12.3 %");
    }
}
