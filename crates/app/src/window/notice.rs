//! A sentence at the foot of the window, until it is read.

use super::controls::sign_button;
use super::paint::Icon;
use super::theme::{Palette, text};
use egui::accesskit::Role;
use egui::{Area, CornerRadius, Order, Rect, Sense, Stroke, StrokeKind, Ui, WidgetInfo, pos2, vec2};

/// Seconds a sentence stays.
const STAYS: f64 = 12.0;

/// What there is to say.
#[derive(Debug, Default)]
pub(super) struct Notice {
    words: Option<(String, f64)>,
}

impl Notice {
    /// Says something, in place of what was said before.
    pub(super) fn say(&mut self, words: String, now: f64) {
        self.words = Some((words, now));
    }

    /// Draws it over the foot of the window.
    pub(super) fn show(&mut self, ui: &Ui) {
        let Some((words, since)) = &self.words else { return };
        let age = ui.ctx().time() - since;
        if age > STAYS {
            self.words = None;
            return;
        }
        ui.ctx().request_repaint_after_secs((STAYS - age + 0.05) as f32);
        let palette = Palette::of(ui.ctx());
        let window = ui.ctx().content_rect();
        let galley = ui.painter().layout(
            words.clone(),
            text::body(),
            palette.card,
            (window.width() - 160.0).min(640.0),
        );
        let size = galley.size() + vec2(62.0, 20.0);
        let rect =
            Rect::from_center_size(pos2(window.center().x, window.bottom() - 22.0 - size.y / 2.0), size);
        let spoken = words.clone();
        let mut close = false;
        Area::new(egui::Id::unique("notice")).order(Order::Foreground).fixed_pos(rect.min).show(
            ui.ctx(),
            |ui| {
                let response = ui.allocate_rect(rect, Sense::hover());
                response.widget_info(|| WidgetInfo::labeled(Role::Alert, true, &spoken));
                let stroke = Stroke::new(1.0, palette.rule);
                ui.painter().rect(rect, CornerRadius::same(8), palette.ink, stroke, StrokeKind::Inside);
                ui.painter().galley(rect.min + vec2(16.0, 10.0), galley, palette.card);
                let cross =
                    Rect::from_center_size(pos2(rect.right() - 22.0, rect.center().y), vec2(24.0, 24.0));
                close =
                    sign_button(ui, cross, Icon::Cross, "Dismiss this message", palette.card, true).clicked();
            },
        );
        if close {
            self.words = None;
        }
    }
}
