//! The embedded typeface: widths, glyphs, outlines.
//!
//! Noto Sans, regular and bold, under the Apache License 2.0 (the licence entry of the font files themselves), as
//! carried by the `notosans` crate. Text is set one character after another without kerning, so that a width
//! measured here is exactly the width painted by every back end that embeds the font.

use skrifa::outline::{DrawSettings, OutlinePen};
use skrifa::prelude::{LocationRef, Size};
use skrifa::{FontRef, GlyphId, MetadataProvider};
use std::sync::LazyLock;

/// Distance from the baseline up to the top of the capitals, in ems (0.714 in both weights).
pub const CAPITAL_HEIGHT_EM: f64 = 0.714;

/// The font file of a weight.
pub fn file(bold: bool) -> &'static [u8] {
    if bold { notosans::BOLD_TTF } else { notosans::REGULAR_TTF }
}

/// One weight, parsed once.
struct Face {
    font: FontRef<'static>,
    units_per_em: f64,
}

impl Face {
    fn parse(bold: bool) -> Face {
        let font = FontRef::new(file(bold)).expect("the embedded font is well formed, as the tests show");
        let units_per_em = f64::from(font.metrics(Size::unscaled(), LocationRef::default()).units_per_em);
        Face { font, units_per_em }
    }
}

static REGULAR: LazyLock<Face> = LazyLock::new(|| Face::parse(false));
static BOLD: LazyLock<Face> = LazyLock::new(|| Face::parse(true));

fn face(bold: bool) -> &'static Face {
    if bold { &BOLD } else { &REGULAR }
}

/// A character on its line.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Set {
    /// Index of the glyph in the font; 0 is the box shown for what the font lacks.
    pub(crate) glyph: u32,
    /// Byte offset of the character in the text.
    pub(crate) start: usize,
    /// Byte length of the character.
    pub(crate) bytes: usize,
    /// Width, ems.
    pub(crate) advance_em: f64,
}

/// The glyphs of a text, one for each character.
pub(crate) fn set(words: &str, bold: bool) -> Vec<Set> {
    let face = face(bold);
    let (map, widths) =
        (face.font.charmap(), face.font.glyph_metrics(Size::unscaled(), LocationRef::default()));
    words
        .char_indices()
        .map(|(start, c)| {
            let glyph = map.map(c).or_else(|| map.map(stand_in(c)?)).unwrap_or(GlyphId::NOTDEF);
            let advance = f64::from(widths.advance_width(glyph).unwrap_or(0.0)) / face.units_per_em;
            Set { glyph: glyph.to_u32(), start, bytes: c.len_utf8(), advance_em: advance }
        })
        .collect()
}

/// A character the font has, shown for one it lacks: lowered figures stand on the line. What the text says when it
/// is copied stays as it was.
fn stand_in(c: char) -> Option<char> {
    match c {
        '₀'..='₉' => char::from_digit(u32::from(c) - u32::from('₀'), 10),
        '\u{2011}' => Some('-'),
        '\u{2007}' | '\u{202f}' => Some(' '),
        _ => None,
    }
}

/// Width of a text in pt at a size in pt.
pub fn width_pt(words: &str, size_pt: f64, bold: bool) -> f64 {
    set(words, bold).iter().map(|s| s.advance_em).sum::<f64>() * size_pt
}

/// True when the embedded font shows this character as itself.
pub fn has(c: char) -> bool {
    face(false).font.charmap().map(c).is_some()
}

/// Draw a glyph's outline, in ems with y upwards.
pub(crate) fn outline(glyph: u32, bold: bool, pen: &mut impl OutlinePen) {
    let face = face(bold);
    if let Some(outline) = face.font.outline_glyphs().get(GlyphId::new(glyph)) {
        let whole = DrawSettings::unhinted(Size::new(1.0), LocationRef::default());
        // A glyph that cannot be drawn leaves its space empty; the font is embedded, so this is not expected.
        let _ = outline.draw(whole, pen);
    }
}

/// Break a text into lines no wider than `width_pt`, at spaces where it can, inside a word where it must.
pub fn wrap(words: &str, size_pt: f64, bold: bool, width_pt: f64) -> Vec<String> {
    let mut lines = Vec::new();
    for paragraph in words.split('\n') {
        let (mut line, mut line_width) = (String::new(), 0.0);
        for word in paragraph.split(' ').filter(|w| !w.is_empty()) {
            let space = if line.is_empty() { 0.0 } else { self::width_pt(" ", size_pt, bold) };
            let word_width = self::width_pt(word, size_pt, bold);
            if line_width + space + word_width <= width_pt {
                if !line.is_empty() {
                    line.push(' ');
                }
                line.push_str(word);
                line_width += space + word_width;
                continue;
            }
            if !line.is_empty() {
                lines.push(std::mem::take(&mut line));
                line_width = 0.0;
            }
            for set in set(word, bold) {
                let advance = set.advance_em * size_pt;
                if line_width + advance > width_pt && !line.is_empty() {
                    lines.push(std::mem::take(&mut line));
                    line_width = 0.0;
                }
                line.push_str(&word[set.start..set.start + set.bytes]);
                line_width += advance;
            }
        }
        lines.push(line);
    }
    lines
}

/// The text cut to a width in pt, with an ellipsis when something was cut.
pub fn shortened(words: &str, size_pt: f64, bold: bool, width_pt: f64) -> String {
    if self::width_pt(words, size_pt, bold) <= width_pt {
        return words.to_owned();
    }
    let mut room = width_pt - self::width_pt("…", size_pt, bold);
    let mut end = 0;
    for set in set(words, bold) {
        room -= set.advance_em * size_pt;
        if room < 0.0 {
            break;
        }
        end = set.start + set.bytes;
    }
    format!("{}…", words[..end].trim_end())
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn the_font_has_every_sign_the_report_uses() {
        for c in "u′v′ΔλπηΦµ°²³×·≥≤±−–—“”’…½αβσ∞√éüßøåżКΩ".chars()
        {
            assert!(has(c), "{c} is missing");
        }
    }

    #[test]
    fn lowered_figures_are_shown_as_figures() {
        assert_eq!(set("c₂", false)[1].glyph, set("c2", false)[1].glyph);
    }

    #[test]
    fn figures_share_one_width_so_columns_of_numbers_line_up() {
        for bold in [false, true] {
            let zero = width_pt("0", 10.0, bold);
            for digit in "123456789".chars() {
                assert!((width_pt(&digit.to_string(), 10.0, bold) - zero).abs() < 1e-9);
            }
        }
    }

    #[test]
    fn a_long_word_is_broken_rather_than_run_over_the_edge() {
        let lines = wrap(&"a".repeat(200), 8.0, false, 60.0);
        assert!(lines.len() > 5);
        assert_eq!(lines.concat(), "a".repeat(200));
    }

    proptest! {
        #[test]
        fn wrapped_lines_fit_and_keep_every_word(words in "[a-zA-Z0-9é′ ]{0,200}", width in 40.0..300.0f64) {
            let lines = wrap(&words, 9.0, false, width);
            for line in &lines {
                prop_assert!(width_pt(line, 9.0, false) <= width + 1e-9);
            }
            let joined: String = lines.concat().split_whitespace().collect();
            let whole: String = words.split_whitespace().collect();
            prop_assert_eq!(joined, whole);
        }

        #[test]
        fn shortened_text_fits(words in any::<String>(), width in 12.0..200.0f64) {
            prop_assert!(width_pt(&shortened(&words, 8.0, true, width), 8.0, true) <= width + 1e-9);
        }
    }
}
