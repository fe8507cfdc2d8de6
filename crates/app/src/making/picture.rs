//! The device to scale: stripes in plan, stack or zone in section, packages on a board.

use super::Making;
use colour::appearance;
use device::FormSettings;
use device::made::Quantities;
use device::recipe::Details;
use files::drawing::figures::{
    Board, BoardPackage, DevicePicture, Look, StackLayer, StackSection, Stripe, StripePlan,
};
use files::drawing::{Ink, Pattern};

/// Pitch drawn where no stripe layout is given, µm.
const DRAWN_PITCH_UM: f64 = 1000.0;
/// Thickness drawn for a unit whose own is not given, nm.
const DRAWN_UNIT_NM: f64 = 100.0;
/// Side of a package and distance between centres as drawn, mm.
const DRAWN_PACKAGE_MM: (f64, f64) = (3.0, 4.5);

impl Making {
    /// How every emitter is told apart, in the plan's order.
    pub fn looks(&self) -> Vec<Look> {
        (0..self.devices.emitters.len())
            .map(|k| {
                let seen = appearance::of_light(&self.devices.tensors.tensor(k));
                Look {
                    name: self.devices.emitters[k].name.clone(),
                    ink: Ink(seen.r, seen.g, seen.b),
                    pattern: Pattern::of_index(k),
                }
            })
            .collect()
    }

    /// The device to scale; `None` where there is none to draw.
    pub fn picture(&self) -> Option<DevicePicture> {
        let looks = self.looks();
        let driven = self.devices.driven(&self.build);
        match &self.recipe.made.as_ref()?.quantities {
            Quantities::SideBySide(stripes) => {
                Some(DevicePicture::Stripes(self.stripes(&stripes.areas, &driven, &looks)))
            }
            Quantities::SeriesStack(stack) => {
                let mut layers = Vec::new();
                for &channel in stack.order.iter().rev().filter(|&&k| stack.eqe[k] > 0.0) {
                    let emitter = driven[channel];
                    for unit in (1..=stack.repeats[channel]).rev() {
                        let name = if stack.repeats[channel] > 1 {
                            format!("{}, unit {unit}", looks[emitter].name)
                        } else {
                            looks[emitter].name.clone()
                        };
                        layers.push(self.layer(emitter, name, None, &looks));
                    }
                }
                Some(DevicePicture::Stack(StackSection { layers, substrate: "substrate".to_owned() }))
            }
            Quantities::SharedZone(zone) => {
                let layers = zone.settings.iter().enumerate().rev().map(|(channel, setting)| {
                    let emitter = driven[channel];
                    let mut layer =
                        self.layer(emitter, looks[emitter].name.clone(), setting.thickness_nm, &looks);
                    if let Some(percent) = setting.concentration_percent {
                        layer.remark = format!("{percent:.3} wt%");
                    }
                    layer
                });
                let layers = layers.collect();
                Some(DevicePicture::Stack(StackSection { layers, substrate: "substrate".to_owned() }))
            }
            Quantities::Packages(_) => {
                let Some(Details::Packages { packages, total_count }) = &self.recipe.details else {
                    return None;
                };
                let packages = driven
                    .iter()
                    .zip(packages)
                    .filter(|(_, line)| line.count > 0)
                    .map(|(&emitter, line)| BoardPackage {
                        look: looks[emitter].clone(),
                        count: line.count,
                        remark: format!("{:.0} mA", line.current_ma),
                    })
                    .collect();
                Some(DevicePicture::Board(Board {
                    packages,
                    package_mm: DRAWN_PACKAGE_MM.0,
                    pitch_mm: DRAWN_PACKAGE_MM.1,
                    columns: f64::from(*total_count).sqrt().ceil().max(1.0) as u32,
                }))
            }
        }
    }

    fn stripes(&self, areas: &[f64], driven: &[usize], looks: &[Look]) -> StripePlan {
        let layout = match &self.build.form {
            FormSettings::SideBySide(form) => form.layout,
            _ => None,
        };
        let pitch_um = layout.map_or(DRAWN_PITCH_UM, |layout| layout.pitch_um);
        let lit: f64 = areas.iter().sum();
        let count = areas.iter().filter(|area| **area > 0.0).count().max(1);
        // What is not lit is dark between the stripes.
        let gap_um = ((1.0 - lit).max(0.0) * pitch_um) / count as f64;
        let mut stripes = Vec::new();
        for (&emitter, &area) in driven.iter().zip(areas).filter(|(_, area)| **area > 0.0) {
            stripes.push(Stripe { look: Some(looks[emitter].clone()), width_um: area * pitch_um });
            stripes.push(Stripe { look: None, width_um: gap_um });
        }
        StripePlan {
            stripes,
            minimum_feature_um: layout.map(|layout| layout.minimum_um).filter(|um| *um > 0.0),
        }
    }

    fn layer(&self, emitter: usize, name: String, nm: Option<f64>, looks: &[Look]) -> StackLayer {
        let id = self.devices.ids[emitter];
        let own = self.plan.thickness_nm.iter().find(|entry| entry.0 == id).map(|entry| entry.1);
        let known = nm.or(own).filter(|nm| nm.is_finite() && *nm > 0.0);
        StackLayer {
            name,
            thickness_nm: known.unwrap_or(DRAWN_UNIT_NM),
            look: Some(looks[emitter].clone()),
            remark: if known.is_some() { String::new() } else { "thickness not given".to_owned() },
        }
    }

    /// Words for what is drawn that is not known.
    pub fn picture_notes(&self) -> Vec<String> {
        let mut out = Vec::new();
        match &self.build.form {
            FormSettings::SideBySide(form) if form.layout.is_none() => {
                out.push(format!("no pitch is given: drawn on {DRAWN_PITCH_UM} \u{b5}m"));
            }
            FormSettings::Packages(_) => {
                out.push("the board shows counts, not places".to_owned());
            }
            _ => {}
        }
        out
    }
}
