//! The sheets of the emitters: what is missing in sentences, and tables typed or pasted.

use super::super::theme::text;
use super::super::view::{Scene, View};
use super::super::wish::Wish;
use super::sentence;
use crate::state::Edit;
use device::curve::Table;
use device::out_coupling::{CouplingFactor, Inclusion, OutCoupling};
use device::roll_off::{AbcRollOff, TripletRollOff};
use device::sheet::{EqeModel, Sheet, VoltageModel};
use egui::{DragValue, Modal, RichText, TextEdit, Ui};
use project::{EmitterId, EmitterSet};

/// The sheet that is open, with what is typed and not yet put in.
#[derive(Debug, Clone)]
pub(in crate::window) struct OpenSheet {
    emitter: EmitterId,
    eqe: String,
    voltage: String,
    problem: Option<String>,
}

impl OpenSheet {
    fn of(emitter: EmitterId, sheet: &Sheet) -> Self {
        let rows = |table: &Table| {
            table.points.iter().map(|(at, value)| format!("{at}\t{value}\n")).collect::<String>()
        };
        let eqe = match &sheet.eqe {
            Some(EqeModel::Table(table)) => rows(table),
            Some(EqeModel::Constant(value)) => value.to_string(),
            _ => String::new(),
        };
        let voltage = match &sheet.voltage {
            Some(VoltageModel::Table(table)) => rows(table),
            Some(VoltageModel::Constant(value)) => value.to_string(),
            None => String::new(),
        };
        Self { emitter, eqe, voltage, problem: None }
    }
}

/// Every emitter of the set with what its sheet lacks.
pub(super) fn list(ui: &mut Ui, set: &EmitterSet, scene: &Scene<'_>, view: &mut View) {
    let palette = scene.palette;
    ui.label(RichText::new("Emitter sheets").font(text::small_strong()).color(palette.muted));
    for member in set.members.iter().filter(|m| m.on) {
        let Some(emitter) = scene.state.project().emitter(member.emitter) else { continue };
        ui.horizontal_wrapped(|ui| {
            if ui.button(&emitter.name).on_hover_text("Open its sheet").clicked() {
                view.recipe.sheet = Some(OpenSheet::of(emitter.id, &emitter.sheet));
            }
            let missing = if emitter.sheet.package.is_some() {
                emitter.sheet.missing_for_package()
            } else {
                emitter.sheet.missing()
            };
            let words = missing.first().map_or("complete".to_owned(), |first| sentence(first));
            let colour = if missing.is_empty() { palette.met } else { palette.muted };
            ui.label(RichText::new(words).font(text::small()).color(colour));
        });
    }
}

/// The sheet, while it is open.
pub(super) fn show(ui: &mut Ui, scene: &Scene<'_>, view: &mut View, wishes: &mut Vec<Wish>) {
    let Some(mut open) = view.recipe.sheet.take() else { return };
    let Some(emitter) = scene.state.project().emitter(open.emitter) else { return };
    let before = emitter.sheet.clone();
    let mut sheet = before.clone();
    let mut done = false;
    let modal = Modal::new(egui::Id::unique("emitter sheet")).show(ui.ctx(), |ui| {
        ui.set_width(520.0);
        ui.label(RichText::new(format!("Sheet of {}", emitter.name)).font(text::title()));
        ui.label(RichText::new("Paste two columns from a spreadsheet, or type them: current density in mA/cm\u{b2}, then the value. One number alone holds at every current.").font(text::small()).color(scene.palette.muted));
        ui.columns(2, |columns| {
            table(&mut columns[0], "EQE, a fraction", &mut open.eqe);
            table(&mut columns[1], "Voltage, V", &mut open.voltage);
        });
        ui.horizontal(|ui| {
            if ui.button("Put the tables in").clicked() {
                match (rows(&open.eqe), rows(&open.voltage)) {
                    (Ok(eqe), Ok(voltage)) => {
                        sheet.eqe = eqe.map(|rows| match rows {
                            Rows::One(value) => EqeModel::Constant(value),
                            Rows::Table(table) => EqeModel::Table(table),
                        });
                        sheet.voltage = voltage.map(|rows| match rows {
                            Rows::One(value) => VoltageModel::Constant(value),
                            Rows::Table(table) => VoltageModel::Table(table),
                        });
                        open.problem = None;
                    }
                    (Err(why), _) => open.problem = Some(format!("EQE: {why}")),
                    (_, Err(why)) => open.problem = Some(format!("Voltage: {why}")),
                }
            }
            if ui.button("Fit triplet roll-off").on_hover_text("Triplet\u{2013}triplet annihilation fitted to the EQE table").clicked() {
                fit(&open.eqe.clone(), &mut open, |table| {
                    TripletRollOff::fit(table).map(|(model, _)| EqeModel::TripletTriplet(model))
                }, &mut sheet);
            }
            if ui.button("Fit ABC").on_hover_text("The ABC model fitted to the EQE table").clicked() {
                fit(&open.eqe.clone(), &mut open, |table| {
                    AbcRollOff::fit(table).map(|(model, _)| EqeModel::Abc(model))
                }, &mut sheet);
            }
        });
        out_coupling(ui, &mut sheet);
        ui.horizontal(|ui| {
            limit(ui, "Wall-plug efficiency", &mut sheet.wall_plug, 0.3, 0.001..=1.0);
            limit(ui, "Highest current, mA/cm\u{b2}", &mut sheet.maximum_current_ma_per_cm2, 20.0, 1e-3..=1e5);
        });
        if let Some(problem) = &open.problem {
            ui.label(RichText::new(sentence(problem)).color(scene.palette.short));
        }
        for one in sheet.missing() {
            ui.label(RichText::new(sentence(&one)).font(text::small()).color(scene.palette.caution));
        }
        for one in sheet.assumptions() {
            ui.label(RichText::new(sentence(&one)).font(text::small()).color(scene.palette.muted));
        }
        done = ui.button("Close").clicked();
    });
    if sheet != before {
        wishes.push(Wish::Edit(Edit::Sheet { emitter: emitter.id, sheet: Box::new(sheet) }));
    }
    if !(done || modal.should_close()) {
        view.recipe.sheet = Some(open);
    }
}

fn table(ui: &mut Ui, name: &str, typed: &mut String) {
    let label = ui.label(RichText::new(name).font(text::small_strong()));
    ui.add(TextEdit::multiline(typed).desired_rows(6).desired_width(f32::INFINITY)).labelled_by(label.id);
}

fn out_coupling(ui: &mut Ui, sheet: &mut Sheet) {
    ui.horizontal_wrapped(|ui| {
        let mut given = sheet.out_coupling.is_some();
        ui.checkbox(&mut given, "Out-coupling factor");
        if !given {
            sheet.out_coupling = None;
            return;
        }
        let coupling = sheet.out_coupling.get_or_insert(OutCoupling {
            factor: CouplingFactor::Number(device::out_coupling::EXTERNAL_FILM_FACTOR),
            inclusion: Inclusion::Unasked,
        });
        match &mut coupling.factor {
            CouplingFactor::Number(value) => {
                ui.add(DragValue::new(value).speed(0.01).range(0.01..=4.0));
            }
            CouplingFactor::PerWavelength(rows) => {
                ui.label(format!("{} rows over wavelength", rows.len()));
            }
        }
        ui.label("Already in the measured EQE?");
        ui.selectable_value(&mut coupling.inclusion, Inclusion::InMeasuredEqe, "yes");
        ui.selectable_value(&mut coupling.inclusion, Inclusion::NotInMeasuredEqe, "no");
    });
}

fn limit(
    ui: &mut Ui,
    name: &str,
    value: &mut Option<f64>,
    default: f64,
    range: std::ops::RangeInclusive<f64>,
) {
    let mut given = value.is_some();
    ui.checkbox(&mut given, name);
    *value = given.then(|| value.unwrap_or(default));
    if let Some(value) = value {
        ui.add(DragValue::new(value).speed(0.01).range(range));
    }
}

fn fit(
    typed: &str,
    open: &mut OpenSheet,
    model: impl Fn(&Table) -> Result<EqeModel, device::DeviceError>,
    sheet: &mut Sheet,
) {
    let fitted = match rows(typed) {
        Ok(Some(Rows::Table(table))) => model(&table).map_err(|e| e.to_string()),
        Ok(_) => Err("a fit needs a table of several rows".to_owned()),
        Err(why) => Err(why),
    };
    match fitted {
        Ok(model) => {
            sheet.eqe = Some(model);
            open.problem = None;
        }
        Err(why) => open.problem = Some(why),
    }
}

/// What a typed table holds.
#[derive(Debug, PartialEq)]
enum Rows {
    One(f64),
    Table(Table),
}

/// Two numbers a line, whatever stands between them; one number alone; nothing for an empty field.
fn rows(typed: &str) -> Result<Option<Rows>, String> {
    let mut points = Vec::new();
    for (k, line) in typed.lines().enumerate() {
        let parts: Vec<&str> =
            line.split(['\t', ';', ' ']).map(str::trim).filter(|part| !part.is_empty()).collect();
        let numbers: Option<Vec<f64>> =
            parts.iter().map(|part| super::super::controls::parse_number(part)).collect();
        match numbers.as_deref() {
            Some([]) => {}
            Some([value]) if typed.lines().filter(|l| !l.trim().is_empty()).count() == 1 => {
                return Ok(Some(Rows::One(*value)));
            }
            Some([at, value]) => points.push((*at, *value)),
            // A header line is no row.
            None if points.is_empty() && k == 0 => {}
            _ => return Err(format!("line {}: expected two numbers, found `{}`", k + 1, line.trim())),
        }
    }
    if points.is_empty() {
        return Ok(None);
    }
    let table = Table::new(points);
    table.curve("typed", "mA/cm\u{b2}").map_err(|e| e.to_string())?;
    Ok(Some(Rows::Table(table)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn pasted_tables_are_read_as_people_write_them() {
        let table = Rows::Table(Table::new(vec![(1.0, 0.2), (10.0, 0.15)]));
        assert_eq!(rows("J\tEQE\n1\t0.2\n10\t0.15\n"), Ok(Some(table)));
        let comma = Rows::Table(Table::new(vec![(1.5, 0.2), (10.0, 0.15)]));
        assert_eq!(rows("1,5;0,2\n10;0,15"), Ok(Some(comma)));
        assert_eq!(rows("0.21"), Ok(Some(Rows::One(0.21))));
        assert_eq!(rows(" \n"), Ok(None));
        assert!(rows("1 0.2\n2 three").unwrap_err().contains("line 2"));
        assert!(rows("1 0.2\n1 0.3").is_err());
    }
}
