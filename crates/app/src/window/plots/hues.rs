//! The sixteen hue bins: fidelity as bars, and the shift of each bin's mean colour as a ring.

use super::super::paint::{fixed, write};
use super::super::theme::{self, text};
use super::super::view::Scene;
use crate::state::derived::BlendView;
use egui::accesskit::Role;
use egui::{Align2, CornerRadius, Pos2, Rect, Sense, Shape, Stroke, Ui, Vec2, WidgetInfo, pos2, vec2};
use std::f64::consts::TAU;

/// Number of hue bins.
const BINS: usize = 16;

pub(in crate::window) fn show(ui: &mut Ui, rect: Rect, scene: &Scene<'_>) {
    let palette = scene.palette;
    let response = ui.interact(rect, ui.scope_id().with("hue bins"), Sense::hover());
    let painter = ui.painter();
    let numbers = scene.derived.blend.as_deref().map(BlendView::measurement);
    let bins = numbers.and_then(|m| Some((m.rf_bins?, m.rcs_bins?, m.rhs_bins?)));
    let Some((rf, rcs, rhs)) = bins else {
        let words = "No hue bins this far from the Planckian locus";
        write(painter, rect.center(), Align2::CENTER_CENTER, words, text::small(), palette.muted);
        return;
    };
    response.widget_info(|| {
        let all: Vec<String> = (0..BINS)
            .map(|k| {
                format!(
                    "bin {} fidelity {}",
                    k + 1,
                    rf[k].map_or_else(|| "empty".to_owned(), |v| format!("{v:.0}"))
                )
            })
            .collect();
        WidgetInfo::labeled(Role::GraphicsObject, true, format!("Hue bins: {}", all.join(", ")))
    });
    let side = rect.height();
    let ring = Rect::from_min_size(rect.min, vec2(side, side));
    self::ring(painter, ring, &rcs, &rhs, scene);

    let bars = Rect::from_min_max(
        pos2(ring.right() + 14.0, rect.top() + 26.0),
        pos2(rect.right(), rect.bottom() - 16.0),
    );
    write(
        painter,
        pos2(bars.left(), rect.top() + 4.0),
        Align2::LEFT_TOP,
        "fidelity of each hue",
        text::tick(),
        palette.muted,
    );
    let pitch = bars.width() / BINS as f32;
    for (k, value) in rf.iter().enumerate() {
        let x = bars.left() + pitch * (k as f32 + 0.5);
        let colour = theme::hue(k, BINS, palette.is_dark());
        if let Some(value) = value {
            let top = bars.bottom() - (value.clamp(0.0, 100.0) / 100.0) as f32 * bars.height();
            let bar = Rect::from_x_y_ranges((x - pitch * 0.36)..=(x + pitch * 0.36), top..=bars.bottom());
            painter.rect_filled(bar, CornerRadius::same(2), colour);
        }
        if k % 2 == 0 {
            write(
                painter,
                pos2(x, bars.bottom() + 2.0),
                Align2::CENTER_TOP,
                k + 1,
                text::tick(),
                palette.muted,
            );
        }
    }
    painter.hline(bars.x_range(), bars.bottom(), Stroke::new(1.0, palette.rule));
    let least = rf.iter().flatten().copied().fold(f64::INFINITY, f64::min);
    if least.is_finite() {
        let words = format!("least {}", fixed(least, 0));
        write(
            painter,
            pos2(bars.right(), rect.top() + 4.0),
            Align2::RIGHT_TOP,
            words,
            text::tick(),
            palette.muted,
        );
    }
    response.on_hover_text("Left: the mean colour of each of the sixteen hue bins under the blend (line) against the reference (ring); outwards is more saturated, arrows show the shift, doubled. Right: fidelity of each bin (ANSI/IES TM-30). Bin 1 is red.");
}

fn ring(
    painter: &egui::Painter,
    rect: Rect,
    rcs: &[Option<f64>; BINS],
    rhs: &[Option<f64>; BINS],
    scene: &Scene<'_>,
) {
    let palette = scene.palette;
    let centre = rect.center();
    let radius = rect.width() * 0.33;
    let direction = |angle: f64| vec2(angle.cos() as f32, -angle.sin() as f32);
    let across = |angle: f64| vec2(-angle.sin() as f32, -angle.cos() as f32);
    painter.circle_filled(centre, radius, palette.well);
    painter.circle_stroke(centre, radius, Stroke::new(1.2, palette.muted));
    painter.line_segment([centre - vec2(5.0, 0.0), centre + vec2(5.0, 0.0)], Stroke::new(1.0, palette.bar));
    painter.line_segment([centre - vec2(0.0, 5.0), centre + vec2(0.0, 5.0)], Stroke::new(1.0, palette.bar));
    let mut outline: Vec<Pos2> = Vec::new();
    for k in 0..BINS {
        let angle = TAU * (k as f64 + 0.5) / BINS as f64;
        let colour = theme::hue(k, BINS, palette.is_dark());
        painter.circle_filled(centre + direction(angle) * (rect.width() * 0.455), 3.6, colour);
        let (Some(chroma), Some(hue)) = (rcs[k], rhs[k]) else { continue };
        let from = centre + direction(angle) * radius;
        let shift: Vec2 =
            (direction(angle) * (chroma / 100.0) as f32 + across(angle) * hue as f32) * radius * 2.0;
        let to = from + shift;
        outline.push(to);
        painter.line_segment([from, to], Stroke::new(2.0, colour));
    }
    painter.add(Shape::closed_line(outline, Stroke::new(1.8, palette.ink)));
}
