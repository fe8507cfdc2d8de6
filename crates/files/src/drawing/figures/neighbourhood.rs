//! The surroundings of a white in the u′v′ diagram.

use crate::drawing::axis::{Axis, Plot, round_step};
use crate::drawing::{Anchor, Drawing, Frame, MM_PER_PT, Path, Pattern, Pen, Place, Text, at, font, theme};
use crate::report::number::fixed;
use colour::{UvPrime, locus};
use serde::{Deserialize, Serialize};

/// Radius of one step in u′v′ (CIE TN 001:2014: n-step circles of 0.0011·n).
const STEP_UV_PRIME: f64 = 0.0011;

/// A white, its target and its tolerance in CIE 1976 u′v′ of the 1931 observer.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Neighbourhood {
    /// The blend.
    pub blend: UvPrime,
    /// The white asked for.
    pub target: Option<UvPrime>,
    /// Corners of the region allowed.
    pub bin: Vec<UvPrime>,
    /// Name of that region, such as `3000 K quadrangle (ANSI C78.377)`.
    pub bin_name: String,
    /// Circles of so many steps of 0.0011 round the target.
    pub circles: Vec<u32>,
}

impl Neighbourhood {
    /// The drawing at a width in mm; the plot is square, so that equal distances look equal.
    pub fn draw(&self, width_mm: f64) -> Drawing {
        let side = (width_mm - 22.0).max(20.0);
        let mut drawing = Drawing::new(
            width_mm,
            side + 23.0,
            "Chromaticity",
            format!(
                "The blend at u′ {}, v′ {} with the Planckian locus{}{}.",
                fixed(self.blend.u, 4),
                fixed(self.blend.v, 4),
                if self.target.is_some() { ", the target" } else { "" },
                if self.bin.len() > 2 { " and the region allowed" } else { "" },
            ),
        );
        let frame = Frame { x: 18.0, y: 3.0, width: side, height: side };
        let plot = self.plot(frame);
        plot.ground(&mut drawing);
        drawing.window(frame, |d| {
            self.paint_bin(&plot, d);
            self.paint_circles(&plot, d);
            paint_locus(&plot, d);
            self.paint_whites(&plot, d);
        });
        self.words(frame, &mut drawing);
        drawing
    }

    fn plot(&self, frame: Frame) -> Plot {
        let centre = self.target.unwrap_or(self.blend);
        let reach = self
            .bin
            .iter()
            .chain(std::iter::once(&self.blend))
            .map(|p| (p.u - centre.u).abs().max((p.v - centre.v).abs()))
            .chain(self.circles.iter().map(|n| f64::from(*n) * STEP_UV_PRIME))
            .filter(|r| r.is_finite())
            .fold(0.005f64, f64::max)
            * 1.18;
        let axis = |title: &str, middle: f64| Axis::over(title, middle - reach, middle + reach, 5.0);
        Plot { frame, across: axis("u′", centre.u), up: axis("v′", centre.v) }
    }

    fn paint_bin(&self, plot: &Plot, drawing: &mut Drawing) {
        if self.bin.len() > 2 {
            let outline = Path::through(self.bin.iter().map(|p| plot.place(p.u, p.v))).close();
            drawing.stroke(outline, Pen::solid(theme::ACCENT, 0.45));
        }
    }

    fn paint_circles(&self, plot: &Plot, drawing: &mut Drawing) {
        let Some(target) = self.target else { return };
        let centre = plot.place(target.u, target.v);
        let mm_per_unit = plot.frame.width / (plot.across.high - plot.across.low);
        for steps in &self.circles {
            let radius = f64::from(*steps) * STEP_UV_PRIME * mm_per_unit;
            let pen = Pen::patterned(theme::QUIET, 0.22, Pattern::ShortDashed);
            drawing.stroke(Path::circle(centre, radius), pen);
            if radius > 2.5 {
                // Upper left, where the locus does not run.
                let corner = at(centre.x - 0.707 * radius, centre.y - 0.707 * radius);
                let words = Text::new(at(corner.x, corner.y + 0.8), steps.to_string(), 6.5, theme::QUIET);
                cleared(drawing, words.anchored(Anchor::Middle));
            }
        }
    }

    fn paint_whites(&self, plot: &Plot, drawing: &mut Drawing) {
        if let Some(target) = self.target {
            let centre = plot.place(target.u, target.v);
            drawing.stroke(cross(centre, 2.6), Pen::solid(theme::ACCENT, 0.7));
        }
        let blend = plot.place(self.blend.u, self.blend.v);
        drawing.shape(Path::circle(blend, 1.05), theme::INK, Pen::solid(theme::PAPER, 0.3));
    }

    /// The key under the plot.
    fn words(&self, frame: Frame, drawing: &mut Drawing) {
        let y = frame.bottom() + 14.6;
        let middle = y - 0.95;
        let said = Text::new(at(frame.x, y), "the blend", theme::TICK_PT, theme::INK);
        let next = frame.x + said.width_mm() + 5.5;
        let dot = Path::circle(at(frame.x - 3.0, middle), 0.95);
        drawing.shape(dot, theme::INK, Pen::solid(theme::PAPER, 0.2));
        drawing.text(said);
        if self.target.is_some() {
            drawing.stroke(cross(at(next, middle), 1.5), Pen::solid(theme::ACCENT, 0.6));
            drawing.text(Text::new(at(next + 3.0, y), "the target", theme::TICK_PT, theme::INK));
        }
        if self.bin.len() > 2 && !self.bin_name.is_empty() {
            let room = (frame.width + 4.0) / crate::drawing::MM_PER_PT;
            let name = font::shortened(&format!("outlined: {}", self.bin_name), theme::TICK_PT, false, room);
            drawing.text(Text::new(at(frame.x - 4.0, y + 3.6), name, theme::TICK_PT, theme::QUIET));
        }
    }
}

fn cross(centre: Place, arm: f64) -> Path {
    Path::new()
        .move_to(at(centre.x - arm, centre.y))
        .line_to(at(centre.x + arm, centre.y))
        .move_to(at(centre.x, centre.y - arm))
        .line_to(at(centre.x, centre.y + arm))
}

/// Text on a patch of the ground, so that lines behind do not run through it.
fn cleared(drawing: &mut Drawing, text: Text) {
    let (width, height) = (text.width_mm() + 0.8, font::CAPITAL_HEIGHT_EM * text.size_pt * MM_PER_PT + 0.8);
    let left = match text.anchor {
        Anchor::Start => text.place.x,
        Anchor::Middle => text.place.x - width / 2.0,
        Anchor::End => text.place.x - width,
    };
    let patch = Frame { x: left, y: text.place.y + 0.4 - height, width, height };
    drawing.fill(patch.path(), theme::PANEL);
    drawing.text(text);
}

/// The locus, and marks across it at round CCTs from Duv −0.002 to +0.002.
fn paint_locus(plot: &Plot, drawing: &mut Drawing) {
    const SAMPLES: usize = 400;
    let place = |cct_k: f64, duv: f64| {
        let white = locus::uv_at(cct_k, duv).uv_prime();
        plot.place(white.u, white.v)
    };
    let inside = |p: Place| {
        p.x >= plot.frame.x && p.x <= plot.frame.right() && p.y >= plot.frame.y && p.y <= plot.frame.bottom()
    };
    // Even in reciprocal CCT, in which the locus is run through at a nearly even pace.
    let (coldest, warmest) = (1.0 / locus::HIGHEST_CCT_K, 1.0 / locus::LOWEST_CCT_K);
    let ccts: Vec<f64> =
        (0..=SAMPLES).map(|i| 1.0 / (coldest + (warmest - coldest) * i as f64 / SAMPLES as f64)).collect();
    let pen = Pen::solid(theme::INK, 0.4);
    drawing.stroke(Path::through(ccts.iter().map(|cct| place(*cct, 0.0))), pen);
    let seen: Vec<f64> = ccts.iter().copied().filter(|cct| inside(place(*cct, 0.0))).collect();
    let (Some(high), Some(low)) = (seen.first(), seen.last()) else { return };
    let step = round_step(((high - low) / 6.0).max(10.0));
    let mut cct = (low / step).ceil() * step;
    while cct <= *high {
        let (below, above) = (place(cct, -0.002), place(cct, 0.002));
        drawing.stroke(Path::line(below, above), Pen::solid(theme::INK, 0.22));
        let along = (below.x - above.x).hypot(below.y - above.y).max(1e-9);
        let out = at((below.x - above.x) / along, (below.y - above.y) / along);
        cleared(
            drawing,
            Text::new(
                at(below.x + 2.4 * out.x, below.y + 2.4 * out.y + 0.6),
                format!("{cct:.0} K"),
                theme::TICK_PT,
                theme::INK,
            )
            .anchored(Anchor::Middle),
        );
        cct += step;
    }
}
