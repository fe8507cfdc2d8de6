//! Round numbers along a range, and lines of equal value on a map.

/// A point of a map, in columns and rows from the first.
pub type Place = [f64; 2];

/// The step 1, 2 or 5 · 10ⁿ that gives at most `most` steps over a range.
pub fn round_step(low: f64, high: f64, most: usize) -> f64 {
    let raw = ((high - low) / most.max(1) as f64).abs();
    if !(raw.is_finite() && raw > 0.0) {
        return 1.0;
    }
    let power = 10f64.powf(raw.log10().floor());
    let lead = raw / power;
    let lead = [1.0, 2.0, 5.0].into_iter().find(|l| *l >= lead - 1e-9).unwrap_or(10.0);
    lead * power
}

/// The multiples of [`round_step`] inside a closed range, ascending.
pub fn round_values(low: f64, high: f64, most: usize) -> Vec<f64> {
    let step = round_step(low, high, most);
    let first = (low / step - 1e-9).ceil();
    let last = (high / step + 1e-9).floor();
    let count = (last - first).clamp(-1.0, 1000.0) + 1.0;
    (0..count as usize).map(|k| (first + k as f64) * step).collect()
}

/// Decimals that tell multiples of a step apart.
pub fn decimals(step: f64) -> usize {
    (0..6).find(|d| (step * 10f64.powi(*d)).fract() < 1e-6 && step * 10f64.powi(*d) > 0.999).unwrap_or(6)
        as usize
}

/// The line where a map has a value, as separate segments (marching squares; cells with a hole are left out).
///
/// `map` holds rows of `columns` values. Where a cell's corners alternate, its middle decides.
pub fn line(map: &[Option<f64>], columns: usize, level: f64) -> Vec<[Place; 2]> {
    let mut segments = Vec::new();
    if columns < 2 {
        return segments;
    }
    let rows = map.len() / columns;
    for row in 1..rows {
        for column in 1..columns {
            let corner = |r: usize, c: usize| map[r * columns + c];
            let (Some(a), Some(b), Some(c), Some(d)) = (
                corner(row - 1, column - 1),
                corner(row - 1, column),
                corner(row, column),
                corner(row, column - 1),
            ) else {
                continue;
            };
            let (x, y) = (column as f64 - 1.0, row as f64 - 1.0);
            let sides = [
                ([x, y], [x + 1.0, y], a, b),
                ([x + 1.0, y], [x + 1.0, y + 1.0], b, c),
                ([x + 1.0, y + 1.0], [x, y + 1.0], c, d),
                ([x, y + 1.0], [x, y], d, a),
            ];
            let crossings: Vec<Place> = sides
                .iter()
                .filter(|(_, _, low, high)| (*low < level) != (*high < level))
                .map(|(from, to, low, high)| {
                    let t = (level - low) / (high - low);
                    [from[0] + (to[0] - from[0]) * t, from[1] + (to[1] - from[1]) * t]
                })
                .collect();
            match crossings.as_slice() {
                [p, q] => segments.push([*p, *q]),
                [p, q, r, s] => {
                    let middle = (a + b + c + d) / 4.0;
                    if (middle < level) == (a < level) {
                        segments.extend([[*p, *q], [*r, *s]]);
                    } else {
                        segments.extend([[*s, *p], [*q, *r]]);
                    }
                }
                _ => {}
            }
        }
    }
    segments
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn values_along_an_axis_are_round_and_inside_it() {
        assert_eq!(round_values(81.3, 97.6, 5), [85.0, 90.0, 95.0]);
        assert_eq!(round_values(-1.0, 1.0, 4), [-1.0, -0.5, 0.0, 0.5, 1.0]);
        assert_eq!(round_values(3.0, 3.0, 4), [3.0]);
        assert!((round_step(300.0, 400.0, 6) - 20.0).abs() < 1e-12);
        assert_eq!([decimals(20.0), decimals(0.5), decimals(0.02)], [0, 1, 2]);
    }

    #[test]
    fn the_line_of_a_slope_is_straight_and_where_the_slope_says() {
        // value = column + 2 row
        let map: Vec<Option<f64>> =
            (0..5).flat_map(|r| (0..6).map(move |c| Some(f64::from(c) + 2.0 * f64::from(r)))).collect();
        let segments = line(&map, 6, 4.5);
        assert!(segments.len() >= 4);
        for point in segments.iter().flatten() {
            assert!((point[0] + 2.0 * point[1] - 4.5).abs() < 1e-12, "{point:?}");
        }
        assert!(line(&map, 6, 40.0).is_empty());
    }

    #[test]
    fn a_hole_ends_the_line() {
        let mut map: Vec<Option<f64>> = (0..3).flat_map(|_| (0..3).map(|c| Some(f64::from(c)))).collect();
        assert_eq!(line(&map, 3, 0.5).len(), 2);
        map[0] = None;
        assert_eq!(line(&map, 3, 0.5).len(), 1);
    }

    #[test]
    fn a_saddle_gives_two_lines_that_do_not_cross() {
        let map = [Some(1.0), Some(0.0), Some(0.0), Some(1.0)];
        let segments = line(&map, 2, 0.4);
        assert_eq!(segments.len(), 2);
        // The middle (0.5) belongs with the high corners, so each line cuts off a low one.
        for [p, q] in segments {
            let middle = [(p[0] + q[0]) / 2.0, (p[1] + q[1]) / 2.0];
            let off_diagonal = (middle[0] - middle[1]).abs();
            assert!(off_diagonal > 0.3, "{middle:?}");
        }
    }
}
