//! The settings of the build form on the bench.

use super::super::theme::text;
use super::super::view::{Scene, View};
use super::super::wish::Wish;
use super::{plan_on_bench, replace};
use device::FormSettings;
use device::packages::StringRule;
use device::series_stack::Tuning;
use device::side_by_side::{Drive, Freedom, StripeLayout};
use egui::{ComboBox, DragValue, Grid, RichText, Ui};
use project::{EmitterSet, RecipePlan};

pub(super) fn show(ui: &mut Ui, set: &EmitterSet, scene: &Scene<'_>, view: &View, wishes: &mut Vec<Wish>) {
    let before = plan_on_bench(set, view.recipe.chosen);
    let mut plan = before.clone();
    ui.label(RichText::new("Settings of the form").font(text::small_strong()).color(scene.palette.muted));
    Grid::new("form settings").num_columns(4).spacing([14.0, 6.0]).show(ui, |ui| {
        match &mut plan.build.form {
            FormSettings::SideBySide(form) => {
                optional(ui, "Lit fraction", "", &mut form.fill, 0.75, 0.01, 0.05..=1.0);
                let drives = [
                    ("own currents, least power", Drive::OwnCurrent(Freedom::LeastPower)),
                    ("own currents, equal ageing", Drive::OwnCurrent(Freedom::EqualAgeing)),
                    ("own currents, all alike", Drive::OwnCurrent(Freedom::EqualCurrent)),
                    ("one current", Drive::CommonCurrent(None)),
                    ("one voltage", Drive::CommonVoltage(None)),
                ];
                choose(ui, "Drive", &mut form.drive, &drives);
                ui.end_row();
                let mut given = form.layout.is_some();
                ui.checkbox(&mut given, "Stripes on a pitch");
                form.layout = given.then(|| {
                    form.layout.unwrap_or(StripeLayout { pitch_um: 1000.0, gap_um: 20.0, minimum_um: 40.0 })
                });
                if let Some(layout) = &mut form.layout {
                    number(ui, "Pitch", "\u{b5}m", &mut layout.pitch_um, 1.0, 1.0..=1e6);
                    ui.end_row();
                    number(ui, "Gap", "\u{b5}m", &mut layout.gap_um, 0.5, 0.0..=1e5);
                    number(ui, "Narrowest stripe", "\u{b5}m", &mut layout.minimum_um, 0.5, 0.0..=1e5);
                }
                ui.end_row();
            }
            FormSettings::SeriesStack(form) => {
                optional(ui, "Lit fraction", "", &mut form.fill, 1.0, 0.01, 0.05..=1.0);
                optional(ui, "Lost between units", "V", &mut form.junction_drop_v, 0.1, 0.01, 0.0..=5.0);
                ui.end_row();
                let tunings =
                    [("still being designed", Tuning::Designed), ("as measured", Tuning::AsMeasured)];
                choose(ui, "Units", &mut form.tuning, &tunings);
                ui.end_row();
                for unit in &mut form.units {
                    let emitter =
                        before.emitters.get(unit.emitter).and_then(|id| scene.state.project().emitter(*id));
                    let name = emitter.map_or("unit", |e| e.name.as_str());
                    let label = ui.label(format!("Repeats of {name}"));
                    ui.add(DragValue::new(&mut unit.repeats).range(1..=12).speed(0.05)).labelled_by(label.id);
                    ui.end_row();
                }
            }
            FormSettings::SharedZone(form) => {
                optional(ui, "Lit fraction", "", &mut form.fill, 1.0, 0.01, 0.05..=1.0);
                ui.label(format!("{} calibration runs", form.runs.len()));
                ui.end_row();
            }
            FormSettings::Packages(form) => {
                let mut limited = form.at_most.is_some();
                ui.checkbox(&mut limited, "At most");
                form.at_most = limited.then(|| form.at_most.unwrap_or(36));
                if let Some(most) = &mut form.at_most {
                    ui.add(DragValue::new(most).range(1..=400).suffix(" packages"));
                }
                ui.checkbox(&mut form.untrimmed, "Every package at its test current");
                ui.end_row();
                let mut strings = form.strings.is_some();
                ui.checkbox(&mut strings, "Strings inside a driver's window");
                form.strings = strings.then(|| {
                    form.strings.unwrap_or(StringRule { lowest_v: 2.0, highest_v: 48.0, most_parallel: 4 })
                });
                if let Some(rule) = &mut form.strings {
                    number(ui, "From", "V", &mut rule.lowest_v, 0.2, 0.0..=1000.0);
                    number(ui, "To", "V", &mut rule.highest_v, 0.2, 0.0..=1000.0);
                }
                ui.end_row();
            }
        }
    });
    if plan != before {
        // Other settings make another device: numbers set by hand belong to the one before.
        let plan = if plan.build == before.build { plan } else { RecipePlan { made: None, ..plan } };
        wishes.push(replace(set, view.recipe.chosen, plan));
    }
}

fn number(
    ui: &mut Ui,
    name: &str,
    unit: &str,
    value: &mut f64,
    speed: f64,
    range: std::ops::RangeInclusive<f64>,
) {
    let label = ui.label(name);
    ui.add(DragValue::new(value).speed(speed).range(range).max_decimals(3).suffix(format!(" {unit}")))
        .labelled_by(label.id);
}

/// A number that may be left to its default.
fn optional(
    ui: &mut Ui,
    name: &str,
    unit: &str,
    value: &mut Option<f64>,
    default: f64,
    speed: f64,
    range: std::ops::RangeInclusive<f64>,
) {
    let label = ui.label(if value.is_some() { name.to_owned() } else { format!("{name} (default)") });
    let mut shown = value.unwrap_or(default);
    let field =
        DragValue::new(&mut shown).speed(speed).range(range).max_decimals(3).suffix(format!(" {unit}"));
    if ui.add(field).labelled_by(label.id).changed() {
        *value = Some(shown);
    }
}

fn choose<T: PartialEq + Copy>(ui: &mut Ui, name: &str, value: &mut T, choices: &[(&str, T)]) {
    let label = ui.label(name);
    let shown = choices.iter().find(|(_, choice)| choice == value).map_or("fixed", |(words, _)| *words);
    let combo = ComboBox::from_id_salt(name).selected_text(shown).show_ui(ui, |ui| {
        for (words, choice) in choices {
            ui.selectable_value(value, *choice, *words);
        }
    });
    combo.response.labelled_by(label.id);
}
