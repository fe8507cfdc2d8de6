//! A drawing as a one-page PDF, and drawings painted onto the pages of a report.
//!
//! Text is written as text with the font embedded (only the glyphs in use), so it can be selected and searched.
//! The bytes depend on the drawing alone: no clock, no random names.

use super::{Anchor, Drawing, Frame, Ink, MM_PER_PT, Mark, Path, Pen, Step, Text, font, printable};
use krilla::color::rgb;
use krilla::geom::{PathBuilder, Point, Rect, Transform};
use krilla::metadata::Metadata;
use krilla::page::PageSettings;
use krilla::paint::{Fill, FillRule, LineCap, LineJoin, Stroke, StrokeDash};
use krilla::surface::Surface;
use krilla::text::{Font, GlyphId, KrillaGlyph};
use krilla::{Document, SerializeSettings};

/// Why a PDF could not be written.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum PdfError {
    /// The sheet has no area, or is larger than the format allows (14 400 pt, 5.08 m).
    #[error("expected a sheet between 1 mm and 5 m on each side for the PDF")]
    Sheet,
    /// The embedded font was refused.
    #[error("the embedded font could not be read")]
    Font,
    /// The writer gave up.
    #[error("the PDF could not be written: {0}")]
    Write(String),
}

/// The embedded fonts, ready for a document.
pub(crate) struct Fonts {
    regular: Font,
    bold: Font,
}

impl Fonts {
    pub(crate) fn load() -> Result<Fonts, PdfError> {
        let load = |bold| Font::new(font::file(bold).into(), 0).ok_or(PdfError::Font);
        Ok(Fonts { regular: load(false)?, bold: load(true)? })
    }
}

/// An empty document whose bytes will depend on its content alone.
pub(crate) fn new_document(title: &str, description: &str) -> Document {
    let settings = SerializeSettings { enable_tagging: false, ..SerializeSettings::default() };
    let mut document = Document::new_with(settings);
    document.set_metadata(
        Metadata::new()
            .title(printable(title))
            .description(printable(description))
            .creator("Whitesmith".to_owned())
            .language("en-GB".to_owned()),
    );
    document
}

/// The bytes of a finished document.
pub(crate) fn finished(document: Document) -> Result<Vec<u8>, PdfError> {
    document.finish().map_err(|error| PdfError::Write(format!("{error:?}")))
}

/// Settings of a page of a size in mm.
pub(crate) fn page_settings(width_mm: f64, height_mm: f64) -> Result<PageSettings, PdfError> {
    let side = |mm: f64| if (1.0..=5000.0).contains(&mm) { Ok(pt(mm)) } else { Err(PdfError::Sheet) };
    PageSettings::from_wh(side(width_mm)?, side(height_mm)?).ok_or(PdfError::Sheet)
}

/// A file of its own, the page as large as the sheet.
///
/// # Errors
/// When the sheet is no possible page, or the writer refuses.
pub fn document(drawing: &Drawing) -> Result<Vec<u8>, PdfError> {
    let fonts = Fonts::load()?;
    let mut document = new_document(&drawing.title, &drawing.description);
    let mut page = document.start_page_with(page_settings(drawing.width_mm, drawing.height_mm)?);
    let mut surface = page.surface();
    paint(&drawing.marks, &fonts, &mut surface);
    surface.finish();
    page.finish();
    finished(document)
}

/// mm to pt.
pub(crate) fn pt(mm: f64) -> f32 {
    (mm / MM_PER_PT) as f32
}

/// Paint marks on a surface whose origin is the sheet's upper left corner.
pub(crate) fn paint(marks: &[Mark], fonts: &Fonts, surface: &mut Surface<'_>) {
    for mark in marks {
        match mark {
            Mark::Shape { path, fill, pen } => {
                let Some(path) = outlines(path) else { continue };
                surface.set_fill(fill.map(inside));
                surface.set_stroke(pen.as_ref().map(stroke));
                if fill.is_some() || pen.is_some() {
                    surface.draw_path(&path);
                }
            }
            Mark::Text(text) => words(text, fonts, surface),
            Mark::Window { frame, marks } => {
                let Some(opening) = rectangle(*frame) else { continue };
                surface.push_clip_path(&opening, &FillRule::NonZero);
                paint(marks, fonts, surface);
                surface.pop();
            }
        }
    }
}

/// Paint marks moved right and down by mm.
pub(crate) fn paint_moved(marks: &[Mark], right: f64, down: f64, fonts: &Fonts, surface: &mut Surface<'_>) {
    surface.push_transform(&Transform::from_translate(pt(right), pt(down)));
    paint(marks, fonts, surface);
    surface.pop();
}

fn inside(ink: Ink) -> Fill {
    Fill { paint: rgb::Color::new(ink.0, ink.1, ink.2).into(), ..Fill::default() }
}

fn stroke(pen: &Pen) -> Stroke {
    let pieces: Vec<f32> = pen.pattern.pieces_mm().iter().map(|mm| pt(*mm)).collect();
    Stroke {
        paint: rgb::Color::new(pen.ink.0, pen.ink.1, pen.ink.2).into(),
        width: pt(pen.width_mm),
        line_cap: LineCap::Butt,
        line_join: LineJoin::Round,
        dash: (!pieces.is_empty()).then_some(StrokeDash { array: pieces, offset: 0.0 }),
        ..Stroke::default()
    }
}

fn outlines(path: &Path) -> Option<krilla::geom::Path> {
    if !path.is_drawable() {
        return None;
    }
    let mut builder = PathBuilder::new();
    for step in path.steps() {
        match step {
            Step::Move(p) => builder.move_to(pt(p.x), pt(p.y)),
            Step::Line(p) => builder.line_to(pt(p.x), pt(p.y)),
            Step::Curve(a, b, c) => {
                builder.cubic_to(pt(a.x), pt(a.y), pt(b.x), pt(b.y), pt(c.x), pt(c.y));
            }
            Step::Close => builder.close(),
        }
    }
    builder.finish()
}

fn rectangle(frame: Frame) -> Option<krilla::geom::Path> {
    let rect = Rect::from_xywh(pt(frame.x), pt(frame.y), pt(frame.width), pt(frame.height))?;
    let mut builder = PathBuilder::new();
    builder.push_rect(rect);
    builder.finish()
}

fn words(text: &Text, fonts: &Fonts, surface: &mut Surface<'_>) {
    let said = printable(&text.words);
    if said.trim().is_empty() || !text.place.is_paintable() {
        return;
    }
    let glyphs: Vec<KrillaGlyph> = font::set(&said, text.bold)
        .into_iter()
        .map(|set| KrillaGlyph {
            glyph_id: GlyphId::new(set.glyph),
            text_range: set.start..set.start + set.bytes,
            x_advance: set.advance_em as f32,
            x_offset: 0.0,
            y_offset: 0.0,
            y_advance: 0.0,
            location: None,
        })
        .collect();
    let size = text.size_pt as f32;
    let width: f32 = glyphs.iter().map(|g| g.x_advance * size).sum();
    let back = match text.anchor {
        Anchor::Start => 0.0,
        Anchor::Middle => width / 2.0,
        Anchor::End => width,
    };
    surface.set_fill(Some(inside(text.ink)));
    surface.set_stroke(None);
    let font = if text.bold { fonts.bold.clone() } else { fonts.regular.clone() };
    let (x, y) = (pt(text.place.x), pt(text.place.y));
    if text.upwards {
        surface.push_transform(&Transform::from_rotate_at(-90.0, x, y));
    }
    surface.draw_glyphs(Point::from_xy(x - back, y), &glyphs, font, &said, size, false);
    if text.upwards {
        surface.pop();
    }
}

#[cfg(test)]
mod tests {
    use super::super::at;
    use super::*;
    use proptest::prelude::*;

    fn labelled(words: &str) -> Drawing {
        let mut drawing = Drawing::new(80.0, 30.0, "A test", "");
        drawing.text(Text::new(at(2.0, 10.0), words, 8.0, Ink(0, 0, 0)));
        drawing.text(Text::new(at(40.0, 20.0), words, 8.0, Ink(0, 0, 0)).bold().upwards());
        drawing
    }

    #[test]
    fn the_words_can_be_read_back() {
        let bytes = document(&labelled("Duv +0.0012 at u′v′")).expect("a PDF");
        let file = lopdf::Document::load_mem(&bytes).expect("a PDF that parses");
        let said = file.extract_text(&[1]).expect("text");
        assert!(said.contains("Duv +0.0012 at u′v′"), "{said}");
    }

    #[test]
    fn the_same_drawing_gives_the_same_bytes() {
        assert_eq!(document(&labelled("once")), document(&labelled("once")));
    }

    #[test]
    fn a_sheet_without_area_is_refused() {
        let mut drawing = labelled("x");
        drawing.width_mm = 0.0;
        assert_eq!(document(&drawing), Err(PdfError::Sheet));
        drawing.width_mm = f64::NAN;
        assert_eq!(document(&drawing), Err(PdfError::Sheet));
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(64))]
        #[test]
        fn any_words_make_a_pdf_that_parses(words in any::<String>()) {
            let bytes = document(&labelled(&words)).expect("a PDF");
            prop_assert!(lopdf::Document::load_mem(&bytes).is_ok());
        }
    }
}
