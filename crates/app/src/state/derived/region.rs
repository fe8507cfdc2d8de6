//! Where the white may lie, as an outline in u′v′ and a test.

use colour::{CctDuv, UvPrime, locus};
use project::{Region, WhiteSpec};

/// Farthest from an exact target that still counts as on it: about a tenth of a just noticeable step, in u′v′.
pub const ON_TARGET_UV_PRIME: f64 = 1e-4;
/// One step of a u′v′ circle (CIE TN 001:2014).
pub const STEP_UV_PRIME: f64 = 0.0011;

/// The region of a white spec, ready to be drawn and tested.
#[derive(Debug, Clone, PartialEq)]
pub struct WhiteRegion {
    /// The target in u′v′.
    pub target: UvPrime,
    /// Corners of the outline in u′v′, curved edges in small steps; empty for an exact target.
    pub outline: Vec<UvPrime>,
    /// What it is, for the ledger: "±175 K, ±0.006".
    pub words: String,
    /// Why it cannot be tested, when it cannot (a centre that is in no table).
    pub problem: Option<String>,
    bounds: Option<(f64, f64)>,
    target_cct_duv: CctDuv,
}

impl WhiteRegion {
    /// The region of a spec.
    pub fn of(white: &WhiteSpec) -> Self {
        let target = locus::uv_at(white.cct_k, white.duv).uv_prime();
        let mut region = Self {
            target,
            outline: Vec::new(),
            words: String::new(),
            problem: None,
            bounds: None,
            target_cct_duv: CctDuv { cct_k: white.cct_k, duv: white.duv },
        };
        match &white.region {
            Region::Point => "exactly on target".clone_into(&mut region.words),
            Region::Box { cct_k, duv } => {
                region.bounds = Some((*cct_k, *duv));
                region.outline = box_outline(white.cct_k, white.duv, *cct_k, *duv);
                region.words = format!("\u{b1}{cct_k} K, \u{b1}{duv} Duv");
            }
            Region::Circle { steps } => {
                region.outline = circle_outline(target, steps * STEP_UV_PRIME);
                region.words = format!("{steps}-step circle round the target");
            }
            Region::Polygon(corners) => {
                region.outline = corners.iter().map(|[u, v]| UvPrime { u: *u, v: *v }).collect();
                region.words = format!("polygon of {} corners", corners.len());
            }
            Region::Quadrangle { nominal_k } => {
                region.words = format!("{nominal_k} K quadrangle (ANSI C78.377)");
                region
                    .fill(quadrangle_outline(*nominal_k), || format!("no quadrangle is named {nominal_k} K"));
            }
            Region::Sdcm { steps, centre } => {
                region.words = format!("{steps}-step ellipse round {centre} (IEC 60081)");
                region.fill(ellipse_outline(centre, *steps), || {
                    format!("no centre is named {centre}: F2700, F3000, F3500, F4000, F5000 or F6500")
                });
            }
        }
        region
    }

    fn fill(&mut self, outline: Option<Vec<UvPrime>>, problem: impl Fn() -> String) {
        match outline {
            Some(outline) => self.outline = outline,
            None => self.problem = Some(problem()),
        }
    }

    /// Half-widths in K and Duv, when the region is such a box.
    pub fn box_half_widths(&self) -> Option<(f64, f64)> {
        self.bounds
    }

    /// How far inside the region a white lies, in u′v′; negative outside. For an exact target: 0.0001 less the
    /// distance.
    pub fn margin_uv_prime(&self, white: UvPrime, at: Option<CctDuv>) -> f64 {
        if self.outline.is_empty() {
            return ON_TARGET_UV_PRIME - white.distance(self.target);
        }
        let distance = distance_to(&self.outline, white);
        let inside = match (self.bounds, at) {
            (Some((cct_k, duv)), Some(at)) => {
                (at.cct_k - self.target_cct_duv.cct_k).abs() <= cct_k
                    && (at.duv - self.target_cct_duv.duv).abs() <= duv
            }
            (Some(_), None) => false,
            (None, _) => contains(&self.outline, white),
        };
        if inside { distance } else { -distance }
    }

    /// Distance from the target in steps of 0.0011.
    pub fn steps_from_target(&self, white: UvPrime) -> f64 {
        white.distance(self.target) / STEP_UV_PRIME
    }
}

fn box_outline(cct_k: f64, duv: f64, half_cct: f64, half_duv: f64) -> Vec<UvPrime> {
    const PIECES: usize = 12;
    let (low, high) = ((cct_k - half_cct).max(1000.0), (cct_k + half_cct).min(20000.0));
    let along = |part: usize| low + (high - low) * part as f64 / PIECES as f64;
    let upper = (0..=PIECES).map(|k| locus::uv_at(along(k), duv + half_duv));
    let lower = (0..=PIECES).rev().map(|k| locus::uv_at(along(k), duv - half_duv));
    upper.chain(lower).map(colour::Uv::uv_prime).collect()
}

fn circle_outline(centre: UvPrime, radius: f64) -> Vec<UvPrime> {
    (0..96)
        .map(|k| std::f64::consts::TAU * f64::from(k) / 96.0)
        .map(|angle| UvPrime { u: centre.u + radius * angle.cos(), v: centre.v + radius * angle.sin() })
        .collect()
}

fn quadrangle_outline(_nominal_k: u32) -> Option<Vec<UvPrime>> {
    None
}

fn ellipse_outline(_centre: &str, _steps: f64) -> Option<Vec<UvPrime>> {
    None
}

/// Whether a point lies inside a polygon (even–odd rule).
fn contains(outline: &[UvPrime], point: UvPrime) -> bool {
    let mut inside = false;
    for (k, a) in outline.iter().enumerate() {
        let b = outline[(k + 1) % outline.len()];
        if (a.v > point.v) != (b.v > point.v) && point.u < (b.u - a.u) * (point.v - a.v) / (b.v - a.v) + a.u {
            inside = !inside;
        }
    }
    inside
}

/// Distance from a point to the nearest edge of a polygon.
fn distance_to(outline: &[UvPrime], point: UvPrime) -> f64 {
    (0..outline.len())
        .map(|k| {
            let (a, b) = (outline[k], outline[(k + 1) % outline.len()]);
            let (du, dv) = (b.u - a.u, b.v - a.v);
            let length = du * du + dv * dv;
            let along = if length > 0.0 {
                (((point.u - a.u) * du + (point.v - a.v) * dv) / length).clamp(0.0, 1.0)
            } else {
                0.0
            };
            point.distance(UvPrime { u: a.u + along * du, v: a.v + along * dv })
        })
        .fold(f64::INFINITY, f64::min)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn margin(white: &WhiteSpec, cct_k: f64, duv: f64) -> f64 {
        let at = CctDuv { cct_k, duv };
        WhiteRegion::of(white).margin_uv_prime(locus::uv_at(cct_k, duv).uv_prime(), Some(at))
    }

    #[test]
    fn a_box_holds_what_lies_within_its_half_widths() {
        let white = WhiteSpec { region: Region::Box { cct_k: 175.0, duv: 0.006 }, ..WhiteSpec::default() };
        assert!(margin(&white, 3000.0, 0.0) > 0.003);
        assert!(margin(&white, 3170.0, 0.0055) > 0.0);
        assert!(margin(&white, 3180.0, 0.0) < 0.0 && margin(&white, 3000.0, -0.0065) < 0.0);
    }

    #[test]
    fn a_circle_of_two_steps_reaches_0_0022() {
        let white = WhiteSpec { region: Region::Circle { steps: 2.0 }, ..WhiteSpec::default() };
        let region = WhiteRegion::of(&white);
        let off = |d: f64| UvPrime { u: region.target.u + d, v: region.target.v };
        assert!(region.margin_uv_prime(off(0.0021), None) > 0.0);
        assert!(region.margin_uv_prime(off(0.0023), None) < 0.0);
        assert!((region.steps_from_target(off(0.0022)) - 2.0).abs() < 1e-9);
    }

    #[test]
    fn an_exact_target_is_met_within_a_tenth_of_a_step() {
        let white = WhiteSpec::default();
        assert!(margin(&white, 3000.0, 0.0) > 0.0);
        assert!(margin(&white, 3002.0, 0.0) < 0.0 || margin(&white, 3002.0, 0.0) < 5e-5);
        assert!(margin(&white, 3010.0, 0.0) < 0.0);
    }
}
