//! The wavelength axis all curves share.

use super::super::paint::{area, write};
use super::super::theme::{Palette, spectral, text};
use colour::{FIRST_NM, LAST_NM, appearance};
use egui::epaint::{Mesh, Vertex, WHITE_UV};
use egui::{Align2, Color32, Painter, Pos2, Rect, Shape, Stroke, pos2};

/// 380 to 780 nm over a stretch of the window.
#[derive(Debug, Clone, Copy)]
pub(super) struct Axis {
    pub(super) left: f32,
    pub(super) right: f32,
}

impl Axis {
    pub(super) fn x(&self, nm: f64) -> f32 {
        let part = ((nm - FIRST_NM) / (LAST_NM - FIRST_NM)) as f32;
        self.left + part * (self.right - self.left)
    }

    pub(super) fn nm(&self, x: f32) -> f64 {
        let part = f64::from((x - self.left) / (self.right - self.left));
        FIRST_NM + part * (LAST_NM - FIRST_NM)
    }

    /// The points of a curve on the colour grid: `height` points for a value of 1, standing on `base`.
    pub(super) fn points(&self, values: impl Iterator<Item = f64>, base: f32, height: f64) -> Vec<Pos2> {
        values
            .enumerate()
            .map(|(k, v)| pos2(self.x(FIRST_NM + k as f64), base - (v * height) as f32))
            .collect()
    }

    /// Vertical lines every 50 nm.
    pub(super) fn grid(&self, painter: &Painter, top: f32, bottom: f32, palette: &Palette) {
        for nm in (400..=750).step_by(50) {
            painter.vline(self.x(f64::from(nm)), top..=bottom, Stroke::new(1.0, palette.grid));
        }
    }

    /// A strip of the spectrum's colours with the wavelengths under it.
    pub(super) fn labels(&self, painter: &Painter, strip: Rect, palette: &Palette) {
        let mut mesh = Mesh::default();
        let (top, bottom) = (strip.top() + 3.0, strip.top() + 7.0);
        for k in 0..=100 {
            let nm = FIRST_NM + f64::from(k) * 4.0;
            let seen = appearance::of_wavelength(nm);
            // Towards the ends of vision the strip sinks into the card.
            let strength = (((nm - 380.0) / 45.0).min((780.0 - nm) / 90.0)).clamp(0.12, 1.0) as f32;
            let colour = spectral(palette, seen, strength);
            let x = self.x(nm);
            mesh.vertices.push(Vertex { pos: pos2(x, top), uv: WHITE_UV, color: colour });
            mesh.vertices.push(Vertex { pos: pos2(x, bottom), uv: WHITE_UV, color: colour });
            if k > 0 {
                let i = 2 * k as u32;
                mesh.indices.extend([i - 2, i - 1, i, i - 1, i + 1, i]);
            }
        }
        painter.add(Shape::mesh(mesh));
        let y = strip.top() + 11.0;
        for nm in (400..=750).step_by(50) {
            write(
                painter,
                pos2(self.x(f64::from(nm)), y),
                Align2::CENTER_TOP,
                nm,
                text::tick(),
                palette.muted,
            );
        }
        write(painter, pos2(self.right, y), Align2::RIGHT_TOP, "nm", text::tick(), palette.muted);
    }

    /// A curve filled in one colour.
    pub(super) fn filled(&self, painter: &Painter, points: &[Pos2], base: f32, top: Color32, foot: Color32) {
        area(painter, points, base, top, foot);
    }
}
