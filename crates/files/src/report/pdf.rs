//! The report as an A4 PDF: selectable text, page numbers, bookmarks, tables that go on over pages.

use super::layout::{self, PAGE_HEIGHT, PAGE_WIDTH};
use super::model::ReportModel;
use crate::drawing::pdf::{Fonts, PdfError, finished, new_document, page_settings, paint_moved, pt};
use krilla::destination::XyzDestination;
use krilla::geom::Point;
use krilla::outline::{Outline, OutlineNode};

/// The bytes of the file; the same model gives the same bytes.
///
/// # Errors
/// When the writer refuses.
pub fn pages(model: &ReportModel) -> Result<Vec<u8>, PdfError> {
    let set = layout::pages(model);
    let fonts = Fonts::load()?;
    let mut document = new_document(&model.title, &model.white);
    for placed in &set.pages {
        let mut page = document.start_page_with(page_settings(PAGE_WIDTH, PAGE_HEIGHT)?);
        let mut surface = page.surface();
        for part in placed {
            paint_moved(&part.marks, part.right, part.down, &fonts, &mut surface);
        }
        surface.finish();
        page.finish();
    }
    let mut outline = Outline::new();
    for mark in &set.landmarks {
        let target = XyzDestination::new(mark.page, Point::from_xy(0.0, pt(mark.y)));
        outline.push_child(OutlineNode::new(mark.words.clone(), target));
    }
    document.set_outline(outline);
    finished(document)
}
