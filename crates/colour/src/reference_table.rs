//! Rendering references tabulated over CCT.
//!
//! Cubic Hermite over mired (10⁶/T). Each formula of the references has its own segment (Planckian to 4000 K, mixed to
//! 5000 K, two daylight polynomials beyond), evaluated past its own ends for the slopes, so that no node looks across
//! a kink. Interpolation moves no index by 0.001 (tested against direct summation).

use super::{Reference, blended_grid, hue_bins};
use crate::chromaticity::Uv;
use crate::illuminant::{DaylightBranch, daylight_grid_on, planckian_grid};
use crate::kernel::{Arithmetic, Lanewise, fma};
use crate::tensor::Tensor;
use crate::tensor::column::{CES_LANES, TCS_LANES};
use std::sync::OnceLock;

const TCS: usize = 3 * TCS_LANES;
const CES: usize = 3 * CES_LANES;
/// Sample coordinates, then u and v of the CIE 13.3 reference, padded to a multiple of eight.
const ROW: usize = CES + TCS + 8;

/// One formula of the references: its range in mired and the intervals it is cut into.
struct Segment {
    first_mired: f64,
    last_mired: f64,
    intervals: usize,
    /// Position of its first node.
    offset: usize,
}

const SEGMENTS: [Segment; 4] = [
    Segment { first_mired: 250.0, last_mired: 1000.0, intervals: 60, offset: 0 },
    Segment { first_mired: 200.0, last_mired: 250.0, intervals: 5, offset: 61 },
    Segment { first_mired: 1e6 / 7000.0, last_mired: 200.0, intervals: 6, offset: 67 },
    Segment { first_mired: 48.0, last_mired: 1e6 / 7000.0, intervals: 18, offset: 74 },
];

fn segment_of(cct_k: f64) -> usize {
    match cct_k {
        t if t <= 4000.0 => 0,
        t if t < 5000.0 => 1,
        t if t <= 7000.0 => 2,
        _ => 3,
    }
}

/// Direct reference by the formula of a segment, inside or outside its range.
fn direct(segment: usize, mired: f64) -> Reference {
    let cct_k = 1e6 / mired;
    let one = |grid: Vec<f64>| {
        let tensor = Tensor::of_grid(&grid);
        Reference::of(cct_k, &tensor, &tensor)
    };
    match segment {
        0 => one(planckian_grid(cct_k)),
        1 => Reference::of(
            cct_k,
            &Tensor::of_grid(&planckian_grid(cct_k)),
            &Tensor::of_grid(&blended_grid(cct_k)),
        ),
        2 => one(daylight_grid_on(cct_k, DaylightBranch::Low)),
        _ => one(daylight_grid_on(cct_k, DaylightBranch::High)),
    }
}

type Row = Box<[f64; ROW]>;

fn row(reference: &Reference) -> Row {
    let mut row = Box::new([0.0; ROW]);
    row[..CES].copy_from_slice(&reference.ces_jab[..]);
    row[CES..CES + TCS].copy_from_slice(&reference.tcs_uvw);
    row[CES + TCS] = reference.white.u;
    row[CES + TCS + 1] = reference.white.v;
    row
}

/// Value and slope (per interval) of every node, each made when it is first asked for: a single white then costs two
/// nodes, not the whole table.
static NODES: [OnceLock<(Row, Row)>; 93] = [const { OnceLock::new() }; 93];

fn node(k: usize, i: usize) -> &'static (Row, Row) {
    let segment = &SEGMENTS[k];
    NODES[segment.offset + i].get_or_init(|| {
        let width = (segment.last_mired - segment.first_mired) / segment.intervals as f64;
        let mired = segment.first_mired + width * i as f64;
        let at = |offset: f64| row(&direct(k, mired + offset));
        // Fourth-order central difference.
        let e = 0.25;
        let [less2, less, value, more, more2] = [at(-2.0 * e), at(-e), at(0.0), at(e), at(2.0 * e)];
        let mut slope = Box::new([0.0; ROW]);
        for lane in 0..ROW {
            slope[lane] =
                width * (8.0 * (more[lane] - less[lane]) - (more2[lane] - less2[lane])) / (12.0 * e);
        }
        (value, slope)
    })
}

/// The reference of a CCT from the table; None outside it.
pub(super) fn interpolated(cct_k: f64, arithmetic: Arithmetic) -> Option<Reference> {
    let mired = 1e6 / cct_k;
    let k = segment_of(cct_k);
    let segment = &SEGMENTS[k];
    // The slack lets exactly 1000 K pass in spite of rounding.
    if !(segment.first_mired - 1e-6..=segment.last_mired + 1e-3).contains(&mired) {
        return None;
    }
    let position =
        (mired - segment.first_mired) * segment.intervals as f64 / (segment.last_mired - segment.first_mired);
    let interval = (position.max(0.0) as usize).min(segment.intervals - 1);
    let t = position - interval as f64;
    let mut reference = Reference {
        cct_k,
        white: Uv { u: 0.0, v: 0.0 },
        tcs_uvw: [0.0; TCS],
        ces_jab: Box::new([0.0; CES]),
        bins: [0; CES_LANES],
    };
    arithmetic.run(Hermite {
        before: node(k, interval),
        after: node(k, interval + 1),
        t,
        out: &mut reference,
    });
    Some(reference)
}

struct Hermite<'a> {
    before: &'a (Row, Row),
    after: &'a (Row, Row),
    t: f64,
    out: &'a mut Reference,
}

impl Lanewise for Hermite<'_> {
    type Output = ();

    #[inline(always)]
    fn run<const FMA: bool>(self) {
        let t = self.t;
        let (t2, t3) = (t * t, t * t * t);
        let [w0, w1, w2, w3] = [2.0 * t3 - 3.0 * t2 + 1.0, t3 - 2.0 * t2 + t, 3.0 * t2 - 2.0 * t3, t3 - t2];
        let ((p0, d0), (p1, d1)) = (self.before, self.after);
        let at = |lane: usize| {
            fma::<FMA>(w0, p0[lane], fma::<FMA>(w1, d0[lane], fma::<FMA>(w2, p1[lane], w3 * d1[lane])))
        };
        for lane in 0..CES {
            self.out.ces_jab[lane] = at(lane);
        }
        for lane in 0..TCS {
            self.out.tcs_uvw[lane] = at(CES + lane);
        }
        self.out.white = Uv { u: at(CES + TCS), v: at(CES + TCS + 1) };
        self.out.bins = hue_bins(&self.out.ces_jab);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Bounds over any light at all: by the triangle inequality Rf moves by at most 6.73 times the mean distance
    /// between interpolated and direct sample coordinates, and each Rᵢ by 4.6 times its own.
    #[test]
    fn interpolation_moves_no_index_by_a_thousandth() {
        for i in 0..=420 {
            let cct_k = 1e6 / (50.0 + 950.0 * f64::from(i) / 420.0);
            let table = interpolated(cct_k, Arithmetic::Dispatched).unwrap();
            let direct = Reference::exact(cct_k);
            let distance =
                |a: [f64; 3], b: [f64; 3]| (0..3).map(|k| (a[k] - b[k]).powi(2)).sum::<f64>().sqrt();
            let samples: Vec<f64> =
                (0..99).map(|s| 6.73 * distance(table.ces_jab(s), direct.ces_jab(s))).collect();
            let mean = samples.iter().sum::<f64>() / 99.0;
            assert!(mean < 0.001, "{cct_k}: Rf by {mean}");
            // One sample passes close by the neutral point near 7740 K, where its hue turns fast.
            assert!(samples.iter().all(|shift| *shift < 0.012), "{cct_k}: {samples:?}");
            let of_cri: Vec<f64> =
                (0..15).map(|s| 4.6 * distance(table.tcs_uvw(s), direct.tcs_uvw(s))).collect();
            assert!(of_cri.iter().all(|shift| *shift < 0.001), "{cct_k}: {of_cri:?}");
            assert!(table.white.distance(direct.white) < 1e-7, "{cct_k}");
            // The colour of the adapting white moves every sample of a light by up to 13·W*·Δuv, W* about 100.
            assert!(4.6 * 1300.0 * table.white.distance(direct.white) < 0.001, "{cct_k}");
        }
    }

    #[test]
    fn switches_belong_to_the_side_the_standards_say() {
        for cct_k in [4000.0, 5000.0, 7000.0, 1000.0, 20_000.0] {
            let (table, direct) = (Reference::at(cct_k), Reference::exact(cct_k));
            assert!(table.white.distance(direct.white) < 1e-9, "{cct_k}");
            assert!((table.ces_jab(50)[1] - direct.ces_jab(50)[1]).abs() < 1e-3, "{cct_k}");
        }
        let (below, at) = (Reference::at(4999.999), Reference::at(5000.0));
        assert!(below.white.distance(at.white) > 1e-3);
    }
}
