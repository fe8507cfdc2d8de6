//! A white spec and its emitters as a problem for the optimiser, the same for the window and the headless commands.
//!
//! * [`Sources`]: emitters by name, each scaled to unit radiant power (380–780 nm).
//! * [`problem`]: sources, a white spec and wall-plug efficiencies as an [`optimiser::Problem`].
//! * [`set_problem`]: the same for an emitter set of a project, with its bounds and locks.
//! * [`measure_blend`]: the numbers of a blend against the reference the white spec calls for.

use colour::measure::{measure, measure_at};
use colour::tolerance::{Ellipse, IEC_60081, NOMINAL_CCTS_K, Quadrangle, STEP_RADIUS};
use colour::{Measurement, Reference, Spectrum, Tensor, TensorSet, UvPrime};
use optimiser::{Objective, Problem, Range, Target};
use project::{Limit, Maximise, Metric, Project, Region, SetId, WhiteSpec};

/// Emitters ready to be blended.
#[derive(Debug, Clone, Default)]
pub struct Sources {
    /// Their names, in order.
    pub names: Vec<String>,
    /// Their linear quantities at unit radiant power.
    pub tensors: TensorSet,
    /// Their curves on the colour grid (380, 381 … 780 nm) at unit radiant power.
    pub grids: Vec<Vec<f64>>,
}

/// Why emitters and a white spec make no problem.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum SolvingError {
    /// An emitter has no light to blend.
    #[error("{name}: expected positive power between 380 and 780 nm, found none in sum")]
    Dark {
        /// Name of the emitter.
        name: String,
    },
    /// An emitter's samples make no spectrum.
    #[error(transparent)]
    Samples(#[from] project::SpectrumProblem),
    /// No quadrangle has this nominal CCT.
    #[error("expected a nominal CCT of ANSI C78.377 ({known}), found {found}")]
    Quadrangle {
        /// The nominal CCTs there are.
        known: String,
        /// The one asked for.
        found: u32,
    },
    /// No ellipse has this centre.
    #[error("expected a centre of IEC 60081 ({known}), found {found}")]
    Centre {
        /// The centres there are.
        known: String,
        /// The one asked for.
        found: String,
    },
    /// A polygon turns both ways or crosses itself.
    #[error(
        "expected the corners of a convex polygon in u′v′ in order, found one that turns back or crosses itself"
    )]
    Concave,
    /// Too few wall-plug efficiencies.
    #[error("expected {expected} fractions, one an emitter, found {found}")]
    WallPlugCount {
        /// Number of emitters.
        expected: usize,
        /// Number given.
        found: usize,
    },
    /// lm per electrical W without wall-plug efficiencies.
    #[error("lm per electrical W needs the wall-plug efficiency of every emitter")]
    WallPlugMissing,
    /// The set is not in the project.
    #[error("expected a set of this project, found number {}", .0.0)]
    UnknownSet(SetId),
    /// Every emitter of the set is off.
    #[error("expected at least one emitter that is on, found none")]
    NothingOn,
    /// What the optimiser itself refuses.
    #[error(transparent)]
    Problem(#[from] optimiser::ProblemError),
}

impl Sources {
    /// Sources from named spectra, scaled to unit radiant power.
    ///
    /// # Errors
    /// When a spectrum has no positive power in sum between 380 and 780 nm.
    pub fn new<'a>(spectra: impl IntoIterator<Item = (&'a str, &'a Spectrum)>) -> Result<Self, SolvingError> {
        let (mut names, mut tensors, mut grids) = (Vec::new(), Vec::new(), Vec::new());
        for (name, spectrum) in spectra {
            let mut grid = spectrum.on_colour_grid();
            let power: f64 = grid.iter().sum();
            let tensor = Tensor::of_grid(&grid);
            if !(power > 0.0 && tensor.is_light()) {
                return Err(SolvingError::Dark { name: name.to_owned() });
            }
            grid.iter_mut().for_each(|v| *v /= power);
            names.push(name.to_owned());
            tensors.push(tensor);
            grids.push(grid);
        }
        Ok(Self { names, tensors: TensorSet::new(&tensors), grids })
    }

    /// Number of emitters.
    pub fn len(&self) -> usize {
        self.names.len()
    }

    /// True without any emitter.
    pub fn is_empty(&self) -> bool {
        self.names.is_empty()
    }

    /// The spectrum of a blend at unit radiant power; `None` when `shares` holds a number that is not finite.
    pub fn blend_spectrum(&self, shares: &[f64]) -> Option<Spectrum> {
        let mut grid = vec![0.0; colour::GRID_POINTS];
        for (source, share) in self.grids.iter().zip(shares).filter(|(_, share)| **share != 0.0) {
            for (sum, value) in grid.iter_mut().zip(source) {
                *sum += share * value;
            }
        }
        Spectrum::from_colour_grid(grid).ok()
    }
}

/// The optimiser's name of a metric.
pub const fn metric(metric: Metric) -> optimiser::Metric {
    match metric {
        Metric::Ra => optimiser::Metric::Ra,
        Metric::R9 => optimiser::Metric::R9,
        Metric::Rf => optimiser::Metric::Rf,
        Metric::Rg => optimiser::Metric::Rg,
        Metric::Ler => optimiser::Metric::Ler,
        Metric::Efficacy => optimiser::Metric::Efficacy,
    }
}

fn range(limit: Limit) -> Range {
    Range { low: limit.low, high: limit.high }
}

fn objective(maximise: Maximise) -> Objective {
    match maximise {
        Maximise::Ler => Objective::Ler,
        Maximise::Efficacy => Objective::Efficacy,
        Maximise::Ra => Objective::Ra,
        Maximise::Rf => Objective::Rf,
    }
}

/// The problem of a white spec: sources free between 0 and 1, the default budget.
///
/// `wall_plug` holds one fraction a source, or nothing.
///
/// # Errors
/// An unknown quadrangle or centre, a concave polygon, a wrong number of wall-plug efficiencies, or what
/// [`Problem::check`] finds.
pub fn problem(sources: &Sources, white: &WhiteSpec, wall_plug: &[f64]) -> Result<Problem, SolvingError> {
    if !wall_plug.is_empty() && wall_plug.len() != sources.len() {
        return Err(SolvingError::WallPlugCount { expected: sources.len(), found: wall_plug.len() });
    }
    let needs_wall_plug = white.maximise == Maximise::Efficacy || !white.limits.efficacy.is_open();
    if needs_wall_plug && wall_plug.is_empty() {
        return Err(SolvingError::WallPlugMissing);
    }
    let mut limits = optimiser::Limits::default();
    for one in Metric::ALL {
        limits.set(metric(one), range(*white.limits.of(one)));
    }
    let target = Target { cct_k: white.cct_k, duv: white.duv };
    let mut problem = Problem::new(sources.tensors.clone(), target);
    problem.region = region(white)?;
    problem.limits = limits;
    problem.maximise = objective(white.maximise);
    problem.wall_plug = wall_plug.to_vec();
    problem.check()?;
    Ok(problem)
}

/// Where the white may lie, in the optimiser's terms. Quadrangles and ellipses of x, y become polygons of u′, v′
/// (straight lines stay straight between the two); circles become inscribed polygons.
///
/// # Errors
/// An unknown quadrangle or centre, or a polygon that is not convex.
pub fn region(white: &WhiteSpec) -> Result<optimiser::Region, SolvingError> {
    Ok(match &white.region {
        Region::Point => optimiser::Region::Point,
        Region::Box { cct_k, duv } => optimiser::Region::Box { cct_k: *cct_k, duv: *duv },
        Region::Quadrangle { nominal_k } => {
            let quadrangle =
                Quadrangle::nominal(f64::from(*nominal_k)).ok_or_else(|| SolvingError::Quadrangle {
                    known: NOMINAL_CCTS_K.map(|k| k.to_string()).join(", "),
                    found: *nominal_k,
                })?;
            optimiser::Region::Polygon(quadrangle.corners.iter().map(|xy| xy.uv_prime()).collect())
        }
        Region::Sdcm { steps, centre } => {
            let ellipse = Ellipse::iec_60081(centre).ok_or_else(|| SolvingError::Centre {
                known: IEC_60081.each_ref().map(|e| e.name).join(", "),
                found: centre.clone(),
            })?;
            let outline = ellipse.boundary(*steps, optimiser::ROUND_SIDES);
            optimiser::Region::Polygon(outline.iter().map(|xy| xy.uv_prime()).collect())
        }
        Region::Circle { steps } => {
            let centre = colour::locus::uv_at(white.cct_k, white.duv).uv_prime();
            optimiser::circle(centre, STEP_RADIUS * steps)
        }
        Region::Polygon(corners) => {
            let corners: Vec<UvPrime> = corners.iter().map(|&[u, v]| UvPrime { u, v }).collect();
            if !is_convex(&corners) {
                return Err(SolvingError::Concave);
            }
            optimiser::Region::Polygon(corners)
        }
    })
}

/// True when the corners turn one way only and go round once.
fn is_convex(corners: &[UvPrime]) -> bool {
    let n = corners.len();
    let side = |k: usize| {
        let (a, b) = (corners[k % n], corners[(k + 1) % n]);
        (b.u - a.u, b.v - a.v)
    };
    let mut turned = 0.0;
    let mut sign = 0.0_f64;
    for k in 0..n {
        let ((au, av), (bu, bv)) = (side(k), side(k + 1));
        let (cross, dot) = (au * bv - av * bu, au * bu + av * bv);
        let turn = cross.atan2(dot);
        if turn == 0.0 && dot > 0.0 {
            continue;
        }
        if turn * sign < 0.0 {
            return false;
        }
        sign = turn.signum();
        turned += turn;
    }
    (turned.abs() - std::f64::consts::TAU).abs() < 1e-6
}

/// The numbers of a blend. At an exact white the reference is that of the target CCT, so that rounding cannot flip
/// the switch at 5000 K; inside a region it is that of the blend's own CCT.
pub fn measure_blend(blend: &Tensor, white: &WhiteSpec) -> Measurement {
    match white.region {
        Region::Point => measure_at(blend, &Reference::at(white.cct_k)),
        _ => measure(blend),
    }
}

/// The value of one limited metric of a blend; efficacy needs the wall-plug efficiencies.
pub fn value_of(one: Metric, measured: &Measurement, shares: &[f64], wall_plug: &[f64]) -> Option<f64> {
    match one {
        Metric::Ra => measured.ra,
        Metric::R9 => measured.r9(),
        Metric::Rf => measured.rf,
        Metric::Rg => measured.rg,
        Metric::Ler => Some(measured.ler_lm_per_w),
        Metric::Efficacy => {
            let electrical: f64 = shares.iter().zip(wall_plug).map(|(share, plug)| share / plug).sum();
            let complete = !wall_plug.is_empty() && electrical > 0.0;
            complete.then(|| measured.ler_lm_per_w * shares.iter().sum::<f64>() / electrical)
        }
    }
}

/// The problem of an emitter set, and which of the set's members take part.
#[derive(Clone)]
pub struct SetProblem {
    /// The problem; one emitter an entry of `members`.
    pub problem: Problem,
    /// Indices into the set's members: those that are on.
    pub members: Vec<usize>,
    /// The emitters that take part.
    pub sources: Sources,
}

/// The problem of one set of a project: members that are off are left out, locks and bounds are kept, wall-plug
/// efficiencies are used when every member has one.
///
/// # Errors
/// As [`problem`]; an unknown set; a set with nothing on; samples that make no spectrum.
pub fn set_problem(project: &Project, set: SetId) -> Result<SetProblem, SolvingError> {
    let set = project.set(set).ok_or(SolvingError::UnknownSet(set))?;
    let mut members = Vec::new();
    let mut spectra = Vec::new();
    let mut wall_plug = Vec::new();
    let mut bounds = Vec::new();
    for (index, member) in set.members.iter().enumerate().filter(|(_, member)| member.on) {
        let Some(emitter) = project.emitter(member.emitter) else { continue };
        members.push(index);
        spectra.push((emitter.name.as_str(), emitter.spectrum()?));
        wall_plug.extend(emitter.wall_plug);
        bounds.push(if member.locked { (member.share, member.share) } else { (member.least, member.most) });
    }
    if members.is_empty() {
        return Err(SolvingError::NothingOn);
    }
    let sources = Sources::new(spectra.iter().map(|(name, spectrum)| (*name, spectrum)))?;
    if wall_plug.len() != members.len() {
        wall_plug.clear();
    }
    let mut problem = problem(&sources, &set.white, &wall_plug)?;
    problem.bounds = bounds;
    problem.check()?;
    Ok(SetProblem { problem, members, sources })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn corners(list: &[[f64; 2]]) -> Vec<UvPrime> {
        list.iter().map(|&[u, v]| UvPrime { u, v }).collect()
    }

    #[test]
    fn convex_polygons_are_told_from_others() {
        assert!(is_convex(&corners(&[[0.2, 0.4], [0.3, 0.4], [0.3, 0.5]])));
        assert!(is_convex(&corners(&[[0.3, 0.5], [0.3, 0.4], [0.2, 0.4], [0.2, 0.5]])));
        assert!(!is_convex(&corners(&[[0.2, 0.4], [0.3, 0.4], [0.21, 0.41], [0.2, 0.5]])));
        assert!(!is_convex(&corners(&[[0.2, 0.4], [0.3, 0.5], [0.3, 0.4], [0.2, 0.5]])));
        assert!(!is_convex(&corners(&[[0.2, 0.4], [0.3, 0.4], [0.25, 0.4]])));
    }

    #[test]
    fn every_region_is_handed_over_or_refused_with_the_known_names() {
        let mut white = WhiteSpec { cct_k: 3000.0, ..WhiteSpec::default() };
        for (text, sides) in [("quadrangle:3000", 4), ("sdcm:3@F3000", 96), ("circle:2", 96)] {
            white.region = text.parse().unwrap();
            match region(&white).unwrap() {
                optimiser::Region::Polygon(corners) => assert_eq!(corners.len(), sides, "{text}"),
                other => panic!("{text}: {other:?}"),
            }
        }
        white.region = "quadrangle:3100".parse().unwrap();
        let sentence = region(&white).unwrap_err().to_string();
        assert!(sentence.contains("3000") && sentence.contains("found 3100"), "{sentence}");
        white.region = "sdcm:3@F3100".parse().unwrap();
        let sentence = region(&white).unwrap_err().to_string();
        assert!(sentence.contains("F3000") && sentence.contains("found F3100"), "{sentence}");
        white.region = "polygon:0.2,0.4;0.3,0.5;0.3,0.4;0.2,0.5".parse().unwrap();
        assert_eq!(region(&white), Err(SolvingError::Concave));
    }

    #[test]
    fn a_circle_is_centred_on_the_target_with_steps_of_0_0011() {
        // Radius 0.0011 n in u′v′: CIE TN 001:2014.
        let white = WhiteSpec {
            cct_k: 4000.0,
            duv: 0.001,
            region: "circle:2".parse().unwrap(),
            ..Default::default()
        };
        let centre = colour::locus::uv_at(4000.0, 0.001).uv_prime();
        let optimiser::Region::Polygon(corners) = region(&white).unwrap() else { panic!("a polygon") };
        for corner in corners {
            assert!((corner.distance(centre) - 0.0022).abs() < 1e-12);
        }
    }
}
