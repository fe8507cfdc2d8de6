//! One emitter: the menu of its row and the sheet of its details.

use super::super::theme::Palette;
use super::super::view::{Scene, View};
use super::super::wish::Wish;
use crate::state::Edit;
use egui::{DragValue, Modal, Popup, Response, RichText, Ui};
use project::{Correction, CorrectionStep, Emitter, EmitterId, EmitterSet, Geometry, Mounting, Origin};

/// The emitter whose details are open, with what is typed and not yet asked for.
#[derive(Debug, Clone, PartialEq)]
pub(in crate::window) struct Details {
    pub(in crate::window) emitter: EmitterId,
    name: String,
    note: String,
}

/// The menu behind a row's three dots.
pub(in crate::window) fn menu(
    button: &Response,
    emitter: &Emitter,
    row: usize,
    set: &EmitterSet,
    view: &mut View,
    wishes: &mut Vec<Wish>,
) {
    Popup::menu(button).show(|ui| {
        ui.set_min_width(190.0);
        let (id, count) = (emitter.id, set.members.len());
        if ui.button("Details\u{2026}").clicked() {
            view.details =
                Some(Details { emitter: id, name: emitter.name.clone(), note: emitter.note.clone() });
        }
        ui.separator();
        let mut moved = |ui: &mut Ui, able: bool, words: &str, to: usize| {
            if ui.add_enabled(able, egui::Button::new(words)).clicked() {
                wishes.push(Wish::Edit(Edit::MoveMember { set: set.id, emitter: id, to }));
            }
        };
        moved(ui, row > 0, "Move up", row.saturating_sub(1));
        moved(ui, row + 1 < count, "Move down", row + 1);
        ui.separator();
        if ui.button("Take out of this set").clicked() {
            wishes.push(Wish::Edit(Edit::RemoveMember { set: set.id, emitter: id }));
        }
        if ui.button("Delete from the project").clicked() {
            wishes.push(Wish::Edit(Edit::RemoveEmitter(id)));
        }
    });
}

/// The sheet of an emitter's details, while it is open.
pub(in crate::window) fn show(ui: &mut Ui, scene: &Scene<'_>, view: &mut View, wishes: &mut Vec<Wish>) {
    let Some(mut details) = view.details.take() else { return };
    let Some(emitter) = scene.state.project().emitter(details.emitter) else { return };
    let modal = Modal::new(egui::Id::unique("emitter details"))
        .frame(super::super::controls::sheet_frame(ui))
        .show(ui.ctx(), |ui| {
            ui.set_width(460.0);
            body(ui, emitter, &mut details, scene, wishes);
            ui.add_space(8.0);
            ui.button("Done").clicked()
        });
    let typed = |wishes: &mut Vec<Wish>| {
        if details.name != emitter.name && !details.name.trim().is_empty() {
            wishes.push(Wish::Edit(Edit::EmitterName { emitter: emitter.id, name: details.name.clone() }));
        }
        if details.note != emitter.note {
            wishes.push(Wish::Edit(Edit::EmitterNote { emitter: emitter.id, note: details.note.clone() }));
        }
    };
    if modal.inner || modal.should_close() {
        typed(wishes);
    } else {
        view.details = Some(details);
    }
}

fn body(ui: &mut Ui, emitter: &Emitter, details: &mut Details, scene: &Scene<'_>, wishes: &mut Vec<Wish>) {
    let palette = Palette::of(ui.ctx());
    let id = emitter.id;
    ui.heading(&emitter.name);
    if emitter.invented {
        ui.label(RichText::new("Invented for demonstration; never measured.").color(palette.caution));
    }
    ui.add_space(6.0);
    egui::Grid::new("emitter details").num_columns(2).spacing([14.0, 8.0]).show(ui, |ui| {
        let label = ui.label("name");
        ui.text_edit_singleline(&mut details.name).labelled_by(label.id);
        ui.end_row();
        let label = ui.label("note");
        ui.add(egui::TextEdit::multiline(&mut details.note).desired_rows(2)).labelled_by(label.id);
        ui.end_row();
        ui.label("light collected");
        geometry(ui, emitter, wishes);
        ui.end_row();
        ui.label("light made by");
        origin(ui, emitter, wishes);
        ui.end_row();
        ui.label("measured");
        choice(
            ui,
            "measured alone or in the stack",
            emitter.mounting,
            &[
                (Mounting::Unknown, "not stated"),
                (Mounting::SingleDevice, "as a device of its own"),
                (Mounting::InStack, "inside the finished stack"),
            ],
            |mounting| wishes.push(Wish::Edit(Edit::EmitterMounting { emitter: id, mounting })),
        );
        ui.end_row();
        ui.label("wall-plug efficiency");
        ui.horizontal(|ui| {
            let mut percent = emitter.wall_plug.unwrap_or(0.0) * 100.0;
            let field = DragValue::new(&mut percent)
                .range(0.0..=100.0)
                .speed(0.1)
                .max_decimals(2)
                .suffix(" %")
                .update_while_editing(false);
            let response = ui.add(field).accessible_name("wall-plug efficiency in percent");
            if response.drag_started() {
                wishes.push(Wish::Begin("change the wall-plug efficiency".to_owned()));
            }
            if response.changed() {
                let wall_plug = (percent > 0.0).then_some(percent / 100.0);
                wishes.push(Wish::Edit(Edit::WallPlug { emitter: id, wall_plug }));
            }
            if response.drag_stopped() {
                wishes.push(Wish::End);
            }
            ui.weak(if emitter.wall_plug.is_none() {
                "not stated"
            } else {
                "optical W of each electrical W"
            });
        });
        ui.end_row();
    });
    ui.add_space(8.0);
    corrections(ui, emitter, wishes);
    sources(ui, emitter, scene);
}

fn choice<T: PartialEq + Copy>(ui: &mut Ui, name: &str, now: T, all: &[(T, &str)], chosen: impl FnOnce(T)) {
    let words = all.iter().find(|(value, _)| *value == now).map_or("other", |(_, words)| words);
    let mut picked = None;
    let response = egui::ComboBox::from_id_salt(name).width(220.0).selected_text(words).show_ui(ui, |ui| {
        for (value, words) in all {
            if ui.selectable_label(*value == now, *words).clicked() {
                picked = Some(*value);
            }
        }
    });
    response.response.accessible_name(name);
    if let Some(value) = picked.filter(|value| *value != now) {
        chosen(value);
    }
}

fn geometry(ui: &mut Ui, emitter: &Emitter, wishes: &mut Vec<Wish>) {
    let id = emitter.id;
    ui.horizontal(|ui| {
        let angle = match emitter.geometry {
            Geometry::Angle(angle) => angle,
            _ => 30.0,
        };
        choice(
            ui,
            "how the light was collected",
            emitter.geometry,
            &[
                (Geometry::Unknown, "not stated"),
                (Geometry::Sphere, "in an integrating sphere"),
                (Geometry::Normal, "along the normal"),
                (Geometry::Angle(angle), "at one angle"),
            ],
            |geometry| wishes.push(Wish::Edit(Edit::EmitterGeometry { emitter: id, geometry })),
        );
        if let Geometry::Angle(mut angle) = emitter.geometry {
            let field =
                DragValue::new(&mut angle).range(0.0..=89.0).suffix("\u{b0}").update_while_editing(false);
            if ui.add(field).accessible_name("angle from the normal").changed() {
                wishes.push(Wish::Edit(Edit::EmitterGeometry {
                    emitter: id,
                    geometry: Geometry::Angle(angle),
                }));
            }
        }
    });
}

fn origin(ui: &mut Ui, emitter: &Emitter, wishes: &mut Vec<Wish>) {
    let id = emitter.id;
    ui.horizontal(|ui| {
        let current = match emitter.origin {
            Origin::Electroluminescence { current_density_ma_per_cm2 } => current_density_ma_per_cm2,
            _ => None,
        };
        choice(
            ui,
            "what made the light",
            emitter.origin,
            &[
                (Origin::Unknown, "not stated"),
                (Origin::Electroluminescence { current_density_ma_per_cm2: current }, "electroluminescence"),
                (Origin::FilmPhotoluminescence, "photoluminescence of a film"),
                (Origin::Modelled, "a model"),
            ],
            |origin| wishes.push(Wish::Edit(Edit::EmitterOrigin { emitter: id, origin })),
        );
        if let Origin::Electroluminescence { current_density_ma_per_cm2 } = emitter.origin {
            let mut drive = current_density_ma_per_cm2.unwrap_or(0.0);
            let field = DragValue::new(&mut drive)
                .range(0.0..=1e5)
                .suffix(" mA/cm\u{b2}")
                .update_while_editing(false);
            if ui.add(field).accessible_name("current density").changed() {
                let origin = Origin::Electroluminescence {
                    current_density_ma_per_cm2: (drive > 0.0).then_some(drive),
                };
                wishes.push(Wish::Edit(Edit::EmitterOrigin { emitter: id, origin }));
            }
        }
    });
}

/// The reversible steps over the samples: each can be switched off again.
fn corrections(ui: &mut Ui, emitter: &Emitter, wishes: &mut Vec<Wish>) {
    let steps = &emitter.corrections;
    let mut change = |steps: Vec<CorrectionStep>| {
        wishes.push(Wish::Edit(Edit::Corrections { emitter: emitter.id, steps }));
    };
    ui.label(RichText::new("Steps over the samples as read").strong());
    if steps.is_empty() {
        ui.weak("None: the samples are used as they are.");
    }
    for (k, step) in steps.iter().enumerate() {
        ui.horizontal(|ui| {
            let mut on = step.on;
            if ui.checkbox(&mut on, in_words(&step.correction)).changed() {
                let mut steps = steps.clone();
                steps[k].on = on;
                change(steps);
            }
            if ui.small_button("remove").clicked() {
                let mut steps = steps.clone();
                steps.remove(k);
                change(steps);
            }
        });
    }
    ui.horizontal_wrapped(|ui| {
        let with = |correction| {
            let mut steps = steps.clone();
            steps.push(CorrectionStep { correction, on: true });
            steps
        };
        let samples = &emitter.import.power_per_nm;
        if samples.iter().any(|p| *p < 0.0) && ui.small_button("set negatives to zero").clicked() {
            change(with(Correction::RemoveNegatives));
        }
        let level = dark_level(samples);
        if level != 0.0 && ui.small_button(format!("subtract a dark level of {level:.3e}")).clicked() {
            change(with(Correction::SubtractDark { level }));
        }
        if ui.small_button("shift by 1 nm").clicked() {
            change(with(Correction::Shift { by_nm: 1.0 }));
        }
    });
}

/// The level a tenth of the samples lie below: where the curve has no light.
fn dark_level(samples: &[f64]) -> f64 {
    let mut sorted = samples.to_vec();
    sorted.sort_by(f64::total_cmp);
    sorted.get(sorted.len() / 10).copied().unwrap_or(0.0)
}

fn in_words(correction: &Correction) -> String {
    match correction {
        Correction::SubtractDark { level } => format!("subtract a dark level of {level:.4e}"),
        Correction::RemoveNegatives => "set negatives to zero".to_owned(),
        Correction::Crop { first_nm, last_nm } => format!("keep {first_nm} to {last_nm} nm"),
        Correction::Shift { by_nm } => format!("shift by {by_nm:+} nm"),
    }
}

fn sources(ui: &mut Ui, emitter: &Emitter, scene: &Scene<'_>) {
    ui.add_space(6.0);
    if let Some(source) = &emitter.import.source {
        ui.label(format!("Read from {}, {} samples", source.name, emitter.import.wavelengths_nm.len()));
    }
    for line in emitter.import.assumptions.iter().chain(&emitter.import.warnings) {
        ui.weak(line);
    }
    if let Some(light) = scene.derived.light(emitter.id) {
        for caution in &light.cautions {
            ui.label(RichText::new(caution).color(Palette::of(ui.ctx()).caution));
        }
    }
}
