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
    fn what_is_unknown_is_said_so_and_zero_has_no_sign() {
        assert_eq!(significant(f64::NAN, 4), "unknown");
        assert_eq!(fixed(f64::INFINITY, 2), "unknown");
        assert_eq!(fixed(-0.0001, 2), "0.00");
        assert_eq!(percent(0.1234), "12.3 %");
    }
}
