//! Dominant (or complementary) wavelength and excitation purity.

use crate::chromaticity::Xy;
use crate::tables;

/// The equal-energy white, the usual origin for the dominant wavelength of an emitter.
pub const EQUAL_ENERGY: Xy = Xy { x: 1.0 / 3.0, y: 1.0 / 3.0 };

/// Dominant wavelength of a colour against a white.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Dominant {
    /// Dominant wavelength, nm; for purples the complementary one.
    pub wavelength_nm: f64,
    /// Whether the wavelength is the complementary one: the ray from the white meets the purple line.
    pub complementary: bool,
    /// Excitation purity: distance from the white over that of the boundary, 0 (white) to 1 (spectral, or on the purple line).
    pub purity: f64,
}

/// The spectral locus is followed from here …
const FIRST_NM: f64 = 380.0;
/// … to here; beyond, the chromaticity no longer moves.
const LAST_NM: f64 = 700.0;

/// Dominant wavelength and purity in CIE 1931 x, y: where the ray from the white through the colour leaves the area
/// between the spectral locus (380–700 nm, straight between whole nanometres) and the purple line.
///
/// None when the colour is the white itself, or either point is not finite or lies outside the area. *Source:* CIE 15.
pub fn dominant(colour: Xy, white: Xy) -> Option<Dominant> {
    let direction = [colour.x - white.x, colour.y - white.y];
    let reach = direction[0].hypot(direction[1]);
    if !reach.is_finite() || reach < 1e-9 {
        return None;
    }
    let locus = spectral_locus();
    let purity_of = |distance: f64| {
        let purity = 1.0 / distance;
        (purity <= 1.0 + 1e-6).then_some(purity)
    };
    if let Some((wavelength_nm, distance)) = leave(&locus, white, direction) {
        return Some(Dominant { wavelength_nm, complementary: false, purity: purity_of(distance)? });
    }
    let (first, last) = (locus[0], locus[locus.len() - 1]);
    let (_, distance) = cross(white, direction, last.1, first.1)?;
    let (wavelength_nm, _) = leave(&locus, white, [-direction[0], -direction[1]])?;
    Some(Dominant { wavelength_nm, complementary: true, purity: purity_of(distance)? })
}

/// Chromaticity of monochromatic light, 380–700 nm at 1 nm.
fn spectral_locus() -> Vec<(f64, Xy)> {
    let table = &*tables::CMF_1931;
    (0..table.wavelengths_nm.len())
        .filter(|i| (FIRST_NM..=LAST_NM).contains(&table.wavelengths_nm[*i]))
        .map(|i| {
            let [x, y, z] = [table.columns[0][i], table.columns[1][i], table.columns[2][i]];
            (table.wavelengths_nm[i], Xy { x: x / (x + y + z), y: y / (x + y + z) })
        })
        .collect()
}

/// Where the ray leaves through the spectral locus: wavelength, and distance in units of the direction.
fn leave(locus: &[(f64, Xy)], white: Xy, direction: [f64; 2]) -> Option<(f64, f64)> {
    locus.windows(2).find_map(|pair| {
        let (along, distance) = cross(white, direction, pair[0].1, pair[1].1)?;
        Some((pair[0].0 + along * (pair[1].0 - pair[0].0), distance))
    })
}

/// Ray against segment: position on the segment (0..1) and distance in units of the direction.
fn cross(origin: Xy, direction: [f64; 2], a: Xy, b: Xy) -> Option<(f64, f64)> {
    let edge = [b.x - a.x, b.y - a.y];
    let to = [a.x - origin.x, a.y - origin.y];
    let area = direction[0] * edge[1] - direction[1] * edge[0];
    if area == 0.0 {
        return None;
    }
    let distance = (to[0] * edge[1] - to[1] * edge[0]) / area;
    let along = (to[0] * direction[1] - to[1] * direction[0]) / area;
    (distance > 0.0 && (0.0..=1.0).contains(&along)).then_some((along, distance))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::{Observer, Tensor};

    fn line(nm: usize) -> Xy {
        let mut grid = vec![0.0; 401];
        grid[nm - 380] = 1.0;
        Tensor::of_grid(&grid).xyz(Observer::Cie1931).xy()
    }

    #[test]
    fn monochromatic_light_is_its_own_dominant_wavelength_at_purity_one() {
        for nm in [450, 500, 555, 620] {
            let found = dominant(line(nm), EQUAL_ENERGY).unwrap();
            assert!((found.wavelength_nm - nm as f64).abs() < 1e-6, "{found:?}");
            assert!(!found.complementary && (found.purity - 1.0).abs() < 1e-9);
        }
    }

    #[test]
    fn halfway_to_the_white_the_purity_is_one_half() {
        let spectral = line(530);
        let half = Xy { x: 0.5 * (spectral.x + EQUAL_ENERGY.x), y: 0.5 * (spectral.y + EQUAL_ENERGY.y) };
        let found = dominant(half, EQUAL_ENERGY).unwrap();
        assert!((found.wavelength_nm - 530.0).abs() < 1e-6 && (found.purity - 0.5).abs() < 1e-9);
    }

    #[test]
    fn a_purple_has_a_complementary_wavelength() {
        let (blue, red) = (line(450), line(640));
        let purple = Xy { x: 0.5 * (blue.x + red.x), y: 0.5 * (blue.y + red.y) };
        let found = dominant(purple, EQUAL_ENERGY).unwrap();
        assert!(found.complementary, "{found:?}");
        assert!((490.0..570.0).contains(&found.wavelength_nm), "{found:?}");
        assert!(found.purity > 0.8 && found.purity <= 1.0, "{found:?}");
    }

    #[test]
    fn white_has_none() {
        assert_eq!(dominant(EQUAL_ENERGY, EQUAL_ENERGY), None);
        assert_eq!(dominant(Xy { x: f64::NAN, y: 0.3 }, EQUAL_ENERGY), None);
    }
}
