//! What each fabrication number does to the white, and what dimming does.

use serde::Serialize;

use crate::build::Build;
use crate::dimming::{self, Dimming};
use crate::error::DeviceError;
use crate::light::DeviceEmitter;
use crate::made::{Made, Quantities, Quantity};

/// What one fabrication number does to the white.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Sensitivity {
    /// The number.
    pub quantity: Quantity,
    /// Its value.
    pub value: f64,
    /// Change of u′ per +1 % of the number.
    pub du_prime_per_percent: f64,
    /// Change of v′ per +1 % of the number.
    pub dv_prime_per_percent: f64,
    /// Change of the lumens in per cent, per +1 % of the number; `None` where the level is unknown.
    pub flux_percent_per_percent: Option<f64>,
}

impl Build {
    /// What +1 % of every fabrication number does to the white and the lumens.
    ///
    /// Central differences over ±0.5 %; one-sided where a number sits at the end of what was measured.
    ///
    /// # Errors
    /// As [`Build::predict`] at the numbers themselves.
    pub fn sensitivities(
        &self,
        emitters: &[DeviceEmitter],
        made: &Made,
    ) -> Result<Vec<Sensitivity>, DeviceError> {
        let centre = self.predict(emitters, made)?;
        let at = |quantity: Quantity, value: f64| -> Option<(f64, f64, f64)> {
            let moved = self.predict(emitters, &made.with(quantity, value)).ok()?;
            let lumens = moved.luminous_exitance_lm_per_m2.or(moved.luminous_flux_lm);
            Some((moved.u_prime?, moved.v_prime?, lumens.unwrap_or(f64::NAN)))
        };
        let lumens = centre.luminous_exitance_lm_per_m2.or(centre.luminous_flux_lm);
        let middle = (
            centre.u_prime.unwrap_or(f64::NAN),
            centre.v_prime.unwrap_or(f64::NAN),
            lumens.unwrap_or(f64::NAN),
        );
        let sensitivity = |(quantity, value): (Quantity, f64)| {
            let up = at(quantity, value * 1.005);
            let down = at(quantity, value * 0.995);
            let (high, low, percent) = match (up, down) {
                (Some(up), Some(down)) => (up, down, 1.0),
                (Some(up), None) => (up, middle, 0.5),
                (None, Some(down)) => (middle, down, 0.5),
                (None, None) => (middle, middle, 1.0),
            };
            Sensitivity {
                quantity,
                value,
                du_prime_per_percent: (high.0 - low.0) / percent,
                dv_prime_per_percent: (high.1 - low.1) / percent,
                flux_percent_per_percent: lumens.map(|lumens| 100.0 * (high.2 - low.2) / lumens / percent),
            }
        };
        Ok(made.numbers().into_iter().map(sensitivity).collect())
    }

    /// Drift of a stack's white when dimmed to fractions of its full lumens.
    ///
    /// # Errors
    /// Another form, sheets without EQE, levels below what the sheets cover.
    pub fn dimming(
        &self,
        emitters: &[DeviceEmitter],
        made: &Made,
        levels: &[f64],
    ) -> Result<Vec<Dimming>, DeviceError> {
        let mut context = self.context(emitters)?;
        context.depths.clone_from(&made.depths);
        match &made.quantities {
            Quantities::SeriesStack(stack) => dimming::dimming(&context, stack, levels),
            _ => Err(DeviceError::Unreachable {
                reason: "the drift when dimmed is worked out for series stacks".to_owned(),
            }),
        }
    }
}
