//! One-dimensional searches: smallest value and root.

/// Place of the smallest value: a scan, then golden section between the neighbours of the best sample.
pub(crate) fn scan_minimum(f: impl FnMut(f64) -> f64, low: f64, high: f64, samples: usize) -> f64 {
    scan_minimum_to(f, low, high, samples, 60)
}

/// As [`scan_minimum`], with the number of golden-section steps (each narrows by 0.618).
pub(crate) fn scan_minimum_to(
    mut f: impl FnMut(f64) -> f64,
    low: f64,
    high: f64,
    samples: usize,
    golden_steps: usize,
) -> f64 {
    let step = (high - low) / samples as f64;
    let mut best = (low, f64::INFINITY);
    for k in 0..=samples {
        let at = if k == samples { high } else { low + step * k as f64 };
        let value = f(at);
        if value < best.1 {
            best = (at, value);
        }
    }
    let golden = (5f64.sqrt() - 1.0) / 2.0;
    let (mut a, mut b) = ((best.0 - step).max(low), (best.0 + step).min(high));
    let (mut c, mut d) = (b - golden * (b - a), a + golden * (b - a));
    let (mut fc, mut fd) = (f(c), f(d));
    for _ in 0..golden_steps {
        if fc <= fd {
            (b, d, fd) = (d, c, fc);
            c = b - golden * (b - a);
            fc = f(c);
        } else {
            (a, c, fc) = (c, d, fd);
            d = a + golden * (b - a);
            fd = f(d);
        }
    }
    let refined = if fc <= fd { (c, fc) } else { (d, fd) };
    if refined.1 <= best.1 { refined.0 } else { best.0 }
}

/// Root of a function that is negative at `low` and positive at `high`: false position with halving of the
/// stale end (Illinois rule), kept inside a shrinking bracket; the side where the function is not negative.
pub(crate) fn root_between(f: impl Fn(f64) -> f64, low: f64, high: f64) -> f64 {
    let (mut a, mut b) = (low, high);
    let (mut fa, mut fb) = (f(a), f(b));
    if fa >= 0.0 {
        return a;
    }
    let mut side = 0i8;
    for step in 0..120 {
        // Every third step halves the bracket, so that a bad shape cannot stall the search.
        let slope = (a * fb - b * fa) / (fb - fa);
        let middle =
            if step % 3 == 2 || slope <= a || slope >= b || slope.is_nan() { 0.5 * (a + b) } else { slope };
        if middle <= a || middle >= b {
            break;
        }
        let value = f(middle);
        if value == 0.0 {
            return middle;
        }
        if value < 0.0 {
            (a, fa) = (middle, value);
            if side == -1 {
                fb *= 0.5;
            }
            side = -1;
        } else {
            (b, fb) = (middle, value);
            if side == 1 {
                fa *= 0.5;
            }
            side = 1;
        }
    }
    b
}
