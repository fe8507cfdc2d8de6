//! Side-by-side emitters: stripes seen from above, to scale.

use super::{KEY_STEP, KeyLine, Look, Sample, key, scale_bar, shown, tag};
use crate::drawing::{Anchor, Drawing, Frame, Path, Pen, Text, at, theme};
use crate::report::number::significant;
use serde::{Deserialize, Serialize};

/// One stripe of the repeated pattern.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Stripe {
    /// How the emitter is told apart; `None` for a dark gap.
    pub look: Option<Look>,
    /// Width, µm.
    pub width_um: f64,
}

/// Stripes on a pitch, in order; the pitch is the sum of the widths.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct StripePlan {
    /// The stripes and gaps of one pitch.
    pub stripes: Vec<Stripe>,
    /// Narrowest width the line can make, µm.
    pub minimum_feature_um: Option<f64>,
}

impl StripePlan {
    /// The pitch, µm: the sum of every width that is finite and positive.
    pub fn pitch_um(&self) -> f64 {
        self.stripes.iter().map(width_of).sum()
    }

    /// The drawing at a width in mm: two pitches to scale, and a key with widths.
    pub fn draw(&self, width_mm: f64) -> Drawing {
        let lit = self.stripes.iter().filter(|s| s.look.is_some()).count();
        let plan_height = 26.0;
        let height = plan_height + 20.0 + KEY_STEP * (lit as f64 + 2.0);
        let pitch = self.pitch_um();
        let mut drawing = Drawing::new(
            width_mm,
            height,
            "Stripes in plan",
            format!("Two pitches of {} µm drawn to scale, {lit} lit stripes in each.", shown(pitch)),
        );
        let frame = Frame { x: 3.0, y: 8.0, width: width_mm - 6.0, height: plan_height };
        drawing.fill(frame.path(), theme::PANEL);
        if pitch > 0.0 {
            self.paint(frame, pitch, &mut drawing);
        }
        drawing.stroke(frame.path(), Pen::solid(theme::EDGE, theme::HAIR_MM));
        let below = Frame {
            x: 3.0,
            y: frame.bottom() + 9.0,
            width: (width_mm - 6.0).min(110.0),
            height: height - frame.bottom() - 9.0,
        };
        key(&mut drawing, below, &self.key_lines(pitch));
        drawing
    }

    fn paint(&self, frame: Frame, pitch: f64, drawing: &mut Drawing) {
        let mm_per_um = frame.width / (2.0 * pitch);
        let mut x = frame.x;
        for repeat in 0..2 {
            let start = x;
            let mut number = 0;
            for stripe in &self.stripes {
                let width = width_of(stripe) * mm_per_um;
                if let Some(look) = &stripe.look {
                    number += 1;
                    let area = Frame { x, width, ..frame };
                    drawing.hatched(area, look.ink, look.pattern);
                    if repeat == 0 {
                        // A stripe narrower than its number carries it above, at the end of a line.
                        let middle = x + width / 2.0;
                        if width > 4.0 {
                            tag(drawing, at(middle, frame.y + frame.height / 2.0), number, look.ink);
                        } else {
                            let leader = Path::line(at(middle, frame.y), at(middle, frame.y - 1.6));
                            drawing.stroke(leader, Pen::solid(theme::INK, 0.2));
                            tag(drawing, at(middle, frame.y - 3.3), number, look.ink);
                        }
                    }
                }
                x += width;
            }
            if repeat == 1 {
                dimension(drawing, start, x, frame.y - 2.2, &format!("pitch {} µm", shown(pitch)));
            }
        }
        scale_bar(drawing, at(frame.x, frame.bottom() + 4.5), mm_per_um, "µm", frame.width / 4.0);
    }

    fn key_lines(&self, pitch: f64) -> Vec<KeyLine> {
        let plain = |name: String, value: String| KeyLine {
            number: None,
            sample: Sample::None,
            name,
            value,
            bold: false,
        };
        let mut lines: Vec<KeyLine> = self
            .stripes
            .iter()
            .filter_map(|stripe| stripe.look.as_ref().map(|look| (look, width_of(stripe))))
            .enumerate()
            .map(|(index, (look, width))| {
                let narrow = self.minimum_feature_um.is_some_and(|least| width < least);
                KeyLine {
                    number: Some((index + 1, look.ink)),
                    sample: Sample::Area(look.ink, look.pattern),
                    name: look.name.clone(),
                    value: format!(
                        "{} µm, {} % of the pitch{}",
                        shown(width),
                        significant(100.0 * width / pitch, 3),
                        if narrow { ", below the least width" } else { "" }
                    ),
                    bold: narrow,
                }
            })
            .collect();
        let dark: f64 = self.stripes.iter().filter(|s| s.look.is_none()).map(width_of).sum();
        if dark > 0.0 {
            let value =
                format!("{} µm, {} % of the pitch", shown(dark), significant(100.0 * dark / pitch, 3));
            lines.push(plain("dark between stripes".to_owned(), value));
        }
        if let Some(least) = self.minimum_feature_um {
            lines.push(plain("least width the line makes".to_owned(), format!("{} µm", shown(least))));
        }
        lines
    }
}

fn width_of(stripe: &Stripe) -> f64 {
    if (0.0..=1e9).contains(&stripe.width_um) { stripe.width_um } else { 0.0 }
}

/// A dimension line with its words in the middle.
fn dimension(drawing: &mut Drawing, from: f64, to: f64, y: f64, words: &str) {
    let pen = Pen::solid(theme::INK, 0.2);
    let text =
        Text::new(at((from + to) / 2.0, y + 0.9), words, theme::TICK_PT, theme::INK).anchored(Anchor::Middle);
    let half = text.width_mm() / 2.0 + 1.5;
    let middle = (from + to) / 2.0;
    drawing.stroke(
        Path::new()
            .move_to(at(from, y - 1.0))
            .line_to(at(from, y + 1.0))
            .move_to(at(from, y))
            .line_to(at((middle - half).max(from), y))
            .move_to(at((middle + half).min(to), y))
            .line_to(at(to, y))
            .move_to(at(to, y - 1.0))
            .line_to(at(to, y + 1.0)),
        pen,
    );
    drawing.text(text);
}
