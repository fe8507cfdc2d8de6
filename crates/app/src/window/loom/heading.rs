//! The loom's heading: which set, in which shares, and whether the white is held.

use super::super::command::Command;
use super::super::controls::switch;
use super::super::paint::{Icon, elided, icon, measure};
use super::super::theme::text;
use super::super::view::{Scene, View};
use super::super::wish::Wish;
use super::kind_words;
use crate::state::Edit;
use egui::accesskit::Role;
use egui::{Align2, CornerRadius, Popup, Rect, Response, Sense, Ui, WidgetInfo, pos2, vec2};
use project::{EmitterSet, ShareKind};

pub(super) fn show(
    ui: &mut Ui,
    rect: Rect,
    scene: &Scene<'_>,
    set: &EmitterSet,
    view: &mut View,
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    let y = rect.top() + 12.0;
    let hint = "While it is on, pulling a row moves along the blends that keep the chromaticity; the span each row can reach is drawn on it.";
    let (clicked, held) = switch(ui, pos2(rect.right(), y), view.hold_white, "white held", hint);
    if clicked {
        wishes.push(Wish::Command(Command::HoldWhite));
    }

    let name = menu_words(ui, pos2(rect.left(), y), &set.name, text::title(), palette.ink, "Emitter set");
    Popup::menu(&name).show(|ui| sets(ui, scene, set, wishes));
    let count = match set.members.len() {
        1 => "1 emitter".to_owned(),
        n => format!("{n} emitters"),
    };
    let painter = ui.painter().clone();
    let count = elided(
        &painter,
        pos2(name.rect.right() + 12.0, y - 7.0),
        110.0,
        &count,
        text::small(),
        palette.muted,
    );
    let add = add_button(ui, pos2(count.right() + 12.0, y));
    Popup::menu(&add).show(|ui| adding(ui, scene, set, wishes));

    let left = add.rect.right() + 18.0;
    let right = held.left() - 14.0;
    if view.hold_white
        && let Some(sentence) = no_freedom(scene)
    {
        let shown =
            elided(&painter, pos2(left, y - 7.0), right - left, &sentence, text::small(), palette.caution);
        ui.interact(shown, ui.scope_id().with("no freedom"), Sense::hover()).on_hover_text(sentence);
        return;
    }
    let kind = scene.state.project().share_kind;
    let lead = "pull a curve: its height is its share of";
    let words = kind_words(kind);
    let room = right - left;
    let needed =
        measure(&painter, lead, text::small()).x + measure(&painter, words, text::small_strong()).x + 24.0;
    let mut x = left;
    if needed < room {
        x = elided(&painter, pos2(left, y - 7.0), room, lead, text::small(), palette.muted).right() + 5.0;
    } else if measure(&painter, "share of", text::small()).x
        + measure(&painter, words, text::small_strong()).x
        + 24.0
        < room
    {
        x = elided(&painter, pos2(left, y - 7.0), room, "share of", text::small(), palette.muted).right()
            + 5.0;
    }
    let kinds = menu_words(ui, pos2(x, y), words, text::small_strong(), palette.accent, "Kind of share");
    Popup::menu(&kinds).show(|ui| {
        for other in [ShareKind::Radiant, ShareKind::Luminous, ShareKind::Photon] {
            let words = format!("share of {}", kind_words(other));
            if ui.selectable_label(other == kind, words).clicked() && other != kind {
                wishes.push(Wish::Edit(Edit::ShareKind(other)));
            }
        }
    });
}

/// When no row can move with the white held: why.
fn no_freedom(scene: &Scene<'_>) -> Option<String> {
    let set = scene.state.current_set()?;
    let blend = scene.derived.blend.as_deref()?;
    let mut reason = None;
    for (row, member) in blend.rows.iter().zip(&set.members) {
        match &row.held_span {
            Ok(_) => return None,
            Err(stuck) if member.on && !member.locked => reason = reason.or(Some(stuck)),
            Err(_) => {}
        }
    }
    reason.map(|stuck| format!("No freedom: {stuck}."))
}

/// Words that open a menu.
fn menu_words(
    ui: &Ui,
    left_centre: egui::Pos2,
    words: &str,
    font: egui::FontId,
    colour: egui::Color32,
    role: &str,
) -> Response {
    let size = measure(ui.painter(), words, font.clone());
    let rect = Rect::from_min_size(left_centre - vec2(5.0, 12.0), vec2(size.x + 26.0, 24.0));
    let response = ui.interact(rect, ui.scope_id().with(("menu words", role)), Sense::click());
    response.widget_info(|| WidgetInfo::labeled(Role::Button, true, format!("{role}: {words}")));
    let palette = super::super::theme::Palette::of(ui.ctx());
    if response.hovered() || response.has_focus() {
        ui.painter().rect_filled(rect, CornerRadius::same(5), palette.accent_wash);
    }
    ui.painter().text(left_centre, Align2::LEFT_CENTER, words, font, colour);
    icon(ui.painter(), Icon::Open, pos2(rect.right() - 10.0, left_centre.y), 9.0, colour);
    super::super::controls::focus_ring(ui, &response, 5);
    response
}

fn add_button(ui: &Ui, left_centre: egui::Pos2) -> Response {
    let palette = super::super::theme::Palette::of(ui.ctx());
    let words = "emitter";
    let size = measure(ui.painter(), words, text::small_strong());
    let rect = Rect::from_min_size(left_centre - vec2(0.0, 11.0), vec2(size.x + 30.0, 22.0));
    let response = ui.interact(rect, ui.scope_id().with("add emitter"), Sense::click());
    response.widget_info(|| WidgetInfo::labeled(Role::Button, true, "Add an emitter to this set"));
    let fill = if response.hovered() { palette.accent_wash } else { palette.well };
    ui.painter().rect_filled(rect, CornerRadius::same(11), fill);
    icon(ui.painter(), Icon::Plus, pos2(rect.left() + 12.0, rect.center().y), 9.0, palette.accent);
    ui.painter().text(
        pos2(rect.left() + 20.0, rect.center().y),
        Align2::LEFT_CENTER,
        words,
        text::small_strong(),
        palette.accent,
    );
    super::super::controls::focus_ring(ui, &response, 11);
    response
}

fn sets(ui: &mut Ui, scene: &Scene<'_>, current: &EmitterSet, wishes: &mut Vec<Wish>) {
    ui.set_min_width(220.0);
    for set in &scene.state.project().sets {
        let target = format!("{}  \u{b7}  {:.0} K", set.name, set.white.cct_k);
        if ui.selectable_label(set.id == current.id, target).clicked() && set.id != current.id {
            wishes.push(Wish::Edit(Edit::SelectSet(Some(set.id))));
        }
    }
    ui.separator();
    let mut name = current.name.clone();
    let label = ui.label("Name of this set");
    let field = egui::TextEdit::singleline(&mut name)
        .desired_width(f32::INFINITY)
        .background_color(scene.palette.well);
    let typed = ui.add(field).labelled_by(label.id);
    if typed.changed() && !name.trim().is_empty() {
        wishes.push(Wish::Edit(Edit::SetName { set: current.id, name }));
    }
    ui.separator();
    for command in [Command::DuplicateSet, Command::AddSet, Command::RemoveSet] {
        let enabled = command != Command::RemoveSet || scene.state.project().sets.len() > 1;
        if ui.add_enabled(enabled, egui::Button::new(command.words()).frame(false)).clicked() {
            wishes.push(Wish::Command(command));
        }
    }
}

fn adding(ui: &mut Ui, scene: &Scene<'_>, set: &EmitterSet, wishes: &mut Vec<Wish>) {
    ui.set_min_width(220.0);
    let mut any = false;
    for emitter in &scene.state.project().emitters {
        if set.members.iter().any(|m| m.emitter == emitter.id) {
            continue;
        }
        any = true;
        if ui.button(&emitter.name).on_hover_text("Put it into this set, with no share yet").clicked() {
            wishes.push(Wish::Edit(Edit::AddMember { set: set.id, emitter: emitter.id, at: usize::MAX }));
        }
    }
    if any {
        ui.separator();
    }
    if ui.button(Command::Import.words()).clicked() {
        wishes.push(Wish::Command(Command::Import));
    }
}
