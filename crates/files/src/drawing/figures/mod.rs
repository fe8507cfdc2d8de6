//! Every picture of the report and of the plot export.
//!
//! Each figure is plain data with one method, `draw`, that gives a [`Drawing`] of a chosen width. Emitters are told
//! apart by number, line pattern or hatching, and name; colour only helps. Values that are not finite leave a gap.

mod board;
mod neighbourhood;
mod rendering;
mod spectrum;
mod stack;
mod stripes;

pub use board::{Board, BoardPackage};
pub use neighbourhood::Neighbourhood;
pub use rendering::{FidelityBars, HueBins, RenderingBars};
pub use spectrum::{SpectrumLine, SpectrumPlot};
pub use stack::{StackLayer, StackSection};
pub use stripes::{Stripe, StripePlan};

use super::{Anchor, Drawing, Frame, Ink, MM_PER_PT, Path, Pattern, Pen, Place, Text, at, font, theme};
use serde::{Deserialize, Serialize};

/// How one emitter is told apart, the same in every figure.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Look {
    /// Its name.
    pub name: String,
    /// The colour it emits, as far as paper can show it.
    pub ink: Ink,
    /// Its line pattern and hatching.
    pub pattern: Pattern,
}

/// The drawing of a built device.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum DevicePicture {
    /// Stripes seen from above.
    Stripes(StripePlan),
    /// Layers in section.
    Stack(StackSection),
    /// Packages on a board.
    Board(Board),
}

impl DevicePicture {
    /// The drawing at a width in mm.
    pub fn draw(&self, width_mm: f64) -> Drawing {
        match self {
            DevicePicture::Stripes(plan) => plan.draw(width_mm),
            DevicePicture::Stack(section) => section.draw(width_mm),
            DevicePicture::Board(board) => board.draw(width_mm),
        }
    }
}

/// A numbered disc that ties a mark to its line in the key.
fn tag(drawing: &mut Drawing, centre: Place, number: usize, ink: Ink) {
    const RADIUS: f64 = 1.75;
    let edge = Pen::solid(ink.legible(), 0.3);
    drawing.shape(Path::circle(centre, RADIUS), theme::PAPER, edge);
    let drop = font::CAPITAL_HEIGHT_EM * 6.5 * MM_PER_PT / 2.0;
    drawing.text(
        Text::new(at(centre.x, centre.y + drop), number.to_string(), 6.5, theme::INK)
            .bold()
            .anchored(Anchor::Middle),
    );
}

/// How a line of the key shows what it stands for.
enum Sample {
    Line(Pen),
    Area(Ink, Pattern),
    None,
}

/// One line of a key.
struct KeyLine {
    number: Option<(usize, Ink)>,
    sample: Sample,
    name: String,
    value: String,
    bold: bool,
}

/// Height of a key's line, mm.
const KEY_STEP: f64 = 5.2;

/// A key: number, sample, name, and a value at the right edge.
fn key(drawing: &mut Drawing, frame: Frame, lines: &[KeyLine]) {
    let drop = font::CAPITAL_HEIGHT_EM * theme::LABEL_PT * MM_PER_PT / 2.0;
    for (index, line) in lines.iter().enumerate() {
        let middle = frame.y + (index as f64 + 0.5) * KEY_STEP;
        let mut x = frame.x;
        if let Some((number, ink)) = line.number {
            tag(drawing, at(x + 1.8, middle), number, ink);
        }
        x += 4.8;
        match line.sample {
            Sample::Line(pen) => drawing.stroke(Path::line(at(x, middle), at(x + 8.0, middle)), pen),
            Sample::Area(ink, pattern) => {
                drawing.hatched(Frame { x, y: middle - 1.6, width: 8.0, height: 3.2 }, ink, pattern);
            }
            Sample::None => {}
        }
        x += 9.8;
        let mut value = Text::new(
            at(frame.right(), middle + drop),
            line.value.clone(),
            theme::LABEL_PT,
            if line.bold { theme::INK } else { theme::QUIET },
        )
        .anchored(Anchor::End);
        value.bold = line.bold;
        let room = frame.right() - x - value.width_mm() - 1.5;
        let mut name = Text::new(at(x, middle + drop), "", theme::LABEL_PT, theme::INK);
        name.bold = line.bold;
        name.words = font::shortened(&line.name, theme::LABEL_PT, line.bold, (room / MM_PER_PT).max(8.0));
        drawing.text(name);
        drawing.text(value);
    }
}

/// A bar showing a length at the drawing's scale: the longest round length that fits `room_mm`.
fn scale_bar(drawing: &mut Drawing, left: Place, mm_per_unit: f64, unit: &str, room_mm: f64) {
    let largest = room_mm / mm_per_unit;
    if !(largest.is_finite() && largest > 0.0) {
        return;
    }
    // round_step gives the least round number not below its argument; this wants the greatest not above.
    let power = 10f64.powf(largest.log10().floor());
    let length = [5.0, 2.0, 1.0].into_iter().map(|m| m * power).find(|l| *l <= largest).unwrap_or(power);
    let (start, end) = (left.x, left.x + length * mm_per_unit);
    let pen = Pen::solid(theme::INK, 0.25);
    drawing.stroke(
        Path::new()
            .move_to(at(start, left.y - 1.0))
            .line_to(at(start, left.y + 1.0))
            .move_to(at(start, left.y))
            .line_to(at(end, left.y))
            .move_to(at(end, left.y - 1.0))
            .line_to(at(end, left.y + 1.0)),
        pen,
    );
    drawing.text(Text::new(
        at(end + 1.5, left.y + 0.9),
        format!("{length} {unit}"),
        theme::TICK_PT,
        theme::QUIET,
    ));
}

/// A number for a figure: enough digits to tell a process by, none that it does not have.
fn shown(value: f64) -> String {
    crate::report::number::significant(value, 4)
}

#[cfg(test)]
mod tests;
