//! Rules for stripes with own currents other than least power: equal currents, equal ageing.

use crate::error::DeviceError;
use crate::form::{Context, Realised};
use crate::power::LeastPower;
use crate::sheet::Sheet;
use crate::side_by_side::Stripes;

/// Areas at given currents.
pub(crate) fn areas_at(context: &Context<'_>, wanted: &[f64], currents: &[f64]) -> Vec<f64> {
    let area = |k: usize| {
        if wanted[k] > 0.0 { wanted[k] / context.characteristics[k].photon_current(currents[k]) } else { 0.0 }
    };
    (0..wanted.len()).map(area).collect()
}

/// Raises a common knob (log scale) until the areas fit the budget; the areas fill it where they can.
///
/// The knob's currents rise with it. Returns the currents at the lowest knob that fits.
fn lowest_that_fits(
    context: &Context<'_>,
    wanted: &[f64],
    budget: f64,
    (low, high): (f64, f64),
    currents: impl Fn(f64) -> Vec<f64>,
) -> Result<LeastPower, DeviceError> {
    let area = |log: f64| areas_at(context, wanted, &currents(log.exp())).iter().sum::<f64>();
    let (a, b) = (low.ln(), high.ln());
    let steps = 400;
    let at = |k: usize| a + (b - a) * k as f64 / steps as f64;
    let fits = |log: f64| area(log) <= budget * (1.0 + 1e-12);
    let Some(first) = (0..=steps).find(|&k| fits(at(k))) else {
        let least = (0..=steps).map(|k| area(at(k))).fold(f64::INFINITY, f64::min);
        return Err(DeviceError::Unreachable {
            reason: format!(
                "at the highest currents of the sheets the emitters take {least:.4} of the panel where \
                 {budget:.4} is there: ask for less light or allow more current"
            ),
        });
    };
    let mut log = at(first);
    if first > 0 {
        let (mut below, mut above) = (at(first - 1), at(first));
        for _ in 0..80 {
            let middle = 0.5 * (below + above);
            if middle <= below || middle >= above {
                break;
            }
            if fits(middle) { above = middle } else { below = middle }
        }
        log = above;
    }
    let found = currents(log.exp());
    let areas = areas_at(context, wanted, &found);
    Ok(LeastPower { watts: f64::NAN, currents: found, areas })
}

pub(crate) fn equal_current(
    context: &Context<'_>,
    wanted: &[f64],
    budget: f64,
) -> Result<LeastPower, DeviceError> {
    let (mut low, mut high) = (0.0f64, f64::INFINITY);
    for k in Context::lit(wanted) {
        let range = context.characteristics[k].range();
        (low, high) = (low.max(range.0), high.min(range.1));
    }
    if low > high {
        return Err(DeviceError::Unreachable {
            reason: "the sheets have no current density in common".to_owned(),
        });
    }
    let currents = |j: f64| wanted.iter().map(|d| if *d > 0.0 { j.clamp(low, high) } else { 0.0 }).collect();
    lowest_that_fits(context, wanted, budget, (low, high), currents)
}

/// τ_ref, J_ref and n of a sheet.
fn wear_of(name: &str, sheet: &Sheet) -> Result<(f64, f64, f64), DeviceError> {
    let found = sheet.wear.as_ref().and_then(|wear| {
        let all = (wear.time_constant_h?, wear.reference_current_ma_per_cm2?, wear.acceleration?);
        (all.0 > 0.0 && all.1 > 0.0 && all.2 > 0.0).then_some(all)
    });
    found.ok_or_else(|| DeviceError::Missing {
        emitter: name.to_owned(),
        missing: "equal ageing needs the life time constant, its reference current and the acceleration \
                  exponent, all above zero"
            .to_owned(),
    })
}

pub(crate) fn equal_ageing(
    context: &Context<'_>,
    wanted: &[f64],
    budget: f64,
    out: &mut Realised<Stripes>,
) -> Result<LeastPower, DeviceError> {
    let mut wear = vec![None; wanted.len()];
    // The knob is 1/τ*: currents rise with it. Each sheet bounds it by its own range of currents.
    let (mut low, mut high) = (0.0f64, f64::INFINITY);
    for k in Context::lit(wanted) {
        let emitter = &context.emitters[context.channels.driven[k]];
        let (tau, reference, n) = wear_of(&emitter.name, &emitter.sheet)?;
        let range = context.characteristics[k].range();
        low = low.max((range.0 / reference).powf(n) / tau);
        high = high.min((range.1 / reference).powf(n) / tau);
        wear[k] = Some((tau, reference, n));
    }
    if low > high {
        return Err(DeviceError::Unreachable {
            reason: "no life is common to all emitters inside their current ranges".to_owned(),
        });
    }
    let currents = |rate: f64| -> Vec<f64> {
        let current = |(k, wear): (usize, &Option<(f64, f64, f64)>)| {
            wear.map_or(0.0, |(tau, reference, n)| {
                let range = context.characteristics[k].range();
                (reference * (tau * rate).powf(1.0 / n)).clamp(range.0, range.1)
            })
        };
        wear.iter().enumerate().map(current).collect()
    };
    let found = lowest_that_fits(context, wanted, budget, (low, high), currents)?;
    let stretches: Vec<f64> = Context::lit(wanted)
        .filter_map(|k| context.emitters[context.channels.driven[k]].sheet.wear.as_ref()?.stretch)
        .collect();
    if stretches.windows(2).any(|pair| (pair[0] - pair[1]).abs() > 1e-9) {
        out.notices.push(
            "the stretching exponents differ: the emitters share their time constant but not the whole course"
                .to_owned(),
        );
    }
    Ok(found)
}
