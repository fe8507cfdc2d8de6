//! The bar along the top: the project, the benches, what is maximised, and *Solve*.

use super::command::Command;
use super::controls::{primary_button, sign_button};
use super::paint::{Icon, elided, icon, measure, write};
use super::theme::{Palette, text};
use super::view::{Bench, Scene};
use super::wish::Wish;
use crate::state::Edit;
use egui::accesskit::Role;
use egui::{
    Align2, CornerRadius, Popup, Rect, Response, Sense, Stroke, StrokeKind, Ui, WidgetInfo, pos2, vec2,
};
use project::Maximise;

/// Height of the bar.
pub(super) const HEIGHT: f32 = 46.0;

/// What can be maximised, in words.
pub(super) const fn maximised(what: Maximise) -> &'static str {
    match what {
        Maximise::Ler => "most lm per optical watt",
        Maximise::Efficacy => "most lm/W of the device",
        Maximise::Ra => "highest Ra",
        Maximise::Rf => "highest Rf",
    }
}

/// Draws the bar.
pub(super) fn show(
    ui: &mut Ui,
    rect: Rect,
    scene: &Scene<'_>,
    saved: &str,
    shown: Bench,
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    let painter = ui.painter().clone();
    painter.rect_filled(rect, CornerRadius::ZERO, palette.card);
    painter.hline(rect.x_range(), rect.bottom() - 0.5, Stroke::new(1.0, palette.rule));
    let y = rect.center().y;

    let menu = sign_button(ui, square(rect.left() + 26.0, y), Icon::Menu, "Menu", palette.ink, true);
    Popup::menu(&menu).show(|ui| main_menu(ui, scene, wishes));
    let name = &scene.state.project().name;
    let left = rect.left() + 50.0;
    let room = (rect.width() * 0.26).max(120.0);
    let title = elided(&painter, pos2(left, y - 9.0), room, name, text::title(), palette.ink);
    let state = pos2(title.right() + 12.0, y - 6.5);
    let right = left + room + 130.0;
    let state = elided(&painter, state, right - state.x - 12.0, saved, text::small(), palette.muted);

    let mut tabs = right.max(state.right() + 24.0);
    for bench in Bench::ALL {
        let (tab, clicked) = tab(ui, pos2(tabs, rect.bottom()), rect, bench, bench == shown);
        if clicked {
            wishes.push(Wish::Command(Command::Show(bench)));
        }
        tabs = tab.right();
    }

    // From the right: appearance, undo and redo, Solve, what is maximised.
    let x = rect.right() - 26.0;
    let sign = if palette.is_dark() { Icon::Sun } else { Icon::Moon };
    let words = if palette.is_dark() { "Light appearance" } else { "Dark appearance" };
    if sign_button(ui, square(x, y), sign, words, palette.muted, true).clicked() {
        wishes.push(Wish::Command(Command::Appearance));
    }
    for (k, (command, sign, label)) in [
        (Command::Redo, Icon::Redo, scene.state.redo_label()),
        (Command::Undo, Icon::Undo, scene.state.undo_label()),
    ]
    .into_iter()
    .enumerate()
    {
        let hint = match label {
            Some(label) => format!("{}: {label}", command.hint(ui.ctx())),
            None => format!("{}: nothing", command.hint(ui.ctx())),
        };
        let at = square(x - 38.0 - 32.0 * k as f32, y);
        if sign_button(ui, at, sign, &hint, palette.ink, label.is_some()).clicked() {
            wishes.push(Wish::Command(command));
        }
    }
    let solve = Rect::from_center_size(pos2(x - 150.0, y), vec2(92.0, 30.0));
    solve_button(ui, solve, scene, wishes);
    maximise(ui, pos2(solve.left() - 14.0, y), tabs + 20.0, scene, wishes);
}

fn square(x: f32, y: f32) -> Rect {
    Rect::from_center_size(pos2(x, y), vec2(30.0, 30.0))
}

fn tab(ui: &Ui, left_bottom: egui::Pos2, bar: Rect, bench: Bench, current: bool) -> (Rect, bool) {
    let words = bench.words();
    let palette = Palette::of(ui.ctx());
    let font = text::strong();
    let size = measure(ui.painter(), words, font.clone());
    let rect =
        Rect::from_min_max(pos2(left_bottom.x, bar.top()), pos2(left_bottom.x + size.x + 24.0, bar.bottom()));
    let response = ui.interact(rect, ui.scope_id().with(("bench", words)), Sense::click());
    response.widget_info(|| WidgetInfo::selected(Role::Tab, true, current, format!("{words} bench")));
    let ink = if current || response.hovered() { palette.ink } else { palette.muted };
    write(ui.painter(), rect.center(), Align2::CENTER_CENTER, words, font, ink);
    if current {
        let line =
            Rect::from_min_max(pos2(rect.left(), bar.bottom() - 3.0), pos2(rect.right(), bar.bottom()));
        ui.painter().rect_filled(line, CornerRadius::ZERO, palette.accent);
    }
    super::controls::focus_ring(ui, &response, 3);
    let clicked = response.clicked();
    response.on_hover_text(Command::Show(bench).hint(ui.ctx()));
    (rect, clicked)
}

fn solve_button(ui: &mut Ui, rect: Rect, scene: &Scene<'_>, wishes: &mut Vec<Wish>) {
    let palette = scene.palette;
    let Some(part) = scene.solving else {
        let able =
            scene.derived.blend.is_some() || scene.state.current_set().is_some_and(|s| !s.members.is_empty());
        let hint = format!("{}: find the best blend within the limits", Command::Solve.hint(ui.ctx()));
        if primary_button(ui, rect, "Solve", able, &hint).clicked() {
            wishes.push(Wish::Command(Command::Solve));
        }
        return;
    };
    let response =
        ui.interact(rect, ui.scope_id().with("stop solving"), Sense::click()).on_hover_text("Stop solving");
    response.widget_info(|| WidgetInfo::labeled(Role::Button, true, "Stop solving"));
    let painter = ui.painter();
    painter.rect(
        rect,
        CornerRadius::same(6),
        palette.accent_wash,
        Stroke::new(1.0, palette.accent),
        StrokeKind::Inside,
    );
    let mut done = rect.shrink(1.0);
    done.set_width(done.width() * part.clamp(0.04, 1.0) as f32);
    painter.rect_filled(done, CornerRadius::same(5), palette.accent.gamma_multiply(0.35));
    write(painter, rect.center(), Align2::CENTER_CENTER, "Stop", text::strong(), palette.ink);
    super::controls::focus_ring(ui, &response, 6);
    if response.clicked() {
        wishes.push(Wish::Command(Command::StopSolving));
    }
}

fn maximise(ui: &Ui, right_centre: egui::Pos2, least_left: f32, scene: &Scene<'_>, wishes: &mut Vec<Wish>) {
    let Some(set) = scene.state.current_set() else { return };
    let palette = scene.palette;
    let words = maximised(set.white.maximise);
    let width = (measure(ui.painter(), words, text::body()).x + 30.0).min(right_centre.x - least_left);
    if width < 40.0 {
        return;
    }
    let rect = Rect::from_min_max(
        pos2(right_centre.x - width, right_centre.y - 14.0),
        pos2(right_centre.x, right_centre.y + 14.0),
    );
    let response: Response = ui.interact(rect, ui.scope_id().with("maximise"), Sense::click());
    response.widget_info(|| WidgetInfo::labeled(Role::Button, true, format!("Maximise: {words}")));
    if response.hovered() || response.has_focus() {
        ui.painter().rect_filled(rect, CornerRadius::same(5), palette.accent_wash);
    }
    elided(
        ui.painter(),
        pos2(rect.left() + 7.0, rect.center().y - 8.0),
        width - 28.0,
        words,
        text::body(),
        palette.ink,
    );
    icon(ui.painter(), Icon::Open, pos2(rect.right() - 12.0, rect.center().y), 9.0, palette.muted);
    super::controls::focus_ring(ui, &response, 5);
    Popup::menu(&response).show(|ui| {
        for what in [Maximise::Ler, Maximise::Efficacy, Maximise::Ra, Maximise::Rf] {
            if ui.selectable_label(what == set.white.maximise, maximised(what)).clicked()
                && what != set.white.maximise
            {
                let mut white = set.white.clone();
                white.maximise = what;
                wishes.push(Wish::Edit(Edit::White { set: set.id, white: Box::new(white) }));
            }
        }
    });
    response.on_hover_text("What Solve makes as large as it can");
}

fn main_menu(ui: &mut Ui, scene: &Scene<'_>, wishes: &mut Vec<Wish>) {
    ui.set_min_width(250.0);
    let label = ui.label("Name of this project");
    let mut name = scene.state.project().name.clone();
    let field = egui::TextEdit::singleline(&mut name)
        .desired_width(f32::INFINITY)
        .background_color(scene.palette.well);
    let typed = ui.add(field).labelled_by(label.id);
    if typed.changed() && !name.trim().is_empty() {
        wishes.push(Wish::Edit(Edit::ProjectName(name)));
    }
    let exportable = scene.derived.blend.is_some();
    let mut group = |ui: &mut Ui, title: &str, enabled: bool, commands: &[Command]| {
        ui.separator();
        if !title.is_empty() {
            ui.weak(title);
        }
        for command in commands {
            let mut button = egui::Button::new(command.words()).frame(false).min_size(vec2(238.0, 0.0));
            if let Some(key) = command.key() {
                button = button.shortcut_text(ui.ctx().format_shortcut(&key));
            }
            if ui.add_enabled(enabled, button).clicked() {
                wishes.push(Wish::Command(*command));
            }
        }
    };
    group(ui, "", true, &[Command::New, Command::Open, Command::Save, Command::SaveAs]);
    group(ui, "Bring in", true, &[Command::Import, Command::Paste]);
    group(
        ui,
        "Give out",
        exportable,
        &[
            Command::ExportSheetRon,
            Command::ExportSheetCsv,
            Command::ExportSpectrum,
            Command::ExportRecipeRon,
            Command::ExportRecipeCsv,
            Command::ExportReportPdf,
            Command::ExportReportHtml,
        ],
    );
    group(ui, "Look around", true, &[Command::OpenDemo, Command::OpenLibrary]);
    group(ui, "", true, &[Command::Quit]);
}
