//! Text at a point, and numbers as words.

use egui::text::{LayoutJob, TextFormat, TextWrapping};
use egui::{Align2, Color32, FontId, Painter, Pos2, Rect, Vec2};

/// Writes text with its anchor at a point; returns where it stands.
pub(in crate::window) fn write(
    painter: &Painter,
    at: Pos2,
    anchor: Align2,
    text: impl ToString,
    font: FontId,
    colour: Color32,
) -> Rect {
    painter.text(at, anchor, text, font, colour)
}

/// The size text would take.
pub(in crate::window) fn measure(painter: &Painter, text: &str, font: FontId) -> Vec2 {
    painter.layout_no_wrap(text.to_owned(), font, Color32::PLACEHOLDER).size()
}

/// Writes text that is cut with an ellipsis where the room ends.
pub(in crate::window) fn elided(
    painter: &Painter,
    at: Pos2,
    width: f32,
    text: &str,
    font: FontId,
    colour: Color32,
) -> Rect {
    let mut job = LayoutJob::single_section(text.to_owned(), TextFormat::simple(font, colour));
    job.wrap = TextWrapping::truncate_at_width(width.max(8.0));
    let galley = painter.layout_job(job);
    let rect = Rect::from_min_size(at, galley.size());
    painter.galley(at, galley, colour);
    rect
}

/// Pieces of one line in different type, such as a value and its unit.
#[derive(Default)]
pub(in crate::window) struct Words {
    job: LayoutJob,
}

impl Words {
    /// Adds a piece.
    pub(in crate::window) fn with(mut self, text: &str, font: FontId, colour: Color32) -> Self {
        self.job.append(
            text,
            0.0,
            TextFormat { valign: egui::Align::BOTTOM, ..TextFormat::simple(font, colour) },
        );
        self
    }

    /// Writes the line with its anchor at a point; returns where it stands.
    pub(in crate::window) fn write(self, painter: &Painter, at: Pos2, anchor: Align2) -> Rect {
        let galley = painter.layout_job(self.job);
        let rect = anchor.anchor_size(at, galley.size());
        painter.galley(rect.min, galley, Color32::PLACEHOLDER);
        rect
    }
}

/// A number with a fixed number of decimals, a true minus sign, and thin spaces between thousands.
pub(in crate::window) fn fixed(value: f64, decimals: usize) -> String {
    if !value.is_finite() {
        return "none".to_owned();
    }
    let text = format!("{:.decimals$}", value.abs());
    let negative = value < 0.0 && text.chars().any(|c| c.is_ascii_digit() && c != '0');
    let (whole, fraction) = text.split_once('.').map_or((text.as_str(), None), |(w, f)| (w, Some(f)));
    let mut out = String::new();
    if negative {
        out.push('\u{2212}');
    }
    let group = whole.len() > 4;
    for (k, digit) in whole.chars().enumerate() {
        if group && k > 0 && (whole.len() - k) % 3 == 0 {
            out.push('\u{2009}');
        }
        out.push(digit);
    }
    if let Some(fraction) = fraction {
        out.push('.');
        out.push_str(fraction);
    }
    out
}

/// Like [`fixed`], with a plus sign on positive numbers.
pub(in crate::window) fn signed(value: f64, decimals: usize) -> String {
    let text = fixed(value, decimals);
    if value > 0.0 && text.chars().any(|c| c.is_ascii_digit() && c != '0') {
        format!("+{text}")
    } else {
        text
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_keep_their_sign_and_lose_it_when_they_round_to_nothing() {
        assert_eq!(fixed(-0.00004, 3), "0.000");
        assert_eq!(fixed(-12.345, 1), "\u{2212}12.3");
        assert_eq!(signed(0.0005, 4), "+0.0005");
        assert_eq!(signed(0.00001, 4), "0.0000");
        assert_eq!(fixed(12_345.0, 0), "12\u{2009}345");
        assert_eq!(fixed(3020.0, 0), "3020");
        assert_eq!(fixed(f64::NAN, 2), "none");
    }
}
