//! Where the white may lie, as an outline in u′v′ and a test.

use colour::tolerance::{Ellipse, Polygon, Quadrangle, STEP_RADIUS, StepCircle};
use colour::{CctDuv, UvPrime, locus};
use project::{Region, WhiteSpec};

/// Farthest from an exact target that still counts as on it: about a tenth of a just noticeable step, in u′v′.
pub const ON_TARGET_UV_PRIME: f64 = 1e-4;
/// Straight pieces a curved outline is drawn and tested with.
const CURVE_PIECES: usize = 180;

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
    polygon: Option<Polygon>,
    region: Region,
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
            polygon: None,
            region: white.region.clone(),
            target_cct_duv: CctDuv { cct_k: white.cct_k, duv: white.duv },
        };
        match &white.region {
            Region::Point => "exactly on target".clone_into(&mut region.words),
            Region::Box { cct_k, duv } => {
                region.outline = box_outline(white.cct_k, white.duv, *cct_k, *duv);
                region.words = format!("\u{b1}{cct_k} K, \u{b1}{duv} Duv");
            }
            Region::Circle { steps } => {
                region.outline = StepCircle { centre: target }.boundary(*steps, CURVE_PIECES);
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
        if !region.outline.is_empty() {
            match Polygon::new(region.outline.clone()) {
                Ok(polygon) => region.polygon = Some(polygon),
                // A box without width has no area, but it is still a limit on CCT and Duv.
                Err(_) if region.box_half_widths().is_some() => {}
                Err(error) => region.problem = Some(format!("the region is no polygon: {error}")),
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
        match self.region {
            Region::Box { cct_k, duv } => Some((cct_k, duv)),
            _ => None,
        }
    }

    /// How far inside the region a white lies, in u′v′; negative outside. For an exact target: 0.0001 less the
    /// distance.
    pub fn margin_uv_prime(&self, white: UvPrime, at: Option<CctDuv>) -> f64 {
        if self.outline.is_empty() {
            return ON_TARGET_UV_PRIME - white.distance(self.target);
        }
        let margin = self.polygon.as_ref().map_or(0.0, |polygon| polygon.margin(white));
        // A box is bounded in CCT and Duv; its outline only approximates it.
        // An ellipse's outline is inscribed.
        let inside = match &self.region {
            Region::Box { cct_k, duv } => at.is_some_and(|at| {
                (at.cct_k - self.target_cct_duv.cct_k).abs() <= *cct_k
                    && (at.duv - self.target_cct_duv.duv).abs() <= *duv
            }),
            Region::Circle { steps } => return steps * STEP_RADIUS - white.distance(self.target),
            Region::Sdcm { steps, centre } => {
                Ellipse::iec_60081(centre).is_some_and(|ellipse| ellipse.contains(white.xy(), *steps))
            }
            _ => return margin,
        };
        if inside { margin.abs() } else { -margin.abs() }
    }

    /// Distance from the target in steps of 0.0011.
    pub fn steps_from_target(&self, white: UvPrime) -> f64 {
        white.distance(self.target) / STEP_RADIUS
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

fn quadrangle_outline(nominal_k: u32) -> Option<Vec<UvPrime>> {
    let polygon = Quadrangle::nominal(f64::from(nominal_k))?.polygon().ok()?;
    Some(polygon.vertices().to_vec())
}

fn ellipse_outline(centre: &str, steps: f64) -> Option<Vec<UvPrime>> {
    let outline = Ellipse::iec_60081(centre)?.boundary(steps, CURVE_PIECES);
    Some(outline.into_iter().map(colour::Xy::uv_prime).collect())
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
    fn a_quadrangle_and_an_ellipse_are_those_of_their_tables() {
        // ANSI C78.377-2017, 3000 K: the corner (.4562, .4260) bounds it; its centre is (.4339, .4033).
        let white = WhiteSpec { region: Region::Quadrangle { nominal_k: 3000 }, ..WhiteSpec::default() };
        let region = WhiteRegion::of(&white);
        let at = |x: f64, y: f64| colour::Xy { x, y }.uv_prime();
        assert!(region.margin_uv_prime(at(0.4339, 0.4033), None) > 0.003);
        assert!(region.margin_uv_prime(at(0.4570, 0.4265), None) < 0.0);
        // IEC 60081 F3000: centre (.440, .403), one step reaches .00278 along its long axis.
        let centre = "F3000".to_owned();
        let white = WhiteSpec { region: Region::Sdcm { steps: 3.0, centre }, ..WhiteSpec::default() };
        let region = WhiteRegion::of(&white);
        assert!(region.problem.is_none() && region.margin_uv_prime(at(0.440, 0.403), None) > 0.0);
        let long = 3.1 * 0.00278;
        let (sin, cos) = 53.2_f64.to_radians().sin_cos();
        assert!(region.margin_uv_prime(at(0.440 + long * cos, 0.403 + long * sin), None) < 0.0);
    }

    #[test]
    fn a_centre_or_quadrangle_in_no_table_says_so() {
        for region in
            [Region::Quadrangle { nominal_k: 3100 }, Region::Sdcm { steps: 3.0, centre: "F3100".to_owned() }]
        {
            let region = WhiteRegion::of(&WhiteSpec { region, ..WhiteSpec::default() });
            assert!(region.problem.unwrap().contains("3100"));
        }
    }

    #[test]
    fn an_exact_target_is_met_within_a_tenth_of_a_step() {
        let white = WhiteSpec::default();
        assert!(margin(&white, 3000.0, 0.0) > 0.0);
        assert!(margin(&white, 3002.0, 0.0) < 0.0 || margin(&white, 3002.0, 0.0) < 5e-5);
        assert!(margin(&white, 3010.0, 0.0) < 0.0);
    }
}
