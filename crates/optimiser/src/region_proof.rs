//! A bound for a whole region of whites.
//!
//! The region is cut into slices between isotherms (straight lines in CIE 1960 uv). In a slice the white may move freely: its sides are linear rows on the blend, and
//! the rendering models hold for every reference of the slice. Each slice goes through the same branch and bound as an exact white; one that could
//! still beat the best blend is cut in two.

use crate::answer::Stop;
use crate::ask::{Ask, Wanted, white_of};
use crate::branch::{Effort, gap_at, prove};
use crate::ces::reference_area;
use crate::fixed::Plan;
use crate::problem::{Control, Problem};
use crate::region::{KIND_CHANGE_K, Piece, clip, isotherm, warm_side};
use colour::locus::{cct_duv, uv_at};
use colour::{Reference, Uv};
use std::time::Instant;

/// Relative gap a region is proven to.
pub(crate) const REGION_GAP: f64 = 5e-4;
/// Slices a piece starts with.
const FIRST: usize = 6;
/// Boxes spent on a slice before it is cut; doubled where they did not suffice.
const BOXES_EACH: u64 = 192;
/// Slices are not cut below this width.
const NARROWEST_K: f64 = 1e-2;

/// A part of a region between two isotherms.
pub(crate) struct Slice {
    pub(crate) cct_k: [f64; 2],
    /// Half-planes g·(u, v) ≤ c.
    pub(crate) sides: Vec<([f64; 2], f64)>,
    /// Greatest X, 1, Z of its corners.
    pub(crate) most: [f64; 3],
    pub(crate) middle: Reference,
    pub(crate) ends: [Reference; 2],
    /// Mean movement of the reference colours of CIE 224 from the middle to the further end.
    pub(crate) rf_slack: f64,
}

/// Half-planes of a convex polygon (either way round).
fn half_planes(polygon: &[[f64; 2]]) -> Vec<([f64; 2], f64)> {
    let k = polygon.len();
    let area: f64 = (0..k)
        .map(|i| {
            let (a, b) = (polygon[i], polygon[(i + 1) % k]);
            a[0] * b[1] - a[1] * b[0]
        })
        .sum();
    let sign = if area >= 0.0 { 1.0 } else { -1.0 };
    (0..k)
        .filter_map(|i| {
            let (a, b) = (polygon[i], polygon[(i + 1) % k]);
            let l = (b[0] - a[0]).hypot(b[1] - a[1]);
            if l < 1e-13 {
                return None;
            }
            let g = [sign * (b[1] - a[1]) / l, -sign * (b[0] - a[0]) / l];
            Some((g, g[0] * a[0] + g[1] * a[1] + 1e-12))
        })
        .collect()
}

/// A polygon that covers the part of a box between two isotherms.
fn cover(cct_k: [f64; 2], duv: [f64; 2]) -> Vec<[f64; 2]> {
    let at = |k: f64, d: f64| {
        let p = uv_at(k, d);
        [p.u, p.v]
    };
    // the curved sides bulge past their chords by a sagitta: move the corners out along their isotherms by a little more
    let bulge = |d: f64| {
        let (a, b) = (at(cct_k[0], d), at(cct_k[1], d));
        let l = (b[0] - a[0]).hypot(b[1] - a[1]).max(1e-300);
        (1..16)
            .map(|i| {
                let p = at(cct_k[0] + (cct_k[1] - cct_k[0]) * f64::from(i) / 16.0, d);
                (((p[0] - a[0]) * (b[1] - a[1]) - (p[1] - a[1]) * (b[0] - a[0])) / l).abs()
            })
            .fold(0.0, f64::max)
    };
    let (low, high) = (duv[0] - 1.3 * bulge(duv[0]) - 1e-9, duv[1] + 1.3 * bulge(duv[1]) + 1e-9);
    let out = |k: f64, d: f64| {
        let (p, e) = isotherm(k);
        [p[0] + d * e[0], p[1] + d * e[1]]
    };
    vec![out(cct_k[0], low), out(cct_k[1], low), out(cct_k[1], high), out(cct_k[0], high)]
}

/// The CCT range of a piece.
fn range(piece: &Piece) -> Option<[f64; 2]> {
    match piece {
        // a box without extent in CCT still needs a slice with one; a superset is bounded then
        Piece::Box { cct_k: [lo, hi], .. } if hi - lo < 0.02 => {
            let at_change = *lo >= KIND_CHANGE_K && lo - 0.01 < KIND_CHANGE_K;
            Some(if at_change { [*lo, hi + 0.02] } else { [lo - 0.01, hi + 0.01] })
        }
        Piece::Box { cct_k, .. } => Some(*cct_k),
        Piece::Polygon { corners, cct_k } => {
            let k = corners.len();
            let (mut lo, mut hi) = (f64::INFINITY, f64::NEG_INFINITY);
            for i in 0..k {
                let (a, b) = (corners[i], corners[(i + 1) % k]);
                for s in 0..8 {
                    let s = f64::from(s) / 8.0;
                    let c = cct_duv(Uv { u: a[0] + s * (b[0] - a[0]), v: a[1] + s * (b[1] - a[1]) })?;
                    lo = lo.min(c.cct_k);
                    hi = hi.max(c.cct_k);
                }
            }
            // an edge may touch an isotherm between the points looked at
            let spare = 0.02 * (hi - lo) + 0.1;
            Some([(lo - spare).max(cct_k[0]), (hi + spare).min(cct_k[1])])
        }
    }
}

impl Slice {
    pub(crate) fn new(piece: &Piece, cct_k: [f64; 2]) -> Option<Slice> {
        let polygon = match piece {
            Piece::Box { duv, .. } => cover(cct_k, *duv),
            Piece::Polygon { corners, .. } => {
                // warmer than the high end, cooler than the low one
                let ((g, c), (h, b)) = (warm_side(cct_k[1]), warm_side(cct_k[0]));
                clip(&clip(corners, g, c + 1e-12), [-h[0], -h[1]], -b + 1e-12)
            }
        };
        if polygon.len() < 3 {
            return None;
        }
        let mut most = [0.0, 1.0, 0.0];
        for p in &polygon {
            let w = white_of(Uv { u: p[0], v: p[1] });
            most[0] = f64::max(most[0], w[0]);
            most[2] = f64::max(most[2], w[2]);
        }
        let mid = 2.0 / (1.0 / cct_k[0] + 1.0 / cct_k[1]);
        let middle = Reference::at(mid);
        let ends = [Reference::at(cct_k[0]), Reference::at(cct_k[1])];
        let moved = |end: &Reference| {
            (0..99)
                .map(|i| {
                    let (a, b) = (end.ces_jab(i), middle.ces_jab(i));
                    ((a[0] - b[0]).powi(2) + (a[1] - b[1]).powi(2) + (a[2] - b[2]).powi(2)).sqrt()
                })
                .sum::<f64>()
                / 99.0
        };
        let rf_slack = 1.05 * moved(&ends[0]).max(moved(&ends[1]));
        Some(Slice { cct_k, sides: half_planes(&polygon), most, middle, ends, rf_slack })
    }
}

impl Slice {
    /// Relative change of the reference's polygon from the middle to the further end, samples binned as given.
    pub(crate) fn area_change(&self, bins: &Reference) -> f64 {
        let middle = reference_area(&self.middle, bins);
        let change = |end: &Reference| (reference_area(end, bins) / middle - 1.0).abs();
        1.05 * change(&self.ends[0]).max(change(&self.ends[1])) + 1e-12
    }

    /// The hue bins that occur in the slice, each to be bounded; None inside: not known, leave Rg out.
    pub(crate) fn bins(&self) -> Vec<Option<&Reference>> {
        let [a, b] = &self.ends;
        let changed = (0..99).filter(|&i| a.hue_bin(i) != b.hue_bin(i)).count();
        match changed {
            0 => vec![Some(a)],
            // a single sample changes its bin somewhere inside: before or after
            1 => vec![Some(a), Some(b)],
            _ => vec![None],
        }
    }
}

/// What the proof of a region found.
pub(crate) struct RegionProof {
    /// Nothing in the region exceeds this; −∞ when nothing in it meets the limits.
    pub(crate) upper: f64,
    pub(crate) boxes: u64,
    pub(crate) stop: Option<Stop>,
}

/// Bounds all pieces of a region against the best value known (−∞: none).
pub(crate) fn bound_region(
    problem: &Problem,
    pieces: &[Piece],
    best: f64,
    plan: Plan,
    control: &Control<'_>,
) -> RegionProof {
    let beat = if best.is_finite() { best + gap_at(best, REGION_GAP) } else { best };
    let wanted = Wanted::from(problem.maximise);
    // open slices with their bounds
    let mut open: Vec<(f64, usize, [f64; 2], u32)> = Vec::new();
    for (i, piece) in pieces.iter().enumerate() {
        let Some(range) = range(piece) else {
            return RegionProof { upper: f64::INFINITY, boxes: 0, stop: None };
        };
        // the references of CIE 224 have a kink at 4000 K
        let mut cuts = vec![range[0], range[1]];
        if range[0] < 4000.0 && range[1] > 4000.0 {
            cuts.insert(1, 4000.0);
        }
        for c in cuts.windows(2) {
            for k in 0..FIRST {
                let at = |k: usize| c[0] + (c[1] - c[0]) * k as f64 / FIRST as f64;
                open.push((f64::INFINITY, i, [at(k), at(k + 1)], 0));
            }
        }
    }
    let (mut boxes, mut stop) = (0u64, None);
    while let Some(next) = (0..open.len()).max_by(|&a, &b| open[a].0.total_cmp(&open[b].0).then(b.cmp(&a))) {
        if open[next].0 <= beat {
            break;
        }
        if control.stop() {
            stop = Some(Stop::Cancelled);
        } else if plan.until.is_some_and(|t| Instant::now() >= t) {
            stop = Some(Stop::Seconds);
        } else if boxes >= plan.boxes {
            stop = Some(Stop::Boxes);
        }
        if stop.is_some() {
            break;
        }
        let (bound, i, cct_k, level) = open.swap_remove(next);
        let Some(slice) = Slice::new(&pieces[i], cct_k) else { continue };
        boxes += 1;
        let variants = if problem.limits.rg.is_open() { vec![None] } else { slice.bins() };
        let mut upper = f64::NEG_INFINITY;
        let mut short_of_boxes = false;
        for bins in variants {
            let Ok(ask) = Ask::within(problem, &slice, wanted, bins) else { continue };
            let effort = Effort {
                boxes: (BOXES_EACH << level.min(20)).min(plan.boxes - boxes.min(plan.boxes)),
                until: plan.until,
                gap: REGION_GAP,
                floor: best,
                // blends found here would be judged by the slice's reference, not their own
                hints: false,
            };
            let proof = prove(&ask, None, effort, control);
            boxes += proof.boxes;
            upper = upper.max(proof.upper);
            // more boxes next time: a narrower slice alone would not close it
            short_of_boxes |= proof.stop == Some(Stop::Boxes);
        }
        let upper = upper.min(bound);
        if upper <= beat {
            continue;
        }
        let level = level + u32::from(short_of_boxes);
        let mid = 0.5 * (slice.cct_k[0] + slice.cct_k[1]);
        if slice.cct_k[1] - slice.cct_k[0] < NARROWEST_K {
            open.push((upper, i, cct_k, level));
            if short_of_boxes {
                continue;
            }
            stop = Some(Stop::Boxes);
            break;
        }
        open.push((upper, i, [cct_k[0], mid], level));
        open.push((upper, i, [mid, cct_k[1]], level));
        (control.progress)(0.5 + 0.5 * (boxes as f32 / plan.boxes.max(1) as f32).min(1.0));
    }
    let left = open.iter().map(|o| o.0).fold(f64::NEG_INFINITY, f64::max);
    RegionProof { upper: left.max(beat), boxes, stop }
}
