//! How a light may look on a screen: sRGB for swatches and curves. An approximation of a screen, and to be labelled so.

use crate::appearance_model::{CAT02, Matrix3};
use crate::chromaticity::{Xy, Xyz};
use crate::observer::Observer;
use crate::tensor::Tensor;
use std::sync::LazyLock;

/// An sRGB colour, eight bits a channel.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub struct Srgb {
    /// Red.
    pub r: u8,
    /// Green.
    pub g: u8,
    /// Blue.
    pub b: u8,
}

/// Linear sRGB from X, Y, Z (IEC 61966-2-1, D65 white).
const RGB_FROM_XYZ: Matrix3 = Matrix3([
    [3.240_625_5, -1.537_208_0, -0.498_628_6],
    [-0.968_930_7, 1.875_756_1, 0.041_517_5],
    [0.055_710_1, -0.204_021_1, 1.056_995_9],
]);

/// X, Y, Z of the sRGB white (x 0.3127, y 0.3290).
static SRGB_WHITE: LazyLock<[f64; 3]> = LazyLock::new(|| Xy { x: 0.3127, y: 0.3290 }.xyz(1.0).to_array());
static XYZ_FROM_CAT02: LazyLock<Matrix3> = LazyLock::new(|| CAT02.inverse());

/// The colour of a chromaticity, as bright as the screen allows. Chromaticities the screen cannot show are moved
/// toward its white until they fit, so that hue is roughly kept.
pub fn of_chromaticity(xy: Xy) -> Srgb {
    if !(xy.x.is_finite() && xy.y.is_finite()) || xy.y <= 0.0 {
        return Srgb { r: 0, g: 0, b: 0 };
    }
    brightest(RGB_FROM_XYZ.times(xy.xyz(1.0).to_array()))
}

/// The colour a light has for the 1931 observer, as bright as the screen allows; black without light.
pub fn of_light(light: &Tensor) -> Srgb {
    of_chromaticity(light.xyz(Observer::Cie1931).xy())
}

/// The colour of monochromatic light; black outside 380–780 nm.
pub fn of_wavelength(nm: f64) -> Srgb {
    if !(crate::FIRST_NM..=crate::LAST_NM).contains(&nm) {
        return Srgb { r: 0, g: 0, b: 0 };
    }
    let mut grid = vec![0.0; crate::GRID_POINTS];
    let at = (nm - crate::FIRST_NM).floor() as usize;
    let part = nm - crate::FIRST_NM - at as f64;
    grid[at] = 1.0 - part;
    if at + 1 < grid.len() {
        grid[at + 1] = part;
    }
    of_light(&Tensor::of_grid(&grid))
}

/// A colour seen by an eye adapted to a white: the white itself becomes the screen's white, small differences from it
/// stay visible. Both need positive Y; the colour is shown at `luminance` (0..1) of the screen's white.
///
/// von Kries adaptation in CAT02, complete.
pub fn adapted(colour: Xyz, white: Xyz, luminance: f64) -> Srgb {
    let (c, w, s) = (CAT02.times(colour.to_array()), CAT02.times(white.to_array()), CAT02.times(*SRGB_WHITE));
    let seen: [f64; 3] = std::array::from_fn(|k| c[k] / w[k] * s[k]);
    let xyz = XYZ_FROM_CAT02.times(seen);
    if xyz.iter().any(|x| !x.is_finite()) || xyz[1] <= 0.0 {
        return Srgb { r: 0, g: 0, b: 0 };
    }
    let rgb = RGB_FROM_XYZ.times(xyz.map(|x| x / xyz[1] * luminance.clamp(0.0, 1.0)));
    encode(rgb.map(|x| x.clamp(0.0, 1.0)))
}

fn brightest(rgb: [f64; 3]) -> Srgb {
    // Y is 1, and so is the luminance of the white that is mixed in: hue is kept, saturation gives way.
    let least = rgb.iter().copied().fold(f64::INFINITY, f64::min);
    let mixed = if least < 0.0 {
        let share = -least / (1.0 - least);
        rgb.map(|x| x + share * (1.0 - x))
    } else {
        rgb
    };
    let most = mixed.iter().copied().fold(0.0, f64::max);
    encode(mixed.map(|x| (x / most).clamp(0.0, 1.0)))
}

/// The transfer curve of IEC 61966-2-1.
fn encode(linear: [f64; 3]) -> Srgb {
    let [r, g, b] = linear.map(|x| {
        let encoded = if x <= 0.003_130_8 { 12.92 * x } else { 1.055 * x.powf(1.0 / 2.4) - 0.055 };
        (255.0 * encoded).round() as u8
    });
    Srgb { r, g, b }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_screens_white_is_white() {
        assert_eq!(of_chromaticity(Xy { x: 0.3127, y: 0.3290 }), Srgb { r: 255, g: 255, b: 255 });
    }

    #[test]
    fn the_screens_primaries_are_its_channels() {
        // IEC 61966-2-1: red .64 .33, green .30 .60, blue .15 .06.
        for (x, y, channels) in
            [(0.64, 0.33, [255, 0, 0]), (0.30, 0.60, [0, 255, 0]), (0.15, 0.06, [0, 0, 255])]
        {
            let Srgb { r, g, b } = of_chromaticity(Xy { x, y });
            for (got, expected) in [r, g, b].into_iter().zip(channels) {
                assert!((i32::from(got) - expected).abs() <= 3, "{x} {y}: {r} {g} {b}");
            }
        }
    }

    #[test]
    fn wavelengths_look_as_they_are_named() {
        let blue = of_wavelength(460.0);
        assert!(blue.b > blue.r && blue.b > blue.g);
        let green = of_wavelength(530.0);
        assert!(green.g > green.r && green.g > green.b);
        let red = of_wavelength(640.0);
        assert!(red.r > red.g && red.r > red.b);
        assert_eq!(of_wavelength(900.0), Srgb { r: 0, g: 0, b: 0 });
    }

    #[test]
    fn an_adapted_eye_sees_its_white_as_white() {
        let warm = Xy { x: 0.45, y: 0.41 }.xyz(3.0);
        assert_eq!(adapted(warm, warm, 1.0), Srgb { r: 255, g: 255, b: 255 });
        let pink = adapted(Xy { x: 0.46, y: 0.40 }.xyz(3.0), warm, 0.8);
        assert!(pink.r > pink.g, "{pink:?}");
    }
}
