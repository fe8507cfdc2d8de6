//! Curves: a line pattern for each emitter, and areas that fade towards their base.

use egui::epaint::{Mesh, Vertex, WHITE_UV};
use egui::{Color32, Painter, Pos2, Shape, Stroke, pos2};

/// How a line is broken, so that no curve is told by its colour alone.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(in crate::window) enum Pattern {
    Solid,
    Dashed,
    Dotted,
    DashDot,
    LongDash,
    DashDotDot,
}

impl Pattern {
    const ALL: [Self; 6] =
        [Self::Solid, Self::Dashed, Self::DashDot, Self::Dotted, Self::LongDash, Self::DashDotDot];

    /// The pattern of the row with that number; repeats after six rows.
    pub(in crate::window) fn of_row(row: usize) -> Self {
        Self::ALL[row % Self::ALL.len()]
    }

    /// Lengths drawn and skipped in turn, in points.
    const fn lengths(self) -> &'static [f32] {
        match self {
            Self::Solid => &[],
            Self::Dashed => &[6.0, 3.5],
            Self::Dotted => &[1.8, 2.8],
            Self::DashDot => &[7.0, 3.0, 1.8, 3.0],
            Self::LongDash => &[13.0, 4.0],
            Self::DashDotDot => &[7.0, 3.0, 1.8, 2.6, 1.8, 3.0],
        }
    }
}

/// Draws a polyline in a pattern.
pub(in crate::window) fn patterned(painter: &Painter, points: &[Pos2], stroke: Stroke, pattern: Pattern) {
    let lengths = pattern.lengths();
    if lengths.is_empty() {
        painter.add(Shape::line(points.to_vec(), stroke));
        return;
    }
    let mut stretch: Vec<Pos2> = points.first().copied().into_iter().collect();
    let (mut at, mut left) = (0, lengths[0]);
    let mut shapes = Vec::new();
    for pair in points.windows(2) {
        let (mut from, to) = (pair[0], pair[1]);
        loop {
            let distance = from.distance(to);
            if distance <= left {
                left -= distance;
                if at % 2 == 0 {
                    stretch.push(to);
                }
                break;
            }
            from += (to - from) * (left / distance);
            if at % 2 == 0 {
                stretch.push(from);
                shapes.push(Shape::line(std::mem::take(&mut stretch), stroke));
            } else {
                stretch = vec![from];
            }
            at = (at + 1) % lengths.len();
            left = lengths[at];
        }
    }
    if stretch.len() > 1 {
        shapes.push(Shape::line(stretch, stroke));
    }
    painter.extend(shapes);
}

/// Fills between a curve and a horizontal base, from `top` at the curve's height to `foot` at the base.
pub(in crate::window) fn area(painter: &Painter, points: &[Pos2], base_y: f32, top: Color32, foot: Color32) {
    let highest = points.iter().map(|p| p.y).fold(base_y, f32::min);
    let span = (base_y - highest).max(1.0);
    let shade = |y: f32| {
        let t = ((base_y - y) / span).clamp(0.0, 1.0);
        foot.lerp_to_gamma(top, t)
    };
    let lower: Vec<Pos2> = points.iter().map(|p| pos2(p.x, base_y)).collect();
    strip(painter, points, &lower, |p| shade(p.y), |_| foot);
}

/// Fills between two curves with the same abscissae.
pub(in crate::window) fn band(painter: &Painter, upper: &[Pos2], lower: &[Pos2], colour: Color32) {
    strip(painter, upper, lower, |_| colour, |_| colour);
}

fn strip(
    painter: &Painter,
    upper: &[Pos2],
    lower: &[Pos2],
    above: impl Fn(Pos2) -> Color32,
    below: impl Fn(Pos2) -> Color32,
) {
    let mut mesh = Mesh::default();
    for (k, (u, l)) in upper.iter().zip(lower).enumerate() {
        mesh.vertices.push(Vertex { pos: *u, uv: WHITE_UV, color: above(*u) });
        mesh.vertices.push(Vertex { pos: *l, uv: WHITE_UV, color: below(*l) });
        if k > 0 {
            let i = 2 * k as u32;
            mesh.indices.extend([i - 2, i - 1, i, i - 1, i + 1, i]);
        }
    }
    painter.add(Shape::mesh(mesh));
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn six_neighbouring_rows_have_six_patterns() {
        let patterns: Vec<_> = (0..6).map(Pattern::of_row).collect();
        for (k, pattern) in patterns.iter().enumerate() {
            assert!(!patterns[..k].contains(pattern));
        }
        assert_eq!(Pattern::of_row(7), Pattern::of_row(1));
    }
}
