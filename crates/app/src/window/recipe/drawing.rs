//! The device to scale, painted from the figure the report prints.

use crate::window::theme::Palette;
use egui::epaint::PathShape;
use egui::{Align2, Color32, FontId, Pos2, Rect, Shape, Stroke, Ui, WidgetInfo, pos2};
use egui::{Sense, accesskit::Role};
use files::drawing::figures::DevicePicture;
use files::drawing::{Anchor, Drawing, Ink, Mark, Path, Place, Step, theme};

/// Straight pieces of a curve.
const PIECES: u32 = 12;

/// Paints a picture into a rectangle, as large as it fits.
pub(super) fn show(ui: &mut Ui, rect: Rect, picture: &DevicePicture, palette: &Palette) {
    // Text sizes are in points of print: about 2.6 screen points a mm make them readable.
    let wide = (f64::from(rect.width()) / 3.0).max(70.0);
    let drawing = picture.draw(wide);
    let scale = (rect.width() / drawing.width_mm as f32).min(rect.height() / drawing.height_mm as f32);
    let response = ui.interact(rect, ui.scope_id().with("device drawing"), Sense::hover());
    let words = format!("{}: {}", drawing.title, drawing.description);
    response.widget_info(|| WidgetInfo::labeled(Role::Image, true, words.clone()));
    let painter = ui.painter_at(rect);
    let sheet = Sheet { origin: rect.min, scale, palette };
    sheet.paint(&painter, &drawing);
}

struct Sheet<'a> {
    origin: Pos2,
    scale: f32,
    palette: &'a Palette,
}

impl Sheet<'_> {
    fn at(&self, place: Place) -> Pos2 {
        pos2(self.origin.x + place.x as f32 * self.scale, self.origin.y + place.y as f32 * self.scale)
    }

    /// Inks of the printed theme become those of the window; emitters' inks stay.
    fn ink(&self, ink: Ink) -> Color32 {
        let p = self.palette;
        match ink {
            i if i == theme::PAPER => p.card,
            i if i == theme::PANEL => p.well,
            i if i == theme::INK => p.ink,
            i if i == theme::QUIET => p.muted,
            i if i == theme::RULE => p.rule,
            i if i == theme::EDGE => p.bar,
            i if i == theme::ACCENT => p.accent,
            i if i == theme::BAR => p.bar,
            Ink(r, g, b) if p.is_dark() => {
                // Washes meant for paper are taken down towards the dark ground.
                let own = Color32::from_rgb(r, g, b);
                if ink.grey() > 0.75 {
                    own.lerp_to_gamma(p.card, 0.62)
                } else {
                    own.lerp_to_gamma(p.ink, 0.25)
                }
            }
            Ink(r, g, b) => Color32::from_rgb(r, g, b),
        }
    }

    fn paint(&self, painter: &egui::Painter, drawing: &Drawing) {
        self.marks(painter, &drawing.marks);
    }

    fn marks(&self, painter: &egui::Painter, marks: &[Mark]) {
        for mark in marks {
            match mark {
                Mark::Shape { path, fill, pen } => self.shape(painter, path, *fill, *pen),
                Mark::Text(words) => {
                    let align = match words.anchor {
                        Anchor::Start => Align2::LEFT_BOTTOM,
                        Anchor::Middle => Align2::CENTER_BOTTOM,
                        Anchor::End => Align2::RIGHT_BOTTOM,
                    };
                    // Points of print to screen points, at the scale of the drawing.
                    let size = (words.size_pt * 0.3528) as f32 * self.scale;
                    let size = size.max(10.0);
                    let font = if words.bold {
                        FontId::new(size, crate::window::theme::strong_family())
                    } else {
                        FontId::proportional(size)
                    };
                    let mut at = self.at(words.place);
                    // The place is on the baseline.
                    at.y += 0.22 * size;
                    painter.text(at, align, &words.words, font, self.ink(words.ink));
                }
                Mark::Window { frame, marks } => {
                    let corner = self.at(Place { x: frame.x, y: frame.y });
                    let far = self.at(Place { x: frame.right(), y: frame.bottom() });
                    let inside = painter
                        .with_clip_rect(painter.clip_rect().intersect(Rect::from_min_max(corner, far)));
                    self.marks(&inside, marks);
                }
            }
        }
    }

    fn shape(
        &self,
        painter: &egui::Painter,
        path: &Path,
        fill: Option<Ink>,
        pen: Option<files::drawing::Pen>,
    ) {
        for (points, closed) in self.outlines(path) {
            if let Some(fill) = fill {
                let shape = PathShape::convex_polygon(points.clone(), self.ink(fill), Stroke::NONE);
                painter.add(Shape::Path(shape));
            }
            if let Some(pen) = pen {
                let stroke = Stroke::new((pen.width_mm as f32 * self.scale).max(0.6), self.ink(pen.ink));
                let mut line = points;
                if closed && let Some(first) = line.first().copied() {
                    line.push(first);
                }
                if pen.pattern.pieces_mm().is_empty() {
                    painter.add(Shape::line(line, stroke));
                } else {
                    let pieces: Vec<f32> =
                        pen.pattern.pieces_mm().iter().map(|mm| *mm as f32 * self.scale).collect();
                    let drawn: Vec<f32> = pieces.iter().step_by(2).copied().collect();
                    let gaps: Vec<f32> = pieces.iter().skip(1).step_by(2).copied().collect();
                    painter.extend(Shape::dashed_line_with_offset(&line, stroke, &drawn, &gaps, 0.0));
                }
            }
        }
    }

    fn outlines(&self, path: &Path) -> Vec<(Vec<Pos2>, bool)> {
        let mut out: Vec<(Vec<Pos2>, bool)> = Vec::new();
        for step in path.steps() {
            match *step {
                Step::Move(place) => out.push((vec![self.at(place)], false)),
                Step::Line(place) => {
                    if let Some((points, _)) = out.last_mut() {
                        points.push(self.at(place));
                    }
                }
                Step::Curve(first, second, end) => {
                    if let Some((points, _)) = out.last_mut()
                        && let Some(start) = points.last().copied()
                    {
                        let (a, b, c) = (self.at(first), self.at(second), self.at(end));
                        for k in 1..=PIECES {
                            let t = k as f32 / PIECES as f32;
                            let u = 1.0 - t;
                            let mix = |p: f32, q: f32, r: f32, s: f32| {
                                u * u * u * p + 3.0 * u * u * t * q + 3.0 * u * t * t * r + t * t * t * s
                            };
                            points.push(pos2(mix(start.x, a.x, b.x, c.x), mix(start.y, a.y, b.y, c.y)));
                        }
                    }
                }
                Step::Close => {
                    if let Some((_, closed)) = out.last_mut() {
                        *closed = true;
                    }
                }
            }
        }
        out
    }
}
