//! Stacked emitters: layers in section, thicknesses to scale.

use super::{Look, scale_bar, shown};
use crate::drawing::{Anchor, Drawing, Frame, MM_PER_PT, Path, Pen, Text, at, font, theme};
use serde::{Deserialize, Serialize};

/// One layer of a section.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct StackLayer {
    /// What it is, such as `electron transport`.
    pub name: String,
    /// Thickness, nm.
    pub thickness_nm: f64,
    /// How its emitter is told apart; `None` for a layer that does not emit.
    pub look: Option<Look>,
    /// A remark beside it, such as a doping.
    pub remark: String,
}

/// Layers from the top of the device down; the substrate is named, not drawn to scale.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct StackSection {
    /// The layers, uppermost first.
    pub layers: Vec<StackLayer>,
    /// What the stack stands on, such as `glass`; empty for nothing.
    pub substrate: String,
}

/// Least distance between two labels, mm.
const LABEL_STEP: f64 = 4.4;

impl StackSection {
    /// Total thickness of the layers drawn, nm.
    pub fn thickness_nm(&self) -> f64 {
        self.layers.iter().map(thickness_of).sum()
    }

    /// The drawing at a width in mm.
    pub fn draw(&self, width_mm: f64) -> Drawing {
        let body = 70f64.max(LABEL_STEP * (self.layers.len() as f64 + 0.5));
        let substrate = if self.substrate.is_empty() { 0.0 } else { 9.0 };
        let total = self.thickness_nm();
        let mut drawing = Drawing::new(
            width_mm,
            body + substrate + 11.0,
            "Stack in section",
            format!("{} layers, {} nm in all, thicknesses to scale.", self.layers.len(), shown(total)),
        );
        let frame = Frame { x: 3.0, y: 3.0, width: 0.40 * width_mm, height: body };
        drawing.fill(frame.path(), theme::PANEL);
        if total > 0.0 {
            self.paint(frame, total, width_mm, &mut drawing);
        }
        drawing.stroke(frame.path(), Pen::solid(theme::EDGE, theme::HAIR_MM));
        if substrate > 0.0 {
            self.paint_substrate(frame, substrate, &mut drawing);
        }
        drawing
    }

    fn paint(&self, frame: Frame, total: f64, width_mm: f64, drawing: &mut Drawing) {
        let mm_per_nm = frame.height / total;
        let mut middles = Vec::with_capacity(self.layers.len());
        let mut y = frame.y;
        for layer in &self.layers {
            let area = Frame { y, height: thickness_of(layer) * mm_per_nm, ..frame };
            match &layer.look {
                Some(look) => drawing.hatched(area, look.ink, look.pattern),
                None => drawing.shape(area.path(), theme::PAPER, Pen::solid(theme::EDGE, 0.2)),
            }
            middles.push(y + area.height / 2.0);
            y = area.bottom();
        }
        let labels = spread(&middles, frame.y + 1.5, frame.bottom() - 1.5, LABEL_STEP);
        let (knee, words_x) = (frame.right() + 3.0, frame.right() + 8.0);
        let drop = font::CAPITAL_HEIGHT_EM * theme::LABEL_PT * MM_PER_PT / 2.0;
        for ((layer, middle), label) in self.layers.iter().zip(&middles).zip(&labels) {
            drawing.stroke(
                Path::new()
                    .move_to(at(frame.right(), *middle))
                    .line_to(at(knee, *middle))
                    .line_to(at(words_x - 1.0, *label)),
                Pen::solid(theme::EDGE, 0.18),
            );
            let nm = Text::new(
                at(words_x + 15.0, label + drop),
                format!("{} nm", shown(layer.thickness_nm)),
                theme::LABEL_PT,
                theme::INK,
            )
            .bold()
            .anchored(Anchor::End);
            drawing.text(nm);
            let name = match &layer.look {
                Some(look) if look.name != layer.name => format!("{}: {}", layer.name, look.name),
                _ => layer.name.clone(),
            };
            let said = if layer.remark.is_empty() { name } else { format!("{name}, {}", layer.remark) };
            let room = (width_mm - words_x - 18.0) / MM_PER_PT;
            let mut text = Text::new(
                at(words_x + 17.0, label + drop),
                font::shortened(&said, theme::LABEL_PT, layer.look.is_some(), room.max(8.0)),
                theme::LABEL_PT,
                theme::INK,
            );
            text.bold = layer.look.is_some();
            drawing.text(text);
        }
        // An upright scale would need turned words; the same scale holds both ways, so the bar lies flat.
        let foot = frame.bottom() + if self.substrate.is_empty() { 5.0 } else { 14.0 };
        scale_bar(drawing, at(frame.x, foot), mm_per_nm, "nm", frame.width * 0.6);
    }

    fn paint_substrate(&self, frame: Frame, height: f64, drawing: &mut Drawing) {
        let top = frame.bottom();
        // A torn lower edge says that the substrate goes on.
        let mut edge = Path::new().move_to(at(frame.x, top)).line_to(at(frame.x, top + height - 1.5));
        let teeth = 12;
        for i in 1..=teeth {
            let x = frame.x + frame.width * f64::from(i) / f64::from(teeth);
            let y = top + height - if i % 2 == 1 { 0.0 } else { 1.5 };
            edge = edge.line_to(at(x, y));
        }
        let edge = edge.line_to(at(frame.right(), top)).close();
        drawing.shape(edge, theme::PAPER, Pen::solid(theme::EDGE, 0.2));
        let room = (frame.width - 4.0) / MM_PER_PT;
        let words =
            font::shortened(&format!("{} (not to scale)", self.substrate), theme::LABEL_PT, false, room);
        drawing.text(
            Text::new(at(frame.x + frame.width / 2.0, top + 4.8), words, theme::LABEL_PT, theme::QUIET)
                .anchored(Anchor::Middle),
        );
    }
}

fn thickness_of(layer: &StackLayer) -> f64 {
    if (0.0..=1e9).contains(&layer.thickness_nm) { layer.thickness_nm } else { 0.0 }
}

/// Move places (ascending) apart to at least `step`, staying between `low` and `high` as far as they fit.
fn spread(places: &[f64], low: f64, high: f64, step: f64) -> Vec<f64> {
    let mut out: Vec<f64> = places.to_vec();
    let mut least = low;
    for place in &mut out {
        *place = place.max(least);
        least = *place + step;
    }
    let mut most = high;
    for place in out.iter_mut().rev() {
        *place = place.min(most);
        most = *place - step;
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn labels_never_overlap(mut places in prop::collection::vec(0.0..60.0f64, 1..12)) {
            places.sort_by(f64::total_cmp);
            let out = spread(&places, 0.0, 60.0, 4.4);
            for pair in out.windows(2) {
                prop_assert!(pair[1] - pair[0] >= 4.4 - 1e-9);
            }
        }
    }
}
