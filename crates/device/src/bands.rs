//! How far each fabrication number may stray before the white leaves its region.

use serde::Serialize;

use crate::build::Build;
use crate::error::DeviceError;
use crate::light::DeviceEmitter;
use crate::made::{Made, Quantity};

/// Furthest a number is moved, as a factor up and down: beyond it a band counts as open.
pub const FURTHEST_FACTOR: f64 = 2.0;

/// Numbers up to which every corner of the joint box is checked.
const ALL_CORNERS: usize = 10;

/// Directions in u′v′ whose extreme corners are checked beyond that.
const DIRECTIONS: usize = 96;

/// Steps on the way out at which the white is looked at.
const STEPS: u32 = 48;

/// The allowed band of one number.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Band {
    /// The number.
    pub quantity: Quantity,
    /// Its target.
    pub target: f64,
    /// Lowest value with all others on target.
    pub alone_low: f64,
    /// Highest value with all others on target.
    pub alone_high: f64,
    /// Lowest value when every number uses its joint band at once.
    pub together_low: f64,
    /// Highest value when every number uses its joint band at once.
    pub together_high: f64,
    /// The band stops at [`FURTHEST_FACTOR`] or at the end of what was measured, not at the region's edge.
    pub open_low: bool,
    /// As `open_low`, upward.
    pub open_high: bool,
}

/// Bands of all numbers.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Bands {
    /// One band a number.
    pub bands: Vec<Band>,
    /// Corners of the joint box that were checked.
    pub corners_checked: usize,
    /// Whether those were all corners, or only those that reach furthest in every direction of u′v′.
    pub every_corner: bool,
}

/// What a set of numbers gives.
#[derive(Debug, Clone, PartialEq)]
pub struct Outcome {
    /// Radiant shares.
    pub shares: Vec<f64>,
    /// Chromaticity u′, v′.
    pub white: (f64, f64),
}

/// Bands of numbers with a model of what they give and a region test on shares.
///
/// Each number is first moved alone, in steps outward, to where the white leaves the region. The joint box
/// takes the same fraction of every such band, the largest at which its corners stay inside. For areas,
/// currents and fluxes the white is a projective image of the numbers, so with a convex region good corners
/// make the whole box good. Numbers without influence stay open and outside the box.
///
/// # Errors
/// [`DeviceError::Unreachable`] where the target itself lies outside the region.
pub fn bands(
    numbers: &[(Quantity, f64)],
    model: impl Fn(&[f64]) -> Option<Outcome>,
    mut inside: impl FnMut(&[f64]) -> bool,
) -> Result<Bands, DeviceError> {
    let target: Vec<f64> = numbers.iter().map(|number| number.1).collect();
    let mut good = |values: &[f64]| model(values).is_some_and(|outcome| inside(&outcome.shares));
    if !good(&target) {
        return Err(DeviceError::Unreachable {
            reason: "the white of this recipe lies outside the region: there is no band to give".to_owned(),
        });
    }
    // Logarithms of the factors each number may take alone.
    let furthest = FURTHEST_FACTOR.ln();
    let mut alone = Vec::with_capacity(numbers.len());
    for (index, &value) in target.iter().enumerate() {
        let mut edge = |sign: f64| -> Side {
            if value <= 0.0 {
                return (0.0, true);
            }
            let mut at = |log: f64| {
                let mut moved = target.clone();
                moved[index] = value * (sign * log).exp();
                good(&moved)
            };
            // Steps grow outward, so that narrow bands are met early.
            let step = |k: u32| furthest * (f64::from(k) / f64::from(STEPS)).powi(2);
            let Some(out) = (1..=STEPS).find(|&k| !at(step(k))) else {
                return (furthest, true);
            };
            let (mut low, mut high) = (step(out - 1), step(out));
            for _ in 0..40 {
                let middle = 0.5 * (low + high);
                if at(middle) { low = middle } else { high = middle }
            }
            let mut beyond = target.clone();
            beyond[index] = value * (sign * high).exp();
            (low, model(&beyond).is_none())
        };
        alone.push((edge(-1.0), edge(1.0)));
    }
    let influences = |side: &Side| !(side.1 && side.0 >= furthest);
    let counted: Vec<usize> = (0..numbers.len())
        .filter(|&k| target[k] > 0.0 && (influences(&alone[k].0) || influences(&alone[k].1)))
        .collect();
    let box_at = |fraction: f64, signs: &dyn Fn(usize) -> bool| -> Vec<f64> {
        let mut values = target.clone();
        for (bit, &k) in counted.iter().enumerate() {
            let log = if signs(bit) { alone[k].1.0 } else { -alone[k].0.0 };
            values[k] *= (fraction * log).exp();
        }
        values
    };
    let every_corner = counted.len() <= ALL_CORNERS;
    let corners: Vec<Vec<bool>> = if every_corner {
        (0..1usize << counted.len())
            .map(|mask| (0..counted.len()).map(|bit| mask >> bit & 1 == 1).collect())
            .collect()
    } else {
        extreme_corners(&target, &counted, &alone, &model)
    };
    let mut all_inside = |fraction: f64| corners.iter().all(|c| good(&box_at(fraction, &|bit| c[bit])));
    let (mut low, mut high) = (0.0, 1.0);
    if all_inside(1.0) {
        low = 1.0;
    } else {
        for _ in 0..24 {
            let middle = 0.5 * (low + high);
            if all_inside(middle) { low = middle } else { high = middle }
        }
    }
    let band = |(k, &(quantity, value)): (usize, &(Quantity, f64))| {
        let ((down, open_low), (up, open_high)) = alone[k];
        let joint = if counted.contains(&k) { low } else { 1.0 };
        Band {
            quantity,
            target: value,
            alone_low: value * (-down).exp(),
            alone_high: value * up.exp(),
            together_low: value * (-joint * down).exp(),
            together_high: value * (joint * up).exp(),
            open_low,
            open_high,
        }
    };
    Ok(Bands {
        bands: numbers.iter().enumerate().map(band).collect(),
        corners_checked: corners.len(),
        every_corner,
    })
}

/// How far a number goes one way, as a logarithm, and whether it stops for another reason than the region.
type Side = (f64, bool);

/// The corners that move the white furthest, to first order, in evenly spread directions.
fn extreme_corners(
    target: &[f64],
    counted: &[usize],
    alone: &[(Side, Side)],
    model: &impl Fn(&[f64]) -> Option<Outcome>,
) -> Vec<Vec<bool>> {
    let white = |values: &[f64]| model(values).map(|outcome| outcome.white);
    let Some(centre) = white(target) else {
        return Vec::new();
    };
    // Movement per side, from a tenth of each band.
    let moves = |&k: &usize| {
        let shift = |log: f64| {
            let mut values = target.to_vec();
            values[k] *= (0.1 * log).exp();
            white(&values).map_or((0.0, 0.0), |w| (w.0 - centre.0, w.1 - centre.1))
        };
        (shift(-alone[k].0.0), shift(alone[k].1.0))
    };
    let moves: Vec<((f64, f64), (f64, f64))> = counted.iter().map(moves).collect();
    let mut corners: Vec<Vec<bool>> = (0..DIRECTIONS)
        .map(|d| {
            let angle = std::f64::consts::TAU * d as f64 / DIRECTIONS as f64;
            let along = |shift: (f64, f64)| shift.0 * angle.cos() + shift.1 * angle.sin();
            moves.iter().map(|(down, up)| along(*up) >= along(*down)).collect()
        })
        .collect();
    corners.sort();
    corners.dedup();
    corners
}

impl Build {
    /// Bands of every number of a made device, for a region test on radiant shares.
    ///
    /// # Errors
    /// As [`bands`] and [`Build::predict`].
    pub fn bands(
        &self,
        emitters: &[DeviceEmitter],
        made: &Made,
        inside: impl FnMut(&[f64]) -> bool,
    ) -> Result<Bands, DeviceError> {
        self.predict(emitters, made)?;
        let context = self.context(emitters)?;
        let numbers = made.numbers();
        let model = |values: &[f64]| -> Option<Outcome> {
            let mut moved = made.clone();
            for ((quantity, old), &value) in numbers.iter().zip(values) {
                if value.to_bits() != old.to_bits() {
                    moved = moved.with(*quantity, value);
                }
            }
            self.outcome(&context, &moved)
        };
        bands(&numbers, model, inside)
    }
}
