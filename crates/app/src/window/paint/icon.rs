//! Small signs drawn with lines, so that they look the same with every typeface.

use egui::{Color32, CornerRadius, Painter, Pos2, Rect, Shape, Stroke, StrokeKind, pos2, vec2};
use std::f32::consts::{PI, TAU};

/// The signs.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(in crate::window) enum Icon {
    Undo,
    Redo,
    Locked,
    Unlocked,
    On,
    Off,
    More,
    Menu,
    Plus,
    Check,
    Cross,
    Sun,
    Moon,
    Open,
    Closed,
    Caution,
    Dash,
}

/// Draws a sign centred at a point, about `size` points high.
pub(in crate::window) fn icon(painter: &Painter, sign: Icon, at: Pos2, size: f32, colour: Color32) {
    let s = size / 2.0;
    let stroke = Stroke::new((size / 9.0).max(1.3), colour);
    let line = |points: &[(f32, f32)]| {
        let points: Vec<Pos2> = points.iter().map(|(x, y)| at + vec2(x * s, y * s)).collect();
        painter.add(Shape::line(points, stroke));
    };
    let arc = |centre: (f32, f32), radius: f32, from: f32, to: f32| {
        let points = (0..=20)
            .map(|k| {
                let angle = from + (to - from) * k as f32 / 20.0;
                at + vec2((centre.0 + radius * angle.cos()) * s, (centre.1 + radius * angle.sin()) * s)
            })
            .collect();
        painter.add(Shape::line(points, stroke));
    };
    match sign {
        Icon::Undo | Icon::Redo => {
            let m = if sign == Icon::Undo { 1.0 } else { -1.0 };
            let turn = |angle: f32| (m * 0.62 * angle.cos() + 0.05 * m, 0.62 * angle.sin() + 0.22);
            let points: Vec<(f32, f32)> =
                (0..=20).map(|k| turn(-PI * 0.92 + k as f32 / 20.0 * PI * 1.32)).collect();
            line(&points);
            let tip = points[0];
            line(&[
                (tip.0 - 0.14 * m, tip.1 - 0.56),
                (tip.0 - 0.02 * m, tip.1 + 0.04),
                (tip.0 + 0.54 * m, tip.1 - 0.1),
            ]);
        }
        Icon::Locked | Icon::Unlocked => {
            let body = Rect::from_min_max(at + vec2(-0.62, -0.06) * s, at + vec2(0.62, 0.86) * s);
            if sign == Icon::Locked {
                painter.rect_filled(body, CornerRadius::same(2), colour);
                line(&[(-0.38, -0.05), (-0.38, -0.4)]);
                line(&[(0.38, -0.05), (0.38, -0.4)]);
                arc((0.0, -0.4), 0.38, PI, TAU);
            } else {
                painter.rect_stroke(body, CornerRadius::same(2), stroke, StrokeKind::Inside);
                line(&[(-0.38, -0.05), (-0.38, -0.5)]);
                arc((0.0, -0.5), 0.38, PI, TAU - 0.35);
            }
        }
        Icon::On | Icon::Off => {
            arc((0.0, 0.08), 0.72, -PI / 2.0 + 0.65, PI * 1.5 - 0.65);
            line(&[(0.0, -0.86), (0.0, if sign == Icon::On { -0.1 } else { -0.35 })]);
            if sign == Icon::Off {
                line(&[(-0.9, 0.95), (0.9, -0.85)]);
            }
        }
        Icon::More => {
            for x in [-0.6, 0.0, 0.6] {
                painter.circle_filled(at + vec2(x * s, 0.0), (size / 12.0).max(1.2), colour);
            }
        }
        Icon::Menu => {
            for y in [-0.5, 0.0, 0.5] {
                line(&[(-0.75, y), (0.75, y)]);
            }
        }
        Icon::Plus => {
            line(&[(-0.7, 0.0), (0.7, 0.0)]);
            line(&[(0.0, -0.7), (0.0, 0.7)]);
        }
        Icon::Check => line(&[(-0.7, 0.05), (-0.2, 0.6), (0.75, -0.6)]),
        Icon::Cross => {
            line(&[(-0.58, -0.58), (0.58, 0.58)]);
            line(&[(-0.58, 0.58), (0.58, -0.58)]);
        }
        Icon::Dash => line(&[(-0.6, 0.0), (0.6, 0.0)]),
        Icon::Sun => {
            painter.circle_stroke(at, 0.38 * s, stroke);
            for k in 0..8 {
                let (sin, cos) = (k as f32 * PI / 4.0).sin_cos();
                line(&[(0.64 * cos, 0.64 * sin), (0.92 * cos, 0.92 * sin)]);
            }
        }
        Icon::Moon => {
            // A disc with a smaller disc cut out of its upper right.
            let outer = (0..=28).map(|k| {
                let angle = -0.35 + k as f32 / 28.0 * 4.55;
                (0.78 * angle.cos() - 0.06, 0.78 * angle.sin() + 0.04)
            });
            let points: Vec<(f32, f32)> = outer.collect();
            let (first, last) = (points[0], points[28]);
            let centre = (0.42, -0.42);
            let from = (last.1 - centre.1).atan2(last.0 - centre.0);
            let to = (first.1 - centre.1).atan2(first.0 - centre.0);
            let (from, to) = if from < to { (from + TAU, to) } else { (from, to) };
            let radius = (last.0 - centre.0).hypot(last.1 - centre.1);
            line(&points);
            line(
                &(0..=14)
                    .map(|k| {
                        let angle = from + (to - from) * k as f32 / 14.0;
                        (centre.0 + radius * angle.cos(), centre.1 + radius * angle.sin())
                    })
                    .collect::<Vec<_>>(),
            );
        }
        Icon::Open => line(&[(-0.5, -0.25), (0.0, 0.3), (0.5, -0.25)]),
        Icon::Closed => line(&[(-0.25, -0.5), (0.3, 0.0), (-0.25, 0.5)]),
        Icon::Caution => {
            painter.add(Shape::closed_line(
                vec![at + vec2(0.0, -0.8) * s, at + vec2(0.88, 0.72) * s, at + vec2(-0.88, 0.72) * s],
                stroke,
            ));
            line(&[(0.0, -0.25), (0.0, 0.22)]);
            painter.circle_filled(pos2(at.x, at.y + 0.46 * s), stroke.width * 0.65, colour);
        }
    }
}
