//! How the white of a series stack moves when it is dimmed.

use serde::Serialize;

use crate::error::DeviceError;
use crate::form::Context;
use crate::light::delta_uv_prime;
use crate::series_stack::Stack;

/// How the white moves when a made stack is dimmed.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Dimming {
    /// Light level, a fraction of the full lumens.
    pub level: f64,
    /// Current density at that level when the amplitude is lowered, mA/cm².
    pub current_ma_per_cm2: f64,
    /// Δu′v′ against full level when the amplitude is lowered.
    pub amplitude_delta_uv_prime: f64,
    /// Δu′v′ when the pulse width is lowered at full current: the EQEs stay, so does the white.
    pub pulse_width_delta_uv_prime: f64,
    /// Lumens per watt by amplitude over lumens per watt by pulse width.
    pub efficacy_ratio: Option<f64>,
}

/// Drift of a stack's white at lower levels, by amplitude and by pulse width.
///
/// Tuned units are taken to keep their measured roll-off: `EQE_i(J) = eqe_i·EQE_sheet,i(J)/EQE_sheet,i(J_full)`.
pub(crate) fn dimming(
    context: &Context<'_>,
    made: &Stack,
    levels: &[f64],
) -> Result<Vec<Dimming>, DeviceError> {
    let lit: Vec<usize> = (0..made.eqe.len()).filter(|&k| made.eqe[k] > 0.0).collect();
    for &k in &lit {
        if !context.characteristics[k].has_eqe() {
            return Err(DeviceError::Missing {
                emitter: context.characteristics[k].name().to_owned(),
                missing: "EQE against current density is missing: the drift when dimmed needs it".to_owned(),
            });
        }
    }
    let full = made.current_ma_per_cm2;
    let lights = context.channel_lights();
    let photons = |j: f64| -> Vec<f64> {
        let of = |(k, eqe): (usize, &f64)| {
            let c = &context.characteristics[k];
            if *eqe > 0.0 { j * eqe * c.eqe(j) / c.eqe(full) } else { 0.0 }
        };
        made.eqe.iter().enumerate().map(of).collect()
    };
    let lumens = |j: f64| -> f64 { photons(j).iter().zip(&lights).map(|(n, l)| n * l.lumens).sum() };
    let white = |j: f64| context.white(&lights, &photons(j));
    let volts = |j: f64| -> Option<f64> {
        lit.iter().all(|&k| context.characteristics[k].has_voltage()).then(|| {
            lit.iter().map(|&k| f64::from(made.repeats[k]) * context.characteristics[k].voltage(j)).sum()
        })
    };
    let lowest = lit.iter().map(|&k| context.characteristics[k].range().0).fold(0.0, f64::max);
    let mut out = Vec::with_capacity(levels.len());
    for &level in levels {
        if !(level > 0.0 && level <= 1.0) {
            return Err(DeviceError::BadSetting {
                what: "a dimming level",
                value: level,
                expected: "a fraction above 0 and at most 1 is expected",
            });
        }
        let wanted = level * lumens(full);
        if lumens(lowest) > wanted {
            return Err(DeviceError::OutsideTable {
                quantity: "the current of a dimmed stack",
                at: level * full,
                low: lowest,
                high: full,
                unit: "mA/cm²",
            });
        }
        let (mut a, mut b) = (lowest.ln(), full.ln());
        for _ in 0..80 {
            let middle = 0.5 * (a + b);
            if lumens(middle.exp()) < wanted { a = middle } else { b = middle }
        }
        let current = if level >= 1.0 { full } else { b.exp() };
        let efficacy_ratio = volts(current).zip(volts(full)).map(|(dimmed, bright)| {
            (lumens(current) / (current * dimmed)) / (lumens(full) / (full * bright))
        });
        out.push(Dimming {
            level,
            current_ma_per_cm2: current,
            amplitude_delta_uv_prime: delta_uv_prime(white(current), white(full)),
            pulse_width_delta_uv_prime: 0.0,
            efficacy_ratio,
        });
    }
    Ok(out)
}
