//! What a person may answer or overrule: the options `--axis`, `--ordinate`, `--per`, `--decimal`, `--columns`,
//! `--start` and `--step`.

use serde::{Deserialize, Serialize};
use std::str::FromStr;

/// The unit of the spectral axis.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub enum AxisUnit {
    /// Nanometre.
    Nm,
    /// Micrometre.
    Um,
    /// Ångström, 0.1 nm.
    Angstrom,
    /// Metre.
    M,
    /// Wavenumber in cm⁻¹.
    Cm1,
    /// Photon energy in eV.
    Ev,
}

impl AxisUnit {
    /// Every unit, in the order of the option's help.
    pub const ALL: [Self; 6] = [Self::Nm, Self::Um, Self::Angstrom, Self::M, Self::Cm1, Self::Ev];

    /// The word of the option `--axis`.
    pub const fn key(self) -> &'static str {
        match self {
            Self::Nm => "nm",
            Self::Um => "um",
            Self::Angstrom => "angstrom",
            Self::M => "m",
            Self::Cm1 => "cm-1",
            Self::Ev => "ev",
        }
    }

    /// The unit as written in sentences.
    pub const fn symbol(self) -> &'static str {
        match self {
            Self::Nm => "nm",
            Self::Um => "µm",
            Self::Angstrom => "Å",
            Self::M => "m",
            Self::Cm1 => "cm⁻¹",
            Self::Ev => "eV",
        }
    }

    /// True for the units of wavelength, false for energy and wavenumber.
    pub const fn is_wavelength(self) -> bool {
        !matches!(self, Self::Cm1 | Self::Ev)
    }
}

/// What the values count.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub enum Ordinate {
    /// Radiant power.
    Power,
    /// Photons.
    Photons,
}

impl Ordinate {
    /// Every kind.
    pub const ALL: [Self; 2] = [Self::Power, Self::Photons];

    /// The word of the option `--ordinate`.
    pub const fn key(self) -> &'static str {
        match self {
            Self::Power => "power",
            Self::Photons => "photons",
        }
    }
}

/// The axis interval the values are a density over.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub enum Per {
    /// Per nanometre (or any other unit of wavelength).
    Nm,
    /// Per electronvolt.
    Ev,
    /// Per cm⁻¹.
    Cm1,
}

impl Per {
    /// Every interval.
    pub const ALL: [Self; 3] = [Self::Nm, Self::Ev, Self::Cm1];

    /// The word of the option `--per`.
    pub const fn key(self) -> &'static str {
        match self {
            Self::Nm => "nm",
            Self::Ev => "ev",
            Self::Cm1 => "cm-1",
        }
    }

    /// The interval as written in sentences.
    pub const fn symbol(self) -> &'static str {
        match self {
            Self::Nm => "nm",
            Self::Ev => "eV",
            Self::Cm1 => "cm⁻¹",
        }
    }
}

/// The decimal mark.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub enum Decimal {
    /// 380.5
    Point,
    /// 380,5
    Comma,
}

impl Decimal {
    /// Both marks.
    pub const ALL: [Self; 2] = [Self::Point, Self::Comma];

    /// The word of the option `--decimal`.
    pub const fn key(self) -> &'static str {
        match self {
            Self::Point => "point",
            Self::Comma => "comma",
        }
    }

    /// The other mark.
    pub const fn other(self) -> Self {
        match self {
            Self::Point => Self::Comma,
            Self::Comma => Self::Point,
        }
    }
}

macro_rules! from_key {
    ($($kind:ty),*) => {$(
        impl FromStr for $kind {
            type Err = String;
            fn from_str(word: &str) -> Result<Self, String> {
                Self::ALL.into_iter().find(|one| one.key() == word).ok_or_else(|| {
                    let keys: Vec<_> = Self::ALL.iter().map(|one| one.key()).collect();
                    format!("expected {}, found {word:?}", keys.join(", "))
                })
            }
        }
    )*};
}
from_key!(AxisUnit, Ordinate, Per, Decimal);

/// Answers to a reader's questions; each one given also overrules what the file itself says.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct Answers {
    /// Unit of the axis.
    pub axis: Option<AxisUnit>,
    /// Power or photons; also declares an ordinate that is not emission to be emission.
    pub ordinate: Option<Ordinate>,
    /// The interval of the density.
    pub per: Option<Per>,
    /// The decimal mark.
    pub decimal: Option<Decimal>,
    /// The file columns that hold the spectra, counted from 1 (file rows when wavelengths run along a row). Naming a column
    /// also accepts it as it is: raw, mostly negative or with a hole.
    pub columns: Option<Vec<usize>>,
    /// First wavelength in nm of a file without axis.
    pub start_nm: Option<f64>,
    /// Step in nm of a file without axis; negative when the file descends.
    pub step_nm: Option<f64>,
}
