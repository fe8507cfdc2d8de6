//! Which whites a set can make at all: the reachable polygon in CIE 1960 uv and the nearest point of it.
//!
//! Shares within bounds, sum 1, map to uv by a ratio of linear forms, which keeps convexity: the reachable whites are a convex
//! polygon. Its extreme point in a direction is a fractional knapsack (Dinkelbach's iteration over a greedy fill); the corners follow by
//! looking outward from every chord.

#[cfg(test)]
use colour::Uv;

/// A corner of the reachable polygon with a blend that makes it.
#[derive(Clone, Debug)]
pub(crate) struct Corner {
    pub(crate) uv: [f64; 2],
    pub(crate) shares: Vec<f64>,
}

/// The reachable polygon; corners in order.
#[derive(Clone, Debug)]
pub(crate) struct Gamut {
    pub(crate) corners: Vec<Corner>,
}

/// A reachable white nearest to somewhere.
#[derive(Clone, Debug)]
pub(crate) struct NearestWhite {
    pub(crate) uv: [f64; 2],
    pub(crate) shares: Vec<f64>,
    pub(crate) distance: f64,
}

struct Fill<'a> {
    /// 4X, 6Y and X + 15Y + 3Z of each emitter.
    forms: Vec<[f64; 3]>,
    bounds: &'a [(f64, f64)],
}

impl Fill<'_> {
    /// The blend whose uv reaches furthest along `g`.
    fn extreme(&self, g: [f64; 2]) -> Option<Corner> {
        let n = self.forms.len();
        let mut order: Vec<usize> = (0..n).collect();
        let mut lambda = 0.0;
        let mut best: Option<Corner> = None;
        for round in 0..60 {
            let gain =
                |i: usize| g[0] * self.forms[i][0] + g[1] * self.forms[i][1] - lambda * self.forms[i][2];
            order.sort_by(|&a, &b| gain(b).total_cmp(&gain(a)).then(a.cmp(&b)));
            let mut shares: Vec<f64> = self.bounds.iter().map(|b| b.0).collect();
            let mut left = 1.0 - shares.iter().sum::<f64>();
            for &i in &order {
                if left <= 0.0 {
                    break;
                }
                let more = (self.bounds[i].1 - shares[i]).min(left);
                shares[i] += more;
                left -= more;
            }
            if left.abs() > 1e-9 {
                return None;
            }
            let s = self.sums(&shares);
            if s[2] <= 0.0 {
                return None;
            }
            let uv = [s[0] / s[2], s[1] / s[2]];
            let value = g[0] * uv[0] + g[1] * uv[1];
            let done = round > 0 && value <= lambda + 1e-15;
            if best.is_none() || value > lambda {
                best = Some(Corner { uv, shares });
            }
            if done {
                break;
            }
            lambda = value;
        }
        best
    }

    fn sums(&self, shares: &[f64]) -> [f64; 3] {
        let mut s = [0.0; 3];
        for (f, w) in self.forms.iter().zip(shares) {
            for k in 0..3 {
                s[k] += w * f[k];
            }
        }
        s
    }

    fn outward(&self, a: &Corner, b: &Corner, depth: u32, out: &mut Vec<Corner>) {
        let edge = [b.uv[0] - a.uv[0], b.uv[1] - a.uv[1]];
        let length = edge[0].hypot(edge[1]);
        if depth == 0 || length < 1e-13 {
            return;
        }
        // corners run anticlockwise: outward is to the right of a→b
        let g = [edge[1] / length, -edge[0] / length];
        let Some(c) = self.extreme(g) else { return };
        let beyond = g[0] * (c.uv[0] - a.uv[0]) + g[1] * (c.uv[1] - a.uv[1]);
        if beyond < 1e-12 {
            return;
        }
        self.outward(a, &c, depth - 1, out);
        out.push(c.clone());
        self.outward(&c, b, depth - 1, out);
    }
}

impl Gamut {
    /// The reachable polygon of emitters (2° XYZ at unit power) within share bounds; None when the bounds admit no blend that
    /// gives light.
    pub(crate) fn new(xyz: &[[f64; 3]], bounds: &[(f64, f64)]) -> Option<Gamut> {
        let fill = Fill {
            forms: xyz.iter().map(|x| [4.0 * x[0], 6.0 * x[1], x[0] + 15.0 * x[1] + 3.0 * x[2]]).collect(),
            bounds,
        };
        let (left, right) = (fill.extreme([-1.0, 0.0])?, fill.extreme([1.0, 0.0])?);
        let mut corners = vec![left.clone()];
        fill.outward(&left, &right, 24, &mut corners);
        if (right.uv[0] - left.uv[0]).hypot(right.uv[1] - left.uv[1]) > 1e-13 {
            corners.push(right.clone());
            fill.outward(&right, &left, 24, &mut corners);
        } else if let (Some(low), Some(high)) = (fill.extreme([0.0, -1.0]), fill.extreme([0.0, 1.0])) {
            // all whites on one vertical line, or one point
            corners = vec![low, high];
        }
        Some(Gamut { corners })
    }

    /// The reachable white nearest to a point.
    #[cfg(test)]
    pub(crate) fn nearest(&self, to: Uv, xyz: &[[f64; 3]]) -> NearestWhite {
        self.nearest_to_polygon(&[[to.u, to.v]], xyz)
    }

    /// The reachable white nearest to a convex region (a point, or corners in order).
    pub(crate) fn nearest_to_polygon(&self, region: &[[f64; 2]], xyz: &[[f64; 3]]) -> NearestWhite {
        let mine: Vec<[f64; 2]> = self.corners.iter().map(|c| c.uv).collect();
        for p in region {
            if inside(&mine, *p) {
                return NearestWhite { uv: *p, shares: Vec::new(), distance: 0.0 };
            }
        }
        let mut best: Option<(f64, usize, f64, [f64; 2])> = None;
        let k = mine.len();
        for i in 0..k {
            let (a, b) = (mine[i], mine[(i + 1) % k]);
            if inside(region, a) {
                return NearestWhite { uv: a, shares: self.corners[i].shares.clone(), distance: 0.0 };
            }
            let m = region.len();
            for r in 0..m {
                let (c, d) = (region[r], region[(r + 1) % m]);
                let (s, p, q) = segment_pair(a, b, c, d);
                let distance = (p[0] - q[0]).hypot(p[1] - q[1]);
                if best.is_none_or(|b| distance < b.0 - 1e-15) {
                    best = Some((distance, i, s, p));
                }
            }
        }
        let Some((distance, i, s, uv)) = best else {
            return NearestWhite { uv: [0.0, 0.0], shares: Vec::new(), distance: f64::INFINITY };
        };
        // The blend on the chord: weights in proportion to the projective denominators.
        let (a, b) = (&self.corners[i].shares, &self.corners[(i + 1) % k].shares);
        let den = |shares: &[f64]| -> f64 {
            shares.iter().zip(xyz).map(|(w, x)| w * (x[0] + 15.0 * x[1] + 3.0 * x[2])).sum()
        };
        let (wa, wb) = ((1.0 - s) / den(a), s / den(b));
        let sum = wa + wb;
        let shares = a.iter().zip(b).map(|(x, y)| (wa * x + wb * y) / sum).collect();
        NearestWhite { uv, shares, distance }
    }
}

/// Whether a point lies inside a convex polygon whose corners run either way round (edges count as inside).
pub(crate) fn inside(polygon: &[[f64; 2]], p: [f64; 2]) -> bool {
    let k = polygon.len();
    if k < 3 {
        return false;
    }
    let (mut left, mut right) = (false, false);
    for i in 0..k {
        let (a, b) = (polygon[i], polygon[(i + 1) % k]);
        let cross = (b[0] - a[0]) * (p[1] - a[1]) - (b[1] - a[1]) * (p[0] - a[0]);
        left |= cross > 1e-15;
        right |= cross < -1e-15;
    }
    !(left && right)
}

/// Nearest points of two segments: position along the first (0–1) and both points.
fn segment_pair(a: [f64; 2], b: [f64; 2], c: [f64; 2], d: [f64; 2]) -> (f64, [f64; 2], [f64; 2]) {
    let at = |p: [f64; 2], q: [f64; 2], s: f64| [p[0] + s * (q[0] - p[0]), p[1] + s * (q[1] - p[1])];
    let onto = |p: [f64; 2], q: [f64; 2], x: [f64; 2]| {
        let e = [q[0] - p[0], q[1] - p[1]];
        let l = e[0] * e[0] + e[1] * e[1];
        if l <= 0.0 { 0.0 } else { (((x[0] - p[0]) * e[0] + (x[1] - p[1]) * e[1]) / l).clamp(0.0, 1.0) }
    };
    // crossing segments
    let (r, s) = ([b[0] - a[0], b[1] - a[1]], [d[0] - c[0], d[1] - c[1]]);
    let det = r[0] * s[1] - r[1] * s[0];
    if det.abs() > 1e-300 {
        let e = [c[0] - a[0], c[1] - a[1]];
        let (t, u) = ((e[0] * s[1] - e[1] * s[0]) / det, (e[0] * r[1] - e[1] * r[0]) / det);
        if (0.0..=1.0).contains(&t) && (0.0..=1.0).contains(&u) {
            let p = at(a, b, t);
            return (t, p, p);
        }
    }
    let mut best = (f64::INFINITY, 0.0, a, c);
    let mut offer = |s: f64, p: [f64; 2], q: [f64; 2]| {
        let l = (p[0] - q[0]).hypot(p[1] - q[1]);
        if l < best.0 {
            best = (l, s, p, q);
        }
    };
    for q in [c, d] {
        let s = onto(a, b, q);
        offer(s, at(a, b, s), q);
    }
    for (s, p) in [(0.0, a), (1.0, b)] {
        let u = onto(c, d, p);
        offer(s, p, at(c, d, u));
    }
    (best.1, best.2, best.3)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn three_free_emitters_make_their_triangle() {
        let xyz = [[1.0, 0.5, 0.0], [0.3, 1.0, 0.05], [0.2, 0.05, 1.2]];
        let free = [(0.0, 1.0); 3];
        let g = Gamut::new(&xyz, &free).unwrap();
        assert_eq!(g.corners.len(), 3);
        let near = g.nearest(Uv { u: 0.2, v: 0.32 }, &xyz);
        assert_eq!(near.distance, 0.0);
        let far = g.nearest(Uv { u: 0.05, v: 0.1 }, &xyz);
        assert!(far.distance > 0.0);
        // the blend really makes the white it claims
        let mut s = [0.0; 3];
        for (x, w) in xyz.iter().zip(&far.shares) {
            for k in 0..3 {
                s[k] += w * x[k];
            }
        }
        let den = s[0] + 15.0 * s[1] + 3.0 * s[2];
        assert!((4.0 * s[0] / den - far.uv[0]).abs() < 1e-12 && (6.0 * s[1] / den - far.uv[1]).abs() < 1e-12);
    }

    #[test]
    fn locks_shrink_the_polygon_to_a_point() {
        let xyz = [[1.0, 0.5, 0.0], [0.3, 1.0, 0.05], [0.2, 0.05, 1.2]];
        let g = Gamut::new(&xyz, &[(0.2, 0.2), (0.5, 0.5), (0.3, 0.3)]).unwrap();
        let near = g.nearest(Uv { u: 0.0, v: 0.0 }, &xyz);
        for (share, lock) in near.shares.iter().zip([0.2, 0.5, 0.3]) {
            assert!((share - lock).abs() < 1e-12);
        }
        assert!(Gamut::new(&xyz, &[(0.0, 0.2); 3]).is_none());
    }
}
