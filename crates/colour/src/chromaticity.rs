//! Tristimulus values and the chromaticity diagrams, as types that cannot be mixed up.
//!
//! *Source:* CIE 15 (x y; u′ v′), CIE 13.3-1995 (u v 1960).

use serde::{Deserialize, Serialize};

/// Tristimulus values: sums of power times colour-matching function, W-scaled (Y × 683 is lumens for the 1931 observer).
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize, Deserialize)]
pub struct Xyz {
    /// X.
    pub x: f64,
    /// Y.
    pub y: f64,
    /// Z.
    pub z: f64,
}

/// Chromaticity x, y.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize, Deserialize)]
pub struct Xy {
    /// x = X/(X+Y+Z).
    pub x: f64,
    /// y = Y/(X+Y+Z).
    pub y: f64,
}

/// CIE 1960 u, v: the diagram in which CCT, Duv and CIE 13.3 are defined.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize, Deserialize)]
pub struct Uv {
    /// u = 4X/(X+15Y+3Z).
    pub u: f64,
    /// v = 6Y/(X+15Y+3Z).
    pub v: f64,
}

/// CIE 1976 u′, v′: the diagram in which colour differences of whites are stated.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize, Deserialize)]
pub struct UvPrime {
    /// u′ = 4X/(X+15Y+3Z).
    pub u: f64,
    /// v′ = 9Y/(X+15Y+3Z).
    pub v: f64,
}

impl Xyz {
    /// x, y. Not finite when X + Y + Z is zero.
    pub fn xy(self) -> Xy {
        let sum = self.x + self.y + self.z;
        Xy { x: self.x / sum, y: self.y / sum }
    }

    /// CIE 1960 u, v. Not finite when X + 15Y + 3Z is zero.
    pub fn uv(self) -> Uv {
        let sum = self.x + 15.0 * self.y + 3.0 * self.z;
        Uv { u: 4.0 * self.x / sum, v: 6.0 * self.y / sum }
    }

    /// CIE 1976 u′, v′.
    pub fn uv_prime(self) -> UvPrime {
        self.uv().uv_prime()
    }

    /// X, Y, Z as an array.
    pub fn to_array(self) -> [f64; 3] {
        [self.x, self.y, self.z]
    }

    /// From X, Y, Z.
    pub fn from_array([x, y, z]: [f64; 3]) -> Xyz {
        Xyz { x, y, z }
    }
}

impl Xy {
    /// CIE 1960 u = 4x/(−2x+12y+3), v = 6y/(−2x+12y+3).
    pub fn uv(self) -> Uv {
        let sum = -2.0 * self.x + 12.0 * self.y + 3.0;
        Uv { u: 4.0 * self.x / sum, v: 6.0 * self.y / sum }
    }

    /// CIE 1976 u′, v′.
    pub fn uv_prime(self) -> UvPrime {
        self.uv().uv_prime()
    }

    /// X, Y, Z with the given Y. Not finite when y is zero.
    pub fn xyz(self, y: f64) -> Xyz {
        Xyz { x: self.x * y / self.y, y, z: (1.0 - self.x - self.y) * y / self.y }
    }
}

impl Uv {
    /// x = 3u/(2u−8v+4), y = 2v/(2u−8v+4).
    pub fn xy(self) -> Xy {
        let sum = 2.0 * self.u - 8.0 * self.v + 4.0;
        Xy { x: 3.0 * self.u / sum, y: 2.0 * self.v / sum }
    }

    /// u′ = u, v′ = 1.5 v.
    pub fn uv_prime(self) -> UvPrime {
        UvPrime { u: self.u, v: 1.5 * self.v }
    }

    /// Distance in the 1960 diagram.
    pub fn distance(self, other: Uv) -> f64 {
        (self.u - other.u).hypot(self.v - other.v)
    }
}

impl UvPrime {
    /// CIE 1960: u = u′, v = v′/1.5.
    pub fn uv(self) -> Uv {
        Uv { u: self.u, v: self.v / 1.5 }
    }

    /// x, y.
    pub fn xy(self) -> Xy {
        self.uv().xy()
    }

    /// Δu′v′: distance in the 1976 diagram.
    pub fn distance(self, other: UvPrime) -> f64 {
        (self.u - other.u).hypot(self.v - other.v)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn diagrams_convert_both_ways() {
        let xyz = Xyz { x: 95.0, y: 100.0, z: 108.0 };
        let (xy, uv, uv_prime) = (xyz.xy(), xyz.uv(), xyz.uv_prime());
        assert!((uv.xy().x - xy.x).abs() < 1e-15 && (uv.xy().y - xy.y).abs() < 1e-15);
        assert!((xy.uv().u - uv.u).abs() < 1e-15 && (xy.uv().v - uv.v).abs() < 1e-15);
        assert!((uv_prime.xy().y - xy.y).abs() < 1e-15);
        let back = xy.xyz(100.0);
        assert!((back.x - 95.0).abs() < 1e-12 && (back.z - 108.0).abs() < 1e-12);
    }

    #[test]
    fn equal_energy_white_is_a_third_a_third() {
        let xyz = Xyz { x: 1.0, y: 1.0, z: 1.0 };
        assert!((xyz.xy().x - 1.0 / 3.0).abs() < 1e-15);
        assert!((xyz.uv_prime().u - 4.0 / 19.0).abs() < 1e-15);
        assert!((xyz.uv_prime().v - 9.0 / 19.0).abs() < 1e-15);
    }
}
