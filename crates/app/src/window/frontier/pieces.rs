//! Small controls of this bench: a row of choices, buttons, sentences.

use super::super::controls::focus_ring;
use super::super::paint::{measure, write};
use super::super::theme::{Palette, text};
use egui::accesskit::Role;
use egui::{
    Align2, Color32, CornerRadius, FontId, Painter, Pos2, Rect, Sense, Stroke, StrokeKind, Ui, Vec2,
    WidgetInfo, pos2, vec2,
};

/// One of several choices side by side.
pub(super) struct Segment<T> {
    pub(super) value: T,
    pub(super) words: &'static str,
    /// Shown on hover, where there is something to say.
    pub(super) hint: &'static str,
    pub(super) enabled: bool,
}

const SEGMENT_HEIGHT: f32 = 28.0;

fn segment_width(ui: &Ui, words: &str) -> f32 {
    measure(ui.painter(), words, text::small_strong()).x + 24.0
}

/// The room a row of choices takes.
pub(super) fn segmented_width<T>(ui: &Ui, segments: &[Segment<T>]) -> f32 {
    segments.iter().map(|segment| segment_width(ui, segment.words)).sum::<f32>() + 4.0
}

/// Draws a row of choices; the one asked for, when another than the current one is, and where the row stands.
pub(super) fn segmented<T: Copy + PartialEq>(
    ui: &mut Ui,
    left_centre: Pos2,
    name: &str,
    segments: &[Segment<T>],
    current: T,
) -> (Option<T>, Rect) {
    let palette = Palette::of(ui.ctx());
    let whole = Rect::from_min_size(
        pos2(left_centre.x, left_centre.y - SEGMENT_HEIGHT / 2.0),
        vec2(segmented_width(ui, segments), SEGMENT_HEIGHT),
    );
    let rule = Stroke::new(1.0, palette.rule);
    ui.painter().rect(whole, CornerRadius::same(7), palette.well, rule, StrokeKind::Inside);
    let mut asked = None;
    let mut x = whole.left() + 2.0;
    for segment in segments {
        let width = segment_width(ui, segment.words);
        let rect = Rect::from_min_size(pos2(x, whole.top() + 2.0), vec2(width, SEGMENT_HEIGHT - 4.0));
        x += width;
        let chosen = segment.value == current;
        let sense = if segment.enabled { Sense::click() } else { Sense::hover() };
        let response = ui.interact(rect, ui.scope_id().with((name, segment.words)), sense);
        let spoken = format!("{name}: {}", segment.words);
        response.widget_info(|| WidgetInfo::selected(Role::RadioButton, segment.enabled, chosen, &spoken));
        let painter = ui.painter();
        if chosen {
            let edge = Stroke::new(1.2, palette.accent);
            painter.rect(rect, CornerRadius::same(5), palette.card, edge, StrokeKind::Inside);
        } else if response.hovered() && segment.enabled {
            painter.rect_filled(rect, CornerRadius::same(5), palette.accent_wash);
        }
        let ink = match (segment.enabled, chosen) {
            (false, _) => palette.bar,
            (true, true) => palette.ink,
            (true, false) => palette.muted,
        };
        write(painter, rect.center(), Align2::CENTER_CENTER, segment.words, text::small_strong(), ink);
        focus_ring(ui, &response, 5);
        if response.clicked() && !chosen {
            asked = Some(segment.value);
        }
        if !segment.hint.is_empty() {
            response.on_hover_text(segment.hint);
        }
    }
    (asked, whole)
}

/// The room a button takes.
pub(super) fn button_size(ui: &Ui, words: &str) -> Vec2 {
    vec2(measure(ui.painter(), words, text::strong()).x + 26.0, 28.0)
}

/// A plain button; true when it was operated.
pub(super) fn button(ui: &mut Ui, rect: Rect, words: &str, enabled: bool, hint: &str) -> bool {
    let palette = Palette::of(ui.ctx());
    let sense = if enabled { Sense::click() } else { Sense::hover() };
    let response = ui.interact(rect, ui.scope_id().with(("button", words)), sense);
    response.widget_info(|| WidgetInfo::labeled(Role::Button, enabled, words));
    let fill = if response.hovered() && enabled { palette.accent_wash } else { palette.card };
    let edge = Stroke::new(1.0, if enabled { palette.accent } else { palette.rule });
    ui.painter().rect(rect, CornerRadius::same(6), fill, edge, StrokeKind::Inside);
    let ink = if enabled { palette.accent } else { palette.muted };
    write(ui.painter(), rect.center(), Align2::CENTER_CENTER, words, text::small_strong(), ink);
    focus_ring(ui, &response, 6);
    let clicked = response.clicked();
    if !hint.is_empty() {
        response.on_hover_text(hint);
    }
    clicked
}

/// A sentence that wraps; read aloud as it stands. Returns where it ends.
pub(super) fn sentence(ui: &Ui, at: Pos2, width: f32, words: &str, font: FontId, colour: Color32) -> f32 {
    let galley = ui.painter().layout(words.to_owned(), font, colour, width.max(40.0));
    let rect = Rect::from_min_size(at, galley.size());
    ui.painter().galley(at, galley, colour);
    ui.interact(rect, ui.scope_id().with(("sentence", words)), Sense::hover())
        .widget_info(|| WidgetInfo::labeled(Role::Label, true, words));
    rect.bottom()
}

/// Small text on a patch of the ground it stands on, so that lines under it do not cross it.
pub(super) fn halo(
    painter: &Painter,
    at: Pos2,
    anchor: Align2,
    words: &str,
    ground: Color32,
    ink: Color32,
) -> Rect {
    let size = measure(painter, words, text::tick());
    let rect = anchor.anchor_size(at, size);
    painter.rect_filled(rect.expand2(vec2(3.0, 0.5)), CornerRadius::same(2), ground.gamma_multiply(0.9));
    write(painter, at, anchor, words, text::tick(), ink)
}
