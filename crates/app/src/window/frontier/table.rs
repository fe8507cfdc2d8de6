//! The points of the curve as a table.

use super::super::controls::focus_ring;
use super::super::paint::{fixed, write};
use super::super::theme::{Palette, text};
use super::plot::point_words;
use crate::frontier::{Trade, title};
use egui::accesskit::Role;
use egui::{
    Align2, Color32, CornerRadius, FontId, Painter, Rect, ScrollArea, Sense, Stroke, Ui, UiBuilder,
    WidgetInfo, pos2, vec2,
};

const ROW: f32 = 24.0;

/// Draws the table; the row asked for.
pub(super) fn show(ui: &mut Ui, rect: Rect, trade: &Trade, chosen: Option<usize>) -> Option<usize> {
    let palette = Palette::of(ui.ctx());
    let painter = ui.painter().clone();
    let heads = [
        format!("{} \u{2265}", title(trade.metric)),
        "lm/W".to_owned(),
        "bound".to_owned(),
        "gap %".to_owned(),
        "Ra".to_owned(),
        "R9".to_owned(),
        "Rf".to_owned(),
        "Rg".to_owned(),
        "worth".to_owned(),
    ];
    let head = Rect::from_min_size(rect.min, vec2(rect.width(), ROW));
    cells(&painter, head, &heads, &text::small(), palette.muted);
    painter.hline(rect.x_range(), head.bottom(), Stroke::new(1.0, palette.muted));
    let body = Rect::from_min_max(pos2(rect.left(), head.bottom() + 1.0), rect.max);
    let mut asked = None;
    ui.scope_builder(UiBuilder::new().max_rect(body).id_salt("points"), |ui| {
        ui.spacing_mut().item_spacing.y = 0.0;
        ScrollArea::vertical().id_salt("points").auto_shrink(false).show_rows(
            ui,
            ROW,
            trade.curve.len(),
            |ui, rows| {
                for k in rows {
                    let point = &trade.curve[k];
                    let (row, response) =
                        ui.allocate_exact_size(vec2(ui.available_width(), ROW), Sense::click());
                    let spoken = point_words(trade, point);
                    let current = chosen == Some(k);
                    response.widget_info(|| WidgetInfo::selected(Role::Row, true, current, &spoken));
                    let painter = ui.painter();
                    if current {
                        painter.rect_filled(row, CornerRadius::same(3), palette.accent_wash);
                        let mark = Rect::from_min_size(row.min, vec2(3.0, row.height()));
                        painter.rect_filled(mark, CornerRadius::ZERO, palette.accent);
                    } else if response.hovered() {
                        painter.rect_filled(row, CornerRadius::same(3), palette.well);
                    }
                    painter.hline(row.x_range(), row.bottom() - 0.5, Stroke::new(1.0, palette.grid));
                    let v = &point.values;
                    let gap = point.gap_percent().map_or_else(|| "\u{2013}".to_owned(), |gap| fixed(gap, 3));
                    let bound = point.bound.map_or_else(|| "\u{2013}".to_owned(), |bound| fixed(bound, 2));
                    let values = [
                        fixed(point.level, 1),
                        fixed(point.objective, 2),
                        bound,
                        gap,
                        fixed(v.ra, 1),
                        fixed(v.r9, 1),
                        fixed(v.rf, 1),
                        fixed(v.rg, 1),
                        point.worth().to_owned(),
                    ];
                    cells(painter, row, &values, &text::small(), palette.ink);
                    focus_ring(ui, &response, 3);
                    if response.clicked() {
                        asked = Some(k);
                    }
                }
            },
        );
    });
    asked
}

fn cells(painter: &Painter, row: Rect, words: &[String], font: &FontId, ink: Color32) {
    // The last column holds a word and is a little wider.
    let width = (row.width() - 12.0) / (words.len() as f32 + 0.6);
    for (k, word) in words.iter().enumerate() {
        let extra = if k + 1 == words.len() { 0.6 } else { 0.0 };
        let right = row.left() + width * (k as f32 + 1.0 + extra);
        write(painter, pos2(right, row.center().y), Align2::RIGHT_CENTER, word, font.clone(), ink);
    }
}
