//! The fifteen special colour rendering indices as bars.

use super::super::paint::{fixed, write};
use super::super::theme::text;
use super::super::view::Scene;
use egui::accesskit::Role;
use egui::{Align2, CornerRadius, Rect, Sense, Stroke, Ui, WidgetInfo, pos2};

pub(in crate::window) fn show(ui: &mut Ui, rect: Rect, scene: &Scene<'_>) {
    let palette = scene.palette;
    let response = ui.interact(rect, ui.scope_id().with("special indices"), Sense::hover());
    let painter = ui.painter();
    let Some(r) = scene.derived.blend.as_deref().and_then(|b| b.measurement().r) else {
        let words = "No special indices this far from the Planckian locus";
        write(painter, rect.center(), Align2::CENTER_CENTER, words, text::small(), palette.muted);
        return;
    };
    response.widget_info(|| {
        let all: Vec<String> = r.iter().enumerate().map(|(k, v)| format!("R{} {v:.0}", k + 1)).collect();
        WidgetInfo::labeled(
            Role::GraphicsObject,
            true,
            format!("Special colour rendering indices: {}", all.join(", ")),
        )
    });
    let (top, foot) = (rect.top() + 14.0, rect.bottom() - 14.0);
    let lowest = r.iter().copied().fold(0.0, f64::min).max(-100.0);
    let y = |value: f64| {
        let part = ((value.clamp(lowest, 100.0) - lowest) / (100.0 - lowest)) as f32;
        foot - part * (foot - top)
    };
    let pitch = rect.width() / 15.0;
    for (k, value) in r.iter().enumerate() {
        let x = rect.left() + pitch * (k as f32 + 0.5);
        let bar = Rect::from_x_y_ranges(
            (x - pitch * 0.34)..=(x + pitch * 0.34),
            y(value.max(0.0))..=y(value.min(0.0)),
        );
        let red = k == 8;
        painter.rect_filled(bar, CornerRadius::same(2), if red { palette.accent } else { palette.bar });
        let ink = if red { palette.accent } else { palette.muted };
        write(painter, pos2(x, bar.top() - 1.0), Align2::CENTER_BOTTOM, fixed(*value, 0), text::tick(), ink);
        write(
            painter,
            pos2(x, rect.bottom()),
            Align2::CENTER_BOTTOM,
            format!("R{}", k + 1),
            text::tick(),
            ink,
        );
    }
    painter.hline(rect.x_range(), y(0.0), Stroke::new(1.0, palette.rule));
    response.on_hover_text("Special indices of the fifteen test colours (CIE 13.3-1995; R15 after JIS Z 8726). R9, in the accent, is the saturated red.");
}
