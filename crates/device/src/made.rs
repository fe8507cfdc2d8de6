//! The numbers a line sets, form by form, and what they are called.

use serde::{Deserialize, Serialize};

use crate::form::BuildForm;
use crate::packages::Board;
use crate::series_stack::Stack;
use crate::shared_zone::Zone;
use crate::side_by_side::{StripeCurrents, Stripes};

/// Fabrication quantities of one device, by driven channel.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Quantities {
    /// Stripes.
    SideBySide(Stripes),
    /// Stacked units.
    SeriesStack(Stack),
    /// One zone.
    SharedZone(Zone),
    /// Packages.
    Packages(Board),
}

/// A device as made: the form's quantities and the optical depths of its converters.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Made {
    /// Quantities of the form.
    pub quantities: Quantities,
    /// Optical depth of each converter layer at its pump's light: one list a driven channel.
    pub depths: Vec<Vec<f64>>,
}

/// Which number of a made device.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum QuantityKind {
    /// Area share of a stripe.
    AreaShare,
    /// Current density of one emitter.
    CurrentDensity,
    /// Current density of the whole device.
    CommonCurrentDensity,
    /// Voltage of the whole device.
    CommonVoltage,
    /// External quantum efficiency of a stacked unit, summed over repeats.
    UnitEqe,
    /// Concentration of a dopant.
    Concentration,
    /// Thickness of a layer.
    Thickness,
    /// Current of a package.
    PackageCurrent,
    /// Flux of a package relative to its sheet.
    PackageFlux,
    /// Optical depth of a converter layer.
    OpticalDepth,
}

impl QuantityKind {
    /// The quantity in words.
    pub fn label(self) -> &'static str {
        match self {
            QuantityKind::AreaShare => "area share",
            QuantityKind::CurrentDensity => "current density",
            QuantityKind::CommonCurrentDensity => "common current density",
            QuantityKind::CommonVoltage => "common voltage",
            QuantityKind::UnitEqe => "EQE of the unit",
            QuantityKind::Concentration => "concentration",
            QuantityKind::Thickness => "thickness",
            QuantityKind::PackageCurrent => "package current",
            QuantityKind::PackageFlux => "package flux",
            QuantityKind::OpticalDepth => "optical depth",
        }
    }

    /// The unit a line uses; empty for pure numbers.
    pub fn unit(self) -> &'static str {
        match self {
            QuantityKind::CurrentDensity | QuantityKind::CommonCurrentDensity => "mA/cm²",
            QuantityKind::CommonVoltage => "V",
            QuantityKind::Concentration => "wt%",
            QuantityKind::Thickness => "nm",
            QuantityKind::PackageCurrent => "mA",
            QuantityKind::AreaShare
            | QuantityKind::UnitEqe
            | QuantityKind::PackageFlux
            | QuantityKind::OpticalDepth => "",
        }
    }
}

/// Where a number sits: the channel (none for the whole device) and, for converters, the layer.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub struct Quantity {
    /// Which number.
    pub kind: QuantityKind,
    /// Driven channel; `None` for the whole device.
    pub channel: Option<usize>,
    /// Converter layer, from the pump outward.
    pub layer: Option<usize>,
}

impl Made {
    /// The build form.
    pub fn build_form(&self) -> BuildForm {
        match self.quantities {
            Quantities::SideBySide(_) => BuildForm::SideBySide,
            Quantities::SeriesStack(_) => BuildForm::SeriesStack,
            Quantities::SharedZone(_) => BuildForm::SharedZone,
            Quantities::Packages(_) => BuildForm::Packages,
        }
    }

    /// Every continuous number of the device, with its value; dark channels have none.
    pub fn numbers(&self) -> Vec<(Quantity, f64)> {
        let mut out = Vec::new();
        let of = |kind, channel: usize| Quantity { kind, channel: Some(channel), layer: None };
        let whole = |kind| Quantity { kind, channel: None, layer: None };
        match &self.quantities {
            Quantities::SideBySide(stripes) => {
                for (k, &area) in stripes.areas.iter().enumerate().filter(|(_, area)| **area > 0.0) {
                    out.push((of(QuantityKind::AreaShare, k), area));
                    if let StripeCurrents::Own(currents) = &stripes.currents {
                        out.push((of(QuantityKind::CurrentDensity, k), currents[k]));
                    }
                }
                match stripes.currents {
                    StripeCurrents::Common(current) => {
                        out.push((whole(QuantityKind::CommonCurrentDensity), current));
                    }
                    StripeCurrents::Voltage(voltage) => {
                        out.push((whole(QuantityKind::CommonVoltage), voltage));
                    }
                    StripeCurrents::Own(_) => {}
                }
            }
            Quantities::SeriesStack(stack) => {
                for (k, &eqe) in stack.eqe.iter().enumerate().filter(|(_, eqe)| **eqe > 0.0) {
                    out.push((of(QuantityKind::UnitEqe, k), eqe));
                }
                out.push((whole(QuantityKind::CommonCurrentDensity), stack.current_ma_per_cm2));
            }
            Quantities::SharedZone(zone) => {
                for (k, setting) in zone.settings.iter().enumerate() {
                    let concentration = setting.concentration_percent;
                    out.extend(concentration.map(|value| (of(QuantityKind::Concentration, k), value)));
                    out.extend(setting.thickness_nm.map(|value| (of(QuantityKind::Thickness, k), value)));
                }
                let current = zone.current_ma_per_cm2;
                out.extend(current.map(|value| (whole(QuantityKind::CommonCurrentDensity), value)));
            }
            Quantities::Packages(board) => {
                for (k, &current) in
                    board.currents_ma.iter().enumerate().filter(|(_, current)| **current > 0.0)
                {
                    out.push((of(QuantityKind::PackageCurrent, k), current));
                    out.push((
                        of(QuantityKind::PackageFlux, k),
                        board.flux_factors.get(k).copied().unwrap_or(1.0),
                    ));
                }
            }
        }
        for (channel, depths) in self.depths.iter().enumerate() {
            for (layer, &depth) in depths.iter().enumerate() {
                let kind = QuantityKind::OpticalDepth;
                out.push((Quantity { kind, channel: Some(channel), layer: Some(layer) }, depth));
            }
        }
        out
    }

    /// The same device with one number changed; unchanged where the number does not belong to this form.
    pub fn with(&self, quantity: Quantity, value: f64) -> Made {
        let mut made = self.clone();
        made.set(quantity, value);
        made
    }

    fn set(&mut self, quantity: Quantity, value: f64) {
        let k = quantity.channel.unwrap_or(usize::MAX);
        let slot = match (&mut self.quantities, quantity.kind) {
            (_, QuantityKind::OpticalDepth) => {
                self.depths.get_mut(k).and_then(|depths| depths.get_mut(quantity.layer.unwrap_or(usize::MAX)))
            }
            (Quantities::SideBySide(stripes), QuantityKind::AreaShare) => stripes.areas.get_mut(k),
            (Quantities::SideBySide(stripes), kind) => match (&mut stripes.currents, kind) {
                (StripeCurrents::Own(currents), QuantityKind::CurrentDensity) => currents.get_mut(k),
                (StripeCurrents::Common(current), QuantityKind::CommonCurrentDensity) => Some(current),
                (StripeCurrents::Voltage(voltage), QuantityKind::CommonVoltage) => Some(voltage),
                _ => None,
            },
            (Quantities::SeriesStack(stack), QuantityKind::UnitEqe) => stack.eqe.get_mut(k),
            (Quantities::SeriesStack(stack), QuantityKind::CommonCurrentDensity) => {
                Some(&mut stack.current_ma_per_cm2)
            }
            (Quantities::SharedZone(zone), QuantityKind::Concentration) => {
                zone.settings.get_mut(k).and_then(|setting| setting.concentration_percent.as_mut())
            }
            (Quantities::SharedZone(zone), QuantityKind::Thickness) => {
                zone.settings.get_mut(k).and_then(|setting| setting.thickness_nm.as_mut())
            }
            (Quantities::SharedZone(zone), QuantityKind::CommonCurrentDensity) => {
                zone.current_ma_per_cm2.as_mut()
            }
            (Quantities::Packages(board), QuantityKind::PackageCurrent) => board.currents_ma.get_mut(k),
            (Quantities::Packages(board), QuantityKind::PackageFlux) => board.flux_factors.get_mut(k),
            _ => None,
        };
        if let Some(slot) = slot {
            *slot = value;
        }
    }
}
