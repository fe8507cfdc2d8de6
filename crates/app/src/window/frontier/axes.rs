//! A pair of axes with round figures.

use super::super::paint::{fixed, write};
use super::super::theme::{Palette, text};
use crate::frontier::contour::{decimals, round_step, round_values};
use egui::{Align2, CornerRadius, Painter, Pos2, Rect, Stroke, pos2};

/// Where values stand in a picture.
#[derive(Debug, Clone, Copy)]
pub(super) struct Axes {
    /// The field inside the axes.
    pub(super) field: Rect,
    pub(super) x: (f64, f64),
    pub(super) y: (f64, f64),
}

impl Axes {
    /// Axes inside a rectangle, with room for figures and titles. `y_title` stands over the field, at the left.
    pub(super) fn draw(
        painter: &Painter,
        rect: Rect,
        (x, y): ((f64, f64), (f64, f64)),
        (x_title, y_title): (&str, &str),
        palette: &Palette,
    ) -> Self {
        let field = Rect::from_min_max(
            pos2(rect.left() + 44.0, rect.top() + 22.0),
            pos2(rect.right() - 8.0, rect.bottom() - 38.0),
        );
        let axes = Self { field, x, y };
        painter.rect_filled(field, CornerRadius::same(3), palette.well);
        let grid = Stroke::new(1.0, palette.grid);
        let many = |points: f32, apart: f32| ((points / apart) as usize).clamp(2, 12);
        let (steps_x, steps_y) = (many(field.width(), 70.0), many(field.height(), 46.0));
        let places = decimals(round_step(x.0, x.1, steps_x));
        for value in round_values(x.0, x.1, steps_x) {
            let at = axes.at(value, y.0).x;
            painter.vline(at, field.y_range(), grid);
            let below = pos2(at, field.bottom() + 5.0);
            write(painter, below, Align2::CENTER_TOP, fixed(value, places), text::tick(), palette.muted);
        }
        let places = decimals(round_step(y.0, y.1, steps_y));
        for value in round_values(y.0, y.1, steps_y) {
            let at = axes.at(x.0, value).y;
            painter.hline(field.x_range(), at, grid);
            let beside = pos2(field.left() - 6.0, at);
            write(painter, beside, Align2::RIGHT_CENTER, fixed(value, places), text::tick(), palette.muted);
        }
        let line = Stroke::new(1.0, palette.muted);
        painter.hline(field.x_range(), field.bottom(), line);
        painter.vline(field.left(), field.y_range(), line);
        let over = pos2(rect.left(), rect.top() + 2.0);
        write(painter, over, Align2::LEFT_TOP, y_title, text::small(), palette.muted);
        let under = pos2(field.right(), rect.bottom() - 2.0);
        write(painter, under, Align2::RIGHT_BOTTOM, x_title, text::small(), palette.muted);
        axes
    }

    /// The place of a pair of values.
    pub(super) fn at(&self, x: f64, y: f64) -> Pos2 {
        let part = |value: f64, (low, high): (f64, f64)| ((value - low) / (high - low)) as f32;
        pos2(
            self.field.left() + self.field.width() * part(x, self.x),
            self.field.bottom() - self.field.height() * part(y, self.y),
        )
    }

    /// True when a pair of values stands inside the field.
    pub(super) fn holds(&self, x: f64, y: f64) -> bool {
        (self.x.0..=self.x.1).contains(&x) && (self.y.0..=self.y.1).contains(&y)
    }
}

/// A range with some room at both ends; never empty.
pub(super) fn roomy(low: f64, high: f64, part: f64) -> (f64, f64) {
    // Less than that is rounding, and would be drawn as a slope.
    let least = 0.004 * low.abs().max(high.abs()).max(1.0);
    let middle = (low + high) / 2.0;
    let half = (high - low).max(least) * (0.5 + part);
    (middle - half, middle + half)
}
