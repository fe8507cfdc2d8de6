//! What is asked: emitters, a white, limits, bounds, what to maximise, and how much work may be spent.

use colour::chromaticity::UvPrime;
use colour::tensor::TensorSet;
use std::sync::atomic::{AtomicBool, Ordering};

/// A white by correlated colour temperature and distance from the Planckian locus.
///
/// *Units:* kelvin; Duv in CIE 1960 uv, positive above the locus.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Target {
    /// Correlated colour temperature.
    pub cct_k: f64,
    /// Signed distance from the Planckian locus in CIE 1960 uv.
    pub duv: f64,
}

/// Where the white may lie.
#[derive(Clone, Debug, PartialEq)]
pub enum Region {
    /// Exactly the target; the rendering reference is that of the target's CCT.
    Point,
    /// |CCT − target| ≤ `cct_k` and |Duv − target| ≤ `duv`.
    Box {
        /// Half-width in kelvin.
        cct_k: f64,
        /// Half-width in CIE 1960 uv.
        duv: f64,
    },
    /// A convex polygon in CIE 1976 u′v′ (corners in order, either way round). Ellipses and circles
    /// are handed over as polygons of many sides, see [`ellipse`] and [`circle`].
    Polygon(Vec<UvPrime>),
}

/// How many sides a round region gets. The polygon is inscribed, so every white it admits is inside the true shape; it gives
/// away at most 1 − cos(π/96) = 0.05 % of the radius.
pub const ROUND_SIDES: usize = 96;

/// A circle in u′v′ as an inscribed polygon.
#[must_use]
pub fn circle(centre: UvPrime, radius: f64) -> Region {
    ellipse(centre, radius, radius, 0.0)
}

/// An ellipse in u′v′ (semi-axes along and across `angle_rad`, measured from the u′ axis) as an inscribed polygon.
#[must_use]
pub fn ellipse(centre: UvPrime, along: f64, across: f64, angle_rad: f64) -> Region {
    let (s, c) = angle_rad.sin_cos();
    Region::Polygon(
        (0..ROUND_SIDES)
            .map(|k| {
                let (b, a) = (std::f64::consts::TAU * k as f64 / ROUND_SIDES as f64).sin_cos();
                let (a, b) = (along * a, across * b);
                UvPrime { u: centre.u + a * c - b * s, v: centre.v + a * s + b * c }
            })
            .collect(),
    )
}

/// A closed range with optional ends.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Range {
    /// Least allowed value.
    pub low: Option<f64>,
    /// Greatest allowed value.
    pub high: Option<f64>,
}

impl Range {
    /// No limit.
    pub const OPEN: Range = Range { low: None, high: None };

    /// `low..`
    #[must_use]
    pub fn at_least(low: f64) -> Range {
        Range { low: Some(low), high: None }
    }

    /// `..high`
    #[must_use]
    pub fn at_most(high: f64) -> Range {
        Range { low: None, high: Some(high) }
    }

    /// `low..high`
    #[must_use]
    pub fn between(low: f64, high: f64) -> Range {
        Range { low: Some(low), high: Some(high) }
    }

    /// True when neither end is set.
    #[must_use]
    pub fn is_open(&self) -> bool {
        self.low.is_none() && self.high.is_none()
    }

    /// How far `value` lies outside, 0 when inside; positive above `high`, negative below `low`.
    #[must_use]
    pub fn excess(&self, value: f64) -> f64 {
        match (self.low, self.high) {
            (Some(low), _) if value < low => value - low,
            (_, Some(high)) if value > high => value - high,
            _ => 0.0,
        }
    }
}

/// Every limit a blend may be held to. Rendering values in points, LER in lm/W.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Limits {
    /// CIE 13.3 general index.
    pub ra: Range,
    /// CIE 13.3 special index 9.
    pub r9: Range,
    /// CIE 224 / TM-30 fidelity.
    pub rf: Range,
    /// TM-30 gamut index.
    pub rg: Range,
    /// Luminous efficacy of radiation, lm/W.
    pub ler: Range,
    /// Device efficacy in lm per electrical watt; needs [`Problem::wall_plug`].
    pub efficacy: Range,
}

/// A quantity that is limited, maximised or traded.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Metric {
    /// CIE 13.3 general index.
    Ra,
    /// CIE 13.3 special index 9.
    R9,
    /// CIE 224 / TM-30 fidelity.
    Rf,
    /// TM-30 gamut index.
    Rg,
    /// Luminous efficacy of radiation, lm/W.
    Ler,
    /// Device efficacy, lm per electrical watt.
    Efficacy,
}

impl Metric {
    /// All of them, in ledger order.
    pub const ALL: [Metric; 6] =
        [Metric::Ra, Metric::R9, Metric::Rf, Metric::Rg, Metric::Ler, Metric::Efficacy];

    /// The lower-case key used in printed answers.
    #[must_use]
    pub fn key(self) -> &'static str {
        match self {
            Metric::Ra => "ra",
            Metric::R9 => "r9",
            Metric::Rf => "rf",
            Metric::Rg => "rg",
            Metric::Ler => "ler",
            Metric::Efficacy => "efficacy",
        }
    }

    /// The metric as people write it, with its unit where it has one.
    #[must_use]
    pub fn title(self) -> &'static str {
        match self {
            Metric::Ra => "Ra",
            Metric::R9 => "R9",
            Metric::Rf => "Rf",
            Metric::Rg => "Rg",
            Metric::Ler => "LER",
            Metric::Efficacy => "lm/W",
        }
    }
}

impl Limits {
    /// The range of one metric.
    #[must_use]
    pub fn get(&self, metric: Metric) -> Range {
        match metric {
            Metric::Ra => self.ra,
            Metric::R9 => self.r9,
            Metric::Rf => self.rf,
            Metric::Rg => self.rg,
            Metric::Ler => self.ler,
            Metric::Efficacy => self.efficacy,
        }
    }

    /// Sets the range of one metric.
    pub fn set(&mut self, metric: Metric, range: Range) {
        match metric {
            Metric::Ra => self.ra = range,
            Metric::R9 => self.r9 = range,
            Metric::Rf => self.rf = range,
            Metric::Rg => self.rg = range,
            Metric::Ler => self.ler = range,
            Metric::Efficacy => self.efficacy = range,
        }
    }

    /// The limited metrics with their ranges, in ledger order.
    #[must_use]
    pub fn active(&self) -> Vec<(Metric, Range)> {
        Metric::ALL.into_iter().map(|m| (m, self.get(m))).filter(|(_, r)| !r.is_open()).collect()
    }
}

/// What is maximised.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Objective {
    /// Luminous efficacy of radiation, lm/W.
    Ler,
    /// Lumens per electrical watt with [`Problem::wall_plug`] frozen at the working point.
    Efficacy,
    /// CIE 13.3 general index.
    Ra,
    /// CIE 224 / TM-30 fidelity.
    Rf,
}

impl Objective {
    /// The metric maximised.
    #[must_use]
    pub fn metric(self) -> Metric {
        match self {
            Objective::Ler => Metric::Ler,
            Objective::Efficacy => Metric::Efficacy,
            Objective::Ra => Metric::Ra,
            Objective::Rf => Metric::Rf,
        }
    }
}

/// A linear limit of the blend per lumen: Σ `coefficients[i]` · (optical W of emitter i per lumen) ≤ `at_most`.
///
/// A device adds its own limits this way, for example areas at a working current.
#[derive(Clone, Debug, PartialEq)]
pub struct LinearRow {
    /// One coefficient an emitter.
    pub coefficients: Vec<f64>,
    /// The right-hand side, in coefficient units · W/lm.
    pub at_most: f64,
}

/// How much work may be spent on the proof.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Budget {
    /// Boxes of the branch and bound; decides, whatever the clock and the threads.
    pub boxes: u64,
    /// A safety stop in seconds; an answer it cut short says so.
    pub seconds: Option<f64>,
}

impl Default for Budget {
    fn default() -> Budget {
        Budget { boxes: DEFAULT_BOXES, seconds: None }
    }
}

/// Boxes examined by default: about one second of two cores for a problem with an Rf limit.
pub const DEFAULT_BOXES: u64 = 60_000;

/// Most emitters of one problem.
pub const MOST_EMITTERS: usize = 40;

/// The whole question.
#[derive(Clone)]
pub struct Problem {
    /// The emitters, each scaled to unit radiant power.
    pub emitters: TensorSet,
    /// The white wanted.
    pub target: Target,
    /// How far the white may move.
    pub region: Region,
    /// What the blend must meet.
    pub limits: Limits,
    /// What is maximised.
    pub maximise: Objective,
    /// Share bounds, one pair an emitter (radiant shares, 0–1); a lock has low = high. Empty: all free.
    pub bounds: Vec<(f64, f64)>,
    /// Wall-plug efficiency (optical W per electrical W) of each emitter; empty when unknown.
    pub wall_plug: Vec<f64>,
    /// Further linear limits.
    pub rows: Vec<LinearRow>,
    /// The work allowed.
    pub budget: Budget,
}

impl Problem {
    /// Maximum LER at an exact white, no limits, all emitters free, default budget.
    #[must_use]
    pub fn new(emitters: TensorSet, target: Target) -> Problem {
        Problem {
            emitters,
            target,
            region: Region::Point,
            limits: Limits::default(),
            maximise: Objective::Ler,
            bounds: Vec::new(),
            wall_plug: Vec::new(),
            rows: Vec::new(),
            budget: Budget::default(),
        }
    }

    /// The same problem on some of its emitters.
    #[must_use]
    pub fn subset(&self, chosen: &[usize]) -> Problem {
        let pick = |v: &[f64]| if v.is_empty() { Vec::new() } else { chosen.iter().map(|&i| v[i]).collect() };
        Problem {
            emitters: self.emitters.subset(chosen),
            bounds: if self.bounds.is_empty() {
                Vec::new()
            } else {
                chosen.iter().map(|&i| self.bounds[i]).collect()
            },
            wall_plug: pick(&self.wall_plug),
            rows: self
                .rows
                .iter()
                .map(|r| LinearRow { coefficients: pick(&r.coefficients), at_most: r.at_most })
                .collect(),
            target: self.target,
            region: self.region.clone(),
            limits: self.limits,
            maximise: self.maximise,
            budget: self.budget,
        }
    }

    /// What is wrong with the question, if anything.
    ///
    /// # Errors
    /// [`ProblemError`] names the first fault found.
    pub fn check(&self) -> Result<(), ProblemError> {
        let n = self.emitters.len();
        if n == 0 {
            return Err(ProblemError::NoEmitters);
        }
        if n > MOST_EMITTERS {
            return Err(ProblemError::TooManyEmitters { found: n });
        }
        for (what, len) in
            [("share bounds", self.bounds.len()), ("wall-plug efficiencies", self.wall_plug.len())]
        {
            if len != 0 && len != n {
                return Err(ProblemError::WrongLength { what, expected: n, found: len });
            }
        }
        for row in &self.rows {
            if row.coefficients.len() != n {
                return Err(ProblemError::WrongLength {
                    what: "linear row coefficients",
                    expected: n,
                    found: row.coefficients.len(),
                });
            }
            if !row.at_most.is_finite() || row.coefficients.iter().any(|c| !c.is_finite()) {
                return Err(ProblemError::NotFinite { what: "linear row" });
            }
        }
        for (emitter, &(low, high)) in self.bounds.iter().enumerate() {
            if !(low.is_finite() && high.is_finite() && low >= 0.0 && low <= high) {
                return Err(ProblemError::Bounds { emitter, low, high });
            }
        }
        if let Some((emitter, &value)) =
            self.wall_plug.iter().enumerate().find(|(_, w)| !(w.is_finite() && **w > 0.0))
        {
            return Err(ProblemError::WallPlug { emitter, value });
        }
        let needs = self.maximise == Objective::Efficacy || !self.limits.efficacy.is_open();
        if needs && self.wall_plug.is_empty() {
            return Err(ProblemError::WallPlugMissing);
        }
        for (metric, range) in self.limits.active() {
            if range.low.is_some_and(|x| !x.is_finite()) || range.high.is_some_and(|x| !x.is_finite()) {
                return Err(ProblemError::NotFinite { what: metric.title() });
            }
            if let (Some(low), Some(high)) = (range.low, range.high)
                && low > high
            {
                return Err(ProblemError::EmptyRange { metric: metric.title(), low, high });
            }
        }
        let t = self.target;
        if !(1000.0..=20_000.0).contains(&t.cct_k) {
            return Err(ProblemError::Target { cct_k: t.cct_k, duv: t.duv });
        }
        if t.duv.is_nan() || t.duv.abs() > 0.05 {
            return Err(ProblemError::Target { cct_k: t.cct_k, duv: t.duv });
        }
        match &self.region {
            Region::Box { cct_k, duv }
                if !(*cct_k >= 0.0 && *duv >= 0.0 && cct_k.is_finite() && duv.is_finite()) =>
            {
                Err(ProblemError::NotFinite { what: "box half-widths" })
            }
            Region::Polygon(p) if p.len() < 3 || p.iter().any(|c| !(c.u.is_finite() && c.v.is_finite())) => {
                Err(ProblemError::Polygon { corners: p.len() })
            }
            _ => Ok(()),
        }
    }

    /// The share bounds of one emitter.
    #[must_use]
    pub fn bound(&self, emitter: usize) -> (f64, f64) {
        self.bounds.get(emitter).copied().unwrap_or((0.0, 1.0))
    }
}

/// A question that cannot be answered as put.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum ProblemError {
    /// No emitters.
    #[error("there is no emitter to blend")]
    NoEmitters,
    /// More than [`MOST_EMITTERS`].
    #[error("at most {MOST_EMITTERS} emitters can be blended, found {found}")]
    TooManyEmitters {
        /// Emitters given.
        found: usize,
    },
    /// A list has the wrong length.
    #[error("{what}: expected one for each of {expected} emitters, found {found}")]
    WrongLength {
        /// Which list.
        what: &'static str,
        /// Emitters.
        expected: usize,
        /// Entries.
        found: usize,
    },
    /// A number is not finite or negative where it may not be.
    #[error("{what}: expected finite numbers")]
    NotFinite {
        /// Which number.
        what: &'static str,
    },
    /// Share bounds out of order.
    #[error("emitter {}: expected share bounds 0 ≤ low ≤ high, found {low} and {high}", .emitter + 1)]
    Bounds {
        /// Emitter, from 0.
        emitter: usize,
        /// Lower bound.
        low: f64,
        /// Upper bound.
        high: f64,
    },
    /// Wall-plug efficiency not positive.
    #[error("emitter {}: expected a wall-plug efficiency above 0, found {value}", .emitter + 1)]
    WallPlug {
        /// Emitter, from 0.
        emitter: usize,
        /// Value found.
        value: f64,
    },
    /// Efficacy asked without wall-plug efficiencies.
    #[error("lm per electrical W needs the wall-plug efficiency of every emitter")]
    WallPlugMissing,
    /// A range whose ends are crossed.
    #[error("{metric}: the lower limit {low} is above the upper limit {high}")]
    EmptyRange {
        /// Metric.
        metric: &'static str,
        /// Lower limit.
        low: f64,
        /// Upper limit.
        high: f64,
    },
    /// Target outside the range where CCT is defined.
    #[error("expected a CCT of 1000 to 20000 K and |Duv| ≤ 0.05, found {cct_k} K and {duv}")]
    Target {
        /// CCT asked.
        cct_k: f64,
        /// Duv asked.
        duv: f64,
    },
    /// Polygon with too few corners.
    #[error("a region polygon needs at least three finite corners, found {corners}")]
    Polygon {
        /// Corners given.
        corners: usize,
    },
}

/// Progress and cancellation of a running job.
#[derive(Clone, Copy)]
pub struct Control<'a> {
    /// Called with the part done, 0 to 1.
    pub progress: &'a (dyn Fn(f32) + Sync),
    /// Set to true to stop early.
    pub cancelled: &'a AtomicBool,
}

static NEVER: AtomicBool = AtomicBool::new(false);

impl Control<'_> {
    /// A control that reports to nobody and never cancels.
    #[must_use]
    pub fn none() -> Control<'static> {
        Control { progress: &|_| {}, cancelled: &NEVER }
    }

    /// True once cancelled.
    #[must_use]
    pub fn stop(&self) -> bool {
        self.cancelled.load(Ordering::Relaxed)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use colour::Tensor;

    fn flat(n: usize) -> Problem {
        let set = TensorSet::new(&vec![Tensor::of_grid(&[1.0; 401]); n]);
        Problem::new(set, Target { cct_k: 4000.0, duv: 0.0 })
    }

    #[test]
    fn faults_of_a_question_are_named() {
        assert_eq!(flat(0).check(), Err(ProblemError::NoEmitters));
        assert_eq!(flat(41).check(), Err(ProblemError::TooManyEmitters { found: 41 }));
        let mut p = flat(3);
        p.maximise = Objective::Efficacy;
        assert_eq!(p.check(), Err(ProblemError::WallPlugMissing));
        p.wall_plug = vec![0.3, 0.0, 0.5];
        assert_eq!(p.check(), Err(ProblemError::WallPlug { emitter: 1, value: 0.0 }));
        let mut p = flat(3);
        p.bounds = vec![(0.0, 1.0), (0.6, 0.5), (0.0, 1.0)];
        assert!(p.check().unwrap_err().to_string().starts_with("emitter 2: expected share bounds"));
        let mut p = flat(3);
        p.limits.ra = Range::between(95.0, 90.0);
        assert!(matches!(p.check(), Err(ProblemError::EmptyRange { metric: "Ra", .. })));
        let mut p = flat(3);
        p.target.duv = 0.06;
        assert!(matches!(p.check(), Err(ProblemError::Target { .. })));
        p.target.duv = f64::NAN;
        assert!(matches!(p.check(), Err(ProblemError::Target { .. })));
        let mut p = flat(3);
        p.region = Region::Polygon(vec![UvPrime { u: 0.2, v: 0.5 }; 2]);
        assert_eq!(p.check(), Err(ProblemError::Polygon { corners: 2 }));
    }

    #[test]
    fn a_range_tells_how_far_outside_a_value_lies() {
        let r = Range::between(0.0, 30.0);
        assert_eq!((r.excess(-2.0), r.excess(10.0), r.excess(31.0)), (-2.0, 0.0, 1.0));
        assert_eq!(Range::OPEN.excess(1e9), 0.0);
    }

    #[test]
    fn a_circle_is_inscribed() {
        let Region::Polygon(corners) = circle(UvPrime { u: 0.25, v: 0.52 }, 0.002) else {
            panic!("not a polygon")
        };
        assert_eq!(corners.len(), ROUND_SIDES);
        for c in corners {
            assert!(((c.u - 0.25).hypot(c.v - 0.52) - 0.002).abs() < 1e-15);
        }
    }
}
