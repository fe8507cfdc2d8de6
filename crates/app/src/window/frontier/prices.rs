//! What things cost: the spec's own answer, each requirement, each emitter; or why there is no answer.

use super::super::command::Command;
use super::super::paint::{Icon, fixed, icon, write};
use super::super::proof::ways_out;
use super::super::theme::{Palette, text};
use super::super::view::Scene;
use super::super::wish::Wish;
use crate::frontier::{DropLine, Refusal, Spec, Trade};
use egui::accesskit::Role;
use egui::{
    Align2, Button, CornerRadius, Frame, Margin, Rect, RichText, ScrollArea, Sense, Stroke, Ui, UiBuilder,
    WidgetInfo, pos2, vec2,
};
use project::EmitterSet;

pub(super) fn show(
    ui: &mut Ui,
    rect: Rect,
    scene: &Scene<'_>,
    set: &EmitterSet,
    trade: &Trade,
    fresh: bool,
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    ui.scope_builder(UiBuilder::new().max_rect(rect).id_salt("prices"), |ui| {
        ScrollArea::vertical().id_salt("prices").auto_shrink(false).show(ui, |ui| {
            ui.set_max_width(rect.width() - 8.0);
            ui.spacing_mut().item_spacing.y = 5.0;
            heading(ui, "The spec as it stands", &palette);
            match &trade.spec {
                Spec::Met(best) => {
                    let bound = match best.bound {
                        Some(bound) if best.gap_percent().is_some_and(|gap| gap < 0.005) => {
                            format!("No blend gives more than {}: proven.", fixed(bound, 1))
                        }
                        Some(bound) => format!(
                            "No blend gives more than {} ({}, {}\u{2009}% higher).",
                            fixed(bound, 2),
                            best.worth(),
                            fixed(best.gap_percent().unwrap_or_default(), 2)
                        ),
                        None => "No bound is known.".to_owned(),
                    };
                    ui.horizontal_wrapped(|ui| {
                        ui.spacing_mut().item_spacing.x = 5.0;
                        let value = RichText::new(fixed(best.objective, 2)).font(text::value());
                        ui.label(value.color(palette.ink));
                        small(ui, trade.aim.words(), &palette);
                    });
                    small(ui, &format!("within all limits. {bound}"), &palette);
                }
                Spec::Refused(refusal) => refused(ui, refusal, set, fresh, &palette, wishes),
                Spec::Unclear(sentence) => {
                    ui.label(RichText::new(sentence).font(text::small()).color(palette.short));
                }
            }
            if let Some(refusal) = trade.no_curve.as_ref().filter(|_| matches!(trade.spec, Spec::Met(_))) {
                refused(ui, refusal, set, fresh, &palette, wishes);
            }
            if !trade.prices.is_empty() {
                heading(ui, "What one step costs", &palette);
                for line in &trade.prices {
                    bullet(ui, &line.words, &palette);
                }
                small(
                    ui,
                    "Each price is the difference of two problems solved again, a small step apart.",
                    &palette,
                );
            }
            if !trade.dropped.is_empty() {
                heading(ui, "Leave one out", &palette);
                dropped(ui, &trade.dropped, &palette);
            }
        });
    });
}

fn heading(ui: &mut Ui, words: &str, palette: &Palette) {
    if ui.cursor().top() > ui.min_rect().top() + 4.0 {
        ui.add_space(8.0);
    }
    ui.label(RichText::new(words).font(text::strong()).color(palette.ink));
}

fn small(ui: &mut Ui, words: &str, palette: &Palette) {
    ui.label(RichText::new(words).font(text::small()).color(palette.muted));
}

fn bullet(ui: &mut Ui, words: &str, palette: &Palette) {
    let width = ui.available_width();
    let galley = ui.painter().layout(words.to_owned(), text::small(), palette.ink, width - 14.0);
    let (rect, response) = ui.allocate_exact_size(vec2(width, galley.size().y), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, words));
    ui.painter().circle_filled(pos2(rect.left() + 4.0, rect.top() + 7.5), 1.8, palette.accent);
    ui.painter().galley(pos2(rect.left() + 14.0, rect.top()), galley, palette.ink);
}

/// Why there is no blend, what comes nearest, and the ways out.
fn refused(
    ui: &mut Ui,
    refusal: &Refusal,
    set: &EmitterSet,
    fresh: bool,
    palette: &Palette,
    wishes: &mut Vec<Wish>,
) {
    let frame = Frame::new()
        .fill(palette.well)
        .stroke(Stroke::new(1.0, palette.short))
        .corner_radius(6)
        .inner_margin(Margin::same(10));
    frame.show(ui, |ui| {
        ui.set_width(ui.available_width());
        let (head, _) = ui.allocate_exact_size(vec2(ui.available_width(), 18.0), Sense::hover());
        icon(ui.painter(), Icon::Cross, pos2(head.left() + 7.0, head.center().y), 11.0, palette.short);
        let at = pos2(head.left() + 20.0, head.center().y);
        write(ui.painter(), at, Align2::LEFT_CENTER, "No blend meets it", text::strong(), palette.short);
        ui.label(RichText::new(&refusal.words).font(text::small()).color(palette.ink));
        for way in ways_out(refusal, set.id) {
            let words = RichText::new(&way.words).font(text::small_strong()).color(palette.accent);
            let hint = if way.solve {
                "Moves that limit and solves; undo takes both back, one after the other"
            } else {
                "Gives the set these shares; undo takes it back"
            };
            if ui.add_enabled(fresh, Button::new(words)).on_hover_text(hint).clicked() {
                wishes.push(Wish::Edit(way.edit));
                if way.solve {
                    wishes.push(Wish::Command(Command::Solve));
                }
            }
        }
    });
}

/// A bar for each emitter: what the answer loses without it.
fn dropped(ui: &mut Ui, lines: &[DropLine], palette: &Palette) {
    let most = lines.iter().filter_map(|line| line.price).fold(0.0, f64::max).max(1e-9);
    let width = ui.available_width();
    for line in lines {
        let (rect, response) = ui.allocate_exact_size(vec2(width, 20.0), Sense::hover());
        let (value, spoken) = match line.price {
            None => ("no blend left".to_owned(), format!("Without {}: no blend meets the limits", line.name)),
            Some(price) if price < 0.05 => {
                ("costs nothing".to_owned(), format!("Without {}: nothing is lost", line.name))
            }
            Some(price) => (
                format!("{} lm/W", fixed(-price, 1)),
                format!("Without {}: {} lm/W less", line.name, fixed(price, 1)),
            ),
        };
        response.widget_info(|| WidgetInfo::labeled(Role::Label, true, &spoken));
        let painter = ui.painter();
        let name = Rect::from_min_max(rect.min, pos2(rect.left() + width * 0.42, rect.bottom()));
        super::super::paint::elided(
            painter,
            pos2(name.left(), name.center().y - 7.5),
            name.width() - 6.0,
            &line.name,
            text::small(),
            palette.ink,
        );
        let end = rect.right() - 82.0;
        let start = name.right();
        let track = Rect::from_min_max(pos2(start, rect.center().y - 3.5), pos2(end, rect.center().y + 3.5));
        if let Some(price) = line.price {
            painter.rect_filled(track, CornerRadius::same(3), palette.grid);
            let part = (price / most) as f32;
            let filled = Rect::from_min_size(track.min, vec2(track.width() * part, track.height()));
            painter.rect_filled(filled, CornerRadius::same(3), palette.bar);
        } else {
            // Hatched, so that it cannot be read as a long bar.
            let stroke = Stroke::new(1.0, palette.short);
            let mut x = track.left();
            while x + 5.0 < track.right() {
                painter.line_segment([pos2(x, track.bottom()), pos2(x + 5.0, track.top())], stroke);
                x += 5.0;
            }
        }
        let ink = if line.price.is_none() { palette.short } else { palette.ink };
        write(painter, pos2(rect.right(), rect.center().y), Align2::RIGHT_CENTER, &value, text::small(), ink);
        response.on_hover_text(spoken);
    }
}
