//! Which whites a set can make at all.

use super::BlendView;
use colour::{UvPrime, Xyz};
use project::EmitterSet;

/// Corners of the chromaticities that the free rows can reach while the locked ones keep their shares, in u′v′, in order
/// round the outline; a single point when nothing is free, empty without light.
///
/// With locked power L and its tristimulus sum, the blends are L + (1 − ΣL)·(mixtures of the free rows). Chromaticity is a
/// projection of them, so the outline is the convex hull of the corners' chromaticities.
pub fn reachable_whites(set: &EmitterSet, blend: &BlendView) -> Vec<UvPrime> {
    let mut locked = [0.0; 3];
    let mut left = 1.0;
    for (member, row) in set.members.iter().zip(&blend.rows) {
        if let Some(light) = row.light.as_ref().filter(|_| member.on && member.locked) {
            left -= row.radiant;
            (0..3).for_each(|c| locked[c] += row.radiant * light.xyz[c]);
        }
    }
    let left = left.max(0.0);
    let corners: Vec<UvPrime> = set
        .members
        .iter()
        .zip(&blend.rows)
        .filter(|(member, _)| member.on && !member.locked)
        .filter_map(|(_, row)| row.light.as_ref())
        .map(|light| Xyz::from_array(std::array::from_fn(|c| locked[c] + left * light.xyz[c])).uv_prime())
        .filter(|point| point.u.is_finite() && point.v.is_finite())
        .collect();
    if corners.is_empty() {
        let fixed = Xyz::from_array(locked).uv_prime();
        return if fixed.u.is_finite() && fixed.v.is_finite() { vec![fixed] } else { Vec::new() };
    }
    hull(corners)
}

/// Convex hull by the monotone chain, counter-clockwise.
fn hull(mut points: Vec<UvPrime>) -> Vec<UvPrime> {
    points.sort_by(|a, b| a.u.total_cmp(&b.u).then(a.v.total_cmp(&b.v)));
    let turn = |o: UvPrime, a: UvPrime, b: UvPrime| (a.u - o.u) * (b.v - o.v) - (a.v - o.v) * (b.u - o.u);
    let half = |points: &mut dyn Iterator<Item = UvPrime>| {
        let mut chain: Vec<UvPrime> = Vec::new();
        for point in points {
            while let [.., a, b] = chain.as_slice() {
                if turn(*a, *b, point) > 0.0 {
                    break;
                }
                chain.pop();
            }
            chain.push(point);
        }
        chain.pop();
        chain
    };
    let mut lower = half(&mut points.iter().copied());
    let upper = half(&mut points.iter().rev().copied());
    lower.extend(upper);
    if lower.is_empty() { points } else { lower }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_hull_of_a_square_with_a_point_inside_has_four_corners() {
        let point = |u: f64, v: f64| UvPrime { u, v };
        let corners =
            hull(vec![point(0.0, 0.0), point(1.0, 0.0), point(0.4, 0.6), point(1.0, 1.0), point(0.0, 1.0)]);
        assert_eq!(corners.len(), 4);
        assert!(!corners.contains(&point(0.4, 0.6)));
    }
}
