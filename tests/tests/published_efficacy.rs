//! The solver against published figures of what light can reach.

use colour::shapes::Shape;
use colour::tensor::{Tensor, TensorSet};
use colour::{Observer, locus::uv_at};
use optimiser::{Control, Grade, Limits, Outcome, Problem, Range, Target, choose, solve};

fn gaussians(peaks_nm: &[f64], fwhm_nm: f64) -> TensorSet {
    let tensors: Vec<Tensor> = peaks_nm
        .iter()
        .map(|&peak_nm| {
            Tensor::of_grid(&Shape::GaussianNm { peak_nm, fwhm_nm }.colour_grid().expect("a valid shape"))
        })
        .collect();
    TensorSet::new(&tensors)
}

fn line(nm: usize) -> Tensor {
    let mut grid = vec![0.0; 401];
    grid[nm - 380] = 1.0;
    Tensor::of_grid(&grid)
}

/// Best four of Gaussians of 20 nm on a grid of peaks, Ra and R9 both at least the level.
fn best_four(cct_k: f64, level: f64) -> f64 {
    // at 5700 K four such lines reach 95 in both for few peaks only, so the grid is fine
    let bands = [(446, 470), (508, 538), (552, 582), (602, 626)];
    let peaks: Vec<f64> = bands.iter().flat_map(|&(a, b)| (a..=b).step_by(3)).map(f64::from).collect();
    let mut p = Problem::new(gaussians(&peaks, 20.0), Target { cct_k, duv: 0.0 });
    p.limits = Limits { ra: Range::at_least(level), r9: Range::at_least(level), ..Limits::default() };
    let choice = choose(&p, 4, &Control::none()).expect("a valid problem");
    let s = match &choice.outcome {
        Outcome::Optimal(s) => s,
        Outcome::Infeasible(why) => panic!("{cct_k} K, {level}: {}", why.explanation),
    };
    assert_eq!(s.grade, Grade::Proven);
    s.objective
}

/// Optics Express 20, 9122 (2012), abstract: the most lm/W of four-colour white light with Ra and R9 of 90 and of 95.
/// The publication does not fix the line shape as we do; ±3 % covers it.
#[test]
fn four_narrow_emitters_reach_the_published_efficacies() {
    for (cct_k, at_90, at_95) in [(3000.0, 381.0, 371.0), (4500.0, 361.0, 352.0), (5700.0, 346.0, 338.0)] {
        for (level, published) in [(90.0, at_90), (95.0, at_95)] {
            let found = best_four(cct_k, level);
            assert!(
                (found / published - 1.0).abs() < 0.03,
                "{cct_k} K, {level}: {found} against {published}"
            );
        }
    }
}

/// The most lm/W of any light at a white, by looking at every three spectral lines (the optimum of the linear programme
/// lies at a vertex, and a vertex has three lines).
fn ceiling(cct_k: f64) -> (f64, [usize; 3]) {
    let uv = uv_at(cct_k, 0.0);
    let white = [1.5 * uv.u / uv.v, 1.0, (4.0 - uv.u - 10.0 * uv.v) / (2.0 * uv.v)];
    let xyz: Vec<[f64; 3]> = (380..=780).map(|nm| line(nm).xyz(Observer::Cie1931).to_array()).collect();
    let cross = |a: [f64; 3], b: [f64; 3]| {
        [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]]
    };
    let dot = |a: [f64; 3], b: [f64; 3]| a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
    let mut best = (0.0, [0; 3]);
    for i in 0..xyz.len() {
        for j in i + 1..xyz.len() {
            let ij = cross(xyz[i], xyz[j]);
            let wi = cross(xyz[i], white);
            let wj = cross(white, xyz[j]);
            for k in j + 1..xyz.len() {
                let det = dot(ij, xyz[k]);
                // Cramer: watts of the three lines per unit Y
                let (p, q, r) = (dot(wj, xyz[k]) / det, dot(wi, xyz[k]) / det, dot(ij, white) / det);
                if p >= 0.0 && q >= 0.0 && r >= 0.0 {
                    let lm_per_w = 683.0 / (p + q + r);
                    if lm_per_w > best.0 {
                        best = (lm_per_w, [i + 380, j + 380, k + 380]);
                    }
                }
            }
        }
    }
    best
}

/// The ceilings at Duv 0 (508.7 lm/W at 3000 K, 414.6 at 6500 K) are those of an independent linear programme over spectral lines.
#[test]
fn the_monochromatic_ceiling_is_that_of_a_linear_programme() {
    for (cct_k, known) in [(3000.0, 508.7), (6500.0, 414.6)] {
        let (most, lines) = ceiling(cct_k);
        assert!((most - known).abs() < 0.1, "{cct_k} K: {most}");
        // the solver finds the same among lines that include the best three
        let mut set: Vec<usize> = (400..=700).step_by(10).collect();
        set.extend(lines);
        let tensors: Vec<Tensor> = set.iter().map(|&nm| line(nm)).collect();
        let p = Problem::new(TensorSet::new(&tensors), Target { cct_k, duv: 0.0 });
        let outcome = solve(&p, &Control::none()).expect("a valid problem");
        let s = outcome.solution().expect("lines make every white");
        assert!((s.objective - most).abs() < 1e-6 * most, "{} against {most}", s.objective);
        assert_eq!(s.gap, Some(0.0));
    }
}

/// CIE S 010 / the definition of the lumen: 683 lm/W at 555 nm, and nothing more.
#[test]
fn no_light_exceeds_683_lm_per_w() {
    let most = (380..=780).map(|nm| line(nm).ler_lm_per_w()).fold(0.0, f64::max);
    assert!((most - 683.0).abs() < 0.1 && (line(555).ler_lm_per_w() - most).abs() < 1e-9);
}
