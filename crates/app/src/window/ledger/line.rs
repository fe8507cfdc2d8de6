//! One line of the ledger.

use super::super::command::Command;
use super::super::controls::focus_ring;
use super::super::paint::{Icon, Words, elided, icon, write};
use super::super::theme::{Palette, text};
use super::super::view::{Scene, Section, View, WayOut};
use super::super::wish::Wish;
use super::limits;
use crate::state::derived::{LedgerLine, LineState};
use egui::accesskit::Role;
use egui::{Align2, CornerRadius, Painter, Pos2, Rect, Sense, Stroke, Ui, WidgetInfo, pos2, vec2};
use project::EmitterSet;

/// Height of a line with a limit.
const HEIGHT: f32 = 50.0;
/// Height of a line without one.
const LOW_HEIGHT: f32 = 30.0;
/// Where values begin.
pub(super) const VALUE_X: f32 = 50.0;
/// Where limits begin.
pub(super) const LIMIT_X: f32 = 172.0;
/// Room for the mark at the end.
const MARK_WIDTH: f32 = 62.0;

#[expect(clippy::too_many_arguments, reason = "one line's whole scene")]
pub(super) fn show(
    ui: &mut Ui,
    width: f32,
    line: &LedgerLine,
    section: Option<Section>,
    scene: &Scene<'_>,
    set: &EmitterSet,
    view: &mut View,
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    let tall = line.limited || line.bar.is_some();
    let height = if tall { HEIGHT } else { LOW_HEIGHT };
    let (rect, _) = ui.allocate_exact_size(vec2(width, height), Sense::hover());
    let painter = ui.painter().clone();
    painter.hline(rect.x_range(), rect.top() + 0.5, Stroke::new(1.0, palette.rule));
    let top = rect.top() + if tall { 16.0 } else { 15.0 };

    // Hovering says what it is; the spoken line says how it stands.
    let spoken_rect = Rect::from_min_max(rect.min, pos2(rect.left() + LIMIT_X - 4.0, rect.bottom()));
    let response = ui.interact(spoken_rect, ui.scope_id().with(("line", line.key)), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, spoken(line)));
    response.on_hover_text(line.hover);

    label(ui, &painter, pos2(rect.left(), top), line.label, section, view, &palette);
    let value_colour = if line.state == LineState::Short { palette.short } else { palette.ink };
    let shown = line.text.replace('-', "\u{2212}");
    let font = if tall { text::value() } else { text::strong() };
    let mut words = Words::default().with(&shown, font, value_colour);
    let unit = if line.value.is_some() { line.unit.split(' ').next().unwrap_or_default() } else { "" };
    if !unit.is_empty() {
        words = words.with(&format!(" {unit}"), text::small(), palette.muted);
    }
    words.write(&painter, pos2(rect.left() + VALUE_X, top), Align2::LEFT_CENTER);

    let limit_rect = Rect::from_min_max(
        pos2(rect.left() + LIMIT_X, top - 12.0),
        pos2(rect.right() - MARK_WIDTH, top + 12.0),
    );
    limits::edit(ui, limit_rect, line, scene, set, wishes);
    mark(&painter, pos2(rect.right(), top), &line.state, &palette);
    if tall {
        let y = rect.top() + 37.0;
        if let Some(part) = line.bar {
            bar(
                &painter,
                Rect::from_center_size(pos2(rect.left() + VALUE_X + 52.0, y), vec2(104.0, 4.0)),
                part,
                &palette,
            );
        }
        let x = if line.bar.is_some() { LIMIT_X + 4.0 } else { VALUE_X };
        let room = width - x;
        if let Some(way) = way_out(scene, line) {
            relax(ui, pos2(rect.left() + x, y), way, &palette, wishes);
            return;
        }
        let remark = rect.left() + x;
        let shown = elided(&painter, pos2(remark, y - 7.0), room, &line.remark, text::small(), palette.muted);
        if !line.remark.is_empty() {
            ui.interact(shown, ui.scope_id().with(("remark", line.key)), Sense::hover())
                .on_hover_text(&line.remark);
        }
    }
}

/// The way out of a refusal that moves this line's limit.
fn way_out<'a>(scene: &'a Scene<'_>, line: &LedgerLine) -> Option<&'a WayOut> {
    let proof = scene.proof.filter(|proof| !proof.met && scene.solving.is_none())?;
    proof.ways_out.iter().find(|way| way.limit.is_some_and(|limit| limit.key() == line.key))
}

/// One click moves the limit as far as it must and solves again.
fn relax(ui: &Ui, left_centre: Pos2, way: &WayOut, palette: &Palette, wishes: &mut Vec<Wish>) {
    let painter = ui.painter();
    let at = left_centre + vec2(5.0, 0.0);
    let words = &way.words;
    let shown = write(painter, at, Align2::LEFT_CENTER, words, text::small_strong(), palette.accent);
    let area = Rect::from_min_max(
        pos2(left_centre.x, shown.top() - 2.0),
        pos2(shown.right() + 20.0, shown.bottom() + 2.0),
    );
    let response = ui.interact(area, ui.scope_id().with(("relax", words)), Sense::click());
    response.widget_info(|| WidgetInfo::labeled(Role::Button, true, format!("Relax: {words}")));
    if response.hovered() || response.has_focus() {
        painter.rect_filled(area, CornerRadius::same(4), palette.accent_wash);
        write(painter, at, Align2::LEFT_CENTER, words, text::small_strong(), palette.accent);
    }
    icon(painter, Icon::Closed, pos2(area.right() - 9.0, left_centre.y), 8.0, palette.accent);
    focus_ring(ui, &response, 4);
    if response.on_hover_text("Moves this limit and solves again").clicked() {
        wishes.push(Wish::Edit(way.edit.clone()));
        if way.solve {
            wishes.push(Wish::Command(Command::Solve));
        }
    }
}

fn spoken(line: &LedgerLine) -> String {
    let state = match &line.state {
        LineState::Met => "met".to_owned(),
        LineState::Short => "short".to_owned(),
        LineState::Needs(what) => what.clone(),
        LineState::NotLimited => String::new(),
    };
    [format!("{} {} {}", line.label, line.text, line.unit), line.limit.clone(), line.remark.clone(), state]
        .iter()
        .filter(|part| !part.trim().is_empty())
        .map(|part| part.trim().to_owned())
        .collect::<Vec<_>>()
        .join(", ")
}

fn label(
    ui: &Ui,
    painter: &Painter,
    left_centre: Pos2,
    words: &str,
    section: Option<Section>,
    view: &mut View,
    palette: &Palette,
) {
    let shown = write(painter, left_centre, Align2::LEFT_CENTER, words, text::small(), palette.muted);
    let Some(section) = section else { return };
    let open = view.open.contains(&section);
    let rect = Rect::from_min_max(
        pos2(shown.left() - 4.0, left_centre.y - 11.0),
        pos2(shown.right() + 17.0, left_centre.y + 11.0),
    );
    let response = ui.interact(rect, ui.scope_id().with(("section", section)), Sense::click());
    let what = match section {
        Section::White => "the neighbourhood of the white",
        Section::Ra => "the fifteen test colours",
        Section::Rf => "the sixteen hue bins",
        Section::Other => "other values",
    };
    let name = format!("{} {what}", if open { "Hide" } else { "Show" });
    response.widget_info(|| WidgetInfo::selected(Role::DisclosureTriangle, true, open, &name));
    if response.hovered() {
        painter.rect_filled(rect, CornerRadius::same(5), palette.accent_wash);
        write(painter, left_centre, Align2::LEFT_CENTER, words, text::small(), palette.ink);
    }
    let sign = if open { Icon::Open } else { Icon::Closed };
    icon(painter, sign, pos2(shown.right() + 9.0, left_centre.y), 9.0, palette.accent);
    focus_ring(ui, &response, 5);
    if response.on_hover_text(name).clicked() {
        view.toggle(section);
    }
}

/// Met or short, as mark and word.
fn mark(painter: &Painter, right_centre: Pos2, state: &LineState, palette: &Palette) {
    let (words, colour, sign) = match state {
        LineState::Met => ("met", palette.met, Icon::Check),
        LineState::Short => ("short", palette.short, Icon::Cross),
        LineState::Needs(_) => ("needs data", palette.caution, Icon::Dash),
        LineState::NotLimited => return,
    };
    let shown = write(painter, right_centre, Align2::RIGHT_CENTER, words, text::small_strong(), colour);
    if !matches!(state, LineState::Needs(_)) {
        icon(painter, sign, pos2(shown.left() - 10.0, right_centre.y), 10.0, colour);
    }
}

/// The margin: to the right of the tick what there is to spare, to the left what is short.
fn bar(painter: &Painter, rect: Rect, part: f64, palette: &Palette) {
    painter.rect_filled(rect, CornerRadius::same(2), palette.rule);
    let zero = rect.left() + rect.width() * 0.36;
    let (end, colour) = if part >= 0.0 {
        (zero + (rect.right() - zero) * part as f32, palette.met)
    } else {
        (zero + (zero - rect.left()) * part as f32, palette.short)
    };
    let filled = Rect::from_min_max(pos2(zero.min(end), rect.top()), pos2(zero.max(end), rect.bottom()));
    painter.rect_filled(filled, CornerRadius::same(2), colour);
    painter.vline(zero, (rect.top() - 3.0)..=(rect.bottom() + 3.0), Stroke::new(1.5, palette.ink));
}

/// Values that are stated without being limited.
pub(super) fn others(ui: &mut Ui, width: f32, lines: &[&LedgerLine], scene: &Scene<'_>, view: &mut View) {
    let palette = scene.palette;
    for line in lines {
        let cautious = line.key == "blue_light";
        let caution_rows = if cautious && view.open.contains(&Section::Other) {
            Some(ui.painter().layout(line.hover.to_owned(), text::small(), palette.caution, width))
        } else {
            None
        };
        let extra = caution_rows.as_ref().map_or(0.0, |g| g.size().y + 6.0)
            + if cautious && !line.remark.is_empty() { 17.0 } else { 0.0 };
        let (rect, _) = ui.allocate_exact_size(vec2(width, LOW_HEIGHT - 3.0 + extra), Sense::hover());
        let painter = ui.painter().clone();
        painter.hline(rect.x_range(), rect.top() + 0.5, Stroke::new(1.0, palette.rule));
        let y = rect.top() + 14.0;
        let response = ui.interact(rect, ui.scope_id().with(("line", line.key)), Sense::hover());
        response.widget_info(|| WidgetInfo::labeled(Role::Label, true, spoken(line)));
        let label = write(
            &painter,
            pos2(rect.left(), y),
            Align2::LEFT_CENTER,
            line.label,
            text::small(),
            palette.muted,
        );
        let mut words = Words::default().with(&line.text, text::strong(), palette.ink);
        if !line.unit.is_empty() {
            words = words.with(&format!(" {}", line.unit), text::small(), palette.muted);
        }
        words.write(&painter, pos2(rect.right(), y), Align2::RIGHT_CENTER);
        let mut below = rect.top() + 27.0;
        if cautious {
            let at = Rect::from_center_size(pos2(label.right() + 14.0, y), vec2(20.0, 20.0));
            let name = "Caution about the blue-light figure";
            if super::super::controls::sign_button(ui, at, Icon::Caution, name, palette.caution, true)
                .clicked()
            {
                view.toggle(Section::Other);
            }
            if !line.remark.is_empty() {
                write(
                    &painter,
                    pos2(rect.left(), below),
                    Align2::LEFT_TOP,
                    &line.remark,
                    text::small(),
                    palette.muted,
                );
                below += 17.0;
            }
        }
        if let Some(galley) = caution_rows {
            painter.galley(pos2(rect.left(), below), galley, palette.caution);
        }
        response.on_hover_text(line.hover);
    }
}
