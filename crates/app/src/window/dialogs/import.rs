//! What a reader makes of a file, shown before anything is taken from it; every assumption can be changed.

use super::super::controls::primary_button;
use super::super::paint::{Icon, Pattern, icon, patterned, write};
use super::super::theme::{Palette, text};
use egui::accesskit::Role;
use egui::{
    Align2, ComboBox, CornerRadius, DragValue, Frame, Grid, Margin, Modal, Rect, RichText, ScrollArea, Sense,
    Stroke, StrokeKind, TextEdit, Ui, WidgetInfo, pos2, vec2,
};
use files::read::{Answers, AxisUnit, Decimal, Ordinate, Outcome, Per, Question, Reading, read_bytes};
use project::{
    Correction, CorrectionStep, Emitter, EmitterId, Geometry, Import, Mounting, Origin, SourceFile,
};
use std::collections::VecDeque;
use std::str::FromStr;
use std::sync::Arc;

/// Files up to this size are read within the frame; larger ones by a job.
const READ_AT_ONCE: usize = 400_000;

/// A file to be looked at.
#[derive(Debug, Clone)]
pub(in crate::window) struct Source {
    pub(in crate::window) name: String,
    pub(in crate::window) bytes: Arc<Vec<u8>>,
}

/// The files waiting and the one looked at.
#[derive(Debug, Default)]
pub(in crate::window) struct Imports {
    waiting: VecDeque<Source>,
    preview: Option<Preview>,
}

/// What the dialog asks the application to do.
#[derive(Debug)]
pub(in crate::window) enum Asked {
    /// Read a large file by a job, with these answers.
    Read(Source, Answers),
    /// Take these emitters in; into the current set too when `true`.
    Take(Vec<Emitter>, bool),
}

#[derive(Debug)]
struct Preview {
    source: Source,
    answers: Answers,
    columns: String,
    /// `None` while a job reads.
    reading: Option<Reading>,
    picks: Vec<Pick>,
    geometry: Geometry,
    origin: Origin,
    mounting: Mounting,
    into_set: bool,
}

#[derive(Debug, Clone)]
struct Pick {
    take: bool,
    name: String,
    steps: Vec<CorrectionStep>,
}

impl Imports {
    /// Puts a file into the queue.
    pub(in crate::window) fn add(&mut self, source: Source) {
        self.waiting.push_back(source);
    }

    /// True while a preview covers the benches.
    pub(in crate::window) fn is_open(&self) -> bool {
        self.preview.is_some() || !self.waiting.is_empty()
    }

    /// The answer of a reading job.
    pub(in crate::window) fn read(&mut self, reading: Reading) {
        if let Some(preview) = &mut self.preview {
            preview.set(reading);
        }
    }

    /// Draws the preview, while there is one.
    pub(in crate::window) fn show(&mut self, ui: &Ui, has_set: bool) -> Vec<Asked> {
        let mut asked = Vec::new();
        if self.preview.is_none() {
            let Some(source) = self.waiting.pop_front() else { return asked };
            let mut preview = Preview::of(source);
            preview.read_again(&mut asked);
            self.preview = Some(preview);
        }
        let Some(preview) = &mut self.preview else { return asked };
        let left = self.waiting.len();
        let room = ui.ctx().content_rect().size();
        let mut end = None;
        let modal = Modal::new(egui::Id::unique("import"))
            .frame(super::super::controls::sheet_frame(ui))
            .show(ui.ctx(), |ui| {
                ui.set_width((room.x - 120.0).min(960.0));
                ui.set_max_height(room.y - 90.0);
                end = preview.body(ui, (room.y - 250.0).min(520.0), left, has_set, &mut asked);
            });
        if modal.should_close() && end.is_none() {
            end = Some(End::Leave);
        }
        match end {
            None => {}
            Some(End::Take) => {
                asked.push(Asked::Take(preview.emitters(), preview.into_set && has_set));
                self.preview = None;
            }
            Some(End::Skip) => self.preview = None,
            Some(End::Leave) => {
                self.preview = None;
                self.waiting.clear();
            }
        }
        asked
    }
}

/// How looking at a file ends.
enum End {
    Take,
    Skip,
    Leave,
}

impl Preview {
    fn of(source: Source) -> Self {
        Self {
            source,
            answers: Answers::default(),
            columns: String::new(),
            reading: None,
            picks: Vec::new(),
            geometry: Geometry::Unknown,
            origin: Origin::Unknown,
            mounting: Mounting::Unknown,
            into_set: true,
        }
    }

    fn read_again(&mut self, asked: &mut Vec<Asked>) {
        if self.source.bytes.len() <= READ_AT_ONCE {
            self.set(read_bytes(&self.source.name, &self.source.bytes, &self.answers));
        } else {
            self.reading = None;
            asked.push(Asked::Read(self.source.clone(), self.answers.clone()));
        }
    }

    fn set(&mut self, reading: Reading) {
        self.picks = reading
            .spectra
            .iter()
            .map(|spectrum| {
                let before = self.picks.iter().find(|pick| pick.name == spectrum.name);
                Pick {
                    take: before.is_none_or(|pick| pick.take),
                    name: spectrum.name.clone(),
                    steps: spectrum
                        .offered
                        .iter()
                        .map(|correction| CorrectionStep { correction: *correction, on: false })
                        .collect(),
                }
            })
            .collect();
        self.reading = Some(reading);
    }

    fn body(
        &mut self,
        ui: &mut Ui,
        height: f32,
        left: usize,
        has_set: bool,
        asked: &mut Vec<Asked>,
    ) -> Option<End> {
        let palette = Palette::of(ui.ctx());
        ui.horizontal(|ui| {
            ui.heading(format!("Import {}", self.source.name));
            if left > 0 {
                ui.weak(if left == 1 {
                    "and 1 more file".to_owned()
                } else {
                    format!("and {left} more files")
                });
            }
        });
        let Some(reading) = self.reading.clone() else {
            ui.add_space(30.0);
            ui.label("Reading\u{2026}");
            return ui.button("Cancel").clicked().then_some(End::Leave);
        };
        if let Some(message) = &reading.message {
            ui.add_space(10.0);
            ui.label(RichText::new("This file was not read").color(palette.short).font(text::strong()));
            ui.label(message);
        }
        let mut again = false;
        ui.add_space(6.0);
        let width = ui.available_width();
        ui.horizontal_top(|ui| {
            ui.allocate_ui(vec2(width * 0.43, height), |ui| {
                ui.set_width(width * 0.43);
                ui.set_min_height(height);
                ScrollArea::vertical()
                    .id_salt("import facts")
                    .max_height(height)
                    .auto_shrink([false, false])
                    .show(ui, |ui| {
                        ui.vertical(|ui| {
                            again |= self.questions(ui, &reading.questions, &palette);
                            again |= self.choices(ui, &reading);
                            remarks(ui, &reading, &palette);
                        });
                    });
            });
            ui.add_space(12.0);
            ui.vertical(|ui| {
                let room = ui.available_width();
                let (rect, response) =
                    ui.allocate_exact_size(vec2(room, (height * 0.44).max(120.0)), Sense::hover());
                curves(ui, rect, &reading, &self.picks, &palette);
                response.widget_info(|| {
                    WidgetInfo::labeled(
                        Role::GraphicsObject,
                        true,
                        format!("{} spectra of {}", reading.spectra.len(), reading.file),
                    )
                });
                ui.add_space(6.0);
                ScrollArea::vertical()
                    .id_salt("import spectra")
                    .max_height(height * 0.56 - 96.0)
                    .auto_shrink([false, true])
                    .show(ui, |ui| self.spectra(ui, &reading));
                ui.add_space(4.0);
                self.provenance(ui);
            });
        });
        if again {
            self.read_again(asked);
        }
        ui.add_space(8.0);
        self.buttons(ui, &reading, left, has_set)
    }

    fn buttons(&mut self, ui: &mut Ui, reading: &Reading, left: usize, has_set: bool) -> Option<End> {
        let mut end = None;
        ui.horizontal(|ui| {
            let count = self.picks.iter().filter(|pick| pick.take).count();
            let words = match count {
                1 => "Add 1 emitter".to_owned(),
                n => format!("Add {n} emitters"),
            };
            if reading.outcome != Outcome::Refused {
                let (rect, _) = ui.allocate_exact_size(vec2(150.0, 30.0), Sense::hover());
                let hint = if reading.outcome == Outcome::Ask {
                    "A question is open: this takes the best reading"
                } else {
                    "Take these spectra into the project"
                };
                if primary_button(ui, rect, &words, count > 0, hint).clicked() {
                    end = Some(End::Take);
                }
                if has_set {
                    ui.checkbox(&mut self.into_set, "into the set on the bench too");
                }
            }
            if left > 0 && ui.button("Skip this file").clicked() {
                end = Some(End::Skip);
            }
            if ui.button("Cancel").clicked() {
                end = Some(End::Leave);
            }
        });
        end
    }

    /// Open questions, each with the answers that fit; true when one was answered.
    fn questions(&mut self, ui: &mut Ui, questions: &[Question], palette: &Palette) -> bool {
        let mut answered = false;
        for question in questions {
            Frame::new()
                .fill(palette.accent_wash)
                .corner_radius(CornerRadius::same(6))
                .inner_margin(Margin::same(8))
                .show(ui, |ui| {
                    ui.set_width(ui.available_width());
                    ui.label(RichText::new(&question.text).font(text::strong()));
                    ui.horizontal_wrapped(|ui| {
                        for choice in &question.choices {
                            if ui.button(choice).clicked() {
                                answered |= self.answer(question.option, choice);
                            }
                        }
                        if question.choices.is_empty() {
                            ui.label("Answer it below.");
                        }
                    });
                });
            ui.add_space(4.0);
        }
        answered
    }

    fn answer(&mut self, option: &str, choice: &str) -> bool {
        let answers = &mut self.answers;
        match option {
            "--axis" => answers.axis = AxisUnit::from_str(choice).ok(),
            "--ordinate" => answers.ordinate = Ordinate::from_str(choice).ok(),
            "--per" => answers.per = Per::from_str(choice).ok(),
            "--decimal" => answers.decimal = Decimal::from_str(choice).ok(),
            "--columns" => {
                self.columns = choice.to_owned();
                answers.columns = columns(choice);
            }
            "--start" | "--start --step" => answers.start_nm = choice.parse().ok(),
            "--step" => answers.step_nm = choice.parse().ok(),
            _ => return false,
        }
        true
    }

    /// Everything the reader assumed, to be changed; true when something was.
    fn choices(&mut self, ui: &mut Ui, reading: &Reading) -> bool {
        let mut changed = false;
        let raw = reading.spectra.first().map(|s| &s.raw);
        let as_read = |words: Option<String>| {
            words.map_or_else(|| "as the file says".to_owned(), |w| format!("as read: {w}"))
        };
        Grid::new("import choices").num_columns(2).spacing([10.0, 6.0]).show(ui, |ui| {
            ui.label("axis");
            changed |= choose(
                ui,
                "unit of the axis",
                &mut self.answers.axis,
                &AxisUnit::ALL,
                |u| u.symbol().to_owned(),
                &as_read(raw.map(|r| r.axis_unit.symbol().to_owned())),
            );
            ui.end_row();
            ui.label("values count");
            changed |= choose(
                ui,
                "what the values count",
                &mut self.answers.ordinate,
                &Ordinate::ALL,
                |o| o.key().to_owned(),
                &as_read(raw.map(|r| r.ordinate.key().to_owned())),
            );
            ui.end_row();
            ui.label("values are per");
            changed |= choose(
                ui,
                "interval of the density",
                &mut self.answers.per,
                &Per::ALL,
                |p| p.symbol().to_owned(),
                &as_read(raw.map(|r| r.per.symbol().to_owned())),
            );
            ui.end_row();
            ui.label("decimal mark");
            let mark = |d: Decimal| match d {
                Decimal::Point => "point, 380.5".to_owned(),
                Decimal::Comma => "comma, 380,5".to_owned(),
            };
            changed |= choose(
                ui,
                "decimal mark",
                &mut self.answers.decimal,
                &Decimal::ALL,
                |d| mark(*d),
                &as_read(reading.facts.decimal.map(|d| d.key().to_owned())),
            );
            ui.end_row();
            let label = ui.label("columns");
            let hint = reading.spectra.iter().map(|s| s.column.to_string()).collect::<Vec<_>>().join(", ");
            let field = ui
                .add(TextEdit::singleline(&mut self.columns).hint_text(hint).desired_width(150.0))
                .labelled_by(label.id);
            if field.lost_focus() {
                let new = columns(&self.columns);
                if new != self.answers.columns {
                    self.answers.columns = new;
                    changed = true;
                }
            }
            ui.end_row();
            ui.label("first, step");
            ui.horizontal(|ui| {
                changed |= number(ui, "first wavelength in nm", &mut self.answers.start_nm, 380.0);
                changed |= number(ui, "step in nm", &mut self.answers.step_nm, 1.0);
            });
            ui.end_row();
        });
        if self.answers != Answers::default() && ui.button("As the file says again").clicked() {
            self.answers = Answers::default();
            self.columns.clear();
            changed = true;
        }
        changed
    }

    fn spectra(&mut self, ui: &mut Ui, reading: &Reading) {
        for (k, (pick, spectrum)) in self.picks.iter_mut().zip(&reading.spectra).enumerate() {
            ui.push_id(("spectrum", k), |ui| {
                ui.horizontal(|ui| {
                    ui.checkbox(&mut pick.take, "").accessible_name(format!("take {}", spectrum.name));
                    ui.add(TextEdit::singleline(&mut pick.name).desired_width(170.0))
                        .accessible_name(format!("name of spectrum {}", k + 1));
                    let peak = spectrum
                        .peak_nm
                        .map_or_else(|| "peak not known".to_owned(), |p| format!("{p:.0} nm"));
                    let width = spectrum.fwhm_nm.map_or_else(String::new, |w| format!(", {w:.0} nm wide"));
                    let points = spectrum.points.map_or_else(String::new, |n| format!(", {n} samples"));
                    ui.weak(format!("{peak}{width}{points}"));
                });
                for step in &mut pick.steps {
                    ui.horizontal(|ui| {
                        ui.add_space(26.0);
                        let words = match step.correction {
                            Correction::SubtractDark { level } => {
                                format!("subtract the dark level {level:.3e}")
                            }
                            Correction::RemoveNegatives => "set negatives to zero".to_owned(),
                            Correction::Crop { first_nm, last_nm } => {
                                format!("keep {first_nm} to {last_nm} nm")
                            }
                            Correction::Shift { by_nm } => format!("shift by {by_nm:+} nm"),
                        };
                        ui.checkbox(&mut step.on, words).on_hover_text(
                            "A step that can be switched off again later; the samples stay as read.",
                        );
                    });
                }
            });
        }
    }

    fn provenance(&mut self, ui: &mut Ui) {
        ui.horizontal_wrapped(|ui| {
            pick(
                ui,
                "light collected",
                &mut self.geometry,
                &[
                    (Geometry::Unknown, "geometry not stated"),
                    (Geometry::Sphere, "in a sphere"),
                    (Geometry::Normal, "along the normal"),
                ],
            );
            pick(
                ui,
                "light made by",
                &mut self.origin,
                &[
                    (Origin::Unknown, "origin not stated"),
                    (Origin::Electroluminescence { current_density_ma_per_cm2: None }, "electroluminescence"),
                    (Origin::FilmPhotoluminescence, "film photoluminescence"),
                    (Origin::Modelled, "modelled"),
                ],
            );
            pick(
                ui,
                "measured alone or in the stack",
                &mut self.mounting,
                &[
                    (Mounting::Unknown, "mounting not stated"),
                    (Mounting::SingleDevice, "single device"),
                    (Mounting::InStack, "in the stack"),
                ],
            );
        });
    }

    fn emitters(&self) -> Vec<Emitter> {
        let Some(reading) = &self.reading else { return Vec::new() };
        let taken = self.picks.iter().zip(&reading.spectra).filter(|(pick, _)| pick.take);
        taken
            .map(|(pick, spectrum)| Emitter {
                id: EmitterId(0),
                name: pick.name.trim().to_owned(),
                invented: false,
                note: String::new(),
                import: Import {
                    wavelengths_nm: spectrum.spectrum.wavelengths_nm().to_vec(),
                    power_per_nm: spectrum.spectrum.values().to_vec(),
                    source: Some(SourceFile {
                        name: reading.file.clone(),
                        sha256: reading.sha256.clone(),
                        column: spectrum.column.to_string(),
                    }),
                    assumptions: reading.assumptions.clone(),
                    warnings: reading.warnings.clone(),
                },
                corrections: pick.steps.clone(),
                geometry: self.geometry,
                origin: self.origin,
                mounting: self.mounting,
                instrument_range_nm: None,
                wall_plug: None,
                sheet: device::Sheet::default(),
            })
            .collect()
    }
}

fn columns(text: &str) -> Option<Vec<usize>> {
    let list: Vec<usize> =
        text.split([',', ';', ' ']).filter_map(|part| part.trim().parse().ok()).filter(|c| *c > 0).collect();
    (!list.is_empty()).then_some(list)
}

fn choose<T: Copy + PartialEq>(
    ui: &mut Ui,
    name: &str,
    value: &mut Option<T>,
    all: &[T],
    words: impl Fn(&T) -> String,
    default: &str,
) -> bool {
    let before = *value;
    let shown = value.as_ref().map_or_else(|| default.to_owned(), &words);
    let response = ComboBox::from_id_salt(name).width(180.0).selected_text(shown).show_ui(ui, |ui| {
        ui.selectable_value(value, None, default);
        for one in all {
            ui.selectable_value(value, Some(*one), words(one));
        }
    });
    response.response.accessible_name(name);
    *value != before
}

fn pick<T: Copy + PartialEq>(ui: &mut Ui, name: &str, value: &mut T, all: &[(T, &str)]) {
    let shown = all.iter().find(|(one, _)| one == value).map_or("other", |(_, words)| words);
    let response = ComboBox::from_id_salt(name).width(150.0).selected_text(shown).show_ui(ui, |ui| {
        for (one, words) in all {
            ui.selectable_value(value, *one, *words);
        }
    });
    response.response.accessible_name(name);
}

/// A number that may be left open.
fn number(ui: &mut Ui, name: &str, value: &mut Option<f64>, usual: f64) -> bool {
    let mut on = value.is_some();
    let mut changed = false;
    if ui.checkbox(&mut on, "").accessible_name(format!("state the {name}")).changed() {
        *value = on.then_some(usual);
        changed = true;
    }
    let mut number = value.unwrap_or(usual);
    let field = DragValue::new(&mut number).speed(0.5).suffix(" nm").update_while_editing(false);
    if ui.add_enabled(on, field).accessible_name(name).changed() {
        *value = Some(number);
        changed = true;
    }
    changed
}

fn remarks(ui: &mut Ui, reading: &Reading, palette: &Palette) {
    let facts = &reading.facts;
    if !facts.format.is_empty() {
        ui.add_space(6.0);
        ui.weak(format!(
            "{}, {}, cells separated by {}, {} rows of numbers from line {}",
            facts.format, facts.encoding, facts.separator, facts.rows, facts.first_data_line
        ));
    }
    let list = |ui: &mut Ui, title: &str, lines: &[String], colour, sign: Option<Icon>| {
        if lines.is_empty() {
            return;
        }
        ui.add_space(6.0);
        ui.label(RichText::new(title).font(text::strong()));
        for line in lines {
            ui.horizontal_top(|ui| {
                let (rect, _) = ui.allocate_exact_size(vec2(14.0, 16.0), Sense::hover());
                match sign {
                    Some(sign) => icon(ui.painter(), sign, rect.center(), 11.0, colour),
                    None => {
                        ui.painter().circle_filled(rect.center(), 1.8, colour);
                    }
                }
                ui.add(egui::Label::new(RichText::new(line).color(colour).font(text::small())).wrap());
            });
        }
    };
    list(ui, "Warnings", &reading.warnings, palette.caution, Some(Icon::Caution));
    list(ui, "Assumed and converted", &reading.assumptions, palette.muted, None);
}

/// The curves on one axis, each to its own greatest value.
fn curves(ui: &Ui, rect: Rect, reading: &Reading, picks: &[Pick], palette: &Palette) {
    let painter = ui.painter().with_clip_rect(rect.intersect(ui.clip_rect()));
    painter.rect(
        rect,
        CornerRadius::same(6),
        palette.well,
        Stroke::new(1.0, palette.rule),
        StrokeKind::Inside,
    );
    let shown: Vec<_> =
        reading.spectra.iter().zip(picks).filter(|(_, pick)| pick.take).map(|(s, _)| s).collect();
    let first =
        shown.iter().filter_map(|s| s.spectrum.wavelengths_nm().first()).copied().fold(380.0, f64::min);
    let last = shown.iter().filter_map(|s| s.spectrum.wavelengths_nm().last()).copied().fold(780.0, f64::max);
    let plot = Rect::from_min_max(rect.min + vec2(10.0, 10.0), rect.max - vec2(10.0, 20.0));
    let x = |nm: f64| plot.left() + ((nm - first) / (last - first)) as f32 * plot.width();
    let step = if last - first > 900.0 { 200 } else { 100 };
    let from = (first / f64::from(step)).ceil() as i32 * step;
    for nm in (from..=last as i32).step_by(step as usize) {
        painter.vline(x(f64::from(nm)), plot.y_range(), Stroke::new(1.0, palette.grid));
        write(
            &painter,
            pos2(x(f64::from(nm)), rect.bottom() - 3.0),
            Align2::CENTER_BOTTOM,
            format!("{nm} nm"),
            text::tick(),
            palette.muted,
        );
    }
    for (k, spectrum) in shown.iter().enumerate().take(24) {
        let values = spectrum.spectrum.values();
        let greatest = values.iter().copied().fold(0.0, f64::max);
        if greatest <= 0.0 {
            continue;
        }
        let lowest = values.iter().copied().fold(0.0, f64::min) / greatest;
        let y = |v: f64| plot.bottom() - ((v / greatest - lowest) / (1.0 - lowest)) as f32 * plot.height();
        // Far more samples than columns of pixels would only cost time.
        let stride = (values.len() / 1500).max(1);
        let points: Vec<_> = spectrum
            .spectrum
            .wavelengths_nm()
            .iter()
            .zip(values)
            .step_by(stride)
            .map(|(nm, v)| pos2(x(*nm), y(*v)))
            .collect();
        let peak = spectrum.peak_nm.unwrap_or(0.0);
        let emitted = palette.emitter(colour::appearance::of_wavelength(peak.clamp(400.0, 700.0)));
        patterned(&painter, &points, Stroke::new(1.6, emitted.line), Pattern::of_row(k));
    }
}
