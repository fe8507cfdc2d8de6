//! A drawing as a PNG of any resolution, for publication.

use super::{Anchor, Drawing, Frame, Ink, MM_PER_PT, Mark, Path, Pen, Step, Text, font, printable, theme};
use skrifa::outline::OutlinePen;
use tiny_skia::{
    FillRule, LineCap, LineJoin, Mask, Paint, PathBuilder, Pixmap, Rect, Stroke, StrokeDash, Transform,
};

/// Dots per inch that journals ask of line art.
pub const PUBLICATION_DPI: f64 = 600.0;
/// Most pixels of a picture: 100 million, 300 MB while it is written.
pub const MOST_PIXELS: f64 = 1e8;

/// Why a picture could not be written.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum PngError {
    /// No pixels, or too many.
    #[error(
        "expected a picture of 1 to 100 million pixels, found {width_px:.0} × {height_px:.0}: choose a smaller resolution"
    )]
    Size {
        /// Asked width in pixels.
        width_px: f64,
        /// Asked height in pixels.
        height_px: f64,
    },
    /// The encoder gave up.
    #[error("the picture could not be written: {0}")]
    Write(String),
}

/// The bytes of a PNG at a resolution, which the file also records.
///
/// # Errors
/// When the picture would have no pixels or more than [`MOST_PIXELS`].
pub fn png(drawing: &Drawing, dots_per_inch: f64) -> Result<Vec<u8>, PngError> {
    let dots_per_mm = dots_per_inch / 25.4;
    let (width_px, height_px) =
        ((drawing.width_mm * dots_per_mm).round(), (drawing.height_mm * dots_per_mm).round());
    let size = PngError::Size { width_px, height_px };
    if !(width_px >= 1.0 && height_px >= 1.0 && width_px * height_px <= MOST_PIXELS) {
        return Err(size);
    }
    let mut pixels = Pixmap::new(width_px as u32, height_px as u32).ok_or(size)?;
    pixels.fill(tiny_skia::Color::from_rgba8(theme::PAPER.0, theme::PAPER.1, theme::PAPER.2, 255));
    let scale = Transform::from_scale(dots_per_mm as f32, dots_per_mm as f32);
    paint(&drawing.marks, scale, None, &mut pixels);
    encoded(&pixels, dots_per_inch)
}

fn encoded(pixels: &Pixmap, dots_per_inch: f64) -> Result<Vec<u8>, PngError> {
    let refused = |error: png::EncodingError| PngError::Write(error.to_string());
    // The ground is opaque, so every pixel is: alpha need not be stored.
    let rgb: Vec<u8> = pixels.pixels().iter().flat_map(|p| [p.red(), p.green(), p.blue()]).collect();
    let mut bytes = Vec::new();
    let mut encoder = png::Encoder::new(&mut bytes, pixels.width(), pixels.height());
    encoder.set_color(png::ColorType::Rgb);
    encoder.set_depth(png::BitDepth::Eight);
    let per_metre = (dots_per_inch / 0.0254).round() as u32;
    encoder.set_pixel_dims(Some(png::PixelDimensions {
        xppu: per_metre,
        yppu: per_metre,
        unit: png::Unit::Meter,
    }));
    let mut writer = encoder.write_header().map_err(refused)?;
    writer.write_image_data(&rgb).map_err(refused)?;
    writer.finish().map_err(refused)?;
    Ok(bytes)
}

fn colour(ink: Ink) -> Paint<'static> {
    let mut paint = Paint { anti_alias: true, ..Paint::default() };
    paint.set_color_rgba8(ink.0, ink.1, ink.2, 255);
    paint
}

fn paint(marks: &[Mark], scale: Transform, seen: Option<&Mask>, pixels: &mut Pixmap) {
    for mark in marks {
        match mark {
            Mark::Shape { path, fill, pen } => {
                let Some(path) = outlines(path) else { continue };
                if let Some(ink) = fill {
                    pixels.fill_path(&path, &colour(*ink), FillRule::Winding, scale, seen);
                }
                if let Some(pen) = pen {
                    pixels.stroke_path(&path, &colour(pen.ink), &stroke(pen), scale, seen);
                }
            }
            Mark::Text(text) => words(text, scale, seen, pixels),
            Mark::Window { frame, marks } => {
                let Some(opening) = rectangle(*frame) else { continue };
                let mask = match seen {
                    Some(outer) => {
                        let mut mask = outer.clone();
                        mask.intersect_path(&opening, FillRule::Winding, true, scale);
                        Some(mask)
                    }
                    None => Mask::new(pixels.width(), pixels.height()).map(|mut mask| {
                        mask.fill_path(&opening, FillRule::Winding, true, scale);
                        mask
                    }),
                };
                // Without a mask (no memory for one) nothing is painted rather than painted outside.
                if let Some(mask) = mask {
                    paint(marks, scale, Some(&mask), pixels);
                }
            }
        }
    }
}

fn stroke(pen: &Pen) -> Stroke {
    let pieces: Vec<f32> = pen.pattern.pieces_mm().iter().map(|mm| *mm as f32).collect();
    Stroke {
        width: pen.width_mm as f32,
        line_cap: LineCap::Butt,
        line_join: LineJoin::Round,
        dash: if pieces.is_empty() { None } else { StrokeDash::new(pieces, 0.0) },
        ..Stroke::default()
    }
}

fn outlines(path: &Path) -> Option<tiny_skia::Path> {
    if !path.is_drawable() {
        return None;
    }
    let mut builder = PathBuilder::new();
    for step in path.steps() {
        match step {
            Step::Move(p) => builder.move_to(p.x as f32, p.y as f32),
            Step::Line(p) => builder.line_to(p.x as f32, p.y as f32),
            Step::Curve(a, b, c) => {
                builder.cubic_to(a.x as f32, a.y as f32, b.x as f32, b.y as f32, c.x as f32, c.y as f32);
            }
            Step::Close => builder.close(),
        }
    }
    builder.finish()
}

fn rectangle(frame: Frame) -> Option<tiny_skia::Path> {
    let rect = Rect::from_xywh(frame.x as f32, frame.y as f32, frame.width as f32, frame.height as f32)?;
    Some(PathBuilder::from_rect(rect))
}

/// Collects a glyph's outline, ems with y upwards.
struct GlyphPen(PathBuilder);

impl OutlinePen for GlyphPen {
    fn move_to(&mut self, x: f32, y: f32) {
        self.0.move_to(x, y);
    }

    fn line_to(&mut self, x: f32, y: f32) {
        self.0.line_to(x, y);
    }

    fn quad_to(&mut self, cx: f32, cy: f32, x: f32, y: f32) {
        self.0.quad_to(cx, cy, x, y);
    }

    fn curve_to(&mut self, ax: f32, ay: f32, bx: f32, by: f32, x: f32, y: f32) {
        self.0.cubic_to(ax, ay, bx, by, x, y);
    }

    fn close(&mut self) {
        self.0.close();
    }
}

fn words(text: &Text, scale: Transform, seen: Option<&Mask>, pixels: &mut Pixmap) {
    if !(text.place.is_paintable() && text.size_pt.is_finite()) {
        return;
    }
    let glyphs = font::set(&printable(&text.words), text.bold);
    let em_mm = text.size_pt * MM_PER_PT;
    let width: f64 = glyphs.iter().map(|g| g.advance_em * em_mm).sum();
    let mut along = match text.anchor {
        Anchor::Start => 0.0,
        Anchor::Middle => -width / 2.0,
        Anchor::End => -width,
    };
    let turn = if text.upwards { -90.0 } else { 0.0 };
    let line = scale.pre_translate(text.place.x as f32, text.place.y as f32).pre_rotate(turn);
    let paint = colour(text.ink);
    for glyph in glyphs {
        let mut pen = GlyphPen(PathBuilder::new());
        font::outline(glyph.glyph, text.bold, &mut pen);
        if let Some(path) = pen.0.finish() {
            let here = line.pre_translate(along as f32, 0.0).pre_scale(em_mm as f32, -em_mm as f32);
            pixels.fill_path(&path, &paint, FillRule::Winding, here, seen);
        }
        along += glyph.advance_em * em_mm;
    }
}

#[cfg(test)]
mod tests {
    use super::super::at;
    use super::*;

    fn picture(drawing: &Drawing, dpi: f64) -> (png::OutputInfo, Vec<u8>, Option<png::PixelDimensions>) {
        let bytes = png(drawing, dpi).expect("a picture");
        let mut reader =
            png::Decoder::new(std::io::Cursor::new(bytes)).read_info().expect("a PNG that parses");
        let mut pixels = vec![0; reader.output_buffer_size().expect("a size")];
        let info = reader.next_frame(&mut pixels).expect("pixels");
        let dims = reader.info().pixel_dims;
        (info, pixels, dims)
    }

    #[test]
    fn an_inch_at_300_dots_is_300_pixels_and_says_so() {
        let (info, _, dims) = picture(&Drawing::new(25.4, 12.7, "", ""), 300.0);
        assert_eq!((info.width, info.height), (300, 150));
        assert_eq!(dims.map(|d| d.xppu), Some(11811));
    }

    #[test]
    fn what_lies_outside_a_window_is_not_painted() {
        let mut drawing = Drawing::new(10.0, 10.0, "", "");
        let all = Frame { x: 0.0, y: 0.0, width: 10.0, height: 10.0 };
        let left = Frame { width: 5.0, ..all };
        drawing.window(left, |d| d.fill(all.path(), Ink(0, 0, 0)));
        let (info, pixels, _) = picture(&drawing, 254.0);
        let at = |x: usize, y: usize| pixels[y * info.line_size + 3 * x];
        assert_eq!(at(20, 50), 0);
        assert_eq!(at(80, 50), theme::PAPER.0);
    }

    #[test]
    fn text_leaves_ink_where_it_stands_and_nowhere_else() {
        let mut drawing = Drawing::new(40.0, 10.0, "", "");
        drawing.text(Text::new(at(38.0, 7.0), "Ra 95", 10.0, Ink(0, 0, 0)).anchored(Anchor::End));
        let (info, pixels, _) = picture(&drawing, 254.0);
        let inked = |from: usize, to: usize| {
            (0..100).any(|y| (from..to).any(|x| pixels[y * info.line_size + 3 * x] < 60))
        };
        assert!(inked(250, 380), "no text at the right");
        assert!(!inked(0, 200), "text where none should be");
    }

    #[test]
    fn a_picture_too_large_is_refused_with_its_size() {
        let refused = png(&Drawing::new(1000.0, 1000.0, "", ""), 2400.0);
        assert!(matches!(refused, Err(PngError::Size { width_px, .. }) if width_px > 9e4));
        assert!(png(&Drawing::new(10.0, 10.0, "", ""), f64::NAN).is_err());
    }
}
