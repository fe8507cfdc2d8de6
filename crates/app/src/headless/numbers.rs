//! Parsers of the numbers on the command line; each says what was expected and what was found.

/// A finite number.
pub(super) fn number(text: &str) -> Result<f64, String> {
    let value = text.trim().parse::<f64>().ok().filter(|v| v.is_finite());
    value.ok_or_else(|| format!("expected a number, found `{text}`"))
}

/// A number above zero.
pub(super) fn positive(text: &str) -> Result<f64, String> {
    number(text).ok().filter(|v| *v > 0.0).ok_or_else(|| format!("expected a number above 0, found `{text}`"))
}

/// A correlated colour temperature a blend may be asked for.
pub(super) fn cct_k(text: &str) -> Result<f64, String> {
    number(text)
        .ok()
        .filter(|v| (1000.0..=20_000.0).contains(v))
        .ok_or_else(|| format!("expected 1000 to 20000 K, found `{text}`"))
}

/// A distance from the Planckian locus a blend may be asked for.
pub(super) fn duv(text: &str) -> Result<f64, String> {
    number(text)
        .ok()
        .filter(|v| v.abs() <= 0.05)
        .ok_or_else(|| format!("expected -0.05 to 0.05 (CIE 1960 uv), found `{text}`"))
}

/// A fraction above 0 and at most 1.
pub(super) fn fraction(text: &str) -> Result<f64, String> {
    number(text)
        .ok()
        .filter(|v| *v > 0.0 && *v <= 1.0)
        .ok_or_else(|| format!("expected fractions above 0 and at most 1, found `{text}`"))
}

/// A count of at least one.
pub(super) fn count(text: &str) -> Result<usize, String> {
    text.trim()
        .parse()
        .ok()
        .filter(|v| *v > 0)
        .ok_or_else(|| format!("expected a whole number of at least 1, found `{text}`"))
}

/// A number of boxes; none at all is allowed.
pub(super) fn boxes(text: &str) -> Result<u64, String> {
    text.trim().parse().map_err(|_| format!("expected a whole number of boxes, found `{text}`"))
}

/// A range with both ends, above zero.
pub(super) fn span(text: &str) -> Result<(f64, f64), String> {
    let ends =
        text.split_once("..").and_then(|(low, high)| Some((positive(low).ok()?, positive(high).ok()?)));
    ends.filter(|(low, high)| low <= high)
        .ok_or_else(|| format!("expected a range such as 420..680, found `{text}`"))
}
