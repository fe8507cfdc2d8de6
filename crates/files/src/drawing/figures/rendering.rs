//! Rendering: R1–R15, fidelity by hue, and the shifts of hue and chroma.

use crate::drawing::axis::{Axis, Plot};
use crate::drawing::{Anchor, Drawing, Frame, Ink, Path, Pattern, Pen, Place, Text, at, theme};
use crate::report::number::significant;
use serde::{Deserialize, Serialize};
use std::f64::consts::TAU;

/// The special indices R1–R15 of CIE 13.3-1995 as bars.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct RenderingBars {
    /// R1, R2 … R15.
    pub r: Vec<f64>,
}

impl RenderingBars {
    /// The drawing at a width in mm.
    pub fn draw(&self, width_mm: f64) -> Drawing {
        let bars: Vec<Bar> = self
            .r
            .iter()
            .enumerate()
            .map(|(i, value)| Bar {
                name: format!("R{}", i + 1),
                value: Some(*value).filter(|v| v.is_finite()),
                accent: i == 8,
            })
            .collect();
        let title = "Special colour rendering indices";
        let about = "Bars of R1 to R15; R9, the saturated red, is hatched in the accent.";
        bar_chart(width_mm, title, about, "special index Rᵢ".replace('ᵢ', "i").as_str(), &bars)
    }
}

/// Fidelity of the sixteen hue bins of ANSI/IES TM-30 as bars.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct FidelityBars {
    /// Rf,h1 … Rf,h16; `None` where a bin holds no sample.
    pub rf: Vec<Option<f64>>,
}

impl FidelityBars {
    /// The drawing at a width in mm.
    pub fn draw(&self, width_mm: f64) -> Drawing {
        let bars: Vec<Bar> = self
            .rf
            .iter()
            .enumerate()
            .map(|(i, value)| Bar {
                name: (i + 1).to_string(),
                value: value.filter(|v| v.is_finite()),
                accent: false,
            })
            .collect();
        let title = "Local fidelity by hue bin";
        bar_chart(
            width_mm,
            title,
            "Bars of the local fidelity of hue bins 1 to 16.",
            "local fidelity Rf,h",
            &bars,
        )
    }
}

struct Bar {
    name: String,
    value: Option<f64>,
    accent: bool,
}

fn bar_chart(width_mm: f64, title: &str, about: &str, ordinate: &str, bars: &[Bar]) -> Drawing {
    /// Below this the bars are cut and only the number tells.
    const LOWEST_SHOWN: f64 = -100.0;
    let mut drawing = Drawing::new(width_mm, 46.5, title, about);
    let frame = Frame { x: 15.0, y: 5.0, width: width_mm - 17.0, height: 36.0 };
    let least = bars.iter().filter_map(|b| b.value).fold(0.0f64, f64::min).max(LOWEST_SHOWN);
    let mut plot = Plot {
        frame,
        across: Axis {
            title: String::new(),
            low: 0.0,
            high: bars.len().max(1) as f64,
            ticks: vec![],
            decimals: 0,
        },
        up: Axis::over(ordinate, if least < 0.0 { least * 1.12 } else { 0.0 }, 112.0, 5.0),
    };
    plot.up.ticks.retain(|t| *t <= 100.5);
    plot.ground(&mut drawing);
    drawing.stroke(
        Path::line(plot.place(0.0, 0.0), plot.place(plot.across.high, 0.0)),
        Pen::solid(theme::EDGE, 0.25),
    );
    for (index, bar) in bars.iter().enumerate() {
        let middle = index as f64 + 0.5;
        let foot = plot.place(middle, plot.up.low);
        let name = Text::new(at(foot.x, frame.bottom() + 3.4), bar.name.clone(), theme::TICK_PT, theme::INK)
            .anchored(Anchor::Middle);
        drawing.text(if bar.accent { name.bold() } else { name });
        let Some(value) = bar.value else {
            drawing.text(
                Text::new(at(foot.x, plot.place(0.0, 0.0).y - 1.0), "none", 6.0, theme::QUIET)
                    .anchored(Anchor::Middle),
            );
            continue;
        };
        let (zero, end) = (plot.place(middle, 0.0).y, plot.place(middle, value.clamp(LOWEST_SHOWN, 100.0)).y);
        let half = 0.32 * frame.width / plot.across.high;
        let area =
            Frame { x: foot.x - half, y: zero.min(end), width: 2.0 * half, height: (zero - end).abs() };
        if bar.accent {
            drawing.hatched(area, theme::ACCENT, Pattern::Dashed);
        } else {
            drawing.shape(area.path(), theme::BAR.thinned(0.8), Pen::solid(theme::QUIET, 0.15));
        }
        let above = if value < 0.0 { zero - 0.9 } else { end - 0.9 };
        let words =
            Text::new(at(foot.x, above), shown_index(value), 6.5, theme::INK).anchored(Anchor::Middle);
        drawing.text(if bar.accent { words.bold() } else { words });
    }
    drawing
}

/// An index without decimals, with a true minus.
fn shown_index(value: f64) -> String {
    let text = format!("{:.0}", value.abs());
    if value <= -0.5 { format!("−{text}") } else { text }
}

/// How hue and chroma move in each of the sixteen hue bins of ANSI/IES TM-30, against the reference.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct HueBins {
    /// Local chroma shift Rcs,h1 … 16, percent; `None` where a bin holds no sample.
    pub chroma_shift_percent: Vec<Option<f64>>,
    /// Local hue shift Rhs,h1 … 16, radians for small shifts.
    pub hue_shift: Vec<Option<f64>>,
}

impl HueBins {
    /// The drawing at a width in mm: reference on the ring, an arrow in each bin to where the blend puts it.
    pub fn draw(&self, width_mm: f64) -> Drawing {
        let side = width_mm;
        let mut drawing = Drawing::new(
            width_mm,
            side + 6.0,
            "Shift of hue and chroma by hue bin",
            "A ring for the reference; in each of 16 hue bins an arrow to the colour under the blend. Outward is more \
             chroma, inward less; sideways is a change of hue.",
        );
        let centre = at(side / 2.0, side / 2.0);
        let ring = 0.335 * side;
        drawing.fill(Path::circle(centre, 1.36 * ring), theme::PANEL);
        for (scale, percent) in [(0.8, "−20 %"), (1.2, "+20 %")] {
            let pen = Pen::patterned(theme::EDGE, 0.2, Pattern::ShortDashed);
            drawing.stroke(Path::circle(centre, scale * ring), pen);
            drawing.text(
                Text::new(at(centre.x, centre.y - scale * ring + 3.0), percent, 6.0, theme::QUIET)
                    .anchored(Anchor::Middle),
            );
        }
        let bins = self.chroma_shift_percent.len().min(self.hue_shift.len());
        let place =
            |angle: f64, radius: f64| at(centre.x + radius * angle.cos(), centre.y - radius * angle.sin());
        let angle_of = |i: usize| TAU * (i as f64 + 0.5) / bins.max(1) as f64;
        for i in 0..bins {
            let edge = TAU * i as f64 / bins as f64;
            drawing.stroke(
                Path::line(place(edge, 0.25 * ring), place(edge, 1.36 * ring)),
                Pen::solid(theme::RULE, 0.2),
            );
            let label = place(angle_of(i), 1.44 * ring);
            drawing.text(
                Text::new(at(label.x, label.y + 0.9), (i + 1).to_string(), theme::TICK_PT, theme::QUIET)
                    .anchored(Anchor::Middle),
            );
        }
        drawing.stroke(Path::circle(centre, ring), Pen::solid(theme::QUIET, 0.35));
        let ends: Vec<Place> = (0..bins).map(|i| self.end(i, angle_of(i), centre, ring)).collect();
        if ends.iter().all(|p| p.x.is_finite()) && bins > 2 {
            drawing.stroke(Path::smooth_ring(&ends), Pen::solid(theme::INK, 0.3));
        }
        for (i, end) in ends.iter().enumerate() {
            arrow(&mut drawing, place(angle_of(i), ring), *end, theme::ACCENT);
        }
        drawing.text(
            Text::new(
                at(centre.x, side + 3.6),
                "ring: reference; outward more chroma, sideways other hue",
                6.5,
                theme::QUIET,
            )
            .anchored(Anchor::Middle),
        );
        drawing
    }

    /// Where the blend puts a bin: not finite when the bin is empty.
    fn end(&self, i: usize, angle: f64, centre: Place, ring: f64) -> Place {
        let (Some(chroma), Some(hue)) = (self.chroma_shift_percent[i], self.hue_shift[i]) else {
            return at(f64::NAN, f64::NAN);
        };
        // Shifts beyond half the ring would leave the picture; the numbers are in the table.
        let (out, side) = (1.0 + (chroma / 100.0).clamp(-0.7, 0.4), hue.clamp(-0.6, 0.6));
        at(
            centre.x + ring * (out * angle.cos() - side * angle.sin()),
            centre.y - ring * (out * angle.sin() + side * angle.cos()),
        )
    }
}

fn arrow(drawing: &mut Drawing, from: Place, to: Place, ink: Ink) {
    let (dx, dy) = (to.x - from.x, to.y - from.y);
    let length = dx.hypot(dy);
    drawing.fill(Path::circle(from, 0.45), ink);
    if !(length.is_finite() && length > 0.3) {
        return;
    }
    let head = length.min(1.9);
    let (ux, uy) = (dx / length, dy / length);
    let neck = at(to.x - head * ux, to.y - head * uy);
    drawing.stroke(Path::line(from, neck), Pen::solid(ink, 0.45));
    drawing.fill(
        Path::new()
            .move_to(to)
            .line_to(at(neck.x - 0.36 * head * uy, neck.y + 0.36 * head * ux))
            .line_to(at(neck.x + 0.36 * head * uy, neck.y - 0.36 * head * ux))
            .close(),
        ink,
    );
}

impl HueBins {
    /// One sentence on the greatest chroma shift, for readers without the picture; empty when every bin is empty.
    pub fn sentence(&self) -> String {
        let greatest = self
            .chroma_shift_percent
            .iter()
            .enumerate()
            .filter_map(|(i, shift)| shift.filter(|s| s.is_finite()).map(|s| (i + 1, s)))
            .max_by(|a, b| a.1.abs().total_cmp(&b.1.abs()));
        greatest.map_or_else(String::new, |(bin, shift)| {
            format!("Greatest chroma shift: {} % in hue bin {bin}.", significant(shift, 2))
        })
    }
}
