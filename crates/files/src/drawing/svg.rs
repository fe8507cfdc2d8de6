//! A drawing as SVG text.
//!
//! Text stays text (selectable, editable); every word is escaped; nothing refers outside the file. Coordinates
//! are mm in the view box, so the file prints at its true size.

use super::{Anchor, Drawing, MM_PER_PT, Mark, Path, Pen, Place, Step, Text, printable};
use std::fmt::Write;

/// The name space of SVG, the only address such a file holds.
const NAME_SPACE: &str = "http://www.w3.org/2000/svg";

/// A file of its own.
pub fn document(drawing: &Drawing) -> String {
    let mut out = String::from("<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n");
    element(drawing, &format!(" xmlns=\"{NAME_SPACE}\""), "w", &mut out);
    out
}

/// An element to stand inside an HTML page. `key` keeps its inner names apart from those of other drawings on the
/// page; only its letters and digits are used.
pub fn inline(drawing: &Drawing, key: &str) -> String {
    let key: String = key.chars().filter(char::is_ascii_alphanumeric).collect();
    let mut out = String::new();
    element(drawing, "", &key, &mut out);
    out
}

/// Markup characters replaced, controls left out: fit for element text and for quoted attributes.
pub fn escaped(words: &str) -> String {
    let mut out = String::with_capacity(words.len());
    for c in printable(words).chars() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\'' => out.push_str("&#39;"),
            c => out.push(c),
        }
    }
    out
}

/// A length in mm with at most three decimals (a micrometre on paper).
fn mm(value: f64) -> String {
    let text = format!("{value:.3}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    if text == "-0" { "0".to_owned() } else { text.to_owned() }
}

/// Writing to a `String` cannot fail.
macro_rules! put {
    ($out:expr, $($rest:tt)*) => { let _ = write!($out, $($rest)*); };
}

fn element(drawing: &Drawing, name_space: &str, key: &str, out: &mut String) {
    let (width, height) = (mm(drawing.width_mm), mm(drawing.height_mm));
    put!(
        out,
        "<svg{name_space} role=\"img\" width=\"{width}mm\" height=\"{height}mm\" viewBox=\"0 0 {width} {height}\" \
         font-family=\"'Noto Sans', system-ui, sans-serif\" font-variant-numeric=\"tabular-nums\">\n"
    );
    put!(out, "<title>{}</title>\n", escaped(&drawing.title));
    put!(out, "<desc>{}</desc>\n", escaped(&drawing.description));
    let mut windows = 0;
    marks(&drawing.marks, key, &mut windows, out);
    out.push_str("</svg>\n");
}

fn marks(list: &[Mark], key: &str, windows: &mut usize, out: &mut String) {
    for mark in list {
        match mark {
            Mark::Shape { path, fill, pen } => {
                if !path.is_drawable() {
                    continue;
                }
                put!(out, "<path d=\"{}\"", path_data(path));
                match fill {
                    Some(ink) => {
                        put!(out, " fill=\"{}\"", hex(*ink));
                    }
                    None => out.push_str(" fill=\"none\""),
                }
                if let Some(pen) = pen {
                    stroke(pen, out);
                }
                out.push_str("/>\n");
            }
            Mark::Text(text) => words(text, out),
            Mark::Window { frame, marks: inner } => {
                let name = format!("{key}-{windows}");
                *windows += 1;
                put!(
                    out,
                    "<clipPath id=\"{name}\"><rect x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\"/></clipPath>\n\
                     <g clip-path=\"url(#{name})\">\n",
                    mm(frame.x),
                    mm(frame.y),
                    mm(frame.width.max(0.0)),
                    mm(frame.height.max(0.0))
                );
                marks(inner, key, windows, out);
                out.push_str("</g>\n");
            }
        }
    }
}

fn hex(ink: super::Ink) -> String {
    format!("#{:02x}{:02x}{:02x}", ink.0, ink.1, ink.2)
}

fn stroke(pen: &Pen, out: &mut String) {
    put!(out, " stroke=\"{}\" stroke-width=\"{}\" stroke-linejoin=\"round\"", hex(pen.ink), mm(pen.width_mm));
    let pieces = pen.pattern.pieces_mm();
    if !pieces.is_empty() {
        let list: Vec<String> = pieces.iter().map(|p| mm(*p)).collect();
        put!(out, " stroke-dasharray=\"{}\"", list.join(" "));
    }
}

fn path_data(path: &Path) -> String {
    let mut out = String::new();
    let pair = |p: &Place| format!("{} {}", mm(p.x), mm(p.y));
    for step in path.steps() {
        if !out.is_empty() {
            out.push(' ');
        }
        match step {
            Step::Move(p) => {
                put!(out, "M{}", pair(p));
            }
            Step::Line(p) => {
                put!(out, "L{}", pair(p));
            }
            Step::Curve(a, b, c) => {
                put!(out, "C{} {} {}", pair(a), pair(b), pair(c));
            }
            Step::Close => out.push('Z'),
        }
    }
    out
}

fn words(text: &Text, out: &mut String) {
    if !(text.place.is_paintable() && text.size_pt.is_finite()) {
        return;
    }
    let (x, y) = (mm(text.place.x), mm(text.place.y));
    put!(
        out,
        "<text x=\"{x}\" y=\"{y}\" font-size=\"{}\" fill=\"{}\"",
        mm(text.size_pt * MM_PER_PT),
        hex(text.ink)
    );
    match text.anchor {
        Anchor::Start => {}
        Anchor::Middle => out.push_str(" text-anchor=\"middle\""),
        Anchor::End => out.push_str(" text-anchor=\"end\""),
    }
    if text.bold {
        out.push_str(" font-weight=\"700\"");
    }
    if text.upwards {
        put!(out, " transform=\"rotate(-90 {x} {y})\"");
    }
    put!(out, ">{}</text>\n", escaped(&text.words));
}

#[cfg(test)]
mod tests {
    use super::super::{Frame, Ink, at};
    use super::*;
    use proptest::prelude::*;
    use quick_xml::{Reader, events::Event};

    /// Reads to the end and returns (names of elements, all text).
    #[track_caller]
    fn read_whole(svg: &str) -> (Vec<String>, String) {
        let mut reader = Reader::from_str(svg);
        reader.config_mut().check_end_names = true;
        let (mut names, mut text) = (Vec::new(), String::new());
        loop {
            match reader.read_event().expect("well-formed") {
                Event::Start(e) | Event::Empty(e) => {
                    names.push(e.name().as_ref().to_owned());
                    for attribute in e.attributes() {
                        attribute.expect("a quoted attribute");
                    }
                }
                Event::Text(t) => text.push_str(&t),
                Event::GeneralRef(r) => {
                    let name: &str = &r;
                    text.push_str(match name {
                        "lt" => "<",
                        "gt" => ">",
                        "amp" => "&",
                        "quot" => "\"",
                        "#39" => "'",
                        other => panic!("an entity of its own: {other}"),
                    });
                }
                Event::Eof => return (names, text),
                _ => {}
            }
        }
    }

    fn labelled(words: &str) -> Drawing {
        let mut drawing = Drawing::new(30.0, 20.0, words, words);
        drawing.text(Text::new(at(2.0, 10.0), words, 8.0, Ink(0, 0, 0)));
        drawing
    }

    #[test]
    fn hostile_words_stay_words() {
        let hostile = "</text><script>alert('1')</script> \" onload=\"x &lol; <!ENTITY a>";
        let (names, text) = read_whole(&document(&labelled(hostile)));
        assert_eq!(names, ["svg", "title", "desc", "text"]);
        assert!(text.contains(hostile));
    }

    #[test]
    fn shapes_that_are_not_finite_are_left_out() {
        let mut drawing = Drawing::new(10.0, 10.0, "", "");
        drawing.stroke(Path::line(at(f64::NAN, 0.0), at(1.0, 1.0)), Pen::solid(Ink(0, 0, 0), 0.2));
        drawing.stroke(Path::line(at(0.0, 0.0), at(1.0, 1.0)), Pen::solid(Ink(0, 0, 0), 0.2));
        let svg = document(&drawing);
        assert_eq!(svg.matches("<path").count(), 1);
        assert!(!svg.contains("NaN") && !svg.contains("inf"));
    }

    #[test]
    fn windows_of_two_drawings_on_a_page_do_not_share_names() {
        let mut drawing = Drawing::new(10.0, 10.0, "", "");
        let frame = Frame { x: 1.0, y: 1.0, width: 5.0, height: 5.0 };
        drawing.window(frame, |d| d.fill(frame.path(), Ink(1, 2, 3)));
        assert!(inline(&drawing, "a").contains("id=\"a-0\""));
        assert!(inline(&drawing, "b\"><x").contains("id=\"bx-0\""));
        assert!(!inline(&drawing, "a").contains("http"));
    }

    proptest! {
        #[test]
        fn any_words_make_a_well_formed_file_that_says_them(words in any::<String>()) {
            let (names, text) = read_whole(&document(&labelled(&words)));
            prop_assert_eq!(names.len(), 4);
            prop_assert!(text.contains(&printable(&words)));
        }
    }
}
