//! Every fabrication number in the units of the line, with its target and allowed band.

use super::{Making, MakingError};
use device::bands::Bands;
use device::build::FormSettings;
use device::recipe::Details;
use device::{Quantity, QuantityKind};
use serde::Serialize;

/// One number a line sets.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Number {
    /// The part it belongs to: an emitter, a converter, or empty for the whole device.
    pub part: String,
    /// What is set.
    pub quantity: String,
    /// Unit; empty for a plain number.
    pub unit: &'static str,
    /// Value as it stands.
    pub value: f64,
    /// Value that follows from the blend; `None` where there is none.
    pub target: Option<f64>,
    /// Lower end of the band when every number uses its band at once; `None` where no band is known.
    pub low: Option<f64>,
    /// Upper end of that band.
    pub high: Option<f64>,
    /// Lower end with every other number on target.
    pub low_alone: Option<f64>,
    /// Upper end with every other number on target.
    pub high_alone: Option<f64>,
    /// Whether the band downward ends where the measured range or the search ends, not at the region's edge.
    pub open_low: bool,
    /// As `open_low`, upward.
    pub open_high: bool,
    /// Which number it is to the device crate; `None` for counts, repeats and what only follows from others.
    #[serde(skip)]
    pub key: Option<Quantity>,
    /// Factor from the device crate's unit to this one.
    #[serde(skip)]
    pub factor: f64,
    /// Whether it must not be changed when the white is brought back.
    pub locked: bool,
}

/// Unit of the line for a quantity, and the factor from the device crate's unit.
pub fn line_unit(kind: QuantityKind) -> (&'static str, f64) {
    match kind {
        QuantityKind::AreaShare | QuantityKind::UnitEqe => ("%", 100.0),
        other => (other.unit(), 1.0),
    }
}

impl Making {
    /// Every number of the device, continuous ones first; bands where given.
    pub fn numbers(&self, bands: Option<&Bands>) -> Vec<Number> {
        let Ok(made) = self.made() else { return Vec::new() };
        let targets = self.target.as_ref().ok().and_then(|t| t.made.as_ref()).map(device::Made::numbers);
        let targets = targets.unwrap_or_default();
        let mut out: Vec<Number> = made
            .numbers()
            .into_iter()
            .map(|(key, value)| {
                let (unit, factor) = line_unit(key.kind);
                let band = bands.and_then(|bands| bands.bands.iter().find(|band| band.quantity == key));
                let target = targets.iter().find(|(other, _)| *other == key).map(|(_, value)| value * factor);
                Number {
                    part: self.part_of(key),
                    quantity: key.kind.label().to_owned(),
                    unit,
                    value: value * factor,
                    target,
                    low: band.map(|band| band.together_low * factor),
                    high: band.map(|band| band.together_high * factor),
                    low_alone: band.map(|band| band.alone_low * factor),
                    high_alone: band.map(|band| band.alone_high * factor),
                    open_low: band.is_some_and(|band| band.open_low),
                    open_high: band.is_some_and(|band| band.open_high),
                    key: Some(key),
                    factor,
                    locked: self.plan.locked.contains(&key),
                }
            })
            .collect();
        self.stripe_widths(&mut out);
        self.loadings(&mut out);
        self.fixed(&mut out);
        out
    }

    /// The part a number belongs to, in words.
    pub fn part_of(&self, key: Quantity) -> String {
        let Some(channel) = key.channel else { return String::new() };
        if let Some(layer) = key.layer {
            let driven = self.devices.driven(&self.build);
            let pump = driven.get(channel).copied();
            let conversion = self.build.conversions.iter().find(|c| Some(c.pump) == pump);
            let emitter = conversion.and_then(|c| c.layers.get(layer)).map(|layer| layer.emitter);
            return emitter
                .and_then(|emitter| self.devices.emitters.get(emitter))
                .map_or_else(String::new, |emitter| emitter.name.clone());
        }
        self.channel_name(channel).to_owned()
    }

    /// Stripe widths follow from areas and the pitch.
    fn stripe_widths(&self, out: &mut Vec<Number>) {
        let FormSettings::SideBySide(form) = &self.build.form else { return };
        let Some(layout) = form.layout else { return };
        let widths: Vec<Number> = out
            .iter()
            .filter(|n| n.key.is_some_and(|key| key.kind == QuantityKind::AreaShare))
            .map(|area| {
                // A share in per cent times the pitch.
                let wide = |share: f64| share / 100.0 * layout.pitch_um;
                Number {
                    quantity: "stripe width".to_owned(),
                    unit: "\u{b5}m",
                    value: wide(area.value),
                    target: area.target.map(wide),
                    low: area.low.map(wide),
                    high: area.high.map(wide),
                    low_alone: area.low_alone.map(wide),
                    high_alone: area.high_alone.map(wide),
                    key: None,
                    factor: 1.0,
                    locked: false,
                    ..area.clone()
                }
            })
            .collect();
        out.extend(widths);
    }

    /// Loadings in wt% follow from optical depths where absorption and thickness are known.
    fn loadings(&self, out: &mut Vec<Number>) {
        let driven = self.devices.driven(&self.build);
        let loadings: Vec<Number> = out
            .iter()
            .filter_map(|depth| {
                let key = depth.key.filter(|key| key.kind == QuantityKind::OpticalDepth)?;
                let pump = driven.get(key.channel?).copied()?;
                let conversion = self.build.conversions.iter().find(|c| c.pump == pump)?;
                let layer = conversion.layers.get(key.layer?)?;
                layer.loading_percent(1.0)?;
                let load = |depth: f64| layer.loading_percent(depth).unwrap_or(f64::NAN);
                Some(Number {
                    quantity: "converter loading".to_owned(),
                    unit: "wt%",
                    value: load(depth.value),
                    target: depth.target.map(load),
                    low: depth.low.map(load),
                    high: depth.high.map(load),
                    low_alone: depth.low_alone.map(load),
                    high_alone: depth.high_alone.map(load),
                    key: None,
                    factor: 1.0,
                    locked: false,
                    ..depth.clone()
                })
            })
            .collect();
        out.extend(loadings);
    }

    /// Whole numbers and settings that are not moved continuously.
    fn fixed(&self, out: &mut Vec<Number>) {
        let mut push = |part: &str, quantity: &str, unit: &'static str, value: f64| {
            out.push(Number {
                part: part.to_owned(),
                quantity: quantity.to_owned(),
                unit,
                value,
                target: Some(value),
                low: None,
                high: None,
                low_alone: None,
                high_alone: None,
                open_low: false,
                open_high: false,
                key: None,
                factor: 1.0,
                locked: false,
            });
        };
        match &self.recipe.details {
            Some(Details::SeriesStack { units, total_voltage_v, .. }) => {
                for unit in units {
                    push(&unit.name, "repeats", "", f64::from(unit.repeats));
                }
                total_voltage_v.iter().for_each(|volts| push("", "voltage of the stack", "V", *volts));
            }
            Some(Details::Packages { packages, .. }) => {
                for line in packages.iter().filter(|line| line.count > 0) {
                    push(&line.name, "packages", "", f64::from(line.count));
                    if let (Some(strings), Some(in_series)) = (line.strings, line.in_series) {
                        push(&line.name, "strings", "", f64::from(strings));
                        push(&line.name, "packages on a string", "", f64::from(in_series));
                    }
                    line.string_voltage_v.iter().for_each(|v| push(&line.name, "string voltage", "V", *v));
                }
            }
            Some(Details::SideBySide { .. } | Details::SharedZone { .. }) | None => {}
        }
        if let FormSettings::SideBySide(form) = &self.build.form
            && let Some(layout) = form.layout
        {
            push("", "pitch of the stripes", "\u{b5}m", layout.pitch_um);
            push("", "gap between stripes", "\u{b5}m", layout.gap_um);
        }
        for emitter in &self.recipe.emitters {
            if matches!(self.build.form, FormSettings::SideBySide(_) | FormSettings::SeriesStack(_))
                && let Some(volts) = emitter.voltage_v.filter(|_| emitter.converted_by.is_none())
            {
                push(&emitter.name, "voltage", "V", volts);
            }
        }
    }

    /// The numbers with their bands, or without where no band can be given, and the sentence that says why.
    pub fn numbers_and_bands(&self) -> (Vec<Number>, Result<Bands, MakingError>) {
        let bands = self.bands();
        (self.numbers(bands.as_ref().ok()), bands)
    }
}
