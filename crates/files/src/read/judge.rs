//! What looks wrong with a spectrum, its dark level, its peak and width. Rules and thresholds: docs/methods/reading.md.

use super::reading::DarkEstimate;

/// Least samples of a wing that may tell the dark level (common practice).
const WING_SAMPLES: usize = 20;
/// Least length of such a wing, nm.
const WING_NM: f64 = 15.0;
/// A dark level below this fraction of the peak is left alone.
pub(super) const DARK_OF_PEAK: f64 = 0.02;
/// An end above this fraction of the peak is cut off (common practice).
const CUT_OF_PEAK: f64 = 0.01;
/// Negative area above this fraction of the positive area is worth a warning (common practice).
const NEGATIVE_AREA: f64 = 0.005;

/// Findings about one spectrum.
#[derive(Debug, Clone, Default)]
pub(super) struct Judgement {
    pub(super) dark: Option<DarkEstimate>,
    pub(super) peak_nm: f64,
    pub(super) fwhm_nm: Option<f64>,
    pub(super) warnings: Vec<String>,
    /// The hole that may hide the peak, nm.
    pub(super) hole: Option<(f64, f64)>,
    pub(super) mostly_negative: bool,
    /// Negative area as a fraction of the positive.
    pub(super) negative_area: f64,
}

/// Judges `values` (the file's own) over ascending `nm`; `power` are the same after conversion by `factors`.
pub(super) fn judge(nm: &[f64], values: &[f64], factors: &dyn Fn(f64) -> f64) -> Judgement {
    let mut found = Judgement { dark: dark(nm, values), ..Judgement::default() };
    let level = found.dark.filter(|dark| dark.of_peak > DARK_OF_PEAK).map_or(0.0, |dark| dark.level);
    if let Some(dark) = found.dark.filter(|_| level > 0.0) {
        found.warnings.push(format!(
            "a dark level of {} ({:.1} % of the peak, noise {}) lies under the spectrum, by {:.0}–{:.0} nm; peak and width are taken above it, the samples are unchanged",
            short(dark.level),
            100.0 * dark.of_peak,
            short(dark.noise),
            dark.wing_nm.0,
            dark.wing_nm.1
        ));
    }
    let above: Vec<f64> = nm.iter().zip(values).map(|(&nm, &value)| (value - level) * factors(nm)).collect();
    let peak = above
        .iter()
        .copied()
        .enumerate()
        .max_by(|a, b| a.1.total_cmp(&b.1).then(b.0.cmp(&a.0)))
        .map_or(0, |one| one.0);
    found.peak_nm = nm[peak];
    found.fwhm_nm = fwhm(nm, &above, above[peak]);
    negatives(nm, &above, &mut found);
    let flat = is_flat(values);
    if flat {
        found.warnings.push("all values are nearly the same: no emission is seen".into());
    } else if is_noise(values) {
        found.warnings.push("the values scatter like noise: no emission stands out".into());
    } else {
        found.hole = hole(nm, &above, peak);
        if let Some(sentence) = spike(nm, &above) {
            found.warnings.push(sentence);
        }
        if let Some(sentence) = saturated(nm, values) {
            found.warnings.push(sentence);
        }
        let noise = found.dark.map_or(0.0, |dark| dark.noise);
        if let Some(sentence) = cut(nm, &above, above[peak], noise) {
            found.warnings.push(sentence);
        }
    }
    if let Some((from, to)) = found.hole.or_else(|| widest_gap(nm)) {
        found
            .warnings
            .push(format!("no samples between {from} and {to} nm: the gap is bridged by a straight line"));
    }
    found
}

/// A number for a sentence: four significant digits.
pub(super) fn short(value: f64) -> String {
    if value == 0.0 {
        return "0".into();
    }
    let digits = value.abs().log10().floor();
    if (-3.0..6.0).contains(&digits) {
        let decimals = (3.0 - digits).clamp(0.0, 7.0) as usize;
        let text = format!("{value:.decimals$}");
        if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.').to_owned() } else { text }
    } else {
        format!("{value:.3e}")
    }
}

fn median(values: &mut [f64]) -> f64 {
    if values.is_empty() {
        return 0.0;
    }
    let middle = values.len() / 2;
    *values.select_nth_unstable_by(middle, f64::total_cmp).1
}

/// The dark level: the median of a wing that neither rises nor falls and that nothing in the spectrum lies below.
fn dark(nm: &[f64], values: &[f64]) -> Option<DarkEstimate> {
    let count = nm.len();
    if count < 2 * WING_SAMPLES {
        return None;
    }
    let peak = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    let floor = sorted[count / 50];
    let left = WING_SAMPLES.max(nm.partition_point(|&one| one < nm[0] + WING_NM));
    let right = WING_SAMPLES.max(count - nm.partition_point(|&one| one <= nm[count - 1] - WING_NM));
    let ends = [
        median(&mut values[..left.min(count)].to_vec()),
        median(&mut values[count.saturating_sub(right)..].to_vec()),
    ];
    let wings = [(0, left, ends[1]), (count.saturating_sub(right), count, ends[0])];
    let mut best: Option<DarkEstimate> = None;
    for (from, to, other) in wings {
        if to - from > count / 2 {
            continue;
        }
        let wing = &values[from..to];
        let level = median(&mut wing.to_vec());
        let half = wing.len() / 2;
        let (early, late) = (median(&mut wing[..half].to_vec()), median(&mut wing[half..].to_vec()));
        // Noise about the line through the two halves: a slope is no noise.
        let slope = (late - early) / half as f64;
        let about =
            |(index, value): (usize, &f64)| (value - level - slope * (index as f64 - half as f64)).abs();
        let noise = 1.4826 * median(&mut wing.iter().enumerate().map(about).collect::<Vec<_>>());
        // The medians of two halves of pure noise differ by about 1.77·noise/√half; three times that is allowed.
        let allowed = (5.3 * noise / (half as f64).sqrt()).max(0.02 * level.abs());
        let flat = (late - early).abs() <= allowed && noise <= 0.05 * (peak - level);
        let tolerance = 4.0 * noise + 0.01 * (peak - level);
        let under = floor >= level - tolerance && other >= level - tolerance;
        // An offset that high shows at both ends.
        let sure = level < 0.25 * peak || (other - level).abs() <= tolerance;
        if peak > level && flat && under && sure && best.is_none_or(|one| level < one.level) {
            best =
                Some(DarkEstimate { level, noise, of_peak: level / peak, wing_nm: (nm[from], nm[to - 1]) });
        }
    }
    best
}

/// Distance of the outermost half-maximum crossings, straight lines between samples.
fn fwhm(nm: &[f64], above: &[f64], peak: f64) -> Option<f64> {
    if peak.is_nan() || peak <= 0.0 {
        return None;
    }
    let half = 0.5 * peak;
    let first = above.iter().position(|&value| value >= half)?;
    let last = above.iter().rposition(|&value| value >= half)?;
    if first == 0 || last + 1 == above.len() {
        return None;
    }
    let cross = |low: usize, high: usize| {
        nm[low] + (nm[high] - nm[low]) * ((half - above[low]) / (above[high] - above[low]))
    };
    Some(cross(last + 1, last) - cross(first - 1, first))
}

fn negatives(nm: &[f64], above: &[f64], found: &mut Judgement) {
    let (mut negative, mut positive, mut below) = (0.0, 0.0, 0_usize);
    let mut lowest = 0.0_f64;
    let mut highest = 0.0_f64;
    for (index, &value) in above.iter().enumerate() {
        let left = if index > 0 { nm[index] - nm[index - 1] } else { 0.0 };
        let right = if index + 1 < nm.len() { nm[index + 1] - nm[index] } else { 0.0 };
        let area = value * 0.5 * (left + right);
        if value < 0.0 {
            negative -= area;
            below += 1;
        } else {
            positive += area;
        }
        lowest = lowest.min(value);
        highest = highest.max(value);
    }
    if negative <= 0.0 {
        return;
    }
    found.negative_area = if positive > 0.0 { negative / positive } else { f64::INFINITY };
    let most = 2 * below > above.len();
    found.mostly_negative = found.negative_area > 1.0 || (most && found.negative_area > 0.5);
    // Noise about zero is half negative and must stay: its negative area is 0.4 standard deviations (half-normal mean, half
    // the time).
    let noise = noise(nm, above);
    let by_noise = 0.4 * noise * (nm[nm.len() - 1] - nm[0]);
    let large = negative > (NEGATIVE_AREA * positive).max(1.5 * by_noise);
    let deep = -lowest > (0.02 * highest).max(5.5 * noise);
    if large || deep {
        let percent = 100.0 * found.negative_area.min(9.99);
        found.warnings.push(format!(
            "{below} of {} values are negative, {percent:.1} % of the area; they are kept",
            above.len()
        ));
    }
}

/// Standard deviation of sample-to-sample noise, from the median size of second differences against the line between
/// neighbours (variance 1.5 σ² on even steps).
fn noise(nm: &[f64], above: &[f64]) -> f64 {
    let mut bends: Vec<f64> = (1..nm.len().saturating_sub(1))
        .map(|index| {
            let share = (nm[index] - nm[index - 1]) / (nm[index + 1] - nm[index - 1]);
            (above[index] - above[index - 1] - share * (above[index + 1] - above[index - 1])).abs()
        })
        .collect();
    1.4826 * median(&mut bends) / 1.5_f64.sqrt()
}

/// Less than 5 % between nearly the least and nearly the largest value.
fn is_flat(values: &[f64]) -> bool {
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    let (low, high) = (sorted[sorted.len() / 20], sorted[sorted.len() - 1]);
    high > 0.0 && high - low < 0.05 * high && high - sorted[0] < 0.1 * high
}

/// Neighbours that know nothing of each other (their mean squared difference is near twice the variance: von Neumann's ratio,
/// Annals of Mathematical Statistics 12:367, 1941), and no sample beyond the scatter of the others.
fn is_noise(values: &[f64]) -> bool {
    const FEWEST: usize = 40;
    const RATIO: f64 = 1.4;
    const SCATTER: f64 = 6.0;
    if values.len() < FEWEST {
        return false;
    }
    let count = values.len() as f64;
    let mean = values.iter().sum::<f64>() / count;
    let variance = values.iter().map(|value| (value - mean).powi(2)).sum::<f64>() / count;
    let steps = values.windows(2).map(|pair| (pair[1] - pair[0]).powi(2)).sum::<f64>() / (count - 1.0);
    let middle = median(&mut values.to_vec());
    let mut away: Vec<f64> = values.iter().map(|value| (value - middle).abs()).collect();
    let most = away.iter().copied().fold(0.0, f64::max);
    // 1.4826 turns the median deviation of normal scatter into its standard deviation.
    variance > 0.0 && steps > RATIO * variance && most < SCATTER * 1.4826 * median(&mut away)
}

/// One sample far from the line between its neighbours while the rest is smooth.
fn spike(nm: &[f64], above: &[f64]) -> Option<String> {
    let count = above.len();
    if count < 7 {
        return None;
    }
    let excess = |index: usize| {
        let share = (nm[index] - nm[index - 1]) / (nm[index + 1] - nm[index - 1]);
        above[index] - (above[index - 1] + share * (above[index + 1] - above[index - 1]))
    };
    let index = (1..count - 1).max_by(|&a, &b| excess(a).total_cmp(&excess(b)))?;
    let own = excess(index);
    let near = |other: usize| other.abs_diff(index) <= 2;
    let roughest =
        (1..count - 1).filter(|&other| !near(other)).map(|other| excess(other).abs()).fold(0.0, f64::max);
    let rest = (0..count).filter(|&other| other != index).map(|other| above[other]).fold(0.0, f64::max);
    // A narrow line on nothing is the emission itself.
    let emission = (0..count).filter(|&other| !near(other)).map(|other| above[other]).fold(0.0, f64::max);
    if emission < 0.02 * above[index] || emission < 3.0 * roughest {
        return None;
    }
    // Both neighbours lie near what surrounds them, so the feature is one sample wide.
    let shoulders = above[index - 1].max(above[index + 1]);
    let single = own > 0.5 * (above[index] - shoulders.min(above[index])).abs() && above[index] > shoulders;
    (rest > 0.0
        && own > 0.1 * rest
        && own > 5.0 * roughest
        && single
        && above[index] - shoulders > 0.1 * rest)
        .then(|| format!("the sample at {} nm stands far above its neighbours: a spike?", short(nm[index])))
}

/// A run of samples at the very top with steep ends: the detector was full.
fn saturated(nm: &[f64], values: &[f64]) -> Option<String> {
    let count = values.len();
    let top = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    if top.is_nan() || top <= 0.0 {
        return None;
    }
    let at_top = |index: usize| values[index] >= top * (1.0 - 1e-9);
    // The longest run at the top.
    let (mut best, mut start) = ((0, 0), None);
    for index in 0..=count {
        if index < count && at_top(index) {
            start = start.or(Some(index));
        } else if let Some(from) = start.take()
            && index - from > best.1 - best.0
        {
            best = (from, index);
        }
    }
    let (from, to) = best;
    let run = to - from;
    let full_scale = [255.0, 1023.0, 4095.0, 16383.0, 65535.0].contains(&top);
    if run < if full_scale { 2 } else { 4 } {
        return None;
    }
    // Rounding makes plateaus too; a parabola flat over four or more samples then falls by at most three rounding steps.
    let step = rounding_step(values, top);
    let drop =
        |index: Option<usize>| index.and_then(|index| values.get(index)).map_or(0.0, |value| top - value);
    let fall = drop(from.checked_sub(1)).max(drop(Some(to)));
    let steep = fall > (4.0 * step).max(0.002 * top);
    (full_scale || steep).then(|| {
        format!(
            "{run} samples by {}–{} nm stand at the very top: saturated?",
            short(nm[from]),
            short(nm[to - 1])
        )
    })
}

/// The power of ten that all values above half of the largest, `top`, are multiples of; 0 below nine digits.
fn rounding_step(values: &[f64], top: f64) -> f64 {
    let leading = top.log10().floor() as i32;
    let whole = |step: f64| {
        let upper = values.iter().filter(|&&value| value > 0.5 * top);
        upper.map(|value| value / step).all(|steps| (steps - steps.round()).abs() < 1e-3)
    };
    (0..=9).map(|digits| 10_f64.powi(leading - digits)).find(|&step| whole(step)).unwrap_or(0.0)
}

/// An end inside 380–780 nm where the spectrum has not died away.
fn cut(nm: &[f64], above: &[f64], peak: f64, noise: f64) -> Option<String> {
    let count = nm.len();
    let end = |slice: &[f64]| {
        let mut values = slice.to_vec();
        median(&mut values)
    };
    let width = 3.min(count);
    let first = end(&above[..width]);
    let last = end(&above[count - width..]);
    let limit = CUT_OF_PEAK * peak + 3.0 * noise;
    let mut ends = Vec::new();
    if nm[0] > 380.5 && first > limit {
        ends.push((nm[0], first));
    }
    if nm[count - 1] < 779.5 && last > limit {
        ends.push((nm[count - 1], last));
    }
    let list: Vec<String> = ends
        .iter()
        .map(|(nm, value)| format!("{} nm at {:.1} % of the peak", short(*nm), 100.0 * value / peak))
        .collect();
    (!list.is_empty())
        .then(|| format!("the spectrum is cut off at {}; zero is assumed beyond", list.join(" and at ")))
}

/// The typical step around a gap: the median of up to ten steps on either side.
fn typical_step(nm: &[f64], gap: usize) -> f64 {
    let from = gap.saturating_sub(10);
    let to = (gap + 11).min(nm.len() - 1);
    let mut steps: Vec<f64> =
        (from..to).filter(|&index| index != gap).map(|index| nm[index + 1] - nm[index]).collect();
    if steps.is_empty() { f64::INFINITY } else { median(&mut steps) }
}

/// A gap the peak may hide in, with steps three times as wide as those around it: the samples rise towards it from both sides, and the lines through them meet clearly above the
/// largest sample.
fn hole(nm: &[f64], above: &[f64], peak: usize) -> Option<(f64, f64)> {
    let count = nm.len();
    let top = above[peak];
    for gap in 1..count.saturating_sub(2) {
        let beside = gap == peak || gap + 1 == peak;
        if !beside && above[gap].min(above[gap + 1]) < 0.3 * top {
            continue;
        }
        let (a, b) = (gap, gap + 1);
        let width = nm[b] - nm[a];
        if width < 2.9 * typical_step(nm, gap) || width < 1.0 {
            continue;
        }
        let reach = 3.min(gap).min(count - 1 - b);
        let rise = (above[a] - above[a - reach]) / (nm[a] - nm[a - reach]);
        let fall = (above[b] - above[b + reach]) / (nm[b + reach] - nm[b]);
        // Where the two lines meet, and how high.
        let slopes = rise + fall;
        if rise < 0.0 || fall < 0.0 || slopes <= 0.0 {
            continue;
        }
        let meet = (above[b] - above[a] + fall * width) / slopes;
        if meet <= 0.0 || meet >= width {
            continue;
        }
        let height = above[a] + rise * meet;
        // Straight lines overshoot a rounded peak; beside the largest sample any rise counts.
        if height > if beside { 1.02 } else { 1.2 } * top {
            return Some((nm[a], nm[b]));
        }
    }
    None
}

/// The widest gap when it is out of proportion: over 10 nm and over five times the steps around it.
fn widest_gap(nm: &[f64]) -> Option<(f64, f64)> {
    let gap = (0..nm.len() - 1).max_by(|&a, &b| (nm[a + 1] - nm[a]).total_cmp(&(nm[b + 1] - nm[b])))?;
    let width = nm[gap + 1] - nm[gap];
    (width > 10.0 && width > 5.0 * typical_step(nm, gap)).then_some((nm[gap], nm[gap + 1]))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn grid() -> Vec<f64> {
        (380..=780).map(f64::from).collect()
    }

    fn gaussian(nm: &[f64], centre: f64, width: f64) -> Vec<f64> {
        nm.iter().map(|nm| (-4.0 * 2f64.ln() * ((nm - centre) / width).powi(2)).exp()).collect()
    }

    fn found(nm: &[f64], values: &[f64]) -> Judgement {
        judge(nm, values, &|_| 1.0)
    }

    #[test]
    fn a_clean_gaussian_is_left_in_peace() {
        for width in [12.0, 25.0, 60.0, 100.0] {
            let nm = grid();
            let judged = found(&nm, &gaussian(&nm, 560.0, width));
            assert_eq!(judged.warnings, Vec::<String>::new(), "{width}");
            assert_eq!(judged.peak_nm, 560.0);
            assert!((judged.fwhm_nm.unwrap() - width).abs() < 0.05);
            assert!(judged.hole.is_none() && !judged.mostly_negative);
        }
    }

    #[test]
    fn an_offset_is_found_and_peak_and_width_lie_above_it() {
        let nm = grid();
        let mut state = 1_u64;
        let mut noise = || {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            (state >> 33) as f64 / f64::from(1_u32 << 31) - 0.5
        };
        let values: Vec<f64> =
            gaussian(&nm, 530.0, 30.0).iter().map(|value| 1000.0 * value + 300.0 + 4.0 * noise()).collect();
        let judged = found(&nm, &values);
        let dark = judged.dark.unwrap();
        assert!((dark.level - 300.0).abs() < 2.0 && dark.noise > 0.3 && dark.noise < 4.0, "{dark:?}");
        assert!((judged.fwhm_nm.unwrap() - 30.0).abs() < 0.5);
        assert_eq!(judged.warnings.len(), 1, "{:?}", judged.warnings);
    }

    #[test]
    fn what_looks_wrong_is_said_and_nothing_else() {
        let nm = grid();
        let clean = gaussian(&nm, 530.0, 30.0);
        let says = |values: &[f64], word: &str| {
            let judged = found(&nm, values);
            assert!(
                judged.warnings.len() == 1 && judged.warnings[0].contains(word),
                "{word}: {:?}",
                judged.warnings
            );
        };
        let mut spiked = clean.clone();
        spiked[250] = 0.8;
        says(&spiked, "spike");
        says(&clean.iter().map(|value| value.min(0.6)).collect::<Vec<_>>(), "saturated");
        says(&clean.iter().map(|value| value.min(0.95)).collect::<Vec<_>>(), "saturated");
        says(&[3.0; 401], "nearly the same");
        // Scatter without a trend, from the fractional parts of multiples of the golden section's square.
        let scatter: Vec<f64> =
            (0..401).map(|i| 1.0 + (f64::from(i).powi(2) * 0.381_966_011_250_105).fract()).collect();
        says(&scatter, "noise");
        let short: Vec<f64> = nm[..170].to_vec();
        assert!(found(&short, &clean[..170]).warnings[0].contains("cut off"));
        says(&clean.iter().map(|value| value - 0.03).collect::<Vec<_>>(), "negative");
        // Rounding to two decimals is no saturation.
        assert!(
            found(&nm, &clean.iter().map(|value| (value * 100.0).round() / 100.0).collect::<Vec<_>>())
                .warnings
                .is_empty()
        );
    }

    #[test]
    fn a_hole_across_the_peak_is_told_from_one_beside_it() {
        let nm = grid();
        let clean = gaussian(&nm, 530.0, 30.0);
        let without = |from: f64, to: f64| -> (Vec<f64>, Vec<f64>) {
            nm.iter()
                .zip(&clean)
                .filter(|(nm, _)| **nm < from || **nm > to)
                .map(|(nm, value)| (*nm, *value))
                .unzip()
        };
        for (from, to) in [(525.0, 535.0), (515.0, 545.0), (520.0, 534.0), (528.0, 545.0)] {
            let (nm, values) = without(from, to);
            assert!(found(&nm, &values).hole.is_some(), "{from}–{to}");
        }
        for (from, to) in [(600.0, 640.0), (532.0, 560.0)] {
            let (nm, values) = without(from, to);
            let judged = found(&nm, &values);
            assert!(
                judged.hole.is_none() && judged.warnings.iter().any(|one| one.contains("bridged")),
                "{from}–{to}"
            );
        }
    }
}
