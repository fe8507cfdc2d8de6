//! Vector figures: one small model, three ways out.
//!
//! A [`Drawing`] is a sheet of paper measured in millimetres, y downwards, holding paths, text and clipped groups.
//! [`svg::document`] writes it as SVG text, [`pdf::document`] as a one-page PDF whose text can be selected, and
//! [`raster::png`] as a picture of any resolution. [`figures`] draws every picture of the report and of the plot
//! export; none of them relies on colour alone: lines carry dash patterns and areas carry hatching, both from
//! [`Pattern`].
//!
//! Out of scope: interaction, layout of running text (see [`crate::report`]), pictures inside pictures.

pub mod figures;
pub mod font;
pub mod pdf;
pub mod raster;
pub mod svg;
pub mod theme;

mod axis;

use serde::{Deserialize, Serialize};

/// Millimetres in a point of 1/72 inch.
pub const MM_PER_PT: f64 = 25.4 / 72.0;

/// A place on the sheet: mm from its upper left corner, y downwards.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Place {
    /// Rightwards, mm.
    pub x: f64,
    /// Downwards, mm.
    pub y: f64,
}

impl Place {
    /// True when both coordinates are numbers within a kilometre: what every back end can reckon with.
    pub fn is_paintable(self) -> bool {
        self.x.abs() <= 1e6 && self.y.abs() <= 1e6
    }
}

/// A place from its two coordinates in mm.
pub const fn at(x: f64, y: f64) -> Place {
    Place { x, y }
}

/// An upright rectangle, mm.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Frame {
    /// Left edge.
    pub x: f64,
    /// Upper edge.
    pub y: f64,
    /// Width, not negative.
    pub width: f64,
    /// Height, not negative.
    pub height: f64,
}

impl Frame {
    /// The right edge.
    pub fn right(self) -> f64 {
        self.x + self.width
    }

    /// The lower edge.
    pub fn bottom(self) -> f64 {
        self.y + self.height
    }

    /// The outline as a path.
    pub fn path(self) -> Path {
        Path::new()
            .move_to(at(self.x, self.y))
            .line_to(at(self.right(), self.y))
            .line_to(at(self.right(), self.bottom()))
            .line_to(at(self.x, self.bottom()))
            .close()
    }
}

/// An opaque sRGB colour.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
pub struct Ink(pub u8, pub u8, pub u8);

impl Ink {
    /// This colour thinned towards white; `strength` 1 leaves it, 0 is white.
    pub fn thinned(self, strength: f64) -> Ink {
        let strength = strength.clamp(0.0, 1.0);
        let mix = |channel: u8| (255.0 - (255.0 - f64::from(channel)) * strength).round() as u8;
        Ink(mix(self.0), mix(self.1), mix(self.2))
    }

    /// Luma on 0–255 after Rec. 601 weights: what a grey printer makes of it.
    pub fn grey(self) -> f64 {
        0.299 * f64::from(self.0) + 0.587 * f64::from(self.1) + 0.114 * f64::from(self.2)
    }

    /// This colour darkened until it stands out on paper even in grey (luma at most 125).
    pub fn legible(self) -> Ink {
        const DARK_ENOUGH: f64 = 125.0;
        let grey = self.grey();
        if grey <= DARK_ENOUGH {
            return self;
        }
        let factor = DARK_ENOUGH / grey;
        let dim = |channel: u8| (f64::from(channel) * factor).floor() as u8;
        Ink(dim(self.0), dim(self.1), dim(self.2))
    }
}

/// One step of a path.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Step {
    /// Start a new outline here.
    Move(Place),
    /// A straight line to here.
    Line(Place),
    /// A cubic curve: two control points and the end.
    Curve(Place, Place, Place),
    /// Back to where the outline began.
    Close,
}

/// Outlines made of steps.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Path {
    steps: Vec<Step>,
}

impl Path {
    /// An empty path.
    pub fn new() -> Path {
        Path::default()
    }

    /// The steps in order.
    pub fn steps(&self) -> &[Step] {
        &self.steps
    }

    /// With a new outline started at `place`.
    #[must_use]
    pub fn move_to(mut self, place: Place) -> Path {
        self.steps.push(Step::Move(place));
        self
    }

    /// With a straight line to `place`.
    #[must_use]
    pub fn line_to(mut self, place: Place) -> Path {
        self.steps.push(Step::Line(place));
        self
    }

    /// With a cubic curve to `end`.
    #[must_use]
    pub fn curve_to(mut self, first: Place, second: Place, end: Place) -> Path {
        self.steps.push(Step::Curve(first, second, end));
        self
    }

    /// With the outline closed.
    #[must_use]
    pub fn close(mut self) -> Path {
        self.steps.push(Step::Close);
        self
    }

    /// One straight line.
    pub fn line(from: Place, to: Place) -> Path {
        Path::new().move_to(from).line_to(to)
    }

    /// Straight lines through every place that can be painted; another breaks the line.
    pub fn through(places: impl IntoIterator<Item = Place>) -> Path {
        let mut path = Path::new();
        let mut broken = true;
        for place in places {
            if !place.is_paintable() {
                broken = true;
                continue;
            }
            path = if broken { path.move_to(place) } else { path.line_to(place) };
            broken = false;
        }
        path
    }

    /// A smooth closed curve through every place (uniform Catmull–Rom); empty for fewer than three.
    pub fn smooth_ring(places: &[Place]) -> Path {
        let n = places.len();
        if n < 3 {
            return Path::new();
        }
        let mut path = Path::new().move_to(places[0]);
        for i in 0..n {
            let (before, from) = (places[(i + n - 1) % n], places[i]);
            let (to, after) = (places[(i + 1) % n], places[(i + 2) % n]);
            let first = at(from.x + (to.x - before.x) / 6.0, from.y + (to.y - before.y) / 6.0);
            let second = at(to.x - (after.x - from.x) / 6.0, to.y - (after.y - from.y) / 6.0);
            path = path.curve_to(first, second, to);
        }
        path.close()
    }

    /// A circle as four cubic curves (radial error below 0.03 % of the radius).
    pub fn circle(centre: Place, radius: f64) -> Path {
        Path::ellipse(centre, radius, radius)
    }

    /// An upright ellipse as four cubic curves.
    pub fn ellipse(centre: Place, across: f64, down: f64) -> Path {
        // 4/3·(√2 − 1): the handle length that puts the curve's middle on the circle.
        let (hx, hy) = (0.552_284_749_830_793_6 * across, 0.552_284_749_830_793_6 * down);
        let Place { x, y } = centre;
        Path::new()
            .move_to(at(x + across, y))
            .curve_to(at(x + across, y + hy), at(x + hx, y + down), at(x, y + down))
            .curve_to(at(x - hx, y + down), at(x - across, y + hy), at(x - across, y))
            .curve_to(at(x - across, y - hy), at(x - hx, y - down), at(x, y - down))
            .curve_to(at(x + hx, y - down), at(x + across, y - hy), at(x + across, y))
            .close()
    }

    /// True when every place can be painted.
    pub fn is_paintable(&self) -> bool {
        let finite = |p: &Place| p.is_paintable();
        self.steps.iter().all(|step| match step {
            Step::Move(p) | Step::Line(p) => finite(p),
            Step::Curve(a, b, c) => finite(a) && finite(b) && finite(c),
            Step::Close => true,
        })
    }

    /// True when the back ends can paint it: it starts with a move, draws something, and every place can be painted.
    pub fn is_drawable(&self) -> bool {
        matches!(self.steps.first(), Some(Step::Move(_))) && self.steps.len() > 1 && self.is_paintable()
    }
}

/// How a line is broken, so that lines can be told apart in grey.
///
/// Emitters take these in file order, the same in the window, on paper and in every export.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Pattern {
    /// Unbroken.
    #[default]
    Solid,
    /// Long dashes.
    Dashed,
    /// Fine dots.
    Dotted,
    /// Dash, dot.
    DashDot,
    /// Dash, dot, dot.
    DashDotDot,
    /// Short dashes.
    ShortDashed,
    /// Very long dashes.
    LongDashed,
    /// Pairs of dots.
    Paired,
}

impl Pattern {
    /// Every pattern, in the order emitters take them.
    pub const ALL: [Pattern; 8] = [
        Pattern::Solid,
        Pattern::Dashed,
        Pattern::DashDot,
        Pattern::ShortDashed,
        Pattern::DashDotDot,
        Pattern::LongDashed,
        Pattern::Dotted,
        Pattern::Paired,
    ];

    /// The pattern of the emitter at `index`; after the eighth they come round again.
    pub const fn of_index(index: usize) -> Pattern {
        Pattern::ALL[index % Pattern::ALL.len()]
    }

    /// Lengths of drawn and left-out pieces, mm; empty when unbroken.
    pub const fn pieces_mm(self) -> &'static [f64] {
        match self {
            Pattern::Solid => &[],
            Pattern::Dashed => &[2.2, 1.1],
            Pattern::Dotted => &[0.35, 0.85],
            Pattern::DashDot => &[2.4, 0.8, 0.4, 0.8],
            Pattern::DashDotDot => &[2.4, 0.7, 0.4, 0.7, 0.4, 0.7],
            Pattern::ShortDashed => &[1.1, 0.7],
            Pattern::LongDashed => &[4.2, 1.2],
            Pattern::Paired => &[0.4, 0.5, 0.4, 1.3],
        }
    }
}

/// A line's look.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Pen {
    /// Colour.
    pub ink: Ink,
    /// Width, mm.
    pub width_mm: f64,
    /// How it is broken.
    pub pattern: Pattern,
}

impl Pen {
    /// An unbroken line.
    pub const fn solid(ink: Ink, width_mm: f64) -> Pen {
        Pen { ink, width_mm, pattern: Pattern::Solid }
    }

    /// A line with a pattern.
    pub const fn patterned(ink: Ink, width_mm: f64, pattern: Pattern) -> Pen {
        Pen { ink, width_mm, pattern }
    }
}

/// Which side of its place a text stands on.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default)]
pub enum Anchor {
    /// The text begins at the place.
    #[default]
    Start,
    /// The text is centred on the place.
    Middle,
    /// The text ends at the place.
    End,
}

/// A line of text.
#[derive(Debug, Clone, PartialEq)]
pub struct Text {
    /// The place of its baseline.
    pub place: Place,
    /// What it says. Control characters are left out when painted.
    pub words: String,
    /// Size, pt.
    pub size_pt: f64,
    /// Bold instead of regular.
    pub bold: bool,
    /// Which side of the place it stands on.
    pub anchor: Anchor,
    /// Colour.
    pub ink: Ink,
    /// True when it reads upwards (turned a quarter anticlockwise).
    pub upwards: bool,
}

impl Text {
    /// Regular text beginning at `place`.
    pub fn new(place: Place, words: impl Into<String>, size_pt: f64, ink: Ink) -> Text {
        Text { place, words: words.into(), size_pt, bold: false, anchor: Anchor::Start, ink, upwards: false }
    }

    /// In bold.
    #[must_use]
    pub fn bold(self) -> Text {
        Text { bold: true, ..self }
    }

    /// Anchored otherwise.
    #[must_use]
    pub fn anchored(self, anchor: Anchor) -> Text {
        Text { anchor, ..self }
    }

    /// Reading upwards.
    #[must_use]
    pub fn upwards(self) -> Text {
        Text { upwards: true, ..self }
    }

    /// Its width on paper, mm.
    pub fn width_mm(&self) -> f64 {
        font::width_pt(&self.words, self.size_pt, self.bold) * MM_PER_PT
    }
}

/// One thing on the sheet.
#[derive(Debug, Clone, PartialEq)]
pub enum Mark {
    /// A filled and then stroked path.
    Shape {
        /// The outlines.
        path: Path,
        /// The colour inside.
        fill: Option<Ink>,
        /// The look of the outline.
        pen: Option<Pen>,
    },
    /// A line of text.
    Text(Text),
    /// Marks of which only what lies inside the frame is seen.
    Window {
        /// What can be seen through.
        frame: Frame,
        /// The marks behind it.
        marks: Vec<Mark>,
    },
}

/// A sheet with marks on it.
#[derive(Debug, Clone, PartialEq)]
pub struct Drawing {
    /// Width, mm.
    pub width_mm: f64,
    /// Height, mm.
    pub height_mm: f64,
    /// A title for readers that cannot see it.
    pub title: String,
    /// A sentence saying what it shows, for readers that cannot see it.
    pub description: String,
    /// Painted in order.
    pub marks: Vec<Mark>,
}

impl Drawing {
    /// An empty sheet.
    pub fn new(
        width_mm: f64,
        height_mm: f64,
        title: impl Into<String>,
        description: impl Into<String>,
    ) -> Drawing {
        Drawing {
            width_mm,
            height_mm,
            title: title.into(),
            description: description.into(),
            marks: Vec::new(),
        }
    }

    /// Add a stroked path.
    pub fn stroke(&mut self, path: Path, pen: Pen) {
        self.marks.push(Mark::Shape { path, fill: None, pen: Some(pen) });
    }

    /// Add a filled path.
    pub fn fill(&mut self, path: Path, ink: Ink) {
        self.marks.push(Mark::Shape { path, fill: Some(ink), pen: None });
    }

    /// Add a path both filled and stroked.
    pub fn shape(&mut self, path: Path, ink: Ink, pen: Pen) {
        self.marks.push(Mark::Shape { path, fill: Some(ink), pen: Some(pen) });
    }

    /// Add a text.
    pub fn text(&mut self, text: Text) {
        self.marks.push(Mark::Text(text));
    }

    /// Add what `paint` draws, seen only inside `frame`.
    pub fn window(&mut self, frame: Frame, paint: impl FnOnce(&mut Drawing)) {
        let mut behind = Drawing::new(self.width_mm, self.height_mm, "", "");
        paint(&mut behind);
        self.marks.push(Mark::Window { frame, marks: behind.marks });
    }

    /// Fill a rectangle with a thinned colour and a hatching that tells it apart in grey.
    pub fn hatched(&mut self, frame: Frame, ink: Ink, pattern: Pattern) {
        self.fill(frame.path(), ink.thinned(0.30));
        let pen = Pen::solid(ink.legible().thinned(0.75), 0.16);
        let lines = hatch_lines(frame, pattern);
        if lines.is_drawable() {
            self.window(frame, |behind| behind.stroke(lines, pen));
        }
        self.stroke(frame.path(), Pen::solid(ink.legible(), 0.25));
    }
}

/// Hatching of a rectangle: direction and spacing follow the pattern.
fn hatch_lines(frame: Frame, pattern: Pattern) -> Path {
    /// More lines than this would be a solid area anyway.
    const MOST_LINES: f64 = 4000.0;
    // (slope: run over rise; spacing, mm); two slopes make a lattice.
    let (slopes, spacing): (&[f64], f64) = match pattern {
        Pattern::Solid => (&[], 1.0),
        Pattern::Dashed => (&[1.0], 1.3),
        Pattern::DashDot => (&[-1.0], 1.3),
        Pattern::ShortDashed => (&[0.0], 1.1),
        Pattern::DashDotDot => (&[1.0, -1.0], 1.8),
        Pattern::LongDashed => (&[2.2], 1.0),
        Pattern::Dotted => (&[-2.2], 1.0),
        Pattern::Paired => (&[0.45], 1.6),
    };
    let mut path = Path::new();
    for slope in slopes {
        let run = slope * frame.height;
        let (first, last) = (frame.x - run.max(0.0), frame.right() - run.min(0.0));
        if !(first.is_finite() && last.is_finite()) || (last - first) / spacing > MOST_LINES {
            continue;
        }
        // Lines sit on a lattice fixed to the sheet, so that neighbours of one pattern join up.
        let mut x = (first / spacing).ceil() * spacing;
        while x < last {
            path = path.move_to(at(x, frame.bottom())).line_to(at(x + run, frame.y));
            x += spacing;
        }
    }
    path
}

/// Text without characters that no back end can carry: controls and the two non-characters of XML.
pub(crate) fn printable(words: &str) -> String {
    words
        .chars()
        .map(|c| if c == '\t' || c == '\n' || c == '\r' { ' ' } else { c })
        .filter(|c| !c.is_control() && !matches!(c, '\u{fffe}' | '\u{ffff}'))
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_line_through_a_hole_is_two_lines() {
        let path = Path::through([at(0.0, 0.0), at(1.0, 0.0), at(f64::NAN, 0.0), at(3.0, 0.0), at(4.0, 0.0)]);
        let moves = path.steps().iter().filter(|s| matches!(s, Step::Move(_))).count();
        assert_eq!(moves, 2);
        assert!(path.is_drawable());
    }

    #[test]
    fn eight_emitters_have_eight_different_patterns() {
        for (i, a) in Pattern::ALL.iter().enumerate() {
            for b in &Pattern::ALL[..i] {
                assert_ne!(a.pieces_mm(), b.pieces_mm(), "{a:?} and {b:?} look the same");
            }
        }
        assert_eq!(Pattern::of_index(8), Pattern::of_index(0));
    }

    #[test]
    fn hatchings_differ_from_each_other() {
        let frame = Frame { x: 0.0, y: 0.0, width: 20.0, height: 10.0 };
        for (i, a) in Pattern::ALL.iter().enumerate() {
            for b in &Pattern::ALL[..i] {
                assert_ne!(hatch_lines(frame, *a), hatch_lines(frame, *b), "{a:?} and {b:?} look the same");
            }
        }
    }

    #[test]
    fn a_pale_ink_is_darkened_until_it_reads_in_grey() {
        let yellow = Ink(255, 235, 60);
        assert!(yellow.grey() > 200.0);
        assert!(yellow.legible().grey() <= 125.0);
        assert_eq!(Ink(20, 30, 90).legible(), Ink(20, 30, 90));
    }
}
