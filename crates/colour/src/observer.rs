//! Standard observers.

use crate::tables::{self, Table};
use serde::{Deserialize, Serialize};

/// A standard colorimetric observer. The 1931 observer is the default of the trade; Rf and Rg use 1964.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord, Default, Serialize, Deserialize)]
pub enum Observer {
    /// CIE 1931, 2° (ISO/CIE 11664-1).
    #[default]
    Cie1931,
    /// CIE 1964, 10° (ISO/CIE 11664-1).
    Cie1964,
    /// CIE 170-2:2015, 2°, built on cone fundamentals.
    Cie2015TwoDegree,
    /// CIE 170-2:2015, 10°, built on cone fundamentals.
    Cie2015TenDegree,
}

impl Observer {
    /// Every observer, in the order a list shows them.
    pub const ALL: [Observer; 4] =
        [Observer::Cie1931, Observer::Cie1964, Observer::Cie2015TwoDegree, Observer::Cie2015TenDegree];

    /// Name as standards write it.
    pub fn name(self) -> &'static str {
        match self {
            Observer::Cie1931 => "CIE 1931 2°",
            Observer::Cie1964 => "CIE 1964 10°",
            Observer::Cie2015TwoDegree => "CIE 2015 2°",
            Observer::Cie2015TenDegree => "CIE 2015 10°",
        }
    }

    pub(crate) fn table(self) -> &'static Table {
        match self {
            Observer::Cie1931 => &tables::CMF_1931,
            Observer::Cie1964 => &tables::CMF_1964,
            Observer::Cie2015TwoDegree => &tables::CMF_2015_2,
            Observer::Cie2015TenDegree => &tables::CMF_2015_10,
        }
    }

    /// Position of this observer's X Y Z among the scalar columns of a tensor.
    pub(crate) fn column(self) -> usize {
        crate::tensor::column::XYZ + 3 * self as usize
    }

    /// Colour-matching functions x̄, ȳ, z̄ at 380, 381 … 780 nm (zero where the observer is not tabulated).
    pub fn matching_functions(self) -> [Vec<f64>; 3] {
        let table = self.table();
        [table.on_grid(0), table.on_grid(1), table.on_grid(2)]
    }
}
