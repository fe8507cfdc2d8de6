//! White specifications: the target, the region round it, the limits, and what to maximise.

use serde::{Deserialize, Serialize};
use std::{fmt, str::FromStr};

/// A range with open ends, written `90..`, `..30` or `97..103`.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize, Deserialize)]
pub struct Limit {
    /// Least value allowed.
    #[serde(default)]
    pub low: Option<f64>,
    /// Greatest value allowed.
    #[serde(default)]
    pub high: Option<f64>,
}

impl Limit {
    /// At least `low`.
    pub const fn at_least(low: f64) -> Self {
        Self { low: Some(low), high: None }
    }

    /// From `low` to `high`.
    pub const fn between(low: f64, high: f64) -> Self {
        Self { low: Some(low), high: Some(high) }
    }

    /// True when neither end is set.
    pub const fn is_open(&self) -> bool {
        self.low.is_none() && self.high.is_none()
    }

    /// True when `value` lies inside; an open end never excludes.
    pub fn contains(&self, value: f64) -> bool {
        self.low.is_none_or(|low| value >= low) && self.high.is_none_or(|high| value <= high)
    }

    /// How far `value` is inside the nearer end; negative when outside, `None` when both ends are open.
    pub fn margin(&self, value: f64) -> Option<f64> {
        let below = self.low.map(|low| value - low);
        let above = self.high.map(|high| high - value);
        match (below, above) {
            (Some(a), Some(b)) => Some(a.min(b)),
            (a, b) => a.or(b),
        }
    }
}

impl fmt::Display for Limit {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if let Some(low) = self.low {
            write!(f, "{low}")?;
        }
        f.write_str("..")?;
        if let Some(high) = self.high {
            write!(f, "{high}")?;
        }
        Ok(())
    }
}

/// Why a written limit or region was not understood.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum SpecError {
    /// A range is malformed.
    #[error("expected a range such as 90.. or ..30 or 97..103, found `{0}`")]
    Range(String),
    /// The ends of a range are the wrong way round.
    #[error("expected the lower end of a range first, found `{0}`")]
    Reversed(String),
    /// A region is malformed.
    #[error(
        "expected a region such as box:175,0.006 quadrangle:3000 sdcm:3@F3000 circle:2 or polygon:u1,v1;u2,v2;u3,v3, found `{0}`"
    )]
    Region(String),
}

fn number(text: &str) -> Option<f64> {
    text.trim().parse::<f64>().ok().filter(|v| v.is_finite())
}

impl FromStr for Limit {
    type Err = SpecError;

    fn from_str(text: &str) -> Result<Self, SpecError> {
        let malformed = || SpecError::Range(text.to_owned());
        let (low, high) = text.split_once("..").ok_or_else(malformed)?;
        let end = |part: &str| match part.trim() {
            "" => Ok(None),
            part => number(part).map(Some).ok_or_else(malformed),
        };
        let limit = Self { low: end(low)?, high: end(high)? };
        match limit {
            Self { low: None, high: None } => Err(malformed()),
            Self { low: Some(low), high: Some(high) } if low > high => {
                Err(SpecError::Reversed(text.to_owned()))
            }
            limit => Ok(limit),
        }
    }
}

/// A quantity a blend can be limited in.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub enum Metric {
    /// CIE 13.3 general colour rendering index.
    Ra,
    /// CIE 13.3 special index of the saturated red sample.
    R9,
    /// CIE 224 / TM-30 fidelity index.
    Rf,
    /// TM-30 gamut index.
    Rg,
    /// Luminous efficacy of radiation, lm per optical watt.
    Ler,
    /// Luminous efficacy, lm per electrical watt.
    Efficacy,
}

impl Metric {
    /// Every metric, in ledger order.
    pub const ALL: [Self; 6] = [Self::Ra, Self::R9, Self::Rf, Self::Rg, Self::Ler, Self::Efficacy];

    /// The key of the headless contract.
    pub const fn key(self) -> &'static str {
        match self {
            Self::Ra => "ra",
            Self::R9 => "r9",
            Self::Rf => "rf",
            Self::Rg => "rg",
            Self::Ler => "ler",
            Self::Efficacy => "efficacy",
        }
    }
}

/// The limits of a white spec.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize, Deserialize)]
#[serde(default)]
pub struct Limits {
    /// Limit on Ra.
    pub ra: Limit,
    /// Limit on R9.
    pub r9: Limit,
    /// Limit on Rf.
    pub rf: Limit,
    /// Limit on Rg.
    pub rg: Limit,
    /// Limit on LER, lm per optical watt.
    pub ler: Limit,
    /// Limit on device efficacy, lm per electrical watt.
    pub efficacy: Limit,
}

impl Limits {
    /// The limit on one metric.
    pub const fn of(&self, metric: Metric) -> &Limit {
        match metric {
            Metric::Ra => &self.ra,
            Metric::R9 => &self.r9,
            Metric::Rf => &self.rf,
            Metric::Rg => &self.rg,
            Metric::Ler => &self.ler,
            Metric::Efficacy => &self.efficacy,
        }
    }

    /// The limit on one metric, to change.
    pub const fn of_mut(&mut self, metric: Metric) -> &mut Limit {
        match metric {
            Metric::Ra => &mut self.ra,
            Metric::R9 => &mut self.r9,
            Metric::Rf => &mut self.rf,
            Metric::Rg => &mut self.rg,
            Metric::Ler => &mut self.ler,
            Metric::Efficacy => &mut self.efficacy,
        }
    }
}

/// Where the white may lie.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
pub enum Region {
    /// Exactly at the target.
    #[default]
    Point,
    /// Within ± of the target in CCT and Duv.
    Box {
        /// Half-width in K.
        cct_k: f64,
        /// Half-width in Duv.
        duv: f64,
    },
    /// The ANSI C78.377 quadrangle of a nominal CCT.
    Quadrangle {
        /// Nominal CCT in K, such as 3000.
        nominal_k: u32,
    },
    /// An IEC 60081 ellipse of some steps round a named centre.
    Sdcm {
        /// Number of steps.
        steps: f64,
        /// Name of the centre, such as `F3000`.
        centre: String,
    },
    /// A circle in u′v′ of some steps of 0.0011 round the target (CIE TN 001).
    Circle {
        /// Number of steps.
        steps: f64,
    },
    /// A polygon in u′v′.
    Polygon(Vec<[f64; 2]>),
}

impl fmt::Display for Region {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Point => f.write_str("point"),
            Self::Box { cct_k, duv } => write!(f, "box:{cct_k},{duv}"),
            Self::Quadrangle { nominal_k } => write!(f, "quadrangle:{nominal_k}"),
            Self::Sdcm { steps, centre } => write!(f, "sdcm:{steps}@{centre}"),
            Self::Circle { steps } => write!(f, "circle:{steps}"),
            Self::Polygon(corners) => {
                f.write_str("polygon:")?;
                for (k, [u, v]) in corners.iter().enumerate() {
                    write!(f, "{}{u},{v}", if k == 0 { "" } else { ";" })?;
                }
                Ok(())
            }
        }
    }
}

impl FromStr for Region {
    type Err = SpecError;

    fn from_str(text: &str) -> Result<Self, SpecError> {
        let malformed = || SpecError::Region(text.to_owned());
        let positive = |part: &str| number(part).filter(|v| *v > 0.0).ok_or_else(malformed);
        let half_width = |part: &str| number(part).filter(|v| *v >= 0.0).ok_or_else(malformed);
        if text == "point" {
            return Ok(Self::Point);
        }
        let (kind, rest) = text.split_once(':').ok_or_else(malformed)?;
        match kind {
            "box" => {
                let (cct, duv) = rest.split_once(',').ok_or_else(malformed)?;
                Ok(Self::Box { cct_k: half_width(cct)?, duv: half_width(duv)? })
            }
            "quadrangle" => Ok(Self::Quadrangle { nominal_k: rest.trim().parse().map_err(|_| malformed())? }),
            "sdcm" => {
                let (steps, centre) = rest.split_once('@').ok_or_else(malformed)?;
                Ok(Self::Sdcm { steps: positive(steps)?, centre: centre.trim().to_owned() })
            }
            "circle" => Ok(Self::Circle { steps: positive(rest)? }),
            "polygon" => {
                let corners = rest
                    .split(';')
                    .map(|corner| {
                        let (u, v) = corner.split_once(',').ok_or_else(malformed)?;
                        Ok([number(u).ok_or_else(malformed)?, number(v).ok_or_else(malformed)?])
                    })
                    .collect::<Result<Vec<_>, SpecError>>()?;
                if corners.len() < 3 { Err(malformed()) } else { Ok(Self::Polygon(corners)) }
            }
            _ => Err(malformed()),
        }
    }
}

/// What the solver makes as large as it can.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
pub enum Maximise {
    /// Luminous efficacy of radiation, lm per optical watt.
    #[default]
    Ler,
    /// Luminous efficacy of the device, lm per electrical watt.
    Efficacy,
    /// CIE 13.3 Ra.
    Ra,
    /// CIE 224 / TM-30 Rf.
    Rf,
}

/// Everything a blend must meet.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct WhiteSpec {
    /// Target correlated colour temperature, K.
    pub cct_k: f64,
    /// Target Duv (signed distance from the Planckian locus in CIE 1960 uv).
    pub duv: f64,
    /// Where the white may lie.
    #[serde(default)]
    pub region: Region,
    /// Limits on the metrics.
    #[serde(default)]
    pub limits: Limits,
    /// What to maximise.
    #[serde(default)]
    pub maximise: Maximise,
    /// Wanted luminous flux, lm.
    #[serde(default)]
    pub lumens: Option<f64>,
    /// Wanted luminance, cd/m².
    #[serde(default)]
    pub luminance_cd_per_m2: Option<f64>,
}

impl Default for WhiteSpec {
    fn default() -> Self {
        Self {
            cct_k: 3000.0,
            duv: 0.0,
            region: Region::Point,
            limits: Limits::default(),
            maximise: Maximise::Ler,
            lumens: None,
            luminance_cd_per_m2: None,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn limits_read_back_what_they_write() {
        for text in ["90..", "..30", "97..103", "-20..0"] {
            let limit: Limit = text.parse().unwrap();
            assert_eq!(limit.to_string(), text);
        }
    }

    #[test]
    fn malformed_limits_are_refused_with_what_was_expected() {
        for text in ["", "..", "90", "a..", "9..1", "nan..", "1..inf"] {
            assert!(text.parse::<Limit>().is_err(), "{text}");
        }
    }

    #[test]
    fn regions_read_back_what_they_write() {
        for text in [
            "point",
            "box:175,0.006",
            "quadrangle:3000",
            "sdcm:3@F3000",
            "circle:2",
            "polygon:0.2,0.4;0.3,0.4;0.3,0.5",
        ] {
            let region: Region = text.parse().unwrap();
            assert_eq!(region.to_string(), text);
        }
        for text in ["", "box:1", "box:-1,0", "circle:0", "circle:x", "polygon:1,2;3,4", "sdcm:3", "oval:2"] {
            assert!(text.parse::<Region>().is_err(), "{text}");
        }
    }

    #[test]
    fn margin_is_the_distance_to_the_nearer_end() {
        assert_eq!(Limit::between(95.0, 105.0).margin(104.0), Some(1.0));
        assert_eq!(Limit::at_least(90.0).margin(88.0), Some(-2.0));
        assert_eq!(Limit::default().margin(1.0), None);
    }
}
